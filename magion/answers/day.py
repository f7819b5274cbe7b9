"""One UTC day of one path: MUFs, both waves, their splitting, and when to switch."""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Any, Final

import numpy as np

from magion.answers.certainty import (
    STATES,
    Change,
    PathMufs,
    changes,
    least_fof2,
    path_mufs,
    probabilities,
    state_of,
)
from magion.answers.inputs import IonosphereInput, instant, require_frequency
from magion.answers.modes import (
    ModeRay,
    find_modes,
    hop_counts,
    pure_rays,
    require_length,
    stronger,
    strongest,
)
from magion.answers.reception import (
    RelayAt,
    at_antenna,
    choice,
    positions_on_path,
    relay_at,
)
from magion.answers.scene import Scene, scene_of
from magion.antenna.station import Station
from magion.arrays import BoolArray, FloatArray, IntArray
from magion.constants import SPEED_OF_LIGHT
from magion.errors import InputError, require_range
from magion.field import field_at, flux_density, gyrofrequency
from magion.geometry import Place, azimuth_elevation, solar_zenith_angle
from magion.polarization import Hand, axial_ratio_db, hand_of
from magion.rays.link import link_between
from magion.waves import MODES, Mode, extraordinary_critical_frequency

SCHEMA: Final = "magion/day/1"
MOST_FREQUENCIES: Final = 12
MUF_STEP_MIN: Final = 30.0
"""MUFs are traced at least this far apart and interpolated between [min]."""

IDEAL_SWITCH: Final = (
    "Where the elements' impedance is outside the shipped table an ideal switch is taken: there "
    "the hand is named in place of a relay position."
)

_NEARLY = 0.97
_DEGREES_PER_HOUR = 15.0

Progress = Callable[[float], None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Switch:
    """One entry of the switching plan.

    Parameters
    ----------
    time_utc : str
        When, ISO 8601.
    plus_minus_min : float or None
        One standard deviation; None where foF2 changes too slowly to say [min].
    wave : str or None
        Wave to take from then on; None where neither arrives.
    receive, transmit : str or None
        Relay positions by the station's labels, else hands.
    reason : str
        What changes.
    """

    time_utc: str
    plus_minus_min: float | None
    wave: str | None
    receive: str | None
    transmit: str | None
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class DayFrequency:
    """One frequency through the day; arrays have the ordinary wave first.

    Parameters
    ----------
    frequency_mhz : float
        Frequency [MHz].
    state : tuple of str, length n
        State at each step; "unknown" where the readings do not reach.
    probability : ndarray, shape (4, n)
        Of "both", "ordinary_only", "extraordinary_only", "none"; NaN where the
        uncertainty of foF2 is not known [1].
    elevation_deg, azimuth_deg : ndarray, shape (2, n)
        Where each wave comes from; NaN where it does not arrive [deg].
    group_delay_ms : ndarray, shape (2, n)
        Time of travel [ms].
    absorption_db, level_db, axial_ratio_db : ndarray, shape (2, n)
        Absorption, level to free space, shape [dB].
    receive_hand : tuple of tuple of (str or None)
        IEEE hands, a tuple of n for each wave.
    wave : tuple of (str or None), length n
        Wave to take.
    receive, transmit : tuple of (str or None), length n
        Relay positions for it by the station's labels, else hands.
    rejection_db : ndarray, shape (n,)
        Of the other wave by the station's antenna [dB].
    changes : tuple of Change
        Times at which a wave comes or goes.
    plan : tuple of Switch
        Times at which to move the relay.
    """

    frequency_mhz: float
    state: tuple[str, ...]
    probability: FloatArray
    elevation_deg: FloatArray
    azimuth_deg: FloatArray
    group_delay_ms: FloatArray
    absorption_db: FloatArray
    level_db: FloatArray
    axial_ratio_db: FloatArray
    receive_hand: tuple[tuple[str | None, ...], tuple[str | None, ...]]
    wave: tuple[str | None, ...]
    receive: tuple[str | None, ...]
    transmit: tuple[str | None, ...]
    rejection_db: FloatArray
    changes: tuple[Change, ...]
    plan: tuple[Switch, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class DayAnswer:
    """One UTC day of one path.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    transmitter, receiver : str
        The ends in words.
    distance_km : float
        Between them on the ground [km].
    date : str
        The UTC day.
    station : str or None
        Name of the station, where one is given.
    source : str
        Of the ionosphere.
    time_utc : tuple of str, length n
        The steps, ISO 8601.
    hours : ndarray, shape (n,)
        The same as hours of the day [h].
    solar_hour_offset : float
        Local mean solar time of the midpoint less UTC [h].
    solar_zenith_deg : ndarray, shape (n,)
        Sun's angle from the vertical over the midpoint [deg].
    fof2_mhz, fxf2_mhz, fof2_error_mhz, foe_mhz : ndarray, shape (n,)
        Over the midpoint; NaN where not known [MHz].
    muf_mhz : ndarray, shape (2, n)
        MUFs of the path, ordinary first [MHz].
    frequencies : tuple of DayFrequency
        The operating frequencies.
    caveats : tuple of str
        What to keep in mind.
    """

    schema: str
    transmitter: str
    receiver: str
    distance_km: float
    date: str
    station: str | None
    source: str
    time_utc: tuple[str, ...]
    hours: FloatArray
    solar_hour_offset: float
    solar_zenith_deg: FloatArray
    fof2_mhz: FloatArray
    fxf2_mhz: FloatArray
    fof2_error_mhz: FloatArray
    foe_mhz: FloatArray
    muf_mhz: FloatArray
    frequencies: tuple[DayFrequency, ...]
    caveats: tuple[str, ...]


def answer_day(
    transmitter: Place,
    receiver: Place,
    frequencies_mhz: Sequence[float],
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
    *,
    step_min: float = 15.0,
    station: Station | None = None,
    progress: Progress | None = None,
) -> DayAnswer:
    """Both waves of a path through one UTC day, and when to move the relay.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends; the receiver is the user.
    frequencies_mhz : sequence of float
        One to twelve operating frequencies, 0.5 to 60 [MHz].
    when : datetime, optional
        An instant of the day; typed values are those of this instant; now if
        not given.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere.
    step_min : float
        Step of the table, 5 to 120 [min].
    station : Station, optional
        Antenna, feed and relay of the receiver.
    progress : callable, optional
        Called with the share that is done, 0 to 1.

    Returns
    -------
    DayAnswer
        The day.

    Raises
    ------
    InputError
        If an input is wrong.
    OutsideModelError
        If the date is outside the field model.
    """
    frequencies = [require_frequency(f) for f in frequencies_mhz]
    if not 1 <= len(frequencies) <= MOST_FREQUENCIES:
        raise InputError(
            f"{len(frequencies)} frequencies are given; accepted: 1 to {MOST_FREQUENCIES}"
        )
    require_range("the step", step_min, 5.0, 120.0, "minutes")
    moment = instant(when)
    given = ionosphere or IonosphereInput()
    if given.profile is not None:
        raise InputError(
            "a measured profile is of one instant; accepted for a day: readings, typed values, or "
            "the solar flux"
        )
    link = link_between(transmitter, receiver)
    require_length(link)
    count = int(24.0 * 60.0 / step_min - 1e-9) + 1
    midnight = moment.replace(hour=0, minute=0, second=0, microsecond=0)
    moments = [midnight + timedelta(minutes=step_min * i) for i in range(count)]
    known = np.ones(count, dtype=bool)
    if given.readings is not None:
        covered = given.readings.covered
        known = np.array([any(a <= m <= b for a, b in covered) for m in moments])
        if not known.any():
            raise InputError(
                f"the readings hold nothing on {midnight:%Y-%m-%d}; accepted: readings of that day"
            )
    ratios = None
    if given.readings is None and given.profile is None:
        ratios = scene_of(link, [moment], given).overheads[0].ratios
    index = np.flatnonzero(known)
    scene = scene_of(link, [moments[i] for i in index], given, ratios)
    tell = progress or (lambda share: None)
    tell(0.1)
    mufs = interpolated_mufs(scene, _floats(index * step_min), MUF_STEP_MIN)
    tell(0.5)
    gyro = gyro_at_peaks(scene, midnight)
    rays = rays_of(scene, frequencies, mufs)
    tell(0.9)
    rows = []
    lacking = False
    for f, of_frequency in zip(frequencies, rays, strict=True):
        relay = None if station is None else relay_at(station, f)
        lacking |= station is not None and relay is None
        rows.append(
            _of_frequency(
                scene, f, of_frequency, mufs, gyro, relay, moments, index, receiver, step_min
            )
        )
    tell(1.0)
    latitude, longitude = link.point(0.5)
    overheads = scene.overheads
    fof2 = np.array([o.fof2 for o in overheads])
    return DayAnswer(
        schema=SCHEMA,
        transmitter=_in_words(transmitter),
        receiver=_in_words(receiver),
        distance_km=link.distance / 1e3,
        date=midnight.strftime("%Y-%m-%d"),
        station=None if station is None else station.name or station.antenna.kind.value,
        source=overheads[0].source,
        time_utc=tuple(m.strftime("%Y-%m-%dT%H:%M:%SZ") for m in moments),
        hours=_floats(np.arange(count) * step_min / 60.0),
        solar_hour_offset=math.degrees(longitude) / _DEGREES_PER_HOUR,
        solar_zenith_deg=np.degrees(
            [float(solar_zenith_angle(m, latitude, longitude)) for m in moments]
        ),
        fof2_mhz=_spread(fof2 / 1e6, index, count),
        fxf2_mhz=_spread(extraordinary_critical_frequency(fof2, gyro) / 1e6, index, count),
        fof2_error_mhz=_spread(
            np.array([math.nan if o.fof2_error is None else o.fof2_error for o in overheads]) / 1e6,
            index,
            count,
        ),
        foe_mhz=_spread(
            np.array([math.nan if o.foe is None else o.foe for o in overheads]) / 1e6, index, count
        ),
        muf_mhz=_spread(mufs.any_layer / 1e6, index, count),
        frequencies=tuple(rows),
        caveats=_caveats(scene, lacking, known, ratios),
    )


def _in_words(place: Place) -> str:
    where = f"{place.latitude_deg:.2f}, {place.longitude_deg:.2f}"
    return f"{place.name} ({where})" if place.name else where


def _floats(values: Any) -> FloatArray:
    return np.asarray(values, dtype=np.float64)


def _spread(values: FloatArray, index: IntArray, count: int) -> FloatArray:
    """Values at the known steps in an array over all of them."""
    out = np.full((*values.shape[:-1], count), np.nan)
    out[..., index] = values
    return out


def _caveats(
    scene: Scene,
    lacking: bool,
    known: BoolArray,
    ratios: tuple[float, float, float] | None,
) -> tuple[str, ...]:
    caveats = list(dict.fromkeys(c for o in scene.overheads for c in o.caveats))
    if not known.all():
        caveats.append("Steps that the readings do not reach are left out: they are not guessed.")
    if ratios is not None and ratios != (1.0, 1.0, 1.0):
        caveats.append("The whole day is scaled as the values of the instant given ask.")
    if lacking:
        caveats.append(IDEAL_SWITCH)
    return tuple(caveats)


def interpolated_mufs(scene: Scene, minutes: FloatArray, least_step_min: float) -> PathMufs:
    """MUFs of every hour of a scene; between traced ones their ratio to foF2, fxF2 runs evenly.

    Parameters
    ----------
    scene : Scene
        The path.
    minutes : ndarray, shape (hours,)
        Minutes of the day [min].
    least_step_min : float
        How far apart MUFs are traced [min].

    Returns
    -------
    PathMufs
        Of every hour.
    """
    hops = hop_counts(scene.link.distance)
    stride = 1
    if minutes.size > 2:
        stride = max(1, int(least_step_min / float(np.min(np.diff(minutes))) + 1e-9))
    chosen = np.unique(np.concatenate([np.arange(0, minutes.size, stride), [minutes.size - 1]]))
    if chosen.size == minutes.size:
        return path_mufs(scene, hops)
    traced = path_mufs(scene, hops, hours=chosen)
    fof2 = np.array([o.fof2 for o in scene.overheads])
    critical = (fof2, extraordinary_critical_frequency(fof2, scene.gyro_limit))
    found = []
    for values in (traced.any_layer, traced.f_region):
        rows = []
        for row, base in zip(values, critical, strict=True):
            ratio = row / base[chosen]
            good = np.isfinite(ratio)
            if not good.any():
                rows.append(np.full(minutes.size, np.nan))
                continue
            full = np.interp(minutes, minutes[chosen][good], ratio[good]) * base
            # A step between two without a MUF has none either.
            near = np.interp(minutes, minutes[chosen], good.astype(float))
            rows.append(np.where(near > 0.0, full, np.nan))
        found.append(np.stack(rows))
    return PathMufs(any_layer=found[0], f_region=found[1])


def gyro_at_peaks(scene: Scene, when: datetime) -> FloatArray:
    """Gyrofrequency over the midpoint at the peak of F2, hour by hour.

    Parameters
    ----------
    scene : Scene
        The path.
    when : datetime
        Instant of the field.

    Returns
    -------
    ndarray, shape (hours,)
        Gyrofrequencies [Hz].
    """
    latitude, longitude = scene.link.point(0.5)
    heights = np.array([o.hmf2 for o in scene.overheads])
    flux = field_at(
        np.full(heights.shape, latitude), np.full(heights.shape, longitude), heights, when
    )
    return gyrofrequency(flux_density(flux))


def rays_of(
    scene: Scene,
    frequencies: list[float],
    mufs: PathMufs,
    only: set[tuple[float, int]] | None = None,
) -> list[list[dict[Mode, ModeRay]]]:
    """The leading rays of every frequency and hour.

    Parameters
    ----------
    scene : Scene
        The path.
    frequencies : list of float
        Frequencies [Hz].
    mufs : PathMufs
        MUFs of every hour; what lies well above them is not traced.
    only : set of (float, int), optional
        Frequencies [Hz] and hours that are wanted; all of them if not given.

    Returns
    -------
    list of list of dict
        For each frequency and hour the strongest ray of each wave that arrives.
    """
    hours = len(scene.overheads)
    hops = hop_counts(scene.link.distance)[0]
    wanted, missing = [], []
    for f in frequencies:
        for hour in range(hours):
            for i, mode in enumerate(MODES):
                if mode is Mode.EXTRAORDINARY and f <= scene.gyro_limit:
                    continue
                if only is not None and (f, hour) not in only:
                    continue
                muf = float(mufs.any_layer[i, hour])
                if math.isnan(muf) or muf >= _NEARLY * f:
                    wanted.append((f, hour, mode))
    found: dict[tuple[float, int], list[ModeRay]] = {}
    for (f, hour, mode), rays in zip(wanted, pure_rays(scene, wanted, hops), strict=True):
        found.setdefault((f, hour), []).extend(rays)
        if not rays and float(mufs.any_layer[MODES.index(mode), hour]) >= f:
            missing.append((f, hour))
    # A wave below its MUF without a ray in the coarse fan is looked for patiently.
    for f, hour in dict.fromkeys(missing):
        modes = MODES if f > scene.gyro_limit else (Mode.ORDINARY,)
        found[f, hour] = [
            r for r in find_modes(scene, f, modes, hour).rays if len(set(r.sequence)) == 1
        ]
    return [[strongest(found.get((f, hour), [])) for hour in range(hours)] for f in frequencies]


def _of_frequency(
    scene: Scene,
    frequency: float,
    rays: list[dict[Mode, ModeRay]],
    mufs: PathMufs,
    gyro: FloatArray,
    relay: RelayAt | None,
    moments: list[datetime],
    index: IntArray,
    receiver: Place,
    step_min: float,
) -> DayFrequency:
    count = len(moments)
    numbers = {name: np.full((2, count), np.nan) for name in _NUMBERS}
    hands: list[list[str | None]] = [[None] * count, [None] * count]
    state = ["unknown"] * count
    wave: list[str | None] = [None] * count
    receive: list[str | None] = [None] * count
    transmit: list[str | None] = [None] * count
    rejection = np.full(count, np.nan)
    probability = np.full((4, count), np.nan)
    for k, (step, leading) in enumerate(zip(index, rays, strict=True)):
        for i, mode in enumerate(MODES):
            if mode in leading:
                for name, value in _numbers_of(leading[mode], receiver).items():
                    numbers[name][i, step] = value
                hands[i][step] = hand_of(leading[mode].down.waves()[i]).value
        state[step] = state_of(MODES[0] in leading, MODES[1] in leading)
        probability[:, step] = chances_at(scene, frequency, leading, mufs, gyro, k)
        here = at_antenna(leading, receiver, frequency)
        if here is None:
            continue
        if relay is not None:
            found = positions_on_path(relay, here)
            best = choice(tuple(found[p] for p in relay.station.relay), here)
            taken = best.wave
            receive[step] = best.receive.label
            transmit[step] = None if best.send is None else best.send.label
            rejection[step] = best.receive.rejection_db(taken)
        else:
            taken = stronger(leading)
            hand = Hand(hands[MODES.index(taken)][step])
            receive[step], transmit[step] = hand.value, hand.opposite.value
        wave[step] = taken.value
    relative = np.array([(o.fof2_error or 0.0) / o.fof2 for o in scene.overheads])
    events = changes([moments[i] for i in index], mufs, frequency, relative, scene.gyro_limit)
    return DayFrequency(
        frequency_mhz=frequency / 1e6,
        state=tuple(state),
        probability=probability,
        receive_hand=(tuple(hands[0]), tuple(hands[1])),
        wave=tuple(wave),
        receive=tuple(receive),
        transmit=tuple(transmit),
        rejection_db=rejection,
        changes=events,
        plan=_plan(moments, state, wave, receive, transmit, events, step_min),
        **numbers,
    )


_NUMBERS: Final = (
    "elevation_deg",
    "azimuth_deg",
    "group_delay_ms",
    "absorption_db",
    "level_db",
    "axial_ratio_db",
)


def _numbers_of(ray: ModeRay, receiver: Place) -> dict[str, float]:
    azimuth, elevation = azimuth_elevation(-ray.ray.arrival, receiver.latitude, receiver.longitude)
    own = ray.down.waves()[MODES.index(ray.wave)]
    values = (
        math.degrees(float(elevation)),
        math.degrees(float(azimuth)),
        ray.ray.group_path / SPEED_OF_LIGHT * 1e3,
        ray.absorption_db,
        ray.level_db,
        float(axial_ratio_db(own)),
    )
    return dict(zip(_NUMBERS, values, strict=True))


def chances_at(
    scene: Scene,
    frequency: float,
    leading: dict[Mode, ModeRay],
    mufs: PathMufs,
    gyro: FloatArray,
    hour: int,
) -> FloatArray:
    """Probabilities of the states at one hour.

    Parameters
    ----------
    scene : Scene
        The path.
    frequency : float
        Frequency [Hz].
    leading : dict
        Mode to ray, of the waves that arrive.
    mufs : PathMufs
        MUFs of every hour.
    gyro : ndarray, shape (hours,)
        From :func:`gyro_at_peaks` [Hz].
    hour : int
        Index of the hour [1].

    Returns
    -------
    ndarray, shape (4,)
        In the order of :data:`magion.answers.certainty.STATES`; NaN where the
        uncertainty of foF2 is not known [1].
    """
    overhead = scene.overheads[hour]
    if overhead.fof2_error is None:
        return np.full(4, np.nan)
    levels = []
    for i, mode in enumerate(MODES):
        muf = float(mufs.f_region[i, hour])
        arriving = leading.get(mode)
        if arriving is not None and arriving.layers[-1] in ("E", "Es"):
            levels.append(0.0)
            continue
        if arriving is not None:
            muf = max(muf, frequency) if math.isfinite(muf) else frequency
        elif math.isfinite(muf) and muf >= frequency:
            muf = math.nan  # it does not come down here for another reason
        passed = mode is Mode.EXTRAORDINARY and frequency <= scene.gyro_limit
        if passed or not math.isfinite(muf):
            levels.append(math.inf)
        else:
            levels.append(least_fof2(frequency, muf, overhead.fof2, float(gyro[hour]), i == 0))
    found = probabilities((levels[0], levels[1]), overhead.fof2, overhead.fof2_error)
    return np.array([getattr(found, name) for name in STATES])


def _plan(
    moments: list[datetime],
    state: list[str],
    wave: list[str | None],
    receive: list[str | None],
    transmit: list[str | None],
    events: tuple[Change, ...],
    step_min: float,
) -> tuple[Switch, ...]:
    """Where the advice changes, with the time of the event that changes it."""
    plan = []
    for i in range(len(moments)):
        now = (wave[i], receive[i], transmit[i])
        if i and now == (wave[i - 1], receive[i - 1], transmit[i - 1]):
            continue
        if i == 0:
            plan.append(_switch(moments[0], None, now, f"start of the day: {_word(state[0])}"))
            continue
        middle = moments[i] - timedelta(minutes=0.5 * step_min)
        near = [
            e
            for e in events
            if abs(datetime.fromisoformat(e.time_utc) - middle) <= timedelta(minutes=step_min)
        ]
        if state[i] != state[i - 1] and near:
            # Of several, the one that makes the new state.
            made = [e for e in near if e.state == state[i]] or near
            event = min(made, key=lambda e: abs(datetime.fromisoformat(e.time_utc) - middle))
            verb = "comes" if event.comes else "goes"
            reason = f"the {event.wave} wave {verb}: {_word(state[i])}"
            at = datetime.fromisoformat(event.time_utc)
            plan.append(_switch(at, event.plus_minus_min, now, reason))
        elif state[i] != state[i - 1]:
            plan.append(_switch(middle, 0.5 * step_min, now, f"{_word(state[i])} from here"))
        else:
            reason = f"both arrive, the {now[0]} wave is to be taken"
            if now[0] == wave[i - 1]:
                does = "sends" if now[1] == receive[i - 1] else "parts"
                reason = f"another position {does} the {now[0]} wave better"
            plan.append(_switch(middle, 0.5 * step_min, now, reason))
    return tuple(plan)


def _word(state: str) -> str:
    return {
        "both": "both arrive",
        "ordinary_only": "only the ordinary arrives",
        "extraordinary_only": "only the extraordinary arrives",
        "none": "neither arrives",
    }.get(state, "the readings do not reach here")


def _switch(
    moment: datetime,
    plus_minus_min: float | None,
    now: tuple[str | None, str | None, str | None],
    reason: str,
) -> Switch:
    return Switch(
        time_utc=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        plus_minus_min=plus_minus_min,
        wave=now[0],
        receive=now[1],
        transmit=now[2],
        reason=reason,
    )
