"""The JSON of `path`, `field` and `wave` against the schemas that ship with the package.

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

import jsonschema
import numpy as np
import pytest
from click.testing import CliRunner

from magion.answers import records
from magion.answers.point import FieldAnswer, OneWave, WaveAnswer
from magion.cli import main
from magion.formats.profile import read_profile
from magion.render.data import to_json

FORMATS = Path(__file__).parents[2] / "docs" / "formats.md"
JUNE, JUNE_NIGHT = "2026-06-21T12:00Z", "2026-06-21T00:00Z"
NEAR = ["46.50,11.35", "JN57rb"]
PROFILE = "<profile>"  # stands for the file that a test writes

PATHS = {
    "both waves": [*NEAR, "-f", "5.3", "--time", JUNE, "--fof2", "6.1", "--fof2-error", "0.4"],
    "one wave": [*NEAR, "-f", "6.5", "--time", JUNE, "--fof2", "6.1"],
    "no wave": [*NEAR, "-f", "28", "--time", JUNE, "--flux", "120"],
    "vertical": ["46.50,11.35", "46.50,11.35", "-f", "5.3", "--time", JUNE, "--sunspots", "80"],
    "southern": ["-34.0,151.0", "35.3S,149.1E", "-f", "7.1", "--time", "2026-06-21T12:00+10:00"],
    "several rays": ["15.0,0.0", "5.0,0.0", "-f", "10", "--time", JUNE, "--flux", "120"],
    "below the gyrofrequency": [*NEAR, "-f", "1.2", "--time", JUNE_NIGHT, "--flux", "120"],
    "measured profile": [*NEAR, "-f", "4.0", "--time", JUNE, "--profile", PROFILE],
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
NUMBER = {"path": "path-1", "field": "field", "wave": "wave"}
CASES = [("path", c) for c in PATHS] + [("field", c) for c in FIELDS] + [("wave", c) for c in WAVES]


def refuse(constant):
    raise AssertionError(f"{constant} is not JSON")


@pytest.fixture(scope="module")
def answer(tmp_path_factory):
    """The JSON answer of a case, asked for once."""
    profile = tmp_path_factory.mktemp("profile") / "chapman.csv"
    height_km = np.arange(90.0, 451.0, 5.0)
    z = (height_km - 270.0) / 45.0
    density = 4e11 * np.exp(0.5 * (1.0 - z - np.exp(-z)))
    rows = [f"{h:g},{n:.6g}" for h, n in zip(height_km, density, strict=True)]
    profile.write_text("\n".join(["height_km,electron_density_m3", *rows]), encoding="utf-8")

    @cache
    def ask(command, case, form="json"):
        words = {"path": PATHS, "field": FIELDS, "wave": WAVES}[command][case]
        words = [str(profile) if w == PROFILE else w for w in words]
        result = CliRunner().invoke(main, [command, *words, "--format", form])
        assert result.exit_code == 0, result.output
        assert result.stderr == ""
        return json.loads(result.stdout, parse_constant=refuse) if form == "json" else result.stdout

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
        inner = follow(inner, root)
        if inner.get("type") == "array":
            inner = follow((inner.get("prefixItems") or [inner["items"]])[0], root)
        if keys_of(inner, root):
            yield from objects(inner, root, f"{name}.{key}".lstrip("."))


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
    [("path", "several rays"), ("field", "mid latitude"), ("wave", "ordinary case")],
)
def test_any_key_left_out_is_noticed(answer, command, case):
    found, check, tried = answer(command, case), validator(command), 0
    for where, part in places_in(found):
        for key in list(part):
            value = part.pop(key)
            errors = [e.message for e in check.iter_errors(found)]
            assert errors, f"{key} is missing at {where} and nothing says so"
            part[key] = value
            tried += 1
    check.validate(found)
    assert tried > {"path": 100, "field": 11, "wave": 17}[command]


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


@pytest.mark.parametrize(("where", "value"), WRONG)
def test_wrong_values_are_noticed(answer, where, value):
    found = answer("path", "both waves")
    part = found
    for step in where[:-1]:
        part = part[step]
    part[where[-1]] = value
    assert not validator("path").is_valid(found)


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


@pytest.mark.parametrize("case", [c for c in PATHS if c != "no wave"])
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


RECORDS = {
    ("path", ""): records.PathAnswer,
    ("path", "transmitter"): records.End,
    ("path", "receiver"): records.End,
    ("path", "path"): records.PathGeometry,
    ("path", "path.midpoint"): records.Midpoint,
    ("path", "field"): records.MidpointField,
    ("path", "ionosphere"): records.MidpointIonosphere,
    ("path", "waves"): records.WaveOnPath,
    ("path", "waves.launch"): records.Launch,
    ("path", "waves.arrival"): records.Arrival,
    ("path", "waves.index"): records.IndexAtApex,
    ("path", "waves.limiting"): records.Limiting,
    ("path", "waves.rays"): records.RayAnswer,
    ("path", "advice"): records.Advice,
    ("path", "advice.state_probabilities"): records.StateProbabilities,
    ("path", "advice.rejection_db"): records.Rejection,
    ("field", ""): FieldAnswer,
    ("wave", ""): WaveAnswer,
    ("wave", "ordinary"): OneWave,
}


@pytest.mark.parametrize(("command", "name"), RECORDS)
def test_record_has_the_keys_of_the_contract(command, name):
    root = schema(command)
    part = next(p for n, p in objects(root, root) if n == name)
    missing = set(keys_of(part, root)) - {
        f.name for f in dataclasses.fields(RECORDS[command, name])
    }
    assert not missing


UNIT = re.compile(r"\[([^\]]+)\]$")


def units_of_schema(command):
    """Dotted key to unit, or None, of everything in a schema."""
    root = schema(command)
    return {
        f"{name}.{key}".lstrip("."): (UNIT.findall(inner.get("description", "")) or [None])[0]
        for name, part in objects(root, root)
        if not name.startswith("waves.rays")
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
    }
    root = schema(command)
    for _, part in objects(root, root):
        for key, inner in keys_of(part, root).items():
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
    section = text.split(f"## JSON of `magion {command}`")[1].split("\n## ")[0]
    rows = {}
    for line in section.splitlines():
        cells = [c.strip() for c in line.strip("|").split("|")]
        if line.startswith("| `"):
            for key in re.findall(r"`([^`]+)`", cells[0]):
                rows[key] = None if cells[2] == "" else cells[2]
    wanted = {
        k.replace("waves.", "waves[].").replace("changes.", "changes[]."): u
        for k, u in units_of_schema(command).items()
    }
    if command == "wave":  # one table stands for both waves
        wanted = {k: u for k, u in wanted.items() if not k.startswith("extraordinary.")}
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
