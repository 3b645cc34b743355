"""From logged bench data of a power source to a decision and a test report."""

__version__ = "0.1.0"
