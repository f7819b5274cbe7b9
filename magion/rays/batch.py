"""Many rays at once: an embedded Runge-Kutta pair with a step for each ray.

Dormand and Prince's pair of orders 5 and 4 [DormandPrince1980]_. Rays that
are done leave the batch. Below the ionosphere they are straight lines.
"""

from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray, dot, weighted
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.rays.equations import STATE, RaySet, derivative_and_hamiltonian

_A = (
    (1 / 5,),
    (3 / 40, 9 / 40),
    (44 / 45, -56 / 15, 32 / 9),
    (19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729),
    (9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656),
    (35 / 384, 0.0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84),
)
_WEIGHTS = [np.array(row) for row in _A]
_ERROR = np.array([71 / 57600, 0.0, -71 / 16695, 71 / 1920, -17253 / 339200, 22 / 525, -1 / 40])

POSITION_TOLERANCE = 1.0
"""Error of position accepted in one step [m]."""

DIRECTION_TOLERANCE = 1e-6
"""Error of p accepted in one step [1]."""

COARSE = 10.0
"""Position tolerance from which flat rays may take longer steps [m]."""

_THIN_LAYER_STEP = 400.0
_FIRST_STEP = 4e3
_LONGEST_STEP = 25e3
_TOP_ROOM = 26e3  # more than the longest step, so that none looks beyond the top
_SHORTEST_STEP = 1e-3
_ENERGY = 20.0
_MOST_TURNS = 3
_MOST_ROUNDS = 3000
_BLOCK = 1600


class Fate(IntEnum):
    """How a ray ended."""

    LANDED = 0
    """It came down to the ground."""

    ESCAPED = 1
    """It left through the top of the ionosphere."""

    LONG = 2
    """It was still under way at the greatest group path, or is caught between
    two layers: it has turned downward three times without coming out."""

    LOST = 3
    """Its step vanished: it touched the singular point X = 1 with the field along it."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Track:
    """The nodes of one ray through the ionosphere.

    Parameters
    ----------
    group_path : ndarray, shape (k,)
        Group path from the transmitter [m].
    state : ndarray, shape (7, k)
        Position [m], p [1], phase path [m].
    slope : ndarray, shape (7, k)
        Derivatives of the state by the group path.
    """

    group_path: FloatArray
    state: FloatArray
    slope: FloatArray

    def sample(self, group_path: FloatArray) -> FloatArray:
        """State between the nodes, by cubic Hermite interpolation.

        Parameters
        ----------
        group_path : ndarray, shape (m,)
            Where [m].

        Returns
        -------
        ndarray, shape (7, m)
            The state there.
        """
        i = np.clip(np.searchsorted(self.group_path, group_path) - 1, 0, self.group_path.size - 2)
        h = self.group_path[i + 1] - self.group_path[i]
        t = (group_path - self.group_path[i]) / h
        return np.asarray(
            self.state[:, i] * ((1.0 + 2.0 * t) * (1.0 - t) ** 2)
            + self.slope[:, i] * (h * t * (1.0 - t) ** 2)
            + self.state[:, i + 1] * (t * t * (3.0 - 2.0 * t))
            + self.slope[:, i + 1] * (h * t * t * (t - 1.0))
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Landing:
    """Ends of a batch of rays.

    Parameters
    ----------
    fate : ndarray of int, shape (n,)
        Values of :class:`Fate`.
    position : ndarray, shape (3, n)
        Where the ray meets the ground, Earth-centred; NaN if it does not [m].
    direction : ndarray, shape (3, n)
        p at the end, Earth-centred [1].
    group_path, phase_path : ndarray, shape (n,)
        From transmitter to end [m].
    apogee : ndarray, shape (n,)
        Greatest height reached [m].
    tracks : list of Track
        One for each ray if asked for, else empty.
    """

    fate: IntArray
    position: FloatArray
    direction: FloatArray
    group_path: FloatArray
    phase_path: FloatArray
    apogee: FloatArray
    tracks: list[Track]


def distance_to_height(position: FloatArray, direction: FloatArray, height: float) -> FloatArray:
    """Length of a straight line upward to a height.

    Parameters
    ----------
    position : ndarray, shape (3, n)
        Start, not above the height [m].
    direction : ndarray, shape (3, n)
        Unit vector, not below the horizontal [1].
    height : float
        Height above the sphere [m].

    Returns
    -------
    ndarray, shape (n,)
        Length [m].
    """
    along = dot(position, direction)
    gap = (EARTH_RADIUS + height) ** 2 - dot(position, position)
    return gap / (along + np.sqrt(along * along + gap))


def trace(
    start: FloatArray,
    direction: FloatArray,
    rays: RaySet,
    medium: Medium,
    field: MagneticField | None,
    *,
    longest: float = 7000e3,
    position_tolerance: float = POSITION_TOLERANCE,
    direction_tolerance: float = DIRECTION_TOLERANCE,
    keep_tracks: bool = False,
) -> Landing:
    """Trace rays from the ground through the ionosphere to their ends.

    Parameters
    ----------
    start : ndarray, shape (3, n)
        Positions on the ground, Earth-centred [m].
    direction : ndarray, shape (3, n)
        Unit launch directions, above the horizontal [1].
    rays : RaySet
        Frequency, wave and ionosphere of each ray.
    medium : Medium
        Electron density.
    field : MagneticField or None
        Geomagnetic field; None switches it off.
    longest : float
        Group path after which a ray counts as lost [m].
    position_tolerance, direction_tolerance : float
        Error accepted in one step [m], [1].
    keep_tracks : bool
        Whether to keep the nodes of every ray.

    Returns
    -------
    Landing
        The ends.
    """
    count = start.shape[1]
    below = distance_to_height(start, direction, medium.base)
    state = np.concatenate([start + direction * below, direction, below[None]])
    group = below.copy()
    result = Landing(
        fate=np.full(count, Fate.LOST, dtype=np.intp),
        position=np.full((3, count), np.nan),
        direction=direction.copy(),
        group_path=np.full(count, np.nan),
        phase_path=np.full(count, np.nan),
        apogee=np.full(count, medium.base),
        tracks=[],
    )
    notes: list[tuple[IntArray, FloatArray, FloatArray, FloatArray]] = []
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        for first in range(0, count, _BLOCK):  # blocks that stay in the processor's cache
            block = np.arange(first, min(first + _BLOCK, count))
            _advance(
                block, state[:, block], group[block], rays.take(block), medium, field, result,
                notes, longest, position_tolerance, direction_tolerance, keep_tracks,
            )  # fmt: skip
    if keep_tracks:
        result.tracks.extend(_assemble(notes, count))
    return result


def _advance(
    active: IntArray,
    state: FloatArray,
    group: FloatArray,
    rays: RaySet,
    medium: Medium,
    field: MagneticField | None,
    result: Landing,
    notes: list[tuple[IntArray, FloatArray, FloatArray, FloatArray]],
    longest: float,
    position_tolerance: float,
    direction_tolerance: float,
    keep_tracks: bool,
) -> None:
    step = np.full(active.size, _FIRST_STEP)
    previous = np.full(active.size, 1e-4)
    turns = np.zeros(active.size, dtype=np.intp)
    slope, energy = derivative_and_hamiltonian(state, rays, medium, field)
    radius, climb = _radius_and_climb(state, slope)
    if keep_tracks:
        notes.append((active, group, state, slope))
    for _ in range(_MOST_ROUNDS):
        n = active.size
        if n == 0:
            return
        stages = np.empty((7, STATE, n))
        stages[0] = slope
        flat = stages.reshape(7, -1)
        for i, weights in enumerate(_WEIGHTS):
            trial = state + weighted(weights, flat[: i + 1]).reshape(STATE, n) * step
            stages[i + 1], trial_energy = derivative_and_hamiltonian(trial, rays, medium, field)
        error = np.abs(weighted(_ERROR, flat).reshape(STATE, n) * step)
        size = np.maximum(
            error[0:3].max(axis=0) / position_tolerance,
            error[3:6].max(axis=0) / direction_tolerance,
        )
        # A ray that slips to the other wave near a singular point shows in p² − n².
        size = np.maximum(size, np.abs(trial_energy - energy) / (_ENERGY * direction_tolerance))
        size = np.where(np.isfinite(size), size, 1e6)
        accepted = size <= 1.0
        size = np.maximum(size, 1e-6)
        factor = np.clip(0.9 * size**-0.14 * previous**0.08, 0.1, np.where(accepted, 5.0, 0.9))
        previous = np.where(accepted, np.maximum(size, 1e-4), previous)
        taken = step * accepted
        state = np.where(accepted, trial, state)
        slope = np.where(accepted, stages[6], slope)
        energy = np.where(accepted, trial_energy, energy)
        group = group + taken
        radius_before, climb_before = radius, climb
        radius, climb = _radius_and_climb(state, slope)
        _note_apogee(result, active, accepted, radius_before, radius, climb_before, climb, taken)
        turns += accepted & (climb_before > 0.0) & (climb <= 0.0)
        if keep_tracks:
            notes.append(
                (active[accepted], group[accepted], state[:, accepted], slope[:, accepted])
            )
        height = radius - EARTH_RADIUS
        landed = (height < medium.base) & (climb < 0.0)
        escaped = (height > medium.top - _TOP_ROOM) & (climb > 0.0)
        if landed.any():
            _land(result, active[landed], state[:, landed], group[landed])
        result.fate[active[escaped]] = Fate.ESCAPED
        long = (group > longest) | (turns >= _MOST_TURNS)
        result.fate[active[long & ~landed]] = Fate.LONG
        done = landed | escaped | long | (step < _SHORTEST_STEP)
        # The thin plasma near the base must not fall between the stages of one step.
        thin = np.clip(_FIRST_STEP + 0.4 * (height - medium.base), _FIRST_STEP, _LONGEST_STEP)
        if position_tolerance >= COARSE:
            thin = thin / np.maximum(np.abs(climb), 0.25)
        if medium.thin_layer is not None:
            gap = np.maximum(0.7 * np.abs(height - medium.thin_layer), _THIN_LAYER_STEP)
            thin = np.minimum(thin, gap / np.maximum(np.abs(climb), 0.05))
        step = np.minimum(step * factor, thin)
        if done.any():
            for target, source in (
                (result.group_path, group),
                (result.phase_path, state[6]),
            ):
                missing = done & np.isnan(target[active])
                target[active[missing]] = source[missing]
            keep = ~done
            active, step, group = active[keep], step[keep], group[keep]
            state, slope, rays = state[:, keep], slope[:, keep], rays.take(keep)
            radius, climb, energy = radius[keep], climb[keep], energy[keep]
            previous, turns = previous[keep], turns[keep]


def _radius_and_climb(state: FloatArray, slope: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Distance from the Earth's centre and its derivative by the group path."""
    radius = np.sqrt(dot(state[0:3], state[0:3]))
    return radius, dot(state[0:3], slope[0:3]) / radius


def _note_apogee(
    result: Landing,
    active: IntArray,
    accepted: BoolArray,
    radius_before: FloatArray,
    radius: FloatArray,
    climb_before: FloatArray,
    climb: FloatArray,
    step: FloatArray,
) -> None:
    """Greatest height so far; within a step that turns, by cubic Hermite interpolation."""
    greatest = np.maximum(radius_before, radius)
    turns = accepted & (climb_before > 0.0) & (climb <= 0.0)
    if turns.any():
        r0, r1 = radius_before[turns], radius[turns]
        h = step[turns]
        m0, m1 = climb_before[turns] * h, climb[turns] * h
        # r'(t) of the Hermite cubic: a t² + b t + m0
        a = 3.0 * (m0 + m1) - 6.0 * (r1 - r0)
        b = 6.0 * (r1 - r0) - 4.0 * m0 - 2.0 * m1
        root = np.sqrt(np.maximum(b * b - 4.0 * a * m0, 0.0))
        t = np.clip(2.0 * m0 / (-b + root), 0.0, 1.0)  # the root that turns downward
        peak = r0 + t * (m0 + t * (b / 2.0 + t * a / 3.0))
        greatest[turns] = np.maximum(greatest[turns], peak)
    result.apogee[active] = np.maximum(result.apogee[active], greatest - EARTH_RADIUS)


def _land(result: Landing, index: IntArray, state: FloatArray, group: FloatArray) -> None:
    """Carry rays that left the ionosphere on to the ground, in a straight line."""
    r, p = state[0:3], state[3:6]
    toward = p / np.sqrt(dot(p, p))
    along = dot(r, toward)
    gap = dot(r, r) - EARTH_RADIUS**2
    square = along * along - gap
    meets = square >= 0.0
    length = np.where(meets, gap / (-along + np.sqrt(np.maximum(square, 0.0))), np.nan)
    result.fate[index] = np.where(meets, Fate.LANDED, Fate.ESCAPED)
    result.position[:, index] = r + toward * length
    result.direction[:, index] = p
    result.group_path[index] = group + length
    result.phase_path[index] = state[6] + length


def _assemble(
    notes: list[tuple[IntArray, FloatArray, FloatArray, FloatArray]], count: int
) -> list[Track]:
    index = np.concatenate([n[0] for n in notes])
    group = np.concatenate([n[1] for n in notes])
    state = np.concatenate([n[2] for n in notes], axis=1)
    slope = np.concatenate([n[3] for n in notes], axis=1)
    order = np.argsort(index, kind="stable")
    ends = np.searchsorted(index[order], np.arange(count + 1))
    return [
        Track(group_path=group[part], state=state[:, part], slope=slope[:, part])
        for part in (order[ends[i] : ends[i + 1]] for i in range(count))
    ]
