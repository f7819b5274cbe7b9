"""Collision frequency of electrons."""

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import FloatArray


def electron_neutral(height: ArrayLike) -> FloatArray:
    """Effective electron-neutral collision frequency [WaitSpies1964]_.

    Parameters
    ----------
    height : array_like
        Height [m].

    Returns
    -------
    ndarray
        1.816e11 exp(-0.15 h / km), the value to be put into the
        Appleton-Hartree formula as it stands [s⁻¹].

    Examples
    --------
    >>> round(float(electron_neutral(70e3)) / 1e6, 2)
    5.0
    """
    return 1.816e11 * np.exp(-0.15e-3 * np.asarray(height, dtype=np.float64))
