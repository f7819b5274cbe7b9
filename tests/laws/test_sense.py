"""The table of a station against whole paths, a second way to its geometry, and on its edges.

The table follows straight lines from the receiver; a path's ray bends. So every ray that comes down
at random places is looked up in the table's own terms: its direction and limiting height go into
:func:`magion.answers.sight.arriving_shapes`, and its elevation into the whole table. What may
differ, and by how much:

- **The wave normal.** Where the hand is set the plasma is thin and not empty. By Bouguer's rule,
  n r cos(elevation) is the same all along a ray, so there it is flatter than the line by what n
  asks; with n = 1 - X/2, and half as much again because the other wave's n departs further (by
  1/(1 - Y)). A twentieth of a degree is left for tilts.
- **The shape.** X > 0 multiplies G = Y sin² theta / (2 cos theta) by 1/(1 - X), and theta moves by
  the above: together they bound the axial ratio. Near theta = 90 degrees both are much of it.
- **The axis** on the ground turns by the wave normal's change, over the sines of elevation and
  theta.
- **The height.** The table takes the ionosphere over the receiver, the ray that of its way.

Printed figures are rows of the project's list of checks (kind: derived, unless said otherwise).
"""

import math
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest
from scipy.optimize import brentq

from magion.answers.inputs import IonosphereInput
from magion.answers.reception import AtAntenna, choice, position_for, positions_on_path, relay_at
from magion.answers.scene import scene_of
from magion.answers.sense import BEARINGS_DEG, answer_station
from magion.answers.sight import arriving_shapes, limiting_heights
from magion.antenna.response import IncidentWave
from magion.constants import (
    EARTH_RADIUS,
    GYROFREQUENCY_PER_TESLA,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
    SPEED_OF_LIGHT,
)
from magion.field import declination, dip, field_at
from magion.geometry import Place, great_circle, parse_place, travel
from magion.ground import AVERAGE
from magion.ionosphere.collisions import collision_frequency
from magion.polarization import Hand, Shape
from magion.rays.link import link_between
from magion.waves import MODES, Mode
from tests.stations import LEFT, RIGHT, WIRES, station

WHEN = datetime(2026, 6, 21, tzinfo=UTC)
HEIGHT = 90e3
LINEAR_DB = 20.0 * math.log10(1.0 + math.sqrt(2.0))
SKY = IonosphereInput(fof2_mhz=7.0, hmf2_km=300.0)


def place_at(latitude_deg, longitude_deg):
    return Place(latitude_deg=float(latitude_deg), longitude_deg=float(longitude_deg))


def overhead_field(latitude_deg, longitude_deg, height=HEIGHT):
    """East, north, up of the field over a place [T]."""
    return field_at(math.radians(latitude_deg), math.radians(longitude_deg), height, WHEN)


def gyro(field):
    return GYROFREQUENCY_PER_TESLA * float(np.linalg.norm(field))


def latitude_where(value, longitude_deg, low, high):
    """Latitude on a meridian where a quantity of the field overhead vanishes [deg]."""
    return brentq(lambda lat: value(overhead_field(lat, longitude_deg)), low, high, xtol=1e-9)


def dip_equator(longitude_deg):
    return latitude_where(lambda b: b[2], longitude_deg, -25.0, 25.0)


def random_receivers():
    """Receivers in both hemispheres and about the dip equator, seeded."""
    rng = np.random.default_rng(11)
    for latitudes in ((35.0, 62.0), (-55.0, -30.0), None):
        longitude = float(rng.uniform(-170.0, 170.0))
        if latitudes is None:
            latitude = dip_equator(longitude) + float(rng.uniform(-5.0, 5.0))
        else:
            latitude = float(rng.uniform(*latitudes))
        spans = [(200.0, 450.0), (700.0, 1300.0)] + ([] if latitudes else [(0.0, 0.0)])
        for low, high in spans:
            night = bool(rng.integers(2))
            hour = (0.0 if night else 12.0) - longitude / 15.0
            distance = float(rng.uniform(low, high))
            near = distance < 500.0
            mhz = (3.65 if near else 5.3) if night else (5.3 if near else 10.1)
            bearing = float(rng.choice(BEARINGS_DEG))
            yield (
                place_at(round(latitude, 3), round(longitude, 3)),
                bearing,
                distance,
                mhz,
                WHEN + timedelta(hours=round(hour % 24.0, 2)),
            )


class Arrival:
    """One ray of a path, the same in the table's terms, and what may part the two."""

    def __init__(self, receiver, bearing, mhz, when, ray, table, profiles):
        self.ray = ray
        self.i = MODES.index(ray.wave)
        az, el = (math.radians(a) for a in (ray.arrival.azimuth_deg, ray.arrival.elevation_deg))
        height = ray.limiting.height_km * 1e3
        self.elevation = el
        self.shapes = arriving_shapes(receiver, az, el, height, mhz * 1e6, when)
        self.theta = math.degrees(float(self.shapes.theta))
        line = (np.array([v]) for v in (az, el, mhz * 1e6))
        self.height_km = float(limiting_heights(profiles, receiver, *line, when)[0]) / 1e3
        row = table.rows[0]
        steep = ray.arrival.elevation_deg > 89.0
        self.cell = (
            row.overhead
            if steep
            else next(
                c
                for c in row.cells
                if c.azimuth_deg == bearing and abs(c.elevation_deg - math.degrees(el)) < 1e-6
            )
        )
        self.aside = (
            90.0 - math.degrees(el)
            if steep
            else abs((ray.arrival.azimuth_deg - bearing + 180.0) % 360.0 - 180.0) * math.cos(el)
        )
        density, _ = profiles.at_height(np.array([height]))
        self.X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * float(density[0]) / (mhz * 1e6) ** 2
        cosine = math.cos(el) * EARTH_RADIUS / (EARTH_RADIUS + height)
        bent = math.acos(min(cosine / (1.0 - 0.5 * self.X), 1.0))
        self.bend = 1.5 * math.degrees(math.acos(cosine) - bent) + 0.05


@pytest.fixture(scope="session")
def arrivals(hands_of):
    found = []
    for receiver, bearing, distance, mhz, when in random_receivers():
        angle = distance * 1e3 / EARTH_RADIUS
        start = travel(receiver.latitude, receiver.longitude, math.radians(bearing), angle)
        answer = hands_of(place_at(*np.degrees(start)), receiver, mhz, when, SKY)
        rays = [r for w in answer.waves if w.arrives for r in (w, *w.rays)]
        scene = scene_of(link_between(receiver, receiver), [when], SKY)
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr("magion.answers.sense.scene_of", lambda *_, scene=scene: scene)
            table = answer_station(
                receiver,
                [mhz],
                when,
                SKY,
                elevations_deg=[min(r.arrival.elevation_deg, 89.0) for r in rays],
            )
        profiles = scene.overheads[0].profiles
        found += [Arrival(receiver, bearing, mhz, when, r, table, profiles) for r in rays]
    return found


def ratio_db(theta_deg, Y, X=0.0):
    """Axial ratio without collisions, 2.7: major/minor = sqrt(1 + G²) + |G| [dB]."""
    cosine = math.cos(math.radians(theta_deg))
    G = abs(Y * (1.0 - cosine**2) / (2.0 * (1.0 - X) * cosine))
    return 20.0 * math.log10(math.sqrt(1.0 + G * G) + G)


def turned(one, other):
    """Least angle between two axes [deg]."""
    return abs((one - other + 90.0) % 180.0 - 90.0)


# Rays of whole paths


def test_rays_are_many_and_of_every_kind(arrivals):
    assert len(arrivals) > 35
    assert {a.ray.wave for a in arrivals} == set(MODES)
    assert {a.ray.receive_hand for a in arrivals} == set(Hand)
    assert min(a.elevation for a in arrivals) < math.radians(25.0)
    angles = [a.ray.limiting.field_angle_deg for a in arrivals]
    assert min(angles) < 30.0
    assert max(angles) > 150.0
    assert min(abs(t - 90.0) for t in angles) < 10.0


def test_field_angle_of_a_ray_by_its_straight_line(arrivals):
    for a in arrivals:
        assert abs(a.theta - a.ray.limiting.field_angle_deg) < a.bend


def test_hand_of_a_ray_by_its_straight_line(arrivals):
    told = [a for a in arrivals if abs(a.theta - 90.0) > a.bend]
    assert len(told) > 0.9 * len(arrivals)
    for a in told:
        assert bool(a.shapes.right_hand[a.i]) is (a.ray.receive_hand is Hand.RIGHT)


def test_axial_ratio_of_a_ray_by_its_straight_line(arrivals):
    for a in arrivals:
        theta, Y = a.ray.limiting.field_angle_deg, float(a.shapes.Y)
        near = [theta, theta - a.bend, theta + a.bend]
        values = [ratio_db(t, Y, X) for t in near for X in (0.0, 2.0 * a.X)]
        crosses = abs(theta - 90.0) < a.bend
        # Z, up to 0.03 here, is worth less than a twentieth of a decibel.
        found = float(a.shapes.axial_ratio_db[a.i])
        assert found > min(values) - 0.05
        assert crosses or found < max(values) + 0.05


def test_major_axis_of_a_ray_by_its_straight_line(arrivals):
    for a in arrivals:
        axis = math.degrees(float(a.shapes.major_axis_bearing[a.i]))
        # the plane of wave normal and field turns most where the two lie close to one another
        across = math.sin(math.radians(a.ray.limiting.field_angle_deg))
        allowed = a.bend / (math.sin(a.elevation) * across) + 0.1
        assert turned(axis, a.ray.major_axis_bearing_deg) < allowed


def test_the_whole_table_meets_the_rays(arrivals):
    for a in arrivals:
        cell, ray = a.cell, a.ray
        # to the bearing of the column, and to another place along the line by the height
        allowed = a.bend + a.aside + 0.1
        assert abs(cell.field_angle_deg - ray.limiting.field_angle_deg) < allowed
        if abs(cell.field_angle_deg - 90.0) > allowed:
            hands = cell.ordinary_hand, cell.extraordinary_hand
            assert hands[a.i] is ray.receive_hand


def test_limiting_heights_of_the_table_are_those_of_the_rays(arrivals):
    for a in arrivals:
        apart = abs(a.height_km - a.ray.limiting.height_km)
        # Steep rays leave over the receiver. Low ones leave up to 500 km away, where the sun is
        # higher or lower: the D region and the lower E region move by a kilometre or so.
        assert apart < (0.3 if a.elevation > math.radians(40.0) else 1.5)


# Every cell by a second way to its geometry


def field_angle_another_way(place, azimuth, elevation, height):
    """Angle between waves that come down and the field, by spherical triangles [rad]."""
    azimuth, elevation, height = np.broadcast_arrays(azimuth, elevation, height)
    away = np.arccos(EARTH_RADIUS * np.cos(elevation) / (EARTH_RADIUS + height)) - elevation
    latitude, longitude = travel(place.latitude, place.longitude, azimuth, away)
    _, bearing = great_circle(latitude, longitude, place.latitude, place.longitude)
    local = elevation + away
    travels = np.stack(
        [np.cos(local) * np.sin(bearing), np.cos(local) * np.cos(bearing), -np.sin(local)]
    )
    field = field_at(latitude, longitude, height, WHEN)
    return np.arccos((travels * field).sum(axis=0) / np.sqrt((field**2).sum(axis=0)))


TABLES = [("52.0,6.0", None), ("34.0S,151.0E", None), ("12.0S,77.0W", None), ("6.5N,3.4E", 110.0)]


@pytest.fixture(scope="module", params=TABLES, ids=lambda p: p[0])
def table(request):
    text, height_km = request.param
    place = parse_place(text)
    return place, answer_station(
        place, [1.85, 3.65, 7.1, 14.1], WHEN, SKY, height_km=height_km or HEIGHT / 1e3
    )


def test_every_cell_by_spherical_triangles(table):
    place, answer = table
    for row in answer.rows:
        assert len(row.cells) == 24
        theta = field_angle_another_way(
            place,
            np.radians([c.azimuth_deg for c in row.cells]),
            np.radians([c.elevation_deg for c in row.cells]),
            np.array([c.limiting_height_km for c in row.cells]) * 1e3,
        )
        assert [c.field_angle_deg for c in row.cells] == pytest.approx(np.degrees(theta), abs=1e-6)
        # the extraordinary is right-hand where wave normal and field make an acute angle
        right = [Hand.RIGHT if t < 0.5 * math.pi else Hand.LEFT for t in theta]
        assert [c.extraordinary_hand for c in row.cells] == right
        assert [c.ordinary_hand for c in row.cells] == [h.opposite for h in right]


def test_axes_of_cells_lie_along_and_across_the_field(table):
    # Z is 0.02 at 1.85 MHz and 90 km, and turns the axes by its share of a radian at most; of
    # nearly circular waves the axis means nothing, and low ones are foreshortened.
    _, answer = table
    for row in answer.rows[1:]:
        cell = row.overhead
        if (cell.axial_ratio_db or 60.0) > 0.5:
            north = answer.declination_deg
            assert turned(cell.ordinary_axis_deg, north) < 1.0
            assert turned(cell.extraordinary_axis_deg, north + 90.0) < 1.0


def test_axial_ratio_of_cells_by_the_closed_form(table):
    _, answer = table
    for row in answer.rows[1:]:
        for cell in (row.overhead, *row.cells):
            if cell.axial_ratio_db is None or abs(cell.field_angle_deg - 90.0) < 1.0:
                continue
            # The field is weaker out there: Y overhead is good to the field's change over 350 km.
            wanted = ratio_db(cell.field_angle_deg, row.gyro_ratio)
            weaker = ratio_db(cell.field_angle_deg, 0.85 * row.gyro_ratio)
            stronger = ratio_db(cell.field_angle_deg, 1.15 * row.gyro_ratio)
            assert weaker - 0.05 < cell.axial_ratio_db < stronger + 0.05
            if cell is row.overhead:
                assert cell.axial_ratio_db == pytest.approx(wanted, abs=0.02)
            limit = 3.0 if cell.axial_ratio_db <= 3.0 else LINEAR_DB
            kind = {3.0: Shape.CIRCULAR}.get(
                limit, Shape.ELLIPTICAL if cell.axial_ratio_db <= LINEAR_DB else Shape.LINEAR
            )
            assert cell.shape is kind


# Where the hand turns over, and where a wire beats circular


@pytest.fixture
def level_field(monkeypatch):
    """A field with one dip, declination 0 and strength wherever it is asked for."""

    def put(dip_deg, gyrofrequency):
        total = gyrofrequency / GYROFREQUENCY_PER_TESLA
        angle = math.radians(dip_deg)

        def field(latitude, longitude, height, when):
            shape = np.broadcast_shapes(*(np.shape(v) for v in (latitude, longitude, height)))
            one = np.ones(shape)
            return np.stack(
                [0.0 * one, total * math.cos(angle) * one, -total * math.sin(angle) * one]
            )

        monkeypatch.setattr("magion.answers.sight.field_at", field)

    return put


ROWS_2_4 = [
    (67.0, 15.0, 180.0, -0.1392, Hand.RIGHT),
    (67.0, 15.0, 0.0, +0.6157, Hand.LEFT),
    (67.0, 15.0, 90.0, +0.2382, Hand.LEFT),
    (67.0, 30.0, 180.0, +0.1219, Hand.LEFT),
    (60.0, 20.0, 180.0, -0.1736, Hand.RIGHT),
    (30.0, 20.0, 180.0, -0.6428, Hand.RIGHT),
    (30.0, 70.0, 180.0, +0.1736, Hand.LEFT),
    (-60.0, 20.0, 0.0, +0.1736, Hand.LEFT),
]


@pytest.mark.parametrize(("dip_deg", "local_deg", "travel_deg", "cosine", "hand"), ROWS_2_4)
def test_hand_by_the_angle_where_the_wave_leaves(
    level_field, dip_deg, local_deg, travel_deg, cosine, hand
):
    # row 2.4: the elevation is that at the limiting place; at the equator bearings stay
    level_field(dip_deg, 1.25e6)
    local = math.radians(local_deg)
    elevation = math.acos((EARTH_RADIUS + HEIGHT) / EARTH_RADIUS * math.cos(local))
    source = math.radians(travel_deg + 180.0)
    shapes = arriving_shapes(place_at(0.0, 0.0), source, elevation, HEIGHT, 3.65e6, WHEN)
    # The list writes +, in its own convention for a wave that comes down, where k·B is positive.
    assert math.cos(float(shapes.theta)) == pytest.approx(cosine, abs=5e-5)
    assert bool(shapes.right_hand[0]) is (hand is Hand.RIGHT)
    assert bool(shapes.right_hand[1]) is (hand is Hand.LEFT)


@pytest.mark.parametrize("text", ["52.0,6.0", "34.0,118.0W", "34.0S,151.0E", "41.0S,71.3W"])
def test_flat_geometry_turns_the_hand_at_the_complement_of_the_dip(text):
    # a metre up the Earth is flat and the field that of the place
    place = parse_place(text)
    field = overhead_field(place.latitude_deg, place.longitude_deg, 1.0)
    side = float(declination(field)) + (0.0 if float(dip(field)) > 0.0 else math.pi)
    turn = 0.5 * math.pi - abs(float(dip(field)))
    for offset in (-0.02, 0.02):
        elevation = turn + math.radians(offset)
        shapes = arriving_shapes(place, side, elevation, 1.0, 7e6, WHEN)
        off = math.degrees(float(shapes.theta)) - 90.0
        assert off == pytest.approx(-math.copysign(offset, offset * float(dip(field))), abs=1e-3)
        assert bool(shapes.right_hand[0]) is (off > 0.0) is not bool(shapes.right_hand[1])


@pytest.mark.parametrize("text", ["52.0,6.0", "34.0,118.0W", "34.0S,151.0E"])
def test_elevation_at_which_the_hand_turns_over(text):
    # Over 90 km the line leaves to the side: there it comes down steeper by the angle of arc, and
    # the dip is another. The table's own grid is a quarter of a degree, interpolated.
    place = parse_place(text)
    answer = answer_station(place, [7.1], WHEN, SKY, height_km=HEIGHT / 1e3)
    side = answer.declination_deg + (0.0 if answer.dip_deg > 0.0 else 180.0)
    assert answer.turns_toward_deg == pytest.approx(side % 360.0)

    grid = np.arange(0.0, 80.0, 0.02)
    theta = field_angle_another_way(place, math.radians(side), np.radians(grid), HEIGHT)
    (turn,) = grid[1:][np.diff(theta > 0.5 * math.pi)]
    assert answer.turns_below_deg == pytest.approx(turn, abs=0.03)
    # below the flat rule: the arc makes it 2 to 5 degrees steeper there, the dip grows
    assert 0.5 < 90.0 - abs(answer.dip_deg) - answer.turns_below_deg < 8.0


@pytest.mark.parametrize("text", ["52.0,6.0", "12.0S,77.0W", "6.5N,3.4E", "34.0S,151.0E"])
def test_elevations_between_which_a_wire_beats_circular(text):
    # 2.7 and 2.8: the axial ratio exceeds 1 + sqrt 2 where |G| exceeds 1
    place = parse_place(text)
    answer = answer_station(place, [1.85, 3.65, 7.1], WHEN, SKY, height_km=HEIGHT / 1e3)
    side = math.radians(answer.turns_toward_deg)
    grid = np.arange(0.0, 90.01, 0.05)
    theta = field_angle_another_way(place, side, np.radians(grid), HEIGHT)
    for row in answer.rows:
        linear = np.abs(row.gyro_ratio * np.sin(theta) ** 2 / (2.0 * np.cos(theta))) > 1.0
        assert linear.any() == (row.linear_from_deg is not None)
        if not linear.any():
            continue
        # the table's grid, and Y and Z of the other place, which weigh most on 160 m
        allowed = 0.25 + (1.0 if row.frequency_mhz < 2.0 else 0.4)
        assert row.linear_from_deg == pytest.approx(grid[linear].min(), abs=allowed)
        assert row.linear_to_deg == pytest.approx(grid[linear].max(), abs=allowed)


RATIOS_2_7 = [
    (3.65, 1.25, 67.0, 0.9720),
    (7.1, 1.25, 67.0, 0.9855),
    (3.65, 1.1, 45.0, 0.8991),
    (7.1, 1.0, 30.0, 0.8999),
    (7.1, 1.0, 10.0, 0.6813),
    (7.1, 1.0, 5.0, 0.4799),
    (14.1, 1.0, 1.0, 0.2328),
]


@pytest.mark.parametrize(("mhz", "gyro_mhz", "dip_deg", "ratio"), RATIOS_2_7)
def test_shape_overhead(level_field, mhz, gyro_mhz, dip_deg, ratio):
    # From memory (Ratcliffe; Budden 1952), worked out against the tensor; at 250 km Z is nothing.
    level_field(dip_deg, gyro_mhz * 1e6)
    shapes = arriving_shapes(place_at(0.0, 0.0), 0.0, 0.5 * math.pi, 250e3, mhz * 1e6, WHEN)
    assert 10.0 ** (-float(shapes.axial_ratio_db[0]) / 20.0) == pytest.approx(ratio, abs=1e-4)


@pytest.mark.parametrize(
    ("mhz", "practice", "half_digit"), [(1.85, 13, 0.5), (3.65, 7, 0.5), (7.1, 3.5, 0.25)]
)
def test_dip_below_which_a_wire_beats_circular_overhead(mhz, practice, half_digit):
    # Common practice, with f_H about 0.9 MHz, where the wires lie along the axes.
    longitude = 3.4
    equator = dip_equator(longitude)  # south of it f_H is 0.87 to 0.88 MHz

    def over(latitude):
        shapes = arriving_shapes(
            place_at(latitude, longitude), 0.0, 0.5 * math.pi, HEIGHT, mhz * 1e6, WHEN
        )
        return float(shapes.axial_ratio_db[0]) - LINEAR_DB

    latitude = brentq(over, equator - 15.0, equator - 0.2)
    field = overhead_field(latitude, longitude)
    assert gyro(field) == pytest.approx(0.9e6, abs=0.05e6)
    assert -math.degrees(float(dip(field))) == pytest.approx(practice, abs=half_digit)


@pytest.mark.parametrize("longitude", [-77.0, 3.4, 100.0])
def test_overhead_at_the_dip_equator(longitude):
    # 2.6, published: IEC 60050-705:1995, 705-07-40, wave normal across the field
    place = place_at(dip_equator(longitude), longitude)
    answer = answer_station(place, [3.65, 7.1], WHEN, SKY, height_km=HEIGHT / 1e3)
    assert answer.dip_deg == pytest.approx(0.0, abs=1e-6)
    for row in answer.rows:
        cell = row.overhead
        assert cell.shape is Shape.LINEAR
        assert cell.axial_ratio_db is None
        assert cell.field_angle_deg == pytest.approx(90.0, abs=1e-6)
        assert turned(cell.ordinary_axis_deg, answer.declination_deg) < 1e-3
        assert turned(cell.extraordinary_axis_deg, answer.declination_deg + 90.0) < 1e-3


# Absorption, states and heights


def test_absorption_of_both_waves_overhead():
    # row 6.7: f_L = 1.2 MHz; the place is where that is so at 90 km
    longitude = 10.0
    latitude = latitude_where(
        lambda b: GYROFREQUENCY_PER_TESLA * abs(float(b[2])) - 1.2e6, longitude, 30.0, 70.0
    )
    answer = answer_station(
        place_at(latitude, longitude), [3.65, 5.3, 7.1, 14.15], WHEN, SKY, height_km=HEIGHT / 1e3
    )
    found = [row.absorption_ratio for row in answer.rows]
    assert found == pytest.approx([3.919, 2.513, 1.979, 1.405], abs=5e-4)


def test_no_absorption_of_a_wave_that_is_not_turned_back():
    answer = answer_station(parse_place("52.0,6.0"), [1.2, 1.85], WHEN, SKY)
    assert answer.rows[0].absorption_ratio is None
    assert answer.rows[0].state != "both"
    assert answer.rows[1].absorption_ratio > 15.0


NIGHT = datetime(2026, 12, 21, 1, tzinfo=UTC)


def at_night(place, frequencies, fof2, **more):
    known = IonosphereInput(fof2_mhz=fof2, hmf2_km=300.0, foe_mhz=0.4, **more)
    return answer_station(place, frequencies, NIGHT, known, elevations_deg=[60.0])


@pytest.mark.parametrize("text", ["46.5,11.35", "34.0S,151.0E", "6.5N,3.4E"])
def test_state_overhead_by_the_exact_relation(text):
    # row 3.2: sqrt(f² - f f_H) < foF2 < f, a kilohertz on either side of each edge
    place = parse_place(text)
    for fof2 in (2.4, 5.1):
        f_h = gyro(field_at(place.latitude, place.longitude, 300e3, NIGHT)) / 1e6
        fxf2 = 0.5 * f_h + math.sqrt(fof2**2 + 0.25 * f_h**2)
        edges = [fof2 - 1e-3, fof2 + 1e-3, fxf2 - 1e-3, fxf2 + 1e-3]
        answer = at_night(place, edges, fof2)
        assert answer.fxf2_mhz == pytest.approx(fxf2, abs=2e-4)
        assert [row.state for row in answer.rows] == [
            "both",
            "extraordinary_only",
            "extraordinary_only",
            "none",
        ]


@pytest.mark.parametrize(("mhz", "width"), [(3.65, 0.69), (5.29, 0.67), (7.1, 0.66)])
def test_width_of_the_window_of_the_extraordinary_wave(mhz, width):
    # row 3.2, widths in foF2 at f_H = 1.25 MHz, to half the last digit
    latitude = brentq(
        lambda lat: gyro(field_at(math.radians(lat), math.radians(10.0), 300e3, NIGHT)) - 1.25e6,
        40.0,
        70.0,
    )
    place = place_at(latitude, 10.0)
    states = [
        at_night(place, [mhz], mhz - away).rows[0].state
        for away in (-1e-3, 1e-3, width - 5e-3, width + 5e-3)
    ]
    assert states == ["both", "extraordinary_only", "extraordinary_only", "none"]


def test_probabilities_overhead():
    # P(foF2 > f) for the ordinary, P(foF2 > sqrt(f² - f f_H)) for the extraordinary wave
    place = parse_place("46.5,11.35")
    answer = at_night(place, [3.3, 3.65, 4.2], 3.5, fof2_error_mhz=0.5)
    f_h = gyro(field_at(place.latitude, place.longitude, 300e3, NIGHT)) / 1e6
    for row in answer.rows:
        f, found = row.frequency_mhz, row.state_probabilities
        above = [
            0.5 * math.erfc((level - 3.5) / (0.5 * math.sqrt(2.0)))
            for level in (f, math.sqrt(f * f - f * f_h))
        ]
        assert found.both == pytest.approx(above[0], abs=1e-3)
        assert found.extraordinary_only == pytest.approx(above[1] - above[0], abs=1e-3)
        assert found.ordinary_only == 0.0
        assert found.none == pytest.approx(1.0 - above[1], abs=1e-3)


def phase_below(profiles, theta, Y_times_f, elevation, height, f):
    """O-X phase from the lowest plasma up to a height, by the dispersion relation as it is [rad].

    The squared index solves a quadratic: with U = 1 - i Z, n² = 1 - X / (U - (Y_T²/2 ∓ root) /
    (U - X)), root² = Y_T⁴/4 + Y_L² (U - X)²; below X = 1 the upper sign is the ordinary's.
    """
    h = np.arange(61e3, height, 20.0)
    density, _ = profiles.at_height(h)
    X = PLASMA_FREQUENCY_SQUARED_PER_DENSITY * density / f**2
    U = 1.0 - 1j * collision_frequency(h, density) / (2.0 * np.pi * f)
    Y = Y_times_f / f
    half, along = 0.5 * (Y * math.sin(theta)) ** 2, (Y * math.cos(theta)) ** 2
    root = np.sqrt(half**2 + along * (U - X) ** 2)
    ordinary, extraordinary = (
        np.sqrt(1.0 - X / (U - (half - sign * root) / (U - X))) for sign in (1.0, -1.0)
    )
    rise = (EARTH_RADIUS + h) / np.sqrt(
        (EARTH_RADIUS + h) ** 2 - (EARTH_RADIUS * math.cos(elevation)) ** 2
    )
    turn = np.abs((ordinary - extraordinary).real) * rise
    return float(2.0 * np.pi * f / SPEED_OF_LIGHT * np.sum(0.5 * (turn[1:] + turn[:-1])) * 20.0)


def test_cells_have_the_height_of_their_own_line():
    place, when = parse_place("41.0S,71.3W"), WHEN + timedelta(hours=3)
    answer = answer_station(place, [3.65, 7.1], when, SKY)
    profiles = scene_of(link_between(place, place), [when], SKY).overheads[0].profiles
    assert answer.height_km is None
    for row in answer.rows:
        cells = (row.overhead, *row.cells)
        az, el = (
            np.radians([getattr(c, n) or 0.0 for c in cells])
            for n in ("azimuth_deg", "elevation_deg")
        )
        f = np.full(az.shape, row.frequency_mhz * 1e6)
        heights = limiting_heights(profiles, place, az, el, f, when)
        assert [c.limiting_height_km * 1e3 for c in cells] == pytest.approx(heights, abs=1.0)
        shapes = arriving_shapes(place, az, el, heights, f, when)
        assert [c.field_angle_deg for c in cells] == pytest.approx(np.degrees(shapes.theta))


@pytest.mark.parametrize(
    ("text", "hour"), [("46.5,11.35", 11), ("46.5,11.35", 23), ("41.0S,71.3W", 17)]
)
def test_limiting_height_is_where_a_radian_is_left(text, hour):
    place, when = parse_place(text), WHEN + timedelta(hours=hour)
    profiles = scene_of(link_between(place, place), [when], SKY).overheads[0].profiles
    rng = np.random.default_rng(3)
    azimuth, elevation = rng.uniform(0.0, 6.28, 8), rng.uniform(0.15, 1.5, 8)
    f = np.array([1.85e6, 3.65e6, 5.3e6, 7.1e6] * 2)
    heights = limiting_heights(profiles, place, azimuth, elevation, f, when)
    shapes = arriving_shapes(place, azimuth, elevation, HEIGHT, f, when)
    for i, height in enumerate(heights):
        phase = phase_below(
            profiles, float(shapes.theta[i]), float(shapes.Y[i] * f[i]), elevation[i], height, f[i]
        )
        # half a kilometre of the table's own steps, linear within
        assert phase == pytest.approx(1.0, abs=0.03)


def test_limiting_heights_by_day_and_night():
    # row 2.9: 80 to 90 km by day, 95 km and higher at night, to 150 km on 7 to 14 MHz
    place = parse_place("46.5,11.35")
    day, night = (
        [
            row.overhead.limiting_height_km
            for row in answer_station(place, [1.85, 3.65, 7.1, 14.1], when, SKY).rows
        ]
        for when in (WHEN + timedelta(hours=11), NIGHT)
    )
    for heights in (day, night):
        assert heights == sorted(heights)  # the phase goes nearly with 1 / f²
    assert 75.0 < day[1] < day[2] < 92.0
    assert 90.0 < night[1] < 100.0 < night[3] < 160.0
    assert min(np.subtract(night, day)) > 5.0


# A station's antenna


@pytest.mark.parametrize("low", [False, True])
def test_relay_positions_are_those_of_a_path_with_these_waves(low):
    there = station(
        3.65e6,
        ground=AVERAGE,
        height=0.08 if low else 0.2,
        relay=(LEFT, RIGHT, *WIRES),
        place=parse_place("52.0,6.0"),
    )
    answer = answer_station(
        there.place, [3.65, 3.8], WHEN, SKY, height_km=HEIGHT / 1e3, station=there
    )
    for row in answer.rows:
        f = row.frequency_mhz * 1e6
        relay = relay_at(there, f)
        for cell in (row.overhead, *row.cells[::3]):
            az, el = math.radians(cell.azimuth_deg or 0.0), math.radians(cell.elevation_deg)
            shapes = arriving_shapes(there.place, az, el, HEIGHT, f, WHEN)
            waves = [IncidentWave(azimuth=az, elevation=el, state=s) for s in shapes.states]
            here = AtAntenna(
                frequency=f,
                waves=tuple(waves),
                others=(waves[1].state, waves[0].state),
                arrives=(True, True),
                level_db=(0.0, 0.0),
            )
            found = positions_on_path(relay, here)
            positions = tuple(found[p] for p in there.relay)
            best = [position_for(positions, mode, both=True) for mode in MODES]
            assert [cell.ordinary_position, cell.extraordinary_position] == [b.label for b in best]
            assert [cell.ordinary_rejection_db, cell.extraordinary_rejection_db] == pytest.approx(
                [b.rejection_db(m) for b, m in zip(best, MODES, strict=True)], abs=1e-6
            )
            taken = choice(positions, here)
            assert taken.receive is best[MODES.index(taken.wave)]


def test_rejection_overhead_is_that_of_a_path_straight_up(hands_of):
    there = station(3.65e6, relay=(LEFT, RIGHT), place=parse_place("46.5,11.35"))
    sky = IonosphereInput(fof2_mhz=6.5, hmf2_km=300.0, foe_mhz=1.0)
    row = answer_station(there.place, [3.65], NIGHT, sky, station=there).rows[0]
    answer = hands_of(there.place, there.place, 3.65, NIGHT, sky, station=there)
    assert row.overhead.ordinary_position == answer.advice.relay_position == "left"
    # The rays come a degree off the vertical, where the ellipses are rounder: 0.34 dB, not 0.36.
    for found, wave in (
        (row.overhead.ordinary_rejection_db, answer.advice.rejection_db.ordinary),
        (row.overhead.extraordinary_rejection_db, answer.advice.rejection_db.extraordinary),
    ):
        assert found == pytest.approx(wave, abs=0.8)
    assert answer.advice.wave is Mode.ORDINARY
