"""Summaries by date and code: the shape that support and seats share."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from aggregator.release.codes import Code
from aggregator.release.draw_summaries import summarise_samples
from aggregator.release.table_words import Kind


def summarise_codes(
    samples: NDArray[Any],
    *,
    days: Sequence[date],
    parties: Sequence[str],
    codes: Sequence[Code],
    kind: Kind,
    whole: bool = False,
) -> pd.DataFrame:
    """Summarise every code on every day on which it exists; an alliance is summed draw by draw.

    Parameters
    ----------
    samples
        Shape (date, party, sample).
    days, parties
        Labels of the first two axes.
    codes
        Codes to summarise, in the order of the rows within a day.
    kind
        Which statement the rows make.
    whole
        Whether the quantity is a count.

    Returns
    -------
    pandas.DataFrame
        Columns ``date``, ``code``, ``level``, ``kind``, ``mean``, ``sd``, ``q05``, ``q25``, ``q50``, ``q75``,
        ``q95``; ordered by day.
    """
    place = {code: index for index, code in enumerate(parties)}
    columns = [
        samples[:, place[code.members[0]]]
        if len(code.members) == 1
        else samples[:, [place[member] for member in code.members]].sum(axis=1)
        for code in codes
    ]
    summary = summarise_samples(np.stack(columns, axis=1), whole=whole)
    exists = np.array([[code.exists_on(day) for code in codes] for day in days]).ravel()
    rows = pd.DataFrame(
        {
            "date": np.repeat(np.array(days, dtype="datetime64[s]"), len(codes)),
            "code": [code.code for code in codes] * len(days),
            "level": [code.level.value for code in codes] * len(days),
            "kind": kind.value,
            **{name: values.ravel() for name, values in summary.items()},
        }
    )
    return rows[exists].reset_index(drop=True)
