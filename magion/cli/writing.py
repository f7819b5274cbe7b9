"""Where answers go: the terminal, or a file written whole or not at all."""

import os
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from magion.errors import InputError
from magion.formats.tables import printable


def give(
    answer: Any,
    form: str,
    output: Path | None,
    as_text: Callable[[Any], str],
    rows: Callable[[Any], list[dict[str, Any]]] | None = None,
) -> None:
    """Write an answer in the form asked for.

    Parameters
    ----------
    answer : record
        The answer.
    form : str
        "text", "json" or "csv".
    output : Path or None
        The file; None for standard output.
    as_text : callable
        The answer's text.
    rows : callable, optional
        The rows of its CSV; one row of all its keys if not given.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    from magion.render.data import dotted_record, to_csv, to_json
    from magion.render.text import can_show

    if form == "json":
        text = to_json(answer)
        if output is None and not can_show(text, getattr(sys.stdout, "encoding", None)):
            text = to_json(answer, ascii_only=True)
    elif form == "csv":
        text = to_csv([dotted_record(answer)] if rows is None else rows(answer))
    else:
        text = as_text(answer)
    write(text, output)


def write(text: str, output: Path | None) -> None:
    """Write an answer to the terminal or a file.

    Parameters
    ----------
    text : str
        The answer.
    output : Path or None
        The file; None for standard output.

    Raises
    ------
    InputError
        If the file cannot be written; what stood there before stays.
    """
    if output is None:
        from magion.render.text import for_encoding

        click.echo(for_encoding(text, getattr(sys.stdout, "encoding", None)), nl=False)
        return
    replace_file(output, text.encode("utf-8"))


def draw(figure: Callable[[], Any], target: Path) -> None:
    """Draw a figure into a file, whole or not at all.

    Parameters
    ----------
    figure : callable
        Makes the figure; called after the file's ending was found good.
    target : Path
        The file: .png, .svg or .pdf.

    Raises
    ------
    InputError
        If the ending is another, or the file cannot be written.
    """
    from magion.plots.saving import encoded

    ending = require_figure(target)
    replace_file(target, encoded(figure(), ending))


def require_figure(target: Path) -> str:
    """Refuse a figure's file before work is spent on it.

    Parameters
    ----------
    target : Path
        The file: .png, .svg or .pdf.

    Returns
    -------
    str
        Its ending, without the point.

    Raises
    ------
    InputError
        If the ending is another, or the file cannot be written.
    """
    from magion.plots.saving import require_ending

    ending = require_ending(target.name)
    require_target(target)
    return ending


def require_files(output: Path | None, plot: Path | None = None) -> None:
    """Refuse files that cannot be written before work is spent, or one of them is written.

    Parameters
    ----------
    output, plot : Path or None
        Files for the answer and for its figure.

    Raises
    ------
    InputError
        If one cannot be written, the figure's ending is no figure's, or both
        are one file.
    """
    if output is not None:
        require_target(output)
    if plot is not None:
        require_figure(plot)
    if output and plot and os.path.realpath(output) == os.path.realpath(plot):
        raise InputError("--plot and --output name one file; accepted: two files")


def require_target(target: Path) -> None:
    """Refuse a file that cannot be written before work is spent on it.

    Parameters
    ----------
    target : Path
        The file.

    Raises
    ------
    InputError
        If it is not a regular file or its folder is missing.
    """
    name = printable(str(target))
    if target.is_dir() or (target.exists() and not target.is_file()):
        raise InputError(f"output {name} is not a regular file")
    if not target.parent.is_dir():
        raise InputError(f"output {name}: the folder {printable(str(target.parent))} is missing")


def replace_file(target: Path, content: bytes) -> None:
    """Put a file in place in one move, with the user's usual permissions.

    Parameters
    ----------
    target : Path
        The file; an existing regular file is replaced.
    content : bytes
        What it shall hold.

    Raises
    ------
    InputError
        If it is not a regular file or its folder cannot be written.
    """
    name = printable(str(target))
    require_target(target)
    try:
        handle, partial = tempfile.mkstemp(prefix=f".{target.name}.", dir=target.parent)
        try:
            with os.fdopen(handle, "wb") as file:
                file.write(content)
            mask = os.umask(0)
            os.umask(mask)
            os.chmod(partial, target.stat().st_mode if target.exists() else 0o666 & ~mask)
            os.replace(partial, target)
        except BaseException:
            Path(partial).unlink(missing_ok=True)
            raise
    except OSError as error:
        raise InputError(f"output {name}: {error.strerror or 'cannot be written'}") from None
