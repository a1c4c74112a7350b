import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from assess.mechanics.dimensions import (
    COVER_DEVIATIONS,
    dimension_deviation,
    effective_depth,
    effective_depth_of_layers,
)

PMC = "JCSS Probabilistic Model Code"


@given(st.floats(100.0, 2000.0), st.floats(0.0, 90.0), st.floats(0.0, 50.0))
def test_more_cover_never_deepens(depth, cover, more):
    before = effective_depth(depth, cover, 10.0, 20.0)
    assert effective_depth(depth, cover + more, 10.0, 20.0) <= before
    layered = effective_depth_of_layers(depth, cover + more, 10.0, [20.0, 16.0], [900, 400], [25])
    assert layered <= effective_depth_of_layers(depth, cover, 10.0, [20, 16], [900, 400], [25])


def test_one_layer_is_the_simple_formula():
    single = effective_depth_of_layers(600.0, 35.0, 8.0, [25.0], [1000.0], [])
    assert float(single) == effective_depth(600.0, 35.0, 8.0, 25.0) == 544.5


def test_layers_by_hand():
    # Centres at 30 + 10 + 12.5 = 52.5 and 30 + 10 + 25 + 30 + 8 = 103 mm from the edge.
    found = effective_depth_of_layers(700.0, 30.0, 10.0, [25.0, 16.0], [1500.0, 500.0], [30.0])
    assert float(found) == pytest.approx(700.0 - (1500 * 52.5 + 500 * 103.0) / 2000)


def test_losing_the_outer_layer_raises_the_centroid():
    left = np.array([1500.0, 750.0, 0.0])
    found = effective_depth_of_layers(700.0, 30.0, 10.0, [25.0, 16.0], [left, 500.0], [30.0])
    assert np.all(np.diff(found) < 0)
    assert found[-1] == pytest.approx(700.0 - 103.0)


def test_layers_refuse_unequal_lists():
    with pytest.raises(ValueError, match="got 2 diameters, 1 areas, 1 clear distances"):
        effective_depth_of_layers(700.0, 30.0, 10.0, [25.0, 16.0], [1500.0], [30.0])


@pytest.mark.published(source=PMC, place="part 3.10, eqs 2 and 3")
@pytest.mark.parametrize(
    ("nominal", "mean", "sd"),
    [(200.0, 0.6, 5.2), (500.0, 1.5, 7.0), (1000.0, 3.0, 10.0), (2500.0, 3.0, 10.0)],
)
def test_dimension_deviation(nominal, mean, sd):  # formula published, values worked by hand
    assert [float(v) for v in dimension_deviation(nominal)] == pytest.approx([mean, sd])


@pytest.mark.published(source=PMC, place="part 3.10, eqs 10 to 17")
def test_cover_deviations():
    assert COVER_DEVIATIONS["column or wall"] == ((0, 5), (5, 10))
    assert COVER_DEVIATIONS["slab bottom"] == ((0, 10), (5, 10))
    assert COVER_DEVIATIONS["beam bottom"] == ((-10, 0), (5, 10))
    assert COVER_DEVIATIONS["slab or beam top"] == ((0, 10), (10, 15))


def test_dimension_deviation_refuses_nothing():
    with pytest.raises(ValueError, match="positive .*got 0"):
        dimension_deviation(0.0)
