"""Rays of several hops: through the ionosphere, off the ground, and on."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray, dot
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.batch import Fate, Landing, trace
from magion.rays.equations import RaySet
from magion.waves import Mode

_BESIDE = math.radians(0.5)
_FIELD_HEIGHT = 200e3


@dataclass(frozen=True, slots=True, kw_only=True)
class Specs:
    """What distinguishes the rays of a batch, hop by hop.

    Parameters
    ----------
    frequency : ndarray, shape (n,)
        Wave frequency [Hz].
    which : ndarray of int, shape (n,)
        Index of the ionosphere within the medium [1].
    hops : ndarray of int, shape (n,)
        Number of hops [1].
    extraordinary : ndarray of bool, shape (most hops, n)
        Which wave the ray is on each hop [1].
    """

    frequency: FloatArray
    which: IntArray
    hops: IntArray
    extraordinary: BoolArray

    def take(self, index: IntArray | BoolArray) -> "Specs":
        """Some of the specs, or some of them several times.

        Parameters
        ----------
        index : ndarray
            Indices or a mask.

        Returns
        -------
        Specs
            The chosen ones.
        """
        return Specs(
            frequency=self.frequency[index],
            which=self.which[index],
            hops=self.hops[index],
            extraordinary=self.extraordinary[:, index],
        )

    def hop(self, number: int, index: IntArray) -> RaySet:
        """The rays of one hop.

        Parameters
        ----------
        number : int
            Hop, from 0 [1].
        index : ndarray of int
            Which rays [1].

        Returns
        -------
        RaySet
            Frequency, wave and ionosphere on that hop.
        """
        return RaySet(
            frequency=self.frequency[index],
            extraordinary=self.extraordinary[number, index],
            which=self.which[index],
        )


def specs_of(
    rows: Sequence[tuple[float, int, tuple[Mode, ...]]],
) -> Specs:
    """Specs from a list.

    Parameters
    ----------
    rows : sequence of (float, int, tuple of Mode)
        Frequency [Hz], index of the ionosphere, and the wave on each hop.

    Returns
    -------
    Specs
        The same as arrays.
    """
    hops = np.array([len(sequence) for _, _, sequence in rows], dtype=np.intp)
    extraordinary = np.zeros((int(hops.max(initial=1)), len(rows)), dtype=bool)
    for i, (_, _, sequence) in enumerate(rows):
        extraordinary[: len(sequence), i] = [m is Mode.EXTRAORDINARY for m in sequence]
    return Specs(
        frequency=np.array([f for f, _, _ in rows], dtype=np.float64),
        which=np.array([w for _, w, _ in rows], dtype=np.intp),
        hops=hops,
        extraordinary=extraordinary,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Chain:
    """Ends of rays of several hops.

    Parameters
    ----------
    fate : ndarray of int, shape (n,)
        Values of :class:`~magion.rays.batch.Fate` of the last hop traced [1].
    position : ndarray, shape (3, n)
        Where the last hop comes down; NaN if it does not [m].
    direction : ndarray, shape (3, n)
        p there [1].
    group_path, phase_path : ndarray, shape (n,)
        All hops together [m].
    apogees : ndarray, shape (most hops, n)
        Greatest height of each hop [m].
    landings : list of Landing
        Every hop's ends, each for all rays (not-a-number where a ray has no
        such hop).
    """

    fate: IntArray
    position: FloatArray
    direction: FloatArray
    group_path: FloatArray
    phase_path: FloatArray
    apogees: FloatArray
    landings: list[Landing]


def reflected(direction: FloatArray, position: FloatArray) -> FloatArray:
    """Unit directions after specular reflection at the ground.

    Parameters
    ----------
    direction : ndarray, shape (3, n)
        Directions of travel before.
    position : ndarray, shape (3, n)
        Places on the ground [m].

    Returns
    -------
    ndarray, shape (3, n)
        Directions of travel after [1].
    """
    up = position / np.sqrt(dot(position, position))
    toward = direction / np.sqrt(dot(direction, direction))
    return np.asarray(toward - 2.0 * dot(toward, up) * up)


def chain(
    start: FloatArray,
    direction: FloatArray,
    specs: Specs,
    medium: Medium,
    field: MagneticField | None,
    *,
    tolerance: float = 1.0,
    longest: float = 7000e3,
    keep_tracks: bool = False,
) -> Chain:
    """Trace rays of one or several hops.

    Parameters
    ----------
    start, direction : ndarray, shape (3, n)
        Launch positions [m] and unit directions [1].
    specs : Specs
        Frequency, ionosphere and waves of each ray.
    medium, field
        As for :func:`magion.rays.batch.trace`.
    tolerance : float
        Error of position accepted in one step; that of p is 1e-6 of it a metre [m].
    longest : float
        Group path of one hop after which a ray is given up [m].
    keep_tracks : bool
        Whether to keep the nodes.

    Returns
    -------
    Chain
        The ends.
    """
    count = start.shape[1]
    most = int(specs.hops.max(initial=1))
    result = Chain(
        fate=np.full(count, Fate.LOST, dtype=np.intp),
        position=np.full((3, count), np.nan),
        direction=np.full((3, count), np.nan),
        group_path=np.zeros(count),
        phase_path=np.zeros(count),
        apogees=np.full((most, count), np.nan),
        landings=[],
    )
    index = np.arange(count)
    for hop in range(most):
        rays = specs.hop(hop, index)
        ends = one_hop(start, direction, rays, medium, field, tolerance, longest, keep_tracks)
        result.fate[index] = ends.fate
        result.position[:, index] = ends.position
        result.direction[:, index] = ends.direction
        result.group_path[index] += ends.group_path
        result.phase_path[index] += ends.phase_path
        result.apogees[hop, index] = ends.apogee
        result.landings.append(ends if index.size == count else _spread(ends, index, count))
        on = (ends.fate == Fate.LANDED) & (specs.hops[index] > hop + 1)
        short = (ends.fate != Fate.LANDED) & (specs.hops[index] > hop + 1)
        result.position[:, index[short]] = np.nan
        start, direction = ends.position[:, on], reflected(ends.direction, ends.position)[:, on]
        index = index[on]
        if index.size == 0:
            break
    return result


def _spread(ends: Landing, index: IntArray, count: int) -> Landing:
    """Ends of some rays in arrays over all of them."""

    def wide(values: FloatArray) -> FloatArray:
        out = np.full((*values.shape[:-1], count), np.nan)
        out[..., index] = values
        return out

    fate = np.full(count, Fate.LOST, dtype=np.intp)
    fate[index] = ends.fate
    tracks = []
    if ends.tracks:
        by_ray = dict(zip(index.tolist(), ends.tracks, strict=True))
        empty = ends.tracks[0]
        tracks = [by_ray.get(i, empty) for i in range(count)]
    return Landing(
        fate=fate,
        position=wide(ends.position),
        direction=wide(ends.direction),
        group_path=wide(ends.group_path),
        phase_path=wide(ends.phase_path),
        apogee=wide(ends.apogee),
        tracks=tracks,
    )


def one_hop(
    start: FloatArray,
    direction: FloatArray,
    rays: RaySet,
    medium: Medium,
    field: MagneticField | None,
    tolerance: float,
    longest: float,
    keep_tracks: bool,
) -> Landing:
    """Trace one hop; rays at the spitze take their limit from half a degree beside.

    Parameters
    ----------
    start, direction : ndarray, shape (3, n)
        Positions on the ground [m] and unit directions [1].
    rays : RaySet
        Frequency, wave and ionosphere.
    medium, field, tolerance, longest, keep_tracks
        As for :func:`chain`.

    Returns
    -------
    Landing
        The ends.

    Notes
    -----
    In the magnetic meridian, within the spitze's cone, the ordinary ray meets
    X = 1 with the field along its wave normal. Its neighbours on both sides
    pass the point and land symmetrically about its limit.
    """

    def ends_of(where: FloatArray, toward: FloatArray, chosen: RaySet) -> Landing:
        return trace(
            where,
            toward,
            chosen,
            medium,
            field,
            longest=longest,
            position_tolerance=tolerance,
            direction_tolerance=1e-6 * tolerance,
            keep_tracks=keep_tracks,
        )

    ends = ends_of(start, direction, rays)
    lost = np.flatnonzero(ends.fate == Fate.LOST)
    if lost.size and field is not None:
        where, toward = start[:, lost], direction[:, lost]
        up = where / np.sqrt(dot(where, where))
        flux, _ = field.at(up * (EARTH_RADIUS + _FIELD_HEIGHT))
        side = np.cross(up, flux, axis=0)
        side *= math.tan(_BESIDE) / np.sqrt(dot(side, side))
        pair = np.concatenate([toward + side, toward - side], axis=1)
        pair /= np.sqrt(dot(pair, pair))
        twice = np.concatenate([lost, lost])
        _take_middle(ends, ends_of(start[:, twice], pair, rays.take(twice)), lost)
    return ends


def _take_middle(ends: Landing, beside: Landing, lost: IntArray) -> None:
    """Give lost rays the middle of their two neighbours' ends."""
    n = lost.size
    both = (beside.fate[:n] == Fate.LANDED) & (beside.fate[n:] == Fate.LANDED)
    ends.fate[lost] = np.where(both, Fate.LANDED, beside.fate[:n])
    middle = 0.5 * (beside.position[:, :n] + beside.position[:, n:])
    ends.position[:, lost] = middle * (EARTH_RADIUS / np.sqrt(dot(middle, middle)))
    ends.direction[:, lost] = 0.5 * (beside.direction[:, :n] + beside.direction[:, n:])
    for target, source in (
        (ends.group_path, beside.group_path),
        (ends.phase_path, beside.phase_path),
        (ends.apogee, beside.apogee),
    ):
        target[lost] = 0.5 * (source[:n] + source[n:])
    if beside.tracks:
        for i, ray in enumerate(lost):
            ends.tracks[ray] = beside.tracks[i]
