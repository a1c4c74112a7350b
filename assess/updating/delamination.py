"""Evidence: share of a surface that has delaminated or spalled."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from assess import operations as op
from assess.case.forms import Column, EvidenceEntry, EvidenceForm
from assess.case.processes import only_positive
from assess.case.reader import Case, Evidence
from assess.errors import Fault
from assess.updating import corrosion_history as history
from assess.updating.corrosion_faults import zones_without_corrosion
from assess.updating.corrosion_history import LEAST_AGE, Places, Population
from assess.updating.delamination_faults import contradicting_surveys, impossible_shares
from assess.updating.kind import (
    EvidenceKind,
    FloatArray,
    IntArray,
    Numeric,
    Rows,
    build_rows,
    gather,
    index_places,
    place_keys,
    zone_values,
)
from assess.updating.local import LocalModel
from assess.updating.measuring import catalogue_variable, restated_faults
from assess.updating.variables import Variable

MOST_PATCHES = 1e4  # more independent patches than any surface has


class DelaminationEntry(EvidenceEntry):
    """What a survey says of its delaminated shares: all of it stands in the table."""


class Delamination(EvidenceKind):
    r"""Delaminated share: the share of places whose loss of radius has loosened the cover.

    Notes
    -----
    At a place of a zone, with onset :math:`t_i` and rate r lognormal as for break-outs, the cover
    has come loose at age T where the loss of radius exceeds the critical one of the place,
    :math:`r (T - t_i)^+ > d`, :math:`\ln d \sim N(\ln \bar d, s_d^2)`; so by T with probability

    .. math:: G(T) = \int_0^T f(t_i)\, \Phi\left( \frac{\ln \bar r + \ln(T - t_i) - \ln \bar d}
              {\sqrt{s_r^2 + s_d^2}} \right) dt_i

    (`corrosion_history.log_likelihood`: loss found beyond a limit, not measured). A surface is
    worth n independent patches. A surface surveyed at :math:`T_1 < T_2 < \dots` has the same
    patches each time, and what is loose stays so: the shares :math:`x_k` are multinomial,

    .. math:: \ln L = n \sum_k (x_k - x_{k-1}) \ln[G(T_k) - G(T_{k-1})] + n (1 - x_m) \ln[1 -
              G(T_m)]

    A surface is the section or the location that a row names, else the whole of its zone.
    """

    form = EvidenceForm(
        key="delamination",
        title="Delaminated share",
        entry=DelaminationEntry,
        columns=(
            Column("share", "share of the surface that is hollow or has spalled", "-"),
            Column(
                "patches",
                "number of independent patches that the surface is worth",
                "-",
                above=0.0,
                below=MOST_PATCHES,
            ),
        ),
        value="share",
    )
    unit = "-"
    log_scale = False
    assumption = (
        "The cover comes loose where the loss of radius exceeds a critical one that differs from "
        "place to place; a surface is worth the stated number of independent patches, the same at "
        "every survey of it; these count as other places than those looked at by other means."
    )
    carrier = "onset"

    def variables(self, case: Case) -> tuple[Variable, ...]:
        """Give the critical loss of radius and its scatter, if shares were surveyed."""
        if not gather(case, self.form.key):
            return ()
        return (
            catalogue_variable(
                "delamination.critical_loss",
                "median loss of radius that loosens the cover",
                "$d$",
                "mm",
                "critical loss of delamination",
            ),
            catalogue_variable(
                "delamination.critical_scatter",
                "scatter of ln critical loss from place to place",
                "$s_d$",
                "-",
                "critical loss of delamination, scatter",
            ),
        )

    def faults(self, case: Case) -> Sequence[Fault]:
        """Find impossible shares, surfaces that healed or changed, zones that do not corrode."""
        items = gather(case, self.form.key)
        found = list(zones_without_corrosion(case, items, "delamination was looked for"))
        found += [fault for _, item in items for fault in impossible_shares(self.form, item)]
        rows = None if found else self.rows(case)
        if rows is not None:
            found += contradicting_surveys(rows, _previous(rows), items)
        return [*found, *restated_faults(case, self.variables(case), only_positive)]

    def rows(self, case: Case) -> Rows | None:
        """Gather the shares of all surveys; a place is a surface."""
        items = gather(case, self.form.key)
        if not items:
            return None
        rows = build_rows(
            items,
            [item.table.numbers["share"] for _, item in items],
            {
                "age": [np.full(len(item.table), item.age) for _, item in items],
                "patches": [item.table.numbers["patches"] for _, item in items],
            },
        )
        place, places = index_places([key for _, item in items for key in _surfaces(item)])
        place_zone = np.zeros(len(places), dtype=np.int64)
        place_zone[place] = rows.zone
        return replace(rows, place=place, places=places, place_zone=place_zone)

    def data(self, rows: Rows, stage: int) -> dict[str, NDArray[Any]]:
        """Patches that came loose between surveys, and those sound at the last; later ones off."""
        previous = _previous(rows)
        active = rows.stage <= stage
        before = np.where(previous < 0, 0.0, rows.value[previous])
        overtaken = np.isin(np.arange(len(active)), previous[active])
        patches = rows.extra["patches"]
        return {
            "delamination_grown": np.where(active, patches * (rows.value - before), 0.0),
            "delamination_sound": np.where(active & ~overtaken, patches * (1.0 - rows.value), 0.0),
        }

    def log_likelihood(
        self, rows: Rows, values: Mapping[str, Numeric], data: Mapping[str, Numeric]
    ) -> Numeric:
        """Log-likelihood of all active shares, up to a constant."""
        population, log_critical = _population(rows, values)
        zone = np.concatenate([rows.zone, rows.zone])
        both = history.log_likelihood(
            _patches(rows, log_critical),
            Population(*(part[..., zone, None] for part in population)),
        )
        count = len(rows.zone)
        grown = data["delamination_grown"] * both[..., :count]
        return (grown + data["delamination_sound"] * both[..., count:]).sum(axis=-1)

    def simulate(
        self, rows: Rows, values: Mapping[str, FloatArray], rng: np.random.Generator
    ) -> FloatArray:
        """Draw the shares of the same surfaces, patch by patch."""
        population, log_critical = _population(rows, values)
        share = np.empty((len(log_critical), len(rows.value)))
        for place, zone in enumerate(rows.place_zone):
            here = np.flatnonzero(rows.place == place)
            shape = (len(share), int(rows.extra["patches"][here[0]]))
            log_onset, onset_scatter, log_rate, rate_scatter = (
                part[:, zone, None] for part in population
            )
            onset = np.exp(log_onset + onset_scatter * rng.standard_normal(shape))
            margin = log_rate + rate_scatter * rng.standard_normal(shape) - log_critical[:, None]
            for row in here:
                years = np.maximum(rows.extra["age"][row] - onset, LEAST_AGE)
                share[:, row] = (margin + np.log(years) > 0.0).mean(axis=1)
        return share

    def local(
        self,
        rows: Rows | None,
        stage: int,
        section: str,
        zone: str,
        values: Mapping[str, FloatArray],
    ) -> tuple[LocalModel, ...]:
        """Leave the section's local variables to others: a share informs its zone."""
        return ()


def _surfaces(item: Evidence) -> Iterator[str]:
    """Name the surface of each row."""
    for key, zone in zip(place_keys(item), item.zone.tolist(), strict=True):
        yield key or f"{zone}: whole zone"


def _previous(rows: Rows) -> IntArray:
    """Row of the survey before, of the same surface; -1 where there is none."""
    previous = np.full(len(rows.place), -1, dtype=np.int64)
    last: dict[int, int] = {}
    for row, place in enumerate(rows.place.tolist()):  # surveys go in order of date
        previous[row] = last.get(place, -1)
        last[place] = row
    return previous


def _population(rows: Rows, values: Mapping[str, Numeric]) -> tuple[Population, Numeric]:
    """Give onset and rate of loss of each zone, and ln of the median critical loss.

    The rate scatters as rate over critical loss does.
    """
    zone = history.population(
        *(
            zone_values(rows, values, name)
            for name in ("onset", "onset_scatter", "current", "current_scatter")
        )
    )
    scatter = values["delamination.critical_scatter"][..., None]
    combined = op.sqrt(zone.rate_scatter**2 + scatter**2)
    return zone._replace(rate_scatter=combined), op.log(values["delamination.critical_loss"])


def _patches(rows: Rows, log_critical: Numeric) -> Places:
    """Put the fates of patches as findings: loosened since the survey before, then still sound.

    Shape (2 n_row, 2): the first n_row were below the limit at the survey before and above it at
    the row's, the others below it at the row's.
    """
    previous, age = _previous(rows), rows.extra["age"]
    count = len(age)
    before = np.where(previous < 0, age, age[previous])
    ages = np.concatenate([np.column_stack([before, age]), np.column_stack([age, age])])
    found, none = np.zeros((2 * count, 2)), np.zeros((2 * count, 2))
    found[:count, 1] = 1.0
    none[:count, 0] = previous >= 0
    none[count:, 1] = 1.0
    nothing = np.zeros((2 * count, 2))
    return Places(
        log_last=np.log(ages[:, 1]),
        log_edge=np.log(ages),
        age=ages,
        found=found,
        none=none,
        log_loss=nothing,
        precision=nothing,
        limit=nothing + log_critical[..., None, None],
        visits=2,
    )
