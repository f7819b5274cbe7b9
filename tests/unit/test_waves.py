"""The two waves at their limits, their derivatives and the choice of label."""

from decimal import Decimal, localcontext

import numpy as np
import pytest

from magion.constants import SPEED_OF_LIGHT
from magion.waves import (
    MODES,
    Mode,
    characteristic_waves,
    collision_ratio,
    critical_collision_frequency,
    extraordinary_critical_frequency,
    group_index,
    gyro_ratio,
    index_difference,
    index_squared_and_slopes,
    limiting_point,
    limiting_shape,
    phase_to_go,
    plasma_ratio,
    polarization_ratio,
    polarization_vectors,
    refractive_index,
    refractive_index_squared,
    resonance,
)

extended = pytest.mark.skipif(
    np.finfo(np.longdouble).eps > 1e-18, reason="central differences need the extended format"
)


def textbook(X, Y_T2, Y_L2, Z=0.0, *, extraordinary, number=np.longdouble):
    """n² by the form multiplied through by (U − X), with its cancellations."""
    X, t, s = number(X), number(Y_T2), number(Y_L2)
    U = 1 - 1j * np.longdouble(Z) if np.any(Z) else 1
    root = np.sqrt(t * t / 4 + s * (U - X) ** 2)
    return 1 - X * (U - X) / (U * (U - X) - t / 2 + np.where(extraordinary, -1, 1) * root)


def exact(X, t, s):
    """Both n² of a collisionless plasma to 60 digits, as Decimal."""
    with localcontext() as context:
        context.prec = 80
        X, t, s = (Decimal(float(v)) for v in (X, t, s))
        root = (t * t / 4 + s * (1 - X) ** 2).sqrt()
        return tuple(1 - X * (1 - X) / ((1 - X) - t / 2 + sign * root) for sign in (1, -1))


def test_ratios():
    # f_N = 9 MHz sqrt(N / 1e12), about; f_H = 1.4 MHz at 50 microtesla; both in their digits.
    assert abs(plasma_ratio(1.24044e12, 10e6) - 1.0) < 5e-6
    assert abs(gyro_ratio(50e-6, 1e6) - 1.3996245) < 5e-8
    assert abs(collision_ratio(2 * np.pi * 1e6, 10e6) - 0.1) < 1e-15
    components = gyro_ratio(np.array([[3e-5], [0.0], [-4e-5]]), 1e6)
    assert components.shape == (3, 1)
    assert abs(np.linalg.norm(components) - 1.3996245) < 5e-8


def test_modes():
    assert MODES == (Mode.ORDINARY, Mode.EXTRAORDINARY)
    assert [m.other for m in MODES] == [Mode.EXTRAORDINARY, Mode.ORDINARY]


@pytest.mark.parametrize("theta", [1e-3, 1e-6, 1e-9, np.pi - 1e-6])
@pytest.mark.parametrize(("X", "Z"), [(0.3, 0.0), (0.5, 0.1), (0.79, 0.0)])
def test_toward_the_field(theta, X, Z):
    Y, U = 0.2, 1 - 1j * Z
    ordinary, extraordinary = refractive_index_squared(X, Y, Z, theta)
    small = min(theta, np.pi - theta) ** 2
    # The squares differ from the limit by order theta²/(1 − X) and worse next to the pole.
    assert abs(ordinary - (1 - X / (U + Y))) < 10 * small + 1e-14
    assert abs(extraordinary - (1 - X / (U - Y))) < 1e4 * small + 1e-12
    for vector, sense in zip(
        polarization_vectors(X, Y, Z, theta), (1, -1) if theta < 1 else (-1, 1), strict=True
    ):
        assert abs(vector[1] / vector[0] - sense * 1j) < small + 1e-14


@pytest.mark.parametrize("below", [1e-3, 1e-6, 1e-9, 0.0])
@pytest.mark.parametrize(("X", "Z"), [(0.3, 0.0), (0.5, 0.1), (1.3, 0.02)])
def test_toward_the_normal_of_the_field(below, X, Z):
    Y, U = 0.2, 1 - 1j * Z
    theta = np.pi / 2 - below
    ordinary, extraordinary = refractive_index_squared(X, Y, Z, theta)
    assert abs(ordinary - (1 - X / U)) < 100 * below**2 + 1e-14
    limit = 1 - X * (U - X) / (U * (U - X) - Y**2)
    assert abs(extraordinary - limit) < 100 * below**2 + 1e-14
    e_o, e_x = polarization_vectors(X, Y, Z, theta)
    # Linear: along the projection of the field, and across it.
    assert abs(e_o[1]) < 20 * below + 1e-15
    assert abs(e_x[0]) < 20 * below + 1e-15


@pytest.mark.parametrize("X", [1e-3, 1e-6, 1e-12, 0.0])
@pytest.mark.parametrize("Z", [0.0, 0.3])
def test_toward_vacuum(X, Z):
    theta, Y = np.array([0.0, 0.4, np.pi / 2, 2.0]), 0.3
    for square in refractive_index_squared(X, Y, Z, theta):
        assert np.abs(square - 1).max() <= X * 1.5
    for n in refractive_index(X, Y, Z, theta):
        assert np.abs(n - 1).max() <= X * 1.5


def test_difference_of_the_indices_in_a_trace_of_plasma():
    # Both indices in 80-digit arithmetic: plain double precision has lost them all at 1e-14.
    for X in (1e-14, 1e-9, 1e-4, 0.2, 0.6):
        for theta in (0.1, 0.9, 1.5, np.pi / 2, 2.2):
            t, s = (0.3 * np.sin(theta)) ** 2, (0.3 * np.cos(theta)) ** 2
            square_o, square_x = exact(X, t, s)
            with localcontext() as context:
                context.prec = 80
                expected = float(square_o.sqrt() - square_x.sqrt())
            found = index_difference(X, 0.3, 0.0, theta)
            # t and s themselves are rounded to 1e-16 before they reach the exact form.
            assert abs(found / expected - 1) < 1e-12


def test_difference_of_the_indices_is_their_difference():
    rng = np.random.default_rng(20)
    X, Y, Z = rng.uniform(0, 2, 5000), rng.uniform(0.02, 1.5, 5000), rng.uniform(0, 0.3, 5000)
    Z[:2000] = 0.0
    theta = rng.uniform(0, np.pi, 5000)
    n_o, n_x = refractive_index(X, Y, Z, theta)
    found = index_difference(X, Y, Z, theta)
    tame = np.abs(n_o) + np.abs(n_x) < 50  # rounding of a large index is not the point
    assert tame.sum() > 4800
    # In the plain difference 1e-16 of n² counts by 1/(n_O + n_X).
    size = np.abs(n_o + n_x)[tame]
    gap = np.abs(found - (n_o - n_x).real)[tame]
    assert np.all(gap < 1e-12 * (1 + 1 / size))


@pytest.mark.parametrize("Y", [0.2, 0.9, 1.4])
@pytest.mark.parametrize("theta", [0.3, 1.2, np.pi / 2])
def test_difference_where_the_ordinary_wave_turns(Y, theta):
    # At X = 1 without collisions n_O = 0 and n_X = 1.
    assert abs(index_difference(1.0, Y, 0.0, theta) + 1.0) < 1e-12


def test_difference_along_the_field_at_X_1():
    # n_O² = Y/(1 + Y), and the extraordinary wave is evanescent: only n_O is real.
    found = index_difference(1.0, 0.2, 0.0, 0.0)
    assert abs(found - np.sqrt(0.2 / 1.2)) < 1e-9


@pytest.mark.parametrize("off", [1e-3, 1e-7, 1e-11, 1e-15])
@pytest.mark.parametrize("side", [-1, 1])
@pytest.mark.parametrize("theta_deg", [0.01, 3.0, 45.0, 89.0, 89.9999])
def test_no_digits_lost_toward_X_1(off, side, theta_deg):
    X, Y = 1 + side * off, 0.4
    theta = np.radians(theta_deg)
    t, s = (Y * np.sin(theta)) ** 2, (Y * np.cos(theta)) ** 2
    found = refractive_index_squared(X, Y, 0.0, theta)
    by_squares = [
        index_squared_and_slopes(np.array(X), np.array(t), np.array(s), np.array(x))[0]
        for x in (False, True)
    ]
    for a, b, expected in zip(found, by_squares, exact(X, t, s), strict=True):
        # 1 − X is exact here, so what is left is rounding; of t it counts by 1/t at small angles.
        assert abs(a - float(expected)) < 1e-13 * max(1, abs(float(expected)))
        assert abs(b - float(expected)) < 1e-13 * max(1, abs(float(expected)))


@pytest.mark.parametrize("Y", [0.2, 0.6])
@pytest.mark.parametrize("theta_deg", [10.0, 45.0, 89.0, 90.0])
def test_sides_of_the_resonance(Y, theta_deg):
    theta = np.radians(theta_deg)
    X = float(resonance(Y, theta))
    assert 1 - Y < X < 1
    # Evanescent from its zero at 1 − Y up to the resonance, then propagating without bound.
    inside = np.linspace(1 - Y + 1e-6, X * (1 - 1e-9), 50)
    beyond = np.linspace(X * (1 + 1e-9), 1 + Y - 1e-6, 50)
    _, below = refractive_index_squared(inside, Y, 0.0, theta)
    _, above = refractive_index_squared(beyond, Y, 0.0, theta)
    assert np.all(below.real < 0)
    assert np.all(above.real > 0)
    assert below.real[-1] < -1e4
    assert above.real[0] > 1e4
    n = refractive_index(inside, Y, 0.0, theta)[1]
    assert np.all(n.real == 0)
    assert np.all(n.imag < 0)


def test_resonance_along_the_field_of_the_gyrofrequency():
    assert abs(resonance(0.5, 0.0) - 1.0) < 1e-15
    assert resonance(1.0, 0.7) == 0.0
    assert resonance(1.5, 0.7) < 0.0 or resonance(1.5, 0.7) > 1.0


def random_states(number, seed):
    """States away from the resonance and from the branch point X = 1, Y_T = 0."""
    rng = np.random.default_rng(seed)
    X, Y = rng.uniform(0.01, 2.5, number), rng.uniform(0.05, 1.6, number)
    theta = rng.uniform(0.05, np.pi - 0.05, number)
    t, s = (Y * np.sin(theta)) ** 2, (Y * np.cos(theta)) ** 2
    squares = [textbook(X, t, s, extraordinary=x) for x in (False, True)]
    tame = np.max(np.abs(squares), axis=0) < 30
    tame &= t * t / 4 + s * (1 - X) ** 2 > 1e-5
    tame &= np.abs(1 - X) > 1e-3
    return X[tame], Y[tame], theta[tame], t[tame], s[tame]


@extended
@pytest.mark.parametrize("mode", MODES)
def test_slopes_against_central_differences(mode):
    X, _, _, t, s = random_states(4000, 21)
    assert X.size > 3000
    wave = np.full(X.shape, mode is Mode.EXTRAORDINARY)
    square, *slopes = index_squared_and_slopes(X, t, s, wave)
    assert np.abs(square - textbook(X, t, s, extraordinary=wave)).max() < 1e-11
    for i, slope in enumerate(slopes):
        step = np.longdouble(1e-6) * [X, t, s][i]
        ends = []
        for sign in (-1, 1):
            moved = [np.longdouble(v) for v in (X, t, s)]
            moved[i] = moved[i] + sign * step
            ends.append(textbook(*moved, extraordinary=wave))
        difference = (ends[1] - ends[0]) / (2 * step)
        # The step's own error, third derivative times step²/6, stays below 1e-6 of the slope
        # because no state lies within some 1e-3 of the resonance.
        assert np.all(np.abs(slope - difference) < 1e-6 * (1 + np.abs(difference)))


def test_slopes_take_one_wave_a_point():
    X, _, _, t, s = random_states(50, 22)
    wave = np.arange(X.size) % 2 == 1
    mixed = index_squared_and_slopes(X, t, s, wave)
    for mode in (False, True):
        alone = index_squared_and_slopes(X, t, s, np.full(X.shape, mode))
        for a, b in zip(mixed, alone, strict=True):
            assert np.array_equal(a[wave == mode], b[wave == mode])


def test_squares_of_the_ray_form_and_of_the_angle_form_agree():
    X, Y, theta, t, s = random_states(3000, 23)
    for mode, square in zip((False, True), refractive_index_squared(X, Y, 0.0, theta), strict=True):
        found = index_squared_and_slopes(X, t, s, np.full(X.shape, mode))[0]
        assert np.abs(found - square.real).max() < 1e-11
        assert np.abs(square.imag).max() == 0.0


@extended
def test_group_index_against_the_derivative_of_f_mu():
    X, Y, theta, t, s = random_states(4000, 24)
    for mode, found in zip((False, True), group_index(X, Y, theta), strict=True):
        square = textbook(X, t, s, extraordinary=mode)
        assert np.isnan(found[square < 0]).all()
        good = square > 0.01
        step = np.longdouble(1e-7)
        ends = []
        for f in (1 - step, 1 + step):  # in units of the frequency
            n2 = textbook(X / f**2, t / f**2, s / f**2, extraordinary=mode)
            ends.append(f * np.sqrt(np.maximum(n2, 0)))
        derivative = (ends[1] - ends[0]) / (2 * step)
        assert np.all(np.abs(found - derivative)[good] < 1e-6 * (1 + np.abs(derivative[good])))
        assert found[good].min() > 0.99  # no signal outruns light


def test_group_index_without_a_field():
    X = np.array([0.0, 0.3, 0.75, 0.99])
    for found in group_index(X, 0.0, 0.7):
        assert np.abs(found * np.sqrt(1 - X) - 1).max() < 1e-12


def tensor_roots(X, Y, Z, theta):
    """Both n² from the quartic of the cold plasma tensor, in no particular order."""
    U = 1 - 1j * Z
    x, y = X / U, Y / U
    S, D, P = 1 - x / (1 - y**2), x * y / (1 - y**2), 1 - x
    sin2, cos2 = np.sin(theta) ** 2, np.cos(theta) ** 2
    A = S * sin2 + P * cos2
    B = (S**2 - D**2) * sin2 + P * S * (1 + cos2)
    F = np.sqrt((S**2 - D**2 - P * S) ** 2 * sin2**2 + 4 * P**2 * D**2 * cos2 + 0j)
    return (B + F) / (2 * A), (B - F) / (2 * A)


@pytest.mark.parametrize("share", [0.05, 0.6, 0.97, 1.03, 1.7, 6.0])
@pytest.mark.parametrize("theta_deg", [15.0, 40.0, 63.0, 130.0])
def test_labels_are_continuous_across_X_1(share, theta_deg):
    theta, Y = np.radians(theta_deg), 0.35
    Z = share * Y * np.sin(theta) ** 2 / (2 * abs(np.cos(theta)))
    frequency = 3e6
    nu_c = critical_collision_frequency(Y * frequency, theta)
    assert bool(Z * 2 * np.pi * frequency > nu_c) is (share > 1)
    X = np.linspace(0.6, 1.4, 16_001)
    labelled = refractive_index_squared(X, Y, Z, theta)
    # Follow the two roots of the tensor from X < 1, where the labels are beyond doubt.
    first, second = tensor_roots(X, Y, Z, theta)
    swap = np.zeros(X.size, dtype=bool)
    for i in range(1, X.size):
        a, b = (second, first) if swap[i - 1] else (first, second)
        stay = abs(first[i] - a[i - 1]) + abs(second[i] - b[i - 1])
        change = abs(second[i] - a[i - 1]) + abs(first[i] - b[i - 1])
        swap[i] = change < stay
    followed = [np.where(swap, second, first), np.where(swap, first, second)]
    if abs(followed[0][0] - labelled[0][0]) > abs(followed[1][0] - labelled[0][0]):
        followed.reverse()
    for ours, theirs in zip(labelled, followed, strict=True):
        assert np.abs(ours - theirs).max() < 1e-9
    # The polarization is continuous with the label.
    for vector in polarization_vectors(X, Y, Z, theta):
        overlap = np.abs(np.sum(np.conj(vector[:, 1:]) * vector[:, :-1], axis=0))
        assert overlap.min() > 0.999


@pytest.mark.parametrize("Z", [0.0, 1e-12, 0.01])
def test_labels_on_both_sides_of_X_1_at_few_collisions(Z):
    # Far from critical: O goes through zero, X through one, both smoothly.
    X = np.array([1 - 1e-4, 1.0, 1 + 1e-4])
    ordinary, extraordinary = refractive_index_squared(X, 0.5, Z, 1.0)
    assert np.abs(ordinary).max() < 2e-3 + 2 * Z
    assert np.abs(extraordinary - 1).max() < 2e-3 + 10 * Z


def test_index_lies_in_the_lossy_quadrant():
    rng = np.random.default_rng(25)
    X, Y, Z = rng.uniform(0, 3, 3000), rng.uniform(0, 2, 3000), rng.uniform(0, 1, 3000)
    theta = rng.uniform(0, np.pi, 3000)
    for n, square in zip(
        refractive_index(X, Y, Z, theta), refractive_index_squared(X, Y, Z, theta), strict=True
    ):
        assert np.all(n.real >= 0)
        assert np.all(n.imag <= 0)
        assert np.abs(n * n - square).max() < 1e-12 * np.abs(square).max()
        assert np.all(square.imag <= 1e-15)  # no wave grows in a passive plasma


def test_characteristic_waves_are_the_single_ones():
    rng = np.random.default_rng(26)
    shape = (3, 4001)  # more than one block
    X, Y, Z = rng.uniform(0, 2, shape), rng.uniform(0, 1, shape), rng.uniform(0, 0.2, shape)
    theta = rng.uniform(0, np.pi, shape)
    waves = characteristic_waves(X, Y, Z, theta)
    for a, b in zip(waves.index, refractive_index(X, Y, Z, theta), strict=True):
        assert a.shape == shape
        assert np.array_equal(a, b)
    for a, b in zip(waves.field, polarization_vectors(X, Y, Z, theta), strict=True):
        assert a.shape == (2, *shape)
        assert np.array_equal(a, b)


def test_broadcasting_and_scalars():
    n_o, n_x = refractive_index(0.5, 0.2, 0.0, 0.3)
    assert n_o.shape == n_x.shape == ()
    n_o, _ = refractive_index(np.array([0.1, 0.2]), 0.2, np.zeros((3, 1)), 0.3)
    assert n_o.shape == (3, 2)
    e_o, _ = polarization_vectors(np.array([0.1, 0.2]), 0.2, np.zeros((3, 1)), 0.3)
    assert e_o.shape == (2, 3, 2)


def test_nan_passes_through():
    state = (np.array([0.5, np.nan]), 0.2, 0.0, 0.3)
    for value in (*refractive_index(*state), *polarization_ratio(*state), index_difference(*state)):
        assert np.isnan(value).tolist() == [False, True]


def test_no_field_at_all():
    X = np.array([0.0, 0.4, 1.0, 1.6])
    for Z in (0.0, 0.1):
        for square in refractive_index_squared(X, 0.0, Z, 0.8):
            assert np.abs(square - (1 - X / (1 - 1j * Z))).max() < 1e-15
        for vector in polarization_vectors(X, 0.0, Z, 0.8):
            assert np.abs(np.sum(np.abs(vector) ** 2, axis=0) - 1).max() < 1e-15
        assert np.abs(index_difference(X, 0.0, Z, 0.8)).max() == 0.0


def test_polarization_ratio_is_that_of_the_vectors():
    state = (0.4, 0.3, 0.05, 1.1)
    for ratio, vector in zip(polarization_ratio(*state), polarization_vectors(*state), strict=True):
        assert abs(ratio - vector[1] / vector[0]) < 1e-15
        assert abs(np.sum(np.abs(vector) ** 2) - 1) < 1e-15
    _, across = polarization_ratio(1.0, 0.2, 0.0, 1.0)  # E_x is exactly zero
    assert np.isinf(across)


def test_limiting_shape_at_its_ends():
    assert limiting_shape(0.2, 0.0) == 1.0
    assert limiting_shape(0.0, 0.7) == 1.0
    assert limiting_shape(0.2, np.pi / 2) < 1e-15
    assert abs(limiting_shape(0.2, 0.4) - limiting_shape(0.2, np.pi - 0.4)) < 1e-15


def test_critical_collision_frequency_at_its_ends():
    assert critical_collision_frequency(1.2e6, 0.0) == 0.0
    assert critical_collision_frequency(1.2e6, np.pi / 2) > 1e20
    assert critical_collision_frequency(np.array([1e6, 2e6]), 0.5).shape == (2,)


def test_extraordinary_critical_frequency_at_its_ends():
    assert extraordinary_critical_frequency(5e6, 0.0) == 5e6
    assert extraordinary_critical_frequency(0.0, 1.2e6) == 1.2e6


def test_phase_to_go_of_a_uniform_slab():
    distance = np.array([0.0, 1e3, 4e3, 10e3])
    phase = phase_to_go(5e6, np.full(4, 1e-3), distance)
    per_metre = 2 * np.pi * 5e6 / SPEED_OF_LIGHT * 1e-3
    assert np.abs(phase - per_metre * (10e3 - distance)).max() < 1e-12


def test_phase_to_go_of_a_thinning_plasma():
    distance = np.linspace(0.0, 60e3, 601)
    difference = 0.02 * np.exp(-distance / 8e3)
    phase = phase_to_go(3.65e6, difference, distance)
    k = 2 * np.pi * 3.65e6 / SPEED_OF_LIGHT
    exact_phase = k * 0.02 * 8e3 * (np.exp(-distance / 8e3) - np.exp(-60e3 / 8e3))
    # The trapezoidal rule is high by (step / scale)² / 12.
    assert np.abs(phase - exact_phase).max() < (100 / 8e3) ** 2 / 12 * exact_phase.max() * 1.01
    assert phase[-1] == 0.0
    # One radian by the closed form, within a step.
    where = -8e3 * np.log(1 / (k * 0.02 * 8e3) + np.exp(-60e3 / 8e3))
    assert abs(limiting_point(phase) * 100 - where) < 10


@pytest.mark.parametrize(
    ("phase", "index"),
    [
        ([0.9, 0.5, 0.0], 0.0),  # never a radian
        ([3.0, 2.0, 0.0], 1.5),
        ([-3.0, -2.0, 0.0], 1.5),  # the sign does not matter
        ([5.0, 0.2, 4.0, 1.5, 0.5, 0.0], 3.5),  # the last crossing, not the first
        ([1.0, 0.0], 0.0),
        ([2.0], 0.0),
    ],
)
def test_limiting_point(phase, index):
    assert abs(limiting_point(np.array(phase)) - index) < 1e-12
