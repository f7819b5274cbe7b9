"""``magion field``."""

from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from magion.cli.arguments import INSTANT, NUMBER, PLACE, output_options

if TYPE_CHECKING:
    from magion.geometry import Place


@click.command("field", short_help="field, dip, declination, gyrofrequency at a place")
@click.argument("place", metavar="PLACE", type=PLACE)
@click.option(
    "--height", type=NUMBER, default=300.0, show_default=True, help="Height, 0 to 1000 km."
)
@click.option("--date", "when", type=INSTANT, help="Date, YYYY-MM-DD; today by default.")
@output_options("text", "json", "csv")
def command(
    place: "Place", height: float, when: datetime | None, form: str, output: Path | None
) -> None:
    """Geomagnetic field at PLACE: dip, declination, gyrofrequency.

    \b
    Example:
      magion field 46.50,11.35 --height 100 --date 2026-06-21
    """  # noqa: D301
    from magion.answers.point import answer_field
    from magion.cli.writing import give
    from magion.render.text import field_text

    answer = answer_field(place, when or datetime.now(UTC), height_km=height)
    give(answer, form, output, field_text)
