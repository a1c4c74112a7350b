"""Simulation-based calibration of the kinds of evidence.

Draw the common variables from the prior, simulate data of a fixed design, sample the posterior:
the rank of the true value among thinned draws is uniform if, and only if within what a rank can
show, simulator, likelihood and sampler belong together.

References
----------
.. [1] S. Talts, M. Betancourt, D. Simpson, A. Vehtari, A. Gelman, Validating Bayesian inference
   algorithms with simulation-based calibration, arXiv:1804.06788 (2018).
.. [2] D. Modrák et al., Simulation-based calibration checking for Bayesian computation: the
   choice of test quantities shapes sensitivity, Bayesian Anal. (2023).
"""

from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from assess.updating.kind import Rows
from assess.updating.kinds import KINDS
from assess.updating.model import build_model, specify
from assess.updating.sampling import NutpieSampler, Settings
from assess.updating.strength_places import given
from tests.verification.cases import base, read
from tests.verification.check import Check
from tests.verification.design import Design, Spoil, Values, title

FloatArray = NDArray[np.float64]
Data = Callable[[int], dict[str, NDArray[Any]]]  # of the model, by the number of the data set

SETS = 240  # simulated data sets
RANKS = 99  # thinned draws of each posterior, so that ranks go from 0 to 99
THIN = 10
TUNE = 400
SPOILED = 100  # data sets of the test that must fail
BINS = 12
LEVEL = 0.01  # of the test over all variables of a kind
SOURCE = "Talts et al. 2018"


class Calibration:
    """One design on one compiled model."""

    def __init__(self, design: Design, folder: Path) -> None:
        self.design = design
        case = base(corrosion=design.corrosion, surveys=design.surveys)
        case["zones"]["deck"] |= design.zone
        case |= design.case
        spec = specify(read(folder, case, design.tables))
        self.spec = replace(
            spec, rows={key: spec.rows[key] for key in (*design.before, design.kind)}
        )
        self.stages = len(design.surveys)
        self.sampler = NutpieSampler(self.spec, build_model(self.spec, self.stages))

    def ranks(self, sets: int, seed: int, spoil: Spoil | None = None) -> FloatArray:
        """Ranks of the true values, (set, variable of the design); ``spoil`` alters simulation."""
        rng = np.random.default_rng(seed)
        prior = self.spec.prior
        truth = prior.physical(rng.standard_normal((sets, len(prior.names))))
        values: Values = {name: truth[:, i] for i, name in enumerate(prior.names)}
        simulated = self._together if self.design.before else self._at_once
        data = simulated(values, rng, spoil)
        columns = [prior.names.index(name) for name in self.design.variables]

        def one(i: int) -> FloatArray:
            settings = Settings(1, RANKS * THIN, TUNE, 0.9, int(seed + i))
            chains = self.sampler.sample_data(data(i), settings, lambda _: None)
            draws = prior.physical(chains.whitened)[0, THIN - 1 :: THIN]
            return np.asarray((draws < truth[i]).sum(axis=0)[columns], dtype=np.float64)

        with ThreadPoolExecutor(2) as pool:
            return np.stack(list(pool.map(one, range(sets))))

    def _at_once(self, values: Values, rng: np.random.Generator, spoil: Spoil | None) -> Data:
        """Simulate all data sets of the kind; give the model's data of each."""
        kind, rows = KINDS[self.design.kind], self.spec.rows[self.design.kind]
        simulated_rows = rows
        if spoil is not None:
            simulated_rows, values = spoil(rows, values)
        measured = kind.simulate(simulated_rows, values, rng)
        return lambda i: kind.data(kind.observed(rows, measured[i]), self.stages)

    def _together(self, values: Values, rng: np.random.Generator, spoil: Spoil | None) -> Data:
        """Simulate one data set after the other, each kind given those before it."""
        found = []
        for i in range(len(next(iter(values.values())))):
            one = {name: draws[i : i + 1] for name, draws in values.items()}
            known: dict[str, Rows] = {}
            data: dict[str, NDArray[Any]] = {}
            for key in (*self.design.before, self.design.kind):
                rows = given(self.spec.rows[key], known)
                source, drawn = rows, one
                if spoil is not None and key == self.design.kind:
                    source, drawn = spoil(rows, one)
                measured = KINDS[key].simulate(source, drawn, rng)[0]
                known[key] = KINDS[key].observed(rows, measured)
                data |= KINDS[key].data(known[key], self.stages)
            found.append(data)
        return found.__getitem__


def smallest_p(ranks: FloatArray, seed: int = 5) -> tuple[float, int]:
    """Smallest p-value over variables and two tests, times their number (Bonferroni).

    Chi-square on binned ranks finds any shape; Kolmogorov-Smirnov, on ranks spread within their
    steps, finds shifts. The second value tells the variable.
    """
    jitter = np.random.default_rng(seed).uniform(size=ranks.shape)
    p_values = []
    for ranked, spread in zip(ranks.T, jitter.T, strict=True):
        uniform = (ranked + spread) / (RANKS + 1)
        counts = np.histogram(uniform, bins=BINS, range=(0.0, 1.0))[0]
        ks = stats.kstest(uniform, "uniform").pvalue
        p_values.append((float(stats.chisquare(counts).pvalue), float(ks)))
    table = np.array(p_values)
    worst = int(table.min(axis=1).argmin())
    return min(1.0, float(table.min()) * table.size), worst


def calibrate(design: Design, folder: Path, sets: int = SETS) -> Iterator[Check]:
    """Check that ranks are uniform, and that they are not when the data come from elsewhere."""
    calibration = Calibration(design, folder)
    p, worst = smallest_p(calibration.ranks(sets, 1_000))
    place = title(design)
    names = len(design.variables)
    yield Check(
        SOURCE, place, f"p of uniform ranks, {names} variables, {sets} data sets", None, p, LEVEL,
        "bound of this test", at_least=True, note=f"smallest: {design.variables[worst]}",
    )  # fmt: skip
    spoiled, worst = smallest_p(calibration.ranks(SPOILED, 2_000, design.spoil))
    yield Check(
        SOURCE, place, f"p with {design.fault}: must be small", None, spoiled, LEVEL,
        "bound of this test", note=f"smallest: {design.variables[worst]}",
    )  # fmt: skip
