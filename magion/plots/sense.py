"""Hand and axial ratio of the ordinary wave over the sky, as a figure."""

from typing import TYPE_CHECKING

import numpy as np

from magion.answers.sky import SkyAnswer
from magion.plots.sky import mark_direction, name_contours, name_rings, on_disc, sky_axes
from magion.polarization import CIRCULAR_LIMIT_DB, LINEAR_LIMIT_DB

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_RATIOS_DB = (1.0, CIRCULAR_LIMIT_DB, LINEAR_LIMIT_DB)


def plot_sense(answer: SkyAnswer, ax: "Axes | None" = None) -> "Axes":
    """Where the ordinary wave comes RHCP, LHCP or linear.

    Parameters
    ----------
    answer : SkyAnswer
        The sky.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on: white where circular, dark where linear; solid
        lines and R for right-hand, dashed lines and L for left-hand.
    """
    ax = sky_axes(ax)
    closed = np.append(answer.azimuth_deg, 360.0)
    value = np.concatenate([answer.ellipticity, answer.ellipticity[:, :1]], axis=1)
    x, y = on_disc(*np.meshgrid(closed, answer.elevation_deg))
    minor = [10.0 ** (-db / 20.0) for db in _RATIOS_DB]
    ax.contourf(
        x,
        y,
        np.abs(value),
        levels=[0.0, minor[2], minor[1], minor[0], 1.001],
        colors=["0.62", "0.80", "0.92", "1.0"],
    )
    mark_direction(ax, answer.declination_deg, "magnetic N")
    # A single contour of zero changes its dashes; it is drawn thick instead.
    if value.min() < 0.0 < value.max():
        ax.contour(x, y, value, levels=[0.0], colors="black", linewidths=2.2)
    levels = sorted([*minor, *(-m for m in minor)])
    within = [v for v in levels if value.min() < v < value.max()]
    if within:
        lines = ax.contour(x, y, value, levels=within, colors="black", linewidths=0.9)
        name_contours(ax, lines, _ratio_name)
    name_rings(ax)
    ax.set_title("hand and axial ratio of the ordinary wave [dB]", fontsize=9)
    return ax


def _ratio_name(ellipticity: float) -> str:
    hand = "R" if ellipticity > 0.0 else "L"
    return f"{hand} {-20.0 * np.log10(abs(ellipticity)):.1f} dB"


def sense_figure(answer: SkyAnswer) -> "Figure":
    """The sky with its title and key.

    Parameters
    ----------
    answer : SkyAnswer
        The sky.

    Returns
    -------
    Figure
        The figure.
    """
    from matplotlib.figure import Figure

    figure = Figure(figsize=(6.0, 6.9), layout="constrained")
    figure.suptitle(
        f"Ordinary wave at {answer.name}, {answer.frequency_mhz:.3f} MHz, {answer.date}\n"
        f"dip {answer.dip_deg:.1f}°, declination {answer.declination_deg:.1f}°, limiting height "
        f"{answer.height_km:.0f} km",
        fontsize=11,
    )
    plot_sense(answer, figure.add_subplot())
    figure.supxlabel(
        "Hand to receive and axial ratio: R with solid lines, L with dashed; the extraordinary\n"
        "wave has the other hand. Thick: the hand turns over. Darkest: one wire beats circular.",
        fontsize=8.5,
    )
    return figure
