"""All kinds that a case file may name, gathered from the packages that implement them."""

from functools import cache

from assess.case.forms import Vocabulary
from assess.decisions.options import OPTIONS
from assess.decisions.targets import TARGET_SETS
from assess.mechanics.concrete import GRADES
from assess.reliability.limit_states import LIMIT_STATES
from assess.updating.kinds import KINDS


@cache
def vocabulary() -> Vocabulary:
    """Gather evidence, limit states, options, targets and concrete grades."""
    return Vocabulary(
        evidence={key: kind.form for key, kind in KINDS.items()},
        limit_states={key: state.form for key, state in LIMIT_STATES.items()},
        options={key: kind.form for key, kind in OPTIONS.items()},
        targets={name: tuple(item.classes) for name, item in TARGET_SETS.items()},
        concrete_grades=tuple(sorted({g for grades in GRADES.values() for g in grades})),
    )
