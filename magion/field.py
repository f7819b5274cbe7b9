"""The geomagnetic field: IGRF at points, and a smooth fit along a path.

The field model is the 14th generation of the International Geomagnetic
Reference Field [IGRF14]_. It is heavy to call, so a path calls it once over a
box and every ray reads a Chebyshev fit with an analytic gradient.
"""

import math
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Final, Protocol

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import ArrayLike

from magion.arrays import FloatArray, IntArray, as_floats, padded
from magion.constants import EARTH_RADIUS, GYROFREQUENCY_PER_TESLA
from magion.errors import MagionError, OutsideModelError
from magion.geometry import as_utc, great_circle, local_axes, to_cartesian, travel

MODEL: Final = "IGRF-14"
"""Name of the field model, as records carry it."""

FIRST_DATE: Final = datetime(1900, 1, 1, tzinfo=UTC)
LAST_DATE: Final = datetime(2030, 1, 1, tzinfo=UTC)
LARGEST_RESIDUAL: Final = 5e-9
"""Largest difference a fit may leave to the field model [T]."""

_CHECKED_SHARE = 0.7  # what the check points may show: between them it can be 1.34 times as much
_POLE_MARGIN = 1e-7  # degrees; at 90 itself the synthesis divides by zero


class MagneticField(Protocol):
    """A magnetic field in space, with its gradient."""

    def at(self, position: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Field and gradient at points.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].

        Returns
        -------
        field : ndarray, shape (3, n)
            Flux density in Earth-centred axes [T].
        gradient : ndarray, shape (3, 3, n)
            Derivative of component i along axis j at [i, j] [T/m].
        """
        ...


def require_date(when: datetime) -> datetime:
    """Return the instant in UTC if the field model covers it.

    Parameters
    ----------
    when : datetime
        An instant; without a zone, UTC.

    Returns
    -------
    datetime
        The instant in UTC.

    Raises
    ------
    OutsideModelError
        If it lies before 1900 or after the start of 2030.
    """
    instant = as_utc(when)
    if not FIRST_DATE <= instant <= LAST_DATE:
        raise OutsideModelError(
            f"date {instant:%Y-%m-%d} is outside the field model; "
            "accepted: 1900-01-01 to 2030-01-01"
        )
    return instant


def field_at(
    latitude: ArrayLike, longitude: ArrayLike, height: ArrayLike, when: datetime
) -> FloatArray:
    """Geomagnetic flux density at points (IGRF-14).

    Parameters
    ----------
    latitude, longitude : array_like
        Geodetic place [rad].
    height : array_like
        Height above the ellipsoid [m].
    when : datetime
        Instant, 1900 to the start of 2030.

    Returns
    -------
    ndarray, shape (3, ...)
        East, north and up components [T]. NaN where the place is not a number.

    Raises
    ------
    OutsideModelError
        If the date is outside the model or a latitude beyond the pole.

    Notes
    -----
    One call costs about 20 ms for up to a hundred points: call it with arrays.
    """
    import ppigrf

    instant = require_date(when)
    phi, lam, h = as_floats(latitude, longitude, height)
    lat_deg, lon_deg, h_km = np.degrees(phi).ravel(), np.degrees(lam).ravel(), h.ravel() / 1e3
    if np.any(np.abs(lat_deg) > 90.0 + 1e-9):
        raise OutsideModelError("a latitude is beyond the pole; accepted: -90 to 90 degrees")
    lat_deg = np.clip(lat_deg, -90.0 + _POLE_MARGIN, 90.0 - _POLE_MARGIN)
    components = ppigrf.igrf(lon_deg, lat_deg, h_km, instant.replace(tzinfo=None))
    return np.stack([np.asarray(c, dtype=np.float64).reshape(phi.shape) for c in components]) * 1e-9


def dip(field: FloatArray) -> FloatArray:
    """Angle of the field below the horizontal.

    Parameters
    ----------
    field : ndarray, shape (3, ...)
        East, north, up components, any unit.

    Returns
    -------
    ndarray
        Dip (inclination), positive down [rad].
    """
    return np.asarray(np.arctan2(-field[2], np.hypot(field[0], field[1])))


def declination(field: FloatArray) -> FloatArray:
    """Direction of the field's horizontal part, which is magnetic north.

    Parameters
    ----------
    field : ndarray, shape (3, ...)
        East, north, up components, any unit.

    Returns
    -------
    ndarray
        Declination, east of true north, -pi to pi [rad].
    """
    return np.asarray(np.arctan2(field[0], field[1]))


def flux_density(field: FloatArray) -> FloatArray:
    """Magnitude of the field.

    Parameters
    ----------
    field : ndarray, shape (3, ...)
        Components along any axes [T].

    Returns
    -------
    ndarray
        Total flux density [T].
    """
    return np.asarray(np.sqrt(field[0] ** 2 + field[1] ** 2 + field[2] ** 2))


def gyrofrequency(magnitude: ArrayLike) -> FloatArray:
    """Electron gyrofrequency in a field, f_H = e B / (2 pi m_e).

    Parameters
    ----------
    magnitude : array_like
        Total flux density [T].

    Returns
    -------
    ndarray
        Gyrofrequency [Hz].

    Examples
    --------
    >>> round(float(gyrofrequency(50e-6)) / 1e6, 4)
    1.3996
    """
    return GYROFREQUENCY_PER_TESLA * np.asarray(magnitude, dtype=np.float64)


def _chebyshev_table(x: FloatArray, degree: int) -> FloatArray:
    """Values of T_0 ... T_degree at x, shape (degree + 1, *x.shape)."""
    table = np.empty((degree + 1, *x.shape))
    table[0] = 1.0
    if degree:
        table[1] = x
        twice = 2.0 * x
        for i in range(2, degree + 1):
            np.multiply(twice, table[i - 1], out=table[i])
            table[i] -= table[i - 2]
    return table


def _derivative_matrix(degree: int) -> FloatArray:
    """Matrix that takes Chebyshev coefficients to those of the derivative."""
    out = np.zeros((degree + 1, degree + 1))
    for i in range(1, degree + 1):
        unit = np.zeros(degree + 1)
        unit[i] = 1.0
        out[:degree, i] = chebyshev.chebder(unit)
    return out


# A matrix product rounds a column alike whatever stands beside it, if so many do.
_COLUMNS: Final = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class FieldFit:
    """A smooth fit of the field over the region of a path.

    The fit runs in three coordinates of the path: the angle along its great
    circle, the sine of the angle across it, and the height. Outside its box the field of
    the nearest point of the box is used.

    Parameters
    ----------
    axes : ndarray, shape (3, 3)
        Rows: unit vectors to the path's middle, along it there, and across [1].
    low, high : ndarray, shape (3,)
        Box: along [rad], sine across [1], height [m].
    exponents : ndarray of int, shape (3, terms)
        Chebyshev degrees of each term along the three coordinates [1].
    coefficients : ndarray, shape (12, terms)
        For each Cartesian component of B and of its derivatives along the
        three coordinates [T, T/rad, T, T/m].
    residual : float
        Largest difference to the field model at points between the fitted
        ones [T].
    model : str
        Name of the field model.
    """

    axes: FloatArray
    low: FloatArray
    high: FloatArray
    exponents: IntArray
    coefficients: FloatArray
    residual: float
    model: str = MODEL

    @property
    def degree(self) -> int:
        """Greatest degree of the fit along any coordinate [1]."""
        return int(self.exponents.max())

    def at(self, position: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Field and its gradient at points.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].

        Returns
        -------
        field : ndarray, shape (3, n)
            Flux density in Earth-centred axes [T].
        gradient : ndarray, shape (3, 3, n)
            Derivative of component i along axis j at [i, j] [T/m].
        """
        count = position.shape[1]
        path = self.axes @ padded(position, _COLUMNS)
        c, t, n = path
        ring = c * c + t * t
        square = ring + n * n
        radius = np.sqrt(square)
        coordinates = np.empty_like(path)
        np.arctan2(t, c, out=coordinates[0])
        np.divide(n, radius, out=coordinates[1])
        np.subtract(radius, EARTH_RADIUS, out=coordinates[2])
        scale = 2.0 / (self.high - self.low)
        x = coordinates * scale[:, None] - (self.low * scale + 1.0)[:, None]
        table = _chebyshev_table(np.minimum(np.maximum(x, -1.0), 1.0), self.degree)
        basis = table[:, 0].take(self.exponents[0], axis=0)
        basis *= table[:, 1].take(self.exponents[1], axis=0)
        basis *= table[:, 2].take(self.exponents[2], axis=0)
        values = (self.coefficients @ basis).reshape(4, 3, -1)
        # Gradients of the three coordinates, in path axes and then turned.
        upward = path / radius
        slope = np.empty((3, *path.shape))
        np.divide(-t, ring, out=slope[0, 0])
        np.divide(c, ring, out=slope[0, 1])
        slope[0, 2] = 0.0
        np.multiply(upward, -n / square, out=slope[1])
        slope[1, 2] += 1.0 / radius
        slope[2] = upward
        if np.abs(x).max() > 1.0:
            slope *= (np.abs(x) <= 1.0)[:, None, :]
        turned = self.axes.T @ slope
        gradient = np.einsum("min,mjn->ijn", values[1:], turned)
        return values[0][:, :count], gradient[..., :count]


def fit_field(
    latitude_1: float,
    longitude_1: float,
    latitude_2: float,
    longitude_2: float,
    when: datetime,
    *,
    margin: float = 400e3,
    top: float = 640e3,
) -> FieldFit:
    """Fit the field model over the region of a path.

    Parameters
    ----------
    latitude_1, longitude_1, latitude_2, longitude_2 : float
        The ends of the path [rad].
    when : datetime
        Instant.
    margin : float
        Width of the box beyond the path on every side [m].
    top : float
        Upper edge of the box; the lower is the ground [m].

    Returns
    -------
    FieldFit
        The fit, its residual checked against the model between the nodes.

    Raises
    ------
    OutsideModelError
        If the date is outside the model.
    MagionError
        If no fit leaves 5 nT or less.
    """
    angle, bearing = (
        float(v) for v in great_circle(latitude_1, longitude_1, latitude_2, longitude_2)
    )
    mid_lat, mid_lon = travel(latitude_1, longitude_1, bearing, angle / 2.0)
    middle = to_cartesian(mid_lat, mid_lon, 0.0) / EARTH_RADIUS
    east, north, _ = local_axes(latitude_1, longitude_1)
    start = to_cartesian(latitude_1, longitude_1, 0.0) / EARTH_RADIUS
    tangent = math.sin(bearing) * east + math.cos(bearing) * north
    along = math.cos(angle / 2.0) * tangent - math.sin(angle / 2.0) * start
    axes = np.stack([middle, along, np.cross(middle, along)])
    half = np.array([angle / 2.0 + margin / EARTH_RADIUS, margin / EARTH_RADIUS])
    low = np.array([-half[0], -math.sin(half[1]), 0.0])
    high = np.array([half[0], math.sin(half[1]), top])
    along_degree = max(4, math.ceil(3.0 + 9.0 * half[0]))
    for extra in range(8):
        degrees = (along_degree + 2 * extra, 4 + extra, 4 + (extra + 1) // 2)
        fit = _fit_box(axes, low, high, degrees, when)
        if fit.residual <= _CHECKED_SHARE * LARGEST_RESIDUAL:
            return fit
    raise MagionError(
        f"the field along the path could not be fitted to 5 nT (residual {fit.residual * 1e9:.1f})"
    )


def _model_on_box(axes: FloatArray, points: FloatArray, when: datetime) -> FloatArray:
    """Field model at box coordinates (3, n), in Earth-centred axes [T]."""
    u, v, h = points
    ring = np.sqrt(1.0 - v * v)
    direction = axes.T @ np.stack([ring * np.cos(u), ring * np.sin(u), v])
    latitude = np.arctan2(direction[2], np.hypot(direction[0], direction[1]))
    longitude = np.arctan2(direction[1], direction[0])
    east, north, up = local_axes(latitude, longitude)
    b = field_at(latitude, longitude, h, when)
    return np.asarray(east * b[0] + north * b[1] + up * b[2])


def _fit_box(
    axes: FloatArray,
    low: FloatArray,
    high: FloatArray,
    degrees: tuple[int, int, int],
    when: datetime,
) -> FieldFit:
    node_axes = [np.cos(np.pi * (np.arange(d + 1) + 0.5) / (d + 1)) for d in degrees]
    check_axes = [np.cos(np.pi * np.arange(0, d + 2) / (d + 1)) for d in degrees]
    check_axes[1] = check_axes[1][::2]
    check_axes[2] = check_axes[2][::2]
    grids = [
        np.stack(np.meshgrid(*a, indexing="ij")).reshape(3, -1) for a in (node_axes, check_axes)
    ]
    unit_points = np.concatenate(grids, axis=1)
    points = low[:, None] + (unit_points + 1.0) / 2.0 * (high - low)[:, None]
    truth = _model_on_box(axes, points, when)
    nodes = grids[0].shape[1]
    # Exact interpolation on the tensor nodes, then only terms of low weighted degree are kept.
    tensor = truth[:, :nodes].reshape(3, *(d + 1 for d in degrees))
    for axis, degree in enumerate(degrees):
        to_coefficients = np.linalg.inv(chebyshev.chebvander(node_axes[axis], degree))
        tensor = np.moveaxis(np.tensordot(to_coefficients, tensor, axes=(1, axis + 1)), 0, axis + 1)
    i, j, k = np.meshgrid(*(np.arange(d + 1) for d in degrees), indexing="ij")
    kept = i / degrees[0] + j / degrees[1] + k / degrees[2] <= 1.0 + 1e-9
    exponents = np.stack([i[kept], j[kept], k[kept]])
    tensor = tensor * kept  # before differentiating, so that value and gradient belong together
    blocks = [tensor]
    for axis, degree in enumerate(degrees):
        slope = np.tensordot(_derivative_matrix(degree), tensor, axes=(1, axis + 1))
        blocks.append(np.moveaxis(slope, 0, axis + 1) * 2.0 / (high[axis] - low[axis]))
    coefficients = np.concatenate([b[:, kept] for b in blocks])
    table = [_chebyshev_table(unit_points[a, nodes:], degrees[a]) for a in range(3)]
    basis = table[0][exponents[0]] * table[1][exponents[1]] * table[2][exponents[2]]
    residual = float(np.max(np.linalg.norm(coefficients[:3] @ basis - truth[:, nodes:], axis=0)))
    return FieldFit(
        axes=axes,
        low=low,
        high=high,
        exponents=exponents,
        coefficients=coefficients,
        residual=residual,
    )
