"""`sparsereach atlas build`: killed, gone on with, in one piece; and what is set aside."""

import json
import os
import signal
import subprocess
import sys
import textwrap
import time
from pathlib import Path

import numpy as np
import pytest

import app.atlas_command
import app.ready
from app.atlas_command import build
from app.cli import main
from app.ready import own_atlas, own_atlas_file, ready_atlas
from engine.limits.atlas_build import finer_charts
from engine.limits.atlas_charts import CHARTS
from engine.limits.atlas_file import VERSION, dump_atlas, load_atlas

ROOT = Path(__file__).parents[2]
SHIPPED = ROOT / "assets" / "atlas.npz"

# Builds the tiny grid with slices that cost a tenth of a second and are noted in a log; workers
# that start afresh find `evaluate` in this script.
SCRIPT = textwrap.dedent("""
    import json, sys, time
    from pathlib import Path
    import numpy as np
    from app.atlas_command import build
    from engine.limits.atlas import NUMBERS, PENALTIES
    from engine.limits.atlas_charts import CHARTS, Chart

    def evaluate(each):
        time.sleep(0.1)
        with open(sys.argv[2], "a") as log:
            log.write(each.name + "\\n")
        seed = [each.row, *each.chart.name.encode()]
        shape = (each.chart.columns, len(PENALTIES), NUMBERS)
        return np.random.default_rng(seed).random(shape).astype(np.float32)

    if __name__ == "__main__":
        tiny = tuple(Chart(chart.name, 4, 4) for chart in CHARTS)
        print(json.dumps(build(Path(sys.argv[1]), tiny, 2, evaluate)))
""")


def start(folder, log):
    script = folder / "script.py"
    script.write_text(SCRIPT)
    file = folder / "cache" / "atlas.npz"
    return file, subprocess.Popen(
        [sys.executable, str(script), str(file), str(log)],
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def finished(process):
    out, err = process.communicate(timeout=30)
    assert process.returncode == 0, err
    return json.loads(out), err


def names(log):
    return log.read_text().split() if log.exists() else []


def test_a_killed_build_goes_on_where_it_stopped(tmp_path):
    (tmp_path / "whole").mkdir()
    whole, reference = start(tmp_path / "whole", tmp_path / "whole.log")
    (tmp_path / "killed").mkdir()
    log = tmp_path / "killed.log"
    file, process = start(tmp_path / "killed", log)
    parts = file.parent / "atlas-parts-4x4-4x4-4x4"
    give_up = time.monotonic() + 30
    while len(list(parts.glob("*.npz"))) < 3 and time.monotonic() < give_up:
        time.sleep(0.01)
    process.send_signal(signal.SIGKILL)
    process.communicate()
    saved = {each.stem for each in parts.glob("*.npz")}
    assert 3 <= len(saved) < 12
    assert not file.exists()

    # The workers have ended with the killed command: nothing more is evaluated.
    time.sleep(0.5)
    before = names(log)
    time.sleep(0.3)
    assert names(log) == before
    damaged = parts / f"{min(saved)}.npz"
    damaged.write_bytes(damaged.read_bytes()[:-20])

    report, err = finished(start(tmp_path / "killed", log)[1])
    again = names(log)[len(before) :]
    assert sorted(again) == sorted(set(again))
    assert not set(again) & (saved - {min(saved)})
    assert report["computed"] == len(again) == 12 - len(saved) + 1
    assert "set aside" in err
    assert "12 of 12 slices" in err

    finished(reference)
    assert file.read_bytes() == whole.read_bytes()
    assert list(file.parent.iterdir()) == [file]
    report, _ = finished(start(tmp_path / "killed", log)[1])
    assert report["computed"] == 0
    load_atlas(file.read_bytes())


def test_a_terminal_shows_a_bar_and_a_file_a_line_each_tenth(capsys, monkeypatch):
    def shown():
        bar = app.atlas_command._Bar()
        for done in range(41):
            bar.show(done, 40)
        return capsys.readouterr().err

    assert shown().splitlines() == [f"{done} of 40 slices" for done in range(0, 41, 4)]
    monkeypatch.setattr(sys.stderr, "isatty", lambda: True)
    bars = shown().split("\r")
    assert bars[11] == f"[{'#' * 10}{'.' * 30}] 10 of 40"
    assert bars[-1] == f"[{'#' * 40}] 40 of 40\n"


@pytest.fixture
def cache(tmp_path, monkeypatch):
    monkeypatch.setattr(app.ready.platformdirs, "user_cache_path", lambda name: tmp_path / name)
    # The files of this tree, whichever one the environment has installed.
    monkeypatch.setattr(app.ready, "asset", lambda name: (ROOT / "assets" / name).read_bytes())
    ready_atlas.cache_clear()
    yield own_atlas_file()
    ready_atlas.cache_clear()


def test_the_users_own_atlas_is_read_if_it_is_sound(cache, capsys):
    shipped = load_atlas(SHIPPED.read_bytes())
    finer = type(shipped)({name: table + 1.0 for name, table in shipped.tables.items()})
    cache.parent.mkdir()
    cache.write_bytes(dump_atlas(finer))
    found = ready_atlas()
    assert all(np.array_equal(found.tables[c.name], finer.tables[c.name]) for c in CHARTS)
    assert capsys.readouterr().err == ""


@pytest.mark.parametrize("content", [b"", b"anything", SHIPPED.read_bytes()[:-50]])
def test_a_damaged_or_foreign_file_is_set_aside(cache, capsys, content):
    cache.parent.mkdir()
    cache.write_bytes(content)
    found = ready_atlas()
    shipped = load_atlas(SHIPPED.read_bytes())
    assert all(np.array_equal(found.tables[c.name], shipped.tables[c.name]) for c in CHARTS)
    warning = capsys.readouterr().err
    assert warning.count("\n") == 1
    assert f"set aside as {cache.name}.set-aside: atlas must be" in warning
    assert not cache.exists()
    assert cache.with_name(f"{cache.name}.set-aside").read_bytes() == content


def test_a_file_too_large_is_not_read(cache, capsys, monkeypatch):
    monkeypatch.setattr(app.ready, "_ATLAS_BYTES", 10)
    cache.parent.mkdir()
    cache.write_bytes(b"x" * 11)
    assert own_atlas(cache) is None
    assert "must be at most 10 bytes" in capsys.readouterr().err


def test_without_an_own_atlas_the_shipped_one_is_read_in_silence(cache, capsys):
    assert ready_atlas().charts == CHARTS
    assert capsys.readouterr().err == ""


def test_the_command_builds_into_the_cache_folder(cache, capsys, monkeypatch):
    asked = []

    def noted(file, charts, workers):
        asked.append((file, charts, workers))
        return {"file": str(file), "slices": 3, "computed": 1}

    monkeypatch.setattr(app.atlas_command, "build", noted)
    assert main(["atlas", "build", "--finer", "3", "--workers", "2", "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == {
        "file": str(cache), "slices": 3, "computed": 1,
    }  # fmt: skip
    assert main(["atlas", "build"]) == 0
    assert capsys.readouterr().out == f"{cache}: 3 slices, 1 of them evaluated now\n"
    assert [charts for _, charts, _ in asked] == [finer_charts(3), finer_charts(2)]
    assert cache.name == f"atlas-{VERSION}.npz"


@pytest.mark.parametrize(
    ("options", "rule"),
    [
        (["--finer", "0"], "--finer: must be a whole number from 1 to 8, not '0'"),
        (["--finer", "2.5"], "--finer: must be a whole number from 1 to 8, not '2.5'"),
        (["--workers", "65"], "--workers: must be a whole number from 1 to 64, not '65'"),
    ],
)
def test_bad_options_are_told_in_one_line(capsys, options, rule):
    assert main(["atlas", "build", *options]) == 2
    assert rule in capsys.readouterr().err


def test_a_folder_that_cannot_be_made_is_a_failure(tmp_path):
    (tmp_path / "sparsereach").write_text("a file stands where the folder should")
    done = subprocess.run(
        [sys.executable, "-m", "app.cli", "atlas", "build"],
        env={**os.environ, "PYTHONPATH": str(ROOT), "XDG_CACHE_HOME": str(tmp_path)},
        capture_output=True,
        text=True,
    )
    assert done.returncode == 1
    assert done.stderr == "sparsereach: File exists\n"


def test_an_atlas_that_is_there_is_not_built_again(cache):
    cache.parent.mkdir()
    cache.write_bytes(SHIPPED.read_bytes())
    report = build(cache, CHARTS, 1)
    assert report == {
        "file": str(cache),
        "version": VERSION,
        "bytes": SHIPPED.stat().st_size,
        "slices": sum(chart.rows for chart in CHARTS),
        "computed": 0,
    }
