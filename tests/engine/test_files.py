"""Strict JSON in, one form of JSON out."""

import json
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.files import check_keys, check_list, check_text, dump, parse


def test_a_byte_order_mark_is_tolerated():
    assert parse(b'\xef\xbb\xbf{"a": 1}', 100) == {"a": 1}
    assert parse('\ufeff{"a": 1}', 100) == {"a": 1}


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
        (b'{"a": Infinity}', "^numbers must be finite, not Infinity$"),
        (b"", "^file must be JSON: Expecting value at line 1, column 1$"),
        (b'{\n "a": 1,\n}', "^file must be JSON: .* at line [23], column [0-9]+$"),
        (b'{"a": 1} {}', "^file must be JSON: Extra data at line 1, column 10$"),
        (b"{'a': 1}", "must be JSON: Expecting property name"),
        (b'{"a": 01}', "must be JSON: "),
        (b"\xef\xbb\xbf\xef\xbb\xbf{}", "must be JSON: "),
        ('{"a": 1}'.encode("utf-16"), r"must be UTF-8, not other bytes \(at byte 0\)"),
        ('{"a": "é"}'.encode("latin-1"), r"must be UTF-8, not other bytes \(at byte 7\)"),
        ('{"a": "\ud800"}', r"must be UTF-8, not other bytes \(at byte 7\)"),
        (b"null", "must be a JSON object, not None"),
        (b"600.0", "must be a JSON object, not 600"),
        (b'"text"', "must be a JSON object, not 'text'"),
    ],
)
def test_what_is_refused(content, message):
    with pytest.raises(ValueError, match=message):
        parse(content, 100)


def test_sizes_are_bytes_and_the_message_tells_them_apart():
    text = '{"a": "é"}'  # 10 characters, 11 bytes
    assert parse(text, 11) == {"a": "é"}
    with pytest.raises(ValueError, match="^file must be at most 10 bytes, not 11 bytes$"):
        parse(text, 10)
    message = "^study file must be at most 1 MB, not 1.000001 MB$"
    with pytest.raises(ValueError, match=message):
        parse(b" " * 1_000_001, 1_000_000, "study file")


def nested(depth, inside="1"):
    return '{"a": ' * depth + inside + "}" * depth


@pytest.mark.parametrize("inside", ["1", "[]", "[[]]"])
def test_depth_counts_objects_and_lists(inside):
    most = 20 - inside.count("[")
    assert parse(nested(most, inside), 1000)
    with pytest.raises(ValueError, match="^file must be nested at most 20 deep$"):
        parse(nested(most + 1, inside), 1000)


def test_numbers_too_long_for_any_use_are_refused_in_a_sentence():
    assert parse('{"a": ' + "9" * 500 + "}", 10_000) == {"a": 10**500 - 1}
    for count in (501, 5000):
        message = f"^numbers must have at most 500 digits, not {count}$"
        with pytest.raises(ValueError, match=message):
            parse('{"a": ' + "9" * count + "}", 10_000)


def test_a_float_beyond_every_float_is_left_to_the_check_of_its_field():
    assert parse('{"a": 1e400}', 100) == {"a": float("inf")}


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
    with pytest.raises(ValueError, match=r"^file must be an object, not \[\]$"):
        check_keys([], "", ())
    with pytest.raises(ValueError, match=r"^a\.b\\nc must be a known key; known are runs$"):
        check_keys({"b\nc": 1}, "a", ("runs",))
    both = {"runs": 1, "title": ""}
    assert check_keys(both, "", ("runs",), ("title",)) is both


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
    with pytest.raises(ValueError, match="^x must have 1 to 2 entries, not 0$"):
        check_list([], "x", 1, 2)
    assert check_text("abcde", "name", 5) == "abcde"
    assert check_list([1, 2], "x", 1, 2) == [1, 2]


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


def test_dump_keeps_short_lists_on_a_line_and_one_key_a_line():
    data = {"a": {"b": [1, 2], "c": [{"d": "é"}]}, "e": {}}
    assert dump(data).splitlines() == [
        "{",
        '  "a": {',
        '    "b": [1, 2],',
        '    "c": [',
        "      {",
        '        "d": "é"',
        "      }",
        "    ]",
        "  },",
        '  "e": {}',
        "}",
    ]


@pytest.mark.parametrize("value", [float("nan"), float("inf")])
def test_dump_writes_no_number_that_parse_would_refuse(value):
    with pytest.raises(ValueError, match="not JSON compliant"):
        dump({"a": [value]})


characters = st.characters(exclude_categories=["Cs"])
texts = st.text(characters, max_size=8)
json_values = st.recursive(
    st.none()
    | st.booleans()
    | st.integers(-(10**40), 10**40)
    | st.floats(allow_nan=False, allow_infinity=False)
    | texts,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(texts, inner, max_size=3),
    max_leaves=12,
)


@settings(max_examples=200, deadline=None)
@given(st.dictionaries(texts, json_values, max_size=4))
def test_what_dump_writes_parse_reads_and_dump_writes_again(data):
    text = dump(data)
    assert repr(parse(text, 10**6)) == repr(data)  # repr tells 1 from 1.0 and -0.0 from 0.0
    assert dump(parse(text.encode(), 10**6)) == text
    json.loads(text)


@settings(max_examples=200, deadline=None)
@given(st.binary(max_size=60) | st.text(max_size=60))
def test_any_content_is_an_object_or_refused_in_one_line(content):
    refusal = ""
    try:
        assert isinstance(parse(content, 50), dict)
    except ValueError as error:
        refusal = str(error)
    assert re.fullmatch(r"|[^\n]* must (be|have) [^\n]*", refusal)
