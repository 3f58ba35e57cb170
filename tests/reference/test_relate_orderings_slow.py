# SPDX-License-Identifier: BSD-2-Clause
"""P(v|b) follows v_B/sin b within its width for several orderings and sectors, its variance is that of a reading of least
disturbance, and the packet moves along the curve that is left when the parameter is eliminated."""
import math

from common import check, finish, np, tempfile
from relate_support import evolve, relate

MODEL = """
gravity: {{prescription: {p}, sector: {sector}}}
clock: {{kind: scalar, from: -0.4, to: 0.4, samples: 121}}
state: {{profile: gaussian_momentum, momentum: 400, relative_spread: 0.07}}
output: {{keep: [moments]}}
"""
POWER = 48
READING = f"readings:\n  - {{name: b, clock: {{observable: b, instrument: cosine_power, power: {POWER}, centres: 64}}}}\n"
CASES = (("slqc", 4), ("slqc", 2), ("aps", 4), ("aps", 2), ("mmo", 4), ("mmo", 1.3), ("aps", 1.3))



def twirl(folder):
    """Integrated over all of the parameter, P(v|b) knows |c(k)|^2 and no phase: shifted and squeezed packets give the same, and
    squeezed ones, which differ before and after their bounce, still the same at b and pi - b."""
    seen = []
    for i, more in enumerate(("", ", bounce_at: 0.03", ", squeeze: 0.8", ", squeeze: -0.8, bounce_at: -0.02")):
        text = MODEL.format(p="slqc", sector=4).replace("relative_spread: 0.07", "relative_spread: 0.07" + more)
        f, _ = relate(folder, evolve(folder, f"twirl{i}", text), f"twirl{i}_b", READING, expect=1)
        g = f["relational/b"]
        seen.append((g["system_centre"][()], g["probability"][()], g["window_error"][()]))
        f.close()
    sites = min(len(v) for v, _, _ in seen)  # the lattice is as large as each packet needs
    good = np.all([np.isfinite(p).all(axis=1) & (w < 1e-8) for _, p, w in seen], axis=0)
    check(good.sum() >= 20, f"{good.sum()} outcomes whose window error is below 1e-8")
    for i in range(1, 4):
        off = 0.5 * np.abs(seen[i][1][good][:, :sites] - seen[0][1][good][:, :sites]).sum(axis=1).max()
        check(off < 1e-7, f"other phases {i}: total variation {off:.1e}")
        both = good & good[::-1]
        off = 0.5 * np.abs(seen[i][1] - seen[i][1][::-1])[both].sum(axis=1).max()
        check(off < 1e-7, f"other phases {i}: b and pi - b differ by {off:.1e}")


with tempfile.TemporaryDirectory() as folder:
    twirl(folder)
    for p, sector in CASES:
        name = f"{p}_{sector}"
        result = evolve(folder, name, MODEL.format(p=p, sector=sector))
        f, _ = relate(folder, result, name + "_b", READING, expect=1)
        g = f["relational/b"]
        b, median, spread, curve = (g[key][()] for key in ("centre", "median", "spread", "effective"))
        good = np.isfinite(median) & (np.abs(b - np.pi / 2) < 0.9)
        check(good.sum() > 30, f"{name}: {good.sum()} outcomes")
        off = np.abs(median - curve)[good]
        # quantified: in units of the distribution's own width, and relative
        check(np.all(off < 0.15 * spread[good]), f"{name}: median within {np.max(off / spread[good]):.3f} widths of v_B/sin b")
        check(np.all(off < 0.02 * curve[good]), f"{name}: within {np.max(off / curve[good]):.4f} of it")
        # Var(v|b) = 2p + sd(p)^2/(3 pi G sin^2 b) + (v_B cos b/sin^2 b)^2/(2p): the curve is taken as straight over a reading of
        # width 1/sqrt(2p), which leaves some percent in the middle and a quarter at b = 0.67
        near = good & (np.abs(b - np.pi / 2) < 0.4)
        sine = np.sin(b[near])
        bounce = curve[near][0] * sine[0]
        model = 2 * POWER + (400 * 0.07)**2 / (3 * math.pi) / sine**2 + (bounce * np.cos(b[near]) / sine**2)**2 / (2 * POWER)
        check(near.sum() > 10 and np.all(np.abs(spread[near]**2 / model - 1) < 0.06),
              f"{name}: variance within {np.max(np.abs(spread[near]**2 / model - 1)):.3f} of the sum of its parts")
        # d ln v/db = -cot b, whatever the parameter does
        speed = np.gradient(np.log(median[good]), b[good])[2:-2]
        wanted = -1 / np.tan(b[good])[2:-2]
        check(np.all(np.abs(speed - wanted) < 0.05), f"{name}: d ln v/db off -cot b by {np.max(np.abs(speed - wanted)):.3f} at most")
        # a moment of time reversal: symmetric about the bounce, whatever the ordering; the window is symmetric too
        check(np.all(np.abs(median[good] - median[good][::-1]) < 1e-6 * median[good]), f"{name}: P(v|b) = P(v|pi - b)")
        check(g.attrs["verdict"] in (b"good", "good"), f"{name}: a good clock")
        f.close()
finish()
