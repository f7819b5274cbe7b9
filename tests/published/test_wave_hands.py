"""The hand in which waves go up and come down.

Source
------
The rule of IEC 60050-705:1995, entry 705-07-40 (the extraordinary wave is
left- or right-hand as its normal makes an obtuse or an acute angle with the
field), and the sense of IEEE Std 145 (clockwise along the travel is
right-hand).

Kind: derived; the scalar products were worked out from the angles by hand.
Printed precision: 4 decimals of the cosine between wave normal and field.

Axes: magnetic north, magnetic east, down; dip positive down; azimuth is the
magnetic one of the travel.
"""

import numpy as np
import pytest

from magion.polarization import Hand, hand_of
from magion.waves import polarization_vectors


def field_of_dip(dip_deg):
    dip = np.radians(dip_deg)
    return np.array([np.cos(dip), 0.0, np.sin(dip)])


def downgoing(elevation_deg, azimuth_deg):
    e, a = np.radians([elevation_deg, azimuth_deg])
    return np.array([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), np.sin(e)])


def hands(wave_normal, field):
    """Hands of the ordinary and the extraordinary wave about the wave normal."""
    theta = np.arccos(np.clip(wave_normal @ field, -1.0, 1.0))
    return tuple(hand_of(v) for v in polarization_vectors(1e-3, 0.2, 0.0, theta))


@pytest.mark.parametrize(
    ("dip_deg", "elevation_deg", "azimuth_deg", "k_dot_b", "hand"),
    [
        (67, 15, 180, -0.1392, Hand.RIGHT),
        (67, 15, 0, 0.6157, Hand.LEFT),
        (67, 15, 90, 0.2382, Hand.LEFT),
        (67, 30, 180, 0.1219, Hand.LEFT),
        (60, 20, 180, -0.1736, Hand.RIGHT),
        (30, 20, 180, -0.6428, Hand.RIGHT),
        (30, 70, 180, 0.1736, Hand.LEFT),
        (-60, 20, 0, 0.1736, Hand.LEFT),
    ],
)
def test_ordinary_wave_comes_down(dip_deg, elevation_deg, azimuth_deg, k_dot_b, hand):
    k, b = downgoing(elevation_deg, azimuth_deg), field_of_dip(dip_deg)
    assert abs(k @ b - k_dot_b) < 5e-5  # half the last printed digit
    assert hands(k, b) == (hand, hand.opposite)


@pytest.mark.parametrize("dip_deg", [50, 67, 80])
@pytest.mark.parametrize("azimuth_deg", [0, 90, 180])
def test_steep_waves_change_hand_between_up_and_down(dip_deg, azimuth_deg):
    b = field_of_dip(dip_deg)
    down = downgoing(80, azimuth_deg)
    up = down * [1, 1, -1]
    assert hands(up, b) == (Hand.RIGHT, Hand.LEFT)
    assert hands(down, b) == (Hand.LEFT, Hand.RIGHT)
    # South of the magnetic equator everything is reversed.
    south = field_of_dip(-dip_deg)
    assert hands(up, south) == (Hand.LEFT, Hand.RIGHT)
    assert hands(down, south) == (Hand.RIGHT, Hand.LEFT)


@pytest.mark.parametrize("dip_deg", [-75, -20, 5, 40, 67])
@pytest.mark.parametrize("elevation_deg", [8, 33, 71])
@pytest.mark.parametrize("azimuth_deg", [10, 100, 200, 290])
def test_reversed_path_takes_the_opposite_hand(dip_deg, elevation_deg, azimuth_deg):
    k, b = downgoing(elevation_deg, azimuth_deg), field_of_dip(dip_deg)
    arrives, goes_back = hands(k, b), hands(-k, b)
    assert goes_back == (arrives[0].opposite, arrives[1].opposite)


@pytest.mark.parametrize("elevation_deg", [15, 25, 40])
def test_southward_to_the_dip_equator_the_hand_at_launch_is_a_third_answer(elevation_deg):
    # A dipole's dip, tan I = 2 tan(latitude): launch over 15 degrees north, exit near 0.
    at_launch = field_of_dip(np.degrees(np.arctan(2 * np.tan(np.radians(15)))))
    at_exit = field_of_dip(np.degrees(np.arctan(2 * np.tan(np.radians(2)))))
    down = downgoing(elevation_deg, 180)
    up = down * [1, 1, -1]
    assert hands(up, at_launch)[0] is Hand.RIGHT
    assert hands(down, at_exit)[0] is Hand.RIGHT
    assert hands(-down, at_exit)[0] is Hand.LEFT
