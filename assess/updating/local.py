"""Local variables of a section: what is left to chance there once a draw is given."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Local:
    """Normal local variable given each draw, possibly truncated.

    Attributes
    ----------
    mean, sd : ndarray, shape (n_draw,)
        Of the normal before truncation, on the scale of the variable (logarithm for onset,
        current and strength). ``sd`` 0 makes the draw a known value.
    lower, upper : ndarray, shape (n_draw,), or None
        Truncation in standard units (value less mean, over sd); None: none.
    """

    mean: FloatArray
    sd: FloatArray
    lower: FloatArray | None = None
    upper: FloatArray | None = None

    def value(self, z: FloatArray, draws: slice | NDArray[np.int64] = slice(None)) -> FloatArray:
        """Map standard normals to local values.

        Parameters
        ----------
        z : ndarray, shape (n, ...)
            Standard normals; the first axis goes with the chosen draws.
        draws : slice or index array, default all
            Which draws the first axis of ``z`` stands for.

        Returns
        -------
        ndarray, shape of ``z``
            Local values on the scale of the variable.
        """
        tail = (slice(None),) + (None,) * (z.ndim - 1)
        score = z
        if self.lower is not None or self.upper is not None:
            low = special.ndtr(self.lower[draws])[tail] if self.lower is not None else 0.0
            high = special.ndtr(self.upper[draws])[tail] if self.upper is not None else 1.0
            # Clipped away from 0 and 1: beyond 1e-300 the score is at the bound for any purpose.
            inside = np.clip(low + special.ndtr(z) * (high - low), 1e-300, 1.0 - 1e-16)
            score = special.ndtri(inside)
        return self.mean[draws][tail] + self.sd[draws][tail] * score

    def take(self, order: NDArray[np.int64]) -> "Local":
        """Reorder the draws (used to drop dependence on purpose)."""
        return Local(
            self.mean[order],
            self.sd[order],
            None if self.lower is None else self.lower[order],
            None if self.upper is None else self.upper[order],
        )
