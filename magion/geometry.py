"""Places, locators, great circles, local axes and the sun's angle.

The Earth of rays and great circles is a sphere of 6371 km. Against the
ellipsoid this costs up to 0.56 % in distance and 0.2 degrees in bearing up to
12,000 km, and in the midpoint 3 km up to 4,000 km, 21 km up to 12,000 km
(tests/published/test_great_circle.py). Latitudes are those on the map
(geodetic).
"""

import math
import re
from dataclasses import dataclass
from datetime import UTC, datetime

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray, as_floats
from magion.constants import EARTH_RADIUS
from magion.errors import InputError

_LOCATOR = re.compile(r"[A-R]{2}[0-9]{2}(?:[A-X]{2}(?:[0-9]{2})?)?")
_COORDINATE = re.compile(r"([+-]?(?:\d+(?:\.\d*)?|\.\d+))\s*°?\s*([NSEW]?)", re.IGNORECASE)
PLACE_FORMS = "LAT,LON in decimal degrees (46.50,11.35 or 41.0S,71.3W) or a 4, 6 or 8 sign locator"
"""What :func:`parse_place` accepts, as messages say it."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """A place on the ground.

    Parameters
    ----------
    latitude_deg : float
        Latitude, north positive, -90 to 90 [deg].
    longitude_deg : float
        Longitude, east positive, -180 to 180 [deg].
    name : str or None
        The user's name for it.

    Raises
    ------
    InputError
        If a coordinate is out of range or not a number.
    """

    latitude_deg: float
    longitude_deg: float
    name: str | None = None

    def __post_init__(self) -> None:
        if not -90.0 <= self.latitude_deg <= 90.0:
            raise InputError(f"latitude {self.latitude_deg:.10g} is not within -90 to 90 degrees")
        if not -180.0 <= self.longitude_deg <= 180.0:
            raise InputError(
                f"longitude {self.longitude_deg:.10g} is not within -180 to 180 degrees"
            )

    @property
    def locator(self) -> str:
        """Six-sign grid locator of the place [text]."""
        return locator_of(self.latitude_deg, self.longitude_deg)

    @property
    def latitude(self) -> float:
        """Latitude [rad]."""
        return math.radians(self.latitude_deg)

    @property
    def longitude(self) -> float:
        """Longitude [rad]."""
        return math.radians(self.longitude_deg)


def locator_of(latitude_deg: float, longitude_deg: float, signs: int = 6) -> str:
    """Grid locator of the square that holds a place.

    Parameters
    ----------
    latitude_deg, longitude_deg : float
        Place [deg].
    signs : {4, 6, 8}
        Length of the locator.

    Returns
    -------
    str
        The locator, truncated (never rounded) to `signs`.

    Examples
    --------
    >>> locator_of(46.50, 11.35)
    'JN56qm'
    """
    # Counted in whole smallest squares, so that no rounding moves a border.
    x = min(int((longitude_deg + 180.0) * 120.0 + 1e-9), 43_199)
    y = min(int((latitude_deg + 90.0) * 240.0 + 1e-9), 43_199)
    letters = "ABCDEFGHIJKLMNOPQRSTUVWX"
    text = (
        letters[x // 2400]
        + letters[y // 2400]
        + str(x // 240 % 10)
        + str(y // 240 % 10)
        + letters[x // 10 % 24].lower()
        + letters[y // 10 % 24].lower()
        + str(x % 10)
        + str(y % 10)
    )
    return text[:signs]


def place_of_locator(locator: str) -> tuple[float, float]:
    """Centre of a locator's square.

    Parameters
    ----------
    locator : str
        4, 6 or 8 signs, in any case.

    Returns
    -------
    latitude_deg, longitude_deg : float
        Centre of the square [deg].

    Raises
    ------
    InputError
        If the text is not a locator.
    """
    text = locator.strip().upper()
    if not (locator.isascii() and _LOCATOR.fullmatch(text)):
        raise InputError(f"{locator!r} is not a locator; accepted: AA00, AA00aa or AA00aa00")
    lon, lat = -180.0, -90.0
    width = 360.0
    for i, base in enumerate((18, 10, 24, 10)[: len(text) // 2]):
        width /= base
        start = "0" if i % 2 else "A"
        lon += (ord(text[2 * i]) - ord(start)) * width
        lat += (ord(text[2 * i + 1]) - ord(start)) * width / 2.0
    return lat + width / 4.0, lon + width / 2.0


def _coordinate(text: str, positive: str, negative: str) -> float | None:
    match = _COORDINATE.fullmatch(text.strip())
    if match is None:
        return None
    number, letter = float(match.group(1)), match.group(2).upper()
    if letter and (letter not in positive + negative or match.group(1)[0] in "+-"):
        return None
    return -number if letter and letter == negative else number


def parse_place(text: str, name: str | None = None) -> Place:
    """Read a place as a user types it.

    Parameters
    ----------
    text : str
        ``LAT,LON`` in decimal degrees, signed or with N, S, E, W; or a grid
        locator of 4, 6 or 8 signs.
    name : str, optional
        A name to carry along.

    Returns
    -------
    Place
        The place; of a locator, the centre of its square.

    Raises
    ------
    InputError
        If the text is neither, or out of range.

    Examples
    --------
    >>> parse_place("41.0S,71.3W").latitude_deg
    -41.0
    """
    plain = text.strip().replace("\N{MINUS SIGN}", "-")
    if plain.isascii() and _LOCATOR.fullmatch(plain.upper()):
        lat_deg, lon_deg = place_of_locator(plain)
        return Place(latitude_deg=lat_deg, longitude_deg=lon_deg, name=name)
    parts = plain.split(",")
    if len(parts) == 2:
        lat = _coordinate(parts[0], "N", "S")
        lon = _coordinate(parts[1], "E", "W")
        if lat is not None and lon is not None:
            try:
                return Place(latitude_deg=lat, longitude_deg=lon, name=name)
            except InputError as error:
                raise InputError(f"place {plain!r}: {error}") from None
    raise InputError(f"{plain!r} is not a place; accepted: {PLACE_FORMS}")


def _full_turn(angle: FloatArray) -> FloatArray:
    """Angles within 0 and below 2 pi."""
    turned = angle % (2.0 * np.pi)
    return np.where(turned >= 2.0 * np.pi, 0.0, turned)


def great_circle(
    latitude_1: ArrayLike, longitude_1: ArrayLike, latitude_2: ArrayLike, longitude_2: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Central angle and initial bearing from one place to another.

    Parameters
    ----------
    latitude_1, longitude_1, latitude_2, longitude_2 : array_like
        The two places [rad].

    Returns
    -------
    angle : ndarray
        Central angle; times the Earth's radius it is the distance [rad].
    bearing : ndarray
        Direction at place 1 toward place 2, east of true north, 0 to 2 pi;
        0 where the places coincide [rad].
    """
    phi1, lam1, phi2, lam2 = as_floats(latitude_1, longitude_1, latitude_2, longitude_2)
    dlam = lam2 - lam1
    east = np.cos(phi2) * np.sin(dlam)
    # cos φ1 sin φ2 − sin φ1 cos φ2 cos Δλ, without its cancellation for near places
    north = np.sin(phi2 - phi1) + 2.0 * np.sin(phi1) * np.cos(phi2) * np.sin(dlam / 2.0) ** 2
    up = np.sin(phi1) * np.sin(phi2) + np.cos(phi1) * np.cos(phi2) * np.cos(dlam)
    angle = np.arctan2(np.hypot(east, north), up)
    return angle, np.where(angle < 1e-12, 0.0, _full_turn(np.arctan2(east, north)))


def travel(
    latitude: ArrayLike, longitude: ArrayLike, bearing: ArrayLike, angle: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Place reached along a great circle.

    Parameters
    ----------
    latitude, longitude : array_like
        Start [rad].
    bearing : array_like
        Initial direction, east of true north [rad].
    angle : array_like
        Central angle travelled [rad].

    Returns
    -------
    latitude, longitude : ndarray
        The place [rad].
    """
    phi, lam, alpha, sigma = as_floats(latitude, longitude, bearing, angle)
    z = np.sin(phi) * np.cos(sigma) + np.cos(phi) * np.sin(sigma) * np.cos(alpha)
    x = np.cos(phi) * np.cos(sigma) - np.sin(phi) * np.sin(sigma) * np.cos(alpha)
    y = np.sin(sigma) * np.sin(alpha)
    lon = lam + np.arctan2(y, x)
    return np.arctan2(z, np.hypot(x, y)), (lon + np.pi) % (2.0 * np.pi) - np.pi


def local_axes(
    latitude: ArrayLike, longitude: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Unit vectors east, north and up at a place, in Earth-centred axes.

    Parameters
    ----------
    latitude, longitude : array_like
        Place [rad]. At a pole, east and north are those of the given longitude.

    Returns
    -------
    east, north, up : ndarray, shape (3, ...)
        Unit vectors [1].
    """
    phi, lam = as_floats(latitude, longitude)
    sin_phi, cos_phi, sin_lam, cos_lam = np.sin(phi), np.cos(phi), np.sin(lam), np.cos(lam)
    east = np.stack([-sin_lam, cos_lam, np.zeros_like(phi)])
    north = np.stack([-sin_phi * cos_lam, -sin_phi * sin_lam, cos_phi])
    up = np.stack([cos_phi * cos_lam, cos_phi * sin_lam, sin_phi])
    return east, north, up


def to_cartesian(latitude: ArrayLike, longitude: ArrayLike, height: ArrayLike) -> FloatArray:
    """Earth-centred position of a point above the sphere.

    Parameters
    ----------
    latitude, longitude : array_like
        Place [rad].
    height : array_like
        Height above the sphere of 6371 km [m].

    Returns
    -------
    ndarray, shape (3, ...)
        Position [m].
    """
    phi, lam, h = as_floats(latitude, longitude, height)
    return local_axes(phi, lam)[2] * (EARTH_RADIUS + h)


def from_cartesian(position: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Latitude, longitude and height of an Earth-centred position.

    Parameters
    ----------
    position : ndarray, shape (3, ...)
        Position [m].

    Returns
    -------
    latitude, longitude : ndarray
        Place [rad].
    height : ndarray
        Height above the sphere of 6371 km [m].
    """
    x, y, z = position
    rho = np.hypot(x, y)
    return np.arctan2(z, rho), np.arctan2(y, x), np.hypot(rho, z) - EARTH_RADIUS


def horizontal_direction(
    azimuth: ArrayLike, elevation: ArrayLike, latitude: ArrayLike, longitude: ArrayLike
) -> FloatArray:
    """Unit vector of an azimuth and elevation at a place, in Earth-centred axes.

    Parameters
    ----------
    azimuth : array_like
        East of true north [rad].
    elevation : array_like
        Above the horizontal [rad].
    latitude, longitude : array_like
        Place [rad].

    Returns
    -------
    ndarray, shape (3, ...)
        Unit vector [1].
    """
    az, el, phi, lam = as_floats(azimuth, elevation, latitude, longitude)
    east, north, up = local_axes(phi, lam)
    return np.asarray(np.cos(el) * (np.sin(az) * east + np.cos(az) * north) + np.sin(el) * up)


def source_axes(azimuth: ArrayLike, elevation: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Transverse axes of directions, in east, north and up.

    ::

                v  upward, across the direction
                |   /  to the source
                |  /
                | /____ h  horizontal, toward growing azimuth (clockwise on the map)

    A wave that arrives from there travels along h x v, one that leaves along -h x v.

    Parameters
    ----------
    azimuth : array_like
        Direction toward the source, east of true north [rad].
    elevation : array_like
        Above the horizontal [rad].

    Returns
    -------
    h, v : ndarray, shape (3, ...)
        Horizontal axis toward growing azimuth, and upward axis [1].
    """
    a, e = as_floats(azimuth, elevation)
    sa, ca, se, ce = np.sin(a), np.cos(a), np.sin(e), np.cos(e)
    return np.stack([ca, -sa, np.zeros_like(a)]), np.stack([-se * sa, -se * ca, ce])


def azimuth_elevation(
    direction: FloatArray, latitude: ArrayLike, longitude: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Azimuth and elevation of a direction at a place.

    Parameters
    ----------
    direction : ndarray, shape (3, ...)
        Vector in Earth-centred axes, of any length.
    latitude, longitude : array_like
        Place [rad].

    Returns
    -------
    azimuth : ndarray
        East of true north, 0 to 2 pi [rad].
    elevation : ndarray
        Above the horizontal [rad].
    """
    east, north, up = local_axes(latitude, longitude)
    e = np.einsum("i...,i...->...", direction, east)
    n = np.einsum("i...,i...->...", direction, north)
    u = np.einsum("i...,i...->...", direction, up)
    return _full_turn(np.arctan2(e, n)), np.arctan2(u, np.hypot(e, n))


def as_utc(when: datetime) -> datetime:
    """The same instant in UTC; without a zone, it is UTC already.

    Parameters
    ----------
    when : datetime
        An instant, aware or naive.

    Returns
    -------
    datetime
        The instant, aware, in UTC.
    """
    return when.replace(tzinfo=UTC) if when.tzinfo is None else when.astimezone(UTC)


def subsolar_point(when: datetime) -> tuple[float, float]:
    """Place where the sun stands overhead.

    Low-precision formulas of the Astronomical Almanac (0.01 degrees between
    1950 and 2050) [Almanac]_.

    Parameters
    ----------
    when : datetime
        An instant; without a zone, UTC.

    Returns
    -------
    latitude, longitude : float
        Subsolar place [rad].
    """
    since_2000 = (as_utc(when) - datetime(2000, 1, 1, 12, tzinfo=UTC)).total_seconds() / 86_400.0
    mean_longitude = math.radians(280.460 + 0.9856474 * since_2000)
    anomaly = math.radians(357.528 + 0.9856003 * since_2000)
    ecliptic = (
        mean_longitude
        + math.radians(1.915) * math.sin(anomaly)
        + math.radians(0.020) * math.sin(2.0 * anomaly)
    )
    obliquity = math.radians(23.439 - 4.0e-7 * since_2000)
    declination = math.asin(math.sin(obliquity) * math.sin(ecliptic))
    right_ascension = math.atan2(math.cos(obliquity) * math.sin(ecliptic), math.cos(ecliptic))
    sidereal = math.radians((280.46061837 + 360.98564736629 * since_2000) % 360.0)
    longitude = math.remainder(right_ascension - sidereal, 2.0 * math.pi)
    return declination, longitude


def solar_zenith_angle(when: datetime, latitude: ArrayLike, longitude: ArrayLike) -> FloatArray:
    """Angle of the sun from the zenith, without refraction.

    Parameters
    ----------
    when : datetime
        An instant; without a zone, UTC.
    latitude, longitude : array_like
        Places [rad].

    Returns
    -------
    ndarray
        Zenith angle, 0 to pi [rad].
    """
    sun_latitude, sun_longitude = subsolar_point(when)
    return great_circle(latitude, longitude, sun_latitude, sun_longitude)[0]
