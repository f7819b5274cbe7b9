"""A fan of rays in one batch against SciPy's DOP853 one ray at a time.

Both use the same analytic right-hand side, and both are timed at the coarsest
tolerance at which every ray of the fan lands within 0.05 km of a converged
reference. The general solver is timed on every tenth ray, and its error is
taken on these and on the ten rays that answer most to the tolerance.
"""

import time

import numpy as np
from scipy.integrate import solve_ivp

from magion.constants import EARTH_RADIUS
from magion.rays.batch import distance_to_height
from magion.rays.equations import derivative
from magion.rays.fans import shoot
from tests.benchmarks.scene import LINK, MEDIUM, fan, field

ALLOWED = 50.0


def _one(start, direction, rays, magnetic, scale):
    below = distance_to_height(start[:, None], direction[:, None], MEDIUM.base)

    def right_hand_side(_, y):
        return derivative(y[:, None], rays, MEDIUM, magnetic)[:, 0]

    def leaves(_, y):
        return np.sqrt(y[:3] @ y[:3]) - EARTH_RADIUS - MEDIUM.base + 1.0

    leaves.terminal, leaves.direction = True, -1.0
    y = solve_ivp(
        right_hand_side,
        (0.0, 15e6),
        np.concatenate([start + direction * below, direction, below]),
        method="DOP853",
        rtol=1e-12,
        atol=np.array([1.0] * 3 + [1e-6] * 3 + [1.0]) * scale,
        events=leaves,
    ).y[:, -1]
    p = y[3:6] / np.linalg.norm(y[3:6])
    along = y[:3] @ p
    return y[:3] + p * (-along - np.sqrt(along**2 - y[:3] @ y[:3] + EARTH_RADIUS**2))


def rows():
    """Rows of the table."""
    magnetic = field()
    w, rays = fan(100)
    reference = shoot(LINK, w, rays, MEDIUM, magnetic, tolerance=1e-3).position
    start, directions = LINK.up * EARTH_RADIUS, LINK.launch(w)

    def batch_error(tolerance):
        ends = shoot(LINK, w, rays, MEDIUM, magnetic, tolerance=tolerance)
        return np.sqrt(((ends.position - reference) ** 2).sum(axis=0)).max()

    tolerance = next(
        t for t in (4.0, 3.0, 2.0, 1.5, 1.0, 0.8, 0.5, 0.2) if batch_error(t) <= ALLOWED
    )
    some = np.arange(0, 200, 10)
    coarse = shoot(LINK, w, rays, MEDIUM, magnetic, tolerance=4.0).position
    tender = np.argsort(-np.sqrt(((coarse - reference) ** 2).sum(axis=0)))[:10]

    def error(index, scale):
        landed = _one(start, directions[:, index], rays.hop(0, np.array([index])), magnetic, scale)
        return float(np.linalg.norm(landed - reference[:, index]))

    def single(scale):
        begin = time.perf_counter()
        worst = max(error(i, scale) for i in some)
        return (time.perf_counter() - begin) / some.size * 200, worst

    for scale in (30.0, 20.0, 10.0, 6.0, 3.0, 2.0, 1.0, 0.6, 0.3, 0.1):
        if max(error(i, scale) for i in tender) <= ALLOWED and single(scale)[1] <= ALLOWED:
            break
    ratios = []
    for _ in range(3):  # in turn, so that a change of the machine's speed falls on both
        seconds, _ = single(scale)
        begin = time.perf_counter()
        for _ in range(5):
            shoot(LINK, w, rays, MEDIUM, magnetic, tolerance=tolerance)
        ratios.append(seconds / ((time.perf_counter() - begin) / 5))
    yield (
        f"200 O and X rays, batch (tol {tolerance:g} m) / DOP853 one by one",
        f"{np.median(ratios):.0f} x faster",
        ">= 150 x",
    )
    for count in (25, 100, 400, 1600):
        w, rays = fan(count)
        begin = time.perf_counter()
        shoot(LINK, w, rays, MEDIUM, magnetic)
        seconds = time.perf_counter() - begin
        yield f"  {2 * count} rays in one batch", f"{2 * count / seconds:.0f} rays/s", ""
