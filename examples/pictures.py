"""The pictures of the documentation: a day, an antenna, a sky and a table for the wall.

    python pictures.py [FOLDER] [STEP]

FOLDER is ../docs/pictures if not given, STEP that of the day in minutes, 15 if not given.
"""

import sys
from datetime import UTC, datetime
from pathlib import Path

from magion import (
    IonosphereInput,
    answer_antenna,
    answer_day,
    answer_sky,
    answer_station,
    parse_place,
    read_station,
)
from magion.plots.antenna import antenna_figure
from magion.plots.day import day_figure
from magion.plots.sense import sense_figure
from magion.render.sense import sense_text

HERE = Path(__file__).parent
PARTNER = parse_place("47.10,10.85", "Scree Hut")
DAY = datetime(2026, 12, 21, 12, tzinfo=UTC)
SUN = IonosphereInput(flux=130.0)
WALL_MHZ = (1.85, 3.65, 5.0, 5.3, 5.36, 7.1, 10.1)


def main(folder: Path = HERE.parent / "docs" / "pictures", step_min: float = 15.0) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    larch = read_station(HERE / "larch_hut.toml")
    home = larch.place

    day = answer_day(PARTNER, home, [3.65, 5.3], DAY, SUN, step_min=step_min, station=larch)
    sky_over_antenna = answer_antenna(larch, 5.3, range(1, 91), range(0, 360, 3))
    sky = answer_sky(home, 3.65, DAY)
    for name, figure in (
        ("day", day_figure(day)),
        ("antenna", antenna_figure(sky_over_antenna)),
        ("sky", sense_figure(sky)),
    ):
        figure.savefig(folder / f"{name}.png", dpi=90)

    wall = answer_station(home, WALL_MHZ, DAY, SUN, station=larch)
    (folder / "wall_table.txt").write_text(sense_text(wall), encoding="utf-8")


if __name__ == "__main__":
    where, step = ([*sys.argv[1:], "", ""])[:2]
    main(*([Path(where)] if where else []), **({"step_min": float(step)} if step else {}))
