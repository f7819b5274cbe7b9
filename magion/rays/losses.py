"""What a wave loses on its way, and how its phase path answers to the layers.

Absorption is the line integral of the imaginary part of the complex index
along the ray. Per group path it is (omega / c) (-Im n²) / (2 G), with G of the
ray equations: the same as (omega / c) chi (p̂ . dr) where the wave is well
above reflection, and regular where n goes to zero. Without a field and with a
constant collision frequency it is (nu / 2c)(P' - P) exactly [DysonBennett1980]_.

A small change of the electron density changes the phase path between fixed
ends by the integral of dn²/dX dX / (2 G) along the unchanged ray (Fermat).
"""

from collections.abc import Callable

import numpy as np

from magion.arrays import FloatArray, IntArray, dot, norm
from magion.constants import (
    EARTH_RADIUS,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
    SPEED_OF_LIGHT,
)
from magion.field import MagneticField, flux_density
from magion.ionosphere.collisions import collision_frequency
from magion.ionosphere.medium import Medium
from magion.rays.batch import Track
from magion.waves import (
    collision_ratio,
    gyro_ratio,
    index_squared_and_slopes,
    plasma_ratio,
    refractive_index_squared,
)

_SPACING = 1e3
_NEPER_DB = 20.0 / np.log(10.0)

Collisions = Callable[[FloatArray, FloatArray], FloatArray]


def _samples(track: Track) -> FloatArray:
    length = float(track.group_path[-1] - track.group_path[0])
    even = np.linspace(track.group_path[0], track.group_path[-1], int(length / _SPACING) + 2)
    return np.union1d(even, track.group_path)


def absorption(
    track: Track,
    frequency: float,
    extraordinary: bool,
    which: int,
    medium: Medium,
    field: MagneticField | None,
    collisions: Collisions = collision_frequency,
) -> float:
    """Absorption of one wave along one hop.

    Parameters
    ----------
    track : Track
        Nodes of its ray through the ionosphere.
    frequency : float
        Wave frequency [Hz].
    extraordinary : bool
        Which wave [1].
    which : int
        Index of the ionosphere within the medium [1].
    medium, field
        Electron density and geomagnetic field; None for no field.
    collisions : callable
        Effective collision frequency [s⁻¹] from heights [m] and densities [m⁻³].

    Returns
    -------
    float
        Absorption [dB].
    """
    path = _samples(track)
    state = track.sample(path)
    position, p = state[0:3], state[3:6]
    density, _ = medium.density(position, np.full(path.size, which))
    nu = collisions(norm(position) - EARTH_RADIUS, density)
    X, Z = plasma_ratio(density, frequency), collision_ratio(nu, frequency)
    p_squared = dot(p, p)
    if field is None:
        loss = X * Z / (1.0 + Z * Z)
        G = p_squared + X
    else:
        flux, _ = field.at(position)
        magnitude = flux_density(flux)
        Y = gyro_ratio(magnitude, frequency)
        cosine = np.clip(dot(p, flux) / (np.sqrt(p_squared) * magnitude), -1.0, 1.0)
        square = refractive_index_squared(X, Y, Z, np.arccos(cosine))[int(extraordinary)]
        loss = -square.imag
        s = (Y * cosine) ** 2
        t = Y * Y - s
        _, by_x, by_t, by_s = index_squared_and_slopes(X, t, s, np.full(X.shape, extraordinary))
        G = p_squared - X * by_x - t * by_t - s * by_s
    rate = np.pi * frequency / SPEED_OF_LIGHT * loss / G
    rate = np.where(np.isfinite(rate), rate, 0.0)
    return float(_NEPER_DB * np.trapezoid(rate, path))


def phase_path_change(
    track: Track,
    frequency: float,
    extraordinary: bool,
    which: IntArray,
    medium: Medium,
    field: MagneticField,
) -> FloatArray:
    """Change of the phase path between fixed ends as the ionosphere changes.

    Parameters
    ----------
    track : Track
        Nodes of the ray in the unchanged ionosphere.
    frequency : float
        Wave frequency [Hz].
    extraordinary : bool
        Which wave [1].
    which : ndarray of int, shape (1 + m,)
        Indices within the medium of the unchanged ionosphere and of m changed
        ones, close to it [1].
    medium, field
        Electron density and geomagnetic field.

    Returns
    -------
    ndarray, shape (m,)
        Change of the phase path in each [m].
    """
    path = _samples(track)
    state = track.sample(path)
    position, p = state[0:3], state[3:6]
    densities = [medium.density(position, np.full(path.size, w))[0] for w in which]
    flux, _ = field.at(position)
    Y = gyro_ratio(flux, frequency)
    p_squared = dot(p, p)
    s = dot(Y, p) ** 2 / p_squared
    t = np.maximum(dot(Y, Y) - s, 0.0)
    X = plasma_ratio(densities[0], frequency)
    _, by_x, by_t, by_s = index_squared_and_slopes(X, t, s, np.full(X.shape, extraordinary))
    G = p_squared - X * by_x - t * by_t - s * by_s
    factor = PLASMA_FREQUENCY_SQUARED_PER_DENSITY / frequency**2
    weight = 0.5 * factor * by_x / G
    weight = np.where(np.isfinite(weight), weight, 0.0)
    return np.array([np.trapezoid(weight * (d - densities[0]), path) for d in densities[1:]])
