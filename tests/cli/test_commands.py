"""Whole commands, as a user types them."""

import csv
import io
import json
import subprocess
import sys

import pytest
from click.testing import CliRunner

from magion.cli import main
from magion.render.text import for_encoding

PATH = ["path", "46.50,11.35", "47.10,10.85", "-f", "5.3", "--time", "2026-06-21T12:00Z"]
SUN = ["--flux", "130"]


def run(*tokens):
    return CliRunner().invoke(main, [str(t) for t in tokens])


def refused(*tokens):
    """The one line of a refusal."""
    result = run(*tokens)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    lines = result.stderr.strip().splitlines()
    assert len(lines) == 1
    assert lines[0].startswith("magion: ")
    assert "Traceback" not in result.stderr
    return lines[0]


def test_path_text_leads_with_the_hand():
    result = run(*PATH, *SUN)
    assert result.exit_code == 0
    lines = result.output.splitlines()
    assert lines[0].startswith("Receive LHCP: ordinary wave")
    assert max(len(line) for line in lines) <= 80
    for words in ("looking up", "on the map", "delay line in arm", "east-west", "fxF2", "IGRF-14"):
        assert words in result.output


def test_southern_and_western_places_work_as_typed():
    for place in ("-41.0,-71.3", "41.0S,71.3W", "-41,-71.3"):
        record = json.loads(run("field", place, "--date", "2026-01-01", "--format", "json").output)
        assert record["latitude_deg"] == -41.0
        assert record["longitude_deg"] == -71.3
    other = run("field", "--date", "2026-01-01", "--height", "-3", "-41,-71.3")
    assert other.exit_code == 2
    assert "height is -3" in other.stderr


def test_csv_has_a_row_for_each_ray_and_dotted_keys():
    rows = list(csv.DictReader(io.StringIO(run(*PATH, *SUN, "--format", "csv").output)))
    assert rows[0]["wave"] == "ordinary"
    assert {"arrival.elevation_deg", "limiting.field_angle_deg", "advice.state"} <= set(rows[0])
    assert float(rows[0]["ionosphere.fxf2_mhz"]) > float(rows[0]["ionosphere.fof2_mhz"])


def test_no_wave_arrives_is_an_answer():
    result = run("path", "46.50,11.35", "47.10,10.85", "-f", "20", *PATH[5:], *SUN)
    assert result.exit_code == 0
    assert result.output.startswith("Neither wave arrives")
    assert "skip distance" in result.output or "passes through" in result.output


def test_wave_of_the_check_table():
    # physics check 1.1: X = 0.5, Y = 0.2, theta = 30 degrees (derived, 1e-5)
    tokens = ["wave", "-f", "1", "--plasma", repr(0.5**0.5), "--gyro", "0.2", "--angle", "30"]
    record = json.loads(run(*tokens, "--format", "json").output)
    assert record["ordinary"]["mu"] == pytest.approx(0.755155, abs=1e-5)
    assert record["extraordinary"]["mu"] == pytest.approx(0.622603, abs=1e-5)
    assert (record["ordinary"]["hand"], record["extraordinary"]["hand"]) == ("LHCP", "RHCP")


def test_output_file_is_whole_or_left_as_it_was(tmp_path):
    target = tmp_path / "answer.json"
    target.write_text("before")
    assert "frequency" in refused(*PATH[:4], "-1", "--output", target)
    assert target.read_text() == "before"
    assert run(*PATH, *SUN, "--format", "json", "--output", target).exit_code == 0
    assert json.loads(target.read_text())["schema"] == "magion/path/1"
    assert list(tmp_path.iterdir()) == [target]
    assert "is not a regular file" in refused(*PATH, *SUN, "--output", tmp_path)
    assert "missing" in refused(*PATH, *SUN, "--output", tmp_path / "no" / "answer")


@pytest.mark.parametrize(
    ("tokens", "words"),
    [
        (["path", "91,0", "47,11", "-f", "5"], ["91", "-90 to 90"]),
        (["path", "46,181", "47,11", "-f", "5"], ["181", "-180 to 180"]),
        (["path", "ZZ99", "47,11", "-f", "5"], ["'ZZ99'", "locator"]),
        (["path", "46,11", "-46,-169", "-f", "5"], ["antipodes", "20,000 km"]),
        (["path", "46,11", "47,11", "-f", "0.2"], ["0.2", "0.5 to 60"]),
        (["path", "46,11", "47,11", "-f", "nan"], ["nan", "finite"]),
        (["path", "46,11", "47,11", "-f", "five"], ["five", "number"]),
        (["path", "46,11", "47,11", "-f", "5", "--fof2", "99"], ["99", "0.5 to 25"]),
        (["path", "46,11", "47,11", "-f", "5", "--hmf2", "20"], ["20", "150 to 600"]),
        (["path", "46,11", "47,11", "-f", "5", "--flux", "20"], ["20", "60 to 300"]),
        (["path", "46,11", "47,11", "-f", "5", "--flux", "90", "--sunspots", "9"], ["contradict"]),
        (["path", "46,11", "47,11", "-f", "5", "--time", "yesterday"], ["yesterday", "2026"]),
        (["path", "46,11", "47,11", "-f", "5", "--time", "1850-01-01"], ["1850", "1900-01-01"]),
        (["path", "46,11", "47,11", "-f", "5", "--time", "2031-01-01"], ["2031", "2030-01-01"]),
        (["path", "46,11", "47,11", "-f", "5", "--bogus", "1"], ["--bogus"]),
        (["path", "46,11", "47,11"], ["--frequency"]),
        (["path", "46,11", "-f", "5"], ["TO"]),
        (["path", "46,11", "47,11", "-f", "5", "--format", "xml"], ["xml", "json"]),
        (["field", "46,11", "--height", "nan"], ["nan"]),
        (["field", "46,11", "--date", "1800-01-01"], ["1800", "1900"]),
        (["wave", "-f", "5", "--plasma", "-1", "--gyro", "1", "--angle", "3"], ["-1", "0 to 100"]),
        (["wave", "-f", "5", "--plasma", "1", "--gyro", "1", "--angle", "190"], ["190", "180"]),
        (["sing"], ["sing"]),
    ],
)
def test_wrong_input_gets_one_line_and_status_2(tokens, words):
    line = refused(*tokens)
    for word in words:
        assert word in line


GOOD = "height_km,electron_density_m3\n100,0\n150,1e10\n250,5e11\n300,4e11\n"


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", ["empty"]),
        ("# only a note\n", ["empty"]),
        ("height_km\n100\n", ["electron_density_m3 is missing"]),
        (GOOD.replace("250,", "150,"), ["line 4", "height_km", "increase"]),
        (GOOD.replace("5e11", "-5e11"), ["line 4", "electron_density_m3", "-5e+11"]),
        (GOOD.replace("5e11", "many"), ["line 4", "electron_density_m3", "many"]),
        (GOOD.replace("5e11", "nan"), ["line 4", "nan"]),
        (GOOD.replace("300,4e11\n", ""), ["3 rows", "at least 4"]),
        (GOOD.replace("250,5e11", "250,5e11,7"), ["line 4", "3 cells"]),
        (GOOD.replace("1e10", "0").replace("5e11", "0").replace("4e11", "0"), ["every density"]),
        ("\x00\x01\x02", ["missing"]),
    ],
)
def test_wrong_profile(tmp_path, content, words):
    file = tmp_path / "profile.csv"
    file.write_text(content)
    line = refused(*PATH, "--profile", file)
    assert "profile.csv" in line
    for word in words:
        assert word in line


def test_profile_that_is_no_file(tmp_path):
    assert "regular file" in refused(*PATH, "--profile", tmp_path)
    assert "does not exist" in refused(*PATH, "--profile", tmp_path / "none.csv")
    (tmp_path / "bytes.csv").write_bytes(b"\xff\xfe\x00")
    assert "UTF-8" in refused(*PATH, "--profile", tmp_path / "bytes.csv")


def test_profile_contradicts_typed_layers(tmp_path):
    file = tmp_path / "profile.csv"
    file.write_text("\ufeff# a note\n" + GOOD.replace("\n", "\r\n"))
    assert "contradict" in refused(*PATH, "--profile", file, "--fof2", "5")
    assert "contradict" in refused(*PATH, "--profile", file, "--flux", "100")
    assert run(*PATH, "--profile", file).exit_code == 0


def test_ascii_terminals_get_ascii():
    text = run(*PATH, *SUN).output
    assert "°" in text
    plain = for_encoding(text, "ascii")
    assert plain.isascii()
    assert "?" not in plain
    assert for_encoding(text, "utf-8") == text


def test_help_and_package_root_import_nothing_heavy():
    code = (
        "import sys, magion, magion.cli\n"
        "from click.testing import CliRunner\n"
        "assert CliRunner().invoke(magion.cli.main, ['--help']).exit_code == 0\n"
        "heavy = {'numpy', 'scipy', 'matplotlib', 'ppigrf', 'PyIRI', 'pandas'}\n"
        "sys.exit(bool(heavy & set(sys.modules)))\n"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_library_call_loads_no_face():
    code = (
        "import sys\n"
        "from magion import answer_field, parse_place\n"
        "from datetime import datetime\n"
        "answer_field(parse_place('46.5,11.35'), datetime(2026, 1, 1))\n"
        "sys.exit(bool({'click', 'matplotlib', 'PyIRI', 'magion.cli'} & set(sys.modules)))\n"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
