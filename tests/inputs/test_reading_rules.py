"""Each reading rule, broken in one place: the whole report is what the desk is told."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Severity
from tests.inputs.desk_folder import FILES, TODAY, findings, spoilt, write_folder

HERE = Path(__file__).parent
CASES = [
    case
    for file in ("reading_rules.toml", "counting_rules.toml", "candidate_rules.toml")
    for case in tomllib.loads((HERE / file).read_text(encoding="utf-8"))["case"]
]
RULES_PAGE = (HERE.parents[1] / "docs" / "reading_rules.md").read_text(encoding="utf-8")


def _documented() -> dict[str, str]:
    """Kind of each rule as the page has it."""
    return dict(re.findall(r"^\| (R\d{2,3}) \| (error|warning|both) \|", RULES_PAGE, re.MULTILINE))


@pytest.mark.parametrize("case", CASES, ids=[f"{c['rule']} {c['what']}" for c in CASES])
def test_a_broken_rule_is_reported_in_full_and_alone(case, tmp_path):
    changed: dict[str, str | bytes | None] = dict(case.get("content", {}))
    changed |= dict.fromkeys(case.get("missing", []))
    for file, *texts in case.get("change", []):
        before = str(changed.get(file) or FILES[file])
        if texts[0] not in before:
            raise ValueError(f"{texts[0]!r} is not in {file}")
        changed[file] = before.replace(texts[0], texts[1], 1)
    if "append" in case:
        file, row = case["append"]
        changed[file] = FILES[file] + row
    folder = write_folder(tmp_path / "contest", **changed)
    found = findings(folder, today=case.get("today", TODAY))
    assert [f"{p.severity.value}: {p}" for p in found] == case["report"]
    assert case["rule"] in {p.rule for p in found}


def test_the_sound_contest_has_no_findings(tmp_path):
    assert findings(write_folder(tmp_path / "contest")) == ()


def test_every_rule_of_the_code_is_documented_and_vice_versa():
    assert sorted(_documented(), key=lambda rule: int(rule[1:])) == [rule.value for rule in Rule]


def test_every_rule_is_broken_by_some_test():
    sources = "".join(p.read_text(encoding="utf-8") for p in HERE.iterdir() if p.suffix in (".py", ".toml"))
    asserted = set(re.findall(r"\[(R\d{2,3})\]", sources))
    assert asserted == {rule.value for rule in Rule}


def test_rules_are_errors_or_warnings_as_the_page_says():
    sources = "".join(p.read_text(encoding="utf-8") for p in HERE.iterdir() if p.suffix in (".py", ".toml"))
    seen: dict[str, set[str]] = {}
    for kind, rule in re.findall(r'"(error|warning): .*\[(R\d{2,3})\]"', sources):
        seen.setdefault(rule, set()).add(kind)
    both = {severity.value for severity in Severity}
    for rule, kind in _documented().items():
        if rule in seen:
            assert seen[rule] <= (both if kind == "both" else {kind}), rule
    assert {r for r, kinds in seen.items() if len(kinds) == 2} == {
        r for r, kind in _documented().items() if kind == "both"
    }


def test_every_problem_of_every_file_is_in_one_report(tmp_path):
    folder = write_folder(
        tmp_path / "contest",
        contest_toml=spoilt("contest.toml", ('time_zone = "Europe/Zurich"', 'time_zone = "Lakes"')),
        polls_csv=spoilt("polls.csv", (",1012,", ",many,"), (",MERE,1090", ",MEER,1090"), ("K-2,", "K-1,")),
        result_last_csv=spoilt("result_last.csv", ("10480", "-1"), ("M2,", "M1,")),
    )
    assert [(p.file, p.row, p.rule.value) for p in findings(folder)] == [
        ("contest.toml", None, "R13"),
        ("polls.csv", 2, "R25"),
        ("polls.csv", 5, "R32"),
        ("polls.csv", 6, "R55"),
        ("polls.csv", 6, "R55"),
        ("polls.csv", 6, "R55"),
        ("polls.csv", 6, "R54"),
        ("result_last.csv", 3, "R71"),
        ("result_last.csv", 5, "R70"),
    ]


def test_a_broken_contest_does_not_hide_what_is_wrong_in_the_other_files(tmp_path):
    folder = write_folder(
        tmp_path / "contest",
        contest_toml=spoilt("contest.toml", ("polling_day = 2031-05-18\n", "")),
        polls_csv=spoilt("polls.csv", (",1012,", ",many,"), ("HU,UP,OL", "HU,UPP,OL")),
    )
    assert [(p.file, p.row, p.rule.value) for p in findings(folder)] == [
        ("contest.toml", None, "R12"),
        ("polls.csv", 1, "R07"),
        ("polls.csv", 2, "R25"),
    ]


def test_codes_in_doubt_are_not_held_against_the_other_files(tmp_path):
    contest = spoilt("contest.toml", ('code = "OL"', 'code = "O L"'), ('"HU", "OL"', '"HU", "O L"'))
    folder = write_folder(tmp_path / "contest", contest_toml=contest)
    assert [(p.file, p.rule.value) for p in findings(folder)] == [("contest.toml", "R14")]


def test_the_habit_of_a_house_is_said_once(tmp_path):
    polls = FILES["polls.csv"].replace(",34,33,16,,7,10,", ",38,37,18,,7,10,")
    row = polls.splitlines(keepends=True)[1]
    for day in ("15", "16", "17"):
        polls += row.replace("T-1", f"T-{day}").replace("02-05", f"03-{day}").replace("02-03", f"03-{day}")
    polls = polls.replace(",2031-02-07,", ",,")
    folder = write_folder(tmp_path / "contest", polls_csv=polls)
    gathered = next(p for p in findings(folder) if p.rule == Rule.UNDECIDED_OUTSIDE)
    assert (gathered.row, gathered.found) == (
        2,
        "10 beside shares that sum to 100; likewise in row(s) 7, 8, 9",
    )
