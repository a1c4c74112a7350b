"""Quick comparisons of formulas with published and independently computed values."""

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd

from assess.decisions.design_values import (
    annex_d_factor,
    design_value_gumbel,
    design_value_lognormal,
    design_value_lognormal_approximate,
    design_value_normal,
)
from assess.mechanics.concrete import predictive_quantile, strength_prior
from assess.mechanics.corrosion import penetration_depth
from assess.probability.dependence import spearman_to_score
from assess.probability.marginals import make_marginal
from assess.probability.pearson import attainable_pearson, pearson_to_score
from assess.reliability.index import index_for_period
from tests.verification.check import MEMORY, RECOMPUTED, SEEN, Check

PUBLISHED = Path(__file__).parents[1] / "published"
NATAF = "Liu & Der Kiureghian 1986"
EN = "EN 1990:2002"


def formulas() -> Iterator[Check]:
    """Go through all quick comparisons."""
    yield from _corrosion()
    yield from _dependence()
    yield from _periods()
    yield from _design_values()
    yield from _strength()


def _corrosion() -> Iterator[Check]:
    depth = float(penetration_depth(1.0, 1.0))
    yield Check(
        "RILEM TC 154-EMC", "V = 0.0116 i", "loss of radius at 1 µA/cm² [mm/yr]", 0.0116, depth,
        5e-5, SEEN,
    )  # fmt: skip
    exact = 55.845 / (2 * 96485.33212 * 7.87) * 1e-6 * 365.25 * 86400.0 * 10.0
    yield Check(
        "Faraday's law", "iron, density 7.87 g/cm³", "loss of radius at 1 µA/cm² [mm/yr]", exact,
        depth, 1e-9, RECOMPUTED,
    )  # fmt: skip


def _dependence() -> Iterator[Check]:
    lognormal = {v: make_marginal("lognormal", mean=1.0, V=v) for v in (0.1, 0.2, 0.3, 0.5, 1.0)}
    gumbel = make_marginal("gumbel", mean=1.0, V=0.3)
    normal = make_marginal("normal", mean=0.0, sd=1.0)
    uniform = make_marginal("uniform", lower=0.0, upper=1.0)
    limits = (
        ("lognormal V 0.1, 0.5", lognormal[0.1], lognormal[0.5], -0.920553, 0.964969),
        ("lognormal V 0.2, 1", lognormal[0.2], lognormal[1.0], -0.760027, 0.896264),
        ("lognormal V 1, 1", lognormal[1.0], lognormal[1.0], -0.5, 1.0),
        ("Gumbel, Gumbel", gumbel, gumbel, -0.885932, 1.0),
        ("normal, Gumbel", normal, gumbel, -0.969464, 0.969464),
        ("normal, lognormal V 0.3", normal, lognormal[0.3], -0.978535, 0.978535),
        ("normal, uniform", normal, uniform, -0.977205, 0.977205),
        ("lognormal V 0.3, Gumbel", lognormal[0.3], gumbel, -0.902045, 0.999092),
    )
    for pair, first, second, low, high in limits:
        found = attainable_pearson(first, second)
        for word, value, limit in zip(("least", "largest"), found, (low, high), strict=True):
            yield Check(
                "Fréchet-Hoeffding bounds", pair, f"{word} Pearson coefficient", limit, value, 2e-6
            )
    factors = (
        ("normal, uniform", normal, uniform, 0.5, 1.023, 6e-4),
        ("normal, Gumbel", normal, gumbel, 0.5, 1.031, 6e-4),
        ("Gumbel, Gumbel", gumbel, gumbel, 0.5, 1.064 - 0.069 * 0.5 + 0.005 * 0.25, 1e-3),
        ("uniform, Gumbel", uniform, gumbel, 0.5, 1.055 + 0.015 * 0.25, 1e-3),
        ("uniform, uniform", uniform, uniform, 0.5, 1.047 - 0.047 * 0.25, 1e-3),
        ("lognormal V 0.3, Gumbel", lognormal[0.3], gumbel, 0.5,
         1.029 + 0.0005 + 0.0042 + 0.001 + 0.233 * 0.09 - 0.197 * 0.15, 3e-3),
    )  # fmt: skip
    for pair, first, second, rho, printed, allowed in factors:
        found = pearson_to_score(rho, first, second) / rho
        quantity = f"score over Pearson coefficient, {rho:g}"
        yield Check(NATAF, pair, quantity, printed, found, allowed, MEMORY)
    scores = (
        ("lognormal V 0.3, Gumbel", lognormal[0.3], gumbel, 0.513318),
        ("Gumbel, Gumbel", gumbel, gumbel, 0.515428),
        ("normal, Gumbel", normal, gumbel, 0.515749),
        ("lognormal V 0.2, 0.2", lognormal[0.2], lognormal[0.2], 0.504902),
        ("lognormal V 0.5, 0.5", lognormal[0.5], lognormal[0.5],
         float(np.log1p(0.5 * 0.25) / np.log1p(0.25))),
    )  # fmt: skip
    for pair, first, second, exact in scores:
        found = pearson_to_score(0.5, first, second)
        yield Check(NATAF, pair, "score for Pearson 0.5", exact, found, 2e-6)
    yield Check("Kruskal 1958", "2 sin(pi r / 6)", "score for Spearman 0.5", 0.517638,
                spearman_to_score(0.5), 1e-6)  # fmt: skip


def _periods() -> Iterator[Check]:
    table = pd.read_csv(
        PUBLISHED / "index_for_period_recomputed.csv", comment="#", index_col="index"
    )
    for index, row in table.iterrows():
        for years in ("5", "50", "100"):
            found = float(index_for_period(float(str(index)), float(years)))
            yield Check(
                EN, "eq. C.3", f"index of {years} years from {index}", float(row[years]), found,
                6e-5,
            )  # fmt: skip
    yield Check(EN, "table B2, RC2", "index of 50 years from 4.7", 3.8,
                float(index_for_period(4.7, 50.0)), 0.05, SEEN,
                note="one decimal")  # fmt: skip


def _design_values() -> Iterator[Check]:
    resistance, action = (30.0, 0.15, 3.8, 0.8), (100.0, 0.35, 3.8, -0.7)
    for quantity, expected, found in (
        ("normal resistance", 16.3200, design_value_normal(*resistance)),
        ("lognormal resistance, V < 0.2", 19.0144, design_value_lognormal_approximate(*resistance)),
        ("lognormal resistance", 18.8518, design_value_lognormal(*resistance)),
        ("normal action", 193.1000, design_value_normal(*action)),
        ("Gumbel action", 235.5138, design_value_gumbel(*action)),
    ):
        yield Check(EN, "table C3", f"design value, {quantity}", expected, float(found), 6e-5)
    printed = pd.read_csv(PUBLISHED / "en1990_table_d.csv", comment="#", index_col="tests")
    for n in (3.0, 5.0, 10.0, 30.0):
        found = float(annex_d_factor(n, 0.05, False))
        value = float(printed.loc[n, "d1_unknown"])
        yield Check(EN, "table D1", f"k, n = {n:g}, V unknown, closed form", value, found, 0.017,
                    MEMORY)  # fmt: skip


def _strength() -> Iterator[Check]:
    table = pd.read_csv(PUBLISHED / "jcss_strength_priors.csv", comment="#")
    for row in table.to_dict("records"):
        prior = strength_prior(row["grade"], row["production"])
        found = float(predictive_quantile(prior, 0.05))
        yield Check("JCSS Probabilistic Model Code", f"part 3.1, {row['production']}",
                    f"5 % of {row['grade']} [MPa]", float(row["p05"]), found, 6e-4)  # fmt: skip
