"""Build sheet and pattern table of a station, as text of 80 columns."""

from collections.abc import Sequence

import numpy as np

from magion.answers.feed import BandRow, FeedAnswer, PositionInFeed
from magion.answers.pattern import AntennaAnswer, PositionPattern
from magion.arrays import FloatArray
from magion.render.text import wrapped

_ROWS_ON_PAGE = 9
_TABLE_ELEVATIONS = (5, 10, 15, 20, 30, 45, 60, 75, 90)
_MOST_ELEVATIONS = 12
_TABLE_AZIMUTHS = (0, 45, 90, 135, 180, 225, 270, 315)


def feet_and_inches(metres: float) -> str:
    """A length in feet and inches.

    Parameters
    ----------
    metres : float
        Length [m].

    Returns
    -------
    str
        Such as ``30 ft 7.4 in``.
    """
    tenths = round(abs(metres) / 0.0254 * 10.0)
    feet, rest = divmod(tenths, 120)
    return f"{'-' if metres < 0.0 and tenths else ''}{feet} ft {rest / 10.0:.1f} in"


def _length(metres: float) -> str:
    return f"{metres:8.3f} m   {feet_and_inches(metres):>14}"


def feed_text(answer: FeedAnswer) -> str:
    """The build sheet.

    Parameters
    ----------
    answer : FeedAnswer
        The answer.

    Returns
    -------
    str
        One page to print.
    """
    name = f" of {answer.station}" if answer.station else ""
    lines = wrapped(f"Build sheet for the feed{name}, {answer.frequency_mhz:.3f} MHz", "", "")
    lines += wrapped(answer.headline, "", "")
    lines += _antenna_rows(answer)
    lines += _line_rows(answer)
    lines += _relay_rows(answer)
    lines += _band_rows(answer)
    lines += _check_rows(answer)
    for caveat in answer.caveats:
        lines += wrapped(caveat, "    ", "  - ")
    lines.append("Cautions")
    for caution in answer.cautions:
        lines += wrapped(caution, "    ", "  - ")
    return "\n".join(lines) + "\n"


def _antenna_rows(answer: FeedAnswer) -> list[str]:
    if answer.antenna is None or answer.height_m is None:
        return []
    legs = "" if answer.leg_length_m is None else f", each leg {answer.leg_length_m:.2f} m"
    rows = wrapped(
        f"{answer.antenna}, feed point {answer.height_m:.1f} m up, ground: {answer.ground}{legs}"
    )
    rows += [
        f"  arm {a.name}: hot leg toward {a.hot_bearing_deg:.0f}° true, cold leg toward "
        f"{a.cold_bearing_deg:.0f}°"
        for a in answer.arms
    ]
    return rows


def _line_rows(answer: FeedAnswer) -> list[str]:
    line, tolerance = answer.line, answer.tolerance
    if line is None:
        if answer.positions and all(p.delayed_arm is None for p in answer.positions):
            return []
        maker = "digital combination" if answer.feed == "digital" else answer.feed
        return ["The 90 degrees", f"  made by the {maker} itself: no delay line to cut"]
    rows = [f"The delay line (velocity factor {line.velocity_factor:g})"]
    rows.append(f"  a quarter wave is          {_length(line.quarter_wave_m)}")
    if answer.antenna is not None:
        rows.append(f"  less leads and connectors  {_length(line.leads_m)}")
    if line.cut_m > 0.0:
        rows.append(f"  cut the line to            {_length(line.cut_m)}")
    else:
        rows.append("  nothing is left to cut: the leads alone are longer")
    if line.present_m is not None:
        rows.append(f"  the station file has       {_length(line.present_m)}")
        rows.append(f"    with leads {line.present_deg:.1f}° at {answer.frequency_mhz:.3f} MHz")
    rows.append(
        f"  about 20 dB hold while it is right to {tolerance.phase_deg:.0f}° "
        f"({tolerance.length_m:.2f} m of cable) and {tolerance.amplitude_db:.0f} dB"
    )
    if answer.antenna is None:
        rows += [
            f"  {q.cable + ', ' + format(q.velocity_factor, 'g'):<31}{_length(q.length_m)}"
            for q in answer.quarter_waves
        ]
    return rows


def _relay_rows(answer: FeedAnswer) -> list[str]:
    if not answer.positions:
        return [
            "Which arm",
            "  hot legs north and east, waves from overhead: line in the east-west arm",
            "  hears and sends LHCP, line in the north-south arm RHCP; the legs of one",
            "  dipole swapped, the reverse",
        ]
    wide = max(len(p.label) for p in answer.positions)
    rows = ["Relay (waves from overhead)"]
    made = "line" if answer.line is not None else "90°"
    for p in answer.positions:
        head = f"  {p.label:<{wide}}  "
        rows += wrapped(_position(p, made, bool(answer.can_transmit)), " " * len(head), head)
    if answer.has_hand and answer.can_transmit:
        rows.append("  A wave heard on one hand is answered with the other: change over to send.")
    if answer.has_hand:
        rows.append("  The legs of one dipole swapped, the two hands change places.")
    return rows


def _position(position: PositionInFeed, made: str, sends: bool) -> str:
    if position.single_arm is not None:
        return f"arm {position.single_arm} alone, no hand"
    line = f"{made} in arm {position.delayed_arm}: "
    if position.rejection_db is None:
        return line + "not known"
    if position.hand is None:
        return line + f"no hand, the two differ by {position.rejection_db:.1f} dB"
    hand = position.hand.value
    down = f"{position.rejection_db:.0f}" if position.rejection_db < 59.5 else "60+"
    does = "hears and sends" if sends else "hears"
    return line + f"{does} {hand}, the other {down} dB down"


def _cell(value: float | None, form: str, wide: int) -> str:
    # Adding zero after rounding leaves no "-0.0".
    shown = "-" if value is None else format(round(value, int(form[-2])) + 0.0, form)
    return f"{shown:>{wide}}"


def _band_rows(answer: FeedAnswer) -> list[str]:
    rows = answer.band
    if len(rows) > _ROWS_ON_PAGE:
        picked = np.unique(np.linspace(0, len(rows) - 1, _ROWS_ON_PAGE).round().astype(int))
        rows = tuple(rows[i] for i in picked)
    where = f", delay in arm {answer.delayed_arm}" if answer.delayed_arm else ""
    head = f"Across the band{where}"
    if answer.antenna is None:
        head += ", arms matched and isolated"
    lines = [head]
    lines.append("      MHz path, °   element ohm apart, ° ratio, dB  rejected, dB  SWR lost, dB")
    lines += [_band_row(r) for r in rows]
    return lines


def _band_row(row: BandRow) -> str:
    ohm = "-"
    if row.resistance_ohm is not None and row.reactance_ohm is not None:
        ohm = f"{row.resistance_ohm:.0f}{round(row.reactance_ohm):+d}j"
    apart = None if row.phase_deg is None else -row.phase_deg % 360.0
    return (
        f"  {row.frequency_mhz:7.3f}{_cell(row.line_deg, '.1f', 7)}{ohm:>14}"
        f"{_cell(apart, '.1f', 9)}{_cell(row.amplitude_db, '+.1f', 9)}"
        f"{_cell(row.rejection_db, '.1f', 12)}{_cell(row.swr, '.2f', 8)}"
        f"{_cell(row.loss_db, '.1f', 9)}"
    )


def _check_rows(answer: FeedAnswer) -> list[str]:
    line = answer.line
    rows = ["Check by measurement"]
    if line is not None and line.cut_m > 0.0:
        rows += wrapped(
            f"The cut piece alone, far end open: the first dip of its impedance falls at "
            f"{line.dip_mhz:.3f} MHz; with leads and connectors on, at "
            f"{answer.frequency_mhz:.3f} MHz. Cut long, trim to the dip.",
            "    ",
            "  - ",
        )
    if answer.antenna is None or any(p.delayed_arm for p in answer.positions):
        rows += wrapped(
            "Both paths into equal resistors of the cable's impedance, on two channels: 90° and "
            "within 1 dB of each other at the resistors. Repeat with the relay thrown.",
            "    ",
            "  - ",
        )
    rows += wrapped("A good SWR proves nothing about the phase.", "    ", "  - ")
    return rows


def antenna_text(answer: AntennaAnswer) -> str:
    """The response over the sky.

    Parameters
    ----------
    answer : AntennaAnswer
        The answer.

    Returns
    -------
    str
        A table for every relay position.
    """
    name = answer.station or "the antenna"
    lines = wrapped(
        f"Response of {name} to circular waves, {answer.frequency_mhz:.3f} MHz: {answer.kind}, "
        f"{answer.height_m:.1f} m up, ground: {answer.ground}; feed: {answer.feed}.",
        "",
        "",
    )
    arms = ", ".join(f"{a.name} {a.hot_bearing_deg:.0f}°" for a in answer.arms)
    lines += wrapped(f"Hot legs (true): {arms}. Cells: favoured hand, by how many dB.", "", "")
    elevations = _picked(answer.elevation_deg, _TABLE_ELEVATIONS, _MOST_ELEVATIONS)[::-1]
    whole = bool(np.all(answer.azimuth_deg == np.round(answer.azimuth_deg)))
    azimuths = _picked(answer.azimuth_deg, _TABLE_AZIMUTHS, 8 if whole else 6)
    for position in answer.positions:
        lines += ["", *_pattern_rows(answer, position, elevations, azimuths)]
    return "\n".join(lines) + "\n"


def _picked(values: FloatArray, usual: Sequence[float], most: int) -> list[float]:
    """All values if they are few; else the usual ones among them, else some spread evenly."""
    found = [float(v) for v in usual if v in values]
    if values.size > most and len(found) > 1:
        return found
    spread = np.linspace(0, values.size - 1, min(most, values.size)).round().astype(int)
    return [float(values[i]) for i in spread]


def _pattern_rows(
    answer: AntennaAnswer,
    position: PositionPattern,
    elevations: Sequence[float],
    azimuths: Sequence[float],
) -> list[str]:
    what = (
        f"arm {position.single_arm} alone"
        if position.single_arm
        else f"delay in arm {position.delayed_arm}"
    )
    rows = [f"Relay {position.label} ({what})"]
    wide = 6 if len(azimuths) > 6 else 8
    heads = "".join(f"{f'{a:.5g}°':>{wide}}" for a in azimuths)
    rows.append(f"  elev. {heads}  best dBi: RHCP   LHCP")
    columns = [int(np.flatnonzero(answer.azimuth_deg == a)[0]) for a in azimuths]
    for e in elevations:
        i = int(np.flatnonzero(answer.elevation_deg == e)[0])
        cells = "".join(f"{_favoured(position.right_over_left_db[i, c]):>{wide}}" for c in columns)
        right, left = position.right_dbi[i].max(), position.left_dbi[i].max()
        rows.append(f"{f'{e:.4g}°':>8}{cells}{_gain(right):>16}{_gain(left):>7}")
    return rows


def _favoured(right_over_left_db: float) -> str:
    size = round(abs(float(right_over_left_db)))
    if size == 0:
        return "even"
    return f"{'R' if right_over_left_db > 0.0 else 'L'} {size}"


def _gain(dbi: float) -> str:
    return "none" if dbi < -99.0 else f"{dbi:.1f}"
