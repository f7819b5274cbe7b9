"""Electron density along a path: layers that change from place to place.

Stations stand along the great circle, and a little to both sides of it. Their
profiles become a table of cubic splines in height and along the path, with a
constant slope across; so N is smooth to the second derivative in height and
along, and tilts at dawn and dusk bend rays. Beyond the last station the
ionosphere is that of the last station.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.arrays import FloatArray, IntArray
from magion.constants import EARTH_RADIUS
from magion.geometry import great_circle, local_axes
from magion.ionosphere.layers import (
    BASE,
    SPORADIC_HEIGHT,
    TOP,
    LayerParameters,
    layered_density,
)
from magion.ionosphere.profile import to_polynomials

STATION_SPACING: Final = 200e3
"""Greatest distance between stations along the path [m]."""

MARGIN: Final = 600e3
"""How far the stations go on beyond both ends of the path [m]."""

ASIDE: Final = 150e3
"""How far the side stations stand from the great circle [m]."""

_SPACING, _FINE_SPACING = 500.0, 250.0
_WIDEST = 2.0 * ASIDE / EARTH_RADIUS

# Weights of four spline coefficients and of their derivatives, as polynomials of
# the place u between two stations: rows times (1, u, u², u³).
_SPLINE = (
    np.array(
        [
            [1.0, -3.0, 3.0, -1.0],
            [4.0, 0.0, -6.0, 3.0],
            [1.0, 3.0, 3.0, -3.0],
            [0.0, 0.0, 0.0, 1.0],
            [-3.0, 6.0, -3.0, 0.0],
            [0.0, -12.0, 9.0, 0.0],
            [3.0, 6.0, -9.0, 0.0],
            [0.0, 0.0, 3.0, 0.0],
        ]
    )
    / 6.0
)
_FOUR = np.arange(4)[:, None]
_RISING = np.array([[1.0], [2.0], [3.0]])


@dataclass(frozen=True, slots=True, kw_only=True)
class Stations:
    """Places along and beside a great circle.

    Parameters
    ----------
    axes : ndarray, shape (3, 3)
        Rows: unit vectors to the start, along the path there, and to its left [1].
    angle : ndarray, shape (n,)
        Central angle of each row of stations from the start [rad].
    latitude, longitude : ndarray, shape (3 n,)
        Places: the row on the great circle, then the right, then the left one [rad].
    """

    axes: FloatArray
    angle: FloatArray
    latitude: FloatArray
    longitude: FloatArray


def stations_along(
    latitude_1: float, longitude_1: float, latitude_2: float, longitude_2: float
) -> Stations:
    """Stations for a path.

    Parameters
    ----------
    latitude_1, longitude_1, latitude_2, longitude_2 : float
        Its ends [rad].

    Returns
    -------
    Stations
        Places from 600 km before the start to 600 km beyond the end.
    """
    span, bearing = (
        float(v) for v in great_circle(latitude_1, longitude_1, latitude_2, longitude_2)
    )
    east, north, up = local_axes(latitude_1, longitude_1)
    forward = math.sin(bearing) * east + math.cos(bearing) * north
    axes = np.stack([up, forward, np.cross(up, forward)])
    margin = MARGIN / EARTH_RADIUS
    count = math.ceil((span + 2.0 * margin) * EARTH_RADIUS / STATION_SPACING) + 1
    angle = np.linspace(-margin, span + margin, count)
    middle = axes.T @ np.stack([np.cos(angle), np.sin(angle), np.zeros(count)])
    rows = []
    for side in (0.0, -1.0, 1.0):
        off = side * ASIDE / EARTH_RADIUS
        position = middle * math.cos(off) + axes[2][:, None] * math.sin(off)
        rows.append(
            (np.arctan2(position[2], np.hypot(position[0], position[1])),
             np.arctan2(position[1], position[0]))
        )  # fmt: skip
    return Stations(
        axes=axes,
        angle=angle,
        latitude=np.concatenate([r[0] for r in rows]),
        longitude=np.concatenate([r[1] for r in rows]),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class PathIonosphere:
    """One or several ionospheres (hours) along one great circle.

    Parameters
    ----------
    base, top : float
        Lowest and greatest height with plasma [m].
    axes : ndarray, shape (3, 3)
        As in :class:`Stations` [1].
    first, spacing : float
        Central angle of the first row of stations, and between rows [rad].
    rows : int
        Number of rows [1].
    table : ndarray, shape (8, hours * (rows + 2) * cells)
        Spline coefficients along the path of the height polynomials of N
        and of its slope across the path, per unit of the sine [m⁻³].
    cells : int
        Cells in height [1].
    height_step : float
        Size of a cell [m].
    thin_layer : float or None
        Height of a sporadic E layer [m].
    """

    base: float
    top: float
    axes: FloatArray
    first: float
    spacing: float
    rows: int
    table: FloatArray
    cells: int
    height_step: float
    thin_layer: float | None = None

    def density(self, position: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        """Electron density and its gradient at positions.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].
        which : ndarray of int, shape (n,)
            Which hour.

        Returns
        -------
        electron_density : ndarray, shape (n,)
            Electron density [m⁻³].
        gradient : ndarray, shape (3, n)
            Its gradient [m⁻⁴].
        """
        if position.shape[1] == 1:  # a single column would be rounded otherwise
            density, gradient = self.density(np.repeat(position, 2, axis=1), np.repeat(which, 2))
            return density[:1], gradient[:, :1]
        path = self.axes @ position
        c, t, n = path
        ring = c * c + t * t
        square = ring + n * n
        radius = np.sqrt(square)
        # In cells of the table, height and along: which one, and where in it. Beyond
        # the last station the ionosphere is that of the last station.
        place = np.empty((2, radius.size))
        np.subtract(radius, EARTH_RADIUS + self.base, out=place[0])
        np.arctan2(t, c, out=place[1])
        place[1] -= self.first
        place *= np.array([[1.0 / self.height_step], [1.0 / self.spacing]])
        limit = np.array([[self.cells], [self.rows - 1]])
        inside = (place > 0.0) & (place < limit)
        place = np.minimum(np.maximum(place, 0.0), limit)
        cell = np.maximum(np.minimum(place.astype(np.intp), limit - 1), 0)  # NaN has no cell
        powers = np.empty((4, 2, radius.size))
        powers[0] = 1.0
        np.subtract(place, cell, out=powers[1])
        np.multiply(powers[1], powers[1], out=powers[2])
        np.multiply(powers[2], powers[1], out=powers[3])
        height = powers[:, 0]
        v = n / radius
        slanting = np.abs(v) < _WIDEST
        v = np.minimum(np.maximum(v, -_WIDEST), _WIDEST)
        start = (which * (self.rows + 2) + cell[1]) * self.cells + cell[0]
        found = self.table.take(start + self.cells * _FOUR, axis=1)
        weight = (_SPLINE @ powers[:, 1]).reshape(2, 4, -1) * inside[0]
        mixed = np.einsum("wkn,ckn->cwn", weight, found)
        total = mixed[:4] + mixed[4:] * v
        density, by_row = np.einsum("cwn,cn->wn", total, height)
        by_height = np.einsum("cn,cn->n", total[1:, 0], height[:3] * _RISING)
        by_height *= 1.0 / self.height_step
        by_sine = np.einsum("cn,cn->n", mixed[4:, 0], height) * slanting
        by_row *= inside[1] / (ring * self.spacing)
        gradient = path * ((by_height - by_sine * n / square) / radius)
        gradient[0] -= by_row * t
        gradient[1] += by_row * c
        gradient[2] += by_sine / radius
        return density, self.axes.T @ gradient


def path_ionosphere(stations: Stations, hours: Sequence[LayerParameters]) -> PathIonosphere:
    """Ionospheres along a path from layer parameters at its stations.

    Parameters
    ----------
    stations : Stations
        The places.
    hours : sequence of LayerParameters
        Parameters over the places, in the stations' order, one for each hour.

    Returns
    -------
    PathIonosphere
        The ionospheres.
    """
    rows = stations.angle.size
    sporadic = any(layers.foes > 0.0 for layers in hours)
    step = _FINE_SPACING if sporadic else _SPACING
    cells = int((TOP - BASE) / step)
    height: FloatArray = BASE + step * np.arange(-2.0, cells + 3)
    parts = []
    for layers in hours:
        middle, right, left = layered_density(height, layers).reshape(3, rows, -1)
        across = (left - right) / (2.0 * math.sin(ASIDE / EARTH_RADIUS))
        smooth = [_along_coefficients(_height_coefficients(v)) for v in (middle, across)]
        density = np.maximum(smooth[0], 0.0)
        # Splines have positive weights: bounded so, N is positive wherever it is asked for.
        limit = 0.9 / _WIDEST * density
        parts.append(np.stack([density, np.clip(smooth[1], -limit, limit)]))
    polynomials = to_polynomials(np.stack(parts))  # (hours, 2, rows + 2, cells, 4)
    table = np.moveaxis(polynomials, (1, -1), (0, 1)).reshape(8, -1)
    return PathIonosphere(
        base=BASE,
        top=TOP,
        axes=stations.axes,
        first=float(stations.angle[0]),
        spacing=float(stations.angle[1] - stations.angle[0]),
        rows=rows,
        table=np.ascontiguousarray(table),
        cells=cells,
        height_step=step,
        thin_layer=SPORADIC_HEIGHT if sporadic else None,
    )


def _height_coefficients(samples: FloatArray) -> FloatArray:
    """Spline coefficients in height that meet the samples to fourth order."""
    bend = samples[:, 2:] - 2.0 * samples[:, 1:-1] + samples[:, :-2]
    return np.asarray(samples[:, 1:-1] - bend / 6.0)


def _along_coefficients(rows: FloatArray) -> FloatArray:
    """Spline coefficients along the path, one more at each end."""
    first, last = 2.0 * rows[:1] - rows[1:2], 2.0 * rows[-1:] - rows[-2:-1]
    wide = np.concatenate([first, rows, last])
    bend = wide[2:] - 2.0 * wide[1:-1] + wide[:-2]
    inner = rows - bend / 6.0
    first, last = 2.0 * inner[:1] - inner[1:2], 2.0 * inner[-1:] - inner[-2:-1]
    return np.concatenate([first, inner, last])
