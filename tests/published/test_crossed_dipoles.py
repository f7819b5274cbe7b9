"""Circular waves, flat crossed dipoles and a single wire.

Source
------
The sense of IEEE Std 145, "Definitions of Terms for Antennas" (clockwise along
the direction of travel is right-hand).

Kind: derived, from the voltages of two crossed wires. Printed precision: 3
decimals of the axial ratio, 0.01 dB.
"""

import numpy as np
import pytest

from magion.polarization import (
    LINEAR_LIMIT_DB,
    Hand,
    Shape,
    ellipse,
    hand_in_words,
    hand_of,
    is_right_hand,
    match,
    shape_of,
)

EAST, NORTH, UP = np.eye(3)


def arriving(hand):
    """Unit field (east, north, up; complex) of a circular wave from overhead.

    A right-hand wave's real field turns from x to y about its travel z, so its
    y component lags x by a quarter period. Here z is down, x north, y east.
    """
    lag = -1j if hand is Hand.RIGHT else 1j
    assert np.array_equal(np.cross(NORTH, EAST), -UP)
    return (NORTH + lag * EAST) / np.sqrt(2)


def turn_on_the_map(field):
    """+1 anticlockwise, -1 clockwise, of the real field seen from above."""
    now, later = field.real, (field * 1j).real  # a quarter period on, exp(+i omega t)
    return np.sign(np.cross(now, later) @ UP)


def received(field, delayed):
    """Amplitude from two equal crossed dipoles, one arm behind a quarter-wave line."""
    north_arm, east_arm = field @ NORTH, field @ EAST
    if delayed == "north-south":
        return abs(-1j * north_arm + east_arm)
    return abs(north_arm - 1j * east_arm)


@pytest.mark.parametrize(("hand", "arm"), [(Hand.LEFT, "east-west"), (Hand.RIGHT, "north-south")])
def test_arm_with_the_quarter_wave_line(hand, arm):
    other = {"east-west": "north-south", "north-south": "east-west"}[arm]
    field = arriving(hand)
    assert hand_in_words(hand).delayed_arm == arm
    assert abs(received(field, arm) - np.sqrt(2)) < 1e-12
    assert received(field, other) < 1e-12
    # Radiating upward, the same wiring gives the same hand.
    currents = {"north": 1.0 + 0j, "east": 1.0 + 0j}
    currents["east" if arm == "east-west" else "north"] *= -1j
    upward = np.array([currents["east"], currents["north"]])  # x east, y north, z up
    assert hand_of(upward) is hand


@pytest.mark.parametrize(
    ("hand", "looking_up", "on_the_map"),
    [(Hand.LEFT, "clockwise", "anticlockwise"), (Hand.RIGHT, "anticlockwise", "clockwise")],
)
def test_turn_of_an_arriving_wave(hand, looking_up, on_the_map):
    words = hand_in_words(hand)
    assert (words.ieee, words.looking_up, words.on_the_map) == (hand, looking_up, on_the_map)
    assert turn_on_the_map(arriving(hand)) == (1 if on_the_map == "anticlockwise" else -1)
    # The wave's own axes, x north and y east for a wave that travels down.
    in_wave_axes = arriving(hand) @ np.stack([NORTH, EAST]).T
    assert hand_of(in_wave_axes) is hand


def test_axial_ratio_above_which_a_wire_beats_a_circular_antenna():
    limit = 1 + np.sqrt(2)
    assert abs(limit - 2.414) < 5e-4  # half the last printed digit
    assert abs(LINEAR_LIMIT_DB - 20 * np.log10(limit)) < 1e-6
    assert abs(LINEAR_LIMIT_DB - 7.66) < 5e-3  # half the last printed digit
    wire, circular = np.array([1.0 + 0j, 0.0]), ellipse(1.0, 0.0, True)
    for ratio, wire_wins in [(0.99 * limit, False), (1.01 * limit, True)]:
        wave = ellipse(ratio, 0.0, True)
        assert bool(is_right_hand(wave))
        assert bool(match(wire, wave) > match(circular, wave)) is wire_wins
        named = shape_of(20 * np.log10(ratio))
        assert named is (Shape.LINEAR if wire_wins else Shape.ELLIPTICAL)
