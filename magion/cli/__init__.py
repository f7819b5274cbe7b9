"""The command line: one click command a file, loaded when it is called."""

from importlib import import_module
from typing import Any

import click

from magion import __version__
from magion.cli.arguments import protect_minus
from magion.errors import MagionError

_COMMANDS = {
    "path": "which hand each wave arrives with on one path",
    "day": "both waves of a path through a day, and when to move the relay",
    "net": "one hand and one frequency for many partners",
    "station": "sense versus frequency at a place: the table for the wall",
    "feed": "build sheet of the 90-degree line, and what the feed does across a band",
    "antenna": "response of an antenna to both hands over the sky",
    "relay": "from a log of readings on both hands: is the relay labelled right",
    "sweep": "the answer for every row of a log or of a list of paths",
    "field": "geomagnetic field, dip, declination, gyrofrequency at a place",
    "wave": "both characteristic waves at one point of plasma",
}


class _Commands(click.Group):
    """Commands by name; each module is imported only when it is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(_COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in _COMMANDS:
            return None
        found: click.Command = import_module(f"magion.cli.{cmd_name}").command
        return found

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(list(_COMMANDS.items()))

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        return super().parse_args(ctx, protect_minus(args))

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except MagionError as error:
            raise click.UsageError(str(error)) from None


class _OneLine(_Commands):
    """Wrong input gets one line on standard error and exit status 2."""

    def main(self, *args: Any, **kwargs: Any) -> Any:
        kwargs["standalone_mode"] = False
        try:
            result = super().main(*args, **kwargs)
        except click.exceptions.NoArgsIsHelpError as error:
            click.echo(error.format_message())
            raise SystemExit(2) from None
        except click.ClickException as error:
            message = " ".join(error.format_message().split())
            click.echo(f"magion: {message}", err=True)
            raise SystemExit(2) from None
        except (click.Abort, KeyboardInterrupt):
            click.echo("magion: stopped", err=True)
            raise SystemExit(130) from None
        except BrokenPipeError:
            raise SystemExit(0) from None
        except OSError as error:
            click.echo(f"magion: cannot write the answer: {error.strerror}", err=True)
            raise SystemExit(1) from None
        raise SystemExit(result if isinstance(result, int) else 0)


@click.group(
    cls=_OneLine,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 80},
    epilog="Each command explains itself: magion path --help",
)
@click.version_option(__version__, prog_name="magion", message="%(prog)s %(version)s")
def main() -> None:
    """Which hand the ordinary and the extraordinary HF wave arrive with.

    The ionosphere splits every HF wave in two of opposite hands. magion says
    which hand to switch to, whether each wave is there, and why.
    """
