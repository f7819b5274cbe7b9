"""Physical constants, in SI units.

The two magneto-ionic constants follow from the CODATA values of the
elementary charge, the electron mass and the electric constant; they are
written out so that a reader sees the figures the trade knows.
"""

from typing import Final

SPEED_OF_LIGHT: Final = 299_792_458.0
"""Speed of light in vacuum [m/s]."""

EARTH_RADIUS: Final = 6_371_000.0
"""Radius of the sphere on which rays and great circles are drawn [m]."""

GYROFREQUENCY_PER_TESLA: Final = 27.99249e9
"""Electron gyrofrequency per magnetic flux density, e / (2 pi m_e) [Hz/T].

Not 28.025 GHz/T, which carries half the electron's g-factor and belongs to
spin resonance.
"""

PLASMA_FREQUENCY_SQUARED_PER_DENSITY: Final = 80.6164
"""Square of the plasma frequency per electron density [Hz² m³]."""
