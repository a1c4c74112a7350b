"""Variable loads whose yearly maxima are uncertain themselves, for measurements to tell."""

from collections.abc import Iterator, Mapping
from types import MappingProxyType
from typing import Annotated, ClassVar, Literal

from pydantic import AfterValidator, Discriminator, Field, Tag

from assess.case.distributions import (
    Distribution,
    ForceDistribution,
    MomentDistribution,
    NumberDistribution,
)
from assess.case.forms import Closed
from assess.case.processes import Meaning, only_positive


class LoadModel(Closed):
    """Largest effect of a year: generalised extreme value, Gumbel where no shape is stated."""

    meanings: ClassVar[Mapping[str, Meaning]]

    shape: NumberDistribution | None = Field(
        None,
        description="shape of the distribution, above 0 for a heavier tail than Gumbel's, below 0 "
        "for an upper bound; left out: 0, Gumbel",
    )

    def priors(self) -> Iterator[tuple[str, Meaning, Distribution]]:
        """Go through name, meaning and prior of the variables that are stated."""
        for name, meaning in self.meanings.items():
            prior = getattr(self, name)
            if prior is not None:
                yield name, meaning, prior


def _meanings(distribution: type[Distribution]) -> Mapping[str, Meaning]:
    return MappingProxyType(
        {
            "location": Meaning("location of yearly maxima", "$u$", distribution),
            "scale": Meaning("scale of yearly maxima", "$b$", distribution),
            "shape": Meaning("shape of yearly maxima", "$\\xi$", NumberDistribution),
        }
    )


class MomentMaxima(LoadModel):
    """Yearly maxima of a moment."""

    meanings = _meanings(MomentDistribution)

    quantity: Literal["moment"] = Field(description="what the maxima are of")
    location: MomentDistribution = Field(description="location parameter, as uncertain")
    scale: Annotated[MomentDistribution, AfterValidator(only_positive)] = Field(
        description="scale parameter, as uncertain"
    )


class ForceMaxima(LoadModel):
    """Yearly maxima of a force, such as a weight or a reaction."""

    meanings = _meanings(ForceDistribution)

    quantity: Literal["force"] = Field(description="what the maxima are of")
    location: ForceDistribution = Field(description="location parameter, as uncertain")
    scale: Annotated[ForceDistribution, AfterValidator(only_positive)] = Field(
        description="scale parameter, as uncertain"
    )


def _quantity(value: object) -> str | None:
    said = value.get("quantity") if isinstance(value, dict) else getattr(value, "quantity", None)
    return said if said in ("moment", "force") else None


AnyLoadModel = Annotated[
    Annotated[MomentMaxima, Tag("moment")] | Annotated[ForceMaxima, Tag("force")],
    Discriminator(
        _quantity,
        custom_error_type="one_form",
        custom_error_message="exactly one form must be said",
        custom_error_context={"keys": "quantity: moment, or quantity: force"},
    ),
]
