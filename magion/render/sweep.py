"""One row of a sweep as cells of its CSV."""

import math
from typing import Final

from magion.answers.sweep import SweepRow

COLUMNS: Final = (
    "line",
    "time_utc",
    "from",
    "to",
    "frequency_mhz",
    "answered_for_utc",
    "distance_km",
    "state",
    "any_wave_probability",
    "wave",
    "receive_hand",
    "transmit_hand",
    "ordinary.level_db",
    "extraordinary.level_db",
    "ordinary.muf_mhz",
    "extraordinary.muf_mhz",
    "margin_mhz",
    "note",
)
"""Columns of the output."""


def cells(row: SweepRow) -> list[str]:
    """The cells of one row.

    Parameters
    ----------
    row : SweepRow
        The row and its answer.

    Returns
    -------
    list of str
        In the order of :data:`COLUMNS`; empty where there is nothing.
    """
    contact, found = row.contact, row.found
    chance = None if found.probability is None else 1.0 - found.probability[3]
    ends = (contact.transmitter, contact.receiver)
    return [
        str(contact.line),
        contact.time.strftime("%Y-%m-%dT%H:%M:%SZ"),
        *(f"{p.latitude_deg:.4f},{p.longitude_deg:.4f}" for p in ends),
        f"{contact.frequency_mhz:g}",
        row.answered_for_utc,
        f"{found.distance_km:.1f}",
        found.state,
        _number(chance, 3),
        found.wave or "",
        found.receive_hand or "",
        found.transmit_hand or "",
        *(_number(v, 2) for v in found.level_db),
        *(_number(v, 3) for v in found.muf_mhz),
        _number(found.margin_mhz, 3),
        contact.note,
    ]


def _number(value: float | None, digits: int) -> str:
    if value is None or not math.isfinite(value):
        return ""
    return f"{round(value, digits) + 0.0:.{digits}f}"
