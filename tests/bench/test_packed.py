"""Packed columns give back what was packed, to the bit."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.bench.packed import Block, Packed, append, extent_of, pack, pack_whole, whole_run
from acceptance.bench.packed_frame import PackedArray


def bits(values):
    return np.asarray(values, dtype=np.float64).view(np.uint64).tolist()


def unpacked(block):
    return Packed([block]).part(0, block.size)


@given(
    st.lists(st.integers(-(2**40), 2**40), min_size=1, max_size=60),
    st.integers(0, 12),
    st.integers(0, 9),
    st.lists(st.integers(0, 59), max_size=5),
)
def test_pack_gives_decimal_readings_back_to_the_bit(numbers, digits, expected_digits, holes):
    """Whatever number of digits was expected, and with readings missing."""
    values = np.array([float(f"{n}e-{digits}") for n in numbers])
    values[[h for h in holes if h < values.size]] = np.nan

    assert bits(unpacked(pack(values, expected_digits))) == bits(values)


@given(st.lists(st.floats(width=64), min_size=1, max_size=40), st.integers(0, 4), st.booleans())
def test_pack_gives_any_float_back_to_the_bit(values, digits, look_for_run):
    """Infinities, minus zero, subnormals and all; a NaN is a NaN."""
    values = np.array(values)

    back = unpacked(pack(values, digits, look_for_run=look_for_run))

    known = ~np.isnan(values)
    assert np.isnan(back[~known]).all()
    assert bits(back[known]) == bits(values[known])


@pytest.mark.parametrize(
    ("values", "most_bytes_each"),
    [
        pytest.param((np.arange(1000) % 200 + 1200) / 100, 1, id="a quiet voltage"),
        pytest.param(np.arange(1000) * 7 % 1000 / 1000, 2, id="three digits"),
        pytest.param(np.full(1000, 230.1), 0, id="constant"),
        pytest.param(np.arange(1000) * 977 % 99991 / 1e4, 4, id="more than 16 bits"),
    ],
)
def test_pack_takes_no_more_bytes_than_the_digits_need(values, most_bytes_each):
    block = pack(values, 2)

    assert Packed([block]).nbytes <= most_bytes_each * values.size


def test_pack_keeps_evenly_spaced_times_as_a_run():
    values = (np.arange(5000) + 30) / 10

    block = pack(values, 1, look_for_run=True)

    assert block.codes is None
    assert bits(unpacked(block)) == bits(values)


@given(st.lists(st.integers(-(10**15), 10**15), min_size=1, max_size=40), st.sampled_from([1, 1000, 10**6]))
def test_pack_whole_gives_the_quotients(numbers, divisor):
    block = pack_whole(np.array(numbers, dtype=np.int64), divisor)

    assert bits(unpacked(block)) == bits([number / divisor for number in numbers])


def blocks_of(values, cuts):
    edges = [0, *sorted(cuts), len(values)]
    return [pack(values[a:b], 2) for a, b in zip(edges, edges[1:], strict=False) if b > a]


@given(st.data())
def test_packed_is_like_an_array_whatever_its_blocks(data):
    """Slices, single rows, steps, missing rows, extent."""
    values = np.array(
        data.draw(st.lists(st.sampled_from([0.0, 1.25, -3.5, np.nan, 1 / 3, 700.0]), min_size=1, max_size=40))
    )
    packed = Packed(blocks_of(values, data.draw(st.lists(st.integers(0, len(values)), max_size=4))))
    first, stop = (data.draw(st.integers(0, len(values))) for _ in range(2))
    step = data.draw(st.integers(1, 9))

    assert len(packed) == values.size
    np.testing.assert_array_equal(np.asarray(packed), values)
    np.testing.assert_array_equal(packed[first:stop], values[first:stop])
    np.testing.assert_array_equal(packed[first:stop:step], values[first:stop:step])
    np.testing.assert_array_equal([packed[row] for row in range(-values.size, values.size)], [*values, *values])
    np.testing.assert_array_equal(packed.missing(), np.flatnonzero(np.isnan(values)))
    np.testing.assert_array_equal(packed.converted(0.001, 2.0)[:], values * 0.001 + 2.0)
    assert extent_of(packed) == extent_of(values)


@given(st.lists(st.integers(1, 9), max_size=60), st.sampled_from([1, 7, 300, 70_000]), st.integers(0, 2))
def test_append_gives_the_same_column_in_fewer_blocks(sizes, spread, oddity):
    """Of few bytes each, of many, of runs, and with readings missing or no decimal numbers among them."""
    blocks, parts = [], []
    for number, size in enumerate(sizes):
        values = (np.arange(size) * spread % 1000 + number * spread) / 100
        if oddity and number % 7 == 3:
            values[0] = np.nan if oddity == 1 else 1 / 3
        append(blocks, pack(values, 2, look_for_run=True))
        parts.append(values)

    whole = np.concatenate([[], *parts])
    packed = Packed(blocks)

    assert bits(np.asarray(packed)[~np.isnan(whole)]) == bits(whole[~np.isnan(whole)])
    assert packed.missing().tolist() == np.flatnonzero(np.isnan(whole)).tolist()
    assert len(blocks) <= len(sizes)


def test_append_merges_small_blocks():
    blocks = []
    for number in range(120):
        append(blocks, pack((np.arange(50) * 7 % 13 + number) / 100, 2))

    assert len(blocks) == 10


@pytest.mark.parametrize(
    ("parts", "is_even"),
    [
        pytest.param([np.arange(10), np.arange(10, 15)], True, id="goes on"),
        pytest.param([np.arange(10), np.arange(11, 15)], False, id="a gap between blocks"),
        pytest.param([np.arange(10), np.arange(5, 12)], False, id="back"),
        pytest.param([np.arange(10), np.arange(10, 30, 2)], False, id="another step"),
        pytest.param([np.zeros(10), np.zeros(10)], False, id="stands still"),
        pytest.param([np.array([0.0, 1, 1, 2])], False, id="repeated"),
        pytest.param([np.arange(10), np.array([10.0, 12, 13])], False, id="a gap within a later block"),
    ],
)
def test_is_rising_evenly_tells_gaps_between_blocks(parts, is_even):
    packed = Packed([pack(part.astype(float), 0, look_for_run=True) for part in parts])

    assert packed.is_rising_evenly(0, len(packed)) is is_even


def test_packed_array_is_a_column_of_a_table():
    """What the rest of the program asks of a column."""
    values = np.array([1.5, np.nan, 3.25, 4.0])
    table = pd.DataFrame({"v": PackedArray(Packed([pack(values, 2)])), "line": PackedArray(whole_run(7, 4))})

    assert table["v"].dtype.kind == "f"
    np.testing.assert_array_equal(table["v"].to_numpy(np.float64), values)
    np.testing.assert_array_equal(table["v"].to_numpy(), values)
    assert table["v"].isna().tolist() == [False, True, False, False]
    assert table["line"].tolist() == [7, 8, 9, 10]
    assert table["line"].dtype.kind == "i"
    np.testing.assert_array_equal(table[1:3]["v"].to_numpy(), values[1:3])
    np.testing.assert_array_equal(table.iloc[[3, 0]]["v"].to_numpy(), values[[3, 0]])
    np.testing.assert_array_equal(pd.concat([table, table])["v"].to_numpy(), [*values, *values])


def test_packed_array_takes_plain_values_without_a_copy():
    values = np.arange(4.0)

    assert Packed.of(values).blocks == (Block(4, values, has_holes=True),)
