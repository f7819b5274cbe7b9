"""The feed network, solved as a circuit over frequency.

The network is driven from the radio's end with one watt of available power;
the element currents it sets up are, by reciprocity, also the weights with
which it adds the elements' voltages on reception. So one solution serves both
ways. Lines are those of the telegraph equations [KrausMarhefka2002]_; the
combiner and the hybrid are ideal, matched and isolated.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.antenna.station import Feed, FeedKind, RelayPosition
from magion.arrays import ComplexArray, FloatArray
from magion.constants import SPEED_OF_LIGHT

LOSS_FREQUENCY: Final = 10e6
"""Frequency at which the loss of cables is stated [Hz]."""


# An unknown impedance is NaN and goes through as such.
_quiet = np.errstate(invalid="ignore", divide="ignore")


@dataclass(frozen=True, slots=True, kw_only=True)
class Network:
    """What the network does in one relay position, over frequency.

    Parameters
    ----------
    current : ndarray of complex, shape (arms, ...)
        Feed-point current of each element for one watt of available power,
        root mean square; zero in an arm that is not used [A].
    mismatch : ndarray of complex, shape (...)
        Reflection coefficient at the radio's end [1].
    reflected, dumped, fed, lost : ndarray, shape (...)
        Shares of the available power: sent back to the radio, ended in the
        combiner's or hybrid's load, taken by the elements, lost in the cables;
        their sum is one [1].
    """

    current: ComplexArray
    mismatch: ComplexArray
    reflected: FloatArray
    dumped: FloatArray
    fed: FloatArray
    lost: FloatArray


def quarter_wave(frequency: ArrayLike, velocity_factor: ArrayLike) -> FloatArray:
    """Length of a quarter wave of cable.

    Parameters
    ----------
    frequency : array_like
        Frequency [Hz].
    velocity_factor : array_like
        Of the cable [1].

    Returns
    -------
    ndarray
        Its length [m].

    Examples
    --------
    >>> round(float(quarter_wave(3.65e6, 0.66)), 3)
    13.552
    """
    f, factor = np.asarray(frequency, float), np.asarray(velocity_factor, float)
    return np.asarray(0.25 * factor * SPEED_OF_LIGHT / f)


def delay_length(feed: Feed, resonant_frequency: float | None) -> float:
    """Cable in the delayed path, leads counted in.

    Parameters
    ----------
    feed : Feed
        The feed.
    resonant_frequency : float or None
        Of the elements [Hz].

    Returns
    -------
    float
        Length of line and leads; without a stated line, a quarter wave at the
        resonant frequency; 0 where the network itself makes the delay [m].
    """
    if feed.kind in (FeedKind.HYBRID, FeedKind.DIGITAL):
        return 0.0
    if feed.line_length is not None:
        return feed.line_length + feed.leads
    if resonant_frequency is None:
        return 0.0
    return float(quarter_wave(resonant_frequency, feed.velocity_factor))


def _cable(
    feed: Feed, frequency: FloatArray, length: float
) -> tuple[ComplexArray, ComplexArray, ComplexArray, ComplexArray]:
    """Chain matrix A, B, C, D of a length of cable."""
    loss_db = feed.loss_db_per_100m / 100.0 * np.sqrt(frequency / LOSS_FREQUENCY)
    alpha = loss_db * math.log(10.0) / 20.0
    beta = 2.0 * np.pi * frequency / (SPEED_OF_LIGHT * feed.velocity_factor)
    angle = np.asarray((alpha + 1j * beta) * length, dtype=np.complex128)
    cosh: ComplexArray = np.cosh(angle)
    sinh: ComplexArray = np.sinh(angle)
    return cosh, np.asarray(feed.impedance * sinh), np.asarray(sinh / feed.impedance), cosh


def electrical_length(feed: Feed, frequency: ArrayLike, length: ArrayLike) -> FloatArray:
    """Electrical length of a length of cable.

    Parameters
    ----------
    feed : Feed
        The feed, for its velocity factor.
    frequency : array_like
        Frequency [Hz].
    length : array_like
        Length of cable [m].

    Returns
    -------
    ndarray
        Phase that a matched wave gathers along it [rad].
    """
    f, metres = np.asarray(frequency, float), np.asarray(length, float)
    return np.asarray(2.0 * np.pi * f * metres / (SPEED_OF_LIGHT * feed.velocity_factor))


@_quiet
def solve(
    feed: Feed,
    arms: tuple[str, ...],
    position: RelayPosition,
    frequency: ArrayLike,
    impedance: ComplexArray,
    delay: float,
) -> Network:
    """Element currents of one relay position.

    Parameters
    ----------
    feed : Feed
        The network.
    arms : tuple of str
        Names of the elements.
    position : RelayPosition
        Which arm is delayed, or which one is used alone.
    frequency : array_like, shape (...)
        Frequencies [Hz].
    impedance : ndarray of complex, shape (...)
        Feed-point impedance of each element, the same for both [ohm].
    delay : float
        Cable in the delayed path, from :func:`delay_length` [m].

    Returns
    -------
    Network
        Currents, match and the account of the power; NaN where the impedance is.
    """
    f = np.asarray(frequency, float)
    load = np.asarray(impedance, dtype=np.complex128)
    used = [a for a in arms if position.single in (None, a)]
    radio = feed.radio_impedance
    branches = []
    for arm in used:
        length = feed.feeder_length + (delay if arm == position.delayed else 0.0)
        a, b, c, d = _cable(feed, f, length)
        # Voltage and current at the near end for one ampere in the element.
        branches.append((a * load + b, c * load + d))
    current = np.zeros((len(arms), *np.broadcast_shapes(f.shape, load.shape)), np.complex128)
    isolated = feed.kind is not FeedKind.TEE and len(used) > 1
    drive = 2.0 * math.sqrt(radio)  # open-circuit voltage of one available watt
    mismatch: ComplexArray
    if isolated:
        waves = _port_waves(feed, [arm == position.delayed for arm in used])
        mismatch = np.zeros_like(current[0])
        returned = np.zeros(current.shape[1:])
        for arm, wave, (voltage, near) in zip(used, waves, branches, strict=True):
            current[arms.index(arm)] = wave * drive / (voltage + radio * near)
            gamma = (voltage - radio * near) / (voltage + radio * near)
            mismatch = mismatch + wave * wave * gamma
            returned = returned + abs(wave) ** 2 * np.abs(gamma) ** 2
        reflected = np.abs(mismatch) ** 2
        dumped = returned - reflected
    else:
        admittance = sum((near / voltage for voltage, near in branches), np.zeros_like(load))
        node = drive / (1.0 + radio * admittance)
        for arm, (voltage, _) in zip(used, branches, strict=True):
            current[arms.index(arm)] = node / voltage
        mismatch = (1.0 - radio * admittance) / (1.0 + radio * admittance)
        reflected = np.abs(mismatch) ** 2
        dumped = np.zeros_like(reflected)
    fed = np.sum(np.abs(current) ** 2, axis=0) * load.real
    return Network(
        current=current,
        mismatch=np.asarray(mismatch),
        reflected=reflected,
        dumped=dumped,
        fed=fed,
        lost=np.asarray(1.0 - reflected - dumped - fed),
    )


def _port_waves(feed: Feed, delayed: list[bool]) -> list[complex]:
    """Waves out of the two isolated ports for a unit wave in."""
    if feed.kind is FeedKind.COMBINER:
        return [complex(math.sqrt(0.5))] * len(delayed)
    gain = 10.0 ** (feed.amplitude_error_db / 20.0)
    shift = gain * np.exp(-1j * (0.5 * math.pi + feed.phase_error))
    scale = 1.0 / math.hypot(1.0, gain)
    return [complex(scale * (shift if late else 1.0)) for late in delayed]


def standing_wave_ratio(mismatch: ComplexArray) -> FloatArray:
    """Standing wave ratio of a reflection coefficient.

    Parameters
    ----------
    mismatch : ndarray of complex
        Reflection coefficient [1].

    Returns
    -------
    ndarray
        1 (matched) to infinity [1].
    """
    size = np.minimum(np.abs(mismatch), 1.0)
    with np.errstate(divide="ignore"):
        return np.asarray((1.0 + size) / (1.0 - size))
