"""`sparsereach atlas build`: a finer atlas in the user's cache folder.

Slices are saved as they are done, so that a build that was killed goes on where it stopped.
Every file is written beside its place and moved there: it is there whole or not at all.
"""

import argparse
import json
import multiprocessing
import multiprocessing.connection
import os
import shutil
import sys
import tempfile
import threading
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, ProcessPoolExecutor
from pathlib import Path
from typing import Any

from app.ready import own_atlas, own_atlas_file, set_aside
from engine.limits.atlas_build import Slice, build_atlas, build_slice, finer_charts, slices_of
from engine.limits.atlas_charts import Chart
from engine.limits.atlas_file import VERSION, dump_atlas, dump_slice, load_slice

__all__ = ["add_atlas", "atlas", "build"]

FINEST, MOST_WORKERS = 8, 64


def add_atlas(parser: argparse.ArgumentParser) -> None:
    """Declare the words and options of the command."""
    parser.add_argument(
        "action", choices=["build"], help="build: evaluate a grid finer than the one that ships"
    )
    parser.add_argument(
        "--finer",
        type=_whole(FINEST),
        default=2,
        metavar="N",
        help=f"times as many rows and columns, 1 to {FINEST}; default 2, about an hour of two "
        "processors",
    )
    parser.add_argument(
        "--workers",
        type=_whole(MOST_WORKERS),
        default=min(os.cpu_count() or 1, MOST_WORKERS),
        metavar="N",
        help=f"processes, 1 to {MOST_WORKERS}; default one a processor",
    )
    parser.add_argument("--json", action="store_true", help="print one JSON object")


def atlas(options: argparse.Namespace) -> int:
    """Build a finer grid of the searched boundaries, which the dashboard then reads."""
    file = own_atlas_file()
    try:
        report = build(file, finer_charts(options.finer), options.workers)
    except BrokenExecutor:
        print("sparsereach: a worker process ended early; run it again", file=sys.stderr)
        return 1
    if options.json:
        print(json.dumps(report))
    else:
        print(f"{file}: {report['slices']} slices, {report['computed']} of them evaluated now")
    return 0


def build(
    file: Path,
    charts: tuple[Chart, ...],
    workers: int,
    evaluate: Callable[[Slice], Any] = build_slice,
) -> dict[str, Any]:
    """Build the atlas of `charts` into `file`, and say what was done."""
    file.parent.mkdir(parents=True, exist_ok=True)
    slices = slices_of(charts)
    computed = 0
    existing = own_atlas(file)
    if existing is None or existing.charts != charts:
        parts = Parts(_parts_folder(file, charts))
        kept = parts.load(slices)
        computed = len(slices) - len(kept)
        pool = _workers(min(workers, max(computed, 1)))
        try:
            built = build_atlas(charts, pool, evaluate, kept, parts.keep, _Bar().show)
        finally:
            pool.shutdown(cancel_futures=True)
        _write(file, dump_atlas(built))
        parts.remove()
    return {
        "file": str(file),
        "version": VERSION,
        "bytes": file.stat().st_size,
        "slices": len(slices),
        "computed": computed,
    }


def _parts_folder(file: Path, charts: tuple[Chart, ...]) -> Path:
    """The folder of the slices of one grid of one version."""
    grid = "-".join(f"{chart.rows}x{chart.columns}" for chart in charts)
    return file.with_name(f"{file.stem}-parts-{grid}")


class Parts:
    """The slices that are done, one file each."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        folder.mkdir(exist_ok=True)

    def load(self, slices: list[Slice]) -> dict[str, Any]:
        """Return the sound ones by name; others are set aside."""
        kept = {}
        for each in slices:
            file = self._file(each.name)
            try:
                kept[each.name] = load_slice(file.read_bytes(), each.chart.columns)
            except FileNotFoundError:
                continue
            except ValueError as error:
                set_aside(file, error)
        return kept

    def keep(self, name: str, table: Any) -> None:
        """Save a slice."""
        _write(self._file(name), dump_slice(table))

    def remove(self) -> None:
        """Remove all of them, once the atlas is written."""
        shutil.rmtree(self._folder)

    def _file(self, name: str) -> Path:
        return self._folder / f"{name}.npz"


def _write(file: Path, content: bytes) -> None:
    """Write a file in one piece."""
    with tempfile.NamedTemporaryFile(dir=file.parent, suffix=".tmp", delete=False) as beside:
        try:
            beside.write(content)
            beside.flush()
            os.fsync(beside.fileno())
            os.replace(beside.name, file)
        except BaseException:
            os.unlink(beside.name)
            raise


def _workers(count: int) -> ProcessPoolExecutor:
    """Processes that start afresh, with one thread each: more would wait for each other."""
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ[name] = "1"
    context = multiprocessing.get_context("spawn")
    return ProcessPoolExecutor(count, mp_context=context, initializer=_end_with_parent)


def _end_with_parent() -> None:
    """End this worker when the command has been killed: nobody would take its results."""

    def watch() -> None:
        parent = multiprocessing.parent_process()
        if parent is not None:
            multiprocessing.connection.wait([parent.sentinel])
        os._exit(1)

    threading.Thread(target=watch, daemon=True).start()


class _Bar:
    """The share that is done, on stderr: as a bar in a terminal, else a line each tenth."""

    _WIDTH = 40

    def __init__(self) -> None:
        self._told = -1

    def show(self, done: int, total: int) -> None:
        """Say how many slices are done."""
        share = done / total
        if sys.stderr.isatty():
            bar = ("#" * int(share * self._WIDTH)).ljust(self._WIDTH, ".")
            end = "\n" if done == total else ""
            print(f"\r[{bar}] {done} of {total}", end=end, file=sys.stderr, flush=True)
        elif int(10 * share) > self._told:
            self._told = int(10 * share)
            print(f"{done} of {total} slices", file=sys.stderr, flush=True)


def _whole(most: int) -> Any:
    """Return the reader of an option that is a whole number from 1 on."""

    def read(text: str) -> int:
        if not text.isdecimal() or not 1 <= int(text) <= most:
            raise argparse.ArgumentTypeError(
                f"must be a whole number from 1 to {most}, not {text!r}"
            )
        return int(text)

    return read
