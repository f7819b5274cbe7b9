"""The examples run and say what they promise."""

import runpy
from pathlib import Path

import pytest
from click.testing import CliRunner

from magion.cli import main
from tests.demo import DEMO, LARCH, said

ROOT = Path(__file__).parents[2]
EXAMPLES, PICTURES = ROOT / "examples", ROOT / "docs" / "pictures"


def run_main(name, *arguments):
    """An example with fewer steps than it takes by itself."""
    runpy.run_path(str(EXAMPLES / name))["main"](*arguments)


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


def test_pictures(tmp_path):
    run_main("pictures.py", tmp_path / "pictures", 120.0)
    drawn = {f.name: f.read_bytes() for f in (tmp_path / "pictures").iterdir()}
    assert set(drawn) == {"day.png", "antenna.png", "sky.png", "wall_table.txt"}
    assert set(drawn) == {f.name for f in PICTURES.iterdir()}
    for name, content in drawn.items():
        shipped = (PICTURES / name).read_bytes()
        assert len(shipped) < 200_000
        if name.endswith(".png"):
            assert content.startswith(b"\x89PNG")
            assert shipped.startswith(b"\x89PNG")
            # As wide and as high; the content of the day hangs on its steps.
            assert content[16:24] == shipped[16:24]

    def table(content):
        """The wall table without what hangs on the climatology."""
        lines = content.decode("utf-8").splitlines()
        return [line for line in lines if not line.startswith(("Overhead: foF2", "(CCIR"))]

    assert table(drawn["wall_table.txt"]) == table((PICTURES / "wall_table.txt").read_bytes())


def test_readme_shows_the_pictures_that_the_examples_make():
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    assert "](docs/pictures/day.png)" in text
    table = (PICTURES / "wall_table.txt").read_text(encoding="utf-8")
    assert f"```\n{table}```\n" in text


@pytest.mark.usefixtures("once")
def test_readme_quotes_the_answer_of_the_demo_station():
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    first = said("path", *DEMO, "--station", LARCH).split("\n\n")[0]
    assert f"```\n{first}\n```\n" in text


def test_two_nets(capsys):
    run_main("two_nets.py", 1)
    lines = capsys.readouterr().out.splitlines()
    assert [line.split(",")[0] for line in lines[::2]] == ["Larch Hut", "Cedar Ridge"]
    assert all("serves 1 of 1" in line for line in lines[::2])
    assert [line.split()[0] for line in lines[1::2]] == ["Scree", "Puma"]
