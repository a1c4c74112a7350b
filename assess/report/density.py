"""Densities of draws for drawing: binned, smoothed, positive variables through their logarithm."""

from dataclasses import dataclass

import numpy as np
from scipy.ndimage import gaussian_filter, gaussian_filter1d
from scipy.stats import iqr

from assess.decisions.results import FloatArray

BINS = 240
CELLS = 72  # per side of a joint density
LOG_RATIO = 30.0  # upper over lower end from which an axis is logarithmic
WINDOW = (0.004, 0.996)
SMOOTHER = 1.3  # over the normal rule
EDGE = 4.0  # kernel widths kept beyond the outermost draw


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """A density over a grid, both of shape (n,)."""

    x: FloatArray
    y: FloatArray


def bandwidth(values: FloatArray, dimension: int = 1) -> float:
    """Kernel width by the normal rule with the smaller of two scale estimates.

    Parameters
    ----------
    values : ndarray, shape (n,)
        Draws, any unit.
    dimension : int, default 1
        Number of variables smoothed together.

    Returns
    -------
    float
        Width, unit of `values`; 0 for constant values.

    References
    ----------
    B. W. Silverman, Density Estimation for Statistics and Data Analysis, Chapman & Hall 1986,
    eq. 3.31, with the factor 0.9, widened here because draws of a chain are worth fewer
    independent ones; D. W. Scott, Multivariate Density Estimation, Wiley 1992, for
    the power of the sample size (both from memory).
    """
    scale = min(float(np.std(values)), float(iqr(values)) / 1.34) or float(np.std(values))
    return SMOOTHER * 0.9 * scale * float(np.power(len(values), -1.0 / (dimension + 4)))


def is_positive(values: FloatArray) -> bool:
    """Tell whether all values are positive, so that a density must not leak below zero."""
    return bool(np.min(values) > 0.0)


def curve(draws: FloatArray, *, per_log: bool = False) -> Curve:
    """Estimate a density by binning and Gaussian smoothing.

    Parameters
    ----------
    draws : ndarray
        Draws of any shape.
    per_log : bool, default False
        Density per unit of the natural logarithm, for logarithmic axes; needs positive draws.

    Returns
    -------
    Curve
        Positive draws are smoothed in their logarithm: no mass below zero.

    Raises
    ------
    ValueError
        If `per_log` is asked for draws that are not all positive.
    """
    values = np.asarray(draws, dtype=float).ravel()
    positive = is_positive(values)
    if per_log and not positive:
        raise ValueError(
            f"density per logarithm: smallest draw {values.min():g} given, positive draws allowed"
        )
    work = np.log(values) if positive else values
    width = bandwidth(work) or 1e-3 * max(abs(float(work[0])), 1.0)
    low, high = float(work.min()) - EDGE * width, float(work.max()) + EDGE * width
    bins = int(np.clip(np.ceil(4.0 * (high - low) / width), BINS, 8 * BINS))
    counts, edges = np.histogram(work, bins=bins, range=(low, high), density=True)
    step = edges[1] - edges[0]
    smooth = gaussian_filter1d(counts, width / step, mode="constant")
    grid = 0.5 * (edges[1:] + edges[:-1])
    if not positive:
        return Curve(grid, smooth)
    x = np.exp(grid)
    return Curve(x, smooth if per_log else smooth / x)


def window(
    samples: list[FloatArray],
    data: FloatArray | None = None,
    tails: tuple[float, float] = WINDOW,
) -> tuple[float, float]:
    """Range of an axis that shows all samples but their far tails, and all data."""
    ends = [np.quantile(sample, tails) for sample in samples]
    low = min(float(end[0]) for end in ends)
    high = max(float(end[1]) for end in ends)
    if data is not None and len(data):
        low, high = min(low, float(np.min(data))), max(high, float(np.max(data)))
    if high <= low:
        return low - 0.5, high + 0.5
    positive = all(is_positive(sample) for sample in samples)
    margin = 0.03 * (high - low)
    return (max(low - margin, 0.0) if positive else low - margin), high + margin


def wants_log(samples: list[FloatArray], data: FloatArray | None = None) -> bool:
    """Tell whether positive samples spread so far that a logarithmic axis reads better."""
    if not all(is_positive(sample) for sample in samples):
        return False
    if data is not None and len(data) and not is_positive(data):
        return False
    low = min(float(np.quantile(sample, 0.025)) for sample in samples)
    high = max(float(np.quantile(sample, 0.975)) for sample in samples)
    return high / low > LOG_RATIO


@dataclass(frozen=True, slots=True, eq=False)
class Surface:
    """A joint density: grid vectors (n,), (n,), density (n, n) as [row of y, column of x]."""

    x: FloatArray
    y: FloatArray
    z: FloatArray
    levels: tuple[float, float]  # density on the border of the 90 % and the 50 % region


def region_level(z: FloatArray, held: FloatArray, mass: float) -> float:
    """Density on the border of the smallest region with a given mass.

    Parameters
    ----------
    z, held : ndarray, the same shape
        Density and mass of each cell.
    mass : float
        Share of the whole that the region holds.

    References
    ----------
    R. J. Hyndman, Computing and graphing highest density regions, Am. Stat. 50 (1996) 120-126,
    doi:10.1080/00031305.1996.10474359.
    """
    order = np.argsort(-z, axis=None)
    summed = np.cumsum(held.ravel()[order])
    place = int(np.searchsorted(summed, mass * summed[-1]))
    return float(z.ravel()[order[min(place, len(order) - 1)]])


def surface(x: FloatArray, y: FloatArray, *, log_x: bool, log_y: bool) -> Surface:
    """Estimate a joint density of two variables on the scales of the axes they are drawn on.

    Parameters
    ----------
    x, y : ndarray, shape (n,)
        Draws; positive ones are smoothed in their logarithm.
    log_x, log_y : bool
        Whether the axis is logarithmic: the density is then per unit of the logarithm.

    Returns
    -------
    Surface
        Density and the levels of the 90 % and 50 % regions.
    """
    positive_x, positive_y = is_positive(x), is_positive(y)
    u = np.log(x) if positive_x else np.asarray(x, dtype=float)
    v = np.log(y) if positive_y else np.asarray(y, dtype=float)
    width_u, width_v = 1.2 * bandwidth(u, 2), 1.2 * bandwidth(v, 2)
    # Far tails would spend the cells on emptiness.
    bounds = [
        (float(low) - 3.0 * width, float(high) + 3.0 * width)
        for (low, high), width in (
            (np.quantile(u, [0.001, 0.999]), width_u),
            (np.quantile(v, [0.001, 0.999]), width_v),
        )
    ]
    counts, edge_u, edge_v = np.histogram2d(u, v, bins=CELLS, range=bounds)
    sigma = (width_u / (edge_u[1] - edge_u[0]), width_v / (edge_v[1] - edge_v[0]))
    smooth = gaussian_filter(counts, sigma, mode="nearest").T
    grid_u, grid_v = 0.5 * (edge_u[1:] + edge_u[:-1]), 0.5 * (edge_v[1:] + edge_v[:-1])
    grid_x = np.exp(grid_u) if positive_x else grid_u
    grid_y = np.exp(grid_v) if positive_y else grid_v
    # Cells are equal in u and v; on a linear axis of a positive variable they grow with it.
    z = smooth / (grid_x if positive_x and not log_x else 1.0)
    z = z / (grid_y[:, None] if positive_y and not log_y else 1.0)
    return Surface(grid_x, grid_y, z, (region_level(z, smooth, 0.9), region_level(z, smooth, 0.5)))


def thinned(values: FloatArray, limit: int) -> FloatArray:
    """Keep at most some values, evenly spread over their order."""
    if len(values) <= limit:
        return values
    return np.take(values, np.linspace(0, len(values) - 1, limit).astype(int))
