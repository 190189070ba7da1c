"""Uncertainty: propagation by sampling, combination of sources, and how a number is shown.

After JCGM 100:2008 (GUM) and its supplement JCGM 101:2008.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

# Enough for a standard uncertainty to about 3 %, which the second shown digit does not see.
SAMPLES = 512
# Inputs that can be drawn beside each other.
INPUTS = 8
# Probabilities between which a normal distribution has ± one standard deviation.
_CENTRAL = (0.15865525393145707, 0.8413447460685429)


def scores(index: int) -> Array:
    """Standard normal scores [1] of shape (SAMPLES,) of input ``index``, the same in every run.

    JCGM 101:2008 with stratified draws: the normal quantiles of equal slices of probability in
    an order of each input's own, then freed of what correlation chance has left between inputs,
    so that a linear law of propagation is met exactly. Raises ``IndexError`` beyond ``INPUTS``.
    """
    row: Array = _all_scores()[index]
    return row


@lru_cache(maxsize=1)
def _all_scores() -> Array:
    quantiles = _normal_quantile((np.arange(SAMPLES) + 0.5) / SAMPLES)
    orders = (np.random.Generator(np.random.PCG64(7919 + i)) for i in range(INPUTS))
    shuffled = np.stack([order.permutation(quantiles) for order in orders])
    shuffled -= shuffled.mean(axis=1, keepdims=True)
    root = np.linalg.cholesky(shuffled @ shuffled.T / SAMPLES)
    free: Array = np.linalg.solve(root, shuffled)
    free.setflags(write=False)
    return free


def _normal_quantile(probability: Array) -> Array:
    from statistics import NormalDist

    inverse = NormalDist().inv_cdf
    return np.array([inverse(float(p)) for p in probability])


def draw(value: ArrayLike, uncertainty: ArrayLike, index: int, low: float, high: float) -> Array:
    """Samples of an input: shape of ``value`` plus a last axis of ``SAMPLES``.

    ``value`` and ``uncertainty`` [any, the same], ``low`` and ``high`` its physical bounds:
    samples beyond a bound are put on it. ``index`` names the input: the same index gives the
    same scores, so metrics that share an input stay correlated.
    """
    centre = np.asarray(value, dtype=np.float64)[..., np.newaxis]
    spread = np.asarray(uncertainty, dtype=np.float64)[..., np.newaxis]
    return np.clip(centre + spread * scores(index), low, high)


def spread(samples: Array) -> Array:
    """Standard uncertainty [as samples] over the last axis: half the central 68.27 % interval.

    For a normal distribution that is the standard deviation. It stays finite and meaningful where
    a quotient or a bound leaves the distribution long tails and no usable standard deviation
    (JCGM 101:2008, 7.7: the interval is what a sampled distribution gives). Samples without a
    value (NaN) are left out; where they are the majority the result is NaN.
    """
    samples = np.asarray(samples, dtype=np.float64)
    count = samples.shape[-1] - np.isnan(samples).sum(axis=-1)
    result = np.full(samples.shape[:-1], np.nan)
    usable = 2 * count > samples.shape[-1]
    ordered = np.sort(samples[usable], axis=-1)  # NaN comes last
    low, high = (_quantile(ordered, count[usable], p) for p in _CENTRAL)
    result[usable] = (high - low) / 2
    return result


def _quantile(ordered: Array, count: NDArray[np.int_], probability: float) -> Array:
    """Quantile of the first ``count`` samples in order, each standing for its own slice."""
    position = np.clip(probability * count - 0.5, 0, count - 1)
    below = np.floor(position).astype(int)
    above = np.minimum(below + 1, count - 1)
    share = position - below
    left, right = (
        np.take_along_axis(ordered, i[:, np.newaxis], axis=-1)[:, 0] for i in (below, above)
    )
    return np.asarray(left + share * (right - left))


def weighted_mean(value: ArrayLike, uncertainty: ArrayLike) -> tuple[float, float, float]:
    """Mean, its standard uncertainty and the Birge ratio of values [any] of shape (n,).

    Weights 1/u². Where the values scatter more than their uncertainties say (Birge ratio above
    1) the uncertainty grows by that ratio. Birge, Phys. Rev. 40, 207 (1932).
    """
    x = np.asarray(value, dtype=np.float64)
    w = 1 / np.asarray(uncertainty, dtype=np.float64) ** 2
    mean = float(np.sum(w * x) / np.sum(w))
    own = float(1 / np.sqrt(np.sum(w)))
    if x.size < 2:
        return mean, own, 0.0
    birge = float(np.sqrt(np.sum(w * (x - mean) ** 2) / (x.size - 1)))
    return mean, own * max(1.0, birge), birge


MINUS = "\u2212"
_SUPER = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def decimals_for(uncertainty: float) -> int:
    """Decimals that show an uncertainty [any] with two digits (JCGM 100, 7.2.6)."""
    if not math.isfinite(uncertainty) or uncertainty <= 0:
        return 0
    rounded = float(f"{uncertainty:.1e}")
    return 1 - math.floor(math.log10(rounded))


def _plain(number: float, decimals: int) -> str:
    text = f"{number:.{max(decimals, 0)}f}" if decimals >= 0 else f"{round(number, decimals):.0f}"
    return text.removeprefix("-") if float(text) == 0 else text.replace("-", MINUS)


def format_number(number: float, decimals: int) -> str:
    """A number with fixed decimals, or as a power of ten where those would show nothing of it."""
    if not math.isfinite(number):
        return ""
    if number != 0 and (
        abs(number) < 10.0 ** (-decimals) / 2 or abs(number) >= 1e7 or decimals > 6
    ):
        mantissa, exponent = f"{number:.1e}".split("e")
        return f"{mantissa}×10{str(int(exponent)).translate(_SUPER)}".replace("-", MINUS)
    return _plain(number, decimals)


def format_value(value: float, uncertainty: float, decimals: int) -> str:
    """``78.36 ± 0.05``: digits that fit the uncertainty, never more than ``decimals`` + 1 of them.

    Without a usable uncertainty the quantity's own ``decimals`` hold. Very large and very small
    values are shown as powers of ten.
    """
    if not math.isfinite(value):
        return ""
    if not math.isfinite(uncertainty) or uncertainty <= 0:
        return format_number(value, decimals)
    if decimals > 6 or abs(value) >= 1e7:
        exponent = math.floor(math.log10(abs(value))) if value else 0
        scale = 10.0**exponent
        inner = format_value(value / scale, uncertainty / scale, 2)
        return f"({inner})×10{str(exponent).translate(_SUPER)}"
    shown = min(decimals_for(uncertainty), decimals + 1)
    own = _plain(uncertainty, shown)
    if float(own) == 0.0:
        shown = decimals_for(uncertainty)
        own = _plain(uncertainty, shown)
    return f"{_plain(value, shown)} ± {own}"
