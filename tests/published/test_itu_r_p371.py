"""Solar flux and sunspot number.

Source
------
Recommendation ITU-R P.371-8, "Choice of indices for long-term ionospheric
predictions", 1999: the two relations of twelve-month means.

Kind: published. Printed precision: exact values of the quadratic to 3 decimals.
The inverse is printed with a constant of 2 decimals (408.99): 0.005.
"""

import pytest

from magion.ionosphere.climatology import flux_of_sunspots, sunspots_of_flux
from tests.proof import proves

FLUX = proves(
    "solar flux of a sunspot number",
    layer="ionosphere",
    kind="published",
    source="ITU-R P.371-8",
    tolerance=5e-4,
    unit="sfu",
    scale=100.0,
)
SUNSPOTS = proves(
    "sunspot number of a solar flux",
    layer="ionosphere",
    kind="published",
    source="ITU-R P.371-8",
    tolerance=0.005,
)

ROWS = [(0, 63.7), (50, 102.325), (100, 145.400), (150, 192.925)]


@pytest.mark.parametrize(("sunspots", "flux"), ROWS)
def test_flux_of_sunspots(sunspots, flux):
    FLUX.within(flux_of_sunspots(sunspots), flux)  # half the last printed digit


@pytest.mark.parametrize(("sunspots", "flux"), ROWS)
def test_sunspots_of_flux(sunspots, flux):
    SUNSPOTS.within(sunspots_of_flux(flux), sunspots)


def test_sunspots_do_not_fall_below_zero():
    assert sunspots_of_flux(60.0) == 0.0
