"""``magion feed``."""

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import NUMBER, RANGE, output_options, station_option

if TYPE_CHECKING:
    from magion.answers.feed import FeedAnswer
    from magion.antenna.station import Station


@click.command("feed", short_help="build sheet of the 90-degree line")
@click.option("-f", "--frequency", type=NUMBER, required=True, help="Frequency of the cut [MHz].")
@station_option()
@click.option("--band", type=RANGE, help="Frequencies of the rows, as 3.5:3.8:0.05 [MHz].")
@click.option("--velocity-factor", type=NUMBER, help="Of the cable, where no station file says it.")
@output_options("text", "json", "csv")
def command(
    frequency: float,
    station: "Station | None",
    band: tuple[float, ...] | None,
    velocity_factor: float | None,
    form: str,
    output: Path | None,
) -> None:
    """The build sheet: which arm carries the line, how long, how good.

    With a station file the feed is solved as a circuit with the elements'
    impedance; without one the arms are taken as matched and isolated.

    \b
    Example:
      magion feed -f 3.65 --velocity-factor 0.66 --band 3.5:3.8:0.05
    """  # noqa: D301
    from magion.answers.feed import answer_feed
    from magion.cli.writing import give
    from magion.render.station import feed_text

    answer = answer_feed(frequency, station, band, velocity_factor=velocity_factor)
    give(answer, form, output, feed_text, _rows)


def _rows(answer: "FeedAnswer") -> list[dict[str, Any]]:
    from magion.render.data import dotted_record

    return [dotted_record(row) for row in answer.band]
