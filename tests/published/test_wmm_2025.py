"""Test values of the World Magnetic Model 2025.

Source
------
NOAA National Centers for Environmental Information and British Geological
Survey, "The US/UK World Magnetic Model for 2025-2030", 2024/2025, the test
values published with the model's coefficients. Geodetic WGS 84; X north, Y
east, Z down.

Kind: published, of another model of the same field. Printed precision: 0.1 or
0.001 nT, 0.01 degrees. Tolerance: 60 nT and 0.15 degrees, the difference the
two models may have.
"""

from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from magion.field import declination, dip, field_at
from tests.proof import proves

COMPONENTS = proves(
    "components of the field against another model",
    layer="field",
    kind="published",
    source="World Magnetic Model 2025",
    tolerance=60.0,
    unit="nT",
)
DIP = proves(
    "dip against another model",
    layer="field",
    kind="published",
    source="World Magnetic Model 2025",
    tolerance=0.15,
    unit="deg",
)
DECLINATION = proves(
    "declination against another model",
    layer="field",
    kind="published",
    source="World Magnetic Model 2025",
    tolerance=0.15,
    unit="deg",
)

ROWS = [
    (2025.0, 0, 80, 0, 6521.6, 145.9, 54791.5, 83.21, 1.28),
    (2025.0, 100, 0, 120, 37688.6, -96.2, -10152.1, -15.08, -0.15),
    (2025.0, 100, -80, 240, 5907.6, 14780.3, -49540.7, -72.19, 68.21),
    (2027.5, 0, 0, 120, 39701.6, -167.4, -10381.8, -14.65, -0.24),
    (2027.5, 100, -80, 240, 5984.0, 14760.1, -49317.7, -72.10, 67.93),
    (2025.0, 65, 43, 93, 24299.853, 210.517, 50037.924, 64.10, 0.50),
    (2025.0, 51, -33, 109, 21737.779, -2090.274, -52710.004, -67.50, -5.49),
    (2026.0, 62, -14, 99, 33437.829, -835.919, -33100.922, -44.70, -1.43),
    (2026.5, 14, 0, 80, 39431.416, -2133.456, -12188.838, -17.15, -3.10),
]


def instant(year):
    start = datetime(int(year), 1, 1, tzinfo=UTC)
    return start + timedelta(days=365 * (year % 1))  # none of the years is a leap year


@pytest.mark.parametrize(
    ("year", "height_km", "lat_deg", "lon_deg", "north", "east", "down", "dip_deg", "decl_deg"),
    ROWS,
)
def test_components_dip_and_declination(
    year, height_km, lat_deg, lon_deg, north, east, down, dip_deg, decl_deg
):
    found = field_at(np.radians(lat_deg), np.radians(lon_deg), height_km * 1e3, instant(year))
    COMPONENTS.within(found * 1e9, [east, north, -down])
    DIP.within(np.degrees(dip(found)), dip_deg)
    DECLINATION.within(np.degrees(declination(found)), decl_deg)
