"""``magion antenna``."""

from pathlib import Path
from typing import TYPE_CHECKING

import click

from magion.cli.arguments import NUMBER, RANGE, output_options, plot_option, station_option

if TYPE_CHECKING:
    from magion.antenna.station import Station


@click.command("antenna", short_help="response to both hands over the sky")
@click.option("-f", "--frequency", type=NUMBER, required=True, help="Frequency [MHz].")
@station_option(required=True)
@click.option("--elevation", type=RANGE, help="Elevations, as 5:90:5 [degrees].")
@click.option("--azimuth", type=RANGE, help="Azimuths, as 0:345:15 [degrees].")
@plot_option
@output_options("text", "json", "csv")
def command(
    frequency: float,
    station: "Station",
    elevation: tuple[float, ...] | None,
    azimuth: tuple[float, ...] | None,
    plot: Path | None,
    form: str,
    output: Path | None,
) -> None:
    """What every relay position hears of RHCP and LHCP, from every direction.

    Gains are over isotropic, with the mismatch and the losses of the feed and
    the ground.

    \b
    Example:
      magion antenna -f 5.3 --station examples/larch_hut.toml --plot sky.png
    """  # noqa: D301
    from magion.answers.pattern import answer_antenna
    from magion.cli.writing import draw, give, require_files
    from magion.render.data import antenna_rows
    from magion.render.station import antenna_text

    require_files(output, plot)
    answer = answer_antenna(station, frequency, elevation, azimuth)
    if plot is not None:
        from magion.plots.antenna import antenna_figure

        fine = tuple(range(1, 91)), tuple(range(0, 360, 3))
        draw(lambda: antenna_figure(answer_antenna(station, frequency, *fine)), plot)
    give(answer, form, output, antenna_text, antenna_rows)
