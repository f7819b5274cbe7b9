"""The field model at its edges, and the fit along a path."""

import math
from datetime import UTC, datetime, timedelta, timezone

import numpy as np
import pytest
from scipy import constants

from magion.constants import (
    EARTH_RADIUS,
    GYROFREQUENCY_PER_TESLA,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
    SPEED_OF_LIGHT,
)
from magion.errors import OutsideModelError
from magion.field import (
    declination,
    dip,
    field_at,
    fit_field,
    flux_density,
    gyrofrequency,
    require_date,
)
from magion.geometry import (
    from_cartesian,
    great_circle,
    horizontal_direction,
    local_axes,
    to_cartesian,
    travel,
)

WHEN = datetime(2025, 1, 1, tzinfo=UTC)


def test_constants_from_the_charge_and_the_mass():
    e, m, eps = constants.e, constants.m_e, constants.epsilon_0
    assert constants.c == SPEED_OF_LIGHT
    # Half the last printed digit of each.
    assert abs(GYROFREQUENCY_PER_TESLA - e / (2 * np.pi * m)) < 5e3
    assert abs(PLASMA_FREQUENCY_SQUARED_PER_DENSITY - e**2 / (4 * np.pi**2 * eps * m)) < 5e-5
    assert abs(gyrofrequency(50e-6) - e * 50e-6 / (2 * np.pi * m)) < 1.0


@pytest.mark.parametrize(
    "when",
    [
        datetime(1900, 1, 1),
        datetime(1900, 1, 1, tzinfo=UTC),
        datetime(2030, 1, 1),
        datetime(1899, 12, 31, 23, tzinfo=timezone(timedelta(hours=-3))),
        datetime(2030, 1, 1, 2, tzinfo=timezone(timedelta(hours=3))),
    ],
)
def test_dates_within_the_model(when):
    assert require_date(when).tzinfo is UTC
    assert np.all(np.isfinite(field_at(0.3, 0.4, 0.0, when)))


@pytest.mark.parametrize(
    "when",
    [
        datetime(1899, 12, 31, 23, 59, 59),
        datetime(1900, 1, 1, 1, tzinfo=timezone(timedelta(hours=3))),
        datetime(2030, 1, 1, 0, 0, 1),
        datetime(2030, 1, 1, tzinfo=timezone(timedelta(hours=-1))),
        datetime(1, 1, 1),
        datetime(9999, 12, 31),
    ],
)
def test_dates_outside_the_model(when, capsys):
    calls = (
        require_date,
        lambda w: field_at(0.3, 0.4, 0.0, w),
        lambda w: fit_field(0.0, 0.0, 0.0, 0.0, w),
    )
    for call in calls:
        with pytest.raises(OutsideModelError, match="1900-01-01 to 2030-01-01"):
            call(when)
    assert capsys.readouterr().out == ""


@pytest.mark.parametrize("pole", [np.pi / 2, -np.pi / 2])
def test_the_field_at_a_pole_does_not_depend_on_the_longitude(pole):
    lon = np.radians([-180.0, -50.0, 0.0, 77.0, 180.0])
    b = field_at(pole, lon, 100e3, WHEN)
    east, north, up = local_axes(pole, lon)
    vectors = east * b[0] + north * b[1] + up * b[2]
    assert np.ptp(vectors, axis=1).max() < 1e-12
    # And it is the field next to the pole, to the metre or so between.
    near = field_at(pole * (1 - 1e-6), lon, 100e3, WHEN)
    assert np.abs(near - b).max() < 1e-9


def test_latitude_beyond_the_pole():
    with pytest.raises(OutsideModelError, match="-90 to 90"):
        field_at(np.radians(91.0), 0.0, 0.0, WHEN)


def test_longitude_wraps():
    lon = np.array([-180.0, 181.0, 350.0])
    turned = field_at(0.5, np.radians(lon + 360.0), 0.0, WHEN)
    assert np.abs(turned - field_at(0.5, np.radians(lon), 0.0, WHEN)).max() < 1e-15


def test_shapes_and_nan():
    assert field_at(0.1, 0.2, 0.0, WHEN).shape == (3,)
    b = field_at(np.array([[0.1], [np.nan]]), np.array([0.0, 0.5, 1.0]), 0.0, WHEN)
    assert b.shape == (3, 2, 3)
    assert np.isfinite(b[:, 0]).all()
    assert np.isnan(b[:, 1]).all()
    for place in [(np.nan, 0.0, 0.0), (0.0, np.nan, 0.0), (0.0, 0.0, np.nan)]:
        assert np.isnan(field_at(*place, WHEN)).all()


def test_points_of_a_batch_do_not_depend_on_each_other():
    lat, lon, h = np.radians([10.0, -70.0]), np.radians([20.0, 130.0]), np.array([0.0, 3e5])
    together = field_at(lat, lon, h, WHEN)
    for i in range(2):
        alone = field_at(lat[i], lon[i], h[i], WHEN)
        assert np.abs(alone - together[:, i]).max() < 1e-15


@pytest.mark.parametrize(
    ("field", "dip_deg", "declination_deg", "magnitude"),
    [
        ((0.0, 3.0, -4.0), math.degrees(math.atan2(4, 3)), 0.0, 5.0),
        ((0.0, 3.0, 4.0), -math.degrees(math.atan2(4, 3)), 0.0, 5.0),
        ((1.0, 0.0, 0.0), 0.0, 90.0, 1.0),
        ((-1.0, -1.0, 0.0), 0.0, -135.0, math.sqrt(2)),  # south of west, no folding
        ((0.0, 0.0, -2.0), 90.0, 0.0, 2.0),
    ],
)
def test_angles_of_a_field(field, dip_deg, declination_deg, magnitude):
    b = np.array(field)
    assert abs(np.degrees(dip(b)) - dip_deg) < 1e-12
    assert abs(np.degrees(declination(b)) - declination_deg) < 1e-12
    assert abs(flux_density(b) - magnitude) < 1e-15


PATHS = {
    "of zero length": (52.0, 5.0, 52.0, 5.0),
    "of 300 km": (52.0, 5.0, 50.0, 8.0),
    "over the pole": (80.0, 0.0, 78.0, 175.0),
    "from the pole": (90.0, 0.0, 75.0, 30.0),
    "over the south pole": (-75.0, 30.0, -80.0, -160.0),
    "across the date line": (10.0, 175.0, -10.0, -170.0),
    "on the date line": (40.0, 180.0, 50.0, -180.0),
    "of 12,000 km": (52.0, 5.0, -35.0, -60.0),
}


@pytest.fixture(scope="module", params=PATHS, ids=lambda name: name.replace(" ", "-"))
def path_and_fit(request):
    ends = np.radians(PATHS[request.param])
    return ends, fit_field(*(float(v) for v in ends), WHEN)


def along_path(ends, number, seed, share=1.0):
    """Random positions [m] around a path, to `share` of 400 km beyond it and 0 to 600 km high."""
    angle, bearing = great_circle(*ends)
    mid_lat, mid_lon = travel(*ends[:2], bearing, angle / 2)
    back = great_circle(mid_lat, mid_lon, *ends[:2])[1] if angle > 0 else bearing + np.pi
    middle = to_cartesian(mid_lat, mid_lon, 0.0) / EARTH_RADIUS
    along = -horizontal_direction(back, 0.0, mid_lat, mid_lon)
    across = np.cross(middle, along)
    rng = np.random.default_rng(seed)
    margin = share * 400e3 / EARTH_RADIUS
    u, v = rng.uniform(-1, 1, (2, number)) * [[angle / 2 + margin], [margin]]
    height = 300e3 + share * rng.uniform(-300e3, 300e3, number)
    direction = (
        np.cos(v) * np.cos(u) * middle[:, None]
        + np.cos(v) * np.sin(u) * along[:, None]
        + np.sin(v) * across[:, None]
    )
    return direction * (EARTH_RADIUS + height)


def model(position):
    lat, lon, h = from_cartesian(position)
    east, north, up = local_axes(lat, lon)
    b = field_at(lat, lon, h, WHEN)
    return east * b[0] + north * b[1] + up * b[2]


def test_fit_meets_the_model(path_and_fit):
    ends, fit = path_and_fit
    position = along_path(ends, 1500, 3)
    worst = np.linalg.norm(fit.at(position)[0] - model(position), axis=0).max()
    assert fit.residual <= 5e-9
    assert worst <= 5e-9
    assert fit.model == "IGRF-14"


def test_fit_is_made_of_the_path(path_and_fit):
    ends, fit = path_and_fit
    assert np.abs(fit.axes @ fit.axes.T - np.eye(3)).max() < 1e-12
    angle, _ = great_circle(*ends)
    for lat, lon in (ends[:2], ends[2:]):
        c, t, n = fit.axes @ to_cartesian(lat, lon, 0.0) / EARTH_RADIUS
        assert abs(n) < 1e-12  # both ends lie on the path's own great circle
        assert abs(abs(np.arctan2(t, c)) - angle / 2) < 1e-12


def test_gradient_of_the_fit_against_central_differences(path_and_fit):
    ends, fit = path_and_fit
    position = along_path(ends, 300, 4, share=0.95)  # both neighbours inside the box
    _, gradient = fit.at(position)
    step = 200.0
    for axis in range(3):
        d = np.zeros((3, 1))
        d[axis] = step
        slope = (fit.at(position + d)[0] - fit.at(position - d)[0]) / (2 * step)
        # Of the order of 2e-11 T/m; rounding of B over the step leaves 1e-16.
        assert np.abs(gradient[:, axis] - slope).max() < 1e-15


def test_gradient_of_the_fit_against_the_model(path_and_fit):
    ends, fit = path_and_fit
    position = along_path(ends, 150, 5, share=0.8)
    _, gradient = fit.at(position)
    step = 2000.0
    for axis in range(3):
        d = np.zeros((3, 1))
        d[axis] = step
        slope = (model(position + d) - model(position - d)) / (2 * step)
        # 5 nT over a tenth of the height of the box, against some 20 nT/km of B itself.
        assert np.abs(gradient[:, axis] - slope).max() < 5e-9 / 60e3


def test_outside_its_box_the_fit_holds_the_nearest_value(path_and_fit):
    _, fit = path_and_fit
    middle = fit.axes[0]
    top = (EARTH_RADIUS + fit.high[2]) * middle[:, None]
    above = (EARTH_RADIUS + 900e3) * middle[:, None]
    below = (EARTH_RADIUS - 5e3) * middle[:, None]
    ground = EARTH_RADIUS * middle[:, None]
    for outside, edge in ((above, top), (below, ground)):
        b, gradient = fit.at(outside)
        assert np.abs(b - fit.at(edge)[0]).max() < 1e-15
        assert np.abs(gradient[:, :, 0] @ middle).max() < 1e-22  # flat along the height


def test_top_is_the_one_asked_for():
    fit = fit_field(0.1, 0.2, 0.3, 0.2, WHEN, margin=150e3, top=400e3)
    position = to_cartesian(0.2, 0.2, np.array([390e3, 400e3, 401e3, 450e3]))
    b, _ = fit.at(position)
    assert np.abs(b[:, 0] - b[:, 1]).max() > 50e-9
    assert np.abs(b[:, 1:] - b[:, 1:2]).max() < 1e-15


def test_any_path_of_12000_km_can_be_fitted():
    fit = fit_field(*np.radians([-58.3, 7.1, 47.8, 31.1]).tolist(), WHEN)
    assert fit.residual <= 5e-9


def test_half_the_earth_can_be_fitted():
    fit = fit_field(0.0, 0.0, 0.0, math.pi, WHEN)
    assert fit.residual <= 5e-9
