"""Answers for many rows: what shares a path and a UTC day shares the work.

A row is answered for the nearest step of its day (an hour by default). All
rows of one path and day make one job; a job is a pure function of plain values,
so that it can run in this process, in another one, or on another machine, with
the same result whatever else is asked beside it.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from typing import Final

import numpy as np

from magion.answers.certainty import path_mufs, state_of
from magion.answers.day import chances_at, gyro_at_peaks, rays_of
from magion.answers.inputs import IonosphereInput
from magion.answers.modes import hop_counts, require_length, stronger
from magion.answers.reception import AtAntenna, at_antenna
from magion.answers.scene import scene_of
from magion.geometry import Place
from magion.polarization import hand_of
from magion.rays.link import link_between
from magion.waves import MODES

_End = tuple[float, float]

STEP_MIN: Final = 60.0
"""Rows are answered for the nearest multiple of this [min]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Query:
    """One thing asked of a path on a day.

    Parameters
    ----------
    minute : float
        Minute of the UTC day [min].
    frequency : float
        Frequency [Hz].
    """

    minute: float
    frequency: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PathDay:
    """A path on one UTC day, with all that is asked of it.

    Parameters
    ----------
    transmitter, receiver : tuple of float
        Latitude and longitude of the ends [deg].
    date : tuple of int
        Year, month, day.
    queries : tuple of Query
        What is asked, each once.
    """

    transmitter: tuple[float, float]
    receiver: tuple[float, float]
    date: tuple[int, int, int]
    queries: tuple[Query, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """The answer to one query.

    Parameters
    ----------
    distance_km : float
        Length of the path on the ground [km].
    state : str
        Which waves arrive.
    probability : tuple of float or None
        Of "both", "ordinary_only", "extraordinary_only", "none"; None where the
        uncertainty of foF2 is not known [1].
    wave : str or None
        The stronger wave; within 3 dB, the ordinary.
    receive_hand, transmit_hand : str or None
        IEEE hands for it.
    level_db : tuple of float or None
        Levels of both waves to free space, the ordinary first; None for one
        that does not arrive [dB].
    muf_mhz : tuple of float or None
        MUFs of both waves [MHz].
    margin_mhz : float or None
        Of the wave to take; where none arrives, below the greater MUF [MHz].
    here : AtAntenna or None
        The waves at the receiver's antenna.
    """

    distance_km: float
    state: str
    probability: tuple[float, ...] | None
    wave: str | None
    receive_hand: str | None
    transmit_hand: str | None
    level_db: tuple[float | None, float | None]
    muf_mhz: tuple[float | None, float | None]
    margin_mhz: float | None
    here: AtAntenna | None


def nearest_step(when: datetime, step_min: float = STEP_MIN) -> tuple[tuple[int, int, int], float]:
    """The UTC day and minute that an instant is answered for.

    Parameters
    ----------
    when : datetime
        An instant in UTC.
    step_min : float
        Step; a divisor of the day [min].

    Returns
    -------
    date : tuple of int
        Year, month, day.
    minute : float
        Minute of that day [min].
    """
    midnight = when.replace(hour=0, minute=0, second=0, microsecond=0)
    steps = math.floor((when - midnight).total_seconds() / 60.0 / step_min + 0.5)
    moment = midnight + timedelta(minutes=steps * step_min)
    minute = (moment - moment.replace(hour=0, minute=0)).total_seconds() / 60.0
    return (moment.year, moment.month, moment.day), minute


def answer_path_day(job: PathDay, ionosphere: IonosphereInput) -> tuple[Found, ...]:
    """Answer all that is asked of a path on a day.

    Parameters
    ----------
    job : PathDay
        The path, the day and the queries.
    ionosphere : IonosphereInput
        What is known of the ionosphere.

    Returns
    -------
    tuple of Found
        One a query, in their order; each the same whatever is asked beside it.

    Raises
    ------
    InputError
        If the readings do not cover an instant, or the path is too long.
    OutsideModelError
        If the date is outside the field model.
    """
    transmitter = Place(latitude_deg=job.transmitter[0], longitude_deg=job.transmitter[1])
    receiver = Place(latitude_deg=job.receiver[0], longitude_deg=job.receiver[1])
    link = link_between(transmitter, receiver)
    require_length(link)
    midnight = datetime(*job.date, tzinfo=UTC)
    minutes = sorted({q.minute for q in job.queries})
    moments = [midnight + timedelta(minutes=m) for m in minutes]
    scene = scene_of(link, moments, ionosphere)
    mufs = path_mufs(scene, hop_counts(link.distance))
    gyro = gyro_at_peaks(scene, midnight)
    frequencies = sorted({q.frequency for q in job.queries})
    wanted = {(q.frequency, minutes.index(q.minute)) for q in job.queries}
    rays = rays_of(scene, frequencies, mufs, only=wanted)
    answers = []
    for query in job.queries:
        hour, f = minutes.index(query.minute), query.frequency
        leading = rays[frequencies.index(f)][hour]
        chances = chances_at(scene, f, leading, mufs, gyro, hour)
        both = mufs.any_layer[:, hour] / 1e6
        taken = stronger(leading) if leading else None
        hand = None
        if taken is not None:
            hand = hand_of(leading[taken].down.waves()[MODES.index(taken)])
            margin = max(float(both[MODES.index(taken)]) - f / 1e6, 0.0)
        else:
            margin = float(np.nanmax(both)) - f / 1e6 if np.isfinite(both).any() else math.nan
        levels = [leading[m].level_db if m in leading else None for m in MODES]
        known = [float(m) if math.isfinite(m) else None for m in both]
        answers.append(
            Found(
                distance_km=link.distance / 1e3,
                state=state_of(MODES[0] in leading, MODES[1] in leading),
                probability=None if np.isnan(chances[0]) else tuple(float(c) for c in chances),
                wave=None if taken is None else taken.value,
                receive_hand=None if hand is None else hand.value,
                transmit_hand=None if hand is None else hand.opposite.value,
                level_db=(levels[0], levels[1]),
                muf_mhz=(known[0], known[1]),
                margin_mhz=margin if math.isfinite(margin) else None,
                here=at_antenna(leading, receiver, f),
            )
        )
    return tuple(answers)


def jobs_of(
    rows: Sequence[tuple[Place, Place, datetime, float]], step_min: float = STEP_MIN
) -> tuple[list[PathDay], list[tuple[int, int]]]:
    """Group rows into jobs.

    Parameters
    ----------
    rows : sequence of (Place, Place, datetime, float)
        Transmitter, receiver, instant in UTC, frequency [Hz].
    step_min : float
        Rows are answered for the nearest multiple of this [min].

    Returns
    -------
    jobs : list of PathDay
        One for each path and day, in order of first appearance.
    where : list of (int, int)
        For each row the job, and the query within it.
    """
    found: dict[tuple[_End, _End, tuple[int, int, int]], tuple[int, dict[Query, int]]] = {}
    where = []
    for transmitter, receiver, when, frequency in rows:
        date, minute = nearest_step(when, step_min)
        start = (transmitter.latitude_deg, transmitter.longitude_deg)
        end = (receiver.latitude_deg, receiver.longitude_deg)
        index, queries = found.setdefault((start, end, date), (len(found), {}))
        query = Query(minute=minute, frequency=frequency)
        where.append((index, queries.setdefault(query, len(queries))))
    jobs = [
        PathDay(transmitter=key[0], receiver=key[1], date=key[2], queries=tuple(queries))
        for key, (_, queries) in found.items()
    ]
    return jobs, where
