"""What a survey says of its chloride profiles, and one table of them as numbers."""

from typing import Annotated, Literal, cast

import numpy as np
from pydantic import Field, model_validator

from assess.case.forms import EvidenceEntry
from assess.case.processes import Chloride
from assess.case.quantities import CoefficientOfVariation, InUnit
from assess.case.reader import Case, Evidence
from assess.units import NONE, QuantityError
from assess.updating.bounds import lower_limits, marked
from assess.updating.kind import FloatArray

PERCENT = 100.0  # contents are shown, and compared, in percent of binder

_Content = Annotated[
    float, InUnit(NONE, "a chloride content", above=0.0, below=0.05, usual=(1e-6, 2e-3))
]
_Mass = Annotated[float, InUnit("kg/m^3", "a binder content", above=0.0, usual=(150.0, 700.0))]
_Density = Annotated[float, InUnit("kg/m^3", "a density", above=0.0, usual=(1200.0, 3500.0))]


class ChlorideProfileEntry(EvidenceEntry):
    """What a survey says of its chloride profiles."""

    basis: Literal["binder", "concrete"] = Field(
        description="what the contents of the table are a fraction of"
    )
    binder_content: _Mass | None = Field(
        None, description="mass of binder in the concrete; with contents by mass of concrete"
    )
    density: _Density | None = Field(
        None, description="density of the concrete; with contents by mass of concrete"
    )
    error: CoefficientOfVariation = Field(
        description="coefficient of variation of a content as measured about the true one of its "
        "increment: sampling and analysis"
    )
    absolute_error: _Content = Field(
        description="standard deviation of a measured content where there is hardly any, on the "
        "basis of the table (such as 0.005 %)"
    )
    detection_limit: _Content | None = Field(
        None,
        description="smallest content that the analysis tells, on the basis of the table; left "
        "out: the largest that the table says contents are below of",
    )

    @model_validator(mode="after")
    def _basis_is_said(self) -> "ChlorideProfileEntry":
        given = [key for key in ("binder_content", "density") if getattr(self, key) is not None]
        if self.basis == "binder" and given:
            what = "contents by mass of binder need no conversion"
            raise QuantityError(what, " and ".join(given), "neither", "or say basis: concrete")
        if self.basis == "concrete" and len(given) < 2:
            what = "contents by mass of concrete need both binder_content and density"
            mend = "such as binder_content: 320 kg/m^3 and density: 2350 kg/m^3"
            raise QuantityError(what, " and ".join(given) or "neither", "both", mend)
        return self

    @property
    def binder_share(self) -> float | None:
        """Binder over concrete, by mass; None where contents are of binder."""
        if self.binder_content is None or self.density is None:
            return None
        return self.binder_content / self.density


def table_rows(item: Evidence, case: Case) -> dict[str, FloatArray]:
    """Arrange one table of profiles.

    Parameters
    ----------
    item : Evidence
        The table, in zones with chloride.
    case : Case
        The case.

    Returns
    -------
    dict of str to ndarray, shape (n_row,)
        ``value`` with marks of `assess.updating.bounds` [% of binder]; ``start`` and ``end`` below
        the convection depth [mm]; what `Increments` needs; ``log_ratio``, the logarithm of
        reference age over age; ``scaled``, 1 where contents were by mass of concrete.
    """
    entry, table = cast(ChlorideProfileEntry, item.entry), item.table
    processes = [cast(Chloride, case.spec.zones[zone].chloride) for zone in item.zone.tolist()]
    convection = np.array([process.convection_depth for process in processes])
    reference_age = np.array([process.reference_age for process in processes])
    share = entry.binder_share
    scale = PERCENT if share is None else PERCENT / share
    content, below = scale * table.numbers["chloride"], scale * table.below["chloride"]
    limit = None if entry.detection_limit is None else scale * entry.detection_limit
    if limit is not None:
        # A content read below the stated detection limit says no more than that it is.
        under = content < limit
        content, below = np.where(under, np.nan, content), np.where(under, limit, below)
    count = len(table)
    return {
        "value": marked(content, below),
        "start": table.numbers["from"] - convection,
        "end": table.numbers["to"] - convection,
        "age": np.full(count, item.age),
        "log_ratio": np.log(reference_age / item.age),
        "initial": PERCENT * np.array([process.initial_chloride for process in processes]),
        "variation": np.full(count, entry.error),
        "absolute": np.full(count, scale * entry.absolute_error),
        "limit": lower_limits(content, below, limit),
        "scaled": np.full(count, 0.0 if share is None else 1.0),
    }
