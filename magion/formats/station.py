"""Files of a station: antenna, ground, feed and relay, in TOML."""

import math
import re
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Final, NamedTuple

from magion.antenna.elements import HALF_WAVE_LEG
from magion.antenna.feed import quarter_wave
from magion.antenna.station import (
    Antenna,
    AntennaKind,
    Arm,
    Feed,
    FeedKind,
    MeasuredImpedance,
    RelayPosition,
    Station,
)
from magion.constants import SPEED_OF_LIGHT
from magion.errors import InputError
from magion.formats.tables import printable, printable_name, read_text
from magion.geometry import PLACE_FORMS, Place, parse_place
from magion.ground import CLASSES, Ground

LARGEST_STATION: Final = 64 * 2**10
"""Greatest size of a station's file [bytes]."""

LONGEST_LINE: Final = 1000
"""Longest line of a station's file; a key of very many dots would fill the memory [1]."""

LOWEST_WIRE_END: Final = 0.1
"""Least height of the ends of an inverted vee above the ground [m]."""

RIGHT_ANGLE_WITHIN_DEG: Final = 5.0
"""How far from a right angle two arms may cross [deg]."""

MOST_POSITIONS: Final = 8
"""Greatest number of relay positions [1]."""

_LONGEST_MESSAGE = 200
_LONGEST_NAME, _LONGEST_STATION_NAME = 20, 60
_NEEDED = {
    "station": "place",
    "antenna": "kind, height_m, resonant_mhz or leg_length_m, and arms",
    "ground": "class, or permittivity and conductivity_s_per_m",
    "feed": "kind",
    "relay": 'its positions, as left = { delayed = "B" }',
}
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_PARSER_SAYS = re.compile(
    r"(.*?)(?: \(at (?:line (\d+), column \d+|end of document)\))?", re.DOTALL
)


class _Range(NamedTuple):
    """Numbers that a key accepts, in the key's own unit, and its default."""

    low: float
    high: float
    unit: str = ""
    default: float | None = None

    @property
    def accepted(self) -> str:
        return f"{self.low:g} to {self.high:g}{self.unit and ' '}{self.unit}"


_RANGES = {
    "height_m": _Range(0.5, 200.0, "m"),
    "resonant_mhz": _Range(0.5, 60.0, "MHz"),
    "leg_length_m": _Range(0.3, 200.0, "m"),
    "wire_diameter_mm": _Range(0.1, 200.0, "mm", 2.0),
    "resistance_ohm": _Range(1.0, 5000.0, "ohm"),
    "reactance_ohm": _Range(-5000.0, 5000.0, "ohm", 0.0),
    "quality_factor": _Range(1.0, 200.0),
    "permittivity": _Range(1.0, 100.0),
    "conductivity_s_per_m": _Range(0.0, 10.0, "S/m"),
    "velocity_factor": _Range(0.4, 1.0, "", 0.66),
    "impedance_ohm": _Range(10.0, 1000.0, "ohm", 50.0),
    "radio_ohm": _Range(10.0, 1000.0, "ohm", 50.0),
    "line_length_m": _Range(0.01, 500.0, "m"),
    "leads_m": _Range(0.0, 10.0, "m", 0.0),
    "feeder_m": _Range(0.0, 500.0, "m", 0.0),
    "loss_db_per_100m": _Range(0.0, 50.0, "dB", 0.0),
    "phase_error_deg": _Range(-90.0, 90.0, "degrees", 0.0),
    "amplitude_error_db": _Range(-20.0, 20.0, "dB", 0.0),
}
_BEARING = _Range(-360.0, 360.0, "degrees, the true bearing")
_STATION_KEYS = ("name", "place")
_WIRE_KEYS = ("leg_length_m", "wire_diameter_mm")
_MEASURED_KEYS = ("resistance_ohm", "reactance_ohm", "quality_factor")
_ANTENNA_KEYS = (
    "kind", "height_m", "resonant_mhz", *_WIRE_KEYS, "apex_angle_deg", "arms", *_MEASURED_KEYS,
)  # fmt: skip
_GROUND_KEYS = ("class", "permittivity", "conductivity_s_per_m")
_LINE_KEYS = ("line_length_m", "leads_m")
_ERROR_KEYS = ("phase_error_deg", "amplitude_error_db")
_FEED_KEYS = (
    "kind", "velocity_factor", "impedance_ohm", "radio_ohm", *_LINE_KEYS, "feeder_m",
    "loss_db_per_100m", *_ERROR_KEYS, "receive_only",
)  # fmt: skip


@dataclass(frozen=True, slots=True, kw_only=True)
class _Section:
    """One section of a file, and what can be wrong with it."""

    file: str
    name: str
    values: dict[str, object]

    def error(self, key: str, what: str) -> InputError:
        """An error that names file, section and key."""
        return _fault(self.file, f"[{self.name}] {key} {what}")

    def only(self, accepted: Iterable[str], known: Iterable[str], kind: str = "") -> None:
        """Refuse keys that are unknown, or that do not go with a kind."""
        wanted = tuple(accepted)
        for key in self.values:
            if key not in wanted:
                what = f"does not go with {kind}" if key in known else "is unknown"
                raise self.error(_key(key), f"{what}; accepted: {', '.join(wanted)}")

    def choice(self, key: str, accepted: Iterable[str], default: str | None = None) -> str:
        """One of several words."""
        wanted = tuple(accepted)
        listed = f"accepted: {', '.join(wanted)}"
        if key not in self.values:
            if default is None:
                raise self.error(key, f"is missing; {listed}")
            return default
        value = self.values[key]
        if not isinstance(value, str) or value not in wanted:
            raise self.error(key, f"is {_shown(value)}; {listed}")
        return value

    def number(self, key: str) -> float:
        """A number of a key with a range, in the key's unit; absent, its default."""
        found = self.optional(key)
        if found is None:
            raise self.error(key, f"is missing; accepted: {_RANGES[key].accepted}")
        return found

    def optional(self, key: str) -> float | None:
        """The same, None where it is absent and has no default."""
        wanted = _RANGES[key]
        return self.within(key, self.values[key], wanted) if key in self.values else wanted.default

    def within(self, key: str, value: object, wanted: _Range) -> float:
        """A value as a number within a range."""
        if isinstance(value, bool) or not isinstance(value, int | float):
            kind = "the text " if isinstance(value, str) else ""
            what = f"is {kind}{_shown(value)}; accepted: a number, {wanted.accepted}"
            raise self.error(key, what)
        if not wanted.low <= value <= wanted.high:
            raise self.error(key, f"is {_shown(value)}; accepted: {wanted.accepted}")
        return float(value) + 0.0  # no negative zero


def _short(text: str, longest: int) -> str:
    safe = printable(text)
    return safe if len(safe) <= longest else safe[: longest - 3] + "..."


def _key(key: str) -> str:
    """A key as the file writes it: quoted where TOML asks for it."""
    bare = _BARE_KEY.fullmatch(key)
    return _short(key, _LONGEST_NAME) if bare else f"'{_short(key, _LONGEST_NAME)}'"


def _shown(value: object) -> str:
    """A value for messages, near to how the file writes it."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, int):
        return str(value) if abs(value) < 10**15 else "a number of very many digits"
    if isinstance(value, float):
        return repr(value)
    if isinstance(value, str):
        return f"'{_short(value, 40)}'"
    if isinstance(value, dict):
        return "a table"
    return "an array" if isinstance(value, list) else _short(str(value), 40)


def _fault(file: str, what: str) -> InputError:
    """An error of one short line; of a long name of a file, the end stays."""
    room = max(_LONGEST_MESSAGE - len(what) - 2, 18)
    return InputError(f"{file if len(file) <= room else '...' + file[3 - room :]}: {what}")


def read_station(path: str | Path) -> Station:
    """Read a station.

    Parameters
    ----------
    path : str or Path
        TOML with the sections station, antenna, ground, feed and relay;
        docs/formats.md explains every key.

    Returns
    -------
    Station
        The station, in SI.

    Raises
    ------
    InputError
        If the file is not such a station; the message names the key, and of
        a fault in the TOML the line.
    """
    text = read_text(path, "a TOML file of a station", LARGEST_STATION)
    return station_of(text, str(path))


def station_of(text: str, name: str) -> Station:
    """A station of a TOML text.

    Parameters
    ----------
    text : str
        The text, as for :func:`read_station`.
    name : str
        Name of the file, for messages.

    Returns
    -------
    Station
        The station, in SI.

    Raises
    ------
    InputError
        If the text is not such a station.

    Examples
    --------
    >>> text = '''
    ... station.place = "46.50,11.35"
    ... ground.class = "average"
    ... [antenna]
    ... kind = "dipole"
    ... height_m = 9.0
    ... resonant_mhz = 5.3
    ... arms = { A = 20.0 }
    ... '''
    >>> station_of(text, "hut.toml").antenna.height
    9.0
    """
    file = printable_name(name)
    document = _document(text, file)
    place = _place(_section(document, file, "station"))
    antenna = _antenna(_section(document, file, "antenna"))
    ground, ground_name = _ground(_section(document, file, "ground"))
    crossed = antenna.kind.is_crossed
    feed = _feed(_section(document, file, "feed", optional=not crossed), antenna)
    relay = _relay(_section(document, file, "relay", optional=not crossed), antenna.arms)
    return Station(
        name=place.name,
        place=place,
        antenna=antenna,
        ground=ground,
        ground_name=ground_name,
        feed=feed,
        relay=relay,
    )


def _document(text: str, file: str) -> dict[str, object]:
    """The sections of a TOML text."""
    for line, content in enumerate(text.split("\n"), 1):
        if len(content) > LONGEST_LINE:
            raise _fault(file, f"line {line} is too long; accepted: {LONGEST_LINE} signs a line")
    example = 'accepted: TOML, as height_m = 9.0 or kind = "tee"'
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        says = _PARSER_SAYS.fullmatch(str(error))
        reason, line_said = says.groups() if says else (str(error), None)
        where = line_said or text.rstrip("\n").count("\n") + 1
        told = f"{reason[:1].lower()}{reason[1:]}"
        raise _fault(file, f"line {where} is not TOML: {_short(told, 70)}; {example}") from None
    except (ValueError, RecursionError):
        what = "a number is too long, or brackets lie too deep"
        raise _fault(file, f"{what}; {example}") from None
    listed = f"accepted: {', '.join(f'[{s}]' for s in _NEEDED)}"
    for key, value in document.items():
        if key not in _NEEDED:
            raise _fault(
                file,
                f"section [{_key(key)}] is unknown; {listed}"
                if isinstance(value, dict)
                else f"{_key(key)} stands in no section; {listed}",
            )
    return document


def _section(
    document: dict[str, object], file: str, name: str, *, optional: bool = False
) -> _Section:
    if name not in document and not optional:
        raise _fault(file, f"section [{name}] is missing; accepted: [{name}] with {_NEEDED[name]}")
    values = document.get(name, {})
    if not isinstance(values, dict):
        raise _fault(file, f"[{name}] is {_shown(values)}; accepted: a section [{name}] with keys")
    return _Section(file=file, name=name, values=values)


def _is_name(text: str, longest: int) -> bool:
    return 1 <= len(text) <= longest and text.isprintable() and text == text.strip()


def _name_form(longest: int) -> str:
    return f"accepted: 1 to {longest} printable signs, no space at either end"


def _place(section: _Section) -> Place:
    section.only(_STATION_KEYS, _STATION_KEYS)
    name = section.values.get("name")
    if name is not None and not (isinstance(name, str) and _is_name(name, _LONGEST_STATION_NAME)):
        raise section.error("name", f"is {_shown(name)}; {_name_form(_LONGEST_STATION_NAME)}")
    if "place" not in section.values:
        raise section.error("place", f"is missing; accepted: {PLACE_FORMS}")
    text = section.values["place"]
    refusal = f"is {_shown(text)}; accepted: {PLACE_FORMS}"
    if not isinstance(text, str) or len(text) > 40 or not text.isprintable():
        raise section.error("place", refusal)
    try:
        return parse_place(text, name)
    except InputError as error:
        if str(error).startswith("place "):  # the form is right, a coordinate out of range
            refusal = f"is {_shown(text)}: {str(error).partition(': ')[2]}"
        raise section.error("place", refusal) from None


def _antenna(section: _Section) -> Antenna:
    kind = AntennaKind(section.choice("kind", (k.value for k in AntennaKind)))
    refused = {*(_WIRE_KEYS if kind.is_loops else ()), *(() if kind.is_vee else ["apex_angle_deg"])}
    accepted = [k for k in _ANTENNA_KEYS if k not in refused]
    section.only(accepted, _ANTENNA_KEYS, f"kind {kind.value}")
    height = section.number("height_m")
    resonant_mhz, leg = section.optional("resonant_mhz"), section.optional("leg_length_m")
    resonant = None if resonant_mhz is None else _hertz(resonant_mhz)
    if not kind.is_loops and (resonant is None) == (leg is None):
        fault = "and leg_length_m are both there" if leg else "is missing"
        either = (f"{k} ({_RANGES[k].accepted})" for k in ("resonant_mhz", "leg_length_m"))
        raise section.error("resonant_mhz", f"{fault}; accepted: {' or '.join(either)}")
    apex_deg = _apex_deg(section) if kind.is_vee else 180.0
    if kind.is_vee:
        length = HALF_WAVE_LEG * SPEED_OF_LIGHT / resonant if resonant else leg or 0.0
        # To the micrometre, so that no rounding refuses the height that a message names.
        least = round(length * math.cos(math.radians(0.5 * apex_deg)) + LOWEST_WIRE_END, 6)
        if height < least:
            wanted = _RANGES["height_m"]._replace(low=math.ceil(round(least * 100.0, 4)) / 100.0)
            raise section.error(
                "height_m",
                f"is {_shown(section.values['height_m'])}: the wire ends would hang lower than "
                f"{LOWEST_WIRE_END:g} m; accepted: {wanted.accepted}",
            )
    return Antenna(
        kind=kind,
        height=height,
        arms=_arms(section, kind),
        resonant_frequency=resonant,
        leg_length=leg,
        wire_diameter=section.number("wire_diameter_mm") / 1e3,
        apex_angle=math.radians(apex_deg),
        measured=_measured(section, resonant),
    )


def _hertz(mhz: float) -> float:
    return round(mhz * 1e6, 3)


def _apex_deg(section: _Section) -> float:
    value = section.values.get("apex_angle_deg")
    accepted = "accepted: a number of degrees above 90 and below 180"
    if value is None:
        raise section.error("apex_angle_deg", f"is missing; {accepted}")
    if isinstance(value, bool) or not isinstance(value, int | float) or not 90.0 < value < 180.0:
        raise section.error("apex_angle_deg", f"is {_shown(value)}; {accepted}")
    return float(value)


def _arms(section: _Section, kind: AntennaKind) -> tuple[Arm, ...]:
    count = 2 if kind.is_crossed else 1
    two, one = "two arms with true bearings", "one arm with its true bearing"
    form = f"{two}, as {{ A = 20.0, B = 110.0 }}" if count == 2 else f"{one}, as {{ A = 20.0 }}"
    accepted = f"accepted: for {kind.value} {form}"
    table = section.values.get("arms")
    if table is None:
        raise section.error("arms", f"is missing; {accepted}")
    if not isinstance(table, dict) or len(table) != count:
        fault = f"has {len(table)}" if isinstance(table, dict) else f"is {_shown(table)}"
        raise section.error("arms", f"{fault}; {accepted}")
    for name in table:
        if not _is_name(name, _LONGEST_NAME):
            raise section.error(f"arms.{_key(name)}", f"is no name; {_name_form(_LONGEST_NAME)}")
    degrees = [section.within(f"arms.{_key(n)}", d, _BEARING) for n, d in table.items()]
    if count == 2:
        apart = abs(degrees[0] - degrees[1]) % 180.0
        if abs(apart - 90.0) > RIGHT_ANGLE_WITHIN_DEG + 1e-9:
            raise section.error(
                "arms",
                f"cross at {min(apart, 180.0 - apart):.4g} degrees; accepted: 90 within "
                f"{RIGHT_ANGLE_WITHIN_DEG:g}, since only at right angles may their mutual "
                "coupling be neglected",
            )
    turned = (0.0 if d % 360.0 == 360.0 else d % 360.0 for d in degrees)
    return tuple(
        Arm(name=name, bearing=math.radians(d)) for name, d in zip(table, turned, strict=True)
    )


def _measured(section: _Section, resonant: float | None) -> MeasuredImpedance | None:
    first = next((k for k in _MEASURED_KEYS if k in section.values), None)
    if first is None:
        return None
    for key in ("resistance_ohm", "quality_factor"):
        if key not in section.values:
            together = "resistance_ohm, quality_factor and, if it is not 0, reactance_ohm"
            raise section.error(first, f"stands without {key}; accepted: {together}")
    if resonant is None:
        what = "stands without resonant_mhz, the frequency of the measurement; accepted: both"
        raise section.error(first, what)
    return MeasuredImpedance(
        frequency=resonant,
        resistance=section.number("resistance_ohm"),
        reactance=section.number("reactance_ohm"),
        quality_factor=section.number("quality_factor"),
    )


def _ground(section: _Section) -> tuple[Ground, str]:
    section.only(_GROUND_KEYS, _GROUND_KEYS)
    constants = [k for k in _GROUND_KEYS[1:] if k in section.values]
    both = "permittivity and conductivity_s_per_m"
    if not constants:
        if "class" not in section.values:
            listed = ", ".join(CLASSES)
            raise section.error("class", f"is missing; accepted: {listed}; or {both}")
        name = section.choice("class", CLASSES)
        return CLASSES[name], name
    if "class" in section.values:
        what = f"and class are both there; accepted: class, or {both}"
        raise section.error(constants[0], what)
    eps, sigma = section.number("permittivity"), section.number("conductivity_s_per_m")
    words = f"permittivity {eps:.10g}, {sigma:.10g} S/m"
    return Ground(permittivity=eps, conductivity=sigma), words


def _feed(section: _Section, antenna: Antenna) -> Feed:
    crossed = antenna.kind.is_crossed
    kinds = (k.value for k in FeedKind)
    kind = FeedKind(section.choice("kind", kinds, None if crossed else FeedKind.COMBINER.value))
    has_line = crossed and kind in (FeedKind.TEE, FeedKind.COMBINER)
    refused = {*(() if has_line else _LINE_KEYS), *(_ERROR_KEYS if has_line or not crossed else ())}
    accepted = [k for k in _FEED_KEYS if k not in refused]
    section.only(accepted, _FEED_KEYS, f"kind {kind.value}" if crossed else "a single wire")
    line, leads = section.optional("line_length_m"), section.number("leads_m")
    velocity_factor = section.number("velocity_factor")
    if has_line and line is None:
        if antenna.resonant_frequency is None:
            other = "or [antenna] resonant_mhz, where it is then a quarter wave"
            what = f"is missing; accepted: {_RANGES['line_length_m'].accepted}; {other}"
            raise section.error("line_length_m", what)
        quarter = float(quarter_wave(antenna.resonant_frequency, velocity_factor))
        if leads >= quarter:
            raise section.error(
                "leads_m",
                f"is {_shown(section.values['leads_m'])}; accepted: below "
                f"{math.floor(quarter * 1e3) / 1e3:g} m, the quarter wave of cable at "
                f"{antenna.resonant_frequency / 1e6:.10g} MHz, or with line_length_m",
            )
    receive_only = section.values.get("receive_only", False)
    if not isinstance(receive_only, bool):
        raise section.error("receive_only", f"is {_shown(receive_only)}; accepted: true or false")
    return Feed(
        kind=kind,
        velocity_factor=velocity_factor,
        impedance=section.number("impedance_ohm"),
        radio_impedance=section.number("radio_ohm"),
        line_length=line,
        leads=leads,
        feeder_length=section.number("feeder_m"),
        loss_db_per_100m=section.number("loss_db_per_100m"),
        phase_error=math.radians(section.number("phase_error_deg")),
        amplitude_error_db=section.number("amplitude_error_db"),
        receive_only=receive_only,
    )


def _relay(section: _Section, arms: tuple[Arm, ...]) -> tuple[RelayPosition, ...]:
    names = tuple(arm.name for arm in arms)
    if len(arms) == 1 and not section.values:
        return (RelayPosition(label=names[0], single=names[0]),)
    if not 1 <= len(section.values) <= MOST_POSITIONS:
        fault = f"section [relay] has {len(section.values)} positions"
        raise _fault(section.file, f"{fault}; accepted: 1 to {MOST_POSITIONS}")
    return tuple(_position(section, label, names) for label in section.values)


def _position(section: _Section, label: str, arms: tuple[str, ...]) -> RelayPosition:
    ways = ("delayed", "single") if len(arms) == 2 else ("single",)
    key, table = _key(label), section.values[label]
    if not _is_name(label, _LONGEST_NAME):
        raise section.error(key, f"is no label; {_name_form(_LONGEST_NAME)}")
    if not isinstance(table, dict):
        form = " or ".join(f"{{ {way} = 'ARM' }}" for way in ways)
        raise section.error(key, f"is {_shown(table)}; accepted: {form}")
    for way in table:
        if way not in ways:
            fault = "does not go with a single wire" if way == "delayed" else "is unknown"
            raise section.error(f"{key}.{_key(way)}", f"{fault}; accepted: {' or '.join(ways)}")
    if len(table) != 1:
        fault = "has both of delayed and single" if table else "says nothing"
        raise section.error(key, f"{fault}; accepted: {' or '.join(ways)}")
    ((way, arm),) = table.items()
    if arm not in arms:
        named = " or ".join(_shown(a) for a in arms)
        what = f"is {_shown(arm)}; accepted: the name of an arm, {named}"
        raise section.error(f"{key}.{way}", what)
    return RelayPosition(label=label, **{way: arm})
