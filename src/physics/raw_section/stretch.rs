//! Owns the algebra of one conduction stretch: sums of a sine, a cosine and a decaying exponential.
//!
//! Every electrical quantity during conduction is such a sum, so mean and mean square have closed forms. The basis is
//! shifted to the start of the stretch (1, sin x, cos x - 1, e^(-ax) - 1): all but the first vanish there, which keeps
//! the digits that the plain basis loses to cancellation when conduction is short.

/// Coefficients over the basis 1, sin x, cos x - 1, e^(-ax) - 1.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sum {
    pub(super) one: f64,
    pub(super) sin: f64,
    pub(super) cos: f64,
    pub(super) exp: f64,
}

impl Sum {
    /// `self * k + other * m`.
    pub(super) fn mix(self, k: f64, other: Sum, m: f64) -> Sum {
        Sum {
            one: self.one * k + other.one * m,
            sin: self.sin * k + other.sin * m,
            cos: self.cos * k + other.cos * m,
            exp: self.exp * k + other.exp * m,
        }
    }

    /// Value at a point of the stretch.
    pub(super) fn at(&self, x: &Basis) -> f64 {
        self.one + self.sin * x.sin + self.cos * x.cos + self.exp * x.exp
    }

    /// Slope and second derivative per radian there.
    pub(super) fn slopes(&self, x: &Basis) -> (f64, f64) {
        let (cos, decayed) = (1.0 + x.cos, self.exp * x.decay * (1.0 + x.exp));
        (
            self.sin * cos - self.cos * x.sin - decayed,
            x.decay * decayed - self.sin * x.sin - self.cos * cos,
        )
    }

    /// Slope per radian at the start, without the cancellation of [`Sum::slopes`].
    pub(super) fn slope_at_start(&self, a: f64) -> f64 {
        self.sin - a * self.exp
    }
}

/// The basis at one point: sin x, cos x - 1, e^(-ax) - 1.
#[derive(Debug, Clone, Copy)]
pub(super) struct Basis {
    sin: f64,
    cos: f64,
    pub(super) exp: f64,
    decay: f64,
}

impl Basis {
    /// At angle x after the start, for decay `a` per radian.
    pub(super) fn new(x: f64, a: f64) -> Basis {
        let (s, c) = (0.5 * x).sin_cos();
        Basis {
            sin: 2.0 * s * c,
            cos: -2.0 * s * s,
            exp: (-a * x).exp_m1(),
            decay: a,
        }
    }
}

/// Integrals of the basis and of its products over one stretch of `length` radians.
#[derive(Debug, Clone, Copy)]
pub(super) struct Integrals {
    length: f64,
    s: f64,
    q: f64,
    m: f64,
    ss: f64,
    sq: f64,
    qq: f64,
    sm: f64,
    qm: f64,
    mm: f64,
}

impl Integrals {
    pub(super) fn new(length: f64, a: f64) -> Self {
        let d = length;
        let (sd, cd) = d.sin_cos();
        let versine = 2.0 * (0.5 * d).sin().powi(2); // 1 - cos d
        let e1 = (-a * d).exp_m1();
        let e = 1.0 + e1;
        // Integrals of the exponential: of e^(-ax), its square, and times sine and cosine.
        let ie = if a > 0.0 { -e1 / a } else { d };
        let iee = if a > 0.0 {
            -(-2.0 * a * d).exp_m1() / (2.0 * a)
        } else {
            d
        };
        let k = 1.0 / (1.0 + a * a);
        let ies = (1.0 - e * (cd + a * sd)) * k;
        let iec = (a + e * (sd - a * cd)) * k;
        let s = versine;
        let ic = sd;
        let ss = 0.5 * (d - sd * cd);
        let sc = 0.5 * sd * sd;
        let cc = 0.5 * (d + sd * cd);
        Integrals {
            length,
            s,
            q: ic - d,
            m: ie - d,
            ss,
            sq: sc - s,
            qq: cc - 2.0 * ic + d,
            sm: ies - s,
            qm: iec - ie - ic + d,
            mm: iee - 2.0 * ie + d,
        }
    }

    /// Integral of the sum over the stretch.
    pub(super) fn of(&self, f: Sum) -> f64 {
        f.one * self.length + f.sin * self.s + f.cos * self.q + f.exp * self.m
    }

    /// Integral of the square of the sum over the stretch.
    pub(super) fn of_square(&self, f: Sum) -> f64 {
        f.one * f.one * self.length
            + 2.0 * f.one * (f.sin * self.s + f.cos * self.q + f.exp * self.m)
            + f.sin * f.sin * self.ss
            + f.cos * f.cos * self.qq
            + f.exp * f.exp * self.mm
            + 2.0 * (f.sin * f.cos * self.sq + f.sin * f.exp * self.sm + f.cos * f.exp * self.qm)
    }
}
