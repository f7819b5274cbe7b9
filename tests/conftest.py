"""Settings shared by the tests: property tests draw the same examples every time.

``--accuracy FILE`` writes the largest deviation of every row of docs/accuracy.md that was asserted.
"""

import json
from pathlib import Path

import pytest
from hypothesis import settings

from tests import proof

settings.register_profile("seeded", derandomize=True, database=None, deadline=None)
settings.load_profile("seeded")


def pytest_addoption(parser):
    parser.addoption("--accuracy", metavar="FILE", help="write the largest deviations as JSON")


def pytest_sessionfinish(session):
    config = session.config
    if hasattr(config, "workeroutput"):  # one of several processes
        config.workeroutput["accuracy"] = proof.largest
    elif file := config.getoption("--accuracy"):
        Path(file).write_text(json.dumps(proof.largest, indent=1), encoding="utf-8")


@pytest.hookimpl(optionalhook=True)
def pytest_testnodedown(node, error):
    """Several processes: the largest of each row over all of them."""
    for what, off in getattr(node, "workeroutput", {}).get("accuracy", {}).items():
        proof.largest[what] = max(off, proof.largest.get(what, 0.0))
