"""How large an error all polls may share in this contest: the record, and the undecided of its late polls."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import Floats
from models.lean_record import recorded_size
from models.priors import Priors
from models.shared_lean import lean_size

# The undecided of the polls whose fieldwork ended within this many days of the last one's.
LATE_DAYS = 60


def contest_lean_size(inputs: DeskInputs, *, priors: Priors) -> Floats:
    """Size c of the shared lean by party, log units × √p; dims (party)."""
    return lean_size(_recorded(inputs, priors), undecided=late_undecided(inputs.polls), priors=priors)


def late_undecided(polls: pd.DataFrame) -> float:
    """Mean undecided share, 0–1, of the late polls that state it; zero where none does."""
    late = polls[polls["end"] >= polls["end"].max() - pd.Timedelta(days=LATE_DAYS)]
    stated = late.drop_duplicates("poll")["undecided"].dropna()
    return float(stated.mean()) / 100 if len(stated) else 0.0


def _recorded(inputs: DeskInputs, priors: Priors) -> Floats:
    codes = inputs.contest.party_codes
    record = inputs.past_errors
    if record is None or record.empty:
        return np.full(len(codes), priors.shared_lean)
    position = {code: i for i, code in enumerate(codes)}
    return recorded_size(
        polled=record["polled"].to_numpy(float) / 100,
        result=record["result"].to_numpy(float) / 100,
        party=np.array([position.get(code, -1) for code in record["code"]], dtype=np.int64),
        parties=len(codes),
        published=priors.shared_lean,
    )
