"""Stations without files or tables: arms of stated impedance over a stated ground."""

import math

import numpy as np

from magion.antenna.station import (
    Antenna,
    AntennaKind,
    Arm,
    Feed,
    FeedKind,
    MeasuredImpedance,
    RelayPosition,
    Station,
)
from magion.constants import SPEED_OF_LIGHT
from magion.geometry import Place
from magion.ground import PERFECT

LEFT, RIGHT = RelayPosition(label="left", delayed="E"), RelayPosition(label="right", delayed="N")
WIRES = RelayPosition(label="wire N", single="N"), RelayPosition(label="wire E", single="E")
PLACE = Place(latitude_deg=46.5, longitude_deg=11.35)


def station(
    frequency=3.65e6,
    kind=FeedKind.COMBINER,
    *,
    antenna=AntennaKind.CROSSED_DIPOLES,
    height=0.125,
    leg=None,
    apex_angle=math.pi,
    bearings=(0.0, 0.5 * math.pi),
    resistance=50.0,
    reactance=0.0,
    quality=10.0,
    measured=True,
    ground=PERFECT,
    relay=(LEFT, RIGHT),
    place=PLACE,
    **feed,
):
    """A station whose arms are N and E; height and leg in wavelengths, angles in radians.

    By default an ideal one: arms matched and isolated, a quarter-wave line, a perfect ground.
    """
    wavelength = SPEED_OF_LIGHT / frequency
    names = ("N", "E")[: len(bearings)]
    return Station(
        name="Open Field",
        place=place,
        antenna=Antenna(
            kind=antenna,
            height=height * wavelength,
            arms=tuple(Arm(name=n, bearing=b) for n, b in zip(names, bearings, strict=True)),
            resonant_frequency=frequency,
            leg_length=None if leg is None else leg * wavelength,
            apex_angle=apex_angle,
            measured=MeasuredImpedance(
                frequency=frequency,
                resistance=resistance,
                reactance=reactance,
                quality_factor=quality,
            )
            if measured
            else None,
        ),
        ground=ground,
        ground_name="stated",
        feed=Feed(kind=kind, **feed),
        relay=relay,
    )


def travelling(azimuth, elevation):
    """Direction of travel (east, north, up) of a wave that comes from a direction."""
    return -np.array(
        [
            math.cos(elevation) * math.sin(azimuth),
            math.cos(elevation) * math.cos(azimuth),
            math.sin(elevation),
        ]
    )
