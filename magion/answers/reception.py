"""What the station's antenna makes of both waves of a path, in every relay position."""

import math
from dataclasses import dataclass

import numpy as np

from magion.answers.modes import ModeRay
from magion.antenna.feed import (
    Network,
    delay_length,
    electrical_length,
    standing_wave_ratio,
)
from magion.antenna.response import (
    NO_HAND_DB,
    S_UNIT_DB,
    Cause,
    IncidentWave,
    best_position,
    decibels,
    element_lengths,
    fade_depth_db,
    gain,
    hand_gains,
    joined,
    network_of,
    power_shares,
    rejection_db,
    without_each_cause,
)
from magion.antenna.station import RelayPosition, Station
from magion.arrays import ComplexArray
from magion.geometry import Place, azimuth_elevation, local_axes, source_axes
from magion.polarization import Hand
from magion.waves import MODES, Mode, wave_axes

_GAINED_DB = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class PositionOnPath:
    """One relay position, or one arm alone, on one path.

    Parameters
    ----------
    label : str
        The operator's label, or the arm's name.
    delayed_arm, single_arm : str or None
        Arm with the delay line; arm that is used alone.
    overhead_hand : Hand or None
        Hand that it favours from overhead; None where it has none.
    ordinary_gain_dbi, extraordinary_gain_dbi : float
        Power taken from each wave over an isotropic matched antenna [dB].
    ordinary_over_extraordinary_db : float
        Response to the ordinary over the extraordinary wave, for equal waves [dB].
    ordinary_sent_dbi, extraordinary_sent_dbi : float or None
        Power sent into each wave on the way back, over an isotropic antenna;
        None where the station may not transmit [dB].
    ordinary_share : float or None
        Share of the power sent into both waves that goes into the ordinary [1].
    """

    label: str
    delayed_arm: str | None
    single_arm: str | None
    overhead_hand: Hand | None
    ordinary_gain_dbi: float
    extraordinary_gain_dbi: float
    ordinary_over_extraordinary_db: float
    ordinary_sent_dbi: float | None
    extraordinary_sent_dbi: float | None
    ordinary_share: float | None

    def gain_dbi(self, mode: Mode) -> float:
        """Power taken from one wave.

        Parameters
        ----------
        mode : Mode
            The wave.

        Returns
        -------
        float
            In decibels [dB].
        """
        ordinary = mode is Mode.ORDINARY
        return self.ordinary_gain_dbi if ordinary else self.extraordinary_gain_dbi

    def sent_dbi(self, mode: Mode) -> float | None:
        """Power sent into one wave.

        Parameters
        ----------
        mode : Mode
            The wave.

        Returns
        -------
        float or None
            In decibels [dB].
        """
        ordinary = mode is Mode.ORDINARY
        return self.ordinary_sent_dbi if ordinary else self.extraordinary_sent_dbi

    def rejection_db(self, mode: Mode) -> float:
        """Response to one wave over the other, for equal waves.

        Parameters
        ----------
        mode : Mode
            The wave.

        Returns
        -------
        float
            In decibels [dB].
        """
        sign = 1.0 if mode is Mode.ORDINARY else -1.0
        return sign * self.ordinary_over_extraordinary_db


@dataclass(frozen=True, slots=True, kw_only=True)
class CauseOnPath:
    """One thing that limits the rejection.

    Parameters
    ----------
    cause : str
        What it is.
    rejection_without_db : float
        Rejection with this cause removed, the others left [dB].
    """

    cause: str
    rejection_without_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FeedOnPath:
    """The feed in the chosen position.

    Parameters
    ----------
    path_deg : float or None
        Electrical length of the delayed path; None where the feed makes the
        delay itself and for a single arm [deg].
    phase_deg : float or None
        Of the second arm's current over the first's; None for a single arm [deg].
    amplitude_db : float or None
        The same of its size [dB].
    swr : float
        Standing wave ratio at the radio [1].
    loss_db : float
        Power lost in cables and in a combiner's or hybrid's load [dB].
    """

    path_deg: float | None
    phase_deg: float | None
    amplitude_db: float | None
    swr: float
    loss_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennaOnPath:
    """The station's antenna on one path.

    Parameters
    ----------
    name : str or None
        Name of the station.
    kind : str
        Kind of antenna.
    height_m : float
        Of the feed point [m].
    ground, feed : str
        Ground in words; kind of feed network.
    wave : Mode
        Wave that the following figures are for.
    position, transmit_position : str or None
        Best position to receive it on, and to send it back with.
    rejection_s_units : float
        Rejection in the best position, in S-units of 6 dB [1].
    level_over_dipole_db : float
        Level of that wave over the better arm alone [dB].
    sent_over_dipole_db : float or None
        Power sent into it over the better arm alone [dB].
    both_ends_db : float or None
        What is gained over one dipole at each end if the other end does as
        well as this one [dB].
    fade_depth_before_db, fade_depth_after_db : float or None
        Depth of the fades on the better arm alone and in the best position;
        None where one wave arrives [dB].
    causes : tuple of CauseOnPath
        What may limit the rejection, the greatest first; empty for a single arm.
    limited_by : str or None
        The cause that limits it most; None where the removal of none gains
        half a decibel.
    network : FeedOnPath
        The feed in the best position.
    positions : tuple of PositionOnPath
        Every relay position.
    arms : tuple of PositionOnPath
        Every arm alone, whether the relay has that position or not.
    has_hand : bool
        Whether any position tells one hand from the other overhead.
    """

    name: str | None
    kind: str
    height_m: float
    ground: str
    feed: str
    wave: Mode
    position: str | None
    transmit_position: str | None
    rejection_s_units: float
    level_over_dipole_db: float
    sent_over_dipole_db: float | None
    both_ends_db: float | None
    fade_depth_before_db: float | None
    fade_depth_after_db: float | None
    causes: tuple[CauseOnPath, ...]
    limited_by: str | None
    network: FeedOnPath
    positions: tuple[PositionOnPath, ...]
    arms: tuple[PositionOnPath, ...]
    has_hand: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class AtAntenna:
    """Both waves as they stand at the receiver.

    Parameters
    ----------
    frequency : float
        Frequency [Hz].
    waves : tuple of IncidentWave
        Ordinary and extraordinary; one that does not arrive is taken from the
        direction of the other, with the shape that it would have there.
    others : tuple of ndarray of complex, shape (2,)
        Of each direction, the state of the wave that is not this one [1].
    arrives : tuple of bool
        Which of them arrive.
    level_db : tuple of float
        Levels to free space; minus infinity for one that does not arrive [dB].
    """

    frequency: float
    waves: tuple[IncidentWave, IncidentWave]
    others: tuple[ComplexArray, ComplexArray]
    arrives: tuple[bool, bool]
    level_db: tuple[float, float]


def incident(mode_ray: ModeRay, receiver: Place) -> dict[Mode, IncidentWave]:
    """Both characteristic waves along one ray, as fields at the receiver.

    Parameters
    ----------
    mode_ray : ModeRay
        The ray.
    receiver : Place
        Where it arrives.

    Returns
    -------
    dict
        Mode to wave: the ray's own, and the other one from the same direction.
    """
    azimuth, elevation = azimuth_elevation(
        -mode_ray.ray.arrival, receiver.latitude, receiver.longitude
    )
    east, north, up = local_axes(receiver.latitude, receiver.longitude)
    h, v = source_axes(azimuth, elevation)
    down = mode_ray.down
    x, y = wave_axes(down.wave_normal, down.field)
    found = {}
    for mode, jones in zip(MODES, down.waves(), strict=True):
        field = jones[0] * x + jones[1] * y
        local = np.array([field @ east, field @ north, field @ up])
        state = np.array([local @ h, local @ v])
        found[mode] = IncidentWave(
            azimuth=float(azimuth),
            elevation=float(elevation),
            state=state / np.sqrt(np.sum(np.abs(state) ** 2)),
        )
    return found


def at_antenna(leading: dict[Mode, ModeRay], receiver: Place, frequency: float) -> AtAntenna | None:
    """The leading rays as waves at the antenna.

    Parameters
    ----------
    leading : dict
        Mode to the strongest ray of that wave, of those that arrive.
    receiver : Place
        The receiver.
    frequency : float
        Frequency [Hz].

    Returns
    -------
    AtAntenna or None
        None where neither arrives.
    """
    if not leading:
        return None
    pairs = {mode: incident(ray, receiver) for mode, ray in leading.items()}
    anyone = next(iter(pairs.values()))
    ordinary, extraordinary = (pairs.get(mode, anyone)[mode] for mode in MODES)
    others = [pairs.get(m, anyone)[MODES[1 - i]].state for i, m in enumerate(MODES)]
    levels = [leading[m].level_db if m in leading else -math.inf for m in MODES]
    return AtAntenna(
        frequency=frequency,
        waves=(ordinary, extraordinary),
        others=(others[0], others[1]),
        arrives=(MODES[0] in leading, MODES[1] in leading),
        level_db=(levels[0], levels[1]),
    )


def position_for(
    positions: tuple[PositionOnPath, ...], mode: Mode, *, both: bool
) -> PositionOnPath:
    """The position to receive one wave on.

    Parameters
    ----------
    positions : tuple of PositionOnPath
        Positions to choose from.
    mode : Mode
        The wave.
    both : bool
        Whether the other wave arrives too.

    Returns
    -------
    PositionOnPath
        Of those within an S-unit of the best for that wave, the one that
        rejects the other most; where the wave is alone, the one that takes
        most of it.
    """
    if not both:
        return max(positions, key=lambda p: p.gain_dbi(mode))
    wanted = np.array([p.gain_dbi(mode) for p in positions])
    other = wanted - np.array([p.rejection_db(mode) for p in positions])
    return positions[int(best_position(wanted, other))]


def _best_to_send(positions: tuple[PositionOnPath, ...], mode: Mode) -> PositionOnPath | None:
    sent = [(p, p.sent_dbi(mode)) for p in positions]
    able = [(p, own) for p, own in sent if own is not None]
    if not able:
        return None
    wanted = np.array([own for _, own in able])
    other = np.array([p.sent_dbi(MODES[1 - MODES.index(mode)]) for p, _ in able], dtype=float)
    return able[int(best_position(wanted, other))][0]


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayAt:
    """A station's relay at one frequency.

    Parameters
    ----------
    station : Station
        The station.
    frequency : float
        Frequency [Hz].
    networks : dict
        Network of every relay position and of every arm alone.
    hands : dict
        Hand that each favours from overhead; None where it has none.
    """

    station: Station
    frequency: float
    networks: dict[RelayPosition, Network]
    hands: dict[RelayPosition, Hand | None]

    @property
    def arms(self) -> tuple[RelayPosition, ...]:
        """Every arm alone."""
        return _alone(self.station)


def _alone(station: Station) -> tuple[RelayPosition, ...]:
    return tuple(RelayPosition(label=a.name, single=a.name) for a in station.antenna.arms)


def relay_at(station: Station, frequency: float) -> RelayAt | None:
    """Solve a station's feed at one frequency.

    Parameters
    ----------
    station : Station
        The station.
    frequency : float
        Frequency [Hz].

    Returns
    -------
    RelayAt or None
        None where the elements' impedance is not known.
    """
    networks, hands = {}, {}
    length = element_lengths(station, np.array([frequency]), 0.0, 0.5 * math.pi)
    for position in (*station.relay, *_alone(station)):
        network = network_of(station, position, frequency)
        if not np.isfinite(network.current).all():
            return None
        right, left = hand_gains(joined(network.current, length), frequency)
        overhead = float(rejection_db(right, left)[0])
        hand = Hand.RIGHT if overhead > 0.0 else Hand.LEFT
        told = position.single is None and abs(overhead) >= NO_HAND_DB
        networks[position], hands[position] = network, hand if told else None
    return RelayAt(station=station, frequency=frequency, networks=networks, hands=hands)


def positions_on_path(relay: RelayAt, here: AtAntenna) -> dict[RelayPosition, PositionOnPath]:
    """What every relay position, and every arm alone, makes of both waves.

    Parameters
    ----------
    relay : RelayAt
        The relay at the frequency.
    here : AtAntenna
        The waves.

    Returns
    -------
    dict
        Position to what it makes of them.
    """
    f, station = relay.frequency, relay.station
    lengths = [element_lengths(station, f, w.azimuth, w.elevation) for w in here.waves]
    found = {}
    for position, network in relay.networks.items():
        totals = [joined(network.current[:, 0], length) for length in lengths]
        taken = [gain(t, w.state, f) for t, w in zip(totals, here.waves, strict=True)]
        sent: list[float | None] = [None, None]
        share = None
        if station.can_transmit:
            powers = [
                power_shares(t, w.state, o, f)
                for t, w, o in zip(totals, here.waves, here.others, strict=True)
            ]
            sent = [float(decibels(p)) for p in powers]
            share = float(powers[0] / (powers[0] + powers[1]))
        found[position] = PositionOnPath(
            label=position.label,
            delayed_arm=position.delayed,
            single_arm=position.single,
            overhead_hand=relay.hands[position],
            ordinary_gain_dbi=float(decibels(taken[0])),
            extraordinary_gain_dbi=float(decibels(taken[1])),
            ordinary_over_extraordinary_db=float(rejection_db(*taken)),
            ordinary_sent_dbi=sent[0],
            extraordinary_sent_dbi=sent[1],
            ordinary_share=share,
        )
    return found


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """What to take, and on which relay position.

    Parameters
    ----------
    wave : Mode
        The wave to take.
    receive : PositionOnPath
        Position to receive it on.
    send : PositionOnPath or None
        Position to send it back with; None where the station may not transmit.
    """

    wave: Mode
    receive: PositionOnPath
    send: PositionOnPath | None


def choice(positions: tuple[PositionOnPath, ...], here: AtAntenna) -> Choice:
    """The wave to take and its relay positions.

    Parameters
    ----------
    positions : tuple of PositionOnPath
        Relay positions.
    here : AtAntenna
        The waves.

    Returns
    -------
    Choice
        The stronger wave at the antenna, each in its best position; within
        3 dB, the ordinary.
    """
    both = all(here.arrives)
    wave = _stronger(positions, here, both)
    return Choice(
        wave=wave,
        receive=position_for(positions, wave, both=both),
        send=_best_to_send(positions, wave),
    )


def antenna_on_path(relay: RelayAt, here: AtAntenna) -> AntennaOnPath:
    """What the antenna makes of both waves, and what limits it.

    Parameters
    ----------
    relay : RelayAt
        The relay of the receiver's station, at the frequency.
    here : AtAntenna
        The waves.

    Returns
    -------
    AntennaOnPath
        Every position, the best of them, and why it is no better.
    """
    station, f = relay.station, relay.frequency
    found = positions_on_path(relay, here)
    positions = tuple(found[p] for p in station.relay)
    arms = tuple(found[p] for p in relay.arms)
    chosen = choice(positions, here)
    wave, best, sender = chosen.wave, chosen.receive, chosen.send
    both = all(here.arrives)
    place = station.relay[positions.index(best)]
    network = relay.networks[place]
    arm = max(arms, key=lambda a: a.gain_dbi(wave))
    own = None if sender is None else sender.sent_dbi(wave)
    sent_by_arm = [s for s in (a.sent_dbi(wave) for a in arms) if s is not None]
    gained = None if own is None else own - max(sent_by_arm)
    level = best.gain_dbi(wave) - arm.gain_dbi(wave)
    wanted, other = here.waves if wave is Mode.ORDINARY else here.waves[::-1]
    causes: dict[Cause, float] = {}
    if place.single is None:
        causes = without_each_cause(station, network.current[:, 0], f, wanted, other)
    lead = here.level_db[0] - here.level_db[1] if both else math.nan
    return AntennaOnPath(
        name=station.name,
        kind=station.antenna.kind.value,
        height_m=station.antenna.height,
        ground=station.ground_name,
        feed=station.feed.kind.value,
        wave=wave,
        position=best.label,
        transmit_position=None if sender is None else sender.label,
        rejection_s_units=best.rejection_db(wave) / S_UNIT_DB,
        level_over_dipole_db=level,
        sent_over_dipole_db=gained,
        both_ends_db=None if gained is None else level + gained,
        fade_depth_before_db=_fades(lead, arm) if both else None,
        fade_depth_after_db=_fades(lead, best) if both else None,
        causes=tuple(
            CauseOnPath(cause=c.value, rejection_without_db=db)
            for c, db in sorted(causes.items(), key=lambda item: -item[1])
        ),
        limited_by=_limit(causes, best.rejection_db(wave)),
        network=_feed_on_path(station, network, place, f),
        positions=positions,
        arms=arms,
        has_hand=any(p.overhead_hand is not None for p in positions),
    )


def _limit(causes: dict[Cause, float], rejection: float) -> str | None:
    """The cause whose removal gains most, if it gains anything to speak of."""
    if not causes:
        return None
    most = max(causes, key=lambda c: causes[c])
    return most.value if causes[most] >= rejection + _GAINED_DB else None


def _fades(lead_db: float, position: PositionOnPath) -> float:
    return float(fade_depth_db(lead_db + position.ordinary_over_extraordinary_db))


def _stronger(positions: tuple[PositionOnPath, ...], here: AtAntenna, both: bool) -> Mode:
    """The stronger wave at the antenna, each in its best position; within 3 dB, the ordinary."""
    if not both:
        return MODES[here.arrives.index(True)]
    levels = [
        level + position_for(positions, mode, both=True).gain_dbi(mode)
        for mode, level in zip(MODES, here.level_db, strict=True)
    ]
    return Mode.EXTRAORDINARY if levels[1] - levels[0] > 3.0 else Mode.ORDINARY


def _feed_on_path(
    station: Station, network: Network, position: RelayPosition, frequency: float
) -> FeedOnPath:
    current = network.current[:, 0]
    length = delay_length(station.feed, station.antenna.resonant_frequency)
    path = float(electrical_length(station.feed, frequency, length))
    ratio = current[1] / current[0] if position.single is None else None
    return FeedOnPath(
        path_deg=math.degrees(path) if length and position.single is None else None,
        phase_deg=None if ratio is None else math.degrees(float(np.angle(ratio))),
        amplitude_db=None if ratio is None else float(2.0 * decibels(np.abs(ratio))),
        swr=float(standing_wave_ratio(network.mismatch)[0]),
        loss_db=float(-decibels(network.fed[0] / (1.0 - network.reflected[0]))),
    )
