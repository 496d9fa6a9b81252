"""Every prior scale of the model, each with its reason.

Scales are in log-support units for a party at 15 %; a party of share p has them times √(.15/p), so
that in percentage points they go as √(p(1−p)), as polling errors do.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import log, sqrt

SCALE_SHARE = 0.15


@dataclass(frozen=True)
class Priors:
    """Prior scales of the election model.

    Attributes
    ----------
    drift_log_median, drift_log_sd
        National drift per √week. .035 at 15 % is half a point a week, the order that tracking of large
        parties shows: an exact fit of a local-level model to an open register of 2004–07 gives .9–1.1
        points a week for a party at 44 %, where this prior has median .7 and 90 % interval .25–1.8.
    region_ratio_median, region_ratio_most, region_ratio_spread
        A region's own drift over the national one: about half, 90 % between .2 and 1, never more than
        twice (logit-normal), since regions that move on their own more than the country moves as a whole
        would be two countries. Registers without regional polls leave it at the prior.
    house_log_median, house_log_sd
        House effects: .06 at 15 % is .8 points.
    era_part, mode_part, population_part, formation_part
        Sizes of a method's era, a mode, a population and of asking about an alliance as one, as parts of
        the house effects' size: an assumption, since no register has enough of them to learn theirs. A
        house that changes its method stays nearer to itself than to others.
    ramp_log_sd
        Log height of the ramp of opinion time on polling day: .5 lets opinion move at .4 to 2.3 times its
        usual pace (90 % interval), either way alike.
    party_spread
        How far one party's scale may stray from the common one, log units.
    weighting_loss_log_median, weighting_loss_log_sd, weighting_loss_spread
        κ − 1, the variance that weighting adds: .4 is a usual loss for a quota or weighted sample
        (Kish 1965: one plus the squared variation of the weights).
    error_floor_log_median, error_floor_log_sd, error_floor_spread
        ρ, the error that no sample size removes: .0004 doubles the variance at about 3,500 respondents.
    shared_lean
        Standard deviation of the error all polls share, log units × √p: 2.5 points at 40 %, since the average
        absolute shared error is about 2 points (Shirani-Mehr, Rothschild, Goel & Gelman 2018, JASA
        113:607–614) and sd = 2·√(π/2).
    lean_correlation
        Correlation between the shared lean at the last result and on polling day: an assumption that
        polls of one contest cannot check.
    region_lean_part
        The regional part of the shared lean, as a part of the national one: an assumption, small beside it.
    undecided_stray
        How far the undecided may break from those who chose, log units × √p: 15 points at 40 %, an
        assumption.
    free_log_sd, free_region_log_sd
        A party without a record: its national log share around the median, and each region around it.
    """

    drift_log_median: float = log(0.035)
    drift_log_sd: float = 0.6
    region_ratio_median: float = 0.5
    region_ratio_most: float = 2.0
    region_ratio_spread: float = 0.67
    house_log_median: float = log(0.06)
    house_log_sd: float = 0.5
    era_part: float = 0.5
    mode_part: float = 0.7
    population_part: float = 0.7
    formation_part: float = 0.7
    ramp_log_sd: float = 0.5
    party_spread: float = 0.35
    weighting_loss_log_median: float = log(0.4)
    weighting_loss_log_sd: float = 0.4
    weighting_loss_spread: float = 0.4
    error_floor_log_median: float = log(0.0004)
    error_floor_log_sd: float = 0.7
    error_floor_spread: float = 0.5
    shared_lean: float = 0.025 / sqrt(0.4 * 0.6)
    lean_correlation: float = 1 / 3
    region_lean_part: float = 0.4
    undecided_stray: float = 0.15 / sqrt(0.4 * 0.6)
    free_log_sd: float = 1.2
    free_region_log_sd: float = 0.5


def shared_lean_scale(points_at_40: float) -> float:
    """Log-unit scale of the shared lean, times √p, from its size in points for a party at 40 %."""
    return points_at_40 / 100 / sqrt(0.4 * 0.6)


def shared_lean_points(scale: float) -> float:
    """Size in points for a party at 40 % of a shared lean in log units × √p: `shared_lean_scale` reversed."""
    return 100 * scale * sqrt(0.4 * 0.6)
