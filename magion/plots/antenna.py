"""The response of a station's antenna to both hands, as a figure."""

from typing import TYPE_CHECKING

import numpy as np

from magion.answers.pattern import AntennaAnswer, PositionPattern
from magion.plots.sky import hand_contours, mark_direction, sky_axes

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_LEVELS = (3.0, 6.0, 10.0, 15.0, 20.0, 30.0)
_FLOOR_DBI = -35.0


def _position(answer: AntennaAnswer, label: str | None) -> PositionPattern:
    if label is None:
        return next((p for p in answer.positions if p.delayed_arm), answer.positions[0])
    return next(p for p in answer.positions if p.label == label)


def plot_elevation(
    answer: AntennaAnswer, label: str | None = None, ax: "Axes | None" = None
) -> "Axes":
    """Gain for both hands against elevation, the range over all azimuths.

    Parameters
    ----------
    answer : AntennaAnswer
        The response.
    label : str, optional
        Relay position; else the first with a delayed arm.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    if ax is None:
        from matplotlib.figure import Figure

        ax = Figure(figsize=(5.0, 4.0), layout="constrained").add_subplot()
    position = _position(answer, label)
    elevation = answer.elevation_deg
    for gains, hand, line, shade in (
        (position.right_dbi, "RHCP", "-", "0.55"),
        (position.left_dbi, "LHCP", "--", "0.80"),
    ):
        low = np.maximum(gains.min(axis=1), _FLOOR_DBI)
        high = np.maximum(gains.max(axis=1), _FLOOR_DBI)
        middle = np.maximum(np.median(gains, axis=1), _FLOOR_DBI)
        ax.fill_between(elevation, low, high, color=shade, alpha=0.5, linewidth=0)
        ax.plot(elevation, middle, line, color="black", linewidth=1.6, label=hand)
    ax.set_xlim(elevation.min(), elevation.max())
    top = max(position.right_dbi.max(), position.left_dbi.max())
    ax.set_ylim(_FLOOR_DBI, top + 3.0)
    ax.set_xlabel("elevation [°]")
    ax.set_ylabel("gain [dBi]")
    ax.set_title(f"relay {position.label}: {_what(position)}", fontsize=10)
    ax.legend(loc="lower left", fontsize=8, title="median; shade: all azimuths", title_fontsize=7)
    ax.grid(alpha=0.3)
    return ax


def _what(position: PositionPattern) -> str:
    if position.single_arm:
        return f"arm {position.single_arm} alone"
    return f"delay in arm {position.delayed_arm}"


def plot_sky(answer: AntennaAnswer, label: str | None = None, ax: "Axes | None" = None) -> "Axes":
    """The favoured hand over the sky.

    Parameters
    ----------
    answer : AntennaAnswer
        The response, over all azimuths.
    label : str, optional
        Relay position; else the first with a delayed arm.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    ax = sky_axes(ax)
    difference = _position(answer, label).right_over_left_db
    hand_contours(ax, answer.azimuth_deg, answer.elevation_deg, difference, _LEVELS)
    for arm in answer.arms:
        mark_direction(ax, arm.hot_bearing_deg, f"arm {arm.name}")
    return ax


def antenna_figure(answer: AntennaAnswer) -> "Figure":
    """Elevation cuts and sky of the relay positions.

    Parameters
    ----------
    answer : AntennaAnswer
        The response.

    Returns
    -------
    Figure
        One column a position, up to three.
    """
    from matplotlib.figure import Figure

    shown = [p for p in answer.positions if p.delayed_arm][:3] or list(answer.positions[:3])
    figure = Figure(figsize=(1.0 + 4.2 * len(shown), 8.4), layout="constrained")
    figure.suptitle(
        f"{answer.station or 'Antenna'}, {answer.frequency_mhz:.3f} MHz: circular waves arriving\n"
        "gain over isotropic; below, the sky: R or L, the hand favoured, and by how many dB",
        fontsize=11,
    )
    for i, position in enumerate(shown):
        plot_elevation(answer, position.label, figure.add_subplot(2, len(shown), i + 1))
        sky = figure.add_subplot(2, len(shown), len(shown) + i + 1)
        plot_sky(answer, position.label, sky)
    return figure
