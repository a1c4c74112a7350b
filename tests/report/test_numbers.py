import math

import pytest

from assess.report import numbers
from assess.report.document import Cell, Column, Form, Table, text_cell


@pytest.mark.parametrize(
    ("value", "shown"),
    [
        (1.3e-5, "1.3\u00a0×\u00a010⁻⁵"),
        (9.96e-4, "1.0\u00a0×\u00a010⁻³"),
        (0.0123, "0.012"),
        (0.0, "0"),
        (math.nan, "–"),
    ],
)
def test_probability(value: float, shown: str) -> None:
    assert numbers.probability(value) == shown


@pytest.mark.parametrize(
    ("value", "shown"), [(-0.004, "0.00"), (-1.236, "\u22121.24"), (math.inf, "beyond range")]
)
def test_index_has_a_true_minus_and_no_negative_zero(value: float, shown: str) -> None:
    assert numbers.index(value) == shown


def test_money_has_narrow_spaces_and_the_currency_before() -> None:
    assert numbers.money(1_250_000.4, "EUR") == "EUR\u00a01\u202f250\u202f000"
    assert numbers.cell_text(Cell(4_268_113.0, Form.ESTIMATE)) == "4\u202f270\u202f000"


@pytest.mark.parametrize(
    ("value", "shown"),
    [
        (0.0123456, "0.0123"),
        (1234.5, "1\u202f230"),
        (99.96, "100"),
        (2e-6, "2.00\u00a0×\u00a010⁻⁶"),
    ],
)
def test_significant(value: float, shown: str) -> None:
    assert numbers.significant(value) == shown


def test_percent_never_claims_certainty() -> None:
    assert numbers.percent(0.999).startswith(">")
    assert numbers.percent(0.001).startswith("<")
    assert numbers.percent(1.0) == "100\u00a0%"
    assert numbers.percent(-0.08) == "\u22128\u00a0%"


def test_year_interval_beyond_the_horizon() -> None:
    assert numbers.year_interval(None, None, 2055) == "after 2055"
    assert numbers.year_interval(2031, 2031, 2055) == "2031"


def test_empty_cells_show_a_dash() -> None:
    assert numbers.cell_text(Cell(None)) == numbers.EMPTY
    assert numbers.cell_text(Cell((1.0, None), Form.INDEX)) == numbers.EMPTY


def test_a_ragged_table_is_refused() -> None:
    with pytest.raises(ValueError, match="a row of 1 cells given, 2 allowed"):
        Table("t", [Column("a"), Column("b")], [[text_cell("only one")]])
