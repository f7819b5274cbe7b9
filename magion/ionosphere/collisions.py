"""Collision frequency of electrons."""

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray

_KNEE = 120e3


def electron_neutral(height: ArrayLike) -> FloatArray:
    """Effective electron-neutral collision frequency [WaitSpies1964]_.

    It is the effective value that the Appleton-Hartree formula wants, about 5/2
    of the mono-energetic one where the wave frequency is far above it
    [SenWyller1960]_. Above 120 km, where the atmosphere's scale height grows, it
    falls as (1 + (h - 120 km) / 60 km)**-3.47 (our own fit to the usual
    5.4e-16 n sqrt(T) at 150 to 300 km; from memory).

    Parameters
    ----------
    height : array_like
        Height [m].

    Returns
    -------
    ndarray
        1.816e11 exp(-0.15 h / km) up to 120 km [s⁻¹].

    Examples
    --------
    >>> round(float(electron_neutral(70e3)) / 1e6, 2)
    5.0
    """
    h = np.asarray(height, dtype=np.float64)
    above = np.maximum(h - _KNEE, 0.0)
    falling = 1.816e11 * np.exp(-0.15e-3 * np.minimum(h, _KNEE))
    return np.asarray(falling * (1.0 + above / 60e3) ** -3.47)


def electron_temperature(height: ArrayLike) -> FloatArray:
    """Electron temperature of a quiet day, for the collision frequency only.

    Parameters
    ----------
    height : array_like
        Height [m].

    Returns
    -------
    ndarray
        200 K at 100 km rising to 1500 K at 400 km (our own choice of round
        figures) [K].
    """
    h = np.asarray(height, dtype=np.float64)
    return np.interp(h, [100e3, 150e3, 250e3, 400e3], [200.0, 600.0, 1200.0, 1500.0])


def electron_ion(electron_density: ArrayLike, temperature: ArrayLike) -> FloatArray:
    """Electron-ion collision frequency [Kelley1989]_.

    Parameters
    ----------
    electron_density : array_like
        Electron density [m⁻³].
    temperature : array_like
        Electron temperature [K].

    Returns
    -------
    ndarray
        [34 + 4.18 ln(Te³ / Ne)] Ne Te^-1.5 with Ne in cm⁻³; 0 without plasma [s⁻¹].
    """
    per_cm3 = np.maximum(np.asarray(electron_density, dtype=np.float64) * 1e-6, 0.0)
    kelvin = np.asarray(temperature, dtype=np.float64)
    logarithm = np.log(kelvin**3 / np.maximum(per_cm3, 1e-6))
    return np.asarray((34.0 + 4.18 * logarithm) * per_cm3 * kelvin**-1.5)


def collision_frequency(height: ArrayLike, electron_density: ArrayLike) -> FloatArray:
    """Effective collision frequency of electrons with neutrals and ions.

    Parameters
    ----------
    height : array_like
        Height [m].
    electron_density : array_like
        Electron density [m⁻³].

    Returns
    -------
    ndarray
        Sum of :func:`electron_neutral` and :func:`electron_ion` [s⁻¹].
    """
    ions = electron_ion(electron_density, electron_temperature(height))
    return np.asarray(electron_neutral(height) + ions)
