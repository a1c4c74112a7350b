"""Fractiles of a lognormal variable whose parameters are uncertain."""

import numpy as np
from numpy.typing import NDArray
from scipy import optimize, special

FloatArray = NDArray[np.float64]


def predictive_fractile(median: FloatArray, scatter: FloatArray, fractile: float) -> float:
    r"""Fractile of a lognormal variable, all draws of its parameters taken together.

    Parameters
    ----------
    median, scatter : ndarray, shape (n_draw,)
        Median, and standard deviation of the logarithm, both positive.
    fractile : float
        Between 0 and 1.

    Returns
    -------
    float
        x with :math:`\frac1n \sum_d \Phi[(\ln x - \ln m_d)/s_d] = p`, in the unit of the median.

    Examples
    --------
    >>> round(predictive_fractile(np.array([30.0]), np.array([0.1]), 0.05), 3)
    25.45
    """
    centre = np.log(median)

    def excess(log_x: float) -> float:
        return float(special.ndtr((log_x - centre) / scatter).mean()) - fractile

    single = centre + scatter * special.ndtri(fractile)
    low, high = float(single.min()), float(single.max())
    if high - low < 1e-12:
        return float(np.exp(low))
    return float(np.exp(optimize.brentq(excess, low, high, xtol=1e-10)))
