"""Ellipses, hands and axes at their edges."""

import numpy as np
import pytest

from magion.polarization import (
    CIRCULAR_LIMIT_DB,
    LINEAR_LIMIT_DB,
    Hand,
    Shape,
    axial_ratio,
    axial_ratio_db,
    ellipse,
    hand_in_words,
    hand_of,
    is_right_hand,
    major_axis_bearing,
    match,
    shape_of,
    stokes,
    tilt,
)
from magion.waves import wave_axes

X_AXIS, Y_AXIS = np.array([1.0 + 0j, 0]), np.array([0, 1.0 + 0j])
# exp(+i omega t): a component with −i lags by a quarter period.
RIGHT = np.array([1, -1j]) / np.sqrt(2)
LEFT = np.array([1, 1j]) / np.sqrt(2)


def test_hands():
    assert Hand.RIGHT.opposite is Hand.LEFT
    assert Hand.LEFT.opposite is Hand.RIGHT
    assert (Hand.RIGHT.value, Hand.LEFT.value) == ("RHCP", "LHCP")
    assert hand_of(RIGHT) is Hand.RIGHT
    assert hand_of(LEFT) is Hand.LEFT
    assert is_right_hand(np.stack([RIGHT, LEFT], axis=1)).tolist() == [True, False]


def test_hand_is_the_turn_of_the_real_field():
    """Clockwise looking along the travel (+z): from x toward y."""
    t = np.linspace(0, 2 * np.pi, 400)
    for vector, sense in [(RIGHT, 1), (LEFT, -1)]:
        e_x, e_y = (vector[:, None] * np.exp(1j * t)).real
        turned = np.unwrap(np.arctan2(e_y, e_x))
        assert abs(turned[-1] - turned[0] - sense * 2 * np.pi) < 1e-9


def test_hand_does_not_depend_on_phase_or_size():
    for factor in (1e-12, -3.0, 1j, np.exp(0.3j) * 1e12):
        assert hand_of(RIGHT * factor) is Hand.RIGHT
        assert hand_of(LEFT * factor) is Hand.LEFT


def test_words_differ_in_every_way():
    right, left = hand_in_words(Hand.RIGHT), hand_in_words(Hand.LEFT)
    for name in ("ieee", "looking_up", "on_the_map", "delayed_arm"):
        assert getattr(right, name) != getattr(left, name)
    for words in (right, left):
        assert words.looking_up != words.on_the_map


def test_stokes_of_the_six_simple_states():
    diagonal = np.array([1, 1]) / np.sqrt(2) + 0j
    states = np.stack([X_AXIS, Y_AXIS, diagonal, diagonal * [1, -1], LEFT, RIGHT], axis=1)
    expected = [
        [1, 1, 1, 1, 1, 1],
        [1, -1, 0, 0, 0, 0],
        [0, 0, 1, -1, 0, 0],
        [0, 0, 0, 0, 1, -1],
    ]
    assert np.abs(stokes(states) - expected).max() < 1e-15


def test_axial_ratios():
    assert abs(axial_ratio(RIGHT) - 1) < 1e-15
    assert abs(axial_ratio_db(LEFT)) < 1e-14
    assert np.isinf(axial_ratio(X_AXIS))
    assert np.isinf(axial_ratio_db(Y_AXIS))
    assert abs(axial_ratio(np.array([1.0, 0.1j])) - 10) < 1e-12
    assert abs(axial_ratio_db(np.array([1.0, 0.1j])) - 20) < 1e-12
    # Nearly linear: the plain difference of I and sqrt(Q² + U²) would have no digits left.
    assert abs(axial_ratio(np.array([1.0, 1e-10j])) / 1e10 - 1) < 1e-12
    assert axial_ratio(np.ones((2, 3, 4)) * (1 + 0j)).shape == (3, 4)


@pytest.mark.parametrize("angle_deg", [-89.0, -45.0, -1.0, 0.0, 30.0, 60.0, 90.0])
def test_tilt_of_a_straight_wave(angle_deg):
    angle = np.radians(angle_deg)
    vector = np.array([np.cos(angle), np.sin(angle)]) + 0j
    assert abs(np.degrees(tilt(vector)) - angle_deg) < 1e-12


@pytest.mark.parametrize(
    ("ratio_db", "shape"),
    [
        (0.0, Shape.CIRCULAR),
        (3.0, Shape.CIRCULAR),
        (3.0001, Shape.ELLIPTICAL),
        (7.65, Shape.ELLIPTICAL),
        (7.66, Shape.LINEAR),  # 7.6555 dB
        (60.0, Shape.LINEAR),
        (np.inf, Shape.LINEAR),
    ],
)
def test_names_of_shapes(ratio_db, shape):
    assert shape_of(ratio_db) is shape
    assert CIRCULAR_LIMIT_DB < LINEAR_LIMIT_DB


def test_match_of_the_simple_states():
    for a, b, share in [
        (RIGHT, RIGHT, 1.0),
        (RIGHT, LEFT, 0.0),
        (RIGHT, X_AXIS, 0.5),
        (X_AXIS, Y_AXIS, 0.0),
        (LEFT * 7j, LEFT, 1.0),
    ]:
        assert abs(match(a, b) - share) < 1e-15
    assert match(np.ones((2, 5)) + 0j, X_AXIS[:, None]).shape == (5,)


@pytest.mark.parametrize("right", [True, False])
def test_ellipse_of_a_circle(right):
    vector = ellipse(1.0, 0.7, right)
    assert abs(match(vector, RIGHT if right else LEFT) - 1) < 1e-15
    assert hand_of(vector) is (Hand.RIGHT if right else Hand.LEFT)


def test_ellipse_of_a_nearly_straight_wave():
    vector = ellipse(1e9, np.radians(30), True)
    assert abs(np.sum(np.abs(vector) ** 2) - 1) < 1e-15
    assert abs(axial_ratio(vector) / 1e9 - 1) < 1e-6
    assert abs(np.degrees(tilt(vector)) - 30) < 1e-9


def test_ellipse_of_a_straight_wave():
    vector = ellipse(np.inf, np.radians(30), True)
    assert np.abs(np.abs(vector) - [np.cos(np.radians(30)), 0.5]).max() < 1e-15


def test_wave_axes():
    k = np.array([0.0, 0.0, 2.0])
    b = np.array([3.0, 0.0, -4.0])
    x, y = wave_axes(k, b)
    assert np.abs(x - [1, 0, 0]).max() < 1e-15
    assert np.abs(y - [0, 1, 0]).max() < 1e-15
    rng = np.random.default_rng(31)
    k, b = rng.normal(size=(2, 3, 200))
    x, y = wave_axes(k, b)
    z = k / np.linalg.norm(k, axis=0)
    frame = np.stack([x, y, z])
    products = np.einsum("ain,bin->abn", frame, frame)
    assert np.abs(products - np.eye(3)[:, :, None]).max() < 1e-13
    assert np.abs(np.cross(x, y, axis=0) - z).max() < 1e-13  # right-handed
    assert np.sum(x * b, axis=0).min() > 0  # on the field's side
    assert np.abs(np.sum(y * b, axis=0)).max() < 1e-13  # in its plane


def test_wave_axes_along_the_field_do_not_exist():
    for b in ([0.0, 0.0, 3.0], [0.0, 0.0, -3.0]):
        x, y = wave_axes(np.array([0.0, 0.0, 1.0]), np.array(b))
        assert np.isnan(x).all()
        assert np.isnan(y).all()


@pytest.mark.parametrize("bearing_deg", [0.0, 1.0, 45.0, 90.0, 135.0, 179.0])
@pytest.mark.parametrize("down", [True, False])
def test_bearing_of_the_major_axis_of_a_vertical_wave(bearing_deg, down):
    east, north, up = np.eye(3)
    k = -up if down else up
    # A field pointing north and down; x of the wave is north.
    x, y = wave_axes(k, north - 2 * up)
    assert np.abs(x - north).max() < 1e-15
    # From north through y, which is east below and west above.
    angle = np.radians(bearing_deg if down else -bearing_deg)
    found = np.degrees(major_axis_bearing(ellipse(5.0, angle, True), x, y, east, north))
    assert 0 <= found < 180
    assert abs((found - bearing_deg + 90) % 180 - 90) < 1e-10


def test_bearing_of_a_slanting_wave_is_that_of_the_projection():
    east, north, up = np.eye(3)
    # Coming down steeply from the south, elevation 60; polarized in the vertical plane of travel.
    k = np.cos(np.radians(60)) * north - np.sin(np.radians(60)) * up
    x, y = wave_axes(k, -up)  # x in the vertical plane
    assert abs(x @ east) < 1e-15
    vertical = major_axis_bearing(ellipse(8.0, 0.0, False), x, y, east, north)
    horizontal = major_axis_bearing(ellipse(8.0, np.pi / 2, False), x, y, east, north)
    assert min(vertical, np.pi - vertical) < 1e-12
    assert abs(horizontal - np.pi / 2) < 1e-12
