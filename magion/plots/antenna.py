"""The response of a station's antenna to both hands, as a figure."""

from typing import TYPE_CHECKING

import numpy as np

from magion.answers.pattern import AntennaAnswer, PositionPattern
from magion.plots.sky import hand_contours, mark_direction, name_rings, sky_axes

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_LEVELS = (3.0, 6.0, 10.0, 15.0, 20.0, 30.0)
_DEEPEST_DB = 40.0


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
    # Where both gains are the same, the dashes lie on the grey line.
    for gains, hand, line, colour, width, shade in (
        (position.right_dbi, "RHCP", "-", "0.45", 2.4, "0.55"),
        (position.left_dbi, "LHCP", "--", "black", 1.4, "0.80"),
    ):
        low, middle, high = gains.min(axis=1), np.median(gains, axis=1), gains.max(axis=1)
        ax.fill_between(elevation, low, high, color=shade, alpha=0.5, linewidth=0)
        ax.plot(elevation, middle, line, color=colour, linewidth=width, label=hand)
    ax.set_xlim(elevation.min(), elevation.max())
    top = max(position.right_dbi.max(), position.left_dbi.max())
    ax.set_ylim(top - _DEEPEST_DB, top + 3.0)
    ax.set_xlabel("elevation [°]")
    ax.set_ylabel("gain [dBi]")
    title = f"relay {position.label}: {_what(position)}"
    ax.set_title(title, fontsize=10 if len(title) < 45 else 8)
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
    position = _position(answer, label)
    for arm in answer.arms:
        mark_direction(ax, arm.hot_bearing_deg, f"arm {arm.name}")
    hand_contours(
        ax, answer.azimuth_deg, answer.elevation_deg, position.right_over_left_db, _LEVELS
    )
    name_rings(ax)
    ax.set_title(f"relay {position.label}: favoured hand [dB]", fontsize=9)
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
    wide = len(shown) > 1
    name = f"{answer.station or 'Antenna'},{' ' if wide else chr(10)}{answer.frequency_mhz:.3f} MHz"
    figure.suptitle(
        f"{name}: circular waves arriving\ngain over isotropic; below, the sky:"
        f"{' ' if wide else chr(10)}R or L, the hand favoured, and by how many dB",
        fontsize=11 if wide else 9,
    )
    for i, position in enumerate(shown):
        plot_elevation(answer, position.label, figure.add_subplot(2, len(shown), i + 1))
        sky = figure.add_subplot(2, len(shown), len(shown) + i + 1)
        plot_sky(answer, position.label, sky)
    return figure
