"""The one door to marginal distributions: `make_marginal`."""

import difflib
import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Literal

from assess.probability import fitting
from assess.probability.closed_form import Constant, Lognormal, Normal, Uniform
from assess.probability.extreme_values import Gumbel, Weibull
from assess.probability.marginal import Marginal, require
from assess.probability.tabulated import Beta, Gamma, ScaledInverseChi
from assess.probability.truncated_normal import TruncatedNormal

__all__ = ["DISTRIBUTIONS", "Marginal", "make_marginal"]

LARGEST_V = 2.0
PERCENT_V = 200.0  # up to here a coefficient of variation was probably meant in percent


@dataclass(frozen=True, slots=True)
class _Family:
    """How one distribution is made in each of the three ways."""

    names: tuple[str, ...]  # native parameters
    build: Callable[..., Marginal]  # takes them by keyword, and the bounds where it has any
    from_moments: Callable[[float, float, float, float], Marginal]
    from_quantiles: Callable[[fitting.Quantiles, float, float], Marginal] | None
    bounds: Literal["none", "one or two", "two", "as parameters"] = "none"


def _normal(mean: float, sd: float) -> Marginal:
    return Normal(location=mean, scale=sd)


_FAMILIES: dict[str, _Family] = {
    "normal": _Family(
        ("mean", "sd"), _normal, fitting.normal_from_moments, fitting.normal_from_quantiles
    ),
    "lognormal": _Family(
        ("log_mean", "log_sd"),
        Lognormal,
        fitting.lognormal_from_moments,
        fitting.lognormal_from_quantiles,
    ),
    "gumbel": _Family(
        ("mode", "scale"), Gumbel, fitting.gumbel_from_moments, fitting.gumbel_from_quantiles
    ),
    "weibull": _Family(
        ("scale", "shape"), Weibull, fitting.weibull_from_moments, fitting.weibull_from_quantiles
    ),
    "gamma": _Family(
        ("shape", "scale"), Gamma, fitting.gamma_from_moments, fitting.gamma_from_quantiles
    ),
    "beta": _Family(
        ("q", "r"), Beta, fitting.beta_from_moments, fitting.beta_from_quantiles, "two"
    ),
    "uniform": _Family(
        ("lower", "upper"),
        Uniform,
        fitting.uniform_from_moments,
        fitting.uniform_from_quantiles,
        "as parameters",
    ),
    "truncated normal": _Family(
        ("location", "scale"),
        TruncatedNormal,
        fitting.truncated_normal_from_moments,
        fitting.truncated_normal_from_quantiles,
        "one or two",
    ),
    "scaled inverse chi": _Family(
        ("scale", "degrees"),
        ScaledInverseChi,
        fitting.scaled_inverse_chi_from_moments,
        fitting.scaled_inverse_chi_from_quantiles,
    ),
    "constant": _Family(("value",), Constant, fitting.constant_from_moments, None),
}

DISTRIBUTIONS = tuple(_FAMILIES)


def make_marginal(
    distribution: str,
    *,
    mean: float | None = None,
    V: float | None = None,
    sd: float | None = None,
    quantiles: Mapping[float, float] | None = None,
    parameters: Mapping[str, float] | None = None,
    lower: float | None = None,
    upper: float | None = None,
) -> Marginal:
    """Make a marginal distribution in exactly one of three ways.

    Parameters
    ----------
    distribution : str
        One of `DISTRIBUTIONS`.
    mean : float, optional
        Mean, in the unit of the variable; goes with ``V`` or ``sd``, or alone for a constant.
    V : float, optional
        Coefficient of variation, sd over absolute mean, above 0 and up to 2. [-]
    sd : float, optional
        Standard deviation, in the unit of the variable.
    quantiles : mapping of float to float, optional
        Two values by their non-exceedance probability, such as ``{0.05: 30.0, 0.5: 38.0}``.
    parameters : mapping of str to float, optional
        Native parameters: normal ``mean, sd``; lognormal ``log_mean, log_sd``; gumbel ``mode,
        scale``; weibull ``scale, shape``; gamma ``shape, scale``; beta ``q, r``; uniform ``lower,
        upper``; truncated normal ``location, scale`` (before the cut); scaled inverse chi
        ``scale, degrees``; constant ``value``.
    lower, upper : float, optional
        Bounds: both for a beta, one or both for a truncated normal; for a uniform they are its
        parameters.

    Returns
    -------
    Marginal
        Frozen distribution.

    Raises
    ------
    ValueError
        When the way is missing, incomplete or doubled, or a number is out of range.

    Notes
    -----
    Mean and sd are always those of the variable itself: for a truncated normal, after the cut.

    Examples
    --------
    >>> make_marginal("lognormal", mean=35.0, V=0.5).describe()
    'lognormal, mean 35, V 0.5'
    >>> round(float(make_marginal("gumbel", mean=100.0, sd=20.0).ppf(0.98)), 4)
    151.8455
    """
    family = _family_of(distribution)
    if family.bounds == "as parameters" and (lower is not None or upper is not None):
        parameters = _bounds_as_parameters(distribution, parameters, lower, upper)
        lower = upper = None
    _require_one_way(distribution, mean, V, sd, quantiles, parameters)
    low, high = _checked_bounds(distribution, family, lower, upper)
    if parameters is not None:
        return _from_parameters(distribution, family, parameters, low, high)
    if quantiles is not None:
        if family.from_quantiles is None:
            raise ValueError(f"{distribution} from quantiles: allowed are mean or parameters")
        return family.from_quantiles(_checked_quantiles(distribution, quantiles), low, high)
    assert mean is not None  # for the type checker: _require_one_way has seen to it
    spread = _checked_sd(distribution, mean, V, sd)
    return family.from_moments(float(mean), spread, low, high)


def _family_of(distribution: str) -> _Family:
    if distribution in _FAMILIES:
        return _FAMILIES[distribution]
    near = difflib.get_close_matches(distribution, DISTRIBUTIONS, n=1)
    hint = f" (did you mean {near[0]!r}?)" if near else ""
    raise ValueError(
        f"distribution: given {distribution!r}, allowed {', '.join(DISTRIBUTIONS)}{hint}"
    )


def _require_one_way(
    distribution: str,
    mean: float | None,
    V: float | None,
    sd: float | None,
    quantiles: Mapping[float, float] | None,
    parameters: Mapping[str, float] | None,
) -> None:
    moments = {"mean": mean, "V": V, "sd": sd}
    given_moments = [name for name, value in moments.items() if value is not None]
    ways = [" and ".join(given_moments)] if given_moments else []
    ways += ["quantiles"] if quantiles is not None else []
    ways += ["parameters"] if parameters is not None else []
    complete = [["mean", "V"], ["mean", "sd"]]
    if distribution == "constant":
        complete.append(["mean"])
    if len(ways) != 1 or (given_moments and given_moments not in complete):
        given = "; ".join(ways) if ways else "nothing"
        raise ValueError(
            f"{distribution}: given {given}, allowed exactly one of mean with V, mean with sd, "
            "quantiles, parameters"
        )


def _bounds_as_parameters(
    distribution: str,
    parameters: Mapping[str, float] | None,
    lower: float | None,
    upper: float | None,
) -> Mapping[str, float]:
    if parameters is not None or lower is None or upper is None:
        raise ValueError(
            f"bounds of a {distribution}: given lower {lower} and upper {upper}, allowed both, "
            "and then no parameters"
        )
    return {"lower": lower, "upper": upper}


def _checked_bounds(
    distribution: str, family: _Family, lower: float | None, upper: float | None
) -> tuple[float, float]:
    n_given = (lower is not None) + (upper is not None)
    allowed = {"none": (0,), "as parameters": (0,), "one or two": (1, 2), "two": (2,)}
    if n_given not in allowed[family.bounds]:
        words = {"none": "none", "as parameters": "none", "two": "both"}.get(
            family.bounds, "lower, upper or both"
        )
        raise ValueError(
            f"bounds of a {distribution}: given lower {lower} and upper {upper}, allowed {words}"
        )
    low = -math.inf if lower is None else float(lower)
    high = math.inf if upper is None else float(upper)
    if n_given:
        above = f"a number above the lower bound {low:g}"
        require(low < high, f"upper bound of a {distribution}", high, above)
    return low, high


def _from_parameters(
    distribution: str, family: _Family, parameters: Mapping[str, float], low: float, high: float
) -> Marginal:
    if set(parameters) != set(family.names):
        raise ValueError(
            f"parameters of a {distribution}: given {', '.join(parameters) or 'none'}, "
            f"allowed {', '.join(family.names)}"
        )
    numbers = {name: float(value) for name, value in parameters.items()}
    if family.bounds in ("one or two", "two"):
        return family.build(**numbers, lower=low, upper=high)
    return family.build(**numbers)


def _checked_quantiles(distribution: str, quantiles: Mapping[float, float]) -> fitting.Quantiles:
    if len(quantiles) != 2:
        raise ValueError(f"quantiles of a {distribution}: given {len(quantiles)}, allowed two")
    (first, low), (second, high) = sorted((float(p), float(x)) for p, x in quantiles.items())
    for probability in (first, second):
        inside = 0.0 < probability < 1.0
        require(inside, "probability of a quantile", probability, "between 0 and 1")
    above = f"a number above {low:g}, the value at probability {first:g}"
    require(low < high < math.inf, f"value at probability {second:g}", high, above)
    return (first, low), (second, high)


def _checked_sd(distribution: str, mean: float, V: float | None, sd: float | None) -> float:
    require(math.isfinite(mean), f"mean of a {distribution}", mean, "a finite number")
    if distribution == "constant" and not V and not sd:
        return 0.0
    if sd is not None:
        above_zero = 0.0 < sd < math.inf
        require(above_zero, f"standard deviation of a {distribution}", sd, "a positive number")
        return float(sd)
    assert V is not None  # for the type checker: _require_one_way has seen to it
    hint = f" (in percent? write {V / 100.0:g})" if LARGEST_V < V <= PERCENT_V else ""
    what = f"coefficient of variation of a {distribution}"
    require(0.0 < V <= LARGEST_V, what, V, "in (0, 2]", hint)
    require(mean != 0.0, "mean that goes with V", mean, "a number other than 0 (or give sd)")
    return float(V) * abs(float(mean))
