"""Arrays handed to the engine: what is let in, in which shape, and the words of a refusal."""

import math
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from engine.arguments import as_given, check_arrays
from engine.quantities import RUNS, SAMPLING_RATIO, SPARSITY, TPP

RULE = "tpp must be a finite number above 0 and at most 1, not "


class TestShapes:
    def test_a_scalar_is_an_array_of_no_dimensions(self):
        (tpp,) = check_arrays((TPP, 0.5))
        assert (tpp.shape, tpp.dtype, float(tpp)) == ((), np.float64, 0.5)

    def test_all_are_broadcast_to_one_shape(self):
        tpp, ratio, sparsity = check_arrays(
            (TPP, [[0.3], [0.8]]), (SAMPLING_RATIO, (0.3, 0.6, 1.2)), (SPARSITY, 0.2)
        )
        assert tpp.shape == ratio.shape == sparsity.shape == (2, 3)
        assert tpp[:, 1].tolist() == [0.3, 0.8]
        assert ratio[1].tolist() == [0.3, 0.6, 1.2]

    def test_no_values_are_no_error(self):
        tpp, ratio = check_arrays((TPP, []), (SAMPLING_RATIO, 0.3))
        assert tpp.shape == ratio.shape == (0,)

    def test_shapes_that_do_not_fit_are_named(self):
        message = re.escape(
            "arguments must have shapes that broadcast, "
            "not tpp (2,), sampling_ratio (3,), sparsity ()"
        )
        with pytest.raises(ValueError, match=f"^{message}$"):
            check_arrays((TPP, [0.1, 0.2]), (SAMPLING_RATIO, [0.3] * 3), (SPARSITY, 0.2))

    @given(hnp.mutually_broadcastable_shapes(num_shapes=2, max_dims=3, max_side=3))
    def test_shapes_are_those_of_numpy(self, shapes):
        one, other = shapes.input_shapes
        arrays = check_arrays((TPP, np.full(one, 0.5)), (SPARSITY, np.full(other, 0.2)))
        assert [array.shape for array in arrays] == [shapes.result_shape] * 2


class TestKinds:
    @pytest.mark.parametrize(
        "value",
        [1, np.int8(1), np.uint64(1), np.float32(0.5), np.longdouble(0.5), [1, 0.5],
         np.array([0.5], ">f8"), np.array([0.5], "f2")],
        ids=repr,
    )  # fmt: skip
    def test_numbers_of_any_width(self, value):
        (tpp,) = check_arrays((TPP, value))
        assert tpp.dtype == np.float64
        assert tpp.tolist() == np.asarray(value, float).tolist()

    @pytest.mark.parametrize(
        ("value", "seen"),
        [
            ("x", "'x'"),
            ("0.5", "'0.5'"),
            (True, "True"),
            ([True, False], "[True, False]"),
            (None, "None"),
            ([0.5, None], "[0.5, None]"),
            (0.5j, "0.5j"),
            ({0.5}, "{0.5}"),
            (10**400, "a number of more than 60 digits"),
            ([[0.1], [0.1, 0.2]], "[[0.1], [0.1, 0.2]]"),
            (np.array(["a", "b"]), "array(['a', 'b'], dtype='<U1')"),
            (np.array([["a"], ["b"]]), "array([['a'], ['b']], dtype='<U1')"),
        ],
        ids=repr,
    )
    def test_what_is_not_a_number(self, value, seen):
        with pytest.raises(ValueError, match=f"^{re.escape(RULE + seen)}$"):
            check_arrays((TPP, value))


class TestValues:
    @pytest.mark.parametrize(
        ("value", "seen"),
        [
            (0.0, "0"),
            (-0.0, "0"),
            (1.5, "1.5"),
            (math.nan, "nan"),
            (-math.inf, "-inf"),
            (np.longdouble("1e400"), "inf"),
            ([0.5, 1.25, -3.0], "1.25"),
            (np.array([[0.5, 0.1], [math.nan, 7.0]]), "nan"),
        ],
        ids=repr,
    )
    def test_the_first_offending_value_is_shown(self, value, seen):
        with pytest.raises(ValueError, match=f"^{re.escape(RULE + seen)}$"):
            check_arrays((TPP, value))

    def test_the_first_offending_argument_is_named(self):
        with pytest.raises(ValueError, match="^sampling_ratio must be .* above 0, not 0$"):
            check_arrays((TPP, 0.5), (SAMPLING_RATIO, 0), (SPARSITY, 7))
        with pytest.raises(ValueError, match="^sparsity must be .* below 1, not 1$"):
            check_arrays((TPP, 0.5), (SAMPLING_RATIO, 1), (SPARSITY, 1))

    def test_whole_numbers(self):
        assert check_arrays((RUNS, [1, 2.0]))[0].tolist() == [1.0, 2.0]
        with pytest.raises(ValueError, match="^runs must be a whole number .*, not 2.5$"):
            check_arrays((RUNS, [1, 2.5]))

    @settings(max_examples=200)
    @given(st.floats())
    def test_an_array_and_one_value_are_let_in_alike(self, value):
        try:
            expected = TPP.check(value)
        except ValueError as error:
            with pytest.raises(ValueError, match=f"^{re.escape(str(error))}$"):
                check_arrays((TPP, [0.5, value]))
        else:
            assert check_arrays((TPP, [0.5, value]))[0].tolist() == [0.5, expected]

    def test_what_was_given_is_left_as_it_is(self):
        given_values = np.array([1, 1])
        (tpp,) = check_arrays((TPP, given_values))
        assert given_values.dtype == np.array([1]).dtype
        assert not np.shares_memory(tpp, given_values)


def test_scalars_go_out_as_floats_and_arrays_as_arrays():
    assert type(as_given(np.array(0.5))) is float
    array = np.array([0.5])
    assert as_given(array) is array
