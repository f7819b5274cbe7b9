"""Rows a second of a sweep against the path answer in a loop, and its memory."""

import sys
import tempfile
import time
from datetime import timedelta
from pathlib import Path

import numpy as np

from magion.answers.engines import Pool
from magion.answers.inputs import IonosphereInput
from magion.answers.path import answer_path
from magion.answers.sweep import in_this_process, sweep
from magion.formats.contacts import Contact
from magion.geometry import parse_place
from tests.benchmarks.faces import _timed
from tests.benchmarks.scene import RECEIVER, WHEN

SKY = IonosphereInput(flux=120.0)
MHZ = (3.65, 5.3, 7.1)
PATHS, ROWS, ALONE = 5, 2000, 8


def contacts():
    """A day's log of a net: a few partners heard again and again."""
    generator = np.random.default_rng(8)
    offsets = generator.normal(0.0, 1.2, (PATHS, 2))
    ends = [parse_place(f"{46.5 + a:.2f},{11.35 + b:.2f}") for a, b in offsets]
    midnight = WHEN.replace(hour=0)
    return [
        Contact(
            line=i + 2,
            time=midnight + timedelta(minutes=int(generator.integers(0, 1400))),
            transmitter=ends[int(generator.integers(PATHS))],
            receiver=RECEIVER,
            frequency_mhz=float(generator.choice(MHZ)),
        )
        for i in range(ROWS)
    ]


def _rows_file(folder, count):
    """A file of one path, whose work is done once: what is left is the reading and writing."""
    file = Path(folder) / f"rows{count}.csv"
    with file.open("w", encoding="utf-8") as out:
        out.write("time_utc,from,to,frequency_mhz\n")
        for i in range(count):
            hour, minute = 8 + i % 3, i % 30
            out.write(f'2026-06-21T{hour:02d}:{minute:02d}Z,"47.10,10.85","46.50,11.35",5.3\n')
    return file


def rows():
    """Rows of the table."""
    log = contacts()
    for c in log[:2]:  # the imports
        answer_path(c.transmitter, c.receiver, c.frequency_mhz, c.time, SKY)
    begin = time.perf_counter()
    for c in log[:ALONE]:
        answer_path(c.transmitter, c.receiver, c.frequency_mhz, c.time, SKY)
    alone = ALONE / (time.perf_counter() - begin)
    yield "path answers in a loop", f"{alone:.2f} rows/s", ""
    begin = time.perf_counter()
    sum(1 for _ in sweep(log, SKY, engine=in_this_process))
    one = ROWS / (time.perf_counter() - begin)
    yield f"sweep of {ROWS} rows of {PATHS} paths, one core", f"{one:.0f} rows/s", ""
    yield "  against the loop", f"{one / alone:.0f} x", ">= 20 x"
    with Pool(2) as pool:
        begin = time.perf_counter()
        sum(1 for _ in sweep(log, SKY, engine=pool))
        two = ROWS / (time.perf_counter() - begin)
    yield "  on two cores, the processes' start included", f"{two:.0f} rows/s", ""
    face = [sys.executable, "-c", "from magion.cli import main; main()", "sweep"]
    with tempfile.TemporaryDirectory() as folder:
        for count in (10_000, 100_000, 1_000_000):
            file = _rows_file(folder, count)
            words = [str(file), "--output", f"{folder}/out.csv", "--workers", "1", "--flux", "120"]
            seconds, memory = _timed([*face, *words])
            yield (
                f"  one path, {count:,} rows: whole process",
                f"{seconds:.0f} s, {memory:.0f} MB",
                "flat memory",
            )
