"""One quiet look for every figure, and the way from a figure to SVG text.

Matplotlib is imported when the first figure is made, not when this module is.
"""

import io
import re
from collections.abc import Callable
from functools import wraps
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

INK = "#1f2a33"
FAINT = "#d5dbe0"
GREY = "#5f6b75"  # the prior
BLUE = "#0b5c8a"  # the last stage
OCHRE = "#9a5b00"  # stages between
RUST = "#a3321f"  # targets
GREEN = "#2c6e49"
VIOLET = "#6b4a8c"
TEAL = "#1c7c7d"

# Colour never stands alone: each series has its own dash and marker as well. The hues differ in
# lightness too, so that they keep apart in grey print and for colour-blind readers.
type Look = tuple[str, Any, str, float]  # colour, dash, marker, line width
PRIOR_LOOK: Look = (GREY, (0, (5, 2.5)), "o", 1.2)
FINAL_LOOK: Look = (BLUE, "-", "o", 1.9)
BETWEEN_LOOKS: tuple[Look, ...] = (
    (OCHRE, (0, (6, 1.5, 1.2, 1.5)), "D", 1.3),
    (GREEN, (0, (1.2, 1.4)), "s", 1.5),
    (VIOLET, (0, (6, 1.5, 1.2, 1.5, 1.2, 1.5)), "^", 1.3),
)
OPTION_LOOKS: tuple[Look, ...] = (
    (INK, "-", "o", 1.9),
    (TEAL, (0, (6, 2)), "s", 1.6),
    (OCHRE, (0, (6, 1.5, 1.2, 1.5)), "D", 1.6),
    (VIOLET, (0, (1.4, 1.4)), "^", 1.7),
    (GREEN, (0, (9, 2, 2, 2)), "v", 1.6),
    (GREY, (0, (3, 3)), "P", 1.6),
)

RC: Any = {  # keys are what matplotlib declares, which is not imported here
    "font.family": ["DejaVu Sans"],  # measured with it; wider than what a browser will use
    "font.size": 8.5,
    "text.color": INK,
    "text.parse_math": False,  # a dollar sign in a name is a dollar sign
    "axes.edgecolor": GREY,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.titlesize": 9.0,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.titlepad": 6.0,
    "axes.labelsize": 8.5,
    "axes.formatter.useoffset": False,
    "axes.unicode_minus": True,
    "xtick.color": GREY,
    "ytick.color": GREY,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.labelsize": 8.0,
    "ytick.labelsize": 8.0,
    "xtick.major.size": 3.0,
    "ytick.major.size": 3.0,
    "xtick.major.width": 0.7,
    "ytick.major.width": 0.7,
    "grid.color": FAINT,
    "grid.linewidth": 0.6,
    "legend.frameon": False,
    "legend.fontsize": 8.5,
    "figure.facecolor": "none",
    "axes.facecolor": "none",
    "savefig.facecolor": "none",
    "path.simplify": True,
    "svg.fonttype": "none",  # real text: searchable, sharp, small
}


def stage_looks(stages: list[str]) -> dict[str, Look]:
    """Give each stage its colour, dash and marker: the first quiet, the last strong."""
    looks = {
        stage: BETWEEN_LOOKS[position % len(BETWEEN_LOOKS)]
        for position, stage in enumerate(stages[1:-1])
    }
    if stages:
        looks[stages[0]] = PRIOR_LOOK
        looks[stages[-1]] = FINAL_LOOK if len(stages) > 1 else PRIOR_LOOK
    return looks


def styled[**P, R](draw: Callable[P, R]) -> Callable[P, R]:
    """Draw with our settings, leaving the caller's untouched."""

    @wraps(draw)
    def wrapper(*args: P.args, **kwargs: P.kwargs) -> R:
        import matplotlib

        with matplotlib.rc_context(RC):
            return draw(*args, **kwargs)

    return wrapper


def new_figure(width: float, height: float) -> "Figure":
    """Make an empty figure of a size [in], without pyplot."""
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height))


def place(figure: "Figure", left: float, right: float, bottom: float, top: float) -> "Axes":
    """Add axes with margins in inches, which keeps labels inside whatever the size."""
    width, height = figure.get_size_inches()
    return figure.add_axes(
        (
            left / width,
            bottom / height,
            (width - left - right) / width,
            (height - bottom - top) / height,
        )
    )


def to_svg(figure: "Figure", prefix: str) -> str:
    """Write a figure as an SVG element for inlining.

    Parameters
    ----------
    figure : Figure
        What to write.
    prefix : str
        Begins every id of the element, so that two figures of a page cannot share one.

    Returns
    -------
    str
        The ``<svg>`` element without prolog, metadata, style sheet or fixed size; the same
        figure and prefix give the same text.
    """
    import matplotlib

    with matplotlib.rc_context({**RC, "svg.hashsalt": prefix}):
        stream = io.StringIO()
        figure.savefig(stream, format="svg", metadata={"Date": None, "Creator": None})
    text = stream.getvalue()
    text = text[text.index("<svg") :]
    text = re.sub(r"<metadata>.*?</metadata>\s*", "", text, flags=re.DOTALL)
    # The style sheet of an inline SVG would apply to the whole page; the writer has its rule.
    text = re.sub(r"<defs>\s*<style.*?</style>\s*</defs>\s*", "", text, flags=re.DOTALL)
    text = re.sub(r"<!--.*?-->\s*", "", text, flags=re.DOTALL)
    text = text.replace("xlink:href", "href")
    referenced = set(re.findall(r'(?:href="#|url\(#)([^")]+)', text))

    def rename(match: re.Match[str]) -> str:
        name = match.group(1)
        return f' id="{prefix}-{name}"' if name in referenced else ""

    text = re.sub(r' id="([^"]+)"', rename, text)
    text = re.sub(r'href="#([^"]+)"', rf'href="#{prefix}-\1"', text)
    text = re.sub(r"url\(#([^)]+)\)", rf"url(#{prefix}-\1)", text)
    head = re.match(r"<svg[^>]*>", text)
    box = re.search(r'viewBox="([^"]+)"', head.group(0)) if head else None
    if head is None or box is None:
        raise ValueError("the figure gave no SVG element with a viewBox")
    return f'<svg viewBox="{box.group(1)}">' + re.sub(r"\n\s*", "\n", text[head.end() :]).strip()
