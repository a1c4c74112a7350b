"""Measuring variables whose default prior stands in the catalogue, and what a case makes of them.

A bias, a device's factor or a probability of reading is no property of the structure: each kind
brings its own, by name, and a case may state another prior of that name under `priors`.
"""

from collections.abc import Callable, Iterator, Sequence

from pydantic import ValidationError

from assess.case.distributions import Distribution, distribution_of
from assess.case.reader import Case
from assess.errors import Fault
from assess.units import QuantityError
from assess.updating.variables import Variable


def catalogue_variable(name: str, label: str, symbol: str, unit: str, entry: str) -> Variable:
    """Give a measuring variable with the prior that the catalogue has of it.

    Parameters
    ----------
    name : str
        Of the variable; begins with the key of its kind.
    label, symbol : str
        For people and for axes.
    unit : str
        Unit inside the tool, ``-`` for none.
    entry : str
        Name of the catalogue's entry.

    Returns
    -------
    Variable
        Of the structure as a whole.

    Examples
    --------
    >>> entry = "corrosion current device factor"
    >>> one = catalogue_variable("corrosion_current.x", "factor", "$f$", "-", entry)
    >>> round(float(one.marginal.from_score(0.0)), 6)
    1.0
    """
    stated = distribution_of(unit).model_validate({"catalogue": entry})
    return Variable(name, label, symbol, unit, "", stated.source, stated.marginal())


def restated_faults(
    case: Case, variables: Sequence[Variable], check: Callable[[Distribution], Distribution]
) -> Iterator[Fault]:
    """Find priors that a case states of measuring variables and that these cannot have.

    Parameters
    ----------
    case : Case
        The case.
    variables : sequence of Variable
        Those that the check is for.
    check : callable
        `assess.case.processes.only_positive` or `within_one`.

    Yields
    ------
    Fault
        In the line of the prior. What is no distribution at all is complained of elsewhere.
    """
    for variable in variables:
        stated = case.spec.priors.get(variable.name)
        if stated is None:
            continue
        try:
            read = distribution_of(variable.unit).model_validate(stated)
        except ValidationError:
            continue
        try:
            check(read)
        except QuantityError as error:
            yield case.document.fault(
                ("priors", variable.name),
                f"{variable.name} {error.what}",
                given=error.given,
                allowed=error.allowed,
                mend=error.mend,
            )
