"""One fit to be made: everything it needs and nothing more, under a name that tells what it is."""

from __future__ import annotations

import hashlib
import json
import re
from dataclasses import asdict, dataclass, replace
from pathlib import Path

from aggregator.inputs.contest import ReleaseRules
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.refits.program_version import program_version
from aggregator.settings import RunSettings

HASH_DIGITS = 12
LONGEST_NAME = 60

# The desk's own columns: no fit reads them, no worker needs them, and editing one makes no other fit.
_DESK_COLUMNS = ("sponsor", "source", "note")


@dataclass(frozen=True)
class FitTask:
    """A fit to be made; it can be sent to another machine.

    Attributes
    ----------
    key
        Name of the fit, safe as a file name: contest, day, and a hash of inputs, settings and program.
    inputs
        What a fit reads of the desk's files; see `bare_inputs`.
    settings
        Length and seed.
    test_figures
        Whether to hold the houses' figures against what the fit would have expected.
    """

    key: str
    inputs: DeskInputs
    settings: RunSettings
    test_figures: bool = False


def build_task(
    inputs: DeskInputs, *, name: str, settings: RunSettings, test_figures: bool = False
) -> FitTask:
    """Build the task of fitting a contest as it stands in ``inputs``.

    Parameters
    ----------
    inputs
        The desk's checked files, as of some day.
    name
        What to call the contest in the key, such as its folder's name.
    settings
        Length and seed.
    test_figures
        Whether to hold the houses' figures against what the fit would have expected; it takes a part of the
        time of a fit, and no score needs it.
    """
    bare = bare_inputs(inputs)
    text = _as_text(bare, settings, test_figures=test_figures)
    digest = hashlib.sha256(text.encode()).hexdigest()[:HASH_DIGITS]
    words = re.sub(r"[^A-Za-z0-9_]+", "_", name).strip("_")[:LONGEST_NAME] or "contest"
    return FitTask(f"{words}-{bare.run_date}-{digest}", bare, settings, test_figures)


def bare_inputs(inputs: DeskInputs) -> DeskInputs:
    """Keep of the desk's inputs what a fit reads.

    Left out are rows that do not enter, who paid, sources, notes, row numbers, names of candidates, warnings,
    file names, the title and rules of publication: what is not sent cannot leak, and none of it makes another
    fit.
    """
    polls = inputs.polls.assign(row=range(len(inputs.polls)), **dict.fromkeys(_DESK_COLUMNS, ""))
    return replace(
        inputs,
        folder=Path(),
        contest=inputs.contest.model_copy(update={"title": "contest", "release": ReleaseRules()}),
        polls=polls.reset_index(drop=True),
        unused_polls=inputs.unused_polls.iloc[:0],
        warnings=(),
        unpublished=(),
        files=(),
        fingerprints=(),
        candidates=inputs.candidates.assign(name="") if inputs.candidates is not None else None,
    )


def _as_text(bare: DeskInputs, settings: RunSettings, *, test_figures: bool) -> str:
    """Everything the numbers of a fit depend on; floats are written with all their digits."""
    tables = {
        name: table.to_csv(index=False) if table is not None else None
        for name, table in {
            "polls": bare.polls,
            "last_result": bare.last_result,
            "counted_result": bare.counted_result,
            "past_errors": bare.past_errors,
            "before_last": bare.before_last,
            "transfers": bare.transfers,
            "candidates": bare.candidates,
        }.items()
    }
    whole = {
        "contest": bare.contest.model_dump(mode="json"),
        "run_date": bare.run_date.isoformat(),
        "settings": asdict(settings),
        "test_figures": test_figures,
        "program": program_version(),
        **tables,
    }
    return json.dumps(whole, sort_keys=True)
