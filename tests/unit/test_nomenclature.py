"""Docstrings against the pages: words and units, citation keys, homes of the conventions."""

import ast
import dataclasses
import importlib
import inspect
import json
import pkgutil
import re
from importlib.resources import files
from pathlib import Path
from typing import NamedTuple

import pytest

import magion

ROOT = Path(__file__).parents[2]
SUFFIXES = {
    "km": "km", "m": "m", "ft": "ft", "deg": "deg", "mhz": "MHz", "db": "dB", "dbi": "dB",
    "ohm": "ohm", "nt": "nT", "ms": "ms", "min": "min",
}  # fmt: skip
NOT_SI = {"km", "ft", "deg", "MHz", "nT", "ms"}  # only under a name with its suffix

# Numbers of any unit go through these; no tag can be right for them.
PASS_THROUGH = {
    "answers.inputs.finite_or_none",
    "arrays.as_floats",
    "arrays.cross",
    "arrays.dot",
    "arrays.norm",
    "arrays.padded",
    "arrays.weighted",
    "errors.require_range",
    "formats.tables.Row.number",
    "ionosphere.profile.to_polynomials",
    "polarization.stokes",
    "rays.batch.Track.sample",
}
# Published regressions that are kept in the units of their source.
IN_UNITS_OF_THE_SOURCE = {"ionosphere.climatology.f1_critical_frequency"}


class Entry(NamedTuple):
    """One entry of a Parameters or Returns section."""

    names: tuple[str, ...]
    kind: str
    text: str


class Documented(NamedTuple):
    """A public function, class, method or property."""

    name: str
    thing: object
    doc: str
    parameters: tuple[Entry, ...]
    returns: tuple[Entry, ...]


def modules():
    found = [m.name for m in pkgutil.walk_packages(magion.__path__, "magion.")]
    return [importlib.import_module(m) for m in found if not m.startswith("magion.cli")]


def sections(doc):
    """Lines of each numpydoc section by its heading."""
    lines = inspect.cleandoc(doc).splitlines()
    found, heading = {}, None
    for line, following in zip(lines, [*lines[1:], ""], strict=True):
        if following and set(following) == {"-"}:
            heading = line.strip()
            found[heading] = []
        elif heading and set(line) != {"-"}:
            found[heading].append(line)
    return found


def entries(lines, *, named):
    """Entries of a section; of Returns, a head without a colon is a type."""
    found = []
    for line in lines:
        if line and not line.startswith(" "):
            names, colon, kind = line.partition(" : ")
            if not colon:
                names, kind = (line, "") if named else ("", line)
            found.append((tuple(n.strip(" *") for n in names.split(",") if n), kind, []))
        elif line.strip() and found:
            found[-1][2].append(line.strip())
    return tuple(Entry(names, kind, " ".join(text)) for names, kind, text in found)


def documented(name, thing):
    doc = inspect.getdoc(thing) if not inspect.isclass(thing) else (thing.__doc__ or "")
    parts = sections(doc or "")
    return Documented(
        name.removeprefix("magion."),
        thing,
        doc or "",
        entries(parts.get("Parameters", ()), named=True),
        entries(parts.get("Returns", ()), named=False),
    )


def public():
    for module in modules():
        for name, thing in vars(module).items():
            own = getattr(thing, "__module__", None) == module.__name__
            if name.startswith("_") or not own or not callable(thing):
                continue
            yield documented(f"{module.__name__}.{name}", thing)
            if not inspect.isclass(thing):
                continue
            for part, member in vars(thing).items():
                if not part.startswith("_") and (
                    inspect.isfunction(member) or isinstance(member, property)
                ):
                    yield documented(f"{module.__name__}.{name}.{part}", member)


PUBLIC = list(public())


def rows_of(page, header):
    """Cells of every table row under a header of a page."""
    inside = False
    for line in (ROOT / "docs" / page).read_text(encoding="utf-8").splitlines():
        cells = [c.strip() for c in line.strip().strip("|").split("|")]
        if not line.startswith("|"):
            inside = False
        elif cells[: len(header)] == header:
            inside = True
        elif inside and not set(line) <= set("|- "):
            yield cells


UNITS = {u for cells in rows_of("nomenclature.md", ["tag", "unit"]) for u in cells[0].split("`")}
UNITS -= {"", ", "}


def read_table():
    """Word to units of the nomenclature page."""
    found = {}
    for _, words, unit, _ in rows_of("nomenclature.md", ["symbol", "word", "unit", "what"]):
        for word in re.findall(r"`([^`]+)`", words):
            assert word not in found, f"{word} stands twice in docs/nomenclature.md"
            found[word] = set(unit.split(" or "))
    return found


TABLE = read_table()


def tags(text):
    """Units in brackets; brackets of a formula or around the indices of an array are not units."""
    found = set()
    for inner in re.findall(r"\[([^\]]+)\](?!_)", text):
        parts = [p.strip() for p in inner.split(",")]
        if parts == ["i", "j"] or re.search(r"\(| [+*-] ", inner):
            continue
        unknown = set(parts) - UNITS
        assert not unknown, f"unit {unknown} is not in docs/nomenclature.md"
        found |= set(parts)
    return found


def is_numeric(kind):
    if re.search(r"\b(sequence|iterable|list|dict) of\b|\bof (bool|int)\b", kind):
        return False
    return bool(re.search(r"\b(float|ndarray|array_like)\b", kind))


def faults_of(entry, name, *, of_return=False):
    """What is wrong with the unit of an entry."""
    found = tags(entry.text)
    if not is_numeric(entry.kind):
        return
    if entry.text.startswith(("As for ", "As there")):
        return
    words = entry.names or ((name.rpartition(".")[2],) if of_return else ())
    wanted = set()
    for word in words:
        if (tail := word.rpartition("_")[2]) in SUFFIXES and word != tail:
            units = {SUFFIXES[tail]}
            if found != units:
                yield f"{word} carries {found or 'no unit'}; its suffix says [{SUFFIXES[tail]}]"
        elif word in TABLE:
            units = TABLE[word]
            if not found & units and not ("any" in units and not found):
                yield f"{word} carries {found or 'no unit'}; the table says {units}"
        else:
            units = found
            if not found and name not in PASS_THROUGH:
                yield f"{word} carries no unit and is not in docs/nomenclature.md"
            if found & NOT_SI and name not in IN_UNITS_OF_THE_SOURCE:
                yield f"{word} carries {found} and no suffix that says so"
        wanted |= units
    if words and found - wanted:
        yield f"{', '.join(words)}: {found - wanted} belongs to none of them"
    if not words and not found:
        yield "a value without a unit"


@pytest.mark.parametrize("item", PUBLIC, ids=lambda d: d.name)
def test_units_of_docstrings(item):
    assert item.doc.strip(), f"{item.name} has no docstring"
    faults = [f for e in item.parameters for f in faults_of(e, item.name)]
    faults += [f for e in item.returns for f in faults_of(e, item.name, of_return=True)]
    if isinstance(item.thing, property):
        kind = str(inspect.signature(item.thing.fget).return_annotation)
        first = item.doc.split("\n\n")[0]
        numeric = "array_like" if "float" in kind or "FloatArray" in kind else ""
        entry = Entry((item.name.rpartition(".")[2],), numeric, first)
        faults += list(faults_of(entry, item.name))
    assert not faults, "\n".join(faults)


@pytest.mark.parametrize("item", PUBLIC, ids=lambda d: d.name)
def test_every_parameter_and_field_is_documented(item):
    told = {n for e in item.parameters for n in e.names}
    if inspect.isfunction(item.thing):
        wanted = set(inspect.signature(item.thing).parameters) - {"self"}
    elif dataclasses.is_dataclass(item.thing):
        inherited = {f.name for b in item.thing.__mro__[1:] if dataclasses.is_dataclass(b)
                     for f in dataclasses.fields(b)}  # fmt: skip
        wanted = {f.name for f in dataclasses.fields(item.thing)} - inherited
    else:
        return
    assert told == wanted


WRONG = [
    ("frequency", "float", "Wave frequency [MHz]."),
    ("frequency", "ndarray", "Wave frequency."),
    ("frequency_mhz", "float", "Wave frequency [Hz]."),
    ("height", "array_like", "Height [km]."),
    ("fof2, hmf2", "float", "Critical frequency [Hz] and peak height."),
    ("fof2, hmf2", "float", "Critical frequency [Hz], height [m], width [T]."),
    ("theta", "array_like", "Angle [deg]."),
    ("mass_of_nothing", "float", "Not in the table and without a unit."),
    ("mass_of_nothing", "float", "Not in the table, and not SI [km]."),
    ("first", "ndarray of complex", "A state [T]."),
]


@pytest.mark.parametrize(("names", "kind", "text"), WRONG)
def test_a_wrong_unit_is_noticed(names, kind, text):
    (entry,) = entries([f"{names} : {kind}", f"    {text}"], named=True)
    assert list(faults_of(entry, "waves.anything"))


@pytest.mark.parametrize("text", ["Height [metres].", "Frequency [Mhz].", "Density [m-3]."])
def test_an_unknown_unit_is_noticed(text):
    with pytest.raises(AssertionError, match="not in docs/nomenclature"):
        tags(text)


def occurring():
    """Every word that a docstring, a signature or a record of the package uses."""
    for item in PUBLIC:
        yield item.name.rpartition(".")[2]
        for entry in (*item.parameters, *item.returns):
            yield from entry.names
        if dataclasses.is_dataclass(item.thing):
            yield from (f.name for f in dataclasses.fields(item.thing))


def test_words_of_the_table_occur():
    assert not set(TABLE) - set(occurring())


def test_units_of_the_table_are_known_and_fit_the_suffix():
    for word, units in TABLE.items():
        assert units <= UNITS | {"any", "–"}, word
        if (tail := word.rpartition("_")[2]) in SUFFIXES and word != tail and units != {"–"}:
            assert units == {SUFFIXES[tail]}, word


def keys_in(part):
    """Every key that a schema knows."""
    if isinstance(part, dict):
        for key, inner in part.get("properties", {}).items():
            yield key
            yield from keys_in(inner)
        for key, inner in part.items():
            if key != "properties":
                yield from keys_in(inner)
    elif isinstance(part, list):
        for inner in part:
            yield from keys_in(inner)


SCHEMAS = sorted(f.name for f in files("magion").joinpath("schemas").iterdir())


@pytest.mark.parametrize("name", [n.removesuffix(".json") for n in SCHEMAS if "json" in n])
def test_keys_of_the_json_are_in_the_table(name):
    text = files("magion").joinpath("schemas", f"{name}.json").read_text("utf-8")
    assert not set(keys_in(json.loads(text))) - set(TABLE)


def constants():
    """Numeric constants with a docstring: name, text."""
    for module in modules():
        body = ast.parse(Path(module.__file__).read_text(encoding="utf-8")).body
        for node, after in zip(body, [*body[1:], None], strict=True):
            if not isinstance(node, ast.Assign | ast.AnnAssign) or not isinstance(after, ast.Expr):
                continue
            target = node.targets[0] if isinstance(node, ast.Assign) else node.target
            if not isinstance(target, ast.Name) or not isinstance(after.value, ast.Constant):
                continue
            if isinstance(getattr(module, target.id), float | int):
                yield f"{module.__name__}.{target.id}", after.value.value


@pytest.mark.parametrize(("name", "text"), [pytest.param(*c, id=c[0]) for c in constants()])
def test_constants_carry_their_unit(name, text):
    found, tail = tags(text), name.rpartition("_")[2].lower()
    assert found
    if tail in SUFFIXES:
        assert found == {SUFFIXES[tail]}
    else:
        assert not found & NOT_SI


KEY = re.compile(r"\[([A-Z][A-Za-z0-9]*)\]_")


def cited():
    sources = sorted((ROOT / "magion").rglob("*.py"))
    return {key for file in sources for key in KEY.findall(file.read_text(encoding="utf-8"))}


def bibliography():
    text = (ROOT / "docs" / "bibliography.md").read_text(encoding="utf-8")
    found = re.findall(r"^- \*\*\[(\w+)\]\*\* (.+?)(?=\n- |\n\n|\Z)", text, re.M | re.S)
    return {key: " ".join(entry.split()) for key, entry in found}


def test_every_citation_has_its_entry_and_every_entry_a_citation():
    assert cited()
    assert cited() == set(bibliography())


@pytest.mark.parametrize(("key", "text"), bibliography().items(), ids=str)
def test_entry_has_a_year_and_says_whether_it_was_read(key, text):
    assert re.search(r"\b(18|19|20)\d\d\b", text)
    assert ("Cited from memory." in text) != ("Read." in text)


def references(pattern):
    text = (ROOT / "docs" / "conventions.md").read_text(encoding="utf-8")
    return sorted(set(re.findall(pattern, text)))


@pytest.mark.parametrize("name", references(r"`(magion(?:\.\w+)+)`"))
def test_homes_of_the_conventions_exist(name):
    parts = name.split(".")
    for cut in range(len(parts), 0, -1):
        try:
            found = importlib.import_module(".".join(parts[:cut]))
        except ModuleNotFoundError:
            continue
        for part in parts[cut:]:
            found = getattr(found, part)
        return
    raise AssertionError(name)


@pytest.mark.parametrize("name", references(r"`(tests/[\w/]+\.py::\w+)`"))
def test_tests_of_the_conventions_exist(name):
    file, _, test = name.partition("::")
    assert f"def {test}(" in (ROOT / file).read_text(encoding="utf-8")
