"""Load effects of a section as the case file states them."""

from collections.abc import Mapping
from types import MappingProxyType
from typing import Annotated

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, model_validator

from assess.case.forms import Closed
from assess.case.quantities import (
    CoefficientOfVariation,
    InUnit,
    Length,
    Moment,
    PositiveNumber,
)
from assess.mechanics.loads import (
    gumbel_from_fractile,
    gumbel_from_mean,
    mode_in_year,
    probability_from_return_period,
)
from assess.reliability.limit_state import AnnualMaximum
from assess.units import NONE, QuantityError

FloatArray = NDArray[np.float64]

NOTHING: Mapping[str, FloatArray] = MappingProxyType({})


class PermanentLoad(Closed):
    """One permanent load effect, normal."""

    name: str = Field(description="such as self weight or surfacing")
    effect: Moment = Field(description="mean of its effect at the section")
    V: CoefficientOfVariation = Field(
        description="coefficient of variation of the effect, given the quantities that it is "
        "proportional to"
    )
    proportional_to: tuple[str, ...] = Field(
        (),
        description="names under `quantities`; the effect is stated for their stated means and "
        "grows in proportion to each",
    )
    source: str = Field("", description="where effect and V come from")


class AnnualMaximumEffect(Closed):
    """Largest effect of one year: Gumbel by mean or return period, or a load model's."""

    mean: Moment | None = Field(None, description="mean of the year's largest effect")
    value: Moment | None = Field(None, description="effect of the return period")
    return_period: Annotated[float, InUnit("yr", "a return period", above=1.0)] | None = Field(
        None, description="return period of `value`"
    )
    V: CoefficientOfVariation | None = Field(
        None, description="coefficient of variation of the year's largest effect"
    )
    load_model: str | None = Field(
        None, description="name under `load_models`, whose parameters are uncertain"
    )
    factor: PositiveNumber = Field(
        1.0, description="effect here over the load model's, if a moment"
    )
    lever: Length | None = Field(
        None, description="moment here over the load model's force, where it is one"
    )
    growth: Annotated[float, InUnit(NONE, "a yearly growth", above=-0.1, below=0.1)] = Field(
        0.0, description="yearly growth of the mode, as a fraction of that in the year assessed"
    )

    @model_validator(mode="after")
    def _one_way(self) -> "AnnualMaximumEffect":
        names = ("mean", "value", "return_period", "V", "load_model")
        given = [name for name in names if getattr(self, name) is not None]
        if given not in (["mean", "V"], ["value", "return_period", "V"], ["load_model"]):
            raise QuantityError(
                "a year's largest effect takes one way to be said",
                " and ".join(given) or "none",
                "mean with V, or value with return_period and V, or load_model",
            )
        return self

    def gumbel(self) -> tuple[float, float]:
        """Mode and scale in the year of assessment, where they are stated."""
        variation = self.V or np.nan
        if self.mean is not None:
            mode, scale = gumbel_from_mean(self.mean, variation)
        else:
            probability = probability_from_return_period(self.return_period or np.nan)
            mode, scale = gumbel_from_fractile(self.value or np.nan, probability, variation)
        return float(mode), float(scale)

    def in_years(
        self, years: FloatArray, assessed: int, common: Mapping[str, FloatArray] = NOTHING
    ) -> AnnualMaximum:
        """Distribution in each calendar year; ``common`` holds draws of load models."""
        if self.load_model is not None:
            effect = self.factor if self.lever is None else self.lever
            name = f"load.{self.load_model}"
            location, scale_now = (
                effect * common[f"{name}.{key}"][:, None] for key in ("location", "scale")
            )
            grown = 1.0 + self.growth * (years - assessed)
            return AnnualMaximum(
                location * grown,
                scale_now * np.ones(len(years)),
                common.get(f"{name}.shape", 0.0),
            )
        mode, scale = self.gumbel()
        return AnnualMaximum(
            mode_in_year(mode, years, float(assessed), self.growth), np.full(len(years), scale)
        )


class VariableLoad(Closed):
    """The variable load that rules the section."""

    name: str = Field("variable load", description="such as traffic")
    annual_maximum: AnnualMaximumEffect
    source: str = Field("", description="where the load effect comes from")


class Loads(Closed):
    """Load effects at a section."""

    permanent: tuple[PermanentLoad, ...] = Field((), description="permanent load effects")
    variable: VariableLoad


def permanent_effect(
    loads: Loads, ratio: Mapping[str, FloatArray] = NOTHING
) -> tuple[FloatArray | float, FloatArray | float]:
    r"""Mean and standard deviation of the sum of independent normal permanent effects.

    Parameters
    ----------
    loads : Loads
        At the section.
    ratio : mapping of str to ndarray
        Quantity over its stated mean, by name, for those that a load is proportional to; any
        shapes that broadcast. [-]

    Returns
    -------
    tuple
        Given the quantities, in the unit of the effects; of the shape of the ratios, numbers
        where no load is proportional to anything.

    Notes
    -----
    With mean effect :math:`E_i`, coefficient of variation :math:`V_i` and ratios :math:`r` of the
    quantities that load i is proportional to, :math:`m_i = E_i \prod r`: the mean is
    :math:`\sum m_i` and the variance :math:`\sum (V_i m_i)^2`.
    """
    mean: FloatArray | float = 0.0
    variance: FloatArray | float = 0.0
    for load in loads.permanent:
        effect: FloatArray | float = load.effect
        for name in load.proportional_to:
            effect = effect * ratio[name]
        mean = mean + effect
        variance = variance + (load.V * effect) ** 2
    return mean, np.sqrt(variance)
