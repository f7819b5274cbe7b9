"""The two characteristic waves of a magnetized plasma (Appleton-Hartree).

Time factor exp(+i omega t); n = mu - i chi, and chi >= 0 is loss. With
U = 1 - i Z, Y_L = Y cos(theta), Y_T = Y sin(theta) and

    q = Y_T**2 / 2 + sqrt(Y_T**4 / 4 + Y_L**2 (U - X)**2)

the two indices are [Budden1985]_ [Ratcliffe1959]_

    ordinary       n**2 = 1 - X q       / (U q + Y_L**2 (U - X))
    extraordinary  n**2 = 1 - X (U - X) / (U (U - X) - q)

This is the usual form multiplied through by (U - X), with the difference of
two nearly equal terms in the ordinary's denominator rationalized. It keeps
each label on both sides of X = 1 (the zero of the ordinary wave) and loses no
digits at X -> 1, theta -> 90 degrees or X -> 0. The polarization ratio is
rho_O = i Y_L (U - X) / q and rho_X = 1 / rho_O.

Labels with collisions. Below the critical collision frequency
nu_c = omega Y_T**2 / (2 |Y_L|) the root with the positive real part is the
label on both sides of X = 1. Above nu_c that root changes places across
X = 1; there this module follows each wave continuously from X < 1 to X > 1 at
its fixed collision frequency, so that a wave keeps its name along a ray.
"""

from dataclasses import dataclass
from enum import Enum

import numpy as np
from numpy.typing import ArrayLike

from magion.arrays import BoolArray, ComplexArray, FloatArray, as_floats, cross, dot, unit
from magion.constants import (
    GYROFREQUENCY_PER_TESLA,
    PLASMA_FREQUENCY_SQUARED_PER_DENSITY,
    SPEED_OF_LIGHT,
)


class Mode(Enum):
    """The two characteristic waves."""

    ORDINARY = "ordinary"
    EXTRAORDINARY = "extraordinary"

    @property
    def other(self) -> "Mode":
        """The other wave."""
        return Mode.EXTRAORDINARY if self is Mode.ORDINARY else Mode.ORDINARY

    @property
    def letter(self) -> str:
        """The trade's mark for it, as in 1F2(o) and 1F2(x)."""
        return "o" if self is Mode.ORDINARY else "x"


MODES = (Mode.ORDINARY, Mode.EXTRAORDINARY)
"""Both waves, the ordinary first, as everywhere in magion."""

_BLOCK = 8192

# Kernels pass NaN through and return infinity at a resonance, without warnings.
_quiet = np.errstate(divide="ignore", invalid="ignore", over="ignore")


def plasma_ratio(electron_density: ArrayLike, frequency: ArrayLike) -> FloatArray:
    """X = (f_N / f)**2.

    Parameters
    ----------
    electron_density : array_like
        Electron density [m⁻³].
    frequency : array_like
        Wave frequency [Hz].

    Returns
    -------
    ndarray
        X [1].
    """
    density, f = as_floats(electron_density, frequency)
    return PLASMA_FREQUENCY_SQUARED_PER_DENSITY * density / (f * f)


def gyro_ratio(flux_density: ArrayLike, frequency: ArrayLike) -> FloatArray:
    """Y = f_H / f, of a magnitude or of the components of the field.

    Parameters
    ----------
    flux_density : array_like
        Magnetic flux density [T].
    frequency : array_like
        Wave frequency [Hz].

    Returns
    -------
    ndarray
        Y [1].
    """
    return np.asarray(GYROFREQUENCY_PER_TESLA * np.asarray(flux_density) / np.asarray(frequency))


def collision_ratio(collision_frequency: ArrayLike, frequency: ArrayLike) -> FloatArray:
    """Z = nu / omega.

    Parameters
    ----------
    collision_frequency : array_like
        Effective electron collision frequency [s⁻¹].
    frequency : array_like
        Wave frequency [Hz].

    Returns
    -------
    ndarray
        Z [1].
    """
    nu, f = as_floats(collision_frequency, frequency)
    return nu / (2.0 * np.pi * f)


def critical_collision_frequency(gyrofrequency: ArrayLike, theta: ArrayLike) -> FloatArray:
    """Collision frequency at which both indices coincide at X = 1.

    Parameters
    ----------
    gyrofrequency : array_like
        f_H [Hz].
    theta : array_like
        Angle between wave normal and field [rad].

    Returns
    -------
    ndarray
        nu_c = omega_H sin²(theta) / (2 |cos(theta)|), infinite at 90 degrees [s⁻¹].
    """
    f_h, angle = as_floats(gyrofrequency, theta)
    with np.errstate(divide="ignore"):
        ratio = np.sin(angle) ** 2 / (2.0 * np.abs(np.cos(angle)))
    return np.asarray(2.0 * np.pi * f_h * ratio)


def _split(
    X: FloatArray, Z: FloatArray, Y_L: FloatArray, Y_T: FloatArray
) -> tuple[ComplexArray, ComplexArray]:
    """(U - X) and q of the module's formulas, the label kept across X = 1."""
    half = 0.5 * Y_T * Y_T
    gap = 1.0 - X
    square = np.empty(X.shape, dtype=np.complex128)
    along_squared = Y_L * Y_L
    square.real = half * half + along_squared * (gap * gap - Z * Z)
    square.imag = along_squared * (-2.0 * gap * Z) + 0.0  # no negative zero on the cut
    root = np.sqrt(square)
    turned = (X >= 1.0) & (Z * np.abs(Y_L) > half)
    if turned.any():
        root = np.where(turned, -root, root)
    distance = np.empty(X.shape, dtype=np.complex128)
    distance.real = gap
    distance.imag = -Z
    root += half
    return distance, root


def _shape(Y_L: FloatArray, distance: ComplexArray, q: ComplexArray) -> ComplexArray:
    """H = Y_L (U - X) / q: rho is i h of the ordinary, 1 / (i h) of the extraordinary wave."""
    h = distance * Y_L
    h /= q
    empty = q == 0.0
    if empty.any():
        # θ = 0 and X = 1, Z = 0 together, or no field at all: the limit from X < 1.
        h = np.where(empty, np.where(Y_L < 0.0, -1.0, 1.0) + 0j, h)
    return h


def _squares(
    X: FloatArray, Z: FloatArray, Y_L: FloatArray, Y_T: FloatArray
) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """n² of both waves and h."""
    distance, q = _split(X, Z, Y_L, Y_T)
    h = _shape(Y_L, distance, q)
    U = 1.0 - 1j * Z
    ordinary = 1.0 - X / (U + Y_L * h)
    extraordinary = 1.0 - X * distance / (U * distance - q)
    singular = (q == 0.0) & (distance == 0.0)
    if singular.any():
        extraordinary = np.where(singular, 1.0 - X / (U - np.abs(Y_L)), extraordinary)
    return ordinary, extraordinary, h


def _lossy_root(square: ComplexArray) -> ComplexArray:
    """Root of n² in the quadrant mu >= 0, chi >= 0; infinite where n² is."""
    root = np.asarray(np.sqrt(square))
    endless = np.isinf(square.real) | np.isinf(square.imag)
    if endless.any():
        root = np.where(endless, complex(np.inf, 0.0), root)
    root.imag = -np.abs(root.imag)
    return root


def _vectors(h: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """Unit Jones vectors of both waves from h."""
    scale = 1.0 / np.sqrt(1.0 + h.real * h.real + h.imag * h.imag)
    ordinary = np.empty((2, *h.shape), dtype=np.complex128)
    ordinary[0] = scale
    ordinary.real[1] = -h.imag * scale
    ordinary.imag[1] = h.real * scale
    return ordinary, ordinary[::-1]


@_quiet
def refractive_index_squared(
    X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike
) -> tuple[ComplexArray, ComplexArray]:
    """Squares of both complex refractive indices (Appleton-Hartree).

    Parameters
    ----------
    X, Y, Z : array_like
        Squared plasma, gyro- and collision ratios; X, Y, Z >= 0 [1].
    theta : array_like
        Angle between wave normal and field, 0 to pi [rad].

    Returns
    -------
    ordinary, extraordinary : ndarray of complex
        n² of each wave [1]. Infinite at the resonance of a collisionless plasma.

    Notes
    -----
    At theta = 0 exactly and X > 1 the labels are the limits theta -> 0.

    Examples
    --------
    >>> o, x = refractive_index_squared(0.5, 0.2, 0.0, 0.0)
    >>> round(float(o.real), 6), round(float(x.real), 6)
    (0.583333, 0.375)
    """
    X, Y, Z, theta = as_floats(X, Y, Z, theta)
    ordinary, extraordinary, _ = _squares(X, Z, Y * np.cos(theta), Y * np.sin(theta))
    return ordinary, extraordinary


@_quiet
def refractive_index(
    X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike
) -> tuple[ComplexArray, ComplexArray]:
    """Both complex refractive indices n = mu - i chi.

    Parameters
    ----------
    X, Y, Z, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    ordinary, extraordinary : ndarray of complex
        n of each wave with mu >= 0 and chi >= 0 [1].
    """
    ordinary, extraordinary = refractive_index_squared(X, Y, Z, theta)
    return _lossy_root(ordinary), _lossy_root(extraordinary)


@dataclass(frozen=True, slots=True, kw_only=True)
class CharacteristicWaves:
    """Both waves at points of plasma.

    Parameters
    ----------
    index : tuple of ndarray of complex
        n = mu - i chi of the ordinary and of the extraordinary wave [1].
    field : tuple of ndarray of complex, shape (2, ...)
        Unit vectors (E_x, E_y) of the ordinary and of the extraordinary wave,
        in the axes of :func:`polarization_vectors` [1].
    """

    index: tuple[ComplexArray, ComplexArray]
    field: tuple[ComplexArray, ComplexArray]


@_quiet
def characteristic_waves(
    X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike
) -> CharacteristicWaves:
    """Indices and polarizations of both waves at once, for large arrays.

    Parameters
    ----------
    X, Y, Z, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    CharacteristicWaves
        Both waves.
    """
    X, Y, Z, theta = as_floats(X, Y, Z, theta)
    shape = X.shape
    flat = [np.ravel(v) for v in (X, Y, Z, theta)]
    n_o, n_x = (np.empty(flat[0].size, dtype=np.complex128) for _ in MODES)
    e_o, e_x = (np.empty((2, flat[0].size), dtype=np.complex128) for _ in MODES)
    for start in range(0, flat[0].size, _BLOCK):  # blocks that stay in the processor's cache
        part = slice(start, start + _BLOCK)
        x, y, z, angle = (v[part] for v in flat)
        square_o, square_x, h = _squares(x, z, y * np.cos(angle), y * np.sin(angle))
        n_o[part], n_x[part] = _lossy_root(square_o), _lossy_root(square_x)
        e_o[:, part], e_x[:, part] = _vectors(h)
    return CharacteristicWaves(
        index=(n_o.reshape(shape), n_x.reshape(shape)),
        field=(e_o.reshape(2, *shape), e_x.reshape(2, *shape)),
    )


@_quiet
def polarization_vectors(
    X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike
) -> tuple[ComplexArray, ComplexArray]:
    """Transverse electric field of both waves.

    The axes are z along the wave normal, x in the plane of the wave normal and
    the field with the field on its positive side, y = z cross x.

    Parameters
    ----------
    X, Y, Z, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    ordinary, extraordinary : ndarray of complex, shape (2, ...)
        (E_x, E_y) of unit length; E_y / E_x is the polarization ratio rho [1].
    """
    X, Y, Z, theta = as_floats(X, Y, Z, theta)
    Y_L = Y * np.cos(theta)
    return _vectors(_shape(Y_L, *_split(X, Z, Y_L, Y * np.sin(theta))))


def wave_axes(wave_normal: FloatArray, field: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Transverse axes of a wave in a magnetic field.

    Parameters
    ----------
    wave_normal : ndarray, shape (3, ...)
        Direction of the wave normal.
    field : ndarray, shape (3, ...)
        Magnetic field.

    Returns
    -------
    x, y : ndarray, shape (3, ...)
        Unit vectors: x in the plane of wave normal and field, on the field's
        side; y = z cross x [1]. NaN where the two are parallel.
    """
    z = unit(wave_normal)
    x = unit(field - dot(field, z) * z)
    return x, cross(z, x)


@_quiet
def polarization_ratio(
    X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike
) -> tuple[ComplexArray, ComplexArray]:
    """Polarization ratio rho = E_y / E_x of both waves.

    Parameters
    ----------
    X, Y, Z, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    ordinary, extraordinary : ndarray of complex
        rho [1]; its product over the two waves is 1. Infinite where the wave
        has no E_x (the extraordinary at theta = 90 degrees).
    """
    ordinary, extraordinary = polarization_vectors(X, Y, Z, theta)
    rho_x = extraordinary[1] / extraordinary[0]
    rho_x = np.where(extraordinary[0] == 0.0, complex(np.inf, 0.0), rho_x)
    return ordinary[1] / ordinary[0], rho_x


@_quiet
def index_difference(X: ArrayLike, Y: ArrayLike, Z: ArrayLike, theta: ArrayLike) -> FloatArray:
    """Difference of the real indices, mu_O - mu_X, without cancellation at small X.

    Parameters
    ----------
    X, Y, Z, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    ndarray
        mu_O - mu_X [1].
    """
    X, Y, Z, theta = as_floats(X, Y, Z, theta)
    Y_L, Y_T = Y * np.cos(theta), Y * np.sin(theta)
    distance, q = _split(X, Z, Y_L, Y_T)
    U = 1.0 - 1j * Z
    g = Y_L * _shape(Y_L, distance, q)
    n_o, n_x = refractive_index(X, Y, Z, theta)
    # n_O² − n_X² = X [ (U−X)/(U(U−X) − q) − 1/(U + g) ] = X [U−X](g + q/(U−X)) / ...
    split = X * (distance * g + q) / ((U * distance - q) * (U + g))
    difference = np.asarray((split / (n_o + n_x)).real)
    # Where the split form is 0/0 (X = 1 along the field) or both indices vanish.
    return np.where(np.isfinite(difference), difference, np.asarray((n_o - n_x).real))


@_quiet
def group_index(X: ArrayLike, Y: ArrayLike, theta: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Group refractive index of both waves without collisions.

    Parameters
    ----------
    X, Y, theta : array_like
        As for :func:`refractive_index_squared`.

    Returns
    -------
    ordinary, extraordinary : ndarray
        mu' = d(f mu)/df at fixed direction of the wave normal [1]; NaN where
        the wave does not propagate.
    """
    X, Y, theta = as_floats(X, Y, theta)
    s, t = (Y * np.cos(theta)) ** 2, (Y * np.sin(theta)) ** 2
    found = []
    for mode in MODES:
        extraordinary = np.full(X.shape, mode is Mode.EXTRAORDINARY)
        square, by_x, by_t, by_s = index_squared_and_slopes(X, t, s, extraordinary)
        found.append((square - X * by_x - t * by_t - s * by_s) / np.sqrt(square))
    return found[0], found[1]


@_quiet
def index_squared_and_slopes(
    X: FloatArray, t: FloatArray, s: FloatArray, extraordinary: BoolArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Collisionless n² of one wave a point, with its first derivatives.

    This is the form the rays integrate: everything depends on X and on the
    squares of the field's components across and along the wave normal.

    Parameters
    ----------
    X : ndarray
        (f_N / f)² [1].
    t, s : ndarray
        Y_T² and Y_L² [1].
    extraordinary : ndarray of bool
        Which wave, point by point.

    Returns
    -------
    square : ndarray
        n², negative where the wave is evanescent [1].
    by_x, by_t, by_s : ndarray
        Derivatives of n² by X, by Y_T² at fixed Y_L², and by Y_L² at fixed Y_T² [1].
    """
    return fast_slopes(X, t, s, extraordinary)


def fast_slopes(
    X: FloatArray, t: FloatArray, s: FloatArray, extraordinary: BoolArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """:func:`index_squared_and_slopes` for loops that have silenced NumPy already.

    Parameters
    ----------
    X, t, s, extraordinary
        As there [1].

    Returns
    -------
    square, by_x, by_t, by_s : ndarray
        As there [1].
    """
    a = 1.0 - X
    half = 0.5 * t
    sa = s * a
    root = np.maximum(np.sqrt(half * half + sa * a), 1e-60)
    q = root + half
    over_root = 0.5 / root
    q_x = -2.0 * sa * over_root
    q_t = half * over_root + 0.5
    q_s = a * a * over_root
    # ordinary: n² = 1 − X q / (q + s a); extraordinary: n² = 1 − X a / (a − q)
    inverse = 1.0 / np.where(extraordinary, a - q, q + sa)
    ratio = np.where(extraordinary, a, q) * inverse
    common = X * inverse * inverse
    factor = common * np.where(extraordinary, -a, -sa)
    by_x = common * np.where(extraordinary, -q, -s * q) - ratio
    by_x += factor * q_x
    by_t = factor * q_t
    by_s = factor * q_s + np.where(extraordinary, 0.0, common * a * q)
    return 1.0 - X * ratio, by_x, by_t, by_s


@_quiet
def resonance(Y: ArrayLike, theta: ArrayLike) -> FloatArray:
    """X at which a collisionless index is infinite.

    Parameters
    ----------
    Y : array_like
        Gyro-ratio [1].
    theta : array_like
        Angle between wave normal and field [rad].

    Returns
    -------
    ndarray
        X = (1 - Y²) / (1 - Y² cos²(theta)); on the extraordinary wave for
        Y < 1, on the ordinary for Y > 1 (where it is positive) [1].
    """
    Y, theta = as_floats(Y, theta)
    return (1.0 - Y * Y) / (1.0 - (Y * np.cos(theta)) ** 2)


def extraordinary_critical_frequency(
    ordinary_critical_frequency: ArrayLike, gyrofrequency: ArrayLike
) -> FloatArray:
    """Critical frequency fx of the extraordinary wave: fx² - fx f_H = fo².

    Parameters
    ----------
    ordinary_critical_frequency : array_like
        fo of the layer [Hz].
    gyrofrequency : array_like
        f_H at the layer's peak [Hz].

    Returns
    -------
    ndarray
        fx = f_H / 2 + sqrt(fo² + f_H² / 4) [Hz].

    Examples
    --------
    >>> round(float(extraordinary_critical_frequency(5.0, 1.3)), 4)
    5.6921
    """
    f_o, f_h = as_floats(ordinary_critical_frequency, gyrofrequency)
    return f_h / 2.0 + np.sqrt(f_o * f_o + f_h * f_h / 4.0)


def limiting_shape(Y: ArrayLike, theta: ArrayLike) -> FloatArray:
    """Minor over major axis of both ellipses where the plasma thins out (X, Z -> 0).

    Parameters
    ----------
    Y : array_like
        Gyro-ratio [1].
    theta : array_like
        Angle between wave normal and field [rad].

    Returns
    -------
    ndarray
        sqrt(1 + G²) - |G| with G = Y sin²(theta) / (2 cos(theta)) [1].
    """
    Y, theta = as_floats(Y, theta)
    h = np.abs(polarization_vectors(0.0, Y, 0.0, theta)[0][1])
    major = np.abs(polarization_vectors(0.0, Y, 0.0, theta)[0][0])
    return np.asarray(h / major)


def phase_to_go(frequency: float, difference: FloatArray, path_length: FloatArray) -> FloatArray:
    """O-X phase still to be gathered on the way out, at each point of a ray.

    Parameters
    ----------
    frequency : float
        Wave frequency [Hz].
    difference : ndarray, shape (n,)
        mu_O - mu_X at points ordered toward the exit [1].
    path_length : ndarray, shape (n,)
        Distance along the ray to each point [m].

    Returns
    -------
    ndarray, shape (n,)
        (2 pi / lambda) times the integral of the difference from the point to
        the last one (trapezoidal rule) [rad].
    """
    pieces = 0.5 * (difference[1:] + difference[:-1]) * np.diff(path_length)
    to_end = np.concatenate([np.cumsum(pieces[::-1])[::-1], [0.0]])
    return np.asarray(2.0 * np.pi * frequency / SPEED_OF_LIGHT * to_end)


def limiting_point(phase: FloatArray) -> float:
    """Where the O-X phase still to be gathered falls to one radian for the last time.

    Above it the two waves keep their own changing shapes; below it they leave
    with the shapes they had there (the limiting polarization [Budden1952]_).

    Parameters
    ----------
    phase : ndarray, shape (n,)
        From :func:`phase_to_go`, ordered toward the exit [rad].

    Returns
    -------
    float
        Fractional index into the points; 0 if the whole way gathers less than
        one radian [1].
    """
    above = np.flatnonzero(np.abs(phase) >= 1.0)
    if above.size == 0:
        return 0.0
    i = int(above[-1])
    if i + 1 >= phase.size:
        return float(i)
    high, low = abs(float(phase[i])), abs(float(phase[i + 1]))
    return i + (high - 1.0) / (high - low)
