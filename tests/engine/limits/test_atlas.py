"""The ready atlas against the boundaries it was made from, and files that are none."""

import io
from pathlib import Path

import numpy as np
import pytest

from engine import critical_sparsity, power_limit, sorted_l1_boundary, two_level_boundary
from engine.limits.atlas import PENALTIES, Atlas
from engine.limits.atlas_build import Slice, build_slice, finer_charts
from engine.limits.atlas_charts import CHARTS
from engine.limits.atlas_file import dump_atlas, dump_slice, load_atlas, load_slice
from engine.limits.atlas_known import known

FILE = Path(__file__).parents[3] / "assets" / "atlas.npz"
BOUNDARIES = {"two-level": two_level_boundary, "sorted-l1": sorted_l1_boundary}


@pytest.fixture(scope="module")
def atlas():
    return load_atlas(FILE.read_bytes())


def random_points(count, seed):
    """Studies over the whole grid, half of them sparse, each with six TPPs."""
    rng = np.random.default_rng(seed)
    ratio = np.exp(rng.uniform(np.log(0.01), np.log(20.0), count))
    dense = rng.uniform(0.0005, 0.98, count)
    sparse = np.exp(rng.uniform(np.log(0.0005), np.log(0.98), count))
    sparsity = np.where(rng.random(count) < 0.5, dense, sparse)
    return zip(ratio, sparsity, rng.uniform(0.001, 1.0, (count, 6)), strict=True)


def searched_points(count, seed):
    """Studies past the transition, where everything is searched, TPPs above the power limit."""
    rng = np.random.default_rng(seed)
    ratio = rng.uniform(0.01, 0.75, count)
    least = critical_sparsity(ratio)
    sparsity = least * (0.98 / least) ** (rng.random(count) ** 2)
    limit = power_limit(ratio, sparsity)[:, None]
    return zip(ratio, sparsity, limit + (1.0 - limit) * rng.random((count, 4)), strict=True)


def in_stated_strip(tpp, ratio, sparsity):
    """Beside the power limit or the critical sparsity, as the requirement words it."""
    beside = abs(sparsity / critical_sparsity(ratio) - 1.0) <= 0.01
    return beside | (np.abs(tpp - power_limit(ratio, sparsity)) <= 0.01)


def strayed(atlas, penalty, points):
    """Errors of what is read, whether the stated strip holds them, whether the atlas's does."""
    ratio, sparsity, tpp = (np.array(column) for column in zip(*points, strict=True))
    exact = BOUNDARIES[penalty](tpp, ratio[:, None], sparsity[:, None])
    studies = list(zip(tpp, ratio, sparsity, strict=True))
    read = np.array([atlas.read(penalty, *study) for study in studies])
    stated = np.array([in_stated_strip(*study) for study in studies])
    own = np.array([atlas.inside_strip(penalty, *study) for study in studies])
    return np.abs(read - exact).ravel(), stated.ravel(), own.ravel()


@pytest.mark.parametrize("penalty", PENALTIES)
def test_off_the_grid_it_strays_by_2e_3_at_most(atlas, penalty):
    """Of 41,000 other points one was beyond: 2.5e-3, where a jump runs into TPP 1."""
    error, stated, _ = strayed(atlas, penalty, random_points(800, seed=2))
    assert np.mean(~stated) > 0.8
    assert error[~stated].max() <= 2e-3
    assert np.median(error[~stated]) <= 3e-4


@pytest.mark.parametrize("penalty", PENALTIES)
def test_where_all_is_searched_it_strays_little_more(atlas, penalty):
    error, stated, own = strayed(atlas, penalty, searched_points(600, seed=3))
    assert np.median(error[~stated]) <= 3e-4
    assert np.mean(error[~stated] <= 2e-3) >= 0.995
    # Measured at 52,000 points, some aimed at its jumps and at TPP 1: 2.1e-3, above 2e-3 twice.
    assert error[~stated & ~own].max() <= 3e-3


@pytest.mark.parametrize("penalty", PENALTIES)
def test_in_its_strips_the_boundary_is_evaluated(atlas, penalty):
    for ratio, sparsity in ((0.3, 0.2), (0.4, 0.1356), (0.005, 0.2), (0.5283, 0.2375)):
        limit = power_limit(ratio, sparsity)
        tpp = np.clip(limit + np.array([-0.2, -0.009, 0.0, 0.009, 0.05]), 1e-3, 1.0)
        inside = atlas.inside_strip(penalty, tpp, ratio, sparsity)
        exact = BOUNDARIES[penalty](tpp, ratio, sparsity)
        found = atlas.boundary(penalty, tpp, ratio, sparsity)
        assert inside[1:4].all()
        assert np.array_equal(found[inside], exact[inside])
        assert found == pytest.approx(exact, abs=2e-3)


def test_the_strips_are_where_they_are_said_to_be(atlas):
    def inside(ratio, sparsity, tpp, penalty="sorted-l1"):
        return atlas.inside_strip(penalty, tpp, ratio, sparsity).tolist()

    limit = power_limit(0.3, 0.2)
    assert inside(0.3, 0.2, limit + np.array([-0.0101, -0.0099, 0.0099, 0.0101])) == [
        False, True, True, False,
    ]  # fmt: skip
    critical = critical_sparsity(0.3)
    for part, expected in ((0.989, False), (0.991, True), (1.009, True), (1.011, False)):
        assert inside(0.3, critical * part, [0.5]) == [expected]
    # Sparsities near 1 are near no transition from a sampling ratio of 1 on.
    assert inside(1.5, 0.98, [0.5]) == [False]
    for ratio, sparsity in ((0.0099, 0.5), (20.1, 0.5), (2.0, 0.00049), (2.0, 0.981)):
        assert inside(ratio, sparsity, [0.5]) == [True]


def jump_at(ratio, sparsity, low, high):
    """Where exact two-level jumps, by bisection on the larger step."""
    for _ in range(20):
        tpp = np.array([low, 0.5 * (low + high), high])
        steps = np.diff(two_level_boundary(tpp, ratio, sparsity))
        low, high = (tpp[:2], tpp[1:])[int(steps[1] > steps[0])]
    return high, steps.max()


@pytest.mark.parametrize(
    ("ratio", "sparsity", "low", "high"),
    [(0.5283, 0.2375, 0.97, 0.999), (0.4, 0.155, 0.9, 0.97)],
)
def test_jumps_of_exact_two_level_are_kept_sharp(atlas, ratio, sparsity, low, high):
    jump, height = jump_at(ratio, sparsity, low, high)
    assert height > 0.03
    beside = jump + np.array([-0.0005, 0.0005])
    assert atlas.inside_strip("two-level", beside, ratio, sparsity).all()
    read = atlas.read("two-level", jump + np.array([-0.003, 0.003]), ratio, sparsity)
    assert read[1] - read[0] > 0.9 * height


def test_what_is_known_is_never_below_the_searched_boundary(atlas):
    points = random_points(100, seed=8)
    ratio, sparsity, tpp = (np.array(column) for column in zip(*points, strict=True))
    studies = [known(*each) for each in zip(ratio, sparsity, strict=True)]
    for penalty in PENALTIES:
        exact = BOUNDARIES[penalty](tpp, ratio[:, None], sparsity[:, None])
        fdp = [study.fdp(penalty, u) for study, u in zip(studies, tpp, strict=True)]
        # The curves are read off fine nodes, exact to about 5e-5.
        assert np.all(fdp >= exact - 1e-4)


def test_curves_run_from_the_origin_to_tpp_1(atlas):
    for ratio, sparsity, at in random_points(60, seed=5):
        for penalty in PENALTIES:
            tpp, fdp = atlas.curve(penalty, ratio, sparsity)
            assert (tpp[0], fdp[0], tpp[-1]) == (0.0, 0.0, 1.0)
            assert np.all(np.diff(tpp) > 0.0)
            assert np.all((fdp >= 0.0) & (fdp <= 1.0))
            read = atlas.read(penalty, at, ratio, sparsity)
            assert np.interp(at, tpp, fdp) == pytest.approx(read, abs=1e-3)


def test_outside_the_grid_its_edge_is_read(atlas):
    for outside, edge in (((1e-6, 0.5), (0.01, 0.5)), ((100.0, 1e-9), (20.0, 0.0005))):
        for one, other in zip(
            atlas.curve("sorted-l1", *outside), atlas.curve("sorted-l1", *edge), strict=True
        ):
            assert np.array_equal(one, other)


def test_nodes_are_evaluated_where_they_are_placed():
    for chart in (*CHARTS, *finer_charts(3)):
        for row, column in ((0, 0), (1, 2), (chart.rows - 2, chart.columns - 2)):
            # The inverse of the row's coordinate is by a table of some 4,000 ratios.
            place = chart.place(known(*chart.study(row, column)))
            assert place == pytest.approx((row, column), abs=3e-3)


def test_a_slice_is_built_from_the_boundaries(atlas):
    """One row of a narrow chart, whose nodes stand on every fifth column of the shipped one."""
    shipped = CHARTS[2]
    narrow = type(shipped)("kept", shipped.rows, 2)
    row = build_slice(Slice(narrow, 5))
    # A result depends on its own point alone; in 32 bits.
    assert row == pytest.approx(atlas.tables["kept"][5, [0, -1]], abs=1e-6)


def test_a_file_comes_back_as_it_was(atlas):
    again = load_atlas(dump_atlas(atlas))
    assert all(np.array_equal(again.tables[c.name], atlas.tables[c.name]) for c in CHARTS)
    assert dump_atlas(again) == dump_atlas(atlas) == FILE.read_bytes()
    table = atlas.tables["kept"][0]
    assert np.array_equal(load_slice(dump_slice(table), len(table)), table)
    with pytest.raises(ValueError, match="slice must hold a table of 7 columns"):
        load_slice(dump_slice(table), 7)


def test_the_shipped_file_is_small():
    assert len(FILE.read_bytes()) <= 3_000_000


def saved(**arrays):
    buffer = io.BytesIO()
    np.savez_compressed(buffer, **arrays)
    return buffer.getvalue()


def test_what_is_no_sound_atlas_is_refused(atlas):
    good = FILE.read_bytes()
    not_a_zip = (b"", b"no atlas", good[: len(good) // 2], good[:-1])
    for content in not_a_zip:
        with pytest.raises(ValueError, match="must be a zip of plain arrays"):
            load_atlas(content)
    with pytest.raises(ValueError, match="must be a zip of plain arrays"):
        load_atlas(saved(version=np.array(2), lost=np.array([object()], dtype=object)))
    with pytest.raises(ValueError, match="must be of version 2, not None"):
        load_atlas(saved(a=np.zeros(3)))
    with pytest.raises(ValueError, match="must be of version 2, not 7"):
        load_atlas(saved(version=np.array(7)))
    with pytest.raises(ValueError, match="must match its checksum"):
        load_atlas(saved(version=np.array(2), lost=np.zeros(3)))
    with pytest.raises(ValueError, match="must hold a table of the chart 'lost'"):
        load_atlas(dump_slice(atlas.tables["lost"][0]))
    sound = dict(np.load(io.BytesIO(good)))
    table = sound["kept"].copy()
    table[0, 0, 0, 0] += 1e-3
    with pytest.raises(ValueError, match="must match its checksum"):
        load_atlas(saved(**{**sound, "kept": table}))
    for table in (sound["kept"][..., :-1], sound["kept"].astype(float), sound["kept"] * np.nan):
        with pytest.raises(ValueError, match="kept must hold"):
            load_atlas(dump_atlas(Atlas({**atlas.tables, "kept": table})))


def test_no_byte_of_a_file_can_change_unseen(atlas):
    """Flipped bits are refused, or lie where the zip holds nothing that is read."""
    good = FILE.read_bytes()
    for place in np.random.default_rng(4).integers(0, len(good), 12):
        flipped = bytearray(good)
        flipped[place] ^= 0x10
        try:
            found = load_atlas(bytes(flipped))
        except ValueError:
            continue
        assert all(np.array_equal(found.tables[c.name], atlas.tables[c.name]) for c in CHARTS)
