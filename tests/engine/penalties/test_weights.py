"""The user's own weights: what is read, what is refused."""

import numpy as np
import pytest

from engine.penalties.weights import Weights, check_weights, load_weights


@pytest.mark.parametrize(
    "content", [b"3,2,1", "3\n2\n1\n", "[3, 2, 1]", b"\xef\xbb\xbf3\r\n2\r\n1", " [3,\n2, 1.0]"]
)
def test_lists_are_read(content):
    assert load_weights(content) == (3.0, 2.0, 1.0)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", "weights must have 1 to"),
        ("1,2", "weights[1] must be at most the entry before, not 2"),
        ("2,x", "weights[1] must be a finite number at least 0, not 'x'"),
        ("2,-1", "weights[1] must be"),
        ("[2, true]", "weights[1] must be"),
        ("0,0", "weights[0] must be a finite number above 0"),
        ("[1, 2", "weights must be a JSON list of numbers"),
        (b"\xff\xfe", "weights must be UTF-8"),
        ("nan", "weights[0] must be"),
        ("1_0", "weights[0] must be"),
    ],
)
def test_what_is_wrong_is_named(content, words):
    with pytest.raises(ValueError) as error:  # noqa: PT011
        load_weights(content)
    assert words in str(error.value)


def test_arrays_and_tuples_are_lists_too():
    assert check_weights(np.array([2.0, 1.0])) == check_weights((2, 1)) == (2.0, 1.0)


def test_any_length_is_resampled_by_rank():
    few, many = Weights((3.0, 1.0)), Weights(tuple(np.repeat([3.0, 1.0], 500)))
    at = np.array([0.1, 0.25, 0.75, 0.9])
    assert few._at(at).tolist() == many._at(at).tolist() == [3.0, 3.0, 1.0, 1.0]
