"""Local surface content and diffusion coefficient of profiles, as maps of standard normals.

Given the zone's variables, the two logarithms at a place are normal, and what its profiles say of
them is nearly so. Their scores are measured from where both together put them: sampled scores are
then nearly independent standard normals whatever the profiles say, and exact in any case, for
the change of variables is accounted for.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from assess import operations as op

Numeric = Any  # float, ndarray or PyTensor variable
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


class Population(NamedTuple):
    """Zone parameters at each place, last axis place; the first two are means of logarithms."""

    log_surface: Numeric  # [ln %]
    log_diffusion: Numeric  # at the reference age [ln mm²/yr]
    surface_scatter: Numeric
    diffusion_scatter: Numeric


class Locals(NamedTuple):
    """Local values, last axis place, and ln of the prior density over that of the scores."""

    log_surface: Numeric  # [ln %]
    log_diffusion: Numeric  # at the reference age [ln mm²/yr]
    log_weight: Numeric


@dataclass(frozen=True, slots=True, eq=False)
class ProfileData:
    """Normal summaries of the profiles of each place, as numbers or graph variables.

    ``precision`` (3, n_visit) holds the parts surface-surface, surface-diffusion and
    diffusion-diffusion, ``linear`` (2, n_visit) the linear terms, see
    `assess.updating.chloride_increments.Summary`; all zero where nothing is known. ``by_place``
    (n_visit, n_place) sums profiles by place.
    """

    precision: Any
    linear: Any
    by_place: FloatArray


def local_values(
    data: ProfileData,
    zone: Population,
    scores: tuple[Numeric, Numeric],
    offset: tuple[Numeric, Numeric],
) -> Locals:
    r"""Map the scores of each place to its local values.

    Parameters
    ----------
    data : ProfileData
        What the profiles say.
    zone : Population
        What the zone says.
    scores : tuple of numeric, last axis place
        :math:`\eta`, standard normal in the prior, of surface content and diffusion.
    offset : tuple of numeric, last axis visit
        What separates the local values from those that a profile speaks of: ln of the factor of
        its contents, and :math:`a \ln(t_0 / t)` of its age.

    Returns
    -------
    Locals
        With :math:`\ln [p(x) |dx / d\eta| / \varphi(\eta)]`, to be added to the log-likelihood.

    Notes
    -----
    In standard units of the zone, :math:`x = \mu + \sigma z`, the population is N(0, I) and the
    profiles add precision :math:`\sigma \Lambda \sigma` and linear term
    :math:`\sigma (h - \Lambda (\mu + o))`, where :math:`o` is the offset. With the Cholesky
    factor L of :math:`I + \sigma \Lambda \sigma`

    .. math:: z = L^{-T} (L^{-1} \sigma (h - \Lambda (\mu + o)) + \eta), \qquad
              |dz / d\eta| = 1 / \det L

    which are the posterior mean and scores of a normal model [1]_. Where nothing is known
    :math:`z = \eta` and the weight is one. If the summaries were exact, likelihood times weight
    would not depend on :math:`\eta`, that is be the likelihood with local values integrated out.

    References
    ----------
    .. [1] A. Gelman et al., Bayesian Data Analysis, 3rd ed., 2013, sections 3.5 and 12.4.
    """
    centre = (zone.log_surface, zone.log_diffusion)
    sigma = (zone.surface_scatter, zone.diffusion_scatter)
    own = [data.precision[k] @ data.by_place for k in range(3)]
    shift = (
        data.precision[0] * offset[0] + data.precision[1] * offset[1],
        data.precision[1] * offset[0] + data.precision[2] * offset[1],
    )
    linear = [(data.linear[k] - shift[k]) @ data.by_place for k in range(2)]
    pull_surface = sigma[0] * (linear[0] - own[0] * centre[0] - own[1] * centre[1])
    pull_diffusion = sigma[1] * (linear[1] - own[1] * centre[0] - own[2] * centre[1])
    first = op.sqrt(1.0 + sigma[0] ** 2 * own[0])
    between = sigma[0] * sigma[1] * own[1] / first
    second = op.sqrt(1.0 + sigma[1] ** 2 * own[2] - between * between)
    mean_surface = pull_surface / first
    mean_diffusion = (pull_diffusion - between * mean_surface) / second
    z_diffusion = (mean_diffusion + scores[1]) / second
    z_surface = (mean_surface + scores[0] - between * z_diffusion) / first
    # Differences of squares, exactly zero where nothing is known.
    square = (z_surface - scores[0]) * (z_surface + scores[0])
    square = square + (z_diffusion - scores[1]) * (z_diffusion + scores[1])
    return Locals(
        centre[0] + sigma[0] * z_surface,
        centre[1] + sigma[1] * z_diffusion,
        -0.5 * square - op.log(first) - op.log(second),
    )


def score_names(key: str, place: str) -> tuple[str, str]:
    """Name the two scores of a place."""
    return f"{key}.{place}.surface", f"{key}.{place}.diffusion"


def scores_of(
    key: str, places: tuple[str, ...], values: Mapping[str, Numeric]
) -> tuple[Numeric, Numeric]:
    """Stack the scores of all places, last axis place."""
    names = [score_names(key, place) for place in places]
    return (
        op.stack_last([values[surface] for surface, _ in names]),
        op.stack_last([values[diffusion] for _, diffusion in names]),
    )
