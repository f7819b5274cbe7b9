"""How a log of readings on two relay positions speaks for or against its labels.

Each reading is the level on position A less that on position B, in dB. It is
what the two waves give in the two positions, plus an error:

- a wave gives its full level in the position that prefers it, and is down by
  the antenna's rejection R in the other;
- whether each wave arrives follows from foF2, whose error is one and the same
  for all rows of a UTC day (a standard normal number z a day);
- the level of the ordinary over the extraordinary wave is wrong by one number a
  day too (standard deviation 6 dB);
- a reading's own error is Student's t with four degrees of freedom, and one
  reading in twenty is an outlier, anything within 40 dB. Where neither wave
  arrives both readings are noise.

The evidence for "as labelled" against "swapped" is the ratio of the two
marginal likelihoods, R being anything from 3 to 40 dB. With the same model's
own logs a ratio of 100 is wrong at most once in a hundred.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from magion.arrays import BoolArray, FloatArray, IntArray

SPLIT_ERROR_DB: Final = 6.0
"""Standard deviation of the predicted level of O over X, one a day [dB]."""

OUTLIER_SHARE: Final = 0.05
OUTLIER_REACH_DB: Final = 40.0
FREEDOM: Final = 4.0
TELLING: Final = 2.0
"""log10 of the likelihood ratio from which on a verdict is given [1]."""

REJECTIONS_DB: Final = np.arange(3.0, 40.01, 0.5)
INTERVAL: Final = 0.90
"""Share of the truths that the interval of the rejection is to cover [1]."""

LEVEL_TOLD_DB: Final = 20.0
ALONE: Final = 0.8
_NODES_Z, _NODES_U = 9, 5
_NOISE_ONLY = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Expectation:
    """What is expected of every row.

    Parameters
    ----------
    day : ndarray of int, shape (n,)
        Index of the UTC day.
    ordinary_chance, extraordinary_chance : ndarray, shape (n,)
        Probability that each wave arrives [1].
    ordinary_prefers, extraordinary_prefers : ndarray, shape (n,)
        1 where position A prefers the wave, -1 where B does, 0 where neither [1].
    split_db : ndarray, shape (n,)
        Level of the ordinary over the extraordinary wave [dB].
    """

    day: IntArray
    ordinary_chance: FloatArray
    extraordinary_chance: FloatArray
    ordinary_prefers: FloatArray
    extraordinary_prefers: FloatArray
    split_db: FloatArray

    def take(self, keep: BoolArray | IntArray) -> "Expectation":
        """Some of the rows.

        Parameters
        ----------
        keep : ndarray
            Mask or indices.

        Returns
        -------
        Expectation
            Of those rows.
        """
        names = (
            "day",
            "ordinary_chance",
            "extraordinary_chance",
            "ordinary_prefers",
            "extraordinary_prefers",
            "split_db",
        )
        return Expectation(**{name: getattr(self, name)[keep] for name in names})

    @property
    def carries_rejection(self) -> BoolArray:
        """Rows in which one wave is expected alone, or far stronger.

        Returns
        -------
        ndarray of bool, shape (n,)
            Only these tell the antenna's rejection; the others tell the split
            of the levels.
        """
        both = np.minimum(self.ordinary_chance, self.extraordinary_chance)
        any_wave = np.maximum(self.ordinary_chance, self.extraordinary_chance)
        alone = any_wave - both >= ALONE
        far = (np.abs(self.split_db) >= LEVEL_TOLD_DB) & (any_wave >= ALONE)
        prefers = np.where(
            (self.ordinary_chance - self.extraordinary_chance + 0.05 * self.split_db) > 0.0,
            self.ordinary_prefers,
            self.extraordinary_prefers,
        )
        return np.asarray((alone | far) & (prefers != 0.0))


def expected_difference(
    ordinary_arrives: FloatArray,
    extraordinary_arrives: FloatArray,
    ordinary_prefers: FloatArray,
    extraordinary_prefers: FloatArray,
    split_db: FloatArray,
    rejection_db: FloatArray,
) -> FloatArray:
    """Level on position A less that on B.

    Parameters
    ----------
    ordinary_arrives, extraordinary_arrives : ndarray
        1 where a wave arrives, else 0 [1].
    ordinary_prefers, extraordinary_prefers : ndarray
        Which position prefers it, as in :class:`Expectation` [1].
    split_db : ndarray
        Level of the ordinary over the extraordinary wave [dB].
    rejection_db : ndarray
        The antenna's rejection [dB].

    Returns
    -------
    ndarray
        Difference; 0 where neither arrives [dB].
    """
    kept = 10.0 ** (-np.asarray(rejection_db) / 10.0)
    half = np.clip(split_db, -80.0, 80.0) / 20.0
    on_a, on_b = np.zeros(()), np.zeros(())
    for arrives, prefers, power in (
        (ordinary_arrives, ordinary_prefers, 10.0**half),
        (extraordinary_arrives, extraordinary_prefers, 10.0**-half),
    ):
        on_a = on_a + arrives * power * np.where(prefers < 0.0, kept, 1.0)
        on_b = on_b + arrives * power * np.where(prefers > 0.0, kept, 1.0)
    silent = (on_a <= 0.0) | (on_b <= 0.0)
    ratio = np.where(silent, 1.0, on_a) / np.where(silent, 1.0, on_b)
    return np.asarray(10.0 * np.log10(ratio))


def _density(error_db: FloatArray, scale_db: FloatArray) -> FloatArray:
    """Density of a reading's error: Student's t and outliers [1/dB]."""
    norm = math.gamma(0.5 * (FREEDOM + 1.0)) / (
        math.gamma(0.5 * FREEDOM) * math.sqrt(FREEDOM * math.pi)
    )
    x = error_db / scale_db
    t = norm / scale_db * (1.0 + x * x / FREEDOM) ** (-0.5 * (FREEDOM + 1.0))
    return np.asarray((1.0 - OUTLIER_SHARE) * t + OUTLIER_SHARE / (2.0 * OUTLIER_REACH_DB))


def _thresholds(chance: FloatArray) -> FloatArray:
    """Z above which a wave of some probability arrives."""
    from scipy.special import ndtri

    return np.asarray(-ndtri(np.clip(chance, 0.0, 1.0)))


def _gauss(nodes: int) -> tuple[FloatArray, FloatArray]:
    """Nodes and weights for the mean over a standard normal number."""
    x, w = np.polynomial.hermite_e.hermegauss(nodes)
    return x, w / w.sum()


def _log_likelihood(rows: Expectation, measured_db: FloatArray, noise_db: float) -> FloatArray:
    """Log likelihood, shape (2, rejections): as labelled, and swapped."""
    z, z_weight = _even(_NODES_Z * 5)
    u, u_weight = _gauss(_NODES_U)
    total = np.zeros((2, REJECTIONS_DB.size))
    z_o, z_x = _thresholds(rows.ordinary_chance), _thresholds(rows.extraordinary_chance)
    for day in np.unique(rows.day):
        part = rows.day == day
        one = rows.take(part)
        # axes: z, u, rejection, row
        o = (z[:, None, None, None] >= z_o[part]).astype(float)
        x = (z[:, None, None, None] >= z_x[part]).astype(float)
        split = one.split_db + SPLIT_ERROR_DB * u[None, :, None, None]
        expected = expected_difference(
            o, x, one.ordinary_prefers, one.extraordinary_prefers, split,
            REJECTIONS_DB[None, None, :, None],
        )  # fmt: skip
        scale = noise_db * np.where(o + x > 0.0, 1.0, _NOISE_ONLY)
        for k, sign in enumerate((1.0, -1.0)):
            density = _density(measured_db[part] - sign * expected, scale)
            each = np.sum(np.log(density), axis=-1)
            weights = np.log(z_weight)[:, None, None] + np.log(u_weight)[None, :, None]
            total[k] += _log_sum(each + weights, (0, 1))
    return total


def _even(count: int) -> tuple[FloatArray, FloatArray]:
    """Equally likely values of a standard normal number: steps are met where they lie."""
    from scipy.special import ndtri

    return np.asarray(ndtri((np.arange(count) + 0.5) / count)), np.full(count, 1.0 / count)


def _log_sum(values: FloatArray, axes: tuple[int, ...]) -> FloatArray:
    top = values.max(axis=axes, keepdims=True)
    return np.asarray(np.log(np.sum(np.exp(values - top), axis=axes)) + np.squeeze(top, axes))


@dataclass(frozen=True, slots=True, kw_only=True)
class Evidence:
    """What a log says.

    Parameters
    ----------
    verdict : str
        "as labelled", "swapped" or "not enough to say".
    log10_ratio : float
        log10 of the likelihood ratio, positive for "as labelled" [1].
    rejection_db, lowest_db, highest_db : float or None
        Median and ends of the interval that covers 90 % of the truths; None
        where no row carries the rejection, or no verdict is given [dB].
    """

    verdict: str
    log10_ratio: float
    rejection_db: float | None
    lowest_db: float | None
    highest_db: float | None


def evidence(rows: Expectation, measured_db: FloatArray, noise_db: float) -> Evidence:
    """Weigh a log.

    Parameters
    ----------
    rows : Expectation
        What is expected of every row.
    measured_db : ndarray, shape (n,)
        Level on position A less that on B [dB].
    noise_db : float
        Scale of a reading's own error [dB].

    Returns
    -------
    Evidence
        Verdict and rejection.
    """
    if measured_db.size == 0:
        return Evidence(
            verdict="not enough to say",
            log10_ratio=0.0,
            rejection_db=None,
            lowest_db=None,
            highest_db=None,
        )
    found = _log_likelihood(rows, measured_db, noise_db)
    marginal = _log_sum(found, (1,))
    ratio = float(marginal[0] - marginal[1]) / math.log(10.0)
    verdict = "not enough to say"
    if abs(ratio) >= TELLING:
        verdict = "as labelled" if ratio > 0.0 else "swapped"
    estimate: list[float | None] = [None, None, None]
    telling = rows.carries_rejection
    if verdict != "not enough to say" and telling.any():
        own = _log_likelihood(rows.take(telling), measured_db[telling], noise_db)
        weight = np.exp(own[0 if ratio > 0.0 else 1] - own[0 if ratio > 0.0 else 1].max())
        # Between the grid's values the density is linear.
        share = np.concatenate([[0.0], np.cumsum(0.5 * (weight[1:] + weight[:-1]))])
        share /= share[-1]
        tail = 0.5 * (1.0 - INTERVAL)
        estimate = [float(np.interp(q, share, REJECTIONS_DB)) for q in (0.5, tail, 1.0 - tail)]
    return Evidence(
        verdict=verdict,
        log10_ratio=ratio,
        rejection_db=estimate[0],
        lowest_db=estimate[1],
        highest_db=estimate[2],
    )


def simulated(
    rows: Expectation,
    rejection_db: float,
    swapped: bool,
    noise_db: float,
    generator: np.random.Generator,
) -> FloatArray:
    """A log of known truth, drawn from the model.

    Parameters
    ----------
    rows : Expectation
        What is expected of every row.
    rejection_db : float
        The antenna's true rejection [dB].
    swapped : bool
        Whether the labels are the wrong way round.
    noise_db : float
        Scale of a reading's own error [dB].
    generator : numpy.random.Generator
        Seeded source of chance.

    Returns
    -------
    ndarray, shape (n,)
        Level on position A less that on B [dB].
    """
    days, index = np.unique(rows.day, return_inverse=True)
    z, u = generator.standard_normal((2, days.size))
    o = (z[index] >= _thresholds(rows.ordinary_chance)).astype(float)
    x = (z[index] >= _thresholds(rows.extraordinary_chance)).astype(float)
    true = expected_difference(
        o, x, rows.ordinary_prefers, rows.extraordinary_prefers,
        rows.split_db + SPLIT_ERROR_DB * u[index], np.asarray(rejection_db),
    )  # fmt: skip
    scale = noise_db * np.where(o + x > 0.0, 1.0, _NOISE_ONLY)
    read = (-true if swapped else true) + scale * generator.standard_t(FREEDOM, rows.day.size)
    wild = generator.random(rows.day.size) < OUTLIER_SHARE
    anything = generator.uniform(-OUTLIER_REACH_DB, OUTLIER_REACH_DB, rows.day.size)
    return np.where(wild, anything, read)
