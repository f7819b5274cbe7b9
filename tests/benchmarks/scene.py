"""The demo ionosphere and field that the benchmarks share."""

from datetime import UTC, datetime

import numpy as np

from magion.field import fit_field
from magion.geometry import parse_place
from magion.ionosphere.layers import LayerParameters
from magion.ionosphere.profile import profiles_of_layers
from magion.rays.chain import Specs
from magion.rays.link import link_between

WHEN = datetime(2026, 6, 21, 12, tzinfo=UTC)
TRANSMITTER, RECEIVER = parse_place("46.50,11.35"), parse_place("50.0,8.0")
LINK = link_between(TRANSMITTER, RECEIVER)
LAYERS = LayerParameters(
    fof2=6.5e6,
    hmf2=265e3,
    f2_bottom=31e3,
    f2_top=44e3,
    foe=3.4e6,
    hme=110e3,
    e_bottom=5e3,
    e_top=7e3,
    fof1=4.8e6,
    hmf1=185e3,
    f1_share=1.0,
    source="benchmark",
)
MEDIUM = profiles_of_layers([LAYERS])


def field():
    """The fitted field of the demo path."""
    ends = (TRANSMITTER.latitude, TRANSMITTER.longitude, RECEIVER.latitude, RECEIVER.longitude)
    return fit_field(*ends, WHEN)


def fan(count, frequency=5.3e6):
    """Launch directions and ray set of `count` elevations for both waves."""
    psi = np.radians(np.linspace(2.0, 85.0, count))
    w = np.stack([np.concatenate([psi, psi]), np.zeros(2 * count)])
    rays = Specs(
        frequency=np.full(2 * count, frequency),
        which=np.zeros(2 * count, dtype=np.intp),
        hops=np.ones(2 * count, dtype=np.intp),
        extraordinary=(np.arange(2 * count) >= count)[None],
    )
    return w, rays
