"""A log of readings on two relay positions."""

import math
import re
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Final

from magion.errors import InputError
from magion.formats.tables import Row, printable, read_table
from magion.geometry import Place, parse_place

MOST_ROWS: Final = 20_000
_HEADER: Final = "time_utc,partner,frequency_mhz,level_<position>_db,level_<position>_db"
_LEVEL = re.compile(r"level_(.+)_(db|dbm|s)")
_S_UNITS = re.compile(r"[Ss]?\s*([0-9](?:\.[0-9]+)?)\s*(?:\+\s*([0-9]{1,2})\s*(?:[dD][bB])?)?")
_S_UNIT_DB = 6.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One row of the log.

    Parameters
    ----------
    line : int
        Its line in the file, counted from 1.
    time : datetime
        Instant, UTC.
    partner : Place
        The station that transmits.
    frequency_mhz : float
        Frequency [MHz].
    levels_db : tuple of float or None
        Readings on both positions; None where one is missing [dB].
    """

    line: int
    time: datetime
    partner: Place
    frequency_mhz: float
    levels_db: tuple[float, float] | None


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayLog:
    """A log.

    Parameters
    ----------
    labels : tuple of str
        The two positions, as the header names them.
    unit : str
        "db", "dbm" or "s".
    readings : tuple of Reading
        Its rows.
    """

    labels: tuple[str, str]
    unit: str
    readings: tuple[Reading, ...]


def read_relay_log(path: str | Path, partners: dict[str, Place] | None = None) -> RelayLog:
    """Read a log of two relay positions.

    Parameters
    ----------
    path : str or Path
        CSV with ``time_utc``, ``partner``, ``frequency_mhz`` and, for each of
        two positions, ``level_<label>_db``, ``_dbm`` or ``_s``.
    partners : dict, optional
        Names that may stand for places, in lower case.

    Returns
    -------
    RelayLog
        Levels in dB, S-units at 6 dB each from S9.

    Raises
    ------
    InputError
        If the file is wrong; the message names file, line and column.
    """
    table = read_table(path, ("time_utc", "partner", "frequency_mhz"), _HEADER)
    levels = [(c, m) for c in table.columns if (m := _LEVEL.fullmatch(c))]
    if len(levels) != 2:
        raise InputError(
            f"{table.file}, line {table.header_line}: {len(levels)} columns of levels; accepted: "
            "two, as level_left_db,level_right_db (or _dbm, _s)"
        )
    units = {m.group(2) for _, m in levels}
    if len(units) > 1:
        raise InputError(
            f"{table.file}, line {table.header_line}: the two positions have different units; "
            "accepted: one of _db, _dbm and _s for both"
        )
    if len(table.rows) > MOST_ROWS:
        raise InputError(f"{table.file} holds more than {MOST_ROWS} rows")
    unit = units.pop()
    columns = (levels[0][0], levels[1][0])
    readings = [_reading(row, columns, unit, partners or {}) for row in table.rows]
    return RelayLog(
        labels=(levels[0][1].group(1), levels[1][1].group(1)), unit=unit, readings=tuple(readings)
    )


def _reading(row: Row, columns: tuple[str, str], unit: str, partners: dict[str, Place]) -> Reading:
    text = row.cells["partner"].strip()
    partner = partners.get(text.casefold())
    if partner is None:
        try:
            partner = parse_place(text)
        except InputError as error:
            raise row.error("partner", str(error)) from None
    frequency = row.number("frequency_mhz")
    if not 0.5 <= frequency <= 60.0:
        raise row.error("frequency_mhz", f"{frequency:g} MHz; accepted: 0.5 to 60 MHz")
    cells = [row.cells[c].strip() for c in columns]
    levels = None
    if all(cells):
        first, second = (_level(row, c, unit) for c in columns)
        levels = (first, second)
    return Reading(
        line=row.line,
        time=instant_of(row, "time_utc"),
        partner=partner,
        frequency_mhz=frequency,
        levels_db=levels,
    )


def instant_of(row: Row, column: str) -> datetime:
    """A cell as an instant.

    Parameters
    ----------
    row : Row
        The row.
    column : str
        The column; ISO 8601, without a zone UTC.

    Returns
    -------
    datetime
        The instant, in UTC.

    Raises
    ------
    InputError
        If it is no time.
    """
    text = row.cells[column].strip()
    try:
        found = datetime.fromisoformat(text)
        return found.replace(tzinfo=UTC) if found.tzinfo is None else found.astimezone(UTC)
    except (ValueError, OverflowError):
        raise row.error(
            column, f"{printable(text)!r} is not a time; accepted: 2026-06-21T12:00Z"
        ) from None


def _level(row: Row, column: str, unit: str) -> float:
    if unit != "s":
        value = row.number(column)
        if not -250.0 <= value <= 150.0:
            raise row.error(column, f"{value:g} is no level; accepted: -250 to 150")
        return value
    text = row.cells[column].strip()
    found = _S_UNITS.fullmatch(text)
    if found is None:
        raise row.error(
            column, f"{printable(text)!r} is no reading in S-units; accepted: 7 or 9+10"
        )
    units, over = float(found.group(1)), float(found.group(2) or 0.0)
    if over and units != 9.0:
        raise row.error(column, f"{printable(text)!r}: only S9 takes decibels; accepted: 9+10")
    return math.fsum([(units - 9.0) * _S_UNIT_DB, over])
