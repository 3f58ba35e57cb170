# SPDX-License-Identifier: BSD-2-Clause
"""Two fields: the second scalar as clock, alone and mixed with b, and the scalar beside dust, against recorded digits of an
independent program (dense eigenvectors, numpy)."""
import math

from common import check, finish, h5py, np, tempfile
from relate_support import close, evolve, relate

TWO = """
clock: {kind: scalar, from: -0.4, to: 0.4, samples: 97}
matter: [{kind: scalar, name: phi2, momentum: 200, spread: 25, grid: {points: 128, length: 1.0}}]
state: {profile: gaussian_volume, v0: 160, spread: 16, b0: 1.5707963267948966}
lattice: {points: 768}
output: {keep: [moments]}
"""
SITES = "window: {tolerance: 1}\nreadings:\n  - {name: phi2, clock: {observable: phi2, instrument: sites}}\n"
EDGE = "from: -0.0859375, to: 0.0859375, bins: 11"
MIXED = "window: {samples: 49, tolerance: 1}\nreadings:\n" \
        f"  - {{name: plain, clock: {{observable: phi2, instrument: cosine, {EDGE}}}}}\n" + "".join(
            f"  - {{name: {name}, clock: {{observable: {{phi2_plus_b: {{alpha: {a}}}}}, instrument: cosine, {EDGE}}}}}\n"
            for name, a in (("a0_0", 0.0), ("a0_02", 0.02), ("a0_1", 0.1)))


def two(folder):
    result = evolve(folder, "two", TWO)
    with h5py.File(result) as e:
        close("weight removed", e["matter/phi2"].attrs["removed_weight"], 4.54201565248e-08, 1e-6)
    f, _ = relate(folder, result, "sites", SITES, expect=1)
    g = f["relational/phi2"]
    x = g["centre"][()]
    zero, far = np.argmin(np.abs(x)), np.argmin(np.abs(x - 0.078125))
    close("median at 0", g["median"][zero], 168.157479613, 1e-8)
    close("median at 0.078", g["median"][far], 292.706317771, 1e-8)
    close("purity at 0", g["purity"][zero], 0.19731989162, 1e-8)
    close("purity of the packet", g.attrs["purity_packet"], 0.208106101753, 1e-8)
    close("<p2/p1>", g.attrs["slope"], 0.457169661778, 1e-8)
    # recorded with p1 above 20 only; with all p1 the same program gives 0.04638754666, this one 0.04638754762 (it drops momenta of weight
    # below a rounding): the tolerance is that difference
    close("distance to the theory with phi2 as parameter", g["distance_reduced"][zero], 0.0463875448823, 1e-7)
    # an identity but for the window, whose estimate is beside it
    off, window = g["distance_weighted"][()], g["window_error"][()]
    good = np.isfinite(off)
    check(off[zero] < 1e-6, f"change of clock: total variation {off[zero]:.1e} at phi2 = 0")
    check(np.all(off[good] < 2 * window[good] + 1e-7), "change of clock: within twice the window estimate everywhere")
    f.close()
    f, _ = relate(folder, result, "mixed", MIXED, expect=0)
    r = f["relational"]
    for name, median, dwell in (("plain", 168.539751216, 0.0355426029897), ("a0_0", 168.539751216, 0.0355426029897),
                                ("a0_02", 165.77873085, 0.0272551962805), ("a0_1", 162.000759437, 0.0139859961812)):
        close(name + " median", r[name + "/median"][5], median, 1e-8)
        close(name + " dwell", r[name + "/dwell"][5], dwell, 1e-8)
        for key in ("identity_probability", "identity_dwell", "identity_action"):
            check(abs(r[name].attrs[key]) < 1e-12, f"{name} {key}: {r[name].attrs[key]:.1e}")
    # alpha -> 0 goes through the transforms of b and back, and gives the commuting clock
    p, q = r["plain/probability"][()], r["a0_0/probability"][()]
    a, b = r["plain/system_centre"][()], r["a0_0/system_centre"][()]
    common = np.isin(a, b)
    check(np.abs(p[:, common] - q[:, np.isin(b, a)]).max() < 1e-13, "alpha = 0 equals the commuting clock")
    f.close()


DUST = """
gravity: {{polymer_scale: {scale!r}}}
clock: {{kind: dust, ordering: densitised, from: -0.25, to: 0.25, samples: 201}}
matter: [{{kind: scalar, name: phi, momentum: {momentum!r}, spread: 8, grid: {{points: 96, length: 1.6}}}}]
state: {{profile: gaussian_volume, v0: 96, spread: 12, b0: 1.5707963267948966}}
lattice: {{points: 512}}
output: {{keep: [moments]}}
"""
DUST_CLOCKS = """
window: {tolerance: 1}
readings:
  - {name: phi, clock: {observable: phi, instrument: cosine, from: -0.15, to: 0.15, bins: 9}}
  - {name: b, clock: {observable: b, instrument: cosine, bins: 12}}
  - {name: dust, clock: {observable: dust}}
"""


def dust(folder):
    # 2 pi gamma lambda G = 1; the scalar has 0.6 of the momentum that would bounce at 96 without dust
    result = evolve(folder, "dust", DUST.format(scale=1 / (2 * math.pi * 0.2375), momentum=0.6 * math.sqrt(3 * math.pi) * 96))
    with h5py.File(result) as e:
        close("<p_T>", e["moments/momentum_mean"][0], 283.396009754, 1e-8)
        close("sd p_T", e["moments/momentum_spread"][0], 79.0802822059, 1e-8)
    f, done = relate(folder, result, "dust_r", DUST_CLOCKS, expect=1)
    r = f["relational"]
    close("phi: least median", np.nanmin(r["phi/median"][()]), 110.235051472, 1e-8)
    close("phi: dwell at 0", r["phi/dwell"][4], 0.0215857563864, 1e-8)
    close("b: least median", np.nanmin(r["b/median"][()]), 98.1440673844, 1e-8)
    close("dust: least median", np.nanmin(r["dust/median"][()]), 96.0, 1e-10)
    good = np.isfinite(r["b/median"][()]) & (np.abs(r["b/centre"][()] - np.pi / 2) < np.pi / 2 - 0.5)
    check(np.all(np.abs(r["b/median"][()][good] / r["b/effective"][()][good] - 1) < 0.1), "b follows the effective curve of dust and scalar")
    check("bounce of the same state by each clock" in done.stdout, "clocks are compared side by side")
    names = [text.decode() for text in f["comparison/reading"][()]]
    least = dict(zip(names, f["comparison/median"][()]))
    check(least["dust"] < least["b"] < least["phi"], f"one state, three bounces: {least}")
    f.close()


with tempfile.TemporaryDirectory() as folder:
    two(folder)
    dust(folder)
finish()
