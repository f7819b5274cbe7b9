"""Layers, profiles, measured profiles, collisions and the climatology's adapter."""

import logging
from datetime import UTC, datetime, timedelta, timezone

import numpy as np
import pytest
from scipy.optimize import brentq

from magion.constants import EARTH_RADIUS
from magion.errors import InputError
from magion.geometry import to_cartesian
from magion.ionosphere.climatology import ASSUMED_FLUX, climate, f1_critical_frequency
from magion.ionosphere.collisions import electron_neutral
from magion.ionosphere.layers import (
    BASE,
    TOP,
    LayerParameters,
    density_of_frequency,
    epstein,
    frequency_of_density,
    layered_density,
    skew_epstein,
    smooth_step,
)
from magion.ionosphere.profile import (
    SPACING,
    critical_frequency,
    measured_profile,
    profiles_of_layers,
)


def layers(**changes):
    values = {
        "fof2": 7e6,
        "hmf2": 280e3,
        "f2_bottom": 30e3,
        "f2_top": 50e3,
        "foe": 3.1e6,
        "hme": 110e3,
        "e_bottom": 5e3,
        "e_top": 7e3,
        "fof1": 4.5e6,
        "hmf1": 190e3,
        "f1_share": 0.0,
        "source": "typed",
    }
    return LayerParameters(**(values | changes))


CASES = {
    "day": layers(f1_share=1.0),
    "day-half-f1": layers(f1_share=0.4, hmf2=250e3),
    "night": layers(fof2=3e6, hmf2=340e3, foe=0.4e6, f2_bottom=35e3),
    "thick": layers(fof2=12e6, hmf2=400e3, f2_bottom=60e3, f2_top=80e3),
    "low": layers(hmf2=200e3, f2_bottom=18e3, f2_top=30e3),
    "lowest-accepted": layers(fof2=4e6, hmf2=150e3, f2_bottom=9e3, f2_top=20e3, foe=2e6),
    "high": layers(fof2=20e6, hmf2=550e3, f2_bottom=60e3),
    "weak-e": layers(foe=0.1e6),
}
case = pytest.mark.parametrize("one", CASES.values(), ids=CASES)


def peak_by_slope(profile, near):
    """Height where the slope vanishes, within 2 km of `near`."""
    return brentq(lambda h: float(profile.at_height(np.array([h]))[1][0]), near - 2e3, near + 2e3)


@case
def test_profile_meets_its_parameters(one):
    profile = profiles_of_layers([one])
    assert abs(critical_frequency(profile) / one.fof2 - 1) < 1e-5
    height = peak_by_slope(profile, one.hmf2)
    assert abs(height / one.hmf2 - 1) < 1e-5
    density, found = profile.peak()
    assert abs(density / density_of_frequency(one.fof2) - 1) < 2e-5
    assert abs(found - one.hmf2) <= 10.0  # the search steps 10 m


@case
def test_profile_meets_the_e_layer(one):
    profile = profiles_of_layers([one])
    foe = frequency_of_density(profile.at_height(np.array([one.hme]))[0][0])
    assert abs(foe / one.foe - 1) < 1e-5
    if one.foe > 1e6:  # else the tail of F2 may hide it
        assert abs(peak_by_slope(profile, one.hme) / one.hme - 1) < 1e-5


@case
def test_densities_are_never_negative(one):
    h = np.arange(0.0, 700e3, 37.0)
    assert layered_density(h, one).min() >= 0.0
    profile = profiles_of_layers([one])
    inside = np.arange(BASE, TOP, 13.0)
    assert profile.at_height(inside)[0].min() >= 0.0


@case
def test_profile_follows_the_layers(one):
    profile = profiles_of_layers([one])
    h = np.arange(BASE + 1e3, TOP - 1e3, 61.0)
    truth = layered_density(h, one)
    # A cubic spline of 250 m: fourth order of the spacing over the thinnest layer.
    assert np.abs(profile.at_height(h)[0] - truth).max() < 2e-5 * truth.max()


def is_smooth(values):
    """No step between neighbours that stands out from the steps around it."""
    jump = np.abs(np.diff(values))
    around = np.maximum.reduce([jump[:-4], jump[1:-3], jump[3:-1], jump[4:]])
    return bool(np.all(jump[2:-2] <= 2.0 * around + 1e-6 * jump.max()))


def test_the_smoothness_check_sees_a_jump():
    x = np.linspace(0, 1, 400)
    assert is_smooth(np.sin(9 * x))
    assert not is_smooth(np.sin(9 * x) + 0.1 * (x > 0.4))


@case
def test_second_derivative_of_the_layers_is_continuous(one):
    step = 25.0
    h = np.arange(BASE, TOP, step)
    n = layered_density(h, one)
    assert is_smooth(n)
    assert is_smooth(np.diff(n))
    assert is_smooth(np.diff(n, 2))


@case
def test_second_derivative_of_the_profile_is_continuous(one):
    profile = profiles_of_layers([one])
    c = profile.polynomials[0]
    scale = np.abs(c).max()
    at_end = np.stack([c.sum(axis=1), c @ [0, 1, 2, 3], c @ [0, 0, 2, 6]])
    at_start = np.stack([c[:, 0], c[:, 1], 2 * c[:, 2]])
    assert np.abs(at_end[:, :-1] - at_start[:, 1:]).max() < 1e-13 * scale


@case
def test_gradient_against_central_differences(one):
    profile = profiles_of_layers([one])
    rng = np.random.default_rng(41)
    number = 500
    lat = np.arcsin(rng.uniform(-1, 1, number))
    lon = rng.uniform(-np.pi, np.pi, number)
    position = to_cartesian(lat, lon, rng.uniform(BASE + 1e3, TOP - 1e3, number))
    which = np.zeros(number, dtype=np.intp)
    density, gradient = profile.density(position, which)
    assert density.shape == (number,)
    step = 1.0
    for axis in range(3):
        d = np.zeros((3, 1))
        d[axis] = step
        slope = (
            profile.density(position + d, which)[0] - profile.density(position - d, which)[0]
        ) / (2 * step)
        # Rounding of a position of 6.4e6 m to 1e-9 m, times the slope, over the step.
        assert np.abs(slope - gradient[axis]).max() < 1e-6 * np.abs(gradient).max()


def test_gradient_points_up_or_down():
    profile = profiles_of_layers([layers()])
    position = to_cartesian(0.4, 1.1, np.array([100e3, 250e3, 400e3]))
    _, gradient = profile.density(position, np.zeros(3, dtype=np.intp))
    up = position / np.linalg.norm(position, axis=0)
    along = np.sum(gradient * up, axis=0)
    assert (np.sign(along) == [1, 1, -1]).all()
    assert np.abs(gradient - along * up).max() < 1e-12 * np.abs(gradient).max()


def test_profiles_side_by_side():
    both = profiles_of_layers([CASES["day"], CASES["night"]])
    h = np.array([110e3, 180e3, 250e3, 340e3])
    alone = [profiles_of_layers([CASES[name]]).at_height(h) for name in ("day", "night")]
    for i in range(2):
        assert np.array_equal(both.at_height(h, i)[0], alone[i][0])
        assert both.peak(i) == profiles_of_layers([list(CASES.values())[2 * i]]).peak()
    mixed = both.at_height(h, np.array([0, 1, 0, 1]))
    for k in range(2):
        assert np.array_equal(mixed[k], np.choose([0, 1, 0, 1], [alone[0][k], alone[1][k]]))


def test_below_the_base_and_at_a_night_valley():
    profile = profiles_of_layers([CASES["night"]])
    assert (profile.base, profile.top) == (60e3, 640e3)
    assert np.all(profile.at_height(np.array([0.0, 59e3]))[0] == 0.0)
    assert layered_density(np.array([10e3, 60e3]), CASES["night"]).max() == 0.0
    valley = profile.at_height(np.arange(115e3, 200e3, 500.0))[0]
    assert 0 <= valley.min() < density_of_frequency(0.4e6) / 2


@pytest.mark.parametrize("hmf2", [590e3, 600e3])
def test_a_peak_close_to_the_top_keeps_its_critical_frequency(hmf2):
    one = layers(fof2=20e6, hmf2=hmf2, f2_bottom=60e3)
    assert abs(critical_frequency(profiles_of_layers([one])) / 20e6 - 1) < 1e-5


def test_density_above_the_top_is_zero():
    density, slope = profiles_of_layers([CASES["thick"]]).at_height(np.array([641e3, 900e3]))
    assert np.all(density == 0.0)
    assert np.all(slope == 0.0)


@pytest.mark.parametrize(
    "one", [CASES["night"], layers(), layers(foe=1.2e6, hmf2=320e3)], ids=["night", "day", "dawn"]
)
def test_peak_of_the_e_region(one):
    density, height = profiles_of_layers([one]).e_peak()
    assert abs(density / density_of_frequency(one.foe) - 1) < 2e-5
    assert abs(height - one.hme) <= 10.0  # the search steps 10 m


def test_no_peak_of_the_e_region_where_the_density_only_rises():
    # No E layer to speak of under a thick F2.
    one = layers(foe=1e3, fof2=12e6, f2_bottom=60e3, hmf2=300e3)
    h = np.arange(96e3, 150e3, 50.0)
    assert np.all(np.diff(layered_density(h, one)) >= 0)
    assert profiles_of_layers([one]).e_peak() is None


def test_peak_of_the_e_region_under_a_dense_f_region():
    one = layers(fof2=10e6, hmf2=250e3, f2_bottom=40e3, foe=3.5e6)
    n = layered_density(np.array([105e3, 110e3, 118e3]), one)
    assert n[1] > n[0]
    assert n[1] > n[2]
    density, height = profiles_of_layers([one]).e_peak()
    assert abs(density / density_of_frequency(one.foe) - 1) < 2e-5
    assert abs(height - one.hme) <= 10.0


def test_with_values():
    one = layers(f1_share=0.5)
    assert one.with_values() == one
    typed = one.with_values(fof2=9e6, foe=2e6)
    assert (typed.fof2, typed.foe, typed.hmf2, typed.f2_bottom) == (9e6, 2e6, 280e3, 30e3)
    lifted = one.with_values(hmf2=460e3)
    assert lifted.hmf2 == 460e3
    assert abs(lifted.f2_bottom - 60e3) < 1e-6  # 360 km over 180 km above 100 km
    # The ledge: 80 km of 170 above the E peak before, so 80/170 of 350 after.
    assert abs(lifted.hmf1 - (110e3 + 80e3 * 350 / 170)) < 1e-6
    assert (lifted.fof2, lifted.foe, lifted.source) == (one.fof2, one.foe, one.source)
    assert one.hmf2 == 280e3  # the original is untouched
    profile = profiles_of_layers([lifted.with_values(fof2=5.5e6)])
    assert abs(critical_frequency(profile) / 5.5e6 - 1) < 1e-5
    assert abs(peak_by_slope(profile, 460e3) / 460e3 - 1) < 1e-5


def test_density_falls_above_a_peak_typed_low():
    # 291 km of the climatology lowered to 168: the bottom shrinks to 10.8 km, the top stays 43.5.
    one = layers(hmf2=291e3, f2_bottom=30e3, f2_top=43.5e3).with_values(hmf2=168e3)
    n = layered_density(np.arange(169e3, 400e3, 500.0), one)
    assert np.diff(n).max() < 0.0


def test_f1_ledge_adds_below_the_peak_only():
    with_ledge, without = layers(f1_share=1.0), layers(f1_share=0.0)
    h = np.arange(60e3, 600e3, 500.0)
    more = layered_density(h, with_ledge) - layered_density(h, without)
    assert more.min() >= 0.0
    assert np.all(more[(h <= 110e3) | (h >= 280e3)] == 0.0)
    at_ledge = layered_density(np.array([190e3]), with_ledge)[0]
    assert abs(frequency_of_density(at_ledge) / 4.5e6 - 1) < 1e-5
    # It never brings the density above the F2 peak, even if foF1 is typed above foF2.
    high = layers(f1_share=1.0, fof1=8e6)
    assert abs(critical_frequency(profiles_of_layers([high])) / 7e6 - 1) < 1e-5


def test_density_and_frequency():
    # N = 1.24044e10 f² [MHz], printed to 6 digits.
    assert abs(density_of_frequency(1e6) / 1.24044e10 - 1) < 5e-6
    f = np.array([0.0, 1e5, 3e6, 2e7])
    assert np.abs(frequency_of_density(density_of_frequency(f)) - f).max() < 1e-8


def test_epstein_layer():
    h = np.linspace(0, 1e6, 2001)
    z = (h - 3e5) / 4e4
    e = np.exp(-np.abs(z))  # symmetric, and without overflow
    assert np.abs(epstein(h, 3e5, 4e4) - 4 * e / (1 + e) ** 2).max() < 1e-15
    assert epstein(np.array([3e5]), 3e5, 4e4)[0] == 1.0
    # Thirty thousand thicknesses away: nothing, and no overflow on the way.
    assert np.all(epstein(np.array([0.0, 1e9]), 3e5, 10.0) < 1e-200)


def test_skew_epstein_layer():
    h = np.linspace(80e3, 160e3, 4001)
    assert np.abs(skew_epstein(h, 110e3, 6e3, 6e3) - epstein(h, 110e3, 6e3)).max() < 1e-14
    skew = skew_epstein(h, 110e3, 5e3, 9e3)
    assert abs(h[skew.argmax()] - 110e3) < 1.0
    assert abs(skew.max() - 1) < 1e-15
    # Far away the logarithm falls by 1 in a thickness.
    far = skew_epstein(np.array([50e3, 55e3, 250e3, 259e3]), 110e3, 5e3, 9e3)
    assert abs(np.log(far[1] / far[0]) - 1) < 1e-3
    assert abs(np.log(far[2] / far[3]) - 1) < 1e-3
    assert np.all(np.isfinite(skew_epstein(np.array([-1e9, 1e9]), 110e3, 5e3, 9e3)))


def test_smooth_step():
    assert smooth_step(np.array([-1.0, 0.0, 0.5, 1.0, 2.0])).tolist() == [0, 0, 0.5, 1, 1]
    x = np.linspace(0, 1, 1001)
    assert np.diff(smooth_step(x)).min() >= 0
    assert np.abs(smooth_step(x) + smooth_step(1 - x) - 1).max() < 1e-12
    # Flat to the third derivative: of fourth order at the start.
    small = np.array([1e-3, 1e-2])
    assert np.all(np.abs(smooth_step(small) / small**4 - 35) < 35 * 3 * small)


HEIGHTS = np.array([90, 100, 110, 118, 130, 160, 200, 240, 270, 300, 350, 420]) * 1e3
DENSITIES = np.array([0, 2, 11, 8, 9, 20, 30, 55, 78, 80, 50, 0]) * 1e10


@pytest.mark.parametrize("shift", [0.0, 87.0])
def test_measured_profile(shift):
    heights = HEIGHTS + shift * np.arange(HEIGHTS.size)
    profile = measured_profile(heights, DENSITIES)
    # The spline smooths by spacing²/6 times the second derivative: up to the worst kink here,
    # 9e10 and -3e10 m⁻³ over 10 and 8 km at the E peak, that is 0.15 % of the greatest density.
    at_rows = profile.at_height(heights)[0]
    assert np.abs(at_rows - DENSITIES).max() < 1.5e-3 * DENSITIES.max()
    h = np.arange(heights[0], heights[-1], 17.0)
    density = profile.at_height(h)[0]
    assert density.min() >= 0.0
    assert density.max() <= DENSITIES.max() * (1 + 1e-12)
    # Monotone between the rows, but for the smoothing over two cells about each of them.
    for low, high, a, b in zip(
        heights[:-1], heights[1:], DENSITIES[:-1], DENSITIES[1:], strict=True
    ):
        between = density[(h > low + 2 * SPACING) & (h < high - 2 * SPACING)]
        assert np.all(np.diff(between) * np.sign(b - a) >= -1e-9 * DENSITIES.max())
    # the spline comes to zero within two nodes of a quarter kilometre below the first row
    assert profile.base == heights[0] - 500.0
    # room above the last row for rays that turn close to it; the density there is zero
    assert heights[-1] + 26e3 <= profile.top
    assert np.all(profile.at_height(heights[-1] + np.array([0.6e3, 5e3, 30e3]))[0] == 0.0)
    assert abs(critical_frequency(profile) / frequency_of_density(8e11) - 1) < 1e-3


def test_measured_profile_that_ends_at_zero_leaves_no_step():
    profile = measured_profile(HEIGHTS, DENSITIES)
    outside = np.array([0.0, 50e3, 89e3, 420.3e3, 500e3, 1e6])
    # The smoothing spreads the last row's foot over one cell: less than 0.1 % of the peak.
    assert np.abs(profile.at_height(outside)[0]).max() < 1e-3 * DENSITIES.max()
    position = np.stack([EARTH_RADIUS + outside, 0 * outside, 0 * outside])
    found = profile.density(position, np.zeros(6, dtype=np.intp))[0]
    assert np.array_equal(found, profile.at_height(outside)[0])


def test_measured_profile_is_zero_outside():
    profile = measured_profile(np.array([1e5, 1.5e5, 2e5]), np.array([1e10, 1e11, 5e11]))
    assert np.all(profile.at_height(np.array([50e3, 99e3, 201e3, 300e3]))[0] == 0.0)


def test_measured_profile_that_ends_at_its_peak_keeps_its_critical_frequency():
    profile = measured_profile(HEIGHTS[:10], DENSITIES[:10])
    assert abs(critical_frequency(profile) / frequency_of_density(8e11) - 1) < 1e-3


def test_collisions_broadcast():
    assert electron_neutral(np.zeros((2, 3))).shape == (2, 3)
    assert np.ndim(electron_neutral(80e3)) == 0
    assert np.isnan(electron_neutral(np.nan))


DAY = datetime(2024, 3, 20, tzinfo=UTC)
HOURS = np.array([0.0, 6.0, 12.0, 18.0])


@pytest.fixture(scope="module")
def two_places():
    return climate(np.radians([52.0, 6.5]), np.radians([5.0, 3.4]), DAY, HOURS, 70.0)


def test_climate_shapes_and_units(two_places):
    for name in ("fof2", "foe", "fof1", "hmf2", "hmf1", "f2_bottom", "f2_top", "m3000", "f1_share"):
        values = getattr(two_places, name)
        assert values.shape == (4, 2), name
        assert np.all(np.isfinite(values)), name
    assert np.all((two_places.fof2 > 1e6) & (two_places.fof2 < 20e6))
    assert np.all((two_places.hmf2 > 200e3) & (two_places.hmf2 < 500e3))
    assert np.all((two_places.f1_share >= 0) & (two_places.f1_share <= 1))
    assert "70" in two_places.source


@pytest.mark.parametrize(
    ("flux", "fof2_mhz"),
    [(70.0, [2.48, 3.03, 5.02, 4.67]), (200.0, [5.57, 5.65, 11.34, 9.50])],
)
def test_climate_sanity(flux, fof2_mhz):
    """Regression: foF2 over 52 N 5 E on 20 March, from the same climatology called directly.

    2 per cent, for the year and for releases of the climatology.
    """
    found = climate(np.radians([52.0]), np.radians([5.0]), DAY, HOURS, flux)
    assert np.abs(found.fof2[:, 0] / 1e6 / fof2_mhz - 1).max() < 0.02


def test_climate_of_a_place_does_not_depend_on_the_batch(two_places):
    alone = climate(np.radians([6.5]), np.radians([3.4]), DAY, HOURS[2:3], 70.0)
    for name in ("fof2", "foe", "fof1", "hmf2", "hmf1", "f2_bottom", "f2_top", "m3000", "f1_share"):
        together = getattr(two_places, name)[2, 1]
        assert abs(getattr(alone, name)[0, 0] - together) <= 1e-9 * abs(together), name


def test_climate_by_day_and_night(two_places):
    night, noon = two_places.layers(0, 0), two_places.layers(2, 0)
    assert noon.foe > 2 * night.foe
    assert noon.fof2 > night.fof2
    assert night.f1_share == 0.0
    assert night.fof1 == 0.0
    for one in (night, noon):
        assert one.source == two_places.source
        profile = profiles_of_layers([one])
        assert abs(critical_frequency(profile) / one.fof2 - 1) < 1e-5
        assert one.hme < one.hmf1 < one.hmf2


def test_climate_takes_the_utc_day_of_the_instant():
    late = datetime(2024, 3, 19, 23, tzinfo=timezone(timedelta(hours=-5)))  # 04 UTC on the 20th
    arguments = np.radians([52.0]), np.radians([5.0])
    a = climate(*arguments, late, HOURS, 100.0)
    b = climate(*arguments, DAY, HOURS, 100.0)
    assert np.array_equal(a.fof2, b.fof2)


@pytest.mark.parametrize("flux", [59.9, 300.1, -1.0, np.nan, np.inf])
def test_climate_refuses_a_flux(flux):
    with pytest.raises(InputError, match="60 to 300"):
        climate(np.zeros(1), np.zeros(1), DAY, HOURS, flux)
    assert 60 <= ASSUMED_FLUX <= 300


def test_climate_leaves_logging_alone(two_places):
    assert logging.raiseExceptions is True


def test_no_f1_with_the_sun_down():
    zenith = np.array([95.0, 120.0, 180.0])
    assert np.all(f1_critical_frequency(zenith, np.array([50.0]), 100.0) == 0.0)
    north, south = (f1_critical_frequency(np.array([40.0]), np.array([d]), 50.0) for d in (30, -30))
    assert north == south
