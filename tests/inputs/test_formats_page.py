"""The page on formats says what the code reads, no more and no less."""

from __future__ import annotations

import re
import tomllib
from datetime import date
from pathlib import Path

import pytest

from aggregator.inputs.contest import (
    Alliance,
    Contest,
    Counting,
    CountingRule,
    Jolt,
    LastResult,
    ModelOverrides,
    Party,
    Region,
    ReleaseRules,
    Silence,
)
from aggregator.inputs.contest_checks import check_contest
from aggregator.inputs.contest_file import known_keys
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.counting_keys import TAKEN_KEYS
from aggregator.inputs.counting_terms import (
    Across,
    CountingTerms,
    CountingWhere,
    Divisors,
    Overhang,
    Quota,
    TieBreak,
)
from aggregator.inputs.register_columns import (
    CANDIDATE_COLUMNS,
    CANDIDATE_NEEDED,
    RECORD_COLUMNS,
    RECORD_NEEDED,
    REGISTER_COLUMNS,
    REGISTER_NEEDED,
    RESULT_COLUMNS,
    TRANSFER_COLUMNS,
    TRANSFER_NEEDED,
    Candidacy,
    Question,
    Status,
    Use,
)
from tests.inputs.desk_folder import CONTEST, read, write_folder

PAGE = (Path(__file__).parents[2] / "docs" / "formats.md").read_text(encoding="utf-8")
INPUT_HALF = PAGE.split("## What a release holds")[0]

TABLES = {
    "Top level": Contest,
    "`[[party]]`": Party,
    "`[[alliance]]`": Alliance,
    "`[[region]]`": Region,
    "`[last_result]`": LastResult,
    "`[[jolt]]`": Jolt,
    "`[counting]`": Counting,
    "`[[counting.where]]`": CountingWhere,
    "`[release]`": ReleaseRules,
    "`[[release.silence]]`": Silence,
    "`[model]`": ModelOverrides,
}


def schema_under(heading: str) -> dict[str, str]:
    """Name and ``needed`` of each line of the table that follows a line."""
    after = INPUT_HALF.split(f"\n{heading}\n", 1)[1]
    rows: dict[str, str] = {}
    for line in after.splitlines():
        if match := re.match(r"\| [`*](\w+)[`*] \| ([^|]+) \|", line):
            rows[match[1]] = match[2].strip()
        elif rows and not line.startswith("|"):
            break
    return rows


@pytest.mark.parametrize("heading", TABLES)
def test_every_key_of_the_contest_is_in_its_table(heading):
    documented = schema_under(f"{heading}:")
    keys = known_keys(TABLES[heading])
    if TABLES[heading] is CountingWhere:
        # The page names them once, under [counting].
        keys = {k: field for k, field in keys.items() if k == "rule" or k not in CountingTerms.model_fields}
    assert set(documented) == set(keys)
    assert {k for k, needed in documented.items() if needed == "yes"} == {
        k for k, field in keys.items() if field.is_required()
    }


def test_every_column_of_the_register_is_in_its_table():
    documented = schema_under("### polls.csv or polls.xlsx")
    assert [c for c in documented if c != "code"] == list(REGISTER_COLUMNS)
    assert {c for c, needed in documented.items() if needed == "yes"} == set(REGISTER_NEEDED)


@pytest.mark.parametrize(
    "heading",
    [
        "### result_last.csv",
        "### result_counted.csv",
        "### result_outcome.csv",
        "### result_before_last.csv",
    ],
)
def test_every_column_of_a_result_is_in_its_table(heading):
    assert [c for c in schema_under(heading) if c != "code"] == list(RESULT_COLUMNS)


def test_every_column_of_the_record_is_in_its_table():
    documented = schema_under("### past_errors.csv")
    assert list(documented) == list(RECORD_COLUMNS)
    assert {c for c, needed in documented.items() if needed == "yes"} == set(RECORD_NEEDED)


def test_the_example_of_a_record_is_read_as_it_says(tmp_path):
    """The party that is no more is named in the page, and warned about."""
    text = re.search(r"^```csv\n(election,.*?)^```$", INPUT_HALF, re.MULTILINE | re.DOTALL)
    record = read(write_folder(tmp_path / "c", past_errors_csv=text[1]))
    assert list(record.past_errors["code"]) == ["HU", "UP", "RF"]
    assert [p.rule.value for p in record.warnings] == ["R88"]


def test_every_column_of_transfers_is_in_its_table():
    documented = schema_under("### transfers.csv")
    assert list(documented) == list(TRANSFER_COLUMNS)
    assert {c for c, needed in documented.items() if needed == "yes"} == set(TRANSFER_NEEDED)


def test_the_example_of_transfers_covers_every_pair(tmp_path):
    text = re.search(r"^```csv\n(from,.*?)^```$", INPUT_HALF, re.MULTILINE | re.DOTALL)
    contest = CONTEST.replace('"plurality"', '"two_round"')
    transfers = read(write_folder(tmp_path / "c", contest_toml=contest, transfers_csv=text[1])).transfers
    rate = transfers.set_index(["from", "to"])["rate"]
    assert rate.to_dict() == {
        ("HU", "UP"): 20, ("HU", "OL"): 20, ("HU", "OTH"): 20, ("UP", "HU"): 20, ("UP", "OL"): 20,
        ("UP", "OTH"): 20, ("OL", "HU"): 70, ("OL", "UP"): 10, ("OL", "OTH"): 20, ("OTH", "HU"): 25,
        ("OTH", "UP"): 25, ("OTH", "OL"): 25,
    }  # fmt: skip


def test_every_column_of_candidates_is_in_its_table():
    documented = schema_under("### candidates.csv")
    assert list(documented) == list(CANDIDATE_COLUMNS)
    assert {c for c, needed in documented.items() if needed == "yes"} == set(CANDIDATE_NEEDED)


def test_the_example_of_candidates_is_read_as_it_says(tmp_path):
    """One candidate has taken the place of another, and the others of that seat are named by no row."""
    text = re.search(r"^```csv\n(seat,code,name.*?)^```$", INPUT_HALF, re.MULTILINE | re.DOTALL)
    folder = write_folder(tmp_path / "c", candidates_csv=text[1])
    before, now = read(folder, as_of=date(2031, 4, 1)), read(folder)
    assert set(now.candidates["seat"]) == {"N1", "M1"}
    assert [
        list(table.loc[(table["seat"] == "M1") & (table["code"] == "HU"), "name"])
        for table in (before.candidates, now.candidates)
    ] == [["Ilse Morrow"], ["Nell Hythe"]]
    assert list(now.candidates.loc[now.candidates["holder"], "name"]) == ["Ada Brae"]
    assert now.warnings == ()


def counting_examples() -> dict[str, str]:
    """The example under each heading of the section on counting rules."""
    section = INPUT_HALF.split("\n### Counting rules\n", 1)[1].split("\n### ", 1)[0]
    return dict(re.findall(r"^#### (.+?)\n.*?^```toml\n(.*?)^```$", section, re.MULTILINE | re.DOTALL))


def test_every_rule_has_an_example():
    assert set(CountingRule) | {"Other rules in some regions"} == set(counting_examples())


@pytest.mark.parametrize("heading", counting_examples())
def test_the_example_of_a_rule_has_the_keys_it_needs_and_no_others(heading):
    example, sound = tomllib.loads(counting_examples()[heading]), tomllib.loads(CONTEST)
    for table in ("region", "alliance"):
        changes = {entry["code"]: entry for entry in example.get(table, [])}
        sound[table] = [entry | changes.get(entry["code"], {}) for entry in sound[table]]
    contest = Contest.model_validate(sound | {"counting": example["counting"]})
    assert check_contest(contest) == []
    assert heading in (contest.counting.rule, "Other rules in some regions")


def test_the_page_says_which_keys_each_rule_takes():
    section = INPUT_HALF.split("\n### Counting rules\n", 1)[1]
    of_lists = set(re.search(r"The keys of lists are (.*?)\.", section, re.DOTALL)[1].replace("`", "")
                   .replace(" and ", ", ").replace("\n", " ").split(", "))  # fmt: skip
    rows = dict(re.findall(r"^\| `(\w+)` \| ([^|]+) \| [^|]+ \|$", section, re.MULTILINE))
    said: dict[str, set[str]] = {}
    for rule, keys in rows.items():
        before = said.get("mixed_parallel", set()) if "the same" in keys else set()
        lists = of_lists if "those of lists" in keys else set()
        said[rule] = set(re.findall(r"`(\w+)`", keys)) | lists | before
    assert said == {rule.value: set(keys) for rule, keys in TAKEN_KEYS.items()}


@pytest.mark.parametrize(
    "words", [Question, Status, Use, Candidacy, CountingRule, Divisors, Quota, Across, Overhang, TieBreak]
)
def test_every_word_a_cell_may_hold_is_named(words):
    for word in words:
        assert f"`{word}`" in INPUT_HALF


def test_the_examples_are_read_without_a_finding(tmp_path):
    for name, text in re.findall(r"^```\w+ (\S+)\n(.*?)^```$", INPUT_HALF, re.MULTILINE | re.DOTALL):
        (tmp_path / name).write_text(text, encoding="utf-8")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["contest.toml", "polls.csv", "result_last.csv"]
    inputs = read_contest_folder(tmp_path, today=date(2031, 3, 20))
    assert inputs.warnings == ()
    assert list(inputs.polls["poll"]) == ["T-1", "K-1", "M-1", "M-1", "K-2b"]
    assert len(inputs.unused_polls) == 4
