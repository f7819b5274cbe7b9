"""The ground as a mirror: permittivity and reflection coefficients.

Time factor exp(+i omega t), so a conducting ground has a negative imaginary
permittivity. R_H multiplies the horizontal electric field. R_V multiplies the
field in the plane of incidence, with the sign of the magnetic field's ratio:
a perfect conductor has R_H = -1 and R_V = +1 [Fresnel]_.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import ComplexArray

_CONDUCTIVITY_FACTOR = 1.0 / (2.0 * np.pi * 8.8541878128e-12)


@dataclass(frozen=True, slots=True, kw_only=True)
class Ground:
    """Electrical constants of a ground.

    Parameters
    ----------
    permittivity : float
        Relative permittivity [1].
    conductivity : float
        Conductivity [S/m].
    """

    permittivity: float
    conductivity: float

    def complex_permittivity(self, frequency: ArrayLike) -> ComplexArray:
        """Complex relative permittivity.

        Parameters
        ----------
        frequency : array_like
            Frequency [Hz].

        Returns
        -------
        ndarray of complex
            eps_r - i sigma / (omega eps_0) [1].
        """
        f = np.asarray(frequency, dtype=np.float64)
        lossy = 1j * (_CONDUCTIVITY_FACTOR * self.conductivity / f)
        return np.asarray(self.permittivity - lossy, dtype=np.complex128)


AVERAGE: Final = Ground(permittivity=13.0, conductivity=0.005)
"""Average land, taken at the bounces between hops (common practice)."""

PERFECT: Final = Ground(permittivity=1.0, conductivity=1e15)
"""A perfect conductor, as good as one."""

CLASSES: Final = {
    "sea": Ground(permittivity=70.0, conductivity=5.0),
    "wet": Ground(permittivity=30.0, conductivity=0.01),
    "medium-dry": Ground(permittivity=15.0, conductivity=0.001),
    "very-dry": Ground(permittivity=3.0, conductivity=1e-4),
    "average": AVERAGE,
}
"""Classes of ground by name: those of ITU-R P.527, and average land [P527]_."""


def reflection(
    ground: Ground, frequency: ArrayLike, elevation: ArrayLike
) -> tuple[ComplexArray, ComplexArray]:
    """Fresnel reflection coefficients of a ground.

    Parameters
    ----------
    ground : Ground
        The ground.
    frequency : array_like
        Frequency [Hz].
    elevation : array_like
        Angle between ray and horizontal, 0 to pi/2 [rad].

    Returns
    -------
    horizontal, vertical : ndarray of complex
        R_H and R_V [1].
    """
    eps = ground.complex_permittivity(frequency)
    sine = np.sin(np.asarray(elevation, dtype=np.float64))
    root = np.sqrt(eps - 1.0 + sine * sine)
    horizontal = (sine - root) / (sine + root)
    vertical = (eps * sine - root) / (eps * sine + root)
    return horizontal, vertical
