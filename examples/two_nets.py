"""One net of huts in the north, one of posts in the south, each by noon of its summer or winter.

    python two_nets.py [PARTNERS]

PARTNERS is how many of each net are asked for, all if not given.
"""

import sys
from datetime import UTC, datetime
from pathlib import Path

from magion import IonosphereInput, answer_net, read_partners, read_station

HERE = Path(__file__).parent
NETS = (
    ("larch_hut.toml", "net_alps.csv", datetime(2026, 12, 21, 11, tzinfo=UTC), (3.65, 5.3)),
    ("cedar_ridge.toml", "net_andes.csv", datetime(2026, 12, 21, 16, tzinfo=UTC), (5.3, 7.1)),
)


def main(most: int | None = None) -> None:
    for file, partners, when, frequencies_mhz in NETS:
        station = read_station(HERE / file)
        net = answer_net(
            station.place,
            read_partners(HERE / partners)[:most],
            frequencies_mhz,
            when,
            IonosphereInput(flux=130.0),
            station=station,
        )
        (hour,) = net.hours
        print(f"{net.control}, {hour.time_utc}: {hour.headline}")
        for partner in net.partners:
            for cell in hour.cells:
                best = cell.frequency_mhz == hour.best_frequency_mhz
                if best and cell.partner == partner.name:
                    rejection = "" if cell.rejection_db is None else f"{cell.rejection_db:.0f} dB"
                    print(
                        f"  {partner.name:<14}{partner.distance_km:5.0f} km "
                        f"{partner.bearing_deg:4.0f} deg  {cell.state:<19}{cell.receive or '-':<7}"
                        f"{cell.wave or '-':<14}{rejection}"
                    )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:2]))
