"""Maximum usable frequency of each wave, by tracing rays.

At each trial frequency a fan of rays shows the least distance at which the
wave comes down (the skip distance) on every branch that reaches beyond the
receiver. The MUF is the frequency at which that distance is the path's. All
frequencies, waves and hours share one batch; the bracket is narrowed twice.
"""

from typing import Final

import numpy as np

from magion.arrays import FloatArray, IntArray
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.chain import Specs
from magion.rays.homing import Fan, Link, fans
from magion.waves import Mode

LONGEST_HOP: Final = 3900e3
"""Greatest length of one hop that is tried [m]."""

_RAYS = 18
_FIRST = 10
_NEXT = 6
_ROUNDS = 2
_SLACK = 0.5e3


def elevation_of_hop(length: float, height: float) -> float:
    """Elevation at which a mirror at a height makes a hop of some length.

    Parameters
    ----------
    length : float
        Length of the hop on the ground [m].
    height : float
        Height of the mirror [m].

    Returns
    -------
    float
        Elevation, negative beyond the horizon [rad].
    """
    half = 0.5 * length / EARTH_RADIUS
    ratio = EARTH_RADIUS / (EARTH_RADIUS + height)
    return float(np.arctan2(np.cos(half) - ratio, np.sin(half)))


def least_distances(fan: Fan) -> list[tuple[float, float]]:
    """Least and greatest distance of every branch of a fan ahead of the zenith.

    Parameters
    ----------
    fan : Fan
        Where rays come down.

    Returns
    -------
    list of (float, float)
        Least distance, by the parabola through the lowest point and its
        neighbours, and greatest distance, for each run of rays that one layer
        turns back [m].
    """
    ahead = np.flatnonzero(fan.landed & (fan.zenith_angle >= -1e-9))
    if ahead.size == 0:
        return []
    breaks = fan.breaks()
    cuts = [i + 1 for i, (a, b) in enumerate(zip(ahead, ahead[1:], strict=False))
            if b != a + 1 or breaks[a]]  # fmt: skip
    found = []
    for run in np.split(ahead, cuts):
        along = fan.along[run]
        i = int(np.argmin(along))
        least = float(along[i])
        if 0 < i < run.size - 1:
            psi = fan.zenith_angle[run[i - 1 : i + 2]]
            curve = np.polyfit(psi - psi[1], along[i - 1 : i + 2], 2)
            if curve[0] > 0.0:
                least = min(least, float(curve[2] - curve[1] ** 2 / (4.0 * curve[0])))
        found.append((least, float(along.max())))
    return found


def skip_distance(fan: Fan) -> float | None:
    """Least distance at which a wave comes down.

    Parameters
    ----------
    fan : Fan
        Its rays.

    Returns
    -------
    float or None
        Skip distance, 0 where the vertical ray is turned back; None where no
        ray is [m].
    """
    branches = least_distances(fan)
    if not branches:
        return None
    if fan.landed[np.argmin(np.abs(fan.zenith_angle))]:
        return 0.0
    return max(0.0, min(least for least, _ in branches))


def _margin(fan: Fan, distance: float) -> float:
    """How far inside its skip distance the receiver lies; -inf if out of reach [m]."""
    margins = [
        distance - least
        for least, greatest in least_distances(fan)
        if greatest >= distance - _SLACK
    ]
    return max(margins, default=-np.inf)


def _angles(link: Link, hops: int) -> FloatArray:
    length = link.distance / hops
    low = max(elevation_of_hop(length, 85e3) - np.radians(2.0), np.radians(0.4))
    high = min(elevation_of_hop(length, 550e3) + np.radians(4.0), np.pi / 2.0)
    low = min(low, high - np.radians(8.0))
    return np.linspace(np.pi / 2.0 - high, np.pi / 2.0 - low, _RAYS)


def maximum_usable_frequencies(
    link: Link,
    which: IntArray,
    mode: Mode,
    hops: int,
    guess: FloatArray,
    medium: Medium,
    field: MagneticField | None,
) -> FloatArray:
    """MUF of one wave and number of hops, for several ionospheres at once.

    Parameters
    ----------
    link : Link
        The path.
    which : ndarray of int, shape (n,)
        Indices of the ionospheres within the medium [1].
    mode : Mode
        The wave, the same on every hop.
    hops : int
        Number of hops [1].
    guess : ndarray, shape (n,)
        Rough values, within a factor of 1.6 [Hz].
    medium, field
        Electron density and geomagnetic field.

    Returns
    -------
    ndarray, shape (n,)
        MUF; NaN where no frequency of the range arrives [Hz].
    """
    angles = _angles(link, hops)
    share = np.geomspace(0.55, 1.65, _FIRST)
    trial = guess[:, None] * share
    low, high = np.full(guess.size, np.nan), np.full(guess.size, np.nan)
    low_margin, high_margin = np.full(guess.size, np.nan), np.full(guess.size, -np.inf)
    for _ in range(_ROUNDS + 1):
        margins = _margins(link, which, mode, hops, trial, angles, medium, field)
        for i in range(guess.size):
            if not np.isfinite(trial[i]).all():
                continue
            ladder = [(low[i], low_margin[i]), *zip(trial[i], margins[i], strict=True)]
            ladder.append((high[i], high_margin[i]))
            ladder = [(f, m) for f, m in ladder if np.isfinite(f)]
            inside = [k for k, (_, m) in enumerate(ladder) if m >= -_SLACK]
            if not inside:
                continue
            k = inside[-1]
            low[i], low_margin[i] = ladder[k]
            if k + 1 < len(ladder):
                high[i], high_margin[i] = ladder[k + 1]
        steps = np.arange(1, _NEXT + 1) / (_NEXT + 1)
        trial = low[:, None] + (high - low)[:, None] * steps
    # Within the last bracket the margin is close to linear, where both ends have one.
    share_of_bracket = np.where(
        np.isfinite(high_margin) & (low_margin > 0.0),
        low_margin / np.maximum(low_margin - high_margin, 1e-9),
        0.5,
    )
    share_of_bracket = np.where(low_margin <= _SLACK, 0.5, share_of_bracket)
    return np.asarray(np.where(np.isfinite(high), low + (high - low) * share_of_bracket, low))


def _margins(
    link: Link,
    which: IntArray,
    mode: Mode,
    hops: int,
    trial: FloatArray,
    angles: FloatArray,
    medium: Medium,
    field: MagneticField | None,
) -> FloatArray:
    count, tries = trial.shape
    frequency = trial.ravel()
    good = np.isfinite(frequency)
    out = np.full(frequency.size, -np.inf)
    if good.any():
        n = int(good.sum())
        specs = Specs(
            frequency=frequency[good],
            which=np.repeat(which, tries)[good],
            hops=np.full(n, hops, dtype=np.intp),
            extraordinary=np.full((hops, n), mode is Mode.EXTRAORDINARY),
        )
        found = fans(link, specs, medium, field, angles, refinements=0)
        out[good] = [_margin(fan, link.distance) for fan in found]
    return out.reshape(count, tries)
