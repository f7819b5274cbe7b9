"""What the antenna and its feed make of waves that arrive, and of power sent.

The effective length of a relay position is the sum of the elements' own,
weighted with the currents of its network. A wave of unit field e gives the
power gain eta k² |l · e|² / 4 pi, per watt of available power over isotropic,
mismatch and losses included; driven, the same l is the radiated field.
"""

import math
from dataclasses import dataclass, replace
from enum import Enum
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.antenna.elements import effective_lengths
from magion.antenna.feed import Network, delay_length, solve
from magion.antenna.impedance import impedance_of, leg_length_of
from magion.antenna.station import RelayPosition, Station
from magion.arrays import ComplexArray, FloatArray, IntArray
from magion.constants import SPEED_OF_LIGHT
from magion.ground import PERFECT, Ground
from magion.polarization import Hand, ellipse, hand_of

GREATEST_REJECTION_DB: Final = 60.0
"""Rejection beyond which only "at least" is meant [dB]."""

S_UNIT_DB: Final = 6.0
"""One S-unit, IARU Region 1 Recommendation R.1 [dB]."""

NO_HAND_DB: Final = 1.0
"""Rejection of circular waves from overhead below which a position has no hand [dB]."""

_IMPEDANCE_OF_VACUUM = 4e-7 * math.pi * SPEED_OF_LIGHT
_SMALLEST = 1e-30


class Cause(Enum):
    """What can limit the rejection."""

    ARRIVAL_ANGLE = "arrival angle"
    ELLIPTICITY = "ellipticity of the wave"
    FEED_PHASE = "feed phase"
    FEED_AMPLITUDE = "feed amplitude"
    GROUND = "ground"


@dataclass(frozen=True, slots=True, kw_only=True)
class IncidentWave:
    """A wave at the antenna.

    Parameters
    ----------
    azimuth, elevation : float
        Direction it comes from [rad].
    state : ndarray of complex, shape (2,)
        Unit field along h and v of :func:`magion.geometry.source_axes` [1].
    """

    azimuth: float
    elevation: float
    state: ComplexArray


def networks(station: Station, frequency: ArrayLike) -> tuple[Network, ...]:
    """The network of every relay position.

    Parameters
    ----------
    station : Station
        The station.
    frequency : array_like, shape (n,)
        Frequencies [Hz].

    Returns
    -------
    tuple of Network
        One a position; NaN where the impedance is not known.
    """
    f = np.atleast_1d(np.asarray(frequency, float))
    return tuple(network_of(station, position, f) for position in station.relay)


def network_of(station: Station, position: RelayPosition, frequency: ArrayLike) -> Network:
    """The network of one relay position, perhaps one that the relay does not have.

    Parameters
    ----------
    station : Station
        The station.
    position : RelayPosition
        The position.
    frequency : array_like, shape (n,)
        Frequencies [Hz].

    Returns
    -------
    Network
        Currents, match and the account of the power.
    """
    f = np.atleast_1d(np.asarray(frequency, float))
    antenna = station.antenna
    load = impedance_of(antenna, leg_length_of(antenna, station.ground), station.ground, f)
    if antenna.kind.is_loops and antenna.measured is None:
        # Each loop ends in its own amplifier, matched to the cable (common practice).
        load = np.full(f.shape, station.feed.impedance, dtype=np.complex128)
    return solve(
        station.feed,
        tuple(a.name for a in antenna.arms),
        position,
        f,
        load,
        delay_length(station.feed, antenna.resonant_frequency),
    )


def element_lengths(
    station: Station,
    frequency: ArrayLike,
    azimuth: ArrayLike,
    elevation: ArrayLike,
    ground: Ground | None = None,
) -> ComplexArray:
    """Effective length of every element of a station.

    Parameters
    ----------
    station : Station
        The station.
    frequency, azimuth, elevation : array_like
        Frequency [Hz] and direction toward the source [rad], of one shape
        together.
    ground : Ground, optional
        Another ground than the station's.

    Returns
    -------
    ndarray of complex, shape (arms, 2, ...)
        Of each arm, along h and v [m].
    """
    leg = leg_length_of(station.antenna, station.ground)
    return effective_lengths(
        station.antenna, leg, ground or station.ground, frequency, azimuth, elevation
    )


def joined(current: ComplexArray, length: ComplexArray) -> ComplexArray:
    """Effective length of a relay position.

    Parameters
    ----------
    current : ndarray of complex, shape (arms, ...)
        Element currents of its network [A].
    length : ndarray of complex, shape (arms, 2, ...)
        Effective lengths of the elements [m].

    Returns
    -------
    ndarray of complex, shape (2, ...)
        Along h and v, for one watt available [m].
    """
    return np.asarray(np.sum(current[:, None] * length, axis=0))


def gain(length: ComplexArray, state: ComplexArray, frequency: ArrayLike) -> FloatArray:
    """Power taken from a wave, over that of an isotropic matched antenna.

    Parameters
    ----------
    length : ndarray of complex, shape (2, ...)
        Effective length of a relay position [m].
    state : ndarray of complex, shape (2, ...)
        Unit field of the wave along h and v [1].
    frequency : array_like
        Frequency [Hz].

    Returns
    -------
    ndarray
        Realized gain for that wave [1].
    """
    k = 2.0 * np.pi * np.asarray(frequency, float) / SPEED_OF_LIGHT
    voltage = length[0] * state[0] + length[1] * state[1]
    return np.asarray(_IMPEDANCE_OF_VACUUM * k * k / (4.0 * np.pi) * np.abs(voltage) ** 2)


def circular(hand: Hand) -> ComplexArray:
    """A circular wave that arrives, along h and v.

    Parameters
    ----------
    hand : Hand
        Its IEEE hand.

    Returns
    -------
    ndarray of complex, shape (2,)
        Unit field; h, v and the travel are right-handed axes [1].
    """
    return ellipse(1.0, 0.0, hand is Hand.RIGHT)


def hand_gains(length: ComplexArray, frequency: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Gain for circular waves of either hand.

    Parameters
    ----------
    length : ndarray of complex, shape (2, ...)
        Effective length of a relay position [m].
    frequency : array_like
        Frequency [Hz].

    Returns
    -------
    right, left : ndarray
        Realized gain for RHCP and for LHCP [1].
    """
    right, left = (gain(length, circular(hand), frequency) for hand in (Hand.RIGHT, Hand.LEFT))
    return right, left


def decibels(ratio: ArrayLike) -> FloatArray:
    """A power ratio in decibels.

    Parameters
    ----------
    ratio : array_like
        Power ratio [1].

    Returns
    -------
    ndarray
        10 log10, at least -300 [dB].
    """
    return np.asarray(10.0 * np.log10(np.maximum(np.asarray(ratio, float), _SMALLEST)))


def rejection_db(wanted: ArrayLike, other: ArrayLike) -> FloatArray:
    """Response to the wanted wave over that to the other.

    Parameters
    ----------
    wanted, other : array_like
        Gains for the two [1].

    Returns
    -------
    ndarray
        Rejection, within 60 either way [dB].
    """
    difference = decibels(wanted) - decibels(other)
    return np.asarray(np.clip(difference, -GREATEST_REJECTION_DB, GREATEST_REJECTION_DB))


def best_position(wanted_dbi: FloatArray, other_dbi: FloatArray) -> IntArray:
    """The relay position to take one wave on while the other arrives too.

    Parameters
    ----------
    wanted_dbi, other_dbi : ndarray, shape (positions, ...)
        Gains for both waves [dB].

    Returns
    -------
    ndarray of int, shape (...)
        Of the positions that take the wanted wave within an S-unit of the best
        one, that which puts the other wave down most [1].
    """
    near = wanted_dbi >= np.max(wanted_dbi, axis=0) - S_UNIT_DB
    return np.asarray(np.argmax(np.where(near, wanted_dbi - other_dbi, -np.inf), axis=0))


def fade_depth_db(level_difference_db: ArrayLike) -> FloatArray:
    """Depth from crest to trough of two waves that beat.

    Parameters
    ----------
    level_difference_db : array_like
        Level of one over the other [dB].

    Returns
    -------
    ndarray
        20 log10((1 + r) / (1 - r)), 60 at most [dB].
    """
    r = 10.0 ** (-np.abs(np.asarray(level_difference_db, float)) / 20.0)
    with np.errstate(divide="ignore"):
        depth = 20.0 * np.log10((1.0 + r) / (1.0 - r))
    return np.asarray(np.minimum(depth, GREATEST_REJECTION_DB))


def power_shares(
    length: ComplexArray, own: ComplexArray, other: ComplexArray, frequency: ArrayLike
) -> FloatArray:
    """Power that goes into one of two waves when the antenna sends.

    Parameters
    ----------
    length : ndarray of complex, shape (2, ...)
        Effective length of a relay position in the direction [m].
    own, other : ndarray of complex, shape (2, ...)
        Fields along h and v of the wave asked for and of the other, as they
        leave in that direction [1].
    frequency : array_like
        Frequency [Hz].

    Returns
    -------
    ndarray
        Realized gain into that wave; the radiated field is split into both,
        which need not be orthogonal [1].
    """
    k = 2.0 * np.pi * np.asarray(frequency, float) / SPEED_OF_LIGHT
    determinant = own[0] * other[1] - own[1] * other[0]
    part = (length[0] * other[1] - length[1] * other[0]) / determinant
    size = np.sum(np.abs(own) ** 2, axis=0)
    return np.asarray(_IMPEDANCE_OF_VACUUM * k * k / (4.0 * np.pi) * np.abs(part) ** 2 * size)


def overhead_rejection_db(
    station: Station, position: RelayPosition, frequency: ArrayLike
) -> FloatArray:
    """Rejection of one circular wave against the other, from overhead.

    Parameters
    ----------
    station : Station
        The station.
    position : RelayPosition
        A relay position.
    frequency : array_like, shape (n,)
        Frequencies [Hz].

    Returns
    -------
    ndarray, shape (n,)
        RHCP over LHCP: negative where LHCP is the stronger [dB].
    """
    f = np.atleast_1d(np.asarray(frequency, float))
    length = element_lengths(station, f, 0.0, 0.5 * math.pi)
    right, left = hand_gains(joined(network_of(station, position, f).current, length), f)
    return rejection_db(right, left)


def _square_feed(current: ComplexArray) -> ComplexArray:
    """The two currents a quarter period apart, the way that is nearer."""
    turn = (current[1] * np.conj(current[0])).imag
    quarter = 1j if turn > 0.0 else -1j
    first = current[0]
    return np.stack([first, np.abs(current[1]) * quarter * first / np.abs(first)])


def _equal_feed(current: ComplexArray) -> ComplexArray:
    """The two currents of equal size."""
    size = np.sqrt(np.abs(current[0] * current[1]))
    return np.asarray(current * (size / np.abs(current)))


def _circular_pair(wanted: IncidentWave, other: IncidentWave) -> tuple[IncidentWave, IncidentWave]:
    hand = hand_of(wanted.state)
    return (
        replace(wanted, state=circular(hand)),
        replace(other, state=circular(hand.opposite)),
    )


def rejection_of(
    station: Station,
    current: ComplexArray,
    frequency: float,
    wanted: IncidentWave,
    other: IncidentWave,
    ground: Ground | None = None,
) -> float:
    """Rejection of one wave against another for given currents.

    Parameters
    ----------
    station : Station
        The station.
    current : ndarray of complex, shape (arms,)
        Currents of the elements, on any scale.
    frequency : float
        Frequency [Hz].
    wanted, other : IncidentWave
        The two waves.
    ground : Ground, optional
        Another ground than the station's.

    Returns
    -------
    float
        Rejection for waves of equal power [dB].
    """
    gains = []
    for wave in (wanted, other):
        length = element_lengths(station, frequency, wave.azimuth, wave.elevation, ground)
        gains.append(gain(joined(current, length), wave.state, frequency))
    return float(rejection_db(*gains))


def without_each_cause(
    station: Station,
    current: ComplexArray,
    frequency: float,
    wanted: IncidentWave,
    other: IncidentWave,
) -> dict[Cause, float]:
    """Rejection with each cause removed in turn, the others left.

    Parameters
    ----------
    station : Station
        The station.
    current : ndarray of complex, shape (arms,)
        Currents of the elements; one that is not used is zero.
    frequency : float
        Frequency [Hz].
    wanted, other : IncidentWave
        The two waves.

    Returns
    -------
    dict
        Cause to rejection: both waves from overhead; both circular; currents
        a quarter period apart; currents equal; ground perfectly conducting
        [dB].
    """
    overhead = 0.5 * math.pi
    found = {
        Cause.ARRIVAL_ANGLE: rejection_of(
            station,
            current,
            frequency,
            replace(wanted, elevation=overhead),
            replace(other, elevation=overhead),
        ),
        Cause.ELLIPTICITY: rejection_of(
            station, current, frequency, *_circular_pair(wanted, other)
        ),
        Cause.GROUND: rejection_of(station, current, frequency, wanted, other, PERFECT),
    }
    if np.count_nonzero(current) == 2:
        for cause, changed in (
            (Cause.FEED_PHASE, _square_feed(current)),
            (Cause.FEED_AMPLITUDE, _equal_feed(current)),
        ):
            found[cause] = rejection_of(station, changed, frequency, wanted, other)
    return found
