"""The station's antenna on whole paths: the relay position, what limits it, and what is said of it.

The paths are real ones with a typed ionosphere; what they ought to give follows from the sign of
k·B, from the ellipses of both waves and from one-line formulas of ideal antennas (kind: derived).
The low path from magnetic north at dip 67 degrees is one of the project's list of checks: the
ordinary wave arrives LHCP, and the position that hears LHCP overhead hears the extraordinary wave
5 dB better; held to half the last printed digit, a fifth of a wavelength above average land.
Its height and ground are not stated there: between 0.1 and 0.3 wavelengths it is 3.0 to 6.1 dB.
"""

import math
from datetime import UTC, datetime

import pytest

import magion.answers.path as path_module
from magion.answers.inputs import IonosphereInput
from magion.answers.path import answer_path
from magion.antenna.response import NO_HAND_DB, fade_depth_db
from magion.antenna.station import AntennaKind, FeedKind
from magion.geometry import parse_place
from magion.ground import AVERAGE, CLASSES, PERFECT
from magion.polarization import Hand
from magion.waves import MODES, Mode
from tests.proof import proves
from tests.stations import LEFT, RIGHT, WIRES, station

LOW = proves(
    "response of a station to both waves of a low path",
    layer="answers",
    kind="derived",
    source="signs and ellipses of both waves",
    tolerance=0.5,
    unit="dB",
)
ELLIPSES = proves(
    "rejection by a whole station, limited by the ellipse",
    layer="answers",
    kind="derived",
    source="(r + 1)/(r − 1) of ideal antennas",
    tolerance=0.5,
    unit="dB",
)
GAINED = proves(
    "level heard and sent over one dipole",
    layer="answers",
    kind="derived",
    source="(1 + r)²/(2 r²) of ideal antennas",
    tolerance=0.1,
    unit="dB",
)

NIGHT, NOON = datetime(2026, 12, 21, 1, tzinfo=UTC), datetime(2026, 6, 21, 12, tzinfo=UTC)
F2_ALONE = IonosphereInput(fof2_mhz=6.5, hmf2_km=300.0, foe_mhz=1.0)
PATHS = {
    # straight up and down at dip 62
    "overhead": ("46.5,11.35", "46.5,11.35", 3.65, NIGHT, F2_ALONE),
    # 1000 km from magnetic north at dip 67, by F2: 24 degrees high
    "from the north": ("60.98,6.97", "52.0,6.0", 3.65, NIGHT, F2_ALONE),
    # 700 km from the north-east, by E: 15 degrees high
    "from the north-east": (
        "55.4,15.1", "52.0,6.0", 5.3, NOON,
        IonosphereInput(fof2_mhz=6.5, hmf2_km=270.0, foe_mhz=3.4),
    ),
    # straight up and down near the dip equator
    "dip equator": (
        "12.0S,77.0W", "12.0S,77.0W", 7.1, datetime(2026, 12, 21, 18, tzinfo=UTC),
        IonosphereInput(fof2_mhz=9.0, hmf2_km=300.0, foe_mhz=3.0),
    ),
}  # fmt: skip


@pytest.fixture(scope="module", autouse=True)
def _every_path_is_traced_once():
    """The stations differ, the rays do not."""
    kept = {}

    def once(function, key_of):
        def ask(*args, **options):
            key = (function.__name__, key_of(*args), tuple(options.items()))
            if key not in kept:
                kept[key] = function(*args, **options)
            return kept[key]

        return ask

    def ends(link, moments, given, *rest):
        return link.transmitter, link.receiver, tuple(moments), given, rest

    with pytest.MonkeyPatch.context() as patch:
        for name, key_of in (
            ("scene_of", ends),
            ("find_modes", lambda scene, *rest: (id(scene), *rest)),
            ("path_mufs", lambda scene, hops: (id(scene), tuple(hops))),
        ):
            patch.setattr(path_module, name, once(getattr(path_module, name), key_of))
        yield


def ask(path, there):
    start, end, mhz, when, known = PATHS[path]
    return answer_path(parse_place(start), parse_place(end), mhz, when, known, station=there)


def at(path, kind=FeedKind.COMBINER, **changes):
    """A station at the receiver of a path, resonant at its frequency."""
    _, end, mhz, _, _ = PATHS[path]
    return station(mhz * 1e6, kind, **({"place": parse_place(end), "height": 0.12} | changes))


def position(answer, label):
    return next(p for p in answer.antenna.positions if p.label == label)


def said(answer):
    return " ".join((answer.advice.headline, *answer.advice.caveats))


# Low paths: by response, not by letter


def test_low_path_from_the_north():
    answer = ask("from the north", at("from the north", ground=AVERAGE, height=0.2))
    assert abs(answer.path.distance_km - 1000.0) < 5.0
    ordinary = answer.waves[0]
    assert ordinary.receive_hand is Hand.LEFT
    assert ordinary.arrival.elevation_deg < 30.0
    left = position(answer, "left")
    assert left.overhead_hand is Hand.LEFT
    # the position of the wave's own letter hears the other wave better
    LOW.within(left.ordinary_over_extraordinary_db, -5.0)
    assert position(answer, "right").ordinary_over_extraordinary_db < -3.0
    assert "Circular is the wrong choice here" in said(answer)


def test_one_wire_parts_the_waves_of_that_path():
    there = at("from the north", ground=AVERAGE, height=0.2, relay=(LEFT, RIGHT, *WIRES))
    answer = ask("from the north", there)
    # O stands in the plane of k and B, for the wire that points to it; X lies across, for the
    # wire broadside to it, which hears low waves best: here X is the stronger at the antenna.
    wanted = {Mode.ORDINARY: "wire N", Mode.EXTRAORDINARY: "wire E"}[answer.advice.wave]
    assert answer.advice.relay_position == wanted
    assert answer.advice.rejection_db.ordinary > 15.0
    assert answer.advice.rejection_db.extraordinary > 15.0
    assert answer.antenna.causes == ()
    assert "one wire" in answer.advice.headline


LOW_WIRES = {"ground": AVERAGE, "height": 0.05}


def test_position_is_chosen_by_response_and_not_by_letter():
    answer = ask("from the north-east", at("from the north-east", **LOW_WIRES))
    wave = answer.waves[0]
    assert wave.arrival.elevation_deg < 16.0
    assert answer.advice.wave is Mode.ORDINARY
    assert answer.advice.receive_hand is wave.receive_hand is Hand.LEFT
    assert answer.advice.relay_position == "right"
    assert position(answer, "right").overhead_hand is Hand.RIGHT
    # the position of the letter hears the other wave at least as well
    assert position(answer, "right").ordinary_over_extraordinary_db > 2.0
    assert position(answer, "left").ordinary_over_extraordinary_db < 0.0
    assert "chosen by response, not by letter" in said(answer)


def test_over_a_perfect_ground_the_letter_is_right_again():
    # Both reflected parts keep their phase there: what turned the positions over was the ground.
    answer = ask("from the north-east", at("from the north-east", ground=PERFECT, height=0.05))
    assert answer.advice.relay_position == "left"
    assert "not by letter" not in said(answer)


def test_a_cause_whose_removal_gains_nothing_limits_nothing():
    answer = ask("from the north-east", at("from the north-east", ground=AVERAGE, height=0.15))
    own = position(answer, answer.advice.relay_position).rejection_db(answer.advice.wave)
    gained = max(c.rejection_without_db for c in answer.antenna.causes) - own
    assert gained > 0.01 or answer.advice.limited_by is None


def test_no_arm_is_praised_that_hears_the_other_wave_better():
    answer = ask(
        "from the north-east", at("from the north-east", ground=CLASSES["sea"], height=0.03)
    )
    wire = max(a.rejection_db(answer.advice.wave) for a in answer.antenna.arms)
    assert wire > 0.0 or "Circular is the wrong choice" not in said(answer)


# Near the dip equator


def test_circular_is_the_wrong_choice_near_the_dip_equator():
    answer = ask("dip equator", at("dip equator"))
    assert abs(answer.field.dip_deg) < 3.0
    plain = [c for c in answer.advice.caveats if "Circular is the wrong choice here" in c]
    assert len(plain) == 1
    assert "too linear" in plain[0]
    assert "the relay has no such position" in plain[0]
    # O along magnetic north-south; the declination is under 3 degrees here
    assert "arm N alone" in plain[0]
    # Of ellipses of axial ratio r a circular antenna parts (r + 1)/(r − 1), a wire along it r.
    r = 10.0 ** (answer.waves[0].axial_ratio_db / 20.0)
    circular = 20.0 * math.log10((r + 1.0) / (r - 1.0))
    ELLIPSES.within(answer.advice.rejection_db.ordinary, circular, 0.3)
    wire = next(a for a in answer.antenna.arms if a.label == "N")
    ELLIPSES.within(wire.rejection_db(Mode.ORDINARY), 20.0 * math.log10(r), 0.3)


def test_the_wire_is_taken_where_the_relay_has_it():
    answer = ask("dip equator", at("dip equator", relay=(LEFT, RIGHT, *WIRES)))
    wave = answer.advice.wave
    wanted = {Mode.ORDINARY: "wire N", Mode.EXTRAORDINARY: "wire E"}[wave]
    assert answer.advice.relay_position == answer.advice.transmit_relay_position == wanted
    plain = [c for c in answer.advice.caveats if "Circular is the wrong choice here" in c]
    assert len(plain) == 1
    assert "no such position" not in plain[0]


# Overhead: ideal stations with one fault


def test_an_ideal_station_overhead():
    answer = ask("overhead", at("overhead"))
    ordinary, extraordinary = answer.waves
    assert (ordinary.receive_hand, extraordinary.receive_hand) == (Hand.LEFT, Hand.RIGHT)
    # One position hears one wave and sends the other.
    assert answer.advice.relay_position == "left"
    assert answer.advice.transmit_relay_position == "right"
    assert position(answer, "left").ordinary_share < 0.01
    assert position(answer, "right").ordinary_share > 0.99
    ratios = [10.0 ** (w.axial_ratio_db / 20.0) for w in answer.waves]
    # Of opposite ellipses (r + 1)/(r − 1); the two come a quarter of a degree apart.
    limit = 20.0 * math.log10((ratios[0] + 1.0) / (ratios[0] - 1.0))
    ELLIPSES.within(answer.advice.rejection_db.ordinary, limit)
    assert answer.advice.limited_by == "ellipticity of the wave"
    # Circular against one wire, both matched: (1 + r)² / (2 r²) at either end.
    gained = 10.0 * math.log10((1.0 + ratios[0]) ** 2 / (2.0 * ratios[0] ** 2))
    antenna = answer.antenna
    GAINED.within([antenna.level_over_dipole_db, antenna.sent_over_dipole_db], gained)
    assert antenna.both_ends_db == pytest.approx(
        antenna.level_over_dipole_db + antenna.sent_over_dipole_db
    )
    assert antenna.rejection_s_units == pytest.approx(answer.advice.rejection_db.ordinary / 6.0)


def test_levels_and_fades():
    answer = ask("overhead", at("overhead"))
    lead = answer.waves[0].level_db - answer.waves[1].level_db
    rejection = position(answer, "left").ordinary_over_extraordinary_db
    assert answer.advice.separation_db == pytest.approx(lead + rejection)
    antenna = answer.antenna
    assert antenna.fade_depth_after_db == pytest.approx(float(fade_depth_db(lead + rejection)))
    assert antenna.fade_depth_after_db < 1.0
    arm = max(antenna.arms, key=lambda a: a.ordinary_gain_dbi)
    before = float(fade_depth_db(lead + arm.ordinary_over_extraordinary_db))
    assert antenna.fade_depth_before_db == pytest.approx(before)
    assert antenna.fade_depth_before_db > 10.0


def test_signs_of_level_and_margin():
    ordinary, extraordinary = ask("overhead", at("overhead")).waves
    # The extraordinary wave is absorbed by 2 dB more; its smaller spread gives back a part of it.
    assert extraordinary.absorption_db - ordinary.absorption_db > 1.5
    assert ordinary.level_db - extraordinary.level_db > 0.5
    assert extraordinary.level_db < 0.0
    for wave in (ordinary, extraordinary):
        assert wave.margin_mhz == pytest.approx(wave.muf_mhz - 3.65)
        assert wave.margin_mhz > 0.0


FAULTS = [
    ("feed phase", {"phase_error": math.radians(20.0)}, 15.1),
    ("feed phase", {"phase_error": math.radians(-20.0)}, 15.1),
    ("feed amplitude", {"amplitude_error_db": 3.0}, 15.3),
    ("feed amplitude", {"amplitude_error_db": -3.0}, 15.3),
]


def within(found, alone_db, ideal_db):
    """Whether a rejection can be that of a fault alone beside the ellipse's own limit.

    Leaks a of the fault and b of the ellipse add up with any phase, to (a ± b)/(1 ± a b); half the
    last printed digit of the fault's figure is left on top.
    """
    a, b = (10.0 ** (-db / 20.0) for db in (alone_db, ideal_db))
    least = -20.0 * math.log10((a + b) / (1.0 - a * b))
    most = -20.0 * math.log10((a - b) / (1.0 + a * b))
    return least - 0.05 < found < most + 0.05


@pytest.mark.parametrize(("cause", "fault", "printed"), FAULTS)
@pytest.mark.parametrize("kind", [FeedKind.HYBRID, FeedKind.DIGITAL])
def test_an_injected_fault_is_the_one_that_is_named(cause, fault, printed, kind):
    ideal = ask("overhead", at("overhead", kind))
    faulty = ask("overhead", at("overhead", kind, **fault))
    assert faulty.advice.limited_by == cause
    assert f"limited most by the {cause}" in faulty.advice.headline
    limit = ideal.advice.rejection_db.ordinary
    assert within(faulty.advice.rejection_db.ordinary, printed, limit)
    first, second, *_ = faulty.antenna.causes
    assert first.cause == cause
    # without it the ideal station is left
    assert first.rejection_without_db == pytest.approx(limit, abs=0.01)
    assert second.rejection_without_db < first.rejection_without_db - 10.0


def test_both_faults_stand_side_by_side():
    fault = {"phase_error": math.radians(10.0), "amplitude_error_db": 1.0}
    answer = ask("overhead", at("overhead", FeedKind.HYBRID, **fault))
    without = {c.cause: c.rejection_without_db for c in answer.antenna.causes}
    # 19.6 dB with both; the phase weighs more: without it 24.8 dB, without the amplitude 21.2
    limit = ask("overhead", at("overhead", FeedKind.HYBRID)).advice.rejection_db.ordinary
    assert within(answer.advice.rejection_db.ordinary, 19.6, limit)
    assert within(without["feed phase"], 24.8, limit)
    assert within(without["feed amplitude"], 21.2, limit)
    assert without["feed phase"] > without["feed amplitude"] > answer.advice.rejection_db.ordinary
    assert answer.advice.limited_by == "feed phase"


def test_feed_of_the_chosen_position():
    answer = ask("overhead", at("overhead", FeedKind.HYBRID, phase_error=math.radians(7.0)))
    # The delayed arm lags: of E over N −97 degrees in the position with the delay in E.
    assert answer.advice.relay_position == "left"
    network = answer.antenna.network
    assert network.phase_deg == pytest.approx(-97.0)
    assert network.amplitude_db == pytest.approx(0.0, abs=1e-9)
    assert network.swr == pytest.approx(1.0)
    assert network.loss_db == pytest.approx(0.0, abs=1e-9)
    assert network.path_deg is None
    line = ask("overhead", at("overhead")).antenna.network
    assert (line.path_deg, line.phase_deg) == pytest.approx((90.0, -90.0))


@pytest.mark.parametrize("kind", [FeedKind.TEE, FeedKind.COMBINER])
def test_a_half_wave_line_has_no_hand_at_all(kind):
    quarter = 0.25 * 0.66 * 299792458.0 / 3.65e6
    answer = ask("overhead", at("overhead", kind, line_length=2.0 * quarter))
    assert answer.advice.headline.startswith("No hand at all: the delay line is a half wave")
    assert not answer.antenna.has_hand
    assert all(p.overhead_hand is None for p in answer.antenna.positions)
    assert all(abs(p.ordinary_over_extraordinary_db) < NO_HAND_DB for p in answer.antenna.positions)
    assert answer.advice.limited_by is None
    assert "about 90° apart" in said(answer)


def test_a_three_quarter_wave_line_changes_the_labels():
    quarter = 0.25 * 0.66 * 299792458.0 / 3.65e6
    answer = ask("overhead", at("overhead", line_length=3.0 * quarter))
    assert answer.advice.relay_position == "right"
    assert answer.advice.receive_hand is Hand.LEFT
    assert position(answer, "right").overhead_hand is Hand.LEFT


@pytest.mark.parametrize(
    "changes",
    [
        {"kind": FeedKind.DIGITAL},
        {"receive_only": True},
        {"antenna": AntennaKind.CROSSED_LOOPS, "height": 0.02},
    ],
)
def test_receiving_stations_have_no_position_to_send_with(changes):
    answer = ask("overhead", at("overhead", **changes))
    assert answer.advice.relay_position == "left"
    assert answer.advice.transmit_relay_position is None
    assert answer.advice.headline.endswith("Receive only.")
    assert answer.antenna.sent_over_dipole_db is answer.antenna.both_ends_db is None
    for place in (*answer.antenna.positions, *answer.antenna.arms):
        assert place.ordinary_share is None
        assert all(place.sent_dbi(mode) is None for mode in MODES)
    # the hand to send back with is the wave's, and stays
    assert answer.advice.transmit_hand is answer.advice.receive_hand.opposite


def test_an_unknown_impedance_gives_no_position_and_says_so():
    # Resonant at 1.7 MHz, each leg is 0.51 wavelengths long at 3.65 MHz.
    answer = ask("overhead", station(1.7e6, place=parse_place("46.5,11.35")))
    assert answer.antenna is None
    advice = answer.advice
    assert advice.relay_position is advice.transmit_relay_position is None
    assert advice.rejection_db is advice.separation_db is advice.limited_by is None
    assert advice.receive_hand is Hand.LEFT
    assert any("longer than 0.45 wavelengths" in c for c in advice.caveats)


def test_loops_without_an_impedance_say_what_is_taken():
    loops = {"antenna": AntennaKind.CROSSED_LOOPS, "height": 0.02}
    taken = ask("overhead", at("overhead", measured=False, **loops))
    assert taken.advice.relay_position == "left"
    assert "amplifiers" in said(taken)
    assert "amplifiers" not in said(ask("overhead", at("overhead", **loops)))


def test_a_station_elsewhere_is_told():
    there = at("overhead", place=parse_place("47.5,11.35"))
    assert "111 km from TO" in said(ask("overhead", there))
    assert "from TO" not in said(ask("overhead", at("overhead")))


def test_one_wire_has_no_hand():
    there = at(
        "overhead", FeedKind.COMBINER, antenna=AntennaKind.DIPOLE, bearings=(0.0,), relay=WIRES[:1]
    )
    answer = ask("overhead", there)
    assert answer.advice.relay_position == answer.advice.transmit_relay_position == "wire N"
    assert answer.antenna.causes == ()
    assert answer.advice.limited_by is None
    assert answer.antenna.network.phase_deg is None
    assert answer.antenna.level_over_dipole_db == pytest.approx(0.0, abs=1e-12)
