"""The demo stations and whole commands, for the tests of the faces.

Commands of one path, ionosphere and frequency trace their rays once: what the
stations and the forms of the answer change comes after that.
"""

import functools
from importlib import import_module
from pathlib import Path

import numpy as np
from click.testing import CliRunner

from magion.cli import main
from magion.rays.link import Link

EXAMPLES = Path(__file__).parents[1] / "examples"
LARCH, CEDAR = EXAMPLES / "larch_hut.toml", EXAMPLES / "cedar_ridge.toml"

JUNE, DECEMBER = "2026-06-21T12:00Z", "2026-12-21T15:00Z"
NEAR = ["47.10,10.85", "46.50,11.35"]
SOUTH = ["40.2S,71.6W", "41.0S,71.3W"]
DEMO = [*NEAR, "-f", "5.3", "--time", JUNE, "--flux", "130"]

_LARCH = LARCH.read_text(encoding="utf-8")
_RECEIVER = """
[station]
place = "46.50,11.35"
[antenna]
kind = "{kind}"
height_m = {height}
{more}
[ground]
class = "average"
{rest}
"""
LABELS = '[relay]\nleft = { delayed = "E" }\nright = { delayed = "N" }\n'
ARMS = "arms = { N = 0.0, E = 90.0 }"

STATIONS = {
    # Line and leads together a half wave of cable at 5.3 MHz.
    "half-wave line": _LARCH.replace("# line_length_m = 9.18", "line_length_m = 18.517"),
    "loops": _RECEIVER.format(
        kind="crossed-loops",
        height=1.5,
        more=ARMS,
        rest=f'[feed]\nkind = "digital"\nphase_error_deg = 3.0\n{LABELS}',
    ),
    "hybrid": _RECEIVER.format(
        kind="crossed-dipoles",
        height=8.0,
        more=f"leg_length_m = 13.6\n{ARMS}",
        rest=f'[feed]\nkind = "hybrid"\namplitude_error_db = 0.5\n{LABELS}',
    ),
    "long leads": _LARCH.replace("leads_m = 0.15 ", "leads_m = 5.0 "),
    "combiner": _LARCH.replace('kind = "tee"', 'kind = "combiner"'),
    "receive only": _LARCH.replace("# receive_only = false", "receive_only = true"),
    "single dipole": _RECEIVER.format(
        kind="dipole", height=9.0, more="resonant_mhz = 5.3\narms = { A = 20.0 }", rest=""
    ),
    "long names": _LARCH.replace('"Larch Hut"', f'"{"Larch Hut ".ljust(60, "x")}"')
    .replace('"B"', '"east-south-east legs"')
    .replace('"A"', '"north-north-east leg"')
    .replace("A = 20.0, B = 110.0", '"north-north-east leg" = 20.0, "east-south-east legs" = 110.0')
    .replace("left =", f'"{"left hand, for O".ljust(20, "x")}" =')
    .replace("right =", f'"{"right hand, for X".ljust(20, "x")}" =')
    .replace("wire_a =", f'"{"wire to the north".ljust(20, "x")}" ='),
}


def run(*tokens):
    """A command as a user types it."""
    return CliRunner().invoke(main, [str(t) for t in tokens])


def refused(*tokens):
    """The one line of a refusal."""
    result = run(*tokens)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    lines = result.stderr.strip().splitlines()
    assert len(lines) == 1, result.stderr
    assert lines[0].startswith("magion: ")
    assert "Traceback" not in result.stderr
    return lines[0]


@functools.cache
def said(*tokens):
    """What a command writes to the terminal; nothing on standard error."""
    result = run(*tokens)
    assert result.exit_code == 0, result.output
    assert result.stderr == ""
    return result.stdout


def _key(value):
    """Something to know an argument by; what has no value of its own is itself only."""
    if isinstance(value, Link):  # names of places do not matter to rays
        ends = value.transmitter, value.receiver
        return tuple((place.latitude_deg, place.longitude_deg) for place in ends)
    if isinstance(value, list | tuple | set):
        return tuple(map(_key, value))
    if isinstance(value, np.ndarray):
        return value.shape, value.tobytes()
    try:
        hash(value)
    except TypeError:
        return "object", id(value)
    return value if type(value).__eq__ is not object.__eq__ else ("object", id(value))


@functools.cache
def _once(function):
    kept = {}

    @functools.wraps(function)
    def ask(*arguments, **named):
        key = _key(arguments), _key(sorted(named.items(), key=lambda pair: pair[0]))
        if key not in kept:
            # The arguments are kept as well: an id is theirs only while they live.
            kept[key] = function(*arguments, **named), arguments, named
        return kept[key][0]

    return ask


TRACED = {
    "path": ("scene_of", "find_modes", "path_mufs"),
    "day": ("scene_of", "interpolated_mufs", "rays_of"),
    "net": ("scene_of", "interpolated_mufs", "rays_of"),
}


@functools.cache
def traced_once(module, name):
    return _once(getattr(import_module(f"magion.answers.{module}"), name))
