"""The joint prior of a case: all common variables with their sources and their dependence."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from assess.case.distributions import Distribution, distribution_of
from assess.case.reader import Case
from assess.case.spec import (
    CaseSpec,
    GradedConcrete,
    MeasuredConcrete,
    NominalCover,
    Pooling,
    Steel,
    Zone,
)
from assess.mechanics.concrete import IN_SITU_EXPONENT, PRIOR_SOURCE, strength_prior
from assess.probability.dependence import PairDependence, score_correlation_matrix
from assess.probability.log_uniform import LogUniform
from assess.probability.marginals import make_marginal
from assess.updating.kinds import KINDS
from assess.updating.variables import AnyVariable, JointPrior, LevelGivenScatter, Pooled, Variable

FloatArray = NDArray[np.float64]

# Of a prior that leaves the cores to speak: ln(median) about 30 MPa with a standard deviation so
# large, and a scatter log-uniform over bounds so wide, that a few cores swamp them; the density
# approaches the 1/sigma that EN 1990 annex D stands on.
VAGUE_LEVEL = (30.0, 10.0)
VAGUE_SCATTER = (1e-3, 50.0)
COVER_MEAN_SD = 5.0  # [mm] JCSS part 3.10: mean deviation of beams, slabs within some 10 mm
COVER_SCATTER = (7.5, 0.25)  # [mm], V. JCSS part 3.10: standard deviation 5 to 10 mm
COVER_SOURCE = "JCSS Probabilistic Model Code, part 3.10, cover; ranges put as distributions"


def joint_prior(case: Case) -> JointPrior:
    """Assemble all common variables of a case.

    Parameters
    ----------
    case : Case
        As read.

    Returns
    -------
    JointPrior
        Zones in the order of the case, then steel, quantities, loads, then measuring variables.
    """
    variables: list[AnyVariable] = []
    for name, zone in case.spec.zones.items():
        variables += _zone_variables(name, zone)
    for name, steel in case.spec.steel.items():
        variables += _steel_variables(name, steel)
    for name, quantity in case.spec.quantities.items():
        variables += [
            _stated((f"quantity.{name}{end}", f"{label}, {name}", symbol, quantity.unit, ""), prior)
            for end, label, symbol, prior in quantity.priors()
        ]
    for name, model in case.spec.load_models.items():
        variables += [
            _stated(
                (
                    f"load.{name}.{key}",
                    f"{meaning.label}, {name}",
                    meaning.symbol,
                    meaning.unit,
                    "",
                ),
                prior,
            )
            for key, meaning, prior in model.priors()
        ]
    for kind in KINDS.values():
        variables += kind.variables(case)
    variables = [overridden(variable, case.spec) for variable in variables]
    variables = pooled(variables, case.spec.pooling)
    return JointPrior(tuple(variables), _correlation(case.spec, variables))


def overridden(variable: AnyVariable, spec: CaseSpec) -> AnyVariable:
    """Put the distribution that the case states under `priors` in place of a variable's own.

    Raises
    ------
    pydantic.ValidationError
        If what is stated is no distribution in the variable's unit.
    """
    stated = spec.priors.get(variable.name)
    if stated is None:
        return variable
    read = distribution_of(variable.unit).model_validate(stated)
    head = (variable.name, variable.label, variable.symbol, variable.unit, variable.zone)
    return _stated(head, read)


def pooled(variables: Sequence[AnyVariable], pooling: Sequence[Pooling]) -> list[AnyVariable]:
    """Let zones share a part of the scores of some variables.

    Parameters
    ----------
    variables : sequence
        All variables, none pooled yet.
    pooling : sequence of Pooling
        What the case says.

    Returns
    -------
    list
        The shared scores and the shares before all others, for these depend on them.
    """
    found = {variable.name: variable for variable in variables}
    first: list[AnyVariable] = []
    for number, stated in enumerate(pooling, start=1):
        group = f"pool_{number}.{stated.variable}"
        words = f"{stated.variable} of {', '.join(stated.zones)}"
        shared, share = f"{group}.shared", f"{group}.share"
        standard = make_marginal("normal", mean=0.0, sd=1.0)
        first += [
            Variable(shared, f"shared score, {words}", "$u$", "-", "", "by construction", standard),
            _stated((share, f"zones' own share, {words}", "$w$", "-", ""), stated.share),
        ]
        for zone in stated.zones:
            inner = found[f"{zone}.{stated.variable}"]
            if isinstance(inner, Pooled):
                raise ValueError(f"{inner.name} is pooled twice")
            found[inner.name] = Pooled(inner, shared, share)
    return [*first, *found.values()]


def _correlation(spec: CaseSpec, variables: Sequence[AnyVariable]) -> FloatArray:
    """Score correlation of all variables from the stated pairs."""
    pairs = [
        PairDependence(*item.between, coefficient=item.coefficient, kind=item.measure)
        for item in spec.dependence
    ]
    marginals = {v.name: v.marginal for v in variables if isinstance(v, Variable)}
    return score_correlation_matrix([v.name for v in variables], pairs, marginals)


def _zone_variables(name: str, zone: Zone) -> list[AnyVariable]:
    return [
        *_concrete_variables(name, zone),
        *_cover_variables(name, zone),
        *_process_variables(name, zone),
    ]


def _concrete_variables(zone_name: str, zone: Zone) -> list[AnyVariable]:
    """Give the level and scatter of the strength in a zone."""
    concrete = zone.concrete
    level = (f"{zone_name}.concrete_mean", "median concrete strength", "$f_c$", "MPa")
    scatter = (f"{zone_name}.concrete_scatter", "scatter of ln strength", "$\\sigma_{\\ln f}$", "-")
    if isinstance(concrete, GradedConcrete):
        prior = strength_prior(concrete.grade, concrete.production)
        # In the structure ln f is 0.96 times that of the standard specimen (JCSS part 3.1);
        # neither the gain with age nor that of sustained load is counted on.
        log_mean, log_sd = IN_SITU_EXPONENT * prior.log_mean, IN_SITU_EXPONENT * prior.log_sd
        tests, degrees = prior.tests, prior.degrees
        source = (
            f"{PRIOR_SOURCE}; {concrete.grade}, {concrete.production}, {concrete.source}; taken to "
            f"the structure by ln f = {IN_SITU_EXPONENT:g} ln f of standard specimens (part 3.1), "
            "no gain with age counted"
        )
    elif isinstance(concrete, MeasuredConcrete):
        log_variance = float(np.log1p(concrete.V**2))
        log_mean = float(np.log(concrete.mean)) - 0.5 * log_variance
        log_sd, tests = float(np.sqrt(log_variance)), concrete.equivalent_tests
        degrees = max(tests - 1.0, 1.0)
        source = concrete.source
        if concrete.scatter == "known":
            constant = make_marginal("constant", parameters={"value": log_sd})
            return [
                Variable(*scatter, zone_name, source, constant),
                LevelGivenScatter(*level, zone_name, source, log_mean, tests, scatter[0]),
            ]
    else:
        source = concrete.source or "vague, by choice"
        vague_scatter = LogUniform(*VAGUE_SCATTER)
        vague_level = make_marginal(
            "lognormal", parameters={"log_mean": np.log(VAGUE_LEVEL[0]), "log_sd": VAGUE_LEVEL[1]}
        )
        return [
            Variable(*scatter, zone_name, source, vague_scatter),
            Variable(*level, zone_name, source, vague_level),
        ]
    spread = make_marginal("scaled inverse chi", parameters={"scale": log_sd, "degrees": degrees})
    return [
        Variable(*scatter, zone_name, source, spread),
        LevelGivenScatter(*level, zone_name, source, log_mean, tests, scatter[0]),
    ]


def _cover_variables(zone_name: str, zone: Zone) -> list[AnyVariable]:
    """Give the mean and scatter of the cover in a zone."""
    cover = zone.cover
    mean = (f"{zone_name}.cover_mean", "mean cover", "$c$", "mm", zone_name)
    scatter = (f"{zone_name}.cover_scatter", "scatter of cover", "$\\sigma_c$", "mm", zone_name)
    if isinstance(cover, NominalCover):
        source = f"{COVER_SOURCE}; nominal {cover.nominal:g} mm, {cover.source}"
        return [
            Variable(*mean, source, make_marginal("normal", mean=cover.nominal, sd=COVER_MEAN_SD)),
            Variable(
                *scatter,
                source,
                make_marginal("lognormal", mean=COVER_SCATTER[0], V=COVER_SCATTER[1]),
            ),
        ]
    return [_stated(mean, cover.mean), _stated(scatter, cover.scatter)]


def _process_variables(name: str, zone: Zone) -> list[AnyVariable]:
    """Give the common variables of all processes of a zone."""
    return [
        _stated((f"{name}.{key}", meaning.label, meaning.symbol, meaning.unit, name), prior)
        for process in zone.processes().values()
        for key, meaning, prior in process.priors()
    ]


def _stated(head: tuple[str, str, str, str, str], stated: Distribution) -> Variable:
    return Variable(*head, stated.source, stated.marginal())


def _steel_variables(name: str, steel: Steel) -> list[Variable]:
    """Give the mean yield strength of a reinforcement, and its scatter where it is uncertain."""
    level = Variable(
        f"steel.{name}",
        f"mean yield strength, {name}",
        "$f_y$",
        "MPa",
        "",
        steel.source,
        make_marginal("normal", mean=steel.mean, sd=steel.sd),
    )
    if isinstance(steel.local_sd, float):
        return [level]
    label = f"scatter of yield strength from bar to bar, {name}"
    head = (f"steel.{name}.scatter", label, "$\\sigma_{f_y}$", "MPa", "")
    return [level, _stated(head, steel.local_sd)]
