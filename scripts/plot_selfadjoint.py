#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Draws a result of 'ebbturn selfadjoint': the radius of Weyl's disc against the number of sites, and what the members of a
family of extensions do. Writes PREFIX.pdf and .png. Lines differ in dashes and markers, so that grey is enough."""
import argparse
import os
import sys

try:
    import numpy as np
    import h5py  # noqa: F401  (used by ebbturn_result; asked for here for the message's sake)
    import matplotlib
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt
except ImportError as missing:
    from ebbturn_python import switch
    switch("plot_selfadjoint", missing)

from ebbturn_result import Result

BLUE, VERMILLION = "#0072b2", "#d55e00"  # Okabe and Ito's palette for colour-blind readers (2008; from memory)
SMALLEST = 1e-30  # radii below are zero to any reader


def disc(axis, result):
    sites, radius = result["selfadjoint/sites"], np.maximum(result["selfadjoint/radius"], SMALLEST)
    axis.loglog(sites, radius, "o-", color=BLUE, mfc="white")
    axis.set_xlabel("sites summed over")
    axis.set_ylabel("radius of Weyl's disc at $z = i\\,\\times$ scale")
    indices = int(result.file["selfadjoint"].attrs["n_plus"])
    says = {0: "shrinks to a point: unique", 1: "stays: a family of extensions"}.get(indices, "cannot tell")
    axis.set_title(f"disc {says}", fontsize=10)
    axis.grid(alpha=0.3)


def family(axis, result):
    if "selfadjoint/extension/angle" not in result:
        axis.text(0.5, 0.5, "no family of extensions", ha="center", va="center", transform=axis.transAxes)
        axis.set_axis_off()
        return
    angle, value = result["selfadjoint/extension/angle"], result["selfadjoint/extension/eigenvalue"]
    # an eigenvalue rises with the angle: where the least positive one falls, another has become it, and no line joins the two
    falls = np.flatnonzero(np.diff(value) < 0) + 1
    error = result.error("selfadjoint/extension/eigenvalue")
    for part in np.split(np.arange(len(value)), falls):
        axis.errorbar(angle[part], value[part], error[part], fmt="s--", color=VERMILLION, mfc="white")
    label = result.text("selfadjoint/extension/angle", "long_name").replace("label ", "")
    axis.set_xlabel(f"extension {label}, in [0, $\\pi$)")
    axis.set_ylabel("least positive eigenvalue [" + result.text("selfadjoint/extension/eigenvalue", "units") + "]")
    axis.set_title("what each choice does", fontsize=10)
    axis.grid(alpha=0.3)


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("result", help="file written by 'ebbturn selfadjoint'")
    parser.add_argument("-o", "--output", help="prefix of the pictures; default: the result's name without its ending")
    arguments = parser.parse_args()
    try:
        result = Result(arguments.result)
    except OSError as reason:
        sys.exit(f"plot_selfadjoint: error: '{arguments.result}' cannot be read: {reason}")
    if "selfadjoint/radius" not in result:
        sys.exit(f"plot_selfadjoint: error: '{arguments.result}' holds no evidence; write one with 'ebbturn selfadjoint'")
    prefix = arguments.output or os.path.splitext(arguments.result)[0]
    figure, axes = plt.subplots(1, 2, figsize=(10, 4.2), constrained_layout=True)
    figure.suptitle(result.text("/", "title").replace("$", r"\$") or "self-adjointness")
    disc(axes[0], result)
    family(axes[1], result)
    for ending in ("pdf", "png"):
        figure.savefig(f"{prefix}.{ending}", dpi=150)
    print(f"wrote '{prefix}.pdf' and '{prefix}.png'")


main()
