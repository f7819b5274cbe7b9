"""Indices and polarizations of a million states against numpy's complex root."""

import time

import numpy as np

from magion.waves import characteristic_waves

COUNT = 1_000_000


def rows():
    """Rows of the table."""
    rng = np.random.default_rng(1)
    X, Y = rng.uniform(0.0, 1.5, COUNT), rng.uniform(0.1, 0.8, COUNT)
    Z, theta = rng.uniform(0.0, 0.2, COUNT), rng.uniform(0.0, np.pi, COUNT)
    states = X + 1j * Y
    ratios = []
    for _ in range(5):
        begin = time.perf_counter()
        np.sqrt(states)
        root = time.perf_counter() - begin
        begin = time.perf_counter()
        characteristic_waves(X, Y, Z, theta)
        ratios.append((time.perf_counter() - begin) / root)
    yield (
        "10⁶ states, both indices and polarizations / complex sqrt",
        f"{np.median(ratios):.1f} x",
        "<= 10 x",
    )
