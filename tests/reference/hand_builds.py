#!/usr/bin/env python3
"""Builds worked by hand: every margin, by a second implementation.

This script shares no code with binrail.  It reads nothing but the builds written out
below, works out every limit that applies and writes them to hand_builds.json, which the Rust
tests compare with the audit.

    hand_builds.py            print the margins of the builds
    hand_builds.py --write    write hand_builds.json beside this file
    hand_builds.py --check    work all out again and compare with hand_builds.json (exit 1 on a difference)
    hand_builds.py --verify   check the solver against other methods and published numbers

Covered: series devices (fixed, adjustable); all hook-ups and paths; sections that feed several
rails, transformers that feed several sections, dual pairs.  Not covered: discrete and shunt
devices, fitted values (the set-point error of an adjustable device is 0), sections that collapse.

The periodic steady state is one brentq root for the start of conduction; means and rms values
are Gauss-Legendre integrals of the waveform, not closed forms.  --verify integrates the same
circuit step by step (solve_ivp) as a third way.

Units are SI, temperatures in degC, life in hours.  Margins come in the order of the subjects
(transformers, sections, rails, supply, parts) and, for each, in the order of the table of limits.
"""

import argparse
import json
import math
import re
import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

JSON_FILE = Path(__file__).with_name("hand_builds.json")
TOLERANCE = 1e-9  # relative, for --check and for "met"

# ---------------------------------------------------------------------------------------------
# Text to numbers
# ---------------------------------------------------------------------------------------------

UNIT_SCALE = {
    "": 1.0, "%": 1e-2, "V": 1.0, "mV": 1e-3, "A": 1.0, "mA": 1e-3, "Hz": 1.0, "W": 1.0, "degC": 1.0, "K": 1.0,
    "h": 1.0, "s": 1.0, "ms": 1e-3, "mm": 1e-3, "mF": 1e-3, "uF": 1e-6, "ohm": 1.0, "mohm": 1e-3,
}
COLUMN_SCALE = {"_uf": 1e-6, "_mohm": 1e-3, "_ma": 1e-3, "_mm": 1e-3, "_pct": 1e-2, "_pct_v": 1e-2}


def quantity(text):
    """'230 V', '10 %', '2.2 mF' -> SI value (per cent as a fraction)."""
    number, unit = re.fullmatch(r"\s*([-+0-9.eE]+)\s*(\S*)\s*", text).groups()
    return float(number) * UNIT_SCALE[unit]


class Missing(Exception):
    """A cell that a limit needs is blank and has no default."""


class Row:
    """One catalogue row: column -> cell text."""

    def __init__(self, part, cells):
        self.part, self.cells = part, cells

    def text(self, column, default=None):
        cell = self.cells.get(column, "").strip()
        if cell:
            return cell
        if default is None:
            raise Missing(column)
        return default

    def has(self, column):
        return self.cells.get(column, "").strip() != ""

    def number(self, column, default=None):
        """SI value of a cell; `default` is given in SI as well."""
        if default is not None and not self.has(column):
            return default
        cell = self.text(column)
        if re.search(r"[A-Za-z%]\s*$", cell):
            return quantity(cell)
        suffixes = [s for s in COLUMN_SCALE if column.endswith(s)]
        return float(cell) * (COLUMN_SCALE[max(suffixes, key=len)] if suffixes else 1.0)


# ---------------------------------------------------------------------------------------------
# Supply
# ---------------------------------------------------------------------------------------------


@dataclass
class Conditions:
    """What the supply file says about mains, ambient, margins and ageing."""

    mains: float
    mains_low: float
    mains_high: float
    hz: float
    flat_top: float
    t_lo: float
    t_hi: float  # ambient high + inside_rise
    m_headroom: float
    m_reservoir: float
    m_reverse: float
    m_junction: float
    loss: float
    esr_rise: float
    life: float


def conditions(supply):
    mains, ambient = supply["mains"], supply["ambient"]
    margins, ageing = supply.get("margins", {}), supply.get("ageing", {})
    nominal = quantity(mains["voltage"])
    if "tolerance" in mains:
        tolerance = quantity(mains["tolerance"])
        low, high = nominal * (1 - tolerance), nominal * (1 + tolerance)
    else:
        low, high = quantity(mains["low"]), quantity(mains["high"])
    return Conditions(
        mains=nominal, mains_low=low, mains_high=high,
        hz=quantity(mains["frequency"]),
        flat_top=quantity(mains.get("flat_top", "3 %")),
        t_lo=quantity(ambient["low"]),
        t_hi=quantity(ambient["high"]) + quantity(ambient.get("inside_rise", "0 K")),
        m_headroom=quantity(margins.get("headroom", "0.25 V")),
        m_reservoir=quantity(margins.get("reservoir", "10 %")),
        m_reverse=quantity(margins.get("reverse", "50 %")),
        m_junction=quantity(margins.get("junction", "15 K")),
        loss=quantity(ageing.get("capacitance_loss", "20 %")),
        esr_rise=float(ageing.get("esr_rise", 2.0)),
        life=quantity(ageing.get("life", "20000 h")),
    )


# ---------------------------------------------------------------------------------------------
# Transformer
# ---------------------------------------------------------------------------------------------


def windings(row):
    """Rated (V, I) of each secondary; '12-0-12' gives two halves.  secondary_a blank: VA / sum of V."""
    volts = [float(t) for t in re.split(r"\+|-0-", row.text("secondary_v"))]
    if row.has("secondary_a"):
        amps = [float(t) for t in re.split(r"\+|-0-", row.text("secondary_a"))]
    else:
        amps = [row.number("va") / sum(volts)] * len(volts)
    return list(zip(volts, amps, strict=True))


def primary_voltage(row, mains):
    """Rated primary voltage of the wiring nearest to the nominal mains, of two the higher."""
    text = row.text("primary_v")
    if "+" in text:
        one = float(text.split("+")[0])
        choices = [one, 2 * one]  # two equal primaries in parallel, in series
    else:
        choices = [float(t) for t in text.split("/")]
    return min(choices, key=lambda v: (abs(v - mains), -v))


@dataclass
class Hookup:
    """A hook-up of equal secondaries as the section sees it."""

    v: float  # V_k
    i: float  # I_k
    s: float  # sum of V_s I_s over all secondaries of the transformer, used or not
    used: list  # rated V of each winding that is used
    rms_share: float  # winding rms current of the hook-up / rms source current; dual: of one polarity's part
    each_share: float  # rms current of one used winding / rms source current; dual: the same


def hook_up(row, section, holder):
    """`holder` is the section that names the secondaries: itself, or the positive half of a dual pair."""
    all_windings = windings(row)
    assert len(section["secondaries"]) == section["windings"]
    used = [all_windings[place - 1] for place in holder["secondaries"]]
    assert used and all(w == used[0] for w in used)
    (v, i), k, kind = used[0], len(used), section["hookup"]
    s = sum(volts * amps for volts, amps in all_windings)
    volts = [w[0] for w in used]
    if kind == "single":
        assert k == 1
        return Hookup(v, i, s, volts, 1.0, 1.0)
    if kind == "series":
        return Hookup(v * k, i, s, volts, 1.0, 1.0)
    if kind == "parallel":
        return Hookup(v, i * k, s, volts, 1.0, 1.0 / k)
    assert kind in ("centre-tap", "dual") and k == 2 and section["path"] == kind
    return Hookup(v, i, s, volts, 1 / math.sqrt(2), 1 / math.sqrt(2))


def open_circuit(row, hookup, mains, v_primary):
    """V_oc = V_s (1 + reg) V_mains / V_primary."""
    return hookup.v * (1 + row.number("regulation_pct")) * mains / v_primary


def winding_resistance(row, hookup, celsius, own_load, loads):
    """R_k at a winding temperature.  `loads`: (V_b, I_Lb) of each section that counts in the sum, this one included."""
    a = row.number("primary_share_pct", 0.50)
    hot = row.number("winding_c", 85.0)
    together = sum(v_b * i_b for v_b, i_b in loads)
    r_k = row.number("regulation_pct") * hookup.v * ((1 - a) / hookup.i + (a / hookup.s) * together / own_load)
    return r_k * (234.5 + min(celsius, hot)) / (234.5 + hot)


# ---------------------------------------------------------------------------------------------
# Rectifier and reservoir
# ---------------------------------------------------------------------------------------------

DIODES_IN_PATH = {"bridge": 2, "centre-tap": 1, "half-wave": 1, "dual": 1}  # dual: per polarity


def diode_threshold(row, celsius, low):
    """V_T0(T) = V_T0 + tc (25 - T), never below 0.2 V; V_T0 from vf_v at vf_a where listed so."""
    if row.has("threshold_v"):
        threshold = row.number("threshold_v")
    else:
        vf = row.number("vf_v")
        threshold = vf - 0.07 if low else min(0.7, vf - 0.2)
    tc = {"junction": 2e-3, "schottky": 1e-3}[row.text("type", "junction")]
    return max(threshold + tc * (25.0 - celsius), 0.2)


def diode_slope(row):
    return row.number("slope_mohm") if row.has("slope_mohm") else 0.07 / row.number("vf_a")


def cold_factors(t_lo):
    """(C factor, ESR factor) below 20 degC."""
    below = max(20.0 - t_lo, 0.0)
    return 1 - 0.004 * below, 2.0 ** (below / 25.0)


def esr_of_can(row):
    """Listed ESR, doubled where it is stated at 10 kHz and more."""
    return row.number("esr_mohm") * (2.0 if row.number("esr_hz", 100.0) >= 10e3 else 1.0)


def ripple_rating(row, path):
    """Ripple rating of one can: x 0.5 where stated at 10 kHz and more, x 0.8 with half-wave."""
    rating = row.number("ripple_a") * (0.5 if row.number("ripple_hz", 100.0) >= 10e3 else 1.0)
    return rating * (0.8 if path == "half-wave" else 1.0)


# ---------------------------------------------------------------------------------------------
# Periodic steady state
# ---------------------------------------------------------------------------------------------


class Collapse(Exception):
    """No periodic solution with v >= 0."""


@dataclass
class Circuit:
    v_pk: float
    v_d: float  # n_d V_T0
    r: float  # R_w + n_d r_T
    c: float
    esr: float
    load: float  # constant I_L
    hz: float
    full_wave: bool


@dataclass
class Steady:
    valley: float
    peak: float
    mean: float
    source_mean: float
    source_rms: float
    source_peak: float
    reservoir_rms: float
    start: float  # angles of conduction, radians from the zero crossing
    end: float

    @property
    def ripple(self):
        return self.peak - self.valley


GAUSS_X, GAUSS_W = np.polynomial.legendre.leggauss(80)


def steady_state(k):
    """Angle x = w t.  State u = v_C - ESR I_L, the raw voltage while the diodes are off.

    on:  i = (E - u)/(R + ESR),  E = v_pk sin x - v_d,  v = E - R i,  C du/dt = i - I_L
    off: i = 0, v = u, C du/dt = -I_L
    With tau = (R + ESR) C the "on" solution is a phase-shifted sine, a constant and a decaying exponential.
    Unknown: the angle x1 at which conduction starts.  It ends where i = 0.  One period later u must meet E again.
    """
    w = 2 * math.pi * k.hz
    period = math.pi if k.full_wave else 2 * math.pi
    r_sum = k.r + k.esr
    w_tau = w * r_sum * k.c
    amplitude, phase = k.v_pk / math.hypot(1.0, w_tau), math.atan(w_tau)
    offset = k.v_d + k.load * r_sum
    fall = k.load / (w * k.c)  # volts per radian while off

    def source(x):
        return k.v_pk * np.sin(x) - k.v_d

    def u_on(x, x1):
        settled = source(x1) - amplitude * math.sin(x1 - phase) + offset
        return amplitude * np.sin(x - phase) - offset + settled * np.exp(-(x - x1) / w_tau)

    def current(x, x1):
        return (source(x) - u_on(x, x1)) / r_sum

    def end_of(x1):
        # i cannot return to zero before the crest (E rises there), and is negative at pi (E = -v_d < u).
        return brentq(lambda x: current(x, x1), math.pi / 2, math.pi, xtol=1e-15, rtol=1e-15)

    def mismatch(x1):
        x2 = end_of(x1)
        return u_on(x2, x1) - fall * (x1 + period - x2) - source(x1)

    least = math.asin(k.v_d / k.v_pk) if k.v_d < k.v_pk else math.pi / 2
    most = math.pi / 2 - 1e-9
    if least >= most or mismatch(least) < 0:
        raise Collapse
    x1 = brentq(mismatch, least, most, xtol=1e-15, rtol=1e-15)
    x2 = end_of(x1)

    def v_on(x):
        return source(x) - k.r * current(x, x1)

    def slope(x):
        """dv/dx while on: du/dx + ESR di/dx, and r_sum di/dx = dE/dx - du/dx."""
        du = (current(x, x1) - k.load) / (w * k.c)
        return du * (1 - k.esr / r_sum) + k.esr / r_sum * k.v_pk * math.cos(x)

    crest = math.pi / 2
    # The raw voltage may fall on for a moment after conduction starts: the valley is the true minimum.
    x_valley = x1 if slope(x1) >= 0 else brentq(slope, x1, crest, xtol=1e-15)
    x_peak = brentq(slope, crest, x2, xtol=1e-15)

    x = 0.5 * (x2 - x1) * GAUSS_X + 0.5 * (x2 + x1)
    weights = 0.5 * (x2 - x1) * GAUSS_W
    i = current(x, x1)
    off = x1 + period - x2
    u_end, u_start = float(u_on(x2, x1)), float(source(x1))
    fine = np.linspace(x1, x2, 4001)
    top = int(np.argmax(current(fine, x1)))
    x_i = golden_maximum(lambda y: float(current(y, x1)), fine[max(top - 1, 0)], fine[min(top + 1, 4000)])
    return Steady(
        valley=float(v_on(x_valley)),
        peak=float(v_on(x_peak)),
        mean=float((weights @ v_on(x) + off * (u_end + u_start) / 2) / period),
        source_mean=float(weights @ i / period),
        source_rms=math.sqrt(float(weights @ i**2) / period),
        source_peak=float(current(x_i, x1)),
        reservoir_rms=math.sqrt(float(weights @ (i - k.load) ** 2 + off * k.load**2) / period),
        start=x1, end=x2,
    )


def golden_maximum(f, a, b):
    ratio = (math.sqrt(5) - 1) / 2
    for _ in range(60):
        p, q = b - ratio * (b - a), a + ratio * (b - a)
        a, b = (a, q) if f(p) > f(q) else (p, b)
    return (a + b) / 2


# ---------------------------------------------------------------------------------------------
# One section at its corners, and its rails
# ---------------------------------------------------------------------------------------------


class Section:
    """A section and its transformer, ready to be judged.  Two steps: its parts, then (all loads known) its corners."""

    def __init__(self, build, given, rows, section):
        self.id, self.path, self.given = section["id"], section["path"], given
        self.section = section
        part_of = {t["id"]: t["part"] for t in build["transformers"]}
        self.transformer_id = section["transformer"]
        self.transformer = rows[part_of[section["transformer"]]]
        self.rectifier = rows[section["rectifier"]]
        self.rectifier_sink = rows[section["rectifier_sink"]] if section["rectifier_sink"] else None
        self.reservoir = rows[section["reservoir"]]
        self.cans = section["reservoir_qty"]
        self.rails = [Rail(build, rows, name, self) for name in section["rails"]]
        self.load = sum(rail.load for rail in self.rails)  # I_L = sum of (rail current + ground current)

        holder = section
        self.negative_half = False
        if self.path == "dual":
            pair = next(x for x in build["sections"] if x["id"] == section["pair"])
            assert pair["pair"] == self.id and pair["transformer"] == section["transformer"]
            assert pair["rectifier"] == section["rectifier"]
            self.negative_half = self.rails[0].negative
            if self.negative_half:
                assert section["secondaries"] == [] and section["windings"] == 0
                assert section["rectifier_qty"] == 0 and section["rectifier_sink"] is None
                holder = pair
        else:
            assert section["pair"] is None
        self.hookup = hook_up(self.transformer, section, holder)
        self.v_primary = primary_voltage(self.transformer, given.mains)
        self.n_d = DIODES_IN_PATH[self.path]
        self.r_t = diode_slope(self.rectifier)

    def settle(self, sections):
        """The corners.  `sections`: all of the build."""
        given = self.given
        self.other = next((x for x in sections if x.id == self.section["pair"]), None)
        v_tol = self.transformer.number("v_tol_pct", 0.0)
        self.v_oc_low = (
            open_circuit(self.transformer, self.hookup, given.mains_low * (1 - given.flat_top), self.v_primary) * (1 - v_tol)
        )
        self.v_oc_high = open_circuit(self.transformer, self.hookup, given.mains_high, self.v_primary) * (1 + v_tol)
        self.crest_idle = self.v_oc_high * math.sqrt(2)
        winding_c = self.transformer.number("winding_c", 85.0)
        together = [(x.hookup.v, x.load) for x in sections if x.transformer_id == self.transformer_id]
        itself = [(self.hookup.v, self.load)]
        self.r_low = winding_resistance(self.transformer, self.hookup, winding_c, self.load, together)
        self.r_high = winding_resistance(self.transformer, self.hookup, given.t_hi, self.load, itself)
        self.r_cold = winding_resistance(self.transformer, self.hookup, given.t_lo, self.load, itself)

        # Bank of n equal cans: n C, ESR / n.
        c, esr = self.cans * self.reservoir.number("c_uf"), esr_of_can(self.reservoir) / self.cans
        cold_c, cold_esr = cold_factors(given.t_lo)
        self.esr = esr
        self.c_low = c * (1 - self.reservoir.number("tol_minus_pct", 0.20)) * (1 - given.loss) * cold_c
        self.c_high = c * (1 + self.reservoir.number("tol_plus_pct", 0.20))
        self.esr_low = esr * given.esr_rise * cold_esr
        self.v_t0_low = diode_threshold(self.rectifier, given.t_lo, low=True)
        self.v_t0_high = diode_threshold(self.rectifier, given.t_hi, low=False)

        self.at = {
            "low": steady_state(self.circuit(self.v_oc_low, self.r_low, self.v_t0_low, self.c_low, self.esr_low, self.load)),
            "high": steady_state(self.circuit(self.v_oc_high, self.r_high, self.v_t0_high, self.c_high, esr, self.load)),
            "worn": steady_state(self.circuit(self.v_oc_high, self.r_high, self.v_t0_high, self.c_low, self.esr_low, self.load)),
        }
        for rail in self.rails:
            rail.alone = steady_state(self.alone_circuit(rail))

    def circuit(self, v_oc, r_w, v_t0, c, esr, load):
        return Circuit(
            v_pk=v_oc * math.sqrt(2), v_d=self.n_d * v_t0, r=r_w + self.n_d * self.r_t,
            c=c, esr=esr, load=load, hz=self.given.hz, full_wave=self.path != "half-wave",
        )

    def alone_circuit(self, rail):
        """As high; this rail full, the other rails of its section idle, with their full ground current."""
        load = rail.load + sum(other.idle + other.ground for other in self.rails if other is not rail)
        return self.circuit(self.v_oc_high, self.r_high, self.v_t0_high, self.c_high, self.esr, load)

    # -- winding, rectifier and reservoir ------------------------------------------------------

    def winding_rms(self):
        """Hook-up; dual: sqrt((I_rms+^2 + I_rms-^2)/2) per half."""
        own = self.at["high"].source_rms
        if self.path == "dual":
            return math.sqrt((own**2 + self.other.at["high"].source_rms ** 2) / 2)
        return own * self.hookup.rms_share

    def windings_va(self):
        """Sum over the windings V_s I_rms; of a dual pair with the positive half."""
        if self.negative_half:
            return 0.0
        if self.path == "dual":
            return sum(v * self.winding_rms() for v in self.hookup.used)
        return sum(v * self.at["high"].source_rms * self.hookup.each_share for v in self.hookup.used)

    def polarities(self):
        """The sections that this rectifier serves."""
        return [self, self.other] if self.path == "dual" else [self]

    def is_module(self):
        return self.rectifier.text("kind") == "bridge"

    def path_loss(self):
        """V_T0 I_avg + r_T I_rms^2 of one diode in the path, at high."""
        high = self.at["high"]
        return self.v_t0_high * high.source_mean + self.r_t * high.source_rms**2

    def package_loss(self):
        """Module: n_d diodes, dual the sum over both polarities; one diode of a half-wave path: all, of a full-wave path: half."""
        if self.is_module():
            return sum(s.n_d * s.path_loss() for s in self.polarities())
        return max(s.path_loss() for s in self.polarities()) * (1.0 if self.path == "half-wave" else 0.5)

    def rectifier_mean(self):
        """Module: the section's mean current; one diode: all of it in half-wave, half in full-wave paths; dual: the larger polarity."""
        share = 1.0 if self.is_module() or self.path == "half-wave" else 0.5
        return max(s.at["high"].source_mean for s in self.polarities()) * share

    def rectifier_allowed(self):
        share = {"capacitive": 1.0, "resistive": 0.8}[self.rectifier.text("io_for", "resistive")]
        return share * self.rectifier.number("io_a")

    def surge(self):
        """V_oc sqrt 2 / (R + n_d r_T + ESR): cold winding, thresholds 0, new capacitor; dual: the worse bank."""
        return max(s.crest_idle / (s.r_cold + s.n_d * s.r_t + s.esr) for s in self.polarities())

    def peak_inverse(self):
        return self.crest_idle * (1.0 if self.path == "bridge" else 2.0)

    def rms_per_can(self):
        return self.at["high"].reservoir_rms / self.cans

    def hot(self):
        """T_hi + 5 K (rms per can / rating)^2, rating as in reservoir-ripple."""
        return self.given.t_hi + 5 * (self.rms_per_can() / ripple_rating(self.reservoir, self.path)) ** 2

    def life(self):
        """life_h 2^((t_max + 5 - hot)/10)."""
        return self.reservoir.number("life_h") * 2 ** ((self.reservoir.number("t_max_c") + 5 - self.hot()) / 10)

    # -- heat ----------------------------------------------------------------------------------

    def heat(self):
        """Pass + rectifier + reservoir ESR I^2 + winding copper, at high; the core is counted per transformer."""
        high = self.at["high"]
        return (
            sum(rail.pass_power(high.mean) for rail in self.rails)
            + self.n_d * self.path_loss()
            + self.esr * high.reservoir_rms**2
            + self.r_high * high.source_rms**2
        )


class Rail:
    """A rail with its device, on its section."""

    def __init__(self, build, rows, name, section):
        self.name, self.section = name, section
        self.asked = next(r for r in build["supply"]["rail"] if r["name"] == name)
        chosen = next(r for r in build["rails"] if r["name"] == name)
        assert chosen["section"] == section.id
        self.device = rows[chosen["pass"]]
        self.sink = rows[chosen["sink"]] if chosen["sink"] else None
        volts = quantity(self.asked["voltage"])
        self.negative, self.v_out = volts < 0, abs(volts)
        self.amps = quantity(self.asked["current"])
        self.idle = quantity(self.asked.get("idle", "0 A"))
        self.ground = self.device.number("ground_ma")
        self.load = self.amps + self.ground

    @property
    def at(self):
        return self.section.at

    def divider_term(self):
        """2 x 1 % (1 - vref/V_out) of an adjustable device."""
        if self.device.text("kind") != "adjustable":
            return 0.0
        return 2 * 0.01 * (1 - self.device.number("vref_v") / self.v_out)

    def tol(self):
        """Set-point error (0 in this step) + tol_pct + the divider's term."""
        return self.device.number("tol_pct") + self.divider_term()

    def dropout(self):
        """dropout_v at every current, or a straight line from dropout_light_v (I = 0) to dropout_v (iout_max)."""
        full = self.device.number("dropout_v")
        if not self.device.has("dropout_light_v"):
            return full
        light = self.device.number("dropout_light_v")
        return light + (full - light) * min(self.amps / self.device.number("iout_max_a"), 1.0)

    def needed(self):
        """V_out (1 + tol) + dropout(I)."""
        return self.v_out * (1 + self.tol()) + self.dropout()

    def pass_power(self, mean):
        """P = (mean raw - V_out) I + mean raw x ground current."""
        return (mean - self.v_out) * self.amps + mean * self.ground

    def junction(self, corner, t_hi):
        mean = {"high": self.at["high"], "alone": self.alone}[corner].mean
        return t_hi + junction_rise(self.pass_power(mean), self.device, self.sink)

    def junction_corner(self, t_hi):
        """The worse of high and alone; on a tie the first."""
        try:
            return max(("high", "alone"), key=lambda corner: self.junction(corner, t_hi))
        except Missing:
            return "high"

    def psrr(self):
        """psrr_db, less 20 log10(V_out/psrr_vout) of an adjustable device, less 20 (1 - h) near dropout, not below 0."""
        db = self.device.number("psrr_db")
        if self.device.text("kind") == "adjustable":
            stated_at = self.device.number("psrr_vout_v", self.device.number("vref_v"))
            db -= max(20 * math.log10(self.v_out / stated_at), 0.0)
        h = (self.at["low"].valley - self.needed()) / 1.0
        db -= 20 * max(1 - h, 0.0)
        return max(db, 0.0)

    def output_ripple(self):
        """(value, corner): the worst of low, high, worn; on a tie the first."""
        corner = max(("low", "high", "worn"), key=lambda name: self.at[name].ripple)
        return self.at[corner].ripple * 10 ** (-self.psrr() / 20), corner

    def accuracy(self):
        """Set-point error (0) + tol_pct + divider + load_reg + line_reg (mean high - mean low), as a fraction."""
        line = self.device.number("line_reg_pct_v", 0.0) * (self.at["high"].mean - self.at["low"].mean)
        return self.tol() + self.device.number("load_reg_pct", 0.0) + line

    def dip_time(self):
        """The asked dip rounded up to whole half periods; half-wave: whole periods."""
        step = (1.0 if self.section.path == "half-wave" else 0.5) / self.section.given.hz
        return math.ceil(quantity(self.asked["dip"]) / step - 1e-9) * step


def junction_rise(power, row, sink):
    """P (rth_jc + rth_cs + rth_sa), or P rth_ja without sink.

    With rise_k the sink follows natural convection, rth_sa (rise_k / actual rise)^0.25.  The fixed point of
    rise = P rth_sa (rise_k / rise)^0.25 is found by bracketing; it equals (P rth_sa)^0.8 rise_k^0.2.
    """
    if sink is None:
        return power * row.number("rth_ja_k_w")
    rise = power * sink.number("rth_sa_k_w")
    if sink.has("rise_k"):
        at = sink.number("rise_k")
        constant = rise
        rise = brentq(lambda t: t - constant * (at / t) ** 0.25, 1e-6, 1e4, xtol=1e-13, rtol=1e-15)
    return power * (row.number("rth_jc_k_w") + sink.number("rth_cs_k_w", 1.2)) + rise


def core_loss(row, mains_high, v_primary):
    """core_loss_w (V_mains/V_primary)^2; core_loss_w blank: 0.27 W x VA^0.62."""
    rated = row.number("core_loss_w", 0.27 * row.number("va") ** 0.62)
    return rated * (mains_high / v_primary) ** 2


# ---------------------------------------------------------------------------------------------
# Cost and stock
# ---------------------------------------------------------------------------------------------


def quantities(build):
    """Pieces of each part per unit built, summed over all its uses."""
    count = {}

    def add(part, pieces):
        if part:
            count[part] = count.get(part, 0) + pieces

    for transformer in build["transformers"]:
        add(transformer["part"], 1)
    for section in build["sections"]:
        add(section["rectifier"], section["rectifier_qty"])
        add(section["rectifier_sink"], 1)
        add(section["reservoir"], section["reservoir_qty"])
    for rail in build["rails"]:
        add(rail["pass"], 1)
        add(rail["sink"], 1)
    return count


def unit_price(row, pieces):
    """Price at a number of pieces, in integers of 1e-6 of the currency."""
    price = row.text("price")
    for step in row.text("breaks", " ").split():
        least, at = step.split(":")
        if pieces >= int(least):
            price = at
    return round(float(price) * 1_000_000)


def cost_per_unit(build, rows, builds):
    micro = sum(n * unit_price(rows[part], n * builds) for part, n in quantities(build).items())
    return micro / 1e6


# ---------------------------------------------------------------------------------------------
# Limits
# ---------------------------------------------------------------------------------------------


class Margins:
    def __init__(self):
        self.list = []

    def add(self, of, limit, corner, unit, value, sign, bound):
        """value, bound: functions, so that a blank cell fails this one limit.  sign: '>=' or '<='."""
        missing, numbers = None, []
        for side in (value, bound):
            try:
                numbers.append(float(side()))
            except Missing as blank:
                missing = missing or str(blank)
                numbers.append(None)
        entry = {"of": of, "limit": limit, "value": numbers[0], "bound": numbers[1], "unit": unit, "margin": None, "corner": corner}
        if missing:
            entry["value"], entry["missing"] = None, missing
        else:
            entry["margin"] = numbers[0] - numbers[1] if sign == ">=" else numbers[1] - numbers[0]
        self.list.append(entry)


def met(entry):
    return entry["margin"] is not None and entry["margin"] >= -TOLERANCE * max(abs(entry["bound"]), 1.0)


def transformer_limits(out, name, sections, given):
    row, v_primary = sections[0].transformer, sections[0].v_primary
    fmin = lambda: row.number("freq_min_hz", 50.0)
    out.add(name, "primary-voltage", "idle", "V", lambda: given.mains_high, "<=",
            lambda: v_primary * min(1.1 * given.hz / fmin(), 1.2))
    out.add(name, "primary-frequency", "", "Hz", lambda: given.hz, ">=", lambda: 0.9 * fmin())
    out.add(name, "transformer-ambient", "", "degC", lambda: given.t_hi, "<=", lambda: row.number("ta_c", 40.0))
    out.add(name, "transformer-load", "high", "VA", lambda: sum(s.windings_va() for s in sections), "<=",
            lambda: row.number("va"))


def source_limits(out, s, given):
    """Winding and rectifier: of a dual pair once, on the positive half."""
    row = s.rectifier
    out.add(s.id, "winding-current", "high", "A", s.winding_rms, "<=", lambda: s.hookup.i)
    if s.path == "half-wave":
        out.add(s.id, "core-bias", "high", "A", lambda: s.load, "<=",
                lambda: 0.0 if s.transformer.text("core") == "toroid" else 0.2 * s.hookup.i)
    out.add(s.id, "reverse-voltage", "idle", "V", lambda: row.number("vrrm_v"), ">=",
            lambda: (1 + given.m_reverse) * s.peak_inverse())
    out.add(s.id, "rectifier-current", "high", "A", s.rectifier_mean, "<=", s.rectifier_allowed)
    out.add(s.id, "rectifier-surge", "switch-on", "A", s.surge, "<=", lambda: row.number("ifsm_a"))
    out.add(s.id, "rectifier-junction", "high", "degC",
            lambda: given.t_hi + junction_rise(s.package_loss(), row, s.rectifier_sink), "<=",
            lambda: row.number("tj_max_c") - given.m_junction)


def section_limits(out, s, given):
    can = s.reservoir
    if not s.negative_half:
        source_limits(out, s, given)
    out.add(s.id, "reservoir-voltage", "idle", "V", lambda: s.crest_idle, "<=",
            lambda: can.number("v_rated_v") * (1 - given.m_reservoir))
    out.add(s.id, "reservoir-ripple", "high", "A", s.rms_per_can, "<=", lambda: ripple_rating(can, s.path))
    out.add(s.id, "reservoir-hot", "high", "degC", s.hot, "<=", lambda: can.number("t_max_c") + 5)
    out.add(s.id, "reservoir-life", "high", "h", s.life, ">=", lambda: given.life)


def rail_limits(out, rail, given):
    device, name, s = rail.device, rail.name, rail.section
    low = s.at["low"]
    out.add(name, "headroom", "low", "V", lambda: low.valley, ">=", lambda: rail.needed() + given.m_headroom)
    if "dip" in rail.asked:
        out.add(name, "ride-through", "low", "V", lambda: low.valley - s.load * rail.dip_time() / s.c_low, ">=", rail.needed)
    both_blank = not device.has("vin_max_v") and not device.has("vdiff_max_v")
    if device.has("vin_max_v") or both_blank:
        out.add(name, "input-ceiling", "idle", "V", lambda: s.crest_idle, "<=", lambda: device.number("vin_max_v"))
    if device.has("vdiff_max_v"):
        out.add(name, "input-difference", "idle", "V", lambda: s.crest_idle - rail.v_out, "<=",
                lambda: device.number("vdiff_max_v"))
    out.add(name, "pass-current", "", "A", lambda: rail.amps, "<=", lambda: device.number("iout_max_a"))
    corner = rail.junction_corner(given.t_hi)
    out.add(name, "pass-junction", corner, "degC", lambda: rail.junction(corner, given.t_hi), "<=",
            lambda: device.number("tj_max_c") - given.m_junction)
    if "ripple" in rail.asked:
        value, worst = rail.output_ripple()
        out.add(name, "output-ripple", worst, "V", lambda: value, "<=", lambda: quantity(rail.asked["ripple"]))
    if "accuracy" in rail.asked:
        out.add(name, "output-accuracy", "", "1", rail.accuracy, "<=", lambda: quantity(rail.asked["accuracy"]))


def supply_limits(out, build, rows, heat, cost):
    caps = build["supply"].get("caps", {})
    if "height" in caps:
        out.add("supply", "height", "", "m", lambda: max(rows[part].number("height_mm") for part in quantities(build)), "<=",
                lambda: quantity(caps["height"]))
    if "cost" in caps:
        out.add("supply", "cost", "", "", lambda: cost, "<=", lambda: caps["cost"])  # no catalogue, no currency
    if "heat" in caps:
        out.add("supply", "heat", "high", "W", lambda: heat, "<=", lambda: quantity(caps["heat"]))


def judge(name, build):
    """The whole case: the build, its margins, heat, cost and verdict."""
    supply = build["supply"]
    given, builds = conditions(supply), supply.get("builds", 1)
    rows = {part: Row(part, cells) for part, cells in build["parts"].items()}
    assert set(rows) == set(quantities(build)), "the rows are exactly those of the build"
    sections = [Section(build, given, rows, s) for s in build["sections"]]
    for s in sections:
        s.settle(sections)
    out = Margins()
    heat = 0.0
    for transformer in build["transformers"]:
        fed = [s for s in sections if s.transformer_id == transformer["id"]]
        transformer_limits(out, transformer["id"], fed, given)
        heat += sum(s.heat() for s in fed) + core_loss(fed[0].transformer, given.mains_high, fed[0].v_primary)
    for s in sections:
        section_limits(out, s, given)
    rails = {rail.name: rail for s in sections for rail in s.rails}
    for asked in supply["rail"]:
        rail_limits(out, rails[asked["name"]], given)
    cost = cost_per_unit(build, rows, builds)
    supply_limits(out, build, rows, heat, cost)
    for part, pieces in quantities(build).items():
        if rows[part].has("stock"):
            out.add(part, "stock", "", "pieces", lambda: pieces * builds, "<=", lambda: rows[part].number("stock"))
    return {
        "name": name, "build": build, "margins": out.list, "heat_w": heat, "cost_per_unit": cost,
        "passes": all(met(entry) for entry in out.list),
    }, sections


# ---------------------------------------------------------------------------------------------
# The builds.  All parts are invented.
# ---------------------------------------------------------------------------------------------


def case_one_rail():
    """One 12 V rail; bridge module on a sink of its own; the second winding stays unused but counts in S."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 1: one rail",
            "builds": 40,
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
            "ambient": {"low": "0 degC", "high": "40 degC", "inside_rise": "5 K"},
            "rail": [
                {"name": "main", "voltage": "12 V", "current": "1 A", "idle": "20 mA",
                 "accuracy": "6 %", "ripple": "5 mV", "dip": "8 ms"},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0412"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 1, "secondaries": [1], "hookup": "single", "path": "bridge",
             "pair": None, "rectifier": "Z2-0207", "rectifier_qty": 1, "rectifier_sink": "Z5-0032",
             "reservoir": "Z3-0471", "reservoir_qty": 2, "rails": ["main"]},
        ],
        "rails": [{"name": "main", "section": "A", "pass": "Z4-1200", "sink": "Z5-0018"}],
        "parts": {
            "Z1-0412": {
                "price": "14.80", "breaks": "25:13.65 100:12.90", "stock": "60", "height_mm": "44", "primary_v": "230",
                "va": "66", "secondary_v": "17+9", "secondary_a": "3.4+0.7", "regulation_pct": "11", "winding_c": "90",
                "primary_share_pct": "45", "v_tol_pct": "3", "core_loss_w": "2.1", "core": "laminated", "ta_c": "50",
            },
            "Z2-0207": {
                "price": "1.12", "breaks": "50:0.98", "height_mm": "20", "kind": "bridge", "vrrm_v": "200", "io_a": "4",
                "io_for": "capacitive", "ifsm_a": "120", "threshold_v": "0.80", "slope_mohm": "22", "rth_ja_k_w": "32",
                "rth_jc_k_w": "3.2", "case": "SIP-4", "tj_max_c": "150",
            },
            "Z3-0471": {
                "price": "0.92", "breaks": "50:0.84 200:0.71", "stock": "500", "height_mm": "36", "c_uf": "4700",
                "tol_minus_pct": "20", "tol_plus_pct": "20", "v_rated_v": "50", "esr_mohm": "48", "esr_hz": "120",
                "ripple_a": "2.6", "ripple_hz": "120", "t_max_c": "105", "life_h": "5000",
            },
            "Z4-1200": {
                "price": "0.66", "height_mm": "19", "kind": "fixed", "vout_v": "12", "tol_pct": "4", "dropout_v": "2.1",
                "vin_max_v": "40", "iout_max_a": "1.5", "ground_ma": "8", "psrr_db": "60", "load_reg_pct": "0.6",
                "line_reg_pct_v": "0.02", "rth_jc_k_w": "2.5", "rth_ja_k_w": "60", "tj_max_c": "150", "case": "TO-220",
            },
            "Z5-0018": {"price": "2.35", "breaks": "100:2.10", "height_mm": "40", "cases": "to-220 TO-247",
                        "rth_sa_k_w": "2.4", "rise_k": "75", "rth_cs_k_w": "0.6"},
            "Z5-0032": {"price": "0.88", "height_mm": "30", "cases": "SIP-4", "rth_sa_k_w": "9.5"},
        },
    }


def case_two_rails():
    """+5 V (parallel windings, four diodes) and -9 V (centre-tap, two of the same diodes); cold, capped, some limits fail."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 2: two rails",
            "builds": 60,
            "share": "never",
            "mains": {"voltage": "120 V", "low": "104 V", "high": "127 V", "frequency": "60 Hz", "flat_top": "2 %"},
            "ambient": {"low": "-10 degC", "high": "45 degC", "inside_rise": "8 K"},
            "margins": {"headroom": "0.3 V", "reservoir": "15 %", "reverse": "40 %", "junction": "20 K"},
            "ageing": {"capacitance_loss": "25 %", "esr_rise": 2.5, "life": "30000 h"},
            "caps": {"cost": 40.0, "heat": "30 W", "height": "45 mm"},
            "rail": [
                {"name": "logic", "voltage": "5 V", "current": "1.2 A", "accuracy": "5 %", "ripple": "20 mV"},
                {"name": "bias", "voltage": "-9 V", "current": "0.6 A", "accuracy": "7 %", "ripple": "5 mV", "dip": "5 ms"},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0809"}, {"id": "T2", "part": "Z1-1212"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 2, "secondaries": [1, 2], "hookup": "parallel", "path": "bridge",
             "pair": None, "rectifier": "Z2-0104", "rectifier_qty": 4, "rectifier_sink": None,
             "reservoir": "Z3-0332", "reservoir_qty": 3, "rails": ["logic"]},
            {"id": "B", "transformer": "T2", "windings": 2, "secondaries": [1, 2], "hookup": "centre-tap", "path": "centre-tap",
             "pair": None, "rectifier": "Z2-0104", "rectifier_qty": 2, "rectifier_sink": None,
             "reservoir": "Z3-0332", "reservoir_qty": 1, "rails": ["bias"]},
        ],
        "rails": [
            {"name": "logic", "section": "A", "pass": "Z4-0500", "sink": "Z5-0041"},
            {"name": "bias", "section": "B", "pass": "Z4-1330", "sink": "Z5-0041"},
        ],
        "parts": {
            "Z1-0809": {
                "price": "11.40", "breaks": "50:10.20", "height_mm": "41", "primary_v": "115+115", "freq_min_hz": "60",
                "va": "36", "secondary_v": "8+8", "secondary_a": "2.2+2.2", "regulation_pct": "14", "winding_c": "80",
                "core_loss_w": "1.6", "core": "laminated", "ta_c": "60",
            },
            "Z1-1212": {
                "price": "8.75", "height_mm": "47", "primary_v": "100/120/230", "va": "30", "secondary_v": "12-0-12",
                "regulation_pct": "15", "v_tol_pct": "2", "core": "laminated",
            },
            "Z2-0104": {
                "price": "0.31", "breaks": "100:0.24 300:0.17 1000:0.12", "stock": "340", "height_mm": "9", "kind": "diode",
                "type": "schottky", "vrrm_v": "50", "io_a": "3", "ifsm_a": "80", "threshold_v": "0.34", "slope_mohm": "42",
                "rth_ja_k_w": "45", "tj_max_c": "150",
            },
            "Z3-0332": {
                "price": "0.58", "breaks": "200:0.49", "stock": "240", "height_mm": "32", "c_uf": "3300", "tol_minus_pct": "10",
                "tol_plus_pct": "30", "v_rated_v": "25", "esr_mohm": "22", "esr_hz": "100000", "ripple_a": "3.4",
                "ripple_hz": "100000", "t_max_c": "105", "life_h": "4000",
            },
            "Z4-0500": {
                "price": "0.54", "height_mm": "19", "kind": "fixed", "vout_v": "5", "tol_pct": "3", "dropout_v": "1.8",
                "vin_max_v": "35", "iout_max_a": "1.5", "ground_ma": "10", "psrr_db": "62", "load_reg_pct": "1",
                "line_reg_pct_v": "0.03", "rth_jc_k_w": "3", "tj_max_c": "150", "case": "TO-220",
            },
            "Z4-1330": {
                "price": "0.83", "breaks": "60:0.71", "height_mm": "19", "kind": "adjustable", "polarity": "-",
                "vout_min_v": "1.25", "vout_max_v": "30", "vref_v": "1.25", "tol_pct": "4", "dropout_v": "2.4",
                "dropout_light_v": "1.5", "vdiff_max_v": "32", "iout_max_a": "1.5", "ground_ma": "0.1", "psrr_db": "66",
                "load_reg_pct": "0.5", "line_reg_pct_v": "0.02", "rth_jc_k_w": "4", "tj_max_c": "125", "case": "TO-220",
            },
            "Z5-0041": {"price": "1.05", "breaks": "100:0.94", "height_mm": "38", "cases": "TO-220", "rth_sa_k_w": "3.1",
                        "rise_k": "60"},
        },
    }


def case_half_wave():
    """Half-wave from a toroid (core-bias fails), vf_v at vf_a, free-standing device, life_h blank."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 3: half-wave",
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz", "flat_top": "4 %"},
            "ambient": {"low": "5 degC", "high": "50 degC"},
            "rail": [
                {"name": "standby", "voltage": "5 V", "current": "60 mA", "ripple": "3 mV", "dip": "15 ms", "paths": ["half-wave"]},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0009"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 2, "secondaries": [1, 2], "hookup": "series", "path": "half-wave",
             "pair": None, "rectifier": "Z2-0011", "rectifier_qty": 1, "rectifier_sink": None,
             "reservoir": "Z3-0222", "reservoir_qty": 1, "rails": ["standby"]},
        ],
        "rails": [{"name": "standby", "section": "A", "pass": "Z4-0510", "sink": None}],
        "parts": {
            "Z1-0009": {
                "price": "6.20", "height_mm": "28", "primary_v": "115+115", "freq_min_hz": "45", "va": "7", "secondary_v": "4+4",
                "regulation_pct": "18", "core": "toroid", "ta_c": "55",
            },
            "Z2-0011": {
                "price": "0.05", "kind": "diode", "vrrm_v": "200", "io_a": "1", "ifsm_a": "30", "vf_v": "1.1", "vf_a": "1",
                "rth_ja_k_w": "70", "tj_max_c": "150",
            },
            "Z3-0222": {
                "price": "0.37", "c_uf": "2.2 mF", "v_rated_v": "25", "esr_mohm": "0.09 ohm", "ripple_a": "1.1", "t_max_c": "85",
                "life_h": "",
            },
            "Z4-0510": {
                "price": "0.19", "kind": "fixed", "vout_v": "5", "tol_pct": "5", "dropout_v": "1.7", "vin_max_v": "30",
                "vdiff_max_v": "25", "iout_max_a": "0.1", "ground_ma": "3.5", "psrr_db": "54", "rth_ja_k_w": "140", "tj_max_c": "150",
            },
        },
    }


def case_dual_module():
    """+12 V and -12 V of different loads from one bridge module, on a sink, across two equal windings; banks differ."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 4: dual with a module",
            "builds": 30,
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
            "ambient": {"low": "-5 degC", "high": "40 degC", "inside_rise": "6 K"},
            "caps": {"heat": "40 W", "height": "45 mm"},
            "rail": [
                {"name": "plus", "voltage": "12 V", "current": "0.9 A", "accuracy": "6 %", "ripple": "6 mV", "dip": "5 ms"},
                {"name": "minus", "voltage": "-12 V", "current": "0.35 A", "ripple": "6 mV", "dip": "15 ms"},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0616"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 2, "secondaries": [1, 2], "hookup": "dual", "path": "dual",
             "pair": "B", "rectifier": "Z2-0404", "rectifier_qty": 1, "rectifier_sink": "Z5-0012",
             "reservoir": "Z3-0472", "reservoir_qty": 2, "rails": ["plus"]},
            {"id": "B", "transformer": "T1", "windings": 0, "secondaries": [], "hookup": "dual", "path": "dual",
             "pair": "A", "rectifier": "Z2-0404", "rectifier_qty": 0, "rectifier_sink": None,
             "reservoir": "Z3-0332", "reservoir_qty": 1, "rails": ["minus"]},
        ],
        "rails": [
            {"name": "plus", "section": "A", "pass": "Z4-1215", "sink": "Z5-0003"},
            {"name": "minus", "section": "B", "pass": "Z4-1216", "sink": None},
        ],
        "parts": {
            "Z1-0616": {
                "price": "13.20", "breaks": "25:12.40", "height_mm": "42", "primary_v": "115+115", "va": "60",
                "secondary_v": "15.5+15.5+6", "secondary_a": "1.6+1.6+0.5", "regulation_pct": "12", "primary_share_pct": "55",
                "v_tol_pct": "2", "core_loss_w": "2.4", "core": "laminated", "ta_c": "50",
            },
            "Z2-0404": {
                "price": "0.74", "breaks": "30:0.69", "height_mm": "16", "kind": "bridge", "vrrm_v": "200", "io_a": "2",
                "ifsm_a": "60", "vf_v": "1.05", "vf_a": "2", "rth_ja_k_w": "40", "rth_jc_k_w": "6", "case": "GBU", "tj_max_c": "150",
            },
            "Z3-0472": {
                "price": "0.88", "height_mm": "36", "c_uf": "4700", "v_rated_v": "40", "esr_mohm": "60", "ripple_a": "2.2",
                "t_max_c": "105", "life_h": "4000",
            },
            "Z3-0332": {
                "price": "0.66", "stock": "29", "height_mm": "30", "c_uf": "3300", "tol_minus_pct": "10", "tol_plus_pct": "30",
                "v_rated_v": "35", "esr_mohm": "35", "esr_hz": "100000", "ripple_a": "2.4", "ripple_hz": "100000", "t_max_c": "85",
                "life_h": "2000",
            },
            "Z4-1215": {
                "price": "0.52", "height_mm": "19", "kind": "fixed", "vout_v": "12", "tol_pct": "4", "dropout_v": "2",
                "vin_max_v": "40", "iout_max_a": "1.5", "ground_ma": "7", "psrr_db": "61", "load_reg_pct": "0.5",
                "line_reg_pct_v": "0.03", "rth_jc_k_w": "3", "tj_max_c": "150", "case": "TO-220",
            },
            "Z4-1216": {
                "price": "0.55", "height_mm": "19", "kind": "fixed", "polarity": "-", "vout_v": "12", "tol_pct": "4",
                "dropout_v": "1.9", "vin_max_v": "40", "iout_max_a": "1", "ground_ma": "5", "psrr_db": "58", "rth_ja_k_w": "32",
                "tj_max_c": "150",
            },
            "Z5-0003": {"price": "1.90", "height_mm": "38", "cases": "TO-220", "rth_sa_k_w": "3.4", "rise_k": "65"},
            "Z5-0012": {"price": "0.48", "height_mm": "25", "cases": "GBU SIP-4", "rth_sa_k_w": "14", "rth_cs_k_w": "0.8"},
        },
    }


def case_dual_diodes():
    """-15 V with -9 V (first, and the heavier half) and +15 V from four diodes on 18-0-18; +5 V from a winding beside it."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 5: dual with diodes",
            "builds": 100,
            "mains": {"voltage": "120 V", "tolerance": "12 %", "frequency": "60 Hz", "flat_top": "2 %"},
            "ambient": {"low": "5 degC", "high": "35 degC", "inside_rise": "10 K"},
            "margins": {"headroom": "0.2 V", "reservoir": "5 %", "reverse": "60 %", "junction": "10 K"},
            "caps": {"cost": 30.0},
            "rail": [
                {"name": "minus", "voltage": "-15 V", "current": "0.5 A", "accuracy": "8 %", "ripple": "3 mV"},
                {"name": "plus", "voltage": "15 V", "current": "0.3 A", "idle": "40 mA", "ripple": "3 mV", "paths": ["dual"]},
                {"name": "logic", "voltage": "5 V", "current": "0.8 A", "accuracy": "5 %", "dip": "10 ms"},
                {"name": "bias", "voltage": "-9 V", "current": "0.12 A", "idle": "10 mA", "accuracy": "6 %"},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-1818"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 0, "secondaries": [], "hookup": "dual", "path": "dual",
             "pair": "B", "rectifier": "Z2-0131", "rectifier_qty": 0, "rectifier_sink": None,
             "reservoir": "Z3-0222", "reservoir_qty": 2, "rails": ["minus", "bias"]},
            {"id": "B", "transformer": "T1", "windings": 2, "secondaries": [1, 2], "hookup": "dual", "path": "dual",
             "pair": "A", "rectifier": "Z2-0131", "rectifier_qty": 4, "rectifier_sink": None,
             "reservoir": "Z3-0222", "reservoir_qty": 1, "rails": ["plus"]},
            {"id": "C", "transformer": "T1", "windings": 1, "secondaries": [3], "hookup": "single", "path": "bridge",
             "pair": None, "rectifier": "Z2-0131", "rectifier_qty": 4, "rectifier_sink": None,
             "reservoir": "Z3-0472", "reservoir_qty": 2, "rails": ["logic"]},
        ],
        "rails": [
            {"name": "minus", "section": "A", "pass": "Z4-1330", "sink": "Z5-0041"},
            {"name": "plus", "section": "B", "pass": "Z4-1230", "sink": None},
            {"name": "logic", "section": "C", "pass": "Z4-0500", "sink": "Z5-0041"},
            {"name": "bias", "section": "A", "pass": "Z4-1330", "sink": None},
        ],
        "parts": {
            "Z1-1818": {
                "price": "11.80", "height_mm": "52", "primary_v": "100/120", "freq_min_hz": "50", "va": "56",
                "secondary_v": "18-0-18+8.5", "secondary_a": "1.1-0-1.1+1.9", "regulation_pct": "13", "winding_c": "95",
                "core": "laminated", "ta_c": "45",
            },
            "Z2-0131": {
                "price": "0.06", "breaks": "500:0.041", "kind": "diode", "type": "schottky", "vrrm_v": "100", "io_a": "1",
                "io_for": "capacitive", "ifsm_a": "40", "threshold_v": "0.45", "slope_mohm": "90", "rth_ja_k_w": "65",
                "tj_max_c": "150",
            },
            "Z3-0222": {
                "price": "0.44", "breaks": "200:0.38", "stock": "300", "c_uf": "2200", "v_rated_v": "35", "esr_mohm": "75",
                "esr_hz": "120", "ripple_a": "1.5", "ripple_hz": "120", "t_max_c": "105", "life_h": "3000",
            },
            "Z3-0472": {
                "price": "0.61", "c_uf": "4.7 mF", "tol_plus_pct": "50", "v_rated_v": "25", "esr_mohm": "55", "ripple_a": "2.1",
                "t_max_c": "85", "life_h": "5000",
            },
            "Z4-1330": {
                "price": "0.83", "breaks": "200:0.71", "kind": "adjustable", "polarity": "-", "vout_min_v": "1.25",
                "vout_max_v": "30", "vref_v": "1.25", "tol_pct": "4", "dropout_v": "2.3", "dropout_light_v": "1.4",
                "vdiff_max_v": "40", "iout_max_a": "1.5", "ground_ma": "0.1", "psrr_db": "66", "load_reg_pct": "0.5",
                "line_reg_pct_v": "0.02", "rth_jc_k_w": "4", "rth_ja_k_w": "50", "tj_max_c": "125", "case": "TO-220",
            },
            "Z4-1230": {
                "price": "0.61", "kind": "adjustable", "vout_min_v": "1.25", "vout_max_v": "32", "vref_v": "1.25", "tol_pct": "3",
                "dropout_v": "2.5", "vdiff_max_v": "35", "vin_max_v": "45", "iout_max_a": "1", "ground_ma": "0.1",
                "psrr_db": "64", "psrr_vout_v": "10", "rth_ja_k_w": "38", "tj_max_c": "125",
            },
            "Z4-0500": {
                "price": "0.48", "kind": "fixed", "vout_v": "5", "tol_pct": "3", "dropout_v": "1.7", "vin_max_v": "30",
                "iout_max_a": "1", "ground_ma": "9", "load_reg_pct": "0.8", "line_reg_pct_v": "0.02", "rth_jc_k_w": "3.5",
                "tj_max_c": "150", "case": "TO-220",
            },
            "Z5-0041": {"price": "0.95", "cases": "TO-220", "rth_sa_k_w": "6.2", "rise_k": "50"},
        },
    }


def case_shared_section():
    """+12 V, +5 V and +9 V from one section: with the others idle the raw voltage rises, and `alone` is the worse corner."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 6: one section, three rails",
            "builds": 20,
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
            "ambient": {"low": "10 degC", "high": "45 degC", "inside_rise": "3 K"},
            "rail": [
                {"name": "drive", "voltage": "12 V", "current": "1.1 A", "idle": "1.1 A", "section": "X", "ripple": "8 mV", "dip": "3 ms"},
                {"name": "logic", "voltage": "5 V", "current": "0.25 A", "idle": "30 mA", "section": "X", "accuracy": "5 %"},
                {"name": "sensor", "voltage": "9 V", "current": "0.15 A", "ripple": "2 mV", "dip": "12 ms"},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0518"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 1, "secondaries": [1], "hookup": "single", "path": "bridge",
             "pair": None, "rectifier": "Z2-0404", "rectifier_qty": 1, "rectifier_sink": None,
             "reservoir": "Z3-0682", "reservoir_qty": 2, "rails": ["drive", "logic", "sensor"]},
        ],
        "rails": [
            {"name": "drive", "section": "A", "pass": "Z4-1212", "sink": "Z5-0018"},
            {"name": "logic", "section": "A", "pass": "Z4-0505", "sink": "Z5-0018"},
            {"name": "sensor", "section": "A", "pass": "Z4-0909", "sink": None},
        ],
        "parts": {
            "Z1-0518": {
                "price": "10.90", "primary_v": "230", "va": "60", "secondary_v": "16", "regulation_pct": "14", "v_tol_pct": "3",
                "core_loss_w": "2.2", "core": "laminated", "ta_c": "50",
            },
            "Z2-0404": {
                "price": "0.74", "kind": "bridge", "vrrm_v": "200", "io_a": "4", "ifsm_a": "120", "threshold_v": "0.75",
                "slope_mohm": "30", "rth_ja_k_w": "22", "tj_max_c": "150",
            },
            "Z3-0682": {
                "price": "1.05", "c_uf": "6800", "v_rated_v": "35", "esr_mohm": "40", "ripple_a": "3", "t_max_c": "105",
                "life_h": "5000",
            },
            "Z4-1212": {
                "price": "0.52", "kind": "fixed", "vout_v": "12", "tol_pct": "3", "dropout_v": "1.2", "vin_max_v": "35",
                "iout_max_a": "1.5", "ground_ma": "12", "psrr_db": "60", "rth_jc_k_w": "2.5", "tj_max_c": "150", "case": "TO-220",
            },
            "Z4-0505": {
                "price": "0.33", "kind": "fixed", "vout_v": "5", "tol_pct": "2.5", "dropout_v": "2", "vin_max_v": "35",
                "iout_max_a": "0.5", "ground_ma": "6", "load_reg_pct": "0.5", "line_reg_pct_v": "0.05", "rth_jc_k_w": "5",
                "tj_max_c": "125", "case": "TO-220",
            },
            "Z4-0909": {
                "price": "0.29", "kind": "fixed", "vout_v": "9", "tol_pct": "4", "dropout_v": "1.8", "vin_max_v": "35",
                "iout_max_a": "0.5", "ground_ma": "4", "psrr_db": "64", "rth_ja_k_w": "30", "tj_max_c": "150",
            },
            "Z5-0018": {"price": "2.10", "cases": "TO-220 TO-247", "rth_sa_k_w": "2.2", "rise_k": "70", "rth_cs_k_w": "0.6"},
        },
    }


def case_shared_transformer():
    """+5 V from parallel windings and -12 V from a floating half-wave section with a positive device, on one transformer."""
    return {
        "schema": "binrail.build/1",
        "supply": {
            "name": "Hand build 7: one transformer, two sections",
            "builds": 10,
            "mains": {"voltage": "230 V", "low": "200 V", "high": "250 V", "frequency": "50 Hz"},
            "ambient": {"low": "-20 degC", "high": "40 degC", "inside_rise": "2 K"},
            "caps": {"heat": "12 W"},
            "rail": [
                {"name": "logic", "voltage": "5 V", "current": "1 A", "accuracy": "5 %", "ripple": "10 mV"},
                {"name": "guard", "voltage": "-12 V", "current": "40 mA", "isolated": True, "dip": "15 ms",
                 "paths": ["half-wave"]},
            ],
        },
        "catalogue": None,
        "transformers": [{"id": "T1", "part": "Z1-0916"}],
        "sections": [
            {"id": "A", "transformer": "T1", "windings": 2, "secondaries": [1, 2], "hookup": "parallel", "path": "bridge",
             "pair": None, "rectifier": "Z2-0104", "rectifier_qty": 4, "rectifier_sink": None,
             "reservoir": "Z3-0103", "reservoir_qty": 1, "rails": ["logic"]},
            {"id": "B", "transformer": "T1", "windings": 1, "secondaries": [3], "hookup": "single", "path": "half-wave",
             "pair": None, "rectifier": "Z2-0104", "rectifier_qty": 1, "rectifier_sink": None,
             "reservoir": "Z3-0471", "reservoir_qty": 3, "rails": ["guard"]},
        ],
        "rails": [
            {"name": "logic", "section": "A", "pass": "Z4-0510", "sink": "Z5-0041"},
            {"name": "guard", "section": "B", "pass": "Z4-1205", "sink": None},
        ],
        "parts": {
            "Z1-0916": {
                "price": "9.60", "primary_v": "230", "va": "30", "secondary_v": "9+9+16", "secondary_a": "1.2+1.2+0.3",
                "regulation_pct": "16", "winding_c": "80", "primary_share_pct": "40", "v_tol_pct": "1.5", "core": "laminated",
                "ta_c": "50",
            },
            "Z2-0104": {
                "price": "0.11", "breaks": "50:0.08", "kind": "diode", "vrrm_v": "100", "io_a": "2", "ifsm_a": "60", "vf_v": "1",
                "vf_a": "2", "rth_ja_k_w": "50", "tj_max_c": "150",
            },
            "Z3-0103": {
                "price": "1.15", "c_uf": "10000", "v_rated_v": "25", "esr_mohm": "30", "ripple_a": "3.2", "t_max_c": "105",
                "life_h": "5000",
            },
            "Z3-0471": {
                "price": "0.28", "c_uf": "470", "v_rated_v": "50", "esr_mohm": "300", "ripple_a": "0.6", "t_max_c": "105",
                "life_h": "4000",
            },
            "Z4-0510": {
                "price": "0.45", "kind": "fixed", "vout_v": "5", "tol_pct": "3", "dropout_v": "1.6", "vin_max_v": "35",
                "iout_max_a": "1", "ground_ma": "8", "psrr_db": "62", "load_reg_pct": "0.6", "line_reg_pct_v": "0.03",
                "rth_jc_k_w": "3", "tj_max_c": "150", "case": "TO-220",
            },
            "Z4-1205": {
                "price": "0.24", "kind": "fixed", "vout_v": "12", "tol_pct": "5", "dropout_v": "1.7", "vin_max_v": "40",
                "iout_max_a": "0.1", "ground_ma": "3", "rth_ja_k_w": "150", "tj_max_c": "150",
            },
            "Z5-0041": {"price": "0.95", "cases": "TO-220", "rth_sa_k_w": "6.2", "rise_k": "50"},
        },
    }


CASES = [
    ("one rail", case_one_rail), ("two rails", case_two_rails), ("half-wave", case_half_wave),
    ("dual with a module", case_dual_module), ("dual with diodes", case_dual_diodes),
    ("one section, three rails", case_shared_section), ("one transformer, two sections", case_shared_transformer),
]


def work_out():
    return [judge(name, build()) for name, build in CASES]


# ---------------------------------------------------------------------------------------------
# Comparison, printing, verification
# ---------------------------------------------------------------------------------------------


def differences(old, new, where=""):
    """Paths at which two documents differ by more than TOLERANCE, relative.

    A margin is a difference of value and bound, so its error is taken relative to the larger of the two.
    """
    if isinstance(old, dict) and isinstance(new, dict):
        if list(old) != list(new):
            return [f"{where}: keys {list(old)} / {list(new)}"]
        found = []
        for key in old:
            if key == "margin" and old[key] is not None and new[key] is not None:
                scale = max(abs(new["value"]), abs(new["bound"]))
                if not abs(old[key] - new[key]) <= TOLERANCE * scale:
                    found.append(f"{where}/{key}: {old[key]} / {new[key]}")
            else:
                found += differences(old[key], new[key], f"{where}/{key}")
        return found
    if isinstance(old, list) and isinstance(new, list):
        if len(old) != len(new):
            return [f"{where}: {len(old)} / {len(new)} entries"]
        return [d for n, (a, b) in enumerate(zip(old, new)) for d in differences(a, b, f"{where}/{n}")]
    if type(old) is float and type(new) is float:
        same = abs(old - new) <= TOLERANCE * max(abs(old), abs(new))
    else:
        same = type(old) is type(new) and old == new
    return [] if same else [f"{where}: {old!r} / {new!r}"]


def show(case, sections):
    print(f"== {case['name']}: {'passes' if case['passes'] else 'FAILS'}, "
          f"{case['heat_w']:.4f} W, {case['cost_per_unit']:.6f} per unit")
    for s in sections:
        print(f"   {s.id}: I_L {s.load:.4f} A, V_oc {s.v_oc_low:.3f}/{s.v_oc_high:.3f} V, R {s.r_low:.4f}/{s.r_high:.4f}/{s.r_cold:.4f} ohm, "
              f"V_T0 {s.v_t0_low:.3f}/{s.v_t0_high:.3f}, C {s.c_low*1e6:.1f}/{s.c_high*1e6:.1f} uF, ESR {s.esr_low*1e3:.2f}/{s.esr*1e3:.2f} mohm")
        for corner, a in s.at.items():
            print(f"      {corner:5} valley {a.valley:8.4f} peak {a.peak:8.4f} mean {a.mean:8.4f} pp {a.ripple:7.4f} V; i mean {a.source_mean:.4f} "
                  f"rms {a.source_rms:.4f} peak {a.source_peak:.4f}, reservoir {a.reservoir_rms:.4f} A; {math.degrees(a.end-a.start):.2f} deg")
    for m in case["margins"]:
        number = lambda x: f"{x:14.6f}" if x is not None else f"{'-':>14}"
        note = "" if met(m) else "  FAILS" + (f" ({m['missing']} blank)" if "missing" in m else "")
        print(f"   {m['of']:8} {m['limit']:20} {number(m['value'])} {number(m['bound'])} {m['unit']:6} {number(m['margin'])} {m['corner']}{note}")


def march(k, rtol=1e-12):
    """The same circuit by time integration and shooting on u at a zero crossing of the source: (valley, peak, mean, i mean, i rms)."""
    w = 2 * math.pi * k.hz
    period = math.pi if k.full_wave else 2 * math.pi

    def rates(x, y, on):
        e = k.v_pk * (abs(math.sin(x)) if k.full_wave else math.sin(x)) - k.v_d
        i = (e - y[0]) / (k.r + k.esr) if on else 0.0
        v = y[0] + k.esr * i
        return [(i - k.load) / (w * k.c), v, i, i * i]

    def cross(x, y, on):
        return k.v_pk * math.sin(x) - k.v_d - y[0]

    cross.terminal = True

    def one_period(u):
        """Off from 0 to the start, on to the end, off to the period."""
        y, x, tracks = np.array([u, 0.0, 0.0, 0.0]), 0.0, []
        for on, direction in ((False, 1), (True, -1), (False, 0)):
            cross.direction = direction
            events = cross if direction else None
            step = solve_ivp(rates, (x, period), y, method="DOP853", args=(on,), events=events, rtol=rtol, atol=1e-13, dense_output=True,
                             max_step=0.02)
            tracks.append((on, step))
            x, y = step.t[-1], step.y[:, -1]
        return y, tracks

    u = brentq(lambda start: one_period(start)[0][0] - start, 0.3 * k.v_pk, k.v_pk - k.v_d, xtol=1e-12)
    y, tracks = one_period(u)
    volts = []
    for on, step in tracks:
        x = np.linspace(step.t[0], step.t[-1], 20001)
        uu = step.sol(x)[0]
        volts.append(uu + k.esr * ((k.v_pk * np.sin(x) - k.v_d - uu) / (k.r + k.esr) if on else 0.0))
    volts = np.concatenate(volts)
    return volts.min(), volts.max(), y[1] / period, y[2] / period, math.sqrt(y[3] / period)


def verify():
    """Return the number of failed checks."""
    bad = 0

    def check(what, got, want, tolerance):
        nonlocal bad
        ok = abs(got - want) <= tolerance * abs(want)
        bad += not ok
        print(f"{'ok ' if ok else 'BAD'} {what}: {got:.12g}, wanted {want:.12g} ({abs(got/want-1):.1e})")

    # Exact solution, recomputed: full wave, no series resistance, constant current, k = I/(w C v_pk).
    for k, want in ((0.20, 0.41826), (0.10, 0.23862), (0.05, 0.13005), (0.02, 0.05591), (0.01, 0.02895)):
        c = 1 / (2 * math.pi * 50 * k)
        got = steady_state(Circuit(1.0, 0.0, 1e-7, c, 0.0, 1.0, 50.0, True)).ripple
        check(f"ripple at k {k}", got, want, 5e-4)
    # Diode-detector theory (Terman, from memory), large C: tan t - t = pi Rs/(n R_L), V_dc/V_pk = cos t; n = 2, 5 %: 0.832205, rms 1.79388, peak 4.03253.
    for full, want, rms, peak in ((True, 0.832205, 1.79388, 4.03253), (False, 0.751796, 2.29405, None)):
        load = want / 1.0  # R_L = 1 ohm, v_pk = 1 V
        a = steady_state(Circuit(1.0, 0.0, 0.05, 10.0, 0.0, load, 50.0, full))
        check(f"large C mean, {'full' if full else 'half'} wave", a.mean, want, 1e-5)
        check("   rms / mean", a.source_rms / load, rms, 1e-4)
        if peak:
            check("   peak / mean", a.source_peak / load, peak, 1e-4)
    # The solved corners of the builds: charge, energy and a time integration.
    for case, sections in work_out():
        for s in sections:
            circuits = {
                "low": (s.circuit(s.v_oc_low, s.r_low, s.v_t0_low, s.c_low, s.esr_low, s.load), s.at["low"]),
                "high": (s.circuit(s.v_oc_high, s.r_high, s.v_t0_high, s.c_high, s.esr, s.load), s.at["high"]),
                "worn": (s.circuit(s.v_oc_high, s.r_high, s.v_t0_high, s.c_low, s.esr_low, s.load), s.at["worn"]),
            }
            if len(s.rails) > 1:
                circuits |= {f"{rail.name} alone": (s.alone_circuit(rail), rail.alone) for rail in s.rails}
            for corner, (circuit, a) in circuits.items():
                name = f"{case['name']} {s.id} {corner}"
                check(f"{name} mean i = I_L", a.source_mean, circuit.load, 1e-12)
                check(f"{name} reservoir rms", a.reservoir_rms, math.sqrt(a.source_rms**2 - circuit.load**2), 1e-11)
                valley, peak, mean, i_mean, i_rms = march(circuit)
                check(f"{name} valley, marched", valley, a.valley, 1e-8)
                check(f"{name} peak, marched", peak, a.peak, 1e-8)
                check(f"{name} mean, marched", mean, a.mean, 1e-9)
                check(f"{name} i rms, marched", i_rms, a.source_rms, 1e-8)
    rise = junction_rise(10.0, Row("", {"rth_jc_k_w": "0"}), Row("", {"rth_sa_k_w": "2.4", "rise_k": "75", "rth_cs_k_w": "0"}))
    check("natural convection fixed point", rise, 24.0**0.8 * 75**0.2, 1e-12)
    return bad


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--write", action="store_true")
    parser.add_argument("--check", action="store_true")
    parser.add_argument("--verify", action="store_true")
    flags = parser.parse_args()
    if flags.verify:
        return 1 if verify() else 0
    worked = work_out()
    document = {"cases": [case for case, _ in worked]}
    if flags.write:
        JSON_FILE.write_text(json.dumps(document, indent=1, allow_nan=False) + "\n", encoding="utf-8")
    elif flags.check:
        found = differences(json.loads(JSON_FILE.read_text(encoding="utf-8")), document)
        print("\n".join(found) or f"{JSON_FILE.name}: no difference", file=sys.stderr)
        return 1 if found else 0
    else:
        for case, sections in worked:
            show(case, sections)
    return 0


if __name__ == "__main__":
    sys.exit(main())
