"""The final errors of replayed contests, as the record of earlier elections for the next one."""

from __future__ import annotations

import os
import secrets
from collections.abc import Sequence
from pathlib import Path

import pandas as pd

from aggregator.errors import MachineError, UsageError
from aggregator.release.table_files import inert_cell
from aggregator.replays.methods import Method, Quantity
from aggregator.replays.result_shares import COUNTRY
from aggregator.replays.score_replay import ReplayScores
from aggregator.replays.summarise_scores import without_alliances

COLUMNS = ["election", "code", "polled", "result", "source", "note"]
_FINAL = (Method.MEAN_30_DAYS, Method.DECAYING_MEAN)
_NOTES = {
    Method.MEAN_30_DAYS: "mean of the polls of 30 days",
    Method.DECAYING_MEAN: "decaying mean; no poll in 30 days",
}


def past_errors(replays: Sequence[ReplayScores]) -> pd.DataFrame:
    """Polling average on the last replayed date of each contest, and the result, by party.

    The average is the mean of the last 30 days, not this program's estimate: the record teaches how far all
    polls together stray, and the model already makes good for some of that.

    Parameters
    ----------
    replays
        Scored replays.

    Returns
    -------
    pandas.DataFrame
        ``election`` (datetime64), ``code``, ``polled``, ``result`` (percent), ``source``, ``note``.

    Raises
    ------
    UsageError
        If a contest has no polling average on any replayed date.
    """
    tables = []
    for replay in sorted(replays, key=lambda replay: (replay.polling_day, replay.title)):
        rows = without_alliances(replay.scores)
        rows = rows[(rows["quantity"] == Quantity.SUPPORT) & (rows["region"] == COUNTRY)]
        last = rows[rows["as_of"] == rows["as_of"].max()]
        method = next((m for m in _FINAL if (last["method"] == m).any()), None)
        if method is None:
            raise UsageError(f"{replay.title}: no poll was published by the last replayed date")
        chosen = last[last["method"] == method]
        day = pd.Timestamp(chosen["as_of"].iloc[0]).date()
        tables.append(
            pd.DataFrame(
                {
                    "election": pd.Timestamp(replay.polling_day),
                    "code": chosen["code"],
                    "polled": chosen["estimate"],
                    "result": chosen["truth"],
                    "source": f"replay of {replay.title}",
                    "note": f"{_NOTES[method]}, as of {day}",
                }
            )
        )
    return pd.concat(tables, ignore_index=True)[COLUMNS]


def write_past_errors(replays: Sequence[ReplayScores], *, path: Path) -> Path:
    """Write the final errors of replayed contests as a ``past_errors.csv``, whole or not at all.

    Parameters
    ----------
    replays
        Scored replays.
    path
        Where the file goes; must not exist yet, since it may be the desk's own record.

    Raises
    ------
    UsageError
        If the file exists, or a contest has no polling average.
    MachineError
        If it cannot be written.
    """
    if path.exists() or path.is_symlink():
        raise UsageError(f"{path} exists already; name a new file, and join the two by hand")
    table = past_errors(replays)
    table = table.assign(
        election=table["election"].dt.strftime("%Y-%m-%d"),
        polled=[f"{value:.2f}" for value in table["polled"]],
        result=[f"{value:.2f}" for value in table["result"]],
        source=[inert_cell(text) for text in table["source"]],
    )
    unfinished = path.with_name(f".{path.name}-{secrets.token_hex(6)}")
    try:
        unfinished.write_text(table.to_csv(index=False, lineterminator="\n"), encoding="utf-8")
        os.replace(unfinished, path)
    except OSError as problem:
        unfinished.unlink(missing_ok=True)
        raise MachineError(
            f"{path} could not be written: {problem.strerror or problem}. Nothing was left behind."
        ) from problem
    return path
