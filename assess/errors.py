"""What can go wrong, as one tree.

AssessError
├── CaseError          the case file or a survey table cannot be used (exit code 2)
└── NotConvergedError  the sampler's draws must not be relied on       (exit code 3)
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, order=True)
class Fault:
    """One thing wrong or doubtful in the input, with its place and the way to mend it."""

    file: str
    line: int  # 1-based; 0 where the file as a whole is meant
    what: str
    given: str = ""
    allowed: str = ""
    mend: str = ""

    def __str__(self) -> str:
        """Give ``file:line: what, given ..., allowed ..., mend``."""
        place = f"{self.file}:{self.line}" if self.line else self.file
        parts = [self.what]
        if self.given:
            parts.append(f"given {self.given}")
        if self.allowed:
            parts.append(f"allowed {self.allowed}")
        if self.mend:
            parts.append(self.mend)
        return f"{place}: " + ", ".join(parts)


class AssessError(Exception):
    """Any failure that the tool itself explains."""


class CaseError(AssessError):
    """The input cannot be used; carries every fault found, not only the first."""

    def __init__(self, faults: list[Fault]) -> None:
        self.faults = tuple(sorted(faults))
        super().__init__("\n".join(str(fault) for fault in self.faults))


class NotConvergedError(AssessError):
    """The Markov chains failed the convergence gate after the retry."""

    def __init__(self, stage: str, failures: list[str]) -> None:
        self.stage = stage
        self.failures = tuple(failures)
        super().__init__(f"stage {stage!r} has not converged: " + "; ".join(failures))
