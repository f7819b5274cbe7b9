"""Ionospheres and fields with closed forms, for the checks of the rays."""

import numpy as np

from magion.constants import EARTH_RADIUS, PLASMA_FREQUENCY_SQUARED_PER_DENSITY


class QuasiParabolic:
    """The quasi-parabolic layer of Croft & Hoogasian (1968)."""

    thin_layer = None

    def __init__(self, critical=10e6, peak=300e3, half_width=100e3, ground=6371.2e3):
        self.densest = critical**2 / PLASMA_FREQUENCY_SQUARED_PER_DENSITY
        self.peak_radius = ground + peak
        self.half_width = half_width
        self.base_radius = self.peak_radius - half_width
        self.base = self.base_radius - 1.0 - EARTH_RADIUS
        self.top = self.peak_radius + half_width - EARTH_RADIUS

    def density(self, position, which):
        radius = np.sqrt((position**2).sum(axis=0))
        u = (radius - self.peak_radius) / self.half_width
        shrink = (self.base_radius / radius) ** 2
        density = self.densest * (1.0 - u * u * shrink)
        slope = self.densest * (-2.0 * u / self.half_width + 2.0 * u * u / radius) * shrink
        inside = density > 0.0
        return np.where(inside, density, 0.0), np.where(inside, slope / radius, 0.0) * position


class FlatParabolic:
    """A parabolic layer on a flat Earth that touches the sphere at the x axis."""

    top = 2000e3
    thin_layer = None

    def __init__(self, critical=10e6, bottom=200e3, half_width=100e3, base=199e3):
        self.base = base  # of the spherical shell outside of which rays run straight
        self.densest = critical**2 / PLASMA_FREQUENCY_SQUARED_PER_DENSITY
        self.peak, self.half_width = bottom + half_width, half_width

    def density(self, position, which):
        u = (position[0] - EARTH_RADIUS - self.peak) / self.half_width
        density = np.maximum(self.densest * (1.0 - u * u), 0.0)
        gradient = np.zeros_like(position)
        gradient[0] = np.where(density > 0.0, -2.0 * self.densest * u / self.half_width, 0.0)
        return density, gradient


class AxialDipole:
    """A centred dipole along the Earth's axis: every meridian is a magnetic one."""

    def __init__(self, equator=3.1e-5, sign=1.0):
        self.moment = -sign * equator * EARTH_RADIUS**3

    def at(self, position):
        square = (position**2).sum(axis=0)
        radius = np.sqrt(square)
        z = position[2]
        axis = np.array([0.0, 0.0, 1.0])
        field = self.moment * (3.0 * z * position / radius**5 - axis[:, None] / radius**3)
        gradient = np.empty((3, 3, position.shape[1]))
        for i in range(3):
            for j in range(3):
                gradient[i, j] = self.moment * (
                    3.0 * (axis[j] * position[i] + z * (i == j)) / radius**5
                    - 15.0 * z * position[i] * position[j] / radius**7
                    + 3.0 * axis[i] * position[j] / radius**5
                )
        return field, gradient


class Scaled:
    """A field a factor times as strong."""

    def __init__(self, field, factor):
        self.field, self.factor = field, factor

    def at(self, position):
        field, gradient = self.field.at(position)
        return self.factor * field, self.factor * gradient
