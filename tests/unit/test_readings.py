"""Readings of an ionosonde. The interpolated values are worked by hand from the rows."""

import math
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from magion.errors import InputError
from magion.formats.readings import peak_height_of_m3000, read_readings

EXAMPLE = Path(__file__).parents[2] / "examples" / "readings.csv"
PLAIN = "time_utc,fof2_mhz\n"


def utc(hour, minute=0, second=0, day=21):
    return datetime(2026, 12, day, hour, minute, second, tzinfo=UTC)


def lines(header, *rows):
    """A file of one day; each row begins with HH:MM."""
    return header + "\n" + "".join(f"2026-12-21T{row[:5]}Z{row[5:]}\n" for row in rows)


def written(tmp_path, content):
    file = tmp_path / "readings.csv"
    file.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return file


@pytest.fixture
def read(tmp_path):
    return lambda content: read_readings(written(tmp_path, content))


def refusal(act):
    with pytest.raises(InputError) as caught:
        act()
    line = str(caught.value)
    assert "readings.csv" in line
    assert line.isprintable()
    return line


# Reading the file


def test_all_columns_in_si(read):
    found = read(
        lines(
            "time_utc,fof2_mhz,hmf2_km,m3000f2,foe_mhz,fxi_mhz,fof2_error_mhz",
            "12:00,7.2,230,3.2,2.4,8.1,0.2",
            "12:30,7.3,,,,,",
        )
    )
    assert found.file.endswith("readings.csv")
    assert found.place is None
    assert found.time[0] == utc(12).timestamp()
    assert found.time[1] - found.time[0] == 1800.0
    for values, first in (
        (found.fof2, 7.2e6),
        (found.hmf2, 230e3),
        (found.m3000, 3.2),
        (found.foe, 2.4e6),
        (found.fxi, 8.1e6),
        (found.fof2_error, 0.2e6),
    ):
        assert values[0] == first
    assert found.fof2[1] == 7.3e6
    for values in (found.hmf2, found.m3000, found.foe, found.fxi, found.fof2_error):
        assert np.isnan(values[1])
    assert found.notes == ("", "")
    assert found.ignored_columns == ()


def test_as_other_programs_write_it(read):
    text = (
        "\ufeff# a note, of the station\r\n#PLACE :  46.80N, 11.10E ,,,\r\n\r\n"
        ' foe_mhz , remark,time_utc,"fof2_mhz",\r\n'
        '2.4,"bright, calm",2026-12-21T12:00:00Z, 7.2UF ,\r\n'
        ",,,,\r\n"
        ",x,2026-12-21T13:30+01:00,7.3,\r\n"
        "  # the end\r\n"
    )
    found = read(text)
    assert (found.place.latitude_deg, found.place.longitude_deg) == (46.8, 11.1)
    assert found.ignored_columns == ("remark",)
    assert list(found.fof2) == [7.2e6, 7.3e6]
    assert found.time[1] == utc(12, 30).timestamp()
    assert found.notes == ("foF2 marked UF: uncertain, spread echoes", "")


def test_place_as_locator(read):
    place = read("# place: JN56mt\n" + lines("time_utc,fof2_mhz", "12:00,7")).place
    assert place.latitude_deg == pytest.approx(46.8125, abs=1e-9)
    assert place.longitude_deg == pytest.approx(11.0417, abs=1e-4)


def test_tenths(read):
    found = read(
        lines("time_utc,fof2_tenths_mhz,foe_tenths_mhz,fxi_tenths_mhz", "12:00,72UF,24,081")
    )
    assert (found.fof2[0], found.foe[0], found.fxi[0]) == (7.2e6, 2.4e6, 8.1e6)
    assert found.at(utc(12)).fof2_error == 0.3e6


@pytest.mark.parametrize("k", range(50, 2500, 7))
def test_hundredths_of_a_megahertz_are_whole_hertz(read, k):
    assert read(lines("time_utc,fof2_mhz", f"12:00,{k / 100:.2f}")).fof2[0] == k * 10_000


def test_letters_alone_tell_why_there_is_no_value(read):
    found = read(lines("time_utc,fof2_mhz,foe_mhz,hmf2_km", "12:00,C,EB,-W", "12:30,7.0,2.4U,230"))
    assert np.isnan(found.fof2[0])
    assert found.notes[0] == (
        "no foF2, C: equipment or another cause outside the ionosphere; "
        "no hmF2, W: echo outside the height range; "
        "no foE, B: absorption near the lowest frequency seen"
    )
    assert found.notes[1] == "foE marked U: uncertain"


def test_extraordinary_values_are_not_taken(read):
    found = read(
        lines("time_utc,fof2_mhz,fxi_mhz", "12:00,7.9-X,", "12:30,,8.1-X", "13:00,7.2JX,8.0")
    )
    assert list(np.isfinite(found.fof2)) == [False, False, True]
    assert found.notes[0] == "foF2 marked -X: of the extraordinary wave, not taken for foF2"
    assert found.notes[1].endswith("fxI, the top of spread F, is not taken for foF2")
    assert found.notes[2].startswith("foF2 marked JX: deduced from the extraordinary wave")
    assert found.fxi[1] == 8.1e6


# Wrong files


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", ["empty", "fof2_tenths_mhz"]),
        ("# place: 46,11\n", ["empty"]),
        ("fof2_mhz\n7\n", ["line 1", "time_utc is missing", "fof2_tenths_mhz"]),
        ("# x\ntime_utc,hmf2_km\n", ["line 2", "fof2_mhz is missing", "fof2_tenths_mhz"]),
        ("time_utc,fof2_mhz,fof2_mhz\n", ["line 1", "fof2_mhz stands twice"]),
        ("time_utc,x,fof2_mhz,x\n", ["line 1", "column x stands twice"]),
        ("\ntime_utc,fof2_mhz,fof2_tenths_mhz\n", ["line 2", "fof2_tenths_mhz", "one of them"]),
        ("time_utc,fof2_mhz,foe_mhz,foe_tenths_mhz\n", ["line 1", "foe_tenths_mhz", "one of"]),
        ("time_utc,fof2_mhz,fxi_tenths_mhz,fxi_mhz\n", ["line 1", "fxi_mhz", "one of them"]),
        (PLAIN, ["fof2_mhz has no value", "at least one"]),
        (PLAIN + "2026-12-21T12:00Z,\n2026-12-21T12:30Z,C\n", ["fof2_mhz has no value"]),
        (PLAIN + "2026-12-21T12:00Z,7,1\n", ["line 2", "3 cells"]),
        (PLAIN + '2026-12-21T12:00Z,"7\n', ["line 2", "not CSV"]),
        ("# place: 95,11\n" + PLAIN, ["line 1", "95", "-90 to 90"]),
        ("#\n# place: Larch Hut\n" + PLAIN, ["line 2", "'Larch Hut'", "LAT,LON", "locator"]),
        ("# place:\n" + PLAIN, ["line 1", "''", "LAT,LON"]),
        ("# place: " + "\x1b" * 99 + "\n" + PLAIN, ["line 1", "...", "LAT,LON"]),
        ("# place: 46,11\n#\n# place: 46,12\n" + PLAIN, ["line 3", "line 1", "already"]),
        (b"\x00\x01\x02", ["line 1", "missing"]),
        (b"\xff\xfe\x00", ["UTF-8"]),
    ],
)
def test_wrong_file(tmp_path, text, words):
    line = refusal(lambda: read_readings(written(tmp_path, text)))
    for word in words:
        assert word in line


def test_what_is_no_file(tmp_path):
    with pytest.raises(InputError, match="not a regular file"):
        read_readings(tmp_path)
    with pytest.raises(InputError, match="does not exist"):
        read_readings(tmp_path / "none.csv")


@pytest.mark.parametrize(
    ("time", "words"),
    [
        ("", ["''", "not a time", "2026-06-21T12:00Z"]),
        ("noon", ["'noon'", "not a time"]),
        ("12:00", ["'12:00'", "not a time"]),
        ("2026-12-21T25:00Z", ["25:00", "not a time"]),
        ("2026-12-21T12:00", ["'2026-12-21T12:00'", "no zone", "2026-06-21T12:00Z"]),
        ("2026-12-21", ["no zone"]),
        ("1899-12-31T23:59Z", ["1899", "1900-01-01 to 2030-01-01"]),
        ("2030-01-01T00:01Z", ["2030", "1900-01-01 to 2030-01-01"]),
        ("0001-01-01T00:00+05:00", ["0001", "out of range"]),
        ("9999-12-31T23:00-05:00", ["9999", "out of range"]),
        ("2026-12-21T11:30Z", ["'2026-12-21T11:30Z'", "is not after that of line 3", "increase"]),
        ("2026-12-21T13:00+01:00", ["is also that of line 3"]),
        ("2026\x1b-12-21", ["\\x1b", "not a time"]),
    ],
)
def test_wrong_time(tmp_path, time, words):
    text = "# x\n" + PLAIN + f"2026-12-21T12:00Z,7\n\n{time},7\n"
    line = refusal(lambda: read_readings(written(tmp_path, text)))
    for word in ["line 5", "column time_utc", *words]:
        assert word in line


@pytest.mark.parametrize(
    ("column", "cell", "words"),
    [
        ("fof2_mhz", "0", ["'0'", "0.5 to 25 MHz"]),
        ("fof2_mhz", "99", ["'99'", "0.5 to 25 MHz"]),
        ("fof2_mhz", "-7.2", ["'-7.2'", "0.5 to 25 MHz"]),
        ("fof2_mhz", "25.1UF", ["'25.1UF'", "0.5 to 25 MHz"]),
        ("fof2_mhz", "9" * 400, ["999...'", "0.5 to 25 MHz"]),
        ("fof2_mhz", "7.2FU", ["'7.2FU'", "qualifying", "empty cell"]),
        ("fof2_mhz", "nan", ["'nan'", "a number", "letter alone (C)"]),
        ("fof2_mhz", "-", ["'-'", "empty cell"]),
        ("fof2_mhz", '"7,2"', ["'7,2'", "a number"]),
        ("fof2_mhz", "7\x1b[2J", ["\\x1b[2J", "a number"]),
        ("fof2_tenths_mhz", "7.2", ["'7.2'", "whole number as 72"]),
        ("fof2_tenths_mhz", "4", ["'4'", "5 to 250 tenths"]),
        ("fof2_tenths_mhz", "720", ["'720'", "5 to 250 tenths"]),
        ("hmf2_km", "149", ["'149'", "150 to 600 km"]),
        ("hmf2_km", "601", ["'601'", "150 to 600 km"]),
        ("m3000f2", "1.4", ["'1.4'", "1.5 to 5"]),
        ("m3000f2", "320", ["'320'", "1.5 to 5"]),
        ("foe_mhz", "0", ["'0'", "0.1 to 10 MHz"]),
        ("foe_mhz", "11", ["'11'", "0.1 to 10 MHz"]),
        ("foe_mhz", "7.1", ["foE 7.1 MHz", "above foF2 7 MHz"]),
        ("foe_tenths_mhz", "71", ["foE 7.1 MHz", "above foF2 7 MHz"]),
        ("foe_tenths_mhz", "101", ["'101'", "1 to 100 tenths"]),
        ("fxi_mhz", "31", ["'31'", "0.5 to 30 MHz"]),
        ("fxi_tenths_mhz", "301", ["'301'", "5 to 300 tenths"]),
        ("fof2_error_mhz", "-0.1", ["-0.1", "0 to 10 MHz"]),
        ("fof2_error_mhz", "10.1", ["10.1", "0 to 10 MHz"]),
        ("fof2_error_mhz", "U", ["'U'", "not a number"]),
        ("fof2_error_mhz", "inf", ["'inf'", "finite"]),
    ],
)
def test_wrong_value(tmp_path, column, cell, words):
    if column in ("fof2_mhz", "fof2_tenths_mhz"):
        text = f"time_utc,{column}\n2026-12-21T12:00Z,\n2026-12-21T12:30Z,{cell}\n"
    else:
        text = f"time_utc,fof2_mhz,{column}\n2026-12-21T12:00Z,7,\n2026-12-21T12:30Z,7,{cell}\n"
    line = refusal(lambda: read_readings(written(tmp_path, text)))
    for word in ["line 3", f"column {column}", *words]:
        assert word in line


@pytest.mark.parametrize(
    "row", ["0.5,150,5,0.1,0.5,0", "25,600,1.5,10,30,10", "10,600,1.5,10,30,10"]
)
def test_ends_of_the_ranges_are_accepted(read, row):
    read(lines("time_utc,fof2_mhz,hmf2_km,m3000f2,foe_mhz,fxi_mhz,fof2_error_mhz", f"12:00,{row}"))


# Between the readings

TWO = lines("time_utc,fof2_mhz,hmf2_km,foe_mhz", "12:00,7.0,230,2.4", "13:00,7.6,242,2.2")


def test_at_a_reading(read):
    found = read(TWO).at(utc(12))
    assert (found.fof2, found.hmf2, found.foe) == (7e6, 230e3, 2.4e6)
    assert (found.age, found.time, found.fof2_error, found.caveats) == (0.0, utc(12), None, ())


def test_linear_in_time(read):
    # a quarter of the way: 7.0 + 0.6 / 4, 230 + 12 / 4, 2.4 - 0.2 / 4
    found = read(TWO).at(utc(12, 15))
    assert found.fof2 == pytest.approx(7.15e6, abs=1e-3)
    assert found.hmf2 == pytest.approx(233e3, abs=1e-6)
    assert found.foe == pytest.approx(2.35e6, abs=1e-3)
    assert (found.age, found.time) == (900.0, utc(12))
    assert found.caveats == (
        "Interpolated over 60 min, from the readings of 2026-12-21T12:00Z and "
        "2026-12-21T13:00Z: foF2, hmF2, foE.",
    )
    # two thirds: 7.0 + 0.4; the nearest is the later one, 20 min away
    found = read(TWO).at(utc(12, 40))
    assert found.fof2 == pytest.approx(7.4e6, abs=1e-3)
    assert (found.age, found.time) == (1200.0, utc(13))
    assert found.caveats[-1] == "The nearest reading of foF2 (2026-12-21T13:00Z) is 20 min away."


def test_the_zone_of_the_question_does_not_matter(read):
    readings = read(TWO)
    asked = datetime(2026, 12, 21, 13, 15, tzinfo=timezone(timedelta(hours=1)))
    assert readings.at(asked) == readings.at(utc(12, 15))
    assert readings.at(utc(12, 15).replace(tzinfo=None)) == readings.at(utc(12, 15))


def test_rows_without_a_value_are_bridged_up_to_two_hours(read):
    readings = read(lines("time_utc,fof2_mhz", "10:00,6.0", "11:00,C", "12:00,7.0", "14:01,8.0"))
    found = readings.at(utc(11))
    assert found.fof2 == pytest.approx(6.5e6, abs=1e-3)
    assert found.age == 3600.0
    assert found.caveats == (
        "Reading of 2026-12-21T11:00Z: no foF2, C: equipment or another cause outside the "
        "ionosphere.",
        "Interpolated over 120 min, from the readings of 2026-12-21T10:00Z and "
        "2026-12-21T12:00Z: foF2.",
        "The nearest reading of foF2 (2026-12-21T10:00Z) is 60 min away.",
    )
    line = refusal(lambda: readings.at(utc(13)))
    for words in (
        "no foF2 for 2026-12-21T13:00Z",
        "none between 2026-12-21T12:00Z and 2026-12-21T14:01Z",
        "covered: 2026-12-21T09:30Z to 2026-12-21T12:30Z, 2026-12-21T13:31Z to 2026-12-21T14:31Z",
    ):
        assert words in line


def test_a_gap_tells_the_letters_within(read):
    readings = read(
        lines("time_utc,fof2_mhz", "10:00,6", "11:00,B", "12:00,B", "12:30,", "13:00,7")
    )
    line = refusal(lambda: readings.at(utc(11, 30)))
    assert line.count("no foF2, B: absorption") == 1


def test_half_an_hour_around_the_readings(read):
    readings = read(
        lines("time_utc,fof2_mhz,hmf2_km,foe_mhz", "08:00,5,250,", "08:30,5.5,,1.9", "12:00,7,,")
    )
    assert readings.covered == (
        (utc(7, 30), utc(9)),
        (utc(11, 30), utc(12, 30)),
    )
    before = readings.at(utc(7, 30))
    assert (before.fof2, before.hmf2, before.foe) == (5e6, 250e3, None)
    assert (before.age, before.time) == (1800.0, utc(8))
    assert before.caveats == ("The nearest reading of foF2 (2026-12-21T08:00Z) is 30 min away.",)
    # beside a gap as at the end of the file, foE and hmF2 of the same row
    beside = readings.at(utc(8, 40))
    assert (beside.fof2, beside.hmf2, beside.foe) == (5.5e6, None, 1.9e6)
    assert beside.caveats == ()
    assert readings.at(utc(11, 30)).fof2 == 7e6
    assert readings.at(utc(12, 30)).fof2 == 7e6
    for outside, words in (
        (utc(7, 29, 59), "no foF2 for 2026-12-21T07:29:59Z: the first is of 2026-12-21T08:00Z"),
        (utc(12, 31), "the last is of 2026-12-21T12:00Z"),
        (utc(9, 1), "there is none between 2026-12-21T08:30Z and 2026-12-21T12:00Z"),
        (utc(12, day=22), "the last is of 2026-12-21T12:00Z"),
        (datetime.max, "the last is of"),
        (datetime.min, "the first is of"),
    ):
        line = refusal(lambda outside=outside: readings.at(outside))
        assert words in line
        assert "covered: 2026-12-21T07:30Z to 2026-12-21T09:00Z, 2026-12-21T11:30Z to" in line


def test_many_gaps_stay_one_short_line(read):
    readings = read(lines("time_utc,fof2_mhz", *(f"{h:02d}:00,7" for h in range(0, 24, 3))))
    line = refusal(lambda: readings.at(utc(13, 30)))
    assert line.endswith("and 5 more stretches")
    assert "2026-12-21T11:30Z to 2026-12-21T12:30Z, 2026-12-21T14:30Z to" in line


def test_hmf2_and_foe_come_from_their_own_rows(read):
    readings = read(
        lines(
            "time_utc,fof2_mhz,hmf2_km,foe_mhz",
            "10:00,6.0,240,2.0",
            "11:00,6.4,,",
            "12:00,7.0,230,",
            "13:00,7.2,,2.4",
        )
    )
    # half-way 11:00-12:00; hmF2 three quarters from 10:00 to 12:00; foE's rows are 3 h apart
    found = readings.at(utc(11, 30))
    assert found.fof2 == pytest.approx(6.7e6, abs=1e-3)
    assert found.hmf2 == pytest.approx(232.5e3, abs=1e-6)
    assert found.foe is None
    assert [c for c in found.caveats if "hmF2" in c] == [
        "Interpolated over 120 min, from the readings of 2026-12-21T10:00Z and "
        "2026-12-21T12:00Z: hmF2."
    ]
    # at a row without an own height the rows around it are taken
    assert readings.at(utc(11)).hmf2 == pytest.approx(235e3, abs=1e-6)
    assert readings.at(utc(12, 30)).hmf2 is None


def test_peak_height_of_m3000():
    # 1490 / 3 - 176 = 320.6667; 1490 / 3.2 - 176 = 289.625
    assert peak_height_of_m3000([3.0, 3.2]) == pytest.approx([320_666.667, 289_625.0], abs=1e-3)
    assert np.isnan(peak_height_of_m3000(np.nan))


def test_hmf2_of_m3000_is_flagged(read):
    readings = read(
        lines("time_utc,fof2_mhz,hmf2_km,m3000f2", "12:00,7,,3.2", "13:00,7,,3.0", "14:00,7,240,3")
    )
    found = readings.at(utc(12, 30))
    assert found.hmf2 == pytest.approx((289.625e3 + 320.6666667e3) / 2, abs=0.1)
    assert any("M(3000)F2 as 1490 / M - 176 km" in c for c in found.caveats)
    assert readings.at(utc(14)).hmf2 == 240e3
    assert not any("M(3000)F2" in c for c in readings.at(utc(14)).caveats)


def test_m3000_without_a_height_in_range(read):
    # 1490 / 1.6 - 176 = 755 km, 1490 / 5 - 176 = 122 km
    readings = read(lines("time_utc,fof2_mhz,m3000f2", "12:00,7,1.6", "13:00,7,5.0UF"))
    assert readings.at(utc(12)).hmf2 is None
    assert "M(3000)F2 1.6 gives no height within 150 to 600 km" in readings.at(utc(12)).caveats[0]
    assert "marked UF: uncertain, spread echoes; M(3000)F2 5 gives" in readings.notes[1]


def test_foe_above_fof2_between_the_rows_is_left_out(read):
    # at 13:00 foF2 is half-way from 4 to 2, foE two thirds of the way from 3.9 to 3.7
    readings = read(lines("time_utc,fof2_mhz,foe_mhz", "12:00,4,3.9", "13:30,,3.7", "14:00,2,"))
    reading = readings.at(utc(13))
    assert reading.fof2 == pytest.approx(3e6, abs=1e-3)
    assert reading.foe is None
    assert any("foE between the readings would lie above foF2" in c for c in reading.caveats)


def test_letters_of_the_rows_used_are_told_once(read):
    readings = read(lines("time_utc,fof2_mhz", "10:00,6-F", "10:30,6-F", "11:00,6UF", "11:30,6"))
    assert readings.at(utc(10, 15)).caveats[0] == (
        "Readings from 2026-12-21T10:00Z to 2026-12-21T10:30Z: foF2 marked -F: spread echoes."
    )
    assert readings.at(utc(11)).caveats == (
        "Reading of 2026-12-21T11:00Z: foF2 marked UF: uncertain, spread echoes.",
    )
    assert readings.at(utc(11, 30)).caveats == ()


@pytest.mark.parametrize(
    ("cell", "error"),
    [("7U", 0.3e6), ("7UF", 0.3e6), ("7D", 0.5e6), ("7EA", 0.5e6), ("7AA", 0.5e6), ("7A", None),
     ("7-F", None), ("7IC", None), ("7", None)],
)  # fmt: skip
def test_error_by_the_qualifying_letter(read, cell, error):
    readings = read(lines("time_utc,fof2_mhz", f"12:00,{cell}", "13:00,7"))
    assert readings.at(utc(12)).fof2_error == error
    assert readings.at(utc(13)).fof2_error is None
    # half an hour adds 0.075 MHz in quadrature, and the row without a letter nothing
    between = readings.at(utc(12, 30)).fof2_error
    assert between is None if error is None else between == pytest.approx(
        math.sqrt(error**2 + 0.075e6**2), abs=1e-3
    )  # fmt: skip


def test_error_of_the_file_goes_before_that_of_the_letter(read):
    readings = read(
        lines("time_utc,fof2_mhz,fof2_error_mhz", "12:00,7UF,0.2", "13:00,7,0.4", "14:00,7DF,")
    )
    assert readings.at(utc(12)).fof2_error == 0.2e6
    # 0.25 MHz by interpolation and 0.0375 MHz for a quarter of an hour: 0.252797
    assert readings.at(utc(12, 15)).fof2_error == pytest.approx(0.252797e6, abs=1.0)
    assert readings.at(utc(14)).fof2_error == 0.5e6
    # held for 20 min: 0.05 MHz
    assert readings.at(utc(14, 20)).fof2_error == pytest.approx(math.hypot(0.5e6, 0.05e6), abs=1e-3)


# The example, and anything at all


def test_example():
    readings = read_readings(EXAMPLE)
    assert (readings.place.latitude_deg, readings.place.longitude_deg) == (46.8, 11.1)
    assert readings.covered == ((utc(23, 30, day=20), utc(0, day=22)),)
    assert np.all(np.diff(readings.time) == 1800.0)
    assert np.isnan(readings.fof2).sum() == 1
    lowest = readings.time[np.nanargmin(readings.fof2)]
    assert utc(5).timestamp() <= lowest <= utc(6).timestamp()
    assert "Invented for the demo" in EXAMPLE.read_text(encoding="utf-8").splitlines()[0]
    for minutes in range(0, 24 * 60, 10):
        found = readings.at(utc(0) + timedelta(minutes=minutes))
        assert 2e6 < found.fof2 < 8e6
        assert found.hmf2 is not None
    assert readings.at(utc(12)).foe == 2.4e6
    assert readings.at(utc(2)).foe is None


@pytest.fixture(scope="module")
def anywhere(tmp_path_factory):
    return tmp_path_factory.mktemp("fuzz") / "readings.csv"


def told(act):
    """What a call returns, or None if it refuses in one line."""
    try:
        return act()
    except InputError as error:
        line = str(error)
    assert line.isprintable()
    return None


def survives(file, content, when):
    """Only an InputError in one line may come out."""
    file.write_bytes(content)
    readings = told(lambda: read_readings(file))
    if readings is None:
        return
    assert np.isfinite(readings.fof2).any()
    assert len(readings.notes) == readings.time.size
    first, last = readings.covered[0][0], readings.covered[-1][1]
    for asked in (when, first, last):
        found = told(lambda asked=asked: readings.at(asked))
        if found is None:
            continue
        assert 0.5e6 <= found.fof2 <= 25e6
        assert found.hmf2 is None or 150e3 <= found.hmf2 <= 600e3
        assert found.foe is None or 0.1e6 <= found.foe <= found.fof2
        assert found.fof2_error is None or found.fof2_error >= 0.0
        assert 0.0 <= found.age <= 3600.0
        assert all(c.isprintable() for c in found.caveats)


@given(st.binary(max_size=400))
def test_any_bytes(anywhere, content):
    survives(anywhere, content, utc(12))


CELL = st.one_of(
    st.text(max_size=8),
    st.from_regex(r"[0-9]{1,2}\.[0-9][ADEIJMOTUZ/-]?[A-Z]?", fullmatch=True),
    st.sampled_from(["", "C", "7.2UF", "3.1", "300", "0.4", "2.0", "nan", "-", "1e9", '"', '","']),
)
COLUMNS = ["hmf2_km", "m3000f2", "foe_mhz", "foe_tenths_mhz", "fxi_mhz", "fof2_error_mhz", "x\x07"]
GOOD = {
    "fof2_mhz": ["4.2", "7.1UF", "5.0DX", "6JX", "C", "", "3.4E"],
    "hmf2_km": ["", "150", "600U", "W", "301.5"],
    "m3000f2": ["", "1.5", "5", "3.1", "2.9UF"],
    "foe_mhz": ["", "3.3", "0.1", "A", "2.0U"],
    "fxi_mhz": ["", "8", "8.2-X"],
    "fof2_error_mhz": ["", "0", "0.3"],
}


@given(st.data())
@settings(max_examples=150)
def test_any_cells(anywhere, data):
    names = ["time_utc", "fof2_mhz", *data.draw(st.lists(st.sampled_from(COLUMNS), unique=True))]
    rows = data.draw(st.lists(st.tuples(*[CELL] * len(names)), max_size=4))
    text = "\n".join([",".join(names), *(",".join(r) for r in rows)])
    survives(anywhere, text.encode("utf-8", "surrogatepass"), utc(12))


@given(st.data())
@settings(max_examples=150)
def test_any_good_file(anywhere, data):
    gaps = data.draw(st.lists(st.integers(1, 200 * 60), min_size=1, max_size=12))
    times = utc(0) + np.cumsum([timedelta(seconds=s) for s in gaps])
    rows = [
        ",".join([t.isoformat(), *(data.draw(st.sampled_from(v)) for v in GOOD.values())])
        for t in times
    ]
    asked = times[0] + timedelta(seconds=data.draw(st.integers(-4000, sum(gaps) + 4000)))
    survives(anywhere, "\n".join(["time_utc," + ",".join(GOOD), *rows]).encode(), asked)


@given(st.datetimes(), st.floats(0.5, 25.0), st.floats(0.5, 25.0), st.floats(0.0, 1.0))
def test_the_value_lies_between_its_neighbours(anywhere, when, first, last, share):
    start = when.replace(year=2000 + when.year % 29, tzinfo=UTC) if when.month > 2 else utc(6)
    stop = start + timedelta(hours=2)
    anywhere.write_text(
        f"time_utc,fof2_mhz\n{start.isoformat()},{first:.6f}\n{stop.isoformat()},{last:.6f}\n"
    )
    readings = read_readings(anywhere)
    found = readings.at(start + share * timedelta(hours=2))
    low, high = sorted(readings.fof2)
    assert low - 1e-3 <= found.fof2 <= high + 1e-3
    assert not any(math.isnan(v) for v in (found.fof2, found.age))
