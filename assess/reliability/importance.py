"""The lifetime integral by importance sampling per draw.

For draw d and standard normal local variables z let Lambda_y = -ln F_Q(q(d, z, y)), q being the
load capacity in year y and F_Q the distribution of the year's largest load effect. Years being
independent given (d, z), the probability of failing within a set of years is

    P = E_d E_z [1 - exp(-sum_y Lambda_y)].

The load is thus integrated out in closed form; what remains is smooth in z and is sampled around
the modes of the integrand, which are found for all draws at once.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy import special
from scipy.stats import qmc

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# (z of shape (n, k, dimension), the n draws, the years) -> ln Lambda, shape (n, k, n_year)
LogHazard = Callable[[FloatArray, IntArray, IntArray], FloatArray]

STEP = 1e-3  # of the finite differences, in standard normal units
SCOUTS = 32  # points from which the search of each mode may start
ITERATIONS = 4
ELEMENTS = 400_000  # capacity evaluations held in memory at a time


@dataclass(frozen=True, slots=True)
class Problem:
    """One section under one option at one stage, as the integral sees it."""

    log_hazard: LogHazard
    dimension: int
    draws: int
    years: int
    load_ratio: FloatArray = field(default_factory=lambda: np.zeros(0))  # mode over scale, a year


@dataclass(frozen=True, slots=True, eq=False)
class Sample:
    """Weighted sample of the joint space of draws and local variables.

    Attributes
    ----------
    z : ndarray, shape (n_replicate, n_draw, n_point, dimension)
    weight : ndarray, shape (n_replicate, n_draw, n_point)
        Density ratio, mean 1 in expectation.
    hazard : ndarray, shape (n_replicate, n_draw, n_point, n_year)
        Lambda of each year.
    evaluations : int
        Capacity evaluations spent, those of the mode search included.
    """

    z: FloatArray
    weight: FloatArray
    hazard: FloatArray
    evaluations: int


def log_failure(log_hazard: FloatArray) -> FloatArray:
    """Log-probability of failing in a year, ln(1 - exp(-Lambda)), without cancellation."""
    hazard = np.exp(np.minimum(log_hazard, 50.0))
    small = log_hazard < -20.0
    return np.where(small, log_hazard, np.log(-np.expm1(-np.where(small, 1.0, hazard))))


def find_modes(problem: Problem, year: int) -> tuple[FloatArray, int]:
    """Find for each draw where failing in a year is most likely to come from.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    year : int
        Index of the year.

    Returns
    -------
    tuple
        Approximate maxima of ln P(fail in the year | draw, z) - |z|^2/2, shape (n_draw,
        dimension), and the evaluations spent. They centre a proposal density, so they need not
        be exact; a poor one costs accuracy, which the error estimate shows, never bias.

    Notes
    -----
    Scouts, scrambled Sobol points of 1.5 times the standard scatter, start the search off a
    plateau (a bar that has not begun to corrode has no gradient in its onset). A few steps
    z -> z + t (gradient - z) follow, with t the best of three; for a log-probability linear in
    z the step t = 1 is exact. Forward differences give the gradient.

    References
    ----------
    .. [1] R. E. Melchers, A. T. Beck, Structural Reliability Analysis and Prediction, 3rd ed.,
       2018, section 3.4 (importance sampling centred at the maximum of the integrand).
    """
    years = np.array([year])
    draws = np.arange(problem.draws)
    spent = 0

    def objective(z: FloatArray, chosen: IntArray) -> FloatArray:
        nonlocal spent
        spent += z.shape[0] * z.shape[1]
        value = log_failure(problem.log_hazard(z, chosen, years)[..., 0])
        return np.asarray(value - 0.5 * np.einsum("...i,...i->...", z, z))

    scouts = np.concatenate(
        [
            np.zeros((1, problem.dimension)),
            1.5 * normal_points(problem.dimension, SCOUTS - 1, seed=7)[0],
        ]
    )
    mode = np.empty((problem.draws, problem.dimension))
    for part in np.array_split(draws, max(1, problem.draws * SCOUTS // ELEMENTS)):
        cloud = np.broadcast_to(scouts, (len(part), *scouts.shape))
        mode[part] = scouts[objective(cloud, part).argmax(axis=1)]
    offsets = np.concatenate([np.zeros((1, problem.dimension)), STEP * np.eye(problem.dimension)])
    steps = np.array([0.0, 0.3, 1.0])
    for part in np.array_split(draws, max(1, problem.draws * len(offsets) // ELEMENTS)):
        for _ in range(ITERATIONS):
            around = objective(mode[part, None, :] + offsets, part)
            slope = (around[:, 1:] - around[:, :1]) / STEP
            # Steps longer than 4 leave the region where the slope means anything.
            length = np.linalg.norm(slope, axis=1, keepdims=True)
            slope *= np.minimum(1.0, 4.0 / np.maximum(length, 1e-12))
            tried = mode[part, None, :] + steps[:, None] * slope[:, None, :]
            best = objective(tried, part).argmax(axis=1)
            mode[part] = tried[np.arange(len(part)), best]
    return mode, spent


def draw_sample(
    problem: Problem, centres: Sequence[FloatArray], points: int, replicates: int, seed: int
) -> Sample:
    """Sample local variables around the centres of each draw, with their weights and hazards.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    centres : sequence of ndarray, each (n_draw, dimension)
        Centres of the proposal, a mixture of unit normals with equal shares.
    points : int
        Points per draw, replicate and centre.
    replicates : int
        Independently scrambled repetitions, for the integration error.
    seed : int
        Of the scrambling; equal seeds give equal points (common random numbers).

    Returns
    -------
    Sample
        With ``points * len(centres)`` points per draw and replicate.

    Notes
    -----
    Each replicate runs one scrambled Sobol sequence through all draws, so that points differ
    from draw to draw and are evenly spread over the draws together [1]_. The weight is the
    standard normal density over that of the whole mixture (balance heuristic [2]_), bounded
    wherever any centre covers.

    References
    ----------
    .. [1] A. B. Owen, Scrambling Sobol' and Niederreiter-Xing points, J. Complexity 14 (1998)
       466-489, doi:10.1006/jcom.1998.0487.
    .. [2] E. Veach, L. J. Guibas, Optimally combining sampling techniques for Monte Carlo
       rendering, SIGGRAPH 1995, 419-428, doi:10.1145/218380.218498.
    """
    count = len(centres)
    shape = (replicates, problem.draws, points * count)
    # One sequence for each centre: dealt out by turns, a single one would alias with its bits.
    z = normal_points(problem.dimension, problem.draws * points, seed, replicates * count)
    z = z.reshape(replicates, count, problem.draws, points, problem.dimension)
    z = np.moveaxis(z, 1, 3).reshape(*shape, problem.dimension)
    for number, centre in enumerate(centres):
        z[:, :, number::count] += centre[None, :, None, :]
    log_mixture = np.full(shape, -np.inf)
    for centre in centres:
        away = z - centre[None, :, None, :]
        np.logaddexp(log_mixture, -0.5 * np.einsum("...i,...i->...", away, away), out=log_mixture)
    weight = count * np.exp(-0.5 * np.einsum("...i,...i->...", z, z) - log_mixture)
    hazard = np.empty((*shape, problem.years))
    years = np.arange(problem.years)
    per_draw = points * count * problem.years
    for part in np.array_split(
        np.arange(problem.draws), max(1, problem.draws * per_draw // ELEMENTS)
    ):
        for replicate in range(replicates):
            # Beyond e^50 failure is certain; the bound keeps sums over years finite.
            hazard[replicate, part] = np.exp(
                np.minimum(problem.log_hazard(z[replicate, part], part, years), 50.0)
            )
    return Sample(z, weight, hazard, int(np.prod(shape)) * problem.years)


@lru_cache(maxsize=16)
def _uniform_points(dimension: int, count: int, seed: int, replicates: int) -> FloatArray:
    """Scrambled Sobol points, (replicates, count, dimension)."""
    size = 1 << max(0, int(np.ceil(np.log2(count))))
    seeds = np.random.SeedSequence(seed).spawn(replicates)
    return np.stack(
        [
            qmc.Sobol(dimension, scramble=True, rng=np.random.default_rng(s)).random(size)[:count]
            for s in seeds
        ]
    )


def normal_points(dimension: int, count: int, seed: int, replicates: int = 1) -> FloatArray:
    """Scrambled Sobol points mapped to standard normals, (replicates, count, dimension)."""
    uniform = _uniform_points(dimension, count, seed, replicates)
    # Scrambled points may touch 0; half a grain of the sequence keeps them off it.
    return np.asarray(special.ndtri(np.clip(uniform, 1e-12, 1.0 - 1e-12)))
