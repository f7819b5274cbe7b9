"""Labels where the two indices meet along the field.

Appleton-Hartree along the field: n² = 1 - X / (1 + Y) and 1 - X / (1 - Y)
(Ratcliffe 1959, Budden 1985; from memory). Above X = 1 the ordinary wave is the
one whose index goes over into 1 - X / (1 - Y) as the angle goes to zero (kind:
derived: the ordinary's zero at X = 1 lies between).
"""

import pytest

from magion.waves import refractive_index_squared


@pytest.mark.parametrize("theta", [0.0, 1e-6])
def test_labels_along_the_field_are_the_limit(theta):
    X, Y = 1.3, 0.3
    ordinary, extraordinary = refractive_index_squared(X, Y, 0.0, theta)
    assert ordinary.real == pytest.approx(1.0 - X / (1.0 - Y), abs=1e-6)
    assert extraordinary.real == pytest.approx(1.0 - X / (1.0 + Y), abs=1e-6)
