"""The Chapman layer.

Source
------
S. Chapman, "The absorption and dissociative or ionizing effect of
monochromatic radiation in an atmosphere on a rotating earth", Proceedings of
the Physical Society 43, 26, 1931.

Kind: memory for the formula; the check is derived: the layer is built up again
from its assumptions (an isothermal gas of scale height H, a beam that is
absorbed in it, loss proportional to N²) by quadrature. Precision: that of the
quadrature, 1e-6.
"""

import numpy as np
import pytest
from scipy.integrate import quad

from magion.ionosphere.layers import chapman
from tests.proof import proves

LAYER = proves(
    "Chapman layer from its assumptions",
    layer="ionosphere",
    kind="derived",
    source="Chapman 1931, by quadrature",
    tolerance=1e-6,
)


def production(z, zenith):
    """Ions made at reduced height z, in any unit: gas left times beam left."""
    gas = np.exp(-z)
    column, _ = quad(lambda y: np.exp(-y), z, np.inf)
    return gas * np.exp(-column / np.cos(zenith))


@pytest.mark.parametrize("zenith_deg", [0.0, 35.0, 60.0, 80.0])
def test_layer_from_its_assumptions(zenith_deg):
    zenith, peak, scale = np.radians(zenith_deg), 110e3, 9e3
    # Unit optical depth to the overhead sun at z = 0 makes that the overhead peak.
    overhead_peak = production(0.0, 0.0)
    for z in (-1.5, -0.5, 0.0, 0.7, 2.0, 5.0):
        expected = np.sqrt(production(z, zenith) / overhead_peak)
        found = float(chapman(np.array([peak + z * scale]), peak, scale, zenith)[0])
        LAYER.within(found, expected)


@pytest.mark.parametrize("zenith_deg", [0.0, 45.0, 75.0])
def test_peak_rises_and_weakens_with_the_zenith_angle(zenith_deg):
    zenith, peak, scale = np.radians(zenith_deg), 110e3, 9e3
    h = np.arange(80e3, 200e3, 1.0)
    n = chapman(h, peak, scale, zenith)
    assert abs(h[n.argmax()] - (peak - scale * np.log(np.cos(zenith)))) <= 1.0  # the grid
    assert abs(n.max() - np.sqrt(np.cos(zenith))) < 1e-6
