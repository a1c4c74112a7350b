from typing import Any

import pytest
from pydantic import ValidationError

from assess.case.distributions import (
    LengthDistribution,
    NumberDistribution,
    YearsDistribution,
    distribution_of,
)


def error_of(model: Any, **said: object) -> str:
    with pytest.raises(ValidationError) as caught:
        model.model_validate({"source": "drawings", **said})
    return "\n".join(str(e.get("ctx", {}).get("error", e["msg"])) for e in caught.value.errors())


def test_moments_are_converted_and_reach_the_marginal() -> None:
    said = {"distribution": "lognormal", "mean": "4 cm", "V": "20 %", "source": "drawings"}
    marginal = LengthDistribution.model_validate(said).marginal()
    assert marginal.mean == pytest.approx(40.0)
    assert marginal.sd == pytest.approx(8.0)


def test_standard_deviation_with_a_unit() -> None:
    said = {"distribution": "normal", "mean": "1.5 in", "sd": "0.2 in", "source": "drawings"}
    assert LengthDistribution.model_validate(said).marginal().sd == pytest.approx(5.08)


def test_quantiles_with_units_hold() -> None:
    said = {
        "distribution": "lognormal",
        "quantiles": {0.05: "20 yr", 0.95: "60 yr"},
        "source": "model",
    }
    marginal = YearsDistribution.model_validate(said).marginal()
    assert float(marginal.ppf(0.05)) == pytest.approx(20.0, rel=1e-6)
    assert float(marginal.ppf(0.95)) == pytest.approx(60.0, rel=1e-6)


def test_a_constant_needs_its_mean_only_and_a_uniform_its_bounds() -> None:
    constant = {"distribution": "constant", "mean": "40 mm", "source": "as measured"}
    assert LengthDistribution.model_validate(constant).marginal().mean == 40.0
    uniform = {"distribution": "uniform", "lower": "3 cm", "upper": "50 mm", "source": "bounds"}
    assert LengthDistribution.model_validate(uniform).marginal().mean == pytest.approx(40.0)


@pytest.mark.parametrize(
    ("said", "message"),
    [
        ({"mean": 40, "V": 0.2, "sd": 5}, "exactly one way, given mean and V and sd, allowed"),
        ({"mean": 40}, "exactly one way, given mean, allowed exactly one of mean with V"),
        ({}, "exactly one way, given nothing"),
        ({"mean": 40, "V": 0.2, "parameters": {"log_mean": 1}}, "given mean and V; parameters"),
        ({"mean": -40, "V": 0.2}, "the mean is out of range, given -40, allowed more than 0 mm"),
        ({"mean": "40 MPa", "V": 0.2}, "does not convert to mm"),
        ({"mean": 40, "sd": -5}, "standard deviation .*given -5"),
        ({"mean": 40, "V": 20}, r"in percent\? write 0.2"),
        ({"quantiles": {5: 20, 95: 60}}, r"probability of a quantile.*in percent\? write 0.05"),
        ({"quantiles": {0.05: 60, 0.95: 20}}, "given 20, allowed a number above 60"),
        ({"quantiles": [20, 60]}, "quantiles are values by probability"),
        ({"parameters": 3}, "parameters are numbers by name"),
        ({"parameters": {"mu": 3}}, "given mu, allowed log_mean, log_sd"),
    ],
)
def test_refuse(said: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        raise ValueError(error_of(LengthDistribution, distribution="lognormal", **said))


def test_unknown_kind_is_refused_with_the_nearest() -> None:
    message = error_of(NumberDistribution, distribution="lognromal", mean=1, V=0.2)
    assert "given 'lognromal', allowed normal, lognormal" in message
    assert "did you mean 'lognormal'?" in message


def test_source_is_wanted() -> None:
    with pytest.raises(ValidationError, match="source"):
        NumberDistribution.model_validate({"distribution": "normal", "mean": 1, "sd": 1})


def test_distribution_of_a_unit() -> None:
    assert distribution_of("mm") is LengthDistribution
    load = distribution_of("kN/m")
    assert load is distribution_of("kN/m")
    said = {"distribution": "normal", "mean": "2 kN/m", "sd": "100 N/m", "source": "weighing"}
    assert load.model_validate(said).model_dump()["sd"] == pytest.approx(0.1)


def test_schema_shows_kinds_and_takes_text_or_numbers() -> None:
    properties = LengthDistribution.model_json_schema()["properties"]
    assert "lognormal" in properties["distribution"]["enum"]
    assert properties["mean"]["anyOf"] == [{"type": "number"}, {"type": "string"}]
