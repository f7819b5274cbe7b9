"""A record as JSON or CSV: the same keys, unrounded, no NaN."""

import csv
import dataclasses
import io
import json
import math
from collections.abc import Iterable
from enum import Enum
from typing import Any, get_args, get_origin, get_type_hints

from magion.answers.pattern import AntennaAnswer
from magion.answers.records import PathAnswer, RayAnswer, WaveOnPath

_FORMULA = ("=", "+", "-", "@", "\t", "\r")


def plain(value: Any) -> Any:
    """A record as dictionaries, lists and plain values.

    Parameters
    ----------
    value : record
        A frozen record, or part of one.

    Returns
    -------
    dict, list or plain value
        Numbers unrounded; enumerations as their values; what is not a finite
        number as None.
    """
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: plain(getattr(value, f.name)) for f in dataclasses.fields(value)}
    if isinstance(value, Enum):
        return value.value
    if hasattr(value, "tolist"):
        return plain(value.tolist())  # an array
    if isinstance(value, tuple | list):
        return [plain(v) for v in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def to_json(record: Any, *, ascii_only: bool = False) -> str:
    """A record as strict JSON.

    Parameters
    ----------
    record : record
        A frozen record.
    ascii_only : bool
        Whether to write other signs as escapes.

    Returns
    -------
    str
        JSON text with a final line end.
    """
    return json.dumps(plain(record), indent=2, ensure_ascii=ascii_only, allow_nan=False) + "\n"


def _cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str) and value.startswith(_FORMULA):
        return "'" + value  # a spreadsheet must not take it for a formula
    return repr(value) if isinstance(value, float) else str(value)


def to_csv(rows: Iterable[dict[str, Any]]) -> str:
    """Rows of dotted keys as CSV.

    Parameters
    ----------
    rows : iterable of dict
        Rows; a key missing from one is an empty cell.

    Returns
    -------
    str
        CSV text with a header.
    """
    table = list(rows)
    columns = list(dict.fromkeys(key for row in table for key in row))
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(columns)
    for row in table:
        writer.writerow([_cell(row.get(column)) for column in columns])
    return out.getvalue()


def dotted_record(record: Any) -> dict[str, Any]:
    """A record as one dictionary of dotted keys, the same keys whatever is null in it.

    Parameters
    ----------
    record : record
        A frozen record.

    Returns
    -------
    dict
        Dotted key to plain value; a part that is null gives all its keys with
        None; lists are left out.
    """
    return _walk(type(record), record, "")


def _walk(kind: type, value: Any, prefix: str) -> dict[str, Any]:
    flat: dict[str, Any] = {}
    hints = get_type_hints(kind)
    for field in dataclasses.fields(kind):
        name = f"{prefix}.{field.name}" if prefix else field.name
        inner = None if value is None else getattr(value, field.name)
        choices = [hints[field.name], *get_args(hints[field.name])]
        parts = [c for c in choices if dataclasses.is_dataclass(c) and isinstance(c, type)]
        if any(get_origin(c) is tuple for c in choices):
            continue
        if parts:
            flat |= _walk(parts[0], inner, name)
        else:
            flat[name] = plain(inner)
    return flat


def path_rows(answer: PathAnswer) -> list[dict[str, Any]]:
    """Rows of a path's CSV: one a ray, the leading ray of each wave first.

    Parameters
    ----------
    answer : PathAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys of the answer and of the ray.
    """
    common = dotted_record(answer)
    rows = []
    for wave in answer.waves:
        rows.append(common | _walk(WaveOnPath, wave, ""))
        for ray in wave.rays:
            rows.append(common | _walk(RayAnswer, ray, "") | {"muf_mhz": wave.muf_mhz})
    return rows


def antenna_rows(answer: AntennaAnswer) -> list[dict[str, Any]]:
    """The response over the sky, one row a relay position and direction.

    Parameters
    ----------
    answer : AntennaAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys to values.
    """
    keys = ("right_dbi", "left_dbi", "right_over_left_db")
    return [
        {"label": p.label, "elevation_deg": float(e), "azimuth_deg": float(a)}
        | {key: float(getattr(p, key)[i, j]) for key in keys}
        for p in answer.positions
        for i, e in enumerate(answer.elevation_deg)
        for j, a in enumerate(answer.azimuth_deg)
    ]
