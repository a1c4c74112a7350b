"""Strength of concrete from rebound number and pulse velocity: the basic curves of EN 13791.

The curves are drawn low on purpose, so that cores shift them up (EN 13791:2007, 8.3 and 8.4).
"""

from typing import Any

import numpy as np

Numeric = Any  # float or ndarray

REBOUND_RANGE = (20.0, 50.0)  # [-] EN 13791:2007, figure 2
VELOCITY_RANGE = (4.0, 4.8)  # [km/s] EN 13791:2007, figure 3


def strength_from_rebound(rebound: Numeric) -> Numeric:
    r"""Strength in the structure by the basic curve of the rebound number.

    Parameters
    ----------
    rebound : numeric
        Median rebound number of a location, :math:`R`, horizontal impact. [-]

    Returns
    -------
    numeric
        Strength of a cylinder in the structure. [MPa]

    Notes
    -----
    .. math:: f = 1.25 R - 23 \quad (20 \le R \le 24), \qquad f = 1.73 R - 34.5 \quad
              (24 \le R \le 50)

    From memory; the two pieces meet at 24 within 0.02 MPa.

    References
    ----------
    .. [1] EN 13791:2007, 8.3.3, figure 2.

    Examples
    --------
    >>> round(float(strength_from_rebound(40.0)), 2)
    34.7
    """
    return np.where(rebound <= 24.0, 1.25 * rebound - 23.0, 1.73 * rebound - 34.5)


def strength_from_velocity(velocity: Numeric) -> Numeric:
    r"""Strength in the structure by the basic curve of the pulse velocity.

    Parameters
    ----------
    velocity : numeric
        Pulse velocity of a location, :math:`v`, 4.0 to 4.8 km/s. [km/s]

    Returns
    -------
    numeric
        Strength of a cylinder in the structure. [MPa]

    Notes
    -----
    .. math:: f = 62.5 v^2 - 497.5 v + 990

    From memory.

    References
    ----------
    .. [1] EN 13791:2007, 8.4.3, figure 3.

    Examples
    --------
    >>> strength_from_velocity(4.4)
    11.0
    """
    return 62.5 * velocity * velocity - 497.5 * velocity + 990.0
