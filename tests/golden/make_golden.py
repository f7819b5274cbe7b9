"""Make the golden numbers: ``python tests/golden/make_golden.py``.

Runs PyNEC (NEC-2 method of moments, GPL, optional), which only this file and
``tests/published/test_nec_engine.py`` know. What the numbers mean and how far
they go is said in ``README.md`` beside this file.
"""

import csv
from dataclasses import asdict, dataclass
from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
SPEED_OF_LIGHT = 299.792458  # m MHz

GROUNDS = {
    "sea": (70.0, 5.0),
    "wet": (30.0, 0.01),
    "medium-dry": (15.0, 0.001),
    "very-dry": (3.0, 1e-4),
    "average": (13.0, 0.005),
}
ELEVATIONS_DEG = (2, 5, 8, 12, 20, 30, 45, 60, 75, 88)
AZIMUTHS_DEG = (0, 20, 45, 70, 85, 90)

SEGMENTS = 24  # of a leg
FIRST_SEGMENT = 0.0025  # wavelengths, beside the feed
NOTHING_DB = -100.0  # a component below it is rounding


@dataclass(frozen=True, kw_only=True)
class Case:
    """A wire over ground: legs along east and west, hot leg east."""

    permittivity: float
    conductivity_s_per_m: float
    frequency_mhz: float
    tip_height_m: float
    leg_length_m: float
    wire_diameter_mm: float
    apex_angle_deg: float


def _growth(leg, first):
    """Ratio of neighbouring segments that makes them fill the leg."""
    low, high = 0.3, 4.0
    for _ in range(80):
        middle = 0.5 * (low + high)
        low, high = (
            (middle, high) if first * np.sum(middle ** np.arange(SEGMENTS)) < leg else (low, middle)
        )
    return low


def engine(case, ground):
    """The engine, loaded with one wire over "exact", "perfect" or no ("none") ground.

    The apex is fed by half the voltage on each of the two segments beside it.
    """
    from PyNEC import nec_context

    context = nec_context()
    geometry = context.get_geometry()
    half = np.radians(0.5 * case.apex_angle_deg)
    leg, tip = case.leg_length_m, case.tip_height_m
    x, top = leg * np.sin(half), tip + leg * np.cos(half)
    radius = 0.5e-3 * case.wire_diameter_mm
    ratio = _growth(leg, FIRST_SEGMENT * SPEED_OF_LIGHT / case.frequency_mhz)
    geometry.wire(1, SEGMENTS, -x, 0, tip, 0, 0, top, radius, 1 / ratio, 1)
    geometry.wire(2, SEGMENTS, 0, 0, top, x, 0, tip, radius, ratio, 1)
    context.geometry_complete(0)
    kind = {"exact": 2, "perfect": 1, "none": -1}[ground]
    constants = (case.permittivity, case.conductivity_s_per_m) if ground == "exact" else (0, 0)
    context.gn_card(kind, 0, *constants, 0, 0, 0, 0)
    context.ex_card(0, 1, SEGMENTS, 0, 0.5, 0, 0, 0, 0, 0)
    context.ex_card(0, 2, 1, 0, 0.5, 0, 0, 0, 0, 0)
    context.fr_card(0, 1, case.frequency_mhz, 0)
    return context


def impedance(case, ground="exact"):
    """Impedance at the feed [ohm]."""
    context = engine(case, ground)
    context.xq_card(0)
    return complex(np.sum(context.get_input_parameters(0).get_impedance()))


def average_gain(case):
    """Radiated power over the power at the feed, in free space: 1 were the engine exact."""
    context = engine(case, "none")
    context.rp_card(0, 91, 180, 0, 0, 0, 0, 0, 0, 2, 2, 0, 0)
    pattern = context.get_radiation_pattern(0)
    theta = np.radians(pattern.get_theta_angles())
    power = 10.0 ** (0.1 * np.asarray(pattern.get_gain()))
    by_theta = power.reshape(theta.size, -1).mean(axis=1)
    return float(np.sum(by_theta * np.sin(theta)) / np.sum(np.sin(theta)))


def pattern(case):
    """Rows of one pattern: angles, gains of both components, their phase difference.

    The engine's x is east, y north; theta and phi are 90° less elevation and
    azimuth. magion's v and h run against its theta and phi both, so that
    E_v / E_h = E_theta / E_phi.
    """
    context = engine(case, "exact")
    context.rp_card(0, 91, 19, 1, 0, 0, 0, 0, 0, 1, 5, 0, 0)
    found = context.get_radiation_pattern(0)
    theta, phi = np.rint(found.get_theta_angles()), np.rint(found.get_phi_angles())
    z = complex(np.sum(context.get_input_parameters(0).get_impedance()))
    vertical, horizontal, e_theta, e_phi = (
        np.asarray(flat).reshape(phi.size, theta.size)
        for flat in (
            found.get_gain_vert(),
            found.get_gain_horiz(),
            found.get_e_theta(),
            found.get_e_phi(),
        )
    )
    rows = []
    for azimuth in AZIMUTHS_DEG:
        for elevation in ELEVATIONS_DEG:
            i = int(np.flatnonzero(phi == 90 - azimuth)[0])
            j = int(np.flatnonzero(theta == 90 - elevation)[0])
            gains = [float(g[i, j]) for g in (horizontal, vertical)]
            gains = [g if g > NOTHING_DB else -np.inf for g in gains]
            phase = np.degrees(np.angle(e_theta[i, j] * np.conj(e_phi[i, j])))
            rows.append(
                {
                    "azimuth_deg": azimuth,
                    "elevation_deg": elevation,
                    "horizontal_dbi": round(gains[0], 4),
                    "vertical_dbi": round(gains[1], 4),
                    "vertical_minus_horizontal_phase_deg": round(float(phase), 3)
                    if np.isfinite(gains).all()
                    else np.nan,
                    "resistance_ohm": round(z.real, 4),
                    "reactance_ohm": round(z.imag, 4),
                }
            )
    return rows


def impedance_cases():
    """Forty wires at random over real grounds, where the engine's ground is good."""
    rng = np.random.default_rng(7)
    for number in range(40):
        ground = list(GROUNDS.values())[number % len(GROUNDS)]
        frequency = round(float(np.exp(rng.uniform(np.log(1.8), np.log(30.0)))), 3)
        wavelength = SPEED_OF_LIGHT / frequency
        yield Case(
            permittivity=ground[0],
            conductivity_s_per_m=ground[1],
            frequency_mhz=frequency,
            tip_height_m=round(float(rng.uniform(0.1, 0.45)) * wavelength, 3),
            leg_length_m=round(float(rng.uniform(0.18, 0.30)) * wavelength, 3),
            wire_diameter_mm=round(float(rng.uniform(1.0, 4.0)), 1),
            apex_angle_deg=180.0 if number < 20 else float(rng.choice([90.0, 100.0, 120.0, 150.0])),
        )


def perfect_cases():
    """Wires over a perfect conductor, down to where the engine's lossy ground fails."""
    for apex in (180.0, 120.0, 90.0):
        for tip in (0.0125, 0.03, 0.1, 0.5):
            for leg in (0.2, 0.2375, 0.28):
                wavelength = SPEED_OF_LIGHT / 7.1
                yield Case(
                    permittivity=1.0,
                    conductivity_s_per_m=np.inf,
                    frequency_mhz=7.1,
                    tip_height_m=round(tip * wavelength, 3),
                    leg_length_m=round(leg * wavelength, 3),
                    wire_diameter_mm=2.0,
                    apex_angle_deg=apex,
                )


def pattern_cases():
    """The wires whose patterns are kept, by name."""

    def case(ground, frequency, feed, apex=180.0, leg=0.2375):
        wavelength = SPEED_OF_LIGHT / frequency
        tip = feed - leg * np.cos(np.radians(0.5 * apex))
        return Case(
            permittivity=GROUNDS[ground][0],
            conductivity_s_per_m=GROUNDS[ground][1],
            frequency_mhz=frequency,
            tip_height_m=round(tip * wavelength, 3),
            leg_length_m=round(leg * wavelength, 3),
            wire_diameter_mm=2.0,
            apex_angle_deg=apex,
        )

    for frequency in (3.65, 7.1):
        for height in (0.1, 0.25, 0.5):
            yield f"flat-average-{frequency}-{height}", case("average", frequency, height)
    for ground in ("very-dry", "wet", "sea"):
        yield f"flat-{ground}-7.1-0.25", case(ground, 7.1, 0.25)
    for apex in (120.0, 100.0):
        yield f"vee{apex:.0f}-average-3.65-0.25", case("average", 3.65, 0.25, apex)
        yield f"vee{apex:.0f}-very-dry-7.1-0.25", case("very-dry", 7.1, 0.25, apex)
    for leg in (0.18, 0.30):
        yield f"leg{leg:.2f}-average-7.1-0.25", case("average", 7.1, 0.25, leg=leg)


def impedance_row(case, ground="exact"):
    """One row of a file of impedances."""
    z = impedance(case, ground)
    return {
        **asdict(case),
        "resistance_ohm": round(z.real, 4),
        "reactance_ohm": round(z.imag, 4),
        "average_gain": round(average_gain(case), 5),
    }


def pattern_rows(name, case):
    """All rows of one pattern, with the case in front."""
    top = case.tip_height_m + case.leg_length_m * np.cos(np.radians(0.5 * case.apex_angle_deg))
    front = {
        "case": name,
        **asdict(case),
        "feed_height_m": round(float(top), 3),
        "hot_leg_bearing_deg": 90.0,
    }
    mean = {"average_gain": round(average_gain(case), 5)}
    return [{**front, **row, **mean} for row in pattern(case)]


def read(name):
    """Rows of a golden file; all but the name of the case are numbers."""
    with (HERE / name).open(newline="") as file:
        return [
            {key: text if key == "case" else float(text) for key, text in row.items()}
            for row in csv.DictReader(file)
        ]


def write(name, rows):
    """Write a golden file."""
    with (HERE / name).open("w", newline="") as file:
        writer = csv.DictWriter(file, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def main():
    """Write all three files."""
    write("impedance.csv", [impedance_row(case) for case in impedance_cases()])
    write(
        "impedance_perfect_ground.csv",
        [impedance_row(case, "perfect") for case in perfect_cases()],
    )
    write("patterns.csv", [row for named in pattern_cases() for row in pattern_rows(*named)])


if __name__ == "__main__":
    main()
