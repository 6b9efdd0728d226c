"""The file of an atlas, and of a slice of one that is being built.

Both are zips of plain arrays with a version and a checksum. Nothing in them is ever run, and
what does not match its checksum is refused.
"""

import hashlib
import io
from typing import Any

import numpy as np
import numpy.typing as npt

from engine.limits.atlas import NUMBERS, PENALTIES, Atlas
from engine.limits.atlas_charts import CHARTS

__all__ = ["VERSION", "dump_atlas", "dump_slice", "load_atlas", "load_slice"]

# Rises when the charts, the numbers of a node or the boundaries themselves change.
VERSION = 2

Table = npt.NDArray[np.float32]

_NODE = (len(PENALTIES), NUMBERS)


def dump_atlas(atlas: Atlas) -> bytes:
    """Return the file of an atlas; the same tables give the same bytes."""
    return _dump(atlas.tables)


def load_atlas(content: bytes) -> Atlas:
    """Return the atlas in a file's content.

    Raises
    ------
    ValueError
        If it is no atlas of this version, or damaged.
    """
    arrays = _load(content, "atlas")
    for chart in CHARTS:
        table = arrays.get(chart.name)
        # Cubic interpolation needs four nodes each way.
        if table is None or table.ndim != 4 or min(table.shape[:2]) < 4:
            raise ValueError(f"atlas must hold a table of the chart '{chart.name}'")
        _check_numbers(table, chart.name)
    return Atlas({chart.name: arrays[chart.name] for chart in CHARTS})


def dump_slice(table: Table) -> bytes:
    """Return the file of a slice."""
    return _dump({"slice": table})


def load_slice(content: bytes, columns: int) -> Table:
    """Return the slice of so many columns in a file's content.

    Raises
    ------
    ValueError
        If it is no such slice of this version, or damaged.
    """
    table: Table | None = _load(content, "slice").get("slice")
    if table is None or table.ndim != 3 or len(table) != columns:
        raise ValueError(f"slice must hold a table of {columns} columns")
    _check_numbers(table, "slice")
    return table


def _check_numbers(table: npt.NDArray[Any], name: str) -> None:
    if table.shape[-2:] != _NODE or table.dtype != np.float32 or not np.isfinite(table).all():
        raise ValueError(f"{name} must hold {_NODE} 32-bit numbers a node")


def _dump(arrays: dict[str, Table]) -> bytes:
    buffer = io.BytesIO()
    extra = {"version": np.array(VERSION), "digest": np.frombuffer(_digest(arrays), np.uint8)}
    np.savez_compressed(buffer, **extra, **arrays)  # type: ignore[arg-type]
    return buffer.getvalue()


def _load(content: bytes, what: str) -> dict[str, npt.NDArray[Any]]:
    try:
        with np.load(io.BytesIO(content), allow_pickle=False) as file:
            arrays = {name: file[name] for name in file.files}
    except Exception as error:  # whatever the zip, its streams or its headers may be
        raise ValueError(f"{what} must be a zip of plain arrays: {error}") from None
    version, digest = arrays.pop("version", None), arrays.pop("digest", None)
    if version is None or version.shape or version != VERSION:
        found = None if version is None else version.tolist()
        raise ValueError(f"{what} must be of version {VERSION}, not {found}")
    if digest is None or digest.tobytes() != _digest(arrays):
        raise ValueError(f"{what} must match its checksum; it is damaged")
    return arrays


def _digest(arrays: dict[str, Any]) -> bytes:
    digest = hashlib.sha256()
    for name in sorted(arrays):
        digest.update(f"{name} {arrays[name].dtype.str} {arrays[name].shape}".encode())
        digest.update(arrays[name].tobytes())
    return digest.digest()
