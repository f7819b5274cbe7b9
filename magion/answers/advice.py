"""What to do: the wave to take, the hand or relay position for it, and how sure."""

import math
from dataclasses import dataclass
from typing import Final

from magion.answers.certainty import (
    Change,
    PathMufs,
    StateProbabilities,
    confidence_of,
    least_fof2,
    probabilities,
    state_of,
)
from magion.answers.reception import AntennaOnPath, PositionOnPath, position_for
from magion.answers.records import Advice, Fading, Rejection, WaveOnPath
from magion.answers.scene import Scene
from magion.antenna.impedance import unknown_impedance
from magion.antenna.response import S_UNIT_DB
from magion.antenna.station import Station
from magion.constants import EARTH_RADIUS
from magion.geometry import great_circle
from magion.polarization import LINEAR_LIMIT_DB, Hand, Shape
from magion.waves import MODES, Mode

_CLEARLY_BETTER_DB: Final = 1.0
_SAME_PLACE_KM: Final = 5.0
_HALF_WAVE: Final = 20.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Known:
    """What the advice is drawn from.

    Parameters
    ----------
    scene : Scene
        The path.
    frequency : float
        Frequency [Hz].
    waves : tuple of WaveOnPath
        Ordinary and extraordinary.
    mufs : PathMufs
        MUFs of both.
    gyro : float
        Gyrofrequency at the peak over the midpoint [Hz].
    day : tuple of Change or None
        The day's times of change.
    no_day : bool
        Whether they were asked for and cannot be given.
    station : Station or None
        The receiver's station.
    antenna : AntennaOnPath or None
        What its antenna makes of the waves.
    """

    scene: Scene
    frequency: float
    waves: tuple[WaveOnPath, WaveOnPath]
    mufs: PathMufs
    gyro: float
    day: tuple[Change, ...] | None
    no_day: bool
    station: Station | None
    antenna: AntennaOnPath | None


def advice_on(known: Known) -> Advice:
    """What to do on a path.

    Parameters
    ----------
    known : Known
        What is known of it.

    Returns
    -------
    Advice
        The wave to take, how, and how sure.
    """
    ordinary, extraordinary = waves = known.waves
    state = state_of(ordinary.arrives, extraordinary.arrives)
    antenna = known.antenna
    taken = _taken(waves) if antenna is None else waves[MODES.index(antenna.wave)]
    chances = _probabilities(known.scene, known.frequency, waves, known.mufs, known.gyro)
    sure = None if chances is None else confidence_of(chances, state)
    caveats = _caveats(known.scene, known.frequency, waves, chances, state)
    if known.station is not None:
        caveats += _station_caveats(known, known.station)
    if known.no_day:
        caveats += (
            "Times of change are given for one hop (up to 3900 km) and for an ionosphere that "
            "is known through the day: not here.",
        )
    if known.day is not None and known.scene.overheads[0].ratios != (1.0, 1.0, 1.0):
        caveats += ("For the times of change the whole day is scaled as the values of now ask.",)
    rejection = separation = limited = None
    if antenna is not None:
        rejection = Rejection(
            ordinary=_best_rejection(antenna, Mode.ORDINARY),
            extraordinary=_best_rejection(antenna, Mode.EXTRAORDINARY),
        )
        separation = _separation(antenna, waves)
        limited = antenna.limited_by if antenna.has_hand else None
    return Advice(
        state=state,
        state_probabilities=chances,
        wave=taken.wave if taken else None,
        receive_hand=taken.receive_hand if taken else None,
        transmit_hand=taken.transmit_hand if taken else None,
        relay_position=antenna.position if antenna else None,
        transmit_relay_position=antenna.transmit_position if antenna else None,
        rejection_db=rejection,
        separation_db=separation,
        limited_by=limited,
        headline=_headline(taken, waves, sure, antenna),
        confidence=sure,
        caveats=caveats,
        fading=_fading(waves),
        changes=known.day,
    )


def _best_rejection(antenna: AntennaOnPath, mode: Mode) -> float:
    return position_for(antenna.positions, mode, both=True).rejection_db(mode)


def _chosen(antenna: AntennaOnPath) -> PositionOnPath:
    return next(p for p in antenna.positions if p.label == antenna.position)


def _separation(antenna: AntennaOnPath, waves: tuple[WaveOnPath, WaveOnPath]) -> float | None:
    """Wanted over unwanted in the chosen position, with the waves' own levels."""
    levels = [w.level_db for w in waves if w.arrives]
    if len(levels) < 2 or levels[0] is None or levels[1] is None:
        return None
    lead = levels[0] - levels[1]
    if antenna.wave is Mode.EXTRAORDINARY:
        lead = -lead
    return lead + _chosen(antenna).rejection_db(antenna.wave)


def _taken(waves: tuple[WaveOnPath, WaveOnPath]) -> WaveOnPath | None:
    """The stronger wave; within 3 dB, the ordinary."""
    ordinary, extraordinary = waves
    if not (ordinary.arrives and extraordinary.arrives):
        return ordinary if ordinary.arrives else extraordinary if extraordinary.arrives else None
    lead = (extraordinary.level_db or 0.0) - (ordinary.level_db or 0.0)
    return extraordinary if lead > 3.0 else ordinary


def _probabilities(
    scene: Scene,
    frequency: float,
    waves: tuple[WaveOnPath, WaveOnPath],
    mufs: PathMufs,
    gyro: float,
) -> StateProbabilities | None:
    overhead = scene.overheads[0]
    if overhead.fof2_error is None:
        return None
    levels = []
    for i, wave in enumerate(waves):
        rays = (wave, *wave.rays) if wave.arrives else ()
        muf = float(mufs.f_region[i, 0])
        if wave.arrives:
            muf = max(muf, frequency) if math.isfinite(muf) else frequency
        elif muf >= frequency:
            muf = math.nan  # no ray comes down here for another reason
        absorbed = not wave.arrives and wave.absorption_db is not None
        passed = wave.wave is Mode.EXTRAORDINARY and frequency <= scene.gyro_limit
        if any(r.layer in ("E", "Es") for r in rays):
            levels.append(0.0)
        elif absorbed or passed or not math.isfinite(muf):
            levels.append(math.inf)
        else:
            levels.append(least_fof2(frequency, muf, overhead.fof2, gyro, i == 0))
    return probabilities((levels[0], levels[1]), overhead.fof2, overhead.fof2_error)


def _fading(waves: tuple[WaveOnPath, WaveOnPath]) -> Fading | None:
    shifts = [w.doppler_hz for w in waves]
    if shifts[0] is None or shifts[1] is None:
        return None
    split = shifts[1] - shifts[0]
    return Fading(doppler_split_hz=split, period_s=1.0 / abs(split) if split else None)


def _headline(
    taken: WaveOnPath | None,
    waves: tuple[WaveOnPath, WaveOnPath],
    sure: str | None,
    antenna: AntennaOnPath | None,
) -> str:
    if sure == "cannot_tell" and (taken is None or taken.receive_hand is None):
        return "Too uncertain to tell: perhaps a wave arrives, but none in the central case."
    if taken is None or taken.receive_hand is None or taken.transmit_hand is None:
        return "Neither wave arrives: no hand will help on this frequency now."
    other = waves[1] if taken is waves[0] else waves[0]
    company = "both waves arrive" if other.arrives else "the other wave does not arrive"
    if other.arrives and other.level_db is not None and taken.level_db is not None:
        lead = taken.level_db - other.level_db
        company = (
            f"the other wave is {lead:.0f} dB weaker"
            if lead >= 3.0
            else ("both arrive, within 3 dB")
        )
    if antenna is not None:
        return _relay_headline(antenna, taken, company, other.arrives, sure)
    if taken.shape is Shape.LINEAR:
        return (
            f"{taken.wave.value.capitalize()} wave, nearly linear: use a single wire along "
            f"{taken.major_axis_bearing_deg:.0f}° true ({company})."
        )
    if sure == "cannot_tell":
        return (
            f"Too uncertain to tell which waves arrive. If the {taken.wave.value} does: receive "
            f"{taken.receive_hand.value}, transmit {taken.transmit_hand.value} to answer on it."
        )
    return (
        f"Receive {taken.receive_hand.value}: {taken.wave.value} wave; to answer on it transmit "
        f"{taken.transmit_hand.value} ({company})."
    )


def _relay_headline(
    antenna: AntennaOnPath, taken: WaveOnPath, company: str, both: bool, sure: str | None
) -> str:
    """The line to act on, in the station's own labels."""
    chosen = _chosen(antenna)
    if chosen.single_arm is None and not antenna.has_hand:
        path = antenna.network.path_deg or 0.0
        half = "the delay line is a half wave, and " if abs(path - 180.0) < _HALF_WAVE else ""
        return (
            f"No hand at all: {half}the currents of the two arms are "
            f"{abs(antenna.network.phase_deg or 0.0):.0f}° apart, which makes one slanting dipole "
            "of them; no relay position can part the waves."
        )
    line = f"{taken.wave.value} wave"
    if both:
        db = chosen.rejection_db(antenna.wave)
        put_down = f"puts the other down by {db:.0f} dB ({db / S_UNIT_DB:.1f} S-units)"
        if db < _CLEARLY_BETTER_DB:
            put_down = "cannot put the other down"
        limit = f", limited most by the {antenna.limited_by}" if antenna.limited_by else ""
        line += f", {put_down}{limit}; {company}"
    else:
        line += f"; {company}"
    doubt = (
        "Too uncertain to tell which waves arrive. If it does: relay"
        if (sure == "cannot_tell")
        else "Relay"
    )
    sending = ""
    if antenna.transmit_position is None:
        sending = " Receive only."
    elif antenna.transmit_position != antenna.position:
        sending = f" To answer on it switch to {antenna.transmit_position}."
    hand = "one wire" if chosen.single_arm else f"receive {_name(taken.receive_hand)}"
    return f"{doubt} {antenna.position} ({hand}): {line}.{sending}"


def _name(hand: Hand | None) -> str:
    return "-" if hand is None else hand.value


def _station_caveats(known: Known, station: Station) -> tuple[str, ...]:
    """What the station's antenna gives cause to say."""
    caveats: list[str] = []
    receiver = known.scene.link.receiver
    apart, _ = great_circle(
        station.place.latitude, station.place.longitude, receiver.latitude, receiver.longitude
    )
    apart_km = float(apart) * EARTH_RADIUS / 1e3
    if apart_km > _SAME_PLACE_KM:
        caveats.append(
            f"The station file's place is {apart_km:.0f} km from TO: its antenna is taken to "
            "stand at TO."
        )
    antenna = known.antenna
    if antenna is None:
        if any(w.arrives for w in known.waves):
            caveats.append(
                f"No relay position is given: {unknown_impedance(station, known.frequency)}."
            )
        return tuple(caveats)
    if station.antenna.kind.is_loops and station.antenna.measured is None:
        caveats.append(
            "The loops are taken to end in equal amplifiers matched to the cable (common practice)."
        )
    chosen = _chosen(antenna)
    taken = known.waves[MODES.index(antenna.wave)]
    both = all(w.arrives for w in known.waves)
    if not antenna.has_hand and any(p.single_arm is None for p in antenna.positions):
        caveats.append(
            "Two crossed wires have a hand only while their currents are about 90° apart. magion "
            "feed gives the quarter-wave line, and what the feed does across a band."
        )
        return tuple(caveats)
    if chosen.overhead_hand is not None and chosen.overhead_hand is not taken.receive_hand:
        caveats.append(
            f"The {taken.wave.value} wave arrives {_name(taken.receive_hand)}, yet from its "
            f"angle relay {chosen.label}, {chosen.overhead_hand.value} overhead, parts the waves "
            "better: the position is chosen by response, not by letter."
        )
    if both:
        caveats += _circular_is_wrong(antenna, known.waves)
    return tuple(caveats)


def _circular_is_wrong(antenna: AntennaOnPath, waves: tuple[WaveOnPath, WaveOnPath]) -> list[str]:
    """A plain sentence where one wire parts the waves better than either hand."""
    mode = antenna.wave
    wire = max(antenna.arms, key=lambda a: a.rejection_db(mode))
    hands = [p.rejection_db(mode) for p in antenna.positions if p.single_arm is None]
    gained = wire.rejection_db(mode) - max(hands, default=math.inf)
    if gained < _CLEARLY_BETTER_DB or wire.rejection_db(mode) < _CLEARLY_BETTER_DB:
        return []
    linear = any((w.axial_ratio_db or math.inf) > LINEAR_LIMIT_DB for w in waves)
    why = "the waves are too linear" if linear else "the waves come in too low"
    there = any(p.single_arm == wire.label for p in antenna.positions)
    lacking = "" if there else " (the relay has no such position)"
    best = max(hands)
    hand = f"the hands by {best:.0f} dB" if best >= _CLEARLY_BETTER_DB else "the hands do not"
    return [
        f"Circular is the wrong choice here, {why}: arm {wire.label} alone{lacking} puts the "
        f"other wave down by {wire.rejection_db(mode):.0f} dB, {hand}."
    ]


def _caveats(
    scene: Scene,
    frequency: float,
    waves: tuple[WaveOnPath, WaveOnPath],
    chances: StateProbabilities | None,
    state: str,
) -> tuple[str, ...]:
    caveats = list(scene.overheads[0].caveats)
    if chances is not None and confidence_of(chances, state) == "cannot_tell":
        caveats.append("foF2 is too uncertain to tell which waves arrive.")
    if frequency <= scene.gyro_limit:
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
        if wave.arrives and wave.other_wave_db is not None and wave.other_wave_db > -20.0:
            caveats.append(
                f"On its way out the {wave.wave.value} wave feeds the other one "
                f"({wave.other_wave_db:.0f} dB): no hand is pure here."
            )
        if wave.arrives and wave.launch and wave.launch.elevation_deg < 3.0:
            caveats.append(
                f"The {wave.wave.value} wave leaves at {wave.launch.elevation_deg:.1f}° elevation: "
                "hills and the ground decide whether it gets away."
            )
        if wave.arrives and (wave.hops or 1) > 1:
            caveats.append(
                f"The {wave.wave.value} wave's strongest ray makes {wave.hops} hops; average land "
                "is taken at the bounces."
            )
    if all(w.arrives for w in waves) and waves[0].receive_hand is waves[1].receive_hand:
        caveats.append("Both waves arrive with the same hand: the relay cannot part them.")
    return tuple(caveats)
