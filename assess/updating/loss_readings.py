"""What a break-out's table says of the loss of radius: by diameter, by mass, by the deepest pit."""

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy import integrate, stats

from assess.case.forms import Table
from assess.mechanics.corrosion import pitting_factor_distribution

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

STEEL_DENSITY = 7.85e-3  # [g/mm³] EN 1991-1-1, table A.4, 77 to 78.5 kN/m³


@dataclass(frozen=True, slots=True, eq=False)
class LossReadings:
    """Readings of the loss of radius, arrays (n_reading,); a row may bring two."""

    row: IntArray  # of the table
    log_loss: FloatArray  # ln of the loss of radius [ln mm], NaN for none found
    log_limit: FloatArray  # ln of the loss that would have been noticed [ln mm]
    variance: FloatArray  # of log_loss about the true one


def loss_readings(
    table: Table, detection_limit: float, variation: float, pit_length: float
) -> LossReadings:
    r"""Turn a table into readings of the loss of radius.

    Parameters
    ----------
    table : Table
        With columns ``original diameter`` and any of ``residual diameter`` [mm],
        ``residual mass`` [g/mm], ``pit depth`` [mm].
    detection_limit : float
        Loss of radius that would have been noticed. [mm]
    variation : float
        Coefficient of variation of a measured loss.
    pit_length : float
        Length of bar over which the deepest pit was looked for. [mm]

    Returns
    -------
    LossReadings
        A loss read below the limit says no more than "none found".

    Notes
    -----
    A mass per length m leaves the diameter :math:`\sqrt{4 m / (\pi \rho)}`. The deepest pit is
    the mean loss of radius times the pitting factor R of the length looked at, Gumbel
    (`pitting_factor_distribution`). ln R is taken as normal with its exact mean and variance
    (`pitting_factor_logarithm`), so that a pit reads the mean loss with that much more scatter.
    """
    original = table.numbers["original diameter"]
    spread = np.log1p(variation**2)
    parts = []
    diameter = table.numbers.get("residual diameter", np.full(len(table), np.nan))
    mass = table.numbers.get("residual mass", np.full(len(table), np.nan))
    residual = np.where(
        np.isfinite(diameter), diameter, np.sqrt(4.0 * mass / (np.pi * STEEL_DENSITY))
    )
    none = table.absent.get("residual diameter", np.zeros(len(table), dtype=bool))
    even = np.flatnonzero(np.isfinite(residual) | none)
    loss = 0.5 * (original - residual)[even]
    parts.append(_readings(even, loss, np.log(detection_limit), np.full(len(even), spread)))
    pit = table.numbers.get("pit depth", np.full(len(table), np.nan))
    pitted = np.flatnonzero(np.isfinite(pit))
    if len(pitted):
        mean, variance = np.array(
            [pitting_factor_logarithm(float(d), pit_length) for d in original[pitted]]
        ).T
        parts.append(
            _readings(
                pitted,
                pit[pitted] * np.exp(-mean),
                np.log(detection_limit) - mean,
                spread + variance,
            )
        )
    return LossReadings(
        *(np.concatenate([getattr(part, name) for part in parts]) for name in _NAMES)
    )


_NAMES = ("row", "log_loss", "log_limit", "variance")


def _readings(
    row: IntArray, loss: FloatArray, log_limit: FloatArray | float, variance: FloatArray
) -> LossReadings:
    limit = np.broadcast_to(log_limit, loss.shape)
    found = np.nan_to_num(loss, nan=0.0) >= np.exp(limit)
    return LossReadings(row, np.log(np.where(found, loss, np.nan)), limit.copy(), variance)


@cache
def pitting_factor_logarithm(diameter: float, length: float) -> tuple[float, float]:
    """Mean and variance of ln R of a bar, R at least 1, by quadrature over its Gumbel score.

    Parameters
    ----------
    diameter, length : float
        Of the bar, and of the part that was looked at. [mm]

    Returns
    -------
    tuple of float
        E[ln R] and Var[ln R].
    """
    location, inverse_scale = pitting_factor_distribution(diameter, length)
    known = stats.gumbel_r(float(location), 1.0 / float(inverse_scale))

    def moment(power: int, about: float = 0.0) -> float:
        def integrand(u: float) -> float:
            return float((np.log(max(known.ppf(u), 1.0)) - about) ** power)

        return float(integrate.quad(integrand, 0.0, 1.0, limit=200)[0])

    mean = moment(1)
    return mean, moment(2, mean)
