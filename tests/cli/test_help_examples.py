"""Every command explains itself with an example, and the example runs."""

import shlex
from pathlib import Path

import pytest
from click.testing import CliRunner

from magion.cli import _COMMANDS, main

ROOT = Path(__file__).parents[2]


def examples(command):
    """Lines of a command's help that begin with its call."""
    text = CliRunner().invoke(main, [command, "--help"]).stdout.replace("\\\n", " ")
    lines, found = text.splitlines(), []
    for i, line in enumerate(lines):
        if line.strip().startswith(f"magion {command} "):
            whole = line.strip()
            # click wraps long lines of the block at the indent
            while (
                i + 1 < len(lines)
                and lines[i + 1].startswith("      ")
                and "magion " not in (lines[i + 1])
            ):
                i += 1
                whole += " " + lines[i].strip()
            found.append(whole)
    return found


@pytest.mark.parametrize("command", list(_COMMANDS))
def test_example_of_the_help_runs(command, tmp_path, monkeypatch):
    calls = examples(command)
    assert calls, f"magion {command} --help shows no example"
    (tmp_path / "examples").symlink_to(ROOT / "examples")
    monkeypatch.chdir(tmp_path)
    for call in calls:
        words = shlex.split(call)[1:]
        if command in ("day", "relay") and "--plan" not in words:
            words += ["--step", "120"] if command == "day" else []
        result = CliRunner().invoke(main, words)
        assert result.exit_code == 0, result.output
        assert "Traceback" not in result.output
        for option in ("--plot", "--output"):
            if option in words:
                assert (tmp_path / words[words.index(option) + 1]).stat().st_size > 0
