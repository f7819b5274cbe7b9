"""Field components at seven places, 2020.0, 5 km.

Source
------
Values printed by a national data centre's calculator for the 13th generation
of the model: P. Alken et al., "International Geomagnetic Reference Field: the
thirteenth generation", Earth, Planets and Space 73, 49, 2021. Geodetic WGS 84;
X north, Y east, Z down.

Kind: published. Printed precision: 0.1 nT. Tolerance: 6 nT, because the 14th
generation, in use here, made the 2020 coefficients definitive.
"""

from datetime import UTC, datetime

import numpy as np
import pytest

from magion.field import field_at
from tests.proof import proves

COMPONENTS = proves(
    "components of the field, 13th against 14th generation",
    layer="field",
    kind="published",
    source="Alken 2021 (IGRF-13)",
    tolerance=6.0,
    unit="nT",
)

ROWS = [
    (60, 25, 14649.7, 2407.6, 49966.0),
    (50, 10, 20022.9, 1108.7, 44501.0),
    (40, -100, 20308.6, 1847.7, 48081.8),
    (10, 77, 40381.5, -1214.8, 5146.1),
    (0, -60, 25497.6, -7315.3, 5370.7),
    (-20, -50, 18219.6, -6806.1, -11950.5),
    (-30, 150, 26417.7, 5070.0, -47914.2),
]


@pytest.mark.parametrize(("lat_deg", "lon_deg", "north", "east", "down"), ROWS)
def test_components(lat_deg, lon_deg, north, east, down):
    found = field_at(
        np.radians(lat_deg), np.radians(lon_deg), 5e3, datetime(2020, 1, 1, tzinfo=UTC)
    )
    COMPONENTS.within(found * 1e9, [east, north, -down])
