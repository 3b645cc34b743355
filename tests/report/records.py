"""Records made by hand: a typical one, one of several outputs, and ones that no bench would write."""

from __future__ import annotations

import hashlib
from dataclasses import replace

from acceptance.record import (
    Alternative,
    AtDwell,
    Axis,
    BudgetLine,
    DecisionRule,
    Deviation,
    Evidence,
    Figure,
    Finding,
    Hazard,
    Health,
    InstrumentUsed,
    LimitLine,
    LimitsUsed,
    Mark,
    Output,
    Point,
    Ratings,
    Reading,
    Record,
    Region,
    Series,
    TestFacts,
    Unit,
)

LOADS = (0.0, 0.10, 0.25, 0.50, 0.75, 1.00)


def sha(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


def reading(value: float, unit: str, u: float | None, n: int = 60) -> Reading:
    type_a = None if n == 1 else 0.3 * (u or 0.001)
    type_b = None if u is None else (u**2 - (type_a or 0.0) ** 2) ** 0.5
    return Reading(value, unit, u, type_a, type_b, n, None if n == 1 else n / 3.4)


def output_voltage(load: float, rated: float = 24.0) -> float:
    """A rail that droops 0.3 % from no load to full load."""
    return rated * (1.0004 - 0.003 * load)


def input_power(load: float, rated: float = 120.0) -> float:
    """Fixed loss, loss with current, and loss with its square."""
    return (
        rated * load * output_voltage(load) / 24
        + 0.15
        + 0.045 * rated * load
        + 0.035 * rated * load**2
        + 1.1 * (load > 0)
    )


def efficiency(load: float) -> float:
    return 120.0 * load * output_voltage(load) / 24 / input_power(load)


def point(index: int, load: float) -> Point:
    volts, amperes, watts = output_voltage(load), 5.0 * load, input_power(load)
    channels = {
        "input_voltage": reading(230.1 - 0.3 * load, "V", 0.27),
        "input_power": reading(watts, "W", 0.001 * watts / 3**0.5 + 0.029),
        "output_voltage": reading(volts, "V", 0.0048),
        "output_current": reading(amperes, "A", 0.0006 + 0.0011 * amperes),
        "temperature case": reading(31.0 + 18 * load, "°C", 0.87),
    }
    return Point(
        index,
        "steady",
        f"A-17.csv, lines {31 + 75 * index} to {90 + 75 * index}",
        15.0 + 75 * index,
        59.0,
        60,
        15,
        {"main": load},
        channels,
        efficiency(load) if load else None,
        2 * 0.0009 / max(load, 0.2) if load else None,
        "load setting",
    )


def budget(u: float) -> list[BudgetLine]:
    return [
        BudgetLine("input power, PM-1: accuracy", "B", 0.86 * u, 0.74, None),
        BudgetLine("output current, L-2: shunt tolerance", "B", 0.42 * u, 0.18, None),
        BudgetLine("output voltage, DMM-7: accuracy", "B", 0.23 * u, 0.05, None),
        BudgetLine("scatter of V·I against P", "A", 0.17 * u, 0.03, 17.0),
    ]


def finding(name: str, load: float, low: float, verdict: str = "pass", **changes: object) -> Finding:
    value = efficiency(load)
    expanded = 2 * 0.0009 / max(load, 0.2)
    made = Finding(
        name=name,
        characteristic="efficiency",
        condition=f"load {load:.0%}, input 230 V".replace("%", " %"),
        value=value,
        unit="",
        expanded_uncertainty=expanded,
        coverage_factor=1.98,
        degrees_of_freedom=118.0,
        min=low,
        max=None,
        margin=value - low,
        conformity_probability=0.99997,
        verdict=verdict,  # type: ignore[arg-type]
        reason="",
        standard_uncertainty=expanded / 1.98,
        output="main",
        where="A-17.csv, lines 256 to 315",
        formula="mean(V·I) / mean(P), sample by sample",
        points=[AtDwell(3, f"{load * 100:.0f} %")],
        budget=budget(expanded / 1.98),
    )
    return replace(made, **changes)  # type: ignore[arg-type]


def steady_findings() -> list[Finding]:
    return [
        finding("eff-50", 0.5, 0.88, note="from the customer's order, clause 3.2"),
        finding(
            "eff-avg",
            0.75,
            0.89,
            condition="mean of load 25 %, 50 %, 75 %, 100 %, input 230 V",
            formula="mean of four efficiencies",
            points=[AtDwell(n, f"{LOADS[n] * 100:.0f} %") for n in (2, 3, 4, 5)],
        ),
        Finding(
            "standby",
            "no_load_power",
            "load 0 %, input 230 V",
            0.148,
            "W",
            0.058,
            1.96,
            None,
            None,
            0.21,
            0.062,
            0.982,
            "pass",
            "",
            0.0296,
            "",
            "A-17.csv, lines 31 to 90",
            "",
            "",
            "mean P over the whole no-load stretch, 74 s",
            [AtDwell(0, "no load")],
            [],
            [BudgetLine("input power, PM-1: accuracy", "B", 0.0292, 0.97, None)],
        ),
        Finding(
            "loadreg",
            "load_regulation",
            "load 0 % to 100 %, input 230 V",
            0.00303,
            "",
            0.00012,
            1.97,
            240.0,
            None,
            0.01,
            0.00697,
            1.0,
            "pass",
            "",
            0.00006,
            "main",
            "A-17.csv, lines 31 to 465",
            "",
            "",
            "(largest V − smallest V) / V at full load",
            [AtDwell(n, f"{LOADS[n] * 100:.0f} %") for n in range(6)],
        ),
        Finding(
            "band",
            "output_voltage",
            "load any, input any",
            23.9376,
            "V",
            0.0096,
            1.98,
            118.0,
            23.52,
            24.48,
            0.4176,
            1.0,
            "pass",
            "",
            0.0048,
            "main",
            "A-17.csv, lines 406 to 465",
            "",
            "",
            "mean V of the dwell farthest from rated",
            [AtDwell(5, "load 100 %")],
            [Alternative("load 50 %, lines 256 to 315", 23.9736, 0.0096, 0.4536, 1.0, "pass")],
        ),
    ]


def figures() -> list[Figure]:
    eta = [efficiency(load) for load in LOADS[1:]]
    bars = [2 * 0.0009 / max(load, 0.2) for load in LOADS[1:]]
    return [
        Figure(
            "efficiency",
            "Efficiency against load",
            Axis("Load", ""),
            Axis("Efficiency", ""),
            [Series("230 V", list(LOADS[1:]), eta, list(bars))],
            [LimitLine("eff-50", 0.88, "min", 0.5, 0.5), LimitLine("eff-avg", 0.89, "min", 0.25, 1.0)],
        ),
        Figure(
            "output_voltage",
            "Output voltage against load current",
            Axis("Load current", "A"),
            Axis("Output voltage", "V"),
            [Series("main", [5 * load for load in LOADS], [output_voltage(load) for load in LOADS], [0.0096] * 6)],
            [LimitLine("band", 23.52, "min"), LimitLine("band", 24.48, "max")],
        ),
    ]


def instruments() -> list[InstrumentUsed]:
    return [
        InstrumentUsed("input_power", "PM-1", "0815-3", "0.1 % reading + 0.05 W", "", "10 mW", "2027-03-01", "in date"),
        InstrumentUsed(
            "output_voltage",
            "DMM-7",
            "M7-2217",
            "0.05 % reading + 0.02 % range",
            "60 V",
            "1 mV",
            "2027-03-01",
            "in date",
        ),
        InstrumentUsed(
            "output_current",
            "L-2",
            "",
            "shunt 1 ohm ± 0.1 %, 50 ppm/K, 5 K/W; 16 bit over ± 6.144 V, offset 0.4 mV",
            "",
            "",
            "2026-12-15",
            "in date",
        ),
        InstrumentUsed("temperature case", "TC-4", "", "1.5 K", "", "", None, "no due date stated"),
        InstrumentUsed("input_voltage", None, "", "", "", "", None, "uncertainty not stated"),
    ]


def typical() -> Record:
    """An accepted unit: five findings, six dwells, two figures."""
    return Record(
        acceptance_record=1,
        report_number="7C1E-04B9-E2D5",
        judged_at="2026-11-30T14:05:09Z",
        unit=Unit("Bench rail 24", "C", "A-17"),
        verdict="accepted",
        joint_conformity_probability=0.9818,
        findings=steady_findings(),
        points=[point(index, load) for index, load in enumerate(LOADS)],
        figures=figures(),
        instruments=instruments(),
        health=[],
        notes={"operator": "M. Okafor", "room": "bench 2, 41 % r.h."},
        evidence=[Evidence("A-17.csv", sha("log"), 48_213, 465)],
        limits=LimitsUsed("bench_rail_24.yaml", sha("limits"), sha("requirements"), "bench_2.yaml", sha("bench")),
        made_by={"acceptance": "0.1.0", "python": "3.11.7", "numpy": "2.3.1"},
        ratings=Ratings("ac", 230.0, [207.0, 253.0], 50.0, [Output("main", 24.0, 5.0)], 40.0, "I"),
        decision=DecisionRule("guarded", 0.95, 0.975, None, None),
        test=TestFacts(
            "2026-11-28", ["steady"], 465, "CC", None, 5.0, [22.6, 23.4], "file name", {"input_voltage": 230.0}
        ),
        hazards=[
            Hazard("mains", "rated input 230 V a.c."),
            Hazard("stored charge", "a.c. input with no bleeder stated"),
            Hazard("hot parts", "temperature case reached 49 °C"),
        ],
    )


def every_verdict() -> Record:
    """A rejected unit with each kind of finding, doubts, deviations, other dwells, and a text as a value."""
    base = typical()
    reason = "inside the limit, but not shown to conform: probability 94.1 %, needed 97.5 %"
    findings = [
        base.findings[0],
        finding(
            "eff-25",
            0.25,
            0.8875,
            "fail",
            reason=reason,
            conformity_probability=0.941,
            margin=efficiency(0.25) - 0.8875,
        ),
        finding(
            "eff-10",
            0.10,
            0.80,
            "conditional pass",
            reason="on the limit's good side; not shown",
            conformity_probability=0.71,
        ),
        finding(
            "eff-100",
            1.0,
            0.93,
            "conditional fail",
            reason="on the limit's bad side; not shown",
            conformity_probability=0.31,
        ),
        finding(
            "eff-75-low-line",
            0.75,
            0.88,
            "not judged",
            value=None,
            expanded_uncertainty=None,
            coverage_factor=None,
            degrees_of_freedom=None,
            margin=None,
            conformity_probability=None,
            standard_uncertainty=None,
            budget=[],
            points=[],
            condition="load 75 %, input 207 V",
            reason="no dwell meets input 207 V; the nearest is lines 331 to 390 with 229.9 V. Record a sweep at 207 V",
        ),
        Finding(
            "calibration.PM-1",
            "calibration",
            "",
            None,
            "",
            None,
            None,
            None,
            None,
            None,
            None,
            None,
            "not judged",
            "PM-1 was due on 2026-10-01, and the log's test date is 2026-11-28; have it calibrated and test again",
        ),
        Finding(
            "ocp.behaviour",
            "overcurrent",
            "input any",
            "constant current",
            "",
            None,
            None,
            None,
            None,
            None,
            None,
            None,
            "pass",
            "",
            deviations=[Deviation("The load was stepped in CR mode; the sweep took 4.1 s per step instead of 2 s.")],
        ),
        Finding(
            "ripple",
            "ripple",
            "load 100 %, input 230 V",
            0.0962,
            "V",
            None,
            None,
            None,
            None,
            0.120,
            0.0238,
            None,
            "pass",
            "",
            output="main",
        ),
    ]
    return replace(
        base,
        verdict="rejected",
        joint_conformity_probability=None,
        findings=findings,
        health=[
            Health(
                "frozen channel",
                "input_voltage has the identical value in all of 465 samples",
                False,
                ["input_voltage"],
                "A-17.csv, column 2",
                "check the meter's hold key, or declare the input voltage as stated",
            ),
            Health(
                "impossible efficiency",
                "efficiency above 1 + U at 10 % load",
                True,
                ["input_power", "output_current"],
                "A-17.csv, lines 106 to 165",
                "check the current's scale and the power meter's range",
            ),
        ],
        hazards=[
            Hazard("mains", "rated input 230 V a.c."),
            Hazard("stored charge", "470 µF and 150 kohm stated", 128.0),
            Hazard("output above 60 V", "not known from the ratings"),
            Hazard("high power output", "10 A short-circuit current at 24 V"),
            Hazard("hot parts", "temperature case reached 49 °C"),
        ],
    )


def several_outputs(count: int = 3) -> Record:
    """A supply of several outputs: wide tables, figures with several series."""
    base = typical()
    rails = [
        Output(f"rail {n + 1}", volts, 2.0 + n)
        for n, volts in zip(range(count), (5.0, 12.0, 24.0, -12.0, 3.3, 48.0), strict=False)
    ]
    listed = []
    for each in base.points:
        load = each.load_fractions["main"]
        channels = {name: each.channels[name] for name in ("input_voltage", "input_power")}
        for rail in rails:
            channels[f"output_voltage {rail.name}"] = reading(
                output_voltage(load, rail.voltage), "V", 0.0002 * abs(rail.voltage)
            )
            channels[f"output_current {rail.name}"] = reading(rail.current * load, "A", 0.0006 + 0.001 * load)
            channels[f"ripple {rail.name}"] = reading(0.012 + 0.03 * load, "V", None, 1)
        listed.append(replace(each, channels=channels, load_fractions={rail.name: load for rail in rails}))
    curve = Figure(
        "output_voltage",
        "Deviation of the output voltages from rated",
        Axis("Load", ""),
        Axis("Deviation", ""),
        [
            Series(
                rail.name, list(LOADS), [output_voltage(load * (1 + n / 4), 1.0) - 1 for load in LOADS], [0.0004] * 6
            )
            for n, rail in enumerate(rails)
        ],
        [LimitLine("band", -0.02, "min"), LimitLine("band", 0.02, "max")],
    )
    return replace(
        base, points=listed, figures=[curve, base.figures[0], waveform()], ratings=replace(base.ratings, outputs=rails)
    )


def waveform(samples: int = 4000) -> Figure:
    """Temperature over two hours, as a line of many samples, with one spike."""
    times = [7200.0 * n / samples for n in range(samples)]
    rise = [27.0 * (1 - 2.718281828 ** (-t / 1500)) + 0.2 * ((n * 7919) % 13 / 13 - 0.5) for n, t in enumerate(times)]
    rise[samples // 2] = 33.0
    return Figure(
        "temperature",
        "Temperature rise of the case",
        Axis("Time", "s"),
        Axis("Rise over ambient", "K"),
        [
            Series("case", times, rise, [None] * samples, "trace"),
            Series("case, mean of the last dwell", [6900.0], [26.8], [1.5]),
        ],
        [LimitLine("rise-case", 35.0, "max")],
        "Ambient read beside the unit, 0.3 m away.",
    )


NASTY = {
    "markup": '<img src="x"><para>&amp;</para> & ]]> </b>',
    "formula": "=1+1",
    "controls": "a\x00b\x07c\x1b[31m",
    "right to left": "מספר \u202eABC",
    "emoji": "\N{FIRE}\N{FIRE} rail",
    "wide": "電源ユニット-17",
    "brackets": "((( \\) (",
}


def nasty() -> Record:
    """Texts that would break a page, everywhere a text can stand."""
    base = every_verdict()
    long_serial = "S" * 140 + "-0123456789" * 15
    hostile = " | ".join(NASTY.values())
    findings = [
        replace(
            each,
            name=f"{each.name} {hostile}",
            condition=hostile,
            note=hostile,
            reason=hostile,
            where=hostile,
            formula=hostile,
            asked=hostile if isinstance(each.value, str) else "",
            deviations=[Deviation(hostile), Deviation(f"{hostile} again")],
        )
        for each in base.findings
    ]
    named = [
        replace(figure, title=hostile, caption=hostile, x=replace(figure.x, label=hostile)) for figure in base.figures
    ]
    named = [
        replace(
            figure,
            series=[replace(one, name=hostile) for one in (*figure.series, *figure.series)],
            limits=[replace(limit, label=hostile) for limit in figure.limits],
        )
        for figure in named
    ]
    return replace(
        base,
        unit=Unit(NASTY["markup"] + NASTY["wide"], NASTY["controls"], long_serial),
        findings=findings,
        figures=named,
        notes={name: text for name, text in NASTY.items()} | {NASTY["emoji"]: "x" * 2500},
        health=[replace(base.health[0], text=hostile * 30, remedy=hostile)],
        evidence=[Evidence(hostile, sha("log"), 10**12, 10**9)],
        points=[replace(each, where=hostile, stage=hostile) for each in base.points],
        instruments=[replace(each, device=hostile, accuracy=hostile, serial=long_serial) for each in base.instruments],
    )


def many_findings(count: int = 200) -> Record:
    base = every_verdict()
    listed = [replace(base.findings[n % len(base.findings)], name=f"requirement-{n:03d}") for n in range(count)]
    return replace(base, findings=listed)


def empty() -> Record:
    """Nothing in it but what must be."""
    base = typical()
    return replace(
        base,
        unit=Unit("X", None, "1"),
        verdict="undecided",
        joint_conformity_probability=None,
        findings=[],
        points=[],
        figures=[],
        instruments=[],
        health=[],
        notes={},
        evidence=[],
        limits=LimitsUsed("l.yaml", sha("l"), sha("r")),
        made_by={},
        hazards=[],
        ratings=Ratings("dc", 48.0, None, None, [], None, None),
        test=TestFacts(None, [], 0, None, None, None, None, "the file's name", {}),
    )


def degenerate() -> Record:
    """Figures that charts trip over."""
    volts, share = Axis("Output voltage", "V"), Axis("Load", "")

    def one(
        name: str, xs: list[float], ys: list[float], bars: list[float | None] | None = None, **more: object
    ) -> Figure:
        series = [Series("main", xs, ys, bars or [None] * len(xs))]
        return replace(Figure(name, name, share, volts, series), **more)  # type: ignore[arg-type]

    listed = [
        one("one point", [0.5], [24.0]),
        one("one point with its limit on it", [0.5], [24.0], [0.01], limits=[LimitLine("band", 24.0, "min")]),
        one("equal values", [0.0, 0.5, 1.0], [5.0, 5.0, 5.0], [0.002] * 3),
        one("equal places", [0.5, 0.5, 0.5], [5.0, 5.1, 5.2]),
        one("all zero", [0.0, 0.0], [0.0, 0.0]),
        one("tiny", [0.0, 0.5, 1.0], [1e-9, 3e-9, 2e-9], [1e-10] * 3),
        one("huge", [0.0, 0.5, 1.0], [1e6, 3e6, 2.2e6]),
        one("tiny to huge", [1e-9, 1.0, 1e6], [1e-9, 1.0, 1e6]),
        one("narrow", [0.0, 0.5, 1.0], [24.000001, 24.000002, 24.0000015]),
        one("narrower than a float tells", [0.0, 1.0], [24.0, 24.0 + 4e-15]),
        one("negative", [-1.0, 0.0, 1.0], [-12.1, -12.0, -11.9], limits=[LimitLine("band", -12.24, "min")]),
        one("no points", [], [], limits=[LimitLine("band", 23.5, "min")]),
        one("not finite", [0.0, 0.5, float("nan")], [float("inf"), 24.0, 24.0]),
        one("bar wider than the value", [0.0, 1.0], [0.1, 0.2], [5.0, 4.0]),
        Figure("no series", "no series", share, volts, []),
        replace(waveform(20_000), name="long", title="long"),
        Figure(
            "many series",
            "many series",
            share,
            volts,
            [Series(f"output {n}", [0.0, 0.5, 1.0], [n, n + 0.5, n + 0.2], [0.1] * 3) for n in range(8)],
            [LimitLine(f"limit {n}", 4.0 + n / 8, "max") for n in range(4)],
        ),
        one("far limit", [0.0, 1.0], [0.02, 0.03], limits=[LimitLine("ripple", 120.0, "max")]),
    ]
    return replace(typical(), figures=listed)


# -- figures of overcurrent and temperature, from closed forms


def ripples(count: int, seed: int = 1) -> list[float]:
    """Numbers between -1 and 1 that look like noise, the same every time."""
    state, found = seed, []
    for _ in range(count):
        state = (1_103_515_245 * state + 12_345) % 2**31
        found.append(state / 2**30 - 1)
    return found


def foldback() -> Figure:
    """V over I of a 24 V, 5 A rail: regulated to 6 A, then a straight line back to 1.8 A at nothing."""
    noise = ripples(900)
    up = [(6.0 * n / 400, 24.0 - 0.012 * 6.0 * n / 400) for n in range(400)]
    back = [(6.0 - 4.2 * n / 480, 23.93 * (1 - n / 480)) for n in range(481)]
    places = [(x + 0.02 * e, y + 0.03 * e) for (x, y), e in zip(up + back, noise, strict=False)]
    return Figure(
        "overcurrent main",
        "Output voltage over load current, input 230 V",
        Axis("load current", "A"),
        Axis("output voltage", "V"),
        [
            Series("samples", [x for x, _ in places], [y for _, y in places], [None] * len(places), "dots"),
            Series("regulated branch, fitted", [0.0, 6.5], [24.0, 23.922], [None, None], "line"),
            Series("5 % of rated below it", [0.0, 6.5], [22.8, 22.722], [None, None], "line"),
        ],
        [],
        "Load swept in CR mode, up and down.",
        [
            Mark("onset", 5.79, None, 0.09),
            Mark("short circuit 1.80 A", 1.80, 0.0),
        ],
        [Region("onset allowed, 105 % to 130 %", 5.25, 6.5), Region("below 5 % of rated", y_to=1.2)],
    )


def hiccup() -> Figure:
    """Output current over a quarter of a second: bursts of 8 ms every 60 ms."""
    times = [0.25 * n / 1000 for n in range(1000)]
    noise = ripples(1000, 7)
    amperes = [(7.2 if (t * 1000 + 12) % 60 < 8 else 0.02) + 0.03 * e for t, e in zip(times, noise, strict=True)]
    return Figure(
        "overcurrent main over time",
        "Output current under overload, input 230 V",
        Axis("time", "s"),
        Axis("output current", "A"),
        [Series("output current", times, amperes, [None] * 1000, "trace")],
        [LimitLine("ocp.short_circuit", 7.5, "max")],
        "",
        [Mark("first burst", 0.048), Mark("peak 7.2 A", 0.108, 7.2)],
        [Region("three bursts", 0.048, 0.176)],
    )


def soak(samples: int = 10_000) -> Figure:
    """Two probes and the ambient over four hours, a fit, and the moment from which it counts as settled."""
    times = [14_400.0 * n / samples for n in range(samples)]
    one, two, three = ripples(samples, 3), ripples(samples, 5), ripples(samples, 11)
    decays = [2.718281828 ** (-t / 2700) for t in times]
    coarse = times[:: samples // 60]
    return Figure(
        "temperature",
        "Temperatures of the soak at load 100 %, input 230 V",
        Axis("time", "s"),
        Axis("temperature", "°C"),
        [
            Series("core", times, [23 + 61 * (1 - d) + 0.2 * e for d, e in zip(decays, one, strict=True)], [], "trace"),
            Series("case", times, [23 + 31 * (1 - d) + 0.2 * e for d, e in zip(decays, two, strict=True)], [], "trace"),
            Series("ambient", times, [23 + 0.4 * e for e in three], [], "trace"),
            Series("core, fitted", coarse, [23 + 61 * (1 - 2.718281828 ** (-t / 2700)) for t in coarse], [], "line"),
            Series("mean of the last 30 min", [13_500.0], [83.6], [1.8]),
        ],
        [LimitLine("hot-core max", 110.0, "max")],
        "",
        [Mark("settled: 1 K in 30 min", 10_560.0, None, 300.0)],
        [Region("last 30 min", 12_600.0, 14_400.0)],
    )


def rise() -> Figure:
    """The rise of the case over ambient, in K, with its limit."""
    times = [14_400.0 * n / 500 for n in range(500)]
    noise = ripples(500, 13)
    values = [31 * (1 - 2.718281828 ** (-t / 2700)) + 0.3 * e for t, e in zip(times, noise, strict=True)]
    return Figure(
        "temperature_rise case",
        "Rise of the case over ambient",
        Axis("time", "s"),
        Axis("rise over ambient", "K"),
        [Series("case", times, values, [None] * 500, "trace")],
        [LimitLine("rise-case max", 35.0, "max")],
        "",
        [Mark("with what is still to come", 14_400.0, 31.2)],
    )


def cooling() -> Figure:
    """Winding resistance after switch-off, with the line that leads back to it."""
    times = [6.0 + 5.0 * n for n in range(20)]
    values = [2.41 * (1 - 0.0011 * t + 1.1e-6 * t * t) for t in times]
    line = [float(t) for t in range(0, 110, 5)]
    return Figure(
        "winding_resistance",
        "Winding resistance after switch-off",
        Axis("time from switch-off", "s"),
        Axis("winding resistance", "ohm"),
        [
            Series("readings", times, values, [0.004] * 20),
            Series("fit", line, [2.41 * (1 - 0.0011 * t + 1.1e-6 * t * t) for t in line], [None] * len(line), "line"),
        ],
        [],
        "",
        [Mark("switch-off: 2.410 Ω", 0.0, 2.41)],
    )


def recovery() -> Figure:
    """Output voltage after the overload is removed, with the band it must come back to."""
    times = [100.0 + 0.002 * n for n in range(400)]
    volts = [24.0 * (1 - 2.718281828 ** (-max(0.0, t - 100.1) / 0.06)) for t in times]
    return Figure(
        "recovery main",
        "Output voltage after the overload",
        Axis("time", "s"),
        Axis("output voltage", "V"),
        [Series("output voltage", times, volts, [None] * 400, "dots")],
        [],
        "",
        [Mark("overload removed", 100.1), Mark("in the band", 100.376)],
        [Region("band", y_from=23.76, y_to=24.24)],
    )


def overcurrent_findings() -> list[Finding]:
    shared = [
        Deviation("the load was stepped in CR mode; a sweep in CV mode is what the requirement asks"),
        Deviation("the frequency of the input was not logged"),
    ]
    blank = finding(
        "x", 0.5, 0.88, budget=[], points=[], formula="", min=None, condition="input any", at="input 229.8 V"
    )
    text = replace(
        blank,
        characteristic="overcurrent",
        unit="",
        expanded_uncertainty=None,
        coverage_factor=None,
        degrees_of_freedom=None,
        margin=None,
        conformity_probability=None,
        standard_uncertainty=None,
        deviations=shared,
    )
    amperes = replace(blank, characteristic="overcurrent", unit="A", standard_uncertainty=0.045, deviations=shared)
    warm = replace(blank, condition="load 100 %, input 230 V", at="", degrees_of_freedom=None, margin=26.4, max=110.0)
    return [
        replace(text, name="ocp.behaviour", value="hiccup", asked="hiccup"),
        replace(
            text,
            name="ocp-2.behaviour",
            value="mixed: constant current to 40 % of the voltage, then foldback",
            asked="constant current",
            verdict="fail",
            reason="another behaviour than asked",
        ),
        replace(amperes, name="ocp.onset", value=5.79, expanded_uncertainty=0.09, min=5.25, max=6.5, margin=0.54),
        replace(amperes, name="ocp.short_circuit", value=1.8, expanded_uncertainty=0.02, max=6.5, margin=4.7),
        replace(amperes, name="ocp.recovery", unit="s", value=0.276, expanded_uncertainty=0.002, max=2.0, margin=1.724),
        replace(
            warm,
            name="hot-core",
            characteristic="temperature",
            unit="°C",
            value=83.6,
            expanded_uncertainty=1.8,
            standard_uncertainty=0.9,
            budget=[BudgetLine("temperature core, TC-4: accuracy", "B", 0.87, 0.93, None)],
        ),
        replace(
            warm, name="rise-case", characteristic="temperature_rise", unit="K", value=31.2, expanded_uncertainty=2.4
        ),
    ]


def characteristics() -> Record:
    """Overcurrent and temperature: eight figures, texts and temperatures as values, shared deviations."""
    base = typical()
    published = [
        "the test voltage's distortion was not logged; at most 2 % total harmonic content is asked",
        "the frequency was not logged; 50 Hz ± 1 % is asked",
        "warm-up: 12 min at full load are in the log; 30 min are asked",
        "stability over 5 min was not shown at load 25 %: the log has 2 min there",
        "air speed near the unit is not logged; at most 0.5 m/s is asked",
        "the ambient was 26.3 °C at its highest; 23 °C ± 5 K is asked",
        "the order of loads was 25, 50, 75, 100 %; from the highest to the lowest is asked",
        "one unit's result is not a represented value for a model",
    ]
    of_set = [
        finding(f"eps.{name}", load, 0.85, deviations=[Deviation(text) for text in published])
        for name, load in zip(
            ("average_efficiency", "efficiency-25", "efficiency-50", "efficiency-75", "efficiency-100"),
            (0.75, 0.25, 0.5, 0.75, 1.0),
            strict=True,
        )
    ]
    return replace(
        base,
        verdict="rejected",
        joint_conformity_probability=None,
        findings=[*overcurrent_findings(), *of_set],
        figures=[*base.figures, foldback(), hiccup(), recovery(), soak(), rise(), cooling()],
    )


def annotated() -> Record:
    """Figures whose regions, marks and dots a chart could trip over."""
    amperes, volts, time = Axis("load current", "A"), Axis("output voltage", "V"), Axis("time", "s")
    nan, inf = float("nan"), float("inf")
    hostile = " | ".join(NASTY.values())
    dots = [Series("cloud", ripples(10_000, 3), ripples(10_000, 17), [None] * 10_000, "dots")]
    one = [Series("a", [1.0], [2.0], [None], "line")]
    long = [Series("a", [n / 1000 for n in range(10_000)], ripples(10_000), [None] * 10_000, "line")]
    few = [Series("a", [0.0, 1.0, 2.0], [1.0, 2.0, 1.5], [0.1] * 3)]
    spread = [Mark(f"place {n}", 1.0 + n / 50, 1.5 + n / 50) for n in range(12)]
    return replace(
        typical(),
        figures=[
            Figure("cloud", "cloud", amperes, volts, dots, [], "", [Mark("middle", 0.0, 0.0, 0.4)], [Region("all")]),
            Figure("one point", "one point", amperes, volts, one, [], "", [Mark("it", 1.0, 2.0, inf)]),
            Figure(
                "long line", "long line", time, volts, long, [], "", [Mark("half", 5.0)], [Region("early", x_to=3.0)]
            ),
            Figure("nothing", "nothing", time, volts, [], [], "", [Mark("moment", 5.0)], [Region("part", 2.0, 3.0)]),
            Figure("crowded", "crowded", amperes, volts, few, [LimitLine("m", 1.6, "max")], "", spread),
            Figure(
                "not finite",
                "not finite",
                time,
                volts,
                few,
                [LimitLine("n", nan, "min", inf, nan)],
                "",
                [Mark("nan", nan), Mark("inf", 1.0, inf), Mark("whole", 1.0, None, nan), Mark("wide", 1.0, 1.5, 1e9)],
                [Region("nan", nan, inf, nan, -inf), Region("reversed", 2.0, 1.0, 1.8, 1.2), Region("point", 1.0, 1.0)],
            ),
            Figure(
                "hostile",
                hostile,
                replace(amperes, label=hostile),
                volts,
                [replace(few[0], name=hostile), replace(few[0], name=hostile, kind="dots")],
                [LimitLine(hostile, 1.8, "max")],
                hostile,
                [Mark(hostile, 1.0, 2.0), Mark(hostile, 1.5), Mark("", 0.5, 1.0)],
                [Region(hostile, 0.5, 1.0), Region("")],
            ),
            Figure("far", "far", time, volts, few, [], "", [Mark("far", 1e6, 1e6)], [Region("huge", 0.0, 1e12)]),
        ],
    )
