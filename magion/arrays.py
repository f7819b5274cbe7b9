"""Small operations on component-first vector arrays.

A vector field has shape ``(3, ...)`` so that ``x, y, z = v`` unpacks it.
"""

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray: TypeAlias = NDArray[np.float64]
ComplexArray: TypeAlias = NDArray[np.complex128]
IntArray: TypeAlias = NDArray[np.intp]
BoolArray: TypeAlias = NDArray[np.bool_]


def dot(a: FloatArray, b: FloatArray) -> FloatArray:
    """Scalar product over the first axis.

    Parameters
    ----------
    a, b : ndarray, shape (3, ...)
        Vectors, in any one unit each.

    Returns
    -------
    ndarray, shape (...)
        The product, in the product of the units.

    Examples
    --------
    >>> import numpy as np
    >>> float(dot(np.array([1.0, 2.0, 2.0]), np.array([1.0, 2.0, 2.0])))
    9.0
    """
    return np.asarray(a[0] * b[0] + a[1] * b[1] + a[2] * b[2])


def cross(a: FloatArray, b: FloatArray) -> FloatArray:
    """Vector product over the first axis.

    Parameters
    ----------
    a, b : ndarray, shape (3, ...)
        Vectors, in any one unit each.

    Returns
    -------
    ndarray, shape (3, ...)
        The product, in the product of the units.
    """
    return np.stack(
        [
            a[1] * b[2] - a[2] * b[1],
            a[2] * b[0] - a[0] * b[2],
            a[0] * b[1] - a[1] * b[0],
        ]
    )


def norm(a: FloatArray) -> FloatArray:
    """Length of vectors over the first axis.

    Parameters
    ----------
    a : ndarray, shape (3, ...)
        Vectors.

    Returns
    -------
    ndarray, shape (...)
        Their lengths, in the unit of `a`.
    """
    return np.sqrt(dot(a, a))


def unit(a: FloatArray) -> FloatArray:
    """Unit vectors along `a`.

    Parameters
    ----------
    a : ndarray, shape (3, ...)
        Vectors; a zero vector gives NaN.

    Returns
    -------
    ndarray, shape (3, ...)
        Unit vectors [1].
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.asarray(a / norm(a))


def as_floats(*values: ArrayLike) -> tuple[FloatArray, ...]:
    """Broadcast values to float arrays of one shape.

    Parameters
    ----------
    *values : array_like
        Numbers or arrays that broadcast together.

    Returns
    -------
    tuple of ndarray
        The values as float64, broadcast to one shape.
    """
    return tuple(np.broadcast_arrays(*(np.asarray(v, dtype=np.float64) for v in values)))


def weighted(weights: FloatArray, values: FloatArray) -> FloatArray:
    """Weighted sum of rows, each column bit by bit the same whatever stands beside it.

    Parameters
    ----------
    weights : ndarray, shape (k,)
        Weights.
    values : ndarray, shape (k, n)
        Rows, in any one unit.

    Returns
    -------
    ndarray, shape (n,)
        Their sum. (A matrix product rounds the last columns of a batch otherwise.)
    """
    return np.asarray(np.einsum("k,kn->n", weights, values))


def padded(columns: FloatArray, multiple: int) -> FloatArray:
    """Columns repeated until their number is a multiple, for products that round alike.

    Parameters
    ----------
    columns : ndarray, shape (m, n)
        Columns, in any one unit.
    multiple : int
        What the number of columns shall be a multiple of [1].

    Returns
    -------
    ndarray, shape (m, n or more)
        The columns, and some of them again behind.
    """
    n = columns.shape[1]
    lacking = -n % multiple
    if n == 0 or lacking == 0:
        return columns
    return np.asarray(columns.take(np.arange(n + lacking) % n, axis=1))
