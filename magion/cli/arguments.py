"""Values as users type them, and the options that commands share."""

import math
import re
from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

if TYPE_CHECKING:
    from magion.answers.inputs import IonosphereInput
    from magion.antenna.station import Station
    from magion.geometry import Place

MOST_IN_RANGE = 10_000
_MINUS = "\N{MINUS SIGN}"
_NEGATIVE = re.compile(r"-[0-9.]")
_NAMED = "magion.named_places"
_Decorated = TypeVar("_Decorated", bound=Callable[..., Any])


def protect_minus(args: list[str]) -> list[str]:
    """Let a token that begins with a minus sign and a digit pass as a value.

    Parameters
    ----------
    args : list of str
        Tokens of the command line.

    Returns
    -------
    list of str
        The same, with the minus of such tokens as a typographic minus sign,
        which the value types read again.
    """
    return [_MINUS + a[1:] if _NEGATIVE.match(a) else a for a in args]


def typed(text: str) -> str:
    """A value as the user typed it, undoing :func:`protect_minus`.

    Parameters
    ----------
    text : str
        A value.

    Returns
    -------
    str
        With a plain minus sign.
    """
    return text.replace(_MINUS, "-")


class Number(click.ParamType):
    """A finite number."""

    name = "number"

    def convert(self, value: Any, param: Any, ctx: Any) -> float:
        """Read the number."""
        if isinstance(value, float | int):
            return float(value)
        from magion.formats.tables import printable

        try:
            number = float(typed(value))
        except ValueError:
            self.fail(f"{printable(typed(value))!r} is not a number", param, ctx)
        if not math.isfinite(number):
            self.fail(f"{printable(typed(value))!r} is not a finite number", param, ctx)
        return number


class Instant(click.ParamType):
    """An instant in ISO 8601; without a zone, UTC."""

    name = "time"

    def convert(self, value: Any, param: Any, ctx: Any) -> datetime:
        """Read the instant."""
        if isinstance(value, datetime):
            return value
        from magion.formats.tables import printable

        try:
            found = datetime.fromisoformat(value.strip())
            return found.replace(tzinfo=UTC) if found.tzinfo is None else found.astimezone(UTC)
        except (ValueError, OverflowError):
            self.fail(
                f"{printable(typed(value))!r} is not a time; accepted: 2026-06-21T12:00Z",
                param,
                ctx,
            )


class PlaceType(click.ParamType):
    """A place: coordinates, a locator, or a name from the station file."""

    name = "place"

    def convert(self, value: Any, param: Any, ctx: Any) -> "Place":
        """Read the place."""
        from magion.errors import InputError
        from magion.formats.tables import printable
        from magion.geometry import Place, parse_place

        if isinstance(value, Place):
            return value
        known: dict[str, Place] = ctx.meta.get(_NAMED, {}) if ctx else {}
        named = known.get(" ".join(value.split()).casefold())
        if named is not None:
            return named
        try:
            return parse_place(typed(value))
        except InputError as error:
            self.fail(printable(str(error)) if len(value) > 80 else str(error), param, ctx)


class StationType(click.ParamType):
    """A station file; the name in it becomes a place."""

    name = "file"

    def convert(self, value: Any, param: Any, ctx: Any) -> "Station":
        """Read the file."""
        from magion.antenna.station import Station
        from magion.formats.station import read_station

        station = value if isinstance(value, Station) else read_station(value)
        if station.name and ctx:
            ctx.meta.setdefault(_NAMED, {})[station.name.casefold()] = station.place
        return station


class Range(click.ParamType):
    """Numbers from a first to a last by a step, or one number."""

    name = "first:last:step"

    def convert(self, value: Any, param: Any, ctx: Any) -> tuple[float, ...]:
        """Read the range."""
        if isinstance(value, tuple):
            return value
        parts = [NUMBER.convert(part, param, ctx) for part in str(value).split(":")]
        if len(parts) == 1:
            return (parts[0],)
        if len(parts) != 3 or parts[2] <= 0.0 or parts[1] < parts[0]:
            from magion.formats.tables import printable

            self.fail(
                f"{printable(typed(value))!r} is not a range; accepted: first:last:step, as "
                "3.5:3.8:0.05",
                param,
                ctx,
            )
        first, last, step = parts
        steps = (last - first) / step + 1e-9
        if steps >= MOST_IN_RANGE:
            from magion.formats.tables import printable

            many = f"is more than {MOST_IN_RANGE} values; accepted: up to that"
            self.fail(f"{printable(typed(value))} {many}", param, ctx)
        count = int(steps) + 1
        # The decimals that were typed, without the noise of the sum.
        return tuple(round(first + i * step, 9) for i in range(count))


class PartnersType(click.ParamType):
    """A file of partners; their names become places."""

    name = "file"

    def convert(self, value: Any, param: Any, ctx: Any) -> "tuple[Place, ...]":
        """Read the file."""
        if isinstance(value, tuple):
            return value
        from magion.formats.partners import read_partners

        partners = read_partners(value)
        if ctx:
            named = {p.name.casefold(): p for p in partners if p.name}
            ctx.meta.setdefault(_NAMED, {}).update(named)
        return partners


NUMBER = Number()
RANGE = Range()
INSTANT = Instant()
PLACE = PlaceType()


def named_places(ctx: click.Context) -> "dict[str, Place]":
    """Names that the station and partner files of a command gave to places.

    Parameters
    ----------
    ctx : click.Context
        The command's context.

    Returns
    -------
    dict
        Name in lower case to place.
    """
    found: dict[str, Place] = ctx.meta.get(_NAMED, {})
    return found


def flat(ranges: tuple[tuple[float, ...], ...]) -> tuple[float, ...] | None:
    """Values of an option that may be given several times.

    Parameters
    ----------
    ranges : tuple of tuple of float
        What each use of the option gave.

    Returns
    -------
    tuple of float or None
        All of them in order, each once; None where the option was not used.
    """
    return tuple(dict.fromkeys(v for one in ranges for v in one)) if ranges else None


def station_option(*, required: bool = False) -> Callable[[_Decorated], _Decorated]:
    """Option ``--station``, read before the places that may name it.

    Parameters
    ----------
    required : bool
        Whether a command cannot do without.

    Returns
    -------
    decorator
        Adds the option to a command.
    """
    return click.option(
        "--station",
        type=StationType(),
        is_eager=True,
        required=required,
        metavar="FILE.toml",
        help="Your antenna, feed and relay labels; its name stands for its place.",
    )


def plot_option(command: _Decorated) -> _Decorated:
    """Option ``--plot``.

    Parameters
    ----------
    command : function
        A command.

    Returns
    -------
    function
        The command with the option.
    """
    return click.option(
        "--plot",
        type=click.Path(path_type=Path),
        metavar="FILE",
        help="Draw the figure too: PNG, SVG or PDF by the file's ending.",
    )(command)


def output_options(*formats: str) -> Callable[[_Decorated], _Decorated]:
    """Options ``--format`` and ``--output``.

    Parameters
    ----------
    *formats : str
        The formats that make sense; the first is the default.

    Returns
    -------
    decorator
        Adds the options to a command.
    """

    def add(command: _Decorated) -> _Decorated:
        command = click.option(
            "--output",
            type=click.Path(path_type=Path),
            help="Write to this file instead of the terminal.",
        )(command)
        return click.option(
            "--format",
            "form",
            type=click.Choice(formats),
            default=formats[0],
            show_default=True,
            help="What to write.",
        )(command)

    return add


def ionosphere_options(command: _Decorated) -> _Decorated:
    """Options that say what is known of the ionosphere.

    Parameters
    ----------
    command : function
        A command.

    Returns
    -------
    function
        The command with the options.
    """
    for names, kind, text in reversed(
        (
            ("--flux", NUMBER, "Solar radio flux at 10.7 cm, 60 to 300 sfu."),
            ("--sunspots", NUMBER, "Sunspot number instead of the flux, 0 to 250."),
            ("--fof2", NUMBER, "foF2 from an ionosonde [MHz]."),
            ("--fof2-error", NUMBER, "Its standard deviation [MHz]."),
            ("--hmf2", NUMBER, "hmF2 from an ionosonde [km]."),
            ("--foe", NUMBER, "foE from an ionosonde [MHz]."),
            ("--foes", NUMBER, "foEs: sporadic E along the path [MHz]."),
            (
                "--profile",
                click.Path(path_type=Path),
                "Measured profile: CSV of height_km,electron_density_m3.",
            ),
            (
                "--readings",
                click.Path(path_type=Path),
                "Ionosonde readings over the day: CSV of time_utc,fof2_mhz,...",
            ),
            ("--readings-at", PLACE, "Where they were taken, if the file does not say."),
        )
    ):
        command = click.option(names, type=kind, help=text)(command)
    return command


def ionosphere_from(
    flux: float | None,
    sunspots: float | None,
    fof2: float | None,
    fof2_error: float | None,
    hmf2: float | None,
    foe: float | None,
    foes: float | None,
    profile: Path | None,
    readings: Path | None,
    readings_at: "Place | None",
    **rates: float | None,
) -> "IonosphereInput":
    """The ionosphere that the shared options describe.

    Parameters
    ----------
    flux, sunspots, fof2, fof2_error, hmf2, foe, foes, profile, readings, readings_at
        Values of the options of :func:`ionosphere_options`.
    **rates : float or None
        Rates of foF2 and hmF2, where a command asks for them.

    Returns
    -------
    IonosphereInput
        Checked input.

    Raises
    ------
    InputError
        If a value is out of range, two contradict, or the file is wrong.
    """
    from dataclasses import replace

    from magion.answers.inputs import IonosphereInput
    from magion.errors import InputError
    from magion.formats.profile import read_profile
    from magion.formats.readings import read_readings
    from magion.formats.tables import printable

    table = None if readings is None else read_readings(readings)
    if readings_at is not None:
        if table is None:
            raise InputError("--readings-at is given without --readings; give both")
        table = replace(table, place=readings_at)
    return IonosphereInput(
        flux=flux,
        sunspots=sunspots,
        fof2_mhz=fof2,
        fof2_error_mhz=fof2_error,
        hmf2_km=hmf2,
        foe_mhz=foe,
        profile=None if profile is None else read_profile(profile),
        profile_name=None if profile is None else printable(profile.name),
        foes_mhz=foes,
        readings=table,
        readings_name=None if readings is None else printable(readings.name),
        **rates,
    )
