"""Logs of the demo station's relay, invented with a seed: one with swapped labels, one that
cannot tell.

    python relay_logs.py [FOLDER]     writes relay_swapped.csv and relay_ambiguous.csv
"""

import csv
import sys
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np

from magion import IonosphereInput, read_partners, read_station
from magion.answers.relay import expectation_of
from magion.answers.relay_model import simulated
from magion.formats.readings import read_readings
from magion.formats.relay_log import Reading, RelayLog

HERE = Path(__file__).parent
SEED = 20261221
DAY = datetime(2026, 12, 21, tzinfo=UTC)
MHZ = 5.3


def written(folder, name, minutes, known, swapped, rejection_db, generator):
    """Draw a log and write it."""
    station = read_station(HERE / "larch_hut.toml")
    partners = read_partners(HERE / "net_alps.csv")
    rows = [
        Reading(
            line=0,
            time=DAY + timedelta(minutes=m),
            partner=partners[i % 3],
            frequency_mhz=MHZ,
            levels_db=(0.0, 0.0),
        )
        for i, m in enumerate(minutes)
    ]
    log = RelayLog(labels=("left", "right"), unit="db", readings=tuple(rows))
    expected, _, _ = expectation_of(log, station.place, known, station)
    differences = simulated(expected, rejection_db, swapped, 3.0, generator)
    with (folder / name).open("w", newline="", encoding="utf-8") as file:
        file.write("# Invented: drawn by relay_logs.py from a known truth.\n")
        table = csv.writer(file, lineterminator="\n")
        table.writerow(["time_utc", "partner", "frequency_mhz", "level_left_db", "level_right_db"])
        for row, difference in zip(rows, differences, strict=True):
            common = generator.normal(-80.0, 4.0)
            levels = (f"{common + 0.5 * side * difference:.1f}" for side in (1, -1))
            time = row.time.strftime("%Y-%m-%dT%H:%MZ")
            table.writerow([time, row.partner.name, MHZ, *levels])


def main(folder=HERE):
    """Write both logs."""
    generator = np.random.default_rng(SEED)
    evening = IonosphereInput(readings=read_readings(HERE / "relay_readings.csv"))
    written(folder, "relay_swapped.csv", range(960, 1080, 10), evening, True, 22.0, generator)
    # By the climatology alone nobody knows which waves come back at dawn.
    climate = IonosphereInput(flux=120.0)
    written(folder, "relay_ambiguous.csv", range(415, 455, 8), climate, False, 22.0, generator)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
