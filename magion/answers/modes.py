"""Every ray of every mode of one path, with its hand, loss and level."""

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import product
from typing import Final

import numpy as np

from magion.answers.scene import Overhead, Scene
from magion.arrays import ComplexArray, FloatArray, cross, unit
from magion.errors import InputError
from magion.ground import AVERAGE, Ground, reflection
from magion.ionosphere.layers import SPORADIC_HEIGHT
from magion.rays.chain import Specs, specs_of
from magion.rays.coupling import DEEPEST, carry, share_of_other
from magion.rays.exit import (
    PlasmaPoint,
    RayPlasma,
    exit_plasma,
    limiting_polarization,
    plasma_at_apex,
)
from magion.rays.fans import Fan, default_zenith_angles, fans
from magion.rays.homing import HomedRay, home
from magion.rays.link import Link
from magion.rays.losses import absorption, phase_path_change
from magion.rays.muf import LONGEST_HOP, angles_of_hop, branches
from magion.waves import MODES, Mode, index_difference, phase_to_go, wave_axes

GREATEST_ABSORPTION_DB: Final = 60.0
"""A wave absorbed more than this does not arrive [dB]."""

GREATEST_FOCUS_DB: Final = 9.0
"""Bound on the gain where rays cross, at the skip distance and near antipodes [dB]."""

SHORTEST_REACH: Final = 1500e3
"""Least reach of one hop that is reckoned with [m]."""

MOST_MIXED_HOPS: Final = 2
"""Up to so many hops every sequence of waves is traced; beyond, only pure ones [1]."""

Waves = tuple[Mode, ...]

_PURE_TOLERANCE = 30.0
_PURE_HOMED_TOLERANCE = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class ModeRay:
    """One ray that reaches the receiver, and what it brings.

    Parameters
    ----------
    ray : HomedRay
        The ray.
    sequence : tuple of Mode
        The wave on each hop; the last is the wave that arrives.
    layers : tuple of str
        Layer that turned it back on each hop.
    down, up : PlasmaPoint
        Where it leaves the ionosphere near the receiver, and, on the way up,
        near the transmitter.
    top : PlasmaPoint
        Highest point of the last hop.
    absorption_db : float
        All hops together [dB].
    bounce_db : float
        Loss at the ground and in changing from wave to wave, positive [dB].
    focus_db : float
        Gain over free space of the same path length by the spread of the rays [dB].
    coupling : float
        Power of the other wave that is fed on the way out, over its own [1].
    """

    ray: HomedRay
    sequence: Waves
    layers: tuple[str, ...]
    down: PlasmaPoint
    up: PlasmaPoint
    top: PlasmaPoint
    absorption_db: float
    bounce_db: float
    focus_db: float
    coupling: float

    @property
    def wave(self) -> Mode:
        """The wave that arrives."""
        return self.sequence[-1]

    @property
    def level_db(self) -> float:
        """Level to free space over the same path length [dB]."""
        return self.focus_db - self.absorption_db - self.bounce_db

    @property
    def label(self) -> str:
        """The trade's label, as 1F2(x) or 1E+1F2(o)."""
        runs: list[tuple[str, int]] = []
        for layer in self.layers:
            if runs and runs[-1][0] == layer:
                runs[-1] = (layer, runs[-1][1] + 1)
            else:
                runs.append((layer, 1))
        return "+".join(f"{n}{layer}" for layer, n in runs) + f"({self.wave.letter})"


@dataclass(frozen=True, slots=True, kw_only=True)
class ModesFound:
    """All modes of one path at one frequency and hour.

    Parameters
    ----------
    rays : tuple of ModeRay
        Every ray found.
    hops : tuple of int
        Numbers of hops that were traced [1].
    fans : dict
        Fan of the one-hop rays of each wave.
    """

    rays: tuple[ModeRay, ...]
    hops: tuple[int, ...]
    fans: dict[Mode, Fan]


LONGEST_PATH: Final = 12_000e3
"""Longest path whose hops are traced [m]."""


def require_length(link: Link) -> None:
    """Refuse a path that is too long.

    Parameters
    ----------
    link : Link
        The path.

    Raises
    ------
    InputError
        If it is longer than 12,000 km.
    """
    if link.distance > LONGEST_PATH:
        raise InputError(
            f"the path is {link.distance / 1e3:.0f} km long; accepted: up to "
            f"{LONGEST_PATH / 1e3:.0f} km, what hops are traced for"
        )


def hop_counts(distance: float, reach: float = LONGEST_HOP) -> tuple[int, ...]:
    """Numbers of hops that are traced for a distance.

    Parameters
    ----------
    distance : float
        Length of the path [m].
    reach : float
        Greatest length of one hop [m].

    Returns
    -------
    tuple of int
        The least number of hops of at most 3900 km and one more; where one hop
        reaches less, also the least number of those and one more [1].
    """
    least = max(1, math.ceil(distance / LONGEST_HOP))
    short = max(1, math.ceil(distance / max(reach, SHORTEST_REACH)))
    return tuple(sorted({least, least + 1, *((short, short + 1) if short > least else ())}))


def sequences(hops: int, modes: tuple[Mode, ...]) -> list[Waves]:
    """Sequences of waves over a number of hops.

    Parameters
    ----------
    hops : int
        Number of hops [1].
    modes : tuple of Mode
        Waves that exist at the frequency.

    Returns
    -------
    list of tuple of Mode
        All of them up to two hops; beyond, the pure ones.
    """
    if hops <= MOST_MIXED_HOPS:
        return list(product(modes, repeat=hops))
    return [(m,) * hops for m in modes]


def find_modes(scene: Scene, frequency: float, modes: tuple[Mode, ...], hour: int) -> ModesFound:
    """Trace every mode of a path.

    Parameters
    ----------
    scene : Scene
        The path.
    frequency : float
        Frequency [Hz].
    modes : tuple of Mode
        Waves that exist there.
    hour : int
        Index of the hour [1].

    Returns
    -------
    ModesFound
        All rays.
    """
    wanted: list[Waves] = []
    found: list[Fan] = []
    single: list[Waves] = [(m,) for m in modes]
    one_hop = fans(scene.link, _specs(frequency, hour, single), scene.medium, scene.field)
    reach = max((b.greatest for f in one_hop for b in branches(f)), default=LONGEST_HOP)
    counts = hop_counts(scene.link.distance, reach)
    for hops in counts:
        if hops == 1:
            wanted += single
            found += one_hop
            continue
        several = sequences(hops, modes)
        wanted += several
        found += fans(
            scene.link,
            _specs(frequency, hour, several),
            scene.medium,
            scene.field,
            default_zenith_angles(2.0),
            # Where one hop reaches, the rays of two are seldom the strongest.
            refinements=0 if counts[0] == 1 else 1,
        )
    specs = _specs(frequency, hour, wanted)
    homed = home(scene.link, specs, scene.medium, scene.field, found)
    rays = [_mode_ray(scene, frequency, hour, wanted[r.spec], r) for r in homed]
    return ModesFound(rays=tuple(rays), hops=counts, fans=dict(zip(modes, one_hop, strict=True)))


def strongest(rays: Iterable[ModeRay]) -> dict[Mode, ModeRay]:
    """The strongest ray of each wave that arrives.

    Parameters
    ----------
    rays : iterable of ModeRay
        Rays of one path, frequency and hour.

    Returns
    -------
    dict
        Mode to ray, the ordinary first; a wave that is absorbed or has no ray
        is left out.
    """
    best: dict[Mode, ModeRay] = {}
    for ray in sorted(rays, key=lambda r: r.level_db):
        if ray.absorption_db <= GREATEST_ABSORPTION_DB:
            best[ray.wave] = ray
    return {m: best[m] for m in MODES if m in best}


def stronger(leading: dict[Mode, ModeRay]) -> Mode:
    """The wave to take: the stronger; within 3 dB, the ordinary.

    Parameters
    ----------
    leading : dict
        Mode to ray, of at least one wave that arrives.

    Returns
    -------
    Mode
        That wave.
    """
    if len(leading) == 1:
        return next(iter(leading))
    lead = leading[Mode.EXTRAORDINARY].level_db - leading[Mode.ORDINARY].level_db
    return Mode.EXTRAORDINARY if lead > 3.0 else Mode.ORDINARY


def pure_rays(
    scene: Scene, wanted: Sequence[tuple[float, int, Mode]], hops: int
) -> list[tuple[ModeRay, ...]]:
    """Rays of one wave on every hop, for many frequencies and hours in one batch.

    Parameters
    ----------
    scene : Scene
        The path.
    wanted : sequence of (float, int, Mode)
        Frequency [Hz], index of the hour, and wave.
    hops : int
        Number of hops [1].

    Returns
    -------
    list of tuple of ModeRay
        For each of them every ray found; what the waves feed of one another on
        the way out is not computed (`coupling` is 0).
    """
    if not wanted:
        return []
    specs = specs_of([(f, hour, (mode,) * hops) for f, hour, mode in wanted])
    found = fans(
        scene.link,
        specs,
        scene.medium,
        scene.field,
        angles_of_hop(scene.link, hops),
        tolerance=_PURE_TOLERANCE,
    )
    rays: list[list[ModeRay]] = [[] for _ in wanted]
    homed = home(
        scene.link, specs, scene.medium, scene.field, found, tolerance=_PURE_HOMED_TOLERANCE
    )
    for ray in homed:
        f, hour, mode = wanted[ray.spec]
        rays[ray.spec].append(_mode_ray(scene, f, hour, (mode,) * hops, ray, coupled=False))
    return [tuple(r) for r in rays]


def _specs(frequency: float, hour: int, wanted: list[Waves]) -> Specs:
    return specs_of([(frequency, hour, s) for s in wanted])


def _mode_ray(
    scene: Scene,
    frequency: float,
    hour: int,
    sequence: Waves,
    ray: HomedRay,
    *,
    coupled: bool = True,
) -> ModeRay:
    medium, field = scene.medium, scene.field
    exits = [limiting_polarization(t, frequency, hour, medium, field) for t in ray.tracks]
    entries = [
        limiting_polarization(t, frequency, hour, medium, field, upward=True) for t in ray.tracks
    ]
    lost = sum(
        absorption(t, frequency, m is Mode.EXTRAORDINARY, hour, medium, field)
        for t, m in zip(ray.tracks, sequence, strict=True)
    )
    kept = 1.0
    for i, (place, toward) in enumerate(zip(ray.bounces, ray.incidences, strict=True)):
        kept *= bounce(
            exits[i], entries[i + 1], sequence[i], sequence[i + 1], place, toward, frequency
        )
    receiver = scene.link.receiver
    return ModeRay(
        ray=ray,
        sequence=sequence,
        layers=tuple(layer_of(scene.overheads[hour], a) for a in ray.apogees),
        down=exits[-1],
        up=entries[0],
        top=plasma_at_apex(ray.tracks[-1], frequency, hour, medium, field),
        absorption_db=lost,
        bounce_db=-10.0 * math.log10(max(kept, 1e-12)),
        focus_db=focus_db(ray, receiver.latitude, receiver.longitude),
        coupling=(
            _coupling(scene, frequency, hour, sequence[-1], ray, exits[-1]) if coupled else 0.0
        ),
    )


def focus_db(ray: HomedRay, latitude: float, longitude: float) -> float:
    """Gain over free space of the same path length by the spread of the rays.

    Parameters
    ----------
    ray : HomedRay
        The ray.
    latitude, longitude : float
        The receiver [rad].

    Returns
    -------
    float
        10 log10 of P'² over the cone's cross-section per solid angle, at most
        9 dB, since rays cross where the formula runs away [dB].
    """
    up = np.array(
        [
            math.cos(latitude) * math.cos(longitude),
            math.cos(latitude) * math.sin(longitude),
            math.sin(latitude),
        ]
    )
    sine = max(abs(float(ray.arrival @ up)), 1e-3)
    section = max(ray.spreading * sine, 1.0)
    return min(10.0 * math.log10(ray.group_path**2 / section), GREATEST_FOCUS_DB)


def _wave_vectors(point: PlasmaPoint) -> list[ComplexArray]:
    """Both limiting waves at a place as complex vectors in Earth-centred axes."""
    x, y = wave_axes(point.wave_normal, point.field)
    return [np.asarray(field[0] * x + field[1] * y) for field in point.waves()]


def bounce(
    before: PlasmaPoint,
    after: PlasmaPoint,
    mode: Mode,
    next_mode: Mode,
    place: FloatArray,
    toward: FloatArray,
    frequency: float,
    ground: Ground = AVERAGE,
) -> float:
    """Share of a wave's power that goes on as one of the waves after a ground reflection.

    Parameters
    ----------
    before, after : PlasmaPoint
        Where the wave left the ionosphere, and where it enters again.
    mode, next_mode : Mode
        The wave before and after.
    place : ndarray, shape (3,)
        Where it meets the ground [m].
    toward : ndarray, shape (3,)
        Its direction of travel before, a unit vector [1].
    frequency : float
        Frequency [Hz].
    ground : Ground
        The ground.

    Returns
    -------
    float
        Power share [1].

    Notes
    -----
    Horizontal and vertical parts are reflected with their own Fresnel
    coefficients; what comes off is split into both waves on the way up.
    """
    up = unit(place)
    on = toward - 2.0 * float(toward @ up) * up
    sine = min(abs(float(toward @ up)), 1.0)
    side = cross(toward, up)
    # At the vertical every direction is horizontal.
    east = np.array([-up[1], up[0], 0.0]) if abs(up[2]) < 0.999999 else np.array([1.0, 0.0, 0.0])
    horizontal = unit(side if float(np.sqrt(side @ side)) > 1e-6 else east)
    r_h, r_v = reflection(ground, frequency, math.asin(sine))
    arriving = _wave_vectors(before)[MODES.index(mode)]
    # E of a vertically polarized wave is −k × ĥ times its magnetic field along ĥ.
    parts = (
        complex(r_h) * (arriving @ horizontal),
        complex(r_v) * (arriving @ -cross(toward, horizontal)),
    )
    vertical = -cross(on, horizontal)
    upward = np.array([[w @ horizontal, w @ vertical] for w in _wave_vectors(after)]).T
    split = np.linalg.solve(upward, np.array(parts))
    return float(np.abs(split[MODES.index(next_mode)]) ** 2)


def layer_of(overhead: Overhead, apogee: float) -> str:
    """The layer that turned a ray back, by its greatest height.

    Parameters
    ----------
    overhead : Overhead
        The ionosphere over the midpoint.
    apogee : float
        Greatest height of the hop [m].

    Returns
    -------
    str
        "Es", "E", "F1" or "F2".
    """
    layers = overhead.layers
    if layers is not None and layers.foes > 0.0 and abs(apogee - SPORADIC_HEIGHT) < 3e3:
        return "Es"
    e_peak = overhead.profiles.e_peak()
    e_height = float(layers.hme) if layers is not None else (e_peak[1] if e_peak else 110e3)
    if apogee <= e_height + 8e3:
        return "E"
    if layers is not None and layers.f1_share >= 0.5 and apogee <= layers.hmf1:
        return "F1"
    return "F2"


def _coupling(
    scene: Scene, frequency: float, hour: int, mode: Mode, ray: HomedRay, down: PlasmaPoint
) -> float:
    """Power of the other wave fed on the way out, over the wave's own."""
    plasma = exit_plasma(ray.tracks[-1], frequency, hour, scene.medium, scene.field)
    deep = _from_depth(plasma, frequency)
    field, x, y = carry(deep, frequency, mode)
    states = []
    for vector in _wave_vectors(down):
        states.append(np.array([vector @ x, vector @ y]))
    number = MODES.index(mode)
    return share_of_other(field, states[number], states[1 - number])


def _from_depth(plasma: RayPlasma, frequency: float) -> RayPlasma:
    """The last part of a way out, from where the O-X phase to go is 60 radians."""
    difference = index_difference(plasma.X, plasma.Y, plasma.Z, plasma.theta)
    difference = np.where(np.isfinite(difference), difference, 0.0)
    phase = np.abs(phase_to_go(frequency, difference, plasma.length))
    beyond = np.flatnonzero(phase > DEEPEST)
    return plasma.after(int(beyond[-1]) if beyond.size else 0)


def doppler_of_layers(
    scene: Scene, frequency: float, hours: tuple[int, int, int], mode_ray: ModeRay
) -> FloatArray:
    """Change of a ray's phase path as foF2 and hmF2 change.

    Parameters
    ----------
    scene : Scene
        Its medium holds the unchanged ionosphere and two changed ones.
    frequency : float
        Frequency [Hz].
    hours : tuple of int
        Indices of the unchanged one, of that with another foF2, and of that
        with another hmF2 [1].
    mode_ray : ModeRay
        The ray.

    Returns
    -------
    ndarray, shape (2,)
        Change of the phase path by each [m].
    """
    total = np.zeros(2)
    for track, mode in zip(mode_ray.ray.tracks, mode_ray.sequence, strict=True):
        total += phase_path_change(
            track,
            frequency,
            mode is Mode.EXTRAORDINARY,
            np.array(hours),
            scene.medium,
            scene.field,
        )
    return total
