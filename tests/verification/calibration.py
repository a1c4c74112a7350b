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

from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from assess.updating.kind import Rows
from assess.updating.kinds import KINDS
from assess.updating.model import build_model, specify
from assess.updating.sampling import NutpieSampler, Settings
from tests.verification.cases import METER_A, METER_B, base, loss_entry, read
from tests.verification.check import Check

FloatArray = NDArray[np.float64]
Values = Mapping[str, FloatArray]
Spoil = Callable[[Rows, Values], tuple[Rows, Values]]

SETS = 240  # simulated data sets
RANKS = 99  # thinned draws of each posterior, so that ranks go from 0 to 99
THIN = 10
TUNE = 400
SPOILED = 100  # data sets of the test that must fail
BINS = 12
LEVEL = 0.01  # of the test over all variables of a kind
SOURCE = "Talts et al. 2018"


@dataclass(frozen=True, slots=True)
class Design:
    """What is measured, which variables are ranked, and a fault that must be noticed."""

    kind: str
    surveys: tuple[dict[str, Any], ...]
    tables: Mapping[str, str]
    variables: tuple[str, ...]
    spoil: Spoil
    fault: str
    corrosion: bool = False


def _larger_errors(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return rows, {k: 3.0 * v if k.startswith("cores.") else v for k, v in values.items()}


def _noisier_meter(rows: Rows, values: Values) -> tuple[Rows, Values]:
    return replace(rows, extra={**rows.extra, "variance": 4.0 * rows.extra["variance"]}), values


def _blunter_eye(rows: Rows, values: Values) -> tuple[Rows, Values]:
    limit = rows.extra["limit"] + np.log(4.0)
    return replace(rows, extra={**rows.extra, "limit": limit}), values


_CORES = """location;strength [MPa];diameter [mm];length [mm];moisture
K1;31.6;94;141;as received
K2;40.6;94;188;soaked
K3;37.2;94;94;as received
K3;35.0;94;94;as received
K4;39.1;50;100;as received
K5;33.0;50;60;air dried
K6;36.0;50;75;as received
K6;36.0;75;75;as received
"""
_LATER_CORES = """location;strength [MPa];diameter [mm];length [mm];moisture
K3;35.0;94;141;as received
K7;38.0;94;188;as received
K8;34.0;75;150;air dried
"""
_COVER = "location,cover [mm]\n" + "\n".join([",44"] * 12 + [",>50"] * 2) + "\n"
_LATER_COVER = "location,cover [mm]\n" + "\n".join(
    [f"R{i},40" for i in (1, 1, 1, 2, 2, 3, 3, 3)] + [",41"] * 6
)
_LOSS = "location,original diameter [mm],residual diameter [mm]\n" + "\n".join(
    f"B{i},32,{'none' if i % 2 else 31}" for i in range(6)
)
_LATER_LOSS = "location,original diameter [mm],residual diameter [mm]\n" + "\n".join(
    f"B{i},32,30" for i in range(3, 8)
)


def _survey(date: str, kind: str, entry: dict[str, Any]) -> dict[str, Any]:
    return {"date": date, kind: entry}


DESIGNS: tuple[Design, ...] = (
    Design(
        "cores",
        (
            _survey("2010-01-01", "cores", {"table": "a.csv", "zone": "deck"}),
            _survey(
                "2020-01-01", "cores", {"table": "b.csv", "zone": "deck", "within_location": 0.1}
            ),
        ),
        {"a.csv": _CORES, "b.csv": _LATER_CORES},
        (
            "deck.concrete_mean",
            "deck.concrete_scatter",
            "cores.length_correction",
            "cores.diameter_correction",
            "cores.moisture_correction",
            "cores.damage_correction",
        ),
        _larger_errors,
        "correction errors three times as large as the model has them",
    ),
    Design(
        "cover",
        (
            _survey("2010-01-01", "cover", {"table": "a.csv", "zone": "deck", "meter": METER_A}),
            _survey("2020-01-01", "cover", {"table": "b.csv", "zone": "deck", "meter": METER_B}),
        ),
        {"a.csv": _COVER, "b.csv": _LATER_COVER},
        ("deck.cover_mean", "deck.cover_scatter", "cover_meter_1.bias", "cover_meter_2.bias"),
        _noisier_meter,
        "meters with twice the scatter that the model has",
    ),
    Design(
        "section_loss",
        (
            _survey("2005-01-01", "section_loss", loss_entry("a.csv")),
            _survey("2020-01-01", "section_loss", loss_entry("b.csv")),
        ),
        {"a.csv": _LOSS, "b.csv": _LATER_LOSS},
        ("deck.onset", "deck.onset_scatter", "deck.current", "deck.current_scatter"),
        _blunter_eye,
        "a detection limit four times the one that the model has",
        corrosion=True,
    ),
)


class Calibration:
    """One design on one compiled model."""

    def __init__(self, design: Design, folder: Path) -> None:
        self.design = design
        case = base(corrosion=design.corrosion, surveys=design.surveys)
        self.spec = specify(read(folder, case, design.tables))
        self.stages = len(design.surveys)
        self.sampler = NutpieSampler(self.spec, build_model(self.spec, self.stages))

    def ranks(self, sets: int, seed: int, spoil: Spoil | None = None) -> FloatArray:
        """Ranks of the true values, (set, variable of the design); ``spoil`` alters simulation."""
        kind, rows = KINDS[self.design.kind], self.spec.rows[self.design.kind]
        rng = np.random.default_rng(seed)
        prior = self.spec.prior
        truth = prior.physical(rng.standard_normal((sets, len(prior.names))))
        values: Values = {name: truth[:, i] for i, name in enumerate(prior.names)}
        simulated_rows = rows
        if spoil is not None:
            simulated_rows, values = spoil(rows, values)
        measured = kind.simulate(simulated_rows, values, rng)
        columns = [prior.names.index(name) for name in self.design.variables]

        def one(i: int) -> FloatArray:
            data = kind.data(kind.observed(rows, measured[i]), self.stages)
            settings = Settings(1, RANKS * THIN, TUNE, 0.9, int(seed + i))
            chains = self.sampler.sample_data(data, settings, lambda _: None)
            draws = prior.physical(chains.whitened)[0, THIN - 1 :: THIN]
            return np.asarray((draws < truth[i]).sum(axis=0)[columns], dtype=np.float64)

        with ThreadPoolExecutor(2) as pool:
            return np.stack(list(pool.map(one, range(sets))))


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
    place = design.kind.replace("_", " ")
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
