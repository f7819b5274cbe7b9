"""What a ray asks of an ionosphere."""

from typing import Protocol

from magion.arrays import FloatArray, IntArray


class Medium(Protocol):
    """Electron density in space, of one or of several ionospheres.

    Below `base` and above `top` there is no plasma; rays run straight there.
    `thin_layer` is the height of a layer so thin that a long step could miss
    it, or None.
    """

    @property
    def thin_layer(self) -> float | None:
        """Height of a layer that is thinner than a step [m]."""
        ...

    @property
    def base(self) -> float:
        """Lowest height with plasma [m]."""
        ...

    @property
    def top(self) -> float:
        """Greatest height with plasma [m]."""
        ...

    def density(self, position: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        """Electron density and its gradient.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].
        which : ndarray of int, shape (n,)
            Which ionosphere each point lies in, where there are several.

        Returns
        -------
        electron_density : ndarray, shape (n,)
            Electron density [m⁻³].
        gradient : ndarray, shape (3, n)
            Its gradient in Earth-centred axes [m⁻⁴].
        """
        ...
