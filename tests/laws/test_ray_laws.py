"""Laws that every ray must keep, and a second way to the same numbers.

No source is needed for them: the Hamiltonian stays zero; both waves coincide
as the field goes to zero; reversing the field changes no ray; a mirror of
field and path mirrors the rays; a ray runs back the way it came. The second
way is a general ODE solver, one ray at a time, on the ray equations written
with the index as its own function and numerical derivatives (kind: derived).
"""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from magion.arrays import norm
from magion.constants import (
    EARTH_RADIUS,
    GYROFREQUENCY_PER_TESLA,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
)
from magion.geometry import Place, to_cartesian
from magion.ionosphere.layers import LayerParameters
from magion.ionosphere.profile import profiles_of_layers
from magion.rays.batch import Fate, trace
from magion.rays.chain import Specs, specs_of
from magion.rays.equations import derivative_and_hamiltonian
from magion.rays.fans import shoot
from magion.rays.homing import LARGEST_MISS, home
from magion.rays.link import link_between
from magion.waves import MODES, refractive_index_squared
from tests.media import AxialDipole, Scaled
from tests.proof import proves

HAMILTONIAN = proves(
    "Hamiltonian along every ray",
    layer="rays",
    kind="derived",
    source="it stays zero",
    tolerance=1e-6,
)
REVERSAL = proves(
    "landing place with the field reversed",
    layer="rays",
    kind="derived",
    source="reversing the field changes no ray",
    tolerance=5.0,
    unit="m",
    scale=1e6,
)
MIRROR = proves(
    "landing place in the mirrored hemisphere",
    layer="rays",
    kind="derived",
    source="a mirror of field and path mirrors the rays",
    tolerance=5.0,
    unit="m",
    scale=1e6,
)
SOLVER = proves(
    "landing place by a general ODE solver",
    layer="rays",
    kind="derived",
    source="Hamilton's equations, numerical derivatives",
    tolerance=50.0,
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
    fof1=0.0,
    hmf1=200e3,
    f1_share=0.0,
    source="test",
)
MEDIUM = profiles_of_layers([LAYERS])
DIPOLE = AxialDipole()
HOME = Place(latitude_deg=50.0, longitude_deg=0.0)
TIGHT = 4e-3


def rays(frequency_mhz, extraordinary):
    frequency = np.asarray(frequency_mhz, dtype=float) * 1e6
    return Specs(
        frequency=frequency,
        which=np.zeros(frequency.size, dtype=int),
        hops=np.ones(frequency.size, dtype=int),
        extraordinary=np.broadcast_to(extraordinary, frequency.shape).copy()[None],
    )


def link_to(latitude, longitude):
    return link_between(HOME, Place(latitude_deg=latitude, longitude_deg=longitude))


def fan(link, psi_deg, aside_deg=0.0):
    psi = np.radians(np.asarray(psi_deg, dtype=float))
    return np.stack([psi, np.full_like(psi, np.radians(aside_deg))])


@pytest.mark.parametrize("extraordinary", [False, True])
def test_hamiltonian_stays_zero_along_every_ray(extraordinary):
    link = link_to(50.5, 8.0)
    w = fan(link, np.linspace(-60.0, 88.0, 75))
    batch = rays(np.full(75, 5.3), extraordinary)
    ends = shoot(link, w, batch, MEDIUM, DIPOLE, tolerance=TIGHT, keep_tracks=True)
    assert (ends.fate == Fate.LANDED).all()
    for i, track in enumerate(ends.landings[0].tracks):
        same = batch.hop(0, np.full(track.group_path.size, i))
        _, energy = derivative_and_hamiltonian(track.state, same, MEDIUM, DIPOLE)
        HAMILTONIAN.off(np.abs(energy))


def test_both_waves_coincide_as_the_field_vanishes():
    link = link_to(52.0, 6.0)
    w = fan(link, np.linspace(0.0, 80.0, 20))
    both = {}
    for extraordinary in (False, True):
        for factor in (1.0, 1e-3, 1e-6):
            batch = rays(np.full(20, 5.3), extraordinary)
            ends = shoot(link, w, batch, MEDIUM, Scaled(DIPOLE, factor), tolerance=TIGHT)
            both[extraordinary, factor] = ends.position
    bare = shoot(link, w, rays(np.full(20, 5.3), False), MEDIUM, None, tolerance=TIGHT).position
    apart = [norm(both[True, f] - both[False, f]).max() for f in (1.0, 1e-3, 1e-6)]
    assert apart[0] > 10e3
    assert apart[1] < 2e-3 * apart[0] + 5.0
    assert apart[2] < 5.0
    assert norm(both[False, 1e-6] - bare).max() < 5.0


@pytest.mark.parametrize("extraordinary", [False, True])
def test_reversing_the_field_changes_no_ray(extraordinary):
    link = link_to(48.0, 3.0)
    w = fan(link, np.linspace(2.0, 80.0, 12), 3.0)
    batch = rays(np.full(12, 5.3), extraordinary)
    there = shoot(link, w, batch, MEDIUM, DIPOLE, tolerance=TIGHT).position
    reversed_field = AxialDipole(sign=-1.0)
    back = shoot(link, w, batch, MEDIUM, reversed_field, tolerance=TIGHT).position
    REVERSAL.off(norm(there - back))


@pytest.mark.parametrize("extraordinary", [False, True])
def test_mirror_across_the_equator_mirrors_the_rays(extraordinary):
    south = Place(latitude_deg=-50.0, longitude_deg=0.0)
    north_link = link_to(53.0, 4.0)
    south_link = link_between(south, Place(latitude_deg=-53.0, longitude_deg=4.0))
    w = fan(north_link, np.linspace(5.0, 75.0, 8), 2.0)
    mirrored = w * np.array([[1.0], [-1.0]])
    batch = rays(np.full(8, 5.3), extraordinary)
    above = shoot(north_link, w, batch, MEDIUM, DIPOLE, tolerance=TIGHT).position
    below = shoot(south_link, mirrored, batch, MEDIUM, DIPOLE, tolerance=TIGHT).position
    flip = np.array([[1.0], [1.0], [-1.0]])
    MIRROR.off(norm(above - flip * below))


def test_a_ray_runs_back_the_way_it_came():
    link = link_to(51.2, 2.5)
    found = home(link, rays([5.3, 5.3], [False, True]), MEDIUM, DIPOLE)
    back = link_between(link.receiver, link.transmitter)
    returned = home(back, rays([5.3, 5.3], [False, True]), MEDIUM, DIPOLE)
    assert len(found) == len(returned) >= 2
    for there, here in zip(found, returned, strict=True):
        # both miss by up to 0.1 km, which turns a ray of some 500 km by 2e-4 rad
        assert np.abs(there.launch + here.arrival).max() < 1e-3
        assert there.group_path == pytest.approx(here.group_path, abs=200.0)


@pytest.mark.parametrize("distance_deg", [0.0, 0.3, 2.0, 8.0])
def test_homed_rays_come_down_at_the_receiver(distance_deg):
    link = link_to(50.0 + 0.6 * distance_deg, distance_deg)
    found = home(link, rays([5.3, 5.3], [False, True]), MEDIUM, DIPOLE)
    assert {r.spec for r in found} == {0, 1}
    assert max(r.miss for r in found) <= LARGEST_MISS


def test_rays_at_the_spitze_continue_those_beside():
    """Launched in the magnetic meridian within the cone, the ordinary ray meets
    X = 1 with the field along it; its limit must join the rays beside."""
    link = link_to(51.0, 0.0)
    psi = [-8.0, -4.0, -1.0, 0.0, 1.0, 4.0, 8.0]
    batch = rays(np.full(len(psi), 5.3), False)
    landed = {}
    for aside in (0.0, 0.06, 0.25, 1.0):
        ends = shoot(link, fan(link, psi, aside), batch, MEDIUM, DIPOLE, tolerance=TIGHT)
        assert (ends.fate == Fate.LANDED).all()
        landed[aside] = link.coordinates(ends.position)[0]
    # the distance along grows as the square of the angle aside; 0.1 km at a quarter degree
    for aside in (0.06, 0.25):
        assert np.abs(landed[aside] - landed[0.0]).max() < 100.0
    assert np.abs(landed[1.0] - landed[0.0]).max() < 300.0


def test_ordinary_ray_near_the_vertical_keeps_its_name():
    """Between the extraordinary wave's resonance and X = 1 a wrong label would turn the ray
    back too low (X = 1 - Y) or let it through."""
    link = link_to(50.0, 3.0)
    psi = np.array([1.0, 2.0, 4.0])
    batch = rays(np.full(3, 5.3), False)
    ends = shoot(link, fan(link, psi, 2.0), batch, MEDIUM, DIPOLE, tolerance=TIGHT)
    height = np.arange(150e3, 280e3, 10.0)
    density, _ = MEDIUM.at_height(height)
    X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * density / 5.3e6**2
    full = height[np.searchsorted(X, 1.0)]
    assert (ends.fate == Fate.LANDED).all()
    assert np.all(ends.apogees[0] < full + 50.0)
    assert np.all(ends.apogees[0] > full - 1500.0)


def test_two_hops_are_one_after_the_other():
    """The second hop of a chain is the ray launched from where the first came down,
    in the direction reflected there (kind: derived)."""
    link = link_to(51.0, 4.0)
    w = fan(link, [20.0, 40.0], 1.0)
    for sequence in ((MODES[0], MODES[1]), (MODES[1], MODES[1])):
        specs = specs_of([(5.3e6, 0, sequence)] * 2)
        whole = shoot(link, w, specs, MEDIUM, DIPOLE, tolerance=TIGHT)
        first = shoot(link, w, rays([5.3] * 2, sequence[0] is MODES[1]), MEDIUM, DIPOLE,
                      tolerance=TIGHT)  # fmt: skip
        up = first.position / norm(first.position)
        toward = first.direction / norm(first.direction)
        toward = toward - 2.0 * (toward * up).sum(axis=0) * up
        again = trace(
            first.position,
            toward,
            rays([5.3] * 2, sequence[1] is MODES[1]).hop(0, np.arange(2)),
            MEDIUM,
            DIPOLE,
            position_tolerance=TIGHT,
            direction_tolerance=1e-6 * TIGHT,
        )
        assert norm(whole.position - again.position).max() < 1.0
        assert np.allclose(whole.group_path, first.group_path + again.group_path, atol=1.0)


def _one_ray(position, direction, frequency, extraordinary):
    """The same ray by a general solver, with the index by its complex form
    and every derivative by central differences."""

    def index_squared(r, p):
        density, _ = MEDIUM.density(r[:, None], np.zeros(1, dtype=int))
        field, _ = DIPOLE.at(r[:, None])
        b = field[:, 0]
        size = np.linalg.norm(b)
        cosine = np.clip(b @ p / (size * np.linalg.norm(p)), -1.0, 1.0)
        X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * density[0] / frequency**2
        Y = GYROFREQUENCY_PER_TESLA * size / frequency
        return refractive_index_squared(X, Y, 0.0, np.arccos(cosine))[int(extraordinary)].real

    def hamiltonian(state):
        r, p = state[0:3], state[3:6]
        return 0.5 * (p @ p - index_squared(r, p))

    def right_hand_side(_, state):
        slope = np.empty(6)
        for i in range(6):
            h = 5.0 if i < 3 else 1e-5
            plus, minus = state.copy(), state.copy()
            plus[i] += h
            minus[i] -= h
            slope[i] = (hamiltonian(plus) - hamiltonian(minus)) / (2.0 * h)
        return np.concatenate([slope[3:6], -slope[0:3]])

    def below(_, state):
        return np.linalg.norm(state[0:3]) - EARTH_RADIUS - MEDIUM.base + 10.0

    below.terminal, below.direction = True, -1.0
    solution = solve_ivp(
        right_hand_side,
        (0.0, 3e6),
        np.concatenate([position, direction]),
        method="DOP853",
        rtol=1e-9,
        atol=[0.1] * 3 + [1e-8] * 3,
        max_step=4e3,
        events=below,
    )
    assert solution.status == 1
    r, p = solution.y[0:3, -1], solution.y[3:6, -1]
    p = p / np.linalg.norm(p)
    along = r @ p
    return r + p * (-along - np.sqrt(along**2 - r @ r + EARTH_RADIUS**2))


@pytest.mark.parametrize(("extraordinary", "psi_deg"), [(False, 25.0), (True, 25.0), (True, 60.0)])
def test_general_solver_lands_at_the_same_place(extraordinary, psi_deg):
    link = link_to(51.0, 3.0)
    w = fan(link, [psi_deg], 4.0)
    ends = shoot(link, w, rays([5.3], extraordinary), MEDIUM, DIPOLE, tolerance=TIGHT)
    direction = link.launch(w)[:, 0]
    ground = to_cartesian(HOME.latitude, HOME.longitude, 0.0)
    along = ground @ direction
    length = -along + np.sqrt(along**2 - EARTH_RADIUS**2 + (EARTH_RADIUS + MEDIUM.base) ** 2)
    landed = _one_ray(ground + direction * length, direction, 5.3e6, extraordinary)
    SOLVER.off(np.linalg.norm(landed - ends.position[:, 0]))
