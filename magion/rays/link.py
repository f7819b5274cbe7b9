"""The great circle from a transmitter to a receiver, and directions along it."""

import math
from dataclasses import dataclass

import numpy as np

from magion.arrays import FloatArray
from magion.constants import EARTH_RADIUS
from magion.errors import InputError
from magion.geometry import Place, great_circle, local_axes, travel

_ANTIPODES = math.radians(179.9)


@dataclass(frozen=True, slots=True, kw_only=True)
class Link:
    """The great circle from a transmitter to a receiver.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends.
    angle : float
        Central angle between them [rad].
    bearing : float
        Initial direction at the transmitter, east of north [rad].
    up, forward, left : ndarray, shape (3,)
        Unit vectors at the transmitter: vertical, along the path, and to the
        left of it [1].
    """

    transmitter: Place
    receiver: Place
    angle: float
    bearing: float
    up: FloatArray
    forward: FloatArray
    left: FloatArray

    @property
    def distance(self) -> float:
        """Length of the great circle on the ground [m]."""
        return self.angle * EARTH_RADIUS

    def point(self, share: float) -> tuple[float, float]:
        """Place at a share of the way.

        Parameters
        ----------
        share : float
            0 at the transmitter, 1 at the receiver [1].

        Returns
        -------
        latitude, longitude : float
            The place [rad].
        """
        lat, lon = travel(
            self.transmitter.latitude, self.transmitter.longitude, self.bearing, share * self.angle
        )
        return float(lat), float(lon)

    def launch(self, w: FloatArray) -> FloatArray:
        """Unit directions of zenith angle vectors at the transmitter.

        Parameters
        ----------
        w : ndarray, shape (2, n)
            Zenith angle along and across (left) the path [rad].

        Returns
        -------
        ndarray, shape (3, n)
            Earth-centred directions [1].
        """
        size = np.hypot(w[0], w[1])
        ratio = np.sinc(size / np.pi)
        return np.asarray(
            self.forward[:, None] * (w[0] * ratio)
            + self.left[:, None] * (w[1] * ratio)
            + self.up[:, None] * np.cos(size)
        )

    def coordinates(self, position: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Where points lie, along the great circle and to its left.

        Parameters
        ----------
        position : ndarray, shape (3, n)
            Earth-centred positions [m].

        Returns
        -------
        along, across : ndarray, shape (n,)
            Distances on the ground from the transmitter; `along` runs from
            half-way backward to half-way round forward [m].
        """
        axes = np.stack([self.up, self.forward, self.left])
        u, f, s = np.einsum("ij,jn->in", axes, position)
        return np.arctan2(f, u) * EARTH_RADIUS, np.arctan2(s, np.hypot(u, f)) * EARTH_RADIUS


def link_between(transmitter: Place, receiver: Place) -> Link:
    """The great circle between two places.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends; they may coincide (the vertical case).

    Returns
    -------
    Link
        The link.

    Raises
    ------
    InputError
        If the places are antipodes, which no single great circle joins.
    """
    angle, bearing = (
        float(v)
        for v in great_circle(
            transmitter.latitude, transmitter.longitude, receiver.latitude, receiver.longitude
        )
    )
    if angle > _ANTIPODES:
        raise InputError(
            "the places are antipodes, so no one great circle joins them; "
            "accepted: up to 20,000 km apart"
        )
    east, north, up = local_axes(transmitter.latitude, transmitter.longitude)
    forward = math.sin(bearing) * east + math.cos(bearing) * north
    return Link(
        transmitter=transmitter,
        receiver=receiver,
        angle=angle,
        bearing=bearing,
        up=up,
        forward=forward,
        left=np.cross(up, forward),
    )
