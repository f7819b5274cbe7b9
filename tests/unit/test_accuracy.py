"""The page of accuracies against the rows of the tests and the keys of the schemas.

The deviations themselves are measured by ``python -m tests.accuracy --check``, not here.
"""

import pytest

from tests import accuracy


def test_page_has_the_rows_and_keys_of_today():
    text = accuracy.PAGE.read_text(encoding="utf-8")
    if accuracy.page(accuracy.cells_in(text)) != text:
        pytest.fail(
            "docs/accuracy.md is stale: run python -m tests.accuracy (--keep without new rows)"
        )


def test_every_row_was_measured():
    cells = accuracy.cells_in(accuracy.PAGE.read_text(encoding="utf-8"))
    assert accuracy.NOT_RUN not in cells.values()


def test_every_numeric_key_is_in_a_table():
    names = accuracy.placed()
    assert [k for k, name in names.items() if name is None] == []
    assert len(names) > 150


def test_every_name_of_the_tables_is_a_key():
    texts = (accuracy.ASKED, *accuracy.UNPROVEN.values(), *(q.keys for q in accuracy.QUANTITIES))
    listed = [name for text in texts for name in text.split()]
    assert sorted(listed) == sorted(set(listed))
    assert set(listed) - set(accuracy.placed().values()) == set()


def test_every_check_of_a_quantity_is_there_and_every_row_is_used():
    rows = {row.what for row in accuracy.all_rows()}
    used = {check for q in accuracy.QUANTITIES for check in q.checks}
    assert used - rows - set(accuracy.FILES) == set()
    # What feeds the ionosphere, whose own values no check reaches.
    assert rows - used == {
        "Chapman layer from its assumptions",
        "solar flux of a sunspot number",
        "sunspot number of a solar flux",
    }


def test_every_file_of_checks_is_on_the_page():
    on_it = {row.file for row in accuracy.all_rows()} | set(accuracy.FILES)
    assert set(accuracy.files_of_checks()) - on_it == set()


@pytest.mark.parametrize("row", accuracy.all_rows(), ids=lambda r: r.what)
def test_a_row_says_what_the_head_of_its_file_says(row):
    assert row.layer in accuracy.LAYERS
    assert row.kind in accuracy.kinds_of(row.file)
    if row.kind in ("published", "memory", "reference library"):
        head = " ".join(accuracy.docstring(row.file).split())
        assert row.source.split()[0].rstrip(",") in head
