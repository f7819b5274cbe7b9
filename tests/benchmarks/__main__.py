"""Print the benchmark table: ``python -m tests.benchmarks [NAME ...]``."""

import sys

from tests.benchmarks import antenna, faces, planning, rays, sky, sweep, waves

GROUPS = {
    "rays": rays.rows,
    "waves": waves.rows,
    "sky": sky.rows,
    "antenna": antenna.rows,
    "sweep": sweep.rows,
    "planning": planning.rows,
    "faces": faces.rows,
}

if __name__ == "__main__":
    wanted = sys.argv[1:] or list(GROUPS)
    print(f"{'what':<58}{'measured':>14}{'wanted':>14}")
    for name in wanted:
        for what, measured, target in GROUPS[name]():
            print(f"{what:<58}{measured:>14}{target:>14}", flush=True)
