"""Checks of the dependence that a case file states between common variables."""

from collections.abc import Callable, Collection, Iterator, Mapping
from typing import TYPE_CHECKING, Any

from pydantic import BaseModel

from assess.case.distributions import Distribution, LengthDistribution
from assess.case.forms import FloatArray
from assess.case.processes import PROCESSES
from assess.case.spec import Zone
from assess.case.walking import items_at, mapping_at, read_or_none
from assess.case.yamlfile import Document, Keys, listed, nearest
from assess.errors import Fault
from assess.units import convert

if TYPE_CHECKING:
    from assess.probability.dependence import PairDependence
    from assess.probability.marginal import Marginal

# Where the marginal of a zone's common variable is said outright, and as what.
_SAID: dict[str, tuple[str, str, type[Distribution]]] = {
    "cover_mean": ("cover", "mean", LengthDistribution),
    "cover_scatter": ("cover", "scatter", LengthDistribution),
    **{
        name: (key, name, meaning.distribution)
        for key, process in PROCESSES.items()
        for name, meaning in process.meanings.items()
    },
}


def known_variables(data: Mapping[Any, Any]) -> dict[str, Keys]:
    """Name the common variables that `dependence` may speak of.

    Parameters
    ----------
    data : mapping
        The parsed case file.

    Returns
    -------
    dict
        Place of the zone, steel or quantity by the variable's full name, such as ``deck.onset``.
    """
    found: dict[str, Keys] = {}
    for name in mapping_at(data, "zones"):
        zone = mapping_at(data, "zones", name)
        for variable in Zone.variable_names([key for key in PROCESSES if zone.get(key)]):
            found[f"{name}.{variable}"] = ("zones", name)
    for name, steel in mapping_at(data, "steel").items():
        found[f"steel.{name}"] = ("steel", name)
        if isinstance(steel, dict) and isinstance(steel.get("local_sd"), dict):
            found[f"steel.{name}.scatter"] = ("steel", name)
    for name, quantity in mapping_at(data, "quantities").items():
        found[f"quantity.{name}"] = ("quantities", name)
        if isinstance(quantity, dict) and quantity.get("scatter"):
            found[f"quantity.{name}.scatter"] = ("quantities", name)
    return found


def dependence_faults(document: Document, kinds: Collection[str] = ()) -> Iterator[Fault]:
    """Check the dependence in the prior: names, coefficients, and whether they hold together.

    Parameters
    ----------
    document : Document
        The case file.
    kinds : collection of str
        Kinds of evidence: their measuring variables, named after them, are looked at later.

    Yields
    ------
    Fault
        Each with its line.
    """
    known = known_variables(document.data)
    marginals = _Marginals(document.data, known)
    pairs: list[PairDependence] = []
    seen: dict[frozenset[str], int] = {}
    for index, node in items_at(document.data, "dependence"):
        keys = ("dependence", index)
        between = node.get("between")
        if not isinstance(between, list) or not all(isinstance(name, str) for name in between):
            continue
        strangers = [(i, name) for i, name in enumerate(between) if name not in known]
        for i, name in strangers:
            if not name.startswith((*kinds, "pool_")):
                yield _unknown_variable(document, (*keys, "between", i), name, known)
        both = frozenset(between)
        if both in seen and not strangers:
            what = f"the dependence of line {seen[both]} is between the same variables"
            yield document.fault(keys, what, mend="keep one of the two")
        elif not strangers and len(between) == 2:
            pair = _pair(document, keys, node, marginals)
            if isinstance(pair, Fault):
                yield pair
            elif pair is not None:
                pairs.append(pair)
        seen.setdefault(both, document.line(keys))
    if all(marginals.settle(pair) for pair in pairs):
        names = {name for pair in pairs for name in (pair.first, pair.second)}
        yield from matrix_faults(document, pairs, marginals.of(names))


def matrix_faults(
    document: Document, pairs: "list[PairDependence]", marginals: "Mapping[str, Marginal]"
) -> Iterator[Fault]:
    """Find out whether coefficients that are sound one by one hold together.

    Parameters
    ----------
    document : Document
        The case file.
    pairs : list of PairDependence
        Each with a score coefficient.
    marginals : mapping
        Marginals by name, of the variables with a Pearson coefficient at least.

    Yields
    ------
    Fault
        One at most, in the line of ``dependence:``, with the nearest coefficients that hold.
    """
    from assess.probability.dependence import NotPositiveDefiniteError, score_correlation_matrix

    names = sorted({name for pair in pairs for name in (pair.first, pair.second)})
    try:
        if pairs:
            score_correlation_matrix(names, pairs, marginals)
    except NotPositiveDefiniteError as error:
        what = "these coefficients cannot hold together: their matrix is not positive definite"
        given = "; ".join(_in_words(pair, pair.coefficient) for pair in pairs)
        mend = f"nearest that hold: {_nearest(names, pairs, error.nearest)}"
        yield document.fault(("dependence",), what, given=given, mend=mend)


def _in_words(pair: "PairDependence", coefficient: float) -> str:
    return f"{pair.first} with {pair.second} {coefficient:.3g}"


def _nearest(names: list[str], pairs: "list[PairDependence]", scores: FloatArray) -> str:
    """Give the nearest coefficients that hold together, each of the kind that was stated."""
    from assess.probability.dependence import score_to_kendall, score_to_spearman

    back: dict[str, Callable[[float], float]] = {
        "spearman": score_to_spearman,
        "kendall": score_to_kendall,
        "pearson": float,
    }
    words = []
    for pair in pairs:
        score = float(scores[names.index(pair.first), names.index(pair.second)])
        words.append(_in_words(pair, back[pair.kind](score)))
    return "; ".join(words)


def _unknown_variable(
    document: Document, keys: Keys, name: str, known: Mapping[str, Keys]
) -> Fault:
    zone, _, variable = name.rpartition(".")
    what = "there is no such variable"
    if variable in Zone.variable_names(PROCESSES) and f"{zone}.cover_mean" in known:
        what = f"zone {zone!r} has no {_SAID[variable][0]}, hence no such variable"
    mend = nearest(name, known)
    return document.fault(keys, what, given=name, allowed=listed(known), mend=mend)


def _pair(
    document: Document, keys: Keys, node: dict[Any, Any], marginals: "_Marginals"
) -> "PairDependence | Fault | None":
    """Read one dependence; None where the model refuses its coefficient."""
    from assess.probability.dependence import PairDependence

    first, second = node["between"]
    if first == second:
        return document.fault(keys, "a variable cannot depend on itself", given=first)
    for kind in ("spearman", "kendall", "pearson"):
        value = read_or_none(lambda said: convert(said, "-"), node.get(kind))
        if value is not None and -1.0 < value < 1.0:
            pair = PairDependence(first, second, value, kind)
            try:
                if marginals.settle(pair):
                    pair.score(marginals.of((first, second)))
            except ValueError as error:
                return document.fault((*keys, kind), str(error))
            return pair
    return None


class _Marginals:
    """Marginals of common variables where the file says them outright.

    Others follow from a grade, a nominal cover, a steel: a Pearson coefficient of these is left
    to the checks that know the whole prior.
    """

    def __init__(self, data: Mapping[Any, Any], known: Mapping[str, Keys]) -> None:
        self._data, self._known = data, known

    def of(self, names: Any) -> "dict[str, Marginal]":
        """Give the marginals of some variables, those that are said."""
        found = {name: self._one(name) for name in names}
        return {name: marginal for name, marginal in found.items() if marginal is not None}

    def settle(self, pair: "PairDependence") -> bool:
        """Tell whether the score coefficient of a pair follows from what is said."""
        return pair.kind != "pearson" or len(self.of((pair.first, pair.second))) == 2

    def _one(self, name: str) -> "Marginal | None":
        said = _SAID.get(name.rpartition(".")[2])
        if said and self._known[name][0] == "zones":
            part, key, model = said
            node = mapping_at(self._data, *self._known[name], part, key)
            read: BaseModel | None = read_or_none(model.model_validate, node)
            if isinstance(read, Distribution):
                return read.marginal()
        return None
