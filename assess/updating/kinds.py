"""The kinds of evidence that a survey may bring. One line each."""

from collections.abc import Mapping
from types import MappingProxyType

from assess.updating.cores import Cores
from assess.updating.cover import Cover
from assess.updating.kind import EvidenceKind
from assess.updating.section_loss import SectionLoss

KINDS: Mapping[str, EvidenceKind] = MappingProxyType(
    {kind.form.key: kind for kind in (Cores(), Cover(), SectionLoss())}
)
