"""The kinds of evidence that a survey may bring: one line each, and those of other packages."""

from collections.abc import Iterator, Mapping
from importlib.metadata import EntryPoint, entry_points
from types import MappingProxyType

from assess.updating.annual_maxima import AnnualMaxima
from assess.updating.bars_found import BarsFound
from assess.updating.carbonation_depth import CarbonationDepth
from assess.updating.chloride_profile import ChlorideProfile
from assess.updating.cores import Cores
from assess.updating.corrosion_current import CorrosionCurrent
from assess.updating.cover import Cover
from assess.updating.crack_width import CrackWidth
from assess.updating.delamination import Delamination
from assess.updating.dimensions import Dimensions
from assess.updating.half_cell import HalfCell
from assess.updating.kind import EvidenceKind
from assess.updating.pulse_velocity import PulseVelocity
from assess.updating.quantities import Quantities
from assess.updating.rebound import Rebound
from assess.updating.section_loss import SectionLoss
from assess.updating.yield_strength import YieldStrength

# An installed package adds a kind by an entry point of this group that names a subclass of
# `EvidenceKind` which can be made without arguments.
GROUP = "assess.evidence"

OWN: tuple[EvidenceKind, ...] = (
    AnnualMaxima(),
    BarsFound(),
    CarbonationDepth(),
    ChlorideProfile(),
    Cores(),
    Rebound(),  # given cores
    PulseVelocity(),  # given cores and rebound numbers
    CorrosionCurrent(),
    Cover(),
    CrackWidth(),
    Delamination(),
    Dimensions(),
    HalfCell(),
    Quantities(),
    SectionLoss(),
    YieldStrength(),
)


def installed(points: Iterator[EntryPoint]) -> Iterator[EvidenceKind]:
    """Make the kinds that entry points name.

    Parameters
    ----------
    points : iterator of EntryPoint
        Of the group `GROUP`.

    Yields
    ------
    EvidenceKind
        One for each entry point.

    Raises
    ------
    TypeError
        If what an entry point names is no kind of evidence.
    """
    for point in points:
        made = point.load()()
        if not isinstance(made, EvidenceKind):
            raise TypeError(
                f"entry point {point.name!r} of group {GROUP!r} names {point.value}, which is no "
                "subclass of assess.updating.kind.EvidenceKind"
            )
        yield made


def registry(kinds: Iterator[EvidenceKind]) -> Mapping[str, EvidenceKind]:
    """Arrange kinds by the key under which a survey names them.

    Raises
    ------
    ValueError
        If two kinds claim one key.
    """
    found: dict[str, EvidenceKind] = {}
    for kind in kinds:
        key = kind.form.key
        if key in found:
            first, second = type(found[key]), type(kind)
            raise ValueError(
                f"two kinds of evidence claim the key {key!r}: {first.__module__}."
                f"{first.__qualname__} and {second.__module__}.{second.__qualname__}"
            )
        found[key] = kind
    return MappingProxyType(found)


def _all() -> Iterator[EvidenceKind]:
    yield from OWN
    yield from installed(iter(sorted(entry_points(group=GROUP))))


KINDS: Mapping[str, EvidenceKind] = registry(_all())
