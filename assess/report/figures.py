"""Figures of draws and data: densities, data against prediction, joint densities."""

import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from assess.decisions.results import FloatArray
from assess.report import density, numbers
from assess.report.style import BLUE, FAINT, GREY, INK, Look, new_figure, place, styled

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SMALL = 3.35  # width of a panel that stands three abreast [in]
MAX_CLOUD = 280
MAX_RUG = 150
TITLE_WIDTH = 42  # characters


@dataclass(frozen=True, slots=True, eq=False)
class DensityView:
    """One variable at its stages, and data of the same unit to show below it."""

    title: str
    unit: str
    draws: Mapping[str, FloatArray]  # stage -> (n,)
    looks: Mapping[str, Look]
    data: FloatArray  # (m,), may be empty


@dataclass(frozen=True, slots=True, eq=False)
class JointView:
    """Two variables together at the first and the last stage."""

    title: str
    x_label: str
    y_label: str
    before: tuple[FloatArray, FloatArray] | None
    after: tuple[FloatArray, FloatArray]


def axis_label(label: str, unit: str, width: int = 40) -> str:
    """Name with unit for an axis, broken into lines."""
    whole = label if unit in ("", "-") else f"{label} [{unit}]"
    return "\n".join(textwrap.wrap(whole, width)) or label


def fit_ticks(axes: "Axes", count: int = 5, *, both: bool = True) -> None:
    """Ask for few round ticks on linear axes, plain numbers on logarithmic ones."""
    from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullFormatter

    scales = [(axes.xaxis, axes.get_xscale()), (axes.yaxis, axes.get_yscale())]
    for axis, scale in scales if both else scales[:1]:
        if scale == "linear":
            axis.set_major_locator(MaxNLocator(count, steps=[1, 2, 2.5, 5, 10]))
            continue
        low, high = sorted(axis.get_view_interval())
        decades = np.log10(high / low)
        subs = (1.0, 2.0, 5.0) if decades < 1.6 else (1.0, 3.0) if decades < 2.6 else (1.0,)
        axis.set_major_locator(LogLocator(subs=subs, numticks=12))
        axis.set_major_formatter(FuncFormatter(lambda value, _: _plain(value)))
        axis.set_minor_formatter(NullFormatter())


def _plain(value: float) -> str:
    if 1e-3 <= value < 1e5:
        return f"{value:.6g}"
    return numbers.probability(value) if value < 1e-3 else numbers.significant(value, 1)


@styled
def density_panel(view: DensityView) -> "Figure":
    """Draw one variable's density at every stage over its data.

    Parameters
    ----------
    view : DensityView
        Draws in the unit of the variable.

    Returns
    -------
    Figure
        Areas under the curves are equal, so heights compare.
    """
    figure = new_figure(SMALL, 2.15)
    title = "\n".join(textwrap.wrap(view.title, TITLE_WIDTH))
    axes = place(figure, 0.3, 0.12, 0.5, 0.2 + 0.15 * (title.count("\n") + 1))
    samples = [np.ravel(item) for item in view.draws.values()]
    logarithmic = density.wants_log(samples, view.data)
    top = 0.0
    for stage, draws in view.draws.items():
        colour, dash, _, width = view.looks[stage]
        shape = density.curve(draws, per_log=logarithmic)
        axes.plot(shape.x, shape.y, color=colour, ls=dash, lw=width, label=stage)
        top = max(top, float(shape.y.max()))
    last = axes.lines[-1]
    axes.fill_between(
        np.asarray(last.get_xdata()), np.asarray(last.get_ydata()), color=BLUE, alpha=0.13, lw=0
    )
    _rug(axes, view.data, -0.075 * top)
    if logarithmic:
        axes.set_xscale("log")
    low, high = density.window(samples, view.data)
    if logarithmic and low <= 0.0:
        low = min(float(np.quantile(sample, 0.004)) for sample in samples)
    axes.set_xlim(low, high)
    axes.set_ylim(-0.16 * top if len(view.data) else 0.0, 1.06 * top)
    _only_x(axes)
    axes.set_title(title)
    axes.set_xlabel(axis_label("", view.unit).strip() or "no unit")
    axes.set_ylabel("density", labelpad=4)
    fit_ticks(axes, both=False)
    return figure


def _rug(axes: "Axes", data: FloatArray, height: float) -> None:
    if not len(data):
        return
    shown = density.thinned(np.sort(data), MAX_RUG)
    level = np.full(len(shown), height)
    axes.plot(shown, level, ls="", marker="|", ms=7, mew=0.9, color=INK, label="data")
    axes.axhline(0.0, color=FAINT, lw=0.7, zorder=0)


def _only_x(axes: "Axes") -> None:
    axes.set_yticks([])
    axes.spines["left"].set_visible(False)


@styled
def key_panel(entries: Sequence[tuple[str, Look | None]], *, marks: bool = False) -> "Figure":
    """Draw what line styles mean; an entry without a look is the data mark.

    Parameters
    ----------
    entries : sequence of (str, Look or None)
        Words and look of each series.
    marks : bool, default False
        Show the markers of the series as well.
    """
    from matplotlib.lines import Line2D

    longest = max((len(words) for words, _ in entries), default=0)
    columns = 4 if longest <= 11 else 3 if longest <= 16 else 2
    rows = -(-len(entries) // columns)
    figure = new_figure(4.6, 0.1 + 0.2 * rows)
    handles = []
    filled = max((k for k, (_, look) in enumerate(entries) if look is not None), default=-1)
    for position, (words, look) in enumerate(entries):
        if look is None:
            handles.append(Line2D([], [], ls="", marker="|", ms=8, color=INK, label=words))
            continue
        colour, dash, marker, width = look
        handles.append(
            Line2D(
                [], [], color=colour, ls=dash, lw=width, label=words,
                marker=marker if marks else "", ms=5, mec=colour,
                mfc=colour if position == filled else "white",
            )
        )  # fmt: skip
    figure.legend(
        handles=handles, loc="center left", ncols=columns, handlelength=2.8,
        bbox_to_anchor=(0, 0.5), borderaxespad=0.0, columnspacing=1.4,
    )  # fmt: skip
    return figure


@styled
def joint_panel(view: JointView) -> "Figure":
    """Draw two variables together: draws, and the regions that hold 50 % and 90 % of them.

    Parameters
    ----------
    view : JointView
        Draws, each of shape (n,); the first stage may be absent.

    Returns
    -------
    Figure
        Contours hold 50 % and 90 % of the draws; both stages share the axes.
    """
    figure = new_figure(SMALL, 3.15)
    left, bottom = (0.46 + 0.15 * (label.count("\n") + 1) for label in (view.y_label, view.x_label))
    axes = place(figure, left, 0.12, bottom - 0.1, 0.3)
    stages = [item for item in (view.before, view.after) if item is not None]
    log_x = density.wants_log([item[0] for item in stages])
    log_y = density.wants_log([item[1] for item in stages])
    x, y = view.after
    keep = np.linspace(0, len(x) - 1, min(len(x), MAX_CLOUD)).astype(int)
    axes.plot(x[keep], y[keep], ls="", marker="o", ms=1.8, mew=0, color=BLUE, alpha=0.35)
    if view.before is not None:
        _contours(axes, view.before, log_x, log_y, GREY, (0, (5, 2.5)))
    _contours(axes, view.after, log_x, log_y, BLUE, "-")
    if log_x:
        axes.set_xscale("log")
    if log_y:
        axes.set_yscale("log")
    axes.set_xlim(_limits([item[0] for item in stages], log_x))
    axes.set_ylim(_limits([item[1] for item in stages], log_y))
    axes.set_title(view.title)
    axes.set_xlabel(view.x_label)
    axes.set_ylabel(view.y_label)
    fit_ticks(axes, 4)
    return figure


def _limits(samples: list[FloatArray], logarithmic: bool) -> tuple[float, float]:
    if not logarithmic:
        return density.window(samples, tails=(0.008, 0.985))
    ends = np.array([np.quantile(sample, [0.005, 0.995]) for sample in samples])
    return float(ends[:, 0].min()) / 1.1, float(ends[:, 1].max()) * 1.1


def _contours(
    axes: "Axes",
    pair: tuple[FloatArray, FloatArray],
    log_x: bool,
    log_y: bool,
    colour: str,
    dash: object,
) -> None:
    shape = density.surface(*pair, log_x=log_x, log_y=log_y)
    outer, inner = shape.levels
    if not 0.0 < outer < inner:  # draws on a few points have no regions
        return
    axes.contour(
        shape.x,
        shape.y,
        shape.z,
        levels=[outer, inner],
        colors=[colour],
        linewidths=[1.0, 1.7],
        linestyles=[dash],
    )
