"""Small parts of the antenna: lengths of cable, impedances, positions, and both build sheets."""

import math
from dataclasses import replace

import numpy as np
import pytest

from magion.answers.feed import MOST_ROWS, answer_feed
from magion.answers.pattern import answer_antenna
from magion.antenna import impedance as impedance_module
from magion.antenna.elements import HALF_WAVE_LEG, effective_lengths, loop_length, wire_length
from magion.antenna.feed import (
    delay_length,
    electrical_length,
    quarter_wave,
    solve,
    standing_wave_ratio,
)
from magion.antenna.impedance import LONGEST_LEG, from_table, impedance_of, leg_length_of
from magion.antenna.response import (
    Cause,
    IncidentWave,
    best_position,
    circular,
    decibels,
    element_lengths,
    hand_gains,
    joined,
    network_of,
    networks,
    overhead_rejection_db,
    rejection_db,
    without_each_cause,
)
from magion.antenna.station import AntennaKind, Feed, FeedKind
from magion.constants import SPEED_OF_LIGHT
from magion.errors import InputError, OutsideModelError
from magion.ground import AVERAGE, PERFECT, Ground
from magion.polarization import Hand, axial_ratio, hand_of
from tests.stations import LEFT, RIGHT, WIRES, station

F = 3.65e6
WAVELENGTH = SPEED_OF_LIGHT / F

# Cable


def test_quarter_wave_of_many_frequencies():
    found = quarter_wave([1e6, 2e6], 0.5)
    assert np.allclose(found, [37.474, 18.737], atol=5e-4)
    assert float(quarter_wave(SPEED_OF_LIGHT, 1.0)) == 0.25


@pytest.mark.parametrize(
    ("kind", "line", "leads", "resonant", "length"),
    [
        (FeedKind.TEE, None, 0.0, SPEED_OF_LIGHT, 0.25),
        (FeedKind.COMBINER, None, 0.1, SPEED_OF_LIGHT, 0.25),  # leads counted in
        (FeedKind.TEE, 9.1, 0.2, SPEED_OF_LIGHT, 9.3),  # leads on top of a stated line
        (FeedKind.TEE, 9.1, 0.0, None, 9.1),
        (FeedKind.TEE, None, 0.0, None, 0.0),
        (FeedKind.HYBRID, None, 0.0, SPEED_OF_LIGHT, 0.0),
        (FeedKind.DIGITAL, None, 0.0, SPEED_OF_LIGHT, 0.0),
    ],
)
def test_cable_in_the_delayed_path(kind, line, leads, resonant, length):
    feed = Feed(kind=kind, velocity_factor=1.0, line_length=line, leads=leads)
    assert delay_length(feed, resonant) == pytest.approx(length, abs=1e-12)


def test_electrical_length():
    feed = Feed(kind=FeedKind.TEE, velocity_factor=0.5)
    turn = electrical_length(feed, SPEED_OF_LIGHT, [0.0, 0.125, 0.25, 0.5])
    assert np.allclose(turn, [0.0, 0.5 * np.pi, np.pi, 2.0 * np.pi])
    low, high = electrical_length(feed, [1e6, 3e6], 7.0)
    assert high == pytest.approx(3.0 * low)


@pytest.mark.parametrize(
    ("mismatch", "ratio"), [(0.0, 1.0), (1.0 / 3.0, 2.0), (-0.5j, 3.0), (1.0 + 1e-12, np.inf)]
)
def test_standing_wave_ratio(mismatch, ratio):
    assert standing_wave_ratio(np.array([mismatch + 0j]))[0] == pytest.approx(ratio)


@pytest.mark.parametrize("resistance", [10.0, 25.0, 50.0, 200.0])
def test_standing_wave_ratio_of_a_resistance(resistance):
    lonely = Feed(kind=FeedKind.COMBINER)
    network = solve(lonely, ("N", "E"), WIRES[0], F, np.array([resistance + 0j]), 0.0)
    expected = max(resistance / 50.0, 50.0 / resistance)
    assert standing_wave_ratio(network.mismatch)[0] == pytest.approx(expected)


def test_loss_of_cable_is_that_of_10_mhz_and_grows_with_the_root():
    feed = Feed(kind=FeedKind.COMBINER, feeder_length=100.0, loss_db_per_100m=3.0)
    network = solve(
        feed, ("N", "E"), WIRES[0], np.array([10e6, 2.5e6]), np.array([50.0 + 0j] * 2), 0.0
    )
    assert np.allclose(-decibels(network.fed), [3.0, 1.5], atol=1e-9)


# Impedance


def test_resonance_about_a_measured_point():
    measured = station(F, resistance=48.0, reactance=-7.0, quality=12.0).antenna
    step = 1.0
    low, here, high = impedance_of(measured, None, AVERAGE, [F - step, F, F + step])
    assert here == 48.0 - 7.0j
    assert low.real == high.real == 48.0
    # Of a series resonance dX/df = 2 R Q / f0 at its frequency.
    slope = (high.imag - low.imag) / (2.0 * step)
    assert slope == pytest.approx(2.0 * 48.0 * 12.0 / F, rel=1e-6)


def test_half_power_bandwidth_of_a_measured_resonance_is_its_q():
    # |X| = R at both ends of a band of f0 / Q.
    quality = 9.0
    edges = F * (np.array([-0.5, 0.5]) / quality + math.sqrt(1.0 + 0.25 / quality**2))
    assert edges[1] - edges[0] == pytest.approx(F / quality)
    antenna = station(F, resistance=60.0, quality=quality).antenna
    assert np.allclose(impedance_of(antenna, None, AVERAGE, edges).imag, [-60.0, 60.0])


def test_measured_impedance_ends_where_the_legs_are_too_long():
    antenna = station(F).antenna
    leg = leg_length_of(antenna, AVERAGE)
    last = LONGEST_LEG * SPEED_OF_LIGHT / leg
    known = np.isfinite(impedance_of(antenna, leg, AVERAGE, [0.5 * F, F, last - 1.0, last + 1.0]))
    assert known.tolist() == [True, True, True, False]


def test_loops_without_a_measurement_have_no_impedance():
    loops = station(F, antenna=AntennaKind.CROSSED_LOOPS, measured=False)
    assert np.isnan(impedance_of(loops.antenna, None, AVERAGE, [F])).all()
    # their amplifiers are matched to the cable
    feed = station(
        F, antenna=AntennaKind.CROSSED_LOOPS, measured=False, impedance=75.0, radio_impedance=75.0
    )
    assert abs(network_of(feed, LEFT, F).mismatch[0]) < 1e-12


def test_leg_length():
    assert leg_length_of(station(F, leg=0.2).antenna, AVERAGE) == pytest.approx(0.2 * WAVELENGTH)
    assert leg_length_of(station(F).antenna, AVERAGE) == pytest.approx(HALF_WAVE_LEG * WAVELENGTH)
    loops = station(F, antenna=AntennaKind.CROSSED_LOOPS).antenna
    assert leg_length_of(loops, AVERAGE) is None
    nothing = replace(station(F).antenna, resonant_frequency=None)
    assert leg_length_of(nothing, AVERAGE) is None


# The table: a made-up one that a cubic spline meets exactly, and the shipped one

NODES = (
    np.log([2.0, 5.0, 20.0, 100.0, 1000.0]),  # permittivity, magnitude
    np.array([0.0, 0.5, 1.0, 1.5]),  # loss angle
    np.log([0.02, 0.05, 0.1, 0.3, 1.0]),  # height of the wire's ends
    np.array([0.15, 0.2, 0.25, 0.3, 0.35]),  # leg
    np.array([-6.0, -4.5, -3.0]),  # radius: three nodes, a parabola
    np.array([90.0, 120.0, 150.0, 180.0]),  # apex
)


def cubic(log_eps, loss, log_tip, leg, log_radius, apex_deg):
    """Some impedance that is a cubic in every variable of the table."""
    x = apex_deg / 90.0
    return (
        (50.0 + 3.0 * log_eps - 0.2 * log_eps**3)
        + loss * (5.0 - loss) * log_tip**2
        + 4.0 * x**3 * log_tip
        + 1j * (900.0 * (leg - 0.24) * (1.0 + 0.1 * log_radius**2) + (leg - 0.24) ** 3 * x**2)
    )


@pytest.fixture
def _made_up_table(monkeypatch):
    values = cubic(*np.meshgrid(*NODES, indexing="ij")).astype(complex)
    monkeypatch.setattr(impedance_module, "_table", lambda: (NODES, values))
    leg_length_of.cache_clear()
    yield
    leg_length_of.cache_clear()


@pytest.mark.usefixtures("_made_up_table")
def test_table_is_read_by_cubic_splines_in_its_own_variables():
    rng = np.random.default_rng(3)
    n = 30
    magnitude, loss = np.exp(rng.uniform(0.7, 6.9, n)), rng.uniform(0.0, 1.5, n)
    tip, leg = np.exp(rng.uniform(np.log(0.02), 0.0, n)), rng.uniform(0.15, 0.35, n)
    radius, apex = 10.0 ** rng.uniform(-6.0, -3.0, n), math.radians(133.0)
    found = from_table(magnitude * np.exp(-1j * loss), tip, leg, radius, apex)
    expected = cubic(np.log(magnitude), loss, np.log(tip), leg, np.log10(radius), 133.0)
    assert np.allclose(found, expected, rtol=1e-9)


INSIDE = {"eps": 13.0 - 4.0j, "tip": 0.1, "leg": 0.24, "radius": 1e-5, "apex": math.pi}


@pytest.mark.usefixtures("_made_up_table")
@pytest.mark.parametrize(
    "outside",
    [
        {"eps": 1.0 + 0j},
        {"eps": 1e5 + 0j},
        {"eps": 13.0 + 1.0j},
        {"tip": 0.01},
        {"tip": 1.01},
        {"tip": -0.1},
        {"leg": 0.149},
        {"leg": 0.351},
        {"radius": 1e-7},
        {"radius": 1e-2},
        {"apex": math.radians(80.0)},
        {"tip": math.nan},
    ],
)
def test_outside_the_table_nothing_is_guessed(outside):
    def ask(**values):
        given = np.array([values.pop("eps")])
        return from_table(given, *values.values())

    assert np.isfinite(ask(**INSIDE)).all()
    assert np.isnan(ask(**(INSIDE | outside))).all()
    # One point outside leaves its neighbours alone.
    both = from_table(np.array([13.0 - 4.0j] * 2), [0.1, 5.0], 0.24, 1e-5, math.pi)
    assert np.isfinite(both).tolist() == [True, False]


@pytest.mark.usefixtures("_made_up_table")
def test_wires_without_a_measurement_are_looked_up():
    apex = math.radians(120.0)
    vee = station(F, antenna=AntennaKind.CROSSED_VEES, apex_angle=apex, height=0.2, measured=False)
    ground = Ground(permittivity=15.0, conductivity=0.001)
    leg = 0.22 * WAVELENGTH
    found = impedance_of(vee.antenna, leg, ground, [F])[0]
    eps = ground.complex_permittivity(F)
    tip = 0.2 - 0.22 * math.cos(0.5 * apex)  # the ends hang lower than the feed point
    radius = math.log10(1e-3 / WAVELENGTH)  # of a wire of 2 mm
    expected = cubic(math.log(abs(eps)), -np.angle(eps), math.log(tip), 0.22, radius, 120.0)
    assert found == pytest.approx(expected, rel=1e-9)


@pytest.mark.usefixtures("_made_up_table")
def test_legs_of_a_resonant_wire_are_those_without_reactance():
    # The made-up reactance is zero at 0.24 wavelengths, whatever else.
    wire = station(F, measured=False).antenna
    assert leg_length_of(wire, AVERAGE) == pytest.approx(0.24 * WAVELENGTH, rel=1e-6)
    # Outside the table the usual length is taken.
    assert leg_length_of(wire, PERFECT) == pytest.approx(HALF_WAVE_LEG * WAVELENGTH)


def test_a_high_dipole_over_land_has_about_73_ohm():
    # Half a wave and more above average land the resistance swings about that of free space.
    heights = np.linspace(0.6, 0.95, 15)
    eps = AVERAGE.complex_permittivity(np.full(15, 7.1e6))
    found = from_table(eps, heights, np.full(15, 0.24), np.full(15, 1e-5), math.pi)
    assert abs(found.real.mean() - 70.0) < 8.0
    assert (found.real > 55.0).all()


@pytest.mark.parametrize("height", [0.1, 0.25, 0.5])
def test_resonant_legs_by_the_shipped_table(height):
    there = station(7.1e6, height=height, ground=AVERAGE, measured=False)
    leg = leg_length_of(there.antenna, AVERAGE)
    assert 0.22 < leg * 7.1e6 / SPEED_OF_LIGHT < 0.25  # a little under a quarter wave
    reactance = impedance_of(there.antenna, leg, AVERAGE, [7.1e6]).imag[0]
    assert abs(reactance) < 0.1
    assert abs(overhead_rejection_db(there, LEFT, 7.1e6)[0]) > 10.0


def test_outside_the_shipped_table():
    there = station(7.1e6, ground=AVERAGE, measured=False)
    assert np.isnan(networks(there, 14.2e6)[0].current).all()


# Responses


def test_circular_waves():
    for hand in Hand:
        assert hand_of(circular(hand)) is hand
        assert float(axial_ratio(circular(hand))) == pytest.approx(1.0)


def test_joined_is_the_weighted_sum():
    rng = np.random.default_rng(9)
    current = rng.normal(size=(2, 5)) + 1j * rng.normal(size=(2, 5))
    length = rng.normal(size=(2, 2, 5)) + 0j
    found = joined(current, length)
    assert found.shape == (2, 5)
    assert np.allclose(found, current[0] * length[0] + current[1] * length[1])


def test_networks_are_one_a_position():
    there = station(F, relay=(LEFT, *WIRES))
    found = networks(there, [F, 1.01 * F])
    assert [n.current.shape for n in found] == [(2, 2)] * 3
    assert np.count_nonzero(found[1].current[1]) == 0


def test_elements_of_an_antenna():
    az, el = np.array([0.3, 2.0]), np.array([0.4, 1.0])
    there = station(F, ground=AVERAGE)
    a = there.antenna
    leg = leg_length_of(a, AVERAGE)
    found = element_lengths(there, F, az, el)
    assert found.shape == (2, 2, 2)
    for one, arm in zip(found, a.arms, strict=True):
        wire = wire_length(arm.bearing, leg, a.height, a.apex_angle, AVERAGE, F, az, el)
        assert np.array_equal(one, wire)
    over = element_lengths(there, F, az, el, PERFECT)
    assert np.array_equal(over, effective_lengths(a, leg, PERFECT, F, az, el))
    loops = station(F, antenna=AntennaKind.CROSSED_LOOPS).antenna
    loop = effective_lengths(loops, None, AVERAGE, F, az, el)[1]
    assert np.array_equal(
        loop, loop_length(loops.arms[1].bearing, loops.height, AVERAGE, F, az, el)
    )


@pytest.mark.parametrize(
    ("wanted", "other", "best"),
    [
        ([0.0, -1.0], [-10.0, -20.0], 1),  # rejects more, and is nearly as strong
        ([0.0, -7.0], [-10.0, -40.0], 0),  # rejects far more, but is too weak
        ([0.0, -6.0], [-10.0, -40.0], 1),  # exactly one S-unit down still counts
        ([0.0, 0.0], [-10.0, -10.0], 0),  # the first of equals
        ([5.0], [80.0], 0),
    ],
)
def test_best_position(wanted, other, best):
    assert int(best_position(np.array(wanted), np.array(other))) == best


def test_causes_of_a_single_wire_leave_out_the_feed():
    there = station(F)
    wave = IncidentWave(azimuth=0.0, elevation=1.0, state=circular(Hand.LEFT))
    other = replace(wave, state=circular(Hand.RIGHT))
    alone = without_each_cause(there, network_of(there, WIRES[0], F).current[:, 0], F, wave, other)
    assert set(alone) == {Cause.ARRIVAL_ANGLE, Cause.ELLIPTICITY, Cause.GROUND}
    both = without_each_cause(there, network_of(there, LEFT, F).current[:, 0], F, wave, other)
    assert set(both) == set(Cause)


@pytest.mark.parametrize(
    ("kind", "crossed", "loops", "vee", "transmits"),
    [
        (AntennaKind.CROSSED_DIPOLES, True, False, False, True),
        (AntennaKind.CROSSED_VEES, True, False, True, True),
        (AntennaKind.CROSSED_LOOPS, True, True, False, False),
        (AntennaKind.DIPOLE, False, False, False, True),
        (AntennaKind.VEE, False, False, True, True),
    ],
)
def test_kinds_of_antenna(kind, crossed, loops, vee, transmits):
    assert (kind.is_crossed, kind.is_loops, kind.is_vee) == (crossed, loops, vee)
    assert station(F, antenna=kind).can_transmit is transmits
    assert not station(F, antenna=kind, receive_only=True).can_transmit
    assert not station(F, FeedKind.DIGITAL, antenna=kind).can_transmit


# The build sheet


def test_sheet_without_a_station():
    sheet = answer_feed(7.1)
    assert sheet.station is None
    assert [q.velocity_factor for q in sheet.quarter_waves] == [0.66, 0.695, 0.78, 0.85]
    for line in sheet.quarter_waves:
        assert line.length_m == pytest.approx(line.velocity_factor * 74.948 / 7.1, abs=5e-4)
        assert line.length_ft * 0.3048 == pytest.approx(line.length_m)
    assert len(sheet.band) == 9
    centre = sheet.band[4]
    assert (centre.line_deg, centre.phase_deg) == pytest.approx((90.0, -90.0))
    assert centre.rejection_db == 60.0
    assert centre.resistance_ohm is None
    assert "matched and isolated" in " ".join(sheet.caveats)
    assert sheet.cautions


def test_sheet_of_a_station():
    there = station(F, FeedKind.TEE, leads=0.5, quality=12.0)
    sheet = answer_feed(3.65, there, [3.5, 3.65, 3.8])
    line = sheet.line
    quarter = 0.66 * 74.948 / 3.65
    assert line.quarter_wave_m == pytest.approx(quarter, abs=5e-4)
    assert line.cut_m == pytest.approx(quarter - 0.5, abs=5e-4)
    # Alone, the shorter piece is a quarter wave at a higher frequency.
    assert line.dip_mhz == pytest.approx(3.65 * quarter / (quarter - 0.5), rel=1e-4)
    assert line.present_deg == pytest.approx(90.0)
    assert [(p.label, p.hand) for p in sheet.positions] == [
        ("left", Hand.LEFT),
        ("right", Hand.RIGHT),
    ]
    assert sheet.has_hand
    assert sheet.delayed_arm == "E"
    assert "left hears LHCP" in sheet.headline
    middle = sheet.band[1]
    assert (middle.resistance_ohm, middle.reactance_ohm) == pytest.approx((50.0, 0.0), abs=1e-9)
    assert middle.phase_deg == pytest.approx(-90.0)
    assert middle.swr == pytest.approx(2.0)  # two matched arms side by side
    assert middle.loss_db == pytest.approx(0.0, abs=1e-9)
    assert [a.cold_bearing_deg for a in sheet.arms] == pytest.approx([180.0, 270.0])
    right = answer_feed(3.65, replace(there, relay=(RIGHT,)), [3.65])
    assert right.delayed_arm == "N"
    assert right.band[0].phase_deg == pytest.approx(-90.0)  # of the delayed arm, again


def test_sheet_of_a_line_that_has_no_hand():
    half = 2.0 * float(quarter_wave(F, 0.66))
    sheet = answer_feed(3.65, station(F, line_length=half))
    assert not sheet.has_hand
    assert sheet.headline.startswith("No hand at all")
    assert "180° long" in sheet.headline
    three = answer_feed(3.65, station(F, line_length=1.5 * half))
    assert "three quarters of a wave" in " ".join(three.caveats)
    assert [p.hand for p in three.positions] == [Hand.RIGHT, Hand.LEFT]


@pytest.mark.parametrize("kind", [FeedKind.HYBRID, FeedKind.DIGITAL])
def test_sheet_of_a_feed_without_a_line(kind):
    sheet = answer_feed(3.65, station(F, kind, phase_error=math.radians(5.0)), [3.65])
    assert sheet.line is None
    assert sheet.band[0].line_deg == pytest.approx(95.0)
    assert sheet.band[0].phase_deg == pytest.approx(-95.0)
    assert sheet.band[0].rejection_db == pytest.approx(27.2, abs=0.05)


def test_sheet_of_a_single_wire():
    wire = station(F, antenna=AntennaKind.DIPOLE, bearings=(0.0,), relay=WIRES[:1])
    sheet = answer_feed(3.65, wire, [3.65])
    assert sheet.line is None
    assert not sheet.has_hand
    assert "no hand" in sheet.headline
    assert sheet.band[0].phase_deg is None


def test_sheet_of_an_unknown_impedance_warns_of_nothing():
    answer_feed(8.0, station(F), [3.65, 8.0])


def test_sheet_of_an_unknown_impedance():
    with np.errstate(invalid="ignore"):
        sheet = answer_feed(8.0, station(F), [3.65, 8.0])
    assert all(p.hand is None and p.rejection_db is None for p in sheet.positions)
    assert "not known" in sheet.headline
    assert "longer than 0.45 wavelengths" in " ".join(sheet.caveats)
    known, unknown = sheet.band
    assert known.swr is not None
    for value in (unknown.resistance_ohm, unknown.phase_deg, unknown.rejection_db, unknown.swr):
        assert value is None


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: answer_feed(0.4), "0.5 to 60"),
        (lambda: answer_feed(3.65, velocity_factor=0.3), "velocity factor"),
        (lambda: answer_feed(3.65, station(F), velocity_factor=0.66), "contradict"),
        (lambda: answer_feed(3.65, band_mhz=[]), "0 frequencies"),
        (lambda: answer_feed(3.65, band_mhz=[3.65] * (MOST_ROWS + 1)), "frequencies"),
        (lambda: answer_feed(3.65, band_mhz=[100.0]), "of the band"),
        (lambda: answer_antenna(station(F), 0.1), "0.5 to 60"),
        (lambda: answer_antenna(station(F), 3.65, [95.0]), "elevation"),
        (lambda: answer_antenna(station(F), 3.65, [45.0], [361.0]), "azimuth"),
        (lambda: answer_antenna(station(F), 3.65, []), "directions"),
    ],
)
def test_wrong_input(call, message):
    with pytest.raises(InputError, match=message):
        call()


# Over the sky


def test_pattern_is_that_of_the_hands():
    there = station(F, FeedKind.TEE, ground=AVERAGE, relay=(LEFT, *WIRES))
    found = answer_antenna(there, 3.65, [20.0, 90.0], [0.0, 100.0, 359.0])
    assert [p.label for p in found.positions] == ["left", "wire N", "wire E"]
    for position, pattern in zip(there.relay, found.positions, strict=True):
        assert pattern.right_dbi.shape == (2, 3)
        length = element_lengths(there, F, math.radians(100.0), math.radians(20.0))
        total = joined(network_of(there, position, F).current[:, 0], length)
        right, left = hand_gains(total, F)
        assert pattern.right_dbi[0, 1] == pytest.approx(float(decibels(right)))
        assert pattern.left_dbi[0, 1] == pytest.approx(float(decibels(left)))
        difference = float(rejection_db(right, left))
        assert pattern.right_over_left_db[0, 1] == pytest.approx(difference)
        # overhead the azimuth only turns the axes
        assert np.ptp(pattern.right_dbi[1]) < 1e-9
    default = answer_antenna(there, 3.65)
    assert default.positions[0].right_dbi.shape == (18, 24)


def test_pattern_of_an_unknown_impedance_is_refused():
    with pytest.raises(OutsideModelError, match=r"longer than 0.45 wavelengths"):
        answer_antenna(station(F), 8.0)
