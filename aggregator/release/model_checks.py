"""What tests a fit beside its convergence: other assumptions, figures foreseen, the weight of priors."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from aggregator.alternatives import Alternative


@dataclass(frozen=True)
class ModelChecks:
    """Tests of one fit that inform and never fail it; what was not worked out is left out of the release.

    Attributes
    ----------
    alternatives
        Polling day under other settings of what polls cannot check.
    predictive
        Figures against what the model expected, as the schema ``PREDICTIVE`` has them.
    prior_sensitivity
        How much of each headline number is assumption, as the schema ``PRIOR_SENSITIVITY`` has it.
    """

    alternatives: tuple[Alternative, ...] = ()
    predictive: pd.DataFrame | None = None
    prior_sensitivity: pd.DataFrame | None = None


NO_CHECKS = ModelChecks()
