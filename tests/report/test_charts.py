"""Axes and charts: where things come to lie."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
import report_records as records
from hypothesis import given
from hypothesis import strategies as st

from acceptance.printing import MINUS, Scale, scale_for
from acceptance.record import Axis, Figure, LimitLine, Mark, Region, Series
from acceptance.report.annotations import GROUND, Plot
from acceptance.report.axes import axis_for, decimate, decimate_cloud, decimate_path, nice_step
from acceptance.report.charts import Chart
from acceptance.report.curves import draw_series
from acceptance.report.pen import Pen
from acceptance.report.placing import Crowd, Label, place_labels
from acceptance.report.style import ACCENT, FURNITURE, RED

PLAIN = Scale(0, "V")


class Lines:
    """A canvas that keeps what is drawn on it."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch) -> None:
        self.strokes: list[tuple[list[tuple[float, float]], tuple[float, float, float]]] = []
        self.texts: list[tuple[float, float, str]] = []
        self.circles: list[tuple[float, float]] = []
        self.boxes: list[tuple[tuple[float, float, float, float], object]] = []
        self.strokes_apart: list[list[tuple[float, float, float, float]]] = []
        monkeypatch.setattr(
            Pen, "line", lambda _, points, colour, width, dash=(): self.strokes.append((list(points), colour))
        )
        monkeypatch.setattr(Pen, "text", lambda _, x, y, text, style, align="left": self.texts.append((x, y, text)))
        monkeypatch.setattr(Pen, "circle", lambda _, centre, radius, **how: self.circles.append(centre))
        monkeypatch.setattr(Pen, "rectangle", lambda _, box, fill=None, **how: self.boxes.append((box, fill)))
        monkeypatch.setattr(Pen, "lines", lambda _, segments, colour, width: self.strokes_apart.append(list(segments)))


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


@pytest.mark.parametrize(
    "figure",
    [*records.degenerate().figures, *records.annotated().figures, *records.characteristics().figures],
    ids=lambda figure: figure.name,
)
def test_degenerate_figures_stay_within_their_place(figure, lines):
    """One point, equal values, nothing, the very small and the very large: every coordinate is finite and inside."""
    chart = Chart(figure, 240.0)
    chart.draw(Pen(None), 50.0, 700.0)

    for points, _ in lines.strokes:
        for x, y in points:
            assert math.isfinite(x)
            assert 50.0 <= x <= 290.5
            assert 700.0 - chart.height <= y <= 700.0
    for group in lines.strokes_apart:
        for a, b, c, d in group:
            assert 50.0 <= min(a, c) <= max(a, c) <= 290.5
            assert 700.0 - chart.height <= min(b, d) <= max(b, d) <= 700.0
    for (left, low, wide, high), _ in lines.boxes:
        assert 50.0 - 1e-6 <= left <= left + wide <= 290.5
        assert 700.0 - chart.height <= low <= low + high <= 700.0
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


# -- marks, regions, dots, traces


FLAT = [Series("a", [0.0, 1.0, 2.0], [0.0, 1.0, 2.0], [None] * 3)]


def drawn(lines: Lines, *, series: list[Series] = FLAT, x: str = "ohm", **more: object) -> Chart:
    """A chart of a straight line through three marks, drawn at (0, 700)."""
    figure = Figure("f", "f", Axis("x", x), Axis("y", "V"), series, **more)  # type: ignore[arg-type]
    chart = Chart(figure, 240.0)
    chart.draw(Pen(None), 0.0, 700.0)
    return chart


def test_region_lies_between_its_edges(lines):
    """From the second mark to the third, and from the plot's lower edge to the second."""
    drawn(lines, regions=[Region("window", 1.0, 2.0, None, 1.0)])

    (left, low, wide, high), _ = next(box for box in lines.boxes if box[1] == GROUND)
    first, second, third = lines.circles
    assert (left, left + wide) == pytest.approx((second[0], third[0]))
    assert low + high == pytest.approx(second[1])
    assert low < first[1] + 1e-6
    edges = [(left, low, left, low + high), (left + wide, low, left + wide, low + high)]
    borders = next(group for group in lines.strokes_apart if any(s[:4] == pytest.approx(edges[0]) for s in group))
    assert any(s == pytest.approx(edges[1]) for s in borders)


@pytest.mark.parametrize("name", ["limiter.recovery", "limiter.short_circuit"])
def test_a_name_is_not_broken_for_a_narrow_region(name, lines):
    """It stands beside a region that is too narrow for it."""
    drawn(lines, regions=[Region(name, 1.95, 2.0, 0.5, 1.0)])

    assert name in [text for _, _, text in lines.texts]


def test_region_without_edges_fills_the_plot(lines):
    """Null means the edge of the plot, and such an edge has no line of its own."""
    drawn(lines, regions=[Region("", None, None, 0.5, None)])

    (left, low, wide, high), _ = next(box for box in lines.boxes if box[1] == GROUND)
    assert left < lines.circles[0][0] + 1e-6
    assert left + wide > lines.circles[2][0]
    assert low == pytest.approx((lines.circles[0][1] + lines.circles[1][1]) / 2)
    assert [(left, low, left + wide, low)] in [[pytest.approx(s) for s in group] for group in lines.strokes_apart]


def test_mark_is_a_ring_at_its_place(lines):
    """Half-way between the first two marks of the series."""
    drawn(lines, marks=[Mark("knee", 0.5, 0.5)])

    first, second, _, ring = lines.circles
    assert ring == pytest.approx(((first[0] + second[0]) / 2, (first[1] + second[1]) / 2))
    assert any(text == "knee" for _, _, text in lines.texts)


def test_mark_without_y_is_a_line_over_the_whole_height_with_its_uncertainty(lines):
    """At 1, with a bar from 0.5 to 1.5."""
    drawn(lines, marks=[Mark("onset", 1.0, None, 0.5)])

    upright = next(points for points, _ in lines.strokes if len(points) == 2 and points[0][0] == points[1][0])
    first, second, third = lines.circles
    assert upright[0][0] == pytest.approx(second[0])
    assert upright[0][1] <= first[1]
    assert upright[1][1] >= third[1]
    bar = next(s for group in lines.strokes_apart for s in group if s[2] - s[0] == pytest.approx(second[0] - first[0]))
    assert (bar[0] + bar[2]) / 2 == pytest.approx(second[0])


def test_mark_within_its_uncertainty_beyond_the_plot_is_cut_at_the_edge(lines):
    """The axis shows the data; a bar of a thousand is no reason to shrink them."""
    drawn(lines, marks=[Mark("wide", 1.0, 1.0, 1e3)])

    assert lines.circles[2][0] - lines.circles[0][0] > 150
    assert all(-1 <= s[0] <= s[2] <= 240.5 for group in lines.strokes_apart for s in group if s[1] == s[3])


def test_dots_have_no_line_and_no_bars(lines):
    """Samples that nothing joins, each where it was read."""
    drawn(lines, series=[replace(FLAT[0], kind="dots", expanded_uncertainty=[0.1] * 3)])

    assert not lines.circles
    assert not [points for points, colour in lines.strokes if len(points) > 2]
    dots = next(group for group in lines.strokes_apart if len(group) == 3 and all(s[:2] == s[2:] for s in group))
    assert dots[1][0] == pytest.approx((dots[0][0] + dots[2][0]) / 2)


def test_legend_names_series_and_neither_marks_nor_regions(lines):
    """One series with marks has no key; the marks' labels stand in the plot once."""
    drawn(lines, marks=[Mark("knee", 0.5, 0.5)], regions=[Region("window", 1.0, 2.0)])

    texts = [text for _, _, text in lines.texts]
    assert texts.count("knee") == texts.count("window") == 1
    assert "a" not in texts


def test_a_fitted_line_is_heavier_than_the_trace_it_was_fitted_to(monkeypatch):
    """Both must be seen where they lie on one another."""
    drawn: list[tuple[float, tuple[float, float, float]]] = []
    monkeypatch.setattr(Pen, "line", lambda _, points, colour, width, dash=(): drawn.append((width, colour)))
    axis = axis_for([0.0, 99.0], PLAIN, (0.0, 100.0), most=5)
    places = [float(n) for n in range(100)]

    for kind in ("trace", "line"):
        draw_series(object.__new__(Pen), Series("case", places, places, [None] * 100, kind), 0, Plot(axis, axis))

    (trace, light), (fit, dark) = drawn
    assert trace < fit
    assert sum(light) > sum(dark)


@pytest.mark.parametrize("lowest", [2.0, 0.0, -0.004])
def test_axis_of_a_current_begins_at_zero(lowest, lines):
    """Whatever part of the curve was swept; a reading of noise below zero moves it by no more than that."""
    series = [Series("v", [lowest, 3.0, 4.0], [24.0, 24.0, 12.0], [None] * 3)]
    drawn(lines, series=series, x="A")

    ticks = {text: x for x, y, text in lines.texts if text in ("0", "1", "2", "3", "4")}
    per_ampere = ticks["2"] - ticks["1"]
    assert min(x for points, _ in lines.strokes for x, _ in points) >= ticks["0"] - 0.02 * per_ampere
    assert lines.circles[0][0] == pytest.approx(ticks["0"] + lowest * per_ampere)


@pytest.mark.parametrize(
    ("last", "title", "tick"),
    [
        (0.25, "Time (ms)", "100"),
        (100.0, "Time (s)", "20"),
        (3600.0, "Time (min)", "15"),
        (7200.0, "Time (min)", "60"),
        (14_400.0, "Time (h)", "3"),
    ],
)
def test_time_axis_is_in_a_unit_that_suits_it(last, title, tick, lines):
    """And a tick lies where its label says."""
    series = [Series("a", [0.0, last], [1.0, 2.0], [None] * 2)]
    Chart(Figure("f", "f", Axis("time", "s"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)

    unit = {"ms": 1e-3, "s": 1.0, "min": 60.0, "h": 3600.0}[title[6:-1]]
    place = next(x for x, _, text in lines.texts if text == tick and x > 20)
    begin, end = lines.circles[0][0], lines.circles[1][0]
    assert title in [text for _, _, text in lines.texts]
    assert place == pytest.approx(begin + float(tick) * unit / last * (end - begin), abs=0.01)


@pytest.mark.parametrize(
    ("limit", "text"),
    [(35.0, "≤ 35 V"), (24.4875, "≤ 24.4875 V"), (100.54098901098, "≤ 100.54 V"), (24.48, "≤ 24.48 V")],
)
def test_limit_worked_out_for_a_figure_has_five_digits(limit, text, lines):
    """One that was stated is printed as it is."""
    drawn(lines, limits=[LimitLine("band", limit, "max")])

    assert f"band {text}" in [drawn_text for _, _, drawn_text in lines.texts]


def test_few_dots_lie_above_a_line_and_many_below(monkeypatch):
    """Thirty readings are to be seen beside their fit; a cloud of samples is not to hide it."""
    order: list[str] = []
    monkeypatch.setattr(Pen, "text", lambda *_, **how: None)
    monkeypatch.setattr(Pen, "line", lambda _, points, *style, dash=(): order.append("line") if dash else None)
    monkeypatch.setattr(
        Pen,
        "lines",
        lambda _, strokes, *style: order.append("dots") if [s for s in strokes if s[:2] == s[2:]] else None,
    )
    for count, expected in ((30, ["line", "dots"]), (300, ["dots", "line"])):
        order.clear()
        places = [float(n) for n in range(count)]
        series = [Series("a", places, places, [], "dots"), Series("fit", [0.0, 9.0], [0.0, 9.0], [], "line")]
        Chart(Figure("f", "f", Axis("x", "s"), Axis("y", "V"), series), 240.0).draw(Pen(None), 0.0, 700.0)
        assert order[-2:] == expected


# -- labels


AREA = (30.0, 10.0, 260.0, 140.0)
INSIDE = st.tuples(st.floats(30.0, 260.0), st.floats(10.0, 140.0))


@given(anchors=st.lists(INSIDE, max_size=40), text=st.text(alphabet="abc W", min_size=1, max_size=30), data=st.data())
def test_labels_lie_inside_and_never_on_one_another(anchors, text, data):
    """Whatever is asked; one that finds no room is not placed."""
    crowd = Crowd(AREA)
    crowd.add_path(data.draw(st.lists(INSIDE, max_size=10)))
    labels = [Label((text,), FURNITURE, (x, y, x, y), ((x + 2, y + 2), (x - 40, y - 12)), text) for x, y in anchors]

    boxes = [box for box in place_labels(labels, crowd, AREA) if box is not None]

    for n, one in enumerate(boxes):
        assert AREA[0] <= one[0] <= one[2] <= AREA[2] + 1e-9
        assert AREA[1] <= one[1] <= one[3] <= AREA[3] + 1e-9
        for other in boxes[n + 1 :]:
            assert one[2] <= other[0] or other[2] <= one[0] or one[3] <= other[1] or other[3] <= one[1]
    if len(anchors) == 1:
        assert len(boxes) == 1


def test_label_keeps_off_the_data():
    """Of two places it takes the one that hides nothing, though it is the second best."""
    crowd = Crowd(AREA)
    crowd.add_path([(100.0, 84.0), (140.0, 84.0)])
    label = Label(("knee",), FURNITURE, (100.0, 75.0, 100.0, 75.0), ((102.0, 80.0), (80.0, 60.0)), "knee")

    (box,) = place_labels([label], crowd, AREA)

    assert box is not None
    assert box[:2] == (80.0, 60.0)


def test_what_cannot_be_labelled_is_told_beneath(lines):
    """Fifty marks of long names: what is not in the plot stands below it with its place."""
    marks = [Mark(f"an important place, number {n}", 0.5 + n / 100, 1.0) for n in range(50)]
    drawn(lines, marks=marks)

    drawn_text = " ".join(text for _, _, text in lines.texts)
    assert "Not written into the plot, or not in full" in drawn_text
    for mark in marks:
        assert mark.label in drawn_text


# -- thinning


def test_decimate_path_keeps_the_tip_of_a_curve_that_turns_back():
    """Voltage held while the current goes out to 7 A and back: by voltage alone the tip would be lost."""
    xs = [n / 100 for n in range(700)] + [7.0 - n / 100 for n in range(700)]
    ys = [24.0 - n * 1e-6 for n in range(1400)]

    kept = decimate_path(xs, ys, buckets=9)

    assert 7.0 in [xs[n] for n in kept]
    assert len(kept) <= 22


@given(st.lists(st.tuples(st.floats(-5, 5), st.floats(-5, 5)), min_size=1, max_size=900))
def test_decimate_path_keeps_extremes_of_both_in_order(places):
    """A curve that turns back loses neither its tip nor its order."""
    xs, ys = [x for x, _ in places], [y for _, y in places]
    kept = decimate_path(xs, ys, buckets=60)

    assert kept == sorted(set(kept))
    assert len(kept) <= 124
    for values in (xs, ys):
        assert min(values[n] for n in kept) == min(values)
        assert max(values[n] for n in kept) == max(values)


def test_decimate_cloud_keeps_what_lies_apart():
    """Ten thousand dots on a heap, and one far off."""
    xs, ys = [*records.ripples(10_000, 3), 9.0], [*records.ripples(10_000, 17), 9.0]

    kept = decimate_cloud(xs, ys, 500)

    assert len(kept) <= 500
    assert len(kept) > 100
    assert 10_000 in kept


@pytest.mark.parametrize("figure", [records.soak(), records.annotated().figures[0]], ids=lambda figure: figure.name)
def test_a_figure_of_many_points_stays_small(figure, lines):
    """Some 1500 points together, however long the log."""
    Chart(figure, 240.0).draw(Pen(None), 0.0, 700.0)

    count = sum(len(points) for points, _ in lines.strokes) + sum(map(len, lines.strokes_apart)) + len(lines.circles)
    assert 200 < count < 1600
