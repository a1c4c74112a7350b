"""The limit states that a case file may name. One line each."""

from collections.abc import Mapping
from types import MappingProxyType

from assess.reliability.bending import Bending
from assess.reliability.limit_state import LimitState

LIMIT_STATES: Mapping[str, LimitState] = MappingProxyType(
    {state.form.key: state for state in (Bending(),)}
)
