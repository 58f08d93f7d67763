//! Owns the one root finder: Newton steps kept inside a bracket.

/// Root of a function that changes sign once in `[low, high]`, from positive at `low` to negative at `high`.
///
/// A Newton step of at most `settled` (0: a few ulps) is the last one; its error is about the square of it.
/// `f` returns the value and its derivative; an inexact derivative costs steps, never the answer, since a step that
/// leaves the bracket or does not halve it in time is replaced by bisection. Ends at neighbouring floats.
pub(super) fn falling(mut low: f64, mut high: f64, start: f64, settled: f64, f: impl Fn(f64) -> (f64, f64)) -> f64 {
    let mut x = start.clamp(low, high);
    let mut width_before = high - low;
    for step in 0..200 {
        let (value, slope) = f(x);
        if value > 0.0 {
            low = x;
        } else if value < 0.0 {
            high = x;
        } else {
            return x;
        }
        let newton = x - value / slope;
        // Every third step must have halved the bracket; otherwise Newton creeps along one side of it.
        let creeping = step % 3 == 2 && high - low > 0.5 * width_before;
        if step % 3 == 2 {
            width_before = high - low;
        }
        let next = if newton > low && newton < high && !creeping {
            newton
        } else {
            0.5 * (low + high)
        };
        let close = settled.max(2.0 * f64::EPSILON * x.abs());
        if (newton - x).abs() <= close && newton >= low && newton <= high {
            return newton;
        }
        if next <= low || next >= high {
            return next;
        }
        x = next;
    }
    x
}
