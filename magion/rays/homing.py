"""Rays that arrive at the receiver.

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

from magion.arrays import BoolArray, FloatArray, IntArray, dot
from magion.constants import EARTH_RADIUS
from magion.errors import InputError
from magion.field import MagneticField
from magion.geometry import Place, great_circle, local_axes, travel
from magion.ionosphere.medium import Medium
from magion.rays.batch import Fate, Landing, Track, trace
from magion.rays.equations import RaySet

LARGEST_MISS: Final = 100.0
"""A homed ray comes down within this distance of the receiver [m]."""

HOMED_TOLERANCE: Final = 4e-3
"""Error of position accepted in one step of a homed ray [m]."""

_SEARCH_TOLERANCE = 1.0
_GOOD_MISS = 40.0
_ANTIPODES = math.radians(179.9)
_JUMP = 12e3
STEEPEST: Final = 4e6 * 180.0 / math.pi
"""Rays whose landing place moves faster than 4000 km a degree of elevation are
left out: they graze the peak of a layer, and their power is spread so thin that
they lie more than 15 dB below an ordinary ray [m/rad]."""

_MOST_TRIALS = 9
_BESIDE = math.radians(0.5)


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
        Which of the wanted frequencies, waves and ionospheres it belongs to.
    zenith_vector : ndarray, shape (2,)
        Launch: zenith angle along and across the path [rad].
    launch, arrival : ndarray, shape (3,)
        Unit directions of travel at transmitter and receiver [1].
    group_path, phase_path, apogee : float
        Lengths and greatest height [m].
    miss : float
        Distance from the receiver at which it comes down [m].
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
    apogee: float
    miss: float
    high: bool
    tracks: tuple[Track, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Fan:
    """Where the rays of one frequency, wave and ionosphere come down.

    Parameters
    ----------
    zenith_angle : ndarray, shape (n,)
        Launch angle from the vertical toward the receiver, rising [rad].
    along, across : ndarray, shape (n,)
        Landing place in the link's coordinates; NaN if the ray escapes [m].
    apogee : ndarray, shape (n,)
        Greatest height [m].
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
    rays: RaySet,
    medium: Medium,
    field: MagneticField | None,
    *,
    tolerance: float = 1.0,
    keep_tracks: bool = False,
) -> Landing:
    """Trace rays from the link's transmitter.

    Parameters
    ----------
    link : Link
        Where from and which way.
    w : ndarray, shape (2, n)
        Launch directions as zenith angle vectors [rad].
    rays, medium, field
        As for :func:`magion.rays.batch.trace`.
    tolerance : float
        Error of position accepted in one step; that of p is 1e-6 of it a metre [m].
    keep_tracks : bool
        Whether to keep the nodes.

    Returns
    -------
    Landing
        The ends of the rays.
    """

    def ends_of(directions: FloatArray, chosen: RaySet) -> Landing:
        return trace(
            np.repeat(link.up[:, None] * EARTH_RADIUS, directions.shape[1], axis=1),
            link.launch(directions),
            chosen,
            medium,
            field,
            position_tolerance=tolerance,
            direction_tolerance=1e-6 * tolerance,
            keep_tracks=keep_tracks,
        )

    ends = ends_of(w, rays)
    lost = np.flatnonzero(ends.fate == Fate.LOST)
    if lost.size and field is not None:
        # In the magnetic meridian, within the spitze's cone, the ordinary ray
        # meets X = 1 with the field along its wave normal. Its neighbours on
        # both sides pass the point and land symmetrically about its limit.
        flux, _ = field.at((link.up * (EARTH_RADIUS + 200e3))[:, None])
        north = np.array([link.forward @ flux[:, 0], link.left @ flux[:, 0]])
        aside = _BESIDE * np.array([-north[1], north[0]]) / np.hypot(*north)
        pair = np.concatenate([w[:, lost] + aside[:, None], w[:, lost] - aside[:, None]], axis=1)
        beside = ends_of(pair, rays.take(np.concatenate([lost, lost])))
        _take_middle(ends, beside, lost)
    return ends


def _take_middle(ends: Landing, beside: Landing, lost: IntArray) -> None:
    """Give lost rays the middle of their two neighbours' ends."""
    n = lost.size
    both = (beside.fate[:n] == Fate.LANDED) & (beside.fate[n:] == Fate.LANDED)
    ends.fate[lost] = np.where(both, Fate.LANDED, beside.fate[:n])
    middle = 0.5 * (beside.position[:, :n] + beside.position[:, n:])
    ends.position[:, lost] = middle * (EARTH_RADIUS / np.sqrt(dot(middle, middle)))
    direction = 0.5 * (beside.direction[:, :n] + beside.direction[:, n:])
    ends.direction[:, lost] = direction
    for target, source in (
        (ends.group_path, beside.group_path),
        (ends.phase_path, beside.phase_path),
        (ends.apogee, beside.apogee),
    ):
        target[lost] = 0.5 * (source[:n] + source[n:])
    if beside.tracks:
        for i, ray in enumerate(lost):
            ends.tracks[ray] = beside.tracks[i]


def fans(
    link: Link,
    specs: RaySet,
    medium: Medium,
    field: MagneticField | None,
    zenith_angles: FloatArray | None = None,
    *,
    refinements: int = 2,
) -> list[Fan]:
    """Fans of rays in the plane of the great circle, finer where a layer gives out.

    Parameters
    ----------
    link : Link
        Where from and which way.
    specs : RaySet
        One frequency, wave and ionosphere for each fan wanted.
    medium, field
        As for :func:`magion.rays.batch.trace`.
    zenith_angles : ndarray, optional
        Launch angles [rad].
    refinements : int
        How often the gaps at which a layer gives out are divided by seven.

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
            new = _fan_rays(link, np.concatenate(wanted), index, specs, medium, field)
            found = new if round_ == 0 else [f.merged(n) for f, n in zip(found, new, strict=True)]
        wanted = [_gaps(fan) for fan in found]
    return found


def _fan_rays(
    link: Link,
    angle: FloatArray,
    index: IntArray,
    specs: RaySet,
    medium: Medium,
    field: MagneticField | None,
) -> list[Fan]:
    w = np.stack([angle, np.zeros_like(angle)])
    ends = shoot(link, w, specs.take(index), medium, field)
    along, across = link.coordinates(ends.position)
    # A ray that runs backward round the Earth is one that ran forward beyond half-way.
    along = np.where((along < -5000e3) & (angle > 0.0), along + 2.0 * np.pi * EARTH_RADIUS, along)
    return [
        Fan(
            zenith_angle=angle[part],
            along=along[part],
            across=across[part],
            apogee=ends.apogee[part],
        )
        for part in (index == i for i in range(specs.frequency.size))
    ]


def _breaks(fan: Fan) -> BoolArray:
    """Gaps between neighbours in which a layer gives out."""
    landed = fan.landed
    jump = np.abs(np.diff(fan.apogee)) > _JUMP
    return np.asarray((landed[1:] != landed[:-1]) | (landed[1:] & landed[:-1] & jump))


def _gaps(fan: Fan) -> FloatArray:
    """New launch angles inside the gaps in which a layer gives out."""
    gap = np.flatnonzero(_breaks(fan))
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
    distance: FloatArray

    def take(self, keep: BoolArray) -> "_Search":
        return _Search(
            self.spec[keep], self.w[:, keep], self.low[keep], self.high[keep],
            self.rising[keep], self.jacobian[:, :, keep], self.distance[keep],
        )  # fmt: skip


def _candidates(link: Link, found: list[Fan], distance: float) -> _Search:
    rows = []
    for spec, fan in enumerate(found):
        gap = fan.along - distance
        crossing = np.flatnonzero(
            fan.landed[1:] & fan.landed[:-1] & (gap[1:] * gap[:-1] <= 0.0) & (gap[1:] != 0.0)
            & ~_breaks(fan)
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
            size = math.sin(start) / start if start else 1.0
            swing *= size
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
        distance=np.full(table.shape[0], distance),
    )


def home(
    link: Link,
    specs: RaySet,
    medium: Medium,
    field: MagneticField | None,
    found: list[Fan] | None = None,
) -> list[HomedRay]:
    """All rays of one hop from the transmitter to the receiver.

    Parameters
    ----------
    link : Link
        The path.
    specs : RaySet
        Frequency, wave and ionosphere wanted, one each.
    medium, field
        As for :func:`magion.rays.batch.trace`.
    found : list of Fan, optional
        Fans of these specs, if they are there already.

    Returns
    -------
    list of HomedRay
        The rays, in order of spec and rising elevation; none where no ray of
        that wave comes down at the receiver.
    """
    if found is None:
        found = fans(link, specs, medium, field)
    search = _converged(link, _candidates(link, found, link.distance), specs, medium, field)
    if search.spec.size == 0:
        return []
    ends = shoot(
        link, search.w, specs.take(search.spec), medium, field,
        tolerance=HOMED_TOLERANCE, keep_tracks=True,
    )  # fmt: skip
    along, across = link.coordinates(ends.position)
    miss = np.hypot(along - link.distance, across)
    order = np.lexsort((-search.w[0], search.spec))
    rays: list[HomedRay] = []
    for i in order:
        if ends.fate[i] != Fate.LANDED or not miss[i] <= LARGEST_MISS:
            continue
        if rays and rays[-1].spec == search.spec[i]:
            apart = np.hypot(*(rays[-1].zenith_vector - search.w[:, i]))
            if apart < 2e-4 and abs(rays[-1].apogee - ends.apogee[i]) < 2e3:
                continue
        rays.append(
            HomedRay(
                spec=int(search.spec[i]),
                zenith_vector=search.w[:, i],
                launch=link.launch(search.w[:, [i]])[:, 0],
                arrival=ends.direction[:, i] / math.sqrt(float(dot(*[ends.direction[:, i]] * 2))),
                group_path=float(ends.group_path[i]),
                phase_path=float(ends.phase_path[i]),
                apogee=float(ends.apogee[i]),
                miss=float(miss[i]),
                # range falls with the zenith angle: the high ray
                high=not bool(search.rising[i]),
                tracks=(ends.tracks[i],),
            )
        )
    return rays


def _converged(
    link: Link, search: _Search, specs: RaySet, medium: Medium, field: MagneticField | None
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
        gap = np.stack([along - search.distance[active], across])
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
    return search.take(best <= LARGEST_MISS)
