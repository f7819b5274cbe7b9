"""Checks of what a user may ask, and the ionosphere that it describes."""

import math
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import TYPE_CHECKING

from magion.errors import InputError, require_range
from magion.geometry import as_utc
from magion.ionosphere.profile import VerticalProfiles

if TYPE_CHECKING:
    from magion.formats.readings import Readings

FREQUENCY_MHZ = 0.5, 60.0
FOF2_MHZ = 0.5, 25.0
FOE_MHZ = 0.1, 10.0
HMF2_KM = 150.0, 600.0
FLUX_SFU = 60.0, 300.0
SUNSPOTS = 0.0, 250.0
_HIGHEST_PEAK_KM = 550.0


@dataclass(frozen=True, slots=True, kw_only=True)
class IonosphereInput:
    """What the user knows of the ionosphere.

    Parameters
    ----------
    flux : float, optional
        Solar radio flux, 60 to 300 [sfu].
    sunspots : float, optional
        Twelve-month sunspot number, 0 to 250 [1].
    fof2_mhz, foe_mhz : float, optional
        Critical frequencies, 0.5 to 25 and 0.1 to 10 [MHz].
    hmf2_km : float, optional
        Peak height of F2, 150 to 600 [km].
    fof2_error_mhz : float, optional
        Standard deviation of foF2 [MHz].
    foes_mhz : float, optional
        Critical frequency of sporadic E along the path, 0.5 to 25 [MHz].
    fof2_rate_mhz_per_h, hmf2_rate_km_per_h : float, optional
        How fast foF2 and hmF2 change, for Doppler shifts and fading
        [MHz/h, km/h].
    profile : VerticalProfiles, optional
        A measured profile, used as it stands.
    profile_name : str, optional
        Where the profile comes from.
    readings : Readings, optional
        Readings of an ionosonde over the day.
    readings_name : str, optional
        Where they come from.

    Raises
    ------
    InputError
        If a value is out of range or two contradict each other.
    """

    flux: float | None = None
    sunspots: float | None = None
    fof2_mhz: float | None = None
    hmf2_km: float | None = None
    foe_mhz: float | None = None
    fof2_error_mhz: float | None = None
    foes_mhz: float | None = None
    fof2_rate_mhz_per_h: float | None = None
    hmf2_rate_km_per_h: float | None = None
    profile: VerticalProfiles | None = None
    profile_name: str | None = None
    readings: "Readings | None" = None
    readings_name: str | None = None

    def __post_init__(self) -> None:
        for name, value, (low, high), unit in (
            ("solar flux", self.flux, FLUX_SFU, "sfu"),
            ("sunspot number", self.sunspots, SUNSPOTS, ""),
            ("foF2", self.fof2_mhz, FOF2_MHZ, "MHz"),
            ("foE", self.foe_mhz, FOE_MHZ, "MHz"),
            ("hmF2", self.hmf2_km, HMF2_KM, "km"),
            ("the error of foF2", self.fof2_error_mhz, (0.0, 10.0), "MHz"),
            ("foEs", self.foes_mhz, FOF2_MHZ, "MHz"),
            ("the rate of foF2", self.fof2_rate_mhz_per_h, (-20.0, 20.0), "MHz/h"),
            ("the rate of hmF2", self.hmf2_rate_km_per_h, (-500.0, 500.0), "km/h"),
        ):
            if value is not None:
                require_range(name, value, low, high, unit)
        if self.flux is not None and self.sunspots is not None:
            raise InputError("solar flux and sunspot number contradict each other; give one")
        layers = (
            ("foF2", self.fof2_mhz),
            ("hmF2", self.hmf2_km),
            ("foE", self.foe_mhz),
        )
        climate = (
            ("solar flux", self.flux),
            ("sunspot number", self.sunspots),
            ("foEs", self.foes_mhz),
            ("the rate of foF2", self.fof2_rate_mhz_per_h),
            ("the rate of hmF2", self.hmf2_rate_km_per_h),
            ("readings", self.readings),
        )
        for what, source, others in (
            ("a measured profile", self.profile, layers + climate),
            ("readings", self.readings, layers),
        ):
            clashing = [name for name, value in others if value is not None]
            if source is not None and clashing:
                raise InputError(f"{what} and {clashing[0]} contradict each other; give one")
        if self.fof2_mhz is not None and self.foe_mhz is not None and self.foe_mhz > self.fof2_mhz:
            raise InputError(
                f"foE {self.foe_mhz:g} MHz is above foF2 {self.fof2_mhz:g} MHz; "
                "accepted: foE up to foF2"
            )


def require_frequency(frequency_mhz: float) -> float:
    """A wave frequency within the accepted range, in Hz.

    Parameters
    ----------
    frequency_mhz : float
        Frequency, 0.5 to 60 [MHz].

    Returns
    -------
    float
        The frequency [Hz].

    Raises
    ------
    InputError
        If it is not a number within the range.
    """
    return require_range("frequency", frequency_mhz, *FREQUENCY_MHZ, "MHz") * 1e6


def instant(when: datetime | None) -> datetime:
    """The instant asked for; now, if none is given.

    Parameters
    ----------
    when : datetime or None
        An instant; without a zone, UTC.

    Returns
    -------
    datetime
        The instant in UTC.

    Raises
    ------
    OutsideModelError
        If it is outside the field model.
    """
    from magion.field import require_date

    now = datetime.now(UTC).replace(microsecond=0)
    return require_date(now if when is None else as_utc(when))


def solar_flux(given: IonosphereInput) -> tuple[float, str | None]:
    """The solar flux to use, and a caveat where it is assumed.

    Parameters
    ----------
    given : IonosphereInput
        What the user knows.

    Returns
    -------
    flux : float
        Solar flux [sfu].
    caveat : str or None
        Said where nothing was given.
    """
    from magion.ionosphere.climatology import ASSUMED_FLUX, flux_of_sunspots

    if given.flux is not None:
        return given.flux, None
    if given.sunspots is not None:
        return flux_of_sunspots(given.sunspots), None
    return ASSUMED_FLUX, (
        f"No solar flux was given: {ASSUMED_FLUX:g} sfu is assumed. Give --flux, or foF2 from "
        "an ionosonde."
    )


def finite_or_none(value: float) -> float | None:
    """A number for a record, or None where there is none.

    Parameters
    ----------
    value : float
        A number, perhaps NaN or infinite.

    Returns
    -------
    float or None
        The number if it is finite.
    """
    return float(value) if math.isfinite(value) else None
