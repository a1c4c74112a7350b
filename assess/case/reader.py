"""A case from its files: the YAML file and every survey table it names."""

import hashlib
import os
from collections.abc import Iterator
from dataclasses import dataclass, field
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from pydantic import BaseModel, ValidationError

from assess.case import checks
from assess.case.doubts import outliers
from assess.case.forms import EvidenceEntry, EvidenceForm, Table, TextArray, Vocabulary
from assess.case.schema import case_model, spread_defaults
from assess.case.spec import CaseSpec
from assess.case.tables import examine_table
from assess.case.unlikely import unlikely_quantities
from assess.case.walking import mapping_at
from assess.case.wording import faults_of
from assess.case.yamlfile import Document, Keys, listed, nearest, read_yaml
from assess.errors import CaseError, Fault

DAYS_PER_YEAR = 365.25


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """One table of one survey, each row with the place it speaks of."""

    survey: str  # name of the stage after this survey
    date: date
    age: float  # from construction to the survey [yr]; years of 365.25 days
    kind: str
    entry: EvidenceEntry
    table: Table
    zone: TextArray  # of each row
    section: TextArray  # of each row, "" for none
    location: TextArray  # of each row, "" for none
    keys: Keys = ()  # where the entry stands in the case file


@dataclass(frozen=True, slots=True, eq=False)
class Case:
    """One structure as its engineer described it."""

    path: Path
    spec: CaseSpec
    evidence: tuple[Evidence, ...]  # in order of date
    inputs: dict[str, str]  # SHA-256 of each file by its path from the case's folder
    stages: tuple[tuple[str, date], ...]  # name and date after each survey, in order of date
    document: Document  # the case file, which knows its lines


@dataclass(frozen=True, slots=True, eq=False)
class CaseReading:
    """A case, or what is wrong with it; in either case what is doubtful."""

    case: Case | None
    faults: tuple[Fault, ...]
    doubts: tuple[Fault, ...]
    readable: Case | None = None  # what can be checked further, with the sound tables only


def load_case(path: Path, vocabulary: Vocabulary) -> Case:
    """Read a case that must be usable.

    Parameters
    ----------
    path : Path
        The case file.
    vocabulary : Vocabulary
        Kinds that exist.

    Returns
    -------
    Case
        The case. Doubts are dropped; `read_case` has them.

    Raises
    ------
    CaseError
        With every fault of the file and of its tables.
    """
    reading = read_case(path, vocabulary)
    if reading.case is None:
        raise CaseError(list(reading.faults))
    return reading.case


def read_case(path: Path, vocabulary: Vocabulary, today: date | None = None) -> CaseReading:
    """Read a case file and its tables, collecting every fault and doubt.

    Parameters
    ----------
    path : Path
        The case file; tables are looked for from its folder.
    vocabulary : Vocabulary
        Kinds that exist.
    today : date, optional
        Surveys after this day are doubted; the day of the call if left out.

    Returns
    -------
    CaseReading
        Its case is None if there is any fault; `readable` is None where the case file itself
        is at fault.
    """
    path = Path(path)
    document, misread = read_yaml(path)
    if document is None:
        return CaseReading(None, tuple(sorted(misread)), ())
    document = spread_defaults(document, vocabulary)
    spec, faults = _validated(document, vocabulary)
    wrong, doubts = checks.cross_check(document, vocabulary, today or date.today())
    tables = _Tables(path, document, vocabulary)
    tables.read()
    faults += misread + wrong + tables.faults
    doubts += tables.doubts
    readable = None
    if spec is not None:
        evidence = _evidence(spec, tables)
        doubts += unlikely_quantities(spec, document)
        for one in evidence:
            form = vocabulary.evidence[one.kind]
            doubts += outliers(form, one.entry, one.table, one.zone)
            doubts += form.doubts(one.entry, one.table)
        if not wrong:  # names that lead nowhere would lead further checks astray
            stages = tuple((name, day) for day, name in spec.stages().items())
            hashes = _hashes(path, evidence)
            readable = Case(path, spec, tuple(evidence), hashes, stages, document)
    all_faults = tuple(sorted(set(faults)))
    case = None if all_faults else readable
    return CaseReading(case, all_faults, tuple(sorted(set(doubts))), readable)


def _validated(document: Document, vocabulary: Vocabulary) -> tuple[CaseSpec | None, list[Fault]]:
    models: dict[int, type[BaseModel]] = {}
    try:
        return case_model(vocabulary).model_validate(document.data, context=models), []
    except ValidationError as error:
        return None, faults_of(error, document, models)


def _evidence(spec: CaseSpec, tables: "_Tables") -> list[Evidence]:
    """Join what the model says of each table with the rows that were read."""
    found, stages = [], spec.stages()
    for i, survey in enumerate(spec.surveys):
        age = (survey.date - spec.structure.built).days / DAYS_PER_YEAR
        for kind, j, entry in survey.entries():
            read = tables.by_place.get((i, kind, j))
            if read is not None:
                table, zone, section = read
                found.append(
                    Evidence(
                        stages[survey.date],
                        survey.date,
                        age,
                        kind,
                        entry,
                        table,
                        zone,
                        section,
                        table.texts["location"],
                        _entry_keys(tables.document, i, kind, j),
                    )
                )
    return sorted(found, key=lambda one: one.date)


def _entry_keys(document: Document, survey: int, kind: str, index: int) -> Keys:
    """Give the place of an evidence entry; one alone may stand without the list."""
    alone = isinstance(document.data["surveys"][survey][kind], dict)
    return ("surveys", survey, kind) if alone else ("surveys", survey, kind, index)


def _hashes(path: Path, evidence: list[Evidence]) -> dict[str, str]:
    """Hash every input, so that a run can tell whether it still stands for its files."""
    files = {path.name: path}
    for one in evidence:
        relative = os.path.relpath(one.table.path, path.parent)
        files[Path(relative).as_posix()] = one.table.path
    return {name: hashlib.sha256(p.read_bytes()).hexdigest() for name, p in sorted(files.items())}


@dataclass(slots=True)
class _Tables:
    """All tables that a case file names, read whether or not the rest of the file is sound."""

    path: Path
    document: Document
    vocabulary: Vocabulary
    faults: list[Fault] = field(default_factory=list)
    doubts: list[Fault] = field(default_factory=list)
    by_place: dict[tuple[int, str, int], tuple[Table, TextArray, TextArray]] = field(
        default_factory=dict
    )

    def read(self) -> None:
        """Read each table once for each entry that names it."""
        seen: dict[tuple[str, str], int] = {}
        for keys, kind, entry in checks.entries_of(self.document.data, self.vocabulary):
            if not isinstance(entry.get("table"), str) or not entry["table"].strip():
                continue  # the model says so
            file = Path(os.path.normpath(self.path.parent / entry["table"]))
            place = (*keys, "table")
            if (kind, str(file)) in seen:
                what = f"the table of line {seen[kind, str(file)]} is used a second time"
                mend = "its measurements are counted twice"
                self.doubts.append(self.document.fault(place, what, given=file.name, mend=mend))
            seen.setdefault((kind, str(file)), self.document.line(place))
            self._one(keys, self.vocabulary.evidence[kind], file, entry)

    def _one(self, keys: Keys, form: EvidenceForm, file: Path, entry: dict[Any, Any]) -> None:
        try:
            there = file.exists()
        except OSError:  # a name that no file system takes
            there = False
        if not there:  # the line of the case file is what has to be mended
            what, mend = "there is no such table", "paths start from the case file's folder"
            self.faults.append(
                self.document.fault((*keys, "table"), what, given=_shown(file), mend=mend)
            )
            return
        table, faults, doubts = examine_table(file, form)
        self.faults += faults
        self.doubts += doubts
        if table is None:
            return
        wrong = list(_misplaced(self.document, table, entry.get("zone"))) if form.zoned else []
        self.faults += wrong
        if not wrong and not faults:
            zones, sections = _places(self.document, table, entry.get("zone"))
            index = keys[3] if len(keys) > 3 else 0
            self.by_place[keys[1], form.key, index] = (table, zones, sections)  # type: ignore[index]


def _shown(file: Path) -> str:
    """Show a path, cut in the middle where it is longer than a path can be used for."""
    text = str(file) if str(file).isprintable() else repr(str(file))
    return text if len(text) <= 300 else f"{text[:30]}...{text[-30:]}"


def _places(document: Document, table: Table, zone: Any) -> tuple[TextArray, TextArray]:
    """Give the zone and the section of each row; a section tells its zone."""
    of_section = checks.section_zones(document.data)
    sections = table.texts["section"]
    default = zone if isinstance(zone, str) else ""
    zones = [
        said or default or of_section.get(section, "")
        for said, section in zip(table.texts["zone"].tolist(), sections.tolist(), strict=True)
    ]
    return np.array(zones, dtype=np.str_), sections


def _misplaced(document: Document, table: Table, zone: Any) -> Iterator[Fault]:
    """Find rows whose zone or section does not exist, or that name a section elsewhere."""
    of_section = checks.section_zones(document.data)
    known = mapping_at(document.data, "zones").keys()
    zones, sections = _places(document, table, zone)
    said = table.texts["zone"].tolist()
    seen: set[tuple[str, str, str]] = set()
    rows = zip(table.lines.tolist(), said, zones.tolist(), sections.tolist(), strict=True)
    for line, own, row_zone, section in rows:
        if (own, row_zone, section) in seen:
            continue  # said once, for the first of its rows
        seen.add((own, row_zone, section))
        file = str(table.path)
        if own and own not in known:
            what, near = "there is no zone of this name", nearest(own, known)
            yield Fault(file, line, what, repr(own), listed(known), near)
        elif not row_zone and not section:
            mend = "add zone: to the table's entry in the case file, or a column zone"
            yield Fault(file, line, "the row names no zone", allowed=listed(known), mend=mend)
        if section and section not in of_section:
            what, near = "there is no section of this name", nearest(section, of_section)
            yield Fault(file, line, what, repr(section), listed(of_section), near)
        elif (
            section
            and {row_zone, of_section[section]} <= known
            and (of_section[section] != row_zone)
        ):
            what = f"section {section!r} lies in another zone"
            yield Fault(file, line, what, repr(row_zone), repr(of_section[section]))
