"""The ray equations of both waves, for many rays at once.

The Hamiltonian is H = (p² - n²(r, p/|p|)) / 2 with the collisionless index of
the ray's own wave, and the independent variable is the group path P'
[Haselgrove1955]_ [Budden1985]_:

    dr/dP' = (dH/dp) / G,   dp/dP' = -(dH/dr) / G,   dP/dP' = p² / G
    G = p² - X dn²/dX - Y_T² dn²/dY_T² - Y_L² dn²/dY_L²     (n times the group index)

G stays finite where n goes to zero, so the step never blows up at reflection.
n² depends on the direction of p only through Y_L² = (Y . p)² / p².
"""

from dataclasses import dataclass

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray
from magion.constants import GYROFREQUENCY_PER_TESLA, PLASMA_FREQUENCY_SQUARED_PER_DENSITY
from magion.field import MagneticField
from magion.ionosphere.medium import Medium
from magion.waves import fast_slopes

STATE = 7
"""Numbers a ray carries: position (3) [m], wave vector p (3) [1], phase path (1) [m]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RaySet:
    """What distinguishes the rays of a batch.

    Parameters
    ----------
    frequency : ndarray, shape (n,)
        Wave frequency [Hz].
    extraordinary : ndarray of bool, shape (n,)
        Which wave.
    which : ndarray of int, shape (n,)
        Index of the ionosphere within the medium.
    """

    frequency: FloatArray
    extraordinary: BoolArray
    which: IntArray

    def take(self, index: IntArray | BoolArray) -> "RaySet":
        """Some of the rays.

        Parameters
        ----------
        index : ndarray
            Indices or a mask.

        Returns
        -------
        RaySet
            The chosen rays.
        """
        return RaySet(
            frequency=self.frequency[index],
            extraordinary=self.extraordinary[index],
            which=self.which[index],
        )


def derivative(
    state: FloatArray, rays: RaySet, medium: Medium, field: MagneticField | None
) -> FloatArray:
    """Right-hand side of the ray equations.

    See :func:`derivative_and_hamiltonian`, which this is without the second part.

    Parameters
    ----------
    state, rays, medium, field
        As there.

    Returns
    -------
    ndarray, shape (7, n)
        Derivatives by the group path [1], [1/m], [1].
    """
    return derivative_and_hamiltonian(state, rays, medium, field)[0]


def derivative_and_hamiltonian(
    state: FloatArray, rays: RaySet, medium: Medium, field: MagneticField | None
) -> tuple[FloatArray, FloatArray]:
    """Right-hand side of the ray equations, and how well a ray keeps to its wave.

    Parameters
    ----------
    state : ndarray, shape (7, n)
        Position [m], p [1], phase path [m].
    rays : RaySet
        Frequency, wave and ionosphere of each ray.
    medium : Medium
        Electron density.
    field : MagneticField or None
        Geomagnetic field; None switches it off, and both waves are alike.

    Returns
    -------
    slope : ndarray, shape (7, n)
        Derivatives by the group path [1], [1/m], [1].
    hamiltonian : ndarray, shape (n,)
        p² - n², which is zero along a true ray [1].
    """
    r, p = state[0:3], state[3:6]
    density, density_gradient = medium.density(r, rays.which)
    k_x = PLASMA_FREQUENCY_SQUARED_PER_DENSITY / (rays.frequency * rays.frequency)
    X = k_x * density
    out = np.empty_like(state)
    p_squared = _dot(p, p)
    if field is None:
        out[0:3] = p
        np.multiply(density_gradient, -0.5 * k_x, out=out[3:6])
        out[6] = p_squared
        # G = p² + X, which is 1 on the ray; dividing keeps it so off the ray as well.
        out /= p_squared + X
        return out, p_squared - 1.0 + X
    flux, flux_gradient = field.at(r)
    k_y = GYROFREQUENCY_PER_TESLA / rays.frequency
    Y = flux * k_y
    Y_p = _dot(Y, p) / np.maximum(p_squared, 1e-300)  # (Y · p) / p²
    s = Y_p * Y_p * p_squared
    t = np.maximum(_dot(Y, Y) - s, 0.0)
    square, by_x, by_t, by_s = fast_slopes(X, t, s, rays.extraordinary)
    swing = (by_s - by_t) * Y_p
    # ∂H/∂p = p − (∂n²/∂Y_L² − ∂n²/∂Y_T²)(Y·p/p²)(Y − (Y·p/p²) p)
    np.multiply(p, 1.0 + swing * Y_p, out=out[0:3])
    out[0:3] -= Y * swing
    lever = Y * (by_t * k_y)
    lever += p * (swing * k_y)
    np.einsum("in,ijn->jn", lever, flux_gradient, out=out[3:6])
    out[3:6] += density_gradient * (0.5 * k_x * by_x)
    out[6] = p_squared
    out /= p_squared - X * by_x - t * by_t - s * by_s
    return out, p_squared - square


def _dot(a: FloatArray, b: FloatArray) -> FloatArray:
    """Scalar product of vectors (3, n) in one call."""
    return np.asarray(np.einsum("in,in->n", a, b))
