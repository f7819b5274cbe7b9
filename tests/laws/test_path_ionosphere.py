"""The ionosphere that changes along a path: laws of its table, and rays through a tilt.

No source is needed: with the same layers everywhere it is the vertical profile;
its gradient is the slope of its density; N is never negative; both run on
without a step from one row of stations to the next. The second way to the rays
is a general ODE solver, one ray at a time, on the Hamiltonian with the index by
its complex form and every derivative by central differences (kind: derived).
"""

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from magion.arrays import norm
from magion.constants import (
    EARTH_RADIUS,
    GYROFREQUENCY_PER_TESLA,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
)
from magion.geometry import Place
from magion.ionosphere.along import path_ionosphere, stations_along
from magion.ionosphere.layers import BASE, TOP, LayerParameters
from magion.ionosphere.profile import profiles_of_layers
from magion.rays.batch import Fate
from magion.rays.chain import specs_of
from magion.rays.fans import shoot
from magion.rays.link import link_between
from magion.waves import MODES, Mode, refractive_index_squared
from tests.media import AxialDipole
from tests.proof import proves

SOLVER = proves(
    "landing place through a tilt by a general ODE solver",
    layer="rays",
    kind="derived",
    source="Hamilton's equations, numerical derivatives",
    tolerance=20.0,
    unit="m",
    scale=1e6,
)

LAYERS = LayerParameters(
    fof2=7e6,
    hmf2=280e3,
    f2_bottom=30e3,
    f2_top=40e3,
    foe=2.5e6,
    hme=110e3,
    e_bottom=5e3,
    e_top=7e3,
    fof1=4.2e6,
    hmf1=190e3,
    f1_share=1.0,
    source="test",
)
START = Place(latitude_deg=48.0, longitude_deg=2.0)
END = Place(latitude_deg=54.0, longitude_deg=17.0)
STATIONS = stations_along(START.latitude, START.longitude, END.latitude, END.longitude)
LINK = link_between(START, END)
DIPOLE = AxialDipole()
ROWS, PLACES = STATIONS.angle.size, STATIONS.latitude.size


def same_everywhere():
    return path_ionosphere(STATIONS, [replace(LAYERS, fof2=np.full(PLACES, LAYERS.fof2))])


def dawn(fof2_change=0.5, hmf2_change=-60e3, aside=0.15):
    """Layers at the stations of a strong dawn: foF2 up and hmF2 down along the path, and
    a slope across it."""
    along = np.tile(STATIONS.angle, 3)
    share = 1.0 / (1.0 + np.exp(-(along - 0.5 * LINK.angle) / 0.04))  # over some 1000 km
    side = np.repeat([0.0, -1.0, 1.0], ROWS)
    return replace(
        LAYERS,
        fof2=6e6 * (1.0 + fof2_change * share) * (1.0 + aside * 0.2 * side),
        hmf2=310e3 + hmf2_change * share,
        foe=0.5e6 + 2.5e6 * share,
        fof1=3.5e6 + 0.5e6 * share,
        f1_share=share,
        hmf1=195e3 - 10e3 * share,
        d_height=86e3 - 13e3 * share,
        d_gradient=0.55e-3 - 0.2e-3 * share,
    )


TILTED = path_ionosphere(STATIONS, [dawn()])
VERTICAL = profiles_of_layers([LAYERS])


def positions(angle, side, height):
    """Places by the angle along the path, that to the left of it, and height."""
    angle, side, height = np.broadcast_arrays(angle, side, height)
    c = np.cos(side)
    unit = np.stack([c * np.cos(angle), c * np.sin(angle), np.sin(side)])
    return STATIONS.axes.T @ unit * (EARTH_RADIUS + height)


def scattered(count, seed, low=BASE + 1e3, high=TOP - 1e3):
    """Points inside, beside and beyond the ends of the stations."""
    rng = np.random.default_rng(seed)
    angle = rng.uniform(STATIONS.angle[0] - 0.05, STATIONS.angle[-1] + 0.05, count)
    # the slope across is kept to 300 km aside, 0.047 rad
    return positions(angle, rng.uniform(-0.07, 0.07, count), rng.uniform(low, high, count))


def density(medium, position):
    return medium.density(position, np.zeros(position.shape[1], dtype=int))


def test_same_layers_everywhere_are_the_vertical_profile():
    position = scattered(5000, 1)
    found, slope = density(same_everywhere(), position)
    expected, expected_slope = density(VERTICAL, position)
    assert np.abs(found - expected).max() < 1e-3 * expected.max()
    # tables of 500 m and 250 m, fourth order: the slopes differ by less than 1e-3 of the greatest
    assert np.abs(slope - expected_slope).max() < 1e-3 * np.abs(expected_slope).max()
    low = scattered(2000, 2, 70e3, 100e3)
    pair = density(same_everywhere(), low)[0], density(VERTICAL, low)[0]
    assert np.allclose(*pair, rtol=0.02, atol=0.0)  # the thin plasma that sets hand and loss


@pytest.mark.parametrize("mode", MODES)
def test_rays_through_the_same_layers_land_at_the_same_place(mode):
    psi = np.radians([3.0, 12.0, 21.0, 30.0, 40.0, 50.0, 57.0, 68.0, 75.0, 82.0])
    w = np.stack([psi, np.full_like(psi, 0.03)])
    specs = specs_of([(5.3e6, 0, (mode,))] * psi.size)
    landed = []
    for medium in (same_everywhere(), VERTICAL):
        ends = shoot(LINK, w, specs, medium, DIPOLE, tolerance=0.01)
        assert (ends.fate == Fate.LANDED).all()
        landed.append(ends.position)
    assert norm(landed[0] - landed[1]).max() < 20.0  # 0.7 m found


def test_gradient_is_the_slope_of_the_density():
    position = scattered(3000, 3)
    # Central differences over 20 m; points so near an edge of the model that they straddle it
    # (the end rows, 300 km aside, the top and base) are left out.
    c, t, n = STATIONS.axes @ position
    radius = norm(position)
    along, side = np.arctan2(t, c), n / radius
    ends = np.minimum(np.abs(along - STATIONS.angle[0]), np.abs(along - STATIONS.angle[-1]))
    kept = (ends > 1e-5) & (np.abs(np.abs(side) - 300e3 / EARTH_RADIUS) > 1e-5)
    position = position[:, kept]
    _, gradient = density(TILTED, position)
    size = np.abs(gradient).max()
    for axis in np.eye(3):
        step = 10.0 * axis[:, None]
        ahead, behind = (density(TILTED, position + s * step)[0] for s in (1.0, -1.0))
        difference = (ahead - behind) / 20.0
        along_axis = axis @ gradient
        # third derivatives over a layer's scale of 5 km: (10 / 5000)² / 6 of the greatest slope
        assert np.abs(difference - along_axis).max() < 1e-5 * size
    # the tilt is there: along and across the path, not only upward
    flat = gradient - position / norm(position) ** 2 * np.sum(gradient * position, axis=0)
    assert norm(flat).max() > 0.003 * size
    inside = np.abs(side[kept]) < 300e3 / EARTH_RADIUS
    assert np.abs(STATIONS.axes[2] @ flat)[inside].max() > 3e-4 * size


def test_beyond_the_last_station_nothing_changes_along_the_path():
    rng = np.random.default_rng(4)
    height, side = rng.uniform(90e3, 500e3, 200), rng.uniform(-0.04, 0.04, 200)
    for end, sign in ((STATIONS.angle[0], -1.0), (STATIONS.angle[-1], 1.0)):
        near, far = (density(TILTED, positions(end + sign * a, side, height)) for a in (1e-9, 0.2))
        assert np.allclose(near[0], far[0], rtol=1e-6, atol=1.0)


def test_density_is_never_negative():
    steep = dawn(fof2_change=2.5, hmf2_change=-120e3, aside=4.0)
    for layers in (dawn(), steep):
        found, gradient = density(path_ionosphere(STATIONS, [layers]), scattered(40000, 5))
        assert (found >= 0.0).all()
        assert np.isfinite(gradient).all()


def test_nothing_outside_the_heights_of_the_model():
    rng = np.random.default_rng(6)
    angle = rng.uniform(0.0, LINK.angle, 50)
    for height in (BASE - 10.0, TOP + 10.0, 0.0, 2000e3):
        found, gradient = density(TILTED, positions(angle, 0.01, np.full(50, height)))
        assert (found == 0.0).all()
        assert (gradient == 0.0).all()


@pytest.mark.parametrize("side", [0.0, 0.02, -0.03])
def test_rows_of_stations_join_without_a_step(side):
    height = np.linspace(70e3, 500e3, 400)
    around = density(TILTED, scattered(2000, 7))
    peak, size = around[0].max(), np.abs(around[1]).max()

    def at(angle):
        return density(TILTED, positions(angle, side, height))

    nudge, step = 1e-10, 500.0 / EARTH_RADIUS  # 0.6 mm and 500 m to each side
    bends = []
    # the inner rows: at the outermost the model ends, and N runs on flat with a kink
    for angle in STATIONS.angle[1:-1]:
        before, after = at(angle - nudge), at(angle + nudge)
        assert np.abs(after[0] - before[0]).max() < 1e-8 * peak
        assert np.abs(after[1] - before[1]).max() < 1e-6 * size
        for sign in (-1.0, 1.0):
            values = [at(angle + sign * k * step)[0] for k in (1.0, 2.0, 3.0)]
            bends.append((values[0] - 2.0 * values[1] + values[2]) / step**2)
    # The second derivative along the path is joined as well: 2 km apart it changes by its own
    # slope, 1 % of itself where the rows are 200 km apart; a step would show as tens of percent.
    bends = np.array(bends)
    assert np.abs(bends[1::2] - bends[::2]).max() < 0.05 * np.abs(bends).max()


def by_general_solver(position, direction, frequency, mode):
    """Where one ray lands, by a general solver and central differences."""
    base = TILTED.base

    def hamiltonian(state):
        r, p = state[0:3], state[3:6]
        N, _ = density(TILTED, r)
        field, _ = DIPOLE.at(r)
        size = np.sqrt(np.sum(field * field, axis=0))
        cosine = np.sum(field * p, axis=0) / (size * np.sqrt(np.sum(p * p, axis=0)))
        X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * N / frequency**2
        Y = GYROFREQUENCY_PER_TESLA * size / frequency
        angle = np.arccos(np.clip(cosine, -1.0, 1.0))
        square = refractive_index_squared(X, Y, 0.0, angle)[MODES.index(mode)].real
        return 0.5 * (np.sum(p * p, axis=0) - square)

    steps = np.diag([20.0] * 3 + [1e-5] * 3)

    def right_hand_side(_, state):
        both = np.concatenate([state + steps, state - steps]).T  # all twelve at once
        value = hamiltonian(both)
        slope = (value[:6] - value[6:]) / (2.0 * np.diag(steps))
        return np.concatenate([slope[3:6], -slope[0:3]])

    def below(_, state):
        return np.linalg.norm(state[0:3]) - EARTH_RADIUS - base + 10.0

    below.terminal, below.direction = True, -1.0
    solution = solve_ivp(
        right_hand_side,
        (0.0, 5e6),
        np.concatenate([position, direction]),
        method="DOP853",
        rtol=1e-9,
        atol=[0.1] * 3 + [1e-8] * 3,
        max_step=6e3,
        events=below,
    )
    assert solution.status == 1
    r, p = solution.y[0:3, -1], solution.y[3:6, -1]
    p = p / np.linalg.norm(p)
    along = r @ p
    return r + p * (-along - np.sqrt(along**2 - r @ r + EARTH_RADIUS**2))


@pytest.mark.parametrize(
    ("mode", "psi_deg", "frequency"),
    [(Mode.ORDINARY, 55.0, 7.1e6), (Mode.EXTRAORDINARY, 55.0, 7.1e6), (Mode.ORDINARY, 74.0, 9e6)],
)
def test_general_solver_lands_at_the_same_place_through_a_tilt(mode, psi_deg, frequency):
    w = np.array([[np.radians(psi_deg)], [np.radians(3.0)]])
    specs = specs_of([(frequency, 0, (mode,))])
    ends = shoot(LINK, w, specs, TILTED, DIPOLE, tolerance=4e-3)
    assert ends.fate[0] == Fate.LANDED
    direction = LINK.launch(w)[:, 0]
    ground = LINK.up * EARTH_RADIUS
    along = ground @ direction
    length = -along + np.sqrt(along**2 - EARTH_RADIUS**2 + (EARTH_RADIUS + TILTED.base) ** 2)
    landed = by_general_solver(ground + direction * length, direction, frequency, mode)
    SOLVER.off(np.linalg.norm(landed - ends.position[:, 0]))
    # the tilt matters: through the layers over the start the same ray lands elsewhere
    level = profiles_of_layers([dawn().at(3)])
    other = shoot(LINK, w, specs, level, DIPOLE, tolerance=4e-3)
    assert not np.linalg.norm(other.position[:, 0] - ends.position[:, 0]) < 20e3


def test_hours_do_not_touch_each_other():
    several = path_ionosphere(STATIONS, [dawn(), replace(dawn(), fof2=np.full(PLACES, 4e6))])
    position = scattered(500, 8)
    mixed = several.density(position, np.arange(500) % 2)[0]
    for hour in range(2):
        alone = several.density(position, np.full(500, hour))[0]
        assert (mixed[hour::2] == alone[hour::2]).all()
    assert np.allclose(several.density(position, np.zeros(500, dtype=int))[0],
                       density(TILTED, position)[0], rtol=1e-12, atol=1e-3)  # fmt: skip
