"""Gyrofrequency and dip over five stations at 2025.0.

Source
------
International Association of Geomagnetism and Aeronomy, "International
Geomagnetic Reference Field, 14th generation", 2024, synthesized independently;
gyrofrequency e B / (2 pi m_e), 27.99249 GHz/T.

Kind: derived. Printed precision: 0.001 MHz and 0.01 degrees. Tolerance: 0.002
MHz and 0.05 degrees.
"""

from datetime import UTC, datetime

import numpy as np
import pytest

from magion.field import dip, field_at, flux_density, gyrofrequency
from tests.proof import proves

GYRO = proves(
    "gyrofrequency from 0 to 300 km",
    layer="field",
    kind="derived",
    source="IGRF-14, synthesized independently",
    tolerance=0.002,
    unit="MHz",
)
DIP = proves(
    "dip at 100 km",
    layer="field",
    kind="derived",
    source="IGRF-14, synthesized independently",
    tolerance=0.05,
    unit="deg",
)

ROWS = [
    (52.0, 6.0, (1.385, 1.323, 1.210), 67.10),
    (-34.0, 151.0, (1.598, 1.520, 1.379), -64.50),
    (6.5, 3.4, (0.920, 0.869, 0.778), -13.19),
    (-23.5, -46.6, (0.639, 0.613, 0.566), -39.86),
    (-12.0, -77.0, (0.686, 0.657, 0.602), -1.39),
]
HEIGHTS = np.array([0.0, 100e3, 300e3])


@pytest.mark.parametrize(("lat_deg", "lon_deg", "f_h_mhz", "dip_deg"), ROWS)
def test_gyrofrequency_and_dip(lat_deg, lon_deg, f_h_mhz, dip_deg):
    found = field_at(
        np.radians(lat_deg), np.radians(lon_deg), HEIGHTS, datetime(2025, 1, 1, tzinfo=UTC)
    )
    GYRO.within(gyrofrequency(flux_density(found)) / 1e6, f_h_mhz)
    DIP.within(np.degrees(dip(found[:, 1])), dip_deg)


def test_geographically_north_and_magnetically_south():
    found = field_at(np.radians(6.5), np.radians(3.4), 100e3, datetime(2025, 1, 1, tzinfo=UTC))
    assert abs(np.degrees(dip(found)) + 13) < 0.5  # half the last printed digit
