from __future__ import annotations

from pathlib import Path

import pytest

from aggregator.errors import InputError
from aggregator.inputs.outcome import Outcome, read_outcome
from tests.inputs.desk_folder import read, write_folder

OUTCOME = """\
seat,name,region,HU,UP,OL,OTH
N1,Northgate,NORTH,9000,7000,,900
N2,Pier Head,NORTH,9900,5000,,800
M1,Mereside,MERE,6000,6400,5000,700
M2,Old Orchard,MERE,4800,5300,8000,600
M3,Stonebridge,MERE,5500,8200,4000,800
"""


def outcome(folder: Path, text: str | None) -> Outcome | None:
    inputs = read(write_folder(folder / "c", result_outcome_csv=text))
    return read_outcome(inputs.folder, contest=inputs.contest, last_result=inputs.last_result)


def report(folder: Path, text: str) -> list[str]:
    with pytest.raises(InputError) as caught:
        outcome(folder, text)
    return [str(problem) for problem in caught.value.problems]


def test_an_outcome_has_the_form_of_the_last_result(tmp_path):
    found = outcome(tmp_path, OUTCOME)
    assert list(found.votes) == ["seat", "name", "region", "seats", "cluster", "HU", "UP", "OL", "OTH"]
    assert found.votes["OL"].isna().tolist() == [True, True, False, False, False]
    assert (found.warnings, found.fingerprint.file) == ((), "result_outcome.csv")


def test_a_contest_without_outcome_has_none(tmp_path):
    assert outcome(tmp_path, None) is None


def test_a_refresh_never_sees_the_outcome(tmp_path):
    inputs = read(write_folder(tmp_path / "c", result_outcome_csv=OUTCOME))
    assert "result_outcome.csv" not in {f.file for f in inputs.fingerprints}


def test_parties_other_than_the_contests_are_named(tmp_path):
    text = OUTCOME.replace("seat,name,region,HU,UP,OL,OTH", "seat,name,region,HU,UP,NEW,OTH")
    assert report(tmp_path, text) == [
        "result_outcome.csv, row 1, column NEW: found a column of this name; expected a known column. "
        "Known: seat, name, region, seats, cluster, HU, UP, OL, OTH. Votes of parties not in the contest "
        "belong in OTH; nothing is inherited here. [R07]",
        "result_outcome.csv, row 1, column OL: found no such column; expected votes of Orchard League. "
        "Add the column, its cells blank where it had no candidate. [R08]",
    ]


def test_a_partial_outcome_is_refused_with_every_finding_at_once(tmp_path):
    text = "\n".join(line for line in OUTCOME.splitlines() if line[:2] not in ("N1", "N2", "M2")) + "\n"
    assert report(tmp_path, text) == [
        "result_outcome.csv, row 2, column seat: found MERE without M2; expected all 3 seats of the "
        "region. Add them. While votes are still being counted, move the file out of the folder. [R84]",
        "result_outcome.csv, column region: found no row for NORTH (region[1] of contest.toml); "
        "expected votes in every region. Add its rows. While votes are still being counted, move the file "
        "out of the folder. [R73]",
    ]
