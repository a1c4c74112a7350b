"""Prior and evidence as one PyMC model, whose data switch surveys on stage by stage."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from numpy.typing import NDArray

from assess.case.reader import Case
from assess.updating.kind import Rows
from assess.updating.kinds import KINDS
from assess.updating.prior import joint_prior
from assess.updating.variables import JointPrior

WHITENED = "whitened"


@dataclass(frozen=True, slots=True, eq=False)
class Spec:
    """All that the sampler needs to know of a case, without PyMC."""

    prior: JointPrior
    rows: Mapping[str, Rows]  # kind -> measurements, kinds without any left out

    def data(self, stage: int) -> dict[str, NDArray[Any]]:
        """Likelihood arrays of all kinds at a stage (0: nothing measured yet)."""
        merged: dict[str, NDArray[Any]] = {}
        for key, rows in self.rows.items():
            merged |= KINDS[key].data(rows, stage)
        return merged


def specify(case: Case) -> Spec:
    """Gather prior and measurements of a case."""
    rows = {key: kind.rows(case) for key, kind in KINDS.items()}
    return Spec(joint_prior(case), {key: value for key, value in rows.items() if value is not None})


def build_model(spec: Spec, stage: int) -> Any:
    """Build the PyMC model with the data of one stage.

    Parameters
    ----------
    spec : Spec
        From `specify`.
    stage : int
        Number of surveys that count.

    Returns
    -------
    pymc.Model
        One free variable, ``whitened`` of dimension ``variable``; one Potential per kind of
        evidence. No deterministic variable: each would be compiled a second time, and physical
        values follow from the draws (`JointPrior.physical`). Replacing the data by those of
        another stage needs no new compilation.
    """
    import pymc as pm

    with pm.Model(coords={"variable": list(spec.prior.names)}) as model:
        whitened = pm.Normal(WHITENED, 0.0, 1.0, dims="variable")
        scores = whitened
        if not spec.prior.independent:
            scores = pm.math.dot(spec.prior.cholesky, whitened)
        values = spec.prior.values([scores[i] for i in range(len(spec.prior.variables))])
        data = {name: pm.Data(name, array) for name, array in spec.data(stage).items()}
        for key, rows in spec.rows.items():
            pm.Potential(key, KINDS[key].log_likelihood(rows, values, data))
    return model
