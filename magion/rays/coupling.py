"""Both waves carried together through the bottom of the ionosphere.

Along the exit ray the plasma is cut into thin slabs. Within a slab the two
characteristic waves run apart with their own complex indices; at each face the
transverse field is continuous and is split anew into the waves of the next
slab. So the change of one wave into the other, where the field is nearly
across the ray or the shapes change faster than the phase, is included, and the
limiting polarization comes out by itself [Budden1952]_. Weak reflections at
the faces are left out.
"""

from typing import Final

import numpy as np

from magion.arrays import ComplexArray, FloatArray, dot
from magion.constants import SPEED_OF_LIGHT
from magion.rays.exit import RayPlasma
from magion.waves import MODES, Mode, characteristic_waves, wave_axes

DEEPEST: Final = 12.0
"""O-X phase from the exit at which the waves are started as separate [rad]."""


def _product(matrices: ComplexArray) -> ComplexArray:
    """Product of matrices (n, 2, 2), the first applied first, in halves."""
    while matrices.shape[0] > 1:
        if matrices.shape[0] % 2:
            matrices = np.concatenate([matrices, np.eye(2, dtype=np.complex128)[None]])
        matrices = matrices[1::2] @ matrices[0::2]
        # The waves' losses would run out of range on a long way; only ratios matter.
        matrices = matrices / np.abs(matrices).max(axis=(1, 2), keepdims=True)
    return np.asarray(matrices[0])


def _settled(
    shapes: ComplexArray,
    index: tuple[ComplexArray, ComplexArray],
    wavenumber: float,
    length: FloatArray,
    mode: Mode,
) -> ComplexArray:
    """Parts of both waves at the first point that make one true wave.

    Where the plasma changes slowly a true wave carries a small steady part of
    the other local one: b' = -i k (n_b - n_a) b - C a with C from the change of
    the shapes, so b = -C a / (i k (n_b - n_a)) to first order.
    """
    own = MODES.index(mode)
    other = 1 - own
    change = np.linalg.solve(shapes[0], (shapes[1] - shapes[0]) / length[0])
    parts = np.zeros(2, dtype=np.complex128)
    parts[own] = 1.0
    gap = 1j * wavenumber * (index[other][0] - index[own][0])
    steady = -change[other, own] / gap if gap != 0.0 else 0.0
    # Where the two are not parted enough for that, the local wave alone.
    parts[other] = steady if np.isfinite(steady) and abs(steady) < 0.5 else 0.0
    return parts


def carry(
    plasma: RayPlasma, frequency: float, mode: Mode
) -> tuple[ComplexArray, FloatArray, FloatArray]:
    """Carry one wave out of the ionosphere, with what it feeds of the other.

    Parameters
    ----------
    plasma : RayPlasma
        Plasma along the way out, ordered toward the exit, from where the waves
        are still separate.
    frequency : float
        Wave frequency [Hz].
    mode : Mode
        The wave that is pure at the first point.

    Returns
    -------
    field : ndarray of complex, shape (2,)
        Transverse field at the exit, of unit power [1].
    x, y : ndarray, shape (3,)
        Its axes, those of the last point [1].
    """
    waves = characteristic_waves(plasma.X, plasma.Y, plasma.Z, plasma.theta)
    x, y = wave_axes(plasma.wave_normal, plasma.field)
    x_end, y_end = x[:, -1], y[:, -1]
    turn = np.arctan2(dot(x, y_end[:, None]), dot(x, x_end[:, None]))
    c, s = np.cos(turn), np.sin(turn)
    # Columns: both waves of each point on the axes of the exit.
    shapes = np.empty((plasma.X.size, 2, 2), dtype=np.complex128)
    for column, field in enumerate(waves.field):
        shapes[:, 0, column] = c * field[0] - s * field[1]
        shapes[:, 1, column] = s * field[0] + c * field[1]
    length = np.diff(plasma.length)
    wavenumber = 2.0 * np.pi * frequency / SPEED_OF_LIGHT
    mean = 0.5 * (waves.index[0] + waves.index[1])
    phase = [(n - mean)[:-1] * wavenumber * length for n in waves.index]
    spread = np.zeros((length.size, 2, 2), dtype=np.complex128)
    for column in range(2):
        spread[:, column, column] = np.exp(-1j * phase[column])
    slabs = shapes[:-1] @ spread @ np.linalg.inv(shapes[:-1])
    out = _product(slabs) @ shapes[0] @ _settled(shapes, waves.index, wavenumber, length, mode)
    return out / np.sqrt(np.sum(np.abs(out) ** 2)), x_end, y_end


def share_of_other(field: ComplexArray, own: ComplexArray, other: ComplexArray) -> float:
    """Power of the other wave's state in a field, over that of its own.

    Parameters
    ----------
    field, own, other : ndarray of complex, shape (2,)
        The field, and the states of both waves, on the same axes [1].

    Returns
    -------
    float
        |b|² / |a|² of the split field = a own + b other [1].
    """
    a, b = np.linalg.solve(np.stack([own, other], axis=1), field)
    return float(np.abs(b) ** 2 / np.abs(a) ** 2)
