"""The sky as a disc: zenith in the middle, horizon at the rim, north up, east right."""

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def on_disc(azimuth_deg: ArrayLike, elevation_deg: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Where directions lie on the disc.

    Parameters
    ----------
    azimuth_deg, elevation_deg : array_like
        Directions [deg].

    Returns
    -------
    x, y : ndarray
        East and north, as angles from the zenith in degrees: 90 at the horizon.
    """
    azimuth, zenith = np.radians(azimuth_deg), 90.0 - np.asarray(elevation_deg, float)
    return zenith * np.sin(azimuth), zenith * np.cos(azimuth)


def sky_axes(ax: "Axes | None" = None) -> "Axes":
    """Axes of a disc, with its rings and the points of the compass.

    Parameters
    ----------
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    if ax is None:
        from matplotlib.figure import Figure

        ax = Figure(figsize=(4.5, 4.5), layout="constrained").add_subplot()
    turn = np.radians(np.arange(0, 361, 2))
    for elevation in (0.0, 30.0, 60.0):
        ring = 90.0 - elevation
        rim = elevation == 0.0
        ax.plot(
            ring * np.sin(turn),
            ring * np.cos(turn),
            color="black",
            linewidth=1.2 if rim else 0.5,
            linestyle="-" if rim else ":",
            zorder=3,
        )
    for name, x, y in (("N", 0, 1), ("E", 1, 0), ("S", 0, -1), ("W", -1, 0)):
        ax.text(97.0 * x, 97.0 * y, name, ha="center", va="center", fontsize=9)
    _tag(ax, 150.0, 30.0, "30°")
    _tag(ax, 150.0, 60.0, "60°")
    ax.set_xlim(-104.0, 104.0)
    ax.set_ylim(-104.0, 104.0)
    ax.set_aspect("equal")
    ax.set_axis_off()
    return ax


def _tag(ax: "Axes", azimuth_deg: float, elevation_deg: float, text: str, **box: Any) -> None:
    x, y = on_disc(azimuth_deg, elevation_deg)
    look = {"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": "none"} | box
    ax.text(float(x), float(y), text, ha="center", va="center", fontsize=7, bbox=look, zorder=5)


def mark_direction(ax: "Axes", azimuth_deg: float, name: str) -> None:
    """Name a direction near the rim.

    Parameters
    ----------
    ax : Axes
        Axes of a disc.
    azimuth_deg : float
        East of true north [deg].
    name : str
        What it is.
    """
    _tag(ax, azimuth_deg, 5.0, name, edgecolor="black")


def hand_contours(
    ax: "Axes",
    azimuth_deg: FloatArray,
    elevation_deg: FloatArray,
    right_over_left_db: FloatArray,
    levels: tuple[float, ...],
) -> None:
    """Shade by size and label by hand: solid lines R, dashed lines L.

    Parameters
    ----------
    ax : Axes
        Axes of a disc.
    azimuth_deg : ndarray, shape (azimuths,)
        Over the whole turn, the last not the first again [deg].
    elevation_deg : ndarray, shape (elevations,)
        Rising [deg].
    right_over_left_db : ndarray, shape (elevations, azimuths)
        RHCP over LHCP [dB].
    levels : tuple of float
        Sizes to draw, rising [dB].
    """
    closed_azimuth = np.append(azimuth_deg, azimuth_deg[0] + 360.0)
    value = np.concatenate([right_over_left_db, right_over_left_db[:, :1]], axis=1)
    x, y = on_disc(*np.meshgrid(closed_azimuth, elevation_deg))
    ax.contourf(x, y, np.abs(value), levels=(0.0, *levels, 61.0), cmap="Greys", vmin=0.0, vmax=75.0)
    signed = [*(-level for level in reversed(levels)), *levels]
    lines = ax.contour(x, y, value, levels=signed, colors="black", linewidths=0.8)
    for text in ax.clabel(lines, fmt=_level_name, fontsize=8):
        text.set_bbox({"boxstyle": "round,pad=0.1", "facecolor": "white", "edgecolor": "none"})
        text.set_rotation(0.0)


def _level_name(level: float) -> str:
    return f"{'R' if level > 0.0 else 'L'} {abs(level):.0f}"
