"""Logs of contacts and lists of paths, row by row: CSV and ADIF."""

import string
from datetime import UTC, datetime

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from magion.errors import InputError
from magion.formats.contacts import LONGEST_RECORD, BadRow, Contact, read_contacts
from magion.geometry import parse_place

HEADER = "time_utc,from,to,frequency_mhz\n"
ROW = '2026-06-21T12:00Z,"47.10,10.85",JN56qm,5.3\n'
RECORD = (
    "<QSO_DATE:8>20260621 <TIME_ON:4>1230 <FREQ:5>7.050\n<GRIDSQUARE:6>JN57kc "
    "<MY_GRIDSQUARE:6>JN56qm <EOR>\n"
)


def of(tmp_path, text, name="rows.csv", here=None):
    file = tmp_path / name
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    return list(read_contacts(file, here))


def test_csv_rows(tmp_path):
    rows = of(tmp_path, "\ufeff# a remark\n" + HEADER + ROW + "\n" + ROW.replace("Z", "+02:00"))
    assert [r.line for r in rows] == [3, 5]
    assert rows[0].time == datetime(2026, 6, 21, 12, tzinfo=UTC)
    assert rows[1].time == datetime(2026, 6, 21, 10, tzinfo=UTC)
    assert (rows[0].transmitter.latitude_deg, rows[0].transmitter.longitude_deg) == (47.1, 10.85)
    assert rows[0].receiver.locator == "JN56qm"
    assert rows[0].frequency_mhz == 5.3
    assert rows[0].note == ""


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("noon,JN57kc,JN56qm,5.3", "is not a time"),
        ("1850-01-01T00:00Z,JN57kc,JN56qm,5.3", "outside the field model"),
        ("2030-01-01T00:00Z,JN57kc,JN56qm,5.3", "outside the field model"),
        ("2026-06-21T12:00Z,ZZ99,JN56qm,5.3", "accepted"),
        ("2026-06-21T12:00Z,JN57kc,nowhere,5.3", "accepted"),
        ("2026-06-21T12:00Z,JN57kc,JN56qm,many", "0.5 to 60 MHz"),
        ("2026-06-21T12:00Z,JN57kc,JN56qm,nan", "0.5 to 60 MHz"),
        ("2026-06-21T12:00Z,JN57kc,JN56qm,0.4", "0.5 to 60 MHz"),
        ("2026-06-21T12:00Z,JN57kc", "2 cells where the header has 4"),
        ('2026-06-21T12:00Z,"JN57kc', "not CSV"),
        ("x" * (LONGEST_RECORD + 1), "too long"),
    ],
)
def test_a_bad_csv_row_is_told_with_its_line(tmp_path, row, words):
    rows = of(tmp_path, HEADER + ROW + row + "\n" + ROW)
    assert [type(r) for r in rows] == [Contact, BadRow, Contact]
    assert rows[1].line == 3
    assert words in rows[1].reason
    assert "\n" not in rows[1].reason


@pytest.mark.parametrize(
    ("text", "name", "words"),
    [
        ("", "rows.csv", "is empty"),
        ("# nothing\n", "rows.csv", "is empty"),
        ("time_utc,from,to\n", "rows.csv", "column frequency_mhz is missing"),
        ('time_utc,"from\n', "rows.csv", "header is not CSV"),
        ("no tags at all", "log.adi", "holds no ADIF record"),
    ],
)
def test_a_file_that_is_no_log(tmp_path, text, name, words):
    with pytest.raises(InputError, match=words):
        of(tmp_path, text, name)


def test_missing_file_and_folder(tmp_path):
    with pytest.raises(InputError, match="does not exist"):
        list(read_contacts(tmp_path / "none.csv"))
    with pytest.raises(InputError, match="not a regular file"):
        list(read_contacts(tmp_path))


def test_adif_records(tmp_path):
    text = "Log of an invented station <ADIF_VER:5>3.1.4 <EOH>\n" + RECORD + RECORD.lower()
    rows = of(tmp_path, text, "log.adi")
    assert [r.line for r in rows] == [2, 4]
    assert all(isinstance(r, Contact) for r in rows)
    assert rows[0].time == datetime(2026, 6, 21, 12, 30, tzinfo=UTC)
    # The partner transmits, the operator receives.
    assert rows[0].transmitter.locator == "JN57kc"
    assert rows[0].receiver.locator == "JN56qm"
    assert rows[0].frequency_mhz == 7.05


def record(**fields):
    base = {
        "QSO_DATE": "20260621", "TIME_ON": "123015", "FREQ": "7.05",
        "GRIDSQUARE": "JN57kc", "MY_GRIDSQUARE": "JN56qm",
    }  # fmt: skip
    wanted = {k: v for k, v in (base | fields).items() if v is not None}
    return "".join(f"<{k}:{len(v)}>{v}" for k, v in wanted.items()) + "<EOR>"


def test_adif_latitude_longitude_and_band(tmp_path):
    text = record(
        FREQ=None, BAND="40M", LAT="S041 30.000", LON="W071 15.000", GRIDSQUARE=None,
        MY_LAT="N046 30.000", MY_LON="E011 21.000",
    )  # fmt: skip
    (row,) = of(tmp_path, text, "log.ADIF")
    assert (row.transmitter.latitude_deg, row.transmitter.longitude_deg) == (-41.5, -71.25)
    assert (row.receiver.latitude_deg, row.receiver.longitude_deg) == (46.5, 11.35)
    assert row.frequency_mhz == pytest.approx(7.15)
    assert row.note == "middle of 40m taken"
    assert row.time.second == 15


def test_adif_takes_the_operators_place_where_the_log_does_not_say_it(tmp_path):
    (row,) = of(tmp_path, record(MY_GRIDSQUARE=None), "log.adi", parse_place("46.5,11.35"))
    assert row.receiver.latitude_deg == 46.5
    (row,) = of(tmp_path, record(MY_GRIDSQUARE=None), "log.adi")
    assert "MY_GRIDSQUARE is missing" in row.reason


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"GRIDSQUARE": None}, "GRIDSQUARE is missing"),
        ({"GRIDSQUARE": "??"}, "accepted"),
        ({"FREQ": None}, "BAND '' is not known"),
        ({"FREQ": None, "BAND": "13cm"}, "is not known"),
        ({"FREQ": None, "BAND": "630m"}, "0.5 to 60 MHz"),
        ({"QSO_DATE": "20261301"}, "is no time"),
        ({"TIME_ON": "12"}, "is no time"),
        ({"TIME_ON": None}, "is no time"),
        ({"QSO_DATE": "18500101"}, "outside the field model"),
        ({"LAT": "N046 70.000", "LON": "E011 00.000"}, "60 minutes"),
        ({"LAT": "N096 00.000", "LON": "E011 00.000"}, "beyond 90"),
        ({"LAT": "46.5", "LON": "E011 00.000"}, "is no angle"),
    ],
)
def test_a_bad_adif_record_is_told_with_its_line(tmp_path, fields, words):
    rows = of(tmp_path, record() + "\n" + record(**fields) + "\n" + record(), "log.adi")
    assert [type(r) for r in rows] == [Contact, BadRow, Contact]
    assert rows[1].line == 2
    assert words in rows[1].reason


def test_a_broken_adif_length_does_not_stop_the_reading(tmp_path):
    rows = of(tmp_path, "<CALL:999999999>X<EOR>\n" + RECORD, "log.adi")
    assert any(isinstance(r, BadRow) and "broken" in r.reason for r in rows)
    cut = of(tmp_path, RECORD + RECORD[:40], "log.adi")
    assert isinstance(cut[0], Contact)
    assert isinstance(cut[-1], BadRow)


def test_a_long_adif_value_is_passed_over(tmp_path):
    note = "n" * (LONGEST_RECORD // 2)
    rows = of(tmp_path, record(NOTES=note) + record(), "log.adi")
    assert [type(r) for r in rows] == [Contact, Contact]


pieces = st.sampled_from(
    [
        HEADER,
        ROW,
        RECORD,
        "<EOH>",
        "<EOR>",
        "<CALL:3>",
        "<FREQ:5>7.050",
        '"',
        ",",
        "\r\n",
        "\n",
        "<",
    ]
)
noise = st.one_of(pieces, st.text(string.printable, max_size=20), st.text(max_size=8))


@settings(max_examples=150, deadline=None)
@given(st.lists(noise, max_size=12).map("".join), st.sampled_from(["f.csv", "f.adi"]))
def test_anything_gives_rows_or_one_line(tmp_path_factory, text, name):
    file = tmp_path_factory.mktemp("fuzz") / name
    file.write_bytes(text.encode("utf-8", "replace"))
    lines = text.count("\n") + text.count("\r") + 2
    rows = []
    try:
        rows = list(read_contacts(file))
    except InputError as error:
        rows = [BadRow(line=1, reason=str(error))]
    assert all(1 <= r.line <= lines for r in rows)
    assert [r.line for r in rows] == sorted(r.line for r in rows)
    assert all(r.reason and len(r.reason.splitlines()) == 1 for r in rows if isinstance(r, BadRow))
