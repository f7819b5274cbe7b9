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
from magion.errors import InputError
from magion.field import MagneticField
from magion.geometry import Place, great_circle, local_axes, travel
from magion.ionosphere.medium import Medium
from magion.rays.batch import Track
from magion.rays.chain import Chain, Specs, chain

LARGEST_MISS: Final = 100.0
"""A homed ray comes down within this distance of the receiver [m]."""

HOMED_TOLERANCE: Final = 8e-3
"""Error of position accepted in one step of a homed ray [m]."""

FAN_TOLERANCE: Final = 5.0
"""Error of position accepted in one step of a fan's ray [m]."""

STEEPEST: Final = 4e6 * 180.0 / math.pi
"""Rays whose landing place moves faster than 4000 km a degree of elevation are
left out: they graze the peak of a layer, and their power is spread so thin that
they lie more than 15 dB below an ordinary ray [m/rad]."""

_SEARCH_TOLERANCE = 10.0
_GOOD_MISS = 60.0
_NEAR_ENOUGH = 3e3
_MOST_PASSES = 3
_MOST_TRIALS = 9
_ANTIPODES = math.radians(179.9)
_JUMP = 12e3
_BESIDE_STEP = 5e-4


@dataclass(frozen=True, slots=True, kw_only=True)
class Link:
    """The great circle from a transmitter to a receiver.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends.
    angle : float
        Central angle between them [rad].
    bearing : float
        Initial direction at the transmitter, east of north [rad].
    up, forward, left : ndarray, shape (3,)
        Unit vectors at the transmitter: vertical, along the path, and to the
        left of it [1].
    """

    transmitter: Place
    receiver: Place
    angle: float
    bearing: float
    up: FloatArray
    forward: FloatArray
    left: FloatArray

    @property
    def distance(self) -> float:
        """Length of the great circle on the ground [m]."""
        return self.angle * EARTH_RADIUS

    def point(self, share: float) -> tuple[float, float]:
        """Place at a share of the way.

        Parameters
        ----------
        share : float
            0 at the transmitter, 1 at the receiver [1].

        Returns
        -------
        latitude, longitude : float
            The place [rad].
        """
        lat, lon = travel(
            self.transmitter.latitude, self.transmitter.longitude, self.bearing, share * self.angle
        )
        return float(lat), float(lon)

    def launch(self, w: FloatArray) -> FloatArray:
        """Unit directions of zenith angle vectors at the transmitter.

        Parameters
        ----------
        w : ndarray, shape (2, n)
            Zenith angle along and across (left) the path [rad].

        Returns
        -------
        ndarray, shape (3, n)
            Earth-centred directions [1].
        """
        size = np.hypot(w[0], w[1])
        ratio = np.sinc(size / np.pi)
        return np.asarray(
            self.forward[:, None] * (w[0] * ratio)
            + self.left[:, None] * (w[1] * ratio)
            + self.up[:, None] * np.cos(size)
        )

    def coordinates(self, position: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Where points lie, along the great circle and to its left.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].

        Returns
        -------
        along, across : ndarray, shape (n,)
            Distances on the ground from the transmitter; `along` runs from
            half-way backward to half-way round forward [m].
        """
        u, f, s = self.up @ position, self.forward @ position, self.left @ position
        return np.arctan2(f, u) * EARTH_RADIUS, np.arctan2(s, np.hypot(u, f)) * EARTH_RADIUS


def link_between(transmitter: Place, receiver: Place) -> Link:
    """The great circle between two places.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends; they may coincide (the vertical case).

    Returns
    -------
    Link
        The link.

    Raises
    ------
    InputError
        If the places are antipodes, which no single great circle joins.
    """
    angle, bearing = (
        float(v)
        for v in great_circle(
            transmitter.latitude, transmitter.longitude, receiver.latitude, receiver.longitude
        )
    )
    if angle > _ANTIPODES:
        raise InputError(
            "the places are antipodes, so no one great circle joins them; "
            "accepted: up to 20,000 km apart"
        )
    east, north, up = local_axes(transmitter.latitude, transmitter.longitude)
    forward = math.sin(bearing) * east + math.cos(bearing) * north
    return Link(
        transmitter=transmitter,
        receiver=receiver,
        angle=angle,
        bearing=bearing,
        up=up,
        forward=forward,
        left=np.cross(up, forward),
    )


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


@dataclass(frozen=True, slots=True, kw_only=True)
class Fan:
    """Where the rays of one frequency, ionosphere and sequence come down.

    Parameters
    ----------
    zenith_angle : ndarray, shape (n,)
        Launch angle from the vertical toward the receiver, rising [rad].
    along, across : ndarray, shape (n,)
        Landing place in the link's coordinates; NaN if the ray escapes [m].
    apogee : ndarray, shape (n,)
        Greatest height of the last hop [m].
    """

    zenith_angle: FloatArray
    along: FloatArray
    across: FloatArray
    apogee: FloatArray

    @property
    def landed(self) -> BoolArray:
        """Which rays came down [1]."""
        return np.isfinite(self.along)

    def merged(self, other: "Fan") -> "Fan":
        """This fan with the rays of another one put in their places.

        Parameters
        ----------
        other : Fan
            More rays of the same kind.

        Returns
        -------
        Fan
            All of them, in order of the zenith angle.
        """
        angle = np.concatenate([self.zenith_angle, other.zenith_angle])
        order = np.argsort(angle, kind="stable")
        return Fan(
            zenith_angle=angle[order],
            along=np.concatenate([self.along, other.along])[order],
            across=np.concatenate([self.across, other.across])[order],
            apogee=np.concatenate([self.apogee, other.apogee])[order],
        )

    def breaks(self) -> BoolArray:
        """Gaps between neighbours in which a layer gives out.

        Returns
        -------
        ndarray of bool, shape (n - 1,)
            True where one ray escapes and the next does not, or where they turn
            at heights more than 12 km apart [1].
        """
        landed = self.landed
        jump = np.abs(np.diff(self.apogee)) > _JUMP
        return np.asarray((landed[1:] != landed[:-1]) | (landed[1:] & landed[:-1] & jump))


def default_zenith_angles(spacing_deg: float = 1.25) -> FloatArray:
    """Launch angles of a fan: from a little behind the zenith to the horizon.

    Parameters
    ----------
    spacing_deg : float
        Spacing [deg].

    Returns
    -------
    ndarray
        Zenith angles [rad].
    """
    forward = np.arange(0.0, 89.0, spacing_deg)
    return np.asarray(np.radians(np.concatenate([[-12.0, -4.0, -1.0], forward, [89.0, 89.6]])))


def shoot(
    link: Link,
    w: FloatArray,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    *,
    tolerance: float = 1.0,
    keep_tracks: bool = False,
) -> Chain:
    """Trace rays from the link's transmitter.

    Parameters
    ----------
    link : Link
        Where from and which way.
    w : ndarray, shape (2, n)
        Launch directions as zenith angle vectors [rad].
    specs, medium, field, tolerance, keep_tracks
        As for :func:`magion.rays.chain.chain`.

    Returns
    -------
    Chain
        The ends of the rays.
    """
    return chain(
        np.repeat(link.up[:, None] * EARTH_RADIUS, w.shape[1], axis=1),
        link.launch(w),
        specs,
        medium,
        field,
        tolerance=tolerance,
        # rays caught between two layers run on for long without coming down
        longest=min(2500e3 + 1.5 * link.distance, 7000e3),
        keep_tracks=keep_tracks,
    )


def fans(
    link: Link,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    zenith_angles: FloatArray | None = None,
    *,
    refinements: int = 1,
    tolerance: float = FAN_TOLERANCE,
) -> list[Fan]:
    """Fans of rays in the plane of the great circle, finer where a layer gives out.

    Parameters
    ----------
    link : Link
        Where from and which way.
    specs : Specs
        One frequency, ionosphere and sequence for each fan wanted.
    medium, field
        As for :func:`magion.rays.batch.trace`.
    zenith_angles : ndarray, optional
        Launch angles [rad].
    refinements : int
        How often the gaps at which a layer gives out are divided by seven [1].
    tolerance : float
        Error of position accepted in one step [m].

    Returns
    -------
    list of Fan
        One for each spec. All rays of all fans share one batch.
    """
    angles = default_zenith_angles() if zenith_angles is None else zenith_angles
    count = specs.frequency.size
    wanted = [angles] * count
    found: list[Fan] = []
    for round_ in range(refinements + 1):
        index = np.repeat(np.arange(count), [a.size for a in wanted])
        if index.size:
            angle = np.concatenate(wanted)
            new = _fan_rays(link, angle, index, specs, medium, field, tolerance)
            found = new if round_ == 0 else [f.merged(n) for f, n in zip(found, new, strict=True)]
        wanted = [_gaps(fan) for fan in found]
    return found


def _fan_rays(
    link: Link,
    angle: FloatArray,
    index: IntArray,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    tolerance: float,
) -> list[Fan]:
    w = np.stack([angle, np.zeros_like(angle)])
    ends = shoot(link, w, specs.take(index), medium, field, tolerance=tolerance)
    along, across = link.coordinates(ends.position)
    # A ray that runs backward round the Earth is one that ran forward beyond half-way.
    along = np.where((along < -5000e3) & (angle > 0.0), along + 2.0 * np.pi * EARTH_RADIUS, along)
    last = ends.apogees[specs.hops[index] - 1, np.arange(angle.size)]
    return [
        Fan(zenith_angle=angle[part], along=along[part], across=across[part], apogee=last[part])
        for part in (index == i for i in range(specs.frequency.size))
    ]


def _gaps(fan: Fan) -> FloatArray:
    """New launch angles inside the gaps in which a layer gives out."""
    gap = np.flatnonzero(fan.breaks())
    share = np.arange(1, 7) / 7.0
    low, high = fan.zenith_angle[gap], fan.zenith_angle[gap + 1]
    return np.asarray((low[:, None] + (high - low)[:, None] * share).ravel())


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
    for spec, fan in enumerate(found):
        gap = fan.along - distance
        crossing = np.flatnonzero(
            fan.landed[1:] & fan.landed[:-1] & (gap[1:] * gap[:-1] <= 0.0) & (gap[1:] != 0.0)
            & ~fan.breaks()
        )  # fmt: skip
        for i in crossing:
            a0, a1 = fan.zenith_angle[i], fan.zenith_angle[i + 1]
            slope = (gap[i + 1] - gap[i]) / (a1 - a0)
            if abs(slope) > STEEPEST:
                continue
            start = a0 - gap[i] / slope
            # Turning the azimuth swings the landing place about the transmitter.
            swing = (
                EARTH_RADIUS * math.sin(distance / EARTH_RADIUS) / math.sin(start)
                if distance > 30e3
                else slope
            )
            across = np.interp(start, fan.zenith_angle[i : i + 2], fan.across[i : i + 2])
            swing *= math.sin(start) / start if start else 1.0
            rows.append((spec, start, -across / swing, a0, a1, gap[i + 1] > gap[i], slope, swing))
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

    Returns
    -------
    list of HomedRay
        The rays, in order of spec and rising elevation; none where no such ray
        comes down at the receiver.
    """
    if found is None:
        found = fans(link, specs, medium, field)
    search = _converged(link, _candidates(link, found), specs, medium, field)
    rays: list[HomedRay] = []
    for _ in range(_MOST_PASSES):
        if search.spec.size == 0:
            break
        arrived, search = _fine_pass(link, search, specs, medium, field)
        rays += arrived
    rays.sort(key=lambda r: (r.spec, -r.zenith_vector[0]))
    return [r for i, r in enumerate(rays) if not any(_same(r, q) for q in rays[:i])]


def _same(one: HomedRay, other: HomedRay) -> bool:
    """Whether two searches ended on one ray."""
    return (
        one.spec == other.spec
        and float(np.hypot(*(one.zenith_vector - other.zenith_vector))) < 2e-4
        and abs(one.apogees[-1] - other.apogees[-1]) < 2e3
    )


def _fine_pass(
    link: Link, search: _Search, specs: Specs, medium: Medium, field: MagneticField | None
) -> tuple[list[HomedRay], _Search]:
    """Trace candidates finely, each with two beside it.

    Those that come down at the receiver are done; the others take one step of
    Newton's method with the slopes that their neighbours give.
    """
    count = search.spec.size
    step = _BESIDE_STEP
    asides = np.repeat(step * np.eye(2), count, axis=1)
    beside = np.concatenate([search.w, search.w], axis=1) + asides
    chosen = specs.take(np.concatenate([search.spec] * 3))
    ends = shoot(
        link, np.concatenate([search.w, beside], axis=1), chosen, medium, field,
        tolerance=HOMED_TOLERANCE, keep_tracks=True,
    )  # fmt: skip
    places = np.stack(link.coordinates(ends.position)).reshape(2, 3, count)
    gap = places[:, 0] - np.array([[link.distance], [0.0]])
    slope = (places[:, 1:] - places[:, :1]) / step  # [component, by which of w]
    area = slope[0, 0] * slope[1, 1] - slope[0, 1] * slope[1, 0]
    spreading = np.abs(area) / np.maximum(np.sinc(np.hypot(*search.w) / np.pi), 1e-6)
    miss = np.hypot(*gap)
    arrived = miss <= LARGEST_MISS  # False where the ray did not land
    rays = []
    for i in np.flatnonzero(arrived):
        hops = int(specs.hops[search.spec[i]])
        rays.append(
            HomedRay(
                spec=int(search.spec[i]),
                zenith_vector=search.w[:, i],
                launch=link.launch(search.w[:, [i]])[:, 0],
                arrival=unit(ends.direction[:, i]),
                group_path=float(ends.group_path[i]),
                phase_path=float(ends.phase_path[i]),
                apogees=tuple(float(a) for a in ends.apogees[:hops, i]),
                bounces=tuple(ends.landings[k].position[:, i] for k in range(hops - 1)),
                incidences=tuple(unit(ends.landings[k].direction[:, i]) for k in range(hops - 1)),
                miss=float(miss[i]),
                spreading=float(spreading[i]),
                # range falls with the zenith angle: the high ray
                high=not bool(search.rising[i]),
                tracks=tuple(ends.landings[k].tracks[i] for k in range(hops)),
            )
        )
    with np.errstate(invalid="ignore", divide="ignore"):
        move = -np.stack(
            [
                (slope[1, 1] * gap[0] - slope[0, 1] * gap[1]) / area,
                (slope[0, 0] * gap[1] - slope[1, 0] * gap[0]) / area,
            ]
        )
    again = ~arrived & (np.hypot(*move) < 0.02)  # False where something did not land
    search.w = search.w + np.where(again, move, 0.0)
    return rays, search.take(again)


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
