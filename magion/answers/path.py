"""The answer for one path: which hand, is the wave there, and why."""

import math
from dataclasses import fields
from datetime import datetime, timedelta
from typing import Final

import numpy as np

from magion.answers.advice import Known, advice_on
from magion.answers.certainty import Change, PathMufs, changes, path_mufs
from magion.answers.inputs import IonosphereInput, instant, require_frequency
from magion.answers.modes import (
    GREATEST_ABSORPTION_DB,
    ModeRay,
    ModesFound,
    doppler_of_layers,
    find_modes,
    require_length,
    strongest,
)
from magion.answers.reception import AntennaOnPath, antenna_on_path, at_antenna, relay_at
from magion.answers.records import (
    SCHEMA,
    Arrival,
    End,
    IndexAtApex,
    Launch,
    Limiting,
    Midpoint,
    MidpointField,
    MidpointIonosphere,
    PathAnswer,
    PathGeometry,
    RayAnswer,
    WaveOnPath,
)
from magion.answers.scene import Scene, scene_of, with_changed_layers
from magion.antenna.station import Station
from magion.constants import EARTH_RADIUS, SPEED_OF_LIGHT
from magion.field import MODEL, declination, dip, field_at, flux_density, gyrofrequency
from magion.geometry import Place, azimuth_elevation, great_circle, local_axes
from magion.polarization import (
    LARGEST_AXIAL_RATIO_DB,
    axial_ratio_db,
    hand_of,
    major_axis_bearing,
    shape_of,
)
from magion.rays.exit import PlasmaPoint
from magion.rays.fans import Fan
from magion.rays.link import Link, link_between
from magion.rays.muf import LONGEST_HOP, branches, skip_distance
from magion.waves import (
    MODES,
    Mode,
    characteristic_waves,
    extraordinary_critical_frequency,
    gyro_ratio,
    plasma_ratio,
    wave_axes,
)

FIELD_HEIGHT_KM: Final = 300.0


def answer_path(
    transmitter: Place,
    receiver: Place,
    frequency_mhz: float,
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
    *,
    station: Station | None = None,
    with_changes: bool = False,
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
    station : Station, optional
        Antenna, feed and relay of the receiver; else an ideal switch.
    with_changes : bool
        Whether to add the times of that UTC day at which a wave comes or goes
        (some seconds) [1].

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
    require_length(link)
    scene = scene_of(link, [moment], given)
    overhead = scene.overheads[0]
    modes = _modes_at(scene, frequency)
    found = find_modes(scene, frequency, modes, 0)
    mufs = path_mufs(scene, found.hops)
    if _contradicts(mufs, found, frequency):
        mufs = path_mufs(scene, found.hops, wide=True)
    shifts = _doppler_shifts(scene, frequency, found, given)
    waves = tuple(_wave(scene, frequency, m, found, mufs, shifts) for m in MODES)
    pair = (waves[0], waves[1])
    antenna = None if station is None else _antenna(station, frequency, found, receiver)
    mid_latitude, mid_longitude = link.point(0.5)
    at_peak = field_at(mid_latitude, mid_longitude, overhead.hmf2, moment)
    gyro = float(gyrofrequency(flux_density(at_peak)))
    day = _changes_of_day(scene, moment, frequency, given) if with_changes else None
    return PathAnswer(
        schema=SCHEMA,
        transmitter=_end(transmitter),
        receiver=_end(receiver),
        time_utc=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        frequency_mhz=frequency_mhz,
        path=_geometry(link),
        field=_midpoint_field(mid_latitude, mid_longitude, moment),
        ionosphere=MidpointIonosphere(
            source=overhead.source,
            fof2_mhz=overhead.fof2 / 1e6,
            fxf2_mhz=float(extraordinary_critical_frequency(overhead.fof2, gyro)) / 1e6,
            hmf2_km=overhead.hmf2 / 1e3,
            foe_mhz=None if overhead.foe is None else overhead.foe / 1e6,
            fof2_error_mhz=None if overhead.fof2_error is None else overhead.fof2_error / 1e6,
        ),
        waves=pair,
        antenna=antenna,
        advice=advice_on(
            Known(
                scene=scene,
                frequency=frequency,
                waves=pair,
                mufs=mufs,
                gyro=gyro,
                day=day,
                no_day=with_changes and day is None,
                station=station,
                antenna=antenna,
            )
        ),
    )


def _antenna(
    station: Station, frequency: float, found: ModesFound, receiver: Place
) -> AntennaOnPath | None:
    here = at_antenna(strongest(found.rays), receiver, frequency)
    relay = None if here is None else relay_at(station, frequency)
    return None if here is None or relay is None else antenna_on_path(relay, here)


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


def _modes_at(scene: Scene, frequency: float) -> tuple[Mode, ...]:
    """Waves that the ionosphere can turn back at a frequency."""
    return MODES if frequency > scene.gyro_limit else (Mode.ORDINARY,)


def _contradicts(mufs: PathMufs, found: ModesFound, frequency: float) -> bool:
    """Whether a ray arrives above its wave's MUF, as strong tilts can make it."""
    for i, mode in enumerate(MODES):
        fewest = [r for r in found.rays if set(r.sequence) == {mode}]
        muf = float(mufs.any_layer[i, 0])
        if fewest and not muf >= 0.995 * frequency:
            return True
    return False


def _wave(
    scene: Scene,
    frequency: float,
    mode: Mode,
    found: ModesFound,
    mufs: PathMufs,
    shifts: dict[int, float],
) -> WaveOnPath:
    """One wave: its strongest ray leads; the others follow in order of level."""
    if mode not in found.fans:
        return WaveOnPath(
            wave=mode,
            arrives=False,
            reason=(
                f"{frequency / 1e6:.3f} MHz is at or below the gyrofrequency along the path "
                f"({scene.gyro_limit / 1e6:.3f} MHz at 100 km), where this wave is not turned back"
            ),
        )
    muf = float(mufs.any_layer[MODES.index(mode), 0]) / 1e6
    if any(set(r.sequence) == {mode} for r in found.rays):
        muf = max(muf, frequency / 1e6) if math.isfinite(muf) else frequency / 1e6
    muf_mhz = muf if math.isfinite(muf) else None
    margin = None if muf_mhz is None else muf_mhz - frequency / 1e6
    skip = skip_distance(found.fans[mode])
    skip_km = None if skip is None else skip / 1e3
    own = sorted((r for r in found.rays if r.wave is mode), key=lambda r: -r.level_db)
    strong = [r for r in own if r.absorption_db <= GREATEST_ABSORPTION_DB]
    if not strong:
        reason = _reason(scene, frequency, found.fans[mode])
        if own:
            reason = (
                f"it is absorbed by {own[0].absorption_db:.0f} dB, more than "
                f"{GREATEST_ABSORPTION_DB:.0f} dB"
            )
        return WaveOnPath(
            wave=mode,
            arrives=False,
            reason=reason,
            index=_turning_point(scene, frequency, mode),
            absorption_db=own[0].absorption_db if own else None,
            margin_mhz=margin,
            skip_km=skip_km,
            muf_mhz=muf_mhz,
        )
    answers = [_ray_answer(scene, r, margin, skip_km, shifts.get(id(r))) for r in strong]
    values = {f.name: getattr(answers[0], f.name) for f in fields(RayAnswer)}
    return WaveOnPath(**values, rays=tuple(answers[1:]), muf_mhz=muf_mhz)


def _ray_answer(
    scene: Scene,
    mode_ray: ModeRay,
    margin_mhz: float | None,
    skip_km: float | None,
    doppler_hz: float | None,
) -> RayAnswer:
    ray, mode, down = mode_ray.ray, mode_ray.wave, mode_ray.down
    receiver, transmitter = scene.link.receiver, scene.link.transmitter
    arriving = down.waves()[MODES.index(mode)]
    launched = mode_ray.up.waves()[MODES.index(mode_ray.sequence[0])]
    azimuth, elevation = azimuth_elevation(ray.launch, transmitter.latitude, transmitter.longitude)
    from_azimuth, from_elevation = azimuth_elevation(
        -ray.arrival, receiver.latitude, receiver.longitude
    )
    east, north, _ = local_axes(receiver.latitude, receiver.longitude)
    axis = major_axis_bearing(arriving, *wave_axes(down.wave_normal, down.field), east, north)
    hand = hand_of(arriving)
    ratio_db = _ratio_db(arriving)
    latitude, longitude = down.place
    other_db = 10.0 * math.log10(max(mode_ray.coupling, 1e-12))
    return RayAnswer(
        wave=mode,
        arrives=True,
        layer=mode_ray.layers[-1],
        hops=len(ray.tracks),
        label=mode_ray.label,
        sequence="".join(m.letter for m in mode_ray.sequence),
        launch=Launch(
            azimuth_deg=math.degrees(float(azimuth)),
            elevation_deg=math.degrees(float(elevation)),
            hand=hand_of(launched),
            axial_ratio_db=_ratio_or_none(_ratio_db(launched)),
        ),
        arrival=Arrival(
            azimuth_deg=math.degrees(float(from_azimuth)),
            elevation_deg=math.degrees(float(from_elevation)),
        ),
        group_path_km=ray.group_path / 1e3,
        group_delay_ms=ray.group_path / SPEED_OF_LIGHT * 1e3,
        phase_path_km=ray.phase_path / 1e3,
        apogee_km=ray.apogees[-1] / 1e3,
        index=_index(mode_ray.top, mode),
        absorption_db=mode_ray.absorption_db,
        level_db=mode_ray.level_db,
        margin_mhz=margin_mhz,
        skip_km=skip_km,
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
        other_wave_db=other_db if other_db > -60.0 else None,
        doppler_hz=doppler_hz,
    )


def _ratio_db(field: np.ndarray) -> float:
    return float(axial_ratio_db(field))


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


def _reason(scene: Scene, frequency: float, fan: Fan) -> str:
    """Why no ray of a wave comes down at the receiver."""
    megahertz = f"{frequency / 1e6:.3f} MHz"
    ahead = [b for b in branches(fan) if b.greatest > 0.0]
    if not ahead:
        return f"{megahertz} passes through the ionosphere at every angle"
    skip, reach = min(b.least for b in ahead), max(b.greatest for b in ahead)
    distance = scene.link.distance
    if distance < skip:
        return (
            f"{megahertz} is above this wave's MUF for the path: it first comes down at "
            f"{skip / 1e3:.0f} km (skip distance)"
        )
    if distance > reach:
        return (
            f"one hop reaches {reach / 1e3:.0f} km at most, and none of the rays of several hops "
            "that were traced comes down here"
        )
    return "none of its rays comes down here: the path lies in a gap between those of two layers"


def _turning_point(scene: Scene, frequency: float, mode: Mode) -> IndexAtApex | None:
    """Overhead of the midpoint, where a wave sent straight up would be turned back."""
    latitude, longitude = scene.link.point(0.5)
    overhead = scene.overheads[0]
    height = np.arange(overhead.profiles.base, overhead.hmf2, 50.0)
    density, _ = overhead.profiles.at_height(height)
    X = plasma_ratio(density, frequency)
    _, _, up = local_axes(latitude, longitude)
    flux, _ = scene.field.at(up[:, None] * (EARTH_RADIUS + height))
    magnitude = flux_density(flux)
    Y = gyro_ratio(magnitude, frequency)
    level = 1.0 if mode is Mode.ORDINARY else 1.0 - Y
    reached = np.flatnonzero(X - level >= 0.0)
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


def _doppler_shifts(
    scene: Scene, frequency: float, found: ModesFound, given: IonosphereInput
) -> dict[int, float]:
    """Doppler shift of every ray at the stated rates, by the ray's identity [Hz]."""
    fof2_rate, hmf2_rate = given.fof2_rate_mhz_per_h, given.hmf2_rate_km_per_h
    if fof2_rate is None and hmf2_rate is None:
        return {}
    changed, steps = with_changed_layers(scene)
    rates = np.array([(fof2_rate or 0.0) * 1e6, (hmf2_rate or 0.0) * 1e3]) / 3600.0
    return {
        id(ray): float(
            -frequency
            / SPEED_OF_LIGHT
            * (doppler_of_layers(changed, frequency, (0, 1, 2), ray) / steps @ rates)
        )
        for ray in found.rays
    }


def _changes_of_day(
    scene: Scene, moment: datetime, frequency: float, given: IonosphereInput
) -> tuple[Change, ...] | None:
    """Times of the UTC day at which a wave comes or goes; None where they cannot be told."""
    link = scene.link
    if link.distance > LONGEST_HOP or given.profile is not None:
        return None
    midnight = moment.replace(hour=0, minute=0, second=0, microsecond=0)
    moments = [midnight + timedelta(minutes=30 * i) for i in range(48)]
    if given.readings is not None:
        covered = given.readings.covered
        moments = [m for m in moments if any(a <= m <= b for a, b in covered)]
    if len(moments) < 2:
        return None
    # Typed values are of this moment: the day is scaled as they ask now.
    ratios = None if given.readings is not None else scene.overheads[0].ratios
    day = scene_of(link, moments, given, ratios)
    mufs = path_mufs(day, (1,))
    relative = np.array([(o.fof2_error or 0.0) / o.fof2 for o in day.overheads])
    return changes(moments, mufs, frequency, relative, scene.gyro_limit)
