"""The answer for one path: which hand, is the wave there, and why."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields
from datetime import datetime
from typing import Final

import numpy as np

from magion.answers.inputs import (
    IonosphereInput,
    LocalIonosphere,
    instant,
    ionosphere_over,
    require_frequency,
)
from magion.constants import EARTH_RADIUS, SPEED_OF_LIGHT
from magion.field import (
    MODEL,
    FieldFit,
    declination,
    dip,
    field_at,
    fit_field,
    flux_density,
    gyrofrequency,
)
from magion.geometry import Place, azimuth_elevation, great_circle, local_axes
from magion.polarization import (
    LARGEST_AXIAL_RATIO_DB,
    Hand,
    Shape,
    axial_ratio_db,
    hand_of,
    major_axis_bearing,
    shape_of,
    wave_axes,
)
from magion.rays.equations import RaySet
from magion.rays.exit import PlasmaPoint, limiting_polarization, plasma_at_apex
from magion.rays.homing import Fan, HomedRay, Link, fans, home, link_between
from magion.waves import (
    MODES,
    Mode,
    characteristic_waves,
    extraordinary_critical_frequency,
    gyro_ratio,
    plasma_ratio,
)

SCHEMA: Final = "magion/path/1"
FIELD_HEIGHT_KM: Final = 300.0


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
    """

    wave: Mode
    arrives: bool
    reason: str | None = None
    layer: str | None = None
    hops: int | None = None
    label: str | None = None
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
class StateProbabilities:
    """Probability of each state.

    Parameters
    ----------
    both, ordinary_only, extraordinary_only, none : float
        Probabilities, which add up to 1 [1].
    """

    both: float
    ordinary_only: float
    extraordinary_only: float
    none: float


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


def answer_path(
    transmitter: Place,
    receiver: Place,
    frequency_mhz: float,
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
) -> PathAnswer:
    """Which hand each wave arrives with, and which to switch to.

    Parameters
    ----------
    transmitter : Place
        The station that transmits.
    receiver : Place
        The station that receives; the same place is the vertical case.
    frequency_mhz : float
        Operating frequency, 0.5 to 60 [MHz].
    when : datetime, optional
        Instant; without a zone UTC; now if not given.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere; else the climatology at 120 sfu.

    Returns
    -------
    PathAnswer
        The answer.

    Raises
    ------
    InputError
        If an input is wrong.
    OutsideModelError
        If the date is outside the field model.
    """
    frequency = require_frequency(frequency_mhz)
    moment = instant(when)
    given = ionosphere or IonosphereInput()
    link = link_between(transmitter, receiver)
    mid_latitude, mid_longitude = link.point(0.5)
    overhead = ionosphere_over(given, mid_latitude, mid_longitude, moment)
    field = fit_field(
        transmitter.latitude, transmitter.longitude, receiver.latitude, receiver.longitude, moment
    )
    scene = _Scene(
        link=link,
        frequency=frequency,
        overhead=overhead,
        field=field,
        gyro_limit=_greatest_gyrofrequency(link, field),
    )
    waves = _waves(scene)
    middle = _midpoint_field(mid_latitude, mid_longitude, moment)
    at_peak = field_at(mid_latitude, mid_longitude, overhead.hmf2, moment)
    fxf2 = extraordinary_critical_frequency(
        overhead.fof2, float(gyrofrequency(flux_density(at_peak)))
    )
    return PathAnswer(
        schema=SCHEMA,
        transmitter=_end(transmitter),
        receiver=_end(receiver),
        time_utc=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        frequency_mhz=frequency_mhz,
        path=_geometry(link),
        field=middle,
        ionosphere=MidpointIonosphere(
            source=overhead.source,
            fof2_mhz=overhead.fof2 / 1e6,
            fxf2_mhz=float(fxf2) / 1e6,
            hmf2_km=overhead.hmf2 / 1e3,
            foe_mhz=None if overhead.foe is None else overhead.foe / 1e6,
            fof2_error_mhz=given.fof2_error_mhz,
        ),
        waves=waves,
        advice=_advice(scene, waves),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Scene:
    """Everything the waves of one path are made from."""

    link: Link
    frequency: float
    overhead: LocalIonosphere
    field: FieldFit
    gyro_limit: float


def _end(place: Place) -> End:
    return End(
        name=place.name,
        latitude_deg=place.latitude_deg,
        longitude_deg=place.longitude_deg,
        locator=place.locator,
    )


def _geometry(link: Link) -> PathGeometry:
    latitude, longitude = link.point(0.5)
    one_place = link.distance < 1.0
    _, back = great_circle(
        link.receiver.latitude,
        link.receiver.longitude,
        link.transmitter.latitude,
        link.transmitter.longitude,
    )
    return PathGeometry(
        distance_km=link.distance / 1e3,
        bearing_deg=None if one_place else math.degrees(link.bearing),
        back_bearing_deg=None if one_place else math.degrees(float(back)),
        midpoint=Midpoint(
            latitude_deg=math.degrees(latitude), longitude_deg=math.degrees(longitude)
        ),
    )


def _midpoint_field(latitude: float, longitude: float, moment: datetime) -> MidpointField:
    b = field_at(latitude, longitude, FIELD_HEIGHT_KM * 1e3, moment)
    total = float(flux_density(b))
    return MidpointField(
        height_km=FIELD_HEIGHT_KM,
        flux_density_nt=total * 1e9,
        dip_deg=math.degrees(float(dip(b))),
        declination_deg=math.degrees(float(declination(b))),
        gyrofrequency_mhz=float(gyrofrequency(total)) / 1e6,
        model=MODEL,
    )


def _greatest_gyrofrequency(link: Link, field: FieldFit) -> float:
    """Greatest gyrofrequency at 100 km along the path [Hz]."""
    share = np.linspace(0.0, 1.0, 21) * link.angle
    along = link.up[:, None] * np.cos(share) + link.forward[:, None] * np.sin(share)
    flux, _ = field.at(along * (EARTH_RADIUS + 100e3))
    return float(gyrofrequency(flux_density(flux)).max())


def _waves(scene: _Scene) -> tuple[WaveOnPath, WaveOnPath]:
    modes = [m for m in MODES if m is Mode.ORDINARY or scene.frequency > scene.gyro_limit]
    specs = RaySet(
        frequency=np.full(len(modes), scene.frequency),
        extraordinary=np.array([m is Mode.EXTRAORDINARY for m in modes]),
        which=np.zeros(len(modes), dtype=np.intp),
    )
    medium = scene.overhead.profiles
    found = fans(scene.link, specs, medium, scene.field)
    rays = home(scene.link, specs, medium, scene.field, found)
    answers = []
    for mode in MODES:
        if mode not in modes:
            answers.append(_below_gyrofrequency(scene, mode))
            continue
        i = modes.index(mode)
        own = [_ray_answer(scene, mode, ray, found[i]) for ray in rays if ray.spec == i]
        if own:
            answers.append(_leading(own[0], own[1:]))
        else:
            answers.append(
                WaveOnPath(
                    wave=mode,
                    arrives=False,
                    reason=_reason(scene, mode, found[i]),
                    index=_turning_point(scene, mode),
                    skip_km=_skip_km(found[i]),
                )
            )
    return answers[0], answers[1]


def _leading(first: RayAnswer, others: Sequence[RayAnswer]) -> WaveOnPath:
    values = {f.name: getattr(first, f.name) for f in fields(RayAnswer)}
    return WaveOnPath(**values, rays=tuple(others))


def _below_gyrofrequency(scene: _Scene, mode: Mode) -> WaveOnPath:
    return WaveOnPath(
        wave=mode,
        arrives=False,
        reason=(
            f"{scene.frequency / 1e6:.3f} MHz is at or below the gyrofrequency along the path "
            f"({scene.gyro_limit / 1e6:.3f} MHz at 100 km), where this wave is not turned back"
        ),
    )


def _ray_answer(scene: _Scene, mode: Mode, ray: HomedRay, fan: Fan) -> RayAnswer:
    which, medium = 0, scene.overhead.profiles
    track = ray.tracks[-1]
    receiver, transmitter = scene.link.receiver, scene.link.transmitter
    down = limiting_polarization(track, scene.frequency, which, medium, scene.field)
    up = limiting_polarization(
        ray.tracks[0], scene.frequency, which, medium, scene.field, upward=True
    )
    top = plasma_at_apex(track, scene.frequency, which, medium, scene.field)
    number = MODES.index(mode)
    arriving, launched = down.waves()[number], up.waves()[number]
    azimuth, elevation = azimuth_elevation(ray.launch, transmitter.latitude, transmitter.longitude)
    from_azimuth, from_elevation = azimuth_elevation(
        -ray.arrival, receiver.latitude, receiver.longitude
    )
    east, north, _ = local_axes(receiver.latitude, receiver.longitude)
    axis = major_axis_bearing(arriving, *wave_axes(down.wave_normal, down.field), east, north)
    hand = hand_of(arriving)
    ratio_db = float(axial_ratio_db(arriving))
    layer = _layer(scene.overhead, ray.apogee)
    latitude, longitude = down.place
    return RayAnswer(
        wave=mode,
        arrives=True,
        layer=layer,
        hops=len(ray.tracks),
        label=f"{len(ray.tracks)}{layer}({mode.letter})",
        launch=Launch(
            azimuth_deg=math.degrees(float(azimuth)),
            elevation_deg=math.degrees(float(elevation)),
            hand=hand_of(launched),
            axial_ratio_db=_ratio_or_none(float(axial_ratio_db(launched))),
        ),
        arrival=Arrival(
            azimuth_deg=math.degrees(float(from_azimuth)),
            elevation_deg=math.degrees(float(from_elevation)),
        ),
        group_path_km=ray.group_path / 1e3,
        group_delay_ms=ray.group_path / SPEED_OF_LIGHT * 1e3,
        phase_path_km=ray.phase_path / 1e3,
        apogee_km=ray.apogee / 1e3,
        index=_index(top, mode),
        skip_km=_skip_km(fan),
        receive_hand=hand,
        transmit_hand=hand.opposite,
        axial_ratio_db=_ratio_or_none(ratio_db),
        major_axis_bearing_deg=math.degrees(float(axis)),
        shape=shape_of(ratio_db),
        limiting=Limiting(
            height_km=down.height / 1e3,
            latitude_deg=math.degrees(latitude),
            longitude_deg=math.degrees(longitude),
            field_angle_deg=math.degrees(down.theta),
        ),
    )


def _ratio_or_none(ratio_db: float) -> float | None:
    return ratio_db if ratio_db <= LARGEST_AXIAL_RATIO_DB else None


def _index(point: PlasmaPoint, mode: Mode) -> IndexAtApex:
    waves = characteristic_waves(point.X, point.Y, point.Z, point.theta)
    n = complex(waves.index[MODES.index(mode)])
    return IndexAtApex(
        height_km=point.height / 1e3,
        X=point.X,
        Y=point.Y,
        theta_deg=math.degrees(point.theta),
        mu=n.real,
        chi=abs(n.imag),
    )


def _layer(overhead: LocalIonosphere, apogee: float) -> str:
    """The layer that turned a ray back, by its greatest height."""
    layers = overhead.layers
    e_peak = overhead.profiles.e_peak()
    e_height = layers.hme if layers else (e_peak[1] if e_peak else 110e3)
    if apogee <= e_height + 8e3:
        return "E"
    if layers and layers.f1_share >= 0.5 and apogee <= layers.hmf1:
        return "F1"
    return "F2"


def _skip_km(fan: Fan) -> float | None:
    """Least distance at which the rays of a fan come down [km]."""
    ahead = fan.landed & (fan.zenith_angle >= 0.0)
    if not ahead.any():
        return None
    if fan.landed[np.argmin(np.abs(fan.zenith_angle))]:
        return 0.0
    return max(0.0, float(np.min(fan.along[ahead]))) / 1e3


def _reason(scene: _Scene, mode: Mode, fan: Fan) -> str:
    """Why no ray of a wave comes down at the receiver."""
    megahertz = f"{scene.frequency / 1e6:.3f} MHz"
    ahead = fan.landed & (fan.zenith_angle >= 0.0)
    if not ahead.any():
        return f"{megahertz} passes through the ionosphere at every angle"
    skip, reach = float(np.min(fan.along[ahead])), float(np.max(fan.along[ahead]))
    distance = scene.link.distance
    if distance < skip:
        return (
            f"{megahertz} is above this wave's MUF for the path: it first comes down at "
            f"{skip / 1e3:.0f} km (skip distance)"
        )
    if distance > reach:
        return f"one hop of this wave reaches {reach / 1e3:.0f} km at most"
    return "no ray of this wave comes down at this distance, between those of two layers"


def _turning_point(scene: _Scene, mode: Mode) -> IndexAtApex | None:
    """Overhead of the midpoint, where a wave sent straight up would be turned back."""
    latitude, longitude = scene.link.point(0.5)
    profiles = scene.overhead.profiles
    height = np.arange(profiles.base, scene.overhead.hmf2, 50.0)
    density, _ = profiles.at_height(height)
    X = plasma_ratio(density, scene.frequency)
    _, _, up = local_axes(latitude, longitude)
    flux, _ = scene.field.at(up[:, None] * (EARTH_RADIUS + height))
    magnitude = flux_density(flux)
    Y = gyro_ratio(magnitude, scene.frequency)
    level = 1.0 if mode is Mode.ORDINARY else 1.0 - Y
    reached = np.flatnonzero(level <= X)
    if reached.size == 0:
        return None
    i = int(reached[0])
    theta = float(np.arccos(np.clip(up @ flux[:, i] / magnitude[i], -1.0, 1.0)))
    return IndexAtApex(
        height_km=float(height[i]) / 1e3,
        X=float(X[i]),
        Y=float(Y[i]),
        theta_deg=math.degrees(theta),
        mu=0.0,
        chi=0.0,
    )


def _advice(scene: _Scene, waves: tuple[WaveOnPath, WaveOnPath]) -> Advice:
    ordinary, extraordinary = waves
    state = {
        (True, True): "both",
        (True, False): "ordinary_only",
        (False, True): "extraordinary_only",
        (False, False): "none",
    }[ordinary.arrives, extraordinary.arrives]
    taken = ordinary if ordinary.arrives else extraordinary if extraordinary.arrives else None
    return Advice(
        state=state,
        state_probabilities=None,
        wave=taken.wave if taken else None,
        receive_hand=taken.receive_hand if taken else None,
        transmit_hand=taken.transmit_hand if taken else None,
        relay_position=None,
        transmit_relay_position=None,
        rejection_db=None,
        separation_db=None,
        limited_by=None,
        headline=_headline(taken, waves),
        confidence=None,
        caveats=_caveats(scene, waves),
    )


def _headline(taken: WaveOnPath | None, waves: tuple[WaveOnPath, WaveOnPath]) -> str:
    if taken is None or taken.receive_hand is None or taken.transmit_hand is None:
        return "Neither wave arrives: no hand will help on this frequency now."
    other = waves[1] if taken is waves[0] else waves[0]
    company = "both waves arrive" if other.arrives else "the other wave does not arrive"
    if taken.shape is Shape.LINEAR:
        return (
            f"{taken.wave.value.capitalize()} wave, nearly linear: use a single wire along "
            f"{taken.major_axis_bearing_deg:.0f}° true ({company})."
        )
    return (
        f"Receive {taken.receive_hand.value}: {taken.wave.value} wave; to answer on it transmit "
        f"{taken.transmit_hand.value} ({company})."
    )


def _caveats(scene: _Scene, waves: tuple[WaveOnPath, WaveOnPath]) -> tuple[str, ...]:
    caveats = list(scene.overhead.caveats)
    if scene.frequency <= scene.gyro_limit:
        caveats.append(
            "At frequencies near the gyrofrequency the ground wave may be what is heard."
        )
    for wave in waves:
        if wave.arrives and wave.shape is Shape.LINEAR:
            caveats.append(
                f"The {wave.wave.value} wave is nearly linear: its hand is only a sign, and one "
                "wire along its axis beats circular."
            )
        if wave.arrives and wave.limiting and abs(wave.limiting.field_angle_deg - 90.0) < 3.0:
            caveats.append(
                f"The {wave.wave.value} wave leaves nearly across the field "
                f"({wave.limiting.field_angle_deg:.0f}°): a small change turns its hand over."
            )
    if all(w.arrives for w in waves) and waves[0].receive_hand is waves[1].receive_hand:
        caveats.append("Both waves arrive with the same hand: the relay cannot part them.")
    return tuple(caveats)
