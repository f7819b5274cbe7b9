"""Ellipse, hand and match of a wave's polarization.

The hand is that of IEEE Std 145, the ITU Radio Regulations and IEC 60050-705:
a field that turns clockwise seen looking along the direction of travel is
right-hand. Optics says the opposite. With exp(+i omega t) and axes x, y, z
(z along the travel, y = z cross x) a right-hand wave has E_y = -i E_x.
"""

from dataclasses import dataclass
from enum import Enum
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import BoolArray, ComplexArray, FloatArray, dot

CIRCULAR_LIMIT_DB: Final = 3.0
"""Axial ratio up to which a wave is called circular [dB]."""

LINEAR_LIMIT_DB: Final = 20.0 * 0.38277568
"""Axial ratio above which a single wire beats circular, 20 log10(1 + sqrt(2)) [dB]."""

LARGEST_AXIAL_RATIO_DB: Final = 60.0
"""Axial ratio beyond which a wave is simply linear [dB]."""


class Hand(Enum):
    """Hand of polarization, IEEE."""

    RIGHT = "RHCP"
    LEFT = "LHCP"

    @property
    def opposite(self) -> "Hand":
        """The other hand."""
        return Hand.LEFT if self is Hand.RIGHT else Hand.RIGHT


class Shape(Enum):
    """Shape of the ellipse, by what an antenna can do with it."""

    CIRCULAR = "circular"
    ELLIPTICAL = "elliptical"
    LINEAR = "linear"


@dataclass(frozen=True, slots=True, kw_only=True)
class HandInWords:
    """One hand, said the four ways an operator meets it.

    Parameters
    ----------
    ieee : Hand
        IEEE hand, seen along the direction of travel.
    looking_up : str
        Turn of a wave that comes down, seen from the ground looking up.
    on_the_map : str
        Turn of a wave that comes down, seen from above, as on a map.
    delayed_arm : str
        Which arm of two flat crossed dipoles carries the quarter-wave line to
        receive it from overhead, the hot legs pointing north and east.
    """

    ieee: Hand
    looking_up: str
    on_the_map: str
    delayed_arm: str


def hand_in_words(hand: Hand) -> HandInWords:
    """Say the hand of a wave arriving from above in four ways.

    Parameters
    ----------
    hand : Hand
        IEEE hand of the arriving wave.

    Returns
    -------
    HandInWords
        The four ways.

    Notes
    -----
    A right-hand wave coming down turns clockwise seen along its travel, which
    is downward: as on the map. Looking up at it, it turns the other way. A
    left-hand wave turns from north to west on the map, so the voltage of an
    east leg leads that of a north leg and must be delayed.

    Examples
    --------
    >>> hand_in_words(Hand.LEFT).looking_up
    'clockwise'
    """
    if hand is Hand.RIGHT:
        return HandInWords(
            ieee=hand,
            looking_up="anticlockwise",
            on_the_map="clockwise",
            delayed_arm="north-south",
        )
    return HandInWords(
        ieee=hand, looking_up="clockwise", on_the_map="anticlockwise", delayed_arm="east-west"
    )


def stokes(field: ComplexArray) -> FloatArray:
    """Stokes parameters of a wave.

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y).

    Returns
    -------
    ndarray, shape (4, ...)
        I, Q, U, V in the unit of |field|²; V > 0 is left-hand (IEEE) here.
    """
    e_x, e_y = field
    i, q = np.abs(e_x) ** 2 + np.abs(e_y) ** 2, np.abs(e_x) ** 2 - np.abs(e_y) ** 2
    product = 2.0 * np.conj(e_x) * e_y
    return np.stack([i, q, product.real, product.imag])


def is_right_hand(field: ComplexArray) -> BoolArray:
    """Whether waves turn right-hand (IEEE).

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y), z along the travel.

    Returns
    -------
    ndarray of bool
        True for right-hand; of a linear wave, the sign of what is left.
    """
    return np.asarray(stokes(field)[3] < 0.0)


def hand_of(field: ComplexArray) -> Hand:
    """Hand of one wave.

    Parameters
    ----------
    field : ndarray of complex, shape (2,)
        (E_x, E_y), z along the travel.

    Returns
    -------
    Hand
        Its IEEE hand.
    """
    return Hand.RIGHT if bool(is_right_hand(field)) else Hand.LEFT


def axial_ratio(field: ComplexArray) -> FloatArray:
    """Major over minor axis of the ellipse.

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y).

    Returns
    -------
    ndarray
        Axial ratio, 1 (circular) to infinity (linear) [1].
    """
    i, q, u, v = stokes(field)
    flat = np.hypot(q, u)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        # tan of the ellipticity angle, (I − sqrt(Q²+U²)) / |V|, without cancellation
        return np.asarray(np.maximum((i + flat) / np.abs(v), 1.0))


def axial_ratio_db(field: ComplexArray) -> FloatArray:
    """Axial ratio in decibels.

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y).

    Returns
    -------
    ndarray
        20 log10 of the axial ratio, infinite for a linear wave [dB].
    """
    return np.asarray(20.0 * np.log10(axial_ratio(field)))


def shape_of(ratio_db: float) -> Shape:
    """Name the shape of an ellipse.

    Parameters
    ----------
    ratio_db : float
        Axial ratio [dB].

    Returns
    -------
    Shape
        Circular up to 3 dB; linear above 7.66 dB, where one wire beats a
        circular antenna; elliptical between.
    """
    if ratio_db <= CIRCULAR_LIMIT_DB:
        return Shape.CIRCULAR
    return Shape.LINEAR if ratio_db > LINEAR_LIMIT_DB else Shape.ELLIPTICAL


def tilt(field: ComplexArray) -> FloatArray:
    """Angle of the major axis from x toward y.

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y).

    Returns
    -------
    ndarray
        Tilt, -pi/2 to pi/2 [rad].
    """
    _, q, u, _ = stokes(field)
    return np.asarray(0.5 * np.arctan2(u, q))


def match(first: ComplexArray, second: ComplexArray) -> FloatArray:
    """Share of one wave's power that an antenna matched to another state takes.

    Parameters
    ----------
    first, second : ndarray of complex, shape (2, ...)
        Two polarization states on the same axes; of the antenna, the state of
        the wave that it receives best.

    Returns
    -------
    ndarray
        0 (opposite states) to 1 (equal states) [1].
    """
    power = np.sum(np.abs(first) ** 2, axis=0) * np.sum(np.abs(second) ** 2, axis=0)
    return np.asarray(np.abs(np.sum(np.conj(first) * second, axis=0)) ** 2 / power)


def ellipse(ratio: ArrayLike, tilt_angle: ArrayLike, right_hand: ArrayLike) -> ComplexArray:
    """Unit Jones vector of an ellipse.

    Parameters
    ----------
    ratio : array_like
        Axial ratio, 1 or more [1].
    tilt_angle : array_like
        Angle of the major axis from x toward y [rad].
    right_hand : array_like of bool
        True for right-hand (IEEE).

    Returns
    -------
    ndarray of complex, shape (2, ...)
        (E_x, E_y) of unit length [1].
    """
    r, angle, right = np.broadcast_arrays(ratio, tilt_angle, right_hand)
    major = 1.0 / np.sqrt(1.0 + 1.0 / (r * r))
    minor = np.where(right, -1j, 1j) / np.sqrt(1.0 + r * r)
    c, s = np.cos(angle), np.sin(angle)
    return np.stack([major * c - minor * s, major * s + minor * c])


def major_axis_bearing(
    field: ComplexArray, x: FloatArray, y: FloatArray, east: FloatArray, north: FloatArray
) -> FloatArray:
    """Bearing of the ellipse's major axis as projected on the ground.

    Parameters
    ----------
    field : ndarray of complex, shape (2, ...)
        (E_x, E_y).
    x, y : ndarray, shape (3, ...)
        The transverse axes, from :func:`magion.waves.wave_axes`.
    east, north : ndarray, shape (3, ...)
        Local axes of the ground.

    Returns
    -------
    ndarray
        East of true north, 0 to pi [rad].
    """
    angle = tilt(field)
    axis = np.cos(angle) * x + np.sin(angle) * y
    return np.arctan2(dot(axis, east), dot(axis, north)) % np.pi
