"""Make docs/accuracy.md from the tests: ``python -m tests.accuracy``.

It runs the files that declare rows (``tests/proof.py``), takes the largest deviation of each, and
sets them beside source, kind and tolerance; the files that only say right or wrong get one line
each. With ``--check`` the page is not written: it is compared, the deviations within a factor of
1.5, because another machine rounds differently. With ``--keep`` the deviations of the page stay,
and only headings, keys and tolerances are brought up to date.
"""

import argparse
import ast
import importlib
import json
import re
import subprocess
import sys
import tempfile
from functools import cache
from pathlib import Path
from typing import NamedTuple

from tests import proof

ROOT = proof.ROOT
PAGE = ROOT / "docs" / "accuracy.md"
SCHEMAS = ROOT / "magion" / "schemas"
KINDS = ("published", "memory", "derived", "practice", "reference library")
LAYERS = (
    "geometry",
    "field",
    "waves",
    "polarization",
    "ionosphere",
    "rays",
    "absorption",
    "antenna",
    "feed",
    "answers",
)
NOT_RUN = "not run"
SAME = 1.5  # factor between two machines

# Files without rows of their own, by layer: hands, orders and choices, not numbers; or numbers
# held in a way of their own.
FILES = {
    "tests/laws/test_day.py": "answers",
    "tests/laws/test_net.py": "answers",
    "tests/laws/test_relay_model.py": "answers",
    "tests/laws/test_sense.py": "answers",
    "tests/laws/test_sweep.py": "answers",
    "tests/published/test_crossed_dipoles.py": "polarization",
    "tests/published/test_wave_hands.py": "polarization",
    "tests/unit/test_antenna.py": "feed",
    "tests/unit/test_certainty.py": "answers",
}


class Quantity(NamedTuple):
    """What some keys of the schemas mean, and the checks (rows or files) that reach it."""

    name: str
    keys: str
    checks: tuple[str, ...]


# A key is looked up as schema:parent.key, parent.key, schema:key and key, in this order.
QUANTITIES = (
    Quantity(
        "great circle",
        "distance_km bearing_deg back_bearing_deg midpoint.latitude_deg midpoint.longitude_deg",
        (
            "distance on a sphere",
            "bearing on a sphere",
            "midpoint on a sphere",
            "distance against the ellipsoid (price of the sphere)",
            "bearing against the ellipsoid",
            "midpoint against the ellipsoid",
        ),
    ),
    Quantity("place of the sun", "solar_zenith_deg", ("angle of the sun from the zenith",)),
    Quantity(
        "field of the Earth",
        "east_nt north_nt up_nt flux_density_nt dip_deg declination_deg gyrofrequency_mhz "
        "path:Y gyro_ratio",
        (
            "components of the field against another model",
            "components of the field, 13th against 14th generation",
            "dip against another model",
            "dip at 100 km",
            "declination against another model",
            "gyrofrequency from 0 to 300 km",
        ),
    ),
    Quantity(
        "index",
        "mu chi",
        (
            "indices of both waves, with and without collisions",
            "squared indices along and across the field",
            "squared indices at X = 1",
            "squared indices by a plasma library",
            "squared indices by the dielectric tensor",
            "sum and product of the squared indices by the quartic",
            "labels of both indices where they meet along the field",
            "difference of both squared indices at the critical collision frequency",
            "critical collision frequency",
            "resonance of the index",
            "zeros of both indices",
        ),
    ),
    Quantity(
        "polarization ratio",
        "rho_re rho_im",
        ("product of the two polarization ratios", "states of both waves by the dielectric tensor"),
    ),
    Quantity(
        "shape of a wave",
        "axial_ratio_db",
        (
            "axes of the ellipses at a point",
            "states of both waves by the dielectric tensor",
            "limiting shape of a vertical wave",
            "axial ratio by the limiting place, field angles to 70 degrees",
            "axial ratio by the limiting place, field angles to 80 degrees",
            "tests/laws/test_sense.py",
        ),
    ),
    Quantity(
        "major axis on the ground",
        "major_axis_bearing_deg ordinary_axis_deg extraordinary_axis_deg",
        (
            "tilt of the ellipses with collisions",
            "tilt of both straight waves at X = 1",
            "tests/laws/test_sense.py",
        ),
    ),
    Quantity(
        "wave fed on the way out",
        "other_wave_db",
        ("state of the wave that leaves, by a general ODE solver",),
    ),
    Quantity(
        "place where the hand is set",
        "limiting.height_km limiting_height_km field_angle_deg station:height_km",
        (
            "axial ratio by the limiting place, field angles to 70 degrees",
            "axial ratio by the limiting place, field angles to 80 degrees",
            "tests/laws/test_sense.py",
        ),
    ),
    Quantity(
        "directions at which the hand turns over or a wire is better",
        "turns_toward_deg turns_below_deg linear_from_deg linear_to_deg",
        (
            "axial ratio beyond which one wire takes more than a circular antenna",
            "tests/laws/test_sense.py",
            "tests/published/test_wave_hands.py",
        ),
    ),
    Quantity(
        "critical frequency of the extraordinary wave",
        "fxf2_mhz",
        (
            "critical frequency of the extraordinary wave",
            "width of the window of the extraordinary wave alone",
        ),
    ),
    Quantity(
        "maximum usable frequency",
        "muf_mhz margin_mhz",
        (
            "MUFs straight up",
            "separation of both MUFs, 300 to 3000 km",
            "MUF of F where E has a higher one",
            "tests/laws/test_day.py",
        ),
    ),
    Quantity(
        "ray",
        "elevation_deg azimuth_deg group_path_km group_delay_ms phase_path_km apogee_km hops",
        (
            "ground range, paths and apogee in a quasi-parabolic layer",
            "virtual height of a flat parabolic layer",
            "range and group path in a flat parabolic layer",
            "Hamiltonian along every ray",
            "landing place by a general ODE solver",
            "landing place through a tilt by a general ODE solver",
            "landing place in the mirrored hemisphere",
            "landing place with the field reversed",
            "tests/laws/test_day.py",
        ),
    ),
    Quantity(
        "absorption",
        "absorption_db absorption_ratio",
        (
            "absorption along whole rays, constant collision frequency",
            "absorption of both waves in a slab",
            "ratio of the absorptions of both waves",
            "electron-neutral collision frequency",
            "electron-ion collision frequency",
            "electron density of the daytime D region, 60 to 100 km",
            "tests/laws/test_sense.py",
        ),
    ),
    Quantity(
        "level (its losses: absorption and bounces)",
        "level_db",
        (
            "absorption along whole rays, constant collision frequency",
            "reflection coefficients of four grounds",
            "kept over flipped hand of a bounce",
            "shares of both waves after a bounce",
            "shares of both waves after a bounce, by boundary conditions",
        ),
    ),
    Quantity(
        "Doppler shift",
        "doppler_hz doppler_split_hz period_s",
        ("change of the phase path with the layers",),
    ),
    Quantity(
        "probability of a state",
        "probability both ordinary_only extraordinary_only none arrival_probability "
        "worst_probability reached best_frequency_mhz chance",
        (
            "tests/unit/test_certainty.py",
            "tests/laws/test_day.py",
            "tests/laws/test_net.py",
            "tests/laws/test_sense.py",
        ),
    ),
    Quantity(
        "verdict on a relay",
        "log10_ratio relay:rejection_db rejection_low_db rejection_high_db expected_db error_db",
        ("tests/laws/test_relay_model.py",),
    ),
    Quantity(
        "doubt of a time of change",
        "plus_minus_min",
        ("tests/unit/test_certainty.py", "tests/laws/test_day.py"),
    ),
    Quantity(
        "gain of an antenna",
        "right_dbi left_dbi right_over_left_db ordinary_gain_dbi extraordinary_gain_dbi",
        (
            "absolute gain over real ground (always low: a kept error)",
            "form of the pattern in both polarizations over real ground",
            "phase between both polarizations of the pattern",
            "effective length of wires over every ground",
            "effective length of loops over every ground",
            "pattern of a wire of any length in free space",
            "pattern of a small loop",
            "directivity of the half-wave dipole",
            "radiation resistance of the half-wave dipole",
            "dipole over a perfect ground, overhead",
            "axial ratio of crossed wires at 45 and 30 degrees",
            "power radiated over a perfect ground",
            "loss of a circular wave on one wire",
            "match of two ellipses",
            "match of any two ellipses",
        ),
    ),
    Quantity(
        "rejection of the other wave or hand",
        "rejection_db rejection_db.ordinary rejection_db.extraordinary separation_db "
        "rejection_s_units rejection_without_db ordinary_over_extraordinary_db "
        "ordinary_rejection_db extraordinary_rejection_db",
        (
            "rejection by errors of phase and amplitude",
            "rejection at band edges, matched arms",
            "rejection of a plain tee of resonant dipoles",
            "rejection of a plain tee against its circuit by hand",
            "axial ratio and rejection of short crossed wires, every elevation",
            "response of a station to both waves of a low path",
            "rejection by a whole station, limited by the ellipse",
        ),
    ),
    Quantity(
        "power heard and sent",
        "level_over_dipole_db sent_over_dipole_db both_ends_db ordinary_sent_dbi "
        "extraordinary_sent_dbi ordinary_share",
        (
            "level heard and sent over one dipole",
            "share of an ellipse that a circular antenna and a wire take",
            "currents of every network as weights on reception",
        ),
    ),
    Quantity(
        "depth of fades",
        "fade_depth_before_db fade_depth_after_db",
        ("fade depth of two beating waves",),
    ),
    Quantity(
        "line of cable",
        "quarter_wave_m quarter_wave_ft length_m length_ft cut_m cut_ft line_deg path_deg "
        "present_deg",
        ("quarter wave of cable", "electrical length and phase of the delayed arm at band edges"),
    ),
    Quantity("first dip of the cut piece of cable", "dip_mhz", ("tests/unit/test_antenna.py",)),
    Quantity(
        "currents and powers of the network",
        "phase_deg amplitude_db swr loss_db",
        (
            "currents of every network as weights on reception",
            "shares of the power: reflected, dumped, fed, lost",
            "electrical length and phase of the delayed arm at band edges",
            "standing wave ratio of two lines to one tee",
        ),
    ),
    Quantity(
        "impedance of an element",
        "resistance_ohm reactance_ohm",
        (
            "feed resistance of wires over ground, shipped table",
            "feed reactance of wires over ground, shipped table",
            "feed resistance of wires over ground, the table's solver",
            "feed reactance of wires over ground, the table's solver",
            "resistance of a low short dipole over its free one",
        ),
    ),
)

# Given by the operator or a file, a grid, or counted; only repeated.
ASKED = """
    frequency_mhz latitude_deg longitude_deg height_m hot_bearing_deg cold_bearing_deg
    velocity_factor cable_ohm leg_length_m leads_m present_m hours tolerance.phase_deg
    tolerance.amplitude_db wave:X wave:Y wave:Z wave:theta_deg field:height_km
    antenna:elevation_deg antenna:azimuth_deg elevations_deg bearings_deg station:elevation_deg
    station:azimuth_deg line measured_db rows_read rows_used rows_with_rejection
"""

# No check compares the value with one from elsewhere.
UNPROVEN = {
    "the climatology's values, or those that were typed or read": "fof2_mhz foe_mhz hmf2_km",
    "typed, or by the letter of a reading": "fof2_error_mhz",
    "found with a ray": (
        "path:X path:theta_deg index.height_km skip_km limiting.latitude_deg limiting.longitude_deg"
    ),
    "simple arithmetic": "solar_hour_offset mean_difference_db",
    "a height of the model's choice": "path:field.height_km",
}


class Key(NamedTuple):
    schema: str
    parent: str
    name: str

    def names(self):
        """Names under which the tables may have it, the nearest first."""
        own = f"{self.parent}.{self.name}"
        return f"{self.schema}:{own}", own, f"{self.schema}:{self.name}", self.name


def numeric_keys():
    """Every key of the schemas whose value is a number, or an array of them."""
    found = {}

    def look(node, whole, schema, parent, key, seen):
        if "$ref" in node:
            name = node["$ref"].rpartition("/")[2]
            if name not in seen:
                look(whole["$defs"][name], whole, schema, parent, key, seen | {name})
        kinds = node.get("type", ())
        if key and {"number", "integer"} & ({kinds} if isinstance(kinds, str) else set(kinds)):
            found[Key(schema, parent, key)] = None
        for name, child in node.get("properties", {}).items():
            look(child, whole, schema, key, name, seen)
        for part in ("items", "additionalProperties"):
            if isinstance(node.get(part), dict):
                look(node[part], whole, schema, parent, key, seen)
        for part in ("anyOf", "oneOf", "allOf", "prefixItems"):
            for child in node.get(part, ()):
                look(child, whole, schema, parent, key, seen)

    for file in sorted(SCHEMAS.glob("*.json")):
        whole = json.loads(file.read_text(encoding="utf-8"))
        look(whole, whole, re.sub(r"-\d+$", "", file.stem), "", "", frozenset())
    return list(found)


def placed():
    """The name each numeric key goes by in the tables; None where no table has it."""
    known = set(ASKED.split())
    for keys in (*(q.keys for q in QUANTITIES), *UNPROVEN.values()):
        known |= set(keys.split())
    return {key: next((n for n in key.names() if n in known), None) for key in numeric_keys()}


def docstring(file):
    return ast.get_docstring(ast.parse((ROOT / file).read_text(encoding="utf-8"))) or ""


def kinds_of(file):
    text = " ".join(docstring(file).split())
    return [kind for kind in KINDS if re.search(rf"\b{kind}\b", text)]


def files_of_checks():
    both = (ROOT / "tests" / part for part in ("published", "laws"))
    return [f.relative_to(ROOT).as_posix() for p in both for f in sorted(p.glob("test_*.py"))]


def files_with_rows():
    return [f for f in files_of_checks() if "tests.proof" in (ROOT / f).read_text("utf-8")]


@cache
def all_rows():
    """Every declared row, from the files themselves."""
    for file in files_with_rows():
        importlib.import_module(file.removesuffix(".py").replace("/", "."))
    return sorted(proof.rows.values(), key=lambda r: (r.file, r.what))


def plain(number):
    return re.sub(r"e-0?", "e-", f"{number:g}")


def cell(row, seen):
    """The largest deviation, to digits that another machine has too."""
    if row.what not in seen:
        return NOT_RUN
    off = seen[row.what]
    return "rounding" if off < 1e-9 * row.scale else plain(float(f"{off:.2g}"))


def tolerance(row):
    number = plain(row.tolerance)
    if row.unit == "1":
        return number
    # A limit of two terms: the row is a share of it.
    return f"({row.unit[3:]})" if row.unit.startswith("of 1 %") else f"{number} {row.unit}"


def table(head, lines):
    out = [f"| {' | '.join(head)} |", "|" + "---|" * len(head)]
    return [*out, *(f"| {' | '.join(c.replace('|', chr(92) + '|') for c in r)} |" for r in lines)]


def code(names):
    return ", ".join(f"`{name}`" for name in names)


def page(cells):
    """The page, with the deviations of `cells` by row."""
    rows, names = all_rows(), placed()
    counts = {k: sum(r.kind == k for r in rows) for k in KINDS}
    schemas = {}
    for key, name in names.items():
        if key.schema not in schemas.setdefault(name, []):
            schemas[name].append(key.schema)
    told = ", ".join(f"{n} {k}" for k, n in counts.items() if n)
    out = [
        "# How near the numbers are",
        "",
        "<!-- Made by `python -m tests.accuracy` (`make accuracy` compares). Do not edit. -->",
        "",
        f"Every row is a check that runs with the tests: {len(rows)} rows ({told}).",
        "A value is held to the tolerance; the next column is the largest deviation that was",
        "seen, *rounding* where it is below 1e-9 of the quantity. A case may be held to less than",
        "its row says, where the source prints more digits there. A tolerance in brackets is a sum",
        "of two terms, and the largest deviation a share of it.",
        "",
        "Kinds: **published**, read in the source; **memory**, recalled from it; **derived**,",
        "worked out and confirmed by a second, independent way; **practice**, common to the trade;",
        "**reference library**, computed by independent software. Full citations stand at the head",
        "of each file.",
        "",
        "A tolerance says how well the computation follows its source, not how well the ionosphere",
        "follows the model: that is the doubt which each answer carries itself.",
    ]
    for layer in LAYERS:
        out += ["", f"## {layer.capitalize()}", ""]
        lines = [
            [r.what, r.source, r.kind, tolerance(r), cells.get(r.what, NOT_RUN), f"`{r.file[6:]}`"]
            for r in rows
            if r.layer == layer
        ]
        head = ("check", "source", "kind", "held to", "largest seen", "in tests/")
        out += table(head, lines) if lines else []
        others = [f for f, where in FILES.items() if where == layer]
        if others:
            out += [""] * bool(lines)
            out += ["Held as right or wrong, or within limits of each case:", ""]
            for file in others:
                first = docstring(file).split("\n")[0].rstrip(".")
                out.append(f"- {first} ({', '.join([*kinds_of(file), f'`{file[6:]}`'])})")
    out += [
        "",
        "## Every number a face shows",
        "",
        "The numeric keys of the JSON (`magion/schemas`), by what they mean, and the checks that",
        "reach them. A check reaches the function a key comes from; that the key carries its value",
        "is held by `tests/cli`. `a.b` is `b` within `a`; `a:b` is `b` of the schema `a` alone.",
        "",
    ]

    def keys(text):
        return code(sorted(text.split()))

    lines = []
    for q in QUANTITIES:
        checks = "; ".join(f"`{c[6:]}`" if c.endswith(".py") else c for c in q.checks)
        lines.append([q.name, keys(q.keys), checks])
    out += table(("quantity", "keys", "checks"), lines)
    out += [
        "",
        "### Given or counted, and only repeated",
        "",
        keys(ASKED) + ".",
        "",
        "### Unproven",
        "",
        "No check compares these with a value from elsewhere.",
        "",
        *table(("keys", "what they are"), [[keys(k), why] for why, k in UNPROVEN.items()]),
        "",
    ]
    return "\n".join(out)


def cells_in(text):
    """Deviations by row, as a page has them."""
    found = {}
    for line in text.splitlines():
        parts = [p.strip() for p in re.split(r"(?<!\\)\|", line)[1:-1]]
        if len(parts) == 6 and parts[0] != "check" and not parts[0].startswith("---"):
            found[parts[0].replace("\\|", "|")] = parts[4]
    return found


def alike(old, new):
    """Whether two cells say the same on two machines."""
    try:
        return 1.0 / SAME <= float(old) / float(new) <= SAME
    except ValueError:
        return old == new


def measured():
    """Largest deviations of a run of all files with rows."""
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "accuracy.json"
        command = [sys.executable, "-m", "pytest", f"--accuracy={file}"]
        subprocess.run([*command, *files_with_rows()], cwd=ROOT, check=True)
        return json.loads(file.read_text(encoding="utf-8"))


def main():
    options = argparse.ArgumentParser(description="Make docs/accuracy.md from the tests.")
    options.add_argument("--check", action="store_true", help="compare, write nothing")
    options.add_argument("--keep", action="store_true", help="measure nothing anew")
    asked = options.parse_args()
    if asked.keep:  # a heading or a key changed
        PAGE.write_text(page(cells_in(PAGE.read_text(encoding="utf-8"))), encoding="utf-8")
        return 0
    seen = measured()
    cells = {row.what: cell(row, seen) for row in all_rows()}
    if not asked.check:
        PAGE.write_text(page(cells), encoding="utf-8")
        return 0
    text = PAGE.read_text(encoding="utf-8")
    old = cells_in(text)
    wrong = [w for w, new in cells.items() if not alike(old.get(w, NOT_RUN), new)]
    for what in wrong:
        print(f"{what}: {old.get(what, 'not there')} on the page, {cells[what]} now")
    if page(old) != text:
        wrong.append("page")
        print("docs/accuracy.md has other rows or keys than the tests")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
