"""Pearson correlation of variables that depend through standard normal scores."""

import math
from functools import cache

import numpy as np
from scipy import optimize

from assess.probability.closed_form import Constant, Lognormal, Normal, Uniform
from assess.probability.marginal import FloatArray, Marginal

# The trapezoidal rule converges exponentially on a normal density times a smooth function; these
# ends leave room for variables that grow like exp(4 z).
QUADRATURE_END = 12.0
QUADRATURE_STEP = 0.1
# Largest relative error of a standard deviation by quadrature for a sound Pearson coefficient.
MOMENT_TOLERANCE = 1e-6


@cache
def _quadrature() -> tuple[FloatArray, FloatArray]:
    """Nodes and weights of the standard normal expectation."""
    n_half = round(QUADRATURE_END / QUADRATURE_STEP)
    nodes: FloatArray = np.linspace(-QUADRATURE_END, QUADRATURE_END, 2 * n_half + 1)
    density: FloatArray = np.exp(-0.5 * nodes**2)
    weights: FloatArray = density / density.sum()
    return nodes, weights


def _standardised(marginal: Marginal, z: FloatArray) -> FloatArray:
    return np.asarray((marginal.from_score(z) - marginal.mean) / marginal.sd, dtype=np.float64)


def _require_moments(marginal: Marginal) -> None:
    """Refuse marginals for which a Pearson coefficient means nothing, or cannot be computed."""
    if isinstance(marginal, Constant):
        raise ValueError(
            f"Pearson correlation: given {marginal.describe()}, allowed variables with scatter"
        )
    nodes, weights = _quadrature()
    variance = math.nan
    if math.isfinite(marginal.sd):
        variance = float(weights @ _standardised(marginal, nodes) ** 2)
    if not abs(variance - 1.0) < 2.0 * MOMENT_TOLERANCE:
        raise ValueError(
            f"Pearson correlation: given {marginal.describe()}, whose tail is too heavy; allowed "
            "is a rank correlation (spearman or kendall)"
        )


def score_to_pearson(score: float, first: Marginal, second: Marginal) -> float:
    r"""Pearson correlation of two variables whose scores have a given correlation.

    Parameters
    ----------
    score : float
        Correlation of the standard normal scores, between -1 and 1 inclusive. [-]
    first, second : Marginal
        Marginal distributions, with finite standard deviations.

    Returns
    -------
    float
        Pearson coefficient. [-]

    Notes
    -----
    Expectation of the product of the standardised variables, eq. (12) of [1]_:

    .. math:: \rho_X = E\left[\frac{x_1(z_1)-\mu_1}{\sigma_1}\,
        \frac{x_2(\rho_Z z_1 + \sqrt{1-\rho_Z^2}\,w)-\mu_2}{\sigma_2}\right]

    with independent standard normal :math:`z_1, w`, by the trapezoidal rule in both.

    References
    ----------
    .. [1] P.-L. Liu, A. Der Kiureghian, Multivariate distribution models with prescribed marginals
       and covariances, Probab. Eng. Mech. 1 (1986) 105-112, doi:10.1016/0266-8920(86)90033-0
       (equation number from memory).
    """
    nodes, weights = _quadrature()
    outer = _standardised(first, nodes)
    across = math.sqrt(max(1.0 - score * score, 0.0))
    inner = _standardised(second, score * nodes[:, np.newaxis] + across * nodes)
    return float((weights * outer) @ (inner @ weights))


def attainable_pearson(first: Marginal, second: Marginal) -> tuple[float, float]:
    r"""Smallest and largest Pearson correlation that two marginals allow.

    Parameters
    ----------
    first, second : Marginal
        Marginal distributions, with finite standard deviations.

    Returns
    -------
    tuple of float
        Lower limit (one falls as the other rises) and upper limit (both rise together). [-]

    Raises
    ------
    ValueError
        When one is a constant, or its tail is too heavy for a Pearson coefficient.

    Notes
    -----
    Fréchet-Hoeffding bounds: expectation of :math:`x_1(z) x_2(\pm z)`. In closed form for two
    normal variables, :math:`\pm 1`, and for two lognormal ones,
    :math:`(e^{\pm\zeta_1\zeta_2}-1)/(V_1 V_2)`; else by quadrature over the scores.

    References
    ----------
    .. [1] W. Hoeffding, Masstabinvariante Korrelationstheorie, Schr. Math. Inst. Univ. Berlin 5
       (1940) 181-233.
    .. [2] M. Fréchet, Sur les tableaux de corrélation dont les marges sont données, Ann. Univ.
       Lyon A 14 (1951) 53-77.

    Examples
    --------
    >>> from assess.probability.marginals import make_marginal
    >>> skewed = make_marginal("lognormal", mean=1.0, V=1.0)
    >>> [round(limit, 6) for limit in attainable_pearson(skewed, skewed)]
    [-0.5, 1.0]
    """
    if isinstance(first, Normal) and isinstance(second, Normal):
        return -1.0, 1.0
    if isinstance(first, Lognormal) and isinstance(second, Lognormal):
        exponent, product = first.log_sd * second.log_sd, first.V * second.V
        return math.expm1(-exponent) / product, math.expm1(exponent) / product
    _require_moments(first)
    _require_moments(second)
    nodes, weights = _quadrature()
    weighted = weights * _standardised(first, nodes)
    low, high = (float(weighted @ _standardised(second, sign * nodes)) for sign in (-1.0, 1.0))
    return max(low, -1.0), min(high, 1.0)


def pearson_to_score(pearson: float, first: Marginal, second: Marginal) -> float:
    r"""Score correlation that gives a Pearson correlation (Nataf transformation).

    Parameters
    ----------
    pearson : float
        Pearson coefficient, strictly inside `attainable_pearson`. [-]
    first, second : Marginal
        Marginal distributions, with finite standard deviations.

    Returns
    -------
    float
        Correlation of the standard normal scores, to 1e-6 or better. [-]

    Raises
    ------
    ValueError
        When the coefficient cannot be attained; the message has the range.

    Notes
    -----
    Closed form where it is exact: a normal with anything (the factor does not depend on the
    coefficient), two lognormal variables,
    :math:`\ln(1+\rho V_1 V_2)/(\zeta_1\zeta_2)`, and two uniform ones,
    :math:`2\sin(\pi\rho/6)`. Else `score_to_pearson` is inverted by root finding, not by the
    fitted factors of the paper.

    References
    ----------
    .. [1] P.-L. Liu, A. Der Kiureghian, Multivariate distribution models with prescribed marginals
       and covariances, Probab. Eng. Mech. 1 (1986) 105-112, doi:10.1016/0266-8920(86)90033-0.

    Examples
    --------
    >>> from assess.probability.marginals import make_marginal
    >>> skewed = make_marginal("lognormal", mean=1.0, V=0.2)
    >>> round(pearson_to_score(0.5, skewed, skewed), 6)
    0.504902
    """
    low, high = attainable_pearson(first, second)
    if not low < pearson < high:
        raise ValueError(
            f"Pearson correlation between {first.describe()} and {second.describe()}: given "
            f"{pearson:g}, allowed strictly between {low:.4f} and {high:.4f}"
        )
    if isinstance(first, Normal) or isinstance(second, Normal):
        return float(pearson) / high  # E[X Z] is linear in the score correlation
    if isinstance(first, Lognormal) and isinstance(second, Lognormal):
        log_sds = first.log_sd * second.log_sd
        return math.log1p(pearson * first.V * second.V) / log_sds
    if isinstance(first, Uniform) and isinstance(second, Uniform):
        return 2.0 * math.sin(math.pi * pearson / 6.0)  # its Pearson is its rank correlation
    if pearson == 0.0:
        return 0.0
    ends = (0.0, 1.0) if pearson > 0.0 else (-1.0, 0.0)
    root = optimize.brentq(lambda r: score_to_pearson(r, first, second) - pearson, *ends, xtol=1e-9)
    return float(root)
