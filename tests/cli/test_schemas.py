"""The JSON of the commands against the schemas that ship with the package.

The schemas are the contract: every key of it is required, a key that does not
apply is null, keys not known to it are admitted.
"""

import copy
import csv
import dataclasses
import io
import json
import re
from functools import cache
from importlib.resources import files
from pathlib import Path
from typing import get_args, get_origin, get_type_hints

import jsonschema
import numpy as np
import pytest

from magion.answers import records
from magion.answers.day import DayAnswer, answer_day
from magion.answers.feed import FeedAnswer, answer_feed
from magion.answers.inputs import IonosphereInput
from magion.answers.net import NetAnswer, answer_net
from magion.answers.path import answer_path
from magion.answers.pattern import AntennaAnswer, answer_antenna
from magion.answers.point import FieldAnswer, WaveAnswer
from magion.answers.relay import RelayAnswer, RelayPlan
from magion.answers.sense import SenseAnswer, answer_station
from magion.cli.arguments import INSTANT
from magion.formats.partners import read_partners
from magion.formats.profile import read_profile
from magion.formats.station import read_station
from magion.geometry import parse_place
from magion.render.data import plain, to_json
from tests.demo import DECEMBER, DEMO, EXAMPLES, JUNE, LARCH, SOUTH, said

pytestmark = pytest.mark.usefixtures("once")

FORMATS = Path(__file__).parents[2] / "docs" / "formats.md"
JUNE_NIGHT = "2026-06-21T00:00Z"
NEAR = ["46.50,11.35", "JN57rb"]
PROFILE = "<profile>"  # stands for a file, as the names of stations do
GAPS = "<gaps>"

PATHS = {
    "both waves": [*NEAR, "-f", "5.3", "--time", JUNE, "--fof2", "6.1", "--fof2-error", "0.4"],
    "one wave": [*NEAR, "-f", "6.5", "--time", JUNE, "--fof2", "6.1"],
    "no wave": [*NEAR, "-f", "28", "--time", JUNE, "--flux", "120"],
    "vertical": ["46.50,11.35", "46.50,11.35", "-f", "5.3", "--time", JUNE, "--sunspots", "80"],
    "southern": ["-34.0,151.0", "35.3S,149.1E", "-f", "7.1", "--time", "2026-06-21T12:00+10:00"],
    "several rays": ["15.0,0.0", "5.0,0.0", "-f", "10", "--time", JUNE, "--flux", "120"],
    "below the gyrofrequency": [*NEAR, "-f", "1.2", "--time", JUNE_NIGHT, "--flux", "120"],
    "measured profile": [*NEAR, "-f", "4.0", "--time", JUNE, "--profile", PROFILE],
    "demo station": [*DEMO, "--station", "<demo>"],
    "half-wave line": [*DEMO, "--station", "<half-wave line>"],
    "loops": [*DEMO, "--station", "<loops>"],
    "hybrid": [*DEMO, "--station", "<hybrid>"],
    "receive only": [*DEMO, "--station", "<receive only>"],
    "single dipole": [*DEMO, "--station", "<single dipole>"],
    "no wave at the station": [*NEAR, "-f", "28", *DEMO[4:], "--station", "<demo>"],
    "one wave at the station": [*NEAR, "-f", "7.4", *DEMO[4:], "--station", "<demo>"],
    "outside the impedance table": [*NEAR, "-f", "3.0", *DEMO[4:], "--station", "<demo>"],
    "southern station": [*SOUTH, "-f", "7.1", "--time", DECEMBER, "--station", "<southern>"],
    "station at the dip equator": [
        *["15.0,0.0", "5.0,0.0", "-f", "10", "--time", JUNE, "--flux", "120"],
        *["--station", "<loops>"],
    ],
}
DAY = [*DEMO[:2], "--step", "120", "--time", JUNE, "--flux", "130"]
DAYS = {
    "demo station": [*DAY, "-f", "5.3", "-f", "7.1", "--station", "<demo>"],
    "no station": [*DAY, "-f", "5.3", "-f", "7.1"],
    "loops": [*DAY, "-f", "5.3", "--station", "<loops>"],
    "no wave": [*DAY, "-f", "28", "--station", "<demo>"],
    "gaps in the readings": [*DAY[:4], "--time", "2026-12-21", "-f", "5.3", "--readings", GAPS],
}
NET = ["46.50,11.35", "--time", JUNE, "--flux", "130"]
NETS = {
    "demo station": [
        *["Larch Hut", "47.10,10.85", "46.90,12.20", "-f", "5.3", "-f", "3"],
        *[*NET[1:], "--station", "<demo>"],
    ],
    "no station": [*NET, "47.10,10.85", "46.90,12.20", "-f", "5.3", "-f", "3"],
    "no wave": [*NET, "47.10,10.85", "-f", "28"],
    "southern": ["41.0S,71.3W", "40.2S,71.6W", "-f", "7.1", "--time", DECEMBER],
    "whole day": [*NET, "47.10,10.85", "-f", "5.3", "--day"],
}
STATION = ["46.50,11.35", "-f", "1.2", "-f", "5.3"]
STATIONS = {
    "no time": [*STATION, "--elevation", "30"],
    "across HF": ["46.50,11.35", "--height", "120"],
    "demo station": [*STATION, "--time", JUNE, "--flux", "130", "--station", "<demo>"],
    "southern": ["Cedar Ridge", *STATION[1:], "--time", DECEMBER, "--station", "<southern>"],
    "loops at the dip equator": ["10.0,5.0", *STATION[1:], "--time", JUNE, "--station", "<loops>"],
    "measured profile": [*STATION, "--time", JUNE, "--profile", PROFILE],
    "magnetic pole": ["85.8,139.2", *STATION[1:]],
}
FEEDS = {
    "no station": ["-f", "5.3"],
    "demo station": ["-f", "5.3", "--station", "<demo>", "--band", "5.2:5.4:0.1"],
    "southern": ["-f", "7.1", "--station", "<southern>"],
    "half-wave line": ["-f", "5.3", "--station", "<half-wave line>"],
    "loops": ["-f", "5.3", "--station", "<loops>"],
    "hybrid": ["-f", "5.3", "--station", "<hybrid>"],
    "single dipole": ["-f", "5.3", "--station", "<single dipole>"],
    "outside the impedance table": ["-f", "14", "--station", "<demo>"],
    "leads longer than a quarter wave": ["-f", "60", "--station", "<long leads>"],
}
ANTENNAS = {
    "demo station": ["-f", "5.3", "--station", "<demo>"],
    "southern": ["-f", "7.1", "--station", "<southern>"],
    "half-wave line": ["-f", "5.3", "--station", "<half-wave line>"],
    "loops": ["-f", "1.85", "--station", "<loops>"],
    "hybrid": ["-f", "5.3", "--station", "<hybrid>"],
    "single dipole": ["-f", "5.3", "--station", "<single dipole>"],
    "along the ground": [
        *["-f", "5.3", "--station", "<demo>", "--elevation", "0:10:10", "--azimuth", "20"],
    ],
}
LOGS = ["--station", "<demo>", "--partners", str(EXAMPLES / "net_alps.csv")]
RELAYS = {
    "swapped": [
        *[str(EXAMPLES / "relay_swapped.csv"), *LOGS],
        *["--readings", str(EXAMPLES / "relay_readings.csv")],
    ],
    "ambiguous": [str(EXAMPLES / "relay_ambiguous.csv"), *LOGS, "--flux", "120"],
}
TEST = ["--plan", *DEMO[:2], "-f", "5.3", "--time", "2026-12-21"]
PLANS = {
    "telling": [*TEST, "--readings", str(EXAMPLES / "relay_readings.csv"), "--station", "<demo>"],
    "not telling": ["--plan", *DEMO[:2], "-f", "28", "--time", JUNE],
}
FIELDS = {
    "mid latitude": ["46.50,11.35", "--height", "100", "--date", "2026-06-21"],
    "southern": ["-34.0,151.0", "--date", "1955-01-01"],
    "pole": ["90,0", "--height", "0", "--date", "2026-06-21"],
}
WAVES = {
    "ordinary case": ["-f", "5.3", "--plasma", "3.7", "--gyro", "1.2", "--angle", "25"],
    "along the field": ["-f", "5.3", "--plasma", "3.7", "--gyro", "1.2", "--angle", "180"],
    "across the field": ["-f", "5.3", "--plasma", "6.0", "--gyro", "1.2", "--angle", "90"],
    "collisions": [
        *["-f", "1.85", "--plasma", "1", "--gyro", "1.4", "--angle", "115"],
        *["--collisions", "1e6"],
    ],
    "resonance": ["-f", "1", "--plasma", "0.6", "--gyro", "0.8", "--angle", "90"],
    "no plasma": ["-f", "5.3", "--plasma", "0", "--gyro", "0", "--angle", "0"],
}
ALL = {
    "path": PATHS,
    "day": DAYS,
    "net": NETS,
    "station": STATIONS,
    "feed": FEEDS,
    "antenna": ANTENNAS,
    "relay": RELAYS,
    "relay-plan": PLANS,
    "field": FIELDS,
    "wave": WAVES,
}
NUMBER = {c: c if c in ("field", "wave") else f"{c}-1" for c in ALL}
CASES = [(command, case) for command, cases in ALL.items() for case in cases]
ROOTS = {
    "path": records.PathAnswer,
    "day": DayAnswer,
    "net": NetAnswer,
    "station": SenseAnswer,
    "feed": FeedAnswer,
    "antenna": AntennaAnswer,
    "relay": RelayAnswer,
    "relay-plan": RelayPlan,
    "field": FieldAnswer,
    "wave": WaveAnswer,
}


def refuse(constant):
    raise AssertionError(f"{constant} is not JSON")


@pytest.fixture(scope="module")
def answer(tmp_path_factory, stations):
    """The JSON answer of a case, asked for once."""
    folder = tmp_path_factory.mktemp("files")
    profile = folder / "chapman.csv"
    height_km = np.arange(90.0, 451.0, 5.0)
    z = (height_km - 270.0) / 45.0
    density = 4e11 * np.exp(0.5 * (1.0 - z - np.exp(-z)))
    rows = [f"{h:g},{n:.6g}" for h, n in zip(height_km, density, strict=True)]
    profile.write_text("\n".join(["height_km,electron_density_m3", *rows]), encoding="utf-8")
    gaps = folder / "gaps.csv"
    gaps.write_text("time_utc,fof2_mhz\n2026-12-21T08:00Z,6.5\n2026-12-21T10:00Z,7.2\n")
    known = {f"<{name}>": file for name, file in stations.items()}
    known |= {PROFILE: profile, GAPS: gaps}

    @cache
    def ask(command, case, form="json"):
        words = [str(known.get(w, w)) for w in ALL[command][case]]
        out = said(command.removesuffix("-plan"), *words, "--format", form)
        return json.loads(out, parse_constant=refuse) if form == "json" else out

    return lambda *case, **how: copy.deepcopy(ask(*case, **how))


@cache
def schema(command):
    text = files("magion").joinpath("schemas", f"{NUMBER[command]}.json").read_text("utf-8")
    return json.loads(text)


def validator(command):
    return jsonschema.Draft202012Validator(schema(command))


def follow(part, root):
    """The object that a reference, or the first choice of a nullable part, stands for."""
    if "oneOf" in part:
        part = part["oneOf"][0]
    while "$ref" in part:
        found = root
        for name in part["$ref"].removeprefix("#/").split("/"):
            found = found[name]
        part = found
    return part


def keys_of(part, root):
    """Key to subschema of an object, with what it takes over from others."""
    part = follow(part, root)
    found = {}
    for other in part.get("allOf", ()):
        found |= keys_of(other, root)
    return found | part.get("properties", {})


def required_of(part, root):
    """Keys that an object must have, with what it takes over from others."""
    part = follow(part, root)
    found = set(part.get("required", ()))
    return found.union(*(required_of(other, root) for other in part.get("allOf", ())))


def objects(part, root, name=""):
    """Every object of a schema with a dotted name; of a list, its first kind of item."""
    part = follow(part, root)
    yield name, part
    for key, inner in keys_of(part, root).items():
        inner, full = follow(inner, root), f"{name}.{key}".lstrip(".")
        if inner.get("type") == "array":
            inner = follow((inner.get("prefixItems") or [inner["items"]])[0], root)
            full += "[]"
        if keys_of(inner, root):
            yield from objects(inner, root, full)


@pytest.mark.parametrize("command", NUMBER)
def test_schema_is_one(command):
    jsonschema.Draft202012Validator.check_schema(schema(command))
    assert schema(command)["$schema"] == "https://json-schema.org/draft/2020-12/schema"


@pytest.mark.parametrize("command", NUMBER)
def test_every_key_of_a_schema_is_required_and_unknown_ones_are_admitted(command):
    root = schema(command)
    for _, part in objects(root, root):
        assert part.get("additionalProperties", True) is True
        assert required_of(part, root) == set(keys_of(part, root))


@pytest.mark.parametrize(("command", "case"), CASES)
def test_answer_meets_its_schema(answer, command, case):
    validator(command).validate(answer(command, case))


@pytest.mark.parametrize("number", [float("nan"), float("inf"), -float("inf")])
def test_what_is_not_a_number_becomes_null(number):
    record = records.Midpoint(latitude_deg=number, longitude_deg=1.5)
    found = json.loads(to_json(record), parse_constant=refuse)
    assert found == {"latitude_deg": None, "longitude_deg": 1.5}


@pytest.mark.parametrize("command", NUMBER)
def test_unknown_keys_are_admitted(answer, command):
    found = answer(*next(c for c in CASES if c[0] == command))
    for part in [found, *(v for v in found.values() if isinstance(v, dict))]:
        part["some_later_key"] = {"a": [1, None]}
    validator(command).validate(found)


def places_in(value, where=()):
    """Every dictionary within a value with its place."""
    if isinstance(value, dict):
        yield where, value
        for key, inner in value.items():
            yield from places_in(inner, (*where, key))
    elif isinstance(value, list):
        for i, inner in enumerate(value):
            yield from places_in(inner, (*where, i))


@pytest.mark.parametrize(
    ("command", "case"),
    [
        ("path", "several rays"),
        ("path", "demo station"),
        ("day", "gaps in the readings"),
        ("net", "demo station"),
        ("station", "no time"),
        ("feed", "demo station"),
        ("antenna", "along the ground"),
        ("field", "mid latitude"),
        ("wave", "ordinary case"),
    ],
)
def test_any_key_left_out_is_noticed(answer, command, case):
    found, check, tried = answer(command, case), validator(command), 0
    # Of a long list of alike objects two are enough.
    for cells in (part["cells"] for _, part in list(places_in(found)) if "cells" in part):
        del cells[2:]
    for where, part in places_in(found):
        for key in list(part):
            value = part.pop(key)
            assert not check.is_valid(found), f"{key} is missing at {where} and nothing says so"
            part[key] = value
            tried += 1
    check.validate(found)
    fewest = {"path": 100, "day": 30, "net": 40, "station": 80, "feed": 60, "antenna": 25}
    assert tried > (fewest | {"field": 11, "wave": 17})[command]


WRONG = [
    (("schema",), "magion/path/2"),
    (("waves", 0, "wave"), "extraordinary"),
    (("waves", 0, "receive_hand"), "right"),
    (("waves", 0, "receive_hand"), None),  # it arrives, so it has a hand
    (("waves", 0, "limiting"), None),
    (("waves", 0, "reason"), "no reason"),
    (("waves", 0, "arrives"), False),  # then there must be a reason
    (("waves", 0, "shape"), "round"),
    (("waves", 0, "hops"), 1.5),
    (("waves", 0, "axial_ratio_db"), 61.0),
    (("waves", 0, "major_axis_bearing_deg"), 181.0),
    (("waves", 0, "launch", "hand"), None),
    (("waves", 0, "limiting", "field_angle_deg"), -1.0),
    (("advice", "state"), "one"),
    (("advice", "confidence"), "certain"),
    (("advice", "caveats"), None),
    (("advice", "state_probabilities"), {"both": 1.0}),
    (("frequency_mhz",), "5.3"),
    (("time_utc",), "2026-06-21 12:00"),
    (("path", "midpoint"), None),
    (("field", "dip_deg"), None),
]
WRONG = [("path", "both waves", *wrong) for wrong in WRONG] + [
    ("path", "demo station", ("antenna", "wave"), None),
    ("path", "demo station", ("antenna", "has_hand"), "yes"),
    ("path", "demo station", ("antenna", "causes", 0, "cause"), "bad luck"),
    ("path", "demo station", ("antenna", "network", "swr"), 0.9),
    ("path", "demo station", ("antenna", "positions"), []),
    ("path", "demo station", ("antenna", "positions", 0, "ordinary_share"), 1.1),
    ("path", "demo station", ("antenna", "positions", 0, "overhead_hand"), "left"),
    ("day", "demo station", ("time_utc", 0), "00:00"),
    ("day", "demo station", ("frequencies", 0, "state", 0), "some"),
    ("day", "demo station", ("frequencies", 0, "probability"), []),
    ("day", "demo station", ("frequencies", 0, "elevation_deg"), [[], [], []]),
    ("day", "demo station", ("frequencies", 0, "plan"), []),
    ("day", "demo station", ("frequencies", 0, "receive", 0), ""),
    ("net", "demo station", ("partners",), []),
    ("net", "demo station", ("hours", 0, "cells", 0, "state"), "unknown"),
    ("net", "demo station", ("hours", 0, "frequencies", 0, "reached"), 1.5),
    ("net", "demo station", ("hours", 0, "cells", 0, "served_by"), None),
    ("station", "demo station", ("rows", 0, "overhead"), None),
    ("station", "demo station", ("rows", 0, "cells", 0, "shape"), "round"),
    ("station", "demo station", ("rows", 0, "cells", 0, "ordinary_hand"), None),
    ("station", "demo station", ("date",), "21.6.2026"),
    ("feed", "demo station", ("band",), []),
    ("feed", "demo station", ("cautions",), []),
    ("feed", "demo station", ("line", "cut_ft"), None),
    ("feed", "demo station", ("positions", 0, "rejection_db"), -1.0),
    ("antenna", "demo station", ("positions", 0, "right_dbi"), []),
    ("antenna", "demo station", ("positions", 0, "right_dbi", 0, 0), None),
    ("antenna", "demo station", ("elevation_deg", 0), 91.0),
]


@pytest.mark.parametrize(("command", "case", "where", "value"), WRONG)
def test_wrong_values_are_noticed(answer, command, case, where, value):
    found = answer(command, case)
    part = found
    for step in where[:-1]:
        part = part[step]
    assert part[where[-1]] != value
    part[where[-1]] = value
    assert not validator(command).is_valid(found)


def test_waves_are_two_and_in_order(answer):
    found = answer("path", "both waves")
    for waves in (found["waves"][::-1], found["waves"][:1], found["waves"] * 2):
        assert not validator("path").is_valid(found | {"waves": waves})


def test_parts_that_may_be_filled_later(answer):
    found = answer("path", "both waves")
    for wave in found["waves"]:
        wave |= {"absorption_db": 3.2, "level_db": -4.0, "muf_mhz": 6.4, "margin_mhz": 1.1}
    found["advice"] |= {
        "state_probabilities": {
            "both": 0.7,
            "ordinary_only": 0.0,
            "extraordinary_only": 0.2,
            "none": 0.1,
        },
        "relay_position": "left",
        "transmit_relay_position": "right",
        "rejection_db": {"ordinary": 23.0, "extraordinary": None},
        "separation_db": 26.0,
        "limited_by": "arrival angle",
        "confidence": "cannot_tell",
    }
    validator("path").validate(found)
    # A wave that is absorbed keeps what is known of its ray.
    lost = {"arrives": False, "reason": "absorbed by 71 dB", "absorption_db": 71.0}
    found["waves"][1] |= lost
    validator("path").validate(found)


def test_what_each_case_is_for(answer):
    def arrivals(case):
        return [w["arrives"] for w in answer("path", case)["waves"]]

    assert arrivals("both waves") == [True, True]
    assert arrivals("one wave") == [False, True]
    assert arrivals("no wave") == [False, False]
    assert answer("path", "no wave")["advice"]["wave"] is None
    assert answer("path", "vertical")["path"]["bearing_deg"] is None
    assert answer("path", "southern")["field"]["dip_deg"] < -50.0
    assert answer("path", "southern")["time_utc"] == "2026-06-21T02:00:00Z"
    assert answer("path", "several rays")["waves"][0]["rays"]
    assert "gyrofrequency" in answer("path", "below the gyrofrequency")["waves"][1]["reason"]
    assert "chapman.csv" in answer("path", "measured profile")["ionosphere"]["source"]
    assert answer("wave", "across the field")["extraordinary"]["rho_im"] is None
    assert answer("wave", "across the field")["extraordinary"]["axial_ratio_db"] is None
    assert answer("wave", "resonance")["extraordinary"]["mu"] is None or (
        answer("wave", "resonance")["extraordinary"]["mu"] > 1e3
    )


@pytest.mark.parametrize("case", ["both waves", "southern", "several rays"])
def test_azimuths_of_launch_and_arrival_look_along_the_path(answer, case):
    """Both point away from their own end; a steep ray may swing aside, but not turn round."""

    def turn(one, other):
        return abs((one - other + 180.0) % 360.0 - 180.0)

    found = answer("path", case)
    for wave in found["waves"]:
        for ray in [wave, *wave["rays"]]:
            assert turn(ray["launch"]["azimuth_deg"], found["path"]["bearing_deg"]) < 60.0
            assert turn(ray["arrival"]["azimuth_deg"], found["path"]["back_bearing_deg"]) < 60.0


@pytest.mark.parametrize("case", [c for c in PATHS if not c.startswith("no wave")])
def test_hands_for_sending_back(answer, case):
    """On the reversed path always the opposite hand, whatever the far station launches."""
    found = answer("path", case)
    opposite = {"RHCP": "LHCP", "LHCP": "RHCP"}
    for wave in found["waves"]:
        for ray in [wave, *wave["rays"]]:
            if ray["arrives"]:
                assert ray["transmit_hand"] == opposite[ray["receive_hand"]]
                # IEC 60050-705, 705-07-40: the X wave is right-hand about an acute angle.
                acute = ray["limiting"]["field_angle_deg"] < 90.0
                right = acute == (ray["wave"] == "extraordinary")
                assert ray["receive_hand"] == ("RHCP" if right else "LHCP")
    taken = [w for w in found["waves"] if w["wave"] == found["advice"]["wave"]]
    for key in ("receive_hand", "transmit_hand"):
        assert found["advice"][key] == taken[0][key]


def test_the_hand_at_launch_is_an_answer_of_its_own(answer):
    """Southward to the dip equator the O wave is launched and arrives with one hand."""
    for wave in answer("path", "both waves")["waves"]:  # steep: as it would be sent back
        assert wave["launch"]["hand"] == wave["transmit_hand"] != wave["receive_hand"]
    ordinary = answer("path", "several rays")["waves"][0]
    assert ordinary["launch"]["hand"] == ordinary["receive_hand"] == "RHCP"
    assert ordinary["transmit_hand"] == "LHCP"


def record_in(hint):
    """The record within a type, if there is one, and whether it stands in a tuple."""
    if dataclasses.is_dataclass(hint):
        return hint, False
    for inner in get_args(hint):
        record, listed = record_in(inner)
        if record is not None:
            return record, listed or get_origin(hint) is tuple
    return None, False


def records_of(kind, name=""):
    """Dotted name to keys, of a record and of those within it."""
    found = {name: {f.name for f in dataclasses.fields(kind)}}
    for key, hint in get_type_hints(kind).items():
        record, listed = record_in(hint)
        if record is not None:
            found |= records_of(record, f"{name}.{key}".lstrip(".") + ("[]" if listed else ""))
    return found


@pytest.mark.parametrize("command", NUMBER)
def test_records_have_the_keys_of_the_contract_and_no_others(command):
    root = schema(command)
    assert records_of(ROOTS[command]) == {n: set(keys_of(p, root)) for n, p in objects(root, root)}


UNIT = re.compile(r"\[([^\]]+)\]$")


def units_of_schema(command):
    """Dotted key to unit, or None, of everything in a schema."""
    root = schema(command)
    return {
        f"{name}.{key}".lstrip("."): (UNIT.findall(inner.get("description", "")) or [None])[0]
        for name, part in objects(root, root)
        if not name.startswith("waves[].rays")
        for key, inner in keys_of(part, root).items()
    }


@pytest.mark.parametrize("command", NUMBER)
def test_numbers_of_a_schema_carry_their_unit(command):
    suffixes = {
        "deg": "deg",
        "km": "km",
        "mhz": "MHz",
        "db": "dB",
        "nt": "nT",
        "ms": "ms",
        "hz": "Hz",
        "min": "min",
        "m": "m",
        "ft": "ft",
        "ohm": "ohm",
        "dbi": "dB",
    }
    root = schema(command)
    for _, part in objects(root, root):
        for key, inner in keys_of(part, root).items():
            while inner.get("type") == "array":
                described = inner["description"]
                inner = inner.get("items", {}) | {"description": described}
            kinds = inner.get("type")
            if "number" not in ([kinds] if isinstance(kinds, str) else kinds or []):
                continue
            found = UNIT.findall(inner["description"])
            assert found, f"{key} has no unit"
            if (tail := key.rpartition("_")[2]) in suffixes:
                assert found == [suffixes[tail]], key


@pytest.mark.parametrize("command", NUMBER)
def test_page_of_formats_has_every_key_with_its_unit(command):
    text = FORMATS.read_text(encoding="utf-8")
    name = command.replace("-plan", " --plan")
    section = text.split(f"## JSON of `magion {name}`")[1].split("\n## ")[0]
    rows = {}
    for line in section.splitlines():
        cells = [c.strip() for c in line.strip("|").split("|")]
        if line.startswith("| `"):
            for key in re.findall(r"`([^`]+)`", cells[0]):
                rows[key] = None if cells[2] == "" else cells[2]
    # One table stands for parts that are alike.
    alike = {"wave": "extraordinary.", "path": "antenna.arms[].", "station": "rows[].overhead."}
    wanted = {
        k: u
        for k, u in units_of_schema(command).items()
        if not k.startswith(alike.get(command, "-"))
    }
    assert rows == wanted


def test_example_of_a_profile_can_be_read(tmp_path):
    section = FORMATS.read_text(encoding="utf-8").split("## Profile")[1].split("\n## ")[0]
    file = tmp_path / "profile.csv"
    file.write_text(section.split("```")[1].lstrip("\n"), encoding="utf-8")
    density, height = read_profile(file).peak()
    assert abs(height - 250e3) < 500.0
    assert abs(density / 4e11 - 1.0) < 0.01


def test_csv_of_a_path_has_one_row_a_ray_under_dotted_keys(answer):
    found = answer("path", "several rays")
    table = list(csv.DictReader(io.StringIO(answer("path", "several rays", form="csv"))))
    rays = [r for w in found["waves"] for r in [w, *w["rays"]]]
    assert len(table) == len(rays)
    for row, ray in zip(table, rays, strict=True):
        assert row["arrives"] == "true"
        for key, value in ray.items():
            if isinstance(value, float):
                assert float(row[key]) == value
            elif isinstance(value, str) or value is None:
                assert row.get(key, "") == (value or "")
        for part in ("launch", "arrival", "index", "limiting"):
            for key, value in ray[part].items():
                assert row[f"{part}.{key}"] == ("" if value is None else str(value))
        midpoint = found["path"]["midpoint"]["latitude_deg"]
        assert float(row["path.midpoint.latitude_deg"]) == midpoint
        assert row["advice.headline"] == found["advice"]["headline"]


@pytest.mark.parametrize(("command", "case"), [("field", "southern"), ("wave", "collisions")])
def test_csv_of_a_point_is_one_row(answer, command, case):
    found = answer(command, case)
    (row,) = csv.DictReader(io.StringIO(answer(command, case, form="csv")))
    for key, cell in row.items():
        value = found
        for step in key.split("."):
            value = value[step]
        assert cell == str(value) if isinstance(value, str) else float(cell) == value


def table_of(answer, command, case):
    return list(csv.DictReader(io.StringIO(answer(command, case, form="csv"))))


def cell_of(value):
    """A value as a cell of CSV."""
    if isinstance(value, bool):
        return str(value).lower()
    return "" if value is None else str(value)


def dotted(part, prefix=""):
    """What a cell can hold of an object, under dotted keys."""
    found = {}
    for key, value in part.items():
        if isinstance(value, dict):
            found |= dotted(value, f"{prefix}{key}.")
        elif not isinstance(value, list):
            found[f"{prefix}{key}"] = cell_of(value)
    return found


@pytest.mark.parametrize("case", ["demo station", "outside the impedance table", "single dipole"])
def test_csv_of_a_path_has_the_columns_of_the_antenna(answer, case):
    found = answer("path", case)
    named = {
        f"antenna.{f.name}"
        for f in dataclasses.fields(records.AntennaOnPath)
        if f.name not in ("causes", "network", "positions", "arms")
    }
    named |= {f"antenna.network.{k}" for k in ("path_deg", "phase_deg", "amplitude_db", "swr")}
    known = {} if found["antenna"] is None else dotted(found["antenna"], "antenna.")
    for row in table_of(answer, "path", case):
        assert named <= set(row)
        assert {k: row[k] for k in named} == {k: known.get(k, "") for k in named}
        assert row["advice.relay_position"] == cell_of(found["advice"]["relay_position"])


@pytest.mark.parametrize("case", FEEDS)
def test_csv_of_a_feed_has_a_row_a_frequency(answer, case):
    assert table_of(answer, "feed", case) == [dotted(r) for r in answer("feed", case)["band"]]


@pytest.mark.parametrize("case", ["demo station", "along the ground"])
def test_csv_of_an_antenna_has_a_row_a_position_and_direction(answer, case):
    found, table = answer("antenna", case), table_of(answer, "antenna", case)
    elevations, azimuths = found["elevation_deg"], found["azimuth_deg"]
    gains = ("right_dbi", "left_dbi", "right_over_left_db")
    assert table == [
        {"label": p["label"], "elevation_deg": str(e), "azimuth_deg": str(a)}
        | {g: str(p[g][i][j]) for g in gains}
        for p in found["positions"]
        for i, e in enumerate(elevations)
        for j, a in enumerate(azimuths)
    ]


@pytest.mark.parametrize("case", ["measured profile", "demo station"])
def test_csv_of_a_station_has_a_row_a_frequency_and_direction(answer, case):
    found, table = answer("station", case), table_of(answer, "station", case)
    wanted = []
    for row in found["rows"]:
        own = dotted({k: v for k, v in row.items() if k not in ("cells", "overhead")})
        wanted += [own | dotted(cell) for cell in (row["overhead"], *row["cells"])]
    assert {"state_probabilities.both", "state_probabilities.none"} <= set(table[0])
    for row, want in zip(table, wanted, strict=True):
        assert {k: row.get(k, "") for k in want} == want


@pytest.mark.parametrize("case", ["demo station", "no station", "gaps in the readings"])
def test_csv_of_a_day_has_a_row_a_step_and_frequency(answer, case):
    found, table = answer("day", case), table_of(answer, "day", case)
    n = len(found["time_utc"])
    assert len(table) == n * len(found["frequencies"])
    for k, frequency in enumerate(found["frequencies"]):
        for i in range(n):
            row = dict(table[k * n + i])
            assert float(row.pop("frequency_mhz")) == frequency["frequency_mhz"]
            for key in ("time_utc", "solar_zenith_deg", "fof2_mhz", "fxf2_mhz", "fof2_error_mhz"):
                assert row.pop(key) == cell_of(found[key][i])
            for key in ("state", "wave", "receive", "transmit", "rejection_db"):
                assert row.pop(key) == cell_of(frequency[key][i])
            for w, wave in enumerate(("ordinary", "extraordinary")):
                assert row.pop(f"{wave}.muf_mhz") == cell_of(found["muf_mhz"][w][i])
                for key in (
                    *("receive_hand", "elevation_deg", "azimuth_deg", "group_delay_ms"),
                    *("absorption_db", "level_db", "axial_ratio_db"),
                ):
                    assert row.pop(f"{wave}.{key}") == cell_of(frequency[key][w][i])
            assert not row


@pytest.mark.parametrize("case", ["demo station", "no wave", "whole day"])
def test_csv_of_a_net_has_a_row_a_partner_frequency_and_hour(answer, case):
    found, table = answer("net", case), table_of(answer, "net", case)
    places = {p["name"]: dotted(p) for p in found["partners"]}
    wanted = [
        {"time_utc": hour["time_utc"], "served_by": " ".join(cell["served_by"])}
        | dotted(cell)
        | {k: v for k, v in places[cell["partner"]].items() if k != "name"}
        for hour in found["hours"]
        for cell in hour["cells"]
    ]
    assert table == wanted


def test_numbers_are_those_of_the_records(answer):
    """Unrounded: the JSON says what the call of the library says."""
    larch, noon = read_station(LARCH), INSTANT.convert(JUNE, None, None)
    home, partner = parse_place("46.50,11.35"), parse_place("47.10,10.85")
    sky = IonosphereInput(flux=130.0)
    calls = {
        "path": lambda: answer_path(partner, home, 5.3, noon, sky, station=larch),
        "day": lambda: answer_day(
            partner,
            home,
            [5.3, 7.1],
            noon,
            sky,
            step_min=120.0,
            station=larch,
        ),
        "net": lambda: answer_net(
            larch.place,
            [partner, parse_place("46.90,12.20")],
            [5.3, 3.0],
            noon,
            sky,
            station=larch,
        ),
        "station": lambda: answer_station(home, [1.2, 5.3], noon, sky, station=larch),
        "feed": lambda: answer_feed(5.3, larch, [5.2, 5.3, 5.4]),
        "antenna": lambda: answer_antenna(larch, 5.3),
    }
    for command, call in calls.items():
        assert answer(command, "demo station") == plain(call()), command


def test_what_the_cases_with_a_station_are_for(answer):
    def advice(case):
        return answer("path", case)["advice"]

    demo = answer("path", "demo station")
    assert demo["advice"]["relay_position"] == "left"
    first = demo["antenna"]["causes"][0]["cause"]
    assert demo["advice"]["limited_by"] == demo["antenna"]["limited_by"] == first
    assert {p["label"] for p in demo["antenna"]["positions"]} == {"left", "right", "wire_a"}
    assert answer("path", "half-wave line")["antenna"]["has_hand"] is False
    assert advice("half-wave line")["headline"].startswith("No hand at all")
    assert advice("half-wave line")["limited_by"] is None
    for case in ("loops", "receive only", "station at the dip equator"):
        antenna = answer("path", case)["antenna"]
        assert antenna["transmit_position"] is antenna["both_ends_db"] is None
        assert all(p["ordinary_sent_dbi"] is None for p in antenna["positions"])
    assert answer("path", "single dipole")["antenna"]["causes"] == []
    assert answer("path", "single dipole")["antenna"]["network"]["phase_deg"] is None
    assert answer("path", "hybrid")["antenna"]["network"]["path_deg"] is None
    for case in ("no wave at the station", "outside the impedance table"):
        assert answer("path", case)["antenna"] is None
        assert advice(case)["relay_position"] is advice(case)["rejection_db"] is None
    assert advice("outside the impedance table")["state"] != "none"
    assert advice("one wave at the station")["state"] == "extraordinary_only"
    assert advice("one wave at the station")["separation_db"] is None
    assert answer("path", "one wave at the station")["antenna"]["fade_depth_after_db"] is None
    assert answer("path", "southern station")["field"]["dip_deg"] < 0.0
    assert abs(answer("path", "station at the dip equator")["field"]["dip_deg"]) < 20.0


def test_what_the_other_cases_are_for(answer):
    gaps = answer("day", "gaps in the readings")["frequencies"][0]
    assert {"unknown"} < set(gaps["state"])
    assert answer("day", "no wave")["frequencies"][0]["state"] == ["none"] * 12
    assert answer("day", "loops")["frequencies"][0]["transmit"] == [None] * 12
    assert set(answer("day", "demo station")["frequencies"][0]["receive"]) == {"left", "right"}
    assert set(answer("day", "no station")["frequencies"][0]["receive"]) == {"LHCP", "RHCP"}
    assert answer("net", "no wave")["hours"][0]["best_frequency_mhz"] is None
    assert len(answer("net", "whole day")["hours"]) == 24
    assert answer("net", "southern")["hours"][0]["cells"][0]["receive"] == "RHCP"
    assert answer("station", "no time")["rows"][0]["absorption_ratio"] is None
    assert answer("station", "no time")["height_km"] == 90.0
    assert answer("station", "demo station")["height_km"] is None
    assert answer("station", "southern")["name"] == "Cedar Ridge"
    assert answer("feed", "half-wave line")["has_hand"] is False
    assert answer("feed", "hybrid")["line"] is None
    assert answer("feed", "single dipole")["headline"].startswith("One element alone")
    assert answer("feed", "outside the impedance table")["positions"][0]["rejection_db"] is None
    assert answer("feed", "leads longer than a quarter wave")["line"]["dip_mhz"] is None
    assert answer("antenna", "along the ground")["positions"][0]["right_dbi"][0] == [-300.0]


def test_example_of_partners_can_be_read(tmp_path):
    section = FORMATS.read_text(encoding="utf-8").split("## Partners")[1].split("\n## ")[0]
    file = tmp_path / "net.csv"
    file.write_text(section.split("```")[1].lstrip("\n"), encoding="utf-8")
    assert [p.name for p in read_partners(file)] == ["Scree Hut", "Marmot Hut", "Gentian Hut"]
    for name in ("net_alps.csv", "net_andes.csv"):
        assert len(read_partners(EXAMPLES / name)) >= 4
