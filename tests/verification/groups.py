"""The groups of checks that the verification consists of, in the order they are run."""

from collections.abc import Callable, Iterable, Mapping
from functools import partial
from pathlib import Path

from tests.verification.calibration import calibrate
from tests.verification.check import Check
from tests.verification.design import title
from tests.verification.designs import DESIGNS
from tests.verification.first_order import first_order
from tests.verification.formulas import formulas
from tests.verification.strength import annex_d, normal_gamma

Group = Callable[[Path], Iterable[Check]]  # takes a folder for its case files

GROUPS: Mapping[str, Group] = {
    "Formulas against published values": lambda _: formulas(),
    "Textbook reliability examples": lambda _: first_order(),
    "Normal-gamma updating by six cores": normal_gamma,
    "Factors of EN 1990 annex D through the Markov chains": annex_d,
    **{
        f"Simulation-based calibration: {title(design)}": partial(calibrate, design)
        for design in DESIGNS
    },
}

# Calibrations that take many minutes: `python -m tests.verification WORDS` runs them.
SLOW = frozenset(
    f"Simulation-based calibration: {title(design)}" for design in DESIGNS if design.slow
)
