"""Parameters of a marginal from its mean and standard deviation, or from two quantiles."""

import math
from collections.abc import Callable

import numpy as np
from scipy import optimize, special

from assess.probability.closed_form import Constant, Lognormal, Normal, Uniform
from assess.probability.extreme_values import (
    EULER_GAMMA,
    Gumbel,
    Weibull,
    weibull_squared_variation,
)
from assess.probability.marginal import Marginal, require
from assess.probability.tabulated import (
    LARGEST_SHAPE,
    SMALLEST_SHAPE,
    Beta,
    Gamma,
    ScaledInverseChi,
    inverse_chi_squared_variation,
)
from assess.probability.truncated_normal import TruncatedNormal, truncated_moments

Quantiles = tuple[tuple[float, float], tuple[float, float]]  # (probability, value) twice, rising
MATCH = 1e-8  # largest mismatch of a two-parameter root, relative to the spread asked for


def _root(equation: Callable[[float], float], low: float, high: float, what: str) -> float:
    """Solve for a positive parameter by its logarithm.

    Raises
    ------
    ValueError
        When no root lies between ``low`` and ``high``.
    """

    def by_logarithm(log_value: float) -> float:
        return equation(min(max(math.exp(log_value), low), high))  # rounding must not leave them

    if not equation(low) * equation(high) <= 0.0:
        raise ValueError(f"{what}: no parameter between {low:g} and {high:g} gives that")
    root = optimize.brentq(by_logarithm, math.log(low), math.log(high), xtol=1e-14)
    return min(max(math.exp(float(root)), low), high)


def _require_positive(mean: float, family: str) -> None:
    require(mean > 0.0, f"mean of a {family}", mean, "a positive number")


def constant_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Make a constant of the mean; the standard deviation has to be zero."""
    require(sd == 0.0, "standard deviation of a constant", sd, "0, or leave it out")
    return Constant(mean)


def normal_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a normal distribution of given mean and standard deviation."""
    return Normal(mean, sd)


def lognormal_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a lognormal distribution: log_sd² = ln(1 + V²), log_mean = ln mean - log_sd²/2."""
    _require_positive(mean, "lognormal")
    log_variance = math.log1p((sd / mean) ** 2)
    return Lognormal(math.log(mean) - 0.5 * log_variance, math.sqrt(log_variance))


def gumbel_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a Gumbel distribution: scale = sd sqrt(6)/pi, mode = mean - 0.5772 scale."""
    scale = sd * math.sqrt(6.0) / math.pi
    return Gumbel(mean - EULER_GAMMA * scale, scale)


def weibull_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a Weibull distribution: shape from Γ(1+2/k)/Γ(1+1/k)² - 1 = V²."""
    _require_positive(mean, "weibull")
    target = (sd / mean) ** 2
    what = f"weibull with V {sd / mean:.4g}"
    shape = _root(lambda k: math.log(weibull_squared_variation(k) / target), 0.1, 1e5, what)
    return Weibull(mean / math.gamma(1.0 + 1.0 / shape), shape)


def gamma_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a gamma distribution: shape = 1/V², scale = sd²/mean."""
    _require_positive(mean, "gamma")
    return Gamma((mean / sd) ** 2, sd**2 / mean)


def scaled_inverse_chi_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a scaled inverse chi distribution: degrees from V, then scale from the mean."""
    _require_positive(mean, "scaled inverse chi")
    target = (sd / mean) ** 2
    what = f"scaled inverse chi with V {sd / mean:.4g}"

    def mismatch(beyond_two: float) -> float:
        return math.log(inverse_chi_squared_variation(2.0 + beyond_two) / target)

    degrees = 2.0 + _root(mismatch, 1e-6, 1e6, what)
    return ScaledInverseChi(mean / ScaledInverseChi(1.0, degrees).mean, degrees)


def uniform_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a uniform distribution: mean -/+ sqrt(3) sd."""
    half_width = math.sqrt(3.0) * sd
    return Uniform(mean - half_width, mean + half_width)


def beta_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a beta distribution between bounds, by the method of moments in closed form."""
    allowed = f"a number between the bounds {lower:g} and {upper:g}"
    require(lower < mean < upper, "mean of a beta", mean, allowed)
    share = (mean - lower) / (upper - lower)
    largest = math.sqrt((mean - lower) * (upper - mean))
    require(sd < largest, "standard deviation of a beta", sd, f"less than {largest:.6g}")
    total = (largest / sd) ** 2 - 1.0  # q + r
    return Beta(share * total, (1.0 - share) * total, lower, upper)


def truncated_normal_from_moments(mean: float, sd: float, lower: float, upper: float) -> Marginal:
    """Fit a truncated normal distribution; mean and sd are those *after* truncation."""
    allowed = f"a number between the bounds {lower:g} and {upper:g}"
    require(lower < mean < upper, "mean of a truncated normal", mean, allowed)

    def mismatch(location: float, scale: float) -> tuple[float, float]:
        got_mean, got_sd = truncated_moments(location, scale, lower, upper)
        return (got_mean - mean) / sd, got_sd / sd - 1.0

    what = f"truncated normal with mean {mean:g} and sd {sd:g}"
    return TruncatedNormal(*_location_and_scale(mismatch, mean, sd, what), lower, upper)


def _location_and_scale(
    mismatch: Callable[[float, float], tuple[float, float]], centre: float, spread: float, what: str
) -> tuple[float, float]:
    """Solve for location and scale of a truncated normal distribution."""

    def equations(unknown: np.ndarray[tuple[int], np.dtype[np.float64]]) -> tuple[float, float]:
        try:
            return mismatch(centre + spread * unknown[0], spread * math.exp(unknown[1]))
        except (ValueError, ZeroDivisionError, OverflowError):
            return 1e3, 1e3  # no mass between the bounds: far from any root

    solution = optimize.root(equations, np.zeros(2), method="hybr", tol=1e-13)
    if not np.max(np.abs(solution.fun)) < MATCH:
        raise ValueError(f"{what}: no normal distribution cut off at these bounds has that")
    return centre + spread * float(solution.x[0]), spread * math.exp(float(solution.x[1]))


def _line(first: float, second: float, values: tuple[float, float]) -> tuple[float, float]:
    """Location and scale of values that are linear in the reduced variates given."""
    scale = (values[1] - values[0]) / (second - first)
    return values[0] - scale * first, scale


def _logs(quantiles: Quantiles, family: str) -> tuple[float, float]:
    """Logarithms of two quantiles, which have to be positive."""
    smallest = quantiles[0][1]
    require(smallest > 0.0, f"smaller quantile of a {family}", smallest, "a positive number")
    return math.log(quantiles[0][1]), math.log(quantiles[1][1])


def _scores(quantiles: Quantiles) -> tuple[float, float]:
    return float(special.ndtri(quantiles[0][0])), float(special.ndtri(quantiles[1][0]))


def normal_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a normal distribution through two quantiles."""
    return Normal(*_line(*_scores(quantiles), (quantiles[0][1], quantiles[1][1])))


def lognormal_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a lognormal distribution through two quantiles."""
    return Lognormal(*_line(*_scores(quantiles), _logs(quantiles, "lognormal")))


def gumbel_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a Gumbel distribution through two quantiles, linear in -ln(-ln p)."""
    first, second = (-math.log(-math.log(p)) for p, _ in quantiles)
    return Gumbel(*_line(first, second, (quantiles[0][1], quantiles[1][1])))


def weibull_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a Weibull distribution through two quantiles: ln x is linear in ln(-ln(1 - p))."""
    first, second = (math.log(-math.log1p(-p)) for p, _ in quantiles)
    log_scale, slope = _line(first, second, _logs(quantiles, "weibull"))
    return Weibull(math.exp(log_scale), 1.0 / slope)


def uniform_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a uniform distribution through two quantiles."""
    (first, low), (second, high) = quantiles
    start, width = _line(first, second, (low, high))
    return Uniform(start, start + width)


def gamma_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a gamma distribution through two quantiles; their ratio fixes the shape."""
    low, high = _logs(quantiles, "gamma")

    def mismatch(shape: float) -> float:
        unit = Gamma(shape, 1.0)
        ratio = float(unit.ppf(quantiles[1][0])) / max(float(unit.ppf(quantiles[0][0])), 1e-300)
        return math.log(ratio) - (high - low)

    what = f"gamma with quantiles in the ratio {math.exp(high - low):.4g}"
    shape = _root(mismatch, SMALLEST_SHAPE, LARGEST_SHAPE, what)
    return Gamma(shape, quantiles[1][1] / float(Gamma(shape, 1.0).ppf(quantiles[1][0])))


def scaled_inverse_chi_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a scaled inverse chi distribution through two quantiles, by the gamma of its precision.

    The precision 1/sigma² is gamma distributed with half the degrees of freedom as its shape.
    """
    _logs(quantiles, "scaled inverse chi")
    (first, low), (second, high) = quantiles
    precision = gamma_from_quantiles(((1.0 - second, high**-2), (1.0 - first, low**-2)), 0.0, 0.0)
    shape, scale = precision.parameters["shape"], precision.parameters["scale"]
    return ScaledInverseChi(1.0 / math.sqrt(shape * scale), 2.0 * shape)


def beta_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a beta distribution between bounds through two quantiles."""
    (first, low), (second, high) = quantiles
    allowed = f"inside the bounds {lower:g} and {upper:g}"
    require(lower < low, "smaller quantile of a beta", low, allowed)
    require(high < upper, "larger quantile of a beta", high, allowed)
    shares = np.array([(x - lower) / (upper - lower) for x in (low, high)])
    scores = special.ndtri(np.array([first, second]))

    def mismatch(log_shapes: np.ndarray[tuple[int], np.dtype[np.float64]]) -> list[float]:
        q, r = np.exp(np.clip(log_shapes, math.log(SMALLEST_SHAPE), math.log(LARGEST_SHAPE)))
        unit = Beta(float(q), float(r), 0.0, 1.0)
        return list(np.nan_to_num(unit.score(shares), posinf=40.0, neginf=-40.0) - scores)

    solution = optimize.root(mismatch, _start_of_shapes(shares, scores), method="hybr", tol=1e-13)
    if not np.max(np.abs(solution.fun)) < MATCH:
        raise ValueError(
            f"beta through {low:g} and {high:g} at probabilities {first:g} and {second:g}: "
            f"no shapes between {SMALLEST_SHAPE:g} and {LARGEST_SHAPE:g} give that"
        )
    q, r = np.exp(solution.x)
    return Beta(float(q), float(r), lower, upper)


def _start_of_shapes(
    shares: np.ndarray[tuple[int], np.dtype[np.float64]],
    scores: np.ndarray[tuple[int], np.dtype[np.float64]],
) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Logarithms of the shapes as if the logit were normal: trigamma(q) ~ 1/q."""
    logits = special.logit(shares)
    mean, sd = _line(float(scores[0]), float(scores[1]), (float(logits[0]), float(logits[1])))
    share = special.expit(mean)
    total = 1.0 / (sd**2 * share * (1.0 - share))
    bounds = math.log(2.0 * SMALLEST_SHAPE), math.log(0.5 * LARGEST_SHAPE)
    return np.clip(np.log([share * total, (1.0 - share) * total]), *bounds)


def truncated_normal_from_quantiles(quantiles: Quantiles, lower: float, upper: float) -> Marginal:
    """Fit a truncated normal distribution through two quantiles."""
    (first, low), (second, high) = quantiles
    allowed = f"inside the bounds {lower:g} and {upper:g}"
    require(lower < low, "smaller quantile of a truncated normal", low, allowed)
    require(high < upper, "larger quantile of a truncated normal", high, allowed)
    wanted = _scores(quantiles)
    centre, spread = _line(*wanted, (low, high))

    def mismatch(location: float, scale: float) -> tuple[float, float]:
        cut = TruncatedNormal(location, scale, lower, upper)
        return float(cut.score(low)) - wanted[0], float(cut.score(high)) - wanted[1]

    what = f"truncated normal through {low:g} and {high:g} at {first:g} and {second:g}"
    return TruncatedNormal(*_location_and_scale(mismatch, centre, spread, what), lower, upper)
