"""The searched boundaries read off a grid: fast enough to follow the hand.

The boundaries of two-level and sorted L1 are smooth in sampling ratio and sparsity within three
charts, and along TPP on either side of the TPP at which their best law changes (close to the
power limit). Each chart is a regular grid in coordinates of its own; a node holds, for each of
the two penalties, that TPP and the FDP at fixed fractions of the stretch before it and after
it. Between nodes it is cubic interpolation of these numbers, so the break stays sharp.

The values are for drawing and for a first answer; tests state how far they stray. For values
to rely on, call the boundaries themselves.
"""

import hashlib
import io
import zipfile
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from engine.limits.transition import critical, threshold_at_ratio
from engine.normal import Array, central, density

__all__ = ["CHARTS", "PENALTIES", "Atlas", "Chart", "dump_atlas", "load_atlas"]

VERSION = 1
PENALTIES = ("two-level", "sorted-l1")

# Fractions of TPP before and after the break; the first after it stands just past it.
BEFORE = np.linspace(0.0, 1.0, 33)[1:]
AFTER = np.linspace(0.0, 1.0, 29) ** 2  # the curve bends most just past the break
JUST_PAST = 1e-4

LEAST_RATIO, MOST_RATIO = 0.01, 20.0
LEAST_SPARSITY, MOST_SPARSITY = 0.0005, 0.98

_LEVELS = 65535  # 16 bits for shares in [0, 1]: steps of 1.5e-5


@dataclass(frozen=True)
class Chart:
    """A smooth piece of the phase plane, with its grid.

    'sparse' and 'dense' lie on the two sides of the transition, at sampling ratios below 1;
    'above' holds all sparsities at ratios from 1 on.
    """

    name: str
    rows: int
    columns: int

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the chart's table."""
        return (self.rows, self.columns, len(PENALTIES), 1 + len(BEFORE) + len(AFTER))

    def place(self, delta: float, eps: float, eps_star: float) -> tuple[float, float]:
        """Coordinates of a study on the grid, in rows and columns."""
        if self.name == "above":
            row = np.log(delta) / np.log(MOST_RATIO)
        else:
            row = threshold_at_ratio(np.asarray(delta)) / _LARGEST_T
        low, high = self._ends(eps_star)
        column = max((self._scale(eps) - low) / (high - low), 0.0) ** self._bend
        return float(row) * (self.rows - 1), float(column) * (self.columns - 1)

    def study(self, row: int, column: int) -> tuple[float, float]:
        """Sampling ratio and sparsity of a node."""
        delta = self._ratio(row / (self.rows - 1))
        eps_star = float(critical(np.asarray(delta)))
        low, high = self._ends(eps_star)
        scaled = low + (column / (self.columns - 1)) ** (1.0 / self._bend) * (high - low)
        eps = scaled**3 if self.name == "above" else np.exp(scaled)
        return delta, float(np.clip(eps, 0.5 * LEAST_SPARSITY, 0.9999))

    @property
    def _bend(self) -> float:
        """Below 1, columns crowd at the low end: just past the transition all moves fast."""
        return 0.5 if self.name == "dense" else 1.0

    def _ratio(self, part: float) -> float:
        if self.name == "above":
            return float(MOST_RATIO**part)
        t = np.linspace(0.0, _LARGEST_T, 20_001)[1:]
        # The inverse of threshold_at_ratio by its own table: exact enough to place a node,
        # because the node is evaluated at the ratio that is returned.
        return float(np.interp(max(part * _LARGEST_T, _SMALLEST_T), t, _ratio_at(t)))

    def _ends(self, eps_star: float) -> tuple[float, float]:
        # Just inside the transition, so that every node lies on its own side of it.
        ends = {
            "sparse": (LEAST_SPARSITY, min(eps_star * (1.0 - 1e-5), 0.9995)),
            "dense": (min(eps_star * (1.0 + 1e-5), 0.97), MOST_SPARSITY),
            "above": (LEAST_SPARSITY, MOST_SPARSITY),
        }[self.name]
        return self._scale(ends[0]), self._scale(ends[1])

    def _scale(self, eps: float) -> float:
        return float(np.cbrt(eps)) if self.name == "above" else float(np.log(eps))


# Rows and columns follow how fast the boundaries change across each chart; how far the atlas
# strays from them is measured in tests/engine/limits/test_atlas.py.
CHARTS = (Chart("sparse", 44, 20), Chart("dense", 44, 40), Chart("above", 24, 28))


@dataclass(frozen=True, eq=False)  # one atlas is told from another by being another
class Atlas:
    """Tables of all charts, by name: 16-bit shares, in the order of `Chart.shape`."""

    tables: dict[str, npt.NDArray[np.uint16]]

    def curve(
        self, penalty: str, sampling_ratio: float, sparsity: float
    ) -> tuple[Array, Array]:
        """Return nodes (tpp, fdp) of a boundary, from (0, 0) to TPP 1.

        Studies outside the grid are read at its edge.
        """
        shares = self._read(sampling_ratio, sparsity)[PENALTIES.index(penalty)]
        turn, fdp = float(shares[0]), shares[1:]
        if turn > 1.0 - 2.0 * JUST_PAST:  # the law never changes: nothing comes after
            return np.append(0.0, BEFORE), np.append(0.0, fdp[: len(BEFORE)])
        past = turn + JUST_PAST
        tpp = np.concatenate([[0.0], turn * BEFORE, past + (1.0 - past) * AFTER])
        return tpp, np.append(0.0, fdp)

    def _read(self, sampling_ratio: float, sparsity: float) -> Array:
        delta = min(max(sampling_ratio, LEAST_RATIO), MOST_RATIO)
        eps = min(max(sparsity, LEAST_SPARSITY), MOST_SPARSITY)
        eps_star = float(critical(np.asarray(delta)))
        chart = CHARTS[2] if delta >= 1.0 else CHARTS[int(eps > eps_star)]
        table = self.tables[chart.name]
        row, column = chart.place(delta, eps, eps_star)
        i, across = _cubic(row, chart.rows)
        j, along = _cubic(column, chart.columns)
        block = table[i : i + 4, j : j + 4] / _LEVELS
        read: Array = np.einsum("i,j,ijpk->pk", across, along, block)
        return np.clip(read, 0.0, 1.0)


def _cubic(place: float, count: int) -> tuple[int, Array]:
    """First of the four nodes around a place on a unit grid, and their Lagrange weights."""
    place = min(max(place, 0.0), count - 1.0)
    first = min(max(int(place) - 1, 0), count - 4)
    t = place - first
    weights = (
        -(t - 1.0) * (t - 2.0) * (t - 3.0) / 6.0,
        t * (t - 2.0) * (t - 3.0) / 2.0,
        -t * (t - 1.0) * (t - 3.0) / 2.0,
        t * (t - 1.0) * (t - 2.0) / 6.0,
    )
    return first, np.array(weights)


def levels(shares: Array) -> npt.NDArray[np.uint16]:
    """Return shares in [0, 1] as the 16-bit levels that tables hold."""
    return np.rint(np.clip(shares, 0.0, 1.0) * _LEVELS).astype(np.uint16)


def dump_atlas(atlas: Atlas) -> bytes:
    """Return the file of an atlas: a zip of plain arrays with a version and a checksum."""
    buffer = io.BytesIO()
    version = np.array(VERSION)
    digest = np.frombuffer(_digest(atlas), np.uint8)
    np.savez_compressed(buffer, version=version, digest=digest, **atlas.tables)  # type: ignore[arg-type]
    return buffer.getvalue()


def load_atlas(content: bytes) -> Atlas:
    """Return the atlas in a file's content; nothing in it is ever run.

    Raises
    ------
    ValueError
        If it is no atlas of this version, or damaged.
    """
    try:
        with np.load(io.BytesIO(content), allow_pickle=False) as file:
            arrays = {name: file[name] for name in file.files}
    except (OSError, ValueError, EOFError, KeyError, zipfile.BadZipFile) as error:
        raise ValueError(f"atlas must be a zip of plain arrays: {error}") from None
    found = int(arrays["version"]) if "version" in arrays else None
    if found != VERSION:
        raise ValueError(f"atlas must be of version {VERSION}, not {found}")
    for chart in CHARTS:
        table = arrays.get(chart.name)
        if table is None or table.shape != chart.shape or table.dtype != np.uint16:
            raise ValueError(f"atlas must hold {chart.name} as 16-bit levels of {chart.shape}")
    atlas = Atlas({chart.name: arrays[chart.name] for chart in CHARTS})
    if arrays.get("digest", np.empty(0)).tobytes() != _digest(atlas):
        raise ValueError("atlas must match its checksum; it is damaged")
    return atlas


def _digest(atlas: Atlas) -> bytes:
    digest = hashlib.sha256()
    for chart in CHARTS:
        digest.update(atlas.tables[chart.name].astype("<u2").tobytes())
    return digest.digest()


_LARGEST_T = float(threshold_at_ratio(np.asarray(LEAST_RATIO)))
_SMALLEST_T = 1e-3  # a sampling ratio of 1 - 5e-7


def _ratio_at(t: Array) -> Array:
    """Sampling ratio of the transition at t; falls from 1."""
    return 2.0 * density(t) / (2.0 * density(t) + t * central(t))
