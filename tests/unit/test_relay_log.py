"""Logs of readings on two relay positions."""

import pytest

from magion.errors import InputError
from magion.formats.relay_log import read_relay_log
from magion.geometry import parse_place

HEAD = "time_utc,partner,frequency_mhz,level_left_{u},level_right_{u}\n"
ROW = '2026-12-21T06:40Z,"47.10,10.85",5.3,{a},{b}\n'


def of(tmp_path, text, partners=None):
    file = tmp_path / "log.csv"
    file.write_text(text, encoding="utf-8")
    return read_relay_log(file, partners)


@pytest.mark.parametrize(
    ("unit", "cells", "levels"),
    [
        ("db", ("-3.5", "12"), (-3.5, 12.0)),
        ("dbm", ("-73", "-93.25"), (-73.0, -93.25)),
        # S9 is the zero, 6 dB an S-unit: IARU Region 1 Recommendation R.1
        ("s", ("9", "7"), (0.0, -12.0)),
        ("s", ("9+10", "S 9 + 20 dB"), (10.0, 20.0)),
        ("s", ("5.5", "0"), (-21.0, -54.0)),
    ],
)
def test_units(tmp_path, unit, cells, levels):
    log = of(tmp_path, HEAD.format(u=unit) + ROW.format(a=cells[0], b=cells[1]))
    assert log.labels == ("left", "right")
    assert log.unit == unit
    assert log.readings[0].levels_db == levels
    assert log.readings[0].line == 2


def test_missing_readings_and_names(tmp_path):
    hut = parse_place("47.1,10.85", "Scree Hut")
    text = HEAD.format(u="db") + "2026-12-21T06:40Z,scree hut,5.3,,-4\n"
    log = of(tmp_path, text, {"scree hut": hut})
    assert log.readings[0].levels_db is None
    assert log.readings[0].partner is hut


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("time_utc,partner,frequency_mhz\n", "0 columns of levels"),
        (HEAD.format(u="db").replace("\n", ",level_up_db\n"), "3 columns of levels"),
        ("time_utc,partner,frequency_mhz,level_a_db,level_b_s\n", "different units"),
        ("time_utc,frequency_mhz,level_a_db,level_b_db\n", "partner"),
        (HEAD.format(u="db") + ROW.format(a="loud", b="1"), "level_left_db.*not a number"),
        (HEAD.format(u="db") + ROW.format(a="1", b="900"), "level_right_db.*no level"),
        (HEAD.format(u="s") + ROW.format(a="7+10", b="1"), "only S9 takes"),
        (HEAD.format(u="s") + ROW.format(a="12", b="1"), "S-units"),
        (HEAD.format(u="db") + ROW.format(a="1", b="1").replace("5.3", "0.1"), "0.5 to 60"),
        (HEAD.format(u="db") + ROW.format(a="1", b="1").replace("06:40", "46:40"), "not a time"),
        (HEAD.format(u="db") + ROW.format(a="1", b="1").replace("47.10", "97.10"), "line 2"),
    ],
)
def test_a_wrong_log_is_told_in_one_line(tmp_path, text, words):
    with pytest.raises(InputError, match=words) as error:
        of(tmp_path, text)
    assert len(str(error.value).splitlines()) == 1
