//! Owns every number of the trade that the model needs, with its source. Nothing is stated twice.
//!
//! "Common practice" and "from memory" mark what no standard at hand backs; raising any of them makes the tool stricter
//! unless the line says otherwise.

/// Temperature at which data sheets state thresholds, degC. Source: IEC 60747-2.
pub const DATASHEET_C: f64 = 25.0;
/// Zero-resistance temperature of copper below 0 degC, K. Source: IEC 60028.
pub const COPPER_K: f64 = 234.5;
/// Fall of a junction diode's threshold per kelvin. Common practice. Higher: hotter sections see more voltage.
pub const JUNCTION_TC_V_K: f64 = 2e-3;
/// Fall of a Schottky diode's threshold per kelvin. Common practice.
pub const SCHOTTKY_TC_V_K: f64 = 1e-3;
/// A threshold never falls below this. Common practice. Higher: less raw voltage.
pub const THRESHOLD_FLOOR_V: f64 = 0.2;
/// Voltage that the slope takes at the current of a stated forward voltage. From memory: brackets real curves.
pub const POINT_SLOPE_V: f64 = 0.07;
/// Highest typical threshold of a row that states only a forward voltage. From memory. Higher: less heat at high mains.
pub const POINT_TYPICAL_V: f64 = 0.7;
/// By how much its typical threshold lies below the stated maximum. From memory.
pub const POINT_SPREAD_V: f64 = 0.2;
/// Below this, aluminium electrolytics count as cold, degC. From memory.
pub const COLD_C: f64 = 20.0;
/// Capacitance lost per kelvin of cold. From memory.
pub const COLD_C_LOSS_PER_K: f64 = 0.004;
/// Kelvin of cold that double ESR. From memory. Higher: less strict.
pub const COLD_ESR_DOUBLING_K: f64 = 25.0;
/// From this frequency on, ripple and ESR ratings count as switching-supply ones, hertz. From memory.
pub const HIGH_FREQUENCY_HZ: f64 = 10_000.0;
/// Their ripple current counts times this at mains frequencies. From memory. Higher: less strict.
pub const HIGH_FREQUENCY_RIPPLE: f64 = 0.5;
/// Their ESR counts times this at mains frequencies. From memory.
pub const HIGH_FREQUENCY_ESR: f64 = 2.0;
/// Ripple rating with half-wave pulses, which are at half the frequency. From memory. Higher: less strict.
pub const HALF_WAVE_RIPPLE: f64 = 0.8;
/// Rise of the can's core at rated ripple, and how far above its rated ambient it may then be, K.
/// Source: A. Albertsen, "Electrolytic capacitor lifetime estimation", Jianghai Europe (3.5 to 5 K for 105 degC parts).
pub const RATED_RIPPLE_RISE_K: f64 = 5.0;
/// Kelvin that halve the life. Source: as above (the 10-kelvin rule).
pub const LIFE_HALVING_K: f64 = 10.0;
/// Flux reserve of the core at its lowest frequency. Common practice. Higher: less strict.
pub const FLUX_RESERVE: f64 = 1.1;
/// Most overvoltage at higher frequencies. Common practice. Higher: less strict.
pub const OVERVOLTAGE_MOST: f64 = 1.2;
/// A transformer runs down to this share of its lowest frequency. Common practice. Lower: less strict.
pub const FREQUENCY_LEAST: f64 = 0.9;
/// Half-wave direct current that a laminated core takes, as a share of the rated winding current. From memory.
pub const CORE_BIAS_SHARE: f64 = 0.2;
/// Rectifier rating left with a capacitor behind it, where the row states a resistive load. Common practice.
pub const CAPACITIVE_DERATING: f64 = 0.8;
/// Iron loss where the row states none: 0.27 W x VA^0.62. From memory.
pub const CORE_LOSS_W: f64 = 0.27;
/// Its exponent.
pub const CORE_LOSS_EXPONENT: f64 = 0.62;
/// Exponent of natural convection: thermal resistance goes with rise^-0.25.
/// Source: laminar Nu ~ Ra^1/4 (McAdams, Heat Transmission, 1954; Churchill and Chu, IJHMT 18 (1975) 1323).
pub const CONVECTION_EXPONENT: f64 = 0.25;
/// Tolerance of the two resistors of an output divider, each. Common practice: 1 % parts.
pub const DIVIDER_TOLERANCE: f64 = 0.01;
/// Headroom below which ripple rejection fades, V. From memory.
pub const PSRR_FULL_HEADROOM_V: f64 = 1.0;
/// Rejection lost when that headroom is gone, dB. From memory.
pub const PSRR_LOST_DB: f64 = 20.0;
