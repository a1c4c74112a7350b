"""A run record as a real run would leave it, seeded; numbers are invented, relations are kept."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import ndtr, ndtri

from assess.decisions.results import (
    Conflict,
    DataRecord,
    IndexCurve,
    OptionResult,
    PowerScaling,
    Provenance,
    RunRecord,
    SectionResult,
    StageRecord,
    Standing,
    Target,
    VariableRecord,
    Verdict,
)

STAGES = ("prior", "survey 2019-06-12", "survey 2025-09-30")
YEARS = np.arange(2026, 2056)
TARGET = Target(3.3, 1, "EN 1990", "RC1", "EN 1990:2002, Annex B, Table B2")
ZONES = ("girder soffits", "pier columns")

# name, label, symbol, unit, zone, median, log-sd at each stage, shift of the log-median
VARIABLES = [
    ("fc_mean", "mean concrete strength", "µ_fc", "MPa", 0, 38.0, (0.15, 0.08, 0.05), 0.08),
    ("fc_scatter", "scatter of concrete strength", "σ_fc", "-", 0, 0.14, (0.4, 0.25, 0.18), 0.1),
    ("cover_mean", "mean cover", "µ_c", "mm", 0, 38.0, (0.2, 0.05, 0.03), -0.18),
    ("cover_scatter", "scatter of cover", "σ_c", "mm", 0, 8.0, (0.35, 0.12, 0.08), -0.1),
    ("surface_chloride", "surface chloride content", "C_s", "wt-%", 0, 2.4, (0.5, 0.3, 0.2), 0.2),
    ("diffusion", "apparent diffusion coefficient", "D_a", "mm²/yr", 0, 22.0, (0.7, 0.4, 0.25),
     0.3),
    ("onset", "median time to onset of corrosion", "t_i", "yr", 0, 38.0, (0.6, 0.35, 0.2), -0.3),
    ("rate", "median corrosion current density", "i_corr", "µA/cm²", 0, 0.9, (1.2, 0.6, 0.35),
     -0.2),
    ("pit", "pit factor of the main bars, ratio of deepest to mean penetration", "R", "-", 0, 5.0,
     (0.3, 0.25, 0.22), 0.05),
    ("yield_mean", "mean yield strength", "µ_fy", "MPa", 0, 480.0, (0.06, 0.05, 0.03), 0.02),
    ("asphalt", "asphalt thickness", "h_a", "mm", 0, 110.0, (0.25, 0.25, 0.12), 0.15),
    ("model_bending", "model uncertainty, bending", "θ_R", "-", 0, 1.05, (0.07, 0.07, 0.07), 0.0),
]  # fmt: skip

SECTIONS = [  # name, member, zone, index at each stage in 2026, slope per year, governing
    ("G1 midspan", "girder 1", 0, (3.9, 4.1, 4.35), 0.012, "mean yield strength"),
    ("G2 midspan", "girder 2", 0, (3.6, 3.3, 2.92), 0.045, "median corrosion current density"),
    ("G2 support, shear", "girder 2", 0, (3.7, 3.75, 3.84), 0.030, "model uncertainty, shear"),
    ("G3 midspan", "girder 3", 0, (3.6, 3.5, 3.62), 0.038, "median time to onset of corrosion"),
    ("P1 base", "pier 1", 1, (3.8, 3.9, 4.02), 0.016, "mean concrete strength"),
    ("P2 base, axial force and bending", "pier 2", 1, (3.5, 3.2, 2.61), 0.020, "mean cover"),
]
OPTIONS = [  # name, lift of the index, factor of the slope, cost
    ("leave", 0.0, 1.0, None),
    ("cathodic protection", 0.0, 0.15, 420_000.0),
    ("strengthen girder 2", 0.9, 1.0, 310_000.0),
    ("limit to 16 t", 0.45, 1.0, 35_000.0),
]


def make_curve(
    start: float, slope: float, width: float, period: int = 1, *, cumulative: bool = False
) -> IndexCurve:
    """A declining index; the cumulative one follows from its annual probabilities."""
    age = YEARS - YEARS[0]
    index = start - slope * age - 0.0006 * age**1.6
    probability = ndtr(-index)
    periods = np.full(len(YEARS), period)
    if cumulative:
        probability = 1.0 - np.cumprod(1.0 - probability)
        index = -ndtri(probability)
        periods = age + 1
    spread = width * (1.0 + 0.03 * age)
    return IndexCurve(
        year=YEARS.copy(),
        period=periods,
        index=index,
        low=index - 1.0 * spread,
        high=index + 1.25 * spread,
        integration_error=np.full(len(YEARS), 0.0012),
        mcmc_error=np.full(len(YEARS), 0.014),
        failure_probability=probability,
    )


def make_verdict(curve: IndexCurve, target: float, governing: str) -> Verdict:
    """The verdict that the curve itself implies."""

    def first_below(values: np.ndarray) -> int | None:
        below = np.flatnonzero(values < target)
        return int(curve.year[below[0]]) if len(below) else None

    year = first_below(curve.index)
    factor = None
    if year is None:
        standing = Standing.MEETS
    elif year > int(curve.year[0]):
        standing = Standing.MEETS_UNTIL
    elif curve.index[0] > target - 0.5:
        standing, factor = Standing.BELOW_LIMITABLE, 0.78
    else:
        standing = Standing.BELOW
    share = float(ndtr((target - curve.index[-1]) / (curve.high[-1] - curve.index[-1])))
    return Verdict(
        standing, year, first_below(curve.low), first_below(curve.high), share, factor, governing
    )


def make_result(section: tuple, stage: int, option: tuple) -> SectionResult:
    name, member, zone, starts, slope, governing = section
    _, lift, factor, _ = option
    width = (0.75, 0.45, 0.3)[stage]
    start = starts[stage] + (lift if "2" in member or option[0].startswith("limit") else 0.0)
    annual = make_curve(start, slope * factor, width)
    dropped = make_curve(start + 0.28, slope * factor * 0.8, width)
    last = stage == len(STAGES) - 1
    influences = np.array([0.62, 0.5, 0.4, 0.3, 0.2])
    influences /= np.sqrt((influences**2).sum())
    names = (governing, "annual maximum of traffic load", "model uncertainty", "dead load",
             "local pit depth")  # fmt: skip
    return SectionResult(
        section=name,
        member=member,
        zone=ZONES[zone],
        stage=STAGES[stage],
        option=option[0],
        annual=annual,
        cumulative=make_curve(start, slope * factor, width, cumulative=True),
        reference=annual,
        independent=dropped if last else None,
        verdict=make_verdict(annual, TARGET.index, governing),
        verdict_independent=make_verdict(dropped, TARGET.index, governing) if last else None,
        sensitivities=dict(zip(names, influences, strict=True)),
        evaluations=128_000,
        note="error larger than asked for" if name == "G3 midspan" and last else "",
    )


def make_variables(rng: np.random.Generator) -> list[VariableRecord]:
    """Correlated lognormal draws; the surveys bring onset and rate, and others, into a ridge."""
    size = len(VARIABLES)
    found: dict[tuple[int, int], dict[str, np.ndarray]] = {}
    for stage, name in enumerate(STAGES):
        matrix = np.eye(size)
        strength = (0.0, 0.55, 0.82)[stage]
        for i, j, rho in [(6, 7, 1.0), (4, 5, -0.7), (2, 3, -0.35), (0, 1, 0.4), (7, 8, -0.6)]:
            matrix[i, j] = matrix[j, i] = rho * strength
        if stage == 0:
            matrix[4, 5] = matrix[5, 4] = 0.3
        root = np.linalg.cholesky(matrix)
        for zone in range(2):
            normal = rng.standard_normal((4, 1000, size)) @ root.T
            for k, item in enumerate(VARIABLES):
                median, sds, shift = item[5], item[6], item[7]
                centre = np.log(median) + (0.0, 0.7, 1.0)[stage] * shift * (1 if zone == 0 else -1)
                draws = np.exp(centre + sds[stage] * normal[..., k])
                found.setdefault((zone, k), {})[name] = draws
    out = []
    for zone in range(2):
        for k, (name, label, symbol, unit, *_rest) in enumerate(VARIABLES):
            out.append(
                VariableRecord(
                    name=f"{ZONES[zone]}.{name}",
                    label=f"{label}, {ZONES[zone]}",
                    symbol=symbol,
                    unit=unit,
                    zone=ZONES[zone],
                    source="drawing 12-4, 1967" if "cover" in name else "JCSS PMC Part 3",
                    used=not (zone == 1 and name == "asphalt"),
                    draws=found[zone, k],
                )
            )
    return out


def make_data(rng: np.random.Generator) -> list[DataRecord]:
    plans = [
        ("2019", "2019-06-12", "cores", "Core strengths", 0, "MPa", 39.5, 0.14, 14, 0, 0,
         "fc_mean", ("G1 midspan",)),
        ("2019", "2019-06-12", "cover", "Cover meter readings", 0, "mm", 33.0, 0.22, 420, 12, 0,
         "cover_mean", ("G1 midspan", "G2 midspan", "G3 midspan")),
        ("2019", "2019-06-12", "chloride", "Chloride profiles", 0, "wt-%", 1.1, 0.6, 36, 0, 0,
         "surface_chloride", ()),
        ("2025", "2025-09-30", "section loss", "Bar penetration at break-outs", 0, "mm", 0.4, 0.8,
         24, 0, 8, "rate", ("G2 midspan",)),
        ("2025", "2025-09-30", "cores", "Core strengths", 1, "MPa", 33.0, 0.13, 9, 0, 0, "fc_mean",
         ("P1 base",)),
        ("2025", "2025-09-30", "cover", "Cover meter readings", 1, "mm", 45.0, 0.2, 260, 4, 0,
         "cover_mean", ("P1 base",)),
    ]  # fmt: skip
    out = []
    for survey, date, kind, title, zone, unit, mean, v, count, cens, absent, var, seen in plans:
        values = mean * np.exp(v * rng.standard_normal(count - cens - absent))
        predictive = {
            stage: mean * np.exp(shift + w * v * rng.standard_normal(2000))
            for stage, w, shift in zip(STAGES, (2.0, 1.25, 1.1), (0.2, 0.04, 0.0), strict=True)
        }
        smallest = 0.005 if kind == "cover" else 0.3
        checks = {
            STAGES[0]: {"mean": 0.04, "scatter": 0.31},
            STAGES[2]: {"mean": 0.52, "scatter": 0.44, "minimum": smallest},
        }
        out.append(
            DataRecord(
                survey=survey, date=date, kind=kind, title=title, zone=ZONES[zone], unit=unit,
                log_scale=kind in ("chloride", "section loss"), values=values, count=count,
                censored=cens, absent=absent, sections=seen,
                path=f"case_data/girder_bridge/{kind.replace(' ', '_')}_{survey}.csv",
                variable=f"{ZONES[zone]}.{var}", predictive=predictive, p_values=checks,
            )
        )  # fmt: skip
    return out


def make_record(seed: int = 20260901) -> RunRecord:
    rng = np.random.default_rng(seed)
    results = [
        make_result(section, stage, OPTIONS[0])
        for stage in range(len(STAGES))
        for section in SECTIONS
    ]
    results += [
        make_result(section, len(STAGES) - 1, option)
        for option in OPTIONS[1:]
        for section in SECTIONS
    ]
    last = {(item.section, item.option): item for item in results if item.stage == STAGES[-1]}
    options = []
    for name, _, _, cost in OPTIONS:
        gained = {}
        for section in SECTIONS:
            before = last[section[0], "leave"].verdict.crossing_year
            after = last[section[0], name].verdict.crossing_year
            if before is not None:
                gained[section[0]] = None if after is None else after - before
        here = [item for (_, option), item in last.items() if option == name]
        risk = sum(float(item.cumulative.failure_probability[-1]) for item in here) * 8e6 * 0.6
        below = sum(bool(item.reference.index[-1] < TARGET.index) for item in here)
        text = {
            "leave": "No intervention; inspection as today.",
            "cathodic protection": "Impressed current on all girders and pier bases in 2027.",
            "strengthen girder 2": "Bonded plates at girder 2, jacket at pier 2, in 2027.",
            "limit to 16 t": "Sign and enforce a limit of 16 t for all lanes.",
        }[name]
        options.append(OptionResult(name, text, cost or 0.0, risk, below, gained))
    stages = [
        StageRecord("prior", "", 4, 1000, float("nan"), float("nan"), float("nan"), 0, "", False,
                    True, ()),
        StageRecord(STAGES[1], "2019-06-12", 4, 1000, 1.004, 1480.0, 1120.0, 0,
                    "median corrosion current density, girder soffits", False, True, ()),
        StageRecord(STAGES[2], "2025-09-30", 4, 1000, 1.006, 930.0, 780.0, 0,
                    "median time to onset of corrosion, girder soffits", True, True, ()),
    ]  # fmt: skip
    return RunRecord(
        title="Valley road bridge over the Aune",
        description="Three-span reinforced-concrete girder bridge on two piers, 1968.",
        built=1968,
        assessed=2026,
        horizon=30,
        invented=True,
        target=TARGET,
        stages=stages,
        variables=make_variables(rng),
        data=make_data(rng),
        results=results,
        options=options,
        doubts=["Cover readings of 2019: 12 beyond the range of the meter, all in one bay."],
        conflicts=[
            Conflict("Cover meter readings", "the smallest value is lower than predicted."),
        ],
        assumptions=[
            "Annual maxima of the traffic load are independent between years.",
            "Corrosion starts by chlorides only.",
        ],
        currency="EUR",
        discount_rate=0.03,
        failure_cost=8e6,
        provenance=Provenance(
            command="assess run configs/girder_bridge.yaml --seed 20260901",
            started="2026-09-01T08:00:00+00:00",
            seed=seed,
            inputs={"configs/girder_bridge.yaml": "9f" * 32, "case_data/cores_2019.csv": "3c" * 32},
            versions={"assess": "0.1.0", "python": "3.13.1", "numpy": "2.5.0"},
            timings={"sampling": 41.2, "reliability": 6.4, "report": 3.9},
            sampler="No-U-Turn sampler, 4 chains, 1000 warm-up and 1000 kept draws",
        ),
        power_scaling=(
            PowerScaling("onset", 0.21, 0.13),
            PowerScaling("rate", 0.14, 0.03),
            PowerScaling("cover_mean", 0.01, 0.09),
            PowerScaling("pit", 0.02, 0.01),
        ),
    )


@pytest.fixture(scope="session")
def record() -> RunRecord:
    return make_record()


@pytest.fixture(scope="session")
def unconverged(record: RunRecord) -> RunRecord:
    """The same run with a last stage that failed the gate."""
    failed = replace(
        record.stages[-1], passed=False, rhat_max=1.31, divergences=12, failures=("R-hat of onset",)
    )
    return replace(record, stages=[*record.stages[:-1], failed])


@pytest.fixture(scope="session")
def html(record: RunRecord, tmp_path_factory: pytest.TempPathFactory) -> str:
    from assess.report.writer import write_report

    path = tmp_path_factory.mktemp("report") / "report.html"
    write_report(record, path)
    return path.read_text(encoding="utf-8")
