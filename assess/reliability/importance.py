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
from scipy.spatial import cKDTree
from scipy.stats import qmc

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# (z of shape (n, k, dimension), the n draws, the years) -> ln Lambda, shape (n, k, n_year)
LogHazard = Callable[[FloatArray, IntArray, IntArray], FloatArray]
Hazard = Callable[[FloatArray, IntArray], FloatArray]  # the same for one year, (n, k)

STEP = 1e-3  # of the finite differences, in standard normal units
AXIS_SCOUT = 2.5  # distance of the scouts on the axes, in standard normal units
CLOUD_SCOUT = 1.5  # scatter of the other scouts
CLOUD = 16  # number of those
ITERATIONS = 8
PILOTS = 1000  # draws whose mode is searched from scratch
WORTHWHILE = 0.02  # gain in the logarithm of the integrand for which a climb goes on
SHARES = np.array([0.0, 0.05, 0.2, 0.5, 1.0])  # of the way to the linear form's maximum
BISECTIONS = 30
APART = 1.5  # distance from which modes, and scouts of a second one, count as two
SECOND_SHARE = 0.005  # of the failure probability, for which second modes are sampled too
LOOKOUTS = 32  # draws that climb from every scout, to see how many modes there are
MOST_MODES = 6
ELEMENTS = 400_000  # capacity evaluations held in memory at a time


@dataclass(frozen=True, slots=True)
class Problem:
    """One section under one option at one stage, as the integral sees it."""

    log_hazard: LogHazard
    dimension: int
    draws: int
    years: int
    # Location over scale of the load, (n_year,) or (n_draw, n_year)
    load_ratio: FloatArray = field(default_factory=lambda: np.zeros(0))
    features: FloatArray | None = None  # (n_draw, k) what makes draws alike, scaled alike
    # (z (n, k, dimension), the n draws) -> ln P(what happened | draw, z), (n, k); None: nothing
    log_survival: Callable[[FloatArray, IntArray], FloatArray] | None = None
    draw_weight: FloatArray | None = None  # (n_draw,) of draws that are not alike; None: alike
    load_shape: FloatArray | float = 0.0  # (n_draw,), or one for all

    @property
    def weights(self) -> FloatArray:
        """Weight of each draw, mean 1."""
        if self.draw_weight is None:
            return np.ones(self.draws)
        return self.draw_weight * (self.draws / self.draw_weight.sum())


@dataclass(frozen=True, slots=True, eq=False)
class Proposal:
    """Where to sample: centres for each draw, and how many points each draw gets.

    Attributes
    ----------
    centres : tuple of ndarray, each (n_draw, dimension)
        Centres of a mixture of unit normals with equal shares.
    points : ndarray of int, shape (n_draw,)
        Points per draw, replicate and centre, at least 1.
    seed : int
        Of the scrambled points; equal proposals give equal points (common random numbers).
    """

    centres: tuple[FloatArray, ...]
    points: IntArray
    seed: int


@dataclass(frozen=True, slots=True, eq=False)
class Sample:
    """Weighted sample of the joint space of draws and local variables.

    Points of one draw follow one another: ``owner`` is ascending.

    Attributes
    ----------
    owner : ndarray of int, shape (n_point,)
        Draw that a point belongs to, the same in every replicate and centre.
    z : ndarray, shape (n_replicate, n_centre, n_point, dimension)
    weight : ndarray, shape (n_replicate, n_centre, n_point)
        Adds up to 1 in each replicate in expectation, and to 1/n_draw over each draw.
    hazard : ndarray, shape (n_replicate, n_centre, n_point, n_year)
        Lambda of each year.
    survival : ndarray, shape (n_replicate, n_centre, n_point)
        Probability of what has happened to the section so far; 1 where nothing counts.
    draw_weight : ndarray, shape (n_draw,)
        Weight of each draw before the section's own past, mean 1.
    draws : int
        Number of draws.
    evaluations : int
        Capacity evaluations spent on it.
    """

    owner: IntArray
    z: FloatArray
    weight: FloatArray
    hazard: FloatArray
    survival: FloatArray
    draw_weight: FloatArray
    draws: int
    evaluations: int

    def given_past(self) -> FloatArray:
        """Weights given what has happened, adding up to 1 in each replicate in the mean.

        Returns
        -------
        ndarray, shape of ``weight``
        """
        whole = self.weight * self.draw_weight[self.owner]
        if np.all(self.survival == 1.0):
            return np.asarray(whole)
        whole = whole * self.survival
        return np.asarray(whole * (len(whole) / whole.sum()))

    def per_draw(self, value: FloatArray) -> FloatArray:
        """Sum a value over the points of each draw and over the centres.

        Parameters
        ----------
        value : ndarray, shape (n_centre, n_point, ...)
            Of one replicate.

        Returns
        -------
        ndarray, shape (n_draw, ...)
        """
        starts = np.searchsorted(self.owner, np.arange(self.draws))
        return np.asarray(np.add.reduceat(value.sum(axis=0), starts, axis=0))


def log_failure(log_hazard: FloatArray) -> FloatArray:
    """Log-probability of failing in a year, ln(1 - exp(-Lambda)), without cancellation."""
    hazard = np.exp(np.minimum(log_hazard, 50.0))
    small = log_hazard < -20.0
    return np.where(small, log_hazard, np.log(-np.expm1(-np.where(small, 1.0, hazard))))


@dataclass(frozen=True, slots=True, eq=False)
class Modes:
    """Where failing in one year is most likely to come from, for each draw.

    Attributes
    ----------
    centres : tuple of ndarray, each (n_draw, dimension)
        The highest maximum of each draw; and, where it matters for the failure probability of
        all draws together, a second one apart from it.
    heights : ndarray, shape (n_draw,)
        ln P(fail in the year | draw, z) - |z|^2/2 at the first.
    evaluations : int
        Capacity evaluations spent.
    """

    centres: tuple[FloatArray, ...]
    heights: FloatArray
    evaluations: int


def find_modes(problem: Problem, year: int, starts: Sequence[FloatArray] = ()) -> Modes:
    """Find for each draw where failing in a year is most likely to come from.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    year : int
        Index of the year.
    starts : sequence of ndarray, each (n_draw, dimension)
        Where to start from besides the best of the scouts; the origin if left out.

    Returns
    -------
    Modes
        They centre a proposal density, so they need not be exact; a poor one costs accuracy,
        never bias.

    Notes
    -----
    Each iteration linearises ln Lambda, whose forward differences give its gradient, jumps to the
    maximum that the linear form has, as the first-order search of the design point does [1]_,
    and goes as much of that way as the true objective likes best. Scouts lead off a plateau (a
    bar that has not begun to corrode has no gradient in its onset): points on every axis, and
    scrambled Sobol points. The best scout away from the maximum that was found leads to a second.

    References
    ----------
    .. [1] R. Rackwitz, B. Fiessler, Structural reliability under combined random load sequences,
       Comput. Struct. 9 (1978) 489-494, doi:10.1016/0045-7949(78)90046-9.
    .. [2] R. E. Melchers, A. T. Beck, Structural Reliability Analysis and Prediction, 3rd ed.,
       2018, section 3.4 (importance sampling centred at the maximum of the integrand).
    """
    years = np.array([year])
    spent = 0

    def log_hazard(z: FloatArray, chosen: IntArray) -> FloatArray:
        nonlocal spent
        spent += z.shape[0] * z.shape[1]
        return problem.log_hazard(z, chosen, years)[..., 0]

    # Modes are those before the past counts: a past without failure moves them little, and a
    # proposal need not be exact.
    pilot, rest, nearest = _pilot(problem)
    scouts = _scouts(problem.dimension)
    seen = _look_around(log_hazard, scouts, pilot)
    first = _Found.nothing(problem)
    first.climb(log_hazard, scouts[seen.argmax(axis=1)], pilot)
    for start in starts or [np.zeros_like(first.mode)]:
        first.climb(log_hazard, start[pilot], pilot)
    others = _others(log_hazard, problem, first, scouts, pilot)
    for found in (first, *others):
        found.climb(log_hazard, found.mode[pilot[nearest]], rest)
    centres = (first.mode, *(found.mode for found in others))
    return Modes(centres, first.height, spent)


@dataclass(slots=True, eq=False)
class _Found:
    """The highest point of each draw that climbs have reached."""

    mode: FloatArray  # (n_draw, dimension)
    height: FloatArray  # (n_draw,)

    @staticmethod
    def nothing(problem: Problem) -> "_Found":
        """Start at the origin, with no height."""
        shape = (problem.draws, problem.dimension)
        return _Found(np.zeros(shape), np.full(problem.draws, -np.inf))

    def climb(self, log_hazard: Hazard, start: FloatArray, chosen: IntArray) -> None:
        """Climb from the starts of some draws, and keep what is higher."""
        size = max(1, len(chosen) * (start.shape[1] + 1) // ELEMENTS)
        for place in np.array_split(np.arange(len(chosen)), size):
            part = chosen[place]
            found, height = _climb(log_hazard, start[place], part)
            higher = height > self.height[part]
            self.mode[part] = np.where(higher[:, None], found, self.mode[part])
            self.height[part] = np.where(higher, height, self.height[part])


def _look_around(log_hazard: Hazard, scouts: FloatArray, chosen: IntArray) -> FloatArray:
    """Height of all scouts for some draws, (n_chosen, n_scout)."""
    seen = np.empty((len(chosen), len(scouts)))
    size = max(1, len(chosen) * len(scouts) // ELEMENTS)
    for place in np.array_split(np.arange(len(chosen)), size):
        cloud = np.broadcast_to(scouts, (len(place), *scouts.shape))
        seen[place] = _height(log_hazard(cloud, chosen[place]), cloud)
    return seen


def _others(
    log_hazard: Hazard, problem: Problem, first: "_Found", scouts: FloatArray, pilot: IntArray
) -> list["_Found"]:
    """Find further modes that hold a share of the failure probability worth sampling.

    Some draws climb from every scout; the scout that leads to most of what no centre is near
    to starts the next mode of all draws. Heights stand for masses: widths are taken as alike.
    """
    likely = np.argsort(-first.height[pilot], kind="stable")[: LOOKOUTS // 2]
    spread = np.linspace(0, len(pilot) - 1, LOOKOUTS // 2).astype(np.int64)
    look = pilot[np.unique(np.concatenate([likely, spread]))]
    shape = (len(look), len(scouts))
    mode, height = _climb(log_hazard, np.tile(scouts, (len(look), 1)), np.repeat(look, len(scouts)))
    mode, height = mode.reshape(*shape, -1), height.reshape(shape)
    top = first.height[look].max()
    mass, whole = np.exp(height - top), np.exp(first.height[look] - top).sum()
    near = np.linalg.norm(mode - first.mode[look][:, None, :], axis=-1) <= APART
    found: list[_Found] = []
    while len(found) < MOST_MODES - 1:
        gain = np.where(near, 0.0, mass).sum(axis=0)
        best = int(gain.argmax())
        if not gain[best] > SECOND_SHARE * whole:
            break
        other = _Found.nothing(problem)
        other.climb(log_hazard, np.tile(scouts[best], (len(pilot), 1)), pilot)
        found.append(other)
        near |= np.linalg.norm(mode - mode[:, best, None, :], axis=-1) <= APART
    return found


def _pilot(problem: Problem) -> tuple[IntArray, IntArray, IntArray]:
    """Pick the draws to search from scratch; give the others, and their nearest pilot each.

    Draws that are alike fail alike: the mode of one starts the climb of its neighbours.
    """
    draws = np.arange(problem.draws)
    if problem.features is None or problem.draws < 2 * PILOTS:
        return draws, draws[:0], draws[:0]
    # Spread over the chains, so that no stretch of a chain goes without.
    pilot = np.linspace(0, problem.draws - 1, PILOTS).astype(np.int64)
    rest = np.setdiff1d(draws, pilot)
    _, nearest = cKDTree(problem.features[pilot]).query(problem.features[rest])
    return pilot, rest, np.asarray(nearest, dtype=np.int64)


def _scouts(dimension: int) -> FloatArray:
    """Points that look for failure away from the origin."""
    axes = AXIS_SCOUT * np.eye(dimension)
    cloud = CLOUD_SCOUT * normal_points(dimension, CLOUD, seed=7)[0]
    return np.concatenate([axes, -axes, cloud])


def _height(log_hazard: FloatArray, z: FloatArray) -> FloatArray:
    """Log of the integrand: of failing at z, and of z itself up to a constant."""
    return np.asarray(log_failure(log_hazard) - 0.5 * np.einsum("...i,...i->...", z, z))


def _climb(log_hazard: Hazard, start: FloatArray, part: IntArray) -> tuple[FloatArray, FloatArray]:
    """Climb from the starts of some draws to where the integrand is largest."""
    count, dimension = start.shape
    offsets = np.concatenate([np.zeros((1, dimension)), STEP * np.eye(dimension)])
    mode, peak = start.copy(), np.full(count, -np.inf)
    climbing = np.arange(count)
    for _ in range(ITERATIONS):
        here, chosen = mode[climbing], part[climbing]
        around = log_hazard(here[:, None, :] + offsets, chosen)
        slope = (around[:, 1:] - around[:, :1]) / STEP
        target = _linear_maximum(around[:, 0], slope, here)
        tried = here[:, None, :] + SHARES[:, None] * (target - here)[:, None, :]
        height = _height(log_hazard(tried, chosen), tried)
        best = height.argmax(axis=1)
        row = np.arange(len(climbing))
        gained = height[row, best] - peak[climbing]
        mode[climbing], peak[climbing] = tried[row, best], height[row, best]
        climbing = climbing[gained > WORTHWHILE]
        if not len(climbing):
            break
    return mode, peak


def _linear_maximum(log_hazard: FloatArray, slope: FloatArray, z: FloatArray) -> FloatArray:
    r"""Give the maximum of the integrand were ln Lambda linear.

    It lies on the gradient a, at the distance s where :math:`|a| r(g) = s` with g = ln Lambda
    there and :math:`r = e^g / (e^{e^g} - 1)` the slope of :math:`\ln(1 - e^{-e^g})`; found by
    bisection between 0 and |a|, for r falls from 1 to 0.
    """
    steepness = np.linalg.norm(slope, axis=1)
    unit = slope / np.maximum(steepness, 1e-300)[:, None]
    at_origin = log_hazard - np.einsum("ni,ni->n", slope, z)
    low, high = np.zeros_like(steepness), steepness
    for _ in range(BISECTIONS):
        middle = 0.5 * (low + high)
        hazard = np.exp(np.clip(at_origin + steepness * middle, -700.0, 6.0))
        further = steepness * hazard / np.expm1(hazard) > middle
        low, high = np.where(further, middle, low), np.where(further, high, middle)
    return np.asarray(low[:, None] * unit)


def allocate(contribution: FloatArray, total: int) -> IntArray:
    """Share points out among draws by what each contributes to the failure probability.

    Parameters
    ----------
    contribution : ndarray, shape (n_draw, n_year)
        Non-negative; any scale in each year.
    total : int
        Points to be shared out, at least n_draw.

    Returns
    -------
    ndarray of int, shape (n_draw,)
        At least 1 for each draw, the rest in proportion to the largest share that the draw has
        in any year: optimal allocation where the relative scatter within draws is alike [1]_.

    References
    ----------
    .. [1] W. G. Cochran, Sampling Techniques, 3rd ed., 1977, section 5.5 (Neyman allocation).
    """
    sums = contribution.sum(axis=0)
    usable = sums > 0.0
    count = len(contribution)
    if not usable.any():
        return np.full(count, max(1, total // count), dtype=np.int64)
    share = (contribution[:, usable] / sums[usable]).max(axis=1)
    return np.asarray(1 + np.floor((total - count) * share / share.sum()), dtype=np.int64)


def draw_sample(problem: Problem, proposal: Proposal, replicates: int) -> Sample:
    """Sample local variables around the centres of each draw, with their weights and hazards.

    Parameters
    ----------
    problem : Problem
        What to integrate.
    proposal : Proposal
        Where to sample.
    replicates : int
        Independently scrambled repetitions, for the integration error.

    Returns
    -------
    Sample
        With a point at each centre for each point of the proposal.

    Notes
    -----
    Each replicate runs one scrambled Sobol sequence per centre through all draws, so that points
    differ from draw to draw and are evenly spread over the draws together [1]_. The weight is
    the standard normal density over that of the whole mixture (balance heuristic [2]_), bounded
    wherever any centre covers.

    References
    ----------
    .. [1] A. B. Owen, Scrambling Sobol' and Niederreiter-Xing points, J. Complexity 14 (1998)
       466-489, doi:10.1006/jcom.1998.0487.
    .. [2] E. Veach, L. J. Guibas, Optimally combining sampling techniques for Monte Carlo
       rendering, SIGGRAPH 1995, 419-428, doi:10.1145/218380.218498.
    """
    count = len(proposal.centres)
    owner = np.repeat(np.arange(problem.draws), proposal.points)
    # One sequence for each centre: dealt out by turns, a single one would alias with its bits.
    z = normal_points(problem.dimension, len(owner), proposal.seed, replicates * count).copy()
    z = z.reshape(replicates, count, len(owner), problem.dimension)
    for number, centre in enumerate(proposal.centres):
        z[:, number] += centre[owner]
    log_mixture = np.full(z.shape[:-1], -np.inf)
    for centre in proposal.centres:
        away = z - centre[owner]
        np.logaddexp(log_mixture, -0.5 * np.einsum("...i,...i->...", away, away), out=log_mixture)
    weight = np.exp(-0.5 * np.einsum("...i,...i->...", z, z) - log_mixture)
    weight /= proposal.points[owner] * problem.draws
    hazard = np.empty((*z.shape[:-1], problem.years))
    years = np.arange(problem.years)
    for part in np.array_split(
        np.arange(len(owner)), max(1, len(owner) * problem.years // ELEMENTS)
    ):
        for replicate in range(replicates):
            for number in range(count):
                log_hazard = problem.log_hazard(
                    z[replicate, number, part, None], owner[part], years
                )[:, 0]
                # Beyond e^50 failure is certain; the bound keeps sums over years finite.
                hazard[replicate, number, part] = np.exp(np.minimum(log_hazard, 700.0))
    survival = np.ones_like(weight)
    if problem.log_survival is not None:
        for replicate in range(replicates):
            for number in range(count):
                survival[replicate, number] = np.exp(
                    problem.log_survival(z[replicate, number, :, None], owner)[:, 0]
                )
    return Sample(owner, z, weight, hazard, survival, problem.weights, problem.draws, hazard.size)


@lru_cache(maxsize=4)
def _whole_sequence(dimension: int, power: int, seed: int, replicates: int) -> FloatArray:
    """First 2^power scrambled Sobol points as standard normals, to be read only."""
    uniform = np.empty((replicates, 1 << power, dimension))
    for points, state in zip(uniform, np.random.SeedSequence(seed).spawn(replicates), strict=True):
        sobol = qmc.Sobol(dimension, scramble=True, rng=np.random.default_rng(state))
        points[:] = sobol.random(1 << power)
    # Scrambled points may touch 0; half a grain of the sequence keeps them off it.
    normal = special.ndtri(np.clip(uniform, 1e-12, 1.0 - 1e-12, out=uniform), out=uniform)
    normal.flags.writeable = False
    return np.asarray(normal)


def normal_points(dimension: int, count: int, seed: int, replicates: int = 1) -> FloatArray:
    """Scrambled Sobol points mapped to standard normals, (replicates, count, dimension).

    The array is a view of one that others share: it can be read only.
    """
    power = max(0, int(np.ceil(np.log2(count))))
    return _whole_sequence(dimension, power, seed, replicates)[:, :count]
