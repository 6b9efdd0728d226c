"""The demo study and the shortlist kept on it: a scenario of our own, with invented numbers.

`python -m engine.demo FOLDER` writes both files to a folder.
"""

import sys
from pathlib import Path

from engine.shortlist import Point, dump_shortlist, keep
from engine.study import Effect, Study, Target

__all__ = ["DEMO_STUDY", "demo_points", "write_demo"]

DEMO_STUDY = Study(
    title="Adhesive blends, second screen",
    runs=600,
    candidates=2000,
    actives=400,
    noise_sd=1.0,
    effects=(Effect(0.16, 0.6), Effect(0.32, 0.4)),
    target=Target(tpp=0.8, fdp=0.75),
)


def demo_points() -> tuple[Point, ...]:
    """Return the operating points of the demo shortlist."""
    return (
        keep(DEMO_STUDY, "lasso", 0.40, "First lasso"),
        keep(DEMO_STUDY, "two-level", 0.66, "Wider net"),
        keep(DEMO_STUDY, "sorted-l1", 0.66, "Same, tighter"),
    )


def write_demo(folder: Path) -> None:
    """Write both files to `folder`."""
    (folder / "demo-study.json").write_text(DEMO_STUDY.dumps(), encoding="utf-8")
    (folder / "demo-shortlist.json").write_text(dump_shortlist(demo_points()), encoding="utf-8")


if __name__ == "__main__":
    write_demo(Path(sys.argv[1]))
