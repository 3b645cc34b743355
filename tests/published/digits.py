"""Values as printed: their last digit sets how closely they can be met."""

from __future__ import annotations

from decimal import Decimal
from typing import Any

import pytest


def last_digit(text: str) -> float:
    """What one unit of the last digit is worth: 0.001 for "0.071", 1 for "93"."""
    return 10.0 ** int(Decimal(text).as_tuple().exponent)


def printed(text: str, *, digits: float = 0.5) -> Any:
    """What agrees with a printed value: half a unit of its last digit, or as many as `digits` says.

    More than half only where the document itself calculated with rounded numbers.
    """
    # a hair more, for values that were rounded at exactly half a digit
    return pytest.approx(float(text), rel=0, abs=digits * last_digit(text) * (1 + 1e-6))
