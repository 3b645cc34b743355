"""Health: each fault built into a log is found where it was put, and good logs of many kinds raise no bar."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from acceptance.bench import threads
from acceptance.bench.health import check_health
from acceptance.bench.log import BenchLog, Channel, Doubt
from acceptance.bench.packed import Packed, pack
from acceptance.bench.packed_frame import PackedArray

RATED = {"main": (12.0, 3.0)}
LEVELS = (0.0, 0.3, 0.75, 1.5, 2.25, 3.0)


IS_PACKED = {"columns": False}


@pytest.fixture(autouse=True, params=["plain", "packed"])
def form(request, monkeypatch):
    """Every check must see the same in the packed columns of a very long log, looked at in threads."""
    if request.param == "packed":
        monkeypatch.setitem(IS_PACKED, "columns", True)
        monkeypatch.setattr(threads, "MANY", 0)


def packed(values):
    parts = [np.ascontiguousarray(values[at : at + 97]) for at in range(0, len(values), 97)]
    return PackedArray(Packed([pack(part, 1, look_for_run=True) for part in parts]))


def log_of(columns, *, stage="steady", table=None, assumed=(), stated=None, doubts=()):
    size = len(next(iter(columns.values())))
    frame = pd.DataFrame({key: np.asarray(values, float) for key, values in columns.items()})
    frame["stage"] = pd.Categorical([stage] * size if isinstance(stage, str) else list(stage))
    frame["table"] = np.zeros(size, int) if table is None else table
    frame["line"] = np.arange(2, size + 2)
    if IS_PACKED["columns"]:
        for key in columns:
            frame[key] = packed(frame[key].to_numpy())
    channels = []
    for key in columns:
        quantity, _, qualifier = key.partition(" ")
        origin = "assumed" if key in assumed else "heading"
        channels.append(Channel(key, quantity, qualifier, key, "V", origin, 1.0, 0.0, "", "A.csv"))
    names = tuple(f"table {n}" for n in range(int(frame["table"].max()) + 1))
    return BenchLog("A", frame, tuple(channels), (), names, stated=stated or {}, doubts=tuple(doubts))


def sweep(rows=2400, seed=1, *, current_step=1e-4, noise=2e-3, ac=True, dwell=None):
    """A realistic sweep: levels in turn, noise on everything, each reading rounded to its meter's step."""
    generator = np.random.default_rng(seed)
    dwell = dwell or rows // len(LEVELS)
    setting = np.resize(np.repeat(LEVELS, dwell), rows)

    def rounded(values, step):
        return np.round(np.round(values / step) * step, 9)

    current = setting + generator.normal(0, noise, rows)
    voltage = 12.03 - 0.02 * current + generator.normal(0, 1.5e-3, rows)
    power = voltage * current + 0.15 + 0.6 * current + 0.15 * current**2 + generator.normal(0, 2e-3, rows)
    volts = 230 + generator.normal(0, 0.2, rows)
    time = np.arange(rows) * 0.1
    return {
        "time": time,
        "load_setting main": setting,
        "input_voltage": rounded(volts, 0.01),
        "input_current": rounded(power / volts / (0.6 if ac else 1.0), 1e-4),
        "input_power": rounded(power, 1e-3),
        "output_voltage main": rounded(voltage, 1e-4),
        "output_current main": rounded(current, current_step),
        "temperature case": rounded(23 + 18 * (1 - np.exp(-time / 30)) + generator.normal(0, 0.03, rows), 0.01),
        "ripple main": rounded(0.022 + 0.004 * current + generator.normal(0, 5e-4, rows), 1e-5),
    }


def found(log, **options):
    return check_health(log, supply="ac", rated_input_voltage=230.0, rated=RATED, **options)


def kinds(log):
    return {doubt.kind: doubt for doubt in found(log)}


# --- good data raise no bar -----------------------------------------------------------------------------------------


def manual():
    """One row a condition, read off by a person."""
    return {
        "time": [0, 60, 180, 200, 420, 1000],
        "output_current main": [0.0, 0.3, 0.75, 1.5, 2.25, 3.0],
        "output_voltage main": [12.03, 12.03, 12.02, 12.01, 12.01, 12.0],
        "input_power": [0.2, 4.0, 10.0, 20.0, 31.0, 42.0],
        "input_voltage": [230.0] * 6,
    }


def noiseless():
    columns = sweep()
    return columns | {
        "output_current main": columns["load_setting main"],
        "output_voltage main": 12.03 - 0.02 * columns["load_setting main"],
        "input_power": 0.2 + 14 * columns["load_setting main"],
    }


def zero_at_no_load():
    columns = sweep()
    columns["output_current main"] = np.where(columns["load_setting main"] == 0, 0.0, columns["output_current main"])
    return columns


def quiet_at_no_load():
    """Voltage and power without noise at no load, with noise elsewhere."""
    columns = sweep()
    empty = columns["load_setting main"] == 0
    columns["output_voltage main"] = np.where(empty, 12.0412, columns["output_voltage main"])
    columns["input_power"] = np.where(empty, 0.151, columns["input_power"])
    columns["input_current"] = np.where(empty, 0.0012, columns["input_current"])
    return columns


def bursts_at_no_load():
    """A supply that sleeps between bursts."""
    columns = sweep(6000)
    empty = columns["load_setting main"] == 0
    burst = (np.arange(6000) % 100) < 12
    generator = np.random.default_rng(3)
    asleep = np.where(burst, 0.6 + generator.normal(0, 0.02, 6000).round(3), 0.101)
    columns["input_power"] = np.where(empty, asleep, columns["input_power"])
    return columns


def mains_at_coarse_resolution():
    columns = sweep()
    return columns | {"input_voltage": np.round(230 + np.random.default_rng(4).normal(0, 0.03, 2400), 1)}


def soak():
    """Six hours at one load, temperatures settled to their last digit."""
    columns = sweep(21600, dwell=21600)
    columns["time"] = np.arange(21600.0)
    settled = np.round(23 + 18 * (1 - np.exp(-np.arange(21600) / 1500)), 1)
    return columns | {"temperature case": settled}


def limiter():
    """An overcurrent ramp in small steps into a limiter whose current has a meter's noise."""
    generator = np.random.default_rng(5)
    asked = np.repeat(np.linspace(2.5, 4.5, 200), 5)
    current = np.minimum(asked, 3.6) + generator.normal(0, 1e-3, 1000)
    volts = np.where(asked <= 3.6, 12.0, 12.0 * np.maximum(0, 1 - (asked - 3.6)))
    return {
        "time": np.arange(1000) * 0.1,
        "output_current main": current.round(4),
        "output_voltage main": (volts + generator.normal(0, 1e-3, 1000)).round(4),
        "input_power": (volts * current * 1.2 + 0.2).round(3),
    }


def quantised(step, noise, seed=7):
    """Noise on a lattice at three inputs: at 253 V one reading may be by far the most frequent."""

    def columns():
        generator = np.random.default_rng(seed)
        volts = np.repeat([207.0, 230.0, 253.0, 230.0], 300) + generator.normal(0, noise * step, 1200)
        return sweep(1200) | {"input_voltage": (np.round(volts / step) * step).round(9)}

    return columns


def alternating_inputs():
    """A person goes through three inputs at each load: the highest reads the same each time, the others nearly so."""
    generator = np.random.default_rng(11)
    loads = np.repeat(np.linspace(0, 3, 20), 3)
    order = np.concatenate([(207.0, 230.0, 253.0) if n % 2 else (253.0, 230.0, 207.0) for n in range(20)])
    off = np.where(order == 253, 0, generator.integers(-2, 3, 60) * 0.1)
    power = 14 * loads + 0.2
    return {
        "time": np.arange(60) * 60.0,
        "input_voltage": (order + off).round(1),
        "input_power": power.round(2),
        "output_current main": loads.round(3),
        "output_voltage main": (12.03 - 0.02 * loads).round(3),
    }


def ripple_at_one_step():
    """A scope of 8 bits: few levels, the highest among the most frequent."""
    columns = sweep()
    levels = np.round(columns["ripple main"] / 0.002) * 0.002
    return columns | {"ripple main": levels.round(4)}


def warming_up():
    """A current that rises to its last value and stays there to the last digit."""
    columns = sweep(dwell=2400)
    rising = 0.5 * (1 - np.exp(-np.arange(2400) / 200)) + np.random.default_rng(2).normal(0, 3e-4, 2400)
    return columns | {"input_current": rising.round(3), "load_setting main": np.full(2400, 3.0)}


def bursts_seen_in_part():
    """A hiccup whose bursts are all alike, between which the output is at zero."""
    columns = limiter()
    burst = np.arange(1000) % 9 < 2
    for key in ("output_current main", "output_voltage main", "input_power"):
        columns[key] = np.where(burst, columns[key], 0.0)
    return columns


def single_rests():
    """A burst mode that reads zero in every eighth sample at no load."""
    columns = sweep()
    empty = columns["load_setting main"] == 0
    rest = empty & (np.arange(2400) % 8 == 0)
    return columns | {"input_power": np.where(rest, 0.0, columns["input_power"])}


def one_row_at_no_load():
    """Ten rows at one load, one at none, ten at the load again: the power says that the zero is true."""
    current = np.array([2.5, 2.501, 2.499, 2.5, 2.5] * 4 + [2.5])
    current[10] = 0.0
    return {
        "time": np.arange(21) * 60.0,
        "output_current main": current,
        "output_voltage main": 12.03 - 0.02 * current,
        "input_power": (0.2 + 14 * current).round(2),
    }


def latched_off():
    """An output that is off, with its meter's offset standing still."""
    columns = limiter()
    off = np.arange(1000) > 500
    columns["output_voltage main"] = np.where(off, 0.0021, columns["output_voltage main"])
    columns["output_current main"] = np.where(off, 0.0, columns["output_current main"])
    columns["input_power"] = np.where(off, 0.312, columns["input_power"])
    return columns


GOOD = {
    "realistic": sweep,
    "another seed": lambda: sweep(seed=99),
    "coarse converter of 10 mA": lambda: sweep(current_step=1e-2),
    "coarse converter of 2 mA": lambda: sweep(current_step=2e-3),
    "coarse converter of 0.5 mA": lambda: sweep(current_step=5e-4),
    "steps of three samples": lambda: sweep(dwell=3),
    "short": lambda: sweep(18, dwell=3),
    "manual": manual,
    "no noise": noiseless,
    "zero at no load": zero_at_no_load,
    "quiet at no load": quiet_at_no_load,
    "bursts at no load": bursts_at_no_load,
    "mains at 0.1 V": mains_at_coarse_resolution,
    "long soak": soak,
    "limiter": limiter,
    "latched off": latched_off,
    "lattice, quiet": quantised(0.1, 0.3),
    "lattice, a step of noise": quantised(0.1, 1.0),
    "lattice, half a step off": quantised(0.3, 0.4),
    "lattice, whole volts": quantised(1.0, 0.5),
    "inputs in turn, by hand": alternating_inputs,
    "scope of 8 bits": ripple_at_one_step,
    "warming up": warming_up,
    "hiccup": bursts_seen_in_part,
    "single rests": single_rests,
    "one row at no load": one_row_at_no_load,
}


@pytest.mark.parametrize("kind", GOOD)
def test_good_log_raises_no_doubt(kind):
    """A false bar is as bad as a miss."""
    stage = "overcurrent" if kind in ("limiter", "latched off", "hiccup") else "steady"

    assert found(log_of(GOOD[kind](), stage=stage)) == ()


@pytest.mark.parametrize("seed", range(20))
@pytest.mark.parametrize("step", [1e-4, 7e-4, 1e-3, 2e-3, 4e-3])
def test_good_logs_of_any_resolution_raise_no_bar(seed, step):
    """Noise of twenty to half a step of the converter."""
    assert found(log_of(sweep(1200, seed, current_step=step))) == ()


# --- time -----------------------------------------------------------------------------------------------------------


def test_gap_is_cut_after_its_last_sample():
    """The span ends with the last sample before the gap."""
    columns = sweep()
    columns["time"][700:] += 30

    (doubt,) = found(log_of(columns))

    assert (doubt.kind, doubt.bars, doubt.spans) == ("gap", False, ((699, 700),))
    assert "table 0:701" in doubt.text


def test_time_running_backwards_bars_its_table_alone():
    """Every channel, and no sample of another table."""
    columns = sweep()
    columns["time"] = np.concatenate([columns["time"][:1200], columns["time"][:1200]])
    columns["time"][600:] -= 5
    table = np.repeat([0, 1], 1200)

    doubts = found(log_of(columns, table=table))

    (doubt,) = doubts
    assert (doubt.kind, doubt.bars, doubt.spans) == ("backward time", True, ((0, 1200),))
    assert set(doubt.channels) == set(columns)


def test_time_that_begins_anew_in_a_new_table_is_no_fault():
    """A restarted logger."""
    columns = sweep()
    columns["time"] = np.tile(np.arange(1200) * 0.1, 2)

    assert found(log_of(columns, table=np.repeat([0, 1], 1200))) == ()


def test_repeated_times():
    """Few: a doubt. A coarse clock: a doubt. A clock that stands: what needs time is barred."""
    few, coarse, stuck = sweep(), sweep(), sweep()
    few["time"][50] = few["time"][49]
    coarse["time"] = np.floor(coarse["time"])
    stuck["time"][500:900] = stuck["time"][500]

    assert not kinds(log_of(few))["repeated time"].bars
    assert not kinds(log_of(coarse))["repeated time"].bars
    assert "steps of 1 s" in kinds(log_of(coarse))["repeated time"].text
    barred = kinds(log_of(stuck))["repeated time"]
    assert (barred.bars, barred.channels, barred.spans) == (True, ("time",), ((500, 900),))


# --- converters -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("ceiling", [2.8, 2.2501])
def test_clipped_converter_is_barred_where_it_clips(ceiling):
    """The current cannot read more than the ceiling."""
    columns = sweep()
    columns["output_current main"] = np.minimum(columns["output_current main"], ceiling)
    clipped = np.flatnonzero(columns["output_current main"] == ceiling)

    doubt = kinds(log_of(columns))["clipped"]

    assert doubt.bars
    assert doubt.channels == ("output_current main",)
    barred = np.concatenate([np.arange(a, b) for a, b in doubt.spans])
    assert set(barred) <= set(clipped)
    assert len(barred) > 0.5 * len(clipped)


def test_clipped_limiter_is_barred():
    """A saturated converter would pass for a perfect limiter."""
    columns = limiter()
    columns["output_current main"] = np.minimum(columns["output_current main"], 3.5)

    assert kinds(log_of(columns, stage="overcurrent"))["clipped"].bars


def piled(key, share, *, rows=120, noise=10.0, seed=1):
    """Readings of one dwell on a lattice, those beyond a ceiling put onto it; their share is as asked."""
    generator = np.random.default_rng(seed)
    columns = sweep(rows, dwell=rows)
    columns["load_setting main"] = np.full(rows, 3.0)
    step = {"ripple main": 1e-4, "input_voltage": 0.01}.get(key, 1e-3)
    middle = {"ripple main": 0.099, "input_voltage": 230.0, "input_power": 42.0}.get(key, 3.0)
    steps = np.round(middle / step + generator.normal(0, noise, rows))
    ceiling = np.quantile(steps, 1 - share)
    columns[key] = (np.minimum(steps, np.ceil(ceiling)) * step).round(9)
    return columns, columns[key].max()


@pytest.mark.parametrize("key", ["ripple main", "output_current main", "input_power", "input_voltage"])
@pytest.mark.parametrize(("share", "noise", "seed"), [(0.3, 20, 1), (0.24, 25, 2), (0.5, 12, 3), (0.5, 40, 4)])
def test_readings_piled_up_at_their_largest_are_barred_there(key, share, noise, seed):
    """Not in one run, but among lower readings: the range ends within the noise."""
    columns, ceiling = piled(key, share, noise=noise, seed=seed)

    doubt = kinds(log_of(columns))["clipped"]

    assert (doubt.bars, doubt.channels) == (True, (key,))
    barred = np.concatenate([np.arange(a, b) for a, b in doubt.spans])
    assert barred.tolist() == np.flatnonzero(columns[key] == ceiling).tolist()
    assert "range" in doubt.remedy


def test_ripple_clipped_at_full_load_alone_is_barred():
    """28 of 120 readings at exactly 100.0 mV, the other loads far below."""
    generator = np.random.default_rng(3)
    columns = sweep(120, dwell=20)
    full = columns["load_setting main"] >= 2.25
    ripple = np.where(full, 101.0, 60.0) + generator.normal(0, 3, 120)
    columns["ripple main"] = (np.minimum(ripple, 100.0).round(1) * 1e-3).round(6)
    count = int((columns["ripple main"] == 0.1).sum())
    assert 20 < count < 40

    doubt = kinds(log_of(columns))["clipped"]

    assert doubt.channels == ("ripple main",)
    assert sum(b - a for a, b in doubt.spans) == count
    assert f"{count} " in doubt.text


def test_pile_is_looked_for_in_each_table():
    """A second table in a higher range does not hide it."""
    columns, ceiling = piled("ripple main", 0.3, noise=20)
    longer = {key: np.concatenate([values, values]) for key, values in columns.items()}
    longer["ripple main"][120:] *= 1.7
    longer["ripple main"][120:] += np.random.default_rng(1).normal(0, 2e-3, 120).round(4)
    longer["time"] = np.tile(columns["time"], 2)

    doubt = kinds(log_of(longer, table=np.repeat([0, 1], 120)))["clipped"]

    assert max(b for _, b in doubt.spans) <= 120
    assert f"{ceiling:.6g}" in doubt.text


@pytest.mark.parametrize("seed", range(40))
@pytest.mark.parametrize("noise", [0.3, 1, 3, 10, 30])
def test_noise_that_is_not_clipped_is_no_pile(seed, noise):
    """Whatever the converter's step."""
    columns, _ = piled("ripple main", 0.001, noise=noise, seed=seed)

    assert found(log_of(columns)) == ()


@pytest.mark.parametrize("key", ["output_voltage main", "input_voltage", "input_power", "output_current main"])
@pytest.mark.parametrize("rows", [[1000], [1000, 1013, 1500]])
def test_zero_between_readings_is_barred(key, rows):
    """A logger that had no reading wrote 0."""
    columns = sweep()
    columns[key][rows] = 0.0

    (doubt,) = found(log_of(columns))

    assert (doubt.kind, doubt.bars, doubt.channels) == ("dropout", True, (key,))
    assert doubt.spans == tuple((row, row + 1) for row in rows)
    assert "table 0:1002" in doubt.text


def test_row_of_zeros_is_barred_in_every_channel():
    """No channel can vouch for another there."""
    columns = sweep()
    keys = ("output_voltage main", "input_voltage", "input_power", "output_current main")
    for key in (*keys, "input_current", "load_setting main", "ripple main"):
        columns[key][1000] = 0.0

    assert {d.channels[0] for d in found(log_of(columns)) if d.kind == "dropout"} == set(keys)


@pytest.mark.parametrize("key", ["output_voltage main", "input_power", "output_current main", "input_voltage"])
@pytest.mark.parametrize("span", [(900, 1000), (1500, 1700), (1100, 1300)])
def test_frozen_reading_is_barred_where_it_stands(key, span):
    """Amid a dwell, and across a change of the load."""
    columns = sweep()
    columns[key][span[0] : span[1]] = columns[key][span[0]]

    doubt = kinds(log_of(columns))["frozen"]

    assert (doubt.bars, doubt.channels) == (True, (key,))
    assert doubt.spans[0][0] <= span[0] + 1
    assert doubt.spans[0][1] >= span[1] - 1
    assert sum(b - a for a, b in doubt.spans) <= span[1] - span[0] + 2


# --- columns and units ----------------------------------------------------------------------------------------------


def test_ac_input_without_power_is_barred():
    """Volts times amperes is no power; a power factor would do, and a d.c. input needs neither."""
    columns = sweep()
    del columns["input_power"]
    log = log_of(columns)

    doubt = kinds(log)["no input power"]
    assert (doubt.bars, doubt.channels) == (True, ("input_power", "input_current"))
    assert "wattmeter" in doubt.remedy
    assert not check_health(log, supply="dc")
    assert "no input power" not in kinds(log_of(columns | {"power_factor": np.full(2400, 0.6)}))


def test_swapped_output_columns_are_barred():
    """Volts where the amperes should be."""
    columns = sweep()
    columns["output_voltage main"], columns["output_current main"] = (
        columns["output_current main"],
        columns["output_voltage main"],
    )

    doubt = kinds(log_of(columns))["swapped"]
    assert doubt.bars
    assert set(doubt.channels) == {"output_voltage main", "output_current main"}


def test_swapped_ends_are_barred():
    """The input's volts under the output's heading."""
    columns = sweep()
    columns["input_voltage"], columns["output_voltage main"] = columns["output_voltage main"], columns["input_voltage"]

    assert any(d.kind == "swapped" and d.bars and "input_voltage" in d.channels for d in found(log_of(columns)))


def test_more_power_out_than_in_is_barred():
    """In nearly every sample; the outputs stay, since their voltage is the rated one."""
    columns = sweep()
    columns["input_power"] = columns["input_power"] / 1000

    doubt = kinds(log_of(columns))["swapped"]
    assert doubt.bars
    assert "input_power" in doubt.channels
    assert "output_voltage main" not in doubt.channels


@pytest.mark.parametrize("factor", [1e-3, 0.1, 10.0, 100.0, 1000.0])
@pytest.mark.parametrize("assumed", [True, False])
def test_reading_ten_times_off_the_rating(factor, assumed):
    """A bar only where the unit was assumed."""
    for key in ("output_voltage main", "input_voltage"):
        columns = sweep()
        columns[key] = columns[key] * factor

        doubts = [d for d in found(log_of(columns, assumed=(key,) if assumed else ())) if d.kind == "scale"]

        assert [(d.channels, d.bars) for d in doubts] == [((key,), assumed)]


def test_current_in_milliamperes_is_a_doubt():
    """A thousandfold of the rating."""
    columns = sweep()
    columns["output_current main"] = columns["output_current main"] * 1000

    assert any(d.kind == "scale" and d.channels == ("output_current main",) for d in found(log_of(columns)))


def test_missing_readings_are_said_once():
    """Not again where the reader has said so; and not for a table without the channel."""
    columns = sweep()
    columns["input_power"][10:20] = np.nan
    columns["ripple main"][1200:] = np.nan
    table = np.repeat([0, 1], 1200)
    columns["time"] = np.tile(np.arange(1200) * 0.1, 2)

    doubts = [d for d in found(log_of(columns, table=table)) if d.kind == "missing"]
    assert [(d.channels, d.bars) for d in doubts] == [(("input_power",), False)]
    told = log_of(columns, table=table, doubts=[Doubt("missing", "", channels=("input_power",))])
    assert not [d for d in found(told) if d.kind == "missing"]


def test_ratings_unknown_is_no_fault():
    """`inspect` without a limits file."""
    assert check_health(log_of(sweep())) == ()
