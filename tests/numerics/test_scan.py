"""Maps over any number of axes: right at every point, saved, read back, resumed, safe against failures."""

from __future__ import annotations

import json
import os
import warnings
from concurrent.futures import BrokenExecutor, Executor, Future, ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context
from types import SimpleNamespace

import numpy as np
import pytest
import xarray

import haarloom as hl
from haarloom.exceptions import DocumentError, MissingValueError, ParameterError, ScanError
from haarloom.numerics import scan_run, scan_workers
from haarloom.numerics.scan_chunk import solve_chunk
from haarloom.numerics.scan_grid import scan_grid
from haarloom.numerics.scan_table import empty_table, read_scan, save_scan, scan_masses, verdict_table
from haarloom.numerics.verdicts import VERDICTS
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH, SU3, TINTED
from numerics.workers import KilledOnce, SlowAtHome


class Inline(Executor):
    """Does the work at once, in this process."""

    def submit(self, function, /, *arguments, **keywords):
        future: Future = Future()
        try:
            future.set_result(function(*arguments, **keywords))
        except Exception as problem:
            future.set_exception(problem)
        return future


class FailsAfter(Inline):
    """Delivers some chunks, then nothing but one kind of failure."""

    def __init__(self, good, problem):
        self.good, self.problem = good, problem

    def submit(self, function, /, *arguments, **keywords):
        if self.good:
            self.good -= 1
            return super().submit(function, *arguments, **keywords)
        future: Future = Future()
        future.set_exception(self.problem)
        return future


def assert_right(table, model, points):
    """Each chosen point against a spectrum by itself, within both errors."""
    for point in points:
        here = table.sel(point)
        values = {**json.loads(table.attrs["fixed"]), **point}
        single = model.spectrum(levels=table.sizes["level"] + 2, **values)
        for mass, error in zip(scan_masses(here).values, here["error"].values, strict=True):
            assert np.abs(single.masses - mass).min() <= error + single.error.max()


def assert_same_map(one, other):
    """The same masses within both errors: chunks, and with them cutoffs, may differ."""
    xarray.testing.assert_equal(one["done"], other["done"])
    allowed = (one["error"] + other["error"]).values.max(axis=-1)
    mine, theirs = scan_masses(one).values, scan_masses(other).values
    assert np.isfinite(allowed).all()
    for place in np.ndindex(allowed.shape):
        # of a pair at the last level either member may be listed
        upper = [levels[place].real + 1j * np.abs(levels[place].imag) for levels in (mine, theirs)]
        assert referees.distance(*upper) <= allowed[place]


def make_chunks_small(monkeypatch):
    """Many chunks even for a map of a few hundred points."""
    monkeypatch.setattr(scan_run, "CHUNK_SECONDS", 1e-6)
    monkeypatch.setattr(scan_run, "LEAST_ROWS", 16)
    monkeypatch.setattr(scan_run, "POOL_SECONDS", np.inf)


def small_axes(rows=6, columns=5):
    return {"z": np.linspace(0.1, 0.9, rows), "t": np.linspace(0.5, 1.5, columns)}


def test_a_plane_is_right_everywhere_within_its_tolerance():
    axes = small_axes(15, 12)
    table = EMBER.scan(progress=False, **axes)
    assert table.attrs["complete"] == 1
    assert dict(table.sizes) == {"z": 15, "t": 12, "level": 3}
    relative = table["error"].values / np.abs(scan_masses(table).values)
    assert relative.max() <= 1e-10
    points = [{"z": z, "t": t} for z in axes["z"][::4] for t in axes["t"][::4]]
    assert_right(table, EMBER, points)


def test_names_units_and_the_model_document_travel_with_the_result():
    table = EMBER.scan(progress=False, z=[0.1, 0.2], t=1.0)
    assert set(table.data_vars) >= {"mass_real", "mass_imaginary", "error", "verdict", "cutoff", "done"}
    assert table["mass_real"].attrs["units"] == "1 / lattice spacing"
    document = json.loads(table.attrs["model"])
    assert document["group"] == "SU(3)"
    assert json.loads(table.attrs["fixed"]) == {"t": 1.0}
    assert table["z"].values.tolist() == [0.1, 0.2]
    assert table["level"].values.tolist() == [1, 2, 3]
    assert verdict_table(table).values.tolist() == [["complex pair", "complex pair", "real"]] * 2


@pytest.mark.parametrize(
    ("model", "axes", "points"),
    [
        (EMBER, {"t": [0.8, 1.0, 1.2], "z": 0.3}, [{"t": 1.0}]),
        (EMBER, {"z": [0.9, 0.5, 0.1], "t": 1.0}, [{"z": 0.5}]),
        (
            EMBER_BOTH,
            {"z": [0.2, 0.4], "zbar": [0.0, 0.1, 0.2], "t": [0.8, 1.0]},
            [{"z": 0.4, "zbar": 0.1, "t": 0.8}, {"z": 0.2, "zbar": 0.2, "t": 1.0}],
        ),
        (TINTED, {"h": [0.1, 0.3], "t": [0.9, 1.1]}, [{"h": 0.3, "t": 0.9}]),
        (
            hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z")),
            {"beta": [5.0, 6.0], "z": 0.3},
            [{"beta": 6.0}],
        ),
    ],
    ids=["a line in t", "a falling line in z", "three axes", "a loop field", "Wilson"],
)
def test_any_number_of_axes(model, axes, points):
    table = model.scan(progress=False, **axes)
    assert table.attrs["complete"] == 1
    assert [name for name in table.sizes if name != "level"] == [k for k, v in axes.items() if np.ndim(v)]
    assert_right(table, model, points)


def test_verdicts_are_those_of_single_points():
    axes = small_axes()
    table = EMBER.scan(progress=False, **axes)
    words = verdict_table(table)
    for z in axes["z"][::2]:
        for t in axes["t"][::2]:
            single = EMBER.spectrum(levels=4, z=z, t=t)
            for word, mine in zip(words.sel(z=z, t=t).values[:2], single.verdicts[:2], strict=True):
                assert word == mine or "undecided" in (word, mine)
    assert set(np.unique(words.values)) <= set(VERDICTS)


def test_points_whose_bound_does_not_close_are_marked_and_explained():
    """At t = 0 nothing can be said; the rest of the line is there all the same."""
    table = EMBER.scan(progress=False, t=[0.0, 1.0], z=0.3)
    assert np.isnan(table["mass_real"].values[0]).all()
    assert np.isinf(table["error"].values[0]).all()
    assert np.isfinite(table["error"].values[1]).all()
    assert "bound does not close" in table.attrs["notes"]


def test_round_trip_through_netcdf(tmp_path):
    file = tmp_path / "map.nc"
    table = EMBER.scan(progress=False, file=file, **small_axes())
    again = read_scan(file)
    xarray.testing.assert_identical(table, again)
    assert not list(tmp_path.glob(".*part"))
    with xarray.open_dataset(file) as plain:
        assert plain["mass_real"].attrs["units"] == "1 / lattice spacing"


def test_a_finished_file_is_not_computed_again(tmp_path, monkeypatch):
    file = tmp_path / "map.nc"
    table = EMBER.scan(progress=False, file=file, **small_axes())
    monkeypatch.setattr(scan_run, "solve_chunk", lambda *_: pytest.fail("computed again"))
    xarray.testing.assert_identical(table, EMBER.scan(progress=False, file=file, **small_axes()))


def interrupting(after):
    """solve_chunk that gets a Ctrl-C after some chunks."""
    left = [after]

    def job(grid, chunk):
        if not left[0]:
            raise KeyboardInterrupt
        left[0] -= 1
        return solve_chunk(grid, chunk)

    return job


@pytest.mark.parametrize("by_file", [True, False], ids=["from its file", "from the partial result"])
def test_resumed_after_an_interrupt(tmp_path, monkeypatch, by_file):
    axes = {"z": np.linspace(0.1, 0.9, 4), "t": np.linspace(0.5, 1.5, 70)}
    file = tmp_path / "map.nc" if by_file else None
    make_chunks_small(monkeypatch)
    monkeypatch.setattr(scan_run, "solve_chunk", interrupting(2))
    with pytest.warns(UserWarning, match=r"interrupted: \d+ of 280 points are done"):
        partial = EMBER.scan(progress=False, file=file, **axes)
    assert partial.attrs["complete"] == 0
    done = int(partial["done"].values.sum())
    assert 0 < done < 280
    computed = []

    def counting(grid, chunk):
        computed.append(int((np.zeros(grid.shape)[chunk.index(grid)] == 0).sum()))
        return solve_chunk(grid, chunk)

    monkeypatch.setattr(scan_run, "solve_chunk", counting)
    whole = EMBER.scan(progress=False, file=file, resume=None if by_file else partial, **axes)
    assert whole.attrs["complete"] == 1
    assert sum(computed) < 280, "what was done is not computed again"
    assert partial["done"].values.sum() == done, "the partial result given is left as it was"
    assert_same_map(whole, EMBER.scan(progress=False, **axes))


def test_any_executor_of_the_standard_library_gives_the_same_map():
    axes = small_axes(8, 70)
    alone = EMBER.scan(progress=False, **axes)
    with ThreadPoolExecutor(2) as threads:
        assert_same_map(alone, EMBER.scan(progress=False, executor=threads, **axes))
    assert_same_map(alone, EMBER.scan(progress=False, executor=Inline(), **axes))


def test_an_executor_that_fails_loses_nothing(tmp_path, monkeypatch):
    make_chunks_small(monkeypatch)
    axes = {"z": np.linspace(0.1, 0.9, 4), "t": np.linspace(0.5, 1.5, 200)}
    file = tmp_path / "map.nc"
    with pytest.raises(
        ScanError, match=r"FailsAfter failed \(OSError: no room\).*done and kept in"
    ) as caught:
        EMBER.scan(progress=False, file=file, executor=FailsAfter(1, OSError("no room")), **axes)
    kept = read_scan(file)
    assert 0 < kept["done"].values.sum() < kept["done"].size
    xarray.testing.assert_identical(kept, caught.value.partial)
    whole = EMBER.scan(progress=False, file=file, **axes)
    assert whole.attrs["complete"] == 1


def test_an_executor_that_is_shut_down_is_named():
    executor = ThreadPoolExecutor(1)
    executor.shutdown()
    with pytest.raises(ScanError, match=r"ThreadPoolExecutor failed.*another executor or none") as caught:
        EMBER.scan(progress=False, executor=executor, z=[0.1, 0.2], t=np.linspace(0.5, 1.5, 140))
    assert 0 < caught.value.partial["done"].values.sum() < 280


def test_a_worker_killed_in_the_middle_loses_no_point(tmp_path, monkeypatch):
    flag = str(tmp_path / "killed")
    monkeypatch.setattr(scan_run, "solve_chunk", KilledOnce(flag))
    make_chunks_small(monkeypatch)
    monkeypatch.setattr(scan_run, "POOL_SECONDS", 0.0)
    monkeypatch.setattr(scan_run, "cores", lambda: 2)
    axes = {"z": np.linspace(0.1, 0.9, 4), "t": np.linspace(0.5, 1.5, 200)}
    table = EMBER.scan(progress=False, **axes)
    assert os.path.exists(flag), "no worker was killed: the test would say nothing"
    assert table.attrs["complete"] == 1
    monkeypatch.undo()
    assert_same_map(table, EMBER.scan(progress=False, **axes))


def test_a_pool_of_the_users_whose_worker_is_killed_says_so_and_can_be_resumed(tmp_path, monkeypatch):
    monkeypatch.setattr(scan_run, "solve_chunk", KilledOnce(str(tmp_path / "killed")))
    make_chunks_small(monkeypatch)
    axes = {"z": np.linspace(0.1, 0.9, 4), "t": np.linspace(0.5, 1.5, 200)}
    file = tmp_path / "map.nc"
    with (
        ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool,
        pytest.raises(ScanError, match="BrokenProcessPool"),
    ):
        EMBER.scan(progress=False, file=file, executor=pool, **axes)
    assert read_scan(file)["done"].values.any()
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        table = EMBER.scan(progress=False, file=file, executor=pool, **axes)
    assert table.attrs["complete"] == 1


def test_worker_processes_share_a_long_scan(tmp_path, monkeypatch):
    monkeypatch.setattr(scan_run, "solve_chunk", SlowAtHome(str(tmp_path)))
    make_chunks_small(monkeypatch)
    monkeypatch.setattr(scan_run, "POOL_SECONDS", 0.0)
    monkeypatch.setattr(scan_run, "cores", lambda: 2)
    axes = {"z": np.linspace(0.1, 0.9, 4), "t": np.linspace(0.5, 1.5, 200)}
    table = EMBER.scan(progress=False, **axes)
    assert list(tmp_path.iterdir()), "no worker took part: the test would say nothing"
    assert table.attrs["complete"] == 1
    monkeypatch.undo()
    assert_same_map(table, EMBER.scan(progress=False, **axes))


def test_a_model_that_cannot_be_sent_is_scanned_in_this_process(monkeypatch):
    monkeypatch.setattr(scan_run, "POOL_SECONDS", 0.0)
    monkeypatch.setattr(scan_run, "cores", lambda: 2)
    monkeypatch.setattr(scan_run, "Workers", lambda *_: pytest.fail("workers were started"))
    make_chunks_small(monkeypatch)
    monkeypatch.setattr(scan_run, "POOL_SECONDS", 0.0)
    monkeypatch.setattr(scan_run, "sendable", lambda *_: False)
    assert EMBER.scan(progress=False, z=[0.1, 0.2], t=np.linspace(0.5, 1.5, 130)).attrs["complete"] == 1


def test_what_the_running_script_defines_is_not_sendable(monkeypatch):
    class Local:
        pass

    assert scan_workers.sendable(EMBER)
    assert not scan_workers.sendable(EMBER, Local())


def test_workers_that_always_die_leave_the_work_to_this_process(monkeypatch):
    class Broken(Inline):
        def __init__(self, *_, **__):
            pass

        def submit(self, function, /, *arguments, **keywords):
            raise BrokenExecutor("a worker died")

    make_chunks_small(monkeypatch)
    monkeypatch.setattr(scan_run, "POOL_SECONDS", 0.0)
    monkeypatch.setattr(scan_workers, "ProcessPoolExecutor", Broken)
    monkeypatch.setattr(scan_run, "cores", lambda: 2)
    table = EMBER.scan(progress=False, z=[0.1, 0.2], t=np.linspace(0.5, 1.5, 130))
    assert table.attrs["complete"] == 1


def test_a_dask_cluster():
    distributed = pytest.importorskip("distributed")
    axes = small_axes(4, 70)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # about ports and clean-up of a test machine
        with (
            distributed.LocalCluster(
                n_workers=1, threads_per_worker=1, processes=False, dashboard_address=None
            ) as cluster,
            distributed.Client(cluster) as client,
        ):
            table = EMBER.scan(progress=False, executor=client.get_executor(), **axes)
    assert_same_map(table, EMBER.scan(progress=False, **axes))


def test_the_progress_bar_counts_points(capsys):
    EMBER.scan(progress=True, **small_axes())
    assert "30/30" in capsys.readouterr().err


def damaged(path):
    path.write_bytes(b"CDF\x01 but nothing more")


def truncated(path):
    EMBER.scan(progress=False, file=path, **small_axes())
    path.write_bytes(path.read_bytes()[:-2000])


def foreign(path):
    xarray.Dataset({"rain": ("day", [1.0, 2.0])}).to_netcdf(path)


def text(path):
    path.write_text("masses: none")


@pytest.mark.parametrize("spoil", [damaged, truncated, foreign, text])
def test_a_damaged_or_foreign_file_is_refused_and_left_as_it_is(tmp_path, spoil):
    file = tmp_path / "map.nc"
    spoil(file)
    before = file.read_bytes()
    with pytest.raises(DocumentError, match="left as it"):
        EMBER.scan(progress=False, file=file, **small_axes())
    assert file.read_bytes() == before


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"z": np.linspace(0.2, 0.9, 6)}, "values of z differ"),
        ({"levels": 5}, "another scan: its (levels|model)"),
        ({"tolerance": 1e-8}, "its tolerance"),
    ],
)
def test_a_file_of_another_scan_is_refused(tmp_path, change, message):
    file = tmp_path / "map.nc"
    EMBER.scan(progress=False, file=file, **small_axes())
    before = file.read_bytes()
    with pytest.raises(DocumentError, match=message):
        EMBER.scan(progress=False, file=file, **{**small_axes(), **change})
    assert file.read_bytes() == before


def test_a_file_of_another_model_or_with_other_axes_is_refused(tmp_path):
    file = tmp_path / "map.nc"
    EMBER.scan(progress=False, file=file, z=[0.1, 0.2], t=1.0)
    with pytest.raises(DocumentError, match="another scan: its model"):
        EMBER_BOTH.scan(progress=False, file=file, z=[0.1, 0.2], t=1.0, zbar=0.1)
    with pytest.raises(DocumentError, match="another scan"):
        EMBER.scan(progress=False, file=file, z=[0.1, 0.2], t=1.1)
    with pytest.raises(DocumentError, match="another scan"):
        EMBER.scan(progress=False, file=file, z=[0.1, 0.2], t=[1.0])


def test_a_missing_file_or_folder_is_said(tmp_path):
    with pytest.raises(FileNotFoundError):
        read_scan(tmp_path / "none.nc")
    with pytest.raises((OSError, ParameterError), match=r"none|No such"):
        EMBER.scan(progress=False, file=tmp_path / "none" / "map.nc", z=[0.1, 0.2], t=1.0)


def test_a_failed_write_leaves_the_old_file(tmp_path, monkeypatch):
    file = tmp_path / "map.nc"
    table = EMBER.scan(progress=False, file=file, z=[0.1, 0.2], t=1.0)
    before = file.read_bytes()

    def full(self, path, *_, **__):
        path.write_bytes(b"half")
        raise OSError("disk full")

    monkeypatch.setattr(xarray.Dataset, "to_netcdf", full)
    with pytest.raises(OSError, match="disk full"):
        save_scan(table, file)
    assert file.read_bytes() == before
    assert [path.name for path in tmp_path.iterdir()] == ["map.nc"]


@pytest.mark.parametrize(
    ("given_", "error", "message"),
    [
        ({"z": [], "t": 1}, ParameterError, "at least one value"),
        ({"z": 0.3, "t": 1}, ParameterError, "needs at least one axis"),
        ({"z": [0.1, 0.3, 0.2], "t": 1}, ParameterError, "neither rises nor falls"),
        ({"z": [0.1, np.nan], "t": 1}, ParameterError, "not finite"),
        ({"z": [0.1, 0.2], "t": np.inf}, ParameterError, "not finite"),
        ({"z": [[0.1, 0.2]], "t": 1}, ParameterError, "one-dimensional"),
        ({"z": ["a"], "t": 1}, ParameterError, "no path of real numbers"),
        ({"z": [0.1, 0.2]}, MissingValueError, "no value for t"),
        ({"z": [0.1, 0.2], "t": 1, "q": 2}, ParameterError, "'q' is no parameter"),
        ({"z": [0.1, 0.2], "t": -1}, ParameterError, "t = -1"),
        ({"z": [0.1, 0.2], "t": [0.5, -1.0]}, ParameterError, "must be a real number ≥ 0"),
        ({"z": [0.1], "t": 1, "tolerance": 0}, ParameterError, "tolerance = 0"),
        ({"z": [0.1], "t": 1, "tolerance": 2}, ParameterError, "tolerance = 2"),
        ({"z": [0.1], "t": 1, "levels": 0}, ParameterError, "levels.* 0"),
    ],
)
def test_bad_axes_are_refused_before_anything_is_computed(given_, error, message, monkeypatch):
    monkeypatch.setattr(scan_run, "solve_chunk", lambda *_: pytest.fail("something was computed"))
    with pytest.raises(error, match=message):
        EMBER.scan(progress=False, **given_)


def test_masses_of_a_scan_and_of_the_line_agree():
    from haarloom.numerics.branches import masses_along

    z = np.linspace(0.1, 0.9, 9)
    table = EMBER.scan(progress=False, z=z, t=1.0)
    line = masses_along(EMBER, "z", z, levels=4, cutoff=8, t=1.0)
    for row in range(len(z)):
        assert referees.distance(scan_masses(table).values[row], line.masses[row]) <= 1e-9


@pytest.mark.parametrize("cost", [1e-4, 1e-2, 0.1, 0.3])
def test_no_chunk_runs_for_long_without_being_kept(cost):
    """Seconds of the next chunk at the measured cost of a point; dense points say little about whole rows."""
    grid = scan_grid(EMBER, {"z": np.linspace(0.1, 0.9, 400), "t": np.linspace(0.5, 1.5, 400)}, 4, 1e-10)
    for points, most in ((8, 120.0), (32 * 400, 30.0)):
        run = scan_run.ScanRun(grid, empty_table(grid), None)
        chunk = SimpleNamespace(points=points)
        run._resize(SimpleNamespace(chunk=chunk, seconds=cost * points, together=True))
        assert run.rows * run.columns * cost <= most
        assert run.rows == 32 or cost < 1e-3
        assert run.columns >= 32 or cost > 0.02, "too small for warm starts"
