"""The examples run and say what they promise."""

import runpy
from pathlib import Path

from click.testing import CliRunner

from magion.cli import main

EXAMPLES = Path(__file__).parents[2] / "examples"


def test_one_path(capsys):
    runpy.run_path(str(EXAMPLES / "one_path.py"), run_name="__main__")
    assert "Receive LHCP" in capsys.readouterr().out


def test_hands_around(capsys):
    runpy.run_path(str(EXAMPLES / "hands_around.py"), run_name="__main__")
    rows = capsys.readouterr().out.splitlines()[1:]
    hands = [row.split()[-4:-2] for row in rows]
    assert len(rows) == 8
    # north of the dip equator the far partner to the magnetic north comes in the other way
    assert hands[0] == ["RHCP", "LHCP"]
    assert hands[1] == hands[2] == hands[3] == ["LHCP", "RHCP"]
    # in the south it is the far partner to the south
    assert hands[7] == ["LHCP", "RHCP"]
    assert hands[4] == hands[5] == hands[6] == ["RHCP", "LHCP"]


def test_profile_of_the_demo():
    tokens = ["path", "46.50,11.35", "47.10,10.85", "-f", "5.3", "--time", "2026-06-21T12:00Z"]
    result = CliRunner().invoke(main, [*tokens, "--profile", str(EXAMPLES / "profile.csv")])
    assert result.exit_code == 0
    assert "measured profile profile.csv" in " ".join(result.output.split())
