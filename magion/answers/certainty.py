"""From the uncertainty of foF2 to the state, its probability and its times of change.

A wave arrives if the operating frequency is at or below its MUF. The MUF by
the F region follows foF2: the ordinary's in proportion, the extraordinary's
through fxF2 (fx² - fx f_H = fo²). So each wave has a least foF2 with which it
arrives, and a normal distribution of foF2 gives the probability of each state.
A wave that the E region carries does not hang on foF2.
"""

import math
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Final

import numpy as np

from magion.answers.scene import Scene
from magion.arrays import FloatArray, IntArray
from magion.rays.link import Link
from magion.rays.muf import Mufs, elevation_of_hop, maximum_usable_frequencies
from magion.waves import extraordinary_critical_frequency

STATES: Final = ("both", "ordinary_only", "extraordinary_only", "none")

_HIGH, _MEDIUM, _LOW = 0.9, 0.7, 0.5
_LONGEST_DOUBT = 180.0


@dataclass(frozen=True, slots=True, kw_only=True)
class StateProbabilities:
    """Probability of each state.

    Parameters
    ----------
    both, ordinary_only, extraordinary_only, none : float
        Probabilities, which add up to 1 [1].
    """

    both: float
    ordinary_only: float
    extraordinary_only: float
    none: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PathMufs:
    """MUFs of both waves, hour by hour; the ordinary first.

    Parameters
    ----------
    any_layer, f_region : ndarray, shape (2, hours)
        Over the best number of hops [Hz].
    """

    any_layer: FloatArray
    f_region: FloatArray


def path_mufs(
    scene: Scene, hops: tuple[int, ...], *, wide: bool = False, hours: IntArray | None = None
) -> PathMufs:
    """MUFs of both waves of a path at every hour of a scene.

    Parameters
    ----------
    scene : Scene
        The path.
    hops : tuple of int
        Numbers of hops; the first with which anything arrives counts [1].
    wide : bool
        As for :func:`magion.rays.muf.maximum_usable_frequencies` [1].
    hours : ndarray of int, optional
        Some hours of the scene only.

    Returns
    -------
    PathMufs
        NaN where nothing arrives.
    """
    chosen = np.arange(len(scene.overheads)) if hours is None else hours
    overheads = [scene.overheads[i] for i in chosen]
    which = np.tile(chosen, 2)
    extraordinary = np.repeat([False, True], chosen.size)
    best = [np.full(2 * chosen.size, np.nan), np.full(2 * chosen.size, np.nan)]
    for count in hops:
        guess = np.array([_guess(scene.link, o.fof2, o.foe, count) for o in overheads])
        found: Mufs = maximum_usable_frequencies(
            scene.link,
            which,
            extraordinary,
            count,
            np.tile(guess, 2),
            scene.medium,
            scene.field,
            wide=wide,
        )
        best = [np.fmax(b, f) for b, f in zip(best, (found.any_layer, found.f_region), strict=True)]
        if np.isfinite(best[0]).all():
            break
    return PathMufs(any_layer=best[0].reshape(2, -1), f_region=best[1].reshape(2, -1))


def _guess(link: Link, fof2: float, foe: float | None, hops: int) -> float:
    """Rough MUF by the secant law, for a mirror at 300 km and at 110 km."""
    guesses = []
    for critical, height in ((fof2, 300e3), (foe or 0.0, 110e3)):
        elevation = elevation_of_hop(link.distance / hops, height)
        cosine = math.cos(max(elevation, 0.0)) / (1.0 + height / 6371e3)
        guesses.append(critical / math.sqrt(max(1.0 - cosine * cosine, 0.04)))
    return max(guesses)


def least_fof2(frequency: float, muf: float, fof2: float, gyro: float, ordinary: bool) -> float:
    """Least foF2 with which a wave still arrives by the F region.

    Parameters
    ----------
    frequency : float
        Operating frequency [Hz].
    muf : float
        The wave's MUF by the F region at the present foF2 [Hz].
    fof2 : float
        The present foF2 [Hz].
    gyro : float
        Gyrofrequency at the peak of F2 [Hz].
    ordinary : bool
        Which wave [1].

    Returns
    -------
    float
        The foF2 at which the MUF would be the operating frequency [Hz].
    """
    if ordinary:
        return fof2 * frequency / muf
    fx = float(extraordinary_critical_frequency(fof2, gyro)) * frequency / muf
    return math.sqrt(max(fx * (fx - gyro), 0.0))


def _above(level: float, mean: float, deviation: float) -> float:
    """Probability that foF2, normal but never negative, lies above a level."""
    if level <= 0.0:
        return 1.0
    if not math.isfinite(level):
        return 0.0
    if deviation <= 0.0:
        return float(mean >= level)
    return 0.5 * math.erfc((level - mean) / (deviation * math.sqrt(2.0)))


def probabilities(levels: tuple[float, float], fof2: float, deviation: float) -> StateProbabilities:
    """Probability of each state.

    Parameters
    ----------
    levels : tuple of float
        Least foF2 of the ordinary and of the extraordinary wave; 0 for a wave
        that is there anyway, infinity for one that cannot be [Hz].
    fof2, deviation : float
        Mean and standard deviation of foF2 [Hz].

    Returns
    -------
    StateProbabilities
        They add up to 1.
    """
    ordinary, extraordinary = (_above(level, fof2, deviation) for level in levels)
    both = min(ordinary, extraordinary)  # both hang on the same foF2
    return StateProbabilities(
        both=both,
        ordinary_only=ordinary - both,
        extraordinary_only=extraordinary - both,
        none=1.0 - max(ordinary, extraordinary),
    )


def confidence_of(found: StateProbabilities, state: str) -> str:
    """How sure the state is, in a word.

    Parameters
    ----------
    found : StateProbabilities
        Probabilities.
    state : str
        The central state.

    Returns
    -------
    str
        "high" from 0.9, "medium" from 0.7, "low" from 0.5, else "cannot_tell".
    """
    share = float(getattr(found, state))
    if share >= _HIGH:
        return "high"
    if share >= _MEDIUM:
        return "medium"
    return "low" if share >= _LOW else "cannot_tell"


def state_of(ordinary: bool, extraordinary: bool) -> str:
    """Name of a state.

    Parameters
    ----------
    ordinary, extraordinary : bool
        Whether each wave arrives [1].

    Returns
    -------
    str
        One of "both", "ordinary_only", "extraordinary_only", "none".
    """
    if ordinary:
        return "both" if extraordinary else "ordinary_only"
    return "extraordinary_only" if extraordinary else "none"


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """A time at which one wave comes or goes.

    Parameters
    ----------
    time_utc : str
        When, ISO 8601.
    plus_minus_min : float or None
        One standard deviation; None where foF2 changes too slowly to say [min].
    wave : str
        Which wave.
    comes : bool
        True if it comes, False if it goes.
    state : str
        State after it.
    """

    time_utc: str
    plus_minus_min: float | None
    wave: str
    comes: bool
    state: str


def changes(
    moments: list[datetime],
    mufs: PathMufs,
    frequency: float,
    relative_deviation: FloatArray,
    gyro_limit: float = 0.0,
) -> tuple[Change, ...]:
    """Times at which a wave comes or goes, from its MUF through the day.

    Parameters
    ----------
    moments : list of datetime
        The instants of the MUFs, in order.
    mufs : PathMufs
        MUFs of both waves at them.
    frequency : float
        Operating frequency [Hz].
    relative_deviation : ndarray, shape (hours,)
        Standard deviation of foF2 over foF2 [1].
    gyro_limit : float
        Frequency up to which the extraordinary wave is not turned back [Hz].

    Returns
    -------
    tuple of Change
        In order of time. The plus-minus is the deviation of the MUF over its
        slope in time; it is left out where E decides, or foF2 hardly moves.
    """
    start = moments[0]
    hours = np.array([(m - start).total_seconds() / 3600.0 for m in moments])
    values = np.where(np.isfinite(mufs.any_layer), mufs.any_layer, 0.0)
    if frequency <= gyro_limit:
        values[1] = 0.0
    by_f = np.isclose(mufs.any_layer, mufs.f_region, rtol=2e-3)
    events: list[tuple[float, int, bool, float | None]] = []
    for wave in range(2):
        gap = values[wave] - frequency
        for i in np.flatnonzero((gap[1:] >= 0.0) != (gap[:-1] >= 0.0)):
            share = gap[i] / (gap[i] - gap[i + 1])
            step = hours[i + 1] - hours[i]
            slope = abs(gap[i + 1] - gap[i]) / step
            deviation = (1.0 - share) * relative_deviation[i] + share * relative_deviation[i + 1]
            if wave == 1:
                # fx² − fx f_H = fo²: dfx / fx = 2 (1 − y) / (2 − y) dfo / fo, y = f_H / fx
                y = min(gyro_limit / frequency, 1.0)
                deviation *= 2.0 * (1.0 - y) / (2.0 - y)
            spread = float(deviation * frequency / slope) * 60.0
            told = spread <= _LONGEST_DOUBT and bool(by_f[wave, i] and by_f[wave, i + 1])
            events.append(
                (
                    float(hours[i] + share * step),
                    wave,
                    bool(gap[i + 1] >= 0.0),
                    spread if told else None,
                )
            )
    present = [bool(values[0, 0] >= frequency), bool(values[1, 0] >= frequency)]
    found = []
    for hour, wave, comes, doubt in sorted(events):
        present[wave] = comes
        moment = start + timedelta(hours=hour)
        found.append(
            Change(
                time_utc=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
                plus_minus_min=doubt,
                wave=("ordinary", "extraordinary")[wave],
                comes=comes,
                state=state_of(*present),
            )
        )
    return tuple(found)
