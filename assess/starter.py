"""A starter case: commented, with small invented tables, and fit to run as it is."""

import json
import re
from collections.abc import Iterator
from importlib import resources
from pathlib import Path

from assess.case.schema import json_schema
from assess.errors import CaseError, Fault
from assess.vocabulary import vocabulary

TABLES = {
    "cores": "cores_2025.csv",
    "cover": "cover_2025.csv",
    "section_loss": "section_loss_2025.csv",
}
SCHEMA = "assess-case.schema.json"
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9_-]*")  # a leading dash would be read as an option
_LONGEST = 60
_PLACE = "@NAME@"  # in the template, where the case's name belongs


def write_starter(name: str, folder: Path) -> list[Path]:
    """Write a commented case with its tables and the JSON Schema that editors use.

    Parameters
    ----------
    name : str
        Of the case: letters, digits, ``-`` and ``_``, up to 60 of them.
    folder : Path
        Where ``configs/`` and ``case_data/`` are, or are to be made.

    Returns
    -------
    list of Path
        Files written: the case, its tables, and ``configs/assess-case.schema.json``.

    Raises
    ------
    CaseError
        If the name will not do, or the case or its tables exist already: nothing is written then.
    """
    _check_name(name)
    case = folder / "configs" / f"{name}.yaml"
    data = folder / "case_data" / name
    content = dict(_content(name, case, data))
    existing = [path for path in content if path.exists()]
    if existing:
        what, mend = "the file exists already", "take another name, or move it away"
        raise CaseError([Fault(str(path), 0, what, mend=mend) for path in existing])
    # The schema belongs to the tool's version, not to the case: it is written anew.
    content[case.parent / SCHEMA] = _schema()
    for path, text in content.items():
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8", newline="\n")
    return list(content)


def _check_name(name: str) -> None:
    """Refuse names that would not do as a file and a folder on every system."""
    if _NAME.fullmatch(name) and len(name) <= _LONGEST:
        return
    allowed = f"letters without accents, digits, - and _, up to {_LONGEST}, no - or _ in front"
    raise CaseError([Fault("assess new", 0, "a case cannot have this name", repr(name), allowed)])


def _content(name: str, case: Path, data: Path) -> Iterator[tuple[Path, str]]:
    """Give each file of the case with its text."""
    templates = resources.files("assess") / "starter_data"
    yield case, (templates / "case.yaml").read_text(encoding="utf-8").replace(_PLACE, name)
    for kind, table in TABLES.items():
        yield data / table, (templates / f"{kind}.csv").read_text(encoding="utf-8")


def _schema() -> str:
    return json.dumps(json_schema(vocabulary()), indent=2, ensure_ascii=False) + "\n"
