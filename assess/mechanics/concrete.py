"""Strength of concrete: prior by grade, updating by tests, prediction, value in the structure."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

FloatArray = NDArray[np.float64]

IN_SITU_EXPONENT = 0.96  # [-] lambda, JCSS PMC 3.1
SUSTAINED_LOAD_FACTOR = 0.8  # [-] alpha_1 for a long time under load, JCSS PMC 3.1
CURING_VARIATION = 0.06  # [-] coefficient of variation of Y_1, mean 1, lognormal, JCSS PMC 3.1


@dataclass(frozen=True, slots=True)
class StrengthPrior:
    r"""Normal-gamma knowledge of the logarithm of a strength in MPa.

    ``log_mean`` m is worth ``tests`` n tests, ``log_sd`` s has ``degrees`` :math:`\nu` degrees of
    freedom:

    .. math:: f(\mu, \sigma) \propto \sigma^{-(\nu + \delta(n) + 1)} \exp\left\{-\frac{1}{2
       \sigma^2} \left[\nu s^2 + n (\mu - m)^2\right]\right\}

    with :math:`\delta(0) = 0`, else 1 (JCSS Probabilistic Model Code, part 3.0, annex A). Hence
    :math:`\mu | \sigma` is normal with mean m and standard deviation :math:`\sigma/\sqrt n`, and
    the precision :math:`\sigma^{-2}` gamma with `precision_shape` and `precision_rate`.
    """

    log_mean: float
    tests: float
    log_sd: float
    degrees: float

    @property
    def precision_shape(self) -> float:
        r"""Shape of the gamma distribution of :math:`\sigma^{-2}`, :math:`\nu/2`."""
        return 0.5 * self.degrees

    @property
    def precision_rate(self) -> float:
        r"""Rate of the gamma distribution of :math:`\sigma^{-2}`, :math:`\nu s^2/2`."""
        return 0.5 * self.degrees * self.log_sd**2


# production -> grade -> (m', n', s', nu'); the stored text heads the columns with two primes.
_TABLE: Mapping[str, Mapping[str, StrengthPrior]] = MappingProxyType(
    {
        "ready-mixed": MappingProxyType(
            {
                "C15": StrengthPrior(3.40, 3.0, 0.14, 10.0),
                "C25": StrengthPrior(3.65, 3.0, 0.12, 10.0),
                "C35": StrengthPrior(3.85, 3.0, 0.09, 10.0),
                "C45": StrengthPrior(3.98, 3.0, 0.07, 10.0),
            }
        ),
        "precast": MappingProxyType(
            {
                "C25": StrengthPrior(3.80, 3.0, 0.09, 10.0),
                "C35": StrengthPrior(3.95, 3.0, 0.08, 10.0),
                "C45": StrengthPrior(4.08, 4.0, 0.07, 10.0),
                "C55": StrengthPrior(4.15, 4.0, 0.05, 10.0),
            }
        ),
    }
)
GRADES: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {production: tuple(grades) for production, grades in _TABLE.items()}
)
PRIOR_SOURCE = (
    "JCSS Probabilistic Model Code, part 3.1, table of prior parameters for the concrete strength"
)


def strength_prior(grade: str, production: str = "ready-mixed") -> StrengthPrior:
    """Prior for the 28-day cylinder strength of standard specimens of a grade.

    Parameters
    ----------
    grade : str
        Strength class as the JCSS names it, e.g. ``"C25"``.
    production : {"ready-mixed", "precast"}, default "ready-mixed"
        How the concrete was made.

    Returns
    -------
    StrengthPrior
        Of the logarithm of the strength in MPa. The strength in the structure is lower, see
        `in_situ_strength`.

    Raises
    ------
    ValueError
        If the table has no such production or grade; the message lists those it has.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.1, prior parameters for the concrete strength
       distribution; read in the code's text repository (JCSS-PMC/PMC on GitHub,
       part-03/concrete-properties.md).

    Examples
    --------
    >>> strength_prior("C35")
    StrengthPrior(log_mean=3.85, tests=3.0, log_sd=0.09, degrees=10.0)
    """
    grades = _TABLE.get(production)
    if grades is None:
        known = ", ".join(_TABLE)
        raise ValueError(f"no strength priors for production {production!r}; known: {known}")
    prior = grades.get(grade)
    if prior is None:
        known = ", ".join(grades)
        raise ValueError(f"no strength prior for grade {grade!r}, {production}; known: {known}")
    return prior


def update(prior: StrengthPrior, values: ArrayLike) -> StrengthPrior:
    r"""Combine a prior with independent test results, in closed form.

    Parameters
    ----------
    prior : StrengthPrior
        Knowledge before the tests.
    values : array_like
        Strengths of independent tests, shape (n,), at least one. [MPa]

    Returns
    -------
    StrengthPrior
        Knowledge after the tests.

    Raises
    ------
    ValueError
        If there are no values, or one is not positive and finite.

    Notes
    -----
    With mean m, standard deviation s and :math:`\nu = n - 1` of the logarithms,

    .. math:: n'' = n' + n, \quad \nu'' = \nu' + \nu + \delta(n'), \quad
       m'' = (n' m' + n m)/n''

    .. math:: \nu'' s''^2 = \nu' s'^2 + \nu s^2 + \frac{n' n}{n''} (m - m')^2

    The last line is the annex's :math:`\nu'' s''^2 + n'' m''^2 = [\nu' s'^2 + n' m'^2] + [\nu s^2
    + n m^2]` without its cancellation. :math:`\delta(n')` is 1, or 0 for :math:`n' = 0`.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.0, annex A.

    Examples
    --------
    >>> after = update(strength_prior("C35"), [28.0, 33.0, 35.0, 31.0, 38.0, 29.5])
    >>> round(after.log_mean, 4), after.tests, round(after.log_sd, 4), after.degrees
    (3.5989, 9.0, 0.1636, 16.0)
    """
    strengths = np.asarray(values, dtype=np.float64).ravel()
    if strengths.size == 0:
        raise ValueError("no test values given to update a strength prior; give at least one")
    if not np.all(np.isfinite(strengths) & (strengths > 0)):
        worst = strengths[~(np.isfinite(strengths) & (strengths > 0))][0]
        raise ValueError(f"test strengths must be positive and finite [MPa], got {worst:g}")
    logs = np.log(strengths)
    count = logs.size
    mean = float(logs.mean())
    squares = float(((logs - mean) ** 2).sum())
    tests = prior.tests + count
    degrees = prior.degrees + (count - 1) + (1 if prior.tests > 0 else 0)
    shift = prior.tests * count / tests * (mean - prior.log_mean) ** 2
    total = prior.degrees * prior.log_sd**2 + squares + shift
    return StrengthPrior(
        log_mean=(prior.tests * prior.log_mean + count * mean) / tests,
        tests=tests,
        log_sd=float(np.sqrt(total / degrees)) if degrees > 0 else 0.0,
        degrees=degrees,
    )


def predictive_quantile(prior: StrengthPrior, probability: ArrayLike) -> FloatArray:
    r"""Strength that one further value stays below with a given probability.

    Parameters
    ----------
    prior : StrengthPrior
        Knowledge, before or after tests; ``tests`` and ``degrees`` above 0.
    probability : array_like
        Probability, in (0, 1). [-]

    Returns
    -------
    ndarray
        :math:`\exp(m + t_{p,\nu} \, s \sqrt{1 + 1/n})`, t being Student's. [MPa]

    Raises
    ------
    ValueError
        If the knowledge is too vague to predict from, or a probability is outside (0, 1).

    Notes
    -----
    The code also offers a lognormal approximation with :math:`s \sqrt{n/(n-1) \cdot \nu/(\nu-2)}`;
    its standard deviation is 6 % larger than the exact one for n = 3, and it is not used.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.0, annex A, and part 3.1.

    Examples
    --------
    >>> round(float(predictive_quantile(strength_prior("C35"), 0.05)), 2)
    38.93
    """
    if prior.tests <= 0 or prior.degrees <= 0:
        raise ValueError(
            "a prediction needs tests > 0 and degrees > 0, got "
            f"tests={prior.tests:g}, degrees={prior.degrees:g}"
        )
    level = np.asarray(probability, dtype=np.float64)
    if np.any((level <= 0) | (level >= 1)):
        raise ValueError(f"probability must be in (0, 1), got {np.min(level):g}")
    student = special.stdtrit(prior.degrees, level)
    spread = prior.log_sd * np.sqrt(1.0 + 1.0 / prior.tests)
    return np.asarray(np.exp(prior.log_mean + student * spread))


def age_factor(age_days: ArrayLike) -> FloatArray:
    r"""Strength gain with age.

    Parameters
    ----------
    age_days : array_like
        Age of the concrete, 1 day or more. [d]

    Returns
    -------
    ndarray
        :math:`\alpha_2 = 0.6 + 0.12 \ln t`, 1 at 28 days. [-]

    Raises
    ------
    ValueError
        If an age is below one day.

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.1, normal cement and climate.

    Examples
    --------
    >>> round(float(age_factor(28.0)), 4)
    0.9999
    """
    age = np.asarray(age_days, dtype=np.float64)
    if np.any(age < 1):
        raise ValueError(f"age must be 1 day or more, got {np.min(age):g}")
    return np.asarray(0.6 + 0.12 * np.log(age))


def in_situ_strength(standard_strength: ArrayLike, factor: ArrayLike = 1.0) -> FloatArray:
    r"""Strength in the structure from that of standard specimens.

    Parameters
    ----------
    standard_strength : array_like
        28-day cylinder strength, :math:`f_{co}`. [MPa]
    factor : array_like, default 1.0
        :math:`\alpha = \alpha_1 \alpha_2` times the curing variable :math:`Y_1`, as far as they
        are wanted: `SUSTAINED_LOAD_FACTOR`, `age_factor`, `CURING_VARIATION`. [-]

    Returns
    -------
    ndarray
        :math:`f_c = \alpha f_{co}^{0.96} Y_1`. [MPa]

    References
    ----------
    .. [1] JCSS Probabilistic Model Code, part 3.1.

    Examples
    --------
    >>> round(float(in_situ_strength(30.0)), 3)
    26.184
    """
    strength = np.asarray(standard_strength, dtype=np.float64)
    return np.asarray(np.asarray(factor) * strength**IN_SITU_EXPONENT)
