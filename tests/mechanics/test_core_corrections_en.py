"""EN 13791:2019 and BS 1881-120, from memory."""

import numpy as np
import pytest

from assess.mechanics.core_corrections_en import bar_correction, length_correction_en


def test_ends_are_those_of_the_standard_and_the_shape_lies_between():
    found = length_correction_en(100.0, [90.0, 100.0, 120.0, 150.0, 200.0, 210.0])
    assert found.factor[[0, 1, 4, 5]] == pytest.approx([0.82, 0.82, 1.0, 1.0])
    # BS 1881-120, relative to a core of l/d = 2: 0.8571 at 1.2 and 0.9231 at 1.5, scaled.
    assert found.factor[2:4] == pytest.approx([1 - 0.1429 * 0.9, 1 - 0.0769 * 0.9], abs=1e-4)
    assert found.V[[1, 3, 4]] == pytest.approx([0.025, 0.00625, 0.0])


def test_shapes_beyond_the_standard_are_refused():
    with pytest.raises(ValueError, match=r"core diameter .* 71.25 to 210, got 50"):
        length_correction_en([100.0, 50.0], 100.0)
    with pytest.raises(ValueError, match=r"length over diameter .* got 2.5"):
        length_correction_en(100.0, 250.0)


def test_bars_raise_the_strength_by_their_distance_from_the_end():
    none = bar_correction(100.0, 150.0, [0.0, np.nan], [0.0, np.nan])
    one = bar_correction(100.0, 150.0, [12.0, np.nan], [40.0, np.nan])
    two = bar_correction(100.0, 150.0, [12.0, 10.0], [40.0, 60.0])
    assert none == 1.0
    assert one == pytest.approx(1.0 + 1.5 * 12.0 * 40.0 / (100.0 * 150.0))
    assert two == pytest.approx(1.0 + 1.5 * (480.0 + 600.0) / 15_000.0)
