#!/usr/bin/env python3
"""Draws coverage.svg and lost.svg from the tables beside it.

    python3 -m venv V && V/bin/pip install matplotlib && V/bin/python tests/calibration/figure.py
"""

import csv
import pathlib

import matplotlib

matplotlib.use("svg")
import matplotlib.pyplot as plt

HERE = pathlib.Path(__file__).parent
plt.rcParams.update({"svg.hashsalt": "genewane", "svg.fonttype": "none", "font.size": 9})


def rows(name):
    with open(HERE / name, newline="") as table:
        return list(csv.DictReader(table, delimiter="\t"))


def save(figure, name):
    figure.savefig(HERE / name, metadata={"Date": None}, bbox_inches="tight")


def label(row):
    parts = [f"Ne {row['adults']}", f"{row['loci']} loci", f"t {row['generations']}", f"S {row['sample']}"]
    if row["chromosomes"] != "0":
        parts.append("linked")
    if row["missing"] != "0":
        parts.append(f"{float(row['missing']):.0%} missing")
    if row["alleles"] != "2":
        parts.append(f"{row['alleles']} alleles")
    if row["plan"] == "I":
        parts.append("plan I")
    return ", ".join(parts)


def coverage():
    table = rows("coverage.tsv")
    cells = sorted({int(r["cell"]) for r in table})
    names = {int(r["cell"]): label(r) for r in table}
    styles = {
        "temporal_fs": ("o", "Fs"),
        "temporal_likelihood": ("s", "likelihood"),
        "linkage": ("^", "linkage"),
    }
    figure, axis = plt.subplots(figsize=(7, 0.36 * len(cells) + 1))
    axis.axvspan(0.93, 0.98, color="0.92")
    axis.axvline(0.95, color="0.5", linewidth=0.8)
    for offset, (method, (marker, name)) in zip((-0.22, 0.0, 0.22), styles.items()):
        own = [r for r in table if r["estimator"] == method]
        axis.errorbar(
            [float(r["coverage"]) for r in own],
            [cells.index(int(r["cell"])) + offset for r in own],
            xerr=[2 * float(r["coverage_error"]) for r in own],
            fmt=marker,
            markersize=4,
            linewidth=0.8,
            label=name,
        )
    axis.set_yticks(range(len(cells)), [names[c] for c in cells])
    axis.invert_yaxis()
    axis.set_xlim(0.86, 1.0)
    axis.set_xlabel("share of 95 % intervals that held the true effective size (bars: two standard errors)")
    axis.legend(loc="lower left", fontsize=8)
    save(figure, "coverage.svg")


def lost():
    table = rows("lost.tsv")
    cells = sorted({int(r["cell"]) for r in table})
    columns = 4
    figure, axes = plt.subplots(
        -(-len(cells) // columns), columns, figsize=(9, 4.8), sharex=True, sharey=True
    )
    for axis, cell in zip(axes.flat, cells):
        own = [r for r in table if int(r["cell"]) == cell and float(r["alleles"]) >= 20]
        axis.plot([0, 1], [0, 1], color="0.6", linewidth=0.8)
        axis.errorbar(
            [float(r["said_lost"]) for r in own],
            [float(r["really_lost"]) for r in own],
            yerr=[2 * float(r["standard_error"]) for r in own],
            fmt="o",
            markersize=4,
            linewidth=0.8,
        )
        first = own[0]
        axis.set_title(
            f"N {first['adults']}, t {first['generations']}, S {first['sample']}\n{first['frequencies']}",
            fontsize=8,
        )
    figure.supxlabel("chance of being lost that the report states, mean of a tenth of the scale")
    figure.supylabel("share really lost (bars: two standard errors)")
    figure.tight_layout()
    save(figure, "lost.svg")


coverage()
lost()
