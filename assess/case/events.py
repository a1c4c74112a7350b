"""What has happened to sections already: load tests survived, years served."""

from typing import Annotated, Literal

from pydantic import Discriminator, Field, Tag

from assess.case.forms import Closed
from assess.case.quantities import CoefficientOfVariation, Moment


class LoadTest(Closed):
    """A section carried a known load effect on a day, beside its permanent load."""

    kind: Literal["load test"] = Field(description="a load test")
    section: str = Field(min_length=1, description="section that was loaded")
    year: int = Field(description="year of the test")
    effect: Moment = Field(description="variable load effect that was carried at the section")
    error: CoefficientOfVariation = Field(
        0.05, description="coefficient of variation of the effect, as derived from the test load"
    )
    source: str = Field(min_length=1, description="record of the test")


class PastService(Closed):
    """A section has served for years without failure under its variable load."""

    kind: Literal["past service"] = Field(description="years served without failure")
    section: str = Field(min_length=1, description="section that has served")
    from_year: int = Field(alias="from", description="first year that counts")
    to_year: int = Field(alias="to", description="last year that counts")
    load_factor: Annotated[float, Field(gt=0.0, le=2.0)] = Field(
        1.0,
        description="past yearly maxima over those stated for the section, below 1 where traffic "
        "was lighter; growth is counted besides",
    )
    source: str = Field(min_length=1, description="why these years are known to have passed so")


def _kind(value: object) -> str | None:
    said = value.get("kind") if isinstance(value, dict) else getattr(value, "kind", None)
    return said if said in ("load test", "past service") else None


Event = Annotated[
    Annotated[LoadTest, Tag("load test")] | Annotated[PastService, Tag("past service")],
    Discriminator(
        _kind,
        custom_error_type="one_form",
        custom_error_message="exactly one form must be said",
        custom_error_context={"keys": "kind: load test, or kind: past service"},
    ),
]
