"""The answer for every row of a log or a list of paths, by the million.

Rows are taken in portions of fixed size, grouped by path and UTC day, mapped
over an engine, and given back in their order. What was answered in one portion
is remembered for the next ones, up to a bound, so memory does not grow with
the length of the file.
"""

from collections import OrderedDict
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import islice
from typing import Final

from magion.answers.bulk import STEP_MIN, Found, PathDay, Query, answer_path_day, nearest_step
from magion.answers.inputs import IonosphereInput
from magion.errors import InputError, MagionError
from magion.formats.contacts import BadRow, Contact
from magion.geometry import Place

PORTION: Final = 4000
"""Rows that are grouped together [1]."""

REMEMBERED: Final = 100_000
"""Answers that are kept for later portions [1]."""

_End = tuple[float, float]
_Path = tuple[_End, _End, tuple[int, int, int]]
_Key = tuple[_Path, Query]
JobResult = tuple[Found, ...] | str
Engine = Callable[[Sequence[PathDay], IonosphereInput], Iterable[JobResult]]


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepRow:
    """One row and its answer.

    Parameters
    ----------
    contact : Contact
        The row.
    answered_for_utc : str
        Instant that it is answered for, ISO 8601.
    found : Found
        The answer.
    """

    contact: Contact
    answered_for_utc: str
    found: Found


def run_job(job: PathDay, ionosphere: IonosphereInput) -> JobResult:
    """Answer one path and day: the pure function that engines map.

    Parameters
    ----------
    job : PathDay
        The path, the day and the queries.
    ionosphere : IonosphereInput
        What is known of the ionosphere.

    Returns
    -------
    tuple of Found, or str
        One a query; or why the path cannot be answered.
    """
    try:
        # What stands at the antenna is not needed, and heavy to carry between processes.
        return tuple(replace(f, here=None) for f in answer_path_day(job, ionosphere))
    except MagionError as error:
        return str(error)


def in_this_process(jobs: Sequence[PathDay], ionosphere: IonosphereInput) -> Iterator[JobResult]:
    """The plainest engine: one job after the other.

    Parameters
    ----------
    jobs : sequence of PathDay
        The jobs.
    ionosphere : IonosphereInput
        What is known of the ionosphere.

    Yields
    ------
    tuple of Found, or str
        Results in the order of the jobs.
    """
    for job in jobs:
        yield run_job(job, ionosphere)


def sweep(
    rows: Iterable[Contact | BadRow],
    ionosphere: IonosphereInput | None = None,
    *,
    engine: Engine = in_this_process,
    step_min: float = STEP_MIN,
    portion: int = PORTION,
) -> Iterator[SweepRow | BadRow]:
    """Answer every row, in order.

    Parameters
    ----------
    rows : iterable of Contact or BadRow
        The rows; bad ones are passed on.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere; values of one instant are refused.
    engine : callable
        Maps jobs; see :mod:`magion.answers.engines`.
    step_min : float
        Rows are answered for the nearest multiple of this [min].
    portion : int
        Rows that are grouped together [1].

    Yields
    ------
    SweepRow or BadRow
        One a row.

    Raises
    ------
    InputError
        If the ionosphere is known for one instant only.
    """
    given = ionosphere or IonosphereInput()
    for name, value in (
        ("foF2", given.fof2_mhz),
        ("hmF2", given.hmf2_km),
        ("foE", given.foe_mhz),
        ("a measured profile", given.profile),
    ):
        if value is not None:
            raise InputError(
                f"{name} is of one instant, the rows are of many; accepted: flux, sunspots, "
                "readings"
            )
    if 1440.0 % step_min:
        raise InputError(f"the step of {step_min:g} minutes does not divide a day")
    memory: OrderedDict[_Key, Found | str] = OrderedDict()
    stream = iter(rows)
    while taken := list(islice(stream, portion)):
        yield from _portion(taken, given, engine, step_min, memory)


def _portion(
    rows: list[Contact | BadRow],
    given: IonosphereInput,
    engine: Engine,
    step_min: float,
    memory: OrderedDict[_Key, Found | str],
) -> Iterator[SweepRow | BadRow]:
    keys: list[_Key | None] = []
    wanted: dict[_Path, dict[Query, None]] = {}
    for row in rows:
        if isinstance(row, BadRow):
            keys.append(None)
            continue
        date, minute = nearest_step(row.time, step_min)
        query = Query(minute=minute, frequency=row.frequency_mhz * 1e6)
        path = (_ends(row.transmitter), _ends(row.receiver), date)
        key = (path, query)
        keys.append(key)
        if key in memory:
            memory.move_to_end(key)
        else:
            wanted.setdefault(path, {})[query] = None
    jobs = [
        PathDay(transmitter=path[0], receiver=path[1], date=path[2], queries=tuple(queries))
        for path, queries in wanted.items()
    ]
    for job, result in zip(jobs, engine(jobs, given), strict=True):
        for i, query in enumerate(job.queries):
            path = (job.transmitter, job.receiver, job.date)
            memory[path, query] = result if isinstance(result, str) else result[i]
    for row, asked in zip(rows, keys, strict=True):
        if isinstance(row, Contact) and asked is not None:
            yield _answered(row, asked, memory[asked])
        elif isinstance(row, BadRow):
            yield row
    while len(memory) > REMEMBERED:
        memory.popitem(last=False)


def _ends(place: Place) -> _End:
    return (place.latitude_deg, place.longitude_deg)


def _answered(row: Contact, key: _Key, found: Found | str) -> SweepRow | BadRow:
    if isinstance(found, str):
        return BadRow(line=row.line, reason=found)
    (_, _, (year, month, day)), query = key
    minute = round(query.minute)
    return SweepRow(
        contact=row,
        answered_for_utc=f"{year:04d}-{month:02d}-{day:02d}T{minute // 60:02d}:{minute % 60:02d}Z",
        found=found,
    )
