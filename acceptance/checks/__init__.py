"""One module a characteristic: points and its requirements in, outcomes that are not yet verdicts out.

A new check is a function `check(requirements, points) -> CheckResult` in a module of its own, and a line in CHECKS.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

from acceptance.checks.efficiency import check_efficiency
from acceptance.checks.no_load_power import check_no_load_power
from acceptance.checks.outcome import CheckResult
from acceptance.checks.output_voltage import check_output_voltage
from acceptance.checks.overcurrent import check_overcurrent
from acceptance.checks.published import check_published
from acceptance.checks.regulation import check_line_regulation, check_load_regulation
from acceptance.checks.ripple import check_ripple
from acceptance.checks.temperature import check_temperature, check_temperature_rise

__all__ = ["CHECKS"]

Check = Callable[..., CheckResult]

# characteristic -> what looks at it, in the order of the report
CHECKS: Mapping[str, Check] = {
    "published": check_published,
    "efficiency": check_efficiency,
    "no_load_power": check_no_load_power,
    "load_regulation": check_load_regulation,
    "line_regulation": check_line_regulation,
    "output_voltage": check_output_voltage,
    "overcurrent": check_overcurrent,
    "temperature_rise": check_temperature_rise,
    "temperature": check_temperature,
    "ripple": check_ripple,
}
