"""The terms by which votes become seats, and how many seats the desk's files add up to."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.inputs.contest import Contest, CountingRule
from aggregator.inputs.counting_terms import Across, Counting, CountingTerms, Divisors, Quota
from tests.inputs.desk_folder import CONTEST, RESULT, findings, read, write_folder

DISTRICTS = """\
seat,name,region,seats,cluster,HU,UP,OL,RF,OTH
N,North,NORTH,8,,9120,6310,,1000,880
M1,Mereside,MERE,5,Mere,6120,6450,5260,1000,730
M2,Old Orchard,MERE,,Mere,4890,5310,8120,1100,640
"""
REGIONS = "region,HU,UP,OL,RF,OTH\nNORTH,19600,10930,,1900,1640\nMERE,16580,20000,17360,3050,2250\n"


def counted_by(tmp_path, counting: str, *, result: str = RESULT, north: str = "", mere: str = "", **files):
    """The contest counted by other rules, read without an error."""
    contest = CONTEST.replace('rule = "plurality"\n', counting)
    contest = contest.replace('name = "Northern Shore"\n', f'name = "Northern Shore"\n{north}\n')
    contest = contest.replace('name = "Upper Mere"\n', f'name = "Upper Mere"\n{mere}\n')
    folder = write_folder(tmp_path / "c", contest_toml=contest, result_last_csv=result, **files)
    return read(folder)


class TestTerms:
    def test_a_rule_without_keys_has_the_usual_ones(self):
        settled = {
            rule: CountingTerms(rule=rule).settled for rule in CountingRule if rule is not CountingRule.NONE
        }
        assert settled["highest_averages"].divisors is Divisors.DHONDT
        assert settled["largest_remainder"].quota is Quota.HARE
        assert settled["mixed_compensatory"].divisors is Divisors.DHONDT
        assert {r for r, terms in settled.items() if terms.across is Across.COUNTRY} == {
            "mixed_parallel",
            "mixed_compensatory",
        }

    def test_a_mixed_chamber_may_have_a_quota_in_place_of_divisors(self):
        terms = CountingTerms(rule=CountingRule.MIXED_PARALLEL, quota=Quota.DROOP).settled
        assert (terms.divisors, terms.quota) == (None, Quota.DROOP)

    def test_a_threshold_is_measured_where_seats_are_shared_out(self):
        wide = CountingTerms(rule=CountingRule.HIGHEST_AVERAGES, across=Across.REGION, threshold=5)
        assert wide.settled.threshold_across is Across.REGION

    @given(places=st.integers(0, 999_999))
    def test_a_first_divisor_is_the_decimal_that_was_written(self, places):
        terms = CountingTerms.model_validate(
            {
                "rule": "highest_averages",
                "divisors": "modified_sainte_lague",
                "first_divisor": float(f"1.{places:06d}"),
            }
        )
        assert Fraction(terms.first_divisor) == 1 + Fraction(places, 1_000_000)

    @given(
        apart=st.lists(st.sampled_from("ABCDE"), unique=True, max_size=4),
        split=st.integers(0, 4),
    )
    def test_every_region_counts_by_one_rule(self, apart, split):
        groups = [group for group in (apart[:split], apart[split:]) if group]
        contest = Contest(
            title="Mere",
            polling_day="2031-05-18",
            party=[{"code": "HU", "name": "Harbour Union"}],
            region=[{"code": code, "name": code} for code in "ABCDE"],
            counting={"where": [{"regions": group, "rule": "two_round"} for group in groups]},
        )
        placed = [region for _, regions in contest.counting_groups for region in regions]
        assert sorted(placed) == list("ABCDE")
        for region in "ABCDE":
            wanted = CountingRule.TWO_ROUND if region in apart else CountingRule.PLURALITY
            assert contest.terms_in(region).rule is wanted


class TestSeats:
    def test_districts_elect_the_members_in_their_column(self, tmp_path):
        inputs = counted_by(tmp_path, 'rule = "highest_averages"\n', result=DISTRICTS)
        assert inputs.last_result["seats"].tolist() == [8, 5, 1]
        assert inputs.last_result["cluster"].tolist() == ["", "Mere", "Mere"]
        assert (inputs.contest.counting.seats, inputs.contest.counting.majority) == (14, 8)

    def test_a_mixed_chamber_adds_lists_to_its_rows(self, tmp_path):
        inputs = counted_by(tmp_path, 'rule = "mixed_parallel"\nlist_seats = 4\n')
        assert (inputs.contest.counting.seats, inputs.contest.counting.majority) == (9, 5)

    def test_regions_have_lists_of_their_own(self, tmp_path):
        rule = 'rule = "mixed_compensatory"\nacross = "region"\noverhang = "within"\n'
        inputs = counted_by(tmp_path, rule, north="list_seats = 3", mere="list_seats = 6")
        assert (inputs.contest.counting.seats, inputs.contest.counting.majority) == (14, 8)

    @pytest.mark.parametrize("overhang", ["kept", "levelled"])
    def test_where_a_chamber_may_grow_the_majority_stays_open(self, overhang, tmp_path):
        rule = f'rule = "mixed_compensatory"\nlist_seats = 4\noverhang = "{overhang}"\n'
        inputs = counted_by(tmp_path, rule)
        assert (inputs.contest.counting.seats, inputs.contest.counting.majority) == (9, None)

    def test_a_majority_of_the_desks_own_holds_in_any_chamber(self, tmp_path):
        inputs = counted_by(tmp_path, 'rule = "mixed_compensatory"\nlist_seats = 4\nmajority = 6\n')
        assert inputs.contest.counting.majority == 6

    def test_lists_across_the_country_fill_the_seats_that_are_stated(self, tmp_path):
        rule = 'rule = "largest_remainder"\nacross = "country"\nseats = 20\n'
        inputs = counted_by(tmp_path, rule, result=REGIONS)
        assert inputs.contest.counting.list_seats == 20
        assert inputs.last_result["seats"].tolist() == [0, 0]

    def test_lists_across_the_country_fill_what_districts_add_up_to(self, tmp_path):
        filled = DISTRICTS.replace("MERE,,", "MERE,4,")
        inputs = counted_by(tmp_path, 'rule = "highest_averages"\nacross = "country"\n', result=filled)
        assert inputs.contest.counting.seats == 17

    def test_lists_in_some_regions_fill_what_the_others_leave(self, tmp_path):
        where = '[[counting.where]]\nregions = ["MERE"]\nrule = "highest_averages"\nacross = "country"\n'
        inputs = counted_by(tmp_path, "seats = 12\n" + where)
        ((plain, north), (lists, mere)) = inputs.contest.counting_groups
        assert (plain.rule, north) == (CountingRule.PLURALITY, ("NORTH",))
        assert (lists.list_seats, mere) == (10, ("MERE",))

    def test_a_region_of_lists_may_be_one_row_beside_seats(self, tmp_path):
        result = "".join(row for row in RESULT.splitlines(keepends=True) if not row.startswith("M"))
        result += ",Upper Mere,MERE,16580,20000,17360,3050,2250\n"
        rule = '[[counting.where]]\nregions = ["MERE"]\nrule = "highest_averages"\nacross = "region"\n'
        inputs = counted_by(tmp_path, rule, result=result, mere="list_seats = 7")
        assert inputs.contest.counting.seats == 9
        assert inputs.last_result["seat"].tolist() == ["N1", "N2", ""]
        assert inputs.last_result["seats"].tolist() == [1, 1, 0]
        assert inputs.warnings == ()

    @pytest.mark.parametrize("named", ["", 'rule = "none"\n'])
    def test_nothing_is_counted_where_no_rule_is(self, named, tmp_path):
        inputs = counted_by(tmp_path, named, result=REGIONS)
        assert inputs.contest.counting == Counting(rule=CountingRule.NONE)

    def test_a_party_free_of_the_threshold_passes_it(self, tmp_path):
        """Without the exemption nobody would, which is an error."""
        rule = 'rule = "largest_remainder"\nacross = "country"\nseats = 9\nthreshold = 60\n'
        inputs = counted_by(tmp_path, rule + 'exempt = ["OL", "HU"]\n', result=REGIONS)
        assert inputs.warnings == ()

    def test_a_joint_list_passes_a_threshold_that_its_members_do_not(self, tmp_path):
        rule = '"largest_remainder"\nacross = "country"\nthreshold = 40\nseats = 9'
        contest = CONTEST.replace('"plurality"', rule)
        joint = contest.replace("from = 2031-01-15", "joint_list = true")
        said = {}
        for name, text in (("apart", contest), ("joint", joint)):
            found = findings(write_folder(tmp_path / name, contest_toml=text, result_last_csv=REGIONS))
            said[name] = [(p.severity.value, p.rule.value) for p in found]
        assert said == {"apart": [("error", "R100")], "joint": [("warning", "R100")]}


class TestCountsAndOutcomes:
    def test_members_and_clusters_are_those_of_the_last_result(self, tmp_path):
        inputs = counted_by(
            tmp_path, 'rule = "highest_averages"\n', result=DISTRICTS,
            north="polling_day = 2031-04-20\ncounted = 2031-04-22",
            result_counted_csv="seat,region,HU,UP,OTH\nN,NORTH,9020,7010,900\n",
        )  # fmt: skip
        assert inputs.counted_result["seats"].tolist() == [8]
        assert list(inputs.counted_result.columns) == list(inputs.last_result.columns)
