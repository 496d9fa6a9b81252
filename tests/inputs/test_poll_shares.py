"""Reported figures into shares of those who chose, by the rules of docs/formats.md."""

from __future__ import annotations

import math
from dataclasses import replace
from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.inputs.contest import Alliance, Contest, Party, Region
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_shares import SharesOfRow, read_shares, rounding_step, rounding_steps
from aggregator.inputs.register_columns import Question, Status

CONTEST = Contest(
    title="Assembly of the Lake Provinces",
    polling_day=date(2031, 5, 18),
    party=(
        Party(code="HU", name="Harbour Union"),
        Party(code="UP", name="Upland Party"),
        Party(code="OL", name="Orchard League", regions=("MERE",)),
    ),
    alliance=(Alliance(code="LAKE", name="Lake Alliance", members=("HU", "OL")),),
    region=(Region(code="NORTH", name="Northern Shore"), Region(code="MERE", name="Upper Mere")),
)

ROW = PollRow(
    row=2, poll="T-1", house="Tarrow Research", sponsor="", start=date(2031, 2, 3), end=date(2031, 2, 5),
    published=date(2031, 2, 7), question=Question.VOTE, regions=("NORTH", "MERE"), national=True,
    sample=1000.0, effective=None, mode="", population="", method="", shares={}, undecided=None,
    status=Status.FINAL, status_date=None, replaces="", use=None, why_not="", source="", note="",
    start_given=True, published_given=True,
)  # fmt: skip


def shares_of(
    shares: dict[str, float], *, undecided: float | None = None, contest: Contest = CONTEST, **row: object
) -> tuple[SharesOfRow | None, list[str]]:
    filled = replace(ROW, shares=shares, undecided=undecided, **row)
    step = rounding_step(shares.values())
    read, problems = read_shares(filled, contest=contest, step=step, file="polls.csv")
    return read, [p.rule.value for p in problems]


def good(*args: dict[str, float], **kwargs: object) -> SharesOfRow:
    read, rules = shares_of(*args, **kwargs)
    assert read is not None
    assert rules == []
    return read


def test_undecided_are_set_aside_and_the_rest_rescaled():
    read = good({"HU": 36, "UP": 36, "OL": 9, "OTH": 9}, undecided=10)
    assert read.shares == pytest.approx({"HU": 40, "UP": 40, "OL": 10, "OTH": 10})
    assert math.isnan(read.remainder)
    assert read.decided == pytest.approx(0.9)
    assert read.step == pytest.approx(1 / 0.9)


def test_what_is_missing_to_100_is_the_remainder():
    read = good({"HU": 40.5, "UP": 38, "OL": 12})
    assert read.shares == {"HU": 40.5, "UP": 38, "OL": 12}
    assert read.remainder == pytest.approx(9.5)


def test_the_remainder_is_of_those_who_chose():
    read = good({"HU": 36, "UP": 27}, undecided=10)
    assert read.shares == pytest.approx({"HU": 40, "UP": 30})
    assert read.remainder == pytest.approx(30)


def test_rounding_of_a_full_row_is_rescaled_away():
    read = good({"HU": 41, "UP": 38, "OL": 13, "OTH": 9})
    assert math.fsum(read.shares.values()) == pytest.approx(100)
    assert read.shares["HU"] == pytest.approx(41 / 1.01)
    assert math.isnan(read.remainder)


def test_people_who_would_choose_a_code_not_offered_are_in_the_figure_of_others():
    read = good({"HU": 50, "UP": 42, "OTH": 8})
    assert read.shares == {"HU": 50, "UP": 42}
    assert read.remainder == pytest.approx(8)


def test_a_party_that_stands_elsewhere_is_not_missed():
    read = good({"HU": 50, "UP": 42, "OTH": 8}, regions=("NORTH",), national=False)
    assert read.shares == {"HU": 50, "UP": 42, "OTH": 8}
    assert math.isnan(read.remainder)


def test_a_zero_where_a_party_does_not_stand_is_no_answer():
    read = good({"HU": 50, "UP": 42, "OL": 0, "OTH": 8}, regions=("NORTH",), national=False)
    assert set(read.shares) == {"HU", "UP", "OTH"}


def test_a_zero_where_a_party_stands_is_an_answer():
    read = good({"HU": 50, "UP": 42, "OL": 0, "OTH": 8})
    assert read.shares["OL"] == 0


def test_an_alliance_answers_for_its_members():
    read = good({"LAKE": 56, "UP": 39, "OTH": 5})
    assert read.shares == {"LAKE": 56, "UP": 39, "OTH": 5}
    assert math.isnan(read.remainder)


def test_nothing_left_for_codes_not_asked_makes_shares_among_those_given():
    read, rules = shares_of({"HU": 52, "UP": 48})
    assert rules == ["R48"]
    assert read is not None
    assert math.isnan(read.remainder)
    assert math.fsum(read.shares.values()) == pytest.approx(100)


def test_a_remainder_no_larger_than_rounding_is_none():
    within, rules = shares_of({"HU": 52, "UP": 47})
    beyond, beyond_rules = shares_of({"HU": 52, "UP": 46.5})
    assert (rules, beyond_rules) == (["R48"], [])
    assert within is not None
    assert math.isnan(within.remainder)
    assert beyond is not None
    assert beyond.remainder == pytest.approx(1.5)


def test_shares_that_leave_the_undecided_out_are_not_rescaled_again():
    read, rules = shares_of({"HU": 40, "UP": 40, "OL": 11, "OTH": 9}, undecided=20)
    assert rules == ["R47"]
    assert read is not None
    assert read.shares == {"HU": 40, "UP": 40, "OL": 11, "OTH": 9}
    assert read.decided == pytest.approx(0.8)


def test_undecided_that_fit_neither_way_are_refused():
    assert shares_of({"HU": 40, "UP": 40, "OL": 10}, undecided=15) == (None, ["R46"])


def test_without_others_a_full_row_leaves_no_remainder():
    referendum = Contest(
        title="Bridge vote", polling_day=date(2031, 5, 18), others=False,
        party=(Party(code="YES", name="Yes"), Party(code="NO", name="No")),
    )  # fmt: skip
    row = {"regions": ("ALL",), "contest": referendum}
    read = good({"YES": 43, "NO": 47}, undecided=10, **row)
    assert read.shares == pytest.approx({"YES": 43 / 0.9, "NO": 47 / 0.9})
    assert math.isnan(read.remainder)


@pytest.mark.parametrize(
    ("values", "step"),
    [([34, 20], 1), ([34.5, 20], 0.5), ([34.1, 20], 0.1), ([34.15], 0.05), ([34.12, 0.5], 0.01), ([0], 1)],
)
def test_the_rounding_step_is_the_coarsest_that_fits(values, step):
    assert rounding_step(values) == step


def test_a_poll_with_few_figures_is_rounded_as_its_house_does():
    rows = [
        replace(ROW, poll="T-1", shares={"HU": 40.1, "UP": 38.2, "OL": 12, "OTH": 9.7}),
        replace(ROW, poll="T-2", shares={"HU": 40, "UP": 38}),
        replace(ROW, poll="T-3", shares={"HU": 40, "UP": 38, "OL": 13, "OTH": 9}),
    ]
    assert rounding_steps(rows) == {"T-1": 0.1, "T-2": 0.1, "T-3": 1}


_CODES = ("HU", "UP", "OL", "OTH")


@given(
    figures=st.lists(st.integers(1, 240), min_size=4, max_size=4),
    left_out=st.sets(st.sampled_from(_CODES), max_size=2),
    undecided=st.integers(0, 300),
)
def test_shares_and_remainder_always_sum_to_100(figures, left_out, undecided):
    whole = sum(figures)
    shares = {
        code: round((1000 - undecided) * f / whole) / 10
        for code, f in zip(_CODES, figures, strict=True)
        if code not in left_out
    }
    read, _ = shares_of(shares, undecided=undecided / 10)
    if read is not None:
        remainder = 0.0 if math.isnan(read.remainder) else read.remainder
        assert math.fsum(read.shares.values()) + remainder == pytest.approx(100)
        assert min([*read.shares.values(), remainder]) >= 0
