"""The step that a channel was written in, as the file's digits tell it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.bench.digits import coarser_step, logged_step, written_decimals


@pytest.mark.parametrize(("cells", "decimals"), [
    (["12.05", "12"], 2), (["12", "230"], 0), (["2.000"], 3), (["1.2e-3", "4"], 4), (["12,5"], 1), (["1e3"], -3),
    (["24.01 V", "24.0 V"], 2), (["-0.5"], 1), (['"3.25'], 2), ([""], None), (["OL", "n/a"], None), ([], None),
    (["9.9E37", "1e999", "12.5"], 1), (["1e-400"], None),
])  # fmt: skip
def test_written_decimals(cells, decimals):
    assert written_decimals(cells) == decimals


@given(st.integers(-2, 6), st.sampled_from([1.0, 1e-3]), st.integers(0, 2**32 - 1))
def test_logged_step_is_that_of_the_rounding(decimals, factor, seed):
    """Forty noisy values rounded to so many decimals: that step, or a finer one never, a coarser one never."""
    values = np.unique(
        np.round(np.random.default_rng(seed).normal(50 * 10.0**-decimals, 30 * 10.0**-decimals, 400), decimals)
    )

    step = logged_step(values * factor, factor)
    # some value of forty or more ends in something else than 0
    assert step == pytest.approx(factor * 10.0**-decimals)


def test_logged_step_of_few_values_tells_nothing():
    assert logged_step(np.array([1.0, 2.0, 4.0]), 1.0) == 0.0


@pytest.mark.parametrize(("heading", "cells", "step"), [
    ("Vout (V)", ["12.05", "11.9"], 0.01),
    ("Vout (mV)", ["12050", "11900"], 1e-3),
    ("Vout", ["12.0 V", "11.95 V"], 0.01),
])  # fmt: skip
@pytest.mark.parametrize("rows", [1, 200])
def test_a_channel_knows_its_last_digit(read_text_log, heading, cells, step, rows):
    """By the quick way and by the careful one."""
    log = read_text_log(f"Iout (A);{heading}\n" + "".join(f"2.5;{cell}\n" for cell in cells * rows))

    (channel,) = [channel for channel in log.channels if channel.quantity == "output_voltage"]
    assert channel.step == pytest.approx(step)


@pytest.mark.parametrize(("values", "decimals", "step"), [
    ([12.1, 12.0, 12.1], 4, 0.1),  # twice three digits that say nothing
    ([12.1, 12.05, 12.1], 2, 0.0),
    ([12.1, 12.2], 2, 0.0),  # two zeros: chance
    ([66.0, 65.0, 34.0, 0.0], 3, 1.0),
    ([0.0, 0.0], 3, 0.0),  # zeros lie on every step
])  # fmt: skip
def test_coarser_step(values, decimals, step):
    assert coarser_step(np.array(values), 1.0, decimals) == pytest.approx(step)


def test_a_load_that_reads_whole_amperes_was_set_so(read_text_log):
    log = read_text_log("Iout (A);Vout (V)\n" + "".join(f"{i}.000;12.{i}000\n" for i in (1, 2, 4) * 40))
    steps = {channel.quantity: channel.step for channel in log.channels}

    assert steps["output_current"] == pytest.approx(1e-3)
    assert steps["output_voltage"] == pytest.approx(0.1)
