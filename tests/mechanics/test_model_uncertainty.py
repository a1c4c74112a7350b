from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from assess.mechanics import model_uncertainty as module

PUBLISHED = Path(__file__).parents[1] / "published" / "jcss_model_uncertainties.csv"


@pytest.mark.published(source="JCSS Probabilistic Model Code", place="part 3.9, table 3.9.1")
def test_table():
    table = pd.read_csv(PUBLISHED, comment="#")
    assert set(table.name) == set(module.MODEL_UNCERTAINTIES)
    for row in table.itertuples():
        found = module.model_uncertainty(row.name)
        assert (found.mean, found.variation) == (row.mean, row.variation)
        assert "3.9.1" in found.source


@pytest.mark.published(source="JCSS Probabilistic Model Code", place="part 2.1, weight densities")
def test_self_weights():
    ordinary = module.SELF_WEIGHTS["ordinary concrete"]
    assert (ordinary.density, ordinary.variation) == (24.0, 0.04)
    high = module.SELF_WEIGHTS["high-strength concrete"]  # 24 to 26 printed
    assert 24.0 <= high.density <= 26.0
    assert high.variation == 0.03
    assert module.SELF_WEIGHTS["steel"].density == 77.0


def test_unknown_row_names_the_known():
    with pytest.raises(ValueError, match="no model uncertainty 'bending'; known: .*concrete: bend"):
        module.model_uncertainty("bending")


def test_large_part_by_its_definition():
    # Variance of the mean of 400 values with pairwise correlation 0.85: V² (rho + (1-rho)/400).
    covariance = 0.04**2 * (0.85 + 0.15 * np.eye(400))
    by_sum = np.sqrt(covariance.mean())
    found = module.large_part_variation(0.04, 0.85)
    assert found == pytest.approx(by_sum, rel=5e-4)
    assert found == pytest.approx(0.92195 * 0.04, rel=1e-5)
    assert module.large_part_variation(1.0, 0.70) == pytest.approx(0.83666, abs=5e-6)


def test_large_part_refuses_impossible_correlation():
    with pytest.raises(ValueError, match=r"in \[0, 1\], got 1.2"):
        module.large_part_variation(0.04, 1.2)
