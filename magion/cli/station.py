"""``magion station``."""

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


@click.command("station", short_help="sense versus frequency at a place")
@click.argument("place", metavar="PLACE", type=PLACE)
@click.option(
    "-f",
    "--frequency",
    "frequencies",
    type=RANGE,
    multiple=True,
    help="Frequency or range first:last:step [MHz]; again for more. A list across HF by default.",
)
@click.option(
    "--elevation",
    "elevations",
    type=RANGE,
    multiple=True,
    help="Elevations of the cells [degrees]; 60, 30 and 15 by default.",
)
@click.option("--time", "when", type=INSTANT, help="Adds the state overhead; ISO 8601, UTC.")
@click.option("--height", "height_km", type=NUMBER, help="Limiting height, 60 to 300 [km].")
@station_option()
@ionosphere_options
@plot_option
@output_options("text", "json", "csv")
def command(
    place: "Place",
    frequencies: tuple[tuple[float, ...], ...],
    elevations: tuple[tuple[float, ...], ...],
    when: datetime | None,
    height_km: float | None,
    station: "Station | None",
    plot: Path | None,
    form: str,
    output: Path | None,
    **known: Any,
) -> None:
    """Which hand each wave has from every side, frequency by frequency.

    A table for the wall. Without --time the limiting height is 90 km; with it
    the ionosphere sets the height and gives the state overhead. The figure
    shows the sky at the first frequency.

    \b
    Example:
      magion station 46.50,11.35 -f 1.85 -f 3.5:3.8:0.1 -f 7.1 --plot sky.png
    """  # noqa: D301
    from magion.answers.sense import answer_station
    from magion.cli.writing import draw, give, require_files
    from magion.render.sense import sense_rows, sense_text

    require_files(output, plot)
    wanted = flat(frequencies)
    answer = answer_station(
        place,
        wanted,
        when,
        ionosphere_from(**known),
        elevations_deg=flat(elevations),
        height_km=height_km,
        station=station,
    )
    if plot is not None:
        from magion.answers.sky import answer_sky
        from magion.plots.sense import sense_figure

        first = answer.rows[0]
        height = first.overhead.limiting_height_km
        draw(
            lambda: sense_figure(answer_sky(place, first.frequency_mhz, when, height_km=height)),
            plot,
        )
    give(answer, form, output, sense_text, sense_rows)
