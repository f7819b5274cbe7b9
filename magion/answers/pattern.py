"""The response of a station's antenna to both hands over the sky."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.answers.inputs import require_frequency
from magion.antenna.impedance import unknown_impedance
from magion.antenna.response import (
    decibels,
    element_lengths,
    hand_gains,
    joined,
    networks,
    rejection_db,
)
from magion.antenna.station import Station
from magion.arrays import FloatArray
from magion.errors import InputError, OutsideModelError, require_range

SCHEMA: Final = "magion/antenna/1"
MOST_DIRECTIONS: Final = 200_000


@dataclass(frozen=True, slots=True, kw_only=True)
class PositionPattern:
    """One relay position over the sky.

    Parameters
    ----------
    label : str
        The operator's label.
    delayed_arm, single_arm : str or None
        Arm with the delay line; arm that is used alone.
    right_dbi, left_dbi : ndarray, shape (elevations, azimuths)
        Realized gain for circular waves of either hand that arrive [dB].
    right_over_left_db : ndarray, shape (elevations, azimuths)
        Their difference, within 60 either way [dB].
    """

    label: str
    delayed_arm: str | None
    single_arm: str | None
    right_dbi: FloatArray
    left_dbi: FloatArray
    right_over_left_db: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class ArmBearing:
    """One element's direction.

    Parameters
    ----------
    name : str
        The operator's name.
    hot_bearing_deg : float
        True bearing of its hot leg [deg].
    """

    name: str
    hot_bearing_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennaAnswer:
    """The response of an antenna over the sky.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    station : str or None
        Name of the station.
    kind, ground, feed : str
        Kind of antenna, ground in words, kind of feed.
    height_m : float
        Of the feed point [m].
    frequency_mhz : float
        Frequency [MHz].
    arms : tuple of ArmBearing
        The elements.
    elevation_deg : ndarray, shape (elevations,)
        Angles above the horizontal [deg].
    azimuth_deg : ndarray, shape (azimuths,)
        Where the waves come from, east of true north [deg].
    positions : tuple of PositionPattern
        Every relay position.
    """

    schema: str
    station: str | None
    kind: str
    ground: str
    feed: str
    height_m: float
    frequency_mhz: float
    arms: tuple[ArmBearing, ...]
    elevation_deg: FloatArray
    azimuth_deg: FloatArray
    positions: tuple[PositionPattern, ...]


def answer_antenna(
    station: Station,
    frequency_mhz: float,
    elevation_deg: Sequence[float] | FloatArray | None = None,
    azimuth_deg: Sequence[float] | FloatArray | None = None,
) -> AntennaAnswer:
    """The response of every relay position to both hands over the sky.

    Parameters
    ----------
    station : Station
        The station.
    frequency_mhz : float
        Frequency, 0.5 to 60 [MHz].
    elevation_deg : sequence of float, optional
        Elevations, 0 to 90; else 5 to 90 by 5 [deg].
    azimuth_deg : sequence of float, optional
        Azimuths, 0 to 360; else 0 to 345 by 15 [deg].

    Returns
    -------
    AntennaAnswer
        Gains over isotropic, mismatch and losses included.

    Raises
    ------
    InputError
        If a value is out of range.
    OutsideModelError
        If the impedance of the elements is not known at the frequency.
    """
    f = require_frequency(frequency_mhz)
    elevation = np.asarray(np.arange(5.0, 91.0, 5.0) if elevation_deg is None else elevation_deg)
    azimuth = np.asarray(np.arange(0.0, 360.0, 15.0) if azimuth_deg is None else azimuth_deg)
    for value in elevation:
        require_range("an elevation", float(value), 0.0, 90.0, "degrees")
    for value in azimuth:
        require_range("an azimuth", float(value), 0.0, 360.0, "degrees")
    if not 1 <= elevation.size * azimuth.size <= MOST_DIRECTIONS:
        raise InputError(
            f"{elevation.size} elevations times {azimuth.size} azimuths; accepted: 1 to "
            f"{MOST_DIRECTIONS} directions"
        )
    nets = networks(station, f)
    if not all(np.isfinite(n.current).all() for n in nets):
        raise OutsideModelError(unknown_impedance(station, f))
    az, el = np.meshgrid(np.radians(azimuth), np.radians(elevation))
    lengths = element_lengths(station, f, az, el)
    patterns = []
    for position, net in zip(station.relay, nets, strict=True):
        right, left = hand_gains(joined(net.current[..., None], lengths), f)
        patterns.append(
            PositionPattern(
                label=position.label,
                delayed_arm=position.delayed,
                single_arm=position.single,
                right_dbi=decibels(right),
                left_dbi=decibels(left),
                right_over_left_db=rejection_db(right, left),
            )
        )
    return AntennaAnswer(
        schema=SCHEMA,
        station=station.name,
        kind=station.antenna.kind.value,
        ground=station.ground_name,
        feed=station.feed.kind.value,
        height_m=station.antenna.height,
        frequency_mhz=frequency_mhz,
        arms=tuple(
            ArmBearing(name=a.name, hot_bearing_deg=math.degrees(a.bearing))
            for a in station.antenna.arms
        ),
        elevation_deg=elevation,
        azimuth_deg=azimuth,
        positions=tuple(patterns),
    )
