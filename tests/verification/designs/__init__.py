"""Designs of simulation-based calibration: each module of this folder has one ``DESIGN``."""

from importlib import import_module
from pkgutil import iter_modules

from tests.verification.design import Design

DESIGNS: tuple[Design, ...] = tuple(
    import_module(f"{__name__}.{module.name}").DESIGN
    for module in sorted(iter_modules(__path__), key=lambda found: found.name)
)
