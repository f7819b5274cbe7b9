"""Rays without a field against closed forms.

Croft, T. A., and H. Hoogasian (1968), "Exact ray calculations in a
quasi-parabolic ionosphere with no magnetic field", Radio Science 3(1), 69-74:
the layer model is published, the formulas are from memory, the numbers are
derived two ways (closed form and quadrature); printed to 0.1 m. The gate is
0.05 km.

Appleton, E. V., and W. J. G. Beynon (1940), "The application of ionospheric
data to radio communication problems", Proc. Phys. Soc. 52, 518: flat parabolic
layer, vertical and oblique; formulas from memory, numbers derived; printed to
1e-4 km.
"""

import numpy as np
import pytest

from magion.constants import EARTH_RADIUS
from magion.rays.batch import Fate, trace
from magion.rays.equations import RaySet
from tests.media import FlatParabolic, QuasiParabolic
from tests.proof import proves

RAYS = proves(
    "ground range, paths and apogee in a quasi-parabolic layer",
    layer="rays",
    kind="derived",
    source="Croft and Hoogasian 1968",
    tolerance=0.05,
    unit="km",
    scale=1000.0,
)
VERTICAL = proves(
    "virtual height of a flat parabolic layer",
    layer="rays",
    kind="derived",
    source="Appleton and Beynon 1940",
    tolerance=0.01,
    unit="km",
    scale=1000.0,
)
OBLIQUE = proves(
    "range and group path in a flat parabolic layer",
    layer="rays",
    kind="derived",
    source="Appleton and Beynon 1940",
    tolerance=0.05,
    unit="km",
    scale=1000.0,
)

GROUND = 6371.2e3
TIGHT = {"position_tolerance": 0.01, "direction_tolerance": 1e-8}

# frequency MHz, elevation, ground range, group path, phase path, apogee km
QUASI = [
    (7.0, 60.0, 269.0904, 558.4671, 506.2881, 220.730),
    (9.9, 80.0, 138.7480, 844.5471, 505.7084, 278.055),
    (10.0, 20.0, 1043.2869, 1146.9034, 1136.7033, 208.891),
    (15.0, 10.0, 1756.3369, 1839.6371, 1830.5381, 210.710),
    (20.0, 5.0, 2453.9474, 2537.0869, 2525.2143, 215.284),
]


def rays_without_field(frequency):
    n = len(frequency)
    return RaySet(
        frequency=np.asarray(frequency) * 1e6,
        extraordinary=np.arange(n) % 2 == 1,
        which=np.zeros(n, dtype=int),
    )


def back_to_radius(ends, radius):
    """Ends moved back along their last straight line to another ground."""
    toward = ends.direction / np.sqrt((ends.direction**2).sum(axis=0))
    along = (ends.position * toward).sum(axis=0)
    gap = radius**2 - (ends.position**2).sum(axis=0)
    length = -along - np.sqrt(along**2 + gap)  # negative: backward
    return ends.position + toward * length, ends.group_path + length, ends.phase_path + length


def test_quasi_parabolic_rays():
    rows = np.array(QUASI)
    elevation = np.radians(rows[:, 1])
    start = np.repeat([[GROUND], [0.0], [0.0]], len(rows), axis=1)
    direction = np.stack([np.sin(elevation), np.cos(elevation), 0.0 * elevation])
    ends = trace(start, direction, rays_without_field(rows[:, 0]), QuasiParabolic(), None, **TIGHT)
    assert (ends.fate == Fate.LANDED).all()
    position, group, phase = back_to_radius(ends, GROUND)
    reach = np.arctan2(position[1], position[0]) * GROUND
    got = np.stack([reach, group, phase, ends.apogee + EARTH_RADIUS - GROUND], axis=1) / 1e3
    RAYS.within(got, rows[:, 2:])


@pytest.mark.parametrize(
    ("frequency", "virtual_height"),
    [(3, 209.2856), (6, 241.5888), (8, 287.8890), (9, 332.4998), (9.5, 374.0192)],
)
def test_flat_parabolic_layer_vertical(frequency, virtual_height):
    start = np.array([[EARTH_RADIUS], [0.0], [0.0]])
    up = np.array([[1.0], [0.0], [0.0]])
    ends = trace(start, up, rays_without_field([frequency]), FlatParabolic(), None, **TIGHT)
    VERTICAL.within(ends.group_path[0] / 2e3, virtual_height)


@pytest.mark.parametrize(
    ("frequency", "zenith", "reach", "group_path"),
    [
        (15, 60, 945.601, 1091.887),
        (15, 65, 1061.166, 1170.867),
        (20, 70, 1413.475, 1504.189),
    ],
)
def test_flat_parabolic_layer_oblique(frequency, zenith, reach, group_path):
    angle = np.radians(zenith)
    start = np.array([[EARTH_RADIUS], [0.0], [0.0]])
    direction = np.array([[np.cos(angle)], [np.sin(angle)], [0.0]])
    layer = FlatParabolic(base=150e3)
    ends = trace(
        start, direction, rays_without_field([frequency]), layer, None, keep_tracks=True, **TIGHT
    )
    # From the last node on, in a straight line, to the plane that touches the sphere at the start.
    last = ends.tracks[0].state[:, -1]
    toward = last[3:6] / np.linalg.norm(last[3:6])
    length = (EARTH_RADIUS - last[0]) / toward[0]
    group = ends.tracks[0].group_path[-1] + length
    found = np.array([last[1] + length * toward[1], group]) / 1e3
    OBLIQUE.within(found, [reach, group_path])
