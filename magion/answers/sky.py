"""Hand and shape of both waves over the whole sky, at one frequency."""

import math
from dataclasses import dataclass
from datetime import datetime
from typing import Final

import numpy as np

from magion.answers.inputs import instant, require_frequency
from magion.answers.sense import LIMITING_HEIGHT_KM
from magion.answers.sight import arriving_shapes
from magion.arrays import FloatArray
from magion.errors import require_range
from magion.field import declination, dip, field_at
from magion.geometry import Place

_ELEVATIONS: Final = np.arange(1.0, 90.01, 1.0)
_AZIMUTHS: Final = np.arange(0.0, 360.0, 3.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class SkyAnswer:
    """The ordinary wave over the sky; the extraordinary has the other hand.

    Parameters
    ----------
    name : str
        Name or coordinates of the place.
    date : str
        Date of the field.
    frequency_mhz : float
        Frequency [MHz].
    height_km : float
        Limiting height [km].
    dip_deg, declination_deg : float
        Of the field overhead at that height [deg].
    elevation_deg : ndarray, shape (elevations,)
        Above the horizontal [deg].
    azimuth_deg : ndarray, shape (azimuths,)
        Where the wave comes from [deg].
    ellipticity : ndarray, shape (elevations, azimuths)
        Minor over major axis, positive for RHCP: 1 and -1 are circular, 0 is
        linear [1].
    """

    name: str
    date: str
    frequency_mhz: float
    height_km: float
    dip_deg: float
    declination_deg: float
    elevation_deg: FloatArray
    azimuth_deg: FloatArray
    ellipticity: FloatArray


def answer_sky(
    place: Place,
    frequency_mhz: float,
    when: datetime | None = None,
    *,
    height_km: float = LIMITING_HEIGHT_KM,
) -> SkyAnswer:
    """Hand and shape of the ordinary wave over the sky.

    Parameters
    ----------
    place : Place
        The receiver.
    frequency_mhz : float
        Frequency, 0.5 to 60 [MHz].
    when : datetime, optional
        Instant of the field; now if not given.
    height_km : float
        Limiting height, 60 to 300 [km].

    Returns
    -------
    SkyAnswer
        Over a grid of directions.

    Raises
    ------
    InputError
        If a value is out of range.
    OutsideModelError
        If the date is outside the field model.
    """
    f = require_frequency(frequency_mhz)
    moment = instant(when)
    height = require_range("the limiting height", height_km, 60.0, 300.0, "km") * 1e3
    az, el = np.meshgrid(np.radians(_AZIMUTHS), np.radians(_ELEVATIONS))
    shapes = arriving_shapes(place, az, el, height, f, moment)
    minor = 10.0 ** (-shapes.axial_ratio_db[0] / 20.0)
    above = field_at(place.latitude, place.longitude, height, moment)
    return SkyAnswer(
        name=place.name or f"{place.latitude_deg:.2f}, {place.longitude_deg:.2f}",
        date=moment.strftime("%Y-%m-%d"),
        frequency_mhz=frequency_mhz,
        height_km=height_km,
        dip_deg=math.degrees(float(dip(above))),
        declination_deg=math.degrees(float(declination(above))),
        elevation_deg=_ELEVATIONS,
        azimuth_deg=_AZIMUTHS,
        ellipticity=np.where(shapes.right_hand[0], minor, -minor),
    )
