"""Traced MUFs of the ordinary wave beside the formula of ITU-R P.1240.

Print the table with ``python -m tests.benchmarks.muf_band``. It is a band to
look at and no gate: the formula is an empirical fit through M(3000)F2, and the
traced MUF is that of our own profile. Rays run without a field: nearly the
ordinary wave at every bearing, without the formula's half gyrofrequency.

Formula (Recommendation ITU-R P.1240, from memory), x = max(foF2 / foE, 2):

    B     = M − 0.124 + (M² − 4) [0.0215 + 0.005 sin(7.854 / x − 1.9635)]
    d_max = 4780 + (12610 + 2140 / x² − 49720 / x⁴ + 688900 / x⁶)(1 / B − 0.303) km
    C_D   = 0.74 − 0.591 Z − 0.424 Z² − 0.090 Z³ + 0.088 Z⁴ + 0.181 Z⁵ + 0.096 Z⁶,
            Z = 1 − 2 D / d_max
    MUF   = [1 + (C_D / C_3000)(B − 1)] foF2
"""

from datetime import UTC, datetime

import numpy as np

from magion.answers.certainty import path_mufs
from magion.answers.scene import Overhead, Scene
from magion.constants import EARTH_RADIUS
from magion.geometry import Place, travel
from magion.ionosphere.climatology import climate
from magion.ionosphere.profile import profiles_of_layers
from magion.rays.link import link_between
from tests.media import AxialDipole, Scaled

DISTANCES = (0, 250, 500, 750, 1000, 1500, 2000, 2500, 3000, 3500, 3900)
CASES = (
    ("52N 5E, June noon, 120 sfu", 52.0, 5.0, datetime(2026, 6, 21, 12, tzinfo=UTC), 120.0),
    ("52N 5E, December noon, 120 sfu", 52.0, 5.0, datetime(2026, 12, 21, 12, tzinfo=UTC), 120.0),
    ("52N 5E, December 01 UT, 80 sfu", 52.0, 5.0, datetime(2026, 12, 21, 1, tzinfo=UTC), 80.0),
    ("10S 75W, March 17 UT, 180 sfu", -10.0, -75.0, datetime(2026, 3, 20, 17, tzinfo=UTC), 180.0),
)
NO_FIELD = Scaled(AxialDipole(), 1e-6)


def formula(distance_km, fof2, foe, m3000):
    """F2(D)MUF of the ordinary wave, and d_max [km]."""
    x = max(fof2 / max(foe, 1e-3), 2.0)
    turn = np.sin(7.854 / x - 1.9635)
    b = m3000 - 0.124 + (m3000**2 - 4.0) * (0.0215 + 0.005 * turn)
    reach = 12610.0 + 2140.0 / x**2 - 49720.0 / x**4 + 688900.0 / x**6
    longest = 4780.0 + reach * (1.0 / b - 0.303)

    def c(d):
        z = 1.0 - 2.0 * d / longest
        return np.polyval([0.096, 0.181, 0.088, -0.090, -0.424, -0.591, 0.74], z)

    return (1.0 + c(distance_km) / c(3000.0) * (b - 1.0)) * fof2, longest


def traced(latitude, longitude, distance_km, layers):
    """MUF by the F region over a path with its midpoint there [MHz]."""
    half = 0.5 * distance_km * 1e3 / EARTH_RADIUS
    lat, lon = np.radians([latitude, longitude])
    ends = [travel(lat, lon, bearing, half) for bearing in (-0.5 * np.pi, 0.5 * np.pi)]
    places = [
        Place(latitude_deg=float(np.degrees(a)), longitude_deg=float(np.degrees(b)))
        for a, b in ends
    ]
    over = Overhead(
        profiles=profiles_of_layers([layers]),
        layers=layers,
        fof2=float(layers.fof2),
        hmf2=float(layers.hmf2),
        foe=float(layers.foe),
        fof2_error=None,
        error_source=None,
        source="benchmark",
        caveats=(),
    )
    scene = Scene(
        link=link_between(*places),
        medium=over.profiles,
        field=NO_FIELD,
        gyro_limit=0.0,
        overheads=(over,),
        places=(),
        stations=None,
    )
    return float(path_mufs(scene, (1,)).f_region[0, 0]) / 1e6


def rows():
    """Rows of the table: case, then distance, traced, formula and their ratio."""
    for name, latitude, longitude, when, flux in CASES:
        place = np.radians([[latitude], [longitude]])
        found = climate(*place, when, np.array([float(when.hour)]), flux)
        layers = found.layers(0, 0)
        fof2, foe, m = float(layers.fof2) / 1e6, float(layers.foe) / 1e6, float(found.m3000[0, 0])
        longest = formula(0.0, fof2, foe, m)[1]
        yield (
            f"{name}: foF2 {fof2:.2f}, foE {foe:.2f} MHz, hmF2 {layers.hmf2 / 1e3:.0f} km, "
            f"M {m:.2f}, d_max {longest:.0f} km"
        )
        yield f"{'D km':>8}{'traced':>10}{'formula':>10}{'ratio':>8}"
        for distance in DISTANCES:
            ours = traced(latitude, longitude, distance, layers)
            theirs = formula(distance, fof2, foe, m)[0]
            yield f"{distance:>8}{ours:>10.2f}{theirs:>10.2f}{ours / theirs:>8.3f}"


if __name__ == "__main__":
    for row in rows():
        print(row, flush=True)
