# SPDX-License-Identifier: BSD-2-Clause
"""One field: clocks of v, density and the parameter, histories, the propagator diagnostic, recall and estimators.

Recorded digits are those of an independent program (dense eigenvectors, numpy); histories are computed again here."""
import relational_reference as reference
from common import check, finish, h5py, np, os, tempfile
from relate_support import close, evolve, relate

MODEL = """
clock: {{kind: scalar, from: -{w}, to: {w}, samples: {m}}}
state: {{profile: gaussian_volume, v0: 96, spread: 12, b0: {b0}, chirp: {chirp}}}
lattice: {{points: {n}}}
output: {{keep: [moments, quantiles, probability, state]}}
"""
CLOCKS = """
readings:
  - {name: phi, clock: {observable: phi}}
  - {name: v, clock: {observable: v, instrument: sharp, from: 120, to: 160, bins: 1}, system: {observable: b, bins: 2}}
  - {name: volumes, clock: {observable: v, instrument: sharp, from: 88, to: 248, bins: 10}}
  - {name: density, clock: {observable: density, instrument: cosine, bins: 8}}
  - {name: sandwich, clock: {observable: density_sandwich, instrument: cosine, bins: 8}}
  - {name: sin2, clock: {observable: sin2_b, instrument: cosine, bins: 8}}
  - {name: hubble, clock: {observable: hubble, instrument: cosine, bins: 9}}
  - {name: root, clock: {observable: {function: {of: sin2_b, apply: sqrt}}, instrument: sharp, from: 0, to: 1.0001, bins: 8}}
  - {name: b_density, clock: {observable: b, instrument: cosine, bins: 16}, system: {observable: density, bins: 10}}
"""


def clocks(folder, result):
    f, _ = relate(folder, result, "clocks", CLOCKS, expect=1)
    r = f["relational"]
    dwell, v = r["phi/system_dwell"][()], r["phi/system_centre"][()]
    close("peak of the dwell density", v[np.argmax(np.convolve(dwell, np.ones(3) / 3, "same"))], 104, 1e-10)
    close("P(b > pi/2 | 120 <= v < 160)", r["v/probability"][0, 1], 0.5, 1e-10)
    close("<p>/sqrt(3 pi G)", f["bounds/v_bound"][()], 95.6619690305, 1e-10)
    close("density at the bounce", f["bounds/density_most"][()], 0.993216068293578886559, 1e-12)  # closed form, 30 digits
    check(f["bounds"].attrs["kept"] in (b"yes", "yes"), "no inequality is violated")
    with h5py.File(result) as e:
        p = e["probability/v"][()]
        check(np.abs(r["phi/probability"][:, 1:513] - p).max() < 1e-13, "P(v|phi) is |psi|^2 as `evolve` stores it")
    for name in r:
        for key in ("identity_probability", "identity_dwell", "identity_action", "identity_commuting"):
            if key in r[name].attrs:
                check(abs(r[name].attrs[key]) < 1e-12, f"{name} {key}: {r[name].attrs[key]:.1e}")
    for name in ("density", "sandwich", "sin2"):  # sin^2 b = rho/rho_c on the effective trajectory, 2 % from ordering
        close(f"bounce by {name}", np.nanmin(r[name + "/median"][()]), 98, 0.02)
        check(r[name].attrs["verdict"] in (b"poor", "poor"), f"{name}: two-to-one, a poor clock")
    check(0 < abs(np.nanmin(r["density/median"][()]) - np.nanmin(r["sandwich/median"][()])) < 1e-2,
          "the two orderings of the density differ, a little")
    check(r["volumes"].attrs["order_violation"] == 0 and r["volumes"].attrs["commuting"] == 1, "v commutes with v")
    f.close()


def decoherence(universe, v_star, phi):
    """Class operators by hand: probabilities and d of (early, late)."""
    large = universe.v > v_star
    early, branch = universe.at(-phi)[:, 0], {}
    for first in (False, True):
        late = universe.move(np.where(large == first, early, 0), 2 * phi)
        for second in (False, True):
            branch[first, second] = np.where(large == second, late, 0)
    return {key: {other: np.vdot(branch[other], branch[key]) for other in branch} for key in branch}


HISTORIES = {(96, 0.35): (0.999999999238, 1.77230445393e-10), (144, 0.35): (0.999999762328, 5.1558744382e-08),
             (192, 0.35): (0.999959850333, 8.94469898785e-06), (288, 0.35): (0.960084286338, 0.00999601046206),
             (144, 0.1): (0.0111478317235, None), (144, 0.2): (0.788508753556, None), (144, 0.3): (0.999951269279, None),
             (144, 0.4): (0.999999997347, None)}


def histories(folder, result):
    universe = reference.Universe(512)
    for phi in (0.1, 0.2, 0.3, 0.35, 0.4):
        stars = sorted({v for v, p in HISTORIES if p == phi} | {40, 480})
        f, done = relate(folder, result, f"h{phi}", f"histories: {{v_star: {stars}, at: [-{phi}, {phi}]}}\n")
        g = {key: f["histories"][key][()] for key in f["histories"]}
        for i, star in enumerate(stars):
            d = decoherence(universe, star, phi)
            for key, wanted in (("p_ss", d[False, False][False, False]), ("p_sl", d[False, True][False, True]),
                                ("p_ls", d[True, False][True, False]), ("p_ll", d[True, True][True, True]),
                                ("d_sl_ll", abs(d[False, True][True, True]))):
                close(f"{key} at v* = {star}, Phi = {phi}", g[key][i], wanted.real, 1e-12, absolute=True)
            check(g["bound_low"][i] - 1e-12 <= g["p_ll"][i] <= g["bound_high"][i] + 1e-12,
                  f"v* = {star}, Phi = {phi}: p_ll within single-time bounds")
            recorded = HISTORIES.get((star, phi))
            if recorded:
                close(f"recorded p_ll at v* = {star}, Phi = {phi}", g["p_ll"][i], recorded[0], 1e-11, absolute=True)
                if recorded[1]:
                    close(f"recorded |d| at v* = {star}", g["d_sl_ll"][i], recorded[1], 1e-12, absolute=True)
        if phi == 0.35:  # published: P(bounce) = 1 for generic states (Craig, Singh 2013, arXiv:1306.6142)
            check(1 - g["p_ll"][stars.index(40)] < 1e-11, "v* = 40 far below the bounce: certainty of a bounce")
            check(g["consistent"][stars.index(480)] == 0 and "inconsistent set" in done.stdout,
                  "v* = 480: said to be an inconsistent set")
        f.close()
    f, _ = relate(folder, result, "stay", "histories: {v_star: [110], at: [-0.35, 0.35], times: 17}\n")
    close("above 110 at 17 times", f["histories/p_stay"][0], 0.185996773605, 1e-11, absolute=True)
    f.close()


WDW = """
gravity: {prescription: wdw}
clock: {kind: scalar, from: -0.5, to: 0.5, samples: 11}
state: {profile: gaussian_momentum, momentum: 294.70881, relative_spread: 0.125, lnv0: 0, at: 0, branch: both}
lattice: {lnv_min: -12, lnv_max: 12, points: 4096}
"""


def continuum(folder):
    """The Wheeler-DeWitt universe does not bounce, superpositions of expanding and contracting included."""
    result = evolve(folder, "wdw", WDW.replace("294.70881", repr(48 * reference.KAPPA)))
    f, _ = relate(folder, result, "wdw_h", f"histories: {{v_star: [{np.exp(-1.0)!r}], at: [-0.5, 0.5]}}\n")
    h = f["histories"]
    close("p_SL", h["p_sl"][0], 0.5, 1e-11, absolute=True)
    close("p_LS", h["p_ls"][0], 0.5, 1e-11, absolute=True)
    check(h["p_ll"][0] < 1e-12 and h["d_sl_ll"][0] < 1e-12, f"p_LL = {h['p_ll'][0]:.1e}, |d| = {h['d_sl_ll'][0]:.1e}")
    f.close()


PROPAGATOR = "propagator: {{at: [-0.2, 0.05], first: [164, 188], clock: {{spread: 0.02, half_width: 0.01{0}}}}}\n"


def propagator(folder, result):
    for more, wanted in (("", dict(conditional=0.0315258887713, spread=0.00511318438197, delay=0.0, median=104.704759292)),
                         (", inertia: 10000", dict(conditional=0.0335300873201, spread=0.0064115904574, delay=0.00011683922007,
                                                   median=104.740848456)),
                         (", inertia: 1000", dict(conditional=0.0900401446763, spread=0.0423482609501, delay=0.011944169092,
                                                  median=108.280542327))):
        f, _ = relate(folder, result, "pw", PROPAGATOR.format(more))
        g, a = f["propagator"], f["propagator"].attrs
        v = g["v"][()]
        close(f"conditional distance{more}", a["distance_conditional"], wanted["conditional"], 1e-8)
        close(f"delay spread{more}", a["delay_spread"], wanted["spread"], 1e-8)
        close(f"delay{more}", a["delay"], wanted["delay"], 1e-9, absolute=True)
        close(f"conditional median{more}", reference.quantile(v, g["conditional"][()], 0.5), wanted["median"], 1e-8)
        if not more:
            close("kinematical distance", a["distance_kinematical"], 0.957730248711, 1e-10)
            close("P(V1)", a["first_probability"], 0.418364578747, 1e-10)
            close("right mean", v @ g["right"][()], 139.601786581, 1e-10)
            close("right median", reference.quantile(v, g["right"][()], 0.5), 103.763453756, 1e-10)
            close("kinematical mean", v @ g["kinematical"][()], 175.321346344, 1e-10)
            check(a["verdict"] in (b"yes", "yes"), "kinematical projectors fail, evolving constants do not")
        f.close()


def three_ways(folder, result):
    """Hoehn, Smith, Lock, Phys. Rev. D 104, 066001 (2021), arXiv:1912.00033: for an ideal clock the deparametrised state, the
    relational observable and the conditional probability agree. Stored by `evolve`, read as a clock, and evolved from an
    earlier reading that found nothing out, in functions of its own."""
    f, _ = relate(folder, result, "three", "readings: [{name: phi, clock: {observable: phi}}]\n"
                  "propagator: {at: [-0.2, 0.05], first: [4, 2048], clock: {spread: 0.02, half_width: 0.01}}\n")
    with h5py.File(result) as e:
        at = np.argmin(np.abs(e["clock/value"][()] - 0.05))
        stored = e["probability/v"][at]
    read = f["relational/phi/probability"][at][1:513]
    moved = f["propagator/right"][()]
    check(np.abs(stored - read).max() < 1e-10 and np.abs(stored - moved).max() < 1e-10,
          f"three ways to P(v|phi): {np.abs(stored - read).max():.1e}, {np.abs(stored - moved).max():.1e}")
    f.close()


RECALL = dict(v_plus=53.356119015, v_minus=42.643880985, clock=-0.0182497007009, v_min=95.4004609862, d_plus=0.0102297238996,
              d_minus=0.0482527804488)


def recall(folder):
    result = evolve(folder, "recall", MODEL.format(w=0.3, m=61, b0=1.45, chirp=0.8, n=1024))
    at = -0.0182497007009
    f, _ = relate(folder, result, "estimators", f"window: {{from: {at - 0.05!r}, to: {at + 0.05!r}, samples: 41}}\n"
                  "readings:\n  - {name: phi, clock: {observable: phi}}\n")
    with h5py.File(result) as e:
        for key, wanted in RECALL.items():
            close("recall " + key, e["law/" + key][()], wanted, 1e-9)
        close("D+ - D-", e["law/d_plus"][()] - e["law/d_minus"][()], -0.0380230565492, 1e-9)
        spread = e["moments/lnv_spread"][()]
        close("sd ln v at -Phi", spread[0], 0.218020938934, 1e-9)
        close("sd ln v at +Phi", spread[-1], 0.10060853433, 1e-9)
        close("<v> at the bounce", e["bounce/v"][()], 95.4004609863, 1e-9)
        close("mode", e["bounce/v_mode"][()], 96, 1e-9)
        close("minimum of the median", e["bounce/v_median"][()], 95.3015935, 1e-7)
    close("median at the bounce", f["relational/phi/median"][20], 95.3066406482, 1e-9)
    check(abs(f["relational/phi/centre"][np.argmin(f["relational/phi/median"][()])] - at + 0.0016915) < 0.0025,
          "the median is least a little before the mean, within a sample")
    close("2 sd Re digamma", f["bounds/recall_bound"][()], 0.272447531646, 1e-9)
    close("2 sd ln k", f["bounds/recall_bound_log"][()], 0.272470319587, 1e-9)
    close("2 <Re digamma>", f["bounds/lnv_sum"][()], 7.7001776878, 1e-9)
    close("<p>/sqrt(3 pi G)", f["bounds/v_bound"][()], 94.8499413265, 1e-9)
    check(f["bounds/recall"][()] <= f["bounds/recall_bound"][()] + f["bounds/recall_slack"][()], "recall within its bound")
    f.close()


with tempfile.TemporaryDirectory() as folder:
    result = evolve(folder, "run", MODEL.format(w=0.4, m=161, b0=np.pi / 2, chirp=0, n=512))
    clocks(folder, result)
    histories(folder, result)
    continuum(folder)
    propagator(folder, result)
    three_ways(folder, result)
    recall(folder)
finish()
