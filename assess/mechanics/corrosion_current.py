"""Corrosion current density read on site: what the temperature of the day does to it."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

REFERENCE_TEMPERATURE = 20.0  # [°C]
SLOPE_BELOW = 0.025  # [1/K] below the reference temperature
SLOPE_ABOVE = 0.073  # [1/K] above it
TEMPERATURE_RANGE = (-10.0, 50.0)  # [°C] beyond it the straight lines mean nothing


def temperature_factor(temperature: ArrayLike) -> FloatArray:
    r"""Corrosion current at a temperature over that at 20 °C.

    Parameters
    ----------
    temperature : array_like
        Of the concrete at the bar, :math:`T`, within `TEMPERATURE_RANGE`. [°C]

    Returns
    -------
    ndarray
        :math:`i(T) / i(20\,^\circ C)`. [-]

    Notes
    -----
    .. math:: i(T) / i_{20} = 1 + K (T - 20), \quad K = 0.025\ (T < 20),\ 0.073\ (T \ge 20)

    References
    ----------
    .. [1] DuraCrete, Statistical quantification of the variables in the limit state functions,
       report BE95-1347/R9, 2000. Not seen; formula and slopes from memory.

    Examples
    --------
    >>> temperature_factor([10.0, 20.0, 30.0]).tolist()
    [0.75, 1.0, 1.73]
    """
    excess = np.asarray(temperature, dtype=np.float64) - REFERENCE_TEMPERATURE
    return np.asarray(1.0 + np.where(excess < 0.0, SLOPE_BELOW, SLOPE_ABOVE) * excess)
