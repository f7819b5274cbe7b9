"""MUFs of a day, and how the cost of an answer grows."""

import time
from datetime import timedelta

from magion.answers.certainty import path_mufs
from magion.answers.inputs import IonosphereInput
from magion.answers.modes import find_modes, hop_counts
from magion.answers.scene import scene_of
from magion.geometry import parse_place
from magion.rays.link import link_between
from magion.waves import MODES
from tests.benchmarks.scene import RECEIVER, TRANSMITTER, WHEN

GIVEN = IonosphereInput(flux=120.0)


def _seconds(call):
    begin = time.perf_counter()
    call()
    return time.perf_counter() - begin


def rows():
    """Rows of the table."""
    link = link_between(TRANSMITTER, RECEIVER)
    midnight = WHEN.replace(hour=0)
    scene_of(link, [midnight], GIVEN)  # the imports
    for hours in (6, 12, 24, 48):
        moments = [midnight + timedelta(hours=24.0 * i / hours) for i in range(hours)]
        seconds = _seconds(lambda m=moments: path_mufs(scene_of(link, m, GIVEN), (1,)))
        yield (
            f"MUFs of both waves at {hours} hours of one path",
            f"{seconds:.2f} s",
            "<= 5 s" if hours == 24 else "",
        )
    for name in ("46.50,11.35", "47.0,10.9", "50.0,8.0", "57.0,-5.0", "35.0,-40.0"):
        far = link_between(TRANSMITTER, parse_place(name))
        frequency = 5.3e6 if far.distance < 800e3 else 12e6
        scene = scene_of(far, [WHEN], GIVEN)
        modes = _seconds(lambda s=scene, f=frequency: find_modes(s, f, MODES, 0))
        mufs = _seconds(lambda s=scene, d=far.distance: path_mufs(s, hop_counts(d)[:1]))
        yield (
            f"  {far.distance / 1e3:.0f} km: all modes with levels, both MUFs",
            f"{modes:.2f} + {mufs:.2f} s",
            "",
        )
    scene = scene_of(link, [WHEN], GIVEN)
    for count in (1, 4):
        seconds = _seconds(
            lambda n=count: [find_modes(scene, 4e6 + 1e6 * i, MODES, 0) for i in range(n)]
        )
        yield f"  {count} frequencies, all modes one after the other", f"{seconds:.2f} s", ""
