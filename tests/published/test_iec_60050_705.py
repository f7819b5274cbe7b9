"""Which wave is the extraordinary one, where it reflects, how it turns.

Source
------
IEC 60050-705:1995, "International Electrotechnical Vocabulary, chapter 705:
Radio wave propagation", entry 705-07-40 (extraordinary wave).

Kind: published for the rules (zeros of the X wave, its hand by the angle of
the wave normal to the field, its direction across the field); the numbers that
follow from them are derived. Printed precision: 4 decimals of a critical
frequency, 0.01 MHz of a window.
"""

import numpy as np
import pytest

from magion.arrays import cross, dot, norm
from magion.polarization import Hand, axial_ratio, hand_of, major_axis_bearing
from magion.waves import (
    extraordinary_critical_frequency,
    polarization_vectors,
    refractive_index_squared,
    wave_axes,
)
from tests.proof import proves

ZEROS = proves(
    "zeros of both indices",
    layer="waves",
    kind="published",
    source="IEC 60050-705, 705-07-40",
    tolerance=1e-6,
)
CRITICAL = proves(
    "critical frequency of the extraordinary wave",
    layer="waves",
    kind="derived",
    source="IEC 60050-705, 705-07-40",
    tolerance=5e-5,
    unit="MHz",
)
WINDOW = proves(
    "width of the window of the extraordinary wave alone",
    layer="waves",
    kind="derived",
    source="IEC 60050-705, 705-07-40",
    tolerance=0.005,
    unit="MHz",
)

EAST, NORTH, UP = np.eye(3)


@pytest.mark.parametrize("Y", [0.1, 0.35, 0.8])
@pytest.mark.parametrize("theta_deg", [0.5, 30.0, 60.0, 90.0, 145.0])
def test_zeros_of_both_indices(Y, theta_deg):
    theta = np.radians(theta_deg)
    ordinary, _ = refractive_index_squared(1.0, Y, 0.0, theta)
    ZEROS.within(ordinary, 0.0)
    for X in (1.0 - Y, 1.0 + Y):
        _, extraordinary = refractive_index_squared(X, Y, 0.0, theta)
        ZEROS.within(extraordinary, 0.0)


@pytest.mark.parametrize("X", [1e-6, 0.2, 0.7])
@pytest.mark.parametrize("angle_deg", [5.0, 40.0, 85.0, 95.0, 130.0, 175.0])
def test_hand_by_the_angle_to_the_field(X, angle_deg):
    ordinary, extraordinary = polarization_vectors(X, 0.25, 0.0, np.radians(angle_deg))
    obtuse = angle_deg > 90
    assert hand_of(extraordinary) is (Hand.LEFT if obtuse else Hand.RIGHT)
    assert hand_of(ordinary) is (Hand.RIGHT if obtuse else Hand.LEFT)


@pytest.mark.parametrize("vertical", [UP, -UP])
def test_overhead_at_the_dip_equator(vertical):
    field = NORTH  # dip 0, magnetic north
    x, y = wave_axes(vertical, field)
    theta = np.arctan2(norm(cross(vertical, field)), dot(vertical, field))
    assert theta == np.pi / 2
    ordinary, extraordinary = polarization_vectors(0.4, 0.2, 0.0, theta)
    for vector in (ordinary, extraordinary):
        assert axial_ratio(vector) > 1e12
    along = np.degrees(major_axis_bearing(ordinary, x, y, EAST, NORTH)) % 180
    across = np.degrees(major_axis_bearing(extraordinary, x, y, EAST, NORTH))
    assert min(along, 180 - along) < 1e-9
    assert abs(across - 90) < 1e-9


@pytest.mark.parametrize(
    ("f_o", "f_h", "f_x"),
    [
        (5.0, 1.3, 5.6921),
        (3.0, 1.3, 3.7196),
        (8.0, 1.0, 8.5156),
        (10.0, 1.4, 10.7245),
        (2.0, 1.4, 2.8190),
    ],
)
def test_critical_frequency_of_the_extraordinary_wave(f_o, f_h, f_x):
    found = float(extraordinary_critical_frequency(f_o, f_h))
    CRITICAL.within(found, f_x)  # half the last printed digit
    # The zero at X = 1 - Y that the figure stands for, at any angle to the field.
    _, square = refractive_index_squared((f_o / found) ** 2, f_h / found, 0.0, 0.7)
    assert abs(square) < 1e-6
    # fo + f_H/2 is low, by f_H²/(8 fo) to first order (the next is -f_H⁴/(128 fo³)).
    low_by = found - (f_o + f_h / 2)
    assert abs(low_by - f_h**2 / (8 * f_o)) <= f_h**4 / (128 * f_o**3)


@pytest.mark.parametrize(("f", "width"), [(3.65, 0.69), (5.29, 0.67), (7.1, 0.66)])
def test_window_of_the_extraordinary_wave_alone(f, width):
    lowest = np.sqrt(f * f - f * 1.25)
    assert abs(f - lowest - width) < 0.005  # half the last printed digit
    # At the window's lower edge the X wave of frequency f just reflects.
    edge = extraordinary_critical_frequency(lowest, 1.25)
    assert abs(edge - f) < 1e-9
    WINDOW.within(edge - lowest, width)
