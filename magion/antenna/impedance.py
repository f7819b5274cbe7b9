"""Feed-point impedance of the elements: measured, or from a table.

The table comes from a moment method with the exact Sommerfeld ground and ships
with the package; how it was made, and what an independent engine says to it,
stands in ``data/README.md`` beside it. A Fresnel-weighted image gives wrong
resistances below about 0.2 wavelengths, so it is not used here. Outside the
table the impedance is NaN: it is not guessed.
"""

from functools import lru_cache
from importlib.resources import files
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from magion.antenna.elements import HALF_WAVE_LEG
from magion.antenna.station import Antenna, MeasuredImpedance, Station
from magion.arrays import ComplexArray, FloatArray
from magion.constants import SPEED_OF_LIGHT
from magion.ground import Ground

_AXES: Final = (
    "permittivity_magnitude",
    "loss_angle",
    "tip_height",
    "leg_length",
    "wire_radius_log10",
    "apex_angle_deg",
)
_LOGARITHMIC: Final = ("permittivity_magnitude", "tip_height")
_ROUNDING: Final = 1e-9

LONGEST_LEG: Final = 0.45
"""Leg over wavelength up to which the sinusoidal current has a feed-point current [1]."""


@lru_cache(maxsize=1)
def _table() -> tuple[tuple[FloatArray, ...], ComplexArray]:
    """Nodes of every axis, in the variable that is splined, and the impedance [ohm]."""
    with (files("magion.antenna") / "data" / "impedance.npz").open("rb") as file:
        held = np.load(file, allow_pickle=False)
        nodes = tuple(_variable(name, held[name].astype(float)) for name in _AXES)
        return nodes, held["impedance"].astype(np.complex128)


def _variable(name: str, value: FloatArray) -> FloatArray:
    return np.log(value) if name in _LOGARITHMIC else value


def _weights(nodes: FloatArray, values: FloatArray) -> FloatArray:
    """Share of each node in a cubic spline at some values, shape (n, nodes)."""
    from scipy.interpolate import make_interp_spline

    spline = make_interp_spline(nodes, np.eye(nodes.size), k=min(3, nodes.size - 1))
    return np.asarray(spline(values))


def from_table(
    permittivity: ComplexArray,
    tip_height: ArrayLike,
    leg_length: ArrayLike,
    wire_radius: ArrayLike,
    apex_angle: float,
) -> ComplexArray:
    """Impedance of a dipole or inverted vee by the table.

    Parameters
    ----------
    permittivity : ndarray of complex, shape (n,)
        Complex relative permittivity of the ground [1].
    tip_height, leg_length, wire_radius : array_like
        Height of the wire's ends, length of each leg, radius of the wire, over
        the wavelength [1].
    apex_angle : float
        Between the legs [rad].

    Returns
    -------
    ndarray of complex, shape (n,)
        Impedance; NaN outside the table [ohm].
    """
    eps = np.atleast_1d(permittivity)
    with np.errstate(divide="ignore", invalid="ignore"):
        given = (
            np.abs(eps),
            -np.angle(eps),
            tip_height,
            leg_length,
            np.log10(wire_radius),
            np.degrees(apex_angle),
        )
        values = [
            np.broadcast_to(_variable(name, np.asarray(x, float)), eps.shape)
            for name, x in zip(_AXES, given, strict=True)
        ]
    nodes, impedance = _table()
    inside = np.ones(eps.shape, dtype=bool)
    for axis, x in zip(nodes, values, strict=True):
        inside &= (x >= axis[0] - _ROUNDING) & (x <= axis[-1] + _ROUNDING)
    found = np.full(eps.shape, np.nan + 0j, dtype=np.complex128)
    if not inside.any():
        return found
    # The apex is one number: it leaves the table first.
    kept = impedance @ _weights(nodes[-1], values[-1][:1])[0]
    shares = [_weights(a, x[inside]) for a, x in zip(nodes[:-1], values[:-1], strict=True)]
    partial = np.tensordot(shares[0], kept, axes=1)
    for share in shares[1:]:
        partial = np.einsum("nj,nj...->n...", share, partial)
    found[inside] = partial
    return found


def impedance_of(
    antenna: Antenna, leg: float | None, ground: Ground, frequency: ArrayLike
) -> ComplexArray:
    """Feed-point impedance of each element.

    Parameters
    ----------
    antenna : Antenna
        The antenna; a measured impedance goes before the table.
    leg : float or None
        Length of each leg, from :func:`leg_length_of`; None for loops [m].
    ground : Ground
        The ground.
    frequency : array_like, shape (n,)
        Frequencies [Hz].

    Returns
    -------
    ndarray of complex, shape (n,)
        Impedance; NaN where it is not known: outside the table, of loops that
        were not measured, and for legs longer than 0.45 wavelengths [ohm].
    """
    f = np.atleast_1d(np.asarray(frequency, float))
    if antenna.measured is not None:
        known = leg is None or leg * f / SPEED_OF_LIGHT <= LONGEST_LEG
        return np.where(known, _resonance(antenna.measured, f), np.nan + 0j)
    if leg is None:
        return np.full(f.shape, np.nan + 0j, dtype=np.complex128)
    return _of_wire(antenna, np.asarray(leg), ground, f)


def _resonance(measured: MeasuredImpedance, frequency: FloatArray) -> ComplexArray:
    """A series resonance about the measured point."""
    ratio = frequency / measured.frequency
    slope = measured.resistance * measured.quality_factor * (ratio - 1.0 / ratio)
    return np.asarray(measured.resistance + 1j * (measured.reactance + slope))


def _of_wire(
    antenna: Antenna, leg: FloatArray, ground: Ground, frequency: FloatArray
) -> ComplexArray:
    wavelength = SPEED_OF_LIGHT / frequency
    tip = antenna.height - leg * np.cos(0.5 * antenna.apex_angle)
    return from_table(
        ground.complex_permittivity(frequency),
        tip / wavelength,
        leg / wavelength,
        0.5 * antenna.wire_diameter / wavelength,
        antenna.apex_angle,
    )


@lru_cache(maxsize=64)
def leg_length_of(antenna: Antenna, ground: Ground) -> float | None:
    """Length of each leg, as stated or as the resonant frequency asks.

    Parameters
    ----------
    antenna : Antenna
        The antenna.
    ground : Ground
        Its ground, which shifts the resonance.

    Returns
    -------
    float or None
        The stated length; else that which makes the reactance vanish at the
        resonant frequency by the table; outside the table, and where the
        impedance was measured, 0.2375 wavelengths; None for loops [m].
    """
    if antenna.kind.is_loops:
        return None
    if antenna.leg_length is not None:
        return antenna.leg_length
    if antenna.resonant_frequency is None:
        return None
    wavelength = SPEED_OF_LIGHT / antenna.resonant_frequency
    if antenna.measured is None:
        legs = np.linspace(0.20, 0.27, 71) * wavelength
        reactance = _of_wire(
            antenna, legs, ground, np.full(legs.shape, antenna.resonant_frequency)
        ).imag
        rising = np.flatnonzero((reactance[:-1] < 0.0) & (reactance[1:] >= 0.0))
        if rising.size:
            i = int(rising[0])
            share = -reactance[i] / (reactance[i + 1] - reactance[i])
            return float(legs[i] + share * (legs[i + 1] - legs[i]))
    return HALF_WAVE_LEG * wavelength


def unknown_impedance(station: Station, frequency: float) -> str:
    """Why the elements' impedance is not known at a frequency, for messages.

    Parameters
    ----------
    station : Station
        The station.
    frequency : float
        Frequency [Hz].

    Returns
    -------
    str
        A clause that says what is accepted.
    """
    megahertz = f"{frequency / 1e6:.3f} MHz"
    if station.antenna.measured is not None:
        return (
            f"at {megahertz} the legs are longer than {LONGEST_LEG:g} wavelengths, where the "
            "current at the feed point vanishes; accepted: lower frequencies"
        )
    return (
        f"the elements' impedance at {megahertz} is outside the shipped table (legs of 0.15 to "
        "0.35 wavelengths, ends 0.0125 to 1 up) and is not guessed; give resistance_ohm, "
        "reactance_ohm and quality_factor in [antenna]"
    )
