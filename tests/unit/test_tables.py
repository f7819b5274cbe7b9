"""CSV files: line numbers, refusals, names in messages."""

import pytest

from magion.errors import InputError
from magion.formats.tables import LARGEST_FILE, printable, printable_name, read_table


def written(tmp_path, content, name="table.csv"):
    file = tmp_path / name
    file.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return file


def test_lines_of_header_comments_and_rows(tmp_path):
    table = read_table(
        written(tmp_path, b"\xef\xbb\xbf# one\r\n\r\n a , b\r\n1,2\r\n  # two \r\n3,4\r\n"), ("a",)
    )
    assert (table.columns, table.header_line) == (("a", "b"), 3)
    assert (table.comments, table.comment_lines) == (("one", "two"), (1, 5))
    assert [(r.line, r.cells["b"]) for r in table.rows] == [(4, "2"), (6, "4")]


@pytest.mark.parametrize("sign", ["\u2028", "\x85", "\x0b", "\x0c", "\x1c"])
def test_a_separator_within_a_cell_is_no_new_line(tmp_path, sign):
    table = read_table(written(tmp_path, f"# x{sign}y\na,b\n1{sign}2,3\n4,5\n"), ("a",))
    assert [r.line for r in table.rows] == [3, 4]
    assert table.rows[0].cells["a"] == f"1{sign}2"


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("a,b,a\n1,2,3\n", ["line 1", "column a stands twice", "once"]),
        ("# x\nb,a, b \n1,2,3\n", ["line 2", "column b stands twice"]),
        ('a,b\n1,2\n"3,4\n', ["line 3", "not CSV"]),
        ("a,b\n1,2,3\n", ["line 2", "3 cells", "header has 2"]),
        ("b\n1\n", ["line 1", "column a is missing", "accepted: a and more"]),
        (" \n# only a note\n", ["empty", "accepted: CSV with the header a and more"]),
        (b"a\n\xff\n", ["UTF-8"]),
        (b" " * (LARGEST_FILE + 1), ["larger than 16 MiB"]),
    ],
)
def test_refusals(tmp_path, content, words):
    with pytest.raises(InputError) as caught:
        read_table(written(tmp_path, content), ("a",), "a and more")
    assert "table.csv" in str(caught.value)
    for word in words:
        assert word in str(caught.value)


def test_columns_without_a_name_may_repeat(tmp_path):
    assert read_table(written(tmp_path, "a,,\n1,,\n"), ("a",)).columns == ("a", "", "")


def test_a_long_file_name_keeps_its_end(tmp_path):
    name = "x" * 100 + "table.csv"
    with pytest.raises(InputError, match=r"file \.\.\.x+table\.csv does not exist"):
        read_table(tmp_path / name, ("a",))
    assert len(printable_name(tmp_path / name)) == 80
    assert printable_name("a\x1b.csv") == "a\\x1b.csv"


def test_printable_is_short_and_escapes():
    assert printable("a\x1b[2J\n") == "a\\x1b[2J\\n"
    assert printable("x" * 80) == "x" * 80
    assert printable("x" * 81) == printable("x" * 500) == "x" * 77 + "..."
