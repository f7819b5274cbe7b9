"""The plan of a net as text of 80 columns, and as rows."""

from typing import Any

from magion.answers.net import NetAnswer, NetCell, NetHour
from magion.render.data import dotted_record
from magion.render.day import LETTERS
from magion.render.text import in_words, wrapped

_IN_A_ROW = 3


def net_text(answer: NetAnswer) -> str:
    """The plan: what to do, every frequency, every partner.

    Parameters
    ----------
    answer : NetAnswer
        The answer.

    Returns
    -------
    str
        Text; of several hours one line each.
    """
    first = answer.hours[0]
    if len(answer.hours) == 1:
        lines = wrapped(first.headline, "", "")
        head = f"Net control {answer.control}, {in_words(first.time_utc)}"
        lines += ["", *wrapped(head, "", "")]
        lines += ["", *_frequencies(first, len(answer.partners)), "", *_partners(answer, first)]
        lines += wrapped(
            "B both waves arrive, X only the extraordinary, O only the ordinary, - neither; "
            f"the {'relay position' if answer.station else 'hand'} for it; margin to its MUF in "
            "MHz; rejection of the other wave in dB, where the antenna is known."
        )
    else:
        head = f"Net control {answer.control}, {first.time_utc[:10]}, hour by hour (UTC)"
        lines = [*wrapped(head, "", ""), ""]
        for hour in answer.hours:
            head = f"  {hour.time_utc[11:16]}  "
            lines += wrapped(hour.headline, " " * len(head), head)
    lines += ["", *wrapped(f"Ionosphere: {answer.source}.")]
    if answer.caveats:
        lines += ["", "Keep in mind"]
        for caveat in answer.caveats:
            lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"


def _frequencies(hour: NetHour, count: int) -> list[str]:
    lines = ["      MHz  heard   served  on        worst partner           its chance"]
    for f in hour.frequencies:
        mark = "*" if f.frequency_mhz == hour.best_frequency_mhz else " "
        chance = "-" if f.worst_probability is None else f"{100.0 * f.worst_probability:.0f} %"
        lines.append(
            f"{mark} {f.frequency_mhz:7.3f}  {f'{f.reached}/{count}':<7} "
            f"{f'{len(f.served)}/{count}':<7} {(f.position or '-')[:9]:<9} "
            f"{f.worst_partner[:22]:<22}  {chance:>9}"
        )
        if f.failed and f.position is not None:
            lines += wrapped(f"fails {', '.join(f.failed)}", " " * 11, " " * 11)
    return lines


def _partners(answer: NetAnswer, hour: NetHour) -> list[str]:
    frequencies = [f.frequency_mhz for f in hour.frequencies]
    by_place = {(c.partner, c.frequency_mhz): c for c in hour.cells}
    lines: list[str] = []
    for start in range(0, len(frequencies), _IN_A_ROW):
        part = frequencies[start : start + _IN_A_ROW]
        heads = "".join(f" | {f'{f:.3f} MHz':<16}" for f in part)
        lines.append(f"  {'partner':<10} {'km':>4} {'from':>4}{heads}".rstrip())
        for p in answer.partners:
            cells = "".join(f" | {_cell(by_place[p.name, f]):<16}" for f in part)
            lines.append(
                f"  {p.name[:10]:<10} {p.distance_km:>4.0f} {p.bearing_deg:>3.0f}°{cells}".rstrip()
            )
        lines.append("")
    return lines[:-1]


def _cell(cell: NetCell) -> str:
    margin = ""
    if cell.margin_mhz is not None:
        margin = f"{cell.margin_mhz:{'+.1f' if abs(cell.margin_mhz) < 9.95 else '+.0f'}}"
    rejection = "" if cell.rejection_db is None else f"{round(cell.rejection_db) + 0:d}"
    return f"{LETTERS[cell.state]} {(cell.receive or '-')[:6]:<6} {margin:>4}{rejection:>3}"


def net_rows(answer: NetAnswer) -> list[dict[str, Any]]:
    """One row a partner, frequency and hour.

    Parameters
    ----------
    answer : NetAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys to values.
    """
    partners = {p.name: dotted_record(p) for p in answer.partners}
    rows = []
    for hour in answer.hours:
        for cell in hour.cells:
            own = dotted_record(cell) | {"served_by": " ".join(cell.served_by)}
            own = {k: v for k, v in own.items() if not k.startswith("served_by.")}
            place = {k: v for k, v in partners[cell.partner].items() if k != "name"}
            rows.append({"time_utc": hour.time_utc} | own | place)
    return rows
