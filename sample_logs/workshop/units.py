"""The invented products, and the instruments of the workshop's benches.

The bounds of the instruments are those that the files under limits/ state as accuracies; a test holds them together.
"""

from __future__ import annotations

from dataclasses import replace

from workshop.instruments import Meter
from workshop.overload import ConstantCurrent, Foldback, Hiccup
from workshop.products import Network, Port, Product
from workshop.sequence import Bench
from workshop.soak import Winding

__all__ = [
    "ADAPTER",
    "ADAPTER_LIMITER",
    "ADAPTER_WINDING",
    "BENCH_1",
    "BENCH_2",
    "BENCH_3",
    "BENCH_4",
    "BENCH_SUPPLY",
    "BENCH_SUPPLY_LIMITER",
    "BLOCKED",
    "CONVERTER",
    "CONVERTER_LIMITER",
    "CONVERTER_WINDING",
    "TWO_OUTPUT",
    "with_port",
]

ADAPTER = Product(
    name="Quillfen A60-24",
    revision="C",
    rated_input=230.0,
    outputs={
        "main": Port(
            rated_voltage=24.0,
            rated_current=2.5,
            no_load_voltage=24.11,
            resistance=0.038,
            line=0.004,
            drift=-15e-6,
            linear_loss=1.1,
            square_loss=0.636,
            ripple=0.046,
            ripple_slope=0.014,
        )
    },
    fixed_loss=0.55,
    standby=0.062,
    burst=0.7,
    heat=Network(core_to_case=3.5, case_to_ambient=4.4, core_capacity=95.0, case_capacity=380.0),
    core_line=0.25,
    copper_line=0.6,
    power_factor=0.58,
)
ADAPTER_LIMITER = Hiccup(onset=3.08, burst=3.6, period=0.83, on=0.17, rise=0.015)
ADAPTER_WINDING = Winding(resistance=0.412)

BENCH_SUPPLY = Product(
    name="Wrenlow B30-3",
    revision="B",
    rated_input=230.0,
    outputs={
        "main": Port(
            rated_voltage=30.0,
            rated_current=3.0,
            no_load_voltage=30.008,
            resistance=0.0021,
            line=0.001,
            drift=-3e-6,
            linear_loss=3.1,
            square_loss=0.85,
            ripple=0.0016,
            ripple_slope=0.0004,
        )
    },
    fixed_loss=8.4,
    heat=Network(core_to_case=0.9, case_to_ambient=1.1, core_capacity=420.0, case_capacity=1100.0),
    core_line=0.9,
    copper_line=-0.4,
    power_factor=0.69,
)
BENCH_SUPPLY_LIMITER = ConstantCurrent(limit=3.21, slope=0.0012, rise=0.06)
BLOCKED = Network(
    core_to_case=0.9, case_to_ambient=1.65, core_capacity=420.0, case_capacity=1100.0
)  # dust in its slots

CONVERTER = Product(
    name="Pellmarsh D12-8",
    revision="A",
    rated_input=48.0,
    outputs={
        "main": Port(
            rated_voltage=12.0,
            rated_current=8.0,
            no_load_voltage=12.035,
            resistance=0.0031,
            line=0.003,
            drift=-20e-6,
            linear_loss=0.24,
            square_loss=0.046,
            ripple=0.018,
            ripple_slope=0.0022,
        )
    },
    fixed_loss=0.88,
    heat=Network(core_to_case=3.2, case_to_ambient=4.6, core_capacity=40.0, case_capacity=150.0),
    core_line=0.7,
    copper_line=0.2,
)
CONVERTER_LIMITER = Foldback(knee=9.45, short=3.4, rise=0.04)
CONVERTER_WINDING = Winding(resistance=0.0286)

TWO_OUTPUT = Product(
    name="Skerrow M38",
    revision="D",
    rated_input=230.0,
    outputs={
        "logic": Port(
            rated_voltage=5.0,
            rated_current=4.0,
            no_load_voltage=5.062,
            resistance=0.0075,
            line=0.002,
            drift=-20e-6,
            cross=0.002,
            linear_loss=0.36,
            square_loss=0.11,
            ripple=0.019,
            ripple_slope=0.0035,
        ),
        "drive": Port(
            rated_voltage=12.0,
            rated_current=1.5,
            no_load_voltage=12.21,
            resistance=0.055,
            line=0.004,
            drift=-25e-6,
            cross=-0.016,  # the unregulated one of the two rises with the other's load
            linear_loss=0.66,
            square_loss=0.24,
            ripple=0.038,
            ripple_slope=0.012,
        ),
    },
    fixed_loss=0.62,
    standby=0.088,
    burst=0.9,
    heat=Network(core_to_case=3.0, case_to_ambient=3.9, core_capacity=80.0, case_capacity=260.0),
    core_line=0.25,
    copper_line=0.5,
    power_factor=0.56,
)


def with_port(product: Product, output: str = "main", **changes: float) -> Product:
    """The same product with another value somewhere in one output: a fault, or a unit of its own."""
    return replace(product, outputs={**product.outputs, output: replace(product.outputs[output], **changes)})


# Bench 1: adapters. The voltage is read at the load; the leads are put back by the limits file.
BENCH_1 = Bench(
    meters={
        "input_voltage": Meter(gain=0.001, noise=0.05, step=0.01),
        "input_current": Meter(gain=0.002, offset=0.0005, noise=0.0003, step=0.0001),
        "input_power": Meter(gain=0.001, offset=0.01, noise=0.003, relative_noise=2e-4, memory=0.4, step=0.001),
        "power_factor": Meter(offset=0.005, noise=0.001, step=0.001),
        "output_voltage": Meter(gain=0.0005, offset=0.012, noise=0.0012, step=0.001),
        "output_current": Meter(gain=0.0005, offset=0.002, noise=0.0005, step=0.0001),
        "ripple": Meter(gain=0.03, offset=0.001, noise=0.0008, step=0.0001),
        "temperature": Meter(offset=1.5, noise=0.05, step=0.01),
        "ambient_temperature": Meter(offset=1.5, noise=0.04, step=0.01),
        "winding_resistance": Meter(gain=0.002, offset=0.0001, noise=0.00005, step=0.00001),
    },
    leads=0.0126,
    ambient=23.4,
    supply_wander=0.0006,
    seed=1,
)

# Bench 2: a better voltmeter, sensed at the terminals.
BENCH_2 = Bench(
    meters={
        "input_voltage": Meter(gain=0.001, noise=0.08, step=0.1),
        "input_current": Meter(gain=0.002, offset=0.0005, noise=0.0004, step=0.0001),
        "input_power": Meter(gain=0.0008, offset=0.012, noise=0.006, relative_noise=2e-4, memory=0.5, step=0.001),
        "power_factor": Meter(offset=0.005, noise=0.001, step=0.001),
        "output_voltage": Meter(gain=0.0001, offset=0.0006, noise=0.00018, step=0.0001),
        "output_current": Meter(gain=0.0005, offset=0.0015, noise=0.0006, step=0.0001),
        "ripple": Meter(gain=0.03, offset=0.0002, noise=0.00006, step=0.00001),
        "temperature": Meter(offset=1.5, noise=0.05, step=0.01),
        "ambient_temperature": Meter(offset=1.5, noise=0.04, step=0.01),
    },
    ambient=22.1,
    supply_wander=0.0005,
    seed=2,
)

# Bench 3: direct current in; both currents across shunts read by a 16-bit converter of +-0.256 V.
# Gain: tolerance 0.1 % and 50 ppm/K * 5 K/W * at most 0.7 W. Offset 20 uV over the shunt.
BENCH_3 = Bench(
    meters={
        "input_voltage": Meter(gain=0.0004, offset=0.006, noise=0.004, step=0.001),
        "input_current": Meter(gain=0.001, offset=0.0004, noise=0.0003, step=0.512 / 65536 / 0.05),
        "output_voltage": Meter(gain=0.0003, offset=0.0015, noise=0.0004, step=0.0001),
        "output_current": Meter(gain=0.001, offset=0.002, noise=0.0012, step=0.512 / 65536 / 0.01),
        "ripple": Meter(gain=0.03, offset=0.001, noise=0.0005, step=0.0001),
        "temperature": Meter(offset=1.5, noise=0.05, step=0.1),
        "ambient_temperature": Meter(offset=1.5, noise=0.04, step=0.1),
        "winding_resistance": Meter(gain=0.001, offset=5e-6, noise=2e-6, step=1e-6),
    },
    ambient=24.3,
    supply_wander=0.0008,
    seed=3,
)

# Bench 4: instruments like those of bench 1, another logger.
BENCH_4 = replace(BENCH_1, seed=4)
