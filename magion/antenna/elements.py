"""Elements over ground: the complex effective length toward both polarizations.

An element with effective length l gives the open-circuit voltage l · E of a
wave that arrives with the field E (at the ground below the feed point), and
driven by a current I it radiates a field in proportion to I l in the same
direction: reception and transmission share one l. Wires carry the sinusoidal
current of a straight thin wire, zero at its end; the ground reflects by its
Fresnel coefficients for both polarizations [Fresnel]_, [KrausMarhefka2002]_.

The axes h and v of a direction are those of
:func:`magion.geometry.source_axes`.
"""

import math
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.antenna.station import Antenna
from magion.arrays import ComplexArray, FloatArray, as_floats
from magion.constants import SPEED_OF_LIGHT
from magion.geometry import source_axes
from magion.ground import Ground, reflection

HALF_WAVE_LEG: Final = 0.2375
"""Leg of a resonant thin half-wave dipole over wavelength (common practice) [1]."""

LOOP_AREA: Final = 1.0
"""Area that small loops are given; ratios between waves do not depend on it [m²]."""


def _leg_integral(k: FloatArray, leg: float, cosine: FloatArray) -> ComplexArray:
    """Integral of sin k(L − x) / sin kL · exp(i k x cos) over the leg [m]."""

    def running(q: FloatArray) -> ComplexArray:
        # Integral of exp(iqx), without a singular point.
        half = 0.5 * q * leg
        return np.asarray(leg * np.sinc(half / np.pi) * np.exp(1j * half))

    end = np.exp(1j * k * leg)
    forward, backward = running(k * (cosine - 1.0)), running(k * (cosine + 1.0))
    return np.asarray((end * forward - np.conj(end) * backward) / (2j * np.sin(k * leg)))


def leg_directions(bearing: float, apex_angle: float) -> tuple[FloatArray, FloatArray]:
    """Directions of the hot and the cold leg from the feed point.

    Parameters
    ----------
    bearing : float
        Of the hot leg, east of true north [rad].
    apex_angle : float
        Between the legs, pi where they are level [rad].

    Returns
    -------
    hot, cold : ndarray, shape (3,)
        Unit vectors east, north, up [1].
    """
    level, down = math.sin(0.5 * apex_angle), -math.cos(0.5 * apex_angle)
    s, c = math.sin(bearing), math.cos(bearing)
    return np.array([level * s, level * c, down]), np.array([-level * s, -level * c, down])


def wire_length(
    bearing: float,
    leg: float,
    height: float,
    apex_angle: float,
    ground: Ground | None,
    frequency: ArrayLike,
    azimuth: ArrayLike,
    elevation: ArrayLike,
) -> ComplexArray:
    """Effective length of a centre-fed dipole or inverted vee.

    Parameters
    ----------
    bearing : float
        Of the hot leg [rad].
    leg : float
        Length of each leg [m].
    height : float
        Of the feed point [m].
    apex_angle : float
        Between the legs [rad].
    ground : Ground or None
        The ground; None for free space.
    frequency, azimuth, elevation : array_like
        Frequency [Hz] and direction [rad], of one shape together.

    Returns
    -------
    ndarray of complex, shape (2, ...)
        Along h and v; the hot terminal positive [m].
    """
    f, az, el = as_floats(frequency, azimuth, elevation)
    k = 2.0 * np.pi * f / SPEED_OF_LIGHT
    h, v = source_axes(az, el)
    up = np.sin(el)
    flat = np.cos(el)
    sight = np.stack([flat * np.sin(az), flat * np.cos(az), up])
    mirrored = np.stack([sight[0], sight[1], -up])
    v_mirrored = np.stack([-v[0], -v[1], v[2]])
    phase = np.exp(1j * k * height * up)
    if ground is not None:
        r_h, r_v = reflection(ground, f, el)
    total = np.zeros((2, *az.shape), dtype=np.complex128)
    for sign, leg_axis in zip((1.0, -1.0), leg_directions(bearing, apex_angle), strict=True):
        along_h = np.tensordot(leg_axis, h, axes=1)
        direct = sign * phase * _leg_integral(k, leg, np.tensordot(leg_axis, sight, axes=1))
        total[0] += along_h * direct
        total[1] += np.tensordot(leg_axis, v, axes=1) * direct
        if ground is None:
            continue
        image = sign * np.conj(phase)
        image = image * _leg_integral(k, leg, np.tensordot(leg_axis, mirrored, axes=1))
        total[0] += r_h * along_h * image
        total[1] += r_v * np.tensordot(leg_axis, v_mirrored, axes=1) * image
    return total


def loop_length(
    bearing: float,
    height: float,
    ground: Ground | None,
    frequency: ArrayLike,
    azimuth: ArrayLike,
    elevation: ArrayLike,
) -> ComplexArray:
    """Effective length of a small vertical loop.

    Parameters
    ----------
    bearing : float
        Of the loop's plane on the hot side: the bottom wire runs toward it, and
        the loop's axis lies 90 degrees to its right [rad].
    height : float
        Of its centre [m].
    ground : Ground or None
        The ground; None for free space.
    frequency, azimuth, elevation : array_like
        Frequency [Hz] and direction [rad], of one shape together.

    Returns
    -------
    ndarray of complex, shape (2, ...)
        Along h and v, of a loop of 1 m² [m].
    """
    f, az, el = as_floats(frequency, azimuth, elevation)
    k = 2.0 * np.pi * f / SPEED_OF_LIGHT
    h, v = source_axes(az, el)
    # Faraday: V = −iω μ0 A n·H, H = k x E / eta, the axis n square to the plane.
    normal = np.array([math.cos(bearing), -math.sin(bearing), 0.0])
    along_h, along_v = np.tensordot(normal, h, axes=1), np.tensordot(normal, v, axes=1)
    direct = np.exp(1j * k * height * np.sin(el))
    image_h: ComplexArray | float = 0.0
    image_v: ComplexArray | float = 0.0
    if ground is not None:
        r_h, r_v = reflection(ground, f, el)
        image_h, image_v = r_h * np.conj(direct), r_v * np.conj(direct)
    # k x h = v before the ground; after it the horizontal part of v is reversed.
    from_h = along_v * (direct - image_h)
    from_v = -along_h * (direct + image_v)
    return np.asarray(-1j * k * LOOP_AREA * np.stack([from_h, from_v]))


def effective_lengths(
    antenna: Antenna,
    leg: float | None,
    ground: Ground | None,
    frequency: ArrayLike,
    azimuth: ArrayLike,
    elevation: ArrayLike,
) -> ComplexArray:
    """Effective length of every element of an antenna.

    Parameters
    ----------
    antenna : Antenna
        The antenna.
    leg : float or None
        Length of each leg; None for loops [m].
    ground : Ground or None
        The ground; None for free space.
    frequency, azimuth, elevation : array_like
        Frequency [Hz] and direction toward the source [rad], of one shape
        together.

    Returns
    -------
    ndarray of complex, shape (arms, 2, ...)
        Of each arm, along h and v [m].
    """
    found: Sequence[ComplexArray]
    if antenna.kind.is_loops or leg is None:
        found = [
            loop_length(arm.bearing, antenna.height, ground, frequency, azimuth, elevation)
            for arm in antenna.arms
        ]
    else:
        found = [
            wire_length(
                arm.bearing,
                leg,
                antenna.height,
                antenna.apex_angle,
                ground,
                frequency,
                azimuth,
                elevation,
            )
            for arm in antenna.arms
        ]
    return np.stack(found)
