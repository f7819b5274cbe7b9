"""The build sheet: the delay line, and what the feed does across a band."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.answers.cautions import CAUTIONS
from magion.answers.inputs import FREQUENCY_MHZ, finite_or_none, require_frequency
from magion.antenna.feed import (
    delay_length,
    electrical_length,
    quarter_wave,
    standing_wave_ratio,
)
from magion.antenna.impedance import impedance_of, leg_length_of, unknown_impedance
from magion.antenna.response import (
    NO_HAND_DB,
    decibels,
    network_of,
    overhead_rejection_db,
    rejection_db,
)
from magion.antenna.station import Feed, FeedKind, RelayPosition, Station
from magion.arrays import FloatArray
from magion.errors import InputError, require_range
from magion.polarization import Hand

SCHEMA: Final = "magion/feed/1"
CABLES: Final = {
    "solid polyethylene": 0.66,
    "solid PTFE": 0.695,
    "foam polyethylene, dense": 0.78,
    "foam polyethylene, light": 0.85,
}
"""Velocity factors of usual cables (common practice) [1]."""

TOLERANCE_DEG: Final = 10.0
TOLERANCE_DB: Final = 1.0
MOST_ROWS: Final = 2000
_METRES_PER_FOOT = 0.3048
_BAND_SHARE = 0.04


@dataclass(frozen=True, slots=True, kw_only=True)
class QuarterWave:
    """A quarter wave of one kind of cable.

    Parameters
    ----------
    cable : str
        Which.
    velocity_factor : float
        Of the cable [1].
    length_m : float
        Its length [m].
    length_ft : float
        The same in feet [ft].
    """

    cable: str
    velocity_factor: float
    length_m: float
    length_ft: float


@dataclass(frozen=True, slots=True, kw_only=True)
class DelayLine:
    """The delay line to cut, and the one that the station has.

    Parameters
    ----------
    velocity_factor : float
        Of its cable [1].
    quarter_wave_m : float
        A quarter wave of it [m].
    quarter_wave_ft : float
        The same in feet [ft].
    leads_m : float
        Relay leads and connectors in the delayed path [m].
    cut_m : float
        What is left to cut [m].
    cut_ft : float
        The same in feet [ft].
    dip_mhz : float
        Frequency at which the cut piece alone, its far end open, shows its
        first dip of impedance [MHz].
    present_m : float or None
        Length in the station file, leads not counted; None where the file
        leaves it to the quarter wave [m].
    present_deg : float
        Electrical length of the delayed path at the frequency, leads counted [deg].
    """

    velocity_factor: float
    quarter_wave_m: float
    quarter_wave_ft: float
    leads_m: float
    cut_m: float
    cut_ft: float
    dip_mhz: float
    present_m: float | None
    present_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Tolerance:
    """Errors that still hold about 20 dB.

    Parameters
    ----------
    phase_deg : float
        Error of the phase between the currents, along with the next [deg].
    amplitude_db : float
        Error of their sizes [dB].
    length_m : float
        Cable that makes the phase error [m].
    rejection_db : float
        Rejection of a circular wave from overhead with both errors [dB].
    """

    phase_deg: float
    amplitude_db: float
    length_m: float
    rejection_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ArmInFeed:
    """One element.

    Parameters
    ----------
    name : str
        The operator's name.
    hot_bearing_deg, cold_bearing_deg : float
        True bearings of its legs [deg].
    """

    name: str
    hot_bearing_deg: float
    cold_bearing_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PositionInFeed:
    """One relay position.

    Parameters
    ----------
    label : str
        The operator's label.
    delayed_arm, single_arm : str or None
        Arm with the line; arm that is used alone.
    hand : Hand or None
        Hand that it hears from overhead, and sends upward; None where it has
        none.
    rejection_db : float or None
        Of the other hand, for circular waves from overhead; None where the
        impedance is not known [dB].
    """

    label: str
    delayed_arm: str | None
    single_arm: str | None
    hand: Hand | None
    rejection_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class BandRow:
    """The feed at one frequency, the line in the first delayed arm.

    Parameters
    ----------
    frequency_mhz : float
        Frequency [MHz].
    line_deg : float or None
        Electrical length of the delayed path; None of a single element [deg].
    resistance_ohm, reactance_ohm : float or None
        Of each element [ohm].
    phase_deg : float or None
        Current of the delayed arm over the other's [deg].
    amplitude_db : float or None
        The same of their sizes [dB].
    rejection_db : float or None
        Of the other hand, for circular waves from overhead [dB].
    swr : float or None
        At the radio [1].
    loss_db : float or None
        In cables and in a combiner's or hybrid's load [dB].
    """

    frequency_mhz: float
    line_deg: float | None
    resistance_ohm: float | None
    reactance_ohm: float | None
    phase_deg: float | None
    amplitude_db: float | None
    rejection_db: float | None
    swr: float | None
    loss_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class FeedAnswer:
    """The build sheet.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    frequency_mhz : float
        Frequency that the line is cut for [MHz].
    station, antenna, ground, feed : str or None
        Name of the station, kinds of antenna, ground and feed.
    height_m, leg_length_m : float or None
        Of the feed point; of each leg [m].
    cable_ohm : float or None
        Characteristic impedance of the cables [ohm].
    can_transmit : bool or None
        Whether antenna and feed may carry transmit power; None without a
        station file.
    arms : tuple of ArmInFeed
        The elements.
    quarter_waves : tuple of QuarterWave
        Lengths for usual cables.
    line : DelayLine or None
        The delay line; None where the feed has none.
    tolerance : Tolerance
        What holds about 20 dB.
    positions : tuple of PositionInFeed
        The relay.
    delayed_arm : str or None
        Arm that carries the line in the rows of the band.
    band : tuple of BandRow
        Over the band.
    has_hand : bool
        Whether any position tells one hand from the other at the frequency.
    headline : str
        One line to act on.
    caveats, cautions : tuple of str
        What to keep in mind, and what can hurt.
    """

    schema: str
    frequency_mhz: float
    station: str | None
    antenna: str | None
    ground: str | None
    feed: str | None
    height_m: float | None
    leg_length_m: float | None
    cable_ohm: float | None
    can_transmit: bool | None
    arms: tuple[ArmInFeed, ...]
    quarter_waves: tuple[QuarterWave, ...]
    line: DelayLine | None
    tolerance: Tolerance
    positions: tuple[PositionInFeed, ...]
    delayed_arm: str | None
    band: tuple[BandRow, ...]
    has_hand: bool
    headline: str
    caveats: tuple[str, ...]
    cautions: tuple[str, ...]


def answer_feed(
    frequency_mhz: float,
    station: Station | None = None,
    band_mhz: Sequence[float] | None = None,
    *,
    velocity_factor: float | None = None,
) -> FeedAnswer:
    """The delay line of a station, and what its feed does across a band.

    Parameters
    ----------
    frequency_mhz : float
        Frequency that the line is cut for, 0.5 to 60 [MHz].
    station : Station, optional
        The station; without one, matched and isolated arms.
    band_mhz : sequence of float, optional
        Frequencies of the rows; else 4 % either side [MHz].
    velocity_factor : float, optional
        Of the cable, 0.4 to 1; without one the station's, or 0.66 [1].

    Returns
    -------
    FeedAnswer
        The build sheet.

    Raises
    ------
    InputError
        If a value is out of range.
    """
    f = require_frequency(frequency_mhz)
    if velocity_factor is not None:
        require_range("the velocity factor", velocity_factor, 0.4, 1.0)
        if station is not None:
            raise InputError("a velocity factor and a station file contradict each other; give one")
    rows = np.asarray(
        np.linspace(
            max(frequency_mhz * (1.0 - _BAND_SHARE), FREQUENCY_MHZ[0]),
            min(frequency_mhz * (1.0 + _BAND_SHARE), FREQUENCY_MHZ[1]),
            9,
        )
        if band_mhz is None
        else [require_range("a frequency of the band", b, *FREQUENCY_MHZ, "MHz") for b in band_mhz]
    )
    if not 1 <= rows.size <= MOST_ROWS:
        raise InputError(f"the band has {rows.size} frequencies; accepted: 1 to {MOST_ROWS}")
    feed = Feed(kind=FeedKind.COMBINER, velocity_factor=velocity_factor or 0.66)
    if station is not None:
        feed = station.feed
    tolerance = _tolerance(f, feed)
    lines = tuple(
        QuarterWave(cable=name, velocity_factor=vf, length_m=m, length_ft=m / _METRES_PER_FOOT)
        for name, vf in CABLES.items()
        for m in [float(quarter_wave(f, vf))]
    )
    if station is None:
        return _generic(frequency_mhz, feed, rows, tolerance, lines)
    return _of_station(frequency_mhz, station, rows, tolerance, lines)


def _tolerance(frequency: float, feed: Feed) -> Tolerance:
    phase = math.radians(TOLERANCE_DEG)
    return Tolerance(
        phase_deg=TOLERANCE_DEG,
        amplitude_db=TOLERANCE_DB,
        length_m=float(quarter_wave(frequency, feed.velocity_factor)) * TOLERANCE_DEG / 90.0,
        rejection_db=float(_of_currents(phase - 0.5 * math.pi, TOLERANCE_DB)),
    )


def _of_currents(phase: float | FloatArray, amplitude_db: float | FloatArray) -> FloatArray:
    """Rejection of the worse hand overhead for the ratio of two equal arms' currents."""
    ratio = 10.0 ** (np.asarray(amplitude_db) / 20.0) * np.exp(1j * np.asarray(phase))
    return np.asarray(
        np.abs(rejection_db(np.abs(1.0 + 1j * ratio) ** 2, np.abs(1.0 - 1j * ratio) ** 2))
    )


def _line(frequency: float, feed: Feed, resonant_frequency: float | None) -> DelayLine | None:
    if feed.kind in (FeedKind.HYBRID, FeedKind.DIGITAL):
        return None
    quarter = float(quarter_wave(frequency, feed.velocity_factor))
    cut = quarter - feed.leads
    total = delay_length(feed, resonant_frequency or frequency)
    return DelayLine(
        velocity_factor=feed.velocity_factor,
        quarter_wave_m=quarter,
        quarter_wave_ft=quarter / _METRES_PER_FOOT,
        leads_m=feed.leads,
        cut_m=cut,
        cut_ft=cut / _METRES_PER_FOOT,
        dip_mhz=frequency / 1e6 * quarter / cut if cut > 0.0 else math.nan,
        present_m=feed.line_length,
        present_deg=math.degrees(float(electrical_length(feed, frequency, total))),
    )


def _generic(
    frequency_mhz: float,
    feed: Feed,
    rows: FloatArray,
    tolerance: Tolerance,
    lines: tuple[QuarterWave, ...],
) -> FeedAnswer:
    """Without a station: matched and isolated arms."""
    degrees = 90.0 * rows / frequency_mhz
    rejected = _of_currents(-np.radians(degrees), 0.0)
    line = _line(frequency_mhz * 1e6, feed, None)
    length = lines[0].length_m if line is None else line.quarter_wave_m
    return FeedAnswer(
        schema=SCHEMA,
        frequency_mhz=frequency_mhz,
        station=None,
        antenna=None,
        ground=None,
        feed=None,
        height_m=None,
        leg_length_m=None,
        cable_ohm=None,
        can_transmit=None,
        arms=(),
        quarter_waves=lines,
        line=line,
        tolerance=tolerance,
        positions=(),
        delayed_arm=None,
        band=tuple(
            BandRow(
                frequency_mhz=float(mhz),
                line_deg=float(deg),
                resistance_ohm=None,
                reactance_ohm=None,
                phase_deg=-float(deg),
                amplitude_db=0.0,
                rejection_db=float(db),
                swr=None,
                loss_db=None,
            )
            for mhz, deg, db in zip(rows, degrees, rejected, strict=True)
        ),
        has_hand=True,
        headline=(
            f"A 90-degree line for {frequency_mhz:.3f} MHz: {length:.3f} m of cable with "
            f"velocity factor {feed.velocity_factor:g}, relay leads counted in."
        ),
        caveats=(
            "Without a station file the arms are taken as matched and isolated: dipoles on a "
            "plain tee do far worse off their resonance. Give --station FILE.toml.",
        ),
        cautions=CAUTIONS,
    )


def _of_station(
    frequency_mhz: float,
    station: Station,
    rows: FloatArray,
    tolerance: Tolerance,
    lines: tuple[QuarterWave, ...],
) -> FeedAnswer:
    f = frequency_mhz * 1e6
    antenna, feed = station.antenna, station.feed
    crossed = antenna.kind.is_crossed
    line = _line(f, feed, antenna.resonant_frequency) if crossed else None
    positions = tuple(_position(station, p, f) for p in station.relay)
    first = next((p for p in station.relay if p.delayed), station.relay[0])
    has_hand = any(p.hand is not None for p in positions)
    unknown = any(p.rejection_db is None for p in positions)
    caveats = []
    if unknown:
        caveats.append(f"The hands cannot be told: {unknown_impedance(station, f)}.")
    if crossed and not has_hand and not unknown:
        caveats.append(
            "Two arms fed in phase or in opposite phase are one dipole turned by 45°. Only a "
            "quarter wave of delay (or three quarters, with the hands reversed) makes a hand."
        )
    if line is not None and 225.0 < line.present_deg < 315.0:
        caveats.append(
            "The line is three quarters of a wave: the hands are reversed, and the error with "
            "frequency is three times that of a quarter wave."
        )
    return FeedAnswer(
        schema=SCHEMA,
        frequency_mhz=frequency_mhz,
        station=station.name,
        antenna=antenna.kind.value,
        ground=station.ground_name,
        feed=feed.kind.value,
        height_m=antenna.height,
        leg_length_m=leg_length_of(antenna, station.ground),
        cable_ohm=feed.impedance,
        can_transmit=station.can_transmit,
        arms=tuple(
            ArmInFeed(
                name=a.name,
                hot_bearing_deg=math.degrees(a.bearing),
                cold_bearing_deg=(math.degrees(a.bearing) + 180.0) % 360.0,
            )
            for a in antenna.arms
        ),
        quarter_waves=lines,
        line=line,
        tolerance=tolerance,
        positions=positions,
        delayed_arm=first.delayed,
        band=_band(station, first, rows),
        has_hand=has_hand,
        headline=_headline(frequency_mhz, station, line, positions, unknown),
        caveats=tuple(caveats),
        cautions=CAUTIONS,
    )


def _position(station: Station, position: RelayPosition, frequency: float) -> PositionInFeed:
    right_over_left = float(overhead_rejection_db(station, position, frequency)[0])
    hand = None
    if position.single is None and abs(right_over_left) >= NO_HAND_DB:
        hand = Hand.RIGHT if right_over_left > 0.0 else Hand.LEFT
    return PositionInFeed(
        label=position.label,
        delayed_arm=position.delayed,
        single_arm=position.single,
        hand=hand,
        rejection_db=finite_or_none(abs(right_over_left)),
    )


def _headline(
    frequency_mhz: float,
    station: Station,
    line: DelayLine | None,
    positions: tuple[PositionInFeed, ...],
    unknown: bool,
) -> str:
    if not station.antenna.kind.is_crossed:
        return "One element alone: it has no hand and needs no delay line."
    if unknown:
        return "The impedance is not known here: the hand of the relay positions cannot be told."
    if not any(p.hand for p in positions):
        apart = "" if line is None else f" (the delayed path is {line.present_deg:.0f}° long)"
        return (
            f"No hand at all on {frequency_mhz:.3f} MHz{apart}: no relay position tells RHCP from "
            "LHCP."
        )
    named = [f"{p.label} hears {p.hand.value}" for p in positions if p.hand]
    worst = min(p.rejection_db or 0.0 for p in positions if p.hand)
    down = f"{worst:.0f}" if worst < 59.5 else "60 or more"
    return f"From overhead {', '.join(named)}; the other hand is {down} dB down."


def _band(station: Station, position: RelayPosition, rows: FloatArray) -> tuple[BandRow, ...]:
    f = rows * 1e6
    antenna, feed = station.antenna, station.feed
    arms = [a.name for a in antenna.arms]
    network = network_of(station, position, f)
    load = impedance_of(antenna, leg_length_of(antenna, station.ground), station.ground, f)
    rejected = np.abs(overhead_rejection_db(station, position, f))
    total = delay_length(feed, antenna.resonant_frequency)
    line = np.degrees(electrical_length(feed, f, total))
    if feed.kind in (FeedKind.HYBRID, FeedKind.DIGITAL):
        line = np.full(f.shape, 90.0 + math.degrees(feed.phase_error))
    if position.delayed is None:
        ratio = np.full(f.shape, np.nan + 0j)
    else:
        late = arms.index(position.delayed)
        with np.errstate(invalid="ignore", divide="ignore"):
            ratio = network.current[late] / network.current[1 - late]
    swr = standing_wave_ratio(network.mismatch)
    loss = -decibels(network.fed / (1.0 - network.reflected))
    return tuple(
        BandRow(
            frequency_mhz=float(rows[i]),
            line_deg=float(line[i]) if antenna.kind.is_crossed else None,
            resistance_ohm=finite_or_none(load[i].real),
            reactance_ohm=finite_or_none(load[i].imag) if np.isfinite(load[i].real) else None,
            phase_deg=finite_or_none(math.degrees(float(np.angle(ratio[i])))),
            amplitude_db=finite_or_none(float(2.0 * decibels(np.abs(ratio[i])))),
            rejection_db=finite_or_none(rejected[i]),
            swr=finite_or_none(swr[i]),
            loss_db=finite_or_none(loss[i]),
        )
        for i in range(f.size)
    )
