//! Figures of the step response of a sampled transfer function, from its samples.

use super::looked_at::Time;
use super::quasi::Ratio;
use super::step::StepResult;
use crate::algebra::roots;

/// The most samples that are worked out; slower systems settle too late for this.
const MAX_SAMPLES: usize = 2_000_000;

/// Overshoot, rise and settling at the samples, times as multiples of the period.
///
/// # Errors
///
/// Why there are none.
pub(crate) fn figures(ratio: &Ratio, time: &Time, band: f64) -> Result<StepResult, String> {
    let Time::Sampled(period) = time else { return Err("it is not sampled".to_owned()) };
    let period = period.to_f64().value();
    let den = ratio.den.as_polynomial().ok_or("it has dead times in s")?;
    let num = ratio.num.as_polynomial().ok_or("the final value is 0")?;
    if num.len() > den.len() {
        return Err("it would answer before it is asked".to_owned());
    }
    let sum = |p: &[crate::algebra::IBig]| p.iter().sum::<crate::algebra::IBig>();
    let last = super::axis::quotient(&sum(num), &sum(den));
    if last == 0.0 {
        return Err("the final value is 0".to_owned());
    }
    let radius = roots::roots(den).map_err(|_| "its poles could not be parted".to_owned())?;
    let radius = radius.iter().map(|r| libm::hypot(r.re, r.im)).fold(0.0, f64::max);
    // Until the slowest mode, with its power of k, is far below the band.
    let decades = libm::log(1e-6 * band) - 10.0 * den.len() as f64;
    let count = if radius > 0.0 { decades / libm::log(radius) } else { 0.0 } + 2.0 * den.len() as f64;
    if count > MAX_SAMPLES as f64 {
        return Err(format!("it settles later than after {MAX_SAMPLES} samples"));
    }
    let lead = &den[den.len() - 1];
    let scaled =
        |p: &[crate::algebra::IBig]| -> Vec<f64> { p.iter().map(|c| super::axis::quotient(c, lead)).collect() };
    let (b, a) = (scaled(num), scaled(den));
    let n = a.len() - 1;
    let (mut most, mut when) = (1.0, None);
    let (mut low, mut high, mut settled) = (None, None, 0usize);
    // Transposed direct form: one state for each power of z below the highest.
    let mut state = vec![0.0; n];
    let at = |k: usize| b.get(k).copied().unwrap_or(0.0);
    for k in 0..=(count as usize) {
        let y = at(n) + state.last().copied().unwrap_or(0.0);
        for i in (0..n).rev() {
            state[i] = at(i) - a[i] * y + if i > 0 { state[i - 1] } else { 0.0 };
        }
        let part = y / last;
        if part > most + 1e-13 {
            (most, when) = (part, Some(k));
        }
        low = low.or((part >= 0.1).then_some(k));
        high = high.or((part >= 0.9).then_some(k));
        if (part - 1.0).abs() > band {
            settled = k + 1;
        }
    }
    let rise = low.zip(high).map(|(a, b)| (b - a) as f64 * period);
    Ok(StepResult {
        overshoot: Ok((most - 1.0) * 100.0),
        peak_time: when.map(|k| k as f64 * period),
        rise_time: rise.ok_or_else(|| "the level is never reached".to_owned()),
        settling_time: Ok(settled as f64 * period),
    })
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{part, ratio};
    use super::*;

    /// 1/(2 z - 1): samples 0, 1/2, 3/4, 7/8, ... (closed form 1 - 2^-k).
    #[test]
    fn a_first_order_sequence() {
        let f = figures(&ratio(&[1], &[-1, 2]), &Time::Sampled(part(1, 10)), 0.02).expect("stable");
        assert_eq!(f.overshoot, Ok(0.0));
        // 0.1 at sample 1, 0.9 at sample 4 (15/16); inside 2 % from sample 6 (63/64) on.
        assert!(
            f.rise_time.is_ok_and(|t| (t - 0.3).abs() < 1e-15)
                && f.settling_time.is_ok_and(|t| (t - 0.6).abs() < 1e-15)
        );
    }

    /// Dead beat: 2 z/z² - 1/z²: samples 0, 2, 1, 1, ...: 100 % at the first sample.
    #[test]
    fn a_dead_beat_response() {
        let f = figures(&ratio(&[-1, 2], &[0, 0, 1]), &Time::Sampled(part(1, 1)), 0.02).expect("stable");
        assert_eq!((f.overshoot, f.peak_time, f.settling_time), (Ok(100.0), Some(1.0), Ok(2.0)));
    }
}
