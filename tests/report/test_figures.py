import re
from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.figure import Figure
from matplotlib.text import Text

from assess.decisions.results import RunRecord
from assess.report import derived, figures, index_figures, style
from assess.report.content import build_document
from assess.report.document import FigureNode, Panel
from assess.report.parts import evidence, reliability


def panels(record: RunRecord) -> Iterator[Panel]:
    for section in build_document(record).sections:
        for block in section.blocks:
            if isinstance(block, FigureNode):
                yield from block.panels


def line(figure: Figure, label: str, place: int = 0) -> np.ndarray:
    found = next(item for item in figure.axes[place].lines if item.get_label() == label)
    return np.column_stack(found.get_data())


def test_every_axis_names_its_quantity(record: RunRecord) -> None:
    seen = 0
    for panel in panels(record):
        figure = panel.factory()
        assert panel.alt
        lowest = figure.axes[-1]
        assert lowest.get_xlabel(), panel.title
        assert all(axes.get_ylabel() for axes in figure.axes) or "before and after" in panel.title
        seen += 1
    assert seen > 40


def test_density_panel_draws_every_stage_and_the_data(record: RunRecord) -> None:
    variable = next(item for item in record.variables if item.name == "girder soffits.cover_mean")
    looks = style.stage_looks([item.name for item in record.stages])
    view = evidence.density_view(record, variable, looks)
    figure = figures.density_panel(view)
    labels = [item.get_label() for item in figure.axes[0].lines]
    assert labels[:3] == [item.name for item in record.stages]
    marks = line(figure, "data")[:, 0]
    measured = next(item.values for item in record.data if item.variable == variable.name)
    assert set(marks) <= set(measured)
    assert {measured.min(), measured.max()} <= set(marks)
    low, high = figure.axes[0].get_xlim()
    assert low < measured.min()
    assert high > measured.max()
    assert figure.axes[0].get_xlabel() == "[mm]"


def test_stages_differ_by_dash_and_not_by_colour_alone() -> None:
    looks = style.stage_looks(["prior", "a", "b", "c"])
    assert len({str(look[1]) for look in looks.values()}) == 4
    assert len({str(look[1]) for look in style.OPTION_LOOKS}) == len(style.OPTION_LOOKS)


def test_before_after_shows_indices_bands_and_target(record: RunRecord) -> None:
    groups = reliability.bar_groups(record)
    figure = index_figures.before_after(groups, record.target.index, "target")
    axes = figure.axes[0]
    drawn = {float(item.lines[0].get_xdata()[0]) for item in axes.containers}
    assert drawn == {bar.index for group in groups for bar in group.bars}
    assert list(line(figure, "target")[:, 0]) == [record.target.index] * 2
    low, high = axes.get_xlim()
    assert all(low < bar.low and bar.high < high for group in groups for bar in group.bars)
    texts = {item.get_text().replace("\n", " ") for item in axes.texts}
    assert {group.section for group in groups} <= texts


def test_years_panel_holds_the_curves_of_the_record(record: RunRecord) -> None:
    view = next(v for v in reliability.years_views(record) if v.title == "G3 midspan")
    figure = index_figures.over_years(view)
    last = record.result("G3 midspan", record.stages[-1].name)
    assert np.array_equal(line(figure, "after 2025")[:, 1], last.reference.index)
    prior = record.result("G3 midspan", "prior")
    assert np.array_equal(line(figure, "prior")[:, 1], prior.reference.index)
    assert np.array_equal(line(figure, "after 2025", 1)[:, 1], last.cumulative.index)
    assert line(figure, "crossing")[0, 0] == last.verdict.crossing_year
    ends = line(figure, "crossing interval")[:, 0]
    assert list(ends) == [last.verdict.crossing_low, last.verdict.crossing_high]
    band = figure.axes[0].collections[0].get_paths()[0].vertices[:, 1]
    assert band.min() == pytest.approx(last.reference.low.min())
    assert band.max() == pytest.approx(last.reference.high.max())


def test_periods_that_end_beyond_the_horizon_have_years_of_their_own(record: RunRecord) -> None:
    view = reliability.years_views(record)[0]
    later = [
        replace(item, curve=replace(item.curve, year=item.curve.year + 49)) for item in view.series
    ]
    moved = replace(view, series=later, span=(2075, 2104), abscissa="year in which it ends")
    upper, lower = index_figures.over_years(moved).axes
    assert upper.get_xlim() == (2075, 2104)
    assert lower.get_xlim() == (2026, 2055)
    assert upper.get_xlabel() == "year in which it ends"


@pytest.mark.parametrize("target", [1.0, 3.3, 9.0])
def test_target_words_stay_inside_the_chart(record: RunRecord, target: float) -> None:
    figure = index_figures.before_after(
        reliability.bar_groups(record), target, "target 9.00 (1 yr)"
    )
    figure.draw_without_rendering()
    box = next(t for t in figure.axes[0].texts if "target" in t.get_text()).get_window_extent()
    assert figure.bbox.x0 <= box.x0
    assert box.x1 <= figure.bbox.x1


def test_sections_share_their_scales(record: RunRecord) -> None:
    views = reliability.years_views(record)
    assert len(views) == 6
    assert len({view.limits for view in views}) == 1
    assert len({view.lower_limits for view in views}) == 1


def test_end_labels_do_not_overlap(record: RunRecord) -> None:
    for view in reliability.years_views(record):
        figure = index_figures.over_years(view)
        figure.draw_without_rendering()
        axes = figure.axes[0]
        right = axes.bbox.x1
        # Of the words alone: an annotation's own extent includes its leader line.
        extents = [Text.get_window_extent(text) for text in axes.texts]
        boxes = [box for box in extents if box.x0 > right]
        assert len(boxes) == len(view.series) + 1
        boxes.sort(key=lambda box: box.y0)
        for lower, upper in zip(boxes, boxes[1:], strict=False):
            assert upper.y0 > lower.y1 - 1.0
        assert all(box.x1 <= figure.bbox.x1 for box in boxes)


def test_joint_panel_has_two_regions_for_each_stage(record: RunRecord) -> None:
    pair = derived.dependent_pairs(record)[0]
    last = record.stages[-1].name
    after = (pair.first.draws[last].ravel(), pair.second.draws[last].ravel())
    before = (pair.first.draws["prior"].ravel(), pair.second.draws["prior"].ravel())
    figure = figures.joint_panel(figures.JointView("t", "x [yr]", "y [-]", before, after))
    sets = [item for item in figure.axes[0].collections if hasattr(item, "levels")]
    assert [len(item.levels) for item in sets] == [2, 2]
    cloud = figure.axes[0].lines[0]
    assert len(cloud.get_xdata()) <= figures.MAX_CLOUD
    assert set(cloud.get_xdata()) <= set(after[0])


def test_svg_is_deterministic_and_its_ids_carry_the_prefix(record: RunRecord) -> None:
    view = reliability.years_views(record)[0]
    texts = [style.to_svg(index_figures.over_years(view), prefix) for prefix in ("p1", "p1", "p2")]
    assert texts[0] == texts[1]
    ids = re.findall(r' id="([^"]+)"', texts[0])
    assert ids
    assert all(name.startswith("p1-") for name in ids)
    assert not set(ids) & set(re.findall(r' id="([^"]+)"', texts[2]))
    used = re.findall(r'(?:href="#|url\(#)([^")]+)', texts[0])
    assert set(used) <= set(ids)
    for clue in ("<metadata", "<style", "<!--", "http:"):
        assert clue not in texts[0]


def test_importing_the_report_does_not_import_matplotlib() -> None:
    import subprocess
    import sys

    program = "import sys, assess.report.writer; sys.exit('matplotlib' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0


def test_drawing_leaves_the_settings_of_the_caller(record: RunRecord) -> None:
    import matplotlib

    before = matplotlib.rcParams["font.size"], matplotlib.rcParams["svg.fonttype"]
    index_figures.over_years(reliability.years_views(record)[0])
    assert (matplotlib.rcParams["font.size"], matplotlib.rcParams["svg.fonttype"]) == before
