"""magion: ionospheric magneto-ionic modes, and the hand to switch to.

The ionosphere splits every HF wave in two. Each command of the command line
is one call here that returns a frozen record:

    magion path     answer_path(...)
    magion field    answer_field(...)
    magion wave     answer_wave(...)

Names are loaded when they are first used; importing the package costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from magion.answers.inputs import IonosphereInput
    from magion.answers.path import answer_path
    from magion.answers.point import FieldAnswer, WaveAnswer, answer_field, answer_wave
    from magion.answers.records import PathAnswer
    from magion.errors import InputError, MagionError, OutsideModelError
    from magion.geometry import Place, parse_place
    from magion.polarization import Hand, Shape
    from magion.waves import Mode

__version__ = "0.1.0"

_HOMES = {
    "FieldAnswer": "answers.point",
    "Hand": "polarization",
    "InputError": "errors",
    "IonosphereInput": "answers.inputs",
    "MagionError": "errors",
    "Mode": "waves",
    "OutsideModelError": "errors",
    "PathAnswer": "answers.records",
    "Place": "geometry",
    "Shape": "polarization",
    "WaveAnswer": "answers.point",
    "answer_field": "answers.point",
    "answer_path": "answers.path",
    "answer_wave": "answers.point",
    "parse_place": "geometry",
}

__all__ = [
    "FieldAnswer",
    "Hand",
    "InputError",
    "IonosphereInput",
    "MagionError",
    "Mode",
    "OutsideModelError",
    "PathAnswer",
    "Place",
    "Shape",
    "WaveAnswer",
    "answer_field",
    "answer_path",
    "answer_wave",
    "parse_place",
]


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module 'magion' has no attribute {name!r}")
    return getattr(import_module(f"magion.{_HOMES[name]}"), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
