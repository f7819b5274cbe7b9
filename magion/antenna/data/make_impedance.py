r"""Make the table of feed-point impedances: ``python make_impedance.py OUT.npz``.

A centre-fed thin wire, straight or bent to an inverted vee, over a flat lossy
ground. Its current is found by Galerkin's method of moments; the ground enters
through the exact integrals of A. Sommerfeld (1909). All lengths are in
wavelengths, so of the ground only its complex permittivity counts. Nothing
here is used when the package runs; it needs numpy and scipy and no engine.

Time factor exp(+i omega t). Axes of the wire's plane:

            z
            |      feed
            |      /  \
            |    /      \      legs in the plane y = 0
            |  /          \
            | tip         tip
    --------+--------------------- x   the ground, z = 0

Of the field that the ground sends back, the plane wave with the wave number kz
along z arrives with exp(-i kz (z + z')); the Fresnel coefficients R_H and R_V
of the package [Fresnel]_, continued to complex elevations, stand before it.
"""

import argparse
from collections.abc import Sequence
from dataclasses import dataclass
from multiprocessing import Pool
from pathlib import Path
from time import perf_counter
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import RectBivariateSpline, make_interp_spline
from scipy.optimize import brentq
from scipy.special import j0, j1

from magion.arrays import ComplexArray, FloatArray, IntArray
from magion.constants import SPEED_OF_LIGHT
from magion.ground import CLASSES

AXES: Final[dict[str, FloatArray]] = {
    "permittivity_magnitude": np.array([2.5, 5.0, 11.0, 30.0, 120.0, 900.0, 8000.0, 60000.0]),
    "loss_angle": np.array([0.005, 0.5, 1.05, 0.5 * np.pi - 0.002]),
    "tip_height": np.array(
        [
            *(0.0125, 0.02, 0.03, 0.045, 0.065, 0.09, 0.12, 0.16, 0.21, 0.27),
            *(0.335, 0.405, 0.48, 0.56, 0.64, 0.73, 0.82, 0.91, 1.0),
        ]
    ),
    "leg_length": np.linspace(0.15, 0.35, 9),
    "wire_radius_log10": np.array([-6.0, -4.8, -4.0, -3.4, -3.0]),
    "apex_angle_deg": np.array([90.0, 110.0, 130.0, 150.0, 165.0, 175.0, 180.0]),
}
"""Nodes of the table, from which cubic splines are laid through the impedance.

The permittivity is the magnitude times exp(-i loss_angle). Splined are the
logarithms of its magnitude and of the tip height, and the rest as it stands.
"""

K: Final = 2.0 * np.pi
"""Wave number of one wavelength [1]."""

ETA: Final = 376.730313668
"""Wave impedance of vacuum [ohm]."""

FEED_GAP: Final = 0.005
"""Length of wire over which the field of the feed is spread, over wavelength [1]."""

SEGMENTS: Final = 10
"""Segments of a leg."""

# Powers 1, u, u² of the current on a segment, u from 0 to 1: falling, rising, bulge.
_SHAPE = np.array([[1.0, -1.0, 0.0], [0.0, 1.0, 0.0], [0.0, 4.0, -4.0]])
_SLOPE = np.array([[-1.0, 0.0, 0.0], [1.0, 0.0, 0.0], [4.0, -8.0, 0.0]])


def _gauss(edges: ArrayLike, points: int) -> tuple[FloatArray, FloatArray]:
    """Nodes and weights of Gauss and Legendre on each interval between edges."""
    x, w = np.polynomial.legendre.leggauss(points)
    e = np.asarray(edges, dtype=np.float64)
    half, middle = 0.5 * np.diff(e), 0.5 * (e[1:] + e[:-1])
    return (middle[:, None] + half[:, None] * x).ravel(), (half[:, None] * w).ravel()


# --------------------------------------------------------------- the ground


def _spectrum(eps: complex, lowest: float, farthest: float) -> tuple[ComplexArray, ComplexArray]:
    """Nodes kz and weights of the integral over kr dkr from 0 to infinity.

    kr dkr = −kz dkz, so the path runs in kz from k to 0 and on to −i infinity,
    until exp(−i kz 2h) has vanished at the lowest height. The intervals are short
    near kz = 0, where R_V has its pole close by (kz about −k / sqrt(eps)), and at
    the branch point kz = −i k sqrt(eps − 1).
    """
    fine = np.geomspace(0.01 * K * min(1.0, 3.0 / abs(eps) ** 0.5), K, 24)
    x, w = _gauss([0.0, *fine], 12)
    end = 42.0 / lowest
    step = min(2.0 * np.pi / farthest, 8.0)
    branch = K * np.sqrt(eps - 1.0).real
    about = np.geomspace(1e-4 * branch, max(0.5 * branch, step), 24)
    edges = np.concatenate(
        [[0.0], fine, np.arange(K + step, end + step, step), branch + about, branch - about]
    )
    edges = np.unique(np.append(edges, [branch, end]))
    y, v = _gauss(edges[(edges >= 0.0) & (edges <= end)], 12)
    return np.concatenate([x + 0j, -1j * y]), np.concatenate([x * w + 0j, y * v])


def ground_field(
    eps: complex, distance: FloatArray, height: FloatArray
) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """Field that the ground returns of a short current, by Sommerfeld's integrals.

    Parameters
    ----------
    eps : complex
        Complex relative permittivity; infinity for a perfect conductor [1].
    distance : ndarray, shape (m,)
        Horizontal distance of the observer along x over wavelength, 0 or more [1].
    height : ndarray, shape (n,)
        Sum of the heights of source and observer over wavelength [1].

    Returns
    -------
    xx, zz, zx : ndarray of complex, shape (m, n)
        E_x of a current moment along x, E_z of one along z, E_z of one along
        x, of 1 A over a length of one wavelength [V per wavelength]. E_x of a
        moment along z is −zx.
    """
    perfect = not np.isfinite(eps)
    kz, weight = _spectrum(2.0 if perfect else eps, float(height.min()), float(distance.max()))
    kr = np.sqrt((K * K - kz * kz).real)
    # Fresnel's coefficients, as magion.ground.reflection has them, the sine of
    # the elevation being kz / k, here real or imaginary.
    if perfect:
        r_h, r_v = -np.ones_like(kz), np.ones_like(kz)
    else:
        sine = kz / K
        root = np.sqrt(eps - 1.0 + sine * sine)
        r_h = (sine - root) / (sine + root)
        r_v = (eps * sine - root) / (eps * sine + root)
    x = np.outer(distance, kr)
    bessel_0, bessel_1 = j0(x), j1(x)
    small = x < 1e-8
    bessel_2 = 2.0 * np.where(small, 0.5, bessel_1 / np.where(small, 1.0, x)) - bessel_0
    travel = np.exp(-1j * np.outer(kz, height))
    factor = ETA * K / (8.0 * np.pi)
    xx = (bessel_0 - bessel_2) * (weight * r_v * kz / K**2)
    xx = xx - (bessel_0 + bessel_2) * (weight * r_h / kz)
    zz = -2.0 * bessel_0 * (weight * r_v * kr**2 / (K**2 * kz))
    zx = 2j * bessel_1 * (weight * r_v * kr / K**2)
    return factor * (xx @ travel), factor * (zz @ travel), factor * (zx @ travel)


def image_field(
    distance: FloatArray, height: FloatArray
) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """The same over a perfect conductor, in closed form: the field of the image.

    Parameters
    ----------
    distance, height : ndarray, shape (...)
        As for :func:`ground_field` [1].

    Returns
    -------
    xx, zz, zx : ndarray of complex, shape (...)
        As of :func:`ground_field` [V per wavelength].
    """
    r = np.hypot(distance, height)
    q = 1.0 / (K * r)
    common: ComplexArray = -1j * K * ETA * np.exp(-1j * K * r) / (4.0 * np.pi * r)
    across: ComplexArray = common * (1.0 - 1j * q - q * q)
    along: ComplexArray = common * (-1.0 + 3j * q + 3.0 * q * q)
    x, z = distance / r, height / r
    return -across - along * x * x, across + along * z * z, -along * x * z


class GroundField:
    """:func:`ground_field` of one ground, splined between exact values.

    Splined is what is left after the quasi-static image (eps − 1) / (eps + 1),
    times the distance from the image and without its phase.

    Parameters
    ----------
    eps : complex
        Complex relative permittivity; infinity for a perfect conductor [1].
    lowest, highest : float
        Bounds of the sum of both heights over wavelength [1].
    farthest : float
        Greatest horizontal distance over wavelength [1].
    """

    _BEND: Final = 0.02

    def __init__(self, eps: complex, lowest: float, highest: float, farthest: float) -> None:
        self._share = 1.0 if not np.isfinite(eps) else (eps - 1.0) / (eps + 1.0)
        across = np.linspace(0.0, float(np.arcsinh(farthest / self._BEND)), 70)
        up = np.linspace(np.log(lowest), np.log(highest), 80)
        x, z = np.sinh(across) * self._BEND, np.exp(up)
        mesh_x, mesh_z = np.meshgrid(x, z, indexing="ij")
        r = np.hypot(mesh_x, mesh_z)
        exact, images = ground_field(eps, x, z), image_field(mesh_x, mesh_z)
        self._rest = []
        for field, image in zip(exact, images, strict=True):
            rest = (field - self._share * image) * r * np.exp(1j * K * r)
            self._rest.append(
                (
                    RectBivariateSpline(across, up, rest.real),
                    RectBivariateSpline(across, up, rest.imag),
                )
            )

    def __call__(
        self, distance: FloatArray, height: FloatArray
    ) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
        """The field, as :func:`ground_field` but point by point, ``distance`` signed."""
        apart = np.abs(distance)
        r = np.hypot(apart, height)
        out = np.exp(-1j * K * r) / r
        u, v = np.arcsinh(apart / self._BEND), np.log(height)
        xx, zz, zx = (
            (real.ev(u, v) + 1j * imaginary.ev(u, v)) * out + self._share * image
            for (real, imaginary), image in zip(self._rest, image_field(apart, height), strict=True)
        )
        return xx, zz, zx * np.sign(distance)


# ----------------------------------------------------------------- the wire


def _nodes_of_leg(leg: float) -> FloatArray:
    """Distance of the nodes from the feed: short segments at the feed and at the tip."""
    first = 0.5 * FEED_GAP
    step = np.arange(1, SEGMENTS)
    exponent = np.minimum(step, SEGMENTS - step + 0.7)
    growth = brentq(lambda g: first * (1.0 + np.sum(g**exponent)) - leg, 0.3, 6.0, xtol=1e-14)
    return np.concatenate([[0.0, first], first + np.cumsum(first * growth**exponent)])


@dataclass(frozen=True, slots=True, kw_only=True)
class Wire:
    """The bent wire, cut into segments from one tip to the other.

    Parameters
    ----------
    nodes : ndarray, shape (2, segments + 1)
        x and z of the nodes, z from the tips, over wavelength [1].
    lengths : ndarray, shape (segments,)
        Of the segments, over wavelength [1].
    directions : ndarray, shape (2, segments)
        Unit vectors along the segments [1].
    unknowns : ndarray, shape (segments, 3, unknowns)
        1 where a shape (falling, rising, bulge) of a segment belongs to an unknown.
    drive : ndarray, shape (unknowns,)
        Mean of each unknown's current over the feed gap [1].
    """

    nodes: FloatArray
    lengths: FloatArray
    directions: FloatArray
    unknowns: FloatArray
    drive: FloatArray


def wire_of(leg: float, apex_angle: float) -> Wire:
    """Cut a wire into segments.

    Parameters
    ----------
    leg : float
        Length of each leg over wavelength [1].
    apex_angle : float
        Between the legs, pi where they are level [rad].

    Returns
    -------
    Wire
        The wire.
    """
    t = _nodes_of_leg(leg)
    x, z = t * np.sin(0.5 * apex_angle), (leg - t) * np.cos(0.5 * apex_angle)
    nodes = np.stack([np.append(-x[::-1], x[1:]), np.append(z[::-1], z[1:])])
    steps = np.diff(nodes, axis=1)
    lengths = np.hypot(*steps)
    n = lengths.size
    unknowns = np.zeros((n, 3, 2 * n - 1))
    inner, every = np.arange(n - 1), np.arange(n)
    unknowns[inner + 1, 0, inner] = 1.0
    unknowns[inner, 1, inner] = 1.0
    unknowns[every, 2, n - 1 + every] = 1.0
    mean = _SHAPE @ (1.0 / np.array([1.0, 2.0, 3.0]))
    gap = slice(n // 2 - 1, n // 2 + 1)
    drive = np.einsum("p,pam,a->m", lengths[gap] / FEED_GAP, unknowns[gap], mean)
    return Wire(
        nodes=nodes, lengths=lengths, directions=steps / lengths, unknowns=unknowns, drive=drive
    )


def _powers(u: FloatArray) -> FloatArray:
    return np.stack([np.ones_like(u), u, u * u])


def own_matrix(wire: Wire, radius: float) -> ComplexArray:
    """Impedance matrix of the wire in free space, with the thin-wire kernel.

    Parameters
    ----------
    wire : Wire
        The wire.
    radius : float
        Of the wire over wavelength [1].

    Returns
    -------
    ndarray of complex, shape (unknowns, unknowns)
        The matrix [ohm].
    """
    # The outer points crowd at the segment's ends, where the inner integral,
    # closed for 1 / R and numerical for (exp(−ikR) − 1) / R, is logarithmic.
    x, w = _gauss([0.0, 1.0], 12)
    outer, outer_weight = x * x * (3.0 - 2.0 * x), 6.0 * w * x * (1.0 - x)
    start, length, along = wire.nodes[:, :-1], wire.lengths, wire.directions
    point = start[:, :, None] + along[:, :, None] * (length[:, None] * outer)
    apart = point[:, :, :, None] - start[:, None, None, :]
    foot = np.einsum("cpoq,cq->poq", apart, along)
    square = np.maximum(np.sum(apart * apart, axis=0) - foot**2, 0.0) + radius**2
    a, b = -foot, length - foot
    root_a, root_b = np.sqrt(a * a + square), np.sqrt(b * b + square)
    d = np.sqrt(square)
    t0 = np.arcsinh(b / d) - np.arcsinh(a / d)
    t1 = root_b - root_a
    t2 = 0.5 * (b * root_b - a * root_a - square * t0)
    inner = np.stack(
        [t0, (t1 + foot * t0) / length, (t2 + 2.0 * foot * t1 + foot**2 * t0) / length**2]
    ).astype(np.complex128)
    for u, share in zip(*_gauss([0.0, 1.0], 6), strict=True):
        r = np.sqrt((foot - length * u) ** 2 + square)
        rest = share * length * (np.exp(-1j * K * r) - 1.0) / r
        inner += np.array([1.0, u, u * u])[:, None, None, None] * rest
    weight = _powers(outer)[:, None, :] * (length[:, None] * outer_weight)
    moments = np.einsum("ipo,jpoq->ijpq", weight, inner) / (4.0 * np.pi)
    currents = np.einsum("ai,bj,ijpq->abpq", _SHAPE, _SHAPE, moments) * (along.T @ along)
    charges = np.einsum("ai,bj,ijpq->abpq", _SLOPE, _SLOPE, moments) / np.outer(length, length)
    pairs = 1j * K * ETA * currents - 1j * ETA / K * charges
    return np.asarray(np.einsum("pam,abpq,qbn->mn", wire.unknowns, pairs, wire.unknowns))


def ground_matrix(wire: Wire, field: GroundField, tip_height: float) -> ComplexArray:
    """What the ground adds to the impedance matrix.

    Parameters
    ----------
    wire : Wire
        The wire.
    field : GroundField
        The field that the ground returns.
    tip_height : float
        Height of the wire's ends over wavelength [1].

    Returns
    -------
    ndarray of complex, shape (unknowns, unknowns)
        The matrix [ohm].
    """
    # No interval is longer than the distance of the segment from its image.
    xs, zs, functions, directions = [], [], [], []
    heights = tip_height + np.minimum(wire.nodes[1, :-1], wire.nodes[1, 1:])
    for p, length in enumerate(wire.lengths):
        parts = int(np.ceil(length / (2.0 * heights[p]))) + int(length > 0.02)
        u, w = _gauss(np.linspace(0.0, 1.0, parts + 1), 3)
        along = wire.directions[:, p]
        xs.append(wire.nodes[0, p] + along[0] * length * u)
        zs.append(wire.nodes[1, p] + along[1] * length * u + tip_height)
        functions.append((length * w * (_SHAPE @ _powers(u))).T @ wire.unknowns[p])
        directions.append(np.repeat(along[:, None], u.size, axis=1))
    x, z, t = np.concatenate(xs), np.concatenate(zs), np.concatenate(directions, axis=1)
    xx, zz, zx = field(x[:, None] - x, z[:, None] + z)
    turned = np.outer(t[1], t[0]) - np.outer(t[0], t[1])
    mutual = np.outer(t[0], t[0]) * xx + np.outer(t[1], t[1]) * zz + turned * zx
    tested = np.concatenate(functions)
    return np.asarray(-tested.T @ mutual @ tested)


def solve(wire: Wire, matrix: ComplexArray) -> complex:
    """Impedance at the feed.

    Parameters
    ----------
    wire : Wire
        The wire.
    matrix : ndarray of complex, shape (unknowns, unknowns)
        Its impedance matrix [ohm].

    Returns
    -------
    complex
        Voltage over current, the current averaged over the feed gap [ohm].
    """
    return complex(1.0 / (wire.drive @ np.linalg.solve(matrix, wire.drive)))


def feed_impedance(
    eps: complex | None, tip_height: float, leg: float, radius: float, apex_angle: float
) -> complex:
    """Impedance of one wire, directly.

    Parameters
    ----------
    eps : complex or None
        Complex relative permittivity of the ground; infinity for a perfect
        conductor, None for free space [1].
    tip_height, leg, radius : float
        Height of the wire's ends, length of each leg, radius of the wire, over
        wavelength [1].
    apex_angle : float
        Between the legs [rad].

    Returns
    -------
    complex
        The impedance [ohm].
    """
    wire = wire_of(leg, apex_angle)
    matrix = own_matrix(wire, radius)
    if eps is not None:
        top = tip_height + float(wire.nodes[1].max())
        field = GroundField(eps, 1.99 * tip_height, 2.01 * top, 2.01 * leg)
        matrix = matrix + ground_matrix(wire, field, tip_height)
    return solve(wire, matrix)


# ---------------------------------------------------------------- the table


def _of_ground(at: tuple[int, int]) -> tuple[tuple[int, int], ComplexArray]:
    """The table of one ground, over heights, legs, radii and apex angles."""
    magnitude, angle = AXES["permittivity_magnitude"][at[0]], AXES["loss_angle"][at[1]]
    tips, legs, angles = AXES["tip_height"], AXES["leg_length"], AXES["apex_angle_deg"]
    radii = 10.0 ** AXES["wire_radius_log10"]
    top = tips[-1] + legs[-1] * np.cos(0.5 * np.radians(angles[0]))
    field = GroundField(
        complex(magnitude * np.exp(-1j * angle)), 1.99 * tips[0], 2.01 * top, 2.01 * legs[-1]
    )
    found = np.empty((tips.size, legs.size, radii.size, angles.size), dtype=np.complex128)
    for j, leg in enumerate(legs):
        for m, apex in enumerate(np.radians(angles)):
            wire = wire_of(leg, apex)
            own = [own_matrix(wire, radius) for radius in radii]
            for i, tip in enumerate(tips):
                returned = ground_matrix(wire, field, tip)
                found[i, j, :, m] = [solve(wire, matrix + returned) for matrix in own]
    return at, found


def _held(path: Path, shape: Sequence[int]) -> ComplexArray:
    """What an interrupted run left, if its nodes are these; NaN elsewhere."""
    if path.exists():
        with np.load(path) as file:
            if all(np.array_equal(file[name], nodes) for name, nodes in AXES.items()):
                return np.asarray(file["impedance"])
    return np.full(shape, np.nan + 0j, dtype=np.complex64)


def make(path: Path, processes: int) -> None:
    """Make the table, saving it after every ground; go on where a run was broken off.

    Parameters
    ----------
    path : Path
        The file.
    processes : int
        How many to run beside each other.
    """
    impedance = _held(path, [nodes.size for nodes in AXES.values()])
    missing: IntArray = np.argwhere(np.isnan(impedance[:, :, 0, 0, 0, 0]))
    beside = path.with_suffix(".part.npz")
    begun = perf_counter()
    with Pool(processes) as pool:
        jobs = [(int(i), int(j)) for i, j in missing]
        for done, (at, found) in enumerate(pool.imap_unordered(_of_ground, jobs), start=1):
            impedance[at] = found
            arrays: dict[str, Any] = {"impedance": impedance, **AXES}
            np.savez_compressed(beside, **arrays)
            beside.replace(path)
            print(f"{done} of {len(jobs)} grounds, {perf_counter() - begun:.0f} s", flush=True)  # noqa: T201


def interpolated(path: Path, at: Sequence[float]) -> complex:
    """Impedance by cubic splines through the table, as the package lays them.

    Parameters
    ----------
    path : Path
        The file.
    at : sequence of float
        Value on every axis, in the order of :data:`AXES`.

    Returns
    -------
    complex
        The impedance [ohm].
    """
    with np.load(path) as file:
        found = file["impedance"]
        for name, value in zip(AXES, at, strict=True):
            nodes, x = np.asarray(file[name]), np.asarray(value)
            if name in ("permittivity_magnitude", "tip_height"):
                nodes, x = np.log(nodes), np.log(x)
            spline = make_interp_spline(nodes, np.eye(nodes.size), k=min(3, nodes.size - 1))
            found = np.tensordot(spline(x), found, axes=1)
    return complex(found)


def check(path: Path, points: int) -> None:
    """Print how far the splines are from direct runs, over real grounds and in all the table.

    Parameters
    ----------
    path : Path
        The file.
    points : int
        How many of each, at random.
    """
    rng = np.random.default_rng(11)
    grounds = list(CLASSES.values())
    for domain in ("practical", "whole"):
        errors = []
        for number in range(points):
            if domain == "practical":
                frequency = np.exp(rng.uniform(np.log(1.8e6), np.log(30e6)))
                wavelength = SPEED_OF_LIGHT / frequency
                eps = complex(grounds[number % len(grounds)].complex_permittivity(frequency))
                tip, leg = rng.uniform(0.05, 0.6), rng.uniform(0.18, 0.30)
                radius = rng.uniform(0.5e-3, 2e-3) / wavelength
            else:
                eps = np.exp(rng.uniform(np.log(2.5), np.log(6e4)) - 1j * rng.uniform(0.005, 1.568))
                tip, leg = np.exp(rng.uniform(np.log(0.0125), 0.0)), rng.uniform(0.15, 0.35)
                radius = 10.0 ** rng.uniform(-6.0, -3.0)
            apex = 180.0 if number % 2 else rng.uniform(90.0, 180.0)
            direct = feed_impedance(complex(eps), tip, leg, radius, np.radians(apex))
            at = (abs(eps), -np.angle(eps), tip, leg, np.log10(radius), apex)
            error = abs(interpolated(path, at) - direct)
            errors.append((error / abs(direct), error, *at))
        share, error = np.array(errors)[:, :2].T
        print(  # noqa: T201
            f"{domain}: {points} points, largest {error.max():.3f} ohm, {share.max():.2e} of |Z|;"
            f" 99 of 100 below {np.quantile(error, 0.99):.3f} ohm, {np.quantile(share, 0.99):.2e};"
            f" median {np.median(error):.4f} ohm; worst at {np.round(max(errors)[2:], 4)}"
        )


def main() -> None:
    """Read the command line and make the table."""
    parser = argparse.ArgumentParser(description="Make the table of feed-point impedances.")
    parser.add_argument("out", type=Path, help="the file to write, .npz")
    parser.add_argument("--processes", type=int, default=1)
    parser.add_argument("--check", type=int, default=0, help="points to check the splines at")
    given = parser.parse_args()
    make(given.out, given.processes)
    if given.check:
        check(given.out, given.check)


if __name__ == "__main__":
    main()
