"""magion: ionospheric magneto-ionic modes, and the hand to switch to.

The ionosphere splits every HF wave in two. Each command of the command line
is one call here that returns a frozen record:

    magion path       answer_path(...)
    magion day        answer_day(...)
    magion net        answer_net(...), partners from read_partners(...)
    magion station    answer_station(...), and the sky in its figure answer_sky(...)
    magion feed       answer_feed(...)
    magion antenna    answer_antenna(...)
    magion relay      answer_relay(...), the log from read_relay_log(...)
    magion sweep      sweep(...)
    magion field      answer_field(...)
    magion wave       answer_wave(...)

A Station, which most of them take, comes from read_station(...). Places are
Place(...) or parse_place(...), what is known of the ionosphere IonosphereInput(...).
Names are loaded when they are first used; importing the package costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from magion.answers.day import DayAnswer, answer_day
    from magion.answers.feed import FeedAnswer, answer_feed
    from magion.answers.inputs import IonosphereInput
    from magion.answers.net import NetAnswer, answer_net
    from magion.answers.path import answer_path
    from magion.answers.pattern import AntennaAnswer, answer_antenna
    from magion.answers.point import FieldAnswer, WaveAnswer, answer_field, answer_wave
    from magion.answers.records import PathAnswer
    from magion.answers.relay import RelayAnswer, answer_relay
    from magion.answers.sense import SenseAnswer, answer_station
    from magion.answers.sky import SkyAnswer, answer_sky
    from magion.answers.sweep import SweepRow, sweep
    from magion.antenna.station import Station
    from magion.errors import InputError, MagionError, OutsideModelError
    from magion.formats.partners import read_partners
    from magion.formats.relay_log import read_relay_log
    from magion.formats.station import read_station
    from magion.geometry import Place, parse_place
    from magion.polarization import Hand, Shape
    from magion.waves import Mode

__version__ = "0.1.0"

_HOMES = {
    "AntennaAnswer": "answers.pattern",
    "DayAnswer": "answers.day",
    "FeedAnswer": "answers.feed",
    "FieldAnswer": "answers.point",
    "Hand": "polarization",
    "InputError": "errors",
    "IonosphereInput": "answers.inputs",
    "MagionError": "errors",
    "Mode": "waves",
    "NetAnswer": "answers.net",
    "OutsideModelError": "errors",
    "PathAnswer": "answers.records",
    "Place": "geometry",
    "RelayAnswer": "answers.relay",
    "SenseAnswer": "answers.sense",
    "Shape": "polarization",
    "SkyAnswer": "answers.sky",
    "Station": "antenna.station",
    "SweepRow": "answers.sweep",
    "WaveAnswer": "answers.point",
    "answer_antenna": "answers.pattern",
    "answer_day": "answers.day",
    "answer_feed": "answers.feed",
    "answer_field": "answers.point",
    "answer_net": "answers.net",
    "answer_path": "answers.path",
    "answer_relay": "answers.relay",
    "answer_sky": "answers.sky",
    "answer_station": "answers.sense",
    "answer_wave": "answers.point",
    "parse_place": "geometry",
    "read_partners": "formats.partners",
    "read_relay_log": "formats.relay_log",
    "read_station": "formats.station",
    "sweep": "answers.sweep",
}

__all__ = [
    "AntennaAnswer",
    "DayAnswer",
    "FeedAnswer",
    "FieldAnswer",
    "Hand",
    "InputError",
    "IonosphereInput",
    "MagionError",
    "Mode",
    "NetAnswer",
    "OutsideModelError",
    "PathAnswer",
    "Place",
    "RelayAnswer",
    "SenseAnswer",
    "Shape",
    "SkyAnswer",
    "Station",
    "SweepRow",
    "WaveAnswer",
    "answer_antenna",
    "answer_day",
    "answer_feed",
    "answer_field",
    "answer_net",
    "answer_path",
    "answer_relay",
    "answer_sky",
    "answer_station",
    "answer_wave",
    "parse_place",
    "read_partners",
    "read_relay_log",
    "read_station",
    "sweep",
]


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module 'magion' has no attribute {name!r}")
    return getattr(import_module(f"magion.{_HOMES[name]}"), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
