"""Repeated readings of normal local values: the population's log-likelihood in closed form."""

from typing import Any

from assess import operations as op

Numeric = Any  # float, ndarray or PyTensor variable


def nested_log_likelihood(
    precision_sum: Numeric,
    weighted_sum: Numeric,
    weighted_square_sum: Numeric,
    population_variance: Numeric,
) -> Numeric:
    r"""Log-likelihood of readings of one location, its local value integrated out.

    Parameters
    ----------
    precision_sum : numeric
        :math:`P = \sum p_i` over the location's readings, :math:`p_i` being one over the
        variance of reading error; 0 where nothing was read.
    weighted_sum, weighted_square_sum : numeric
        :math:`\sum p_i r_i` and :math:`\sum p_i r_i^2` with :math:`r_i` the reading less its
        known bias and less the population mean.
    population_variance : numeric
        :math:`\sigma^2` of the local values.

    Returns
    -------
    numeric
        Log-density up to terms of the :math:`p_i` alone; broadcasts.

    Notes
    -----
    Readings :math:`y_i = \mu + u + e_i` with :math:`u \sim N(0, \sigma^2)`,
    :math:`e_i \sim N(0, 1/p_i)`. With the matrix determinant lemma and the Sherman-Morrison
    formula the covariance :math:`\mathrm{diag}(1/p) + \sigma^2 1 1^T` gives

    .. math:: -\tfrac12 \left[ \ln(1 + P\sigma^2) + \sum p_i r_i^2
              - \frac{\sigma^2 (\sum p_i r_i)^2}{1 + P \sigma^2} \right].

    References
    ----------
    .. [1] G. H. Golub, C. F. Van Loan, Matrix Computations, 4th ed., 2013, section 2.1.4.
    """
    inflation = 1.0 + precision_sum * population_variance
    return -0.5 * (
        op.log(inflation)
        + weighted_square_sum
        - population_variance * weighted_sum * weighted_sum / inflation
    )


def local_posterior(
    precision_sum: Numeric,
    weighted_sum: Numeric,
    population_mean: Numeric,
    population_variance: Numeric,
) -> tuple[Numeric, Numeric]:
    r"""Mean and standard deviation of a local value given its readings and the population.

    Parameters
    ----------
    precision_sum, weighted_sum, population_variance : numeric
        As in `nested_log_likelihood`.
    population_mean : numeric
        :math:`\mu`.

    Returns
    -------
    tuple of numeric
        Mean and standard deviation of the normal posterior of the local value.

    References
    ----------
    .. [1] A. Gelman et al., Bayesian Data Analysis, 3rd ed., 2013, section 2.5.
    """
    inflation = 1.0 + precision_sum * population_variance
    mean = population_mean + population_variance * weighted_sum / inflation
    return mean, op.sqrt(population_variance / inflation)
