//! Owns the parts as the rest of the program sees them: SI units, settled defaults.
//!
//! A field is an `Option` only where the column has no default: a limit that needs it then fails by name,
//! with the column as the reason. Readers build these types; nothing else does.

use crate::units::Money;

/// The five kinds of part, in the order in which a bill of materials lists them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Slot {
    /// Mains transformers.
    Transformer,
    /// Bridges and single diodes.
    Rectifier,
    /// Reservoir capacitors.
    Reservoir,
    /// Regulators and pass transistors.
    Pass,
    /// Heat sinks.
    Sink,
}

impl Slot {
    /// All slots in bill-of-materials order.
    pub const ALL: [Slot; 5] = [
        Slot::Transformer,
        Slot::Rectifier,
        Slot::Reservoir,
        Slot::Pass,
        Slot::Sink,
    ];

    /// The word for it in reports and JSON.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Slot::Transformer => "transformer",
            Slot::Rectifier => "rectifier",
            Slot::Reservoir => "reservoir",
            Slot::Pass => "pass",
            Slot::Sink => "sink",
        }
    }

    /// The file of the catalogue folder that lists it.
    #[must_use]
    pub fn file(self) -> &'static str {
        match self {
            Slot::Transformer => "transformers.csv",
            Slot::Rectifier => "rectifiers.csv",
            Slot::Reservoir => "reservoirs.csv",
            Slot::Pass => "pass_devices.csv",
            Slot::Sink => "sinks.csv",
        }
    }
}

/// Place of a part in its catalogue, unique over all slots; parts count in slot order, then by name.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PartId(pub u32);

/// Whether a part may still be bought.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Status {
    /// In normal stock.
    Current,
    /// Still sold, with a caution.
    LastBuy,
    /// Picked only when asked for by name.
    Withdrawn,
}

/// From `pieces` on, one piece costs `price`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Break {
    /// Least number of pieces.
    pub pieces: u64,
    /// Unit price from there on.
    pub price: Money,
}

/// What every part has, whatever its slot.
#[derive(Debug, Clone, PartialEq)]
pub struct Part {
    /// Unique over all slots of a catalogue.
    pub id: PartId,
    /// Slot that it is listed under.
    pub slot: Slot,
    /// The firm's own name of the part, as text.
    pub name: String,
    /// Free text.
    pub description: String,
    /// Unit price below the first break.
    pub price: Money,
    /// Rising in pieces, never rising in price.
    pub breaks: Vec<Break>,
    /// Pieces on the shelf; `None` = not limited.
    pub stock: Option<u64>,
    /// Whether it may be bought.
    pub status: Status,
    /// Mounted height in metres.
    pub height_m: Option<f64>,
    /// The row as it stood in the file: column name and text of every cell that is not blank, in file order.
    pub cells: Vec<(&'static str, String)>,
    /// Line of the row in its file, counted from 1 (0 when the part came from a saved build).
    pub line: u64,
}

impl Part {
    /// Unit price when `pieces` are bought at once.
    #[must_use]
    pub fn unit_price(&self, pieces: u64) -> Money {
        self.breaks
            .iter()
            .rev()
            .find(|b| b.pieces <= pieces)
            .map_or(self.price, |b| b.price)
    }
}

impl Part {
    /// Cost of `pieces` when no more than `in_all` are bought at once, and no more than the stock holds: what they cost
    /// at least, since prices never rise with pieces.
    #[must_use]
    pub fn least_cost(&self, pieces: u64, in_all: u64) -> Money {
        self.unit_price(self.stock.map_or(in_all, |stock| in_all.min(stock))) * pieces
    }
}

/// One secondary winding, or one half of an x-0-x winding.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Secondary {
    /// Rated voltage, rms.
    pub volts_v: f64,
    /// Rated current, rms.
    pub amps_a: f64,
    /// `Some(k)`: half of the k-th x-0-x winding of the row (its two halves are neighbours and share k).
    pub tapped: Option<u32>,
}

/// Core construction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Core {
    /// Stacked laminations.
    Laminated,
    /// Toroid: takes no direct current.
    Toroid,
}

/// A mains transformer.
#[derive(Debug, Clone, PartialEq)]
pub struct Transformer {
    /// Name, price, stock.
    pub part: Part,
    /// Rated primary voltages in every wiring that it allows, rising ("115+115" gives 115 and 230).
    pub primary_v: Vec<f64>,
    /// Lowest rated frequency (default 50 Hz).
    pub freq_min_hz: f64,
    /// Rated apparent power.
    pub va: f64,
    /// All secondaries, in the order written; an x-0-x winding gives two.
    pub secondaries: Vec<Secondary>,
    /// (no-load - full-load)/full-load voltage, a fraction.
    pub regulation: f64,
    /// Winding temperature at full load (default 85 degC).
    pub winding_c: f64,
    /// Share of the copper drop in the primary, a fraction (default 0.5).
    pub primary_share: f64,
    /// Tolerance of the no-load voltage, a fraction (default 0).
    pub v_tol: f64,
    /// Iron loss at rated voltage; `None`: estimated from VA, with a caution.
    pub core_loss_w: Option<f64>,
    /// Core construction, needed for half-wave only.
    pub core: Option<Core>,
    /// Highest ambient (default 40 degC).
    pub ta_c: f64,
}

/// Bridge module or single diode.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RectifierKind {
    /// Four diodes in one package.
    Bridge,
    /// One diode.
    Diode,
}

/// What the junction is made of: decides the temperature coefficient of the threshold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Junction {
    /// Silicon p-n.
    Junction,
    /// Schottky barrier.
    Schottky,
}

/// Forward characteristic of one diode.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Forward {
    /// threshold_v and slope_mohm as listed.
    Line {
        /// Threshold V_T0 at 25 degC.
        threshold_v: f64,
        /// Slope r_T.
        slope_ohm: f64,
    },
    /// vf_v at vf_a: a maximum near rated current.
    Point {
        /// Forward voltage.
        vf_v: f64,
        /// At this current.
        vf_a: f64,
    },
}

/// A bridge module or a single diode.
#[derive(Debug, Clone, PartialEq)]
pub struct Rectifier {
    /// Name, price, stock.
    pub part: Part,
    /// Module or single diode.
    pub kind: RectifierKind,
    /// Junction (default) or Schottky.
    pub junction: Junction,
    /// Repetitive peak reverse voltage.
    pub vrrm_v: Option<f64>,
    /// Rated mean current.
    pub io_a: Option<f64>,
    /// `true`: io_a is stated for a capacitive load (default: resistive).
    pub io_capacitive: bool,
    /// Non-repetitive surge.
    pub ifsm_a: Option<f64>,
    /// Forward characteristic, or the column that is missing.
    pub forward: Result<Forward, &'static str>,
    /// Junction to ambient, free-standing.
    pub rth_ja_k_w: Option<f64>,
    /// Junction to case.
    pub rth_jc_k_w: Option<f64>,
    /// Outline, upper case.
    pub case: Option<String>,
    /// Highest junction temperature.
    pub tj_max_c: Option<f64>,
}

/// A reservoir capacitor.
#[derive(Debug, Clone, PartialEq)]
pub struct Reservoir {
    /// Name, price, stock.
    pub part: Part,
    /// Rated capacitance.
    pub c_f: f64,
    /// Negative tolerance, a fraction (default 0.2).
    pub tol_minus: f64,
    /// Positive tolerance, a fraction (default 0.2).
    pub tol_plus: f64,
    /// Rated voltage.
    pub v_rated_v: Option<f64>,
    /// Series resistance as listed.
    pub esr_ohm: Option<f64>,
    /// Frequency at which ESR is listed (default 100 Hz).
    pub esr_hz: f64,
    /// Rated ripple current as listed.
    pub ripple_a: Option<f64>,
    /// Frequency at which the ripple current is listed (default 100 Hz).
    pub ripple_hz: f64,
    /// Rated temperature.
    pub t_max_c: Option<f64>,
    /// Life at rated temperature and ripple, hours.
    pub life_h: Option<f64>,
}

/// Kinds of pass device, as the column `kind` and the supply key `devices` write them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum DeviceKind {
    /// Integrated, one output voltage.
    Fixed,
    /// Integrated, output set by a divider.
    Adjustable,
    /// Discrete transistor.
    Follower,
    /// Discrete pair.
    Darlington,
    /// Shunt regulator with its series resistor.
    Shunt,
}

impl DeviceKind {
    /// All kinds.
    pub const ALL: [DeviceKind; 5] = [
        DeviceKind::Fixed,
        DeviceKind::Adjustable,
        DeviceKind::Follower,
        DeviceKind::Darlington,
        DeviceKind::Shunt,
    ];

    /// The word for it in files and reports.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            DeviceKind::Fixed => "fixed",
            DeviceKind::Adjustable => "adjustable",
            DeviceKind::Follower => "follower",
            DeviceKind::Darlington => "darlington",
            DeviceKind::Shunt => "shunt",
        }
    }
}

/// Sign of the rail that a device serves with its output not grounded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Polarity {
    /// Positive.
    Positive,
    /// Negative.
    Negative,
}

/// A regulator or pass transistor.
#[derive(Debug, Clone, PartialEq)]
pub struct PassDevice {
    /// Name, price, stock.
    pub part: Part,
    /// Fixed, adjustable, follower, darlington, shunt.
    pub kind: DeviceKind,
    /// Default positive.
    pub polarity: Polarity,
    /// Output of a fixed device, a magnitude.
    pub vout_v: Option<f64>,
    /// Lowest output of an adjustable device, a magnitude.
    pub vout_min_v: Option<f64>,
    /// Highest output of an adjustable device, a magnitude.
    pub vout_max_v: Option<f64>,
    /// Reference of an adjustable device.
    pub vref_v: Option<f64>,
    /// Output tolerance, a fraction.
    pub tol: Option<f64>,
    /// Dropout, a maximum over temperature.
    pub dropout_v: Option<f64>,
    /// Dropout at no load.
    pub dropout_light_v: Option<f64>,
    /// Highest input voltage.
    pub vin_max_v: Option<f64>,
    /// Highest input to output voltage.
    pub vdiff_max_v: Option<f64>,
    /// Highest output current.
    pub iout_max_a: Option<f64>,
    /// Current into ground at full load.
    pub ground_a: Option<f64>,
    /// Least load that regulates (default 0).
    pub min_load_a: f64,
    /// Ripple rejection.
    pub psrr_db: Option<f64>,
    /// Output at which psrr_db is stated; default vref_v.
    pub psrr_vout_v: Option<f64>,
    /// Load regulation, a fraction (default 0).
    pub load_reg: f64,
    /// Line regulation, a fraction of the output per volt (default 0).
    pub line_reg_per_v: f64,
    /// Junction to case.
    pub rth_jc_k_w: Option<f64>,
    /// Junction to ambient, free-standing.
    pub rth_ja_k_w: Option<f64>,
    /// Highest junction temperature.
    pub tj_max_c: Option<f64>,
    /// Outline, upper case.
    pub case: Option<String>,
    /// Discrete: base-emitter drop of the row.
    pub vbe_v: Option<f64>,
    /// Discrete: least current gain.
    pub hfe_min: Option<f64>,
    /// Discrete: safe operating area, (volts, amps), volts rising.
    pub soa: Vec<(f64, f64)>,
    /// Price of the fitted values that come with it (default 0).
    pub fitted_price: Money,
    /// Shunt: least current.
    pub iz_min_a: Option<f64>,
    /// Shunt: highest current.
    pub iz_max_a: Option<f64>,
    /// Shunt: dynamic resistance.
    pub rz_ohm: Option<f64>,
}

/// A heat sink.
#[derive(Debug, Clone, PartialEq)]
pub struct Sink {
    /// Name, price, stock.
    pub part: Part,
    /// Outlines that it takes, upper case.
    pub cases: Vec<String>,
    /// Sink to ambient.
    pub rth_sa_k_w: Option<f64>,
    /// Rise at which rth_sa is stated (natural convection); `None`: constant.
    pub rise_k: Option<f64>,
    /// Case to sink (default 1.2 K/W).
    pub rth_cs_k_w: f64,
}

/// Everything that may be picked. Each list is in order of part name, so that no answer depends on row order.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Catalogue {
    /// Absolute path of the folder ("" when it came from a saved build).
    pub folder: String,
    /// Currency of all prices; `None` without catalogue.toml.
    pub currency: Option<String>,
    /// transformers.csv
    pub transformers: Vec<Transformer>,
    /// rectifiers.csv
    pub rectifiers: Vec<Rectifier>,
    /// reservoirs.csv
    pub reservoirs: Vec<Reservoir>,
    /// pass_devices.csv
    pub pass_devices: Vec<PassDevice>,
    /// sinks.csv
    pub sinks: Vec<Sink>,
}

impl Catalogue {
    /// All parts in the order of their ids.
    pub fn parts(&self) -> impl Iterator<Item = &Part> {
        (self.transformers.iter().map(|x| &x.part))
            .chain(self.rectifiers.iter().map(|x| &x.part))
            .chain(self.reservoirs.iter().map(|x| &x.part))
            .chain(self.pass_devices.iter().map(|x| &x.part))
            .chain(self.sinks.iter().map(|x| &x.part))
    }

    /// All parts in the order of their ids, to be changed.
    pub fn parts_mut(&mut self) -> impl Iterator<Item = &mut Part> {
        (self.transformers.iter_mut().map(|x| &mut x.part))
            .chain(self.rectifiers.iter_mut().map(|x| &mut x.part))
            .chain(self.reservoirs.iter_mut().map(|x| &mut x.part))
            .chain(self.pass_devices.iter_mut().map(|x| &mut x.part))
            .chain(self.sinks.iter_mut().map(|x| &mut x.part))
    }

    /// The part of that name.
    #[must_use]
    pub fn find(&self, name: &str) -> Option<&Part> {
        self.parts().find(|p| p.name == name)
    }
}
