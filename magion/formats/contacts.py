"""Logs of contacts or lists of paths, read row by row: CSV and ADIF.

ADIF is the open Amateur Data Interchange Format [ADIF3]_: fields
``<NAME:LENGTH>value``, records ended by ``<EOR>``, an optional header ended by
``<EOH>``. Files may be of any length: only one record is held at a time.
"""

import csv
import re
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from functools import lru_cache
from pathlib import Path
from typing import Final, TextIO

from magion.errors import InputError
from magion.field import FIRST_DATE, LAST_DATE
from magion.formats.tables import printable, printable_name
from magion.geometry import Place, parse_place

CSV_COLUMNS: Final = ("time_utc", "from", "to", "frequency_mhz")
LONGEST_RECORD: Final = 100_000
"""Signs of one record beyond which a file is no log [text]."""

FREQUENCY_MHZ: Final = 0.5, 60.0

_BANDS_MHZ: Final = {
    "2190m": (0.1357, 0.1378),
    "630m": (0.472, 0.479),
    "560m": (0.501, 0.504),
    "160m": (1.8, 2.0),
    "80m": (3.5, 4.0),
    "60m": (5.06, 5.45),
    "40m": (7.0, 7.3),
    "30m": (10.1, 10.15),
    "20m": (14.0, 14.35),
    "17m": (18.068, 18.168),
    "15m": (21.0, 21.45),
    "12m": (24.89, 24.99),
    "10m": (28.0, 29.7),
    "8m": (40.0, 45.0),
    "6m": (50.0, 54.0),
}
_FIELD = re.compile(r"<\s*([A-Za-z0-9_]+)\s*(?::\s*(\d+)\s*(?::[^>]*)?)?>")
_ANGLE = re.compile(r"([NSEWnsew])(\d{1,3}) (\d{1,2}(?:\.\d+)?)")


# The same few places come again and again in a log.
_known_place = lru_cache(maxsize=20_000)(parse_place)


@dataclass(frozen=True, slots=True, kw_only=True)
class Contact:
    """One row that can be answered.

    Parameters
    ----------
    line : int
        Line of the file at which it begins, counted from 1.
    time : datetime
        Instant, UTC.
    transmitter, receiver : Place
        The ends; of a log, the partner and the operator.
    frequency_mhz : float
        Frequency [MHz].
    note : str
        What was assumed, such as the middle of a band; else empty.
    """

    line: int
    time: datetime
    transmitter: Place
    receiver: Place
    frequency_mhz: float
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class BadRow:
    """One row that cannot be answered.

    Parameters
    ----------
    line : int
        Line of the file at which it begins, counted from 1.
    reason : str
        What was wrong and what is accepted.
    """

    line: int
    reason: str


def read_contacts(path: str | Path, here: Place | None = None) -> Iterator[Contact | BadRow]:
    """Read a log or a list of paths, row by row.

    Parameters
    ----------
    path : str or Path
        CSV with ``time_utc``, ``from``, ``to``, ``frequency_mhz``, or ADIF (a
        name that ends in .adi or .adif).
    here : Place, optional
        The operator's place, for records of an ADIF log that do not say it.

    Yields
    ------
    Contact or BadRow
        In the order of the file.

    Raises
    ------
    InputError
        If the file cannot be read, or is no such file.
    """
    file = Path(path)
    name = printable_name(path)
    if not file.exists():
        raise InputError(f"file {name} does not exist")
    if not file.is_file():
        raise InputError(f"{name} is not a regular file; accepted: a CSV or ADIF file")
    adif = file.suffix.lower() in (".adi", ".adif")
    try:
        with file.open(encoding="utf-8-sig", errors="replace", newline="") as text:
            yield from _adif(text, name, here) if adif else _csv(text, name)
    except OSError as error:
        raise InputError(f"file {name}: {error.strerror or 'cannot be read'}") from None


def _csv(text: TextIO, name: str) -> Iterator[Contact | BadRow]:
    columns: dict[str, int] | None = None
    for number, line in enumerate(text, 1):
        stripped = line.strip()
        if not stripped or stripped.startswith("#"):
            continue
        if len(line) > LONGEST_RECORD:
            yield BadRow(line=number, reason="the line is too long to be a row")
            continue
        try:
            cells = [c.strip() for c in next(csv.reader([stripped], strict=True))]
        except (csv.Error, StopIteration):
            if columns is None:
                raise InputError(f"{name}, line {number}: the header is not CSV") from None
            yield BadRow(line=number, reason="the line is not CSV")
            continue
        if columns is None:
            columns = {c: i for i, c in enumerate(cells)}
            missing = [c for c in CSV_COLUMNS if c not in columns]
            if missing:
                raise InputError(
                    f"{name}, line {number}: column {missing[0]} is missing; accepted: "
                    + ",".join(CSV_COLUMNS)
                )
            continue
        try:
            if len(cells) < len(columns):
                raise InputError(f"{len(cells)} cells where the header has {len(columns)}")
            time, start, end, mhz = (cells[columns[c]] for c in CSV_COLUMNS)
            contact = Contact(
                line=number,
                time=_time(time),
                transmitter=_known_place(start),
                receiver=_known_place(end),
                frequency_mhz=_frequency(mhz),
            )
        except InputError as error:
            yield BadRow(line=number, reason=str(error))
            continue
        yield contact
    if columns is None:
        raise InputError(f"file {name} is empty; accepted: CSV with {','.join(CSV_COLUMNS)}")


def _time(text: str) -> datetime:
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        raise InputError(
            f"time_utc {printable(text)!r} is not a time; accepted: 2026-06-21T12:00Z"
        ) from None
    return _in_model(found)


def _in_model(found: datetime) -> datetime:
    try:
        moment = found.replace(tzinfo=UTC) if found.tzinfo is None else found.astimezone(UTC)
    except (ValueError, OverflowError):
        raise InputError("the time is out of range; accepted: 1900 to 2029") from None
    if not FIRST_DATE <= moment < LAST_DATE:
        raise InputError(
            f"the year {moment.year} is outside the field model; accepted: 1900 to 2029"
        )
    return moment


def _frequency(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not FREQUENCY_MHZ[0] <= value <= FREQUENCY_MHZ[1]:
        raise InputError(
            f"frequency {printable(text)!r} is none of 0.5 to 60 MHz, what is accepted"
        )
    return value


def _records(text: TextIO) -> Iterator[tuple[int, dict[str, str] | None]]:
    """Line and fields of every ADIF record; None for fields where one is broken."""
    buffer, line, started = "", 1, 1
    fields: dict[str, str] = {}
    broken = False
    header = True
    more = True
    while True:
        found = _FIELD.search(buffer)
        need = 0 if found is None else found.end() + int(found.group(2) or 0)
        if found is None or need > len(buffer):
            if len(buffer) > LONGEST_RECORD:
                # No tag, or a value, of such a length: this record is broken.
                broken = True
                cut = buffer.rfind("<", 1)
                cut = len(buffer) if cut < 1 or found is None else found.end()
                line += buffer.count("\n", 0, cut)
                buffer = buffer[cut:]
                continue
            chunk = text.read(65536) if more else ""
            if not chunk:
                more = False
                if found is not None:
                    broken, buffer = True, buffer[found.end() :]
                    continue
                if fields or broken:
                    yield started, None
                return
            buffer += chunk
            continue
        line += buffer.count("\n", 0, found.start())
        tag = found.group(1).upper()
        if not fields and not broken:
            started = line
        if tag == "EOH" and header:
            fields, broken, header = {}, False, False
        elif tag == "EOR":
            header = False
            yield started, None if broken else fields
            fields, broken = {}, False
        elif found.group(2) is not None:
            fields[tag] = buffer[found.end() : need].strip()
        line += buffer.count("\n", found.start(), need)
        buffer = buffer[need:]


def _adif(text: TextIO, name: str, here: Place | None) -> Iterator[Contact | BadRow]:
    some = False
    for line, fields in _records(text):
        some = True
        if fields is None:
            yield BadRow(line=line, reason="the record is broken: a field is longer than the file")
            continue
        try:
            contact = _contact(line, fields, here)
        except InputError as error:
            yield BadRow(line=line, reason=str(error))
            continue
        yield contact
    if not some:
        raise InputError(f"file {name} holds no ADIF record; accepted: fields <NAME:LENGTH>, <EOR>")


def _contact(line: int, fields: dict[str, str], here: Place | None) -> Contact:
    mhz, note = fields.get("FREQ", ""), ""
    if mhz:
        frequency = _frequency(mhz)
    else:
        band = fields.get("BAND", "").lower()
        if band not in _BANDS_MHZ:
            raise InputError(
                f"FREQ is missing and BAND {printable(band)!r} is not known; accepted: FREQ, or "
                "a BAND such as 40m"
            )
        low, high = _BANDS_MHZ[band]
        frequency = _frequency(str(0.5 * (low + high)))
        note = f"middle of {band} taken"
    own = _place(fields, "MY_GRIDSQUARE", "MY_LAT", "MY_LON") or here
    partner = _place(fields, "GRIDSQUARE", "LAT", "LON")
    for place, wanted in ((own, "MY_GRIDSQUARE"), (partner, "GRIDSQUARE")):
        if place is None:
            raise InputError(f"{wanted} is missing; accepted: a locator, or latitude and longitude")
    if own is None or partner is None:
        raise InputError("a place is missing")
    return Contact(
        line=line,
        time=_moment(fields.get("QSO_DATE", ""), fields.get("TIME_ON", "")),
        transmitter=partner,
        receiver=own,
        frequency_mhz=frequency,
        note=note,
    )


def _moment(date: str, time: str) -> datetime:
    form = {4: "%H%M", 6: "%H%M%S"}.get(len(time))
    try:
        if form is None:
            raise ValueError(time)
        return _in_model(datetime.strptime(date + time, "%Y%m%d" + form))
    except ValueError as error:
        if isinstance(error, InputError):
            raise
        raise InputError(
            f"QSO_DATE {printable(date)!r} TIME_ON {printable(time)!r} is no time; accepted: "
            "YYYYMMDD and HHMM or HHMMSS"
        ) from None


def _place(fields: dict[str, str], grid: str, latitude: str, longitude: str) -> Place | None:
    if fields.get(latitude) and fields.get(longitude):
        values = [_angle(fields[latitude], "NS", 90.0), _angle(fields[longitude], "EW", 180.0)]
        return Place(latitude_deg=values[0], longitude_deg=values[1])
    if fields.get(grid):
        return _known_place(fields[grid])
    return None


def _angle(text: str, signs: str, most: float) -> float:
    found = _ANGLE.fullmatch(text)
    if found is None or found.group(1).upper() not in signs:
        raise InputError(f"{printable(text)!r} is no angle; accepted: as {signs[0]}046 30.000")
    value = float(found.group(2)) + float(found.group(3)) / 60.0
    if float(found.group(3)) >= 60.0 or value > most:
        raise InputError(f"{printable(text)!r} is beyond {most:g} degrees or 60 minutes")
    return value if found.group(1).upper() == signs[0] else -value
