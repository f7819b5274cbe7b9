"""The sky as a disc: zenith in the middle, horizon at the rim, north up, east right."""

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.contour import ContourSet

# In units of the disc, of which 90 go from the zenith to the horizon: about the width of a sign
# and half the height of a line, of figures from 4 inches up; the shortest contour that is named.
_SIGN, _HALF_LINE, _SHORTEST = 3.8, 5.5, 25.0


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
    ax.set_xlim(-104.0, 104.0)
    ax.set_ylim(-104.0, 104.0)
    ax.set_aspect("equal")
    ax.set_axis_off()
    return ax


def _tag(ax: "Axes", x: float, y: float, text: str, **look: Any) -> None:
    edge = look.pop("edgecolor", "none")
    box = {"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": edge}
    words: dict[str, Any] = {"ha": "center", "va": "center", "fontsize": 7, "zorder": 5}
    ax.text(x, y, text, bbox=box, **(words | look))


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
    x, y = on_disc(azimuth_deg, 7.0)
    # The words run inward, so that long ones stay within the disc.
    side = "right" if x > 30.0 else "left" if x < -30.0 else "center"
    _tag(ax, float(x), float(y), name, ha=side, edgecolor="black")


def _boxes(ax: "Axes") -> list[tuple[float, float, float, float]]:
    """About where the texts of a disc are: x, y, half the width and half the height."""
    found = []
    for text in ax.texts:
        x, y = text.get_position()
        half = 0.5 * _SIGN * len(text.get_text())
        shift = {"left": half, "right": -half}.get(text.get_horizontalalignment(), 0.0)
        found.append((float(x) + shift, float(y), half, _HALF_LINE))
    return found


def _place(
    ax: "Axes", x: FloatArray, y: FloatArray, text: str, **look: Any
) -> tuple[float, float] | None:
    """Write at that of some points which is farthest from all other texts; where none is free, not.

    Points near the rim are not used.
    """
    half = 0.5 * _SIGN * len(text)
    room = np.full(x.shape, 10.0)
    for bx, by, wide, high in _boxes(ax):
        # 1 where the two boxes touch.
        room = np.minimum(
            room, np.maximum(np.abs(x - bx) / (half + wide), np.abs(y - by) / (_HALF_LINE + high))
        )
    room[np.hypot(np.abs(x) + half, y) > 90.0] = 0.0
    best = int(np.argmax(room))
    if room[best] < 1.05:
        return None
    _tag(ax, float(x[best]), float(y[best]), text, **look)
    return float(x[best]), float(y[best])


def name_rings(ax: "Axes") -> None:
    """Write the elevation of each ring where no other text is; the last to be written.

    Parameters
    ----------
    ax : Axes
        Axes of a disc.
    """
    for elevation in (30.0, 60.0):
        x, y = on_disc(np.arange(150.0, 510.0, 5.0) % 360.0, elevation)
        _place(ax, x, y, f"{elevation:.0f}°")


def name_contours(ax: "Axes", lines: "ContourSet", name: Callable[[float], str]) -> None:
    """Write the level of every contour where no other text is.

    Parameters
    ----------
    ax : Axes
        Axes of a disc.
    lines : ContourSet
        Its contours.
    name : callable
        Level to text.
    """
    for level, path in zip(lines.levels, lines.get_paths(), strict=True):
        for piece in map(np.asarray, path.to_polygons(closed_only=False)):
            steps = np.hypot(*np.diff(piece, axis=0).T)
            if float(steps.sum()) > _SHORTEST:
                _place(ax, piece[:, 0], piece[:, 1], name(float(level)), fontsize=8)


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
    within = [v for v in signed if value.min() < v < value.max()]
    if within:
        lines = ax.contour(x, y, value, levels=within, colors="black", linewidths=0.8)
        name_contours(ax, lines, _level_name)


def _level_name(level: float) -> str:
    return f"{'R' if level > 0.0 else 'L'} {abs(level):.0f}"
