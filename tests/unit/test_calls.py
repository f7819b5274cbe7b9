"""The calls of the library: one for each command, loaded when first used."""

import ast
import inspect
from importlib import import_module
from pathlib import Path

import pytest

import magion
from magion.cli import main

ROOT = Path(magion.__file__).parent
COMMANDS = main.list_commands(None)
CALLS = {c: "sweep" if c == "sweep" else f"answer_{c}" for c in COMMANDS}


@pytest.mark.parametrize("command", COMMANDS)
def test_each_command_has_its_call(command):
    call = getattr(magion, CALLS[command])
    assert callable(call)
    assert CALLS[command] in magion.__all__
    # The command makes no other answer than that of the library.
    source = (ROOT / "cli" / f"{command}.py").read_text(encoding="utf-8")
    imported = {
        alias.name
        for node in ast.walk(ast.parse(source))
        if isinstance(node, ast.ImportFrom) and node.module == call.__module__
        for alias in node.names
    }
    assert CALLS[command] in imported
    listed = [line.split() for line in magion.__doc__.splitlines() if "    magion " in line]
    told = [" ".join(words[2:]) for words in listed if words[1] == command]
    assert len(told) == 1
    assert f"{CALLS[command]}(...)" in told[0]


@pytest.mark.parametrize("command", [c for c in COMMANDS if c != "sweep"])
def test_each_record_that_a_call_returns_has_a_name_here(command):
    returned = inspect.signature(getattr(magion, CALLS[command])).return_annotation
    name = returned if isinstance(returned, str) else returned.__name__
    assert name in magion.__all__


def test_names_are_listed_once_and_come_from_their_homes():
    assert magion.__all__ == sorted(set(magion.__all__))
    assert set(magion.__all__) == set(magion._HOMES)
    assert set(magion.__all__) <= set(dir(magion))
    for name, home in magion._HOMES.items():
        found = getattr(magion, name)
        assert found is getattr(import_module(f"magion.{home}"), name)
        assert found.__module__ == f"magion.{home}"
    with pytest.raises(AttributeError, match="no attribute 'answer_nothing'"):
        _ = magion.answer_nothing


def test_type_checkers_see_the_same_names():
    tree = ast.parse((ROOT / "__init__.py").read_text(encoding="utf-8"))
    (guarded,) = (node for node in tree.body if isinstance(node, ast.If))
    seen = {
        alias.name: node.module.removeprefix("magion.")
        for node in guarded.body
        for alias in node.names
    }
    assert seen == magion._HOMES


def test_a_station_and_a_net_are_read_by_one_call_each():
    examples = ROOT.parent / "examples"
    larch = magion.read_station(examples / "larch_hut.toml")
    assert isinstance(larch, magion.Station)
    assert len(magion.read_partners(examples / "net_alps.csv")) == 5
    answer = magion.answer_feed(5.3, larch)
    assert isinstance(answer, magion.FeedAnswer)
    assert answer.positions[0].hand is magion.Hand.LEFT
