"""Figures of the reliability index: before and after, over the years, under options."""

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np

from assess.decisions.results import IndexCurve
from assess.report import numbers
from assess.report.figures import fit_ticks
from assess.report.style import (
    FAINT,
    INK,
    RUST,
    Look,
    new_figure,
    place,
    styled,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MEDIUM = 4.3  # width of a panel that stands two abreast [in]
LONE = 4.5  # width of the before-and-after chart, which stands alone [in]
ROW = 0.17  # height of one bar of the before-and-after chart [in]
HALO = "#ffffff"


@dataclass(frozen=True, slots=True)
class Bar:
    """Index of one section in one state, with its band and its numerical error."""

    index: float
    error: float  # standard error
    low: float  # 5 % of the conditional index
    high: float  # 95 %
    look: Look


@dataclass(frozen=True, slots=True)
class BarGroup:
    """The states of one section, first on top."""

    section: str
    bars: Sequence[Bar]


@dataclass(frozen=True, slots=True, eq=False)
class Series:
    """One curve with the words that stand at its end."""

    words: str
    curve: IndexCurve
    look: Look
    band: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class YearsView:
    """Index of one section over the years."""

    title: str
    series: Sequence[Series]
    target: float
    target_words: str
    limits: tuple[float, float]  # of the index, shared between sections
    span: tuple[int, int]  # years
    abscissa: str
    crossing: tuple[int | None, int | None, int | None] | None  # year, 5 %, 95 %
    ordinate: str
    lower: Sequence[Series]  # second panel: cumulative index
    lower_limits: tuple[float, float]
    lower_label: str


@styled
def before_after(groups: Sequence[BarGroup], target: float, target_words: str) -> "Figure":
    """Draw every section's index in each state against the target.

    Parameters
    ----------
    groups : sequence of BarGroup
        One per section, each with as many bars as there are states.
    target : float
        Required index. [-]
    target_words : str
        What stands at the target line.

    Returns
    -------
    Figure
        Pale bar: 5-95 % band of the conditional index; marker: index; whisker: two standard
        errors of the numerical calculation.
    """
    names = [
        "\n".join(textwrap.wrap(_breakable(group.section), 20, break_long_words=False))
        for group in groups
    ]
    most = max(len(group.bars) for group in groups)
    pitch = ROW * most + 0.2
    figure = new_figure(LONE, pitch * len(groups) + 0.85)
    axes = place(figure, 1.42, 0.42, 0.5, 0.32)
    for position, group in enumerate(groups):
        middle = -pitch * position
        if position:
            axes.axhline(middle + pitch / 2, color=FAINT, lw=0.6, zorder=0)
        for place_in_group, bar in enumerate(group.bars):
            height = middle + ROW * ((len(group.bars) - 1) / 2 - place_in_group)
            _bar(axes, bar, height, last=place_in_group == len(group.bars) - 1)
    axes.axvline(target, color=RUST, ls=(0, (4, 2)), lw=1.3, zorder=1, label="target")
    axes.set_yticks([])
    for position, name in enumerate(names):
        # Set from the left: lines of one name keep their edge whatever font the reader has.
        axes.annotate(
            name, (0.0, -pitch * position), xycoords=("figure fraction", "data"), xytext=(3, 0),
            textcoords="offset points", va="center", ha="left", fontweight="bold",
            annotation_clip=False,
        )  # fmt: skip
    axes.set_ylim(-pitch * (len(groups) - 0.5), pitch / 2)
    shown = [value for group in groups for bar in group.bars for value in (bar.low, bar.high)]
    low, high = min([*shown, target]), max([*shown, target])
    axes.set_xlim(low - 0.05 * (high - low), high + 0.05 * (high - low))
    axes.text(
        target, 1.0, target_words, color=RUST, ha=_side(axes, target), va="bottom",
        transform=axes.get_xaxis_transform(),
    )  # fmt: skip
    axes.spines["left"].set_visible(False)
    axes.set_xlabel("reliability index β [-]")
    axes.xaxis.grid(True)
    axes.set_axisbelow(True)
    _round_years(axes, 6)
    return figure


def _side(axes: "Axes", x: float) -> Literal["left", "center", "right"]:
    """Alignment that keeps words at an abscissa inside the figure."""
    low, high = axes.get_xlim()
    place_of_x = (x - low) / (high - low)
    return "left" if place_of_x < 0.25 else "right" if place_of_x > 0.75 else "center"


def _breakable(words: str) -> str:
    return words.replace("/", "/ ").replace("_", "_ ")


def _round_years(axes: "Axes", count: int) -> None:
    from matplotlib.ticker import MaxNLocator

    axes.xaxis.set_major_locator(MaxNLocator(count, steps=[1, 2, 5, 10]))


def _bar(axes: "Axes", bar: Bar, height: float, *, last: bool) -> None:
    colour, dash, marker, _ = bar.look
    axes.plot(
        [bar.low, bar.high], [height, height], color=colour, lw=5.0, alpha=0.26,
        solid_capstyle="butt",
    )  # fmt: skip
    axes.errorbar(
        bar.index, height, xerr=2.0 * bar.error, color=colour, marker=marker, ms=5.0, lw=1.2,
        capsize=0.0, mec=colour, mfc=colour if last else "white", ls="",
    )  # fmt: skip
    if last:
        axes.annotate(
            numbers.index(bar.index), (1.0, height), xycoords=("axes fraction", "data"),
            xytext=(4, 0), textcoords="offset points", va="center", color=colour,
            fontweight="bold",
        )  # fmt: skip


@styled
def over_years(view: YearsView) -> "Figure":
    """Draw one section's index over the years, with the cumulative index below.

    Parameters
    ----------
    view : YearsView
        Curves, target and crossing of one section.

    Returns
    -------
    Figure
        Two axes that share the years, or one where there is no cumulative curve.
    """
    # Periods that end beyond the horizon need years of their own.
    own_years = bool(view.lower) and _span(view.lower) != view.span
    extra = 0.36 if own_years else 0.0
    height = (3.9 if view.lower else 2.9) + extra
    figure = new_figure(MEDIUM, height)
    bottom = 1.72 + extra if view.lower else 0.5
    axes = place(figure, 0.56, 1.2, bottom, 0.3)
    axes.set_ylim(*view.limits)
    axes.set_xlim(*view.span)
    _curves(axes, view.series)
    _target(axes, view)
    _end_words(axes, view.series, (view.target_words, view.target))
    axes.set_title(view.title)
    axes.set_ylabel(view.ordinate)
    axes.yaxis.grid(True)
    axes.set_axisbelow(True)
    fit_ticks(axes)
    _round_years(axes, 6)
    if view.lower:
        axes.tick_params(labelbottom=own_years)
        below = place(figure, 0.56, 1.2, 0.5, height - 1.55)
        below.set_ylim(*view.lower_limits)
        below.set_xlim(*_span(view.lower))
        _curves(below, view.lower)
        _end_words(below, view.lower)
        below.set_ylabel(view.lower_label)
        below.yaxis.grid(True)
        below.set_axisbelow(True)
        fit_ticks(below, 4)
        _round_years(below, 6)
        below.set_xlabel("year")
    if own_years or not view.lower:
        axes.set_xlabel(view.abscissa)
    return figure


def _span(series: Sequence[Series]) -> tuple[int, int]:
    year = series[0].curve.year
    return int(year[0]), int(year[-1])


def _curves(axes: "Axes", series: Sequence[Series]) -> None:
    for item in series:
        colour, dash, _, width = item.look
        curve = item.curve
        if item.band:
            axes.fill_between(curve.year, curve.low, curve.high, color=colour, alpha=0.16, lw=0)
        axes.plot(curve.year, curve.index, color=colour, ls=dash, lw=width, label=item.words)


def _target(axes: "Axes", view: YearsView) -> None:
    axes.axhline(view.target, color=RUST, ls=(0, (4, 2)), lw=1.2, label="target")
    if view.crossing is None:
        return
    year, low, high = view.crossing
    last = view.span[1]
    if low is not None:
        end = last if high is None else high
        axes.plot(
            [low, end], [view.target] * 2, color=INK, lw=2.6, solid_capstyle="butt",
            label="crossing interval",
        )  # fmt: skip
        axes.plot([low], [view.target], ls="", marker="|", ms=7, mew=1.4, color=INK)
        open_end = high is None  # an arrow where the interval goes on beyond the horizon
        axes.plot(
            [end], [view.target], ls="", marker=">" if open_end else "|", ms=5 if open_end else 7,
            mew=1.4, color=INK, clip_on=False,
        )  # fmt: skip
    if year is not None:
        axes.plot(
            [year], [view.target], ls="", marker="v", ms=7, color=INK, mec=HALO, label="crossing"
        )
        axes.annotate(
            str(year), (year, view.target), xytext=(0, 7), textcoords="offset points",
            ha="center" if view.span[0] + 3 < year < last - 3 else "left", va="bottom",
            fontweight="bold", bbox=_halo(),
        )  # fmt: skip


def _halo() -> dict[str, object]:
    return {"facecolor": HALO, "edgecolor": "none", "alpha": 0.75, "pad": 0.8}


def _end_words(
    axes: "Axes", series: Sequence[Series], target: tuple[str, float] | None = None
) -> None:
    """Write each curve's name at its end, and the target's, moved apart where ends meet."""
    low, high = axes.get_ylim()
    inches = axes.bbox.height / axes.figure.dpi
    named = [(item.words, float(item.curve.index[-1]), item.look[0]) for item in series]
    if target is not None:
        named.append((*target, RUST))
    lines = [textwrap.wrap(words, 19, break_long_words=False) for words, _, _ in named]
    unit = (high - low) / inches  # index per inch
    ends = [float(np.clip(end, low, high)) for _, end, _ in named]
    heights = [0.135 * len(parts) * unit + 0.04 * unit for parts in lines]
    placed = spaced(ends, heights, low, high)
    for (_, _, colour), parts, y, end in zip(named, lines, placed, ends, strict=True):
        axes.annotate(
            "\n".join(parts), (1.0, end), xycoords=("axes fraction", "data"), xytext=(1.045, y),
            textcoords=("axes fraction", "data"), va="center", color=colour, annotation_clip=False,
            linespacing=1.05, fontsize=8.0,
            arrowprops={"arrowstyle": "-", "color": colour, "lw": 0.6, "shrinkA": 0, "shrinkB": 0,
                        "relpos": (0.0, 0.5)},
        )  # fmt: skip


def spaced(
    wanted: Sequence[float], heights: Sequence[float], low: float, high: float
) -> list[float]:
    """Move label centres apart so that no two overlap, staying within an axis if they fit.

    Parameters
    ----------
    wanted, heights : sequence of float, length n
        Wanted centres and heights of the labels, in the unit of the axis.
    low, high : float
        Ends of the axis.

    Returns
    -------
    list of float
        Centres, in the order given.

    Examples
    --------
    >>> spaced([1.0, 1.1], [0.4, 0.4], 0.0, 5.0)
    [1.0, 1.4]
    """
    order = sorted(range(len(wanted)), key=lambda k: (wanted[k], k))
    centres = [float(value) for value in wanted]
    floor = low
    for k in order:
        centres[k] = max(centres[k], floor + heights[k] / 2)
        floor = centres[k] + heights[k] / 2
    ceiling = max(high, low + sum(heights))
    for k in reversed(order):
        centres[k] = min(centres[k], ceiling - heights[k] / 2)
        ceiling = centres[k] - heights[k] / 2
    return centres
