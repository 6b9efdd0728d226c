"""What the program finds ready made: the files of assets/, and an atlas of the user's own."""

import os
import sys
from functools import lru_cache
from importlib import resources
from pathlib import Path

import platformdirs

from engine.limits.atlas import Atlas
from engine.limits.atlas_file import VERSION, load_atlas
from engine.limits.contours import Contours, contours_from

__all__ = [
    "asset",
    "own_atlas",
    "own_atlas_file",
    "ready_atlas",
    "ready_contours",
    "set_aside",
]

# The finest grid that the command builds takes some 80 MB.
_ATLAS_BYTES = 200_000_000


def asset(name: str) -> bytes:
    """Return the content of a file in assets/."""
    return resources.files("app.assets").joinpath(name).read_bytes()


@lru_cache(maxsize=1)
def ready_atlas() -> Atlas | None:
    """Return the user's own atlas, or the one that ships.

    Without a sound one the dashboard works, only slower.
    """
    try:
        return own_atlas(own_atlas_file()) or load_atlas(asset("atlas.npz"))
    except (OSError, ValueError) as error:
        print(
            f"sparsereach: no ready atlas, values follow more slowly: {error}", file=sys.stderr
        )
        return None


@lru_cache(maxsize=1)
def ready_contours() -> Contours | None:
    """Return the table that contours are drawn from: about a second, once."""
    atlas = ready_atlas()
    return None if atlas is None else contours_from(atlas)


def own_atlas_file() -> Path:
    """Return where the user's own atlas of this version is kept."""
    return platformdirs.user_cache_path("sparsereach") / f"atlas-{VERSION}.npz"


def own_atlas(file: Path) -> Atlas | None:
    """Return the atlas in a file; None without one, or when it had to be set aside."""
    try:
        if file.stat().st_size > _ATLAS_BYTES:
            raise ValueError(f"atlas must be at most {_ATLAS_BYTES:,} bytes")
        return load_atlas(file.read_bytes())
    except FileNotFoundError:
        return None
    except (OSError, ValueError) as error:
        set_aside(file, error)
        return None


def set_aside(file: Path, reason: Exception) -> None:
    """Rename a file that is not what its name says, with a warning."""
    aside = file.with_name(f"{file.name}.set-aside")
    line = " ".join(str(reason).split())
    try:
        os.replace(file, aside)
        where = f"set aside as {aside.name}"
    except OSError as error:
        where = f"left where it is ({error.strerror})"
    print(f"sparsereach: {file}: not used and {where}: {line}", file=sys.stderr)
