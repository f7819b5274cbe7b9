"""Wrong input of the commands about stations, and the files that they write.

Every refusal is one line on standard error and exit status 2, and nothing is written.
"""

import os
import stat
import tempfile

import pytest

from magion.plots import saving
from tests.demo import CEDAR, EXAMPLES, LARCH, NEAR, refused, run

FIRST = ["-f", "5.3", "--time", "2026-06-21"]
STATION = ["--station", LARCH]
PROFILE = ["--profile", EXAMPLES / "profile.csv"]
READINGS = ["--readings", EXAMPLES / "readings.csv"]
FEED, ANTENNA = ["feed", "-f", "5.3"], ["antenna", "-f", "5.3", *STATION]
DAY, NET = ["day", *NEAR, *FIRST], ["net", "46.50,11.35", "47.10,10.85", *FIRST]
SENSE = ["station", "46.50,11.35"]

WRONG = [
    # frequencies
    (["feed"], ["-f", "--frequency"]),
    (["antenna", *STATION], ["-f", "--frequency"]),
    (["day", *NEAR], ["-f", "--frequency"]),
    (["net", *NEAR], ["-f", "--frequency"]),
    (["path", *NEAR, *STATION], ["-f", "--frequency"]),
    (["feed", "-f", "0.2"], ["0.2", "0.5 to 60"]),
    (["antenna", "-f", "61", *STATION], ["61", "0.5 to 60"]),
    (["day", *NEAR, "-f", "0"], ["0 MHz", "0.5 to 60"]),
    (["net", *NEAR, "-f", "-5"], ["-5", "0.5 to 60"]),
    (["station", "46,11", "-f", "99"], ["99", "0.5 to 60"]),
    (["antenna", "-f", "14", *STATION], ["14.000 MHz", "not guessed", "resistance_ohm"]),
    ([*DAY, "-f", "1:20:1"], ["21", "1 to 12"]),
    ([*NET, "-f", "1:40:1"], ["41", "1 to 30"]),
    # ranges
    ([*FEED, "--band", "5.5:5:0.1"], ["5.5:5:0.1", "first:last:step"]),
    ([*FEED, "--band", "5:5.5"], ["5:5.5", "first:last:step"]),
    ([*FEED, "--band", "5:5.5:0"], ["5:5.5:0", "first:last:step"]),
    ([*FEED, "--band", "5:5.5:-0.1"], ["first:last:step"]),
    ([*FEED, "--band", "5:six:0.1"], ["six", "number"]),
    ([*FEED, "--band", "5:nan:0.1"], ["nan", "finite"]),
    ([*FEED, "--band", ""], ["number"]),
    ([*FEED, "--band", "55:65:1"], ["61", "0.5 to 60"]),
    ([*FEED, "--band", "5:6:0.00001"], ["5:6:0.00001", "10000"]),
    ([*FEED, "--band", "0:1e300:1e-300"], ["more than 10000"]),
    ([*FEED, "--band", "1:9:0.002"], ["4001", "1 to 2000"]),
    ([*ANTENNA, "--azimuth", "0:400:10"], ["370", "0 to 360"]),
    ([*ANTENNA, "--elevation", "95"], ["95", "0 to 90"]),
    ([*ANTENNA, "--elevation", "-5:5:5"], ["-5", "0 to 90"]),
    ([*ANTENNA, "--elevation", "0:90:0.1", "--azimuth", "0:360:0.1"], ["901", "3601", "200000"]),
    ([*SENSE, "--elevation", "90"], ["90", "1 to 89"]),
    ([*SENSE, "--elevation", "0:60:30"], ["0 degrees", "1 to 89"]),
    ([*SENSE, "--height", "20"], ["20", "60 to 300"]),
    ([*SENSE, "-f", "1:50:0.01", "--elevation", "1:89:1"], ["200000 cells"]),
    ([*DAY, "--step", "4"], ["4", "5 to 120"]),
    ([*DAY, "--step", "121"], ["121", "5 to 120"]),
    ([*DAY, "--step", "hour"], ["hour", "number"]),
    # places and partners
    (["net", "46,11", *FIRST], ["0 partners", "1 to 500"]),
    (["net", "46,11", "46,11", *FIRST], ["at net control itself"]),
    (["net", "46,11", "-46,-169", *FIRST], ["antipodes"]),
    (["net", "46,11", "-30,-150", *FIRST], ["12000 km"]),
    (["net", "46,11", "No Hut", *FIRST], ["No Hut", "locator"]),
    (["net", *FIRST], ["PLACE"]),
    (["day", "46,11", *FIRST], ["TO"]),
    (["day", "46,11", "-30,-150", *FIRST], ["12000 km"]),
    (["station"], ["PLACE"]),
    (["station", "Larch Hut"], ["Larch Hut", "locator"]),
    (["path", NEAR[0], "Larch Hut", "-f", "5", "--station", CEDAR], ["Larch Hut", "locator"]),
    ([*NET, "--partners", "none.csv"], ["none.csv", "does not exist"]),
    ([*NET, "--partners", EXAMPLES / "profile.csv"], ["profile.csv", "name", "missing"]),
    ([*NET, "--partners", EXAMPLES], ["examples", "not a regular file"]),
    # options that contradict each other or lack each other
    ([*FEED, "--velocity-factor", "0.66", *STATION], ["velocity factor", "contradict"]),
    ([*FEED, "--velocity-factor", "0.2"], ["0.2", "0.4 to 1"]),
    (["antenna", "-f", "5.3"], ["--station"]),
    ([*DAY, *PROFILE], ["profile", "one instant"]),
    ([*NET, "--day", *PROFILE], ["profile", "one instant"]),
    ([*DAY, "--flux", "100", "--sunspots", "10"], ["contradict"]),
    ([*NET, "--flux", "100", "--sunspots", "10"], ["contradict"]),
    ([*SENSE, "--flux", "100"], ["--time"]),
    ([*SENSE, *FIRST, *PROFILE, "--flux", "100"], ["contradict"]),
    ([*DAY, *READINGS], ["2026-06-21", "readings"]),
    ([*NET, "--day", *READINGS], ["2026-06-21", "readings"]),
    ([*DAY, *READINGS, "--fof2", "5"], ["contradict"]),
    ([*NET, "--readings-at", "46,11"], ["--readings"]),
    # files and formats
    ([*FEED, "--format", "xml"], ["xml", "json"]),
    ([*FEED, "--plot", "sheet.png"], ["--plot"]),
    ([*NET, "--plot", "net.png"], ["--plot"]),
    ([*DAY, "--time", "2040-01-01"], ["2040", "2030-01-01"]),
    ([*ANTENNA, "--plot", "sky.gif"], [".gif", ".png, .svg or .pdf"]),
    ([*DAY, "--plot", "day.txt"], [".txt", ".png, .svg or .pdf"]),
    ([*SENSE, "--plot", "sky"], ["ending", ".png, .svg or .pdf"]),
    ([*FEED, "--station", "none.toml"], ["none.toml", "does not exist"]),
    ([*FEED, "--station", EXAMPLES], ["examples", "not a regular file"]),
    (["station", "46,11", "--station", EXAMPLES / "net_alps.csv"], ["net_alps.csv", "TOML"]),
]


@pytest.fixture(autouse=True)
def empty_folder(tmp_path, monkeypatch):
    """A working folder in which nothing may be left."""
    folder = tmp_path / "here"
    folder.mkdir()
    monkeypatch.chdir(folder)
    return folder


@pytest.mark.parametrize(("tokens", "words"), WRONG)
def test_wrong_input_gets_one_line_and_writes_nothing(empty_folder, tokens, words):
    line = refused(*tokens)
    for word in words:
        assert word in line
    assert list(empty_folder.iterdir()) == []


@pytest.mark.parametrize("command", [FEED, ["antenna", "-f", "5.3"], SENSE, DAY, NET])
@pytest.mark.parametrize(
    ("was", "becomes", "words"),
    [
        ("height_m", "hight_m", ["[antenna]", "hight_m"]),
        ("height_m = 9.0", "height_m = 900.0", ["height_m", "900", "0.5 to 200"]),
        ('class = "medium-dry"', 'class = "moon"', ["class", "moon"]),
        ('kind = "tee"', 'kind = "funnel"', ["kind", "funnel"]),
        ('delayed = "B"', 'delayed = "C"', ["left.delayed", "'C'"]),
        ('place = "46.50,11.35"', 'place = "nowhere"', ["place", "nowhere"]),
        ("B = 110.0", "B = 140.0", ["arms", "60 degrees"]),
        ("[relay]", "[relais]", ["relais"]),
        ("[antenna]", "[antenna", ["TOML"]),
    ],
)
def test_a_wrong_station_file_is_refused_by_every_command(tmp_path, command, was, becomes, words):
    text = LARCH.read_text(encoding="utf-8")
    assert was in text
    file = tmp_path / "hut.toml"
    file.write_text(text.replace(was, becomes, 1), encoding="utf-8")
    line = refused(*command, "--station", file)
    for word in ("hut.toml", *words):
        assert word in line


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", ["empty"]),
        ("name,place\n", ["0 partners", "1 to 500"]),
        ("name\nA\n", ["line 1", "place is missing"]),
        ('name,place\nA,"91,0"\n', ["line 2", "place", "91"]),
        ("name,place\nA,46.5,11.35\n", ["line 2", "3 cells"]),
        ('name,place\n,"46,11"\n', ["line 2", "name", "1 to 60"]),
        (f'name,place\n{"A" * 61},"46,11"\n', ["line 2", "name", "1 to 60"]),
        ('name,place\nA,"46,11"\na,"47,11"\n', ["line 3", "'a' stands twice"]),
        ('name,name,place\nA,B,"46,11"\n', ["name"]),
        ("name,place\n" + "".join(f'P{i},"46,{i % 90}"\n' for i in range(501)), ["501", "500"]),
        ("\x00\x01", ["missing"]),
    ],
)
def test_wrong_partners(tmp_path, content, words):
    file = tmp_path / "net.csv"
    file.write_text(content, encoding="utf-8")
    line = refused("net", "46,11", "--partners", file, *FIRST)
    for word in ("net.csv", *words):
        assert word in line


# --- files


ALL = [FEED, ANTENNA, SENSE, DAY, NET]
DRAWN = [ANTENNA, [*SENSE, "-f", "5.3"], DAY]


@pytest.mark.parametrize("command", ALL)
def test_an_output_that_cannot_be_written(tmp_path, empty_folder, command):
    assert "folder" in refused(*command, "--output", tmp_path / "no" / "answer.txt")
    assert "not a regular file" in refused(*command, "--output", tmp_path)
    assert list(empty_folder.iterdir()) == []


@pytest.mark.parametrize("command", DRAWN)
def test_a_plot_that_cannot_be_written(tmp_path, empty_folder, command):
    (tmp_path / "folder.png").mkdir()
    assert "folder" in refused(*command, "--plot", tmp_path / "no" / "sky.png")
    assert "not a regular file" in refused(*command, "--plot", tmp_path / "folder.png")
    assert list(empty_folder.iterdir()) == []


@pytest.mark.parametrize("command", DRAWN)
def test_plot_and_output_are_written_both_or_neither(tmp_path, empty_folder, command):
    figure = empty_folder / "sky.png"
    missing = tmp_path / "no" / "answer.txt"
    assert "missing" in refused(*command, "--plot", figure, "--output", missing)
    assert "one file" in refused(*command, "--plot", figure, "--output", "../here/sky.png")
    assert list(empty_folder.iterdir()) == []


def test_a_folder_that_may_not_be_written(empty_folder, monkeypatch):
    def denied(*arguments, **named):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(tempfile, "mkstemp", denied)
    for option in ("--output", "--plot"):
        assert "Permission denied" in refused(*ANTENNA, option, empty_folder / "sky.png")
    assert list(empty_folder.iterdir()) == []


def test_an_existing_file_is_replaced_whole_or_left_as_it_was(empty_folder, monkeypatch):
    figure, answer = empty_folder / "sky.svg", empty_folder / "answer.json"
    for file in (figure, answer):
        file.write_text("before")
        file.chmod(0o640)
    both = ["--plot", figure, "--format", "json", "--output", answer]
    assert "61" in refused("antenna", "-f", "61", *STATION, *both)
    assert figure.read_text() == answer.read_text() == "before"

    def full(*arguments):
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as broken:
        broken.setattr(os, "replace", full)
        assert "No space left" in refused(*ANTENNA, *both)
    assert figure.read_text() == answer.read_text() == "before"
    with monkeypatch.context() as broken:
        broken.setattr(saving, "encoded", lambda *arguments: 1 / 0)
        assert run(*ANTENNA, *both).exit_code == 1
    assert figure.read_text() == answer.read_text() == "before"

    result = run(*ANTENNA, *both)
    assert result.exit_code == 0
    assert result.output == ""
    assert "<svg" in figure.read_text()
    assert answer.read_text().startswith('{\n  "schema": "magion/antenna/1"')
    assert {stat.S_IMODE(file.stat().st_mode) for file in (figure, answer)} == {0o640}
    assert sorted(empty_folder.iterdir()) == [answer, figure]


@pytest.mark.parametrize(
    ("name", "start"), [("sky.png", b"\x89PNG"), ("sky.SVG", b"<?xml"), ("a.b.pdf", b"%PDF")]
)
def test_the_ending_says_the_kind_of_figure(empty_folder, name, start):
    words = ["station", "46.50,11.35", "-f", "5.3", "--plot", empty_folder / name]
    result = run(*words)
    assert result.exit_code == 0
    assert result.output.startswith("Sense table")
    assert (empty_folder / name).read_bytes().startswith(start)
