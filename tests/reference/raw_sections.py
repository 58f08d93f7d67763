#!/usr/bin/env python3
"""Independent reference for binrail's raw section: 1000 random sections solved with scipy.

    raw_sections.py --write      make the sections from SEED, solve them, write raw_sections.csv (several minutes)
    raw_sections.py --check N    solve every (rows // N)-th row again, N rows at most, and compare at 1e-6 relative;
                                 a line per disagreement, last line "N sections recomputed, M disagree"; exit 1 if M > 0
    --method NAME                integrator: auto (default), DOP853, Radau, LSODA
    --csv FILE                   another table than raw_sections.csv beside this script

Needs requirements.txt. It shares no code with the Rust program and uses no closed form of the waveform.

The section: source v_pk |sin wt| (bridge, centre-tap) or v_pk sin wt (half-wave), winding resistance R_w, n_d diodes in the
path (bridge 2, others 1) of threshold V_T0 and slope r_T, reservoir C with ESR, load i_L(v) = I_0 + G v.

    on    i = (v_s - n_d V_T0 - v) / (R_w + n_d r_T)  where that is positive, else 0
    v = v_C + ESR (i - i_L(v)),   C dv_C/dt = i - i_L(v)

Columns.  In: path; source_v rms, open circuit (of one half for centre-tap); hz; winding_ohm; threshold_v, slope_ohm per diode;
farad; esr_ohm; amps = I_0 (0 = none); load_ohm = 1/G (blank = none).  Out: valley_v, peak_v true extrema of v; mean_v;
source_mean_a, source_rms_a, source_peak_a of the rectified current i; reservoir_rms_a of i - i_L; conduction_deg of one
pulse, in degrees of the mains period.

Method.  Time is the angle wt from a rising zero of the source, the voltages are scaled by v_pk and the currents by
I_0 + G v_pk.  One period (pi, half-wave 2 pi) is integrated by solve_ivp at rtol 1e-13, atol 1e-14 in pieces:

    off, up to turn-on    With i = 0 the excess h = v_s - n_d V_T0 - v is concave (v falls on a line or a convex exponential), so
                          its maximum is one event; if h > 0 there, turn-on is the only root before it.
    on, up to turn-off    While the current forcing at i = 0 is positive the current cannot return to zero, so turn-off is
                          the first zero of i after that angle: an event.
    off, to the end

Each piece ends at its switching angle, so no kink lies inside a step. Events are first found on the dense output, then
polished by Newton steps each of which integrates again up to the angle. Extrema of v and i (zeros of their derivatives in
the on piece, and the ends of that piece) are evaluated by integrating up to them, not from the interpolant.

Convergence.  The steady state is not waited for: it is the root of F(x) = v_C(end of period | v_C(0) = x) - x. Sections
switch at i = 0, where the right-hand side is continuous, so F'(x) = exp(-integral of a) - 1 exactly, a being the decay rate of the
stretch. Solutions keep their order and F falls strictly wherever there is conduction, so the root is unique. Newton's method is kept inside
a bracket (from v = 0 to no conduction at all, bisecting when a step leaves it) and ends when the step is below 1e-12 v_C.
A start whose v falls below zero lies below any periodic solution with v >= 0, and so only raises the bracket; if
nothing is left of the bracket the section collapses (and is discarded by --write). Means and mean squares are then extra state
variables of one last period from the root, and asserted on every solved section:

    |v_C(end) - v_C(0)| <= 1e-11 v_C
    mean(i) = mean(i_L) to 1e-9
    mean(v_s i) = n_d V_T0 mean(i) + (R_w + n_d r_T) mean(i^2) + mean(v i_L) + ESR mean(i_C^2) to 1e-9
"""

import argparse
import csv
import math
import os
import sys
import time

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

SEED = 20260711
ROWS = 1000
RTOL, ATOL = 1e-13, 1e-14
STEP = 0.1  # largest step, rad, where an event is looked for
STIFF = 300.0  # decay rate per rad above which Radau takes over
TOLERANCE = 1e-6

INPUTS = ["path", "source_v", "hz", "winding_ohm", "threshold_v", "slope_ohm", "farad", "esr_ohm", "amps", "load_ohm"]
OUTPUTS = ["valley_v", "peak_v", "mean_v", "source_mean_a", "source_rms_a", "source_peak_a", "reservoir_rms_a", "conduction_deg"]
DIODES = {"half-wave": 1, "centre-tap": 1, "bridge": 2}


class Collapse(Exception):
    """No periodic solution with v >= 0."""


class Section:
    def __init__(self, row, method="auto"):
        n = DIODES[row["path"]]
        self.v_unit = math.sqrt(2.0) * row["source_v"]
        g = 1.0 / row["load_ohm"] if row["load_ohm"] else 0.0
        self.i_unit = row["amps"] + g * self.v_unit
        z = self.v_unit / self.i_unit
        # All that follows is scaled.
        self.vt = n * row["threshold_v"] / self.v_unit
        self.r = (row["winding_ohm"] + n * row["slope_ohm"]) / z
        self.c = 2.0 * math.pi * row["hz"] * row["farad"] * z
        self.esr = row["esr_ohm"] / z
        self.i0 = row["amps"] / self.i_unit
        self.g = g * z
        self.period = 2.0 * math.pi if row["path"] == "half-wave" else math.pi
        self.k = 1.0 + self.esr * self.g
        self.d = self.r * self.k + self.esr
        # Decay rates of v_C: -d(dv_C/dt)/dv_C.
        self.a_off = self.g / self.k / self.c
        self.a_on = (1.0 + self.g * self.r) / self.d / self.c
        if method == "auto":
            method = "Radau" if self.a_on > STIFF else "DOP853"
        self.method = method

    # Circuit, at angle t and reservoir voltage vc.

    def state(self, t, vc, on):
        """i, v, i_L."""
        if on:
            i = ((math.sin(t) - self.vt) * self.k - vc + self.esr * self.i0) / self.d
            v = math.sin(t) - self.vt - self.r * i
        else:
            i = 0.0
            v = (vc - self.esr * self.i0) / self.k
        return i, v, self.i0 + self.g * v

    def slope(self, t, vc, on):
        """dv_C/dt, di/dt, dv/dt."""
        i, v, il = self.state(t, vc, on)
        dvc = (i - il) / self.c
        if on:
            di = (math.cos(t) * self.k - dvc) / self.d
            return dvc, di, math.cos(t) - self.r * di
        return dvc, 0.0, dvc / self.k

    def excess(self, t, vc):
        return math.sin(t) - self.vt - (vc - self.esr * self.i0) / self.k

    def excess_slope(self, t, vc):
        return math.cos(t) - self.slope(t, vc, False)[2]

    # Integration. y is [v_C] or [v_C, integrals of i, i^2, v, i_C^2, v i_L, v_s i].

    def rhs(self, on, long):
        def short_rhs(t, y):
            i, _, il = self.state(t, y[0], on)
            return [(i - il) / self.c]

        def long_rhs(t, y):
            i, v, il = self.state(t, y[0], on)
            ic = i - il
            return [ic / self.c, i, i * i, v, ic * ic, v * il, math.sin(t) * i]

        return long_rhs if long else short_rhs

    def run(self, a, b, y, on, **more):
        if b <= a:
            return None
        s = solve_ivp(self.rhs(on, len(y) > 1), (a, b), y, method=self.method, rtol=RTOL, atol=ATOL, **more)
        assert s.status >= 0, s.message
        return s

    def to(self, a, b, y, on):
        """The state at b, from y at a. b may lie (a hair) before a."""
        if b == a:
            return np.array(y)
        s = solve_ivp(self.rhs(on, len(y) > 1), (a, b), y, method=self.method, rtol=RTOL, atol=ATOL)
        assert s.status >= 0, s.message
        return s.y[:, -1]

    def polish(self, a, y, t, on, f, df, lo, hi):
        """Root of f near t, and the state there; the state is y at a."""
        w = self.to(a, t, y, on)
        for _ in range(4):
            slope = df(t, w[0])
            step = -f(t, w[0]) / slope if slope else 0.0
            new = min(max(t + step, lo), hi)
            if abs(new - t) < 4e-16 * max(1.0, t):
                break
            w, t = self.to(a, new, y, on), new
        return t, w

    def cycle(self, y):
        """One period from y at 0: (y at the end, turn-on, turn-off, y at turn-on, y at turn-off). Angles None if it never conducts."""
        y = np.array(y, dtype=float)
        top = lambda t, y: self.excess_slope(t, y[0])
        top.terminal, top.direction = True, -1
        s = self.run(0.0, math.pi, y, False, events=top, dense_output=True, max_step=STEP)
        if not len(s.t_events[0]):
            raise Collapse  # v falls faster than the source ever does
        t_top = s.t[-1]
        if self.excess(t_top, s.y[0, -1]) <= 0.0:
            end = self.to(t_top, self.period, s.y[:, -1], False)
            self.positive(self.period, end)
            return end, None, None, None, None

        # Turn-on.
        if self.excess(0.0, y[0]) > 0.0:
            raise Collapse
        t_on = brentq(lambda t: self.excess(t, s.sol(t)[0]), 0.0, t_top, xtol=1e-14)
        t_on, y_on = self.polish(0.0, y, t_on, False, self.excess, self.excess_slope, 0.0, t_top)
        self.positive(t_on, y_on)

        # Up to where the forcing at i = 0 changes sign, then to turn-off.
        force = lambda t: math.cos(t) * self.k + (self.i0 + self.g * (math.sin(t) - self.vt)) / self.c
        if force(math.pi) >= 0.0:
            raise Collapse
        t_mid = max(t_on, brentq(force, 0.5 * math.pi, math.pi, xtol=1e-14))
        y_mid = self.to(t_on, t_mid, y_on, True)
        zero = lambda t, y: self.state(t, y[0], True)[0]
        zero.terminal, zero.direction = True, -1
        s = self.run(t_mid, math.pi, y_mid, True, events=zero, max_step=STEP)
        if s is None or not len(s.t_events[0]):
            raise Collapse
        t_off, y_off = self.polish(
            t_mid, y_mid, s.t[-1], True,
            lambda t, vc: self.state(t, vc, True)[0], lambda t, vc: self.slope(t, vc, True)[1], t_mid, math.pi,
        )
        end = self.to(t_off, self.period, y_off, False)
        self.positive(self.period, end)
        return end, t_on, t_off, y_on, y_off

    def positive(self, t, y):
        if self.state(t, y[0], False)[1] < 0.0:
            raise Collapse

    def periodic(self):
        """v_C at angle 0 of the periodic solution."""
        lo = self.esr * self.i0
        hi = (1.0 - self.vt) * self.k + self.esr * self.i0
        if hi <= lo:
            raise Collapse
        x = lo + 0.8 * (hi - lo)
        below = False  # a start that stays positive has been found below the root
        for _ in range(200):
            try:
                end, t_on, t_off, _, _ = self.cycle([x])
            except Collapse:
                lo, below = x, False
                new = 0.5 * (lo + hi)
            else:
                f = end[0] - x
                if f > 0.0:
                    lo, below = x, True
                else:
                    hi = x
                on = t_off - t_on if t_on is not None else 0.0
                df = math.expm1(-self.a_on * on - self.a_off * (self.period - on))
                new = x - f / df if df else math.inf
                if t_on is not None and abs(new - x) <= 1e-12 * x:
                    return new
                if not lo < new < hi:
                    new = 0.5 * (lo + hi)
            if hi - lo <= 1e-11 * hi:
                if below:
                    return new  # the root to the integrator's own noise; solve() asserts what is needed
                raise Collapse
            x = new
        raise AssertionError("no convergence")

    def extrema(self, a, b, y, what):
        """The states at zeros of di/dt (what 1) or dv/dt (what 2) in the on piece, and at its ends."""
        f = lambda t, y: self.slope(t, y[0], True)[what]
        s = self.run(a, b, y, True, events=f, max_step=min(STEP, (b - a) / 20.0))
        points = [(a, y)] + [(t, self.to(a, t, y, True)) for t in s.t_events[0] if a < t < b] + [(b, self.to(a, b, y, True))]
        return [self.state(t, w[0], True) for t, w in points]

    def solve(self):
        """The outputs, and the relative errors {periodic, charge, energy}."""
        x = self.periodic()
        end, t_on, t_off, y_on, y_off = self.cycle([x] + [0.0] * 6)
        i, ii, v, icic, vil, vsi = end[1:] / self.period
        v_points = [p[1] for p in self.extrema(t_on, t_off, y_on[:1], 2)]
        i_points = [p[0] for p in self.extrema(t_on, t_off, y_on[:1], 1)]
        if min(v_points) < 0.0:
            raise Collapse
        il = self.i0 + self.g * v
        errors = {
            "periodic": abs(end[0] - x) / x,
            "charge": abs(i - il) / il,
            "energy": abs(vsi - self.vt * i - self.r * ii - vil - self.esr * icic) / vsi,
        }
        assert errors["periodic"] <= 1e-11, errors
        assert errors["charge"] <= 1e-9, errors
        assert errors["energy"] <= 1e-9, errors
        assert abs(self.excess(t_on, y_on[0])) < 1e-12 and abs(self.state(t_off, y_off[0], True)[0]) * self.d < 1e-12
        out = {
            "valley_v": min(v_points) * self.v_unit,
            "peak_v": max(v_points) * self.v_unit,
            "mean_v": v * self.v_unit,
            "source_mean_a": i * self.i_unit,
            "source_rms_a": math.sqrt(ii) * self.i_unit,
            "source_peak_a": max(i_points) * self.i_unit,
            "reservoir_rms_a": math.sqrt(icic) * self.i_unit,
            "conduction_deg": math.degrees(t_off - t_on),
        }
        return out, errors


# Random sections.


def rounded(x):
    return float("%.6g" % x)


def log_uniform(rng, a, b):
    return math.exp(rng.uniform(math.log(a), math.log(b)))


def candidate(rng, path, load, with_esr, amps):
    """A section drawing about `amps`; None if its winding leaves 0.02..20 ohm."""
    volts = log_uniform(rng, 4.0, 60.0)
    kind = rng.uniform()
    hz = 50.0 if kind < 0.4 else 60.0 if kind < 0.8 else log_uniform(rng, 45.0, 400.0)
    reg = log_uniform(rng, 0.03, 0.30)
    winding = reg * volts / amps
    threshold = 0.0 if rng.uniform() < 0.15 else rng.uniform(0.0, 1.0)
    slope = 0.0 if rng.uniform() < 0.2 else log_uniform(rng, 0.002, 0.2)
    n = DIODES[path]
    v = math.sqrt(2.0) * volts * (1.0 - 1.2 * reg) - n * threshold - 3.0 * n * slope * amps
    ripple = log_uniform(rng, 0.005, 0.6)
    esr_drop = log_uniform(rng, 0.001, 0.10)
    share = {"amps": 1.0, "ohm": 0.0, "both": rng.uniform(0.1, 0.9)}[load]
    if not 0.02 <= winding <= 20.0 or v < 0.3 * volts:
        return None
    interval = (1.0 if path == "half-wave" else 0.5) / hz
    return {
        "path": path,
        "source_v": rounded(volts),
        "hz": rounded(hz),
        "winding_ohm": rounded(winding),
        "threshold_v": rounded(threshold),
        "slope_ohm": rounded(slope),
        "farad": rounded(0.75 * amps * interval / (ripple * v)),
        "esr_ohm": rounded(esr_drop * v / amps) if with_esr else 0.0,
        "amps": rounded(share * amps),
        "load_ohm": rounded(v / ((1.0 - share) * amps)) if share < 1.0 else None,
    }


def generate(method):
    """ROWS pairs (inputs, outputs), the worst errors and the number of sections discarded."""
    rng = np.random.default_rng(SEED)
    thirds = lambda names: [names[i % 3] for i in rng.permutation(ROWS)]
    halves = iter([("bridge", "centre-tap")[i % 2] for i in range(ROWS)])
    paths = [p or next(halves) for p in thirds(["half-wave", None, None])]
    loads = thirds(["amps", "ohm", "both"])
    esrs = thirds([False, True, True])
    made, worst = [], {}
    count = {"collapsed": 0, "out of range": 0}
    for path, load, with_esr in zip(paths, loads, esrs):
        amps = log_uniform(rng, 0.010, 8.0)
        while True:
            row = candidate(rng, path, load, with_esr, amps)
            if row is None:
                continue
            try:
                out, errors = Section(row, method).solve()
            except Collapse:
                count["collapsed"] += 1
                continue
            if not 0.005 <= (out["peak_v"] - out["valley_v"]) / out["mean_v"] <= 0.5:
                count["out of range"] += 1
                continue
            break
        made.append((row, out))
        for name, e in errors.items():
            worst[name] = max(worst.get(name, 0.0), e)
        if len(made) % 50 == 0:
            print("%d sections" % len(made), file=sys.stderr, flush=True)
    return made, worst, count


def write(path, method):
    start = time.time()
    made, worst, count = generate(method)
    with open(path, "w", newline="") as f:
        w = csv.writer(f, lineterminator="\n")
        w.writerow(INPUTS + OUTPUTS)
        for row, out in made:
            cells = [row["path"]] + ["" if row[c] is None else "%.15g" % row[c] for c in INPUTS[1:]]
            w.writerow(cells + ["%.15g" % out[c] for c in OUTPUTS])
    print("discarded: " + ", ".join("%s %d" % kv for kv in count.items()))
    print("worst errors: " + ", ".join("%s %.1e" % kv for kv in worst.items()))
    print("%d sections written in %.0f s" % (len(made), time.time() - start))


def check(path, n, method):
    start = time.time()
    with open(path, newline="") as f:
        table = list(csv.DictReader(f))
    step = max(1, len(table) // n)
    picked = list(enumerate(table, 2))[::step][:n]  # with line numbers
    bad, worst, largest = 0, {}, 0.0
    for line, cells in picked:
        row = {c: cells[c] if c == "path" else float(cells[c]) if cells[c] else None for c in INPUTS}
        row["amps"] = row["amps"] or 0.0
        try:
            out, errors = Section(row, method).solve()
        except Collapse:
            bad += 1
            print("line %d: collapses" % line)
            continue
        for name, e in errors.items():
            worst[name] = max(worst.get(name, 0.0), e)
        fails = []
        for c in OUTPUTS:
            have = float(cells[c])
            off = abs(have - out[c]) / abs(out[c])
            largest = max(largest, off)
            if not off <= TOLERANCE:
                fails.append("%s %s, recomputed %.15g" % (c, cells[c], out[c]))
        if fails:
            bad += 1
            print("line %d: %s" % (line, "; ".join(fails)))
    print("largest difference %.1e; worst errors: %s; %.0f s"
          % (largest, ", ".join("%s %.1e" % kv for kv in worst.items()), time.time() - start))
    print("%d sections recomputed, %d disagree" % (len(picked), bad))
    return 1 if bad or not picked else 0


def main():
    p = argparse.ArgumentParser(description="Reference figures of random raw sections.")
    what = p.add_mutually_exclusive_group(required=True)
    what.add_argument("--write", action="store_true")
    what.add_argument("--check", type=int, metavar="N")
    p.add_argument("--method", default="auto", choices=["auto", "DOP853", "Radau", "LSODA"])
    p.add_argument("--csv", default=os.path.join(os.path.dirname(os.path.abspath(__file__)), "raw_sections.csv"))
    a = p.parse_args()
    if a.write:
        write(a.csv, a.method)
        return 0
    if a.check < 1:
        p.error("--check wants a number from 1")
    return check(a.csv, a.check, a.method)


if __name__ == "__main__":
    sys.exit(main())
