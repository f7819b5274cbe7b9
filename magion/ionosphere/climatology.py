"""Layer parameters from the published international climatology.

Only layer parameters are taken (foF2, hmF2, thickness, foE, probability of
F1): they do not depend on what else is in the call, which the climatology's
own profile does. Its coefficient maps are the CCIR's; see [IRI]_ [PyIRI]_.
"""

from dataclasses import dataclass
from datetime import datetime
from typing import Final

import numpy as np

from magion.arrays import FloatArray
from magion.errors import require_range
from magion.geometry import as_utc
from magion.ionosphere.layers import LayerParameters, d_region_of_sun, smooth_step

MODEL: Final = "international climatology (CCIR maps)"
ASSUMED_FLUX: Final = 120.0
"""Solar flux taken where none is given [sfu]."""

_MIDDLE_F1 = 0.5


def flux_of_sunspots(sunspot_number: float) -> float:
    """Solar flux that goes with a twelve-month sunspot number (ITU-R P.371-8).

    Parameters
    ----------
    sunspot_number : float
        R12 [1].

    Returns
    -------
    float
        Phi12 = 63.7 + 0.728 R12 + 8.9e-4 R12² [sfu].

    Examples
    --------
    >>> round(flux_of_sunspots(100.0), 3)
    145.4
    """
    return 63.7 + 0.728 * sunspot_number + 8.9e-4 * sunspot_number**2


def sunspots_of_flux(flux: float) -> float:
    """Twelve-month sunspot number that goes with a solar flux (ITU-R P.371-8).

    Parameters
    ----------
    flux : float
        Phi12 [sfu].

    Returns
    -------
    float
        R12 = sqrt(167273 + 1123.6 (Phi12 - 63.7)) - 408.99, not below 0 [1].
    """
    return max(0.0, float(np.sqrt(167_273.0 + 1123.6 * (flux - 63.7))) - 408.99)


@dataclass(frozen=True, slots=True, kw_only=True)
class Climate:
    """Layer parameters of places and hours of one day.

    Parameters
    ----------
    fof2, foe, fof1 : ndarray, shape (hours, places)
        Critical frequencies [Hz].
    hmf2, hmf1, f2_bottom, f2_top : ndarray, shape (hours, places)
        Heights and thicknesses [m].
    m3000 : ndarray, shape (hours, places)
        Propagation factor M(3000)F2 [1].
    f1_share : ndarray, shape (hours, places)
        0 where there is no F1 ledge, 1 where there is [1].
    zenith : ndarray, shape (hours, places)
        Solar zenith angle [rad].
    source : str
        Name of the model with its driver.
    """

    fof2: FloatArray
    foe: FloatArray
    fof1: FloatArray
    hmf2: FloatArray
    hmf1: FloatArray
    f2_bottom: FloatArray
    f2_top: FloatArray
    m3000: FloatArray
    f1_share: FloatArray
    zenith: FloatArray
    source: str

    def places(self, hour: int) -> LayerParameters:
        """Layer parameters of all places at one hour.

        Parameters
        ----------
        hour : int
            Index of the hour [1].

        Returns
        -------
        LayerParameters
            The layers, arrays over the places.
        """
        d_height, d_gradient = d_region_of_sun(self.zenith[hour])
        return LayerParameters(
            fof2=self.fof2[hour],
            hmf2=self.hmf2[hour],
            f2_bottom=self.f2_bottom[hour],
            f2_top=self.f2_top[hour],
            foe=self.foe[hour],
            hme=110e3,
            e_bottom=5e3,
            e_top=7e3,
            fof1=self.fof1[hour],
            hmf1=self.hmf1[hour],
            f1_share=self.f1_share[hour],
            source=self.source,
            d_height=d_height,
            d_gradient=d_gradient,
        )

    def layers(self, hour: int, place: int) -> LayerParameters:
        """Layer parameters of one hour and place.

        Parameters
        ----------
        hour, place : int
            Indices into the arrays [1].

        Returns
        -------
        LayerParameters
            The layers.
        """
        return self.places(hour).at(place)


def f1_critical_frequency(
    zenith_deg: FloatArray, dip_latitude_deg: FloatArray, sunspot_number: float
) -> FloatArray:
    """Critical frequency of the F1 layer [DuCharme1973]_.

    Parameters
    ----------
    zenith_deg : ndarray
        Solar zenith angle [deg].
    dip_latitude_deg : ndarray
        Magnetic dip latitude [deg].
    sunspot_number : float
        R12 [1].

    Returns
    -------
    ndarray
        foF1; 0 with the sun down [MHz].
    """
    lam = np.abs(dip_latitude_deg)
    low = 4.35 + 0.0058 * lam - 1.20e-4 * lam**2
    high = 5.348 + 0.011 * lam - 2.30e-4 * lam**2
    power = 0.093 + 0.0046 * lam - 5.4e-5 * lam**2 + 3.0e-4 * sunspot_number
    overhead = low + 0.01 * (high - low) * sunspot_number
    return np.asarray(overhead * np.maximum(np.cos(np.radians(zenith_deg)), 0.0) ** power)


def climate(
    latitude: FloatArray,
    longitude: FloatArray,
    when: datetime,
    hours: FloatArray,
    flux: float,
) -> Climate:
    """Layer parameters at places through one day.

    Parameters
    ----------
    latitude, longitude : ndarray, shape (places,)
        Places [rad].
    when : datetime
        The day; without a zone, UTC.
    hours : ndarray, shape (hours,)
        Hours of that UTC day, 0 to below 24 [h].
    flux : float
        Solar radio flux at 10.7 cm, 60 to 300 [sfu].

    Returns
    -------
    Climate
        The parameters.

    Raises
    ------
    InputError
        If the flux is out of range.
    """
    require_range("solar flux", flux, 60.0, 300.0, "sfu")
    import logging

    speaks = logging.raiseExceptions
    import PyIRI
    import PyIRI.edp_update

    logging.raiseExceptions = speaks  # the import above switches it off for everyone
    day = as_utc(when)
    f2, f1, e, _, _, magnetic, _ = PyIRI.edp_update.IRI_density_1day(
        day.year,
        day.month,
        day.day,
        np.asarray(hours, dtype=np.float64),
        np.degrees(longitude),
        np.degrees(latitude),
        np.array([300.0]),
        flux,
        PyIRI.coeff_dir,
        0,
    )
    hmf2 = np.asarray(f2["hm"]) * 1e3
    zenith_deg = np.asarray(e["solzen"])
    sunspots = sunspots_of_flux(flux)
    fof1 = f1_critical_frequency(zenith_deg, np.asarray(magnetic["mag_dip_lat"]), sunspots)
    return Climate(
        fof2=np.asarray(f2["fo"]) * 1e6,
        foe=np.asarray(e["fo"]) * 1e6,
        fof1=fof1 * 1e6,
        hmf2=hmf2,
        hmf1=np.minimum(165e3 + 642.8 * np.minimum(zenith_deg, 90.0), 110e3 + 0.6 * (hmf2 - 110e3)),
        f2_bottom=np.asarray(f2["B_bot"]) * 1e3,
        f2_top=np.asarray(f2["B_top"]) * 1e3,
        m3000=np.asarray(f2["M3000"]),
        f1_share=smooth_step((np.asarray(f1["P"]) - _MIDDLE_F1) / 0.2 + 0.5),
        zenith=np.radians(zenith_deg),
        source=f"{MODEL}, solar flux {flux:.0f}",
    )
