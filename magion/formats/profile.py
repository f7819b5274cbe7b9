"""Files of a measured profile N(h)."""

from pathlib import Path

import numpy as np

from magion.errors import InputError
from magion.formats.tables import read_table
from magion.ionosphere.profile import VerticalProfiles, measured_profile

HEIGHT = "height_km"
DENSITY = "electron_density_m3"
LEAST_ROWS = 4
LOWEST_KM, HIGHEST_KM = 40.0, 2000.0
LARGEST_DENSITY = 1e14


def read_profile(path: str | Path) -> VerticalProfiles:
    """Read a measured profile.

    Parameters
    ----------
    path : str or Path
        CSV with the columns ``height_km,electron_density_m3``: heights
        strictly increasing, densities not negative, at least four rows.

    Returns
    -------
    VerticalProfiles
        The profile as it stands, zero outside its heights.

    Raises
    ------
    InputError
        If the file is not such a table; the message names line and column.
    """
    table = read_table(path, (HEIGHT, DENSITY))
    heights: list[float] = []
    densities: list[float] = []
    for row in table.rows:
        height, density = row.number(HEIGHT), row.number(DENSITY)
        if not LOWEST_KM <= height <= HIGHEST_KM:
            raise row.error(HEIGHT, f"{height:g} is out of range; accepted: 40 to 2000 km")
        if heights and height <= heights[-1]:
            raise row.error(
                HEIGHT, f"{height:g} does not lie above {heights[-1]:g}; heights must increase"
            )
        if not 0.0 <= density <= LARGEST_DENSITY:
            raise row.error(DENSITY, f"{density:g} is out of range; accepted: 0 to 1e14 per m³")
        heights.append(height)
        densities.append(density)
    if len(heights) < LEAST_ROWS:
        raise InputError(f"{table.file}: {len(heights)} rows; accepted: at least {LEAST_ROWS}")
    if max(densities) <= 0.0:
        raise InputError(f"{table.file}: every density is 0; accepted: a profile with plasma")
    return measured_profile(np.array(heights) * 1e3, np.array(densities))
