"""Priors by name: what stands in the catalogue and how a case file takes it."""

import pytest
from pydantic import ValidationError

from assess.case.catalogue import catalogue, fitting, from_catalogue
from assess.case.distributions import (
    DiffusionDistribution,
    LengthDistribution,
    NumberDistribution,
    distribution_of,
)
from assess.units import QuantityError


@pytest.mark.parametrize("name", catalogue())
def test_every_entry_is_a_distribution_with_its_source(name: str) -> None:
    entry = catalogue()[name]
    read = distribution_of(entry["unit"]).model_validate({"catalogue": name})
    assert read.marginal().sd > 0.0
    assert entry["seen"]
    for part in (entry["source"], entry["seen"]):
        assert part in read.source


def test_numbers_are_converted_to_the_unit_wanted() -> None:
    read = NumberDistribution.model_validate({"catalogue": "critical chloride content"})
    assert read.mean == pytest.approx(0.006)
    assert read.marginal().support == pytest.approx((0.002, 0.02))


@pytest.mark.published(source="fib Bulletin 34 (from memory)", place="annex B2")
@pytest.mark.parametrize(
    ("name", "low", "median", "high"),
    [  # 5, 50 and 95 % fractiles recomputed independently from mean and sd
        ("age exponent of CEM I", 0.12061, 0.28994, 0.51397),
        ("age exponent of CEM I with fly ash", 0.34078, 0.60716, 0.83456),
        ("age exponent of CEM III/B", 0.13390, 0.44312, 0.78974),
        ("critical chloride content", 0.0037907, 0.0058589, 0.0086933),
    ],
)
def test_fractiles(name: str, low: float, median: float, high: float) -> None:
    marginal = NumberDistribution.model_validate({"catalogue": name}).marginal()
    assert marginal.ppf(0.05) == pytest.approx(low, rel=2e-4)
    assert marginal.ppf(0.50) == pytest.approx(median, rel=2e-4)
    assert marginal.ppf(0.95) == pytest.approx(high, rel=2e-4)


@pytest.mark.published(source="fib Bulletin 34 (from memory)", place="annex B2, D_RCM,0")
@pytest.mark.parametrize(("binder", "coefficient"), [("CEM I", 10.0), ("CEM III/B", 1.9)])
def test_migration_coefficients_are_read_in_square_metres_per_second(
    binder: str, coefficient: float
) -> None:
    name = f"chloride migration coefficient of {binder}, w/b 0.45"
    marginal = DiffusionDistribution.model_validate({"catalogue": name}).marginal()
    seconds = 365.25 * 86400.0  # 1e-12 m²/s is 31.5576 mm²/yr
    assert marginal.mean == pytest.approx(coefficient * 1e-6 * seconds, rel=1e-5)
    assert marginal.sd == pytest.approx(0.2 * marginal.mean, rel=1e-4)
    assert marginal.support[0] == 0.0


def test_an_unknown_name_is_refused_with_the_nearest() -> None:
    with pytest.raises(QuantityError, match="did you mean 'critical chloride content'"):
        from_catalogue("critical chlorid content", "-")


def test_an_entry_of_another_quantity_is_refused() -> None:
    with pytest.raises(QuantityError, match=r"this entry of the catalogue is in %.*mm"):
        from_catalogue("critical chloride content", "mm")


def test_a_name_stands_alone() -> None:
    with pytest.raises(ValidationError, match="says nothing else"):
        LengthDistribution.model_validate(
            {"catalogue": "cover scatter of beams and slabs", "mean": "7 mm"}
        )


def test_the_schema_offers_what_fits() -> None:
    assert "cover scatter of beams and slabs" in fitting("mm")
    offered = LengthDistribution.model_json_schema()["properties"]["catalogue"]["enum"]
    assert offered == fitting("mm")
