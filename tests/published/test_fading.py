"""Levels that beat, S-units, and when one wire is better than two.

Sources
-------
Fade depth of two beating waves, 20 log10((1 + r)/(1 − r)). Kind: derived. Printed precision:
0.1 dB.

IARU Region 1 Recommendation R.1: 6 dB an S-unit, S9 = −73 dBm below 30 MHz. Kind: published. The
package counts in S-units and never states an absolute level.

Axial ratio beyond which a horizontal antenna of two wires, with a choice between them, takes more
of a wave than a circular one: 1 + sqrt 2 = 2.414, 7.66 dB. Kind: derived. Printed precision: 3
decimals, 0.01 dB.
"""

import math

import numpy as np
import pytest

from magion.antenna.response import (
    S_UNIT_DB,
    IncidentWave,
    best_position,
    decibels,
    element_lengths,
    fade_depth_db,
    gain,
    joined,
    network_of,
)
from magion.polarization import LINEAR_LIMIT_DB, ellipse
from tests.proof import proves
from tests.stations import LEFT, RIGHT, WIRES, station

FADE = proves(
    "fade depth of two beating waves",
    layer="antenna",
    kind="derived",
    source="20 log10((1 + r)/(1 − r))",
    tolerance=0.05,
    unit="dB",
)
LIMIT = proves(
    "axial ratio beyond which one wire takes more than a circular antenna",
    layer="polarization",
    kind="derived",
    source="1 + sqrt 2",
    tolerance=0.005,
    unit="dB",
)
SHARE = proves(
    "share of an ellipse that a circular antenna and a wire take",
    layer="antenna",
    kind="derived",
    source="closed forms",
    tolerance=1e-9,
)

F = 3.65e6
OVERHEAD = 0.5 * math.pi


@pytest.mark.parametrize(("level_db", "printed"), [(-1.0, 24.8), (-3.0, 15.3), (-6.0, 9.6)])
def test_fade_depth_of_two_beating_waves(level_db, printed):
    FADE.within(fade_depth_db(level_db), printed)  # half the last printed digit
    assert fade_depth_db(-level_db) == fade_depth_db(level_db)


@pytest.mark.parametrize("level_db", [-1.0, -3.0, -6.0, -20.0])
def test_fade_depth_is_that_of_the_sum_in_time(level_db):
    beat = np.abs(1.0 + 10.0 ** (level_db / 20.0) * np.exp(1j * np.linspace(0.0, 2.0 * np.pi, 721)))
    assert abs(fade_depth_db(level_db) - 20.0 * np.log10(beat.max() / beat.min())) < 1e-9


def test_an_s_unit():
    assert S_UNIT_DB == 6.0
    # Relay positions within one S-unit count as equally strong, beyond it not.
    wanted, other = np.array([0.0, -6.0 + 1e-9]), np.array([0.0, -30.0])
    assert best_position(wanted, other) == 1
    assert best_position(wanted - [0.0, 2e-9], other) == 0


def taken(position, ratio, tilt):
    """Power that a relay position takes of an ellipse from overhead."""
    there = station(F, relay=(LEFT, RIGHT, *WIRES))
    wave = IncidentWave(azimuth=0.0, elevation=OVERHEAD, state=ellipse(ratio, tilt, False))
    length = element_lengths(there, F, wave.azimuth, wave.elevation)
    total = joined(network_of(there, position, F).current[:, 0], length)
    return float(gain(total, wave.state, F))


# Seen from overhead h is east and v south: a major axis along h is that of wire E.
@pytest.mark.parametrize(("tilt", "wire"), [(0.0, WIRES[1]), (0.5 * math.pi, WIRES[0])])
@pytest.mark.parametrize("ratio", [1.0, 1.5, 2.41, 2.42, 4.0, 50.0])
def test_a_wire_beats_circular_beyond_an_axial_ratio_of_2_414(ratio, tilt, wire):
    circular, single = taken(LEFT, ratio, tilt), taken(wire, ratio, tilt)
    assert (single > circular) is (ratio > 2.414)
    assert (single > circular) is (20.0 * math.log10(ratio) > LINEAR_LIMIT_DB)
    # Shares of the power that the matched antenna would take, in closed form
    whole = taken(LEFT, 1.0, 0.0)
    SHARE.within(circular / whole, (1.0 + ratio) ** 2 / (2.0 * (1.0 + ratio**2)))
    SHARE.within(single / whole, ratio**2 / (1.0 + ratio**2))


def test_the_limit_between_wire_and_circular():
    LIMIT.within(LINEAR_LIMIT_DB, 7.66)  # half the last printed digit
    limit = 10.0 ** (LINEAR_LIMIT_DB / 20.0)
    assert abs(limit - 2.414) < 5e-4
    difference = decibels(taken(WIRES[1], limit, 0.0)) - decibels(taken(LEFT, limit, 0.0))
    assert abs(difference) < 1e-6
