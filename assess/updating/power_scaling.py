"""How much each variable's posterior hangs on its prior and on the data."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from assess.updating.stages import StageDraws
from assess.updating.variables import JointPrior

SENSITIVE = 0.05  # Kallioinen et al. 2024, section 3.2


@dataclass(frozen=True, slots=True)
class PowerScaling:
    """Sensitivity of one variable's posterior to scaling a power of what it comes from."""

    variable: str
    prior: float  # of its own prior
    data: float  # of the likelihood of all data

    @property
    def conflict(self) -> bool:
        """Whether prior and data both pull, which they do where they disagree."""
        return self.prior >= SENSITIVE and self.data >= SENSITIVE

    @property
    def rests_on_prior(self) -> bool:
        """Whether the prior decides and the data say little."""
        return self.prior >= SENSITIVE > self.data


def power_scaling(
    draws: StageDraws, prior: JointPrior, used: Sequence[str]
) -> tuple[PowerScaling, ...]:
    """Scale each variable's own prior, and the likelihood, by powers close to 1.

    Parameters
    ----------
    draws : StageDraws
        Posterior of one stage.
    prior : JointPrior
        Its prior.
    used : sequence of str
        Variables to look at; constants are left out.

    Returns
    -------
    tuple of PowerScaling
        In the order of the prior; empty for the prior itself.

    Notes
    -----
    The change of the posterior is the cumulative Jensen-Shannon distance between the draws and
    the draws reweighted by importance, per doubling of the power, as ArviZ computes it [1]_. The
    prior of a variable is that of its score; a stated dependence stays as it is.

    References
    ----------
    .. [1] N. Kallioinen, T. Paananen, P.-C. Bürkner, A. Vehtari, Detecting and diagnosing prior
       and likelihood sensitivity with power-scaling, Stat. Comput. 34 (2024) 57,
       doi:10.1007/s11222-023-10366-5.
    """
    if draws.number == 0:
        return ()
    import xarray as xr
    from arviz_stats import psense

    dims = ("chain", "draw")
    scores = draws.whitened @ prior.cholesky.T
    chosen = [
        i for i, name in enumerate(draws.names)
        if name in set(used) and np.ptp(draws.physical[..., i]) > 0.0
    ]  # fmt: skip
    names = [draws.names[i] for i in chosen]
    tree = xr.DataTree.from_dict(
        {
            "posterior": xr.Dataset(
                {draws.names[i]: (dims, draws.physical[..., i]) for i in chosen}
            ),
            "log_prior": xr.Dataset(
                {draws.names[i]: (dims, -0.5 * scores[..., i] ** 2) for i in chosen}
            ),
            "log_likelihood": xr.Dataset({"data": (dims, draws.log_likelihood)}),
        }
    )
    by_data = psense(tree, group="likelihood")
    return tuple(
        PowerScaling(
            name,
            float(psense(tree, var_names=[name], group="prior", group_var_names=[name])[name]),
            float(by_data[name]),
        )
        for name in names
    )
