"""What the findings of the sample logs truly are, from the closed forms behind the logs."""

from __future__ import annotations

import math
import sys
from collections.abc import Sequence
from functools import cache
from pathlib import Path

import numpy as np

ROOT = Path(__file__).resolve().parents[1]
SAMPLES, LIMITS = ROOT / "sample_logs", ROOT / "limits"
sys.path.insert(0, str(SAMPLES))  # the script is no part of the package

from workshop.overload import ConstantCurrent, Foldback, Hiccup, OverloadRun  # noqa: E402
from workshop.runs import FILES, LogFile  # noqa: E402
from workshop.soak import SoakRun  # noqa: E402

BEYOND_STEADY = ("_overcurrent", "_thermal", "_cold", "_cooling")
STEADY = [name for name in FILES if not any(stage in name for stage in BEYOND_STEADY)]
DROOP = 0.05  # of rated voltage: where a limits file sees the onset unless it says otherwise
RECOVERY_BANDS = {"Quillfen A60-24": 0.01, "Wrenlow B30-3": 0.005, "Pellmarsh D12-8": 0.01}  # as their limits files ask
BEHAVIOURS = {ConstantCurrent: "constant current", Foldback: "foldback", Hiccup: "hiccup"}


@cache
def made(name: str) -> LogFile:
    """One log, made once for all tests."""
    return FILES[name]()


def overload_of(logs: Sequence[LogFile]) -> OverloadRun:
    """The sweep through the overload among a unit's logs."""
    return next(log.overload for log in logs if log.overload is not None)


def soak_of(logs: Sequence[LogFile]) -> SoakRun:
    """The soak among a unit's logs."""
    return next(log.soak for log in logs if log.soak is not None)


def true_value(name: str, logs: Sequence[LogFile]) -> float | None:
    """What a finding's value truly is; None for what is no single number."""
    for known in (_steady_value, _overload_value, _warmth):
        value = known(name, logs)
        if value is not None:
            return value
    return None


def _steady_value(name: str, logs: Sequence[LogFile]) -> float | None:
    log = next(log for log in logs if log.run is not None)
    assert log.run is not None
    product = log.product
    at_rated = [d for d in log.run.truth if d.point.input_voltage == product.rated_input]
    even = {next(iter(d.loads.values())): d.point for d in at_rated if len(set(d.loads.values())) == 1}
    if name in {"eff-avg", "eu-eps.average_efficiency"}:
        return float(np.mean([even[load].efficiency for load in (0.25, 0.5, 0.75, 1.0)]))
    if name.startswith("eff-"):
        return even[int(name.removeprefix("eff-")) / 100].efficiency
    if name in {"standby", "idle", "eu-eps.no_load_power"}:
        return even[0.0].input_power
    if name == "loadreg":
        volts = [d.point.output_voltage["main"] for d in at_rated]
        nominal = product.outputs["main"].rated_voltage if product.name.startswith("Pellmarsh") else None
        return (max(volts) - min(volts)) / (nominal or even[1.0].output_voltage["main"])
    if name == "linereg":
        volts = [d.point.output_voltage["main"] for d in log.run.truth if d.loads["main"] == 1.0]
        return (max(volts) - min(volts)) / even[1.0].output_voltage["main"]
    return None


def _overload_value(name: str, logs: Sequence[LogFile]) -> float | None:
    what = name.partition(".")[2]
    if what == "onset":
        return true_onset(overload_of(logs), logs[0].product.outputs["main"].rated_voltage)
    if what == "short_circuit":
        run = overload_of(logs)
        if isinstance(run.limiter, Hiccup):
            return run.limiter.burst
        return run.limiter.line(run.supply).meets(run.supply, run.steps[-2])[1]  # the short comes before the return
    return None


def true_onset(run: OverloadRun, rated_voltage: float) -> float:
    """Where the output lies the droop below its branch V = V0 - r I: on I = short + slope V; or where it trips. [A]"""
    if isinstance(run.limiter, Hiccup):
        return run.limiter.onset
    line, supply = run.limiter.line(run.supply), run.supply
    return (line.short + line.slope * (supply.voltage - DROOP * rated_voltage)) / (1 + line.slope * supply.resistance)


def true_recovery(run: OverloadRun, lowest: float) -> float:
    """From the return to a rated load until the output has risen to `lowest` [V], exponentially. [s]"""
    begins, waits = run.truth["output_voltage"][run.truth["time"] < run.removed].iloc[-1], 0.0
    if isinstance(run.limiter, Hiccup):
        rated = [step for step in run.steps if run.supply.meets(step)[1] <= run.limiter.onset]
        tripped_for = run.removed - sum(step.seconds for step in rated[:-1])
        begins, waits = 0.0, run.limiter.waits(tripped_for)
    back = run.steps[-1]
    ends = run.supply.voltage if back.mode == "CV" else run.supply.meets(back)[0]
    return waits + run.limiter.rise * math.log((ends - begins) / (ends - lowest))


def true_words(name: str, logs: Sequence[LogFile]) -> str | None:
    """What a finding in words truly is."""
    return BEHAVIOURS[type(overload_of(logs).limiter)] if name.endswith(".behaviour") else None


def recovery_bracket(name: str, logs: Sequence[LogFile]) -> tuple[float, float] | None:
    """The true recovery, and the most that sampling can make of it: an interval at either end. [s]"""
    if not name.endswith(".recovery"):
        return None
    run, product = overload_of(logs), logs[0].product
    band = RECOVERY_BANDS[product.name]
    truth = true_recovery(run, product.outputs["main"].rated_voltage * (1 - band))
    return truth, truth + 2 * float(run.truth["time"].diff().max())


def _warmth(name: str, logs: Sequence[LogFile]) -> float | None:
    """Rises once settled, in the room as it drifted at last; temperatures at the highest rated ambient."""
    if name not in {"rise-case", "rise-winding", "hot-core"}:
        return None
    core, case = soak_of(logs).ended
    ambient = {"Quillfen": 40.0, "Pellmarsh": 55.0}.get(logs[0].product.name.partition(" ")[0], math.nan)
    return float({"rise-case": case, "rise-winding": core, "hot-core": core + ambient}[name])


def shown_warmth(name: str, logs: Sequence[LogFile]) -> float | None:
    """The same as thermometers show it that err as these do; None where it does not hang on probes alone."""
    truth, probe = _warmth(name, logs), {"rise-case": "case", "hot-core": "core"}.get(name)
    if truth is None or probe is None:
        return None
    meters = [logs[0].bench.in_use(key) for key in (f"temperature {probe}", "ambient_temperature")]
    of_probe, of_ambient = (meter.offset_error for meter in meters if meter is not None)
    return truth + of_probe - of_ambient
