"""``magion relay``."""

from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import (
    INSTANT,
    NUMBER,
    PLACE,
    RANGE,
    PartnersType,
    flat,
    ionosphere_from,
    ionosphere_options,
    named_places,
    output_options,
    station_option,
)

if TYPE_CHECKING:
    from magion.antenna.station import Station
    from magion.geometry import Place


@click.command("relay", short_help="from a log of readings: is the relay labelled right")
@click.argument("log", metavar="[LOG.csv]", required=False, type=click.Path(path_type=Path))
@click.option("--plan", nargs=2, type=PLACE, metavar="FROM TO", help="When to test instead.")
@click.option(
    "-f",
    "--frequency",
    "frequencies",
    type=RANGE,
    multiple=True,
    help="Frequencies of a test [MHz]; only with --plan.",
)
@click.option("--time", "when", type=INSTANT, help="An instant of the day; only with --plan.")
@click.option("--at", "place", type=PLACE, help="Where the log was taken; else the station.")
@click.option("--noise", "noise_db", type=NUMBER, default=3.0, show_default=True,
              help="Usual error of one reading [dB].")  # fmt: skip
@click.option(
    "--partners",
    "listed",
    type=PartnersType(),
    is_eager=True,
    metavar="FILE.csv",
    help="Names that the log uses, from a CSV of name,place.",
)
@station_option()
@ionosphere_options
@output_options("text", "json", "csv")
def command(
    log: Path | None,
    plan: "tuple[Place, Place] | None",
    frequencies: tuple[tuple[float, ...], ...],
    when: datetime | None,
    place: "Place | None",
    noise_db: float,
    listed: "tuple[Place, ...] | None",
    station: "Station | None",
    form: str,
    output: Path | None,
    **known: Any,
) -> None:
    """Is the relay labelled right, and what rejection does the antenna reach.

    LOG.csv holds time_utc,partner,frequency_mhz and a level for each of two
    positions, as level_left_db,level_right_db. With --plan it proposes when a
    test tells most.

    \b
    Examples:
      magion relay examples/relay_swapped.csv --station examples/larch_hut.toml
          --partners examples/net_alps.csv --readings examples/relay_readings.csv
      magion relay --plan 47.10,10.85 46.50,11.35 -f 3.65 --time 2026-12-21
    """  # noqa: D301
    from magion.answers.relay import answer_relay, answer_relay_plan
    from magion.cli.progress import shown
    from magion.cli.writing import give
    from magion.errors import InputError
    from magion.formats.relay_log import read_relay_log
    from magion.render.data import dotted_record
    from magion.render.relay import plan_text, relay_text

    sky = ionosphere_from(**known)
    if plan is not None:
        if log is not None:
            raise InputError("a log and --plan are given; give one")
        wanted = flat(frequencies)
        if not wanted:
            raise InputError("--plan needs a frequency; give -f MHZ")
        with shown("tracing the day") as progress:
            proposal = answer_relay_plan(
                *plan, wanted, when, sky, station=station, progress=progress
            )
        give(proposal, form, output, plan_text, lambda p: [dotted_record(w) for w in p.windows])
        return
    if log is None:
        raise InputError("no log is given; give LOG.csv, or --plan FROM TO")
    if frequencies or when is not None:
        raise InputError("-f and --time go with --plan; the log has its own")
    where = place or (station.place if station else None)
    if where is None:
        raise InputError("where the log was taken is not known; give --station or --at PLACE")
    readings = read_relay_log(log, named_places(click.get_current_context()))
    with shown("expecting the log") as progress:
        answer = answer_relay(
            readings, where, sky, station=station, noise_db=noise_db, progress=progress
        )
    give(answer, form, output, relay_text, lambda a: [dotted_record(r) for r in a.rows])
