"""Layer parameters, and the electron density they stand for.

The profile is our own: each layer an Epstein function of its published
thickness, joined so that the critical frequencies and peak heights asked for
are met exactly and everything is smooth to the second derivative.

    N(h) = fade(h) N_F2(h) + fade(h) N_F1(h) + N_E(h)

`fade` is 0 at the E peak and 1 some 40 km above, so that no tail of F moves
foE; the E and F1 layers end below the F2 peak, so that none moves foF2. Below
the E peak the Epstein function of 5 km thickness runs on as the D region.
"""

from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray
from magion.constants import PLASMA_FREQUENCY_SQUARED_PER_DENSITY

BASE: Final = 60e3
"""Lowest height of the profiles built here [m]."""

TOP: Final = 600e3
"""Greatest height of the profiles built here [m]."""

_FADE = 40e3
_E_TOP_END = 90e3
_ONSET = 10e3


@dataclass(frozen=True, slots=True, kw_only=True)
class LayerParameters:
    """Parameters of the E, F1 and F2 layers over one place.

    Parameters
    ----------
    fof2, hmf2 : float
        Critical frequency [Hz] and peak height [m] of F2.
    f2_bottom, f2_top : float
        Epstein thickness of F2 below and above its peak [m].
    foe, hme : float
        Critical frequency [Hz] and peak height [m] of E.
    e_bottom, e_top : float
        Epstein thickness of E below and above its peak [m].
    fof1, hmf1 : float
        Critical frequency [Hz] and height [m] of the F1 ledge.
    f1_share : float
        0 where there is no F1, 1 where there is, between at its coming and
        going [1].
    source : str
        Where the parameters come from.
    """

    fof2: float
    hmf2: float
    f2_bottom: float
    f2_top: float
    foe: float
    hme: float
    e_bottom: float
    e_top: float
    fof1: float
    hmf1: float
    f1_share: float
    source: str

    def with_values(
        self, *, fof2: float | None = None, hmf2: float | None = None, foe: float | None = None
    ) -> "LayerParameters":
        """The same layers with typed values in place of the climatology's.

        Parameters
        ----------
        fof2, foe : float, optional
            Critical frequencies [Hz].
        hmf2 : float, optional
            Peak height of F2 [m]; the thickness below it scales with its
            height above 100 km, and the F1 ledge keeps its relative place.

        Returns
        -------
        LayerParameters
            The changed layers.
        """
        out = self
        if fof2 is not None:
            out = replace(out, fof2=fof2)
        if foe is not None:
            out = replace(out, foe=foe)
        if hmf2 is not None:
            stretch = (hmf2 - 100e3) / (self.hmf2 - 100e3)
            out = replace(
                out,
                hmf2=hmf2,
                f2_bottom=self.f2_bottom * stretch,
                f2_top=self.f2_top * stretch,
                hmf1=self.hme + (self.hmf1 - self.hme) * (hmf2 - self.hme) / (self.hmf2 - self.hme),
            )
        return out


def density_of_frequency(plasma_frequency: ArrayLike) -> FloatArray:
    """Electron density whose plasma frequency is given.

    Parameters
    ----------
    plasma_frequency : array_like
        f_N [Hz].

    Returns
    -------
    ndarray
        Electron density [m⁻³].
    """
    f = np.asarray(plasma_frequency, dtype=np.float64)
    return f * f / PLASMA_FREQUENCY_SQUARED_PER_DENSITY


def frequency_of_density(electron_density: ArrayLike) -> FloatArray:
    """Plasma frequency of an electron density.

    Parameters
    ----------
    electron_density : array_like
        Electron density [m⁻³].

    Returns
    -------
    ndarray
        f_N [Hz].
    """
    return np.sqrt(PLASMA_FREQUENCY_SQUARED_PER_DENSITY * np.asarray(electron_density))


def epstein(height: FloatArray, peak: float, thickness: ArrayLike) -> FloatArray:
    """Epstein layer of unit peak, 4 e^z / (1 + e^z)² = sech²(z / 2).

    Parameters
    ----------
    height : ndarray
        Heights [m].
    peak : float
        Height of the peak [m].
    thickness : array_like
        Thickness parameter B; z = (h - peak) / B [m].

    Returns
    -------
    ndarray
        The layer, 0 to 1 [1].
    """
    z = np.clip((height - peak) / np.asarray(thickness), -600.0, 600.0)
    return np.asarray(1.0 / np.cosh(0.5 * z) ** 2)


def skew_epstein(height: FloatArray, peak: float, bottom: float, top: float) -> FloatArray:
    """Epstein layer of unit peak with one thickness below and another above.

    The hyperbolic functions of the Epstein layer are taken with their own
    thickness on each side, weighted so that the slope at the peak is zero; the
    curve has no joint. With equal thicknesses it is :func:`epstein`.

    Parameters
    ----------
    height : ndarray
        Heights [m].
    peak : float
        Height of the peak [m].
    bottom, top : float
        Thickness far below and far above the peak [m].

    Returns
    -------
    ndarray
        The layer, 0 to 1 [1].
    """
    u = height - peak
    below = np.exp(np.minimum(-u / bottom, 600.0))
    above = np.exp(np.minimum(u / top, 600.0))
    return np.asarray(2.0 / (1.0 + (bottom * below + top * above) / (bottom + top)))


def chapman(height: FloatArray, peak: float, scale_height: float, zenith: float) -> FloatArray:
    """Chapman layer of unit peak under an overhead sun [Chapman1931]_.

    Parameters
    ----------
    height : ndarray
        Heights [m].
    peak : float
        Height of the peak under an overhead sun [m].
    scale_height : float
        Scale height H; z = (h - peak) / H [m].
    zenith : float
        Solar zenith angle, below 90 degrees [rad].

    Returns
    -------
    ndarray
        exp{(1 - z - sec(zenith) exp(-z)) / 2} [1].
    """
    z = (height - peak) / scale_height
    return np.asarray(np.exp(0.5 * (1.0 - z - np.exp(-z) / np.cos(zenith))))


def smooth_step(x: FloatArray) -> FloatArray:
    """Rise from 0 at 0 to 1 at 1, smooth to the third derivative.

    Parameters
    ----------
    x : ndarray
        Position [1].

    Returns
    -------
    ndarray
        x⁴ (35 - 84 x + 70 x² - 20 x³) between 0 and 1 [1].
    """
    x = np.clip(x, 0.0, 1.0)
    return x**4 * (35.0 + x * (-84.0 + x * (70.0 - 20.0 * x)))


def layered_density(height: FloatArray, layers: LayerParameters) -> FloatArray:
    """Electron density of the layers at heights.

    Parameters
    ----------
    height : ndarray
        Heights [m].
    layers : LayerParameters
        The layers.

    Returns
    -------
    ndarray
        Electron density [m⁻³]; 0 below 60 km.
    """
    fade = smooth_step((height - layers.hme) / _FADE)

    def f2_layer(h: FloatArray) -> FloatArray:
        above = smooth_step((h - layers.hmf2) / 100e3)
        # More than 1.6 times the lower thickness would make a second maximum.
        top = min(max(layers.f2_top, layers.f2_bottom), 1.6 * layers.f2_bottom)
        thickness = layers.f2_bottom + (top - layers.f2_bottom) * above
        return epstein(h, layers.hmf2, thickness)

    def e_layer(h: FloatArray) -> FloatArray:
        end = min(layers.hme + _E_TOP_END, layers.hmf2)
        shape = skew_epstein(h, layers.hme, layers.e_bottom, layers.e_top)
        return shape * (1.0 - smooth_step((h - layers.hme - 10e3) / (end - layers.hme - 10e3)))

    nm_f2 = float(density_of_frequency(layers.fof2))
    nm_e = float(density_of_frequency(layers.foe))
    total = nm_f2 * fade * f2_layer(height) + nm_e * e_layer(height)
    if layers.f1_share > 0.0:
        at_ledge = np.asarray([layers.hmf1])
        rest = nm_f2 * f2_layer(at_ledge)[0] + nm_e * e_layer(at_ledge)[0]
        missing = float(density_of_frequency(min(layers.fof1, 0.9 * layers.fof2))) - rest
        if missing > 0.0:
            thickness = 0.25 * (layers.hmf1 - layers.hme) + 5e3
            ledge = epstein(height, layers.hmf1, thickness)
            ledge = ledge * (
                1.0 - smooth_step((height - layers.hmf1) / (layers.hmf2 - layers.hmf1))
            )
            total = total + layers.f1_share * missing * fade * ledge
    return np.asarray(total * smooth_step((height - BASE) / _ONSET))
