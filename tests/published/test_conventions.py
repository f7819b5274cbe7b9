"""Labels where the two indices meet along the field.

Appleton-Hartree along the field: n² = 1 - X / (1 + Y) and 1 - X / (1 - Y)
(Ratcliffe 1959, Budden 1985; from memory). Above X = 1 the ordinary wave is the
one whose index goes over into 1 - X / (1 - Y) as the angle goes to zero (kind:
derived: the ordinary's zero at X = 1 lies between).
"""

import pytest

from magion.waves import refractive_index_squared
from tests.proof import proves

LABELS = proves(
    "labels of both indices where they meet along the field",
    layer="waves",
    kind="derived",
    source="Ratcliffe 1959; Budden 1985",
    tolerance=1e-6,
)


@pytest.mark.parametrize("theta", [0.0, 1e-6])
def test_labels_along_the_field_are_the_limit(theta):
    X, Y = 1.3, 0.3
    ordinary, extraordinary = refractive_index_squared(X, Y, 0.0, theta)
    LABELS.within([ordinary, extraordinary], [1.0 - X / (1.0 - Y), 1.0 - X / (1.0 + Y)])
