"""Reading of text and CSV files, with messages that name file, line and column."""

import csv
import math
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from magion.errors import InputError

LARGEST_FILE: Final = 16 * 2**20
"""Greatest size of a file that is held whole [bytes]."""


def printable(text: str) -> str:
    """Text with its control characters escaped, for messages.

    Parameters
    ----------
    text : str
        Any text.

    Returns
    -------
    str
        The same, safe to print, shortened to 80 signs.
    """
    start = text[:81]
    safe = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in start)
    return safe if len(safe) <= 80 else safe[:77] + "..."


def printable_name(path: str | Path) -> str:
    """Name of a file with its control characters escaped, for messages.

    Parameters
    ----------
    path : str or Path
        The file.

    Returns
    -------
    str
        Safe to print; of a long one, the last 80 signs, which hold the name.
    """
    safe = "".join(printable(c) for c in str(path))
    return safe if len(safe) <= 80 else "..." + safe[-77:]


def read_text(path: str | Path, accepted: str = "a text file", largest: int = LARGEST_FILE) -> str:
    """The text of a regular file.

    Parameters
    ----------
    path : str or Path
        The file; UTF-8, with or without a byte-order mark.
    accepted : str
        What kind of file it should be, as messages say it.
    largest : int
        Greatest size that is read [bytes].

    Returns
    -------
    str
        Its text.

    Raises
    ------
    InputError
        If it is missing, not a regular file, too large, or not UTF-8.
    """
    file = Path(path)
    name = printable_name(path)
    try:
        if not file.exists():
            raise InputError(f"file {name} does not exist; accepted: {accepted}")
        if not file.is_file():
            raise InputError(f"{name} is not a regular file; accepted: {accepted}")
        if file.stat().st_size > largest:
            size = f"{largest // 2**20} MiB" if largest >= 2**20 else f"{largest // 2**10} KiB"
            raise InputError(f"file {name} is larger than {size}; accepted: {accepted} up to that")
        return file.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise InputError(f"file {name} is not UTF-8 text; accepted: {accepted} in UTF-8") from None
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        reason = getattr(error, "strerror", None) or "cannot be read"
        raise InputError(f"file {name}: {reason}") from None


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One row of a table.

    Parameters
    ----------
    file : str
        Name of the file, for messages.
    line : int
        Its line, counted from 1.
    cells : dict
        Column name to text.
    """

    file: str
    line: int
    cells: dict[str, str]

    def error(self, column: str, what: str) -> InputError:
        """An error that names file, line and column.

        Parameters
        ----------
        column : str
            The column.
        what : str
            What was wrong and what is accepted.

        Returns
        -------
        InputError
            To be raised.
        """
        return InputError(f"{self.file}, line {self.line}, column {column}: {what}")

    def number(self, column: str) -> float:
        """A cell as a finite number.

        Parameters
        ----------
        column : str
            The column.

        Returns
        -------
        float
            Its value.

        Raises
        ------
        InputError
            If the cell is empty or not a finite number.
        """
        text = self.cells.get(column, "").strip()
        try:
            value = float(text)
        except ValueError:
            raise self.error(column, f"{printable(text)!r} is not a number") from None
        if not math.isfinite(value):
            raise self.error(column, f"{printable(text)!r} is not a finite number")
        return value


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """A CSV file.

    Parameters
    ----------
    file : str
        Its name, for messages.
    columns : tuple of str
        The header.
    rows : tuple of Row
        The rows.
    comments : tuple of str
        The lines that began with ``#``, without it.
    header_line : int
        Line of the header, counted from 1.
    comment_lines : tuple of int
        Line of each comment.
    """

    file: str
    columns: tuple[str, ...]
    rows: tuple[Row, ...]
    comments: tuple[str, ...]
    header_line: int
    comment_lines: tuple[int, ...]


def read_table(path: str | Path, required: tuple[str, ...], accepted: str = "") -> Table:
    """Read a CSV file with a header row.

    Parameters
    ----------
    path : str or Path
        The file.
    required : tuple of str
        Columns that must be there.
    accepted : str
        The header as messages give it, if it is more than `required`.

    Returns
    -------
    Table
        Header, rows and comments; columns not known to the caller are kept.

    Raises
    ------
    InputError
        If the file cannot be read, is empty, lacks a column or has one twice,
        or a row has another number of cells than the header.
    """
    name = printable_name(path)
    # Not splitlines(): a line separator within a cell would shift every line number after it.
    lines = list(enumerate(read_text(path, "a CSV file").split("\n"), 1))
    notes = [(i, x.strip()[1:].strip()) for i, x in lines if x.lstrip().startswith("#")]
    kept = [(i, x) for i, x in lines if x.strip() and not x.lstrip().startswith("#")]
    wanted = accepted or ",".join(required)
    if not kept:
        raise InputError(f"file {name} is empty; accepted: CSV with the header {wanted}")
    parsed: list[tuple[int, list[str]]] = []
    for line, text in kept:
        try:
            parsed.append((line, next(csv.reader([text], strict=True))))
        except csv.Error as error:
            raise InputError(f"file {name}, line {line} is not CSV: {error}") from None
    header_line = parsed[0][0]
    columns = tuple(c.strip() for c in parsed[0][1])
    for column in required:
        if column not in columns:
            raise InputError(
                f"{name}, line {header_line}: column {column} is missing; accepted: {wanted}"
            )
    seen: set[str] = set()
    for column in filter(None, columns):
        if column in seen:
            raise InputError(
                f"{name}, line {header_line}: column {printable(column)} stands twice; "
                "accepted: each column once"
            )
        seen.add(column)
    rows = []
    for line, cells in parsed[1:]:
        if len(cells) != len(columns):
            raise InputError(
                f"{name}, line {line}: {len(cells)} cells where the header has {len(columns)}"
            )
        rows.append(Row(file=name, line=line, cells=dict(zip(columns, cells, strict=True))))
    return Table(
        file=name,
        columns=columns,
        rows=tuple(rows),
        comments=tuple(text for _, text in notes),
        header_line=header_line,
        comment_lines=tuple(line for line, _ in notes),
    )
