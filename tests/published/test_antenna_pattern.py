"""Patterns of wires and small loops, alone and over a perfect ground.

Sources
-------
Textbooks of antennas, as J. D. Kraus and R. J. Marhefka, Antennas, 3rd ed., McGraw-Hill 2002:
far field of a thin wire with the sinusoidal current that is zero at its ends, directivity 1.64092
(2.1509 dBi) and radiation resistance (about 73, here 73.1 ohm) of the half-wave dipole; k A sin
of a small loop; half of its power from a circular wave. Kind: practice; the figures derived anew
by integration over the sphere. Printed precision: 5 decimals, 0.0001 dB, 0.1 ohm.

Image theory over a perfect conductor: 2 sin kh overhead, and for crossed wires at the elevation e,
s = sin e, the axial ratio 1/s and the rejection 20 log10((1 + s)/(1 − s)) of short ones. Half-wave
ones have 4.04 dB at 45 and 7.58 dB at 30 degrees in the plane of one wire. Kind: derived. Printed
precision: 0.01 dB, 0.1 dB of the two axial ratios of short ones; the law is held to 0.05 dB.
"""

import math

import numpy as np
import pytest

from magion.antenna.elements import leg_directions, loop_length, wire_length
from magion.antenna.feed import solve
from magion.antenna.response import (
    circular,
    decibels,
    element_lengths,
    gain,
    hand_gains,
    joined,
    network_of,
    overhead_rejection_db,
)
from magion.antenna.station import AntennaKind, FeedKind
from magion.constants import SPEED_OF_LIGHT
from magion.geometry import source_axes
from magion.ground import PERFECT
from magion.polarization import Hand, axial_ratio_db
from tests.proof import proves
from tests.stations import LEFT, RIGHT, WIRES, station, travelling

DIRECTIVITY = proves(
    "directivity of the half-wave dipole",
    layer="antenna",
    kind="practice",
    source="Kraus and Marhefka 2002",
    tolerance=0.5e-5,
)
RADIATION = proves(
    "radiation resistance of the half-wave dipole",
    layer="antenna",
    kind="practice",
    source="Kraus and Marhefka 2002",
    tolerance=0.05,
    unit="ohm",
)
HALF_POWER = proves(
    "loss of a circular wave on one wire",
    layer="antenna",
    kind="practice",
    source="Kraus and Marhefka 2002",
    tolerance=0.5e-4,
    unit="dB",
)
CURRENT = proves(
    "pattern of a wire of any length in free space",
    layer="antenna",
    kind="practice",
    source="Kraus and Marhefka 2002",
    tolerance=1e-9,
    unit="relative",
)
LOOP = proves(
    "pattern of a small loop",
    layer="antenna",
    kind="practice",
    source="Kraus and Marhefka 2002",
    tolerance=1e-12,
)
IMAGE = proves(
    "dipole over a perfect ground, overhead",
    layer="antenna",
    kind="derived",
    source="image theory",
    tolerance=0.005,
    unit="dB",
)
CROSSED = proves(
    "axial ratio and rejection of short crossed wires, every elevation",
    layer="antenna",
    kind="derived",
    source="image theory",
    tolerance=0.05,
    unit="dB",
)
HALF_WAVES = proves(
    "axial ratio of crossed wires at 45 and 30 degrees",
    layer="antenna",
    kind="derived",
    source="image theory",
    tolerance=0.05,
    unit="dB",
)

F = SPEED_OF_LIGHT  # a wavelength of one metre
K = 2.0 * math.pi
ETA = 4e-7 * math.pi * SPEED_OF_LIGHT
OVERHEAD = 0.5 * math.pi
HALF_PRINTED = 0.5


def wire(azimuth, elevation, *, bearing=0.0, leg=0.25, height=0.0, apex=math.pi, ground=None):
    return wire_length(bearing, leg, height, apex, ground, F, azimuth, elevation)


def size(length):
    return np.sqrt(np.sum(np.abs(length) ** 2, axis=0))


def over_the_sphere(leg):
    """Mean of |effective length|² over all directions [m²]."""
    nodes, weights = np.polynomial.legendre.leggauss(60)
    azimuth = np.linspace(0.0, 2.0 * np.pi, 120, endpoint=False)
    a, e = np.meshgrid(azimuth, np.arcsin(nodes))
    return 0.5 * weights @ np.mean(size(wire(a, e, leg=leg)) ** 2, axis=1)


def test_directivity_of_a_half_wave_dipole():
    directivity = size(wire(0.5 * math.pi, 0.0)) ** 2 / over_the_sphere(0.25)
    DIRECTIVITY.within(directivity, 1.64092)
    assert abs(10.0 * np.log10(directivity) - 2.1509) < HALF_PRINTED * 1e-4


def test_radiation_resistance_of_a_half_wave_dipole():
    # Power of 1 A: the field k eta |l| / (4 pi r), its density over eta, times the sphere.
    resistance = ETA * K**2 / (4.0 * math.pi) * over_the_sphere(0.25)
    RADIATION.within(resistance, 73.1)


def test_a_matched_half_wave_dipole_has_that_gain():
    # Matched to the radio at its own radiation resistance, it takes all and sends all of it.
    resistance = ETA * K**2 / (4.0 * math.pi) * over_the_sphere(0.25)
    lonely = station(F, FeedKind.TEE, bearings=(0.0,), antenna=AntennaKind.DIPOLE, relay=WIRES[:1])
    matched = solve(lonely.feed, ("N",), WIRES[0], F, np.array([50.0 + 0j]), 0.0)
    power = abs(matched.current[0, 0]) ** 2 * 50.0
    assert abs(power - 1.0) < 1e-12
    length = wire(0.5 * math.pi, 0.0)[:, None] * math.sqrt(power / resistance)
    along = np.array([1.0 + 0j, 0.0])
    assert abs(gain(length, along, F)[0] - 1.64092) < HALF_PRINTED * 1e-5


def test_a_circular_wave_on_a_linear_antenna():
    length = wire(0.5 * math.pi, 0.0)  # broadside: the wire lies along h
    full = gain(length, np.array([1.0 + 0j, 0.0]), F)
    for hand in Hand:
        lost = decibels(gain(length, circular(hand), F) / full)
        HALF_POWER.within(lost, -3.0103)
        assert abs(lost / 6.0 + 0.5) < 0.002  # half an S-unit


@pytest.mark.parametrize("leg", [0.01, 0.1, 0.2375, 0.25, 0.3, 0.4])
def test_pattern_of_a_current_that_is_zero_at_the_ends(leg):
    # 2 [cos(kL cos t) − cos kL] / (k sin kL sin t), t from the wire: no other current has it.
    azimuth = np.radians(np.arange(5.0, 180.0, 5.0))  # the wire points north
    found = wire(azimuth, 0.0, leg=leg)
    cos, sin = np.cos(azimuth), np.sin(azimuth)
    textbook = 2.0 * (np.cos(K * leg * cos) - np.cos(K * leg)) / (K * math.sin(K * leg) * sin)
    CURRENT.within(np.abs(found[0]), textbook)
    assert np.abs(found[1]).max() < 1e-15
    # What a current that reaches the ends at full strength would have
    uniform = 2.0 * leg * np.sinc(2.0 * leg * cos) * sin
    assert np.abs(textbook / uniform - 1.0).max() > 0.2
    # Along the hot leg's own side the sign is that of the hot leg: north of the wire h is east.
    assert np.allclose(found[0] / found[0].real, 1.0, atol=1e-12)


def test_sign_of_the_hot_leg():
    # A field toward the hot leg, from overhead: a positive voltage, whatever the bearing.
    for bearing in np.radians([0.0, 70.0, 200.0]):
        toward = np.array([math.sin(bearing), math.cos(bearing), 0.0])
        h, v = source_axes(0.0, OVERHEAD)
        length = wire(0.0, OVERHEAD, bearing=bearing)
        voltage = length[0] * (h @ toward) + length[1] * (v @ toward)
        assert abs(voltage - 2.0 / K) < 1e-12  # of a half-wave dipole lambda / pi


@pytest.mark.parametrize(
    ("height", "printed"), [(0.05, -4.18), (0.1, 1.40), (0.125, 3.01), (0.25, 6.02)]
)
def test_overhead_of_a_horizontal_dipole_over_a_perfect_ground(height, printed):
    over = wire(0.0, OVERHEAD, height=height, ground=PERFECT)
    factor = size(over) / size(wire(0.0, OVERHEAD))
    IMAGE.within(20.0 * np.log10(factor), printed)
    assert abs(factor - 2.0 * math.sin(K * height)) < 1e-6


def test_overhead_of_a_dipole_half_a_wave_high_is_nothing():
    over = wire(0.0, OVERHEAD, height=0.5, ground=PERFECT)
    assert 20.0 * np.log10(size(over) / size(wire(0.0, OVERHEAD))) < -120.0


def crossed(leg, azimuth, elevation, position=LEFT):
    """Effective length of ideal crossed dipoles over a perfect ground."""
    there = station(leg=leg)
    f = there.antenna.resonant_frequency
    current = network_of(there, position, f).current
    shape = np.broadcast_shapes(np.shape(azimuth), np.shape(elevation))
    a, e = np.broadcast_to(azimuth, shape).ravel(), np.broadcast_to(elevation, shape).ravel()
    return joined(current, element_lengths(there, f, a, e)), f


@pytest.mark.parametrize("azimuth_deg", [0.0, 30.0, 45.0, 90.0, 203.0])
@pytest.mark.parametrize("position", [LEFT, RIGHT])
def test_short_crossed_elements_at_every_elevation(azimuth_deg, position):
    elevation = np.radians(np.arange(1.0, 90.0))
    s = np.sin(elevation)
    total, f = crossed(0.002, math.radians(azimuth_deg), elevation, position)
    CROSSED.within(axial_ratio_db(total), 20.0 * np.log10(1.0 / s))
    right, left = hand_gains(total, f)
    wanted, other = (left, right) if position is LEFT else (right, left)
    kept = s < 0.998  # beyond, 60 dB and more
    law = 20.0 * np.log10((1.0 + s) / (1.0 - s))
    CROSSED.within(decibels(wanted / other)[kept], law[kept])


@pytest.mark.parametrize(
    ("leg", "azimuth_deg", "elevation_deg", "printed", "precision"),
    [
        (0.002, 0.0, 45.0, 3.0, 0.1),
        (0.002, 0.0, 30.0, 6.0, 0.1),
        (0.25, 0.0, 45.0, 4.04, 0.01),
        (0.25, 0.0, 30.0, 7.58, 0.01),
        (0.25, 90.0, 45.0, 4.04, 0.01),
        (0.25, 90.0, 30.0, 7.58, 0.01),
    ],
)
def test_axial_ratios_of_crossed_elements(leg, azimuth_deg, elevation_deg, printed, precision):
    total, _ = crossed(leg, math.radians(azimuth_deg), math.radians(elevation_deg))
    HALF_WAVES.within(axial_ratio_db(total)[0], printed, HALF_PRINTED * precision)


@pytest.mark.parametrize("azimuth_deg", [45.0, 135.0, 225.0, 315.0])
def test_half_wave_elements_on_the_diagonals_are_as_short_ones(azimuth_deg):
    elevation = np.radians(np.arange(1.0, 90.0))
    total, _ = crossed(0.25, math.radians(azimuth_deg), elevation)
    # The conductor of 1e15 S/m is not quite perfect: 1e-5 dB at one degree.
    assert np.abs(axial_ratio_db(total) + 20.0 * np.log10(np.sin(elevation))).max() < 1e-4


def test_an_inverted_vee_of_180_degrees_is_the_dipole():
    rng = np.random.default_rng(5)
    a, e = rng.uniform(0.0, 2.0 * np.pi, 60), rng.uniform(0.02, OVERHEAD, 60)
    straight, vee = (
        element_lengths(station(antenna=kind, apex_angle=apex, ground=PERFECT), 3.65e6, a, e)
        for kind, apex in (
            (AntennaKind.CROSSED_DIPOLES, math.pi),
            (AntennaKind.CROSSED_VEES, math.pi - 1e-9),
        )
    )
    assert np.abs(vee - straight).max() < 1e-6  # of some 30 m
    hot, cold = leg_directions(0.3, math.pi)
    assert np.allclose(hot, -cold, atol=1e-15)


@pytest.mark.parametrize("apex_deg", [90.0, 120.0, 170.0])
def test_a_short_inverted_vee_is_a_dipole_as_long_as_its_shadow(apex_deg):
    # Legs that slope down by the same angle: their vertical parts cancel where phase counts little.
    leg, apex = 1e-4, math.radians(apex_deg)
    a, e = np.radians([0.0, 50.0, 90.0]), np.radians([80.0, 30.0, 10.0])
    vee = wire(a, e, leg=leg, apex=apex)
    dipole = wire(a, e, leg=leg * math.sin(0.5 * apex))
    assert np.abs(vee - dipole).max() < 1e-3 * np.abs(dipole).max()


def test_legs_of_an_inverted_vee():
    hot, cold = leg_directions(math.radians(90.0), math.radians(120.0))
    assert np.allclose(hot, [math.sin(math.radians(60.0)), 0.0, -0.5], atol=1e-12)
    assert np.allclose(cold, [-math.sin(math.radians(60.0)), 0.0, -0.5], atol=1e-12)
    assert abs(math.degrees(math.acos(hot @ cold)) - 120.0) < 1e-9


@pytest.mark.parametrize("bearing_deg", [0.0, 25.0, 140.0])
def test_pattern_of_a_small_loop(bearing_deg):
    # k A sin of the angle between its axis and the direction, the field along the axis crossed
    # with the direction; the axis is level, across the loop's plane.
    rng = np.random.default_rng(7)
    a, e = rng.uniform(0.0, 2.0 * np.pi, 40), rng.uniform(-1.5, 1.5, 40)
    bearing = math.radians(bearing_deg)
    found = loop_length(bearing, 0.0, None, F, a, e)
    axis = np.array([math.cos(bearing), -math.sin(bearing), 0.0])
    sight = -np.array([travelling(*pair) for pair in zip(a, e, strict=True)])
    across = np.cross(axis, sight)
    assert np.allclose(size(found), K * np.linalg.norm(across, axis=1), rtol=1e-12)
    h, v = source_axes(a, e)
    vector = (found[0] * h + found[1] * v).T
    LOOP.off(np.abs(np.cross(vector, across)))


def test_a_vertical_loop_over_a_perfect_ground():
    # Its image carries the same current: twice the field in its plane at the horizon, for the
    # vertical polarization; nothing along its axis.
    low = math.radians(0.01)
    toward = loop_length(0.0, 0.05, PERFECT, F, 0.0, low)
    alone = loop_length(0.0, 0.05, None, F, 0.0, low)
    assert abs(abs(toward[1]) / abs(alone[1]) - 2.0) < 1e-4
    assert abs(toward[0]) < 1e-3
    axial = loop_length(0.0, 0.05, PERFECT, F, 0.5 * math.pi, low)
    assert np.abs(axial).max() < 1e-3 * abs(toward[1])


@pytest.mark.parametrize("measured", [True, False])
def test_crossed_loops_overhead_have_the_hands_of_crossed_dipoles(measured):
    loops = station(antenna=AntennaKind.CROSSED_LOOPS, height=0.01, measured=measured)
    assert overhead_rejection_db(loops, LEFT, 3.65e6)[0] == -60.0  # as far as it is told
    assert overhead_rejection_db(loops, RIGHT, 3.65e6)[0] == 60.0
    assert not loops.can_transmit
