"""The field at one place, and both waves at one point of plasma."""

import math
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from magion.answers.inputs import FREQUENCY_MHZ, finite_or_none
from magion.errors import require_range
from magion.field import (
    MODEL,
    declination,
    dip,
    field_at,
    flux_density,
    gyrofrequency,
    require_date,
)
from magion.geometry import Place
from magion.polarization import LARGEST_AXIAL_RATIO_DB, Hand, axial_ratio_db, hand_of
from magion.waves import characteristic_waves, polarization_ratio

HEIGHT_KM = 0.0, 1000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class FieldAnswer:
    """The geomagnetic field at one place.

    Parameters
    ----------
    latitude_deg, longitude_deg : float
        The place [deg].
    height_km : float
        Height above the ellipsoid [km].
    date : str
        Date, YYYY-MM-DD.
    east_nt, north_nt, up_nt, flux_density_nt : float
        Components and total [nT].
    dip_deg, declination_deg : float
        Dip (positive down) and declination (positive east) [deg].
    gyrofrequency_mhz : float
        Electron gyrofrequency [MHz].
    model : str
        Field model.
    """

    latitude_deg: float
    longitude_deg: float
    height_km: float
    date: str
    east_nt: float
    north_nt: float
    up_nt: float
    flux_density_nt: float
    dip_deg: float
    declination_deg: float
    gyrofrequency_mhz: float
    model: str


def answer_field(place: Place, when: datetime, *, height_km: float = 300.0) -> FieldAnswer:
    """The geomagnetic field at a place.

    Parameters
    ----------
    place : Place
        Where.
    when : datetime
        Date, 1900 to 2030.
    height_km : float
        Height, 0 to 1000 [km].

    Returns
    -------
    FieldAnswer
        Components, dip, declination, gyrofrequency.

    Raises
    ------
    InputError
        If the height is out of range.
    OutsideModelError
        If the date is outside the field model.
    """
    require_range("height", height_km, *HEIGHT_KM, "km")
    instant = require_date(when)
    b = field_at(place.latitude, place.longitude, height_km * 1e3, instant)
    total = float(flux_density(b))
    return FieldAnswer(
        latitude_deg=place.latitude_deg,
        longitude_deg=place.longitude_deg,
        height_km=height_km,
        date=f"{instant:%Y-%m-%d}",
        east_nt=float(b[0]) * 1e9,
        north_nt=float(b[1]) * 1e9,
        up_nt=float(b[2]) * 1e9,
        flux_density_nt=total * 1e9,
        dip_deg=math.degrees(float(dip(b))),
        declination_deg=math.degrees(float(declination(b))),
        gyrofrequency_mhz=float(gyrofrequency(total)) / 1e6,
        model=MODEL,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class OneWave:
    """One characteristic wave at one point.

    Parameters
    ----------
    mu, chi : float or None
        n = mu - i chi [1]; None at a resonance.
    rho_re, rho_im : float or None
        Polarization ratio E_y / E_x [1]; None where it is infinite.
    hand : Hand
        About the wave normal, IEEE; of a linear wave the sign of what is left.
    axial_ratio_db : float or None
        Axial ratio; None beyond 60 dB [dB].
    """

    mu: float | None
    chi: float | None
    rho_re: float | None
    rho_im: float | None
    hand: Hand
    axial_ratio_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class WaveAnswer:
    """Both characteristic waves at one point of plasma.

    Parameters
    ----------
    X, Y, Z : float
        Magneto-ionic ratios [1].
    theta_deg : float
        Angle between wave normal and field [deg].
    ordinary, extraordinary : OneWave
        The waves.
    """

    X: float
    Y: float
    Z: float
    theta_deg: float
    ordinary: OneWave
    extraordinary: OneWave


def answer_wave(
    *,
    frequency_mhz: float,
    plasma_mhz: float,
    gyro_mhz: float,
    theta_deg: float,
    collisions: float = 0.0,
) -> WaveAnswer:
    """Both characteristic waves at one point of plasma.

    Parameters
    ----------
    frequency_mhz : float
        Wave frequency, 0.5 to 60 [MHz].
    plasma_mhz : float
        Plasma frequency, 0 to 100 [MHz].
    gyro_mhz : float
        Gyrofrequency, 0 to 10 [MHz].
    theta_deg : float
        Angle between wave normal and field, 0 to 180 [deg].
    collisions : float
        Effective collision frequency, 0 to 1e9 [s⁻¹].

    Returns
    -------
    WaveAnswer
        Ratios, indices, polarization.

    Raises
    ------
    InputError
        If a value is out of range.
    """
    require_range("frequency", frequency_mhz, *FREQUENCY_MHZ, "MHz")
    require_range("plasma frequency", plasma_mhz, 0.0, 100.0, "MHz")
    require_range("gyrofrequency", gyro_mhz, 0.0, 10.0, "MHz")
    require_range("theta", theta_deg, 0.0, 180.0, "degrees")
    require_range("collision frequency", collisions, 0.0, 1e9, "per second")
    X = (plasma_mhz / frequency_mhz) ** 2
    Y = gyro_mhz / frequency_mhz
    Z = collisions / (2.0 * math.pi * frequency_mhz * 1e6)
    theta = math.radians(theta_deg)
    found = characteristic_waves(X, Y, Z, theta)
    ratios = polarization_ratio(X, Y, Z, theta)
    records = []
    for n, vector, rho in zip(found.index, found.field, ratios, strict=True):
        ratio_db = float(axial_ratio_db(vector))
        linear = ratio_db > LARGEST_AXIAL_RATIO_DB
        infinite = not np.isfinite(rho) or abs(rho) > 1e9
        records.append(
            OneWave(
                mu=finite_or_none(float(n.real)),
                chi=finite_or_none(abs(float(n.imag))),
                rho_re=None if infinite else float(rho.real),
                rho_im=None if infinite else float(rho.imag),
                hand=hand_of(vector),
                axial_ratio_db=None if linear else ratio_db,
            )
        )
    return WaveAnswer(
        X=X, Y=Y, Z=Z, theta_deg=theta_deg, ordinary=records[0], extraordinary=records[1]
    )
