"""Every kind's likelihood takes all draws at once, and says of each what it says of it alone."""

from importlib import import_module
from pathlib import Path
from pkgutil import iter_modules

import numpy as np
import pytest

from assess.updating.kinds import KINDS
from assess.updating.model import specify
from tests.verification import designs
from tests.verification.cases import base, read

NAMES = sorted(module.name for module in iter_modules(designs.__path__))


@pytest.mark.parametrize("name", NAMES)
def test_draws_together_have_the_log_likelihoods_that_each_has_alone(
    name: str, tmp_path: Path
) -> None:
    design = import_module(f"{designs.__name__}.{name}").DESIGN
    case = base(corrosion=design.corrosion, surveys=design.surveys)
    case["zones"]["deck"] |= design.zone
    spec = specify(read(tmp_path, case | design.case, design.tables))
    kind, rows = KINDS[design.kind], spec.rows[design.kind]
    physical = spec.prior.physical(
        np.random.default_rng(4).standard_normal((7, len(spec.prior.names)))
    )
    values = dict(zip(spec.prior.names, physical.T, strict=True))
    for stage in (1, len(design.surveys)):
        data = kind.data(rows, stage)
        together = kind.log_likelihood(rows, values, data)
        alone = [
            kind.log_likelihood(rows, {n: v[i] for n, v in values.items()}, data) for i in range(7)
        ]
        assert together.shape == (7,)
        np.testing.assert_allclose(together, np.array(alone), rtol=1e-12)
        assert np.ptp(together) > 0.0
