"""Onset and current at a section that was itself broken out: their joint distribution there."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special

from assess.mechanics.corrosion import penetration_depth
from assess.updating.corrosion_history import (
    Places,
    Population,
    log_onset_density,
    rate_given_onset,
    years_at_visits,
)
from assess.updating.local import (
    SCORES,
    LocalModel,
    look_up,
    quantile_table,
    scores_of_density,
    truncated_score,
)

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

GRID = 257  # onsets at which the conditional density is tabulated


@dataclass(frozen=True, slots=True, eq=False)
class MeasuredCorrosion(LocalModel):
    """Onset and current at one place given what its break-outs found, for each draw.

    Attributes
    ----------
    seen : Places
        The one place.
    zone : Population
        Parameters of its zone, arrays (n_draw,).
    log_onset : ndarray, shape (n_draw, n_score)
        Quantiles of ln onset at `assess.updating.local.SCORES`, given the findings.

    Notes
    -----
    The first standard normal gives the onset by its distribution given the findings; the second
    the rate given that onset, a truncated lognormal (`corrosion_history`). The pair thus follows
    the joint posterior of the place, whose ridge it keeps, with nothing drawn beforehand.
    """

    seen: Places
    zone: Population
    log_onset: FloatArray

    names = ("onset", "current")
    normals = ("onset", "current")

    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        """Map standard normals to onset [yr] and current [µA/cm²]."""
        onset = np.exp(look_up(self.log_onset, z[..., 0], draws))
        zone = Population(*(part[draws][:, None] for part in self.zone))
        rate = rate_given_onset(self.seen, zone, years_at_visits(self.seen, onset))
        log_rate = rate.mean + rate.sd * truncated_score(z[..., 1], rate.lower, rate.upper)
        return {"onset": onset, "current": np.exp(log_rate) / penetration_depth(1.0, 1.0)}

    def without_dependence(self, rng: np.random.Generator) -> LocalModel:
        """Onset and current each as they are distributed, independent of each other and all else.

        The current of one draw is paired with an onset of its own, which a third standard normal
        brings, and only the current is kept.
        """
        count = len(self.log_onset)
        return _TornCorrosion(self, rng.permutation(count), rng.permutation(count))


@dataclass(frozen=True, slots=True, eq=False)
class _TornCorrosion(LocalModel):
    """Onset and current of a measured place with their dependence dropped."""

    joint: MeasuredCorrosion
    onset_draw: IntArray
    current_draw: IntArray

    names = ("onset", "current")
    normals = ("onset", "current", "current through its onset")

    def values(self, z: FloatArray, draws: IntArray) -> dict[str, FloatArray]:
        log_onset = look_up(self.joint.log_onset, z[..., 0], self.onset_draw[draws])
        pair = self.joint.values(z[..., [2, 1]], self.current_draw[draws])
        return {"onset": np.exp(log_onset), "current": pair["current"]}

    def without_dependence(self, _rng: np.random.Generator) -> LocalModel:
        return self


def measured_corrosion(seen: Places, zone: Population) -> MeasuredCorrosion:
    """Condition onset and current of one place on what was found there.

    Parameters
    ----------
    seen : Places
        One place at which something is known.
    zone : Population
        Arrays of shape (n_draw,).

    Returns
    -------
    MeasuredCorrosion
        Exact but for tabulating the onset at `GRID` points up to the first visit that found
        loss, or the last one that found none; later onsets follow the zone in closed form.
    """
    column = Population(*(np.asarray(part)[:, None] for part in zone))
    log_last = float(seen.log_last[0])
    # Denser towards the visit, where the density varies fastest.
    w = np.linspace(1.0, 0.0, GRID)[1:-1]
    onset = np.exp(log_last) * (1.0 - w * w)
    weighed = rate_given_onset(seen, column, years_at_visits(seen, onset[None, :]))
    with np.errstate(divide="ignore"):  # an impossible onset has no density
        log_density = (
            log_onset_density(column, np.log(onset)) + weighed.log_density + np.log(weighed.window)
        )
    beyond = ((column.log_onset - log_last) / column.onset_scatter)[:, 0]
    none_found = not seen.found.max() > 0.0
    log_later = special.log_ndtr(beyond) if none_found else -np.inf
    scores, later = scores_of_density(onset, log_density, log_later)
    table = quantile_table(np.log(onset), scores)
    if none_found:
        # Survivors of the last visit: their share of the mass maps onto the zone's own tail.
        share = special.ndtr(-SCORES) / np.maximum(later, 1e-300)[:, None]
        tail = special.ndtri(np.minimum(share, 1.0) * special.ndtr(beyond)[:, None])
        later_onset = column.log_onset - column.onset_scatter * tail
        table = np.where(share < 1.0, later_onset, table)
    return MeasuredCorrosion(seen, zone, table)
