//! Owns the limits of integrated pass devices (fixed and adjustable).

use super::check::{Check, Corner, Known, Limit};
use super::site::{Raw, Site};
use super::thermal::rise_k;
use crate::catalogue::{DeviceKind, PassDevice, Sink};
use crate::physics::raw_section::Waveform;
use crate::physics::regulator::{dissipation_w, divider_tolerance, dropout_v, output_ripple_v, rejection_db};
use crate::supply::{Path, Rail};

/// A device on a rail, and what follows from these two alone.
#[derive(Debug, Clone, Copy)]
pub struct Stage<'c> {
    /// The requirement.
    pub rail: &'c Rail,
    /// The device.
    pub device: &'c PassDevice,
    /// Magnitude of the output voltage.
    pub out_v: f64,
    /// Highest output plus dropout at full load: the lowest input that regulates.
    pub floor_v: Known<f64>,
}

impl<'c> Stage<'c> {
    /// Puts a device on a rail.
    #[must_use]
    pub fn new(rail: &'c Rail, device: &'c PassDevice) -> Stage<'c> {
        let out_v = rail.voltage_v.abs();
        let floor_v =
            tolerance(device, out_v).and_then(|tol| Ok(out_v * (1.0 + tol) + dropout(device, rail.current_a)?));
        Stage {
            rail,
            device,
            out_v,
            floor_v,
        }
    }

    /// What the rail takes from its section at full load.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn load_a(&self) -> Known<f64> {
        Ok(self.rail.current_a + self.device.ground_a.ok_or("ground_ma")?)
    }

    /// What it takes when idle. An integrated device keeps its whole ground current.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn idle_a(&self) -> Known<f64> {
        Ok(self.rail.idle_a + self.device.ground_a.ok_or("ground_ma")?)
    }

    /// Current rating.
    #[must_use]
    pub fn current(&self) -> Check {
        Check::new(
            Limit::PassCurrent,
            None,
            Ok(self.rail.current_a),
            self.device.iout_max_a.ok_or("iout_max_a"),
        )
    }

    /// Input ratings; `idle_v` is the unloaded raw voltage at high mains. A row states one of the two, or both.
    pub fn input(&self, idle_v: f64, mut to: impl FnMut(Check)) {
        let (ceiling, difference) = (self.device.vin_max_v, self.device.vdiff_max_v);
        if ceiling.is_some() || difference.is_none() {
            to(Check::new(
                Limit::InputCeiling,
                Corner::Idle,
                Ok(idle_v),
                ceiling.ok_or("vin_max_v"),
            ));
        }
        if let Some(most) = difference {
            to(Check::new(
                Limit::InputDifference,
                Corner::Idle,
                Ok(idle_v - self.out_v),
                Ok(most),
            ));
        }
    }

    /// Input that headroom asks of the valley.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn valley_wanted_v(&self, site: &Site) -> Known<f64> {
        Ok(self.floor_v? + site.supply.margins.headroom_v)
    }

    /// Valley above output and dropout.
    #[must_use]
    pub fn headroom(&self, site: &Site, low: Known<&Waveform>) -> Check {
        Check::new(
            Limit::Headroom,
            Corner::Low,
            low.map(|w| w.valley_v()),
            self.valley_wanted_v(site),
        )
    }

    /// Valley left after the asked dip, if one is asked; `load_a` is the whole section's.
    #[must_use]
    pub fn ride_through(&self, site: &Site, raw: &Raw, load_a: Known<f64>, low: Known<&Waveform>) -> Option<Check> {
        let dip_s = self.rail.dip_s?;
        // The reservoir is only recharged at the next crest, so a dip costs whole recharging intervals.
        let crests_hz = site.supply.mains.frequency_hz * if raw.path == Path::HalfWave { 1.0 } else { 2.0 };
        let intervals = whole_intervals(dip_s * crests_hz);
        let bank_f = site.can_f(raw.reservoir, Corner::Low) * f64::from(raw.cans);
        let left = low.and_then(|wave| Ok(wave.valley_v() - load_a? * (intervals / crests_hz) / bank_f));
        Some(Check::new(Limit::RideThrough, Corner::Low, left, self.floor_v))
    }

    /// Dissipation at a waveform.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn loss_w(&self, wave: Known<&Waveform>) -> Known<f64> {
        let ground_a = self.device.ground_a.ok_or("ground_ma")?;
        Ok(dissipation_w(wave?.mean_v(), self.out_v, self.rail.current_a, ground_a))
    }

    /// Junction with that dissipation, free-standing or on a sink.
    #[must_use]
    pub fn junction(&self, site: &Site, corner: Corner, power_w: Known<f64>, sink: Option<&Sink>) -> Check {
        let rise = power_w.and_then(|w| rise_k(w, self.device.rth_ja_k_w, self.device.rth_jc_k_w, sink));
        let bound = self
            .device
            .tj_max_c
            .ok_or("tj_max_c")
            .map(|tj| tj - site.supply.margins.junction_k);
        Check::new(Limit::PassJunction, corner, rise.map(|k| site.t_hi_c + k), bound)
    }

    /// Ripple behind the device at the worst of the three waveforms, if a limit is asked.
    #[must_use]
    pub fn ripple(&self, low: Known<&Waveform>, high: Known<&Waveform>, worn: Known<&Waveform>) -> Option<Check> {
        let asked_v = self.rail.ripple_v?;
        let worst = || -> Known<(f64, Corner)> {
            let db = self.rejection_db(low?)?;
            let at = [
                (low?.ripple_v(), Corner::Low),
                (high?.ripple_v(), Corner::High),
                (worn?.ripple_v(), Corner::Worn),
            ];
            let (raw_v, corner) = at.into_iter().fold(at[0], |a, b| if b.0 > a.0 { b } else { a });
            Ok((output_ripple_v(raw_v, db), corner))
        };
        let worst = worst();
        let corner = worst.map_or(Corner::Low, |(_, corner)| corner);
        Some(Check::new(
            Limit::OutputRipple,
            corner,
            worst.map(|(v, _)| v),
            Ok(asked_v),
        ))
    }

    /// The same when all that is known of the low corner is the lowest waveform and the highest peak that it can have.
    #[must_use]
    pub fn ripple_within(
        &self,
        lowest: Known<&Waveform>,
        peak_v: f64,
        high: Known<&Waveform>,
        worn: Known<&Waveform>,
    ) -> Option<Check> {
        let asked_v = self.rail.ripple_v?;
        let most = || -> Known<f64> {
            let db = self.rejection_db(lowest?)?;
            let raw_v = (peak_v - lowest?.valley_v())
                .max(high?.ripple_v())
                .max(worn?.ripple_v());
            Ok(output_ripple_v(raw_v, db))
        };
        Some(Check::new(Limit::OutputRipple, Corner::Low, most(), Ok(asked_v)))
    }

    /// Ripple rejection at this output and at the headroom of the low corner.
    fn rejection_db(&self, low: &Waveform) -> Known<f64> {
        let stated_db = self.device.psrr_db.ok_or("psrr_db")?;
        let stated_at_v = match self.device.kind {
            DeviceKind::Adjustable => self.device.psrr_vout_v.or(self.device.vref_v).ok_or("psrr_vout_v")?,
            _ => self.out_v,
        };
        Ok(rejection_db(
            stated_db,
            self.out_v / stated_at_v,
            low.valley_v() - self.floor_v?,
        ))
    }

    /// Error of the output, if a limit is asked.
    #[must_use]
    pub fn accuracy(&self, low: Known<&Waveform>, high: Known<&Waveform>) -> Option<Check> {
        let asked = self.rail.accuracy?;
        let error = || -> Known<f64> {
            let swing_v = high?.mean_v() - low?.mean_v();
            Ok(tolerance(self.device, self.out_v)? + self.device.load_reg + self.device.line_reg_per_v * swing_v)
        };
        Some(Check::new(Limit::OutputAccuracy, None, error(), Ok(asked)))
    }
}

/// Output tolerance with the divider's part, a fraction. The set-point error is 0 until dividers are worked out.
fn tolerance(device: &PassDevice, out_v: f64) -> Known<f64> {
    let own = device.tol.ok_or("tol_pct")?;
    Ok(match device.kind {
        DeviceKind::Adjustable => own + divider_tolerance(device.vref_v.ok_or("vref_v")?, out_v),
        _ => own,
    })
}

fn dropout(device: &PassDevice, load_a: f64) -> Known<f64> {
    let full_v = device.dropout_v.ok_or("dropout_v")?;
    let light = match device.dropout_light_v {
        None => None,
        Some(light_v) => Some((light_v, device.iout_max_a.ok_or("iout_max_a")?)),
    };
    Ok(dropout_v(full_v, light, load_a))
}

/// Rounded up; a product that is whole but for rounding (10 ms at 100 Hz) stays whole.
fn whole_intervals(intervals: f64) -> f64 {
    let nearest = intervals.round();
    if (intervals - nearest).abs() <= 1e-9 * nearest.max(1.0) {
        nearest
    } else {
        intervals.ceil()
    }
}
