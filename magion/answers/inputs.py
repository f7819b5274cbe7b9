"""Checks of what a user may ask, and the ionosphere that it describes."""

import math
from dataclasses import dataclass
from datetime import UTC, datetime

import numpy as np

from magion.errors import InputError, require_range
from magion.geometry import as_utc
from magion.ionosphere.layers import LayerParameters
from magion.ionosphere.profile import VerticalProfiles, profiles_of_layers

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
    profile : VerticalProfiles, optional
        A measured profile, used as it stands.
    profile_name : str, optional
        Where the profile comes from.

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
    profile: VerticalProfiles | None = None
    profile_name: str | None = None

    def __post_init__(self) -> None:
        for name, value, (low, high), unit in (
            ("solar flux", self.flux, FLUX_SFU, "sfu"),
            ("sunspot number", self.sunspots, SUNSPOTS, ""),
            ("foF2", self.fof2_mhz, FOF2_MHZ, "MHz"),
            ("foE", self.foe_mhz, FOE_MHZ, "MHz"),
            ("hmF2", self.hmf2_km, HMF2_KM, "km"),
            ("the error of foF2", self.fof2_error_mhz, (0.0, 10.0), "MHz"),
        ):
            if value is not None:
                require_range(name, value, low, high, unit)
        if self.flux is not None and self.sunspots is not None:
            raise InputError("solar flux and sunspot number contradict each other; give one")
        if self.profile is not None:
            for name, value in (
                ("foF2", self.fof2_mhz),
                ("hmF2", self.hmf2_km),
                ("foE", self.foe_mhz),
                ("solar flux", self.flux),
                ("sunspot number", self.sunspots),
            ):
                if value is not None:
                    raise InputError(
                        f"a measured profile and {name} contradict each other; give one"
                    )
        if self.fof2_mhz is not None and self.foe_mhz is not None and self.foe_mhz > self.fof2_mhz:
            raise InputError(
                f"foE {self.foe_mhz:g} MHz is above foF2 {self.fof2_mhz:g} MHz; "
                "accepted: foE up to foF2"
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class LocalIonosphere:
    """The ionosphere over one place.

    Parameters
    ----------
    profiles : VerticalProfiles
        Its profile.
    layers : LayerParameters or None
        Its layers; None for a measured profile.
    fof2, hmf2 : float
        Critical frequency [Hz] and peak height [m].
    foe : float or None
        Critical frequency of the E region, if it has a peak [Hz].
    source : str
        Where it comes from.
    caveats : tuple of str
        What the user should know about it.
    """

    profiles: VerticalProfiles
    layers: LayerParameters | None
    fof2: float
    hmf2: float
    foe: float | None
    source: str
    caveats: tuple[str, ...]


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

    return require_date(datetime.now(UTC) if when is None else as_utc(when))


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


def ionosphere_over(
    given: IonosphereInput, latitude: float, longitude: float, when: datetime
) -> LocalIonosphere:
    """The ionosphere over a place at an instant.

    Parameters
    ----------
    given : IonosphereInput
        What the user knows.
    latitude, longitude : float
        The place [rad].
    when : datetime
        The instant, UTC.

    Returns
    -------
    LocalIonosphere
        From the measured profile, or the climatology with typed values in it.
    """
    from magion.ionosphere.layers import frequency_of_density

    if given.profile is not None:
        density, height = given.profile.peak()
        e_peak = given.profile.e_peak()
        e_is_own = e_peak is not None and e_peak[1] < height
        return LocalIonosphere(
            profiles=given.profile,
            layers=None,
            fof2=float(frequency_of_density(density)),
            hmf2=height,
            foe=float(frequency_of_density(e_peak[0])) if e_peak and e_is_own else None,
            source=f"measured profile {given.profile_name or ''}".strip(),
            caveats=("The measured profile is taken as the same along the whole path.",),
        )
    from magion.ionosphere.climatology import climate

    flux, assumed = solar_flux(given)
    hour = when.hour + when.minute / 60.0 + when.second / 3600.0
    found = climate(np.array([latitude]), np.array([longitude]), when, np.array([hour]), flux)
    layers = found.layers(0, 0)
    typed = {
        "foF2": None if given.fof2_mhz is None else given.fof2_mhz * 1e6,
        "hmF2": None if given.hmf2_km is None else given.hmf2_km * 1e3,
        "foE": None if given.foe_mhz is None else given.foe_mhz * 1e6,
    }
    layers = layers.with_values(fof2=typed["foF2"], hmf2=typed["hmF2"], foe=typed["foE"])
    names = [name for name, value in typed.items() if value is not None]
    source = layers.source + (" (assumed)" if assumed else "")
    if names:
        source = f"{', '.join(names)} as typed; the rest: {source}"
    caveats = [assumed] if assumed and given.fof2_mhz is None else []
    if layers.foe > layers.fof2:
        caveats.append("foE is above foF2: the E region hides the F region from below.")
    profiles = profiles_of_layers([layers])
    return LocalIonosphere(
        profiles=profiles,
        layers=layers,
        fof2=layers.fof2,
        hmf2=layers.hmf2,
        foe=layers.foe,
        source=source,
        caveats=tuple(caveats),
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
