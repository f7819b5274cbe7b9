"""The shape in which both waves leave a plasma that thins out.

Sources
-------
K. G. Budden, "The theory of the limiting polarization of radio waves reflected
from the ionosphere", Proceedings of the Royal Society A 215, 215, 1952.
J. A. Ratcliffe, "The Magneto-Ionic Theory and its Applications to the
Ionosphere", Cambridge University Press, 1959.

Kind: memory for the formula; the numbers are derived and were confirmed
through the dielectric tensor. Printed precision: 4 decimals.
"""

import numpy as np
import pytest

from magion.polarization import axial_ratio, tilt
from magion.waves import limiting_shape, polarization_vectors
from tests.proof import proves

LIMITING = proves(
    "limiting shape of a vertical wave",
    layer="polarization",
    kind="derived",
    source="Budden 1952; Ratcliffe 1959",
    tolerance=1e-4,
)

ROWS = [
    (3.65, 1.25, 67, 0.9720),
    (7.1, 1.25, 67, 0.9855),
    (3.65, 1.1, 45, 0.8991),
    (7.1, 1.0, 30, 0.8999),
    (7.1, 1.0, 10, 0.6813),
    (7.1, 1.0, 5, 0.4799),
    (14.1, 1.0, 1, 0.2328),
    (7.1, 1.0, 0, 0.0),
]


@pytest.mark.parametrize(("f", "f_h", "dip_deg", "ratio"), ROWS)
def test_minor_over_major_axis_of_a_vertical_wave(f, f_h, dip_deg, ratio):
    theta = np.radians(90 - dip_deg)
    LIMITING.within(limiting_shape(f_h / f, theta), ratio)
    # The same from the waves themselves in a trace of plasma.
    for vector in polarization_vectors(1e-9, f_h / f, 0.0, theta):
        LIMITING.within(1 / axial_ratio(vector), ratio)


@pytest.mark.parametrize(("f", "f_h", "dip_deg", "ratio"), ROWS)
def test_major_axes_lie_along_and_across_the_field(f, f_h, dip_deg, ratio):
    for theta in np.radians([90 - dip_deg, 90 + dip_deg]):
        ordinary, extraordinary = polarization_vectors(1e-9, f_h / f, 0.0, theta)
        assert abs(tilt(ordinary)) < 1e-6
        assert abs(abs(tilt(extraordinary)) - np.pi / 2) < 1e-6
