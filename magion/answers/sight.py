"""What comes down from a direction of the sky, without tracing a ray.

Below the ionosphere a wave runs straight, so one that comes from some direction
left the ionosphere where that line passes the limiting height, with the shape
that the field and the wave normal gave it there [Budden1952]_.
"""

from dataclasses import dataclass
from datetime import datetime

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import BoolArray, ComplexArray, FloatArray, as_floats, dot
from magion.constants import EARTH_RADIUS, SPEED_OF_LIGHT
from magion.field import field_at, flux_density
from magion.geometry import (
    Place,
    from_cartesian,
    horizontal_direction,
    local_axes,
    source_axes,
)
from magion.ionosphere.collisions import collision_frequency
from magion.ionosphere.profile import VerticalProfiles
from magion.polarization import axial_ratio_db, is_right_hand, major_axis_bearing
from magion.waves import (
    collision_ratio,
    gyro_ratio,
    index_difference,
    plasma_ratio,
    polarization_vectors,
    wave_axes,
)

_HEIGHTS = np.arange(62e3, 300e3, 500.0)
_FIELD_HEIGHT = 90e3


@dataclass(frozen=True, slots=True, kw_only=True)
class ArrivingShapes:
    """Both waves from some directions.

    Parameters
    ----------
    states : ndarray of complex, shape (2, 2, ...)
        Ordinary and extraordinary, each along h and v of
        :func:`magion.geometry.source_axes` [1].
    right_hand : ndarray of bool, shape (2, ...)
        Which of the two are right-hand [1].
    axial_ratio_db : ndarray, shape (2, ...)
        Their axial ratios [dB].
    major_axis_bearing : ndarray, shape (2, ...)
        Of the axis as projected on the ground, 0 to pi [rad].
    theta : ndarray, shape (...)
        Angle of the wave normal to the field [rad].
    Y : ndarray, shape (...)
        Gyro ratio at the limiting place [1].
    """

    states: ComplexArray
    right_hand: BoolArray
    axial_ratio_db: FloatArray
    major_axis_bearing: FloatArray
    theta: FloatArray
    Y: FloatArray


def line_of_sight(
    place: Place, azimuth: ArrayLike, elevation: ArrayLike, height: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Where straight lines from a place reach a height.

    Parameters
    ----------
    place : Place
        The place.
    azimuth, elevation : array_like
        Directions [rad].
    height : array_like
        Above the sphere [m].

    Returns
    -------
    position : ndarray, shape (3, ...)
        Earth-centred [m].
    direction : ndarray, shape (3, ...)
        Unit vector outward [1].
    """
    az, el, h = as_floats(azimuth, elevation, height)
    outward = horizontal_direction(az, el, place.latitude, place.longitude)
    _, _, up = local_axes(place.latitude, place.longitude)
    rise = EARTH_RADIUS * np.sin(el)
    length = np.sqrt(rise * rise + 2.0 * EARTH_RADIUS * h + h * h) - rise
    start = up.reshape((3, *(1,) * az.ndim)) * EARTH_RADIUS
    return start + outward * length, outward


def field_along(position: FloatArray, when: datetime) -> FloatArray:
    """Flux density at Earth-centred positions, in Earth-centred axes.

    Parameters
    ----------
    position : ndarray, shape (3, ...)
        Positions [m].
    when : datetime
        Instant.

    Returns
    -------
    ndarray, shape (3, ...)
        Flux density [T].
    """
    latitude, longitude, height = from_cartesian(position)
    b_east, b_north, b_up = field_at(latitude, longitude, height, when)
    east, north, up = local_axes(latitude, longitude)
    return np.asarray(b_east * east + b_north * north + b_up * up)


def arriving_shapes(
    place: Place,
    azimuth: ArrayLike,
    elevation: ArrayLike,
    height: ArrayLike,
    frequency: ArrayLike,
    when: datetime,
) -> ArrivingShapes:
    """Both waves that come down to a place from some directions.

    Parameters
    ----------
    place : Place
        The receiver.
    azimuth, elevation : array_like
        Directions toward the source [rad].
    height : array_like
        Limiting height [m].
    frequency : array_like
        Frequency [Hz].
    when : datetime
        Instant, for the field.

    Returns
    -------
    ArrivingShapes
        Limiting polarizations, with the collisions of that height and no plasma.
    """
    az, el, h, f = as_floats(azimuth, elevation, height, frequency)
    position, outward = line_of_sight(place, az, el, h)
    field = field_along(position, when)
    magnitude = flux_density(field)
    normal = -outward
    theta = np.arccos(np.clip(dot(normal, field) / magnitude, -1.0, 1.0))
    Y = gyro_ratio(magnitude, f)
    Z = collision_ratio(collision_frequency(h, np.zeros_like(h)), f)
    waves = polarization_vectors(np.zeros_like(f), Y, Z, theta)
    x, y = wave_axes(normal, field)
    east, north, up = local_axes(place.latitude, place.longitude)
    h_axis, v_axis = source_axes(az, el)
    tail = (1,) * az.ndim
    lifted = [axis.reshape((3, *tail)) for axis in (east, north, up)]
    states = []
    for wave in waves:
        vector = wave[0] * x + wave[1] * y
        local = np.stack([np.sum(vector * axis, axis=0) for axis in lifted])
        states.append(np.stack([np.sum(local * h_axis, axis=0), np.sum(local * v_axis, axis=0)]))
    return ArrivingShapes(
        states=np.stack(states),
        right_hand=np.stack([is_right_hand(w) for w in waves]),
        axial_ratio_db=np.stack([axial_ratio_db(w) for w in waves]),
        major_axis_bearing=np.stack(
            [major_axis_bearing(w, x, y, lifted[0], lifted[1]) for w in waves]
        ),
        theta=theta,
        Y=Y,
    )


def limiting_heights(
    profiles: VerticalProfiles,
    place: Place,
    azimuth: FloatArray,
    elevation: FloatArray,
    frequency: FloatArray,
    when: datetime,
) -> FloatArray:
    """Limiting height along straight lines of sight, in the ionosphere overhead.

    Parameters
    ----------
    profiles : VerticalProfiles
        The ionosphere over the place, the first of them.
    place : Place
        The receiver.
    azimuth, elevation, frequency : ndarray, shape (n,)
        Directions [rad] and frequencies [Hz].
    when : datetime
        Instant.

    Returns
    -------
    ndarray, shape (n,)
        Height above which more than one radian of O-X phase is gathered; the
        greatest height looked at (300 km) where it never is [m].
    """
    base, _ = line_of_sight(place, azimuth, elevation, _FIELD_HEIGHT)
    field = field_along(base, when)
    outward = horizontal_direction(azimuth, elevation, place.latitude, place.longitude)
    magnitude = flux_density(field)
    theta = np.arccos(np.clip(-dot(outward, field) / magnitude, -1.0, 1.0))
    density, _ = profiles.at_height(_HEIGHTS)
    nu = collision_frequency(_HEIGHTS, density)
    f = frequency[:, None]
    difference = index_difference(
        plasma_ratio(density, f),
        gyro_ratio(magnitude, frequency)[:, None],
        collision_ratio(nu, f),
        theta[:, None],
    )
    # Where a wave is turned back no phase is counted any more.
    difference = np.where(np.isfinite(difference), np.abs(difference), 0.0)
    rise = EARTH_RADIUS * np.sin(elevation)[:, None]
    length = np.sqrt(rise**2 + 2.0 * EARTH_RADIUS * _HEIGHTS + _HEIGHTS**2) - rise
    pieces = 0.5 * (difference[:, 1:] + difference[:, :-1]) * np.diff(length, axis=1)
    phase = np.cumsum(pieces, axis=1) * (2.0 * np.pi / SPEED_OF_LIGHT) * f
    reached = phase >= 1.0
    first = np.argmax(reached, axis=1)
    before = np.take_along_axis(phase, np.maximum(first - 1, 0)[:, None], axis=1)[:, 0]
    before = np.where(first > 0, before, 0.0)
    here = np.take_along_axis(phase, first[:, None], axis=1)[:, 0]
    with np.errstate(invalid="ignore", divide="ignore"):
        share = np.clip((1.0 - before) / (here - before), 0.0, 1.0)
    height = _HEIGHTS[first] + share * (_HEIGHTS[1] - _HEIGHTS[0])
    return np.asarray(np.where(reached.any(axis=1), height, _HEIGHTS[-1]))
