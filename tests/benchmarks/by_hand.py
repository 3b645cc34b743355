"""by_hand.py LOG.csv OUT.pdf: what a practitioner writes by hand, as the floor to measure against.

Read, group by set current, mean, efficiency, regulation, four limits, a PDF of three pages with two charts. No
uncertainty, no look at the data, no statistics.
"""

from __future__ import annotations

import sys
from pathlib import Path

import pandas as pd
from reportlab.graphics.charts.lineplots import LinePlot
from reportlab.graphics.shapes import Drawing
from reportlab.lib import colors
from reportlab.lib.pagesizes import A4
from reportlab.lib.styles import getSampleStyleSheet
from reportlab.platypus import PageBreak, Paragraph, SimpleDocTemplate, Spacer, Table, TableStyle

LIMITS = {"eff_min_pct": 80.0, "load_reg_max_pct": 2.0, "case_rise_max_K": 40.0, "ripple_max_mV": 50.0}
STYLES = getSampleStyleSheet()
GRID = TableStyle(
    [
        ("GRID", (0, 0), (-1, -1), 0.4, colors.grey),
        ("BACKGROUND", (0, 0), (-1, 0), colors.lightgrey),
        ("FONTSIZE", (0, 0), (-1, -1), 8),
        ("ALIGN", (1, 0), (-1, -1), "RIGHT"),
    ]
)


def chart(xs: list[float], ys: list[float]) -> Drawing:
    drawing = Drawing(460, 220)
    plot = LinePlot()
    plot.x, plot.y, plot.width, plot.height = 40, 30, 400, 170
    plot.data = [list(zip(xs, ys, strict=True))]
    plot.lines[0].strokeColor = colors.navy
    drawing.add(plot)
    return drawing


def report(log: Path, out: Path) -> None:
    table = pd.read_csv(log, parse_dates=["timestamp"])
    g = table.groupby("i_set").mean(numeric_only=True).reset_index()
    n = table.groupby("i_set").size().to_numpy()
    g["eff"] = 100 * g["p_out"] / g["p_in"]
    load = g[g.i_set > 0]
    v0, v1 = g["v_out"].iloc[0], g["v_out"].iloc[-1]
    checks = [
        ("Efficiency, lowest loaded point", load["eff"].min(), ">=", LIMITS["eff_min_pct"], "%"),
        ("Load regulation", 100 * abs(v0 - v1) / v1, "<=", LIMITS["load_reg_max_pct"], "%"),
        ("Case temperature rise", (table["t_case"] - table["t_amb"]).max(), "<=", LIMITS["case_rise_max_K"], "K"),
        ("Ripple, mean at full load", g["ripple_mv"].iloc[-1], "<=", LIMITS["ripple_max_mV"], "mV"),
    ]
    rows = [["Check", "Measured", "Limit", "Result"]]
    for name, value, side, limit, unit in checks:
        ok = value >= limit if side == ">=" else value <= limit
        rows.append([name, f"{value:.3f} {unit}", f"{side} {limit:g} {unit}", "PASS" if ok else "FAIL"])
    points = [["I set/A", "n", "V in", "P in/W", "V out", "I out", "P out/W", "eff/%"]]
    for k, r in enumerate(g.itertuples()):
        means = [f"{r.i_set:.3f}", str(int(n[k])), f"{r.v_in:.2f}", f"{r.p_in:.3f}", f"{r.v_out:.4f}"]
        points.append([*means, f"{r.i_out:.4f}", f"{r.p_out:.3f}", f"{r.eff:.2f}"])
    story = [
        Paragraph("Power supply test report", STYLES["Title"]),
        Paragraph(f"Log: {log.name}, {len(table)} rows", STYLES["Normal"]),
        Spacer(1, 12),
        Table(rows, style=GRID),
        PageBreak(),
        Paragraph("Load points", STYLES["Heading2"]),
        Table(points, style=GRID, repeatRows=1),
        PageBreak(),
        Paragraph("Efficiency against load current", STYLES["Heading2"]),
        chart(load["i_out"].tolist(), load["eff"].tolist()),
        Paragraph("Output voltage against load current", STYLES["Heading2"]),
        chart(g["i_out"].tolist(), g["v_out"].tolist()),
    ]
    SimpleDocTemplate(str(out), pagesize=A4).build(story)


if __name__ == "__main__":
    report(Path(sys.argv[1]), Path(sys.argv[2]))
