"""``magion sweep`` end to end: resumed runs, wrong input, what is skipped."""

import pytest
from click.testing import CliRunner

from magion.cli import main

HEADER = "time_utc,from,to,frequency_mhz\n"
ROWS = [
    f'2026-06-21T{hour:02d}:{minute:02d}Z,"{place}",JN56qm,{mhz}\n'
    for hour, minute, place, mhz in [
        (8, 10, "47.10,10.85", 5.3),
        (8, 20, "47.10,10.85", 7.1),
        (9, 40, "45.80,12.90", 5.3),
        (10, 5, "47.10,10.85", 3.65),
        (8, 15, "45.80,12.90", 7.1),
    ]
]
BASE = ["--flux", "120", "--workers", "1"]


def run(*words):
    return CliRunner().invoke(main, ["sweep", *[str(w) for w in words]])


@pytest.fixture
def rows(tmp_path):
    file = tmp_path / "rows.csv"
    file.write_text(HEADER + "".join([*ROWS[:3], "broken,,,\n", *ROWS[3:]]), encoding="utf-8")
    return file


def test_rows_and_report(rows, tmp_path):
    out = tmp_path / "out.csv"
    result = run(rows, "--output", out, *BASE)
    assert result.exit_code == 0
    assert "magion: line 5 skipped" in result.stderr
    assert "5 rows answered, 1 skipped" in result.stderr
    lines = out.read_text("utf-8").splitlines()
    assert [x.split(",", 1)[0] for x in lines] == ["line", "2", "3", "4", "6", "7"]
    assert sorted(p.name for p in tmp_path.iterdir()) == ["out.csv", "rows.csv"]


def test_an_interrupted_run_goes_on_and_ends_the_same(rows, tmp_path, monkeypatch):
    whole = tmp_path / "whole.csv"
    assert run(rows, "--output", whole, *BASE).exit_code == 0
    monkeypatch.setattr("magion.answers.sweep.PORTION", 2)
    from magion.cli import sweep as face

    plain = face._Run.write

    def write(self, row):
        plain(self, row)
        if self.rows == 3:
            raise KeyboardInterrupt

    out = tmp_path / "out.csv"
    with monkeypatch.context() as patch:
        patch.setattr(face._Run, "write", write)
        broken = run(rows, "--output", out, *BASE)
    assert broken.exit_code == 130
    assert not out.exists()
    partial = tmp_path / "out.csv.partial"
    kept = partial.read_bytes()
    assert kept.count(b"\n") == 4
    partial.write_bytes(kept + b"7,2026-06")  # a row cut in the middle
    again = run(rows, "--output", out, *BASE)
    assert again.exit_code == 0, again.output
    assert out.read_bytes() == whole.read_bytes()
    assert "line 5 skipped" in again.stderr
    assert not partial.exists()


def test_a_partial_output_of_another_run_is_refused(rows, tmp_path):
    out = tmp_path / "out.csv"
    (tmp_path / "out.csv.partial").write_text("line\n2\n", encoding="utf-8")
    result = run(rows, "--output", out, *BASE)
    assert result.exit_code == 2
    assert "belongs to another run" in result.stderr
    assert (tmp_path / "out.csv.partial").read_text("utf-8") == "line\n2\n"


@pytest.mark.parametrize(
    ("words", "what"),
    [
        (["--output", "{tmp}/o.csv", "--workers", "0"], "number of workers"),
        (["--output", "{tmp}/o.csv", "--workers", "2", "--scheduler", "tcp://x:1"], "contradict"),
        (["--output", "{tmp}/none/o.csv"], "folder"),
        (["--output", "{tmp}"], "not a regular file"),
        ([], "--output"),
        (["--output", "{tmp}/o.csv", "--step", "7", "--workers", "1"], "does not divide a day"),
        (["--output", "{tmp}/o.csv", "--step", "0.5"], "the step"),
        (["--output", "{tmp}/o.csv", "--fof2", "5", "--workers", "1"], "of one instant"),
    ],
)
def test_wrong_input_is_one_line(rows, tmp_path, words, what):
    result = run(rows, *[w.format(tmp=tmp_path) for w in words])
    assert result.exit_code == 2
    assert what in result.stderr
    assert len(result.stderr.splitlines()) == 1
    assert not (tmp_path / "o.csv").exists()


def test_a_file_that_is_not_there(tmp_path):
    result = run(tmp_path / "none.adi", "--output", tmp_path / "o.csv", "--workers", "1")
    assert result.exit_code == 2
    assert "does not exist" in result.stderr
    assert not list(tmp_path.iterdir())
