"""Rays that arrive at the receiver, by one hop or several.

A ray of several hops is reflected at the ground and may go on as either wave,
so each has a sequence of waves, one a hop; the last sets the hand.

A fan of launch directions in the plane of the great circle shows where each
wave comes down; every crossing of the receiver's distance starts a search in
both horizontal components of the launch direction, because a ray of one wave
leaves the plane of the great circle. The search runs in the zenith angle
vector w (angle from the vertical, along and across the path), which is regular
at the zenith.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray, unit
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.batch import Track
from magion.rays.chain import Chain, Specs
from magion.rays.fans import Fan, fans, shoot, vertex_of
from magion.rays.link import Link

LARGEST_MISS: Final = 100.0
"""A homed ray comes down within this distance of the receiver [m]."""

HOMED_TOLERANCE: Final = 6e-3
"""Error of position accepted in one step of a homed ray [m]."""

STEEPEST: Final = 4e6 * 180.0 / math.pi
"""Rays whose landing place moves faster than 4000 km a degree of elevation are
left out: they graze the peak of a layer, and their power is spread so thin that
they lie more than 15 dB below an ordinary ray [m/rad]."""

_SEARCH_TOLERANCE = 10.0
_GOOD_MISS = 60.0
_NEAR_ENOUGH = 3e3
_MOST_PASSES = 3
_MOST_TRIALS = 9
_BESIDE_STEP = 5e-4
_LONGEST_MOVE = 0.08


@dataclass(frozen=True, slots=True, kw_only=True)
class HomedRay:
    """One ray from the transmitter to the receiver.

    Parameters
    ----------
    spec : int
        Which of the wanted frequencies, ionospheres and sequences it belongs to [1].
    zenith_vector : ndarray, shape (2,)
        Launch: zenith angle along and across the path [rad].
    launch, arrival : ndarray, shape (3,)
        Unit directions of travel at transmitter and receiver [1].
    group_path, phase_path : float
        Lengths, all hops together [m].
    apogees : tuple of float
        Greatest height of each hop [m].
    bounces : tuple of ndarray, shape (3,)
        Positions of the ground reflections [m].
    incidences : tuple of ndarray, shape (3,)
        Unit directions of travel before them [1].
    miss : float
        Distance from the receiver at which it comes down [m].
    spreading : float
        Area on the ground that a cone of rays fills, per solid angle [m²].
    high : bool
        True for the high-angle ray of a layer (the range grows with elevation).
    tracks : tuple of Track
        Its nodes through the ionosphere, one track a hop.
    """

    spec: int
    zenith_vector: FloatArray
    launch: FloatArray
    arrival: FloatArray
    group_path: float
    phase_path: float
    apogees: tuple[float, ...]
    bounces: tuple[FloatArray, ...]
    incidences: tuple[FloatArray, ...]
    miss: float
    spreading: float
    high: bool
    tracks: tuple[Track, ...]


@dataclass(slots=True)
class _Search:
    """State of the search for several rays at once (arrays over the candidates)."""

    spec: IntArray
    w: FloatArray
    low: FloatArray
    high: FloatArray
    rising: BoolArray
    jacobian: FloatArray

    def take(self, keep: BoolArray) -> "_Search":
        return _Search(
            self.spec[keep], self.w[:, keep], self.low[keep], self.high[keep],
            self.rising[keep], self.jacobian[:, :, keep],
        )  # fmt: skip


def _candidates(link: Link, found: list[Fan]) -> _Search:
    rows = []
    distance = link.distance

    def add(spec: int, fan: Fan, start: float, slope: float, low: float, high: float) -> None:
        if abs(slope) > STEEPEST:
            return
        # Turning the azimuth swings the landing place about the transmitter.
        swing = (
            EARTH_RADIUS * math.sin(distance / EARTH_RADIUS) / math.sin(start)
            if distance > 30e3 and start > 0.1
            else slope
        )
        swing *= math.sin(start) / start if start else 1.0
        across = float(np.interp(start, fan.zenith_angle, fan.across))
        if math.isfinite(across) and swing:
            rows.append((spec, start, -across / swing, low, high, slope > 0.0, slope, swing))

    for spec, fan in enumerate(found):
        psi, gap, breaks = fan.zenith_angle, fan.along - distance, fan.breaks()
        whole = fan.landed[1:] & fan.landed[:-1] & ~breaks
        crossing = whole & (gap[1:] * gap[:-1] <= 0.0) & (gap[1:] != 0.0)
        for i in np.flatnonzero(crossing):
            slope = (gap[i + 1] - gap[i]) / (psi[i + 1] - psi[i])
            add(spec, fan, psi[i] - gap[i] / slope, slope, psi[i], psi[i + 1])
        # Just below the MUF the low and the high ray stand between two rays of the fan.
        inner = whole[1:] & whole[:-1] & (gap[1:-1] > 0.0)
        for i in np.flatnonzero(inner & (gap[1:-1] < gap[:-2]) & (gap[1:-1] <= gap[2:])) + 1:
            vertex = vertex_of(psi[i - 1 : i + 2], gap[i - 1 : i + 2])
            if vertex is None or vertex[1] >= 0.0:
                continue
            place, depth, bend = vertex
            away = math.sqrt(-depth / bend)
            for side in (-1.0, 1.0):
                add(
                    spec, fan, place + side * away, 2.0 * bend * side * away,
                    min(place, place + side * 2.0 * away), max(place, place + side * 2.0 * away),
                )  # fmt: skip
    table = np.array(rows, dtype=np.float64).reshape(-1, 8)
    jacobian = np.zeros((2, 2, table.shape[0]))
    jacobian[0, 0], jacobian[1, 1] = table[:, 6], table[:, 7]
    return _Search(
        spec=table[:, 0].astype(np.intp),
        w=table[:, 1:3].T.copy(),
        low=table[:, 3],
        high=table[:, 4],
        rising=table[:, 5] > 0.0,
        jacobian=jacobian,
    )


def home(
    link: Link,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    found: list[Fan] | None = None,
    *,
    tolerance: float = HOMED_TOLERANCE,
) -> list[HomedRay]:
    """All rays from the transmitter to the receiver.

    Parameters
    ----------
    link : Link
        The path.
    specs : Specs
        Frequency, ionosphere and sequence of waves wanted, one each.
    medium, field
        As for :func:`magion.rays.batch.trace`.
    found : list of Fan, optional
        Fans of these specs, if they are there already.
    tolerance : float
        Error of position accepted in one step of a homed ray [m].

    Returns
    -------
    list of HomedRay
        The rays, in order of spec and rising elevation; none where no such ray
        comes down at the receiver.
    """
    if found is None:
        found = fans(link, specs, medium, field)
    start = _candidates(link, found)
    trials = (link, specs, medium, field)
    # One step of Newton's method is enough for most; the others are searched for patiently.
    near, far = _stepped(start, *_probe(start, *trials, tolerance=_SEARCH_TOLERANCE)[1:])
    rays, left = _fine_passes(near, *trials, tolerance)
    hard = start.take(far | _indices_in(start, near, left))
    if hard.spec.size:
        rays += _fine_passes(_converged(link, hard, specs, medium, field), *trials, tolerance)[0]
    rays.sort(key=lambda r: (r.spec, -r.zenith_vector[0]))
    return [r for i, r in enumerate(rays) if not any(_same(r, q) for q in rays[:i])]


def _indices_in(start: _Search, near: _Search, left: BoolArray) -> BoolArray:
    """Which of the first candidates those are that the fine passes left over."""
    chosen = np.zeros(start.spec.size, dtype=bool)
    for spec, low in zip(near.spec[left], near.low[left], strict=True):
        chosen |= (start.spec == spec) & (start.low == low)
    return chosen


def _same(one: HomedRay, other: HomedRay) -> bool:
    """Whether two searches ended on one ray."""
    return (
        one.spec == other.spec
        and float(np.hypot(*(one.zenith_vector - other.zenith_vector))) < 2e-4
        and abs(one.apogees[-1] - other.apogees[-1]) < 2e3
    )


def _probe(
    search: _Search,
    link: Link,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    *,
    tolerance: float,
    keep_tracks: bool = False,
) -> tuple[Chain, FloatArray, FloatArray]:
    """Trace candidates, each with two beside it.

    Returns the ends, the gaps to the receiver (2, n), and the slopes of the
    landing place [component, by which of w, n].
    """
    count = search.spec.size
    asides = np.repeat(_BESIDE_STEP * np.eye(2), count, axis=1)
    beside = np.concatenate([search.w, search.w], axis=1) + asides
    ends = shoot(
        link,
        np.concatenate([search.w, beside], axis=1),
        specs.take(np.concatenate([search.spec] * 3)),
        medium,
        field,
        tolerance=tolerance,
        keep_tracks=keep_tracks,
    )
    places = np.stack(link.coordinates(ends.position)).reshape(2, 3, count)
    gap = places[:, 0] - np.array([[link.distance], [0.0]])
    return ends, gap, (places[:, 1:] - places[:, :1]) / _BESIDE_STEP


def _area(slope: FloatArray) -> FloatArray:
    """Determinant of the slopes of the landing place."""
    return np.asarray(slope[0, 0] * slope[1, 1] - slope[0, 1] * slope[1, 0])


def _stepped(search: _Search, gap: FloatArray, slope: FloatArray) -> tuple[_Search, BoolArray]:
    """Candidates after one step of Newton's method, and which of them it carried too far."""
    with np.errstate(invalid="ignore", divide="ignore"):
        move = -np.stack(
            [
                (slope[1, 1] * gap[0] - slope[0, 1] * gap[1]) / _area(slope),
                (slope[0, 0] * gap[1] - slope[1, 0] * gap[0]) / _area(slope),
            ]
        )
    # False where something did not land.
    good = np.hypot(*move) < _LONGEST_MOVE
    moved = search.take(good)
    moved.w = moved.w + move[:, good]
    return moved, ~good


def _fine_passes(
    search: _Search,
    link: Link,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    tolerance: float,
) -> tuple[list[HomedRay], BoolArray]:
    """Trace candidates finely until they come down at the receiver.

    Returns the rays, and which candidates did not become one.
    """
    rays: list[HomedRay] = []
    pending = np.arange(search.spec.size)
    left = np.ones(search.spec.size, dtype=bool)
    for _ in range(_MOST_PASSES):
        if pending.size == 0:
            break
        ends, gap, slope = _probe(
            search, link, specs, medium, field, tolerance=tolerance, keep_tracks=True
        )
        miss = np.hypot(*gap)
        arrived = miss <= LARGEST_MISS  # False where the ray did not land
        size = np.sinc(np.hypot(*search.w) / np.pi)
        spreading = np.abs(_area(slope)) / np.maximum(size, 1e-6)
        for i in np.flatnonzero(arrived):
            hops = int(specs.hops[search.spec[i]])
            before = ends.landings[: hops - 1]
            rays.append(
                HomedRay(
                    spec=int(search.spec[i]),
                    zenith_vector=search.w[:, i],
                    launch=link.launch(search.w[:, [i]])[:, 0],
                    arrival=unit(ends.direction[:, i]),
                    group_path=float(ends.group_path[i]),
                    phase_path=float(ends.phase_path[i]),
                    apogees=tuple(float(a) for a in ends.apogees[:hops, i]),
                    bounces=tuple(e.position[:, i] for e in before),
                    incidences=tuple(unit(e.direction[:, i]) for e in before),
                    miss=float(miss[i]),
                    spreading=float(spreading[i]),
                    # range falls with the zenith angle: the high ray
                    high=not bool(search.rising[i]),
                    tracks=tuple(e.tracks[i] for e in ends.landings[:hops]),
                )
            )
        left[pending[arrived]] = False
        search, far = _stepped(search.take(~arrived), gap[:, ~arrived], slope[..., ~arrived])
        pending = pending[~arrived][~far]
    return rays, left


def _converged(
    link: Link, search: _Search, specs: Specs, medium: Medium, field: MagneticField | None
) -> _Search:
    """Broyden's method in both components, kept within each bracket of the fan."""
    width = search.high - search.low
    low, high = search.low - 0.5 * width, search.high + 0.5 * width
    best_w = search.w.copy()
    best = np.full(search.spec.size, np.inf)
    active = np.arange(search.spec.size)
    previous_w = np.full_like(search.w, np.nan)
    previous_gap = np.full_like(search.w, np.nan)
    for _ in range(_MOST_TRIALS):
        if active.size == 0:
            break
        w = search.w[:, active]
        ends = shoot(
            link, w, specs.take(search.spec[active]), medium, field, tolerance=_SEARCH_TOLERANCE
        )
        along, across = link.coordinates(ends.position)
        gap = np.stack([along - link.distance, across])
        lost = ~np.isfinite(along)
        miss = np.where(lost, np.inf, np.hypot(*gap))
        better = miss < best[active]
        best_w[:, active] = np.where(better, w, best_w[:, active])
        best[active] = np.minimum(best[active], miss)
        # Broyden's rank-one update from the last move.
        move, change = w - previous_w[:, active], gap - previous_gap[:, active]
        jacobian = search.jacobian[:, :, active]
        square = np.einsum("in,in->n", move, move)
        known = np.isfinite(square) & (square > 0.0) & np.isfinite(change).all(axis=0)
        with np.errstate(invalid="ignore", divide="ignore"):
            wrong = change - np.einsum("ijn,jn->in", jacobian, move)
            update = np.einsum("in,jn->ijn", wrong, move) / square
        jacobian = np.where(known, jacobian + update, jacobian)
        search.jacobian[:, :, active] = jacobian
        determinant = jacobian[0, 0] * jacobian[1, 1] - jacobian[0, 1] * jacobian[1, 0]
        with np.errstate(invalid="ignore", divide="ignore"):
            step = -np.stack(
                [
                    (jacobian[1, 1] * gap[0] - jacobian[0, 1] * gap[1]) / determinant,
                    (jacobian[0, 0] * gap[1] - jacobian[1, 0] * gap[0]) / determinant,
                ]
            )
        size = np.hypot(*step)
        step *= np.minimum(1.0, 0.03 / np.maximum(size, 1e-12))
        target = w + step
        # A lost ray, or a step out of the bracket: half-way back to what landed best.
        outside = (target[0] < low[active]) | (target[0] > high[active])
        back = lost | outside | ~np.isfinite(target).all(axis=0)
        edge = np.clip(target[0], low[active], high[active])
        halved = 0.5 * (best_w[:, active] + np.stack([np.where(lost, w[0], edge), w[1]]))
        target = np.where(back, halved, target)
        previous_w[:, active] = np.where(lost, np.nan, w)
        previous_gap[:, active] = gap
        search.w[:, active] = target
        active = active[best[active] > _GOOD_MISS]
    search.w = best_w
    return search.take(best <= _NEAR_ENOUGH)
