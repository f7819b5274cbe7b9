"""Collision frequency of electrons in the D region.

Source
------
J. R. Wait and K. P. Spies, "Characteristics of the Earth-ionosphere waveguide
for VLF radio waves", National Bureau of Standards, Technical Note 300, 1964.

Kind: published. Printed precision: 2 digits at 70 and 80 km.
"""

import numpy as np
import pytest

from magion.ionosphere.collisions import electron_neutral
from tests.proof import proves

NEUTRALS = proves(
    "electron-neutral collision frequency",
    layer="ionosphere",
    kind="published",
    source="Wait and Spies 1964",
    tolerance=0.05e6,
    unit="s⁻¹",
    scale=1000000.0,
)


@pytest.mark.parametrize(("height_km", "nu"), [(70, 5.0e6), (80, 1.1e6)])
def test_collision_frequency(height_km, nu):
    NEUTRALS.within(electron_neutral(height_km * 1e3), nu)  # half the last printed digit


def test_falls_by_e_in_a_scale_height():
    # 0.15 per km, so a factor e in 6.6667 km, and 1.816e11 per second at the ground.
    h = np.array([0.0, 20e3 / 3])
    ground, above = electron_neutral(h)
    assert abs(ground / 1.816e11 - 1) < 1e-12
    assert abs(above / ground - np.exp(-1)) < 1e-12
