"""The verification's groups as tests, for those who would rather run pytest."""

import pytest

from tests.verification.check import Check, plain_table
from tests.verification.groups import GROUPS
from tests.verification.page import page

QUICK = ("Formulas against published values", "Textbook reliability examples")


def _failed(checks):
    return plain_table([check for check in checks if not check.passed])


@pytest.mark.parametrize("title", QUICK)
def test_quick_groups(title, tmp_path):
    checks = list(GROUPS[title](tmp_path))
    assert all(check.passed for check in checks), _failed(checks)


@pytest.mark.verify
@pytest.mark.parametrize("title", [title for title in GROUPS if title not in QUICK])
def test_long_groups(title, tmp_path):
    checks = list(GROUPS[title](tmp_path))
    assert all(check.passed for check in checks), _failed(checks)


def test_a_check_fails_when_it_should():
    good = Check("book", "table 1", "x < y", 1.0, 1.05, 0.1, "from memory")
    bad = Check("book", "table 2", "x", 1.0, 1.2, 0.1)
    nothing = Check("book", "table 3", "x", 1.0, float("nan"), 0.1)
    low = Check("book", "p", "p", None, 0.001, 0.01, at_least=True)
    assert [check.passed for check in (good, bad, nothing, low)] == [True, False, False, False]
    text = page([("Group", [good, bad, nothing, low], 1.0)])
    assert "1 passed, 3 failed" in text
    assert 'class="bad"' in text
    assert 'class="memory"' in text
    assert "x &lt; y" in text
    assert plain_table([good, bad]).count("\n") == 2
