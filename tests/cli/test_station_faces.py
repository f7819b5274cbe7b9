"""Path with a station, feed, antenna, station, day and net, as a user types them."""

import csv
import io
import json
import re
import subprocess
import sys

import pytest
from click.testing import CliRunner

from magion.cli import main
from magion.render.text import for_encoding
from tests.demo import CEDAR, DECEMBER, DEMO, JUNE, LARCH, NEAR, SOUTH, said

pytestmark = pytest.mark.usefixtures("once")

PAGE = 66
DAY = [*NEAR, "--step", "120", "--time", JUNE, "--flux", "130"]
CAUTIONS = ("power lines", "thunder", "DC for the relay", "exposure", "licensed")


def plain(text):
    """Text on one line."""
    return " ".join(text.split())


def after(text, heading):
    """The lines below a heading, up to the next empty one."""
    return text.split(heading)[1].strip("\n").split("\n\n")[0].splitlines()


# --- path


def test_path_leads_with_the_stations_own_label():
    text = said("path", *DEMO, "--station", LARCH)
    found = json.loads(said("path", *DEMO, "--station", LARCH, "--format", "json"))
    antenna, advice = found["antenna"], found["advice"]
    first = plain(text.split("\n\n")[0])
    assert first.startswith("Relay left (receive LHCP): ordinary wave, puts the other down by ")
    db = advice["rejection_db"]["ordinary"]
    assert f"by {db:.0f} dB ({db / 6.0:.1f} S-units)" in first
    assert antenna["rejection_s_units"] == pytest.approx(db / 6.0)
    assert f"limited most by the {advice['limited_by']}" in first
    assert advice["transmit_relay_position"] == "right"
    assert first.endswith("To answer on it switch to right.")
    below = plain(text.split("\nAntenna\n")[1])
    for words in ("Larch Hut: crossed-dipoles, 9.0 m up", "feed: tee, SWR", "left LHCP", "wire_a"):
        assert words in below
    assert "(B) no hand" in below  # one arm alone that the relay does not have


def test_a_half_wave_line_gives_no_hand_at_all(stations):
    station = stations["half-wave line"]
    path = plain(said("path", *DEMO, "--station", station))
    assert path.startswith("No hand at all: the delay line is a half wave")
    assert "magion feed gives the quarter-wave line" in path
    feed = plain(said("feed", "-f", "5.3", "--station", station))
    assert "No hand at all on 5.300 MHz (the delayed path is 180° long)" in feed
    assert "no hand, the two differ by 0.0 dB" in feed
    assert "one dipole turned by 45°" in feed


def test_a_station_far_from_the_receiver_is_told(stations):
    text = plain(said("path", *DEMO, "--station", CEDAR))
    assert "its antenna is taken to stand at TO" in text


def test_receive_only_antennas_never_advise_to_transmit(stations):
    for name in ("loops", "receive only"):
        text = plain(said("path", *DEMO, "--station", stations[name]))
        assert "Receive only." in text
        assert "switch to" not in text
    text = plain(said("path", *DEMO, "--station", stations["loops"]))
    assert "amplifiers matched to the cable" in text


def test_a_single_dipole_has_one_position(stations):
    text = plain(said("path", *DEMO, "--station", stations["single dipole"]))
    assert text.startswith("Relay A (one wire): ordinary wave")


def test_the_name_of_the_station_is_a_place():
    for name in ("Larch Hut", "larch hut", " LARCH  HUT "):
        words = ["path", NEAR[0], name, *DEMO[2:], "--station", LARCH, "--format", "json"]
        receiver = json.loads(said(*words))["receiver"]
        assert (receiver["name"], receiver["latitude_deg"]) == ("Larch Hut", 46.50)
    # The option may stand after the place that it names.
    words = ["station", "Cedar Ridge", "-f", "7.1", "--station", CEDAR, "--format", "json"]
    assert json.loads(said(*words))["latitude_deg"] == -41.0


# --- feed


def feeds(stations):
    yield [], None
    yield ["--station", LARCH], "Larch Hut"
    yield ["--station", CEDAR], "Cedar Ridge"
    for name in sorted(stations):
        yield ["--station", stations[name]], name


def test_every_build_sheet_fits_a_page_and_warns(stations):
    for more, name in feeds(stations):
        for band in ([], ["--band", "3:6:0.01"]):
            sheet = said("feed", "-f", "5.3", *more, *band)
            assert len(sheet.splitlines()) <= PAGE, name
            for words in CAUTIONS:
                assert words in sheet, (name, words)
            assert "Check by measurement" in sheet


@pytest.mark.parametrize(
    ("station", "length", "feet"),
    [
        (LARCH, "9.333 m", "30 ft 7.4 in"),
        (CEDAR, "9.333 m", "30 ft 7.4 in"),
        (None, "9.333 m", "30 ft 7.4 in"),
    ],
)
def test_a_build_sheet_gives_metres_and_feet(station, length, feet):
    sheet = said("feed", "-f", "5.3", *(["--station", station] if station else []))
    rows = [line for line in sheet.splitlines() if "a quarter wave is" in line]
    assert length in rows[0]
    assert feet in rows[0]
    assert re.search(r"cut the line to +\d+\.\d{3} m +\d+ ft \d+\.\d in", sheet)


def test_the_demo_station_builds_what_its_file_says():
    sheet = said("feed", "-f", "5.3", "--station", LARCH)
    lines = sheet.splitlines()
    assert lines[0] == "Build sheet for the feed of Larch Hut, 5.300 MHz"
    assert lines[1].startswith("From overhead left hears LHCP, right hears RHCP")
    assert "arm A: hot leg toward 20° true, cold leg toward 200°" in sheet
    assert "line in arm B: hears and sends LHCP" in sheet
    assert "arm A alone, no hand" in sheet
    for words in ("0.150 m", "9.183 m", "first dip", "Repeat with the relay", "SWR proves nothing"):
        assert words in plain(sheet)


def test_feeds_without_a_line_say_so(stations):
    hybrid = said("feed", "-f", "5.3", "--station", stations["hybrid"])
    assert "made by the hybrid itself: no delay line to cut" in hybrid
    assert "90° in arm E: hears and sends LHCP" in hybrid
    loops = said("feed", "-f", "5.3", "--station", stations["loops"])
    assert "made by the digital combination itself" in loops
    single = said("feed", "-f", "5.3", "--station", stations["single dipole"])
    assert "One element alone" in single
    for words in ("delay line (", "Both paths", "matched and isolated"):
        assert words not in single
    leads = said("feed", "-f", "14", "--station", stations["long leads"])
    assert "nothing is left to cut: the leads alone are longer" in leads
    assert "cut the line to" not in leads
    # A file without a name is a station all the same.
    assert "matched and isolated" not in hybrid
    assert "matched and isolated" in said("feed", "-f", "5.3")


def test_a_single_dipole_has_no_delayed_path(stations):
    words = ["feed", "-f", "5.3", "--station", stations["single dipole"], "--format", "json"]
    assert {row["line_deg"] for row in json.loads(said(*words))["band"]} == {None}


def test_the_sheet_of_an_antenna_for_receiving_does_not_speak_of_sending(stations):
    for name in ("loops", "receive only"):
        sheet = said("feed", "-f", "5.3", "--station", stations[name])
        assert "sends" not in sheet
        assert "change over to send" not in sheet


def test_the_rows_by_themselves_keep_to_the_accepted_range():
    band = json.loads(said("feed", "-f", "60", "--format", "json"))["band"]
    assert max(row["frequency_mhz"] for row in band) <= 60.0


def test_the_rows_of_a_band_are_those_asked_for():
    sheet = said("feed", "-f", "3.65", "--velocity-factor", "0.8", "--band", "3.5:3.8:0.1")
    rows = after(sheet, "lost, dB\n")[:4]
    assert [r.split()[0] for r in rows] == ["3.500", "3.600", "3.700", "3.800"]
    assert "velocity factor 0.8" in sheet
    table = said("feed", "-f", "3.65", "--band", "3.5:3.8:0.1", "--format", "csv")
    found = [float(r["frequency_mhz"]) for r in csv.DictReader(io.StringIO(table))]
    assert found == [3.5, 3.6, 3.7, 3.8]
    long = said("feed", "-f", "3.65", "--band", "3:4:0.01")  # as many as fit the page
    assert [r.split()[0] for r in after(long, "lost, dB\n")[:9]][::8] == ["3.000", "4.000"]


# --- antenna


def test_antenna_names_every_position_and_the_favoured_hand():
    text = said("antenna", "-f", "5.3", "--station", LARCH)
    for words in ("Relay left (delay in arm B)", "Relay wire_a (arm A alone)", "A 20°, B 110°"):
        assert words in text
    zenith = [line.split() for line in text.splitlines() if line.lstrip().startswith("90°")]
    assert [row[1] for row in zenith] == ["L", "R", "even"]
    # North of a wire that runs 20° west of south the answer is the same as south of it.
    assert said("antenna", "-f", "5.3", "--station", LARCH, "--format", "csv").startswith("label,")


def test_antenna_shows_the_directions_asked_for():
    text = said(
        *["antenna", "-f", "5.3", "--station", LARCH],
        *["--elevation", "12:18:2", "--azimuth", "0:90:22.5"],
    )
    rows = text.split("Relay left")[1].split("\n\n")[0].splitlines()[1:]
    assert rows[0].split()[:6] == ["elev.", "0°", "22.5°", "45°", "67.5°", "90°"]
    assert [r.split()[0] for r in rows[1:]] == ["18°", "16°", "14°", "12°"]
    all_of_them = said("antenna", "-f", "5.3", "--station", LARCH, "--elevation", "1:90:1")
    assert len(all_of_them.splitlines()) < 50


# --- station


@pytest.mark.parametrize("more", [[], ["--station", LARCH], ["--time", JUNE, "--flux", "130"]])
def test_the_legend_of_a_sense_table_has_four_lines(more):
    text = said("station", "46.50,11.35", "-f", "1.85", "-f", "5.3", *more)
    legend = after(text, "\n\nHand to receive")
    legend = ["Hand to receive" + legend[0], *legend[1:]]
    assert len([line for line in legend if not line.startswith(("  - ", "    "))]) == 4
    assert "N NE E SE S SW W NW" in legend[0]
    assert legend[1].startswith("L R circular, l r elliptical")


def test_a_sense_table_turns_over_with_the_hemisphere():
    north = said("station", "46.50,11.35", "-f", "7.1")
    south = said("station", "41.0S,71.3W", "-f", "7.1")
    rows = [next(r for r in t.splitlines() if r.startswith("   7.100")) for t in (north, south)]
    assert [r.split()[3] for r in rows] == ["L", "R"]  # of the ordinary wave overhead
    assert "toward 4° true the hands change places" in plain(north)
    assert "Sense table, 41.00 S 71.30 W" in south


def test_a_sense_table_tells_states_and_rejections():
    text = said("station", "Larch Hut", "-f", "5.3", "-f", "28", *DEMO[4:], "--station", LARCH)
    assert "Sense table of Larch Hut" in text
    assert "Overhead: foF2" in text
    rows = {r.split()[0]: r for r in text.splitlines() if re.match(r" +\d+\.\d{3} ", r)}
    assert rows["5.300"].endswith("both")
    assert re.search(r" \d+/\d+ ", rows["5.300"])
    assert rows["28.000"].endswith("none")
    assert " -/- " in rows["28.000"]
    assert "outside the shipped table" in plain(text)
    assert "-28" not in text


# --- day


def test_a_day_has_strips_and_a_plan():
    text = said("day", *DAY, "-f", "5.3", "-f", "7.1", "--station", LARCH)
    strips = [line.split()[-1] for line in text.splitlines() if re.search(r" (waves|relay) ", line)]
    assert len(strips) == 4
    assert {len(s) for s in strips} == {12}
    assert set(strips[0]) <= set("BXO-")
    assert set(strips[1]) <= set("lrw.")
    for f in ("5.300", "7.100"):
        plan = after(text, f"Switching plan, {f} MHz\n")
        assert plan[0].startswith("  00:00")
        assert "start of the day" in plain(" ".join(plan[:2]))
    assert "first letter of left, right, to receive" in plain(text)
    hours = re.findall(r"^  (\d\d):00 ", text.split("  UTC   foF2")[1], re.M)
    assert hours == [f"{h:02d}" for h in range(0, 24, 2)]


def test_a_day_without_a_station_speaks_of_hands():
    text = said("day", *DAY, "-f", "5.3", "-f", "7.1")
    assert "R for RHCP, L for LHCP, to receive" in plain(text)
    assert "receive LHCP, transmit RHCP" in text
    found = json.loads(said("day", *DAY, "-f", "5.3", "-f", "7.1", "--format", "json"))
    assert len(found["time_utc"]) == 12


def test_a_day_without_a_wave_is_an_answer():
    text = said("day", *DAY, "-f", "28", "--station", LARCH)
    assert "nothing to switch to: start of the day: neither arrives" in plain(text)
    assert "no wave to switch for" in text


def test_a_day_outside_the_impedance_table_says_that_an_ideal_switch_is_taken():
    text = plain(said("day", *DAY, "-f", "3", "--station", LARCH))
    assert "outside the shipped table" in text


# --- net


def test_a_net_names_one_position_and_one_frequency():
    text = said("net", "Larch Hut", *NEAR[:1], "--station", LARCH, "-f", "5.3", *DEMO[4:])
    assert text.startswith("5.300 MHz on left: serves 1 of 1.")
    assert "Net control Larch Hut, 2026-06-21 12:00 UTC" in text
    assert "the relay position for it" in plain(text)


def test_partners_come_from_a_file_and_from_the_line(tmp_path):
    file = tmp_path / "one.csv"
    file.write_text('name,place\nScree Hut,"47.10,10.85"\n')
    words = ["net", "46.50,11.35", "--partners", file, "46.90,12.20", "-f", "5.3", *DEMO[4:]]
    text = said(*words)
    assert "serves 2 of 2" in text
    assert [line.split()[0] for line in after(text, "| 5.300 MHz\n")[:2]] == ["Scree", "46.90,12.2"]


def test_a_partner_named_twice_counts_once(tmp_path):
    file = tmp_path / "one.csv"
    file.write_text('name,place\nScree Hut,"47.10,10.85"\n')
    words = ["net", "46.50,11.35", "scree hut", "--partners", file, "-f", "5.3", *DEMO[4:]]
    assert "serves 1 of 1" in said(*words)


def test_a_net_without_a_wave_is_an_answer():
    text = said("net", "46.50,11.35", *NEAR[:1], "-f", "28", *DEMO[4:])
    assert text.startswith("No partner is reached on any of these frequencies.")


def test_a_net_through_the_day_has_a_line_an_hour():
    text = said("net", "46.50,11.35", *NEAR[:1], "-f", "5.3", *DEMO[4:], "--day")
    assert re.findall(r"^  (\d\d):00  ", text, re.M) == [f"{h:02d}" for h in range(24)]


# --- all faces


def texts(stations):
    """Command lines of all faces, with the demo stations and with the longest names."""
    long = "Larch Hut ".ljust(60, "x")
    for name in (LARCH, CEDAR, stations["long names"]):
        station = ["--station", name]
        yield ["feed", "-f", "5.3", *station]
        yield ["antenna", "-f", "5.3", *station]
        yield ["station", "46.50,11.35", *station]
        yield ["path", *DEMO, *station]
    station = ["--station", stations["long names"]]
    yield ["station", long, "-f", "1.3", "-f", "5.3", *DEMO[4:], *station]
    yield ["path", NEAR[0], long, *DEMO[2:], *station]
    yield ["day", NEAR[0], long, *DAY[2:], "-f", "5.3", "-f", "7.1", *station]
    yield ["net", long, NEAR[0], "-f", "5.3", "-f", "3", "-f", "28", *DEMO[4:], *station]
    yield ["net", long, NEAR[0], "-f", "5.3", *DEMO[4:], "--day", *station]
    yield ["day", *DAY, "-f", "5.3", "-f", "7.1", "--station", LARCH]
    yield ["path", *SOUTH, "-f", "7.1", "--time", DECEMBER, "--station", CEDAR]
    yield ["antenna", *["-f", "5.3", "--station", LARCH, "--elevation", "0.125:1:0.125"]]
    yield ["antenna", *["-f", "5.3", "--station", LARCH, "--azimuth", "0:359:7.75"]]
    yield ["station", "85.8,139.2", "-f", "1.62:1.66:0.005", "--elevation", "33.333"]
    yield ["feed", "-f", "5.3"]
    for name in ("half-wave line", "loops", "hybrid", "single dipole", "long leads"):
        yield ["path", *DEMO, "--station", stations[name]]
        yield ["feed", "-f", "5.3", "--station", stations[name]]


def test_every_text_fits_80_columns_and_has_an_ascii_form(stations):
    for words in texts(stations):
        text = said(*words)
        longest = max(text.splitlines(), key=len)
        assert len(longest) <= 80, f"{words}: {longest}"
        assert all(line == line.rstrip() for line in text.splitlines()), words
        ascii_form = for_encoding(text, "ascii")
        assert ascii_form.isascii()
        assert "?" not in ascii_form
        longest = max(ascii_form.splitlines(), key=len)
        assert len(longest) <= 80, f"{words}: {longest}"
        assert for_encoding(text, "utf-8") == text


def test_data_is_the_same_on_an_ascii_terminal(tmp_path):
    file = tmp_path / "hut.toml"
    text = LARCH.read_text(encoding="utf-8").replace("Larch Hut", "Lärchenhütte")
    file.write_text(text, encoding="utf-8")
    words = ["feed", "-f", "5.3", "--station", str(file), "--format", "json"]
    result = CliRunner(charset="ascii").invoke(main, words)
    assert json.loads(result.output)["station"] == "Lärchenhütte"


def test_no_number_is_a_negative_zero(stations):
    for words in texts(stations):
        assert not re.search(r"(?<![\w.])-0(\.0+)?(?![\d.])", said(*words)), words


def test_commands_that_draw_nothing_load_no_plots(tmp_path):
    code = (
        "import sys\n"
        "from click.testing import CliRunner\n"
        "from magion.cli import main\n"
        "larch, plot = sys.argv[1:]\n"
        "for words in (['feed', '-f', '5.3', '--station', larch],\n"
        "              ['antenna', '-f', '5.3', '--station', larch],\n"
        "              ['station', '46.50,11.35', '-f', '5.3', '--station', larch]):\n"
        "    assert CliRunner().invoke(main, words).exit_code == 0\n"
        "assert not {'matplotlib', 'PyIRI'} & set(sys.modules)\n"
        "words = ['antenna', '-f', '5.3', '--station', larch, '--plot', plot]\n"
        "assert CliRunner().invoke(main, words).exit_code == 0\n"
        "assert 'matplotlib' in sys.modules\n"
        "assert 'matplotlib.pyplot' not in sys.modules\n"
    )
    arguments = [str(LARCH), str(tmp_path / "sky.png")]
    result = subprocess.run(
        [sys.executable, "-c", code, *arguments], check=False, capture_output=True, text=True
    )
    assert result.returncode == 0, result.stderr
