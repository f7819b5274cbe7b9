"""Which hand does Larch Hut switch to for Stone Hut at noon?"""

from datetime import UTC, datetime

from magion import IonosphereInput, Place, answer_path

LARCH = Place(name="Larch Hut", latitude_deg=46.50, longitude_deg=11.35)
STONE = Place(name="Stone Hut", latitude_deg=47.10, longitude_deg=10.85)


def main() -> None:
    answer = answer_path(
        STONE,
        LARCH,
        5.3,
        datetime(2026, 6, 21, 12, tzinfo=UTC),
        IonosphereInput(fof2_mhz=6.4, flux=130.0),
    )
    print(answer.advice.headline)
    for wave in answer.waves:
        if wave.arrives and wave.arrival and wave.receive_hand:
            print(
                f"{wave.wave.value:>14}: {wave.receive_hand.value}, elevation "
                f"{wave.arrival.elevation_deg:.1f} deg, delay {wave.group_delay_ms:.3f} ms"
            )


if __name__ == "__main__":
    main()
