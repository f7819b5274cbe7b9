"""A net against the day and the path of each partner, and its choices by trying everything.

Kind: derived. A net asks of every partner what a day or a path asks, with MUFs three hours apart.
So its cells are held to those answers, and its choices to the rules that docs/formats.md prints: a
position serves a partner while it hears it within 6 dB of the best one and with one wave 6 dB above
the other; the best frequency reaches most partners, then gives the worst one the better chance
(within 5 %), then serves more, then has the stronger worst partner.
"""

import math
from datetime import datetime, timedelta
from itertools import pairwise

import numpy as np
import pytest

from magion.answers.certainty import STATES
from magion.geometry import great_circle, parse_place
from magion.ground import AVERAGE
from tests.laws.conftest import DECEMBER, JUNE
from tests.stations import LEFT, RIGHT, WIRES, station

HUT = "46.50,11.35"
PARTNERS = {"scree": "47.10,10.85", "rhine": "50.0,8.0", "coast": "43.6,13.5"}
TWO = " ".join(f"{n}={PARTNERS[n]}" for n in ("scree", "rhine"))
THREE = " ".join(f"{n}={p}" for n, p in PARTNERS.items())
FREQUENCIES = [3.65, 5.3]
EVENING = DECEMBER + timedelta(hours=17)
S_UNIT = 6.0


@pytest.fixture(scope="session")
def whole_day(net_of):
    return net_of(HUT, TWO, FREQUENCIES, DECEMBER, whole_day=True)


@pytest.fixture(scope="session")
def evening(net_of):
    return net_of(HUT, THREE, [3.65, 5.3, 7.1], EVENING)


@pytest.fixture(scope="session")
def with_a_station(net_of):
    # one height and ground for all: at 0.1 wavelengths on 3.65 MHz
    there = station(
        5.3e6, ground=AVERAGE, height=0.15, relay=(LEFT, RIGHT, *WIRES), place=parse_place(HUT)
    )
    return there, net_of(HUT, THREE, [3.65, 5.3, 7.1], EVENING, station=there)


def cells_of(hour, **wanted):
    return [c for c in hour.cells if all(getattr(c, k) == v for k, v in wanted.items())]


# Cells


def test_every_partner_frequency_and_hour_is_there_once(whole_day):
    assert [h.time_utc for h in whole_day.hours] == [f"2026-12-21T{h:02}:00:00Z" for h in range(24)]
    for hour in whole_day.hours:
        asked = [(c.partner, c.frequency_mhz) for c in hour.cells]
        assert asked == [(p.name, f) for p in whole_day.partners for f in FREQUENCIES]
    for partner in whole_day.partners:
        place, hut = parse_place(PARTNERS[partner.name]), parse_place(HUT)
        angle, bearing = great_circle(hut.latitude, hut.longitude, place.latitude, place.longitude)
        assert partner.distance_km == pytest.approx(float(angle) * 6371.0)
        assert partner.bearing_deg == pytest.approx(math.degrees(float(bearing)))


def days_of(net, day_of):
    """Every cell of a whole day beside the row and step of its partner's day."""
    for partner in net.partners:
        day = day_of((PARTNERS[partner.name], HUT), FREQUENCIES, DECEMBER, step_min=60.0)
        for row in day.frequencies:
            for i, hour in enumerate(net.hours):
                own = cells_of(hour, partner=partner.name, frequency_mhz=row.frequency_mhz)
                yield own[0], day, row, i


def test_cells_of_a_whole_day_are_the_partners_days(whole_day, day_of):
    for cell, day, row, i in days_of(whole_day, day_of):
        assert cell.state == row.state[i]
        # MUFs three hours apart: between them a margin is good to some per cent of the MUF, and
        # a chance to a third of a deviation, which is 12 to 18 % of foF2
        chance = 1.0 - row.probability[STATES.index("none"), i]
        assert cell.arrival_probability == pytest.approx(chance, abs=0.12)
        if cell.wave is None:
            assert cell.margin_mhz < 0.0
            continue
        k = ("ordinary", "extraordinary").index(cell.wave)
        assert cell.receive == row.receive_hand[k][i]
        assert cell.level_db == pytest.approx(row.level_db[k, i], abs=0.01)
        margin = max(day.muf_mhz[k, i] - row.frequency_mhz, 0.0)
        assert cell.margin_mhz == pytest.approx(margin, abs=0.05 * day.muf_mhz[k, i])


def margin_errors(net, day_of, wave):
    """Errors of the margins of one wave over its MUF."""
    for cell, day, row, i in days_of(net, day_of):
        k = ("ordinary", "extraordinary").index(wave)
        if cell.wave == wave or (cell.wave is None and wave == "extraordinary"):
            margin = day.muf_mhz[k, i] - row.frequency_mhz
            if cell.wave is not None:
                margin = max(margin, 0.0)
            yield abs(cell.margin_mhz - margin) / day.muf_mhz[k, i]


def test_margins_of_the_ordinary_wave_between_traced_hours(whole_day, day_of):
    # its MUF goes with foF2: 1 % is what tilts and heights add in three hours
    assert max(margin_errors(whole_day, day_of, "ordinary")) < 0.015


def test_margins_of_the_extraordinary_wave_between_traced_hours(whole_day, day_of):
    assert max(margin_errors(whole_day, day_of, "extraordinary")) < 0.015


NOT_THE_PATHS_CHOICE = (
    "_cell() takes the wave of the position that parts best, with an ideal switch simply the "
    "stronger; a path and a day take the ordinary while the other is not 3 dB stronger"
)


def test_wave_to_take_is_that_of_the_partners_day(whole_day, day_of):
    for cell, _, row, i in days_of(whole_day, day_of):
        assert (cell.wave, cell.receive) == (row.wave[i], row.receive[i])


def test_wave_to_take_is_that_of_the_partners_path(evening, path_of):
    for partner, mhz in (("scree", 3.65), ("scree", 5.3), ("coast", 3.65), ("coast", 5.3)):
        (cell,) = cells_of(evening.hours[0], partner=partner, frequency_mhz=mhz)
        told = path_of((PARTNERS[partner], HUT), mhz, EVENING).advice
        assert (cell.wave, cell.receive) == (told.wave.value, told.receive_hand.value)


def test_with_a_station_the_wave_to_take_is_that_of_the_path(with_a_station, path_of):
    there, net = with_a_station
    for partner, mhz in (("scree", 3.65), ("scree", 5.3), ("coast", 3.65), ("coast", 5.3)):
        (cell,) = cells_of(net.hours[0], partner=partner, frequency_mhz=mhz)
        told = path_of((PARTNERS[partner], HUT), mhz, EVENING, station=there).advice
        assert (cell.wave, cell.receive) == (told.wave.value, told.relay_position)


def test_cells_of_an_instant_are_the_partners_paths(evening, path_of):
    (hour,) = evening.hours
    for partner in ("scree", "coast"):
        for mhz in (3.65, 5.3):
            (cell,) = cells_of(hour, partner=partner, frequency_mhz=mhz)
            path = path_of((PARTNERS[partner], HUT), mhz, EVENING)
            told = path.advice
            assert cell.state == told.state
            assert cell.arrival_probability == pytest.approx(
                1.0 - told.state_probabilities.none, abs=1e-3
            )
            wave = next(w for w in path.waves if w.wave.value == cell.wave)
            assert cell.receive == wave.receive_hand.value
            assert cell.level_db == pytest.approx(wave.level_db, abs=0.1)
            assert cell.margin_mhz == pytest.approx(wave.margin_mhz, abs=3e-3 * wave.muf_mhz)
            assert cell.rejection_db is None


def test_hours_of_a_day_are_single_instants(whole_day, evening):
    (now,) = evening.hours
    then = whole_day.hours[17]
    assert then.time_utc == now.time_utc
    for cell in then.cells:
        (alone,) = cells_of(now, partner=cell.partner, frequency_mhz=cell.frequency_mhz)
        assert (cell.state, cell.wave, cell.receive) == (alone.state, alone.wave, alone.receive)
        assert cell.served_by == alone.served_by
        assert cell.level_db == pytest.approx(alone.level_db, abs=0.01)
        # MUFs three hours apart, interpolated as their ratio to foF2
        muf = alone.margin_mhz + alone.frequency_mhz
        assert cell.margin_mhz == pytest.approx(alone.margin_mhz, abs=0.03 * muf)
        assert cell.arrival_probability == pytest.approx(alone.arrival_probability, abs=0.08)


@pytest.mark.xfail(
    strict=True,
    reason="chances_at() sees the leading rays only: where F leads and E carries the wave as well, "
    "the chance is F's; a path takes a wave that any of its rays has by E as sure",
)
def test_a_wave_that_e_carries_too_is_sure(net_of, path_of):
    when = JUNE + timedelta(hours=16)
    (cell,) = net_of(HUT, "island=55.4,15.1", [10.1], when).hours[0].cells
    chances = path_of(("55.4,15.1", HUT), 10.1, when).advice.state_probabilities
    assert cell.arrival_probability == pytest.approx(1.0 - chances.none, abs=0.02)


def test_frequencies_do_not_hide_one_another(net_of):
    # 2300 km at 08 UT: 7 MHz falls between E and F, and comes by two hops
    net = net_of("40.0,25.0", "west=50.0,0.0", [6.9, 7.0, 7.1], DECEMBER + timedelta(hours=8))
    assert {c.state for c in net.hours[0].cells} == {"both"}


# What serves a partner


def hands_that_serve(path):
    """Hands of an ideal switch that serve, by the rule, from the levels and hands of a path."""
    heard = {}
    for wave in path.waves:
        if wave.arrives:
            heard.setdefault(wave.receive_hand.value, []).append(wave.level_db)
    best = max(max(levels) for levels in heard.values())
    return {
        hand
        for hand, levels in heard.items()
        if max(levels) >= best - S_UNIT and (len(levels) == 1 or abs(np.diff(levels)[0]) >= S_UNIT)
    }


def test_hands_that_serve_a_partner(evening, path_of):
    for partner, mhz in (("scree", 3.65), ("scree", 5.3), ("coast", 3.65), ("coast", 5.3)):
        (cell,) = cells_of(evening.hours[0], partner=partner, frequency_mhz=mhz)
        path = path_of((PARTNERS[partner], HUT), mhz, EVENING)
        assert set(cell.served_by) == hands_that_serve(path)


def test_positions_that_serve_a_partner(with_a_station, path_of):
    there, net = with_a_station
    for partner, mhz in (("scree", 3.65), ("scree", 5.3), ("coast", 3.65), ("coast", 5.3)):
        (cell,) = cells_of(net.hours[0], partner=partner, frequency_mhz=mhz)
        path = path_of((PARTNERS[partner], HUT), mhz, EVENING, station=there)
        heard = {}
        for p in path.antenna.positions:
            own = [
                w.level_db + g
                for w, g in zip(
                    path.waves, (p.ordinary_gain_dbi, p.extraordinary_gain_dbi), strict=True
                )
                if w.arrives
            ]
            parted = abs(own[0] - own[1]) if len(own) == 2 else math.inf
            heard[p.label] = max(own), parted, p
        best = max(strength for strength, _, _ in heard.values())
        serves = {
            label
            for label, (strength, parted, _) in heard.items()
            if strength >= best - S_UNIT and parted >= S_UNIT
        }
        assert set(cell.served_by) == serves
        if path.advice.state == "both":
            chosen = heard[cell.receive][2]
            sign = 1.0 if cell.wave == "ordinary" else -1.0
            wanted = sign * chosen.ordinary_over_extraordinary_db
            assert cell.rejection_db == pytest.approx(wanted, abs=0.3)


def test_the_station_changes_no_state(evening, with_a_station):
    _, net = with_a_station
    for one, two in zip(evening.hours[0].cells, net.hours[0].cells, strict=True):
        assert (one.partner, one.state, one.arrival_probability) == (
            two.partner,
            two.state,
            two.arrival_probability,
        )
    labels = {label for c in net.hours[0].cells for label in c.served_by}
    assert labels <= {"left", "right", "wire N", "wire E"}


# The choices, by trying everything


def all_hours(*nets):
    return [(net, hour) for net in nets for hour in net.hours]


def test_the_position_serves_most_partners(whole_day, evening, with_a_station):
    for _, hour in all_hours(whole_day, evening, with_a_station[1]):
        for row in hour.frequencies:
            own = cells_of(hour, frequency_mhz=row.frequency_mhz)
            every = {label for c in own for label in c.served_by}
            counts = {x: sum(x in c.served_by for c in own) for x in every}
            if not every:
                assert row.position is None
                assert row.served == ()
            else:
                assert counts[row.position] == max(counts.values()) == len(row.served)
                # of several that serve as many, the one that most partners would take
                takes = {
                    x: sum(c.receive == x for c in own)
                    for x in every
                    if counts[x] == counts[row.position]
                }
                assert takes[row.position] == max(takes.values())
            assert set(row.served) == {c.partner for c in own if row.position in c.served_by}


def test_served_and_failed_are_all(whole_day, evening, with_a_station):
    for net, hour in all_hours(whole_day, evening, with_a_station[1]):
        names = [p.name for p in net.partners]
        for row in hour.frequencies:
            assert sorted(row.served + row.failed) == sorted(names)
            own = cells_of(hour, frequency_mhz=row.frequency_mhz)
            assert row.reached == sum(c.state != "none" for c in own)
            assert len(row.served) <= row.reached
            (worst,) = cells_of(hour, frequency_mhz=row.frequency_mhz, partner=row.worst_partner)
            assert row.worst_probability == worst.arrival_probability
            assert worst.arrival_probability == min(c.arrival_probability for c in own)


def better(one, two, cells):
    """Whether a frequency is the better one, rule by rule."""

    def worst_level(row):
        own = [c for c in cells if c.frequency_mhz == row.frequency_mhz]
        low = min(own, key=lambda c: (c.arrival_probability, c.level_db or -200.0))
        return -200.0 if low.level_db is None else low.level_db

    if one.reached != two.reached:
        return one.reached > two.reached
    steps = [round(r.worst_probability / 0.05) for r in (one, two)]
    if steps[0] != steps[1]:
        return steps[0] > steps[1]
    if len(one.served) != len(two.served):
        return len(one.served) > len(two.served)
    return worst_level(one) >= worst_level(two)


def test_the_best_frequency(whole_day, evening, with_a_station):
    seen = set()
    for _, hour in all_hours(whole_day, evening, with_a_station[1]):
        seen.add(hour.best_frequency_mhz)
        if all(r.reached == 0 for r in hour.frequencies):
            assert hour.best_frequency_mhz is None
            assert hour.headline == "No partner is reached on any of these frequencies."
            continue
        (best,) = [r for r in hour.frequencies if r.frequency_mhz == hour.best_frequency_mhz]
        assert best.reached > 0
        assert all(better(best, other, hour.cells) for other in hour.frequencies)
        assert hour.headline.startswith(f"{best.frequency_mhz:.3f} MHz")
        if best.position is not None:
            assert f"on {best.position}: serves {len(best.served)} of" in hour.headline
    assert {3.65, 5.3} <= seen


def test_hours_follow_one_another(whole_day):
    times = [datetime.fromisoformat(h.time_utc) for h in whole_day.hours]
    assert {b - a for a, b in pairwise(times)} == {timedelta(hours=1)}
