"""Axes and charts: where things come to lie."""

from __future__ import annotations

import math

import pytest
import report_records as records
from hypothesis import given
from hypothesis import strategies as st

from acceptance.printing import MINUS, Scale, scale_for
from acceptance.record import Axis, Figure, LimitLine, Series
from acceptance.report.axes import axis_for, decimate, nice_step
from acceptance.report.charts import Chart
from acceptance.report.pen import Pen
from acceptance.report.style import ACCENT, RED

PLAIN = Scale(0, "V")


class Lines:
    """A canvas that keeps what is drawn on it."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch) -> None:
        self.strokes: list[tuple[list[tuple[float, float]], tuple[float, float, float]]] = []
        self.texts: list[tuple[float, float, str]] = []
        self.circles: list[tuple[float, float]] = []
        monkeypatch.setattr(
            Pen, "line", lambda _, points, colour, width, dash=(): self.strokes.append((list(points), colour))
        )
        monkeypatch.setattr(Pen, "text", lambda _, x, y, text, style, align="left": self.texts.append((x, y, text)))
        monkeypatch.setattr(Pen, "circle", lambda _, centre, radius, **how: self.circles.append(centre))


@pytest.fixture
def lines(monkeypatch):
    return Lines(monkeypatch)


@pytest.mark.parametrize(
    ("span", "most", "step"), [(10, 5, 2), (1, 5, 0.2), (7, 5, 2), (0.03, 6, 0.005), (100, 4, 50), (9, 9, 1)]
)
def test_nice_step_is_one_two_or_five(span, most, step):
    """The smallest such step that does not give too many ticks."""
    assert nice_step(span, most) == pytest.approx(step, rel=1e-12)


@given(
    low=st.floats(-1e6, 1e6),
    span=st.floats(1e-9, 1e6),
    exponent=st.sampled_from([-6, -3, -2, 0, 3]),
    most=st.integers(2, 10),
)
def test_axis_shows_all_values_and_its_ticks_are_true(low, span, exponent, most):
    """Values lie within the axis, ticks too; each label says where its tick stands."""
    axis = axis_for([low, low + span], Scale(exponent, ""), (50.0, 250.0), most=most)

    for value in (low, low + span):
        assert 50.0 - 1e-6 <= axis.place(value) <= 250.0 + 1e-6
    assert len(axis.ticks) <= most + 3
    step = axis.ticks[1] - axis.ticks[0] if len(axis.ticks) > 1 else abs(axis.high - axis.low)
    for tick, label in zip(axis.ticks, axis.labels, strict=True):
        assert 50.0 - 1e-6 <= axis.place(tick) <= 250.0 + 1e-6
        assert float(label.replace(MINUS, "-")) * 10.0**exponent == pytest.approx(
            tick, abs=1e-5 * step + 1e-5 * abs(tick)
        )


def test_axis_places_values_in_proportion():
    """A closed form: the ends, and a quarter of the way."""
    axis = axis_for([0.0, 8.0], PLAIN, (100.0, 300.0), most=5, padding=0.0)

    assert (axis.low, axis.high) == (0.0, 8.0)
    assert axis.place(0.0) == pytest.approx(100.0)
    assert axis.place(2.0) == pytest.approx(150.0)
    assert axis.labels == ("0", "2", "4", "6", "8")


@pytest.mark.parametrize("values", [[5.0], [5.0, 5.0], [0.0], [-3.0], [1e-9], [1e6], [24.0, 24.0 + 4e-15]])
def test_axis_of_a_single_value_has_it_in_the_middle(values):
    """Nothing to divide by zero; at least two ticks."""
    axis = axis_for(values, PLAIN, (0.0, 100.0), most=5)

    assert axis.place(values[0]) == pytest.approx(50.0, abs=5.0)
    assert len(axis.ticks) >= 2
    assert len(set(axis.labels)) == len(axis.labels)


def test_axis_labels_are_in_the_unit_shown():
    """0.88 as a ratio stands at 88."""
    axis = axis_for([0.86, 0.94], scale_for("", []), (0.0, 100.0), most=5)

    assert "88" in axis.labels
    assert axis.ticks[axis.labels.index("88")] == pytest.approx(0.88)


@given(st.lists(st.floats(-1e3, 1e3), min_size=1, max_size=3000))
def test_decimate_keeps_extremes_and_ends(values):
    """Few enough points, in order, and no spike is lost."""
    kept = decimate(values, buckets=100)

    assert kept == sorted(set(kept))
    assert len(kept) <= 202
    assert kept[0] == 0
    assert kept[-1] == len(values) - 1
    assert min(values[n] for n in kept) == min(values)
    assert max(values[n] for n in kept) == max(values)


def test_chart_draws_a_limit_at_its_value(lines):
    """A limit half-way between two points of data lies half-way between their marks."""
    figure = Figure(
        "eta",
        "eta",
        Axis("Load", ""),
        Axis("Efficiency", ""),
        [Series("a", [0.25, 1.0], [0.86, 0.92], [None, None])],
        [LimitLine("eff", 0.89, "min")],
    )
    Chart(figure, 240.0).draw(Pen(None), 50.0, 700.0)

    limit = next(points for points, colour in lines.strokes if colour == RED)
    low, high = (y for _, y in lines.circles)
    assert limit[0][1] == limit[1][1] == pytest.approx((low + high) / 2, abs=1e-6)
    assert any("≥ 89 %" in text for _, _, text in lines.texts)


def test_chart_draws_a_limit_only_where_it_holds(lines):
    """From the first to the last place of its condition, and wide enough to see at a single one."""
    series = [Series("a", [0.0, 0.5, 1.0], [1.0, 2.0, 3.0], [None] * 3)]
    limits = [LimitLine("part", 2.0, "max", 0.5, 1.0), LimitLine("one", 1.5, "max", 0.5, 0.5)]
    Chart(Figure("f", "f", Axis("Load", ""), Axis("y", "V"), series, limits), 240.0).draw(Pen(None), 0.0, 700.0)

    part, one = (points for points, colour in lines.strokes if colour == RED)
    half, full = lines.circles[1][0], lines.circles[2][0]
    assert part[0][0] == pytest.approx(half)
    assert part[1][0] == pytest.approx(full)
    assert (one[0][0] + one[1][0]) / 2 == pytest.approx(half)
    assert one[1][0] - one[0][0] == pytest.approx(20.0)


def test_chart_says_when_error_bars_are_hidden(lines):
    """Bars below the size of a mark are named; larger ones are not."""

    def chart(bar: float) -> list[str]:
        lines.texts.clear()
        series = [Series("a", [0.0, 1.0], [1.0, 2.0], [bar, bar])]
        Chart(Figure("f", "f", Axis("x", "A"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)
        return [text for _, _, text in lines.texts]

    assert any("smaller than the marks" in text for text in chart(0.001))
    assert not any("smaller than the marks" in text for text in chart(0.2))


@pytest.mark.parametrize("count", [1, 2, 8])
def test_chart_has_a_legend_only_for_several_series(lines, count):
    """A single series needs no key."""
    series = [Series(f"rail {n}", [0.0, 1.0], [1.0 + n, 2.0 + n], [None, None]) for n in range(count)]
    Chart(Figure("f", "f", Axis("x", "A"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)

    named = [text for _, _, text in lines.texts if text.startswith("rail")]
    assert len(named) == (count if count > 1 else 0)


@pytest.mark.parametrize("figure", records.degenerate().figures, ids=lambda figure: figure.name)
def test_degenerate_figures_stay_within_their_place(figure, lines):
    """One point, equal values, nothing, the very small and the very large: every coordinate is finite and inside."""
    chart = Chart(figure, 240.0)
    chart.draw(Pen(None), 50.0, 700.0)

    for points, _ in lines.strokes:
        for x, y in points:
            assert math.isfinite(x)
            assert 50.0 <= x <= 290.5
            assert 700.0 - chart.height <= y <= 700.0
    for x, y, text in lines.texts:
        assert math.isfinite(x), text
        assert 700.0 - chart.height - 1 <= y <= 700.0, text


def test_points_that_are_no_numbers_are_counted_not_hidden(lines):
    """What is left out is said."""
    series = [Series("a", [0.0, 1.0, 2.0], [1.0, float("nan"), float("inf")], [None, None, float("nan")])]
    Chart(Figure("f", "f", Axis("x", "A"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)

    assert any(text.startswith("2 points of the record") for _, _, text in lines.texts)


def test_curve_joins_repeats_and_not_what_differs(lines):
    """A repeated place is led through in the middle; two conditions at one place are not joined."""

    def curve(ys: list[float]) -> list[tuple[float, float]]:
        lines.strokes.clear()
        lines.circles.clear()
        series = [Series("a", [1.0, 0.0, 0.5, 1.0], ys, [None] * 4)]
        Chart(Figure("f", "f", Axis("x", "A"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)
        return [points for points, colour in lines.strokes if colour == ACCENT][0]

    joined = curve([3.00, 1.0, 2.0, 3.02])
    assert [x for x, _ in joined] == sorted(x for x, _ in joined)
    assert len(joined) == 3
    assert joined[-1][1] == pytest.approx((lines.circles[0][1] + lines.circles[3][1]) / 2)
    assert curve([3.0, 1.0, 2.0, 1.5]) == []
