#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Draws a result of 'ebbturn relate': what the system is given a clock, how long the clock reads each value, and the bounce
that each clock sees. Writes PREFIX.pdf and .png. Outcomes that were refused are left out of the lines and hatched in the
picture. Lines differ in dashes as well as in colour, and the colour map is monotonic in brightness."""
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
    switch("plot_relational", missing)

from ebbturn_result import Result

# Okabe and Ito's palette for colour-blind readers (Color Universal Design, 2008; from memory)
BLUE, VERMILLION, ORANGE, BLACK, GREEN = "#0072b2", "#d55e00", "#e69f00", "#000000", "#009e73"
BINS = 300  # logarithmic bins of volume: more than paper shows
NAMES = {"b": r"$b$  (expanding $< \pi/2 <$ contracting)", "phi": r"$\varphi$", "phi2": r"$\varphi_2$", "v": r"$|v|$",
         "dust": "dust time $T$", "sin2_b": r"$\sin^2 b$", "density": r"$\rho/\rho_c$", "hubble": "Hubble rate",
         "phi2_plus_b": r"$\varphi_2 + \alpha(\pi/2 - b)$", "density_sandwich": r"$\rho/\rho_c$ (sandwich)", "lnv": r"$\ln |v|$"}


def plain(text):
    """Text from a file is no mathematics."""
    return text.replace("$", r"\$")


def words(result, path):
    return [w.decode(errors="replace") if isinstance(w, bytes) else str(w) for w in np.atleast_1d(result[path])]


def cells(centre):
    """Edges half way between centres."""
    if len(centre) == 1:
        return np.array([centre[0] - 0.5, centre[0] + 0.5])
    middle = 0.5 * (centre[1:] + centre[:-1])
    return np.concatenate(([centre[0] - (middle[0] - centre[0])], middle, [centre[-1] + (centre[-1] - middle[-1])]))


def on_logarithmic_bins(v, p, low, high):
    """Probability per unit of ln v, the mass of a site spread uniformly over its cell."""
    edge = np.maximum(cells(v), 0)
    bins = np.geomspace(low, high, BINS + 1)
    below = np.concatenate((np.zeros((len(p), 1)), np.cumsum(np.nan_to_num(p), axis=1)), axis=1)
    return bins, np.array([np.diff(np.interp(bins, edge, line)) for line in below]) / np.diff(np.log(bins))


def draw_probability(figure, axes, result, group):
    centre, p = result[group + "/centre"], result[group + "/probability"]
    v, good = result[group + "/system_centre"], np.array([w == "ok" for w in words(result, group + "/status")])
    quantile, level = result[group + "/quantiles"], np.atleast_1d(result[group + "/level"])
    system = result.text("/" + group, "system")
    if not good.any():
        axes.text(0.5, 0.5, "every outcome was refused", transform=axes.transAxes, ha="center", va="center")
        return
    if system == "v":
        low = max(0.5 * np.nanmin(quantile), v[v > 0][0]) if np.ndim(quantile) == 2 else v[v > 0][0]
        high = min(2 * np.nanmax(quantile), v[-1]) if np.ndim(quantile) == 2 else v[-1]
        bins, density = on_logarithmic_bins(v, p, low, high)
        density[~good] = np.nan
        axes.set_yscale("log")
        label = r"probability per unit of $\ln v$"
    else:
        bins = cells(v)
        density = p / np.diff(bins)
        label = "probability density"
    mesh = axes.pcolormesh(cells(centre), bins, density.T, cmap="cividis", norm=matplotlib.colors.PowerNorm(0.5, vmin=0),
                           rasterized=True)
    figure.colorbar(mesh, ax=axes, label=label, pad=0.01)
    for edge in np.flatnonzero(~good):
        e = cells(centre)
        axes.axvspan(e[edge], e[edge + 1], facecolor="white", edgecolor="0.7", hatch="///", lw=0)
    if system == "v":
        curve = result[group + "/effective"]
        axes.plot(centre, np.where(good, curve, np.nan), color=VERMILLION, lw=1.4, ls="--", label="effective")
    axes.plot(centre, np.where(good, result[group + "/median"], np.nan), color="white", marker=".", ms=4, lw=0.8, label="median")
    for i, q in enumerate(level if np.ndim(quantile) == 2 else []):
        if abs(q - 0.5) > 1e-9:
            axes.plot(centre, quantile[:, i], color="white", lw=0.8, ls=((0, (1, 1)), (0, (4, 2)))[i % 2], label=f"{100 * q:g} %")
    axes.set_ylim(bins[0], bins[-1])
    axes.set_xlim(cells(centre)[0], cells(centre)[-1])
    axes.set_ylabel(NAMES.get(system, plain(system)))
    axes.legend(fontsize=8, loc="upper center", ncol=4, facecolor="#bbbbbb")


def draw_dwell(axes, result, group):
    centre, dwell = result[group + "/centre"], result[group + "/dwell"]
    axes.plot(centre, dwell, color=BLACK, drawstyle="steps-mid", lw=1.2, label="dwell $D$")
    axes.set_yscale("log")
    axes.set_ylabel("dwell [parameter time]")
    axes.set_xlabel(NAMES.get(result.text("/" + group, "clock"), plain(result.text("/" + group, "clock"))))
    twin = axes.twinx()
    for name, color, dash, label in (("purity", BLUE, "-", "purity"), ("clock_spread", GREEN, "-.", r"$\kappa\sigma_t$"),
                                     ("leak", ORANGE, ":", r"leak to $v \leq 0$")):
        values = result[group + "/" + name]
        if np.any(np.isfinite(values)) and np.nanmax(values) > 0:
            good = np.isfinite(result[group + "/median"])
            twin.plot(centre, np.where(good, values, np.nan), color=color, ls=dash, lw=1.3, label=label)
    twin.set_ylim(0, 1.05)
    twin.set_ylabel("purity, spread, leak")
    lines = axes.get_legend_handles_labels()[0] + twin.get_legend_handles_labels()[0]
    axes.legend(lines, [line.get_label() for line in lines], fontsize=8, loc="lower center", bbox_to_anchor=(0.5, 1.0), ncol=4,
                frameon=False)


def draw_comparison(axes, result):
    if "comparison/reading" not in result:
        axes.text(0.5, 0.5, "no comparison in this file", transform=axes.transAxes, ha="center", va="center")
        return
    names, verdict = words(result, "comparison/reading"), words(result, "comparison/verdict")
    median, error = result["comparison/median"], np.nan_to_num(result["comparison/median_error"])
    low, high, effective = (result["comparison/" + key] for key in ("low", "high", "effective"))
    place = np.arange(len(names))[::-1]
    color = {"good": BLUE, "poor": ORANGE, "unusable": VERMILLION}
    for i, y in enumerate(place):
        if np.isfinite(low[i]) and np.isfinite(high[i]):
            axes.plot([low[i], high[i]], [y, y], color="0.6", lw=3, solid_capstyle="butt", label="least outer quantiles" if i == 1 else None)
        axes.errorbar(median[i], y, xerr=error[i], fmt="o", ms=6, mfc="white", mec=color.get(verdict[i], BLACK), mew=1.6,
                      ecolor=BLACK, capsize=3)
        if np.isfinite(effective[i]):
            axes.plot(effective[i], y, "x", color=BLACK, ms=5, label="effective" if "effective" not in axes.get_legend_handles_labels()[1] else None)
    axes.set_yticks(place, [f"{plain(n)} ({v})" for n, v in zip(names, verdict)], fontsize=8)
    axes.set_xlabel("bounce volume $|v|$ that this clock sees")
    axes.grid(axis="x", lw=0.4)
    if axes.get_legend_handles_labels()[0]:
        axes.legend(fontsize=8, loc="best")


def draw(result, names, prefix):
    rows = len(names)
    figure, axes = plt.subplots(2 * rows + 1, 1, figsize=(7.2, 4.6 * rows + 3.2), layout="constrained", squeeze=False,
                                height_ratios=[3, 1.3] * rows + [1.8])
    for i, name in enumerate(names):
        group = "relational/" + name
        draw_probability(figure, axes[2 * i][0], result, group)
        axes[2 * i][0].set_title(f"{plain(name)}: {plain(result.text('/' + group, 'verdict'))} clock, "
                                 f"{plain(result.text('/' + group, 'instrument'))}", fontsize=10)
        axes[2 * i + 1][0].set_xlim(axes[2 * i][0].get_xlim() if axes[2 * i][0].has_data() else None)
        draw_dwell(axes[2 * i + 1][0], result, group)
    draw_comparison(axes[-1][0], result)
    figure.suptitle(plain(result.text("/", "title") or "ebbturn relate"), fontsize=11)
    figure.savefig(prefix + ".pdf", metadata={"CreationDate": None})  # equal results give equal files
    figure.savefig(prefix + ".png", dpi=150)


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("result", help="result file of 'ebbturn relate'")
    parser.add_argument("-r", "--reading", action="append", metavar="NAME", help="which readings; the first two of b, or the first, where not given")
    parser.add_argument("-o", "--output", metavar="PREFIX", help="write PREFIX.pdf and PREFIX.png (default: RESULT's name)")
    options = parser.parse_args()
    prefix = options.output or os.path.splitext(options.result)[0]
    try:
        result = Result(options.result)
    except OSError as reason:
        print(f"plot_relational: error: '{options.result}': {reason}", file=sys.stderr)
        return 4
    there = list(result.file["relational"]) if "relational" in result else []
    chosen = options.reading or [n for n in there if result.text("/relational/" + n, "clock") == "b"][:2] or there[:1]
    missing = [n for n in chosen if n not in there]
    if missing or not chosen:
        print(f"plot_relational: error: '{options.result}' has no reading '{(missing or ['any'])[0]}'; it has {', '.join(there) or 'none'}",
              file=sys.stderr)
        return 2
    draw(result, chosen, prefix)
    print(f"wrote '{prefix}.pdf' and '{prefix}.png'")
    return 0


if __name__ == "__main__":
    sys.exit(main())
