"""Records of the answer for one path; their fields are the keys of its JSON."""

from dataclasses import dataclass
from typing import Final

from magion.answers.certainty import Change, StateProbabilities
from magion.answers.reception import AntennaOnPath
from magion.polarization import Hand, Shape
from magion.waves import Mode

SCHEMA: Final = "magion/path/1"


@dataclass(frozen=True, slots=True, kw_only=True)
class End:
    """An end of the path.

    Parameters
    ----------
    name : str or None
        The user's name for the place.
    latitude_deg, longitude_deg : float
        Place [deg].
    locator : str
        Six-sign grid locator.
    """

    name: str | None
    latitude_deg: float
    longitude_deg: float
    locator: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Midpoint:
    """A place on the ground.

    Parameters
    ----------
    latitude_deg, longitude_deg : float
        Place [deg].
    """

    latitude_deg: float
    longitude_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PathGeometry:
    """The great circle.

    Parameters
    ----------
    distance_km : float
        Length on the sphere [km].
    bearing_deg, back_bearing_deg : float or None
        From the transmitter, and from the receiver back; None where the
        places coincide [deg].
    midpoint : Midpoint
        Half-way.
    """

    distance_km: float
    bearing_deg: float | None
    back_bearing_deg: float | None
    midpoint: Midpoint


@dataclass(frozen=True, slots=True, kw_only=True)
class MidpointField:
    """The geomagnetic field over the midpoint.

    Parameters
    ----------
    height_km : float
        Height [km].
    flux_density_nt : float
        Total flux density [nT].
    dip_deg, declination_deg : float
        Dip (positive down), declination (positive east) [deg].
    gyrofrequency_mhz : float
        Electron gyrofrequency [MHz].
    model : str
        Field model.
    """

    height_km: float
    flux_density_nt: float
    dip_deg: float
    declination_deg: float
    gyrofrequency_mhz: float
    model: str


@dataclass(frozen=True, slots=True, kw_only=True)
class MidpointIonosphere:
    """The ionosphere over the midpoint.

    Parameters
    ----------
    source : str
        Where it comes from.
    fof2_mhz, fxf2_mhz : float
        Critical frequencies of the ordinary and extraordinary wave [MHz].
    hmf2_km : float
        Peak height [km].
    foe_mhz : float or None
        Critical frequency of E [MHz].
    fof2_error_mhz : float or None
        Standard deviation of foF2 [MHz].
    """

    source: str
    fof2_mhz: float
    fxf2_mhz: float
    hmf2_km: float
    foe_mhz: float | None
    fof2_error_mhz: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Launch:
    """How a wave leaves the transmitter.

    Parameters
    ----------
    azimuth_deg, elevation_deg : float
        Direction [deg].
    hand : Hand
        Hand that excites this wave.
    axial_ratio_db : float or None
        Its axial ratio; None beyond 60 dB [dB].
    """

    azimuth_deg: float
    elevation_deg: float
    hand: Hand
    axial_ratio_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Arrival:
    """Where a wave comes from at the receiver.

    Parameters
    ----------
    azimuth_deg, elevation_deg : float
        Direction to look [deg].
    """

    azimuth_deg: float
    elevation_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class IndexAtApex:
    """The plasma where a wave is turned back.

    Parameters
    ----------
    height_km : float
        Height [km].
    X, Y : float
        Magneto-ionic ratios [1].
    theta_deg : float
        Angle between wave normal and field [deg].
    mu, chi : float
        n = mu - i chi of this wave [1].
    """

    height_km: float
    X: float
    Y: float
    theta_deg: float
    mu: float
    chi: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Limiting:
    """The place that sets the hand.

    Parameters
    ----------
    height_km : float
        Height [km].
    latitude_deg, longitude_deg : float
        Place [deg].
    field_angle_deg : float
        Angle of the wave normal to the field; below 90 the extraordinary wave
        is right-hand [deg].
    """

    height_km: float
    latitude_deg: float
    longitude_deg: float
    field_angle_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class RayAnswer:
    """One ray of one wave; of a wave that does not arrive, the reason.

    Parameters
    ----------
    wave : Mode
        Which wave.
    arrives : bool
        Whether it does.
    reason : str or None
        Why not.
    layer, label : str or None
        Reflecting layer, and the trade's label.
    hops : int or None
        Number of hops [1].
    sequence : str or None
        Wave on each hop, "o" or "x"; the last is this wave.
    launch, arrival, index, limiting
        Parts of their own.
    group_path_km, phase_path_km, apogee_km : float or None
        Lengths and greatest height [km].
    group_delay_ms : float or None
        Time of travel [ms].
    absorption_db, level_db : float or None
        Absorption, and level to free space over the same path length [dB].
    margin_mhz : float or None
        Distance of the operating frequency below this wave's MUF [MHz].
    skip_km : float or None
        Least distance at which this wave comes down [km].
    receive_hand, transmit_hand : Hand or None
        Hand it arrives with, and hand that sends it back the same way.
    axial_ratio_db : float or None
        None beyond 60 dB [dB].
    major_axis_bearing_deg : float or None
        True bearing of the major axis as projected on the ground, 0 to 180 [deg].
    shape : Shape or None
        Circular, elliptical or linear.
    other_wave_db : float or None
        Power of the other wave fed on the way out, to this one's; None below
        -60 dB [dB].
    doppler_hz : float or None
        Doppler shift at the stated rates of foF2 and hmF2 [Hz].
    """

    wave: Mode
    arrives: bool
    reason: str | None = None
    layer: str | None = None
    hops: int | None = None
    label: str | None = None
    sequence: str | None = None
    launch: Launch | None = None
    arrival: Arrival | None = None
    group_path_km: float | None = None
    group_delay_ms: float | None = None
    phase_path_km: float | None = None
    apogee_km: float | None = None
    index: IndexAtApex | None = None
    absorption_db: float | None = None
    level_db: float | None = None
    margin_mhz: float | None = None
    skip_km: float | None = None
    receive_hand: Hand | None = None
    transmit_hand: Hand | None = None
    axial_ratio_db: float | None = None
    major_axis_bearing_deg: float | None = None
    shape: Shape | None = None
    limiting: Limiting | None = None
    other_wave_db: float | None = None
    doppler_hz: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class WaveOnPath(RayAnswer):
    """One wave on the path: its leading ray, and the others.

    Parameters
    ----------
    muf_mhz : float or None
        Greatest frequency at which this wave reaches the receiver [MHz].
    rays : tuple of RayAnswer
        Every other ray of this wave found.
    """

    muf_mhz: float | None = None
    rays: tuple[RayAnswer, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Rejection:
    """How far the antenna puts down the other wave.

    Parameters
    ----------
    ordinary, extraordinary : float or None
        When that wave is wanted [dB].
    """

    ordinary: float | None
    extraordinary: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Fading:
    """How the two waves beat, for stated rates of foF2 and hmF2.

    Parameters
    ----------
    doppler_split_hz : float
        Doppler shift of the extraordinary less that of the ordinary wave [Hz].
    period_s : float or None
        Time from fade to fade, in which the plane of polarization makes half a
        turn; None where the split vanishes [s].
    """

    doppler_split_hz: float
    period_s: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Advice:
    """What to do.

    Parameters
    ----------
    state : str
        "both", "ordinary_only", "extraordinary_only" or "none".
    state_probabilities : StateProbabilities or None
        Their probabilities.
    wave : Mode or None
        The wave to take.
    receive_hand, transmit_hand : Hand or None
        Hands for it.
    relay_position, transmit_relay_position : str or None
        Labels of the station file.
    rejection_db : Rejection or None
        Of the station's antenna.
    separation_db : float or None
        The same with the waves' own levels [dB].
    limited_by : str or None
        What limits the rejection most.
    headline : str
        One line to act on.
    confidence : str or None
        "high", "medium", "low" or "cannot_tell".
    caveats : tuple of str
        What to keep in mind.
    fading : Fading or None
        How the waves beat, where rates were stated.
    changes : tuple of Change or None
        The day's times of change, where they were asked for.
    """

    state: str
    state_probabilities: StateProbabilities | None
    wave: Mode | None
    receive_hand: Hand | None
    transmit_hand: Hand | None
    relay_position: str | None
    transmit_relay_position: str | None
    rejection_db: Rejection | None
    separation_db: float | None
    limited_by: str | None
    headline: str
    confidence: str | None
    caveats: tuple[str, ...]
    fading: Fading | None = None
    changes: tuple[Change, ...] | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PathAnswer:
    """The answer for one path.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    transmitter, receiver : End
        The ends.
    time_utc : str
        Instant, ISO 8601.
    frequency_mhz : float
        Operating frequency [MHz].
    path, field, ionosphere, waves, advice
        Parts of their own; `waves` has the ordinary first.
    antenna : AntennaOnPath or None
        What the station's antenna makes of the waves; None without a station
        file, where no wave arrives, and where its impedance is not known.
    """

    schema: str
    transmitter: End
    receiver: End
    time_utc: str
    frequency_mhz: float
    path: PathGeometry
    field: MidpointField
    ionosphere: MidpointIonosphere
    waves: tuple[WaveOnPath, WaveOnPath]
    advice: Advice
    antenna: AntennaOnPath | None = None
