"""What users rely on in the model: order and labels do not matter, and its parts mean what they say."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pymc as pm
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.estimate.compiled_election import CompiledElection, compile_election
from aggregator.estimate.log_density import compile_log_density
from aggregator.estimate.poll_fit import row_log_likelihood
from models.arrays import ElectionArrays, ModelInputError
from models.block_geometry import build_geometry
from models.conditional_laplace import coordinates_from_modes
from models.election_model import build_election_model
from models.priors import SCALE_SHARE, Priors
from models.region_support import own_support
from models.shared_lean import lean_loadings, lean_scale
from tests.models.made_up_arrays import made_up_arrays


def _full(*, polls: int = 40, houses: int = 4, messy: bool = False) -> ElectionArrays:
    """A contest with a new party, an absent party, lumped parties and interval cells."""
    return made_up_arrays(
        4,
        free=1,
        absent=True,
        small=True,
        parties=5,
        regions=3,
        houses=houses,
        polls=polls,
        weeks=20,
        messy=messy,
    )[0]


@pytest.fixture(scope="module", params=[False, True], ids=["plain", "messy"])
def election(request: pytest.FixtureRequest) -> CompiledElection:
    return compile_election(_full(messy=request.param), priors=Priors())


def _points(election: CompiledElection, count: int = 4) -> np.ndarray:
    rng = np.random.default_rng(12)
    return election.start + 0.5 * rng.normal(size=(count, election.density.layout.size))


def test_the_draws_are_read_with_the_likelihood_they_were_drawn_from(election: CompiledElection) -> None:
    """Likelihood of every row in numpy against the model's own graph, at random points."""
    points = _points(election)
    ours = row_log_likelihood(election.read(points), arrays=election.arrays, samples=np.arange(len(points)))
    model = election.model
    names = [name for name in ("answers", "small_answers") if name in model.named_vars]
    graph = model.compile_fn(
        model.logp(vars=[model[name] for name in names], sum=True), inputs=model.value_vars, point_fn=False
    )
    layout = election.density.layout
    for point, rows in zip(points, ours, strict=True):
        assert graph(*[layout.part(point, name) for name in layout.names]) == pytest.approx(
            rows.sum(), rel=1e-9
        )


def test_the_pilot_moves_the_coordinates_and_not_the_density(election: CompiledElection) -> None:
    """The same support has the same density with the pilot's pulls and with none."""
    layout, share = election.density.layout, election.arrays.country.pilot_share
    geometry = election.geometry
    for point in _points(election):
        parameters = election.read(point[None])
        moved = point.copy()
        for name, block, scale in (
            ("national", geometry.national, parameters.drift[0]),
            ("region", geometry.region, parameters.drift[0] * parameters.region_ratio[0]),
            ("lean", geometry.lean, parameters.house_scale[0]),
        ):
            assert block is not None
            pull = election.model[f"{name}_pull"].get_value()
            shift = _shift(scale, block.information, share, pull)
            moved[layout.place(f"{name}_modes")] += shift.ravel()
        without = _density_of(election, election.arrays, moved)
        assert election.density(point)[0] == pytest.approx(without, abs=1e-6)


def _shift(scale: np.ndarray, information: np.ndarray, share: np.ndarray, pull: np.ndarray) -> np.ndarray:
    """Coordinates without a pull, of the modes that lie at the origin with it."""
    origin = {"scale": scale, "information": information, "share": share}
    return -coordinates_from_modes(np.zeros_like(pull), **origin, pull=pull)


def test_the_order_of_rows_changes_the_density_by_nothing(election: CompiledElection) -> None:
    arrays = election.arrays
    shuffled = _reorder_rows(arrays, np.random.default_rng(1).permutation(len(arrays.rows.respondents)))
    point = _common_point(election)
    assert _density_of(election, shuffled, point) == pytest.approx(
        _density_of(election, arrays, point), rel=1e-11
    )


def test_relabelling_parties_and_regions_changes_the_density_by_nothing(election: CompiledElection) -> None:
    arrays = election.arrays
    relabelled = _reorder_parties(_reorder_regions(arrays, [2, 0, 1]), [3, 4, 0, 2, 1])
    point = _common_point(election)
    assert _density_of(election, relabelled, point) == pytest.approx(
        _density_of(election, arrays, point), rel=1e-9
    )


def test_another_weeks_polls_and_houses_need_no_new_compilation(election: CompiledElection) -> None:
    """The density compiled for other polls gives what one compiled for these polls gives."""
    messy = election.arrays.counted is not None
    more = _full(polls=55, houses=6, messy=messy)
    reused = compile_election(more, priors=Priors(), like=election)
    try:
        assert reused.density.compiled is election.density.compiled
        geometry = build_geometry(more, priors=Priors())
        anew = compile_log_density(build_election_model(more, geometry=geometry, priors=Priors()))
        point = _common_point(reused)
        for name, data in reused.model.named_vars.items():
            if name.endswith("_pull"):
                data.set_value(np.zeros_like(data.get_value()))
        assert reused.density(point)[0] == pytest.approx(anew(point)[0], rel=1e-10)
    finally:
        # The tests after this one need the election's own numbers back.
        compile_election(election.arrays, priors=Priors(), like=election)


def test_another_contests_model_is_compiled_anew(election: CompiledElection) -> None:
    other = compile_election(_full(messy=election.arrays.counted is None), priors=Priors(), like=election)
    assert other.density.compiled is not election.density.compiled


def test_the_prior_can_be_drawn_from_and_gives_plausible_registers() -> None:
    arrays, _ = made_up_arrays(4, parties=4, polls=25, weeks=20)
    model = build_election_model(arrays, geometry=build_geometry(arrays, priors=Priors()), priors=Priors())
    with model:
        drawn = pm.sample_prior_predictive(60, random_seed=5)
    answers = drawn["prior_predictive"]["answers"].to_numpy()
    asked = np.broadcast_to(arrays.rows.answers.sum(axis=1), answers.shape[:-1])
    np.testing.assert_allclose(answers.sum(axis=-1), asked, atol=1)
    share = answers / answers.sum(axis=-1, keepdims=True)
    first = (share * arrays.rows.used)[..., 0]
    # A register drawn from the prior moves by points between polls, not by tens of points.
    assert 0.005 < first.std(axis=-1).mean() < 0.15


def test_modes_drawn_from_the_prior_have_the_scale_of_their_party() -> None:
    arrays, _ = made_up_arrays(4, parties=4, polls=25, weeks=20)
    priors = replace(Priors(), drift_log_sd=1e-9, party_spread=1e-9)
    model = build_election_model(arrays, geometry=build_geometry(arrays, priors=Priors()), priors=priors)
    with model:
        modes = pm.draw(model["national_modes"], draws=400, random_seed=3)
    expected = 0.035 * np.sqrt(SCALE_SHARE / arrays.country.reference_share)
    np.testing.assert_allclose(modes.std(axis=(0, 1)), expected, rtol=0.05)


def test_the_shared_lean_keeps_its_variance_and_correlates_its_ends_as_assumed() -> None:
    loadings = lean_loadings(np.linspace(0, 1, 9), correlation=1 / 3)
    np.testing.assert_allclose((loadings**2).sum(axis=1), 1)
    assert loadings[0] @ loadings[-1] == pytest.approx(1 / 3)


def test_the_shared_lean_has_one_size_in_points_for_a_party_and_for_any_sum_of_parties() -> None:
    """sd c·√(p(1−p)) of a share, by the delta method over independent log-support errors."""
    share = np.array([0.4, 0.3, 0.2, 0.1])
    scale = lean_scale(lean_size=0.05, reference_share=share, house_scale=np.zeros(4), house_count=5)
    for members in ([0], [1, 3], [0, 2]):
        inside = np.isin(np.arange(4), members)
        total = share[inside].sum()
        slope = share * (inside - total)
        assert np.sqrt(((slope * scale) ** 2).sum()) == pytest.approx(0.05 * np.sqrt(total * (1 - total)))


def test_few_houses_add_their_unseen_common_mean_to_the_shared_lean() -> None:
    lean = lean_scale(lean_size=0.05, reference_share=0.25, house_scale=0.06, house_count=2)
    assert lean == pytest.approx(np.sqrt(0.05**2 / 0.25 + 0.06**2 / 2))


@settings(max_examples=50)
@given(seed=st.integers(0, 10_000), size=st.floats(0.01, 2))
def test_regional_swings_leave_every_partys_national_sum_alone(seed: int, size: float) -> None:
    rng = np.random.default_rng(seed)
    start, turnout = rng.dirichlet(np.ones(4), size=3), rng.dirichlet(np.ones(3))
    start[0, 1] = 0
    own = own_support(size * rng.normal(size=(3, 4)), start_share=start, turnout=turnout, exp=np.exp)
    before = turnout @ (start / start.sum(axis=1, keepdims=True))
    np.testing.assert_allclose(turnout @ own, before, rtol=1e-9)
    assert own[0, 1] == 0


@pytest.mark.parametrize(
    ("change", "named"),
    [
        ({"respondents": np.zeros(40)}, "more than one respondent"),
        ({"respondents": np.full(40, np.nan)}, "respondents"),
        ({"poll_respondents": np.full(40, 10.0)}, "its poll"),
        ({"region_mix": np.full((40, 3), 0.5)}, "region_mix"),
    ],
)
def test_arrays_that_contradict_each_other_are_refused_by_name(change: dict, named: str) -> None:
    arrays = _full()
    broken = replace(arrays, rows=replace(arrays.rows, **change))
    with pytest.raises(ModelInputError, match=named):
        build_election_model(broken, geometry=build_geometry(arrays, priors=Priors()), priors=Priors())


def _density_of(election: CompiledElection, arrays: ElectionArrays, point: np.ndarray) -> float:
    """Log density of other arrays through the compiled function, their pulls zero."""
    other = build_election_model(arrays, geometry=build_geometry(arrays, priors=Priors()), priors=Priors())
    shared = [variable for variable in election.model.data_vars if variable.name in other.named_vars]
    before = [variable.get_value() for variable in shared]
    try:
        for variable in shared:
            variable.set_value(other[variable.name].get_value())
        return election.density(point)[0]
    finally:
        for variable, value in zip(shared, before, strict=True):
            variable.set_value(value)


def _common_point(election: CompiledElection) -> np.ndarray:
    """A point with other scales; whatever has a party or a house of its own stays at zero, free of labels."""
    layout = election.density.layout
    point = np.zeros(layout.size)
    values = {"drift_log": -3.1, "house_scale_log": -3.0, "region_ratio_own": 0.4, "ramp_log_height": 0.3}
    for name in values.keys() & set(layout.names):
        point[layout.place(name)] = values[name]
    return point


def _reorder_rows(arrays: ElectionArrays, order: np.ndarray) -> ElectionArrays:
    rows = arrays.rows
    by_row = {
        name: getattr(rows, name)[order]
        for name in (
            "poll_of_row",
            "house_of_row",
            "respondents",
            "poll_respondents",
            "weighting_known",
            "partition",
            "answers",
            "used",
        )
    }
    place = np.argsort(order)
    by_row |= {"small_row": place[rows.small_row], "row_of_part": place[rows.row_of_part]}
    leans = replace(arrays.leans, terms_of_row=arrays.leans.terms_of_row[order])
    return replace(arrays, rows=replace(rows, **by_row), leans=leans)


def _reorder_parties(arrays: ElectionArrays, order: list[int]) -> ElectionArrays:
    country = arrays.country
    leans = arrays.leans
    counted = arrays.counted
    return replace(
        arrays,
        leans=replace(leans, formation_members=leans.formation_members[:, order]),
        counted=counted and replace(counted, share=counted.share[:, order]),
        country=replace(
            country,
            parties=tuple(country.parties[i] for i in order),
            standing=country.standing[:, order],
            start_log_share=country.start_log_share[:, order],
            reference_share=country.reference_share[order],
            lean_size=country.lean_size[order],
            pilot_share=country.pilot_share[order],
            free_party=np.argsort(order)[country.free_party],
        ),
        rows=replace(arrays.rows, partition=arrays.rows.partition[:, :, order]),
    )


def _reorder_regions(arrays: ElectionArrays, order: list[int]) -> ElectionArrays:
    country = arrays.country
    counted = arrays.counted
    return replace(
        arrays,
        counted=counted and replace(counted, region=np.argsort(order)[counted.region]),
        country=replace(
            country,
            regions=tuple(country.regions[i] for i in order),
            turnout=country.turnout[order],
            standing=country.standing[order],
            start_log_share=country.start_log_share[order],
        ),
        rows=replace(arrays.rows, region_mix=arrays.rows.region_mix[:, order]),
    )
