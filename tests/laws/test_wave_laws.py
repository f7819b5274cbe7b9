"""Laws of the two waves, of polarization and of great circles that need no source.

The independent route of the waves starts from the equation of motion of one
electron, m dv/dt = −e (E + v × B) − m ν v, with exp(+iωt): its mobility gives
the dielectric tensor, and the tensor the wave equation, whose two transverse
eigenvectors are the waves. Neither the indices nor the hands go through the
formulas under test (kind: derived).
"""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from magion.arrays import cross, dot, norm, unit
from magion.geometry import (
    from_cartesian,
    great_circle,
    locator_of,
    place_of_locator,
    to_cartesian,
    travel,
)
from magion.polarization import (
    axial_ratio,
    ellipse,
    hand_of,
    is_right_hand,
    match,
    stokes,
    tilt,
)
from magion.waves import (
    polarization_ratio,
    polarization_vectors,
    refractive_index,
    refractive_index_squared,
    wave_axes,
)
from tests.proof import proves

ROOTS = proves(
    "squared indices by the dielectric tensor",
    layer="waves",
    kind="derived",
    source="motion of one electron",
    tolerance=1e-10,
    unit="relative to 1 + |n²|",
)
QUARTIC = proves(
    "sum and product of the squared indices by the quartic",
    layer="waves",
    kind="derived",
    source="S, D, P elements",
    tolerance=1e-9,
    unit="relative to 1 + |n²|",
)
VECTORS = proves(
    "states of both waves by the dielectric tensor",
    layer="polarization",
    kind="derived",
    source="eigenvectors of the tensor",
    tolerance=1e-12,
)

NUMBER = 4000


def states(seed, number=NUMBER, collisions=True):
    """X, Y, Z, theta over all of the plane, clear of resonances and degenerate roots."""
    rng = np.random.default_rng(seed)
    X, Y = rng.uniform(0.001, 2.5, number), rng.uniform(0.01, 1.8, number)
    Z = rng.uniform(0.0, 0.6, number) * (rng.random(number) < 0.7) * collisions
    theta = rng.uniform(0.02, np.pi - 0.02, number)
    good = np.abs(1 - X) > 1e-3
    A = tensor(X, Y, Z, theta)[:, 2, 2]
    good &= np.abs(A) > 1e-2  # E_z is eliminated through it; small next to a resonance
    return X[good], Y[good], Z[good], theta[good]


def tensor(X, Y, Z, theta, sign=1):
    """Dielectric tensor, shape (n, 3, 3), for exp(sign iωt); z along k, B toward +x."""
    b = np.stack([np.sin(theta), 0 * theta, np.cos(theta)])
    zero = 0 * theta
    # The matrix of v -> v × b.
    turn = np.array([[zero, b[2], -b[1]], [-b[2], zero, b[0]], [b[1], -b[0], zero]])
    # (iω + ν) v + (e B / m) v × b = −(e/m) E, divided by iω.
    motion = (1 + Z / (1j * sign))[:, None, None] * np.eye(3)
    motion = motion + (Y / (1j * sign))[:, None, None] * np.moveaxis(turn, 2, 0)
    return np.eye(3) - X[:, None, None] * np.linalg.inv(motion)


def waves_of_tensor(X, Y, Z, theta, sign=1):
    """n², shape (n, 2), and (E_x, E_y), shape (n, 2, 2) by [state, component, wave]."""
    e = tensor(X, Y, Z, theta, sign)
    # n² (k k − 1) E + ε E = 0: the third row gives E_z, the others an eigenvalue problem.
    transverse = e[:, :2, :2] - e[:, :2, 2:] * e[:, 2:, :2] / e[:, 2:, 2:]
    return np.linalg.eig(transverse)


def paired(X, Y, Z, theta, sign=1):
    """Tensor's waves in the order of ours; and the chosen column for each of ours."""
    squares, vectors = waves_of_tensor(X, Y, Z, theta, sign)
    ordinary, _ = refractive_index_squared(X, Y, Z, theta)
    if sign < 0:
        ordinary = np.conj(ordinary)
    first = np.abs(squares - ordinary[:, None]).argmin(axis=1)
    rows = np.arange(X.size)
    return [(squares[rows, c], vectors[rows, :, c].T) for c in (first, 1 - first)]


def turns_right(vector):
    """Whether the real field of exp(+iωt) goes from x toward y, clockwise along z."""
    now, soon = vector.real, (vector * np.exp(0.01j)).real
    return now[0] * soon[1] - now[1] * soon[0] > 0


@pytest.mark.parametrize("collisions", [False, True])
def test_indices_are_the_roots_of_the_tensor(collisions):
    state = states(1, collisions=collisions)
    assert state[0].size > 0.9 * NUMBER
    for ours, (theirs, _) in zip(refractive_index_squared(*state), paired(*state), strict=True):
        # The elimination of E_z costs up to 1/ε_zz in rounding.
        ROOTS.off(np.abs(ours - theirs) / (1 + np.abs(theirs)))


def test_indices_are_the_roots_of_the_quartic():
    """A n⁴ − B n² + C = 0 with the elements S, D, P; collisions turn X into X/U and Y into Y/U."""
    X, Y, Z, theta = states(2)
    U = 1 - 1j * Z
    x, y = X / U, Y / U
    S, D, P = 1 - x / (1 - y**2), x * y / (1 - y**2), 1 - x
    R, L = S + D, S - D
    sin2, cos2 = np.sin(theta) ** 2, np.cos(theta) ** 2
    A = S * sin2 + P * cos2
    B = R * L * sin2 + P * S * (1 + cos2)
    C = P * R * L
    ordinary, extraordinary = refractive_index_squared(X, Y, Z, theta)
    QUARTIC.off(np.abs(ordinary + extraordinary - B / A) / (1 + np.abs(B / A)))
    QUARTIC.off(np.abs(ordinary * extraordinary - C / A) / (1 + np.abs(C / A)))


@pytest.mark.parametrize("collisions", [False, True])
def test_polarizations_are_the_eigenvectors_of_the_tensor(collisions):
    state = states(3, collisions=collisions)
    squares = refractive_index_squared(*state)
    distinct = np.abs(squares[0] - squares[1]) > 1e-4  # else the eigenvectors are not defined
    assert distinct.sum() > 0.8 * NUMBER
    for ours, (_, theirs) in zip(polarization_vectors(*state), paired(*state), strict=True):
        VECTORS.within(match(ours, theirs)[distinct], 1.0)
        clear = distinct & (np.abs(stokes(ours)[3]) > 1e-6)
        assert np.array_equal(is_right_hand(ours)[clear], turns_right(theirs)[clear])
        assert clear.sum() > 0.75 * NUMBER


def test_labels_by_the_axes_of_the_eigenvectors():
    """Without collisions the ordinary wave is the one whose major axis lies in the (k, B) plane."""
    state = states(4, collisions=False)
    squares, vectors = waves_of_tensor(*state)
    lies_in_plane = np.abs(vectors[:, 0]) > np.abs(vectors[:, 1])
    assert np.all(lies_in_plane.sum(axis=1) == 1)
    theirs = squares[lies_in_plane]
    ordinary, _ = refractive_index_squared(*state)
    assert np.max(np.abs(ordinary - theirs) / (1 + np.abs(theirs))) < 1e-9


def test_labels_with_collisions_by_the_axes_of_the_eigenvectors():
    """The same holds, but for X > 1 above the critical collision frequency: there it is opposite.

    |rho_O| is |tanh(w/2)| with sinh w = 2 Y_L (U − X) / Y_T², below 1 for the root with the
    positive real part of cosh w, above 1 for the other, to which a wave goes over X = 1.
    """
    X, Y, Z, theta = states(5)
    above = 2 * Z * np.abs(np.cos(theta)) > Y * np.sin(theta) ** 2
    exchanged = above & (X > 1)
    assert 100 < exchanged.sum() < X.size - 100
    squares, vectors = waves_of_tensor(X, Y, Z, theta)
    size = np.abs(vectors[:, 1] / vectors[:, 0])
    assert np.all(np.abs(size[:, 0] * size[:, 1] - 1) < 1e-8)
    ordinary_column = np.where(exchanged, size.argmax(axis=1), size.argmin(axis=1))
    theirs = squares[np.arange(X.size), ordinary_column]
    ordinary, _ = refractive_index_squared(X, Y, Z, theta)
    clear = np.abs(np.log(size[:, 0])) > 1e-6
    assert np.max((np.abs(ordinary - theirs) / (1 + np.abs(theirs)))[clear]) < 1e-9


def test_the_other_time_factor_gives_complex_conjugates():
    state = states(6)
    squares = refractive_index_squared(*state)
    distinct = np.abs(squares[0] - squares[1]) > 1e-4
    for ours, vector, (theirs, field) in zip(
        squares, polarization_vectors(*state), paired(*state, sign=-1), strict=True
    ):
        assert np.max(np.abs(np.conj(ours) - theirs) / (1 + np.abs(theirs))) < 1e-10
        assert np.abs(match(np.conj(vector), field) - 1)[distinct].max() < 1e-12


def test_product_of_the_ratios_is_one():
    state = states(7)
    ordinary, extraordinary = polarization_ratio(*state)
    assert np.abs(ordinary * extraordinary - 1).max() < 1e-9


def fields_in_space(k, b, X, Y, Z):
    """n of both waves and their electric fields across k, in fixed axes."""
    theta = np.arctan2(norm(cross(k, b)), dot(k, b))
    x, y = wave_axes(k, b)
    vectors = polarization_vectors(X, Y, Z, theta)
    return refractive_index(X, Y, Z, theta), [v[0] * x + v[1] * y for v in vectors], vectors


def directions(seed, number=500):
    rng = np.random.default_rng(seed)
    k, b = (unit(v) for v in rng.normal(size=(2, 3, number)))
    apart = np.abs(dot(k, b)) < 0.999
    k, b = k[:, apart], b[:, apart]
    size = k.shape[1]
    return k, b, rng.uniform(0.01, 0.95, size), rng.uniform(0.05, 0.9, size)


@pytest.mark.parametrize("Z", [0.0, 0.05])
def test_reversing_the_field_swaps_the_hands_and_keeps_the_indices(Z):
    k, b, X, Y = directions(8)
    n, _, vectors = fields_in_space(k, b, X, Y, Z)
    n_back, _, vectors_back = fields_in_space(k, -b, X, Y, Z)
    for i in range(2):
        assert np.abs(n[i] - n_back[i]).max() < 1e-9
        right, right_back = is_right_hand(vectors[i]), is_right_hand(vectors_back[i])
        clear = np.abs(stokes(vectors[i])[3]) > 1e-9
        assert np.all(right[clear] != right_back[clear])
        assert (
            np.abs(axial_ratio(vectors[i])[clear] / axial_ratio(vectors_back[i])[clear] - 1).max()
            < 1e-6
        )


@pytest.mark.parametrize("Z", [0.0, 0.05])
def test_reversing_the_travel_keeps_the_field_in_space_and_swaps_the_hands(Z):
    k, b, X, Y = directions(9)
    n, fields, vectors = fields_in_space(k, b, X, Y, Z)
    n_back, fields_back, vectors_back = fields_in_space(-k, b, X, Y, Z)
    for i in range(2):
        assert np.abs(n[i] - n_back[i]).max() < 1e-9
        overlap = np.abs(np.sum(np.conj(fields[i]) * fields_back[i], axis=0))
        assert np.abs(overlap - 1).max() < 1e-12
        clear = np.abs(stokes(vectors[i])[3]) > 1e-9
        assert np.all((is_right_hand(vectors[i]) != is_right_hand(vectors_back[i]))[clear])


def test_the_two_waves_are_opposite_without_collisions():
    state = states(10, collisions=False)
    ordinary, extraordinary = polarization_vectors(*state)
    assert match(ordinary, extraordinary).max() < 1e-25
    assert np.all(is_right_hand(ordinary) != is_right_hand(extraordinary))


finite = st.floats(-10, 10, allow_subnormal=False)
jones = st.tuples(finite, finite, finite, finite).map(
    lambda p: np.array([complex(p[0], p[1]), complex(p[2], p[3])])
)


@given(jones, jones)
def test_match_of_any_two_states(a, b):
    assume(min(np.linalg.norm(a), np.linalg.norm(b)) > 1e-3)
    assert abs(match(a, a) - 1) < 1e-12
    share = float(match(a, b))
    assert -1e-12 <= share <= 1 + 1e-12
    assert abs(share - match(b, a)) < 1e-12
    # What one state takes and what its opposite takes is all there is.
    opposite = np.array([-np.conj(a[1]), np.conj(a[0])])
    assert abs(share + match(opposite, b) - 1) < 1e-12
    # And by the Poincare sphere: half of one plus the cosine between the two points.
    p, q = stokes(a), stokes(b)
    assert abs(share - (1 + p[1:] @ q[1:] / (p[0] * q[0])) / 2) < 1e-10


@given(jones)
def test_stokes_parameters_of_a_pure_state(field):
    i, q, u, v = stokes(field)
    assert abs(i**2 - (q**2 + u**2 + v**2)) <= 1e-12 * i**2
    assert i >= 0


@given(st.floats(1.001, 1e4), st.floats(-89.9, 89.9), st.booleans())
def test_ellipse_round_trip(ratio, tilt_deg, right):
    vector = ellipse(ratio, np.radians(tilt_deg), right)
    assert abs(np.sum(np.abs(vector) ** 2) - 1) < 1e-12
    # V is 2 / ratio of I, so that its relative rounding grows with the ratio.
    assert abs(axial_ratio(vector) / ratio - 1) < 1e-11 * ratio
    # Q and U shrink as the ellipse approaches a circle.
    assert abs(np.degrees(tilt(vector)) - tilt_deg) < 1e-10 / (ratio - 1) + 1e-10
    assert bool(is_right_hand(vector)) is right
    # Its real field, sampled: the longest and the shortest radius are the axes.
    t = np.linspace(0, np.pi, 721)
    radius = np.linalg.norm((vector[:, None] * np.exp(1j * t)).real, axis=0)
    assert abs(radius.max() - ratio / np.hypot(1, ratio)) < 1e-5
    assert abs(radius.min() - 1 / np.hypot(1, ratio)) < 5e-3
    assert bool(turns_right(vector)) is right


@given(jones)
def test_any_state_is_an_ellipse(field):
    assume(np.linalg.norm(field) > 1e-3)
    ratio = float(axial_ratio(field))
    assume(ratio < 1e5)
    again = ellipse(ratio, tilt(field), is_right_hand(field))
    assert abs(match(field, again) - 1) < 1e-9
    assert hand_of(again) is hand_of(field)


latitudes = st.floats(-np.pi / 2, np.pi / 2)
longitudes = st.floats(-np.pi, np.pi)


@given(latitudes, longitudes, st.floats(0, 2 * np.pi), st.floats(1e-6, np.pi - 1e-6))
def test_great_circle_undoes_travel(lat, lon, bearing, angle):
    lat_2, lon_2 = travel(lat, lon, bearing, angle)
    assert -np.pi / 2 <= lat_2 <= np.pi / 2
    assert -np.pi <= lon_2 <= np.pi
    found, direction = great_circle(lat, lon, lat_2, lon_2)
    assert abs(found - angle) < 1e-9
    assume(abs(lat) < np.pi / 2 - 1e-6)  # at a pole a bearing hangs on the longitude's last digit
    # One rounding of the longitude, divided by the sine of the angle.
    off = (direction - bearing + np.pi) % (2 * np.pi) - np.pi
    assert abs(off) * np.sin(angle) < 1e-9


@given(latitudes, longitudes, latitudes, longitudes)
def test_distance_is_that_of_the_vectors_and_the_same_both_ways(lat_1, lon_1, lat_2, lon_2):
    angle, _ = great_circle(lat_1, lon_1, lat_2, lon_2)
    back, _ = great_circle(lat_2, lon_2, lat_1, lon_1)
    a, b = unit(to_cartesian(lat_1, lon_1, 0.0)), unit(to_cartesian(lat_2, lon_2, 0.0))
    assert abs(angle - np.arctan2(norm(cross(a, b)), dot(a, b))) < 1e-14
    assert abs(angle - back) < 1e-14


@given(latitudes, longitudes, st.floats(0.0, 1e6))
def test_cartesian_round_trip(lat, lon, height):
    found = from_cartesian(to_cartesian(lat, lon, height))
    assert abs(found[0] - lat) < 1e-14 + 2e-16 / max(np.cos(lat), 1e-3)
    if np.cos(lat) > 1e-3:
        assert abs((found[1] - lon + np.pi) % (2 * np.pi) - np.pi) < 1e-12
    assert abs(found[2] - height) < 1e-8


@given(st.floats(-90, 90), st.floats(-180, 180), st.sampled_from([4, 6, 8]))
def test_locator_round_trip(lat, lon, signs):
    locator = locator_of(lat, lon, signs)
    assert len(locator) == signs
    mid_lat, mid_lon = place_of_locator(locator)
    height = {4: 1.0, 6: 2.5 / 60, 8: 0.25 / 60}[signs]
    # The place lies in the square, but for a nudge that keeps borders where they are written.
    assert abs(mid_lat - lat) <= height / 2 + 1e-10
    assert abs(mid_lon - lon) <= height + 1e-10
    assert locator_of(mid_lat, mid_lon, signs) == locator
    assert locator_of(lat, lon, 8).startswith(locator)
