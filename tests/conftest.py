"""One example case, its model compiled once, for all tests that sample."""

from collections.abc import Callable, Mapping
from typing import Any

import pytest

from assess.case.reader import Case
from tests.verification import cases

MakeCase = Callable[..., Case]


@pytest.fixture(scope="session")
def make_case(tmp_path_factory: pytest.TempPathFactory) -> MakeCase:
    """Write a case file with its tables and read it."""

    def make(case: Mapping[str, Any], tables: Mapping[str, str] = cases.NO_TABLES) -> Case:
        return cases.read(tmp_path_factory.mktemp("case"), case, tables)

    return make


@pytest.fixture(scope="session")
def example_case(make_case: MakeCase) -> Case:
    """Every kind of evidence in two surveys, dependence in the prior."""
    return make_case(cases.example(), cases.EXAMPLE_TABLES)


@pytest.fixture(scope="session")
def example_spec(example_case: Case) -> Any:
    """Prior and measurements of the example."""
    from assess.updating.model import specify

    return specify(example_case)


@pytest.fixture(scope="session")
def example_sampler(example_spec: Any) -> Any:
    """Compiled model of the example; takes some 15 s."""
    from assess.updating.sampling import compile_sampler

    return compile_sampler(example_spec, 2)
