"""Probabilities of the states, the least foF2, and the times of change.

Kinds: derived. The shares of a normal distribution within and beyond one
standard deviation (0.682689, 0.158655) are those of any table, printed to 6
digits. The pairs of foF2 and fxF2 follow from fx² − fx f_H = fo² (IEC
60050-705:1995, 705-07-40: critical frequency of the extraordinary wave),
printed to 1e-4 MHz. Times of change are worked out by hand from MUFs that are
straight lines in time.
"""

from datetime import UTC, datetime, timedelta

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from magion.answers.certainty import (
    STATES,
    PathMufs,
    StateProbabilities,
    changes,
    confidence_of,
    least_fof2,
    probabilities,
    state_of,
)

megahertz = st.floats(0.5, 25.0)
levels = st.one_of(st.just(0.0), st.just(float("inf")), megahertz)


def total(found):
    return sum(getattr(found, state) for state in STATES)


def present(found):
    """Probability of each wave."""
    return found.both + found.ordinary_only, found.both + found.extraordinary_only


@given(levels, levels, megahertz, st.floats(0.0, 10.0))
def test_probabilities_add_up_to_one(ordinary, extraordinary, mean, deviation):
    found = probabilities((ordinary, extraordinary), mean, deviation)
    assert abs(total(found) - 1.0) < 1e-12
    assert all(0.0 <= getattr(found, state) <= 1.0 for state in STATES)
    # both waves hang on the same foF2: never one without the other on both sides
    assert min(found.ordinary_only, found.extraordinary_only) == 0.0


def test_shares_of_a_normal_distribution():
    found = probabilities((5.4e6, 6.6e6), 6.0e6, 0.6e6)
    assert found.both == pytest.approx(0.158655, abs=5e-7)
    assert found.ordinary_only == pytest.approx(0.682689, abs=1e-6)
    assert found.extraordinary_only == 0.0
    assert found.none == pytest.approx(0.158655, abs=5e-7)
    assert present(probabilities((6.0e6, 6.0e6), 6.0e6, 0.6e6)) == (0.5, 0.5)


@given(megahertz, megahertz, megahertz, st.floats(0.0, 5.0), st.floats(0.0, 3.0))
def test_more_fof2_never_makes_a_wave_less_likely(ordinary, extraordinary, mean, rise, deviation):
    before = probabilities((ordinary, extraordinary), mean, deviation)
    after = probabilities((ordinary, extraordinary), mean + rise, deviation)
    for less, more in zip(present(before), present(after), strict=True):
        assert more >= less - 1e-12
    assert after.none <= before.none + 1e-12


@pytest.mark.parametrize(
    ("ordinary", "extraordinary", "state"),
    [
        (5.0, 4.0, "both"),
        (6.1, 5.5, "extraordinary_only"),
        (5.5, 6.1, "ordinary_only"),
        (6.1, 6.2, "none"),
        (float("inf"), 0.0, "extraordinary_only"),
    ],
)
@pytest.mark.parametrize("deviation", [0.0, 1e-6])
def test_without_doubt_one_state_is_sure(ordinary, extraordinary, state, deviation):
    # 1e-6 MHz is a hundred thousand deviations from every level
    found = probabilities((ordinary, extraordinary), 6.0, deviation)
    assert getattr(found, state) == 1.0
    assert total(found) == 1.0


def test_without_doubt_the_level_itself_is_enough():
    # a wave arrives if the frequency is at or below its MUF
    assert probabilities((6.0, 7.0), 6.0, 0.0).ordinary_only == 1.0


def test_wide_doubt_makes_both_sides_alike():
    found = probabilities((5.0, 7.0), 6.0, 1e6)
    for share in present(found):
        assert share == pytest.approx(0.5, abs=1e-6)


def test_wave_that_cannot_be():
    found = probabilities((5.0, float("inf")), 6.0, 0.7)
    assert found.both == 0.0
    assert found.extraordinary_only == 0.0


@pytest.mark.parametrize("deviation", [0.0, 0.3, 1.0])
def test_wave_that_e_carries_does_not_hang_on_fof2(deviation):
    for mean in (6.0, 9.0):
        found = probabilities((0.0, 7.0), mean, deviation)
        assert present(found)[0] == pytest.approx(1.0, abs=1e-8)  # six deviations and more
        assert found.none == pytest.approx(0.0, abs=1e-8)


def test_wave_that_e_carries_is_sure_even_with_a_wide_doubt():
    found = probabilities((0.0, 0.0), 2.0, 2.0)
    assert found.both == 1.0


@pytest.mark.parametrize(
    ("fof2", "gyro", "fxf2"),
    [(5.0, 1.3, 5.6921), (3.0, 1.3, 3.7196), (8.0, 1.0, 8.5156), (2.0, 1.4, 2.8190)],
)
def test_least_fof2_at_the_vertical_is_that_of_the_critical_frequency(fof2, gyro, fxf2):
    # The MUF is fxF2 there: at an operating frequency of fxF2 of another foF2, that foF2.
    for present_fof2 in (4.0, 6.0, 11.0):
        muf = 0.5 * gyro + (present_fof2**2 + 0.25 * gyro**2) ** 0.5
        found = least_fof2(fxf2 * 1e6, muf * 1e6, present_fof2 * 1e6, gyro * 1e6, False)
        assert found / 1e6 == pytest.approx(fof2, abs=1e-4)


def test_least_fof2_of_the_ordinary_wave_is_in_proportion():
    assert least_fof2(9e6, 18e6, 6e6, 1.3e6, True) == pytest.approx(3e6, rel=1e-12)


@given(
    st.floats(1.5, 15.0), st.floats(0.5, 1.6), st.floats(1.0, 3.5), st.floats(0.6, 1.5),
    st.booleans(),
)  # fmt: skip
def test_with_the_least_fof2_the_muf_is_the_frequency(fof2, gyro, factor, change, ordinary):
    def muf(fo):
        critical = fo if ordinary else 0.5 * gyro + (fo * fo + 0.25 * gyro * gyro) ** 0.5
        return factor * critical

    frequency = change * muf(fof2)
    least = least_fof2(frequency, muf(fof2), fof2, gyro, ordinary)
    if least > 0.0:
        assert muf(least) == pytest.approx(frequency, rel=1e-9)
    assert (least <= fof2) is (change <= 1.0) or change == pytest.approx(1.0, abs=1e-9)


def test_extraordinary_wave_needs_no_fof2_below_the_gyrofrequency():
    # the relation has no root there; 0 says that foF2 is no bound
    assert least_fof2(1.0e6, 6.5e6, 6e6, 1.3e6, False) == 0.0


@pytest.mark.parametrize(
    ("share", "word"),
    [
        (1.0, "high"),
        (0.9, "high"),
        (0.8999, "medium"),
        (0.7, "medium"),
        (0.6999, "low"),
        (0.5, "low"),
        (0.4999, "cannot_tell"),
        (0.0, "cannot_tell"),
    ],
)
@pytest.mark.parametrize("state", STATES)
def test_words_of_confidence(state, share, word):
    values = dict.fromkeys(STATES, (1.0 - share) / 3.0)
    assert confidence_of(StateProbabilities(**{**values, state: share}), state) == word


def test_names_of_the_states():
    assert [state_of(*pair) for pair in ((True, True), (True, False), (False, True))] == [
        "both",
        "ordinary_only",
        "extraordinary_only",
    ]
    assert state_of(False, False) == "none"


MIDNIGHT = datetime(2026, 3, 20, tzinfo=UTC)


def day(ordinary, extraordinary, minutes=60):
    """Moments and MUFs from lists in MHz."""
    moments = [MIDNIGHT + timedelta(minutes=minutes * i) for i in range(len(ordinary))]
    both = np.array([ordinary, extraordinary]) * 1e6
    return moments, PathMufs(any_layer=both, f_region=both)


def seconds(change):
    return (datetime.fromisoformat(change.time_utc) - MIDNIGHT).total_seconds()


def test_changes_of_a_muf_that_rises_and_falls_in_straight_lines():
    # MUF(o) = 4 + 0.5 t up to 10 h (9 MHz), then 9 − 0.8 (t − 10); MUF(x) is 0.65 MHz above.
    t = np.arange(0.0, 20.0)
    ordinary = np.where(t <= 10.0, 4.0 + 0.5 * t, 9.0 - 0.8 * (t - 10.0))
    moments, mufs = day(ordinary, ordinary + 0.65)
    found = changes(moments, mufs, 7.1e6, np.full(20, 0.1))
    # 7.1 MHz: x comes at t = (7.1 − 4.65) / 0.5 = 4.9 h, o at 3.1 / 0.5 = 6.2 h; o goes at
    # 10 + 1.9 / 0.8 = 12.375 h, x at 10 + 2.55 / 0.8 = 13.1875 h.
    expected = [4.9, 6.2, 12.375, 13.1875]
    for change, hour in zip(found, expected, strict=True):
        assert abs(seconds(change) - 3600.0 * hour) <= 1.0  # printed to the second
    assert [c.wave for c in found] == ["extraordinary", "ordinary", "ordinary", "extraordinary"]
    assert [c.comes for c in found] == [True, True, False, False]
    assert [c.state for c in found] == [
        "extraordinary_only", "both", "extraordinary_only", "none",
    ]  # fmt: skip
    # a tenth of 7.1 MHz at 0.5 MHz an hour is 1.42 h, at 0.8 MHz an hour 53.25 min
    assert [c.plus_minus_min for c in found] == pytest.approx([85.2, 85.2, 53.25, 53.25])


def test_changes_between_half_hours():
    # from 6.9 to 7.3 MHz in half an hour: 7.1 is crossed after 15 min, half-way between both
    # deviations; ± 0.125 * 7.1 / 0.8 h
    moments, mufs = day([6.9, 7.3], [8.0, 8.0], minutes=30)
    (found,) = changes(moments, mufs, 7.1e6, np.array([0.05, 0.2]))
    assert abs(seconds(found) - 900.0) <= 1.0
    assert found.plus_minus_min == pytest.approx(66.5625)
    assert found.state == "both"


def test_slow_change_has_no_time_to_speak_of():
    # 0.1 MHz an hour and a tenth of 7.1 MHz: 7.1 h, more than three hours
    moments, mufs = day([7.05, 7.15], [9.0, 9.0])
    (found,) = changes(moments, mufs, 7.1e6, np.full(2, 0.1))
    assert found.plus_minus_min is None
    # and just within: 180 min need 0.1 * 7.1 / 3 = 0.2367 MHz an hour
    moments, mufs = day([7.0, 7.237], [9.0, 9.0])
    (found,) = changes(moments, mufs, 7.1e6, np.full(2, 0.1))
    assert found.plus_minus_min == pytest.approx(60.0 * 0.71 / 0.237)


def test_no_change_no_times():
    for muf in (5.0, 9.0):
        moments, mufs = day([muf] * 4, [muf + 0.6] * 4)
        assert changes(moments, mufs, 7.1e6, np.full(4, 0.1)) == ()


def test_hours_at_which_nothing_arrives_count_as_below():
    moments, mufs = day([np.nan, 8.0, np.nan], [np.nan] * 3)
    found = changes(moments, mufs, 7.1e6, np.full(3, 0.1))
    assert [(c.wave, c.comes, c.state) for c in found] == [
        ("ordinary", True, "ordinary_only"),
        ("ordinary", False, "none"),
    ]


def test_muf_at_the_frequency_itself_arrives():
    moments, mufs = day([6.1, 7.1, 8.1], [9.0] * 3)
    (found,) = changes(moments, mufs, 7.1e6, np.full(3, 0.1))
    assert abs(seconds(found) - 3600.0) <= 1.0
    assert found.comes
