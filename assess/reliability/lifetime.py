"""Failure probabilities over years from a weighted sample, with both of their errors."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from assess.reliability.importance import (
    Problem,
    Proposal,
    Sample,
    allocate,
    draw_sample,
    find_modes,
)
from assess.reliability.index import index_error, index_from_probability

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

REPLICATES = 8
CLEAR = 4.0
FIRST_POINTS = 1.25  # per draw, replicate and centre, on average, in the first pass
MOST_ELEMENTS = 16_000_000  # hazards held at a time: replicates, centres, points, years


@dataclass(frozen=True, slots=True, eq=False)
class Probabilities:
    """Failure probability of several windows of years, each array (n_window,) unless said.

    Attributes
    ----------
    probability : ndarray
        All uncertainty integrated; given what has happened, where the problem says so.
    integration_error, mcmc_error : ndarray
        Standard errors of the *index*.
    conditional : ndarray, shape (n_draw, n_window)
        Probability given the draw.
    draw_weight : ndarray, shape (n_draw,)
        Weight of each draw given what has happened, mean 1.
    """

    probability: FloatArray
    integration_error: FloatArray
    mcmc_error: FloatArray
    conditional: FloatArray
    draw_weight: FloatArray

    @property
    def index(self) -> FloatArray:
        """Reliability index of each window."""
        return np.asarray(index_from_probability(np.minimum(self.probability, 1.0)))

    def index_quantile(self, share: float) -> FloatArray:
        """Quantile over the draws of the index given the draw, shape (n_window,)."""
        # Weights average to 1 only in the mean, so a near certain failure may come out above 1.
        bounded = np.minimum(self.conditional, 1.0)
        alike = np.ptp(self.draw_weight) == 0.0  # then selecting does, without sorting
        quantile = np.quantile(
            bounded,
            1.0 - share,
            axis=0,
            method="inverted_cdf",
            weights=None if alike else self.draw_weight,
        )
        return np.asarray(index_from_probability(quantile))


@dataclass(frozen=True, slots=True, eq=False)
class Integral:
    """What integrating one section gave."""

    sample: Sample
    annual: Probabilities  # of each year
    proposal: Proposal  # that the sample was drawn from
    evaluations: int  # of the capacity, mode search and earlier passes included


def windows(years: int, period: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """First and last year (indices) of all windows of a length, by the last year."""
    last = np.arange(period - 1, years)
    return last - period + 1, last


def probabilities(
    sample: Sample, first: NDArray[np.int64], last: NDArray[np.int64], chains: int
) -> Probabilities:
    """Integrate the windows ``first..last`` (year indices, both included).

    Parameters
    ----------
    sample : Sample
        From `assess.reliability.importance.draw_sample`.
    first, last : ndarray, shape (n_window,)
        Year indices.
    chains : int
        Chains that the draws are made of, one after the other.

    Returns
    -------
    Probabilities
        With errors of the index by the delta method.

    Notes
    -----
    With S the probability of what has happened, and W the weight of a draw,
    P = E[W S (1 - exp(-sum Lambda))] / E[W S], both on the same points. The integration error
    comes from the scatter between independently scrambled replicates, the error of finite chains
    from non-overlapping batch means of the ratio's linear form in the draws [1]_, less the
    integration noise that they contain.

    References
    ----------
    .. [1] J. M. Flegal, G. L. Jones, Batch means and spectral variance estimators in Markov
       chain Monte Carlo, Ann. Statist. 38 (2010) 1034-1070, doi:10.1214/09-AOS735.
    """
    replicates = len(sample.weight)
    failed = np.empty((replicates, sample.draws, len(first)))
    survived = np.ones((replicates, sample.draws))
    annual = bool(np.array_equal(first, last))
    past = bool(np.any(sample.survival != 1.0))
    for replicate in range(replicates):
        hazard = sample.hazard[replicate]
        if annual:
            within = hazard[..., last]
        else:
            start = np.zeros((*hazard.shape[:-1], 1))
            total = np.concatenate([start, np.cumsum(hazard, axis=-1)], axis=-1)
            within = total[..., last + 1] - total[..., first]
        weight = sample.weight[replicate] * sample.survival[replicate]
        failed[replicate] = sample.draws * sample.per_draw(-np.expm1(-within) * weight[..., None])
        if past:
            survived[replicate] = sample.draws * sample.per_draw(weight)
    outer = sample.draw_weight
    means = np.einsum("d,rdw->rw", outer, failed) / (survived @ outer)[:, None]
    top, bottom = failed.mean(axis=0), survived.mean(axis=0)
    scale = float(bottom @ outer) / sample.draws
    probability = np.asarray((outer @ top) / sample.draws / scale)
    integration = means.std(axis=0, ddof=1) / np.sqrt(replicates)
    linear = outer[:, None] * (top - probability * bottom[:, None]) / scale
    total_error = batch_means_error(linear, chains)
    mcmc = np.sqrt(np.maximum(total_error**2 - integration**2, 0.0))
    index = index_from_probability(np.minimum(probability, 1.0))
    return Probabilities(
        probability,
        np.asarray(index_error(index, integration)),
        np.asarray(index_error(index, mcmc)),
        top / np.maximum(bottom, 1e-300)[:, None],
        outer * bottom / scale,
    )


def batch_means_error(series: FloatArray, chains: int) -> FloatArray:
    """Estimate the standard error of the mean of chains, by batch means within each chain.

    Parameters
    ----------
    series : ndarray, shape (n_chain * n_draw, n)
        Chains one after the other.
    chains : int
        Number of chains.

    Returns
    -------
    ndarray, shape (n,)
        Standard error of the mean over all draws.
    """
    per_chain = len(series) // chains
    size = max(1, int(np.sqrt(per_chain)))
    batches = per_chain // size
    shaped = series[: per_chain * chains].reshape(chains, per_chain, -1)[:, : batches * size]
    means = shaped.reshape(chains * batches, size, -1).mean(axis=1)
    return np.asarray(means.std(axis=0, ddof=1) / np.sqrt(chains * batches))


def integrate(
    problem: Problem, *, chains: int, tolerance: float, seed: int, proposal: Proposal | None = None
) -> Integral:
    """Sample until the annual index of every year is integrated to the tolerance.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    chains : int
        Chains that the draws are made of.
    tolerance : float
        Largest standard error of the index from integration.
    seed : int
        Of the Sobol scrambling.
    proposal : Proposal, optional
        Where to sample first, from the integral of a problem that differs in an option only:
        both then see the same points. Left out, the modes are searched.

    Returns
    -------
    Integral
        When `MOST_ELEMENTS` do not suffice for the tolerance the result carries the larger
        error; the caller says so.

    Notes
    -----
    Each pass shares twice as many points out among the draws as the pass before, by what that
    one found each draw to contribute; it takes points of its own, so that where they lie does
    not depend on what they find. A pass whose replicates agree by chance must not end the search:
    the error of the pass before, over the root of two, counts where it is larger, unless this
    pass is better than asked by a factor (`CLEAR`) that chance does not give.
    """
    spent = 0
    before = np.zeros(problem.years)
    if proposal is None:
        proposal, spent = first_proposal(problem, seed)
    first, last = windows(problem.years, 1)
    while True:
        sample = draw_sample(problem, proposal, REPLICATES)
        spent += sample.evaluations
        annual = probabilities(sample, first, last, chains)
        own = annual.integration_error
        stated = np.where(own < tolerance / CLEAR, own, np.maximum(own, before / np.sqrt(2.0)))
        annual, before = replace(annual, integration_error=stated), own
        # Where failure is more likely than not, the third digit of a negative index decides
        # nothing; its error is reported all the same.
        open_question = annual.index > 0.0
        worst = np.max(annual.integration_error[open_question], initial=0.0)
        points = 2 * len(sample.owner)
        elements = REPLICATES * len(proposal.centres) * points * problem.years
        if worst <= tolerance or elements > MOST_ELEMENTS:
            return Integral(sample, annual, proposal, spent)
        proposal = Proposal(
            proposal.centres,
            allocate(annual.conditional * annual.draw_weight[:, None], points),
            proposal.seed + 1,
        )


def first_proposal(problem: Problem, seed: int) -> tuple[Proposal, int]:
    """Centre on the modes of the first and last year; give each draw points by their heights.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    seed : int
        Of the points.

    Returns
    -------
    tuple
        The proposal and the evaluations spent on the search.
    """
    # The standard normal density itself bounds the weights wherever the modes do not reach.
    centres, heights, spent = [np.zeros((problem.draws, problem.dimension))], [], 0
    for year in sorted({0, problem.years - 1}):
        found = find_modes(problem, year, centres[1:])
        centres += found.centres
        heights.append(np.exp(found.heights - found.heights.max()))
        spent += found.evaluations
    points = allocate(np.stack(heights, axis=1), int(FIRST_POINTS * problem.draws))
    state: int = np.random.SeedSequence(seed).generate_state(1).item()
    return Proposal(tuple(centres), points, state), spent
