"""Re-centring must not take the uncertainty out of regions of few seats."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.seats.baseline import BaselinePriors, build_baseline
from aggregator.seats.counting import count_seats
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.local_swing import draw_local_strength, region_starts
from aggregator.seats.recentring import solve_multipliers
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

DRAWS = 4000


@pytest.mark.parametrize("seats_per_region", [1, 3, 12])
def test_spread_of_seats_equals_that_of_noise_that_is_never_recentred(seats_per_region: int) -> None:
    result, contest = made_up_last_result(seats_per_region=seats_per_region), made_up_contest()
    plain = BaselinePriors(unseen_sd=0.0)
    draws = made_up_draws(draws=DRAWS, chains=1, dates=1)
    for name in ("support", "support_polling_day"):
        draws[name] = draws[name] * 0 + draws[name].mean(("chain", "draw"))
    counted = count_seats(
        draws, last_result=result, contest=contest, rng=np.random.default_rng(1), baseline_priors=plain
    )

    # The other way round: move the still seats to the region's support once, then let noise run free.
    baseline = build_baseline(result, contest=contest, priors=plain)
    start = region_starts(baseline)
    regions, parties = baseline["seat_region"].to_numpy()[start[:-1]], baseline["party"]
    still = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9)
    rng = np.random.default_rng(2)
    support = draws["support"].sel(region=regions, party=parties).isel(chain=0, draw=[0])
    factor = solve_multipliers(
        draw_local_strength(baseline, draws=1, rng=rng, priors=still).strength,
        support=support.to_numpy(),
        weight=baseline["weight"].to_numpy(),
        region_start=start,
    ).multiplier[0, 0]
    free = draw_local_strength(baseline, draws=DRAWS, rng=rng).strength
    free *= np.repeat(factor, np.diff(start), axis=0).T
    won = np.stack([(free.argmax(axis=1) == p).sum(axis=1) for p in range(parties.size)], axis=-1)

    ours = counted["seats_polling_day"].sel(party=parties).isel(chain=0).to_numpy()
    # Monte Carlo error of a standard deviation over 4,000 draws is about 1 %, of a mean .016 sd.
    large = won.mean(axis=0) > 0.2
    np.testing.assert_allclose(ours[:, large].std(axis=0), won[:, large].std(axis=0), rtol=0.08)
    np.testing.assert_allclose(ours[:, large].mean(axis=0), won[:, large].mean(axis=0), rtol=0.05)
