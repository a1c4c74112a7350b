"""From a run record to the document tree: which parts, in which order."""

from assess.decisions.results import RunRecord
from assess.report.document import Document, Section
from assess.report.parts import answer, asked, dependence, diagnostics, evidence, options
from assess.report.parts import reliability as index_parts

PARTS = (
    answer.read_first,
    asked.asked,
    evidence.evidence,
    evidence.learning,
    dependence.dependence,
    index_parts.before_after,
    index_parts.over_years,
    dependence.ignoring,
    options.options,
    diagnostics.diagnostics,
    asked.doubts,
    asked.cautions,
    asked.provenance,
    asked.references,
)


def build_document(record: RunRecord) -> Document:
    """Build the report of a run.

    Parameters
    ----------
    record : RunRecord
        Everything the run found.

    Returns
    -------
    Document
        Figures are not drawn yet: each panel holds the call that draws it.

    Raises
    ------
    ValueError
        If the record has no stage or no result.
    """
    if not record.stages or not record.results:
        raise ValueError(
            f"a report needs a stage and a result: {len(record.stages)} stages and "
            f"{len(record.results)} results given, at least one of each allowed"
        )
    built = [part(record) for part in PARTS]
    if record.accepted_unconverged:
        warning = answer.unconverged_callout(record)
        built = [Section(item.heading, [warning, *item.blocks]) for item in built]
    first, last = record.built, record.assessed
    return Document(
        title=record.title,
        subtitle=f"Reliability assessment {last}; structure built {first}",
        lead=answer.lead(record),
        sections=built,
    )
