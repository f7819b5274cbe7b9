"""Readings of an ionosonde over the day, and what they say of an instant between them."""

import math
import re
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import BoolArray, FloatArray, as_floats
from magion.errors import InputError
from magion.field import FIRST_DATE, LAST_DATE
from magion.formats.letters import ScaledValue, parse_scaled
from magion.formats.tables import Row, Table, printable, read_table
from magion.geometry import PLACE_FORMS, Place, as_utc, parse_place

LONGEST_GAP: Final = 7200.0
"""Longest time between two readings that is bridged [s]."""

LONGEST_HOLD: Final = 1800.0
"""Longest time for which a reading at the edge of a gap is taken as it stands [s]."""

TOLD_AGE: Final = 900.0
"""Age of a reading beyond which a caveat tells it [s]."""

DRIFT: Final = 0.15e6 / 3600.0
"""Standard deviation that foF2 gains with the time from the nearest reading [Hz/s]."""

_ERROR_OF_LETTER = {"U": 0.3e6, "A": 0.5e6, "D": 0.5e6, "E": 0.5e6}
_LOWEST, _HIGHEST = 150e3, 600e3
_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_TIME = "time_utc"
_ERROR = "fof2_error_mhz"
_TIME_FORM = "ISO 8601 with its zone, as 2026-06-21T12:00Z or 2026-06-21T14:00+02:00"
_HEADER = "time_utc with fof2_mhz or fof2_tenths_mhz"
_PLACE = re.compile(r"place\s*:(.*)", re.IGNORECASE | re.DOTALL)


class _Column(NamedTuple):
    """A column of values with letters; its range in its own unit."""

    quantity: str
    low: float
    high: float
    unit: str
    in_si: float
    whole: bool = False

    @property
    def accepted(self) -> str:
        return f"accepted: {self.low:g} to {self.high:g}{self.unit}"


_COLUMNS = {
    "fof2_mhz": _Column("foF2", 0.5, 25.0, " MHz", 1e6),
    "fof2_tenths_mhz": _Column("foF2", 5.0, 250.0, " tenths of a MHz", 1e5, whole=True),
    "hmf2_km": _Column("hmF2", _LOWEST / 1e3, _HIGHEST / 1e3, " km", 1e3),
    "m3000f2": _Column("M(3000)F2", 1.5, 5.0, "", 1.0),
    "foe_mhz": _Column("foE", 0.1, 10.0, " MHz", 1e6),
    "foe_tenths_mhz": _Column("foE", 1.0, 100.0, " tenths of a MHz", 1e5, whole=True),
    "fxi_mhz": _Column("fxI", 0.5, 30.0, " MHz", 1e6),
    "fxi_tenths_mhz": _Column("fxI", 5.0, 300.0, " tenths of a MHz", 1e5, whole=True),
}
_QUANTITIES = tuple(dict.fromkeys(c.quantity for c in _COLUMNS.values()))


class _Rows(NamedTuple):
    """Two rows and the share of the second in the value between them; one row twice."""

    before: int
    after: int
    share: float = 0.0

    def of(self, values: FloatArray) -> float:
        first = float(values[self.before])
        return first + self.share * (float(values[self.after]) - first)


def peak_height_of_m3000(m3000: ArrayLike) -> FloatArray:
    """Height of the F2 peak from the propagation factor, 1490 / M(3000)F2 - 176 km.

    For a layer with nothing below it [Shimazaki1955]_; the delay of the E
    region makes it too high by day, the more the nearer foE is to foF2.

    Parameters
    ----------
    m3000 : array_like
        M(3000)F2 [1].

    Returns
    -------
    ndarray
        hmF2 [m].

    Examples
    --------
    >>> round(float(peak_height_of_m3000(3.0)))
    320667
    """
    (factor,) = as_floats(m3000)
    return np.asarray((1490.0 / factor - 176.0) * 1e3)


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """What an ionosonde's readings say of one instant.

    Parameters
    ----------
    fof2 : float
        Critical frequency of F2 [Hz].
    hmf2 : float or None
        Height of the F2 peak; from M(3000)F2 where the file has no height [m].
    foe : float or None
        Critical frequency of E [Hz].
    fof2_error : float or None
        Standard deviation of foF2: of the readings, and of the time to the
        nearest of them; None where the file says nothing of it [Hz].
    age : float
        Time from the instant to the nearest reading of foF2 used, never
        negative, whether that one is earlier or later [s].
    time : datetime
        Time of that reading, UTC.
    caveats : tuple of str
        Letters with their meaning, interpolation, age, where hmF2 comes from.
    """

    fof2: float
    hmf2: float | None
    foe: float | None
    fof2_error: float | None
    age: float
    time: datetime
    caveats: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Readings:
    """Readings of an ionosonde, one a row; NaN where a row has no value.

    Parameters
    ----------
    file : str
        Name of the file.
    place : Place or None
        Where the ionosonde stands, if the file says so.
    time : ndarray, shape (n,)
        Time since the start of 1970 UTC, strictly increasing [s].
    fof2, foe, fxi : ndarray, shape (n,)
        Critical frequencies of F2 and E, and top frequency of spread F [Hz].
    hmf2 : ndarray, shape (n,)
        Height of the F2 peak, where the file gives it [m].
    m3000 : ndarray, shape (n,)
        M(3000)F2 [1].
    fof2_error : ndarray, shape (n,)
        Standard deviation of foF2; where the file gives none, that of the
        qualifying letter [Hz].
    notes : tuple of str
        Of each row, the letters with their meaning; empty without letters.
    ignored_columns : tuple of str
        Names of the columns that were not read.
    """

    file: str
    place: Place | None
    time: FloatArray
    fof2: FloatArray
    foe: FloatArray
    fxi: FloatArray
    hmf2: FloatArray
    m3000: FloatArray
    fof2_error: FloatArray
    notes: tuple[str, ...]
    ignored_columns: tuple[str, ...]

    @property
    def covered(self) -> tuple[tuple[datetime, datetime], ...]:
        """First and last instant of each stretch for which :meth:`at` has an answer."""
        times = self.time[np.isfinite(self.fof2)]
        breaks = np.flatnonzero(np.diff(times) > LONGEST_GAP)
        starts = times[np.concatenate([[0], breaks + 1])] - LONGEST_HOLD
        ends = times[np.concatenate([breaks, [times.size - 1]])] + LONGEST_HOLD
        return tuple((_instant(a), _instant(b)) for a, b in zip(starts, ends, strict=True))

    def at(self, when: datetime) -> Reading:
        """The readings at an instant.

        Linear in time between the two readings around the instant, if they
        are at most 2 h apart. Before the first reading, after the last, and
        beside a longer gap, the nearest one is taken as it stands for 30 min.
        hmF2 and foE are interpolated from the rows that have them, in the
        same way; where a reading is taken as it stands, they are those of its
        row. fxI is never taken for foF2: it is the top of spread F.

        The standard deviation of foF2 is that of the rows used, combined in
        quadrature with 0.15 MHz for each hour from the nearest one.

        Parameters
        ----------
        when : datetime
            An instant; without a zone, UTC.

        Returns
        -------
        Reading
            The values, with what there is to know about them.

        Raises
        ------
        InputError
            If no reading is near enough; the message gives the gap and what
            is covered.
        """
        instant = as_utc(when)
        t = _seconds(instant)
        used = _around(self.time, np.isfinite(self.fof2), t) or self._held(t)
        if used is None:
            raise self._not_covered(instant)
        from_m3000 = np.isnan(self.hmf2)
        heights = np.where(from_m3000, _usable_height(self.m3000), self.hmf2)
        of_height = self._beside(used, heights, t)
        of_e = self._beside(used, self.foe, t)
        fof2 = used.of(self.fof2)
        nearest = min(used.before, used.after, key=lambda i: abs(t - self.time[i]))
        age = float(abs(t - self.time[nearest]))

        parts = {"foF2": used, "hmF2": of_height, "foE": of_e}
        caveats = self._told_of(parts)
        if age > TOLD_AGE:
            caveats.append(
                f"The nearest reading of foF2 ({_stamp(self.time[nearest])}) is "
                f"{_minutes(age)} away."
            )
        if of_height and any(from_m3000[[of_height.before, of_height.after]]):
            caveats.append(
                "hmF2 comes from M(3000)F2 as 1490 / M - 176 km, which is too high by day, "
                "when the E region delays the wave."
            )
        foe = of_e.of(self.foe) if of_e else None
        if foe is not None and foe > fof2:
            foe = None
            caveats.append("foE between the readings would lie above foF2; it is left out.")
        return Reading(
            fof2=fof2,
            hmf2=of_height.of(heights) if of_height else None,
            foe=foe,
            fof2_error=self._error_of(used, age),
            age=age,
            time=_instant(self.time[nearest]),
            caveats=tuple(caveats),
        )

    def _held(self, t: float) -> _Rows | None:
        """The nearest row with a foF2, if it may be taken as it stands."""
        rows = np.flatnonzero(np.isfinite(self.fof2))
        away = np.abs(self.time[rows] - t)
        best = int(np.argmin(away))
        return _Rows(int(rows[best]), int(rows[best])) if away[best] <= LONGEST_HOLD else None

    def _beside(self, used: _Rows, values: FloatArray, t: float) -> _Rows | None:
        """Rows for another quantity than foF2."""
        if used.before == used.after and self.time[used.before] != t:
            return used if math.isfinite(values[used.before]) else None
        return _around(self.time, np.isfinite(values), t)

    def _error_of(self, used: _Rows, age: float) -> float | None:
        first, second = (float(self.fof2_error[i]) for i in (used.before, used.after))
        if math.isnan(first) and math.isnan(second):
            return None
        if math.isnan(first) or math.isnan(second):
            own = second if math.isnan(first) else first
        else:
            own = used.of(self.fof2_error)
        return math.hypot(own, DRIFT * age)

    def _told_of(self, parts: dict[str, _Rows | None]) -> list[str]:
        """Caveats of the letters in the rows used, and of the interpolation."""
        told = {i for rows in parts.values() if rows for i in (rows.before, rows.after)}
        if used := parts["foF2"]:
            told |= set(range(used.before, used.after))  # those between have no foF2; why
        by_note: dict[str, list[int]] = {}
        for i in sorted(told):
            if self.notes[i]:
                by_note.setdefault(self.notes[i], []).append(i)
        caveats = []
        for note, rows in by_note.items():
            first, last = _stamp(self.time[rows[0]]), _stamp(self.time[rows[-1]])
            head = f"Readings from {first} to {last}" if len(rows) > 1 else f"Reading of {first}"
            caveats.append(f"{head}: {note}.")
        by_rows: dict[_Rows, list[str]] = {}
        for quantity, between in parts.items():
            if between and between.before != between.after:
                by_rows.setdefault(between, []).append(quantity)
        for between, quantities in by_rows.items():
            first, last = (self.time[i] for i in (between.before, between.after))
            caveats.append(
                f"Interpolated over {_minutes(last - first)}, from the readings of "
                f"{_stamp(first)} and {_stamp(last)}: {', '.join(quantities)}."
            )
        return caveats

    def _not_covered(self, when: datetime) -> InputError:
        rows = np.flatnonzero(np.isfinite(self.fof2))
        k = int(np.searchsorted(self.time[rows], _seconds(when)))
        why: list[str] = []
        if k == 0:
            gap = f"the first is of {_stamp(self.time[rows[0]])}"
        elif k == rows.size:
            gap = f"the last is of {_stamp(self.time[rows[-1]])}"
        else:
            first, last = int(rows[k - 1]), int(rows[k])
            gap = f"there is none between {_stamp(self.time[first])} and {_stamp(self.time[last])}"
            why = [n for n in dict.fromkeys(self.notes[first + 1 : last]) if n]
        reasons = f" ({'; '.join(why[:2])})" if why else ""
        spans = sorted(self.covered, key=lambda s: min(abs(s[0] - when), abs(s[1] - when)))
        shown = ", ".join(f"{_stamp(a)} to {_stamp(b)}" for a, b in sorted(spans[:3]))
        more = f" and {len(spans) - 3} more stretches" if len(spans) > 3 else ""
        return InputError(
            f"{self.file}: no foF2 for {_stamp(when)}: {gap}{reasons}; covered: {shown}{more}"
        )


def _seconds(when: datetime) -> float:
    return (when - _EPOCH).total_seconds()


def _instant(seconds: float) -> datetime:
    return _EPOCH + timedelta(seconds=float(seconds))


def _stamp(time: datetime | float) -> str:
    """Time for messages; seconds only where there are any."""
    when = (time if isinstance(time, datetime) else _instant(time)).replace(tzinfo=None)
    whole = when.second == 0 and when.microsecond == 0
    return when.isoformat(timespec="minutes" if whole else "auto") + "Z"


def _minutes(seconds: float) -> str:
    return f"{seconds / 60.0:.3g} min"


def _around(time: FloatArray, have: BoolArray, t: float) -> _Rows | None:
    """The row at an instant or the two around it that have a value, if near enough."""
    rows = np.flatnonzero(have)
    k = int(np.searchsorted(time[rows], t))
    if k < rows.size and time[rows[k]] == t:
        return _Rows(int(rows[k]), int(rows[k]))
    if not 0 < k < rows.size:
        return None
    before, after = int(rows[k - 1]), int(rows[k])
    length = float(time[after] - time[before])
    if length > LONGEST_GAP:
        return None
    return _Rows(before, after, (t - float(time[before])) / length)


def _usable_height(m3000: ArrayLike) -> FloatArray:
    """hmF2 of M(3000)F2, NaN where it is out of the range of hmF2."""
    height = peak_height_of_m3000(m3000)
    return np.where((height >= _LOWEST) & (height <= _HIGHEST), height, np.nan)


def read_readings(path: str | Path) -> Readings:
    """Read an ionosonde's readings over the day.

    Parameters
    ----------
    path : str or Path
        CSV with the columns ``time_utc`` and ``fof2_mhz`` or
        ``fof2_tenths_mhz``; where present ``hmf2_km``, ``m3000f2``,
        ``foe_mhz``, ``fxi_mhz`` (the last two also in tenths) and
        ``fof2_error_mhz``; the place in a comment ``# place: LAT,LON``.
        Values may carry letters [URSI1972]_.

    Returns
    -------
    Readings
        All rows; at least one of them has a foF2.

    Raises
    ------
    InputError
        If the file is not such a table; the message names line and column.
    """
    table = read_table(path, (_TIME,), _HEADER)
    columns = _columns_of(table)
    place = _place_of(table)
    times: list[datetime] = []
    lines: list[int] = []
    values: dict[str, list[float]] = {quantity: [] for quantity in _QUANTITIES}
    errors: list[float] = []
    notes: list[str] = []
    for row in table.rows:
        if not any(cell.strip() for cell in row.cells.values()):
            continue  # a spreadsheet's empty line
        when = _time_of(row)
        if times and when <= times[-1]:
            fault = "is also that of" if when == times[-1] else "is not after that of"
            raise row.error(
                _TIME,
                f"{printable(row.cells[_TIME].strip())!r} {fault} line {lines[-1]}; "
                "accepted: times that increase from row to row",
            )
        times.append(when)
        lines.append(row.line)
        scaled = {q: _scaled(row, columns[q]) for q in _QUANTITIES if q in columns}
        told = []
        for quantity in _QUANTITIES:
            value, note = _value_of(quantity, columns, scaled)
            values[quantity].append(value)
            told += [note] if note else []
        fof2, foe = values["foF2"][-1], values["foE"][-1]
        if foe > fof2:
            raise row.error(
                columns["foE"],
                f"foE {foe / 1e6:.10g} MHz is above foF2 {fof2 / 1e6:.10g} MHz; "
                "accepted: foE up to foF2",
            )
        if math.isnan(fof2) and math.isfinite(values["fxI"][-1]):
            told.append("fxI, the top of spread F, is not taken for foF2")
        given = _given_error(row)
        of_letter = _ERROR_OF_LETTER.get(scaled["foF2"].qualifying, math.nan)
        errors.append(of_letter if math.isnan(given) else given)
        notes.append("; ".join(told))
    if all(math.isnan(v) for v in values["foF2"]):
        raise InputError(
            f"{table.file}: column {columns['foF2']} has no value in any row; "
            "accepted: at least one foF2"
        )
    return Readings(
        file=table.file,
        place=place,
        time=np.array([_seconds(t) for t in times]),
        fof2=np.array(values["foF2"]),
        foe=np.array(values["foE"]),
        fxi=np.array(values["fxI"]),
        hmf2=np.array(values["hmF2"]),
        m3000=np.array(values["M(3000)F2"]),
        fof2_error=np.array(errors),
        notes=tuple(notes),
        ignored_columns=tuple(
            printable(c) for c in table.columns if c and c not in {*_COLUMNS, _TIME, _ERROR}
        ),
    )


def _columns_of(table: Table) -> dict[str, str]:
    """Column of each quantity; MHz and tenths of it exclude each other."""
    found: dict[str, str] = {}
    for name, column in _COLUMNS.items():
        if name not in table.columns:
            continue
        if column.quantity in found:
            raise InputError(
                f"{table.file}, line {table.header_line}: columns {found[column.quantity]} and "
                f"{name} are both there; accepted: one of them"
            )
        found[column.quantity] = name
    if "foF2" not in found:
        raise InputError(
            f"{table.file}, line {table.header_line}: column fof2_mhz is missing; "
            f"accepted: {_HEADER}"
        )
    return found


def _place_of(table: Table) -> Place | None:
    """Place of the ionosonde, from a comment."""
    place, first = None, 0
    for line, comment in zip(table.comment_lines, table.comments, strict=True):
        match = _PLACE.fullmatch(comment)
        if match is None:
            continue
        if place is not None:
            raise InputError(
                f"{table.file}, line {line}: line {first} gives the place already; accepted: one"
            )
        # A spreadsheet fills the line with commas up to the last column.
        text = match.group(1).strip().rstrip(", \t")
        try:
            place, first = parse_place(text), line
        except InputError as error:
            what = str(error)
            if len(text) > 80:
                what = f"{printable(text)!r} is not a place; accepted: {PLACE_FORMS}"
            raise InputError(f"{table.file}, line {line}: {what}") from None
    return place


def _time_of(row: Row) -> datetime:
    text = row.cells[_TIME].strip()
    shown = f"{printable(text)!r}"
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        raise row.error(_TIME, f"{shown} is not a time; accepted: {_TIME_FORM}") from None
    if found.tzinfo is None:
        raise row.error(_TIME, f"{shown} has no zone; accepted: {_TIME_FORM}")
    if not FIRST_DATE <= found <= LAST_DATE:
        raise row.error(_TIME, f"{shown} is out of range; accepted: 1900-01-01 to 2030-01-01")
    return found.astimezone(UTC)


def _scaled(row: Row, name: str) -> ScaledValue:
    """A cell with its letters, checked; the number in the column's unit."""
    column, text = _COLUMNS[name], row.cells[name]
    found = parse_scaled(text, whole=column.whole)
    shown = f"{printable(text.strip())!r}"
    if found is None:
        number = "a whole number as 72" if column.whole else "a number"
        raise row.error(
            name,
            f"{shown} is not a value; accepted: {number}, with a qualifying and a descriptive "
            "letter if need be (UF), a descriptive letter alone (C), or an empty cell",
        )
    if not math.isnan(found.value) and not column.low <= found.value <= column.high:
        raise row.error(name, f"{shown} is out of range; {column.accepted}")
    return found


def _value_of(
    quantity: str, columns: dict[str, str], scaled: dict[str, ScaledValue]
) -> tuple[float, str]:
    """Value in SI units, and what its letters say."""
    if quantity not in columns:
        return math.nan, ""
    found, column = scaled[quantity], _COLUMNS[columns[quantity]]
    letters = f"{found.letters}: {found.meaning}"
    if math.isnan(found.value):
        return math.nan, f"no {quantity}, {letters}" if found.letters else ""
    value = round(found.value * column.in_si, 6)  # 2.01 MHz is 2010000 Hz
    note = f"{quantity} marked {letters}" if found.letters else ""
    if quantity in ("foF2", "foE") and found.descriptive == "X" and found.qualifying != "J":
        return math.nan, f"{note}, not taken for {quantity}"
    if quantity == "M(3000)F2" and np.isnan(_usable_height(value)):
        too_far = f"{quantity} {value:g} gives no height within 150 to 600 km"
        return value, f"{note}; {too_far}" if note else too_far
    return value, note


def _given_error(row: Row) -> float:
    """Standard deviation of foF2 as the file gives it [Hz]; NaN if it does not."""
    if not row.cells.get(_ERROR, "").strip():
        return math.nan
    value = row.number(_ERROR)
    if not 0.0 <= value <= 10.0:
        raise row.error(_ERROR, f"{value:g} is out of range; accepted: 0 to 10 MHz")
    return value * 1e6
