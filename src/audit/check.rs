//! Owns the words of the limits and what one evaluated limit is.

/// One set of worst-case conditions.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Corner {
    /// Low mains, aged and cold reservoir, all loads.
    Low,
    /// High mains, hot, new parts.
    High,
    /// As high, the other rails of the section idle.
    Alone,
    /// As high, with the reservoir as low.
    Worn,
    /// High mains, no load.
    Idle,
    /// Into the empty reservoir at the crest.
    SwitchOn,
    /// As rated.
    Nominal,
}

impl Corner {
    /// The word for it in reports and JSON.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Corner::Low => "low",
            Corner::High => "high",
            Corner::Alone => "alone",
            Corner::Worn => "worn",
            Corner::Idle => "idle",
            Corner::SwitchOn => "switch-on",
            Corner::Nominal => "nominal",
        }
    }
}

/// Which side of the bound is good.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sense {
    /// value >= bound
    AtLeast,
    /// value <= bound
    AtMost,
}

macro_rules! limits {
    ($($name:ident $word:literal $unit:literal $sense:ident $meaning:literal,)*) => {
        /// One inequality that a build must meet.
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub enum Limit { $(#[doc = $meaning] $name,)* }

        impl Limit {
            /// All limits in report order.
            pub const ALL: &'static [Limit] = &[$(Limit::$name,)*];

            /// The word for it in reports and JSON.
            #[must_use]
            pub fn word(self) -> &'static str { match self { $(Limit::$name => $word,)* } }

            /// Unit of value and bound; "" stands for the catalogue's currency.
            #[must_use]
            pub fn unit(self) -> &'static str { match self { $(Limit::$name => $unit,)* } }

            /// Which side of the bound is good.
            #[must_use]
            pub fn sense(self) -> Sense { match self { $(Limit::$name => Sense::$sense,)* } }

            /// What it guards, in a few words.
            #[must_use]
            pub fn meaning(self) -> &'static str { match self { $(Limit::$name => $meaning,)* } }
        }
    };
}

// The one table of limits: word, unit, direction, meaning. Their formulas are in the files beside this one.
limits! {
    PrimaryVoltage "primary-voltage" "V" AtMost "core flux at high mains",
    PrimaryFrequency "primary-frequency" "Hz" AtLeast "core flux at the lowest frequency",
    TransformerAmbient "transformer-ambient" "degC" AtMost "air around the transformer",
    TransformerLoad "transformer-load" "VA" AtMost "apparent power of all windings in use",
    WindingCurrent "winding-current" "A" AtMost "rms current of the hook-up",
    CoreBias "core-bias" "A" AtMost "direct current of a half-wave path in the core",
    ReverseVoltage "reverse-voltage" "V" AtLeast "peak inverse voltage of the rectifier",
    RectifierCurrent "rectifier-current" "A" AtMost "mean rectifier current",
    RectifierSurge "rectifier-surge" "A" AtMost "switch-on at the mains crest",
    RectifierJunction "rectifier-junction" "degC" AtMost "junction of the hottest rectifier package",
    ReservoirVoltage "reservoir-voltage" "V" AtMost "unloaded raw voltage",
    ReservoirRipple "reservoir-ripple" "A" AtMost "rms current per can",
    ReservoirHot "reservoir-hot" "degC" AtMost "hottest spot of a can",
    ReservoirLife "reservoir-life" "h" AtLeast "life of a can",
    Collapse "collapse" "1" AtLeast "the raw section holds no voltage at all",
    Headroom "headroom" "V" AtLeast "valley above output and dropout",
    RideThrough "ride-through" "V" AtLeast "valley left after the asked mains dip",
    InputCeiling "input-ceiling" "V" AtMost "unloaded raw voltage at the device",
    InputDifference "input-difference" "V" AtMost "unloaded raw voltage above the output",
    PassCurrent "pass-current" "A" AtMost "rail current",
    PassJunction "pass-junction" "degC" AtMost "junction of the pass device",
    OutputRipple "output-ripple" "V" AtMost "ripple behind the device, peak to peak",
    OutputAccuracy "output-accuracy" "1" AtMost "error of the output, a fraction",
    Height "height" "m" AtMost "tallest part",
    Cost "cost" "" AtMost "cost of one unit",
    Heat "heat" "W" AtMost "heat of one unit, full load",
    Stock "stock" "pieces" AtMost "pieces for the whole run",
}

/// What a blank cell leaves undone: the column that is missing.
pub type Known<T> = Result<T, &'static str>;

/// One limit, evaluated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Check {
    /// Which limit.
    pub limit: Limit,
    /// Left side; an error names the blank cell that it needs (then the margin is unknown and the limit fails).
    pub value: Known<f64>,
    /// Right side, with the supply's margins inside it.
    pub bound: Known<f64>,
    /// Where it is worst.
    pub corner: Option<Corner>,
}

/// A limit counts as met down to this share of its bound (or of 1): rounding, not reserve.
const MET_WITHIN: f64 = 1e-9;
/// Tightness of a limit that a blank cell leaves unknown.
const UNKNOWN_TIGHTNESS: f64 = -1e9;

impl Check {
    /// A limit at a corner.
    #[must_use]
    pub fn new(limit: Limit, corner: impl Into<Option<Corner>>, value: Known<f64>, bound: Known<f64>) -> Check {
        Check {
            limit,
            value,
            bound,
            corner: corner.into(),
        }
    }

    /// The one limit of a section that collapses at that corner.
    #[must_use]
    pub fn collapse(corner: impl Into<Option<Corner>>) -> Check {
        Check::new(Limit::Collapse, corner, Ok(0.0), Ok(1.0))
    }

    /// The column whose blank cell keeps this limit from being evaluated.
    #[must_use]
    pub fn missing(&self) -> Option<&'static str> {
        self.value.err().or(self.bound.err())
    }

    /// Positive = met; `None` when a cell is missing.
    #[must_use]
    pub fn margin(&self) -> Option<f64> {
        let (value, bound) = (self.value.ok()?, self.bound.ok()?);
        Some(match self.limit.sense() {
            Sense::AtLeast => value - bound,
            Sense::AtMost => bound - value,
        })
    }

    /// Whether the build passes it.
    #[must_use]
    pub fn met(&self) -> bool {
        match (self.margin(), self.bound) {
            (Some(margin), Ok(bound)) => margin >= -MET_WITHIN * bound.abs().max(1.0),
            _ => false,
        }
    }

    /// The tighter of two; of equally tight ones this.
    #[must_use]
    pub fn or_tighter(self, other: Check) -> Check {
        if other.tightness() < self.tightness() {
            other
        } else {
            self
        }
    }

    /// Margin as a share of the bound: how tightest and nearest are measured.
    #[must_use]
    pub fn tightness(&self) -> f64 {
        match (self.margin(), self.bound) {
            (Some(margin), Ok(bound)) => margin / bound.abs().max(1.0),
            _ => UNKNOWN_TIGHTNESS,
        }
    }
}
