"""Ranks of a long study, kept election by election, so that a study that was stopped goes on where it was."""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from dataclasses import asdict
from hashlib import sha256
from pathlib import Path

import aggregator.estimate
import models
import tests.calibration
from tests.calibration.ranks import RankedElection, rank_elections

# All code that a rank depends on: another model must not go on with this one's ranks.
SOURCES = (models, aggregator.estimate, tests.calibration)


def rank_and_keep(seeds: Sequence[int], *, folder: Path) -> Iterator[RankedElection]:
    """Give the ranks of every seed in order, those kept in the folder first looked up there.

    Kept ranks of other code than today's are left alone and not used.
    """
    path = folder / f"{_fingerprint()}.jsonl"
    kept = _read(path) if path.exists() else {}
    missing = [seed for seed in seeds if seed not in kept]
    yield from (kept[seed] for seed in seeds if seed in kept)
    if not missing:
        return
    with path.open("a", encoding="utf-8") as file:
        for election in rank_elections(missing):
            file.write(json.dumps(asdict(election)) + "\n")
            file.flush()
            yield election


def _read(path: Path) -> dict[int, RankedElection]:
    # A line without its end was being written when the study was stopped.
    lines = [
        line for line in path.read_text(encoding="utf-8").splitlines(keepends=True) if line.endswith("\n")
    ]
    path.write_text("".join(lines), encoding="utf-8")
    elections = [RankedElection(**json.loads(line)) for line in lines]
    return {election.seed: election for election in elections}


def _fingerprint() -> str:
    files = sorted(file for package in SOURCES for file in Path(package.__path__[0]).glob("*.py"))
    return sha256(b"".join(file.read_bytes() for file in files)).hexdigest()[:16]
