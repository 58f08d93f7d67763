//! Owns the heat path of a package, the same for rectifiers and pass devices.

use super::check::Known;
use crate::catalogue::Sink;
use crate::physics::thermal::sink_rise_k;

/// Rise of a junction above the air: free-standing through rth_ja, else through case, pad and sink.
///
/// # Errors
/// Names the column that is blank.
pub(super) fn rise_k(power_w: f64, ja: Option<f64>, jc: Option<f64>, sink: Option<&Sink>) -> Known<f64> {
    match sink {
        None => Ok(power_w * ja.ok_or("rth_ja_k_w")?),
        Some(sink) => {
            let to_sink = jc.ok_or("rth_jc_k_w")? + sink.rth_cs_k_w;
            Ok(power_w * to_sink + sink_rise_k(power_w, sink.rth_sa_k_w.ok_or("rth_sa_k_w")?, sink.rise_k))
        }
    }
}
