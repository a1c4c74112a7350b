"""A vocabulary like the tool's own, and a sound case to spoil."""

from collections.abc import Callable, Mapping
from datetime import date
from pathlib import Path
from typing import Literal

import pytest
from pydantic import Field

from assess.case.forms import (
    Closed,
    Column,
    EvidenceEntry,
    EvidenceForm,
    LimitStateForm,
    OptionEntry,
    OptionForm,
    SectionEntry,
    Vocabulary,
)
from assess.case.quantities import Length, Moment, Years
from assess.case.reader import CaseReading, read_case

CORES = EvidenceForm(
    key="cores",
    title="crushed cores",
    entry=EvidenceEntry,
    columns=(
        Column("strength", "crushing strength", "MPa", above=0.0, usual=(8.0, 120.0)),
        Column("diameter", "core diameter", "mm", required=False, above=0.0, usual=(40.0, 160.0)),
        Column("length", "core length", "mm", required=False, above=0.0),
        Column(
            "moisture", "state when crushed", required=False, choices=("wet", "dry", "as drilled")
        ),
    ),
    value="strength",
    log_scale=True,
)
COVER = EvidenceForm(
    key="cover",
    title="cover readings",
    entry=EvidenceEntry,
    columns=(
        Column("cover", "concrete cover", "mm", above=0.0, usual=(5.0, 120.0), censored=True),
    ),
    value="cover",
)
SECTION_LOSS = EvidenceForm(
    key="section_loss",
    title="measured section loss",
    entry=EvidenceEntry,
    columns=(
        Column("original diameter", "bar diameter as built", "mm", above=0.0),
        Column(
            "residual diameter", "least diameter left", "mm", above=0.0, absent=("none", "no loss")
        ),
        Column("share", "share of bars that are hit", "-", required=False, below=1.001),
    ),
    value="residual diameter",
)


class Bars(Closed):
    count: int = Field(ge=1, description="number of bars")
    diameter: Length = Field(description="bar diameter as built")


class Bending(SectionEntry):
    limit_state: Literal["bending"] = Field(description="bending")
    steel: str = Field(description="reinforcement by name")
    depth: Length = Field(description="effective depth")
    width: Length = Field(description="width of the compression zone")
    bars: Bars = Field(description="tension bars")
    dead_load: Moment = Field(description="moment from dead load")
    live_load: Moment = Field(description="mean yearly maximum moment")


class Shear(SectionEntry):
    limit_state: Literal["shear"] = Field(description="shear")
    depth: Length = Field(description="effective depth")
    web: Length = Field(description="width of the web")


class ArrestCorrosion(OptionEntry):
    kind: Literal["arrest corrosion"] = Field(description="arrest corrosion")
    from_year: int = Field(alias="from", description="first year of its effect")
    zones: tuple[str, ...] = Field((), description="zones it covers, all if left out")


class LimitLoad(OptionEntry):
    kind: Literal["limit load"] = Field(description="limit the load")
    factor: float = Field(gt=0.0, le=1.0, description="share of today's load that stays allowed")
    lasting: Years | None = Field(None, description="how long the limit stays")


VOCABULARY = Vocabulary(
    evidence={form.key: form for form in (CORES, COVER, SECTION_LOSS)},
    limit_states={
        "bending": LimitStateForm("bending", "bending", Bending),
        "shear": LimitStateForm("shear", "shear", Shear),
    },
    options={
        "arrest corrosion": OptionForm("arrest corrosion", "arrest corrosion", ArrestCorrosion),
        "limit load": OptionForm("limit load", "limit the load", LimitLoad),
    },
    targets={"EN 1990": ("RC1", "RC2", "RC3"), "ISO 2394": ("moderate", "great")},
    concrete_grades=("C25", "C35", "C45"),
)

CASE = """\
structure: {name: Weir bridge, built: 1971, assessed: 2026, horizon: 30, invented: true}
zones:
  soffit:
    concrete: {grade: C35, production: ready-mixed, source: drawings}
    cover:
      mean: {distribution: normal, mean: 40 mm, sd: 5 mm, source: drawings}
      scatter: {distribution: lognormal, mean: 8 mm, V: 0.3, source: practice}
    corrosion:
      onset: {distribution: lognormal, quantiles: {0.05: 20 yr, 0.95: 60 yr}, source: model}
      onset_scatter: {distribution: lognormal, mean: 0.4, V: 0.3, source: model}
      current: {distribution: lognormal, mean: 0.5 uA/cm^2, V: 0.5, source: model}
      current_scatter: {distribution: lognormal, mean: 0.6, V: 0.3, source: model}
      attack: pitting
  deck:
    concrete: {mean: 5.5 ksi, V: 0.15, equivalent_tests: 4, source: old tests}
    cover: {nominal: 1.5 in, source: drawings}
steel:
  main bars: {mean: 460 MPa, sd: 30 MPa, source: mill certificates}
surveys:
  - date: 2019-06-12
    name: first visit
    cores: {table: cores.csv, zone: soffit}
    cover:
      - {table: cover.csv}
  - date: 2014-03-01
    section_loss: {table: loss.csv, zone: soffit}
members:
  - name: girder 2
    zone: soffit
    depth: 900 mm
    limit_state: bending
    steel: main bars
    sections:
      - name: midspan
        width: 400 mm
        bars: {count: 6, diameter: 25 mm}
        dead_load: 820 kN*m
        live_load: 410 kNm
      - {name: support, limit_state: shear, web: 300, depth: 850}
dependence:
  - {between: [soffit.onset, soffit.current], spearman: -0.4, source: judgement}
decision:
  target: {set: EN 1990, class: RC2, period: 1}
  options:
    - {name: protect, kind: arrest corrosion, from: 2028, zones: [soffit]}
    - {name: signpost, kind: limit load, factor: 0.8}
  costs: {currency: EUR, failure: 12e6, discount_rate: 0.03}
sampling: {seed: 7}
"""

TABLES = {
    "cores.csv": (
        "location,strength [MPa],diameter [mm],section\nA1,41.2,100,\nA2,38.0,100,midspan\n"
    ),
    "cover.csv": "location;zone;Cover [mm]\nB1;deck;38,5\nB2;soffit;>80\n",
    "loss.csv": "original_diameter [mm],residual_diameter [mm]\n25,22.5\n25,none\n",
}


@pytest.fixture
def vocabulary() -> Vocabulary:
    return VOCABULARY


@pytest.fixture
def write_case(tmp_path: Path) -> Callable[..., Path]:
    """Write the sound case with replacements; each must be found."""

    def write(
        *changes: tuple[str, str], tables: Mapping[str, str | bytes | None] | None = None
    ) -> Path:
        text = CASE
        for old, new in changes:
            assert text.count(old) == 1, old
            text = text.replace(old, new)
        (tmp_path / "case.yaml").write_text(text, encoding="utf-8")
        for name, content in {**TABLES, **(tables or {})}.items():
            if content is not None:
                raw = content.encode() if isinstance(content, str) else content
                (tmp_path / name).write_bytes(raw)
        return tmp_path / "case.yaml"

    return write


@pytest.fixture
def read(write_case: Callable[..., Path]) -> Callable[..., CaseReading]:
    """Write the sound case with replacements and read it, as of a fixed day."""

    def write_and_read(
        *changes: tuple[str, str],
        tables: Mapping[str, str | bytes | None] | None = None,
        today: date = date(2026, 6, 1),
    ) -> CaseReading:
        return read_case(write_case(*changes, tables=tables), VOCABULARY, today)

    return write_and_read


@pytest.fixture
def fault_of(read: Callable[..., CaseReading], tmp_path: Path) -> Callable[..., str]:
    """Spoil the sound case and give its only fault, without the folder."""

    def only_fault(
        *changes: tuple[str, str], tables: Mapping[str, str | bytes | None] | None = None
    ) -> str:
        reading = read(*changes, tables=tables)
        assert reading.case is None
        assert len(reading.faults) == 1, [str(fault) for fault in reading.faults]
        return str(reading.faults[0]).replace(f"{tmp_path}/", "")

    return only_fault
