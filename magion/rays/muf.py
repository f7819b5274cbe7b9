"""Maximum usable frequency of each wave, by tracing rays.

At each trial frequency a fan of rays shows the least distance at which the
wave comes down (the skip distance) on every branch that reaches beyond the
receiver. The MUF is the frequency at which that distance is the path's. All
frequencies, waves and hours share one batch; the bracket is narrowed twice.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.chain import Specs
from magion.rays.fans import Fan, default_zenith_angles, fans, vertex_of
from magion.rays.link import Link

LONGEST_HOP: Final = 3900e3
"""Greatest length of one hop that is tried [m]."""

F_REGION: Final = 130e3
"""Height above which a ray counts as turned back by the F region [m]."""

_RAYS = 18
_FIRST = (0.7, 0.85, 0.97, 1.08, 1.22, 1.45)
_ROUNDS, _ROUNDS_NEAR = 3, 4
_MOST_SHIFTS = 3
_SLACK = 0.5e3
_TOLERANCE = 30.0


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


@dataclass(frozen=True, slots=True, kw_only=True)
class Branch:
    """A run of rays of a fan that one layer turns back.

    Parameters
    ----------
    least, greatest : float
        Least and greatest distance at which they come down, ahead positive [m].
    apogee : float
        Height at which the ray of the least distance turns [m].
    """

    least: float
    greatest: float
    apogee: float


def branches(fan: Fan) -> list[Branch]:
    """The branches of a fan.

    Parameters
    ----------
    fan : Fan
        Where rays come down.

    Returns
    -------
    list of Branch
        One for each run of neighbours without a break; the least distance by
        the parabola through the lowest point and its neighbours.
    """
    landed = np.flatnonzero(fan.landed)
    if landed.size == 0:
        return []
    breaks = fan.breaks()
    cuts = np.flatnonzero((np.diff(landed) != 1) | breaks[landed[:-1]]) + 1
    found = []
    for run in np.split(landed, cuts):
        along = fan.along[run]
        i = int(np.argmin(along))
        least = float(along[i])
        if 0 < i < run.size - 1:
            vertex = vertex_of(fan.zenith_angle[run[i - 1 : i + 2]], along[i - 1 : i + 2])
            least = least if vertex is None else min(least, vertex[1])
        found.append(
            Branch(least=least, greatest=float(along.max()), apogee=float(fan.apogee[run[i]]))
        )
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
        Skip distance, 0 where a ray comes back to the transmitter; None where
        no ray comes down [m].
    """
    ahead = [b for b in branches(fan) if b.greatest > 0.0]
    return max(0.0, min(b.least for b in ahead)) if ahead else None


def _margins_of(fan: Fan, distance: float) -> tuple[float, float]:
    """How far inside the skip distance of any layer, and of F, the receiver lies.

    -inf if it is out of reach [m].
    """
    inside = [
        (distance - b.least, b.apogee) for b in branches(fan) if b.greatest >= distance - _SLACK
    ]
    return (
        max((m for m, _ in inside), default=-np.inf),
        max((m for m, apogee in inside if apogee > F_REGION), default=-np.inf),
    )


def angles_of_hop(link: Link, hops: int) -> FloatArray:
    """Launch angles that a nearly level ionosphere needs to reach the receiver.

    Parameters
    ----------
    link : Link
        The path.
    hops : int
        Number of hops [1].

    Returns
    -------
    ndarray
        Zenith angles, rising [rad].
    """
    length = link.distance / hops
    low = max(elevation_of_hop(length, 85e3) - np.radians(2.0), np.radians(0.4))
    high = elevation_of_hop(length, 550e3) + np.radians(4.0)
    if length < 250e3:
        high = np.pi / 2.0 + np.radians(14.0)  # a tilt may send the ray off backward
    low = min(low, high - np.radians(10.0))
    if length < 250e3:
        low = min(low, np.pi / 2.0 - np.radians(14.0))
    return np.linspace(np.pi / 2.0 - high, np.pi / 2.0 - low, _RAYS)


@dataclass(frozen=True, slots=True, kw_only=True)
class Mufs:
    """Maximum usable frequencies.

    Parameters
    ----------
    any_layer : ndarray, shape (n,)
        By whatever layer; NaN where no frequency of the range arrives [Hz].
    f_region : ndarray, shape (n,)
        By the F region alone [Hz].
    """

    any_layer: FloatArray
    f_region: FloatArray


def maximum_usable_frequencies(
    link: Link,
    which: IntArray,
    extraordinary: BoolArray,
    hops: int,
    guess: FloatArray,
    medium: Medium,
    field: MagneticField | None,
    *,
    wide: bool = False,
) -> Mufs:
    """MUF of waves over a number of hops, for several ionospheres at once.

    Parameters
    ----------
    link : Link
        The path.
    which : ndarray of int, shape (n,)
        Indices of the ionospheres within the medium [1].
    extraordinary : ndarray of bool, shape (n,)
        Which wave, the same on every hop [1].
    hops : int
        Number of hops [1].
    guess : ndarray, shape (n,)
        Rough values, within a factor of 1.6 [Hz].
    medium, field
        Electron density and geomagnetic field.
    wide : bool
        Whether to look at every elevation and not only at those of a level
        ionosphere; for strong tilts [1].

    Returns
    -------
    Mufs
        Of every ionosphere and wave.
    """
    angles = default_zenith_angles(2.0) if wide else angles_of_hop(link, hops)
    count = guess.size

    def margins(trial: FloatArray, refinements: int) -> FloatArray:
        """Margins of trial frequencies (n, k): shape (2, n, k), any layer and F."""
        out = np.full((2, *trial.shape), -np.inf)
        good = np.isfinite(trial)
        total = int(good.sum())
        if total:
            owner = np.repeat(np.arange(count), trial.shape[1])[good.ravel()]
            specs = Specs(
                frequency=trial[good],
                which=which[owner],
                hops=np.full(total, hops, dtype=np.intp),
                extraordinary=np.repeat(extraordinary[owner][None], hops, axis=0),
            )
            found = fans(
                link, specs, medium, field, angles, refinements=refinements, tolerance=_TOLERANCE
            )
            out[:, good] = np.array([_margins_of(fan, link.distance) for fan in found]).T
        return out

    brackets = [_Bracket(count), _Bracket(count)]
    near = link.distance < 300e3 * hops
    # On the steepest paths the critical frequency decides, not a skip distance.
    refinements = 0 if link.distance < 100e3 * hops else 1
    trial = guess[:, None] * np.array(_FIRST)
    bottom, top = trial[:, 0], trial[:, -1]
    span = _FIRST[-1] / _FIRST[0]
    for _ in range(_MOST_SHIFTS):
        both = margins(trial, refinements)
        for bracket, values in zip(brackets, both, strict=True):
            bracket.narrow(trial, values)
        # The guess was too high where nothing arrived (by F, at least), too low
        # where everything did.
        lower = np.isnan(brackets[0].low) | np.isnan(brackets[1].low)
        higher = ~lower & np.isnan(brackets[0].high)
        if not (lower.any() or higher.any()):
            break
        trial = np.full_like(trial, np.nan)
        trial[lower] = (bottom[lower] / span)[:, None] * np.array(_FIRST) / _FIRST[0]
        trial[higher] = top[higher][:, None] * np.array(_FIRST) / _FIRST[0]
        bottom = np.where(lower, bottom / span, bottom)
        top = np.where(higher, top * span, top)
    for _ in range(_ROUNDS_NEAR if near else _ROUNDS):
        trials = [b.inner(near) for b in brackets]
        # Where F alone decides, both brackets are one and are traced once.
        same = (brackets[0].low == brackets[1].low) & (brackets[0].high == brackets[1].high)
        same |= np.isnan(brackets[1].low)
        trials[1] = np.where(same[:, None], np.nan, trials[1])
        width = trials[0].shape[1]
        found = margins(np.concatenate(trials, axis=1), refinements)
        second = np.where(same[:, None], found[1, :, :width], found[1, :, width:])
        brackets[0].narrow(trials[0], found[0, :, :width])
        brackets[1].narrow(np.where(same[:, None], trials[0], trials[1]), second)
    return Mufs(any_layer=brackets[0].value(near), f_region=brackets[1].value(near))


class _Bracket:
    """Highest frequency found to arrive, and the next one, which does not."""

    def __init__(self, count: int) -> None:
        self.low = np.full(count, np.nan)
        self.high = np.full(count, np.nan)
        self.low_margin = np.full(count, np.nan)
        self.high_margin = np.full(count, -np.inf)

    def inner(self, near: bool) -> FloatArray:
        """Trial frequencies within the brackets, shape (n, 3).

        Near the vertical the margin has a corner at the critical frequency and
        the bracket is quartered; else it is close to linear, and the trials
        stand around where it vanishes.
        """
        middle = self.value(near)
        steps = np.array([0.25, 0.5, 0.75])
        quarters = self.low[:, None] + (self.high - self.low)[:, None] * steps
        if near:
            return np.asarray(quarters)
        share = np.clip((middle - self.low) / (self.high - self.low), 0.0, 1.0)[:, None]
        around = np.clip(
            share + np.array([-0.08, 0.0, 0.08]), [0.02, 0.04, 0.06], [0.94, 0.96, 0.98]
        )
        around = self.low[:, None] + (self.high - self.low)[:, None] * around
        known = np.isfinite(self.high_margin)[:, None]
        return np.asarray(np.where(known, around, quarters))

    def narrow(self, trial: FloatArray, margins: FloatArray) -> None:
        """Take in what was traced at trial frequencies (n, tries)."""
        ladder = np.concatenate([self.low[:, None], trial, self.high[:, None]], axis=1)
        found = np.concatenate([self.low_margin[:, None], margins, self.high_margin[:, None]], 1)
        for i in range(self.low.size):
            known = np.flatnonzero(np.isfinite(ladder[i]))
            known = known[np.argsort(ladder[i, known], kind="stable")]
            inside = np.flatnonzero(found[i, known] >= -_SLACK)
            if inside.size == 0:
                if known.size:
                    self.high[i], self.high_margin[i] = ladder[i, known[0]], found[i, known[0]]
                continue
            k = int(inside[-1])
            self.low[i], self.low_margin[i] = ladder[i, known[k]], found[i, known[k]]
            if k + 1 < known.size:
                above = known[k + 1]
                self.high[i], self.high_margin[i] = ladder[i, above], found[i, above]

    def value(self, near: bool) -> FloatArray:
        """Where the margin vanishes, within the last bracket."""
        with np.errstate(invalid="ignore", divide="ignore"):
            share = self.low_margin / (self.low_margin - self.high_margin)
        # Linear where both ends have a margin; at the corner near the vertical, the middle.
        known = (share >= 0.0) & (share <= 1.0) & np.isfinite(self.high_margin)
        share = np.where(known & (not near), share, 0.5)
        middle = self.low + (self.high - self.low) * share
        return np.asarray(np.where(np.isfinite(self.high), middle, self.low))
