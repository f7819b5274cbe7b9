"""Electron density against height, as rays read it.

A table of uniform cubic B-splines: two continuous derivatives, one gather and
a cubic polynomial a point, and several profiles side by side so that rays of
different hours share one batch.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import Final

import numpy as np

from magion.arrays import FloatArray, IntArray
from magion.constants import EARTH_RADIUS
from magion.ionosphere.layers import (
    BASE,
    SPORADIC_HEIGHT,
    TOP,
    LayerParameters,
    frequency_of_density,
    layered_density,
)

SPACING: Final = 250.0
"""Distance of the spline's nodes [m]."""

_ROOM = 40e3
_LEAST_E = 1.24e8  # density of 0.1 MHz, the least foE there is [m⁻³]

_TO_POLYNOMIAL = (
    np.array(
        [[1.0, 4.0, 1.0, 0.0], [-3.0, 0.0, 3.0, 0.0], [3.0, -6.0, 3.0, 0.0], [-1.0, 3.0, -3.0, 1.0]]
    )
    / 6.0
)


@dataclass(frozen=True, slots=True, kw_only=True)
class VerticalProfiles:
    """One or several vertical profiles N(h), the same everywhere on the Earth.

    Parameters
    ----------
    base, top : float
        Lowest and greatest height with plasma [m].
    polynomials : ndarray, shape (profiles, cells, 4)
        Coefficients of 1, t, t², t³ in each cell, t from 0 to 1 [m⁻³].
    thin_layer : float or None
        Height of a sporadic E layer [m].
    """

    base: float
    top: float
    polynomials: FloatArray
    thin_layer: float | None = None

    def at_height(
        self, height: FloatArray, which: IntArray | int = 0
    ) -> tuple[FloatArray, FloatArray]:
        """Electron density and its slope at heights.

        Parameters
        ----------
        height : ndarray, shape (n,)
            Heights above the sphere [m].
        which : ndarray of int, shape (n,), or int
            Which profile.

        Returns
        -------
        electron_density : ndarray, shape (n,)
            Electron density, 0 outside base and top [m⁻³].
        slope : ndarray, shape (n,)
            dN/dh [m⁻⁴].
        """
        cells = self.polynomials.shape[1]
        x = np.minimum(np.maximum((height - self.base) * (1.0 / SPACING), 0.0), cells)
        cell = np.maximum(np.minimum(x.astype(np.intp), cells - 1), 0)  # NaN has no cell
        t = x - cell
        rows = self.polynomials.reshape(-1, 4).take(cell + which * cells, axis=0)
        c0, c1, c2, c3 = rows.T
        cubic = c3 * t
        inside = (x > 0.0) & (x < cells)
        density = (((cubic + c2) * t + c1) * t + c0) * inside
        slope = ((3.0 * cubic + 2.0 * c2) * t + c1) * (inside / SPACING)
        return density, slope

    def density(self, position: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        """Electron density and its gradient at positions.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].
        which : ndarray of int, shape (n,)
            Which profile.

        Returns
        -------
        electron_density : ndarray, shape (n,)
            Electron density [m⁻³].
        gradient : ndarray, shape (3, n)
            Its gradient [m⁻⁴].
        """
        radius = np.sqrt(np.einsum("in,in->n", position, position))
        density, slope = self.at_height(radius - EARTH_RADIUS, which)
        return density, position * (slope / radius)

    def peak(self, which: int = 0) -> tuple[float, float]:
        """Greatest density of a profile and its height.

        Parameters
        ----------
        which : int
            Which profile.

        Returns
        -------
        electron_density : float
            Density at the peak [m⁻³].
        height : float
            Height of the peak [m].
        """
        h = np.arange(self.base, self.top, 10.0)
        density, _ = self.at_height(h, which)
        best = int(np.argmax(density))
        return float(density[best]), float(h[best])

    def e_peak(self, which: int = 0) -> tuple[float, float] | None:
        """Greatest density of the E region, where it has a peak of its own.

        Parameters
        ----------
        which : int
            Which profile.

        Returns
        -------
        tuple of float or None
            Density [m⁻³] and height [m] of the highest local maximum between
            90 and 150 km; None if the density only rises there.
        """
        low, high = max(self.base, 90e3), min(self.top, 150e3)
        if high <= low:
            return None
        h = np.arange(low, high, 10.0)
        density, slope = self.at_height(h, which)
        rises = (slope[:-1] > 0.0) & (slope[1:] <= 0.0)
        summits = np.flatnonzero(rises & (density[:-1] > _LEAST_E))
        if summits.size == 0:
            return None
        best = int(summits[np.argmax(density[summits])])
        return float(density[best]), float(h[best])


def to_polynomials(samples: FloatArray) -> FloatArray:
    """Cubic polynomials of the cells from uniform B-spline coefficients.

    Parameters
    ----------
    samples : ndarray, shape (..., cells + 3)
        Spline coefficients; the first and last lie one node beyond the ends.

    Returns
    -------
    ndarray, shape (..., cells, 4)
        Coefficients of 1, t, t², t³ in each cell, t from 0 to 1.
    """
    window = np.stack([samples[..., i : samples.shape[-1] - 3 + i] for i in range(4)], axis=-1)
    return np.asarray(window @ _TO_POLYNOMIAL.T)


def tabulated(
    functions: Sequence[Callable[[FloatArray], FloatArray]],
    base: float,
    top: float,
    *,
    interpolate: bool,
) -> VerticalProfiles:
    """Profiles from functions of height.

    Parameters
    ----------
    functions : sequence of callable
        Each takes heights [m] and returns electron densities [m⁻³].
    base, top : float
        Range of heights; the profile is zero beyond it [m].
    interpolate : bool
        True to meet the function to fourth order of the spacing; False for the
        variation-diminishing spline, which never overshoots.

    Returns
    -------
    VerticalProfiles
        The profiles.
    """
    cells = max(int(np.ceil((top - base) / SPACING)), 4)
    h: FloatArray = base + SPACING * np.arange(-2.0, cells + 3)
    samples = np.stack([f(h) for f in functions])
    coefficients = samples[:, 1:-1]
    if interpolate:
        bend = samples[:, 2:] - 2.0 * samples[:, 1:-1] + samples[:, :-2]
        coefficients = np.maximum(coefficients - bend / 6.0, 0.0)
    return VerticalProfiles(
        base=base, top=base + SPACING * cells, polynomials=to_polynomials(coefficients)
    )


def profiles_of_layers(layers: Sequence[LayerParameters]) -> VerticalProfiles:
    """Profiles of layer parameters, 60 to 640 km.

    Parameters
    ----------
    layers : sequence of LayerParameters
        One for each profile.

    Returns
    -------
    VerticalProfiles
        The profiles.
    """
    found = tabulated(
        [partial(layered_density, layers=one) for one in layers],
        BASE,
        TOP,
        interpolate=True,
    )
    sporadic = any(one.foes > 0.0 for one in layers)
    return replace(found, thin_layer=SPORADIC_HEIGHT) if sporadic else found


def measured_profile(height: FloatArray, electron_density: FloatArray) -> VerticalProfiles:
    """A measured profile as it stands: monotone between its rows, zero outside.

    Parameters
    ----------
    height : ndarray, shape (n,)
        Strictly increasing heights [m].
    electron_density : ndarray, shape (n,)
        Densities at them [m⁻³].

    Returns
    -------
    VerticalProfiles
        The profile.
    """
    from scipy.interpolate import PchipInterpolator

    first = max(int(np.argmax(electron_density > 0.0)) - 1, 0)  # rays run straight below plasma
    height, electron_density = height[first:], electron_density[first:]
    low, high = float(height[0]), float(height[-1])
    curve = PchipInterpolator(height, electron_density)

    def rows(h: FloatArray) -> FloatArray:
        between = np.maximum(curve(np.clip(h, low, high)), 0.0)
        return np.where((h < low) | (h > high), 0.0, between)

    # Rays need an edge without a step: below the first row the spline comes to zero in two cells.
    # Above there is room for rays that turn close to the last row.
    edge = 2.0 * SPACING
    return tabulated(
        [rows],
        low - edge,
        high + _ROOM,
        interpolate=False,
    )


def critical_frequency(profiles: VerticalProfiles, which: int = 0) -> float:
    """Critical frequency of the ordinary wave at a profile's peak.

    Parameters
    ----------
    profiles : VerticalProfiles
        The profiles.
    which : int
        Which one.

    Returns
    -------
    float
        Plasma frequency at the peak [Hz].
    """
    return float(frequency_of_density(profiles.peak(which)[0]))
