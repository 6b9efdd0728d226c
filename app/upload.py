"""Files that the browser reads and hands over."""

import base64
from typing import Any

__all__ = ["uploaded"]


def uploaded(upload: dict[str, Any], limit: int, what: str) -> bytes:
    """Return the bytes of an upload; one that the browser found too large comes without them.

    Raises
    ------
    ValueError
        If it is larger than `limit`.
    """
    if upload["size"] > limit:
        most, size = f"{limit / 1e6:.0f} MB", f"{upload['size'] / 1e6:.9g} MB"
        raise ValueError(f"{what} must be at most {most}, not {size}")
    return base64.b64decode(upload["content"])
