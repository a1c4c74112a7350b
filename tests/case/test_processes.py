"""Processes of a zone: what their quantities cannot be."""

import pytest

from assess.case.processes import Carbonation


@pytest.mark.parametrize("mean", [30, "30", 3.5])
def test_a_scatter_of_a_logarithm_is_not_in_percent(mean):
    rate = {"distribution": "lognormal", "mean": "4 mm/yr^0.5", "V": 0.3, "source": "test"}
    scatter = {"distribution": "lognormal", "mean": mean, "V": 0.3, "source": "test"}
    with pytest.raises(ValueError, match="out of all proportion, given mean .*, in percent"):
        Carbonation.model_validate({"carbonation_rate": rate, "carbonation_rate_scatter": scatter})
    usual = Carbonation.model_validate(
        {"carbonation_rate": rate, "carbonation_rate_scatter": {**scatter, "mean": 0.3}}
    )
    assert usual.carbonation_rate_scatter.marginal().mean == pytest.approx(0.3)
