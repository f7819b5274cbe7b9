"""The answer for one path: hand by the sign of k·B, presence, reasons, bad input.

Hands: IEC 60050-705:1995, 705-07-40 (published): the extraordinary wave is
right-hand where its wave normal makes an acute angle with the field, the
ordinary the opposite. The places are chosen so that hemisphere, latitude or
distance alone would give the wrong answer (kind: derived).
"""

from datetime import UTC, datetime

import numpy as np
import pytest

from magion.answers.inputs import IonosphereInput
from magion.answers.path import answer_path
from magion.errors import InputError, OutsideModelError
from magion.geometry import parse_place
from magion.ionosphere.profile import measured_profile
from magion.polarization import Hand, Shape

NOON = datetime(2026, 6, 21, 12, 0, tzinfo=UTC)
NIGHT = datetime(2026, 12, 21, 1, 0, tzinfo=UTC)


def ask(start, end, frequency, when=NOON, **known):
    known.setdefault("flux", None if "profile" in known else 130.0)
    return answer_path(
        parse_place(start), parse_place(end), frequency, when, IonosphereInput(**known)
    )


def hands(answer):
    return tuple(w.receive_hand for w in answer.waves)


def test_northern_mid_latitude_overhead():
    answer = ask("46.5,11.35", "46.9,11.0", 5.3)
    assert hands(answer) == (Hand.LEFT, Hand.RIGHT)
    for wave in answer.waves:
        # to stay on one wave the hand changes between receiving and sending
        assert wave.transmit_hand is wave.receive_hand.opposite
        assert wave.launch.hand is wave.transmit_hand
        assert wave.shape is Shape.CIRCULAR
        assert wave.limiting.field_angle_deg < 45.0
        assert 78.0 < wave.limiting.height_km < 92.0  # by day, physics check 2.9


def test_southern_mid_latitude_overhead():
    answer = ask("41.0S,71.3W", "41.4S,70.9W", 5.3, datetime(2026, 12, 21, 17, tzinfo=UTC))
    assert hands(answer) == (Hand.RIGHT, Hand.LEFT)


def test_geographically_north_and_magnetically_south():
    answer = ask("6.5,3.4", "6.6,3.5", 7.1)
    assert answer.field.dip_deg < 0.0
    assert hands(answer) == (Hand.RIGHT, Hand.LEFT)


def test_low_arrival_from_magnetic_north_turns_the_hand():
    from_north = ask("65.5,6.0", "52.0,6.0", 5.3, NIGHT, fof2_mhz=4.5, hmf2_km=300.0)
    from_south = ask("38.5,6.0", "52.0,6.0", 5.3, NIGHT, fof2_mhz=4.5, hmf2_km=300.0)
    assert from_north.waves[0].arrival.elevation_deg < 20.0
    assert from_north.waves[0].limiting.field_angle_deg > 90.0
    assert hands(from_north) == (Hand.RIGHT, Hand.LEFT)
    assert hands(from_south) == (Hand.LEFT, Hand.RIGHT)
    # launched southward at dip 76 and landing at dip 67: three separate hands
    assert from_north.waves[0].launch.hand is not None


def test_dip_equator_is_linear():
    answer = ask("12.0S,77.0W", "12.0S,77.0W", 7.1, datetime(2026, 12, 21, 18, tzinfo=UTC))
    declination = answer.field.declination_deg
    assert abs(answer.field.dip_deg) < 3.0
    assert all(w.shape is Shape.LINEAR for w in answer.waves)
    # O along magnetic north-south, X along magnetic east-west (IEC 60050-705, physics check 2.6)
    ordinary, extraordinary = (w.major_axis_bearing_deg for w in answer.waves)
    assert abs((ordinary - declination + 90.0) % 180.0 - 90.0) < 3.0
    assert abs((extraordinary - declination) % 180.0 - 90.0) < 3.0
    assert "single wire" in answer.advice.headline


def test_vertical_case_and_only_the_extraordinary_left():
    answer = ask("46.5,11.35", "46.5,11.35", 5.0, fof2_mhz=4.7, foe_mhz=2.0)
    assert answer.path.distance_km == 0.0
    assert answer.path.bearing_deg is None
    assert answer.ionosphere.fxf2_mhz > 5.0 > answer.ionosphere.fof2_mhz
    assert answer.advice.state == "extraordinary_only"
    assert answer.advice.receive_hand is Hand.RIGHT
    assert "MUF" in answer.waves[0].reason


@pytest.mark.parametrize(("frequency", "turned_back"), [(4.65, True), (4.75, False)])
def test_vertical_ordinary_ends_at_fof2(frequency, turned_back):
    answer = ask("46.5,11.35", "46.5,11.35", frequency, fof2_mhz=4.7, foe_mhz=2.0)
    assert answer.waves[0].arrives is turned_back


def test_vertical_extraordinary_ends_at_fxf2():
    fxf2 = ask("46.5,11.35", "46.5,11.35", 5.0, fof2_mhz=4.7, foe_mhz=2.0).ionosphere.fxf2_mhz
    for frequency, turned_back in ((fxf2 - 0.02, True), (fxf2 + 0.02, False)):
        answer = ask("46.5,11.35", "46.5,11.35", frequency, fof2_mhz=4.7, foe_mhz=2.0)
        assert answer.waves[1].arrives is turned_back


def test_above_both_is_a_normal_answer():
    answer = ask("46.5,11.35", "46.9,11.0", 12.0)
    assert answer.advice.state == "none"
    assert all(w.reason and w.receive_hand is None for w in answer.waves)


def test_at_the_gyrofrequency_the_extraordinary_does_not_arrive():
    answer = ask("46.5,11.35", "46.9,11.0", 1.2)
    extraordinary = answer.waves[1]
    assert not extraordinary.arrives
    assert extraordinary.muf_mhz is None
    assert "gyrofrequency" in extraordinary.reason
    assert any("ground wave" in c for c in answer.advice.caveats)


def test_measured_profile_is_used_as_it_stands():
    height = np.linspace(90e3, 400e3, 63)
    density = 4e11 * np.exp(-(((height - 280e3) / 60e3) ** 2))
    density[0] = 0.0
    answer = ask("46.5,11.35", "46.9,11.0", 4.0, profile=measured_profile(height, density))
    assert answer.ionosphere.fof2_mhz == pytest.approx(np.sqrt(80.6164 * 4e11) / 1e6, rel=1e-3)
    assert answer.ionosphere.hmf2_km == pytest.approx(280.0, abs=0.5)
    assert answer.waves[0].arrives


def test_antipodes_are_refused():
    with pytest.raises(InputError, match="antipodes"):
        ask("46.5,11.35", "46.5S,168.65W", 5.3)


@pytest.mark.parametrize(
    ("known", "message"),
    [
        ({"flux": 30.0}, "solar flux is 30"),
        ({"flux": 120.0, "sunspots": 40.0}, "contradict"),
        ({"flux": None, "sunspots": 300.0}, "sunspot number is 300"),
        ({"fof2_mhz": float("nan")}, "foF2 is nan"),
        ({"fof2_mhz": 0.2}, "accepted: 0.5 to 25"),
        ({"hmf2_km": 90.0}, "hmF2 is 90"),
        ({"foe_mhz": 30.0}, "foE is 30"),
        ({"fof2_mhz": 3.0, "foe_mhz": 4.0}, "above foF2"),
    ],
)
def test_wrong_ionosphere(known, message):
    with pytest.raises(InputError, match=message):
        ask("46.5,11.35", "46.9,11.0", 5.3, **known)


@pytest.mark.parametrize("frequency", [0.1, 70.0, float("nan"), -3.0, float("inf")])
def test_wrong_frequency(frequency):
    with pytest.raises(InputError, match="frequency"):
        ask("46.5,11.35", "46.9,11.0", frequency)


@pytest.mark.parametrize("year", [1850, 2031])
def test_date_outside_the_field_model(year):
    with pytest.raises(OutsideModelError, match="1900-01-01 to 2030-01-01"):
        ask("46.5,11.35", "46.9,11.0", 5.3, datetime(year, 1, 1, tzinfo=UTC))
