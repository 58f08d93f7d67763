//! Owns the requirement: what a supply must do, in SI units with every default settled.

use crate::catalogue::DeviceKind;

/// The rectifier circuit.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Path {
    /// One diode.
    HalfWave,
    /// Full wave, two diodes on two halves.
    CentreTap,
    /// Full wave, four diodes on one winding.
    Bridge,
    /// One bridge on two halves: a positive and a negative section.
    Dual,
}

impl Path {
    /// All paths.
    pub const ALL: [Path; 4] = [Path::HalfWave, Path::CentreTap, Path::Bridge, Path::Dual];

    /// The word for it in files and reports.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Path::HalfWave => "half-wave",
            Path::CentreTap => "centre-tap",
            Path::Bridge => "bridge",
            Path::Dual => "dual",
        }
    }
}

/// A whole supply file.
#[derive(Debug, Clone, PartialEq)]
pub struct Supply {
    /// Title.
    pub name: String,
    /// Units in the run (default 1).
    pub builds: u64,
    /// Folder of the catalogue as written in the file (relative to the file).
    pub catalogue: Option<String>,
    /// The mains.
    pub mains: Mains,
    /// The air.
    pub ambient: Ambient,
    /// Reserves.
    pub margins: Margins,
    /// What time does to the reservoir.
    pub ageing: Ageing,
    /// Upper limits on the whole build.
    pub caps: Caps,
    /// `true`: every rail has its own section, every section its own transformer.
    pub share_never: bool,
    /// At least one, names unique.
    pub rails: Vec<Rail>,
    /// The file's content as it was written, for saved builds.
    pub content: serde_json::Value,
}

/// The mains, rms.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Mains {
    /// Lowest.
    pub low_v: f64,
    /// Nominal.
    pub nominal_v: f64,
    /// Highest.
    pub high_v: f64,
    /// Lowest frequency.
    pub frequency_hz: f64,
    /// By how much the crest falls short of sqrt 2 x rms, a fraction (default 0.03).
    pub flat_top: f64,
}

/// The air outside the box and how much warmer it is inside.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ambient {
    /// Coldest.
    pub low_c: f64,
    /// Hottest, outside.
    pub high_c: f64,
    /// Added inside the box (default 0).
    pub inside_rise_k: f64,
}

/// Reserves on top of the ratings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Margins {
    /// Above dropout (default 0.25 V).
    pub headroom_v: f64,
    /// Below the reservoir's rated voltage, a fraction (default 0.1).
    pub reservoir: f64,
    /// Above the peak inverse voltage, a fraction (default 0.5).
    pub reverse: f64,
    /// Below the highest junction temperature (default 15 K).
    pub junction_k: f64,
}

/// End-of-life state of the reservoir.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ageing {
    /// Capacitance lost, a fraction (default 0.2).
    pub capacitance_loss: f64,
    /// Factor on ESR (default 2).
    pub esr_rise: f64,
    /// Wanted life in hours (default 20000).
    pub life_h: f64,
}

/// Caps on the whole build.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Caps {
    /// Currency per unit.
    pub cost: Option<f64>,
    /// Watts per unit.
    pub heat_w: Option<f64>,
    /// Tallest part, metres.
    pub height_m: Option<f64>,
    /// Most capacitors in parallel (default 3).
    pub cans: u32,
}

/// One regulated output.
#[derive(Debug, Clone, PartialEq)]
pub struct Rail {
    /// Unique in the supply.
    pub name: String,
    /// Output voltage with its sign.
    pub voltage_v: f64,
    /// Full-load current.
    pub current_a: f64,
    /// Current when idle (default 0).
    pub idle_a: f64,
    /// Allowed output error, a fraction; absent: not asked.
    pub accuracy: Option<f64>,
    /// Allowed output ripple, peak to peak.
    pub ripple_v: Option<f64>,
    /// Mains dip to ride through.
    pub dip_s: Option<f64>,
    /// Rectifier circuits allowed, without repeats (default: bridge, centre-tap, dual).
    pub paths: Vec<Path>,
    /// Device kinds allowed, without repeats (default: fixed, adjustable).
    pub devices: Vec<DeviceKind>,
    /// Shares no section.
    pub isolated: bool,
    /// Discrete devices must survive a shorted output.
    pub short_circuit_survive: bool,
    /// Rails that name the same section share it.
    pub section: Option<String>,
}
