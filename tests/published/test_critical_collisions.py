"""The critical collision frequency, where both indices coincide at X = 1.

Sources
-------
H. G. Booker, "Some general properties of the formulae of the magneto-ionic
theory", Proceedings of the Royal Society A 147, 352, 1934.
J. A. Ratcliffe, "The Magneto-Ionic Theory and its Applications to the
Ionosphere", Cambridge University Press, 1959.

Kind: memory for the values (3 digits, 1 per cent); derived for the meeting of
the indices and for the two straight waves below it.
"""

import numpy as np
import pytest

from magion.polarization import axial_ratio, tilt
from magion.waves import (
    critical_collision_frequency,
    polarization_vectors,
    refractive_index_squared,
)
from tests.proof import proves

VALUES = proves(
    "critical collision frequency",
    layer="waves",
    kind="memory",
    source="Booker 1934; Ratcliffe 1959",
    tolerance=0.01,
    unit="relative",
)
MEETING = proves(
    "difference of both squared indices at the critical collision frequency",
    layer="waves",
    kind="derived",
    source="Booker 1934",
    tolerance=1e-6,
)
STRAIGHT = proves(
    "tilt of both straight waves at X = 1",
    layer="polarization",
    kind="derived",
    source="Booker 1934",
    tolerance=0.1,
    unit="deg",
)


@pytest.mark.parametrize(
    ("dip_deg", "nu_c"), [(50, 2.20e6), (60, 1.18e6), (67, 6.77e5), (75, 2.83e5)]
)
def test_values_for_vertical_waves(dip_deg, nu_c):
    theta = np.radians(90 - dip_deg)
    VALUES.within(critical_collision_frequency(1.3e6, theta), nu_c)


@pytest.mark.parametrize("Y", [0.2, 0.5, 0.9])
@pytest.mark.parametrize("theta_deg", [10, 35, 60, 110])
def test_indices_coincide(Y, theta_deg):
    theta = np.radians(theta_deg)
    Z = Y * np.sin(theta) ** 2 / (2 * abs(np.cos(theta)))
    frequency = 5e6
    nu_c = critical_collision_frequency(Y * frequency, theta)
    assert abs(nu_c / (2 * np.pi * frequency) - Z) < 1e-12
    at_it = refractive_index_squared(1.0, Y, Z, theta)
    below = refractive_index_squared(1.0, Y, 0.9 * Z, theta)
    # A double root: an error of one unit in the last place splits it by its square root.
    MEETING.within(at_it[0], at_it[1])
    assert abs(below[0] - below[1]) > 1e-2


@pytest.mark.parametrize("share", [0.1, 0.35, 0.7, 0.95])
@pytest.mark.parametrize("theta_deg", [10, 35, 60])
def test_both_waves_are_straight_below_it(share, theta_deg):
    theta = np.radians(theta_deg)
    Y = 0.4
    Z = share * Y * np.sin(theta) ** 2 / (2 * np.cos(theta))
    psi_deg = np.degrees(0.5 * np.arcsin(share))
    ordinary, extraordinary = polarization_vectors(1.0, Y, Z, theta)
    assert axial_ratio(ordinary) > 1e6
    assert axial_ratio(extraordinary) > 1e6
    found = np.degrees([tilt(ordinary), tilt(extraordinary)])
    STRAIGHT.within(found, [psi_deg, 90 - psi_deg])


@pytest.mark.parametrize("share", [1.2, 3.0])
def test_principal_roots_change_places_above_it(share):
    theta, Y = np.radians(30), 0.3
    Z = share * Y * np.sin(theta) ** 2 / (2 * np.cos(theta))

    def principal(X):
        """The two roots by the textbook's square root, its real part positive."""
        U = 1 - 1j * Z
        half, along = (Y * np.sin(theta)) ** 2 / 2, Y * np.cos(theta)
        root = np.sqrt(half**2 + (along * (U - X)) ** 2)
        return [1 - X * (U - X) / (U * (U - X) - half + s * root) for s in (1, -1)]

    before, after = principal(1 - 1e-9), principal(1 + 1e-9)
    assert abs(before[0] - after[1]) < 1e-6
    assert abs(before[1] - after[0]) < 1e-6
    ordinary, extraordinary = refractive_index_squared(np.array([1 - 1e-9, 1 + 1e-9]), Y, Z, theta)
    assert abs(ordinary - before[0]).max() < 1e-6
    assert abs(extraordinary - before[1]).max() < 1e-6
