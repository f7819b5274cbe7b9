"""A record as JSON or CSV: the same keys, unrounded, no NaN."""

import csv
import dataclasses
import io
import json
import math
from collections.abc import Iterable
from enum import Enum
from typing import Any

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
    if isinstance(value, tuple | list):
        return [plain(v) for v in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def to_json(record: Any) -> str:
    """A record as strict JSON.

    Parameters
    ----------
    record : record
        A frozen record.

    Returns
    -------
    str
        JSON text with a final line end.
    """
    return json.dumps(plain(record), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def dotted(value: Any, prefix: str = "") -> dict[str, Any]:
    """Nested dictionaries as one, the keys joined by dots.

    Parameters
    ----------
    value : dict
        What :func:`plain` returns of a record.
    prefix : str
        Key of the dictionary itself.

    Returns
    -------
    dict
        Dotted key to plain value; lists are left out.
    """
    flat: dict[str, Any] = {}
    for key, inner in value.items():
        name = f"{prefix}.{key}" if prefix else key
        if isinstance(inner, dict):
            flat.update(dotted(inner, name))
        elif not isinstance(inner, list):
            flat[name] = inner
    return flat


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


def path_rows(record: Any) -> list[dict[str, Any]]:
    """Rows of a path's CSV: one a ray, the leading ray of each wave first.

    Parameters
    ----------
    record : PathAnswer
        The answer.

    Returns
    -------
    list of dict
        Dotted keys of the answer and of the ray.
    """
    answer = plain(record)
    waves = answer.pop("waves")
    common = dotted(answer)
    nested = ("launch", "arrival", "index", "limiting")
    full: dict[str, dict[str, Any]] = {}
    for wave in waves:  # columns of a part that one wave lacks are taken from the other
        for part in nested:
            for ray in [wave, *wave["rays"]]:
                if ray[part]:
                    full.setdefault(part, dict.fromkeys(ray[part]))
    rows = []
    for wave in waves:
        for ray in [wave, *wave["rays"]]:
            filled = {
                key: (full.get(key) if key in nested and value is None else value)
                for key, value in ray.items()
            }
            rows.append(common | dotted({k: v for k, v in filled.items() if k != "rays"}))
    return rows
