"""`python -m tests.bench` prints the table of ratios."""

import sys

from tests.bench.engine_ratios import Ratio, engine_ratios
from tests.bench.fit_ratios import fit_ratios
from tests.bench.latency import latency_ratios


def line(ratio: Ratio) -> str:
    bound = f"{'>=' if ratio.at_least else '<='} {ratio.bound:g}"
    mark = "" if ratio.kept else "NOT KEPT"
    return f"{ratio.what:32} {ratio.value:10.3g} x {ratio.yardstick:30} {bound:10} {mark}"


def main() -> int:
    ratios = [*engine_ratios(), *fit_ratios(), *latency_ratios()]
    print("\n".join(map(line, ratios)))
    return 0 if all(ratio.kept for ratio in ratios) else 1


if __name__ == "__main__":
    sys.exit(main())
