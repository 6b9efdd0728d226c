"""Each user-facing quantity, declared once.

The command's options, the checks of files and arguments, the JSON Schema, the sliders and the
help texts are all made from the declarations at the end of this file.
"""

import math
import re
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

__all__ = [
    "ACTIVES",
    "CALIBRATION",
    "CANDIDATES",
    "CRITICAL_SPARSITY",
    "CUT",
    "EFFECT_SCALE",
    "EFFECT_SIZE",
    "FDP",
    "LAMBDA",
    "LEVEL",
    "NOISE_SD",
    "POWER_LIMIT",
    "QUANTITIES",
    "RAMP_LEVEL",
    "RANK_SHARE",
    "RISK",
    "RUNS",
    "SAMPLING_RATIO",
    "SHARE",
    "SIZE_IN_TAU",
    "SLOPE",
    "SPARSITY",
    "TPP",
    "WEIGHT",
    "ZERO_THRESHOLD",
    "Quantity",
    "shown",
]


@dataclass(frozen=True)
class Quantity:
    """A number the user can give or read, with its interval and its meaning.

    Attributes
    ----------
    name : str
        Name in Python, in files and (with dashes) on the command line.
    label, symbol, unit, meaning : str
        Words on the screen; `symbol` and `unit` may be empty.
    low, high : float
        Ends of the admitted interval; infinite where there is none.
    low_open, high_open : bool
        Whether the end itself is excluded.
    whole : bool
        Whether only whole numbers are admitted.
    nonzero : bool
        Whether 0 is excluded inside the interval.
    slider : tuple of float
        The stretch (low, high) that a slider explores; fields admit the whole interval.
    scale : str
        How the slider spreads that stretch: 'linear', 'log' or 'cube root'.
    step : float
        One key press on a linear slider.
    """

    name: str
    label: str
    symbol: str
    unit: str
    meaning: str
    low: float
    high: float
    low_open: bool = False
    high_open: bool = False
    whole: bool = False
    nonzero: bool = False
    slider: tuple[float, float] = (0.0, 1.0)
    scale: str = "linear"
    step: float = 0.01

    @property
    def option(self) -> str:
        """Name of the command-line option."""
        return "--" + self.name.replace("_", "-")

    @property
    def rule(self) -> str:
        """The admitted values in words, to follow 'must be'."""
        kind = "a whole number" if self.whole else "a finite number"
        if self.nonzero:
            kind = kind.replace(" number", " nonzero number")
        ends = []
        if math.isfinite(self.low):
            ends.append(f"{'above' if self.low_open else 'at least'} {shown(self.low)}")
        if math.isfinite(self.high):
            ends.append(f"{'below' if self.high_open else 'at most'} {shown(self.high)}")
        return " ".join([kind, " and ".join(ends)]).strip()

    def admits(self, values: npt.NDArray[np.float64]) -> npt.NDArray[np.bool_]:
        """Whether each of `values` (finite or not) obeys the rule."""
        above = values > self.low if self.low_open else values >= self.low
        below = values < self.high if self.high_open else values <= self.high
        admitted = above & below & np.isfinite(values)
        if self.whole:
            admitted &= values == np.floor(values)
        if self.nonzero:
            admitted &= values != 0.0
        return admitted

    def check(self, value: Any, where: str = "") -> float:
        """Return `value` as a float (an int when whole), or say what is wrong with it.

        Raises
        ------
        ValueError
            Names the quantity (or `where` it stood), the rule and the value received.
        """
        number = isinstance(value, int | float | np.integer | np.floating)
        if number and not isinstance(value, bool | np.bool_):
            try:
                as_float = float(value)
            except OverflowError:  # a Python int beyond every float
                as_float = math.inf
            if self.admits(np.asarray(as_float)):
                return int(as_float) if self.whole else as_float
        raise ValueError(f"{where or self.name} must be {self.rule}, not {shown(value)}")

    def schema(self) -> dict[str, Any]:
        """JSON Schema (draft 2020-12) of one value."""
        schema: dict[str, Any] = {
            "type": "integer" if self.whole else "number",
            "description": f"{self.meaning} ({self.unit})" if self.unit else self.meaning,
        }
        if math.isfinite(self.low):
            schema["exclusiveMinimum" if self.low_open else "minimum"] = _plain(self.low)
        if math.isfinite(self.high):
            schema["exclusiveMaximum" if self.high_open else "maximum"] = _plain(self.high)
        if self.nonzero:
            schema["not"] = {"const": 0}
        return schema


def shown(value: Any) -> str:
    """Return `value` as an error message shows it: short, and on one line."""
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, int) and abs(value) >= 10**60:
        return "a number of more than 60 digits"
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        value = int(value)
    text = re.sub(r"\n *", " ", repr(value))  # arrays come on several lines
    return text if len(text) <= 60 else text[:57] + "..."


def _plain(end: float) -> float | int:
    return int(end) if float(end).is_integer() else end


_MOST = 1e9  # counts beyond this are typing errors

RUNS = Quantity(
    "runs", "Runs", "n", "count",
    "Experimental runs, the rows of the design",
    1, _MOST, whole=True, slider=(10, 20_000), scale="log",
)  # fmt: skip
CANDIDATES = Quantity(
    "candidates", "Candidates", "p", "count",
    "Candidate predictors, the columns of the design",
    1, _MOST, whole=True, slider=(100, 20_000), scale="log",
)  # fmt: skip
ACTIVES = Quantity(
    "actives", "Actives", "k", "count",
    "Candidates believed to have an effect; fewer than the candidates",
    1, _MOST, whole=True, slider=(1, 10_000), scale="cube root",
)  # fmt: skip
SAMPLING_RATIO = Quantity(
    "sampling_ratio", "Sampling ratio", "δ", "runs per candidate",
    "Runs divided by candidates",
    0.0, math.inf, low_open=True, slider=(0.01, 20.0), scale="log",
)  # fmt: skip
SPARSITY = Quantity(
    "sparsity", "Sparsity", "ε", "actives per candidate",
    "Actives divided by candidates",
    0.0, 1.0, low_open=True, high_open=True, slider=(0.0005, 0.98), scale="cube root",
)  # fmt: skip
TPP = Quantity(
    "tpp", "TPP", "", "share of the actives",
    "True positive proportion (power): the share of the actives that is found",
    0.0, 1.0, low_open=True, slider=(0.01, 1.0),
)  # fmt: skip
FDP = Quantity(
    "fdp", "FDP", "", "share of the list",
    "False discovery proportion: the false share of the list",
    0.0, 1.0, low_open=True, high_open=True, slider=(0.01, 0.99),
)  # fmt: skip
NOISE_SD = Quantity(
    "noise_sd", "Noise SD", "σ", "unit of the response",
    "Standard deviation of the noise in one run",
    0.0, math.inf, low_open=True, slider=(0.1, 10.0), scale="log",
)  # fmt: skip
EFFECT_SIZE = Quantity(
    "size", "Effect size", "b", "unit of the response per column SD",
    "Coefficient of one active per standard deviation of its column; the sign does not matter",
    -math.inf, math.inf, nonzero=True, slider=(0.01, 2.0), scale="log",
)  # fmt: skip
EFFECT_SCALE = Quantity(
    "scale", "Effect scale", "s", "unit of the response per column SD",
    "Scale of a spread of effects: SD of a normal law, mean size of an exponential one",
    0.0, math.inf, low_open=True, slider=(0.01, 2.0), scale="log",
)  # fmt: skip
SHARE = Quantity(
    "share", "Share", "w", "share of the actives",
    "Share of the actives that has this effect; the shares sum to 1",
    0.0, 1.0, low_open=True, slider=(0.01, 1.0),
)  # fmt: skip
ZERO_THRESHOLD = Quantity(
    "zero_threshold", "Zero threshold", "α", "tau",
    "Estimates before shrinkage that are smaller than this are set to 0",
    0.0, math.inf,
)  # fmt: skip
CALIBRATION = Quantity(
    "calibration", "Calibration", "", "share",
    "1 - E eta' / sampling ratio: what the weights are of tau times the normalised weights",
    0.0, 1.0,
)  # fmt: skip
WEIGHT = Quantity(
    "weight", "Normalised weight", "", "tau",
    "Weight of a rank before calibration",
    0.0, math.inf,
)  # fmt: skip
SIZE_IN_TAU = Quantity(
    "size", "Size", "", "tau",
    "Effect of an active in units of tau, the effective noise of the fit",
    0.0, math.inf, low_open=True,
)  # fmt: skip
RISK = Quantity(
    "risk", "Risk", "", "tau squared",
    "Mean squared error per candidate",
    0.0, math.inf,
)  # fmt: skip
SLOPE = Quantity(
    "slope", "Slope", "E η'", "per candidate",
    "Limit of the number of distinct nonzero sizes in the fit, per candidate",
    0.0, 1.0,
)  # fmt: skip
LAMBDA = Quantity(
    "lambda", "Strength", "λ", "unit of the response",
    "Largest weight of the penalty, on columns of length one",
    0.0, math.inf, low_open=True, slider=(0.1, 100.0), scale="log",
)  # fmt: skip
CUT = Quantity(
    "cut", "Cut", "c", "tau",
    "Debiased estimates that are larger than this are selected",
    0.0, math.inf, slider=(0.0, 6.0),
)  # fmt: skip
LEVEL = Quantity(
    "level", "Level", "", "tau",
    "One of two weights; their ratio counts, the strength scales both",
    0.0, math.inf, slider=(0.0, 6.0),
)  # fmt: skip
RANK_SHARE = Quantity(
    "share", "Share of the ranks", "", "share of the candidates",
    "Two levels: the share of the ranks that has the larger one",
    0.0, 1.0, low_open=True, slider=(0.01, 1.0),
)  # fmt: skip
RAMP_LEVEL = Quantity(
    "ramp_level", "Ramp level", "q", "",
    "Level of the Benjamini-Hochberg critical values that the weights follow",
    0.0, 1.0, low_open=True, high_open=True, slider=(0.01, 0.99),
)  # fmt: skip
CRITICAL_SPARSITY = Quantity(
    "critical_sparsity", "Critical sparsity", "ε*", "actives per candidate",
    "Sparsity of the phase transition; 1 where the sampling ratio is at least 1",
    0.0, 1.0, low_open=True,
)  # fmt: skip
POWER_LIMIT = Quantity(
    "power_limit", "Power limit", "u*", "share of the actives",
    "TPP that the lasso cannot pass; 1 where there is no such limit",
    0.0, 1.0, low_open=True,
)  # fmt: skip

QUANTITIES = {
    quantity.name: quantity
    for quantity in (
        RUNS, CANDIDATES, ACTIVES, SAMPLING_RATIO, SPARSITY, TPP, FDP,
        NOISE_SD, EFFECT_SIZE, EFFECT_SCALE, SHARE,
    )
}  # fmt: skip
