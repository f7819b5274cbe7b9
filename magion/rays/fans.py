"""Fans: where rays launched at many elevations come down."""

from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.chain import Chain, Specs, chain
from magion.rays.link import Link

FAN_TOLERANCE: Final = 5.0
"""Error of position accepted in one step of a fan's ray [m]."""

_JUMP = 12e3
_JUMP_PER_RADIAN = 10e3 * 180.0 / np.pi
_NEAR_SKIP = 150e3
_CLOSE = np.radians(1.0)


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
            at heights further apart than within one layer (12 km, and 10 km a degree) [1].
        """
        landed = self.landed
        usual = _JUMP + _JUMP_PER_RADIAN * np.diff(self.zenith_angle)
        jump = np.abs(np.diff(self.apogee)) > usual
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
        How often the gaps at which a layer gives out, or in which the skip
        distance comes near the receiver's, are divided by seven [1].
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
        wanted = [_gaps(fan, link.distance) for fan in found]
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


def _gaps(fan: Fan, distance: float) -> FloatArray:
    """New launch angles where a layer gives out, and about a skip distance near the receiver's."""
    psi, breaks = fan.zenith_angle, fan.breaks()
    chosen = breaks.copy()
    gap = fan.along - distance
    lowest = (gap[1:-1] <= gap[:-2]) & (gap[1:-1] <= gap[2:]) & ~breaks[1:] & ~breaks[:-1]
    lowest &= np.abs(gap[1:-1]) < _NEAR_SKIP
    chosen[:-1] |= lowest
    chosen[1:] |= lowest
    index = np.flatnonzero(chosen)
    share = np.arange(1, 7) / 7.0
    low, high = psi[index], psi[index + 1]
    return np.asarray((low[:, None] + (high - low)[:, None] * share).ravel())


def vertex_of(zenith_angle: FloatArray, along: FloatArray) -> tuple[float, float, float] | None:
    """Lowest point of the parabola through three points.

    Parameters
    ----------
    zenith_angle : ndarray, shape (3,)
        Launch angles, rising [rad].
    along : ndarray, shape (3,)
        Distances at which the rays come down [m].

    Returns
    -------
    tuple of float or None
        Place [rad] and value [m] of the lowest point, and the factor of the
        square [m/rad²]; None if the parabola has no lowest point, or the points
        stand more than a degree apart.
    """
    left, right = (
        (along[1] - along[0]) / (zenith_angle[1] - zenith_angle[0]),
        (along[2] - along[1]) / (zenith_angle[2] - zenith_angle[1]),
    )
    bend = (right - left) / (zenith_angle[2] - zenith_angle[0])
    # Between rays far apart the skip distance is no parabola: far steeper on the high side.
    if not bend > 0.0 or zenith_angle[2] - zenith_angle[0] > _CLOSE:
        return None
    slope = left + bend * (zenith_angle[1] - zenith_angle[0])  # at the middle point
    return (
        float(zenith_angle[1] - slope / (2.0 * bend)),
        float(along[1] - slope * slope / (4.0 * bend)),
        float(bend),
    )
