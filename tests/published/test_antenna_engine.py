"""Impedances by the shipped table and patterns of wires, against a method-of-moments engine.

Source
------
The kept numbers in ``tests/golden``, made with an engine of another make, PyNEC 2.3.4 (NEC-2, exact
Sommerfeld ground); its README says how far they go. Kind: derived with that engine. Its resistances
are taken times its own power balance (``average_gain``), its gains are divided by it.

What is held: impedances interpolated from the table as closely as the table's own solver is
(tests/published/test_nec_engine.py); the form of the pattern in both polarizations and their phase,
to which rejections answer. The absolute gain is lower than the engine's: the sinusoidal current of
``wire_length`` is normalized to one ampere at the feed, where the true one, above all of long legs,
is not quite a sine. Near resonance that is 0.2 to 0.4 dB in both polarizations alike, with legs of
0.18 wavelengths 0.1 dB, of 0.30 0.7 dB. It falls out of every ratio between waves and positions.
"""

import math
from itertools import groupby

import numpy as np
import pytest

from magion.antenna.elements import wire_length
from magion.antenna.impedance import from_table
from magion.constants import SPEED_OF_LIGHT
from magion.ground import Ground
from tests.golden.make_golden import read
from tests.proof import proves

RESISTANCE = proves(
    "feed resistance of wires over ground, shipped table",
    layer="antenna",
    kind="derived",
    source="PyNEC 2.3.4 (NEC-2, Sommerfeld ground)",
    tolerance=0.009,
    unit="relative",
)
REACTANCE = proves(
    "feed reactance of wires over ground, shipped table",
    layer="antenna",
    kind="derived",
    source="PyNEC 2.3.4 (NEC-2, Sommerfeld ground)",
    tolerance=1.0,
    unit="of 1 % of |Z| (bent wires 3 %) and 1 ohm",
)
FORM = proves(
    "form of the pattern in both polarizations over real ground",
    layer="antenna",
    kind="derived",
    source="PyNEC 2.3.4 (NEC-2, Sommerfeld ground)",
    tolerance=0.17,
    unit="dB",
)
PHASE = proves(
    "phase between both polarizations of the pattern",
    layer="antenna",
    kind="derived",
    source="PyNEC 2.3.4 (NEC-2, Sommerfeld ground)",
    tolerance=0.75,
    unit="deg",
)
LEVEL = proves(
    "absolute gain over real ground (always low: a kept error)",
    layer="antenna",
    kind="derived",
    source="PyNEC 2.3.4 (NEC-2, Sommerfeld ground)",
    tolerance=0.75,
    unit="dB",
)

ETA = 4e-7 * math.pi * SPEED_OF_LIGHT
IMPEDANCES = read("impedance.csv")
PATTERNS = {k: list(rows) for k, rows in groupby(read("patterns.csv"), lambda row: row["case"])}


def ground_of(row):
    return Ground(permittivity=row["permittivity"], conductivity=row["conductivity_s_per_m"])


def by_table(row):
    frequency = row["frequency_mhz"] * 1e6
    wavelength = SPEED_OF_LIGHT / frequency
    return from_table(
        np.atleast_1d(ground_of(row).complex_permittivity(frequency)),
        row["tip_height_m"] / wavelength,
        row["leg_length_m"] / wavelength,
        0.5e-3 * row["wire_diameter_mm"] / wavelength,
        math.radians(row["apex_angle_deg"]),
    )[0]


def test_resistances_by_the_table():
    ratio = [by_table(r).real / (r["resistance_ohm"] * r["average_gain"]) for r in IMPEDANCES]
    off = np.abs(np.array(ratio) - 1.0)
    # As the solver itself: half a per cent of the engine's segments, and one row of 0.9 %.
    RESISTANCE.off(off)
    assert np.quantile(off, 0.95) < 0.005


def test_reactances_by_the_table():
    # As the solver itself: 1 % of |Z| and 1 ohm for straight wires, the engine less exact at bends.
    for row in IMPEDANCES:
        z = by_table(row)
        share = 0.01 if row["apex_angle_deg"] == 180.0 else 0.03
        REACTANCE.off(abs(row["reactance_ohm"] - z.imag) / (share * abs(z) + 1.0))


def legs_of(rows):
    return rows[0]["leg_length_m"] * rows[0]["frequency_mhz"] * 1e6 / SPEED_OF_LIGHT


def gains(rows):
    """Effective length along h and v, own gains and those of the engine [dB], shape (2, n)."""
    first = rows[0]
    frequency = first["frequency_mhz"] * 1e6
    azimuth, elevation = np.radians(
        [[r[f"{k}_deg"] for r in rows] for k in ("azimuth", "elevation")]
    )
    length = wire_length(
        math.radians(first["hot_leg_bearing_deg"]),
        first["leg_length_m"],
        first["feed_height_m"],
        math.radians(first["apex_angle_deg"]),
        ground_of(first),
        frequency,
        azimuth,
        elevation,
    )
    k = 2.0 * math.pi * frequency / SPEED_OF_LIGHT
    own = ETA * k * k / (4.0 * math.pi) * np.abs(length) ** 2 / by_table(first).real
    theirs = np.array([[r["horizontal_dbi"], r["vertical_dbi"]] for r in rows]).T
    theirs = theirs - 10.0 * math.log10(first["average_gain"])
    return length, 10.0 * np.log10(np.maximum(own, 1e-30)), theirs


@pytest.mark.parametrize("rows", PATTERNS.values(), ids=PATTERNS)
def test_pattern_in_both_polarizations(rows):
    length, own, theirs = gains(rows)
    bent = rows[0]["apex_angle_deg"] < 180.0
    strong = theirs > theirs.max() - 30.0
    difference = (own - theirs)[strong]
    # About their level: straight wires 0.07 dB, those of the longest legs, least of all a sine,
    # 0.14 dB; bent ones, where the engine loses power at the bend, 0.16 dB.
    spread = np.abs(difference - np.median(difference)).max()
    FORM.off(spread, 0.17 if bent else 0.15 if legs_of(rows) > 0.28 else 0.08)
    both = strong.all(axis=0)
    said = np.array([r["vertical_minus_horizontal_phase_deg"] for r in rows])[both]
    found = np.degrees(np.angle(length[1, both] / length[0, both]))
    assert both.sum() >= 20
    apart = (found - said + 180.0) % 360.0 - 180.0
    PHASE.off(np.abs(apart), 0.75 if bent else 0.002)


@pytest.mark.parametrize("rows", PATTERNS.values(), ids=PATTERNS)
def test_level_of_the_pattern(rows):
    _, own, theirs = gains(rows)
    level = np.median((own - theirs)[theirs > theirs.max() - 30.0])
    legs = legs_of(rows)
    # A kept error, not a tolerance: see the head of this file.
    LEVEL.off(abs(level))
    if legs < 0.2:
        assert -0.15 < level < -0.05
    elif legs > 0.28:
        assert -0.75 < level < -0.5
    else:
        assert -0.4 < level < -0.15
