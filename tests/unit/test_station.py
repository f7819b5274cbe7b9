"""Files of a station: every key, what is refused and in which words, the page and the examples."""

import copy
import math
import re
from datetime import UTC, date, datetime, time
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from magion.antenna.feed import delay_length
from magion.antenna.station import AntennaKind, FeedKind, Station
from magion.errors import InputError
from magion.formats.station import LARGEST_STATION, read_station, station_of
from magion.ground import CLASSES

ROOT = Path(__file__).parents[2]
LARCH = ROOT / "examples" / "larch_hut.toml"
CEDAR = ROOT / "examples" / "cedar_ridge.toml"
PAGE = (ROOT / "docs" / "formats.md").read_text(encoding="utf-8")
PAGE = PAGE.split("## Station (`--station`)")[1].split("\n## ")[0]

BASE = {
    "station": {"name": "Larch Hut", "place": "46.50,11.35"},
    "antenna": {
        "kind": "crossed-dipoles",
        "height_m": 9.0,
        "resonant_mhz": 5.3,
        "arms": {"A": 20.0, "B": 110.0},
    },
    "ground": {"class": "medium-dry"},
    "feed": {"kind": "tee"},
    "relay": {"left": {"delayed": "B"}, "right": {"delayed": "A"}, "wire_a": {"single": "A"}},
}
GONE = object()
VEES = {"antenna.kind": "crossed-inverted-vees", "antenna.apex_angle_deg": 120.0}
LOOPS = {"antenna.kind": "crossed-loops"}
WIRE = {"antenna.kind": "dipole", "antenna.arms": {"A": 20.0}, "feed": GONE, "relay": GONE}
ONE_VEE = WIRE | {"antenna.kind": "inverted-vee", "antenna.apex_angle_deg": 120.0}
HYBRID = {"feed.kind": "hybrid"}
DIGITAL = {"feed.kind": "digital"}
BY_LEG = {"antenna.resonant_mhz": GONE, "antenna.leg_length_m": 13.4}
MEASURED = {"antenna.resistance_ohm": 50.0, "antenna.quality_factor": 12.0}
CONSTANTS = {"ground.class": GONE, "ground.permittivity": 13, "ground.conductivity_s_per_m": 0.005}


def text_of(value):
    """A value as TOML."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        signs = (c if " " <= c <= "~" and c not in '"\\' else f"\\U{ord(c):08x}" for c in value)
        return f'"{"".join(signs)}"'
    if isinstance(value, dict):
        return f"{{{', '.join(f'{text_of(k)} = {text_of(v)}' for k, v in value.items())}}}"
    if isinstance(value, list):
        return f"[{', '.join(map(text_of, value))}]"
    if isinstance(value, datetime | date | time):
        return value.isoformat()
    return repr(value)


def toml(document):
    """A document as TOML, its sections under their headers."""
    first = [f"{text_of(k)} = {text_of(v)}" for k, v in document.items() if not isinstance(v, dict)]
    rest = [
        "\n".join([f"[{text_of(k)}]", *(f"{text_of(a)} = {text_of(b)}" for a, b in v.items())])
        for k, v in document.items()
        if isinstance(v, dict)
    ]
    return "\n".join([*first, *rest]) + "\n"


def changed(*changes):
    """The base with some keys changed or taken away; keys are dotted."""
    document = copy.deepcopy(BASE)
    for change in changes:
        for path, value in change.items():
            *outer, last = path.split(".")
            table = document
            for part in outer:
                table = table.setdefault(part, {})
            if value is GONE:
                table.pop(last, None)
            else:
                table[last] = copy.deepcopy(value)
    return document


def station(*changes):
    return station_of(toml(changed(*changes)), "hut.toml")


def refusal_of_text(text, name="hut.toml"):
    with pytest.raises(InputError) as caught:
        station_of(text, name)
    line = str(caught.value)
    assert line.startswith(f"{name}: ")
    assert line.isprintable()
    assert len(line) <= 200
    return line


def refusal(*changes):
    return refusal_of_text(toml(changed(*changes)))


# What is accepted


def test_the_least_station():
    found = station({"station.name": GONE})
    assert found.name is None
    assert found.place.name is None
    assert (found.place.latitude_deg, found.place.longitude_deg) == (46.5, 11.35)
    antenna = found.antenna
    assert antenna.kind is AntennaKind.CROSSED_DIPOLES
    assert (antenna.height, antenna.resonant_frequency, antenna.leg_length) == (9.0, 5.3e6, None)
    assert (antenna.wire_diameter, antenna.apex_angle) == (2e-3, math.pi)
    assert antenna.measured is None
    assert [(a.name, a.bearing) for a in antenna.arms] == [
        ("A", math.radians(20.0)),
        ("B", math.radians(110.0)),
    ]
    assert (found.ground, found.ground_name) == (CLASSES["medium-dry"], "medium-dry")
    feed = found.feed
    assert feed.kind is FeedKind.TEE
    assert (feed.velocity_factor, feed.impedance, feed.radio_impedance) == (0.66, 50.0, 50.0)
    assert (feed.line_length, feed.leads, feed.feeder_length) == (None, 0.0, 0.0)
    assert (feed.loss_db_per_100m, feed.phase_error, feed.amplitude_error_db) == (0.0, 0.0, 0.0)
    assert feed.receive_only is False
    assert [(p.label, p.delayed, p.single) for p in found.relay] == [
        ("left", "B", None),
        ("right", "A", None),
        ("wire_a", None, "A"),
    ]


def test_every_key_of_an_antenna_in_si():
    antenna = station(
        VEES, MEASURED, {"antenna.reactance_ohm": -7, "antenna.wire_diameter_mm": 3}
    ).antenna
    assert antenna.kind is AntennaKind.CROSSED_VEES
    assert antenna.apex_angle == math.radians(120.0)
    assert antenna.wire_diameter == 0.003
    measured = antenna.measured
    assert (measured.frequency, measured.resistance) == (5.3e6, 50.0)
    assert (measured.reactance, measured.quality_factor) == (-7.0, 12.0)
    assert station(MEASURED).antenna.measured.reactance == 0.0


def test_every_key_of_a_feed_in_si():
    feed = station(
        {
            "feed": {
                "kind": "combiner",
                "velocity_factor": 0.8,
                "impedance_ohm": 75,
                "radio_ohm": 60,
                "line_length_m": 9.1,
                "leads_m": 0.2,
                "feeder_m": 15,
                "loss_db_per_100m": 3,
                "receive_only": True,
            }
        }
    ).feed
    assert feed.kind is FeedKind.COMBINER
    assert (feed.velocity_factor, feed.impedance, feed.radio_impedance) == (0.8, 75.0, 60.0)
    assert (feed.line_length, feed.leads, feed.feeder_length) == (9.1, 0.2, 15.0)
    assert (feed.loss_db_per_100m, feed.receive_only) == (3.0, True)
    for way, kind in ((HYBRID, FeedKind.HYBRID), (DIGITAL, FeedKind.DIGITAL)):
        feed = station(way, {"feed.phase_error_deg": -5, "feed.amplitude_error_db": 0.5}).feed
        assert feed.kind is kind
        assert (feed.phase_error, feed.amplitude_error_db) == (math.radians(-5.0), 0.5)
        assert feed.line_length is None


def test_wires_by_their_leg():
    antenna = station(BY_LEG, {"feed.line_length_m": 9.1}).antenna
    assert (antenna.leg_length, antenna.resonant_frequency) == (13.4, None)
    assert station(BY_LEG, HYBRID).feed.kind is FeedKind.HYBRID


def test_loops():
    found = station(LOOPS)
    assert found.antenna.leg_length is None
    assert found.antenna.resonant_frequency == 5.3e6
    assert not found.can_transmit
    without = {"antenna.resonant_mhz": GONE}
    assert station(LOOPS, DIGITAL, without).antenna.resonant_frequency is None
    assert station(LOOPS, without, {"feed.line_length_m": 9.1}).feed.line_length == 9.1
    assert station(LOOPS, MEASURED).antenna.measured.frequency == 5.3e6


@pytest.mark.parametrize("way", [WIRE, ONE_VEE])
def test_a_single_wire_needs_neither_feed_nor_relay(way):
    found = station(way)
    assert found.feed.kind is FeedKind.COMBINER
    assert [(p.label, p.delayed, p.single) for p in found.relay] == [("A", None, "A")]
    assert station(way, BY_LEG, {"antenna.height_m": 12.0}).antenna.leg_length == 13.4
    assert station(way, {"relay": {}}).relay == found.relay
    named = station(way, {"relay": {"on": {"single": "A"}}, "feed": {"feeder_m": 15.0}})
    assert (named.relay[0].label, named.feed.feeder_length) == ("on", 15.0)


@pytest.mark.parametrize("name", CLASSES)
def test_classes_of_ground(name):
    found = station({"ground.class": name})
    assert (found.ground, found.ground_name) == (CLASSES[name], name)


def test_ground_by_its_constants():
    found = station(CONSTANTS)
    assert (found.ground.permittivity, found.ground.conductivity) == (13.0, 0.005)
    assert found.ground_name == "permittivity 13, 0.005 S/m"


@pytest.mark.parametrize("place", ["41.0S,71.3W", "-41.0, -71.3", " 41°S , 71.3°W "])
def test_places(place):
    found = station({"station.place": place}).place
    assert (found.latitude_deg, found.longitude_deg) == (-41.0, -71.3)
    assert found.name == "Larch Hut"


def test_place_as_locator():
    place = station({"station.place": "JN56mt"}).place
    assert place.latitude_deg == pytest.approx(46.8125, abs=1e-9)


@pytest.mark.parametrize(
    ("first", "second", "normal"),
    [
        (20.0, 110, (20.0, 110.0)),
        (-70.0, 20.0, (290.0, 20.0)),
        (360.0, 90.0, (0.0, 90.0)),
        (-0.0, -90.0, (0.0, 270.0)),
        (-1e-20, 90.0, (0.0, 90.0)),
        (-360, 360 - 90, (0.0, 270.0)),
        (20.0, 25.0 + 90.0, (20.0, 115.0)),
        (0.1, 95.1, (0.1, 95.1)),
        (350.0, 75.0, (350.0, 75.0)),
    ],
)
def test_bearings_are_normal_and_cross(first, second, normal):
    arms = station({"antenna.arms": {"A": first, "B": second}}).antenna.arms
    assert tuple(a.bearing for a in arms) == pytest.approx(
        tuple(math.radians(d) for d in normal), abs=1e-15
    )
    assert all(0.0 <= a.bearing < 2.0 * math.pi for a in arms)
    assert all(math.copysign(1.0, a.bearing) == 1.0 for a in arms)


def test_names_in_the_operators_own_words():
    found = station(
        {
            "station.name": "Lärchenhütte 2",
            "antenna.arms": {"Nord-Süd": 0.0, "the other arm, 20 s": 90.0},
            "relay": {"rechts / RHCP": {"delayed": "Nord-Süd"}, "左": {"delayed": "Nord-Süd"}},
        }
    )
    assert found.place.name == found.name == "Lärchenhütte 2"
    assert [p.label for p in found.relay] == ["rechts / RHCP", "左"]
    assert station({"station.name": "x" * 60}).name == "x" * 60


# With a quarter wave of cable of 0.66 * 299792458 / (4 * 5.3e6) = 9.333 m


def test_leads_are_part_of_the_quarter_wave():
    found = station({"feed.leads_m": 0.15})
    assert found.feed.line_length is None
    assert delay_length(found.feed, found.antenna.resonant_frequency) == pytest.approx(
        9.333, abs=5e-4
    )
    assert station({"feed.leads_m": 9.33}).feed.leads == 9.33
    line = refusal({"feed.leads_m": 9.34})
    for word in ("[feed] leads_m", "9.34", "accepted: below 9.333 m", "5.3 MHz", "line_length_m"):
        assert word in line
    stated = station({"feed.leads_m": 9.34, "feed.line_length_m": 0.01}).feed
    assert delay_length(stated, 5.3e6) == pytest.approx(9.35, abs=1e-12)


# The wire ends: a leg of 0.2375 * 299792458 / 5.3e6 = 13.434 m falls 13.434 cos 60° = 6.717 m


def test_wire_ends_of_a_vee_hang_above_the_ground():
    assert station(VEES, {"antenna.height_m": 6.82}).antenna.height == 6.82
    line = refusal(VEES, {"antenna.height_m": 6.81})
    for word in ("[antenna] height_m", "6.81", "wire ends", "accepted: 6.82 to 200 m"):
        assert word in line
    leg = BY_LEG | {"antenna.leg_length_m": 10.0}  # 10 cos 60° = 5 m
    assert station(ONE_VEE, leg, {"antenna.height_m": 5.1}).antenna.height == 5.1
    assert "accepted: 5.1 to 200 m" in refusal(ONE_VEE, leg, {"antenna.height_m": 5.09})
    assert station({"antenna.height_m": 0.5}).antenna.height == 0.5


@pytest.mark.parametrize("k", range(91, 180, 4))
def test_the_least_height_that_a_message_names_is_accepted(k):
    way = VEES | {"antenna.apex_angle_deg": k + 0.37}
    try:
        station(way, {"antenna.height_m": 0.5})
    except InputError as error:
        least = re.search(r"accepted: ([\d.]+) to 200 m", str(error)).group(1)
        assert station(way, {"antenna.height_m": float(least)})
        refusal(way, {"antenna.height_m": float(least) - 0.011})


# What is refused

UNLIKE_A_NUMBER = ["9", "", True, False, [], [9.0], {}, {"a": 1}, date(2026, 1, 2), time(12, 0)]
OUT_OF_ALL_RANGES = [math.nan, math.inf, -math.inf, 1e300, -1e300, 10**400, -(10**400), 10**18]


def rows_of_page():
    """Section, key, unit, accepted, default of every key on the page."""
    section = None
    for line in PAGE.splitlines():
        if match := re.fullmatch(r"### `\[(\w+)\]`", line):
            section = match.group(1)
        if match := re.match(r"\| `(\w+)` \|", line):
            cells = [c.strip() for c in line.strip().strip("|").split("|")]
            yield section, match.group(1), *cells[1:]


ROWS = list(rows_of_page())
NUMBERS = {
    f"{section}.{key}": (float(found.group(1)), float(found.group(2)), default)
    for section, key, _, accepted, default in ROWS
    if (found := re.fullmatch(r"(-?[\d.]+) to (-?[\d.]+)", accepted))
}
# What has to stand around a key for it to be accepted over its whole range.
AROUND = {
    "antenna.leg_length_m": BY_LEG | {"feed.line_length_m": 9.1},
    "antenna.resistance_ohm": MEASURED,
    "antenna.reactance_ohm": MEASURED,
    "antenna.quality_factor": MEASURED,
    "ground.permittivity": CONSTANTS,
    "ground.conductivity_s_per_m": CONSTANTS,
    "feed.leads_m": {"feed.line_length_m": 9.1},
    "feed.phase_error_deg": HYBRID,
    "feed.amplitude_error_db": HYBRID,
}
IN_RECORD = {
    "antenna.height_m": lambda s: s.antenna.height,
    "antenna.resonant_mhz": lambda s: s.antenna.resonant_frequency / 1e6,
    "antenna.leg_length_m": lambda s: s.antenna.leg_length,
    "antenna.wire_diameter_mm": lambda s: s.antenna.wire_diameter * 1e3,
    "antenna.resistance_ohm": lambda s: s.antenna.measured.resistance,
    "antenna.reactance_ohm": lambda s: s.antenna.measured.reactance,
    "antenna.quality_factor": lambda s: s.antenna.measured.quality_factor,
    "ground.permittivity": lambda s: s.ground.permittivity,
    "ground.conductivity_s_per_m": lambda s: s.ground.conductivity,
    "feed.velocity_factor": lambda s: s.feed.velocity_factor,
    "feed.impedance_ohm": lambda s: s.feed.impedance,
    "feed.radio_ohm": lambda s: s.feed.radio_impedance,
    "feed.line_length_m": lambda s: s.feed.line_length,
    "feed.leads_m": lambda s: s.feed.leads,
    "feed.feeder_m": lambda s: s.feed.feeder_length,
    "feed.loss_db_per_100m": lambda s: s.feed.loss_db_per_100m,
    "feed.phase_error_deg": lambda s: math.degrees(s.feed.phase_error),
    "feed.amplitude_error_db": lambda s: s.feed.amplitude_error_db,
}


def written_key(path):
    section, _, key = path.partition(".")
    return f"[{section}] {key}"


def test_page_has_every_number():
    assert set(NUMBERS) == set(IN_RECORD)


@pytest.mark.parametrize("path", NUMBERS)
def test_range_is_that_of_the_page(path):
    low, high, default = NUMBERS[path]
    around = AROUND.get(path, {})
    for value in (low, high, 0.5 * (low + high)):
        found = station(around, {path: value})
        assert IN_RECORD[path](found) == pytest.approx(value, rel=1e-12)
    beyond = (low - abs(low) * 1e-9 - 1e-9, high + abs(high) * 1e-9)
    for value in (*beyond, *OUT_OF_ALL_RANGES):
        line = refusal(around, {path: value})
        assert written_key(path) in line
        assert f"accepted: {low:g} to {high:g}" in line
    if re.fullmatch(r"[\d.]+", default):
        assert IN_RECORD[path](station(around, {path: GONE})) == float(default)


@pytest.mark.parametrize("path", NUMBERS)
def test_what_is_no_number(path):
    for value in UNLIKE_A_NUMBER:
        line = refusal(AROUND.get(path, {}), {path: value})
        assert written_key(path) in line
        assert "accepted: a number" in line


REQUIRED = {
    "station": {"station.place": {}},
    "antenna": {"antenna.kind": {}, "antenna.height_m": {}, "antenna.arms": {}},
    "feed": {"feed.kind": {}},
    "more": {
        "antenna.resonant_mhz": {},
        "antenna.apex_angle_deg": VEES,
        "ground.class": {},
        "ground.permittivity": CONSTANTS,
        "ground.conductivity_s_per_m": CONSTANTS,
    },
}
REQUIRED = {path: around for part in REQUIRED.values() for path, around in part.items()}


@pytest.mark.parametrize("path", REQUIRED)
def test_missing_key(path):
    line = refusal(REQUIRED[path], {path: GONE})
    assert f"{written_key(path)} is missing; accepted: " in line


@pytest.mark.parametrize("name", BASE)
def test_missing_section(name):
    assert f"section [{name}] is missing; accepted: [{name}] with" in refusal({name: GONE})


@pytest.mark.parametrize("name", BASE)
@pytest.mark.parametrize("value", [3, "x", True, [], [{}], date(2026, 1, 2)])
def test_section_that_is_none(name, value):
    line = refusal({name: value})
    assert f"[{name}] is " in line
    assert f"accepted: a section [{name}]" in line


@pytest.mark.parametrize("name", ["station", "antenna", "ground", "feed"])
@pytest.mark.parametrize("key", ["heigth_m", "Kind", "kind ", "", "x" * 300, "\x1b[2J", "ключ"])
def test_unknown_key_lists_the_accepted_ones(name, key):
    document = changed()
    document[name][key] = 1.0
    line = refusal_of_text(toml(document))
    assert f"[{name}] " in line
    assert " is unknown; accepted: " in line
    listed = line.split("accepted: ")[1].split(", ")
    refused = {
        "antenna": {"apex_angle_deg"},
        "feed": {"phase_error_deg", "amplitude_error_db"},
    }.get(name, set())
    assert set(listed) == {k for s, k, *_ in ROWS if s == name} - refused


def test_unknown_section():
    line = refusal({"anntena": {"height_m": 9.0}})
    assert "section [anntena] is unknown; accepted: [station], [antenna], [ground]" in line
    assert "height_m stands in no section; accepted: [station], " in refusal({"height_m": 9.0})
    assert r"['\x1b'] is unknown" in refusal({"\x1b": {}})


MEASURED_ALONE = "resistance_ohm, quality_factor and"
WRONG = [
    ({"station.name": 7}, "[station] name is 7", "1 to 60 printable signs"),
    ({"station.name": ""}, "[station] name is ''", "1 to 60"),
    ({"station.name": "x" * 61}, "[station] name is 'xxx", "1 to 60"),
    ({"station.name": "Hut\n"}, r"[station] name is 'Hut\n'", "1 to 60"),
    ({"station.name": " Hut"}, "[station] name is ' Hut'", "no space at either end"),
    ({"station.place": 46.5}, "[station] place is 46.5", "LAT,LON in decimal degrees"),
    ({"station.place": "Hut"}, "[station] place is 'Hut'", "locator"),
    ({"station.place": ""}, "[station] place is ''", "locator"),
    ({"station.place": "4" * 41}, "[station] place is '444", "locator"),
    ({"station.place": "4\x1b,3"}, r"[station] place is '4\x1b,3'", "locator"),
    ({"station.place": "95,11"}, "[station] place is '95,11': latitude 95", "-90 to 90"),
    ({"station.place": "46,181"}, "[station] place is '46,181': longitude", "-180 to 180"),
    ({"antenna.kind": "loop"}, "[antenna] kind is 'loop'", "crossed-dipoles, crossed-inv"),
    ({"antenna.kind": 3}, "[antenna] kind is 3", "crossed-loops, dipole, inverted-vee"),
    ({"antenna.kind": ["dipole"]}, "[antenna] kind is an array", "crossed-loops, dipole"),
    ({"antenna.leg_length_m": 13.4}, "resonant_mhz and leg_length_m are both there", "or leg"),
    ({"antenna.apex_angle_deg": 120.0}, "apex_angle_deg does not go with kind crossed-d", "arms"),
    (LOOPS | {"antenna.apex_angle_deg": 120.0}, "apex_angle_deg does not go with", "height_m"),
    (WIRE | {"antenna.apex_angle_deg": 120.0}, "apex_angle_deg does not go with", "height_m"),
    (LOOPS | {"antenna.leg_length_m": 1.0}, "leg_length_m does not go with kind cr", "height_m"),
    (LOOPS | {"antenna.wire_diameter_mm": 2.0}, "wire_diameter_mm does not go with", "height_m"),
    (VEES | {"antenna.apex_angle_deg": 90}, "apex_angle_deg is 90", "above 90 and below 180"),
    (VEES | {"antenna.apex_angle_deg": 180.0}, "apex_angle_deg is 180.0", "below 180"),
    (VEES | {"antenna.apex_angle_deg": math.nan}, "apex_angle_deg is nan", "below 180"),
    (VEES | {"antenna.apex_angle_deg": "120"}, "apex_angle_deg is '120'", "a number of degrees"),
    (VEES | {"antenna.apex_angle_deg": True}, "apex_angle_deg is true", "a number of degrees"),
    ({"antenna.arms": 20.0}, "[antenna] arms is 20.0", "two arms with true bearings"),
    ({"antenna.arms": [20.0, 110.0]}, "[antenna] arms is an array", "{ A = 20.0, B = 110.0 }"),
    ({"antenna.arms": {}}, "[antenna] arms has 0", "for crossed-dipoles two arms"),
    ({"antenna.arms": {"A": 20.0}}, "[antenna] arms has 1", "for crossed-dipoles two arms"),
    ({"antenna.arms": {"A": 0, "B": 1, "C": 2}}, "[antenna] arms has 3", "two arms"),
    (WIRE | {"antenna.arms": {"A": 0, "B": 90}}, "[antenna] arms has 2", "for dipole one arm"),
    (ONE_VEE | {"antenna.arms": {"A": 0, "B": 9}}, "[antenna] arms has 2", "inverted-vee one"),
    ({"antenna.arms": {"A": "20", "B": 110}}, "arms.A is the text '20'", "a number, -360 to 360"),
    ({"antenna.arms": {"A": True, "B": 110}}, "arms.A is true", "a number, -360 to 360 degrees"),
    ({"antenna.arms": {"A": 20, "B": 361}}, "[antenna] arms.B is 361", "-360 to 360 degrees"),
    ({"antenna.arms": {"A": math.nan, "B": 1}}, "[antenna] arms.A is nan", "-360 to 360"),
    ({"antenna.arms": {"A": math.inf, "B": 1}}, "[antenna] arms.A is inf", "-360 to 360"),
    ({"antenna.arms": {"": 20, "B": 110}}, "[antenna] arms.'' is no name", "1 to 20"),
    ({"antenna.arms": {"x" * 21: 20, "B": 110}}, "[antenna] arms.xxxx", "1 to 20 printable"),
    ({"antenna.arms": {"\t": 20, "B": 110}}, r"[antenna] arms.'\t' is no name", "1 to 20"),
    ({"antenna.arms": {"A": 20, "B": 104.9}}, "arms cross at 84.9 degrees", "90 within 5"),
    ({"antenna.arms": {"A": 20, "B": 115.1}}, "arms cross at 84.9 degrees", "right angles"),
    ({"antenna.arms": {"A": 20, "B": 20}}, "arms cross at 0 degrees", "coupling be neglected"),
    ({"antenna.arms": {"A": 20, "B": 200}}, "arms cross at 0 degrees", "90 within 5"),
    ({"antenna.resistance_ohm": 50}, "resistance_ohm stands without quality_factor", "ohm"),
    ({"antenna.reactance_ohm": 5}, "reactance_ohm stands without resistance_ohm", MEASURED_ALONE),
    ({"antenna.quality_factor": 9}, "quality_factor stands without resist", MEASURED_ALONE),
    (MEASURED | BY_LEG, "resistance_ohm stands without resonant_mhz", "both"),
    (LOOPS | MEASURED | {"antenna.resonant_mhz": GONE}, "stands without resonant_mhz", "both"),
    ({"ground.class": "dry"}, "[ground] class is 'dry'", "sea, wet, medium-dry, very-dry, av"),
    ({"ground.class": 3}, "[ground] class is 3", "sea, wet, medium-dry, very-dry, average"),
    ({"ground.permittivity": 13}, "[ground] permittivity and class are both there", "or permit"),
    ({"ground.conductivity_s_per_m": 1}, "conductivity_s_per_m and class are both", "or permit"),
    ({"feed.kind": "t"}, "[feed] kind is 't'", "tee, combiner, hybrid, digital"),
    ({"feed.kind": True}, "[feed] kind is true", "tee, combiner, hybrid, digital"),
    (WIRE | {"feed": {"kind": "t"}}, "[feed] kind is 't'", "tee, combiner, hybrid, digital"),
    ({"feed.receive_only": "yes"}, "[feed] receive_only is 'yes'", "true or false"),
    ({"feed.receive_only": 1}, "[feed] receive_only is 1", "true or false"),
    ({"feed.phase_error_deg": 1}, "phase_error_deg does not go with kind tee", "leads_m"),
    ({"feed.amplitude_error_db": 1}, "amplitude_error_db does not go with kind tee", "leads_m"),
    (HYBRID | {"feed.line_length_m": 9}, "line_length_m does not go with kind hyb", "phase_error"),
    (HYBRID | {"feed.leads_m": 0}, "leads_m does not go with kind hybrid", "phase_error_deg"),
    (DIGITAL | {"feed.line_length_m": 9}, "line_length_m does not go with kind dig", "feeder_m"),
    (DIGITAL | {"feed.leads_m": 0.1}, "leads_m does not go with kind digital", "feeder_m"),
    (WIRE | {"feed": {"line_length_m": 9}}, "line_length_m does not go with a sing", "feeder_m"),
    (WIRE | {"feed": {"leads_m": 0.1}}, "leads_m does not go with a single wire", "feeder_m"),
    (WIRE | {"feed": {"kind": "hybrid", "phase_error_deg": 1}}, "does not go with a s", "feeder"),
    (BY_LEG, "[feed] line_length_m is missing", "0.01 to 500 m; or [antenna] resonant_mhz"),
    (BY_LEG | {"feed.kind": "combiner"}, "[feed] line_length_m is missing", "resonant_mhz"),
    (LOOPS | {"antenna.resonant_mhz": GONE}, "[feed] line_length_m is missing", "resonant_mhz"),
    ({"relay": {}}, "[relay] has 0 positions", "1 to 8"),
    ({"relay": {f"p{i}": {"single": "A"} for i in range(9)}}, "[relay] has 9 positions", "1 to 8"),
    ({"relay.left": "B"}, "[relay] left is 'B'", "{ delayed = 'ARM' } or { single = 'ARM' }"),
    ({"relay.left": {}}, "[relay] left says nothing", "delayed or single"),
    ({"relay.left.single": "A"}, "[relay] left has both", "delayed or single"),
    ({"relay.left.single_": "A"}, "[relay] left.single_ is unknown", "delayed or single"),
    ({"relay.left.delayed": "C"}, "[relay] left.delayed is 'C'", "an arm, 'A' or 'B'"),
    ({"relay.left.delayed": "a"}, "[relay] left.delayed is 'a'", "an arm, 'A' or 'B'"),
    ({"relay.left.delayed": ["A"]}, "[relay] left.delayed is an array", "an arm, 'A' or 'B'"),
    ({"relay.left.delayed": math.nan}, "[relay] left.delayed is nan", "an arm, 'A' or 'B'"),
    ({"relay.wire_a.single": True}, "[relay] wire_a.single is true", "an arm, 'A' or 'B'"),
    ({"relay": {"": {"single": "A"}}}, "[relay] '' is no label", "1 to 20 printable"),
    ({"relay": {"x" * 21: {"single": "A"}}}, "[relay] xxxxx", "1 to 20 printable"),
    ({"relay": {"a\x07": {"single": "A"}}}, r"[relay] 'a\x07' is no label", "1 to 20"),
    (WIRE | {"relay": {"on": {"delayed": "A"}}}, "on.delayed does not go with a sin", "single"),
    (WIRE | {"relay": {"on": {"single": "B"}}}, "[relay] on.single is 'B'", "an arm, 'A'"),
]


@pytest.mark.parametrize(("change", "what", "accepted"), WRONG)
def test_wrong_value(change, what, accepted):
    line = refusal(change)
    assert what in line
    if "place" not in what or "not within" not in line:
        assert "accepted: " in line
        line = line.split("accepted: ")[1]
    assert accepted in line


def test_numbers_of_any_size_are_told_shortly():
    line = refusal({"antenna.height_m": 10**900})
    assert "[antenna] height_m is a number of very many digits; accepted: 0.5 to 200 m" in line
    base = toml(changed())
    refusal_of_text(base.replace('"height_m" = 9.0', f'"height_m" = 0x{"f" * 900}'))
    assert "height_m is inf" in refusal_of_text(
        base.replace('"height_m" = 9.0', '"height_m" = 9e999')
    )


def test_eight_positions_are_accepted():
    relay = {f"p{i}": {"single": "A"} for i in range(8)}
    assert len(station({"relay": relay}).relay) == 8


def test_a_long_message_keeps_the_end_of_the_files_name():
    with pytest.raises(InputError) as caught:
        station_of(toml(changed(VEES, {"antenna.heigth_m": 9.0})), "x" * 300 + "/larch_hut.toml")
    assert re.match(r"\.\.\.x*/larch_hut\.toml: \[antenna\] heigth_m is unk", str(caught.value))
    assert len(str(caught.value)) <= 200


# What is no TOML, or no such file


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[station]\nname = Larch\n", ["line 2", "not TOML", "invalid value"]),
        ("[station]\nname = 'x'\n\nplace\n", ["line 4", "expected '=' after a key"]),
        ("[antenna]\nheight_m = 9,0\n", ["line 2", "not TOML"]),
        ("[antenna]\nheight_m = 9.0\nheight_m = 9.0\n", ["line 3", "not TOML"]),
        ("[feed]\n[antenna]\n[feed]\n", ["line 3", "not TOML"]),
        ("[station]\r\nname = 'x\r\n", ["line 2", "not TOML"]),
        ("[antenna]\narms = { A = 20.0,\n", ["line 2", "not TOML"]),
        ("[antenna\n", ["line 1", "not TOML"]),
        ("[relay]\nx = '''\n\n", ["line 2", "not TOML"]),
        ("a = \x00\n", ["line 1", "not TOML"]),
        ("a = '\x1b[2J'\n", ["line 1", "not TOML"]),
        ("[" + "a" * 900 + "]\n[" + "a" * 900 + "]\n", ["line 2", "not TOML", "..."]),
        ("a = " + "[" * 900, ["too deep"]),
        ("a = [\n" + "[\n" * 5000, ["too deep"]),
        ("# fine\na = " + "x" * 2000, ["line 2", "too long", "1000 signs"]),
        ("a" + ".a" * 500 + " = 1\n", ["line 1", "too long"]),
        ("a" + ".a" * 400 + " = 1\n", ["[a] is unknown"]),
        ("<html>", ["line 1", "not TOML"]),
        ("time_utc,fof2_mhz\n", ["line 1", "not TOML"]),
        ("", ["[station] is missing"]),
        ("# only a note\n", ["[station] is missing"]),
        ("[[station]]\n", ["[station] is an array"]),
        ("a = 1979-13-45\n", ["line 1", "not TOML"]),
    ],
)
def test_wrong_toml(text, words):
    line = refusal_of_text(text)
    for word in [*words, "accepted"]:
        assert word in line


def test_headers_and_dotted_keys_say_the_same():
    text = (
        'station.place = "46.5,11.35"\nground.class = "average"\nfeed.kind = "tee"\n[antenna]\n'
        'kind = "crossed-dipoles"\nheight_m = 9\nresonant_mhz = 5.3\n[antenna.arms]\nA = 20\n'
        'B = 110\n[relay]\nleft.delayed = "B"\n[relay.right]\ndelayed = "A"\n'
    )
    found = station_of(text, "hut.toml")
    assert [p.label for p in found.relay] == ["left", "right"]
    assert found.antenna == station().antenna


def written(tmp_path, content):
    file = tmp_path / "hut.toml"
    file.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return file


@pytest.mark.parametrize("head", [b"", b"\xef\xbb\xbf", b"# a note\r\n"])
def test_file_as_editors_write_it(tmp_path, head):
    text = LARCH.read_text(encoding="utf-8")
    for ending in ("\n", "\r\n"):
        content = head + text.replace("\n", ending).encode("utf-8")
        assert read_station(written(tmp_path, content)) == read_station(LARCH)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"\xff\xfe[\x00", "is not UTF-8 text; accepted: a TOML file of a station"),
        ("[station]\nname = 'Hütte'\n".encode("latin-1"), "is not UTF-8 text"),
        (b"#" * (LARGEST_STATION + 1), "is larger than 64 KiB; accepted: a TOML file"),
        (b"[station]\nplace = 7\n", "hut.toml: [station] place is 7; accepted: LAT,LON"),
    ],
)
def test_wrong_file(tmp_path, content, words):
    with pytest.raises(InputError) as caught:
        read_station(written(tmp_path, content))
    assert words in str(caught.value)
    assert "hut.toml" in str(caught.value)
    assert len(str(caught.value)) <= 200


def test_what_is_no_file(tmp_path):
    with pytest.raises(InputError, match="not a regular file; accepted: a TOML file of a station"):
        read_station(tmp_path)
    with pytest.raises(InputError, match="does not exist; accepted: a TOML file of a station"):
        read_station(tmp_path / "none.toml")
    with pytest.raises(InputError, match="none"):
        read_station("none\x00.toml")


# Whatever comes, a station or one line

PLAUSIBLE = st.sampled_from(
    [k.value for k in AntennaKind]
    + [k.value for k in FeedKind]
    + [*CLASSES, "A", "B", "46.5,11.35", "JN56qm", 0, 1, 5.3, 9.0, 13.4, 50, 120.0, True, False]
    + [{"A": 20.0}, {"A": 20.0, "B": 110.0}, {"delayed": "A"}, {"single": "B"}, {"x": {}}]
)
SIGNS = st.characters(exclude_categories=["Cs"])
SCALARS = st.one_of(
    st.booleans(),
    st.integers(),
    st.integers(min_value=-(10**60), max_value=10**60),
    st.floats(),
    st.text(SIGNS, max_size=90),
    st.dates(),
    st.times(),
    st.datetimes(timezones=st.sampled_from([None, UTC])),
)
VALUES = st.one_of(
    PLAUSIBLE,
    SCALARS,
    st.recursive(
        SCALARS,
        lambda inner: st.one_of(
            st.lists(inner, max_size=3),
            st.dictionaries(st.text(SIGNS, max_size=30), inner, max_size=3),
        ),
        max_leaves=4,
    ),
)
KEYS = st.one_of(
    st.sampled_from([(s, k) for s, k, *_ in ROWS]),
    st.tuples(st.sampled_from([*BASE]), st.text(SIGNS, max_size=30)),
    st.tuples(st.sampled_from(["relay"]), st.sampled_from(["left", "right", "wire_a"])),
    st.tuples(st.sampled_from([*BASE])),
    st.tuples(st.text(SIGNS, max_size=30)),
)


def station_or_one_line(text):
    try:
        found = station_of(text, "hut.toml")
    except InputError as error:
        line = str(error)
        assert line.startswith("hut.toml: ")
        assert line.isprintable()
        assert len(line) <= 200
        return
    assert isinstance(found, Station)
    names = [a.name for a in found.antenna.arms]
    assert len(names) == 1 + found.antenna.kind.is_crossed
    assert 1 <= len(found.relay) <= 8
    for position in found.relay:
        assert (position.delayed is None) != (position.single is None)
        assert (position.delayed or position.single) in names
    for value in (found.antenna.height, found.ground.conductivity, found.feed.leads):
        assert math.isfinite(value)


@settings(max_examples=400, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    base=st.sampled_from([{}, VEES, LOOPS, WIRE, ONE_VEE, HYBRID, BY_LEG, CONSTANTS, MEASURED]),
    changes=st.lists(st.tuples(KEYS, st.one_of(st.just(GONE), VALUES)), min_size=1, max_size=4),
)
def test_any_values_give_a_station_or_one_line(base, changes):
    document = changed(base)
    for path, value in changes:
        table = document
        for part in path[:-1]:
            table = table.setdefault(part, {})
            if not isinstance(table, dict):
                break
        else:
            if value is GONE:
                table.pop(path[-1], None)
            else:
                table[path[-1]] = value
    station_or_one_line(toml(document))


@settings(max_examples=300, deadline=None)
@given(
    noise=st.text(SIGNS | st.sampled_from('[]{}="\n.,#'), max_size=20),
    start=st.integers(0, 2000),
    length=st.integers(0, 30),
)
def test_any_text_gives_a_station_or_one_line(noise, start, length):
    text = LARCH.read_text(encoding="utf-8")
    start %= len(text)
    station_or_one_line(text[:start] + noise + text[start + length :])


# The page and the examples


def test_page_has_the_example_and_it_can_be_read():
    text = PAGE.split("```toml\n")[1].split("```")[0]
    found, larch = station_of(text, "hut.toml"), read_station(LARCH)
    assert found == larch


def test_page_has_the_words_and_the_classes():
    accepted = {f"{s}.{k}": re.findall(r"`([^`]+)`", row[1]) for s, k, *row in ROWS}
    assert accepted["antenna.kind"] == [k.value for k in AntennaKind]
    assert accepted["feed.kind"] == [k.value for k in FeedKind]
    assert accepted["ground.class"] == list(CLASSES)
    rows = re.findall(r"^\| ([\w-]+) \| ([\d.]+) \| ([\d.]+) \|$", PAGE, re.MULTILINE)
    told = {name: (float(eps), float(sigma)) for name, eps, sigma in rows}
    assert told == {n: (g.permittivity, g.conductivity) for n, g in CLASSES.items()}


def test_required_on_the_page():
    required = {f"{s}.{k}" for s, k, *row in ROWS if row[-1].startswith("required")}
    either = {"antenna.resonant_mhz", "ground.class", *CONSTANTS}  # one of two ways
    assert required == set(REQUIRED) - either


def test_larch_hut():
    found = read_station(LARCH)
    assert found.name == "Larch Hut"
    assert found.feed.kind is FeedKind.TEE
    assert (found.antenna.height, found.antenna.resonant_frequency) == (9.0, 5.3e6)
    assert (found.feed.leads, found.feed.loss_db_per_100m) == (0.15, 3.0)
    assert found.ground_name == "medium-dry"
    assert found.can_transmit


def test_larch_hut_explains_every_key():
    text = LARCH.read_text(encoding="utf-8")
    shown = set(re.findall(r"^(?:# )?(\w+) = ", text, re.MULTILINE))
    assert shown >= {k for _, k, *_ in ROWS}
    for path, (low, high, _) in NUMBERS.items():
        if path != "antenna.height_m":
            assert f"{low:g} to {high:g}" in text, path


def test_cedar_ridge():
    found = read_station(CEDAR)
    assert found.place.latitude_deg == -41.0
    assert found.antenna.kind is AntennaKind.CROSSED_VEES
    assert found.antenna.apex_angle == math.radians(120.0)
    assert found.feed.kind is FeedKind.COMBINER
    assert found.feed.feeder_length == 15.0
    assert found.ground_name == "permittivity 13, 0.005 S/m"
