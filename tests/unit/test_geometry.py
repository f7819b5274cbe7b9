"""Places, locators, great circles, local axes and the sun's place, at their edges."""

import math
from datetime import UTC, datetime

import numpy as np
import pytest

from magion.constants import EARTH_RADIUS
from magion.errors import InputError
from magion.geometry import (
    Place,
    azimuth_elevation,
    from_cartesian,
    great_circle,
    horizontal_direction,
    local_axes,
    locator_of,
    parse_place,
    place_of_locator,
    solar_zenith_angle,
    source_axes,
    subsolar_point,
    to_cartesian,
    travel,
)

# Stations whose locators are common knowledge of the trade.
STATIONS = [
    (48.14666, 11.60833, "JN58td"),
    (-34.91, -56.21166, "GF15vc"),
    (38.92, -77.065, "FM18lw"),
    (-41.28333, 174.745, "RE78ir"),
    (41.714775, -72.727260, "FN31pr"),
]


@pytest.mark.parametrize(("lat", "lon", "locator"), STATIONS)
def test_locators_of_known_stations(lat, lon, locator):
    assert locator_of(lat, lon) == locator
    assert locator_of(lat, lon, 4) == locator[:4]
    assert locator_of(lat, lon, 8)[:6] == locator
    assert Place(latitude_deg=lat, longitude_deg=lon).locator == locator


@pytest.mark.parametrize(
    ("locator", "lat", "lon"),
    [
        ("JN56", 46.5, 11.0),
        ("JN56qm", 46 + 12.5 * 2.5 / 60, 10 + 16.5 * 5 / 60),
        ("JN56qm34", 46 + (12 * 2.5 + 4.5 * 0.25) / 60, 10 + (16 * 5 + 3.5 * 0.5) / 60),
        ("AA00", -89.5, -179.0),
        ("AA00aa00", -90 + 0.125 / 60, -180 + 0.25 / 60),
        ("RR99", 89.5, 179.0),
        ("RR99xx", 90 - 1.25 / 60, 180 - 2.5 / 60),
    ],
)
def test_locator_means_the_centre_of_its_square(locator, lat, lon):
    for text in (locator, locator.upper(), locator.lower(), f"  {locator} "):
        found = place_of_locator(text)
        assert abs(found[0] - lat) < 1e-11
        assert abs(found[1] - lon) < 1e-11
        place = parse_place(text, "name")
        assert (place.latitude_deg, place.longitude_deg, place.name) == (*found, "name")


@pytest.mark.parametrize("signs", [4, 6, 8])
def test_locator_truncates(signs):
    # Just inside the north-east corner of JN56qm34, never JN56qm45 or beyond.
    lat = 46 + (12 * 2.5 + 5 * 0.25) / 60 - 1e-7
    lon = 10 + (16 * 5 + 4 * 0.5) / 60 - 1e-7
    assert locator_of(lat, lon, signs) == "JN56qm34"[:signs]


def test_locator_of_a_border_belongs_to_the_square_north_and_east_of_it():
    # 46°30' N and 11°20' E are borders of six-sign squares, and not whole binary numbers.
    assert locator_of(46.5, 11 + 1 / 3, 8) == "JN56qm00"
    assert locator_of(0.0, 0.0) == "JJ00aa"


@pytest.mark.parametrize(
    ("lat", "lon", "locator"),
    [(90, 180, "RR99xx"), (90, -180, "AR09ax"), (-90, 180, "RA90xa"), (-90, -180, "AA00aa")],
)
def test_locator_at_the_ends_of_the_map(lat, lon, locator):
    assert locator_of(lat, lon) == locator


@pytest.mark.parametrize(
    "text",
    ["1234", "ZZ00", "JN5", "JN", "JN56q", "JN56yz", "JN56qm3", "JN56qm345", "SA00", "", "J N56"],
)
def test_what_is_no_locator(text):
    with pytest.raises(InputError, match="is not a locator"):
        place_of_locator(text)
    with pytest.raises(InputError, match="is not a place"):
        parse_place(text)


@pytest.mark.parametrize(
    ("text", "lat", "lon"),
    [
        ("41.0S,71.3W", -41.0, -71.3),
        ("41.0s , 71.3w", -41.0, -71.3),
        ("-41,-71.3", -41.0, -71.3),
        ("\N{MINUS SIGN}41,\N{MINUS SIGN}71.3", -41.0, -71.3),
        ("+46.50,+11.35", 46.5, 11.35),
        ("46.50N, 11.35E", 46.5, 11.35),
        ("46°N,11°E", 46.0, 11.0),
        ("46.,.5", 46.0, 0.5),
        ("90,180", 90.0, 180.0),
        ("-90,-180", -90.0, -180.0),
        ("0,0", 0.0, 0.0),
    ],
)
def test_coordinates(text, lat, lon):
    place = parse_place(text)
    assert (place.latitude_deg, place.longitude_deg) == (lat, lon)
    assert place.latitude == math.radians(lat)
    assert place.longitude == math.radians(lon)


@pytest.mark.parametrize(
    "text",
    [
        "91,0",
        "-90.01,0",
        "0,180.5",
        "0,-181",
        "91N,0E",
        "nan,0",
        "0,nan",
        "inf,0",
        "0,-inf",
        "1e1,0",
        "-41S,71W",
        "41W,71S",
        "N41,E7",
        "41",
        "41 7",
        "1,2,3",
        ",",
        "41,",
        "Vienna",
        "4l.0,7",
        "41;7",
        "9" * 400 + ",0",
    ],
)
def test_nonsense_is_refused_in_one_line(text):
    with pytest.raises(InputError) as caught:
        parse_place(text)
    message = str(caught.value)
    assert text in message
    assert "\n" not in message
    assert "LAT,LON" in message or "degrees" in message


def test_message_of_a_place_is_one_line_whatever_was_typed():
    with pytest.raises(InputError) as caught:
        parse_place("41\n,7 or\nso")
    assert "\n" not in str(caught.value)


def test_message_of_a_latitude_just_beyond_the_pole_names_it():
    with pytest.raises(InputError, match=r"latitude 90\.0000001 "):
        Place(latitude_deg=90.0000001, longitude_deg=0.0)


@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf, 90.1, -90.1])
def test_place_refuses_a_latitude(bad):
    with pytest.raises(InputError, match="latitude"):
        Place(latitude_deg=bad, longitude_deg=0.0)


@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf, 180.1, -180.1])
def test_place_refuses_a_longitude(bad):
    with pytest.raises(InputError, match="longitude"):
        Place(latitude_deg=0.0, longitude_deg=bad)


def test_place_is_frozen():
    place = Place(latitude_deg=1.0, longitude_deg=2.0)
    with pytest.raises(AttributeError):
        place.latitude_deg = 3.0


def test_great_circle_of_simple_paths():
    quarter = np.pi / 2
    cases = [
        ((0, 0, 0, quarter), quarter, quarter),  # east along the equator
        ((0, 0, 0, -quarter), quarter, 3 * quarter),  # west
        ((0, 0, quarter, 0), quarter, 0.0),  # north to the pole
        ((0, 0, -quarter, 0), quarter, np.pi),  # south to the pole
        ((0.5, 0.2, 0.5, 0.2 + np.pi), np.pi - 1.0, 0.0),  # over the pole
    ]
    for ends, angle, bearing in cases:
        found = great_circle(*ends)
        assert abs(found[0] - angle) < 1e-15
        assert abs((found[1] - bearing + np.pi) % (2 * np.pi) - np.pi) < 1e-15


def test_great_circle_of_equal_and_opposite_places():
    angle, bearing = great_circle(0.5, 1.0, 0.5, 1.0)
    assert angle == 0.0
    assert bearing == 0.0
    angle, _ = great_circle(0.5, 1.0, -0.5, 1.0 - np.pi)
    assert abs(angle - np.pi) < 1e-15


def test_great_circle_of_near_places_keeps_its_digits():
    # One millimetre, by the flat Earth.
    step = 1e-3 / EARTH_RADIUS
    angle, bearing = great_circle(0.7, 0.3, 0.7 + step, 0.3 + step / np.cos(0.7))
    assert abs(angle * EARTH_RADIUS - math.sqrt(2) * 1e-3) < 1e-9
    # The difference of two longitudes near 0.3 is itself good to 4e-7 of this step.
    assert abs(bearing - np.pi / 4) < 1e-6


def test_bearing_due_north_is_not_a_full_turn():
    _, bearing = great_circle(0.5, 1.0, np.pi / 2, 0.0)
    assert 0.0 <= bearing < 2 * np.pi


def test_bearing_between_equal_places_on_the_date_line():
    _, bearing = great_circle(0.5, np.pi, 0.5, -np.pi)
    assert bearing == 0.0


def test_great_circle_broadcasts_and_passes_nan():
    angle, bearing = great_circle(0.1, 0.2, np.array([0.3, np.nan, 0.5]), np.zeros((2, 1)))
    assert angle.shape == bearing.shape == (2, 3)
    assert np.isnan(angle).tolist() == [[False, True, False]] * 2
    assert np.ndim(great_circle(0.1, 0.2, 0.3, 0.4)[0]) == 0


def test_travel_over_the_pole_and_across_the_date_line():
    lat, lon = travel(np.radians(80), 0.0, 0.0, np.radians(20))
    assert abs(np.degrees(lat) - 80) < 1e-12
    assert abs(abs(np.degrees(lon)) - 180) < 1e-12
    lat, lon = travel(0.0, np.radians(179), np.pi / 2, np.radians(2))
    assert abs(lat) < 1e-15
    assert abs(np.degrees(lon) + 179) < 1e-12
    lat, lon = travel(np.pi / 2, 0.4, np.pi, 0.3)  # from the pole, "south"
    assert abs(lat - (np.pi / 2 - 0.3)) < 1e-15
    assert abs(lon - 0.4) < 1e-15


@pytest.mark.parametrize("lat", [-np.pi / 2, -0.7, 0.0, 1.2, np.pi / 2])
@pytest.mark.parametrize("lon", [-np.pi, 0.3, 2.9])
def test_local_axes_are_right_handed(lat, lon):
    east, north, up = local_axes(lat, lon)
    frame = np.stack([east, north, up])
    assert np.abs(frame @ frame.T - np.eye(3)).max() < 1e-15
    assert np.abs(np.cross(east, north) - up).max() < 1e-15
    # Moving in longitude goes east, in latitude north, in height up.
    h = 1e-6
    position = to_cartesian(lat, lon, 0.0)
    for axis, moved, scale in [
        (north, to_cartesian(lat + h, lon, 0.0), EARTH_RADIUS * h),
        (up, to_cartesian(lat, lon, 100.0), 100.0),
    ]:
        assert np.abs((moved - position) / scale - axis).max() < 2e-6


def test_cartesian_axes_and_heights():
    assert np.abs(to_cartesian(0.0, 0.0, 0.0) - [EARTH_RADIUS, 0, 0]).max() < 1e-6
    assert np.abs(to_cartesian(0.0, np.pi / 2, 1e5) - [0, EARTH_RADIUS + 1e5, 0]).max() < 1e-6
    assert np.abs(to_cartesian(np.pi / 2, 1.0, 0.0) - [0, 0, EARTH_RADIUS]).max() < 1e-6
    lat, lon, height = from_cartesian(np.array([0.0, 0.0, -EARTH_RADIUS - 7.0]))
    assert (lat, lon) == (-np.pi / 2, 0.0)
    assert abs(height - 7.0) < 1e-8


def test_directions():
    lat, lon = 0.8, -1.1
    east, north, up = local_axes(lat, lon)
    for azimuth, elevation, axis in [
        (0.0, 0.0, north),
        (np.pi / 2, 0.0, east),
        (np.pi, 0.0, -north),
        (1.0, np.pi / 2, up),
    ]:
        assert np.abs(horizontal_direction(azimuth, elevation, lat, lon) - axis).max() < 1e-15
    azimuth = np.radians(np.arange(1.0, 360.0, 13.0))
    elevation = np.radians(np.linspace(-80.0, 80.0, azimuth.size))
    back = azimuth_elevation(7.5 * horizontal_direction(azimuth, elevation, lat, lon), lat, lon)
    assert np.abs(back[0] - azimuth).max() < 1e-13
    assert np.abs(back[1] - elevation).max() < 1e-13


@pytest.mark.parametrize(
    ("azimuth_deg", "elevation_deg", "h", "v"),
    [
        (0.0, 0.0, (1.0, 0.0, 0.0), (0.0, 0.0, 1.0)),  # a source in the north: h is east
        (90.0, 0.0, (0.0, -1.0, 0.0), (0.0, 0.0, 1.0)),  # in the east: h is south
        (0.0, 90.0, (1.0, 0.0, 0.0), (0.0, -1.0, 0.0)),  # overhead
        (180.0, 45.0, (-1.0, 0.0, 0.0), (0.0, math.sqrt(0.5), math.sqrt(0.5))),
    ],
)
def test_transverse_axes_of_a_source(azimuth_deg, elevation_deg, h, v):
    found = source_axes(math.radians(azimuth_deg), math.radians(elevation_deg))
    assert np.allclose(found, [h, v], atol=1e-15)


def test_transverse_axes_and_the_travel_are_right_handed():
    rng = np.random.default_rng(8)
    azimuth, elevation = rng.uniform(0.0, 6.3, 50), rng.uniform(-1.5, 1.5, 50)
    h, v = source_axes(azimuth, elevation)
    flat = np.cos(elevation)
    source = np.array([flat * np.sin(azimuth), flat * np.cos(azimuth), np.sin(elevation)])
    assert np.allclose(np.cross(h, v, axis=0), -source, atol=1e-14)  # an arriving wave's travel
    assert np.allclose(h[2], 0.0)
    # h points to where the source goes as its azimuth grows
    step = 1e-6
    grown = np.array([np.sin(azimuth + step), np.cos(azimuth + step)])
    assert (h[0] * (grown[0] - np.sin(azimuth)) + h[1] * (grown[1] - np.cos(azimuth)) > 0).all()
    assert (v[2] >= 0.0).all()


def test_sun_at_equinoxes_and_solstices():
    # Instants to the minute from the almanacs; the declination is 0 or the obliquity.
    for when, declination_deg in [
        (datetime(2024, 3, 20, 3, 6, tzinfo=UTC), 0.0),
        (datetime(2024, 9, 22, 12, 44, tzinfo=UTC), 0.0),
        (datetime(2024, 6, 20, 20, 51, tzinfo=UTC), 23.436),
        (datetime(2024, 12, 21, 9, 20, tzinfo=UTC), -23.436),
    ]:
        lat, _ = subsolar_point(when)
        assert abs(np.degrees(lat) - declination_deg) < 0.01  # what the formulas claim


def test_sun_by_the_equation_of_time():
    # 3 November: the sun is 16.4 minutes ahead of the clock, the most of the year.
    _, lon = subsolar_point(datetime(2024, 11, 3, 12, tzinfo=UTC))
    assert abs(np.degrees(lon) + 16.4 / 4) < 0.03  # 0.1 minute
    when = datetime(2024, 11, 3, 12, tzinfo=UTC)
    lat, lon = subsolar_point(when)
    assert abs(solar_zenith_angle(when, lat, lon)) < 1e-12
    assert abs(solar_zenith_angle(when, -lat, lon + np.pi) - np.pi) < 1e-12
