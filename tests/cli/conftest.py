"""Fixtures of whole commands."""

import pytest

from tests.demo import CEDAR, LARCH, STATIONS, TRACED, traced_once


@pytest.fixture(scope="module")
def once():
    """Rays of one case are traced once, whatever is asked of them."""
    with pytest.MonkeyPatch.context() as patch:
        for module, names in TRACED.items():
            for name in names:
                where = f"magion.answers.{module}.{name}"
                patch.setattr(where, traced_once(module, name))
        yield


@pytest.fixture(scope="session")
def stations(tmp_path_factory):
    """Name to station file, of the demo and of the others."""
    folder = tmp_path_factory.mktemp("stations")
    files = {"demo": LARCH, "southern": CEDAR}
    for name, text in STATIONS.items():
        files[name] = folder / f"{name.replace(' ', '_')}.toml"
        files[name].write_text(text, encoding="utf-8")
    return files
