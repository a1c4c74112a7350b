"""What was asked and assumed, the doubts about the data, the cautions, the sources."""

from assess.decisions.results import RunRecord
from assess.report import derived, numbers, words
from assess.report.document import (
    BulletList,
    Callout,
    CalloutKind,
    Cell,
    Column,
    Form,
    Paragraph,
    References,
    Section,
    Table,
    text_cell,
)

# From memory, except where a docstring of the code cites the same work.
METHODS = (
    "Reliability index and failure probability, P = \u03a6(\u2212\u03b2): EN 1990:2002, Annex C.",
    "Rank-normalised R-hat and effective sample size: A. Vehtari, A. Gelman, D. Simpson, "
    "B. Carpenter, P.-C. Bürkner, Bayesian Analysis 16 (2021) 667\u2013718, "
    "doi:10.1214/20-BA1221.",
    "Sampler: M. D. Hoffman, A. Gelman, The No-U-Turn Sampler, Journal of Machine Learning "
    "Research 15 (2014) 1593\u20131623.",
    "Predictive p-values: A. Gelman, X.-L. Meng, H. Stern, Statistica Sinica 6 (1996) "
    "733\u2013807.",
    "Rank correlation: C. Spearman, American Journal of Psychology 15 (1904) 72\u2013101, "
    "doi:10.2307/1412159.",
    "Highest-density regions of the joint pictures: R. J. Hyndman, The American Statistician 50 "
    "(1996) 120\u2013126, doi:10.1080/00031305.1996.10474359.",
)


def asked(record: RunRecord) -> Section:
    """Return structure, period, sections, money and assumptions."""
    last = derived.last_year(record)
    blocks = [
        Paragraph([record.description]) if record.description else None,
        Table(
            "The question",
            [Column("What"), Column("Stated", wide=True)],
            [[text_cell(name), text_cell(value)] for name, value in _facts(record, last)],
        ),
        _sections_table(record),
        Paragraph(["The following was assumed."]) if record.assumptions else None,
        BulletList([[item] for item in record.assumptions]) if record.assumptions else None,
    ]
    return Section("What was asked and assumed", [item for item in blocks if item is not None])


def _facts(record: RunRecord, last: int) -> list[tuple[str, str]]:
    target = record.target
    facts = [
        ("Structure", record.title),
        ("Built", str(record.built)),
        ("Assessed", str(record.assessed)),
        ("Horizon", f"{words.years(record.horizon)}, to {last}"),
        ("Required index", f"{numbers.index(target.index)} for {words.years(target.period)}"),
        ("Required by", f"{target.set_name}, class {target.class_name}; {target.source}"),
        ("States of knowledge", "; ".join(item.name for item in record.stages)),
        ("Options", "; ".join(words.option_words(name) for name in derived.option_names(record))),
    ]
    if record.failure_cost is not None:
        facts.append(("Cost of a failure", numbers.money(record.failure_cost, record.currency)))
    if record.discount_rate is not None:
        rate = numbers.fixed(100.0 * record.discount_rate, 1)
        facts.append(("Discount rate", f"{rate}{numbers.NO_BREAK}% a year"))
    return facts


def _sections_table(record: RunRecord) -> Table:
    seen = derived.measured_sections(record)
    rows = []
    for name in derived.sections(record):
        first = next(item for item in record.results if item.section == name)
        measured = "yes" if name in seen else "no, drawn from the zone"
        rows.append([text_cell(word) for word in (name, first.member, first.zone, measured)])
    heads = [Column("Section"), Column("Member"), Column("Zone"), Column("Measured directly")]
    return Table("The sections examined", heads, rows)


def doubts(record: RunRecord) -> Section:
    """Return what is doubtful about the data."""
    if not record.doubts:
        return Section("Doubts about the data", [Paragraph(["The checks of the data found none."])])
    return Section("Doubts about the data", [BulletList([[item] for item in record.doubts])])


def cautions(record: RunRecord) -> Section:
    """Return the limits of what this report says."""
    del record
    blocks = [Callout(CalloutKind.CAUTION, "Limits of this report", words.CAUTIONS[0])]
    return Section("Cautions", [*blocks, BulletList([[item] for item in words.CAUTIONS[1:]])])


def provenance(record: RunRecord) -> Section:
    """Return how the run came about and how to have it again."""
    origin = record.provenance
    general = [
        ("Command", origin.command),
        ("Started", origin.started),
        ("Seed", str(origin.seed)),
        ("Sampler", origin.sampler),
    ]
    return Section(
        "Provenance",
        [
            Paragraph(
                ["The command below, with the same inputs and versions, gives the same numbers."]
            ),
            Table(
                "The run",
                [Column("What"), Column("Stated", wide=True)],
                [[text_cell(name), text_cell(value)] for name, value in general],
            ),
            Table(
                "Inputs",
                [Column("File"), Column("SHA-256", wide=True)],
                [[text_cell(path), text_cell(digest)] for path, digest in origin.inputs.items()],
            ),
            Table(
                "Versions",
                [Column("Software"), Column("Version")],
                [[text_cell(name), text_cell(value)] for name, value in origin.versions.items()],
            ),
            Table(
                "Time spent",
                [Column("Step"), Column("Time", "s", right=True)],
                [[text_cell(step), Cell(t, Form.SECONDS)] for step, t in origin.timings.items()],
            ),
        ],
    )


def references(record: RunRecord) -> Section:
    """Return the sources of target, priors and methods, each once."""
    target = record.target
    found = [f"Target: {target.set_name}, {target.source}."]
    by_source: dict[str, list[str]] = {}
    for item in record.variables:
        if item.source:
            by_source.setdefault(item.source, []).append(item.label)
    found += [
        f"{source.rstrip('.')}. Prior of {numbers.listing(labels)}."
        for source, labels in by_source.items()
    ]
    return Section("References", [References([*found, *METHODS])])
