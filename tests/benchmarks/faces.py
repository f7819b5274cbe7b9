"""Whole processes against the import of their own dependencies."""

import os
import resource
import subprocess
import sys
import time

import numpy as np

FLOOR = [sys.executable, "-c", "import numpy, scipy.interpolate, ppigrf, PyIRI.edp_update"]
BARE = [sys.executable, "-c", "pass"]
RUN = [sys.executable, "-c", "from magion.cli import main; main()"]
SHORT = ["path", "46.50,11.35", "47.10,10.85", "-f", "5.3", "--time", "2026-06-21T12:00Z"]
LONG = ["path", "46.50,11.35", "55.0,25.0", "-f", "9.1", "--time", "2026-06-21T12:00Z"]


def _timed(command):
    """Wall seconds and peak memory of a child process [s, MB]."""
    begin = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.DEVNULL)
    _, status, usage = os.wait4(child.pid, 0)
    if status:
        raise SystemExit(f"{command} failed")
    return time.perf_counter() - begin, usage.ru_maxrss / 1024


def _against(command, other, runs=5):
    """Median ratio and difference of wall times, run in turn, and the peak memory."""
    _timed(command), _timed(other)
    pairs = [(_timed(command), _timed(other)) for _ in range(runs)]
    ratio = np.median([a[0] / b[0] for a, b in pairs])
    gap = np.median([a[0] - b[0] for a, b in pairs])
    return float(ratio), float(gap), max(a[1] for a, _ in pairs)


def rows():
    """Rows of the table."""
    if not hasattr(resource, "getrusage"):
        return
    for name, command in (("magion path, 75 km", SHORT), ("magion path, 1350 km", LONG)):
        ratio, _, memory = _against(RUN + command, FLOOR)
        yield f"{name} / importing its dependencies", f"{ratio:.2f} x", "<= 3 x"
        yield f"  {name}, peak memory", f"{memory:.0f} MB", "<= 400 MB"
    _, gap, _ = _against([*RUN, "--help"], BARE)
    yield "magion --help over bare python", f"{gap:.3f} s", "<= 0.2 s"
