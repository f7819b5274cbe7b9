"""Six states of plasma through the cold dielectric tensor.

Source
------
T. H. Stix, "Waves in Plasmas", American Institute of Physics, 1992, chapter 1:
the elements S, D, P of the dielectric tensor of a cold plasma and the quartic
A n⁴ − B n² + C = 0.

Kind: reference library. The squares were computed with a general plasma
physics library from its tensor elements, electrons only. Printed precision:
12 digits; held to 1e-10 relative, half of which the last digit of the
smallest may use up.
"""

import numpy as np
import pytest

from magion.waves import refractive_index_squared
from tests.proof import proves

TENSOR = proves(
    "squared indices by a plasma library",
    layer="waves",
    kind="reference library",
    source="Stix 1992, chapter 1",
    tolerance=1e-10,
    unit="relative",
)

ROWS = [
    (0.5, 0.2, 30.0, 0.570259745121, 0.387634991722),
    (0.5, 0.2, 90.0, 0.5, 0.456521739130),
    (0.5, 0.2, 0.0, 0.583333333333, 0.375),
    (0.9, 0.6, 60.0, 0.128693574450, 1.519351118287),
    (1.5, 0.2, 30.0, -0.793171993529, -0.267434067077),
    (0.3, 1.5, 40.0, 0.819614480781, 1.302672567902),
]


@pytest.mark.parametrize(("X", "Y", "theta_deg", "square_o", "square_x"), ROWS)
def test_squares_of_both_indices(X, Y, theta_deg, square_o, square_x):
    ordinary, extraordinary = refractive_index_squared(X, Y, 0.0, np.radians(theta_deg))
    TENSOR.within([ordinary, extraordinary], [square_o, square_x])
