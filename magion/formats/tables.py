"""Reading of CSV files, with messages that name file, line and column."""

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
    safe = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)
    return safe if len(safe) <= 80 else safe[:77] + "..."


def read_text(path: str | Path) -> str:
    """The text of a regular file.

    Parameters
    ----------
    path : str or Path
        The file; UTF-8, with or without a byte-order mark.

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
    name = printable(str(path))
    try:
        if not file.exists():
            raise InputError(f"file {name} does not exist")
        if not file.is_file():
            raise InputError(f"{name} is not a regular file; accepted: a CSV file")
        if file.stat().st_size > LARGEST_FILE:
            raise InputError(f"file {name} is larger than {LARGEST_FILE // 2**20} MiB")
        return file.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise InputError(f"file {name} is not UTF-8 text") from None
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
    """

    file: str
    columns: tuple[str, ...]
    rows: tuple[Row, ...]
    comments: tuple[str, ...]


def read_table(path: str | Path, required: tuple[str, ...]) -> Table:
    """Read a CSV file with a header row.

    Parameters
    ----------
    path : str or Path
        The file.
    required : tuple of str
        Columns that must be there.

    Returns
    -------
    Table
        Header, rows and comments; columns not known to the caller are kept.

    Raises
    ------
    InputError
        If the file cannot be read, is empty, lacks a column, or a row has
        another number of cells than the header.
    """
    name = printable(str(path))
    lines = read_text(path).splitlines()
    comments = tuple(x.lstrip()[1:].strip() for x in lines if x.lstrip().startswith("#"))
    kept = [(i, x) for i, x in enumerate(lines, 1) if x.strip() and not x.lstrip().startswith("#")]
    wanted = ",".join(required)
    if not kept:
        raise InputError(f"file {name} is empty; accepted: CSV with the header {wanted}")
    try:
        parsed = [next(csv.reader([text], strict=True)) for _, text in kept]
    except csv.Error as error:
        raise InputError(f"file {name} is not CSV: {error}") from None
    columns = tuple(c.strip() for c in parsed[0])
    for column in required:
        if column not in columns:
            raise InputError(
                f"{name}, line {kept[0][0]}: column {column} is missing; accepted: {wanted}"
            )
    rows = []
    for (line, _), cells in zip(kept[1:], parsed[1:], strict=True):
        if len(cells) != len(columns):
            raise InputError(
                f"{name}, line {line}: {len(cells)} cells where the header has {len(columns)}"
            )
        rows.append(Row(file=name, line=line, cells=dict(zip(columns, cells, strict=True))))
    return Table(file=name, columns=columns, rows=tuple(rows), comments=comments)
