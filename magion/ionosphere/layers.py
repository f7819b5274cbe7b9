"""Layer parameters, and the electron density they stand for.

The profile is our own: each layer an Epstein function of its published
thickness, joined so that the critical frequencies and peak heights asked for
are met exactly and everything is smooth to the third derivative.

    N(h) = fade(h) [N_F2(h) + N_F1(h)] + N_E(h) + N_Es(h)     above 95 km
    N(h) = N_D(h)                                             below 80 km

`fade` is 0 at the E peak and 1 some 40 km above, so that no tail of F moves
foE; the E and F1 layers end below the F2 peak, so that none moves foF2.
Between 80 and 95 km the logarithms of both are blended. The D region is the
exponential one of [WaitSpies1964]_.
"""

from dataclasses import dataclass, fields, replace
from typing import Any, Final, TypeAlias

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray
from magion.constants import PLASMA_FREQUENCY_SQUARED_PER_DENSITY

FloatOrArray: TypeAlias = float | FloatArray

BASE: Final = 60e3
"""Lowest height of the profiles built here [m]."""

TOP: Final = 640e3
"""Greatest height of the profiles built here: the F2 peak may lie at 600 km, and
rays are let go 26 km below the top [m]."""

_FADE = 40e3
_E_TOP_END = 90e3
_ONSET = 10e3
_D_TOP, _E_BOTTOM = 80e3, 95e3

SPORADIC_HEIGHT: Final = 105e3
"""Height of a sporadic E layer [m]."""

_SPORADIC_THICKNESS = 700.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LayerParameters:
    """Parameters of the D, E, F1 and F2 regions over one place or several.

    Parameters
    ----------
    fof2, hmf2 : float or ndarray, shape (places,)
        Critical frequency [Hz] and peak height [m] of F2.
    f2_bottom, f2_top : float or ndarray
        Epstein thickness of F2 below and above its peak [m].
    foe, hme : float or ndarray
        Critical frequency [Hz] and peak height [m] of E.
    e_bottom, e_top : float or ndarray
        Epstein thickness of E below and above its peak [m].
    fof1, hmf1 : float or ndarray
        Critical frequency [Hz] and height [m] of the F1 ledge.
    f1_share : float or ndarray
        0 where there is no F1, 1 where there is, between at its coming and
        going [1].
    source : str
        Where the parameters come from.
    d_height, d_gradient : float or ndarray
        Reference height h' [m] and steepness beta [1/m] of the D region.
    foes : float
        Critical frequency of sporadic E; 0 where there is none [Hz].
    """

    fof2: FloatOrArray
    hmf2: FloatOrArray
    f2_bottom: FloatOrArray
    f2_top: FloatOrArray
    foe: FloatOrArray
    hme: FloatOrArray
    e_bottom: FloatOrArray
    e_top: FloatOrArray
    fof1: FloatOrArray
    hmf1: FloatOrArray
    f1_share: FloatOrArray
    source: str
    d_height: FloatOrArray = 72.3e3
    d_gradient: FloatOrArray = 0.34e-3
    foes: float = 0.0

    def at(self, place: int) -> "LayerParameters":
        """The parameters of one of several places.

        Parameters
        ----------
        place : int
            Index of the place [1].

        Returns
        -------
        LayerParameters
            With plain numbers.
        """
        values: dict[str, Any] = {}
        for field in fields(self):
            value = getattr(self, field.name)
            values[field.name] = float(value[place]) if isinstance(value, np.ndarray) else value
        return LayerParameters(**values)

    def scaled(
        self, *, fof2: float = 1.0, hmf2: float = 1.0, foe: float = 1.0
    ) -> "LayerParameters":
        """The same layers with ratios to the climatology, at every place alike.

        Parameters
        ----------
        fof2, hmf2, foe : float
            Factors of the critical frequencies and of the height of F2 above
            100 km; its thickness scales with that height, and the F1 ledge
            keeps its relative place [1].

        Returns
        -------
        LayerParameters
            The changed layers.
        """
        peak = 100e3 + (self.hmf2 - 100e3) * hmf2
        return replace(
            self,
            fof2=self.fof2 * fof2,
            foe=self.foe * foe,
            hmf2=peak,
            f2_bottom=self.f2_bottom * hmf2,
            f2_top=self.f2_top * hmf2,
            hmf1=self.hme + (self.hmf1 - self.hme) * (peak - self.hme) / (self.hmf2 - self.hme),
        )

    def with_values(
        self, *, fof2: float | None = None, hmf2: float | None = None, foe: float | None = None
    ) -> "LayerParameters":
        """The layers of one place with measured values in place of the climatology's.

        Parameters
        ----------
        fof2, foe : float, optional
            Critical frequencies [Hz].
        hmf2 : float, optional
            Peak height of F2 [m].

        Returns
        -------
        LayerParameters
            The changed layers, by :meth:`scaled`.
        """
        return self.scaled(
            fof2=1.0 if fof2 is None else fof2 / float(self.fof2),
            hmf2=1.0 if hmf2 is None else (hmf2 - 100e3) / (float(self.hmf2) - 100e3),
            foe=1.0 if foe is None else foe / float(self.foe),
        )


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


def epstein(height: FloatArray, peak: ArrayLike, thickness: ArrayLike) -> FloatArray:
    """Epstein layer of unit peak, 4 e^z / (1 + e^z)² = sech²(z / 2).

    Parameters
    ----------
    height : ndarray
        Heights [m].
    peak : array_like
        Height of the peak [m].
    thickness : array_like
        Thickness parameter B; z = (h - peak) / B [m].

    Returns
    -------
    ndarray
        The layer, 0 to 1 [1].
    """
    z = np.clip((height - np.asarray(peak)) / np.asarray(thickness), -600.0, 600.0)
    return np.asarray(1.0 / np.cosh(0.5 * z) ** 2)


def skew_epstein(
    height: FloatArray, peak: ArrayLike, bottom: ArrayLike, top: ArrayLike
) -> FloatArray:
    """Epstein layer of unit peak with one thickness below and another above.

    The hyperbolic functions of the Epstein layer are taken with their own
    thickness on each side, weighted so that the slope at the peak is zero; the
    curve has no joint. With equal thicknesses it is :func:`epstein`.

    Parameters
    ----------
    height : ndarray
        Heights [m].
    peak : array_like
        Height of the peak [m].
    bottom, top : array_like
        Thickness far below and far above the peak [m].

    Returns
    -------
    ndarray
        The layer, 0 to 1 [1].
    """
    u = height - np.asarray(peak)
    bottom, top = np.asarray(bottom), np.asarray(top)
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


def d_region(height: FloatArray, reference: ArrayLike, gradient: ArrayLike) -> FloatArray:
    """Exponential D region [WaitSpies1964]_.

    Parameters
    ----------
    height : ndarray
        Heights [m].
    reference : array_like
        Reference height h' [m].
    gradient : array_like
        Steepness beta [1/m].

    Returns
    -------
    ndarray
        1.43e13 exp(-0.15 h') exp((beta - 0.15)(h - h')), h in km [m⁻³].
    """
    h, top = height * 1e-3, np.asarray(reference) * 1e-3
    beta = np.asarray(gradient) * 1e3
    return np.asarray(1.43e13 * np.exp(-0.15 * top + (beta - 0.15) * (h - top)))


def d_region_of_sun(zenith: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Reference height and steepness of the D region under the sun.

    Day values within the published range (70-74 km, 0.3-0.45 per km), a little
    lower under a high sun; night values 86 km and 0.55 per km; a smooth change
    between zenith angles of 80 and 98 degrees (our own choice).

    Parameters
    ----------
    zenith : array_like
        Solar zenith angle [rad].

    Returns
    -------
    reference : ndarray
        h' [m].
    gradient : ndarray
        beta [1/m].
    """
    angle = np.asarray(zenith, dtype=np.float64)
    day_height = 75.0e3 - 3.4e3 * np.sqrt(np.maximum(np.cos(angle), 0.0))
    night = smooth_step((np.degrees(angle) - 80.0) / 18.0)
    return day_height + (86.0e3 - day_height) * night, 0.34e-3 + (0.55e-3 - 0.34e-3) * night


def layered_density(height: FloatArray, layers: LayerParameters) -> FloatArray:
    """Electron density of the layers at heights.

    Parameters
    ----------
    height : ndarray, shape (k,)
        Heights [m].
    layers : LayerParameters
        The layers, of one place or of several.

    Returns
    -------
    ndarray, shape (k,) or (places, k)
        Electron density [m⁻³]; 0 below 60 km.
    """

    def wide(value: FloatOrArray) -> FloatArray:
        return np.asarray(value, dtype=np.float64)[..., None]

    hme, hmf2, hmf1 = wide(layers.hme), wide(layers.hmf2), wide(layers.hmf1)
    bottom = wide(layers.f2_bottom)
    # A topside much thicker than the bottomside would make a second maximum.
    top = np.clip(wide(layers.f2_top), bottom, 1.6 * bottom)
    nm_f2 = density_of_frequency(wide(layers.fof2))
    nm_e = density_of_frequency(wide(layers.foe))
    e_end = np.minimum(hme + _E_TOP_END, hmf2)

    def f2_layer(h: FloatArray) -> FloatArray:
        thickness = bottom + (top - bottom) * smooth_step((h - hmf2) / 100e3)
        return nm_f2 * epstein(h, hmf2, thickness)

    def e_layer(h: FloatArray) -> FloatArray:
        shape = skew_epstein(h, hme, wide(layers.e_bottom), wide(layers.e_top))
        return nm_e * shape * (1.0 - smooth_step((h - hme - 10e3) / (e_end - hme - 10e3)))

    missing = density_of_frequency(np.minimum(wide(layers.fof1), 0.9 * wide(layers.fof2)))
    missing = np.maximum(missing - f2_layer(hmf1) - e_layer(hmf1), 0.0) * wide(layers.f1_share)
    ledge = epstein(height, hmf1, 0.25 * (hmf1 - hme) + 5e3)
    ledge = missing * ledge * (1.0 - smooth_step((height - hmf1) / (hmf2 - hmf1)))
    e_region = e_layer(height)
    if layers.foes > 0.0:
        at_height = e_layer(np.full(1, SPORADIC_HEIGHT))
        extra = np.maximum(density_of_frequency(layers.foes) - at_height, 0.0)
        e_region = e_region + extra * epstein(height, SPORADIC_HEIGHT, _SPORADIC_THICKNESS)
    fade = smooth_step((height - hme) / _FADE)
    total = fade * (f2_layer(height) + ledge) + e_region
    share = smooth_step((height - _D_TOP) / (_E_BOTTOM - _D_TOP))
    below = d_region(height, wide(layers.d_height), wide(layers.d_gradient))
    joined = np.exp(share * np.log(np.maximum(total, 1.0)) + (1.0 - share) * np.log(below))
    total = np.where(height >= _E_BOTTOM, total, joined)
    return np.asarray(total * smooth_step((height - BASE) / _ONSET))
