"""``magion day``."""

from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import (
    INSTANT,
    NUMBER,
    PLACE,
    RANGE,
    flat,
    ionosphere_from,
    ionosphere_options,
    output_options,
    plot_option,
    station_option,
)

if TYPE_CHECKING:
    from magion.antenna.station import Station
    from magion.geometry import Place


@click.command("day", short_help="both waves through a day, and when to switch")
@click.argument("transmitter", metavar="FROM", type=PLACE)
@click.argument("receiver", metavar="TO", type=PLACE)
@click.option(
    "-f",
    "--frequency",
    "frequencies",
    type=RANGE,
    multiple=True,
    required=True,
    help="Frequency or range first:last:step [MHz]; again for more.",
)
@click.option(
    "--time",
    "when",
    type=INSTANT,
    help="An instant of the UTC day; typed values are those of it. Now by default.",
)
@click.option(
    "--step", "step_min", type=NUMBER, default=15.0, show_default=True, help="Step [minutes]."
)
@station_option()
@ionosphere_options
@plot_option
@output_options("text", "json", "csv")
def command(
    transmitter: "Place",
    receiver: "Place",
    frequencies: tuple[tuple[float, ...], ...],
    when: datetime | None,
    step_min: float,
    station: "Station | None",
    plot: Path | None,
    form: str,
    output: Path | None,
    **known: Any,
) -> None:
    """One UTC day of a path: which waves arrive, and when to move the relay.

    FROM transmits, TO (you) receives. Some ten seconds for 96 steps.

    \b
    Example:
      magion day 47.10,10.85 46.50,11.35 -f 3.65 -f 5.3 --time 2026-12-21 --plot day.png
    """  # noqa: D301
    from magion.answers.day import answer_day
    from magion.cli.progress import shown
    from magion.cli.writing import draw, give, require_files
    from magion.render.day import day_rows, day_text

    require_files(output, plot)
    with shown("tracing the day") as progress:
        answer = answer_day(
            transmitter,
            receiver,
            flat(frequencies) or (),
            when,
            ionosphere_from(**known),
            step_min=step_min,
            station=station,
            progress=progress,
        )
    if plot is not None:
        from magion.plots.day import day_figure

        draw(lambda: day_figure(answer), plot)
    give(answer, form, output, day_text, day_rows)
