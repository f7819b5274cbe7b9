"""Partners of a net from a CSV file."""

from dataclasses import replace
from pathlib import Path
from typing import Final

from magion.errors import InputError
from magion.formats.tables import printable, read_table
from magion.geometry import Place, parse_place

MOST_PARTNERS: Final = 500
LONGEST_NAME: Final = 60


def read_partners(path: str | Path) -> tuple[Place, ...]:
    """Partners of a net.

    Parameters
    ----------
    path : str or Path
        CSV with the columns ``name`` and ``place``.

    Returns
    -------
    tuple of Place
        The partners, with their names.

    Raises
    ------
    InputError
        If the file is wrong; the message names file, line and column.
    """
    table = read_table(path, ("name", "place"))
    if not 1 <= len(table.rows) <= MOST_PARTNERS:
        raise InputError(
            f"{table.file} holds {len(table.rows)} partners; accepted: 1 to {MOST_PARTNERS}"
        )
    partners: list[Place] = []
    seen: set[str] = set()
    for row in table.rows:
        name = row.cells["name"].strip()
        if not name or len(name) > LONGEST_NAME or not name.isprintable():
            raise row.error(
                "name", f"{printable(name)!r} is no name; accepted: 1 to {LONGEST_NAME} signs"
            )
        if name.casefold() in seen:
            raise row.error("name", f"{printable(name)!r} stands twice; accepted: each name once")
        seen.add(name.casefold())
        try:
            place = parse_place(row.cells["place"].strip())
        except InputError as error:
            raise row.error("place", str(error)) from None
        partners.append(replace(place, name=name))
    return tuple(partners)
