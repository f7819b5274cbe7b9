"""The hand follows the field where the wave leaves, not the hemisphere.

Larch Hut hears a station to the magnetic north and one to the south, near and
far; a southern hut does the same.
"""

from datetime import UTC, datetime

from magion import IonosphereInput, Place, answer_path

LARCH = Place(name="Larch Hut", latitude_deg=46.50, longitude_deg=11.35)
LENGA = Place(name="Lenga Hut", latitude_deg=-41.0, longitude_deg=-71.3)
NIGHT = datetime(2026, 12, 21, 23, tzinfo=UTC)


def main() -> None:
    print("receiver    partner       O      X    elevation of O")
    for hut in (LARCH, LENGA):
        for degrees in (15.0, 1.0, -1.0, -15.0):
            partner = Place(
                latitude_deg=hut.latitude_deg + degrees, longitude_deg=hut.longitude_deg
            )
            answer = answer_path(
                partner, hut, 5.3, NIGHT, IonosphereInput(fof2_mhz=6.0, hmf2_km=300.0, flux=130.0)
            )
            hands = [w.receive_hand.value if w.receive_hand else "-" for w in answer.waves]
            arrival = answer.waves[0].arrival
            where = f"{abs(degrees):.0f} deg {'north' if degrees > 0 else 'south'}"
            print(
                f"{hut.name:<11} {where:<13} {hands[0]:<6} {hands[1]:<6} "
                f"{arrival.elevation_deg if arrival else float('nan'):.0f} deg"
            )


if __name__ == "__main__":
    main()
