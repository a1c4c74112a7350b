"""Write the report of a run to a file."""

from pathlib import Path

from assess.decisions.results import RunRecord
from assess.report.content import build_document
from assess.report.html import render


def write_report(record: RunRecord, path: Path) -> None:
    """Write one self-contained HTML file.

    Parameters
    ----------
    record : RunRecord
        Everything the run found.
    path : Path
        File to write; its folder must exist. Written beside and moved into place, so that a
        reader never finds half a report.

    Raises
    ------
    ValueError
        If the record has no stage or no result.
    """
    text = render(build_document(record))
    unfinished = path.with_name(path.name + ".part")
    unfinished.write_text(text, encoding="utf-8", newline="\n")
    unfinished.replace(path)
