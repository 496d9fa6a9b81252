"""A whole release: what lies where, what it says when something is wrong, and foreign text kept inert."""

import csv
import hashlib
import html
import json
import re
import xml.etree.ElementTree as ET
from dataclasses import replace
from datetime import date
from html.parser import HTMLParser
from pathlib import Path

import altair as alt
import pytest
import vl_convert
import xarray as xr

from aggregator.errors import UsageError
from aggregator.inputs.contest import Contest, Silence
from aggregator.release.chart_style import WIDE
from aggregator.release.charts import build_charts, chart_frame
from aggregator.release.model_checks import NO_CHECKS
from aggregator.release.table_schemas import ALL_SCHEMAS
from aggregator.release.write_release import ReleaseWritten, build_contents, write_release
from tests.made_up_draws import RUN_DATE, made_up_contest, only_houses, rename_houses
from tests.release.made_up_desk import contest_without_seats, made_up_run

TABLES = {schema.path for schema in ALL_SCHEMAS}
CHARTS = (
    "support_over_time",
    "alliances_over_time",
    "house_leans",
    "poll_worth",
    "seats_on_polling_day",
    "seats_over_time",
    "combinations",
    "deciding_seats",
    "seats_against_votes",
)
HOSTILE = "<script>alert('x')</script>"


@pytest.fixture
def without_charts(monkeypatch):
    """Charts take most of the time of a release, and many tests look at other things."""
    monkeypatch.setattr("aggregator.release.write_release.write_charts", lambda folder, **_: ())


def write(folder: Path, **changes: object) -> ReleaseWritten:
    arguments = made_up_run(folder) | changes
    return write_release(arguments.pop("inputs"), **arguments)


def files_of(release: ReleaseWritten) -> set[str]:
    return {path.relative_to(release.path).as_posix() for path in release.path.rglob("*") if path.is_file()}


def texts_of(release: ReleaseWritten) -> dict[str, str]:
    kinds = {".csv", ".svg", ".json", ".html", ".md", ".txt"}
    return {
        name: (release.path / name).read_text(encoding="utf-8")
        for name in files_of(release)
        if Path(name).suffix in kinds and not name.startswith("desk/inputs/")
    }


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(text.splitlines()))


@pytest.fixture(scope="module")
def release(tmp_path_factory):
    return write(tmp_path_factory.mktemp("contest"))


@pytest.fixture(scope="module")
def failed(tmp_path_factory):
    folder = tmp_path_factory.mktemp("contest")
    arguments = made_up_run(folder, passed=False)
    return write_release(arguments.pop("inputs"), **arguments)


@pytest.fixture(scope="module")
def hostile(tmp_path_factory):
    folder = tmp_path_factory.mktemp("contest")
    arguments = made_up_run(folder)
    inputs, draws = arguments.pop("inputs"), arguments["draws"]
    contest = made_up_contest()
    contest = contest.model_copy(
        update={
            "title": f"</title>{HOSTILE} & sons",
            "parties": (
                contest.parties[0].model_copy(
                    update={"name": '"><img src=x onerror=alert(1)>', "colour": "red;background:url(//evil)"}
                ),
                *contest.parties[1:],
            ),
            "alliances": (contest.alliances[0].model_copy(update={"name": "{{ 7 * 7 }} | **pact**"}),),
            "regions": (contest.regions[0].model_copy(update={"name": "=SUM(A1:A9)"}), *contest.regions[1:]),
        }
    )
    names = {"Plumb Line": HOSTILE, "Weathercock": "=HYPERLINK('//evil')", "Tally & Wick": "+44 \x08Tally"}
    polls = inputs.polls.assign(
        house=inputs.polls["house"].replace(names),
        sponsor="@cmd",
        source="javascript:alert(1)",
        note="=1+1 and we think they weight by shoe size",
        method=HOSTILE,
    )
    draws = rename_houses(draws, names)
    unused = inputs.unused_polls.assign(
        why_not="| <b>bold</b> `code` [link](javascript:alert(1))", house="-1"
    )
    inputs = replace(inputs, contest=contest, polls=polls, unused_polls=unused)
    return write_release(inputs, **(arguments | {"draws": draws}))


class Tags(HTMLParser):
    """Every element of a page, with its attributes."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.found: list[tuple[str, dict[str, str | None]]] = []
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        self.found.append((tag, dict(attrs)))

    handle_startendtag = handle_starttag


def test_a_release_holds_its_tables_charts_page_and_note_in_two_halves(release):
    expected = TABLES | {
        "manifest.json",
        "public/index.html",
        "public/method.md",
        "desk/draws.nc",
        "desk/warnings.txt",
    }
    expected |= {"desk/inputs/contest.toml", "desk/inputs/polls.csv", "public/charts/alt_texts.json"}
    expected |= {f"public/charts/{chart}{end}" for chart in CHARTS for end in (".svg", ".png", ".vl.json")}
    assert files_of(release) == expected
    assert release.path.name == RUN_DATE.isoformat()
    assert release.page == release.path / "public" / "index.html"
    assert (release.public, release.notices) == (True, ())


def test_tables_on_disk_have_the_columns_of_their_schema(release):
    for schema in ALL_SCHEMAS:
        with (release.path / schema.path).open(encoding="utf-8", newline="") as stream:
            assert tuple(next(csv.reader(stream))) == schema.column_names


def test_the_page_opens_with_the_three_headlines(release):
    page = html.unescape(release.page.read_text(encoding="utf-8")).replace("\u00a0", " ")
    places = [page.index(sentence) for sentence in release.headlines.sentences]
    assert places == sorted(places)
    assert places[-1] < page.index("<main>")


def test_the_page_needs_no_script_and_fetches_nothing(release, failed):
    for page in (release.page.read_text(encoding="utf-8"), failed.page.read_text(encoding="utf-8")):
        for tag, attributes in Tags(page).found:
            assert tag not in {"script", "link", "iframe", "img", "object", "embed"}
            for name, value in attributes.items():
                assert not name.startswith("on")
                if name in {"src", "href", "xlink:href", "data", "action"}:
                    assert str(value).startswith("#")
        assert not re.search(r"url\((?!#)|@import", page)


def test_ids_on_the_page_are_unique(release):
    ids = [
        attributes["id"]
        for _, attributes in Tags(release.page.read_text(encoding="utf-8")).found
        if "id" in attributes
    ]
    assert len(ids) == len(set(ids))


def test_every_chart_says_its_source_dates_unit_and_caution_and_has_its_numbers_as_alt_text(release):
    alt_texts = json.loads((release.path / "public/charts/alt_texts.json").read_text(encoding="utf-8"))
    for chart in CHARTS:
        svg = (release.path / f"public/charts/{chart}.svg").read_text(encoding="utf-8")
        words = " ".join(ET.fromstring(svg).itertext())
        flat = re.sub(r"\s+", " ", words)
        for said in (
            "30 polls by 4 houses",
            "run of 6 March",
            "polling day 15 May",
            "Estimates, not results",
        ):
            assert said in flat, (chart, said)
        assert re.search(r"percent of the vote|points|seats|respondents", flat)
        assert re.search(r"\d", alt_texts[chart]["alt"])
        assert alt_texts[chart]["alt"] in flat


def test_charts_are_valid_vega_lite_with_their_data_inside(release):
    for chart in CHARTS:
        specification = json.loads(
            (release.path / f"public/charts/{chart}.vl.json").read_text(encoding="utf-8")
        )
        assert '"url"' not in json.dumps(specification)
        assert specification.pop("datasets")
        alt.Chart.from_dict(specification, validate=True)


def test_the_same_inputs_seed_and_versions_give_the_same_bytes(release, tmp_path):
    again = write(tmp_path)
    for name in files_of(release) - {"manifest.json", "desk/draws.nc"}:
        assert (release.path / name).read_bytes() == (again.path / name).read_bytes(), name


def test_the_manifest_proves_inputs_and_outputs_and_names_no_place_of_this_machine(release):
    text = (release.path / "manifest.json").read_text(encoding="utf-8")
    manifest = json.loads(text)
    for name, digest in manifest["outputs"].items():
        assert hashlib.sha256((release.path / name).read_bytes()).hexdigest() == digest
    assert set(manifest["outputs"]) == files_of(release) - {"manifest.json"}
    for name, digest in manifest["inputs"].items():
        assert hashlib.sha256((release.path / "desk/inputs" / name).read_bytes()).hexdigest() == digest
    assert manifest["seed"] == 1
    assert manifest["checks"]["passed"] is True
    assert {"python", "numpy", "pymc", "altair"} <= set(manifest["versions"])
    assert str(release.path.parent) not in text
    assert manifest["earlier_runs_on_these_inputs"] == []


def test_a_second_run_on_the_same_inputs_says_that_there_was_a_first(tmp_path, without_charts):
    arguments = made_up_run(tmp_path)
    inputs = arguments.pop("inputs")
    write_release(inputs, **arguments)
    second = write_release(inputs, **arguments | {"settings": {"seed": 2}})
    manifest = json.loads((second.path / "manifest.json").read_text(encoding="utf-8"))
    assert manifest["earlier_runs_on_these_inputs"] == [
        {"release": RUN_DATE.isoformat(), "seed": 1, "checks_passed": True}
    ]


def test_the_draws_can_be_opened_again_with_named_dims(release):
    with xr.open_datatree(release.path / "desk/draws.nc", engine="h5netcdf") as tree:
        assert tree["posterior"]["national_support_polling_day"].dims == ("chain", "draw", "party")
        assert tree["posterior_over_time"]["support"].dims == ("chain", "draw", "date", "region", "party")
        assert tree["seats"]["seats_polling_day"].sizes["draw"] == 60
        assert (
            str(tree["posterior"].attrs.get("run_date", tree.attrs.get("run_date"))) == RUN_DATE.isoformat()
        )


def test_a_failed_release_says_so_in_every_file_a_reader_may_open(failed):
    assert failed.path.parent.name == "failed"
    assert failed.notices
    for name, text in texts_of(failed).items():
        if name == "manifest.json":
            assert json.loads(text)["checks"]["passed"] is False
        else:
            assert "CHECKS FAILED" in re.sub(r"\s+", " ", text), name
        if name.endswith(".csv"):
            rows = rows_of(text)
            assert rows
            assert all("CHECKS FAILED (largest R-hat)" in row["caution"] for row in rows)


def test_a_release_with_a_poll_not_yet_published_has_no_public_half(tmp_path, without_charts):
    arguments = made_up_run(tmp_path, unpublished=("P030",))
    written = write_release(arguments.pop("inputs"), **arguments)
    names = files_of(written)
    assert not any(name.startswith("public") for name in names)
    assert "desk/embargoed/index.html" in names
    assert not written.public
    assert written.page.exists()
    assert any("P030" in notice and "public half" in notice for notice in written.notices)
    assert "NOT FOR PUBLICATION" in written.page.read_text(encoding="utf-8")
    assert json.loads((written.path / "manifest.json").read_text(encoding="utf-8"))["unpublished_polls"] == [
        "P030"
    ]


def test_a_run_in_a_silence_window_is_marked_not_for_publication(tmp_path):
    window = Silence.model_validate(
        {
            "from": RUN_DATE,
            "until": date(2033, 5, 15),
            "time_zone": "Etc/GMT+3",
            "regions": ("PORT",),
            "law": "Act 7",
        }
    )
    contest = made_up_contest()
    contest = contest.model_copy(
        update={"release": contest.release.model_copy(update={"silence": (window,)})}
    )
    arguments = made_up_run(tmp_path)
    inputs = replace(arguments.pop("inputs"), contest=contest)
    written = write_release(inputs, **arguments)
    note = (written.path / "public/method.md").read_text(encoding="utf-8")
    assert note.lstrip().startswith("**NOT FOR PUBLICATION.")
    for said in ("Port and Quays", "6 March 2033", "15 May 2033", "Etc/GMT+3", "Act 7"):
        assert said in note.splitlines()[0], said
    assert (
        json.loads((written.path / "manifest.json").read_text(encoding="utf-8"))["not_for_publication"]
        is True
    )
    assert 'role="alert"' in written.page.read_text(encoding="utf-8")
    svg = (written.path / "public/charts/support_over_time.svg").read_text(encoding="utf-8")
    assert "NOT FOR PUBLICATION" in " ".join(ET.fromstring(svg).itertext())


def test_a_contest_without_seats_has_no_seat_tables_and_no_seat_charts(tmp_path):
    arguments = made_up_run(tmp_path)
    inputs = replace(arguments.pop("inputs"), contest=contest_without_seats())
    written = write_release(inputs, **arguments | {"seats": None})
    assert not any("seat" in name for name in files_of(written))
    page = written.page.read_text(encoding="utf-8")
    assert "If people voted on 6 March 2033" in page.replace("\u00a0", " ")
    assert "seats" not in re.sub(r"<style>.*?</style>", "", page, flags=re.S).split("<main>")[0]


def test_a_contest_with_little_in_it_still_makes_a_release(tmp_path):
    """One party and others, no alliance, no region, one house, one poll, no last result."""
    whole = made_up_run(tmp_path, polls=1)
    contest = Contest.model_validate(
        {"title": "A village", "polling_day": date(2033, 5, 15), "party": [{"code": "FER", "name": "Ferry"}]}
    )
    draws = whole["draws"].sel(party=["FER", "OTH"], region=["PORT"]).assign_coords(region=["ALL"])
    draws = only_houses(draws, ["Plumb Line"]).isel(date=[-1]).drop_dims(["mode", "population", "formation"])
    for name in ("support", "support_polling_day", "national_support", "national_support_polling_day"):
        draws[name] = draws[name] / draws[name].sum("party")
    whole_unused = whole["inputs"].unused_polls
    polls = whole["inputs"].polls.assign(regions=[("ALL",)], house="Plumb Line", OTH=60.0)
    inputs = replace(
        whole.pop("inputs"),
        contest=contest,
        polls=polls,
        last_result=None,
        unused_polls=whole_unused.iloc[:0],
        warnings=(),
    )
    shelf_life = whole["shelf_life"].query("code in ['FER', 'OTH']")
    little = {"draws": draws, "seats": None, "shelf_life": shelf_life, "checks": NO_CHECKS}
    written = write_release(inputs, **whole | little)
    support = rows_of((written.path / "public/support.csv").read_text(encoding="utf-8"))
    assert {row["region"] for row in support} == {""}
    assert "Regions</h2>" not in written.page.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("dates", "drawn"),
    [
        ({"from_": date(2033, 4, 1)}, False),  # still to come on the day of the run
        ({"until": date(2033, 3, 1)}, True),  # gone by polling day
        ({"until": date(2030, 1, 1)}, False),  # long gone
    ],
)
def test_an_alliance_is_drawn_only_where_it_has_a_past(tmp_path, dates, drawn):
    contest = made_up_contest()
    contest = contest.model_copy(update={"alliances": (contest.alliances[0].model_copy(update=dates),)})
    arguments = made_up_run(tmp_path)
    inputs = replace(arguments.pop("inputs"), contest=contest)
    contents = build_contents(inputs, **arguments)
    charts = {chart.name: chart for chart in build_charts(contents)}
    assert ("alliances_over_time" in charts) is drawn
    for chart in charts.values():
        vl_convert.vegalite_to_svg(chart.framed(frame=chart_frame(contents), layout=WIDE))
    assert all("nan" not in chart.alt_text for chart in charts.values())


def test_a_place_that_holds_something_is_refused_before_anything_is_written(tmp_path):
    out = tmp_path / "mine"
    out.mkdir()
    (out / "notes.txt").write_text("mine")
    with pytest.raises(UsageError):
        write(tmp_path / "contest", out=out)
    assert [path.name for path in out.iterdir()] == ["notes.txt"]


def test_foreign_text_is_inert_on_the_page_and_in_the_note(hostile):
    page = hostile.page.read_text(encoding="utf-8")
    tags = Tags(page)
    assert not [tag for tag, _ in tags.found if tag in {"script", "img", "b"}]
    assert not [a for _, a in tags.found if any(name.startswith("on") for name in a)]
    assert not [a for _, a in tags.found if "javascript" in str(a.get("href"))]
    assert "{{ 7 * 7 }}" in page
    assert "evil)" not in re.sub(r"\s", "", page)
    note = (hostile.path / "public/method.md").read_text(encoding="utf-8")
    assert "<script" not in note
    assert "<b>" not in note


def test_foreign_text_is_inert_in_the_charts(hostile):
    for chart in CHARTS:
        tree = ET.parse(hostile.path / f"public/charts/{chart}.svg")
        names = {element.tag.rpartition("}")[2] for element in tree.iter()}
        assert names <= {
            "svg",
            "g",
            "path",
            "text",
            "tspan",
            "title",
            "desc",
            "rect",
            "line",
            "defs",
            "clipPath",
            "image",
        }
        assert "image" not in names
    svg = (hostile.path / "public/charts/house_leans.svg").read_text(encoding="utf-8")
    assert "&lt;script&gt;" in svg


def test_foreign_text_is_inert_in_a_spreadsheet(hostile):
    for name, text in texts_of(hostile).items():
        if not name.endswith(".csv"):
            continue
        schema = next(schema for schema in ALL_SCHEMAS if schema.path == name)
        typed = {column.name for column in schema.columns if column.from_register}
        for row in csv.DictReader(text.splitlines()):
            for column in typed:
                assert not row[column].startswith(("=", "+", "-", "@", "\t", "\r")), (
                    name,
                    column,
                    row[column],
                )
    polls = rows_of((hostile.path / "public/polls_used.csv").read_text(encoding="utf-8"))
    assert {row["sponsor"] for row in polls} == {"'@cmd"}


def test_the_desks_remarks_stay_out_of_the_public_half(hostile):
    for name, text in texts_of(hostile).items():
        if name.startswith("public/"):
            assert "shoe size" not in text, name
