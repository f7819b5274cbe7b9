"""``magion net``."""

from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import (
    INSTANT,
    PLACE,
    RANGE,
    PartnersType,
    flat,
    ionosphere_from,
    ionosphere_options,
    output_options,
    station_option,
)

if TYPE_CHECKING:
    from magion.antenna.station import Station
    from magion.geometry import Place


@click.command("net", short_help="one hand and one frequency for many partners")
@click.argument("place", metavar="PLACE", type=PLACE)
@click.argument("partners", metavar="[PARTNER]...", type=PLACE, nargs=-1)
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
    "--partners",
    "listed",
    type=PartnersType(),
    is_eager=True,
    metavar="FILE.csv",
    help="Partners from a CSV of name,place.",
)
@click.option("--time", "when", type=INSTANT, help="Time, ISO 8601, UTC; now by default.")
@click.option("--day", "whole_day", is_flag=True, help="Every hour of that UTC day.")
@station_option()
@ionosphere_options
@output_options("text", "json", "csv")
def command(
    place: "Place",
    partners: tuple["Place", ...],
    frequencies: tuple[tuple[float, ...], ...],
    listed: "tuple[Place, ...] | None",
    when: datetime | None,
    whole_day: bool,
    station: "Station | None",
    form: str,
    output: Path | None,
    **known: Any,
) -> None:
    """One hand, or relay position, for many partners, and the best frequency.

    PLACE is net control, which hears the partners.

    \b
    Example:
      magion net 46.50,11.35 47.10,10.85 46.90,12.20 -f 3.65 -f 5.3 --time 2026-12-21T09:00Z
    """  # noqa: D301
    from magion.answers.net import answer_net
    from magion.cli.progress import shown
    from magion.cli.writing import give, require_files
    from magion.render.net import net_rows, net_text

    require_files(output)
    with shown("tracing the net") as progress:
        answer = answer_net(
            place,
            (*(listed or ()), *partners),
            flat(frequencies) or (),
            when,
            ionosphere_from(**known),
            whole_day=whole_day,
            station=station,
            progress=progress,
        )
    give(answer, form, output, net_text, net_rows)
