"""``magion wave``."""

from pathlib import Path

import click

from magion.cli.arguments import NUMBER, output_options


@click.command("wave", short_help="both characteristic waves at one point of plasma")
@click.option("-f", "--frequency", type=NUMBER, required=True, help="Frequency [MHz].")
@click.option("--plasma", type=NUMBER, required=True, help="Plasma frequency [MHz].")
@click.option("--gyro", type=NUMBER, required=True, help="Gyrofrequency [MHz].")
@click.option("--angle", type=NUMBER, required=True, help="Wave normal to field, 0 to 180 degrees.")
@click.option(
    "--collisions",
    type=NUMBER,
    default=0.0,
    show_default=True,
    help="Effective collision frequency [1/s].",
)
@output_options("text", "json", "csv")
def command(
    frequency: float,
    plasma: float,
    gyro: float,
    angle: float,
    collisions: float,
    form: str,
    output: Path | None,
) -> None:
    """Index, polarization and hand of both waves at one point of plasma.

    \b
    Example:
      magion wave --frequency 5.3 --plasma 3.7 --gyro 1.2 --angle 25
    """  # noqa: D301
    from magion.answers.point import answer_wave
    from magion.cli.writing import give
    from magion.render.text import wave_text

    answer = answer_wave(
        frequency_mhz=frequency,
        plasma_mhz=plasma,
        gyro_mhz=gyro,
        theta_deg=angle,
        collisions=collisions,
    )
    give(answer, form, output, wave_text)
