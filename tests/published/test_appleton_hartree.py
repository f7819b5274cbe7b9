"""Indices and polarizations of the two magneto-ionic waves at single points.

Sources
-------
J. A. Ratcliffe, "The Magneto-Ionic Theory and its Applications to the
Ionosphere", Cambridge University Press, 1959.
K. G. Budden, "The Propagation of Radio Waves", Cambridge University Press,
1985, chapters 3 and 4.
K. Davies, "Ionospheric Radio", Peter Peregrinus, 1990, chapter 3.

Kind: derived. The formula is theirs, from memory; every number here was worked
out from it and confirmed through the dielectric tensor. Printed precision: 6
digits of an index, 5 of an axial ratio, 0.01 degrees of a tilt.
"""

import numpy as np
import pytest

from magion.polarization import Hand, axial_ratio, hand_of, tilt
from magion.waves import (
    polarization_ratio,
    polarization_vectors,
    refractive_index,
    refractive_index_squared,
    resonance,
)
from tests.proof import proves

INDEX = 1e-5  # the stated tolerance of the rows, ten units of their last digit
AXES = 1e-5
TILT_DEG = 0.005  # half the last printed digit

INDICES = proves(
    "indices of both waves, with and without collisions",
    layer="waves",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=INDEX,
)
SQUARES = proves(
    "squared indices along and across the field",
    layer="waves",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=1e-9,
)
AT_X_1 = proves(
    "squared indices at X = 1",
    layer="waves",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=1e-6,
)
RESONANCE = proves(
    "resonance of the index",
    layer="waves",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=1e-6,
    unit="relative",
)
SHAPES = proves(
    "axes of the ellipses at a point",
    layer="polarization",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=AXES,
)
TILTS = proves(
    "tilt of the ellipses with collisions",
    layer="polarization",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=TILT_DEG,
    unit="deg",
)
PRODUCT = proves(
    "product of the two polarization ratios",
    layer="polarization",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985; Davies 1990",
    tolerance=1e-9,
)


@pytest.mark.parametrize(
    ("theta_deg", "n_o", "n_x", "minor_over_major"),
    [(30.0, 0.755155, 0.622603, 0.94393), (60.0, 0.731181, 0.649895, 0.74403)],
)
def test_indices_and_axes_without_collisions(theta_deg, n_o, n_x, minor_over_major):
    state = (0.5, 0.2, 0.0, np.radians(theta_deg))
    ordinary, extraordinary = refractive_index(*state)
    INDICES.within([ordinary, extraordinary], [n_o, n_x])
    for vector in polarization_vectors(*state):
        SHAPES.within(1.0 / axial_ratio(vector), minor_over_major)


@pytest.mark.parametrize(
    ("theta_deg", "hand_o", "hand_x"),
    [(30.0, Hand.LEFT, Hand.RIGHT), (150.0, Hand.RIGHT, Hand.LEFT)],
)
def test_hands_about_the_wave_normal(theta_deg, hand_o, hand_x):
    state = (0.5, 0.2, 0.0, np.radians(theta_deg))
    ordinary, extraordinary = polarization_vectors(*state)
    assert hand_of(ordinary) is hand_o
    assert hand_of(extraordinary) is hand_x
    n_o, n_x = refractive_index(*state)
    INDICES.within([n_o, n_x], [0.755155, 0.622603])


def test_along_the_field():
    ordinary, extraordinary = refractive_index_squared(0.5, 0.2, 0.0, 0.0)
    SQUARES.within([ordinary, extraordinary], [1 - 0.5 / 1.2, 1 - 0.5 / 0.8])
    # The printed figures, to half their last digit.
    assert abs(ordinary - 0.583333) < 5e-7
    assert abs(extraordinary - 0.375) < 1e-9


def test_across_the_field():
    ordinary, extraordinary = refractive_index_squared(0.5, 0.2, 0.0, np.pi / 2)
    SQUARES.within([ordinary, extraordinary], [0.5, 1 - 0.5 * 0.5 / (0.5 - 0.04)])
    assert abs(extraordinary - 0.456522) < 5e-7


@pytest.mark.parametrize(
    ("state", "n_o", "n_x", "tilt_o_deg", "tilt_x_deg", "tolerance_deg"),
    [
        (
            (0.3, 0.4, 0.05, 45.0),
            0.870005 - 0.006042j,
            0.738660 - 0.025812j,
            2.00,
            88.00,
            TILT_DEG,
        ),
        (
            (0.1, 0.35, 0.3, 25.0),
            0.963043 - 0.008760j,
            0.936638 - 0.029840j,
            9.21,
            80.79,
            TILT_DEG,
        ),
    ],
)
def test_with_collisions(state, n_o, n_x, tilt_o_deg, tilt_x_deg, tolerance_deg):
    X, Y, Z, theta_deg = state
    theta = np.radians(theta_deg)
    INDICES.within(refractive_index(X, Y, Z, theta), [n_o, n_x])
    e_o, e_x = polarization_vectors(X, Y, Z, theta)
    found = np.degrees([tilt(e_o), tilt(e_x)])
    TILTS.within(found, [tilt_o_deg, tilt_x_deg], tolerance_deg)


@pytest.mark.parametrize("Y", [0.1, 0.35, 0.8, 1.7])
def test_no_zero_of_the_ordinary_wave_along_the_field_at_X_1(Y):
    ordinary, _ = refractive_index_squared(1.0, Y, 0.0, 0.0)
    AT_X_1.within(ordinary, Y / (1 + Y))


@pytest.mark.parametrize("Y", [0.1, 0.35, 0.8, 1.7])
@pytest.mark.parametrize("theta_deg", [1.0, 30.0, 75.0, 90.0, 140.0])
def test_extraordinary_index_is_one_at_X_1(Y, theta_deg):
    _, extraordinary = refractive_index_squared(1.0, Y, 0.0, np.radians(theta_deg))
    AT_X_1.within(extraordinary, 1.0)


@pytest.mark.parametrize("Y", [0.15, 0.5, 0.9, 1.3, 2.5])
@pytest.mark.parametrize("theta_deg", [20.0, 50.0, 80.0])
def test_resonance(Y, theta_deg):
    theta = np.radians(theta_deg)
    X = (1 - Y**2) / (1 - Y**2 * np.cos(theta) ** 2)
    RESONANCE.within(resonance(Y, theta), X)
    if X < 0:  # no plasma resonates there
        return
    squares = refractive_index_squared(X * (1 + np.array([-1e-6, 1e-6])), Y, 0.0, theta)
    on_it, off_it = squares if Y > 1 else squares[::-1]
    # A pole is large on both sides, with opposite signs; the other wave does not notice.
    assert np.all(np.abs(on_it) > 1e3)
    assert on_it[0].real * on_it[1].real < 0
    assert abs(off_it[1] - off_it[0]) < 1e-3


@pytest.mark.parametrize("Z", [0.0, 0.02, 0.4])
@pytest.mark.parametrize("X", [0.01, 0.6, 0.98, 1.4])
@pytest.mark.parametrize("theta_deg", [3.0, 47.0, 86.0, 122.0])
def test_product_of_the_polarization_ratios(X, Z, theta_deg):
    ordinary, extraordinary = polarization_ratio(X, 0.3, Z, np.radians(theta_deg))
    PRODUCT.within(ordinary * extraordinary, 1.0)
