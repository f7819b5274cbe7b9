"""The day as text of 80 columns, and as rows."""

import math
from typing import Any

import numpy as np

from magion.answers.day import DayAnswer, DayFrequency, Switch
from magion.render.text import wrapped
from magion.waves import Mode

LETTERS = {
    "both": "B",
    "extraordinary_only": "X",
    "ordinary_only": "O",
    "none": "-",
    "unknown": "?",
}
"""State to letter."""

_COLUMNS = 48


def day_text(answer: DayAnswer) -> str:
    """The day: strips of letters, the switching plan, and a row an hour.

    Parameters
    ----------
    answer : DayAnswer
        The answer.

    Returns
    -------
    str
        Text.
    """
    lines = wrapped(
        f"{answer.date}, from {answer.transmitter} to {answer.receiver}, "
        f"{answer.distance_km:.0f} km. Times are UTC; local solar time is "
        f"{answer.solar_hour_offset:+.1f} h.",
        "",
        "",
    )
    lines += wrapped(f"Ionosphere: {answer.source}.", "", "")
    lines += ["", *_strips(answer)]
    for frequency in answer.frequencies:
        lines += ["", f"Switching plan, {frequency.frequency_mhz:.3f} MHz"]
        for entry in frequency.plan:
            lines += _switch(entry, answer.station is not None)
    lines += ["", *_hourly(answer)]
    if answer.caveats:
        lines += ["", "Keep in mind"]
        for caveat in answer.caveats:
            lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"


def _strips(answer: DayAnswer) -> list[str]:
    count = answer.hours.size
    stride = max(1, math.ceil(count / _COLUMNS))
    shown = range(0, count, stride)
    ruler = [" "] * (len(shown) + 2)
    for k, i in enumerate(shown):
        hour = answer.hours[i]
        if abs(hour / 3.0 - round(hour / 3.0)) < 1e-6:
            ruler[k : k + 2] = f"{round(hour):02d}"
    lines = [f"  {'MHz':<16}{''.join(ruler)}".rstrip()]
    for f in answer.frequencies:
        states = "".join(LETTERS[f.state[i]] for i in shown)
        lines.append(f"  {f.frequency_mhz:<9.3f}{'waves':<7}{states}")
        lines.append(f"  {'':<9}{'relay':<7}{''.join(_letter(f.receive[i]) for i in shown)}")
    lines += wrapped(
        "B both waves, X only the extraordinary, O only the ordinary, - neither"
        + (", ? no readings" if any("unknown" in f.state for f in answer.frequencies) else "")
        + f"; relay: {_key(answer)}."
    )
    return lines


def _letter(position: str | None) -> str:
    return "." if position is None else position[0]


def _key(answer: DayAnswer) -> str:
    names = sorted({p for f in answer.frequencies for p in f.receive if p})
    if not names:
        return "no wave to switch for"
    if answer.station is None:
        return "R for RHCP, L for LHCP, to receive"
    return "first letter of " + ", ".join(names) + ", to receive"


def _switch(entry: Switch, labelled: bool) -> list[str]:
    doubt = "" if entry.plus_minus_min is None else f"± {entry.plus_minus_min:.0f} min"
    if entry.receive is None:
        action = "no position is given" if entry.wave else "nothing to switch to"
    else:
        alike = entry.transmit == entry.receive
        action = f"receive {'and transmit ' if alike else ''}{entry.receive}"
        if entry.transmit is None and labelled:
            action += ", receive only"
        elif entry.transmit is not None and not alike:
            action += f", transmit {entry.transmit}"
    head = f"  {entry.time_utc[11:16]} {doubt:<10} "
    return wrapped(f"{action}: {entry.reason}", " " * len(head), head)


def _hourly(answer: DayAnswer) -> list[str]:
    lines = ["  UTC   foF2  fxF2  MUF O  MUF X |    MHz  elevation    delay   absorbed, dB"]
    lines.append("          MHz   MHz    MHz    MHz |          O      X   X-O, ms     O      X")
    minutes = np.round(answer.hours * 60.0).astype(int)
    for i in np.flatnonzero(minutes % 60 == 0):
        sky = "".join(
            _cell(values[i], ".2f", wide)
            for values, wide in (
                (answer.fof2_mhz, 6),
                (answer.fxf2_mhz, 6),
                (answer.muf_mhz[0], 7),
                (answer.muf_mhz[1], 7),
            )
        )
        for k, f in enumerate(answer.frequencies):
            if k and not np.isfinite(f.elevation_deg[:, i]).any():
                continue
            left = f"  {minutes[i] // 60:02d}:00{sky}" if k == 0 else " " * 33
            split = f.group_delay_ms[1, i] - f.group_delay_ms[0, i]
            lines.append(
                f"{left} |{f.frequency_mhz:7.3f}"
                f"{_cell(f.elevation_deg[0, i], '.0f', 6)}{_cell(f.elevation_deg[1, i], '.0f', 7)}"
                f"{_cell(split, '+.3f', 9)}"
                f"{_cell(f.absorption_db[0, i], '.0f', 7)}{_cell(f.absorption_db[1, i], '.0f', 7)}"
            )
    return lines


def _cell(value: float, form: str, wide: int) -> str:
    # Adding zero after rounding leaves no "-0.000".
    places = int(form[-2])
    return f"{format(round(value, places) + 0.0, form) if math.isfinite(value) else '-':>{wide}}"


def day_rows(answer: DayAnswer) -> list[dict[str, Any]]:
    """One row a step and frequency.

    Parameters
    ----------
    answer : DayAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys to values; what is not a number is None.
    """
    return [_row_of(answer, f, i) for f in answer.frequencies for i in range(len(answer.time_utc))]


def _row_of(answer: DayAnswer, f: DayFrequency, i: int) -> dict[str, Any]:
    row: dict[str, Any] = {
        "frequency_mhz": f.frequency_mhz,
        "time_utc": answer.time_utc[i],
        "state": f.state[i],
        "wave": f.wave[i],
        "receive": f.receive[i],
        "transmit": f.transmit[i],
        "rejection_db": _plain(f.rejection_db[i]),
        "fof2_mhz": _plain(answer.fof2_mhz[i]),
        "fxf2_mhz": _plain(answer.fxf2_mhz[i]),
        "fof2_error_mhz": _plain(answer.fof2_error_mhz[i]),
        "solar_zenith_deg": _plain(answer.solar_zenith_deg[i]),
    }
    for k, mode in enumerate((Mode.ORDINARY.value, Mode.EXTRAORDINARY.value)):
        row[f"{mode}.muf_mhz"] = _plain(answer.muf_mhz[k, i])
        row[f"{mode}.receive_hand"] = f.receive_hand[k][i]
        for name in (
            "elevation_deg",
            "azimuth_deg",
            "group_delay_ms",
            "absorption_db",
            "level_db",
            "axial_ratio_db",
        ):
            row[f"{mode}.{name}"] = _plain(getattr(f, name)[k, i])
    return row


def _plain(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None
