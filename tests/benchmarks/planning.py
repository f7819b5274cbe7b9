"""The station table, a day and a net: whole processes, and how the cost grows."""

import tempfile
import time
from pathlib import Path

import numpy as np

from magion.answers.day import answer_day
from magion.answers.inputs import IonosphereInput
from magion.answers.net import answer_net
from magion.geometry import Place
from tests.benchmarks.faces import FLOOR, RUN, _against, _timed
from tests.benchmarks.scene import RECEIVER, TRANSMITTER, WHEN

SKY = IonosphereInput(flux=120.0)
HUT = "46.50,11.35"
MHZ = (3.65, 5.3, 7.1, 10.1, 14.1)
TWENTY = [f"{f:.2f}" for f in np.linspace(1.85, 28.5, 20)]
JUNE = ["--time", "2026-06-21T12:00Z", "--flux", "120"]


def partners(count):
    """Stations 30 to 500 km around the hut, seeded."""
    generator = np.random.default_rng(20)
    away, bearing = generator.uniform(0.3, 4.5, count), generator.uniform(0.0, 6.28, count)
    return [
        Place(
            latitude_deg=round(46.5 + float(r * np.cos(b)), 2),
            longitude_deg=round(11.35 + float(1.4 * r * np.sin(b)), 2),
            name=f"station {i}",
        )
        for i, (r, b) in enumerate(zip(away, bearing, strict=True))
    ]


def _options(values, name="-f"):
    return [word for v in values for word in (name, str(v))]


def _seconds(call):
    begin = time.perf_counter()
    call()
    return time.perf_counter() - begin


def _whole(name, words, seconds_limit, memory_limit):
    seconds, memory = _timed(RUN + words)
    yield f"{name}: whole process", f"{seconds:.1f} s", seconds_limit
    yield "  its peak memory", f"{memory:.0f} MB", memory_limit


def rows():
    """Rows of the table."""
    table = [*RUN, "station", HUT, *_options(TWENTY)]
    ratio, _, memory = _against(table, FLOOR)
    yield "station, 20 frequencies x 24 directions / its imports", f"{ratio:.2f} x", "<= 2 x"
    yield "  its peak memory", f"{memory:.0f} MB", ""
    ratio, _, _ = _against([*table, *JUNE], FLOOR, 3)
    yield "  with the states and limiting heights of an instant", f"{ratio:.2f} x", ""
    with tempfile.TemporaryDirectory() as folder:
        plot = ["--plot", str(Path(folder) / "day.png")]
        for name, ends in (
            ("day, 75 km", ["47.10,10.85", HUT]),
            ("day, 460 km", ["50.0,8.0", HUT]),
            ("day, 1030 km", ["55.4,15.1", HUT]),
        ):
            words = ["day", *ends, *_options((3.65, 5.3, 7.1)), *JUNE, *plot]
            near = name.startswith("day, 75")
            yield from _whole(
                f"{name}, 96 steps, 3 frequencies, figure",
                words,
                "<= 15 s" if near else "",
                "<= 500 MB",
            )
        listed = Path(folder) / "net.csv"
        listed.write_text(
            "name,place\n"
            + "".join(f'{p.name},"{p.latitude_deg},{p.longitude_deg}"\n' for p in partners(20)),
            encoding="utf-8",
        )
        words = ["net", HUT, "--partners", str(listed), *_options(MHZ), "--day", *JUNE]
        yield from _whole("net, 20 partners, 5 frequencies, 24 hours", words, "<= 60 s", "")
    answer_day(TRANSMITTER, RECEIVER, [5.3], WHEN, SKY, step_min=120.0)  # the imports
    for steps in (24, 48, 96):
        seconds = _seconds(
            lambda n=steps: answer_day(TRANSMITTER, RECEIVER, [5.3], WHEN, SKY, step_min=1440.0 / n)
        )
        yield f"  day of {steps} steps, 460 km, one frequency", f"{seconds:.1f} s", ""
    for count in (1, 3, 6):
        several = [3.65, 5.3, 7.1, 4.4, 6.2, 8.0][:count]
        seconds = _seconds(
            lambda f=several: answer_day(TRANSMITTER, RECEIVER, f, WHEN, SKY, step_min=30.0)
        )
        yield f"  day of 48 steps, {count} frequencies", f"{seconds:.1f} s", ""
    for count in (2, 5, 10):
        seconds = _seconds(lambda n=count: answer_net(RECEIVER, partners(n), MHZ, WHEN, SKY))
        yield f"  net at an instant, {count} partners, 5 frequencies", f"{seconds:.1f} s", ""
