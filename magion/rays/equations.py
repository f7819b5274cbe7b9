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

from magion.arrays import BoolArray, FloatArray, IntArray, dot
from magion.constants import GYROFREQUENCY_PER_TESLA, PLASMA_FREQUENCY_SQUARED_PER_DENSITY
from magion.field import FieldFit
from magion.ionosphere.medium import Medium
from magion.waves import index_squared_and_slopes

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
    state: FloatArray, rays: RaySet, medium: Medium, field: FieldFit | None
) -> FloatArray:
    """Right-hand side of the ray equations.

    Parameters
    ----------
    state : ndarray, shape (7, n)
        Position [m], p [1], phase path [m].
    rays : RaySet
        Frequency, wave and ionosphere of each ray.
    medium : Medium
        Electron density.
    field : FieldFit or None
        Geomagnetic field; None switches it off, and both waves are alike.

    Returns
    -------
    ndarray, shape (7, n)
        Derivatives by the group path [1], [1/m], [1].
    """
    r, p = state[0:3], state[3:6]
    density, density_gradient = medium.density(r, rays.which)
    k_x = PLASMA_FREQUENCY_SQUARED_PER_DENSITY / (rays.frequency * rays.frequency)
    out = np.empty_like(state)
    p_squared = dot(p, p)
    if field is None:
        out[0:3] = p
        out[3:6] = (-0.5 * k_x) * density_gradient
        out[6] = p_squared
        # G = p² + X, which is 1 on the ray; dividing keeps it so off the ray as well.
        return out / (p_squared + k_x * density)
    flux, flux_gradient = field.at(r)
    X = k_x * density
    k_y = GYROFREQUENCY_PER_TESLA / rays.frequency
    Y = flux * k_y
    Y_p = dot(Y, p) / np.maximum(p_squared, 1e-300)  # (Y · p) / p²
    s = Y_p * Y_p * p_squared
    t = np.maximum(dot(Y, Y) - s, 0.0)
    _, by_x, by_t, by_s = index_squared_and_slopes(X, t, s, rays.extraordinary)
    swing = (by_s - by_t) * Y_p
    inverse_g = 1.0 / (p_squared - X * by_x - t * by_t - s * by_s)
    # ∂H/∂p = p − (∂n²/∂Y_L² − ∂n²/∂Y_T²)(Y·p/p²)(Y − (Y·p/p²) p)
    out[0:3] = (p * (1.0 + swing * Y_p) - Y * swing) * inverse_g
    lever = Y * by_t + p * swing
    bend = np.einsum("in,ijn->jn", lever, flux_gradient)
    out[3:6] = (density_gradient * (0.5 * k_x * by_x) + bend * k_y) * inverse_g
    out[6] = p_squared * inverse_g
    return out


def hamiltonian(
    state: FloatArray, rays: RaySet, medium: Medium, field: FieldFit | None
) -> FloatArray:
    """p² - n², which is zero along a true ray.

    Parameters
    ----------
    state : ndarray, shape (7, n)
        As for :func:`derivative`.
    rays, medium, field
        As for :func:`derivative`.

    Returns
    -------
    ndarray, shape (n,)
        Twice the Hamiltonian [1].
    """
    r, p = state[0:3], state[3:6]
    density, _ = medium.density(r, rays.which)
    X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * density / (rays.frequency * rays.frequency)
    p_squared = dot(p, p)
    if field is None:
        return np.asarray(p_squared - 1.0 + X)
    Y = field.at(r)[0] * (GYROFREQUENCY_PER_TESLA / rays.frequency)
    s = dot(Y, p) ** 2 / np.maximum(p_squared, 1e-300)
    t = np.maximum(dot(Y, Y) - s, 0.0)
    return np.asarray(p_squared - index_squared_and_slopes(X, t, s, rays.extraordinary)[0])
