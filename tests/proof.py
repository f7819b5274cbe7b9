"""Rows of docs/accuracy.md: what a check holds, to how many digits, and how far off it was seen.

A test file declares its rows with :func:`proves` and asserts through them; the largest deviation of
each is kept. ``pytest --accuracy FILE`` writes them down, ``python -m tests.accuracy`` makes the
page. A deviation that fails is not kept: what stands on the page has passed.
"""

import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np

ROOT = Path(__file__).parents[1]


@dataclass(frozen=True)
class Row:
    """One row: a quantity of a layer, its source and kind, and the tolerance it is held to."""

    what: str
    layer: str
    kind: str
    source: str
    tolerance: float
    unit: str  # "relative" for parts of the expected value
    scale: float  # size of the quantity; below 1e-9 of it a deviation is rounding
    file: str

    def within(self, measured, expected, tolerance=None):
        """Every measured value is nearer to its expected one than the tolerance."""
        off = np.abs(np.asarray(measured) - np.asarray(expected))
        if self.unit == "relative":
            off = off / np.abs(expected)
        self.off(off, tolerance)

    def off(self, deviation, tolerance=None):
        """Every deviation is below the tolerance, or below a tighter one for this case."""
        limit = self.tolerance if tolerance is None else tolerance
        assert limit <= self.tolerance, f"{self.what}: the row promises {self.tolerance:g}"
        worst = float(np.max(deviation))
        assert worst < limit, f"{self.what}: off by {worst:.3g} {self.unit}, limit {limit:g}"
        largest[self.what] = max(worst, largest.get(self.what, 0.0))


rows: dict[str, Row] = {}
largest: dict[str, float] = {}


def proves(what, *, layer, kind, source, tolerance, unit="1", scale=1.0):
    """Declare a row of the file that calls."""
    file = Path(sys._getframe(1).f_globals["__file__"]).resolve().relative_to(ROOT).as_posix()
    row = Row(what, layer, kind, source, tolerance, unit, scale, file)
    assert rows.setdefault(what, row) == row, f"two rows are called {what!r}"
    return row
