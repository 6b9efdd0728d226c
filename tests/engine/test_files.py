"""Strict JSON in, one form of JSON out."""

import json

import pytest

from engine.files import check_keys, check_list, check_text, dump, parse


def test_a_byte_order_mark_is_tolerated():
    assert parse(b'\xef\xbb\xbf{"a": 1}', 100) == {"a": 1}


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"x" * 101, "file must be at most 100 bytes, not 101 bytes"),
        (b"\xff\xfe{}", r"must be UTF-8, not other bytes \(at byte 0\)"),
        (b'{"a": ', "must be JSON: Expecting value at line 1, column 7"),
        (b"[1]", r"must be a JSON object, not \[1\]"),
        (b'{"a": 1, "a": 2}', "'a' must be given once, not twice"),
        (b'{"b": {"a": 1, "a": 2}}', "'a' must be given once"),
        (b'{"a": NaN}', "numbers must be finite, not NaN"),
        (b'{"a": -Infinity}', "numbers must be finite, not -Infinity"),
        (b'{"a":' + b"[" * 30 + b"]" * 30 + b"}", "must be nested at most 20 deep"),
        (b'{"a": "\x01"}', "must be JSON: Invalid control character"),
    ],
)
def test_what_is_refused(content, message):
    with pytest.raises(ValueError, match=message):
        parse(content, 100)


def test_depths_that_stop_the_parser_are_refused_in_a_sentence():
    with pytest.raises(ValueError, match="must be nested at most 20 deep"):
        parse(b'{"a":' + b"[" * 100_000, 1_000_000)


def test_unknown_misspelt_and_missing_keys_are_named():
    with pytest.raises(ValueError, match=r"^a\.rusn must be a known key; did you mean runs\?$"):
        check_keys({"rusn": 1}, "a", ("runs",))
    with pytest.raises(ValueError, match=r"^zzz must be a known key; known are runs, title$"):
        check_keys({"zzz": 1}, "", ("runs",), ("title",))
    with pytest.raises(ValueError, match="^a.runs must be given$"):
        check_keys({}, "a", ("runs",))
    with pytest.raises(ValueError, match="^a must be an object, not 3$"):
        check_keys(3, "a", ())


def test_texts_and_lists():
    with pytest.raises(ValueError, match="^name must be a text, not 3$"):
        check_text(3, "name", 5)
    with pytest.raises(ValueError, match="^name must be at most 5 characters, not 6$"):
        check_text("abcdef", "name", 5)
    with pytest.raises(ValueError, match="whole characters"):
        check_text("\ud800", "name", 5)
    with pytest.raises(ValueError, match="^x must be a list, not 'a'$"):
        check_list("a", "x", 0, 1)
    with pytest.raises(ValueError, match="^x must have 1 to 2 entries, not 3$"):
        check_list([1, 2, 3], "x", 1, 2)


def test_dump_is_read_back_and_always_in_the_same_form():
    data = {
        "a": [],
        "b": {"c": [[1.5, 2], [0.1, 3]], "é": "\u2028 </script>"},
        "d": [{"x": None}],
    }
    text = dump(data)
    assert json.loads(text) == data
    assert dump(json.loads(text)) == text
    assert "[[1.5, 2], [0.1, 3]]" in text
