"""The antenna over the whole sky and across a band, against one direction or frequency a call."""

import time

import numpy as np

from magion.answers.feed import answer_feed
from magion.answers.pattern import answer_antenna
from magion.antenna.response import decibels, element_lengths, hand_gains, joined, networks
from magion.ground import CLASSES
from tests.stations import LEFT, RIGHT, WIRES, station

MHZ = 5.3
STATION = station(
    MHZ * 1e6,
    measured=False,
    ground=CLASSES["medium-dry"],
    height=0.16,
    relay=(LEFT, RIGHT, *WIRES),
    loss_db_per_100m=3.0,
)


def _seconds(call, runs=3):
    """Median wall time of a call [s]."""
    call()
    taken = []
    for _ in range(runs):
        begin = time.perf_counter()
        call()
        taken.append(time.perf_counter() - begin)
    return float(np.median(taken))


def _sky(step):
    elevation, azimuth = np.arange(step, 90.01, step), np.arange(0.0, 360.0, step)
    return elevation.size * azimuth.size, lambda: answer_antenna(STATION, MHZ, elevation, azimuth)


def _one_by_one(count):
    """A plain loop over directions, the networks solved once; every relay position in each."""
    f = MHZ * 1e6
    nets = networks(STATION, f)
    rng = np.random.default_rng(1)
    for azimuth, elevation in zip(
        rng.uniform(0.0, 6.28, count), rng.uniform(0.02, 1.57, count), strict=True
    ):
        lengths = element_lengths(STATION, f, azimuth, elevation)
        for net in nets:
            right, left = hand_gains(joined(net.current[:, 0], lengths), f)
            decibels(right), decibels(left)


def rows():
    """Rows of the table."""
    count, sky = _sky(1.0)
    whole = _seconds(sky)
    yield f"both hands in {count} directions, 4 relay positions", f"{whole:.2f} s", "<= 0.5 s"
    some = 500
    ratios = []
    for _ in range(3):  # in turn, so that a change of the machine's speed falls on both
        loop = _seconds(lambda: _one_by_one(some), 1) / some * count
        ratios.append(loop / _seconds(sky, 1))
    yield (
        "  the same / a plain loop over directions",
        f"{np.median(ratios):.0f} x faster",
        ">= 50 x",
    )
    for step in (4.0, 2.0, 1.0):
        count, sky = _sky(step)
        yield f"  {count} directions", f"{_seconds(sky) / count * 1e6:.1f} µs each", ""
    band = np.linspace(5.0, 5.6, 200)
    sheet = _seconds(lambda: answer_feed(MHZ, STATION, list(band)))
    yield "build sheet with 200 frequencies, table of impedances", f"{sheet:.3f} s", "<= 0.2 s"
    ratios = []
    for _ in range(3):
        loop = _seconds(lambda: [answer_feed(f, STATION, [f]) for f in band[::10]], 1) * 10
        ratios.append(loop / _seconds(lambda: answer_feed(MHZ, STATION, list(band)), 1))
    yield (
        "  the same / a sheet for each frequency",
        f"{np.median(ratios):.0f} x faster",
        ">= 10 x",
    )
