"""Sense versus frequency: which hand each wave has from every part of the sky.

No ray is traced: see :mod:`magion.answers.sight`. The state overhead follows
from the critical frequencies alone.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Final

import numpy as np

from magion.answers.certainty import StateProbabilities, probabilities, state_of
from magion.answers.inputs import IonosphereInput, finite_or_none, instant, require_frequency
from magion.answers.scene import Overhead, scene_of
from magion.answers.sight import ArrivingShapes, arriving_shapes, limiting_heights
from magion.antenna.response import (
    best_position,
    decibels,
    element_lengths,
    gain,
    joined,
    networks,
    rejection_db,
)
from magion.antenna.station import Station
from magion.arrays import BoolArray, FloatArray, IntArray
from magion.errors import InputError, require_range
from magion.field import MODEL, declination, dip, field_at, flux_density, gyrofrequency
from magion.geometry import Place
from magion.polarization import (
    LARGEST_AXIAL_RATIO_DB,
    LINEAR_LIMIT_DB,
    Hand,
    Shape,
    shape_of,
)
from magion.rays.link import link_between
from magion.waves import (
    extraordinary_critical_frequency,
)

SCHEMA: Final = "magion/station/1"
LIMITING_HEIGHT_KM: Final = 90.0
"""Limiting height where no time is given: between a usual day's and night's [km]."""

FREQUENCIES_MHZ: Final = (
    1.85, 2.5, 3.65, 5.0, 5.36, 7.1, 10.0, 10.12, 14.1, 15.0, 18.1, 20.0, 21.2, 24.9, 28.5,
)  # fmt: skip
"""Across HF: the amateur bands and the frequencies of time signals [MHz]."""

BEARINGS_DEG: Final = (0.0, 45.0, 90.0, 135.0, 180.0, 225.0, 270.0, 315.0)
ELEVATIONS_DEG: Final = (60.0, 30.0, 15.0)
MOST_CELLS: Final = 200_000
_SKY = np.arange(0.0, 90.01, 0.25)


@dataclass(frozen=True, slots=True, kw_only=True)
class SenseCell:
    """Both waves from one direction.

    Parameters
    ----------
    azimuth_deg : float or None
        Where they come from; None from overhead [deg].
    elevation_deg : float
        Above the horizontal [deg].
    limiting_height_km : float
        Where the hand is set [km].
    field_angle_deg : float
        Angle of the wave normal to the field there [deg].
    ordinary_hand, extraordinary_hand : Hand
        Hands to receive them with.
    axial_ratio_db : float or None
        Of both waves; None beyond 60 dB [dB].
    ordinary_axis_deg, extraordinary_axis_deg : float
        True bearings of their major axes on the ground, 0 to 180 [deg].
    shape : Shape
        Circular, elliptical or linear.
    ordinary_position, extraordinary_position : str or None
        Relay positions that take each and reject the other.
    ordinary_rejection_db, extraordinary_rejection_db : float or None
        Rejection there, when that wave is wanted [dB].
    """

    azimuth_deg: float | None
    elevation_deg: float
    limiting_height_km: float
    field_angle_deg: float
    ordinary_hand: Hand
    extraordinary_hand: Hand
    axial_ratio_db: float | None
    ordinary_axis_deg: float
    extraordinary_axis_deg: float
    shape: Shape
    ordinary_position: str | None
    extraordinary_position: str | None
    ordinary_rejection_db: float | None
    extraordinary_rejection_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class SenseRow:
    """One frequency.

    Parameters
    ----------
    frequency_mhz : float
        Frequency [MHz].
    gyro_ratio : float
        Gyrofrequency over frequency, overhead at the limiting height [1].
    absorption_ratio : float or None
        Absorption of the extraordinary over the ordinary wave in dB, overhead
        and for few collisions; None at and below the gyrofrequency [1].
    linear_from_deg, linear_to_deg : float or None
        Elevations toward the turning side between which the waves are so
        linear that a wire beats circular; None where they never are [deg].
    overhead : SenseCell
        From the zenith.
    cells : tuple of SenseCell
        From every elevation and bearing, elevation by elevation.
    state : str or None
        Which waves come back from overhead, where a time is given.
    state_probabilities : StateProbabilities or None
        Of the states.
    """

    frequency_mhz: float
    gyro_ratio: float
    absorption_ratio: float | None
    linear_from_deg: float | None
    linear_to_deg: float | None
    overhead: SenseCell
    cells: tuple[SenseCell, ...]
    state: str | None
    state_probabilities: StateProbabilities | None


@dataclass(frozen=True, slots=True, kw_only=True)
class SenseAnswer:
    """The sense-versus-frequency table of a station.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    name : str or None
        Name of the place.
    latitude_deg, longitude_deg : float
        Place [deg].
    locator : str
        Six-sign grid locator.
    date : str
        Date of the field.
    time_utc : str or None
        Instant of the states, where one was given.
    model : str
        Field model.
    height_km : float or None
        Limiting height, where it was set; None where the ionosphere sets it [km].
    dip_deg, declination_deg : float
        Of the field overhead at 90 km, or at the set height [deg].
    gyrofrequency_mhz : float
        The same of the gyrofrequency [MHz].
    turns_toward_deg : float
        True bearing of the side on which the hand turns over [deg].
    turns_below_deg : float or None
        Elevation on that side below which the hands change places; None where
        they do not [deg].
    fof2_mhz, fxf2_mhz, foe_mhz : float or None
        Overhead, where a time is given [MHz].
    source : str or None
        Of the ionosphere.
    station : str or None
        Kind of antenna, where a station file is given.
    elevations_deg, bearings_deg : tuple of float
        Of the cells [deg].
    rows : tuple of SenseRow
        The frequencies.
    caveats : tuple of str
        What to keep in mind.
    """

    schema: str
    name: str | None
    latitude_deg: float
    longitude_deg: float
    locator: str
    date: str
    time_utc: str | None
    model: str
    height_km: float | None
    dip_deg: float
    declination_deg: float
    gyrofrequency_mhz: float
    turns_toward_deg: float
    turns_below_deg: float | None
    fof2_mhz: float | None
    fxf2_mhz: float | None
    foe_mhz: float | None
    source: str | None
    station: str | None
    elevations_deg: tuple[float, ...]
    bearings_deg: tuple[float, ...]
    rows: tuple[SenseRow, ...]
    caveats: tuple[str, ...]


def answer_station(
    place: Place,
    frequencies_mhz: Sequence[float] | None = None,
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
    *,
    elevations_deg: Sequence[float] | None = None,
    height_km: float | None = None,
    station: Station | None = None,
) -> SenseAnswer:
    """Sense versus frequency at a place.

    Parameters
    ----------
    place : Place
        The receiver.
    frequencies_mhz : sequence of float, optional
        Frequencies, 0.5 to 60; else a list across HF [MHz].
    when : datetime, optional
        Instant for the states overhead and the limiting heights; without one
        the field of today and a fixed limiting height.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere; needs `when`.
    elevations_deg : sequence of float, optional
        Elevations, 1 to 89; else 60, 30 and 15 [deg].
    height_km : float, optional
        Limiting height, 60 to 300, in place of the ionosphere's [km].
    station : Station, optional
        Antenna and feed, for the rejection.

    Returns
    -------
    SenseAnswer
        The table.

    Raises
    ------
    InputError
        If a value is out of range or the list of frequencies is empty.
    """
    chosen = FREQUENCIES_MHZ if frequencies_mhz is None else tuple(frequencies_mhz)
    frequency = np.array([require_frequency(f) for f in chosen])
    low = ELEVATIONS_DEG if elevations_deg is None else tuple(elevations_deg)
    for value in low:
        require_range("an elevation", value, 1.0, 89.0, "degrees")
    if frequency.size == 0 or not low:
        raise InputError("no frequency or no elevation is given; accepted: one or more of each")
    if frequency.size * len(low) * len(BEARINGS_DEG) > MOST_CELLS:
        raise InputError(f"the table would have more than {MOST_CELLS} cells; ask for fewer")
    if height_km is not None:
        require_range("the limiting height", height_km, 60.0, 300.0, "km")
    moment = instant(when)
    if ionosphere is not None and ionosphere != IonosphereInput() and when is None:
        raise InputError("what is known of the ionosphere needs a time; give --time")
    azimuth = np.radians(np.concatenate([[0.0], np.tile(BEARINGS_DEG, len(low))]))
    elevation = np.radians(np.concatenate([[90.0], np.repeat(low, len(BEARINGS_DEG))]))
    f, az = np.meshgrid(frequency, azimuth, indexing="ij")
    el = np.broadcast_to(elevation, f.shape)
    overhead = None
    if when is not None:
        given = ionosphere or IonosphereInput()
        overhead = scene_of(link_between(place, place), [moment], given).overheads[0]
    fixed = (height_km or LIMITING_HEIGHT_KM) * 1e3
    height = np.full(f.shape, fixed)
    if overhead is not None and height_km is None:
        height = limiting_heights(
            overhead.profiles, place, az.ravel(), el.ravel(), f.ravel(), moment
        ).reshape(f.shape)
    shapes = arriving_shapes(place, az, el, height, f, moment)
    chosen_relay, caveats = _relay(station, shapes, f, az, el)
    above = field_at(place.latitude, place.longitude, fixed, moment)
    gyro = float(gyrofrequency(flux_density(above)))
    side, turns, linear = _turning(place, fixed, frequency, moment, above)
    if overhead is not None:
        caveats += overhead.caveats
    fxf2 = None
    if overhead is not None:
        peak = field_at(place.latitude, place.longitude, overhead.hmf2, moment)
        gyro_at_peak = float(gyrofrequency(flux_density(peak)))
        fxf2 = float(extraordinary_critical_frequency(overhead.fof2, gyro_at_peak)) / 1e6
    rows = []
    for i, mhz in enumerate(chosen):
        cells = tuple(_cell(shapes, chosen_relay, height, az, el, i, j) for j in range(az.shape[1]))
        state, chances = None, None
        if overhead is not None:
            state, chances = _state(overhead, frequency[i], gyro_at_peak)
        along = gyro * abs(math.cos(float(shapes.theta[i, 0])))
        rows.append(
            SenseRow(
                frequency_mhz=float(mhz),
                gyro_ratio=gyro / float(frequency[i]),
                absorption_ratio=(
                    ((frequency[i] + along) / (frequency[i] - along)) ** 2
                    if frequency[i] > gyro
                    else None
                ),
                linear_from_deg=finite_or_none(linear[0][i]),
                linear_to_deg=finite_or_none(linear[1][i]),
                overhead=cells[0],
                cells=cells[1:],
                state=state,
                state_probabilities=chances,
            )
        )
    return SenseAnswer(
        schema=SCHEMA,
        name=place.name,
        latitude_deg=place.latitude_deg,
        longitude_deg=place.longitude_deg,
        locator=place.locator,
        date=moment.strftime("%Y-%m-%d"),
        time_utc=None if when is None else moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        model=MODEL,
        height_km=None if overhead is not None and height_km is None else fixed / 1e3,
        dip_deg=math.degrees(float(dip(above))),
        declination_deg=math.degrees(float(declination(above))),
        gyrofrequency_mhz=gyro / 1e6,
        turns_toward_deg=side,
        turns_below_deg=turns,
        fof2_mhz=None if overhead is None else overhead.fof2 / 1e6,
        fxf2_mhz=fxf2,
        foe_mhz=None if overhead is None or overhead.foe is None else overhead.foe / 1e6,
        source=None if overhead is None else overhead.source,
        station=None if station is None else station.antenna.kind.value,
        elevations_deg=tuple(float(e) for e in low),
        bearings_deg=BEARINGS_DEG,
        rows=tuple(rows),
        caveats=caveats,
    )


def _cell(
    shapes: ArrivingShapes,
    relay: "_Relay | None",
    height: FloatArray,
    az: FloatArray,
    el: FloatArray,
    i: int,
    j: int,
) -> SenseCell:
    ratio = float(shapes.axial_ratio_db[0, i, j])
    hands = [Hand.RIGHT if shapes.right_hand[m, i, j] else Hand.LEFT for m in range(2)]
    axes = np.degrees(shapes.major_axis_bearing[:, i, j])
    return SenseCell(
        azimuth_deg=None if j == 0 else round(math.degrees(float(az[i, j])), 9),
        elevation_deg=round(math.degrees(float(el[i, j])), 9),
        limiting_height_km=float(height[i, j]) / 1e3,
        field_angle_deg=math.degrees(float(shapes.theta[i, j])),
        ordinary_hand=hands[0],
        extraordinary_hand=hands[1],
        axial_ratio_db=ratio if ratio <= LARGEST_AXIAL_RATIO_DB else None,
        ordinary_axis_deg=float(axes[0]),
        extraordinary_axis_deg=float(axes[1]),
        shape=shape_of(ratio),
        ordinary_position=None if relay is None else relay.label(0, i, j),
        extraordinary_position=None if relay is None else relay.label(1, i, j),
        ordinary_rejection_db=None if relay is None else relay.rejection_db(0, i, j),
        extraordinary_rejection_db=None if relay is None else relay.rejection_db(1, i, j),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Relay:
    """Best relay position and rejection, each shaped (2, frequencies, directions)."""

    labels: tuple[str, ...]
    index: IntArray
    rejection: FloatArray

    def label(self, wave: int, i: int, j: int) -> str | None:
        if not np.isfinite(self.rejection[wave, i, j]):
            return None
        return self.labels[int(self.index[wave, i, j])]

    def rejection_db(self, wave: int, i: int, j: int) -> float | None:
        return finite_or_none(float(self.rejection[wave, i, j]))


def _relay(
    station: Station | None,
    shapes: ArrivingShapes,
    frequency: FloatArray,
    azimuth: FloatArray,
    elevation: FloatArray,
) -> tuple[_Relay | None, tuple[str, ...]]:
    if station is None:
        return None, ()
    lengths = element_lengths(station, frequency, azimuth, elevation)
    nets = networks(station, frequency[:, 0])
    gains = np.stack(
        [
            [gain(joined(n.current[..., None], lengths), s, frequency) for s in shapes.states]
            for n in nets
        ]
    )
    dbi = decibels(gains)
    known: BoolArray = np.asarray(np.isfinite(dbi).all(axis=(0, 1)))
    index, rejection = [], []
    for wanted, other in ((0, 1), (1, 0)):
        best = best_position(np.nan_to_num(dbi[:, wanted]), np.nan_to_num(dbi[:, other]))
        index.append(best)
        pair = [np.take_along_axis(gains[:, m], best[None], axis=0)[0] for m in (wanted, other)]
        rejection.append(np.where(known, rejection_db(*pair), np.nan))
    relay = _Relay(
        labels=tuple(p.label for p in station.relay),
        index=np.stack(index),
        rejection=np.stack(rejection),
    )
    unknown = np.flatnonzero(~known[:, 0])
    if unknown.size == 0:
        return relay, ()
    return relay, (
        "The elements' impedance is outside the shipped table at "
        + ", ".join(f"{frequency[i, 0] / 1e6:g}" for i in unknown[:8])
        + (" ..." if unknown.size > 8 else "")
        + " MHz and is not guessed: no relay position is given there.",
    )


def _turning(
    place: Place, height: float, frequency: FloatArray, moment: datetime, above: FloatArray
) -> tuple[float, float | None, tuple[FloatArray, FloatArray]]:
    """The side where the hand turns over, the elevation, and where waves are linear.

    A wave comes down from the side toward which the field points down least:
    from magnetic north where the dip is positive, else from magnetic south.
    """
    side = float(declination(above)) + (0.0 if float(dip(above)) >= 0.0 else math.pi)
    elevation = np.radians(_SKY)
    f, el = np.meshgrid(frequency, elevation, indexing="ij")
    shapes = arriving_shapes(place, side, el, height, f, moment)
    cosine = np.cos(shapes.theta[0])
    crossing = np.flatnonzero(cosine[:-1] * cosine[1:] <= 0.0)
    turns = None
    if crossing.size:
        i = int(crossing[-1])
        share = cosine[i] / (cosine[i] - cosine[i + 1]) if cosine[i] != cosine[i + 1] else 0.0
        turns = float(_SKY[i] + share * (_SKY[i + 1] - _SKY[i]))
    linear = np.asarray(shapes.axial_ratio_db[0] > LINEAR_LIMIT_DB)
    any_linear = linear.any(axis=1)
    first = _SKY[np.argmax(linear, axis=1)]
    last = _SKY[_SKY.size - 1 - np.argmax(linear[:, ::-1], axis=1)]
    return (
        math.degrees(side) % 360.0,
        turns,
        (np.where(any_linear, first, np.nan), np.where(any_linear, last, np.nan)),
    )


def _state(
    overhead: Overhead, frequency: float, gyro: float
) -> tuple[str, StateProbabilities | None]:
    """Which waves come back from overhead, by the exact critical frequencies."""
    if overhead.foe is not None and frequency <= overhead.foe:
        levels = (0.0, 0.0 if frequency > gyro else math.inf)
    else:
        under = frequency * (frequency - gyro)
        levels = (frequency, math.sqrt(under) if under > 0.0 else math.inf)
    state = state_of(overhead.fof2 >= levels[0], overhead.fof2 >= levels[1])
    if overhead.fof2_error is None:
        return state, None
    return state, probabilities(levels, overhead.fof2, overhead.fof2_error)
