"""A kind's log-likelihood as the sampler sees it: a graph of independent standard normals."""

from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray

from assess.updating.kind import EvidenceKind, Rows
from assess.updating.variables import JointPrior

FloatArray = NDArray[np.float64]
Graph = Callable[[FloatArray], tuple[float, FloatArray]]


def graph(kind: EvidenceKind, rows: Rows, prior: JointPrior, stage: int) -> Graph:
    """Compile log-likelihood and gradient with respect to the whitened scores."""
    pytensor = pytest.importorskip("pytensor")
    tensor = pytensor.tensor
    whitened = tensor.dvector("whitened")
    values = prior.values([whitened[i] for i in range(len(prior.names))])
    data = {name: tensor.as_tensor(array) for name, array in kind.data(rows, stage).items()}
    value = kind.log_likelihood(rows, values, data)
    gradient = tensor.grad(value, whitened, disconnected_inputs="ignore")
    compiled = pytensor.function([whitened], [value, gradient], mode="FAST_COMPILE")

    def evaluate(at: FloatArray) -> tuple[float, FloatArray]:
        found = compiled(at)
        return float(found[0]), np.asarray(found[1])

    return evaluate


def numbers(kind: EvidenceKind, rows: Rows, prior: JointPrior, stage: int, at: FloatArray) -> float:
    """Give the log-likelihood at whitened scores by NumPy."""
    physical = prior.physical(at)
    values = {name: physical[..., i] for i, name in enumerate(prior.names)}
    return float(kind.log_likelihood(rows, values, kind.data(rows, stage)))


def check(kind: EvidenceKind, rows: Rows, prior: JointPrior, stage: int) -> None:
    """Assert that graph and numbers agree, and that the gradient is right and always finite."""
    evaluate = graph(kind, rows, prior, stage)
    rng = np.random.default_rng(7)
    count = len(prior.names)
    for at in rng.standard_normal((5, count)):
        value, gradient = evaluate(at)
        assert value == pytest.approx(numbers(kind, rows, prior, stage, at), rel=1e-9, abs=1e-9)
        step = 1e-5 * np.eye(count)
        slope = [
            (numbers(kind, rows, prior, stage, at + h) - numbers(kind, rows, prior, stage, at - h))
            / 2e-5
            for h in step
        ]
        np.testing.assert_allclose(gradient, slope, rtol=1e-3, atol=2e-4)
    # A sampler starts anywhere and overshoots.
    for at in 6.0 * rng.choice([-1.0, 1.0], (60, count)):
        value, gradient = evaluate(at)
        assert np.isfinite(value)
        assert np.all(np.isfinite(gradient))
