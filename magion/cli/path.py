"""``magion path``."""

from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import (
    INSTANT,
    NUMBER,
    PLACE,
    ionosphere_from,
    ionosphere_options,
    output_options,
    station_option,
)

if TYPE_CHECKING:
    from magion.antenna.station import Station
    from magion.geometry import Place


@click.command("path", short_help="which hand each wave arrives with on one path")
@click.argument("transmitter", metavar="FROM", type=PLACE)
@click.argument("receiver", metavar="TO", type=PLACE)
@click.option("-f", "--frequency", type=NUMBER, required=True, help="Frequency [MHz].")
@click.option("--time", "when", type=INSTANT, help="Time, ISO 8601, UTC; now by default.")
@station_option()
@ionosphere_options
@click.option(
    "--fof2-rate",
    "fof2_rate_mhz_per_h",
    type=NUMBER,
    help="How fast foF2 changes [MHz/h], for Doppler and fading.",
)
@click.option(
    "--hmf2-rate",
    "hmf2_rate_km_per_h",
    type=NUMBER,
    help="How fast hmF2 changes [km/h].",
)
@click.option("--changes", is_flag=True, help="Add the day's times of change (some seconds).")
@output_options("text", "json", "csv")
def command(
    transmitter: "Place",
    receiver: "Place",
    frequency: float,
    when: datetime | None,
    station: "Station | None",
    changes: bool,
    form: str,
    output: Path | None,
    **known: Any,
) -> None:
    """Which hand to switch to: FROM transmits, TO (you) receives.

    Places are LAT,LON in decimal degrees (46.50,11.35 or 41.0S,71.3W) or a
    grid locator of 4, 6 or 8 signs. The same place twice is the vertical case.

    \b
    Example:
      magion path 46.50,11.35 JN57rb -f 5.3 --time 2026-06-21T12:00Z --fof2 6.1
    """  # noqa: D301
    from magion.answers.path import answer_path
    from magion.cli.writing import give
    from magion.render.data import path_rows
    from magion.render.text import path_text

    answer = answer_path(
        transmitter,
        receiver,
        frequency,
        when,
        ionosphere_from(**known),
        station=station,
        with_changes=changes,
    )
    give(answer, form, output, path_text, path_rows)
