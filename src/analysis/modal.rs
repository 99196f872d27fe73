//! Step responses as sums of modes: y(t) = Σ c·t^k/k!·exp(p·t), from the poles and zeros of the exact polynomials.
//!
//! At a pole p of multiplicity m the coefficients are those of the power series of (s - p)^m·G(s)/s at p, made of the
//! factors s - z and s - q one by one: no polynomial is evaluated in floating point.

use super::quasi::Ratio;
use super::search::{Jet, Smooth};
use crate::algebra::RBig;
use crate::algebra::roots::{RootOf, roots};
use num_complex::Complex64;

/// Why there is no sum of modes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum NoModes {
    /// More zeros than poles: the step response has an impulse at t = 0.
    Improper,
    /// The roots could not be found.
    Roots,
    /// The denominator has dead times.
    DeadTime,
}

/// One mode of a response: c·t^k/k!·exp(p·t), of a pair the real part, doubled.
#[derive(Clone, Copy, Debug)]
struct Mode {
    p: Complex64,
    k: u32,
    c: Complex64,
    /// ln(k!)
    log_factorial: f64,
}

/// The unit step response of a rational function: a constant and its modes.
#[derive(Clone, Debug)]
pub(crate) struct Response {
    /// Its dead time in seconds.
    pub(crate) delay: f64,
    /// G(0).
    pub(crate) last: f64,
    modes: Vec<Mode>,
}

/// The step response of a sum of rational functions over one stable denominator, each behind its own dead time.
#[derive(Clone, Debug)]
pub(crate) struct Step {
    /// By rising dead time.
    pub(crate) parts: Vec<Response>,
}

impl Step {
    /// The response of a ratio whose denominator has no dead time and whose poles are stable.
    ///
    /// # Errors
    ///
    /// [`NoModes`].
    pub(crate) fn of(ratio: &Ratio) -> Result<Self, NoModes> {
        let den = ratio.den.as_polynomial().ok_or(NoModes::DeadTime)?;
        let poles = roots(den).map_err(|_| NoModes::Roots)?;
        let lead = &den[den.len() - 1];
        let mut parts = Vec::new();
        for (delay, num) in &ratio.num.terms {
            if num.len() > den.len() {
                return Err(NoModes::Improper);
            }
            let at_zero = RBig::from_parts_signed(num[0].clone(), den[0].clone()).to_f64().value();
            let gain = super::axis::quotient(&num[num.len() - 1], lead);
            let zeros = roots(num).map_err(|_| NoModes::Roots)?;
            let modes = modes(gain, &zeros, &poles);
            parts.push(Response { delay: delay.to_f64().value(), last: at_zero, modes });
        }
        Ok(Self { parts })
    }

    /// The final value.
    pub(crate) fn last(&self) -> f64 {
        self.parts.iter().map(|p| p.last).sum()
    }

    /// When the parts set in, rising.
    pub(crate) fn breaks(&self) -> Vec<f64> {
        self.parts.iter().map(|p| p.delay).collect()
    }

    /// The value at a time, what sets in at that very time included.
    pub(crate) fn at(&self, t: f64) -> f64 {
        self.parts
            .iter()
            .filter(|p| p.delay <= t)
            .map(|p| p.last + p.modes.iter().map(|m| m.jet(t - p.delay).0).sum::<f64>())
            .sum()
    }

    /// A bound on the distance from the final value from t on; `None` before all parts have set in, and where it can
    /// still grow.
    pub(crate) fn envelope(&self, t: f64) -> Option<f64> {
        let mut total = 0.0;
        for part in &self.parts {
            let own = t - part.delay;
            if own < 0.0 {
                return None;
            }
            for m in &part.modes {
                if f64::from(m.k) > -m.p.re * own {
                    return None;
                }
                total += m.size(own);
            }
        }
        Some(total)
    }

    /// The slowest decay rate of all modes.
    pub(crate) fn slowest(&self) -> f64 {
        self.parts.iter().flat_map(|p| &p.modes).map(|m| -m.p.re).fold(f64::INFINITY, f64::min)
    }

    /// The largest size of a mode's coefficient over that of the final value: how many digits the sum may lose.
    pub(crate) fn cancellation(&self) -> f64 {
        self.parts.iter().flat_map(|p| &p.modes).filter(|m| m.k == 0).map(|m| m.c.norm()).fold(0.0, f64::max)
    }
}

impl Mode {
    /// t^k/k!·exp(σt), without overflow.
    fn weight(&self, k: u32, t: f64) -> f64 {
        if k == 0 {
            return libm::exp(self.p.re * t);
        }
        if t <= 0.0 {
            return 0.0;
        }
        let log_factorial = self.log_factorial - (k + 1..=self.k).map(|i| libm::log(f64::from(i))).sum::<f64>();
        libm::exp(f64::from(k) * libm::log(t) - log_factorial + self.p.re * t)
    }

    fn size(&self, t: f64) -> f64 {
        self.c.norm() * self.weight(self.k, t)
    }

    /// Value and slope.
    fn jet(&self, t: f64) -> (f64, f64) {
        let turn = Complex64::new(libm::cos(self.p.im * t), libm::sin(self.p.im * t));
        let w = self.weight(self.k, t);
        let below = if self.k > 0 { self.weight(self.k - 1, t) } else { 0.0 };
        let c = self.c * turn;
        ((c * w).re, (c * (self.p * w + below)).re)
    }

    /// A bound on the second derivative between two times.
    fn curvature(&self, low: f64, high: f64) -> f64 {
        let decay = -self.p.re;
        // t^k·exp(-σt) is largest at k/σ.
        let most = |k: u32| {
            let peak = (f64::from(k) / decay).clamp(low, high);
            self.weight(k, peak)
        };
        let p = self.p.norm();
        let mut total = p * p * most(self.k);
        if self.k > 0 {
            total += 2.0 * p * most(self.k - 1);
        }
        if self.k > 1 {
            total += most(self.k - 2);
        }
        self.c.norm() * total
    }

    /// A bound on the magnitude between two times.
    fn most(&self, low: f64, high: f64) -> f64 {
        let peak = (f64::from(self.k) / -self.p.re).clamp(low, high);
        self.size(peak)
    }
}

/// The modes of gain·Π(s - z)/(s·Π(s - p)), one of each conjugate pair.
fn modes(gain: f64, zeros: &[RootOf], poles: &[RootOf]) -> Vec<Mode> {
    let mut out = Vec::new();
    for (i, pole) in poles.iter().enumerate().filter(|(_, p)| p.im >= 0.0) {
        let p = Complex64::new(pole.re, pole.im);
        let m = pole.multiplicity as usize;
        // Power series of (s - p)^m·G(s)/s at p, kept with an exponent of its own.
        let mut series = vec![Complex64::ZERO; m];
        series[0] = Complex64::new(gain, 0.0);
        let mut log = 0.0;
        let root = |r: &RootOf| Complex64::new(r.re, r.im);
        for z in zeros {
            (0..z.multiplicity).for_each(|_| times(&mut series, p - root(z), &mut log));
        }
        for (_, q) in poles.iter().enumerate().filter(|(j, _)| *j != i) {
            (0..q.multiplicity).for_each(|_| over(&mut series, p - root(q), &mut log));
        }
        over(&mut series, p, &mut log);
        let pair = if pole.im > 0.0 { 2.0 } else { 1.0 };
        let mut log_factorial = 0.0;
        for k in 0..m {
            if k > 0 {
                log_factorial += libm::log(k as f64);
            }
            // The series' coefficient m - 1 - k goes with 1/(s - p)^(k + 1).
            let c = series[m - 1 - k] * pair * libm::exp(log);
            if c != Complex64::ZERO {
                out.push(Mode { p, k: k as u32, c, log_factorial });
            }
        }
    }
    out
}

/// series·(a + ε)
fn times(series: &mut [Complex64], a: Complex64, log: &mut f64) {
    for k in (0..series.len()).rev() {
        series[k] = series[k] * a + if k > 0 { series[k - 1] } else { Complex64::ZERO };
    }
    rescale(series, log);
}

/// series/(a + ε)
fn over(series: &mut [Complex64], a: Complex64, log: &mut f64) {
    for k in 0..series.len() {
        let before = if k > 0 { series[k - 1] } else { Complex64::ZERO };
        series[k] = (series[k] - before) / a;
    }
    rescale(series, log);
}

/// Takes what would leave the range of doubles into the exponent.
fn rescale(series: &mut [Complex64], log: &mut f64) {
    let size = series.iter().map(|c| c.norm()).fold(0.0, f64::max);
    if size > 0.0 && !(1e-100..1e100).contains(&size) {
        series.iter_mut().for_each(|c| *c /= size);
        *log += libm::log(size);
    }
}

/// sign·(y(t) - level) between two breaks, of the parts that have set in by the first.
pub(crate) struct Segment<'s> {
    /// The response.
    pub(crate) step: &'s Step,
    /// Parts with a dead time up to this one count.
    pub(crate) from: f64,
    /// 1 or -1.
    pub(crate) sign: f64,
    /// The level.
    pub(crate) level: f64,
}

impl Segment<'_> {
    fn parts(&self) -> impl Iterator<Item = &Response> {
        self.step.parts.iter().filter(|p| p.delay <= self.from)
    }
}

impl Smooth for Segment<'_> {
    fn jet(&self, x: f64) -> Jet {
        let (mut value, mut slope, mut noise) = (-self.level, 0.0, self.level.abs());
        for part in self.parts() {
            let t = x - part.delay;
            value += part.last;
            noise += part.last.abs();
            for m in &part.modes {
                let (v, s) = m.jet(t);
                value += v;
                slope += s;
                noise += m.size(t) * (4.0 + (m.p.norm() * t).abs());
            }
        }
        Jet { value: self.sign * value, slope: self.sign * slope, noise: noise * f64::EPSILON }
    }

    fn curvature(&self, low: f64, high: f64) -> f64 {
        let bound = |p: &Response| -> f64 {
            p.modes.iter().map(|m| m.curvature((low - p.delay).max(0.0), high - p.delay)).sum()
        };
        self.parts().map(bound).sum()
    }

    fn range(&self, low: f64, high: f64) -> Option<(f64, f64)> {
        let mut reach = 0.0;
        let mut middle = -self.level;
        for part in self.parts() {
            middle += part.last;
            reach += part.modes.iter().map(|m| m.most((low - part.delay).max(0.0), high - part.delay)).sum::<f64>();
        }
        let middle = self.sign * middle;
        Some((middle - reach, middle + reach))
    }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{delayed_ratio, part, poly, ratio};
    use super::super::quasi::{Quasi, Ratio};
    use super::*;

    /// 1/(s + 1)^5: 1 - exp(-t)·Σ t^k/k! (closed form).
    #[test]
    fn a_fivefold_pole() {
        let step = Step::of(&ratio(&[1], &[1, 5, 10, 10, 5, 1])).expect("rational");
        for t in [0.0, 0.5, 3.0, 20.0] {
            let (mut term, mut sum) = (1.0, 0.0);
            for k in 0..5 {
                sum += term;
                term *= t / f64::from(k + 1);
            }
            assert!((step.at(t) - (1.0 - (-t).exp() * sum)).abs() < 1e-14, "{t}");
        }
    }

    /// A second-order system from its formula, and the same once more half a second later.
    #[test]
    fn an_oscillation_and_an_echo() {
        let g = ratio(&[25], &[25, 5, 1]);
        let step = Step::of(&g).expect("rational");
        let (sigma, w) = (2.5, 18.75f64.sqrt());
        let y = |t: f64| 1.0 - (-sigma * t).exp() * ((w * t).cos() + sigma / w * (w * t).sin());
        assert!((step.at(0.7) - y(0.7)).abs() < 1e-14);
        let num = Quasi::from_terms(vec![(part(0, 1), poly(&[25])), (part(1, 2), poly(&[-25]))]);
        let echo =
            Step::of(&Ratio::new(num, Quasi::polynomial(poly(&[25, 5, 1]))).expect("not over 0")).expect("rational");
        assert!((echo.at(0.7) - (y(0.7) - y(0.2))).abs() < 1e-14 && echo.at(0.4) == step.at(0.4));
        assert_eq!(Step::of(&delayed_ratio(&[1, 0, 1], &[1, 1], part(1, 1))).map(|_| ()), Err(NoModes::Improper));
    }

    #[test]
    fn slopes_and_bounds_hold() {
        let step = Step::of(&ratio(&[3, 1], &[4, 8, 5, 1])).expect("rational");
        let f = Segment { step: &step, from: 0.0, sign: 1.0, level: 0.25 };
        let h = 1e-5;
        for t in [0.3, 1.1, 4.0] {
            let slope = (f.jet(t + h).value - f.jet(t - h).value) / (2.0 * h);
            let curve = (f.jet(t + h).slope - f.jet(t - h).slope) / (2.0 * h);
            assert!((slope - f.jet(t).slope).abs() < 1e-8 && curve.abs() <= f.curvature(t - h, t + h) + 1e-8);
            let (low, high) = f.range(t - h, t + h).expect("always");
            assert!(low <= f.jet(t).value && f.jet(t).value <= high);
        }
    }
}
