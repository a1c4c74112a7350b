"""Sections in bending that cannot exist, though each of their quantities is allowed."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from assess.case.forms import Complaint
from assess.case.spec import CaseSpec, Zone
from assess.case.yamlfile import listed, nearest
from assess.mechanics.dimensions import effective_depth
from assess.reliability.loads import AnnualMaximumEffect, Loads


@dataclass(frozen=True, slots=True)
class Shape:
    """Nominal dimensions of a section [mm]; `flange` is its width and thickness."""

    depth: float
    width: float
    flange: tuple[float, float] | None
    link_diameter: float
    bar_count: int
    bar_diameter: float
    spread: float  # width that the bars have


def impossible_shape(shape: Shape, cover: float) -> Iterator[Complaint]:
    """Find dimensions that contradict each other.

    Parameters
    ----------
    shape : Shape
        Nominal dimensions.
    cover : float
        Nominal or mean cover to the links. [mm]

    Yields
    ------
    Complaint
        With the place from the section's entry.
    """
    lever = effective_depth(shape.depth, cover, shape.link_diameter, shape.bar_diameter)
    if lever <= 0.0:
        needed = shape.depth - lever
        yield Complaint(
            ("depth",),
            "the tension bars would lie outside the section",
            f"{shape.depth:g} mm",
            f"more than {needed:g} mm, cover {cover:g} + link {shape.link_diameter:g} + half a "
            f"bar {0.5 * shape.bar_diameter:g}",
            "check depth, cover, link_diameter and bars",
        )
    if shape.flange is not None:
        width, thickness = shape.flange
        if width < shape.width:
            yield Complaint(
                ("flange", "width"),
                "the flange is narrower than the web",
                f"{width:g} mm",
                f"at least the width of {shape.width:g} mm",
                "leave the flange out for a rectangle",
            )
        if thickness > shape.depth:
            yield Complaint(
                ("flange", "thickness"),
                "the flange is thicker than the section is deep",
                f"{thickness:g} mm",
                f"at most the depth of {shape.depth:g} mm",
                "leave the flange out for a rectangle",
            )
    if shape.bar_count * shape.bar_diameter > shape.spread:
        most = int(shape.spread // shape.bar_diameter)
        yield Complaint(
            ("bars", "count"),
            f"bars of {shape.bar_diameter:g} mm in one layer do not fit into the width",
            str(shape.bar_count),
            f"at most {most} in {shape.spread:g} mm",
            "check count and diameter; state `spread` where the bars lie in a slab; several layers "
            "are not modelled",
        )


def impossible_load(loads: Loads, spec: CaseSpec) -> Iterator[Complaint]:
    """Find variable loads that have no distribution, or that vanish within the horizon.

    Parameters
    ----------
    loads : Loads
        Load effects at the section.
    spec : CaseSpec
        Tells the years looked at, and the load models there are.

    Yields
    ------
    Complaint
        With the place from the section's entry.
    """
    stated = loads.variable.annual_maximum
    place = ("loads", "variable", "annual_maximum")
    structure = spec.structure
    if stated.load_model is not None:
        yield from _wrong_model(stated, spec, place)
        return
    key = "mean" if stated.mean is not None else "value"
    if not (stated.mean or stated.value):
        mend = "the variable load effect is needed"
        yield Complaint((*place, key), "the variable load is nothing", "0", "more than 0", mend)
        return
    try:
        mode, scale = stated.gumbel()
    except ValueError as error:
        yield Complaint((*place, key), str(error))
        return
    if not (np.isfinite(mode) and np.isfinite(scale) and scale > 0.0):
        what = "no Gumbel distribution has these numbers"
        yield Complaint((*place, key), what, f"mode {mode:g}, scale {scale:g}")
        return
    years = np.array([structure.assessed + structure.horizon - 1.0])
    last = float(stated.in_years(years, structure.assessed).mode[0])
    if mode > 0.0 >= last:
        most = -1.0 / max(structure.horizon - 1, 1)
        yield Complaint(
            (*place, "growth"),
            "the variable load would shrink to nothing within the horizon",
            f"{stated.growth:g}",
            f"more than {most:.3g} for a horizon of {structure.horizon} years",
            "growth is a share of the first year's effect, the same each year",
        )


def _wrong_model(
    stated: AnnualMaximumEffect, spec: CaseSpec, place: tuple[str, ...]
) -> Iterator[Complaint]:
    """Find load models that do not exist, or whose quantity does not make a moment."""
    model = spec.load_models.get(stated.load_model or "")
    if model is None:
        what, known = "there is no load model of this name", ", ".join(spec.load_models)
        yield Complaint((*place, "load_model"), what, str(stated.load_model), known or "none")
    elif (model.quantity == "force") != (stated.lever is not None):
        what = f"the load model is of a {model.quantity}"
        mend = "state the lever, moment over force" if model.quantity == "force" else "no lever"
        given = "a lever" if stated.lever is not None else "no lever"
        yield Complaint((*place, "lever"), what, given, "", mend)


def unknown_quantities(loads: Loads, spec: CaseSpec) -> Iterator[Complaint]:
    """Find quantities that permanent loads depend on and that the case does not state.

    Parameters
    ----------
    loads : Loads
        Load effects at the section.
    spec : CaseSpec
        Tells the quantities there are.

    Yields
    ------
    Complaint
        With the place from the section's entry.
    """
    known = spec.quantities
    for i, load in enumerate(loads.permanent):
        for j, name in enumerate(load.proportional_to):
            place = ("loads", "permanent", i, "proportional_to", j)
            if name not in known:
                what = "there is no quantity of this name"
                mend = nearest(name, known) or "state it under quantities"
                yield Complaint(place, what, name, listed(known) or "none", mend)
            elif name in load.proportional_to[:j]:
                yield Complaint(place, "the quantity stands twice", name, mend="keep one of them")


def twice_stated(depth_sd: float | None, zone: Zone) -> Iterator[Complaint]:
    """Find a depth whose deviation both the section and its zone state.

    Parameters
    ----------
    depth_sd : float or None
        Standard deviation of the depth that the section states. [mm]
    zone : Zone
        The section's zone.

    Yields
    ------
    Complaint
        With the place from the section's entry.
    """
    if depth_sd is None or zone.dimensions is None or zone.dimensions.depth_deviation is None:
        return
    what = "the zone states how depths deviate, and so does the section"
    mend = "leave out depth_sd, or the zone's depth_deviation and depth_scatter"
    yield Complaint(("depth_sd",), what, f"{depth_sd:g} mm", mend=mend)
