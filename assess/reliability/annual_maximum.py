"""Distribution of each year's largest variable load effect, as the integral uses it."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from assess.probability.generalised_extreme import reduced_variate

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class AnnualMaximum:
    """Generalised extreme value distribution of each year's largest load effect.

    Attributes
    ----------
    mode, scale : ndarray, shape (n_year,) or (n_draw, n_year)
        Location and scale, in the unit of the load capacity.
    shape : ndarray, shape (n_draw,), or float
        Shape; 0 is the Gumbel distribution.
    """

    mode: FloatArray
    scale: FloatArray
    shape: FloatArray | float = 0.0

    @property
    def ratio(self) -> FloatArray:
        """Location over scale, which a factor on the load leaves as it is."""
        return np.asarray(self.mode / self.scale)

    def scaled(self, factor: FloatArray) -> "AnnualMaximum":
        """Multiply the load effect of each year by a factor, (n_year,)."""
        return AnnualMaximum(self.mode * factor, self.scale * factor, self.shape)

    def log_hazard(self, capacity: FloatArray, draws: IntArray, years: IntArray) -> FloatArray:
        """Logarithm of minus ln F at load capacities.

        Parameters
        ----------
        capacity : ndarray, shape (n, k, n_year)
            Load capacities of chosen draws, at points, in chosen years.
        draws, years : ndarray of int
            Which draws (n,) and years (n_year,) these are.

        Returns
        -------
        ndarray, shape (n, k, n_year)
        """
        mode, scale = (_chosen(array, draws, years) for array in (self.mode, self.scale))
        standard = (capacity - mode) / scale
        if np.ndim(self.shape) == 0 and self.shape == 0.0:
            return np.asarray(-standard)
        shape = np.asarray(self.shape)
        shape = shape[draws][:, None, None] if shape.ndim else shape
        return np.asarray(-reduced_variate(standard, shape))


def _chosen(array: FloatArray, draws: IntArray, years: IntArray) -> FloatArray:
    if array.ndim == 1:
        return array[years]
    return array[draws][:, None, years]
