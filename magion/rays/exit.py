"""Where a wave leaves the ionosphere, and with which polarization.

On the way out the two characteristic waves keep their own changing shapes as
long as the plasma parts them; once the O-X phase still to be gathered is one
radian they leave with the shape they had there [Budden1952]_. The hand at the
receiver is set by the field and the wave normal at that place.
"""

from dataclasses import dataclass

import numpy as np

from magion.arrays import ComplexArray, FloatArray, dot, norm
from magion.constants import EARTH_RADIUS
from magion.field import MagneticField, flux_density
from magion.geometry import from_cartesian
from magion.ionosphere.collisions import collision_frequency
from magion.ionosphere.medium import Medium
from magion.rays.batch import Track
from magion.waves import (
    collision_ratio,
    gyro_ratio,
    index_difference,
    limiting_point,
    phase_to_go,
    plasma_ratio,
    polarization_vectors,
)

_SPACING = 200.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PlasmaPoint:
    """The plasma and the wave at one point of a ray.

    Parameters
    ----------
    position : ndarray, shape (3,)
        Earth-centred [m].
    wave_normal : ndarray, shape (3,)
        Unit vector of p [1].
    field : ndarray, shape (3,)
        Geomagnetic flux density, Earth-centred axes [T].
    X, Y, Z : float
        Magneto-ionic ratios [1].
    theta : float
        Angle between wave normal and field [rad].
    """

    position: FloatArray
    wave_normal: FloatArray
    field: FloatArray
    X: float
    Y: float
    Z: float
    theta: float

    @property
    def height(self) -> float:
        """Height above the sphere [m]."""
        return float(norm(self.position)) - EARTH_RADIUS

    @property
    def place(self) -> tuple[float, float]:
        """Latitude and longitude [rad]."""
        latitude, longitude, _ = from_cartesian(self.position)
        return float(latitude), float(longitude)

    def waves(self) -> tuple[ComplexArray, ComplexArray]:
        """Unit Jones vectors of the ordinary and extraordinary wave [1]."""
        return polarization_vectors(self.X, self.Y, self.Z, self.theta)


@dataclass(frozen=True, slots=True, kw_only=True)
class RayPlasma:
    """The plasma along part of a ray.

    Parameters
    ----------
    position, wave_normal, field : ndarray, shape (3, n)
        Earth-centred position [m], unit wave normal [1], flux density [T].
    X, Y, Z, theta : ndarray, shape (n,)
        Magneto-ionic ratios [1] and the angle to the field [rad].
    length : ndarray, shape (n,)
        Distance along the ray from the first point [m].
    """

    position: FloatArray
    wave_normal: FloatArray
    field: FloatArray
    X: FloatArray
    Y: FloatArray
    Z: FloatArray
    theta: FloatArray
    length: FloatArray

    def at(self, index: float) -> PlasmaPoint:
        """The plasma at a fractional index.

        Parameters
        ----------
        index : float
            Position between the points [1].

        Returns
        -------
        PlasmaPoint
            Linear interpolation between the neighbours.
        """
        i = min(int(index), self.X.size - 2)
        share = index - i

        def between(values: FloatArray) -> FloatArray:
            return np.asarray((1.0 - share) * values[..., i] + share * values[..., i + 1])

        normal = between(self.wave_normal)
        return PlasmaPoint(
            position=between(self.position),
            wave_normal=normal / norm(normal),
            field=between(self.field),
            X=float(between(self.X)),
            Y=float(between(self.Y)),
            Z=float(between(self.Z)),
            theta=float(between(self.theta)),
        )

    def after(self, first: int) -> "RayPlasma":
        """The part from one point on.

        Parameters
        ----------
        first : int
            Index of its first point [1].

        Returns
        -------
        RayPlasma
            That part, at least two points.
        """
        part = slice(min(first, self.X.size - 2), None)
        return RayPlasma(
            position=self.position[:, part],
            wave_normal=self.wave_normal[:, part],
            field=self.field[:, part],
            X=self.X[part],
            Y=self.Y[part],
            Z=self.Z[part],
            theta=self.theta[part],
            length=self.length[part],
        )


def plasma_along(
    state: FloatArray, frequency: float, which: int, medium: Medium, field: MagneticField
) -> RayPlasma:
    """The plasma at states of a ray.

    Parameters
    ----------
    state : ndarray, shape (7, n)
        States of one ray, in order.
    frequency : float
        Wave frequency [Hz].
    which : int
        Index of the ionosphere within the medium.
    medium, field
        Electron density and geomagnetic field.

    Returns
    -------
    RayPlasma
        The plasma along them.
    """
    position, p = state[0:3], state[3:6]
    density, _ = medium.density(position, np.full(position.shape[1], which))
    flux, _ = field.at(position)
    magnitude = flux_density(flux)
    normal = p / np.maximum(norm(p), 1e-300)
    cosine = np.clip(dot(normal, flux) / magnitude, -1.0, 1.0)
    height = norm(position) - EARTH_RADIUS
    steps = norm(np.diff(position, axis=1))
    return RayPlasma(
        position=position,
        wave_normal=normal,
        field=flux,
        X=plasma_ratio(density, frequency),
        Y=gyro_ratio(magnitude, frequency),
        Z=collision_ratio(collision_frequency(height, density), frequency),
        theta=np.arccos(cosine),
        length=np.concatenate([[0.0], np.cumsum(steps)]),
    )


def apex(track: Track) -> float:
    """Group path at which a ray is highest.

    Parameters
    ----------
    track : Track
        Its nodes.

    Returns
    -------
    float
        Group path of the greatest height [m].
    """
    height = norm(track.state[0:3])
    top = int(np.argmax(height))
    low, high = max(top - 1, 0), min(top + 1, height.size - 1)
    fine = np.linspace(track.group_path[low], track.group_path[high], 401)
    return float(fine[np.argmax(norm(track.sample(fine)[0:3]))])


def plasma_at_apex(
    track: Track, frequency: float, which: int, medium: Medium, field: MagneticField
) -> PlasmaPoint:
    """The plasma where a ray is highest.

    Parameters
    ----------
    track : Track
        Its nodes.
    frequency, which, medium, field
        As for :func:`plasma_along`.

    Returns
    -------
    PlasmaPoint
        The plasma there.
    """
    top = apex(track)
    state = track.sample(np.array([top, top]))
    return plasma_along(state, frequency, which, medium, field).at(0.0)


def exit_plasma(
    track: Track,
    frequency: float,
    which: int,
    medium: Medium,
    field: MagneticField,
    *,
    upward: bool = False,
) -> RayPlasma:
    """The plasma from the highest point of a ray to where it leaves the ionosphere.

    Parameters
    ----------
    track : Track
        Nodes of the ray through the ionosphere.
    frequency, which, medium, field
        As for :func:`plasma_along`.
    upward : bool
        False for the way down; True for the way up, taken from the top [1].

    Returns
    -------
    RayPlasma
        Points 200 m of group path apart, ordered toward the exit.
    """
    top = apex(track)
    end = float(track.group_path[0 if upward else -1])
    count = max(int(abs(end - top) / _SPACING), 50)
    state = track.sample(np.linspace(top, end, count + 1))
    return plasma_along(state, frequency, which, medium, field)


def limiting_polarization(
    track: Track,
    frequency: float,
    which: int,
    medium: Medium,
    field: MagneticField,
    *,
    upward: bool = False,
) -> PlasmaPoint:
    """The place that sets a wave's hand on its way out of the ionosphere.

    Parameters
    ----------
    track : Track
        Nodes of the ray through the ionosphere.
    frequency, which, medium, field
        As for :func:`plasma_along`.
    upward : bool
        False for the way down to the receiver; True for the way up, where the
        same criterion gives the state that the transmitter must launch to
        excite this wave alone. The wave normal is that of the travel.

    Returns
    -------
    PlasmaPoint
        The plasma at the limiting height; its :meth:`~PlasmaPoint.waves` are
        the limiting polarizations.
    """
    plasma = exit_plasma(track, frequency, which, medium, field, upward=upward)
    difference = index_difference(plasma.X, plasma.Y, plasma.Z, plasma.theta)
    # Near reflection the indices of the other wave are imaginary: no phase is counted there.
    difference = np.where(np.isfinite(difference), difference, 0.0)
    phase = phase_to_go(frequency, difference, plasma.length)
    return plasma.at(limiting_point(phase))
