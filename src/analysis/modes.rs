//! Modes: the roots of the characteristic polynomial with frequency, damping, and the requests that do not show them.

use super::looked_at::Time;
use crate::algebra::roots::roots;
use crate::algebra::{IBig, dense};

/// A mode.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct ModeFigure {
    /// Real part.
    pub(crate) re: f64,
    /// Imaginary part.
    pub(crate) im: f64,
    /// Exact.
    pub(crate) multiplicity: u32,
    /// In rad/s; `None` for z = 0, which is over at once.
    pub(crate) frequency: Option<f64>,
    /// `None` for a mode at 0, and for z = 0.
    pub(crate) damping_ratio: Option<f64>,
    /// -Re p, in z -ln(abs(z))/T; `None` for z = 0.
    pub(crate) decay_rate: Option<f64>,
    /// The requests that do not show it.
    pub(crate) hidden_from: Vec<String>,
}

/// The modes of a characteristic polynomial; `shown` has, for each request, the polynomial whose roots it shows.
///
/// # Errors
///
/// Why the roots could not be told.
pub(crate) fn modes(p: &[IBig], time: &Time, shown: &[(String, Vec<IBig>)]) -> Result<Vec<ModeFigure>, String> {
    let found = roots(p).map_err(|_| "the roots of the characteristic polynomial could not be parted".to_owned())?;
    let mut out: Vec<ModeFigure> = found.iter().map(|r| figures(r.re, r.im, r.multiplicity, time)).collect();
    for (request, polynomial) in shown {
        let common = dense::gcd(p, polynomial);
        let lost = dense::divide_exactly(&dense::primitive(p), &dense::primitive(&common)).unwrap_or_default();
        if lost.len() < 2 {
            continue;
        }
        // Roots are correctly rounded: the same root of two polynomials is the same pair of doubles.
        for root in roots(&lost).unwrap_or_default() {
            for mode in out.iter_mut().filter(|m| m.re == root.re && m.im == root.im) {
                if !mode.hidden_from.contains(request) {
                    mode.hidden_from.push(request.clone());
                }
            }
        }
    }
    Ok(out)
}

fn figures(re: f64, im: f64, multiplicity: u32, time: &Time) -> ModeFigure {
    // The rate of growth and the angular frequency of the mode in continuous time.
    let in_s = match time {
        Time::Continuous => Some((re, im)),
        Time::Sampled(period) => {
            let t = period.to_f64().value();
            let size = libm::hypot(re, im);
            (size > 0.0).then(|| (libm::log(size) / t, libm::atan2(im, re) / t))
        }
    };
    let frequency = in_s.map(|(a, b)| libm::hypot(a, b));
    let damping_ratio = in_s.zip(frequency.filter(|f| *f > 0.0)).map(|((a, _), f)| positive_zero(-a / f));
    let decay_rate = in_s.map(|(a, _)| positive_zero(-a));
    ModeFigure { re, im, multiplicity, frequency, damping_ratio, decay_rate, hidden_from: Vec::new() }
}

/// -0 as 0.
fn positive_zero(x: f64) -> f64 {
    if x == 0.0 { 0.0 } else { x }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{part, poly};
    use super::*;

    #[test]
    fn frequency_damping_and_what_is_hidden() {
        // (s + 2)(s² + 2 s + 25); a request shows the pair only, another one s + 2 only.
        let p = dense::product(&poly(&[2, 1]), &poly(&[25, 2, 1]));
        let shown = [("a/r".to_owned(), poly(&[25, 2, 1])), ("b/r".to_owned(), poly(&[4, 2]))];
        let found = modes(&p, &Time::Continuous, &shown).expect("roots");
        let lag = found.iter().find(|m| m.im == 0.0).expect("one");
        assert_eq!((lag.re, lag.damping_ratio, &lag.hidden_from[..]), (-2.0, Some(1.0), &["a/r".to_owned()][..]));
        let pair = found.iter().find(|m| m.im > 0.0).expect("one");
        assert_eq!((pair.frequency, pair.damping_ratio, pair.decay_rate), (Some(5.0), Some(0.2), Some(1.0)));
        assert_eq!(pair.hidden_from, ["b/r"]);
    }

    #[test]
    fn modes_in_z_by_their_logarithm() {
        let found = modes(&poly(&[-1, 2]), &Time::Sampled(part(1, 1)), &[]).expect("roots");
        assert_eq!((found[0].frequency, found[0].damping_ratio), (Some(2f64.ln()), Some(1.0)));
        let dead_beat = modes(&poly(&[0, 1]), &Time::Sampled(part(1, 1)), &[]).expect("roots");
        assert_eq!((dead_beat[0].frequency, dead_beat[0].decay_rate), (None, None));
    }
}
