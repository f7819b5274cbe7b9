"""The sense table, for the wall: 80 columns, black on white."""

from typing import Any

from magion.answers.sense import SenseAnswer, SenseCell, SenseRow
from magion.polarization import Hand, Shape
from magion.render.data import dotted_record
from magion.render.text import coordinates, in_words, states_in_short, wrapped

_POINTS = "N NE E SE S SW W NW"


def sense_text(answer: SenseAnswer) -> str:
    """The table to tape to a wall.

    Parameters
    ----------
    answer : SenseAnswer
        The answer.

    Returns
    -------
    str
        Head, rows and a legend of four lines.
    """
    place = f"{coordinates(answer.latitude_deg, answer.longitude_deg)} ({answer.locator})"
    when = answer.date if answer.time_utc is None else in_words(answer.time_utc)
    title = f"Sense table of {answer.name}, {place}" if answer.name else f"Sense table, {place}"
    lines = wrapped(f"{title}, {when}", "", "")
    lines += wrapped(
        f"Dip {answer.dip_deg:.1f}°, declination {answer.declination_deg:.1f}°, gyrofrequency "
        f"{answer.gyrofrequency_mhz:.3f} MHz ({answer.model}). {_turns(answer)}",
        "",
        "",
    )
    if answer.fof2_mhz is not None and answer.fxf2_mhz is not None:
        foe = "" if answer.foe_mhz is None else f", foE {answer.foe_mhz:.2f} MHz"
        lines += wrapped(
            f"Overhead: foF2 {answer.fof2_mhz:.2f} MHz, fxF2 {answer.fxf2_mhz:.2f} MHz{foe} "
            f"({answer.source}).",
            "",
            "",
        )
    shown = answer.elevations_deg[:3]
    rejects = answer.station is not None
    heads = "".join(f" {f'at {e:.4g}°':<8}" for e in shown)
    lines.append("")
    lines.append(
        f"    MHz  fH/f   X/O  top dB {heads} linear"
        + (" rej. O/X" if rejects else "")
        + (" state" if answer.time_utc else "")
    )
    lines += [_row(answer, row, len(shown)) for row in answer.rows]
    lines += ["", *_legend(answer)]
    for caveat in answer.caveats:
        lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"


def _turns(answer: SenseAnswer) -> str:
    side = f"{answer.turns_toward_deg:.0f}° true"
    if answer.turns_below_deg is None:
        return f"Toward {side} the hand turns over at no elevation."
    return f"From below {answer.turns_below_deg:.0f}° toward {side} the hands change places."


def _letter(cell: SenseCell) -> str:
    letter = "R" if cell.ordinary_hand is Hand.RIGHT else "L"
    if cell.shape is Shape.LINEAR:
        return "|"
    return letter if cell.shape is Shape.CIRCULAR else letter.lower()


def _row(answer: SenseAnswer, row: SenseRow, shown: int) -> str:
    ratio = "-"
    if row.absorption_ratio is not None:
        ratio = f"{row.absorption_ratio:.1f}" if row.absorption_ratio < 999.0 else ">999"
    top = row.overhead
    shape = "inf" if top.axial_ratio_db is None else f"{top.axial_ratio_db:.1f}"
    count = len(answer.bearings_deg)
    words = "".join(
        f" {''.join(_letter(c) for c in row.cells[i * count : (i + 1) * count]):<8}"
        for i in range(shown)
    )
    linear = "-"
    if row.linear_from_deg is not None and row.linear_to_deg is not None:
        linear = f"{row.linear_from_deg:.0f}-{row.linear_to_deg:.0f}°"
    line = (
        f"  {row.frequency_mhz:6.3f} {row.gyro_ratio:5.2f} {ratio:>5}  "
        f"{_letter(top)} {shape:<5}{words} {linear:<6}"
    )
    if answer.station is not None:
        line += f" {_rejection(top):<8}"
    if row.state is not None:
        line += f" {states_in_short(row.state)}"
    return line.rstrip()


def _rejection(cell: SenseCell) -> str:
    pair = (cell.ordinary_rejection_db, cell.extraordinary_rejection_db)
    return "/".join("-" if r is None else f"{r:.0f}" for r in pair)


def _legend(answer: SenseAnswer) -> list[str]:
    side = f"{answer.turns_toward_deg:.0f}°"
    fourth = "Overhead: fH/f, dB of absorption X over O, and at the top O's axial ratio."
    if answer.station is not None:
        fourth = "Overhead: absorption X/O, O's axial ratio, rejection in dB for O/X wanted."
    return [
        f"Hand to receive O on, from {_POINTS}; X has the other hand.",
        "L R circular, l r elliptical (over 3 dB), | a wire beats circular (over 7.7 dB).",
        f"linear: elevations toward {side} true between which a wire beats circular.",
        fourth,
    ]


def sense_rows(answer: SenseAnswer) -> list[dict[str, Any]]:
    """The full table, one row a frequency and direction.

    Parameters
    ----------
    answer : SenseAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys to values.
    """
    rows = []
    for row in answer.rows:
        whole = {k: v for k, v in dotted_record(row).items() if "cells" not in k}
        common = {k: v for k, v in whole.items() if not k.startswith("overhead")}
        rows += [common | dotted_record(cell) for cell in (row.overhead, *row.cells)]
    return rows
