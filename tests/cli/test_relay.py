"""``magion relay`` end to end with the demo logs, and with wrong input."""

import csv
import importlib.util
import io
import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from magion.cli import main

EXAMPLES = Path(__file__).parents[2] / "examples"
STATION = ["--station", str(EXAMPLES / "larch_hut.toml")]
PARTNERS = ["--partners", str(EXAMPLES / "net_alps.csv")]
SWAPPED = [str(EXAMPLES / "relay_swapped.csv"), *STATION, *PARTNERS]
READINGS = ["--readings", str(EXAMPLES / "relay_readings.csv")]


def run(*words):
    return CliRunner().invoke(main, ["relay", *words])


def test_the_swapped_demo_log_is_called_swapped():
    result = run(*SWAPPED, *READINGS, "--format", "json")
    assert result.exit_code == 0
    answer = json.loads(result.stdout)
    assert answer["verdict"] == "swapped"
    # drawn with 22 dB
    assert answer["rejection_low_db"] <= 22.0 <= answer["rejection_high_db"]
    assert answer["rows_read"] == len(answer["rows"])
    text = run(*SWAPPED, *READINGS).stdout
    assert text.startswith("Your relay is reversed")
    assert max(len(line) for line in text.splitlines()) <= 80


def test_the_ambiguous_demo_log_is_called_ambiguous():
    result = run(str(EXAMPLES / "relay_ambiguous.csv"), *STATION, *PARTNERS, "--flux", "120")
    assert result.exit_code == 0
    assert result.stdout.startswith("Not enough to say")


def test_the_demo_logs_are_what_their_script_draws(tmp_path):
    spec = importlib.util.spec_from_file_location("relay_logs", EXAMPLES / "relay_logs.py")
    script = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(script)
    script.main(tmp_path)
    for name in ("relay_swapped.csv", "relay_ambiguous.csv"):
        drawn = list(csv.reader(io.StringIO((tmp_path / name).read_text("utf-8"))))
        kept = list(csv.reader(io.StringIO((EXAMPLES / name).read_text("utf-8"))))
        assert [r[:3] for r in drawn] == [r[:3] for r in kept]
        for one, other in zip(drawn[2:], kept[2:], strict=True):
            # another machine's last bit may tip the first decimal
            assert all(
                abs(float(a) - float(b)) < 0.11 for a, b in zip(one[3:], other[3:], strict=True)
            )


def test_rows_that_say_nothing_are_named(tmp_path):
    log = tmp_path / "log.csv"
    log.write_text(
        "time_utc,partner,frequency_mhz,level_RHCP_s,level_lhcp_s\n"
        '2026-12-21T02:00Z,"47.10,10.85",28.0,9,7\n'
        '2026-12-21T02:00Z,"47.10,10.85",28.0,,7\n',
        encoding="utf-8",
    )
    result = run(str(log), "--at", "46.5,11.35", "--flux", "120")
    assert result.exit_code == 0
    assert "no wave expected" in result.stdout
    assert "a reading is missing" in result.stdout
    assert result.stdout.startswith("Not enough to say: no row")


def test_plan_of_a_telling_evening():
    ends = ["--plan", "47.10,10.85", "Larch Hut"]
    words = [*ends, "-f", "5.3", "-f", "3.65", "--time", "2026-12-21", *STATION, *READINGS]
    result = run(*words)
    assert result.exit_code == 0
    assert result.stdout.startswith("Test on 5.300 MHz from 16:")
    assert "right should be the louder" in " ".join(result.stdout.split())
    assert "No relay position has a hand on 3.65 MHz" in " ".join(result.stdout.split())


@pytest.mark.parametrize(
    ("words", "what"),
    [
        ([], "no log is given"),
        ([*SWAPPED, "--plan", "47.1,10.85", "46.5,11.35"], "give one"),
        (["--plan", "47.1,10.85", "46.5,11.35"], "needs a frequency"),
        ([*SWAPPED, "-f", "5.3"], "go with --plan"),
        ([*SWAPPED, "--noise", "0.1"], "the noise"),
        ([SWAPPED[0], *PARTNERS], "where the log was taken"),
        ([SWAPPED[0], *PARTNERS, "--at", "46.5,11.35"], "position 'left' of the log is not known"),
        ([SWAPPED[0], *STATION], "partner"),
        (["none.csv", *STATION], "does not exist"),
    ],
)
def test_wrong_input_is_one_line(words, what):
    result = run(*words)
    assert result.exit_code == 2
    assert what in result.stderr
    assert len(result.stderr.splitlines()) == 1
    assert result.stdout == ""
