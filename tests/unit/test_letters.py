"""Values with the letters of the URSI handbook (kind: memory)."""

import math
import re
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from magion.formats.letters import (
    ALONE_QUALIFYING,
    DESCRIPTIVE,
    QUALIFYING,
    ScaledValue,
    parse_scaled,
)


@pytest.mark.parametrize(
    ("text", "value", "letters"),
    [
        ("7.2", 7.2, ""),
        (" 7.2 ", 7.2, ""),
        ("+7.2", 7.2, ""),
        ("-7.2", -7.2, ""),
        ("7.", 7.0, ""),
        (".7", 0.7, ""),
        ("7.2UF", 7.2, "UF"),
        ("7.2 uf", 7.2, "UF"),
        ("5.1EA", 5.1, "EA"),
        ("4.0-F", 4.0, "-F"),
        ("4.0/F", 4.0, "-F"),
        ("4.0U-", 4.0, "U"),
        ("4.0U/", 4.0, "U"),
        ("4.0--", 4.0, ""),
        ("4.0-", 4.0, ""),
        ("4.0U", 4.0, "U"),
        ("4.0D", 4.0, "D"),
        ("4.0E", 4.0, "E"),
        ("4.0A", 4.0, "-A"),  # sporadic E, not "at most"
        ("4.0F", 4.0, "-F"),
        ("C", math.nan, "C"),
        ("-C", math.nan, "C"),
        ("/b", math.nan, "B"),
        ("E", math.nan, "E"),
        ("EG", math.nan, "G"),
        ("", math.nan, ""),
        ("  ", math.nan, ""),
    ],
)
def test_number_and_letters(text, value, letters):
    found = parse_scaled(text)
    assert found.value == value or (math.isnan(found.value) and math.isnan(value))
    assert found.letters == letters


@pytest.mark.parametrize(
    "text",
    ["7,2", "7.2FU", "7.2UFF", "7.2UJ", "7.2?", "7.2e6", "7.2.1", "1_0", "nan", "inf", "NA", "-",
     "/", "--", "U", "I", "J", "U-", "x7", "7 2", "٧", "7.2\x00"],
)  # fmt: skip
def test_other_text_is_no_value(text):
    assert parse_scaled(text) is None


def test_whole_numbers():
    assert parse_scaled("72UF", whole=True) == ScaledValue(
        value=72.0, qualifying="U", descriptive="F"
    )
    assert parse_scaled("7.2", whole=True) is None
    assert parse_scaled("72.", whole=True) is None
    assert parse_scaled("C", whole=True).descriptive == "C"


def test_meaning():
    assert parse_scaled("7.2UF").meaning == "uncertain, spread echoes"
    assert parse_scaled("7.2D").meaning == "greater than this value"
    assert parse_scaled("7.2-D").meaning == "the upper end of the frequency range"
    assert parse_scaled("7.2").meaning == ""


def test_the_alphabet():
    # All that the handbook knows: the qualifying ones, and A to Z without I, J and U.
    assert "".join(QUALIFYING) == "ADEIJMOTUZ"
    assert "".join(DESCRIPTIVE) == "ABCDEFGHKLMNOPQRSTVWXYZ"
    assert set(ALONE_QUALIFYING) <= set(QUALIFYING)
    assert set(QUALIFYING) - set(DESCRIPTIVE) <= set(ALONE_QUALIFYING)


def test_the_page_has_the_same_letters():
    page = Path(__file__).parents[2] / "docs" / "formats.md"
    found = re.findall(
        r"^\| ([A-Z]) \|(.*)\|(.*)\|$", page.read_text(encoding="utf-8"), re.MULTILINE
    )
    assert {a: b.strip() for a, b, _ in found if b.strip()} == dict(QUALIFYING)
    assert {a: c.strip() for a, _, c in found if c.strip()} == dict(DESCRIPTIVE)


@given(st.floats(0.1, 30.0), st.sampled_from("-/ADEIJMOTUZ"), st.sampled_from(list(DESCRIPTIVE)))
def test_what_is_written_is_read(number, first, second):
    found = parse_scaled(f"{number:.2f}{first}{second}")
    assert found.value == float(f"{number:.2f}")
    assert found.qualifying == first.strip("-/")
    assert found.descriptive == second


@given(st.text(max_size=12), st.booleans())
def test_any_text_is_a_value_or_none(text, whole):
    found = parse_scaled(text, whole=whole)
    assert found is None or isinstance(found.meaning, str)
