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
    from magion.geometry import Place

_MINUS = "\N{MINUS SIGN}"
_NEGATIVE = re.compile(r"-[0-9.]")
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
    """A place: coordinates or a locator."""

    name = "place"

    def convert(self, value: Any, param: Any, ctx: Any) -> "Place":
        """Read the place."""
        from magion.errors import InputError
        from magion.formats.tables import printable
        from magion.geometry import Place, parse_place

        if isinstance(value, Place):
            return value
        try:
            return parse_place(typed(value))
        except InputError as error:
            self.fail(printable(str(error)) if len(value) > 80 else str(error), param, ctx)


NUMBER = Number()
INSTANT = Instant()
PLACE = PlaceType()


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
