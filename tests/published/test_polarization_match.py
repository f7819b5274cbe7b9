"""Power that an antenna of one elliptical state takes from a wave of another.

Source
------
The standard form of the polarization match of two ellipses of axial ratios r1
and r2 whose major axes stand d apart, as textbooks of antennas print it:

    1/2 + [4 s r1 r2 + (r1² − 1)(r2² − 1) cos 2d] / [2 (r1² + 1)(r2² + 1)]

with s = +1 for equal hands and −1 for opposite ones.

Kind: derived; the numbers follow from the form and were confirmed with Jones
vectors written out by hand. Printed precision: 0.001 dB, 0.01 dB for the
deepest; held to 0.002 dB, 0.005 dB for the deepest.
"""

import numpy as np
import pytest

from magion.polarization import ellipse, match
from tests.proof import proves

DECIBELS = proves(
    "match of two ellipses",
    layer="polarization",
    kind="derived",
    source="standard form; Jones vectors",
    tolerance=0.005,
    unit="dB",
)
FORM = proves(
    "match of any two ellipses",
    layer="polarization",
    kind="derived",
    source="standard form",
    tolerance=1e-13,
)

ROWS = [
    (True, 0, -0.088, 0.002),
    (True, 45, -1.308, 0.002),
    (True, 90, -3.010, 0.002),
    (False, 0, -3.010, 0.002),
    (False, 45, -5.850, 0.002),
    (False, 90, -16.99, 0.005),
]


@pytest.mark.parametrize(("same_hand", "apart_deg", "match_db", "tolerance"), ROWS)
@pytest.mark.parametrize("right", [True, False])
@pytest.mark.parametrize("start_deg", [0, 33])
def test_match_in_decibels(same_hand, apart_deg, match_db, tolerance, right, start_deg):
    first = ellipse(2.0, np.radians(start_deg), right)
    second = ellipse(3.0, np.radians(start_deg + apart_deg), right == same_hand)
    DECIBELS.within(10 * np.log10(match(first, second)), match_db, tolerance)


def test_standard_form_everywhere():
    rng = np.random.default_rng(71)
    r1, r2 = rng.uniform(1.0, 30.0, (2, 500))
    first_tilt, second_tilt = rng.uniform(-np.pi / 2, np.pi / 2, (2, 500))
    first_right, second_right = rng.random((2, 500)) < 0.5
    s = np.where(first_right == second_right, 1.0, -1.0)
    d = first_tilt - second_tilt
    form = 0.5 + (4 * s * r1 * r2 + (r1**2 - 1) * (r2**2 - 1) * np.cos(2 * d)) / (
        2 * (r1**2 + 1) * (r2**2 + 1)
    )
    found = match(ellipse(r1, first_tilt, first_right), ellipse(r2, second_tilt, second_right))
    FORM.within(found, form)
