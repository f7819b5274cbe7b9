"""The sun's angle from the zenith.

Source
------
I. Reda and A. Andreas, "Solar Position Algorithm for Solar Radiation
Applications", National Renewable Energy Laboratory, NREL/TP-560-34302,
revised 2008, table A5.1.

Kind: published. Printed precision: 0.01 degrees with refraction (50.11), and
the geometric angle of the same row. Tolerance: 0.05 degrees, what a
low-precision formula and refraction may differ.
"""

from datetime import UTC, datetime, timedelta, timezone

import numpy as np
import pytest

from magion.geometry import solar_zenith_angle
from tests.proof import proves

ZENITH = proves(
    "angle of the sun from the zenith",
    layer="geometry",
    kind="published",
    source="NREL/TP-560-34302, table A5.1",
    tolerance=0.01,
    unit="deg",
)

GEOMETRIC_DEG = 50.1275
APPARENT_DEG = 50.11


@pytest.mark.parametrize(
    "when",
    [
        datetime(2003, 10, 17, 19, 30, 30),  # no zone means UTC
        datetime(2003, 10, 17, 19, 30, 30, tzinfo=UTC),
        datetime(2003, 10, 17, 12, 30, 30, tzinfo=timezone(timedelta(hours=-7))),
    ],
)
def test_zenith_angle(when):
    found = np.degrees(solar_zenith_angle(when, np.radians(39.742476), np.radians(-105.1786)))
    assert abs(found - APPARENT_DEG) < 0.05
    # The formulas used claim 0.01 degrees of geometric position.
    ZENITH.within(found, GEOMETRIC_DEG)
