"""Strict JSON: what a file must be before anyone asks what it says.

Every refusal is a ValueError of one line that names the place, the rule and what was found.
"""

import difflib
import json
from collections.abc import Iterable
from typing import Any

from engine.quantities import shown

__all__ = [
    "SHORTLIST_BYTES",
    "STUDY_BYTES",
    "check_keys",
    "check_list",
    "check_text",
    "dump",
    "parse",
]

STUDY_BYTES = 1_000_000
SHORTLIST_BYTES = 15_000_000

# Deeper than any of our files; far from the depth at which the parser itself gives up.
_DEPTH = 20

# More than any float has; far from the number at which Python itself gives up.
_DIGITS = 500


def parse(content: bytes | str, limit: int, what: str = "file") -> dict[str, Any]:
    """Return the JSON object in `content`.

    Parameters
    ----------
    content : bytes or str
        UTF-8, with or without a byte order mark.
    limit : int
        Largest size in bytes.
    what : str
        What the messages call the file.

    Raises
    ------
    ValueError
        If it is too large, not UTF-8, not JSON, not an object, too deep, holds a key twice or
        a number that is not finite or has too many digits.

    Examples
    --------
    >>> from engine.files import parse
    >>> parse('{"runs": 600}', 100)
    {'runs': 600}
    """
    raw = content.encode("utf-8", "surrogatepass") if isinstance(content, str) else content
    if len(raw) > limit:
        raise ValueError(f"{what} must be at most {_size(limit)}, not {_size(len(raw))}")
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise ValueError(
            f"{what} must be UTF-8, not other bytes (at byte {error.start})"
        ) from None
    try:
        data = json.loads(
            text, object_pairs_hook=_once, parse_constant=_not_finite, parse_int=_whole
        )
    except json.JSONDecodeError as error:
        place = f"line {error.lineno}, column {error.colno}"
        raise ValueError(f"{what} must be JSON: {error.msg} at {place}") from None
    except RecursionError:
        raise ValueError(f"{what} must be nested at most {_DEPTH} deep") from None
    if not isinstance(data, dict):
        raise ValueError(f"{what} must be a JSON object, not {shown(data)}")
    _check_depth(data, what)
    return data


def dump(data: dict[str, Any]) -> str:
    """Return `data` as JSON text, always in the same form.

    Objects and lists of numbers stay readable: one key a line, short lists on one line.
    """
    return _block(data, 0) + "\n"


def check_keys(
    data: Any, where: str, required: Iterable[str], optional: Iterable[str] = ()
) -> dict[str, Any]:
    """Return `data` when it is an object with these keys and no others."""
    if not isinstance(data, dict):
        raise ValueError(f"{where or 'file'} must be an object, not {shown(data)}")
    required = list(required)
    known = [*required, *optional]
    for key in data:
        if key not in known:
            near = difflib.get_close_matches(key, known, 1)
            hint = f"; did you mean {near[0]}?" if near else f"; known are {', '.join(known)}"
            raise ValueError(f"{_join(where, key)} must be a known key{hint}")
    for key in required:
        if key not in data:
            raise ValueError(f"{_join(where, key)} must be given")
    return data


def check_text(value: Any, where: str, most: int) -> str:
    """Return `value` when it is a text of at most `most` characters."""
    if not isinstance(value, str):
        raise ValueError(f"{where} must be a text, not {shown(value)}")
    if len(value) > most:
        raise ValueError(f"{where} must be at most {most} characters, not {len(value)}")
    try:
        value.encode("utf-8")
    except UnicodeEncodeError:
        raise ValueError(
            f"{where} must be a text of whole characters, not {shown(value)}"
        ) from None
    return value


def check_list(value: Any, where: str, least: int, most: int) -> list[Any]:
    """Return `value` when it is a list with `least` to `most` entries."""
    if not isinstance(value, list):
        raise ValueError(f"{where} must be a list, not {shown(value)}")
    if not least <= len(value) <= most:
        raise ValueError(f"{where} must have {least} to {most} entries, not {len(value)}")
    return value


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    data: dict[str, Any] = {}
    for key, value in pairs:
        if key in data:
            raise ValueError(f"{shown(key)} must be given once, not twice in one object")
        data[key] = value
    return data


def _not_finite(word: str) -> None:
    raise ValueError(f"numbers must be finite, not {word}")


def _whole(digits: str) -> int:
    if len(digits) > _DIGITS:
        raise ValueError(f"numbers must have at most {_DIGITS} digits, not {len(digits)}")
    return int(digits)


def _check_depth(data: Any, what: str) -> None:
    level: list[Any] = [data]
    for _ in range(_DEPTH):
        level = [child for node in level for child in _children(node)]
        if not level:
            return
    raise ValueError(f"{what} must be nested at most {_DEPTH} deep")


def _children(node: Any) -> list[Any]:
    values = node.values() if isinstance(node, dict) else node
    return [value for value in values if isinstance(value, dict | list)]


def _join(where: str, key: str) -> str:
    key = shown(key)[1:-1]
    return f"{where}.{key}" if where else key


def _size(count: int) -> str:
    return f"{count / 1e6:.9g} MB" if count >= 1e5 else f"{count} bytes"


def _block(value: Any, depth: int) -> str:
    flat = json.dumps(value, ensure_ascii=False, allow_nan=False)
    plain = isinstance(value, list) and not any(isinstance(v, dict) for v in value)
    if not isinstance(value, dict | list) or not value or (plain and depth):
        return flat
    indent = "  " * (depth + 1)
    if isinstance(value, dict):
        parts = [
            f"{indent}{json.dumps(key, ensure_ascii=False)}: {_block(child, depth + 1)}"
            for key, child in value.items()
        ]
        opening, closing = "{", "}"
    else:
        parts = [f"{indent}{_block(child, depth + 1)}" for child in value]
        opening, closing = "[", "]"
    return opening + "\n" + ",\n".join(parts) + "\n" + "  " * depth + closing
