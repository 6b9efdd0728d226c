"""What ships with the program: the files of assets/."""

import sys
from functools import lru_cache
from importlib import resources

from engine.limits.atlas import Atlas, load_atlas
from engine.limits.contours import Contours, contours_from

__all__ = ["asset", "ready_atlas", "ready_contours"]


def asset(name: str) -> bytes:
    """Return the content of a file in assets/."""
    return resources.files("app.assets").joinpath(name).read_bytes()


@lru_cache(maxsize=1)
def ready_atlas() -> Atlas | None:
    """Return the ready atlas; without a sound one the dashboard works, only slower."""
    try:
        return load_atlas(asset("atlas.npz"))
    except (OSError, ValueError) as error:
        print(
            f"sparsereach: no ready atlas, values follow more slowly: {error}", file=sys.stderr
        )
        return None


@lru_cache(maxsize=1)
def ready_contours() -> Contours | None:
    """Return the table that contours are drawn from: about half a second, once."""
    atlas = ready_atlas()
    return None if atlas is None else contours_from(atlas)
