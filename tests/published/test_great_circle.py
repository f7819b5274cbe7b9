"""Great circles against geodesics.

Source
------
C. F. F. Karney, "Algorithms for geodesics", Journal of Geodesy 87, 43, 2013,
doi 10.1007/s00190-012-0578-z, through its reference implementation
geographiclib.

Kind: reference library. On a sphere of 6371 km the two must agree to rounding.
On the WGS 84 ellipsoid the differences are the price of the sphere. Worst
measured over 1500 random paths in each range of distance:

    km               distance   bearing   midpoint
    50 to 500          0.56 %    0.19°     0.05 km
    500 to 2000        0.56 %    0.19°     0.8 km
    2000 to 4000       0.54 %    0.19°     3.0 km
    4000 to 8000       0.52 %    0.19°    10.7 km
    8000 to 12,000     0.43 %    0.19°    20.7 km
    12,000 to 18,000   0.30 %    0.74°    88 km

A distance cannot be off by more than 0.561 % (the meridian's radius at the
equator, 6335.4 km) as long as the path is short.
"""

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic

from magion.constants import EARTH_RADIUS
from magion.geometry import great_circle, travel
from tests.proof import proves

DISTANCE = proves(
    "distance on a sphere",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=1e-12,
    unit="relative",
)
BEARING = proves(
    "bearing on a sphere",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=1e-9,
    unit="deg",
    scale=100.0,
)
MIDPOINT = proves(
    "midpoint on a sphere",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=1e-5,
    unit="m",
    scale=6e6,
)
WGS_DISTANCE = proves(
    "distance against the ellipsoid (price of the sphere)",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=0.0057,
    unit="relative",
)
WGS_BEARING = proves(
    "bearing against the ellipsoid",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=0.80,
    unit="deg",
)
WGS_MIDPOINT = proves(
    "midpoint against the ellipsoid",
    layer="geometry",
    kind="reference library",
    source="Karney 2013 (geographiclib)",
    tolerance=95.0,
    unit="km",
)

SPHERE = Geodesic(EARTH_RADIUS, 0.0)


def paths(number, seed, shortest_km=50, longest_km=15_000):
    """Ends [deg] of random paths, uniform over the sphere and in distance."""
    rng = np.random.default_rng(seed)
    for _ in range(number):
        lat = np.degrees(np.arcsin(rng.uniform(-1, 1)))
        lon, azimuth = rng.uniform(-180, 180, 2)
        distance = rng.uniform(shortest_km, longest_km) * 1e3
        end = SPHERE.Direct(lat, lon, azimuth, distance)
        yield lat, lon, end["lat2"], end["lon2"]


def ours(ends):
    lat_1, lon_1, lat_2, lon_2 = np.radians(ends)
    angle, bearing = great_circle(lat_1, lon_1, lat_2, lon_2)
    middle = travel(lat_1, lon_1, bearing, angle / 2)
    return float(angle) * EARTH_RADIUS, float(np.degrees(bearing)), np.degrees(middle)


def turn(degrees):
    return abs((degrees + 180) % 360 - 180)


def deviations(geodesic, ends):
    """Relative distance, bearing [deg] and midpoint [m] between the library and us."""
    distance, bearing, (mid_lat, mid_lon) = ours(ends)
    true = geodesic.Inverse(*ends)
    half = geodesic.Direct(ends[0], ends[1], true["azi1"], true["s12"] / 2)
    apart = geodesic.Inverse(mid_lat, mid_lon, half["lat2"], half["lon2"])["s12"]
    return abs(distance / true["s12"] - 1), turn(bearing - true["azi1"]), apart


def test_on_a_sphere():
    worst = np.max([deviations(SPHERE, ends) for ends in paths(300, 1)], axis=0)
    DISTANCE.off(worst[0])
    BEARING.off(worst[1])
    MIDPOINT.off(worst[2])


@pytest.mark.parametrize(
    ("shortest_km", "longest_km", "distance", "bearing_deg", "midpoint_km"),
    [
        (50, 500, 0.0057, 0.20, 0.06),
        (500, 2000, 0.0057, 0.20, 0.9),
        (2000, 4000, 0.0056, 0.20, 3.2),
        (4000, 8000, 0.0054, 0.20, 11.5),
        (8000, 12_000, 0.0045, 0.20, 22.0),
        (12_000, 18_000, 0.0032, 0.80, 95.0),
    ],
)
def test_against_the_ellipsoid(shortest_km, longest_km, distance, bearing_deg, midpoint_km):
    """The limits are the measured worst of the module's text with a few per cent of room."""
    found = [deviations(Geodesic.WGS84, ends) for ends in paths(300, 2, shortest_km, longest_km)]
    worst = np.max(found, axis=0)
    WGS_DISTANCE.off(worst[0], distance)
    WGS_BEARING.off(worst[1], bearing_deg)
    WGS_MIDPOINT.off(worst[2] / 1e3, midpoint_km)


@pytest.mark.parametrize(
    "ends",
    [
        (10.0, 179.0, -10.0, -179.0),  # across the date line
        (80.0, 10.0, 80.0, -170.0),  # over the pole
        (90.0, 0.0, 35.0, 20.0),  # from the pole
        (0.0, 0.0, 0.0, 90.0),  # along the equator
        (-33.9, 18.4, -33.9, 18.4001),  # nine metres
    ],
)
def test_special_paths_on_a_sphere(ends):
    distance, bearing, _ = ours(ends)
    true = SPHERE.Inverse(*ends)
    assert abs(distance - true["s12"]) < 1e-6
    assert turn(bearing - true["azi1"]) < 1e-8
