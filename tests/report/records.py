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
    Output,
    Point,
    Ratings,
    Reading,
    Record,
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
            Series("case", times, rise, [None] * samples, "line"),
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
