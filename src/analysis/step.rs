//! Figures of the unit step response: final value, overshoot, peak time, rise time, settling time.
//!
//! The times are zeros and the overshoot is the largest value of the exact response, found by the verified searches:
//! no step in time decides. Definitions: rise from 10 to 90 per cent of the final value, each reached for the first time;
//! settling is the last entry into the band about the final value; the overshoot is over the final value, in its
//! direction.

use super::modal::{NoModes, Segment, Step};
use super::quasi::Ratio;
use super::search::{self, From, Smooth};

/// A sum of modes that loses more digits than this to cancellation gives no figures.
const MOST_CANCELLATION: f64 = 1e7;

/// Figures of a step response, each a number or the reason why there is none.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct StepResult {
    /// In per cent of the final value.
    pub(crate) overshoot: Result<f64, String>,
    /// When the largest value is reached; `None` where the final value is not passed.
    pub(crate) peak_time: Option<f64>,
    /// In seconds.
    pub(crate) rise_time: Result<f64, String>,
    /// In seconds, for ±2 per cent.
    pub(crate) settling_time: Result<f64, String>,
}

/// The response of a stable transfer function, ready for questions.
#[derive(Clone, Debug)]
pub(crate) struct StepResponse {
    step: Step,
    last: f64,
    /// The starts of the stretches between breaks, and an end.
    stretches: Vec<(f64, f64)>,
}

const GIVEN_UP: &str = "the response oscillates too often before it settles to be followed";

impl StepResponse {
    /// The response of a ratio that is stable.
    ///
    /// # Errors
    ///
    /// Why it has no figures.
    pub(crate) fn of(ratio: &Ratio) -> Result<Self, String> {
        let step = Step::of(ratio).map_err(|e| {
            match e {
                NoModes::Improper => "the transfer function is improper: its step response has an impulse at t = 0",
                NoModes::Roots => "its poles could not be parted",
                NoModes::DeadTime => {
                    "dead time inside a loop: the step response is no finite sum of modes, and it is not worked out yet"
                }
            }
            .to_owned()
        })?;
        let last = step.last();
        if last == 0.0 {
            return Err("the final value is 0".to_owned());
        }
        if step.cancellation() > MOST_CANCELLATION * last.abs() {
            return Err("its poles lie too close together for double precision".to_owned());
        }
        let mut out = Self { step, last, stretches: Vec::new() };
        let end = out.settled_from(1e-3).ok_or(GIVEN_UP)?;
        let mut starts = out.step.breaks();
        if starts.first().is_none_or(|s| *s > 0.0) {
            starts.insert(0, 0.0);
        }
        let ends: Vec<f64> = starts.iter().skip(1).copied().chain([end.max(starts[starts.len() - 1])]).collect();
        out.stretches = starts.into_iter().zip(ends).collect();
        Ok(out)
    }

    /// A time from which on the response stays within this part of its final value.
    fn settled_from(&self, part: f64) -> Option<f64> {
        let slowest = self.step.slowest();
        if slowest == f64::INFINITY {
            return self.step.breaks().last().copied();
        }
        let inside = |t: f64| self.step.envelope(t).is_some_and(|e| e <= part * self.last.abs());
        let start = self.step.breaks().last().copied().unwrap_or(0.0);
        let mut reach = 1.0 / slowest;
        for _ in 0..200 {
            if inside(start + reach) {
                let (mut low, mut high) = (reach / 2.0, reach);
                for _ in 0..30 {
                    let m = f64::midpoint(low, high);
                    if inside(start + m) { high = m } else { low = m }
                }
                return Some(start + high);
            }
            reach *= 2.0;
        }
        None
    }

    fn segment(&self, from: f64, sign: f64, level: f64) -> Segment<'_> {
        Segment { step: &self.step, from, sign, level }
    }

    /// When the response first reaches a level on the way to its final value.
    fn first_at(&self, level: f64) -> Result<f64, String> {
        let sign = self.last.signum();
        for &(from, to) in &self.stretches {
            let f = self.segment(from, sign, level);
            if self.jump_to(from) * sign >= level * sign {
                return Ok(from);
            }
            let found = search::zeros(&f, from, to, From::Low, 1).map_err(|_| GIVEN_UP)?;
            if let Some(t) = found.first() {
                return Ok(*t);
            }
        }
        Err("the level is never reached".to_owned())
    }

    /// The value just after a break.
    fn jump_to(&self, t: f64) -> f64 {
        self.step.at(t)
    }

    /// The last entry into a band about the final value; the band as a part of that.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn settling(&self, band: f64) -> Result<f64, String> {
        let end = self.settled_from(band).ok_or(GIVEN_UP)?;
        let inside = |v: f64| (v - self.last).abs() <= band * self.last.abs();
        for (i, &(from, to)) in self.stretches.iter().enumerate().rev() {
            let to = if i + 1 == self.stretches.len() { end.max(from) } else { to };
            // Outside at its end, and the next part brings it in at once.
            if i + 1 < self.stretches.len() && !inside(self.segment(from, 1.0, 0.0).jet(to).value) {
                return Ok(to);
            }
            let mut last: Option<f64> = None;
            for side in [1.0 - band, 1.0 + band] {
                let f = self.segment(from, 1.0, self.last * side);
                let found = search::zeros(&f, from, to, From::High, 1).map_err(|_| GIVEN_UP)?;
                last = found.first().copied().into_iter().chain(last).reduce(f64::max);
            }
            if let Some(t) = last {
                return Ok(t);
            }
        }
        Ok(0.0)
    }

    /// All figures.
    pub(crate) fn figures(&self) -> StepResult {
        let rise = self.first_at(0.1 * self.last).and_then(|a| Ok(self.first_at(0.9 * self.last)? - a));
        let (overshoot, peak_time) = self.overshoot();
        StepResult { overshoot, peak_time, rise_time: rise, settling_time: self.settling(0.02) }
    }

    fn overshoot(&self) -> (Result<f64, String>, Option<f64>) {
        let sign = self.last.signum();
        let (mut most, mut when) = (self.last.abs(), None);
        for &(from, to) in &self.stretches {
            let start = self.jump_to(from) * sign;
            if start > most {
                (most, when) = (start, Some(from));
            }
            let f = self.segment(from, sign, 0.0);
            match search::maximum(&f, from, to, most) {
                Ok(Some((t, y))) if y > most => (most, when) = (y, Some(t)),
                Ok(_) => {}
                Err(_) => return (Err(GIVEN_UP.to_owned()), None),
            }
        }
        let over = (most / self.last.abs() - 1.0) * 100.0;
        // What rounding alone can make of a response that nears its final value from below.
        if over < 1e-11 { (Ok(0.0), None) } else { (Ok(over), when) }
    }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::Quasi;
    use super::super::quasi::tests::{delayed_ratio, part, poly, ratio};
    use super::*;

    fn close(a: f64, b: f64, tolerance: f64) -> bool {
        (a - b).abs() <= tolerance * b.abs()
    }

    /// Overshoot exp(-πζ/√(1 - ζ²)) at π/(ω_n·√(1 - ζ²)) (K. Ogata, Modern Control Engineering, from memory); rise and
    /// settling from the published checks (mpmath, 40 digits).
    #[test]
    fn the_standard_second_order_system() {
        let s = StepResponse::of(&ratio(&[25], &[25, 5, 1])).expect("stable").figures();
        let root = 0.75f64.sqrt();
        assert!(close(s.overshoot.expect("some"), 100.0 * (-std::f64::consts::PI * 0.5 / root).exp(), 1e-13));
        assert!(close(s.peak_time.expect("some"), std::f64::consts::PI / (5.0 * root), 1e-9));
        assert!(close(s.rise_time.expect("some"), 0.327_514_589_465_7, 1e-12));
        assert!(close(s.settling_time.expect("some"), 1.615_269_794_786, 1e-12));
    }

    /// A first-order lag: ln 9 times its time constant, and ln 50; behind a dead time the settling is later by that.
    #[test]
    fn a_lag_behind_a_dead_time() {
        let s = StepResponse::of(&delayed_ratio(&[3], &[1, 2], part(7, 2))).expect("stable");
        let f = s.figures();
        assert_eq!((f.overshoot, f.peak_time), (Ok(0.0), None));
        assert!(close(f.rise_time.expect("some"), 2.0 * 9f64.ln(), 1e-13));
        assert!(close(f.settling_time.expect("some"), 2.0 * 50f64.ln() + 3.5, 1e-13));
        assert!(close(s.settling(0.05).expect("some"), 2.0 * 20f64.ln() + 3.5, 1e-13));
    }

    /// A damping ratio of 1e-6: two million half cycles until it settles, of which few need to be looked at.
    #[test]
    fn very_light_damping() {
        let s = StepResponse::of(&ratio(&[500_000], &[500_000, 1, 500_000])).expect("stable").figures();
        assert!(close(s.overshoot.expect("some"), 100.0 * (-std::f64::consts::PI * 1e-6).exp(), 1e-9));
        assert!(close(s.settling_time.expect("some"), 50f64.ln() / 1e-6, 1e-5));
    }

    /// A direct gain starts above its final value: 2 at once, then down to 1 (closed form 1 + exp(-t)).
    #[test]
    fn a_jump_at_the_start() {
        let s = StepResponse::of(&ratio(&[1, 2], &[1, 1])).expect("stable").figures();
        assert_eq!((s.overshoot, s.peak_time, s.rise_time), (Ok(100.0), Some(0.0), Ok(0.0)));
        assert!(close(s.settling_time.expect("some"), 50f64.ln(), 1e-13));
        assert!(StepResponse::of(&ratio(&[0, 1], &[1, 1])).is_err_and(|why| why.contains("final value")));
        // A pure gain is there at once.
        let s = StepResponse::of(&ratio(&[3], &[2])).expect("stable").figures();
        assert_eq!((s.overshoot, s.rise_time, s.settling_time), (Ok(0.0), Ok(0.0), Ok(0.0)));
    }

    /// Two steps half a second apart: 1/2 + 1/2·exp(-s/2).
    #[test]
    fn steps_of_a_dead_time() {
        let num = Quasi::from_terms(vec![(part(0, 1), poly(&[1])), (part(1, 2), poly(&[1]))]);
        let g = Ratio::new(num, Quasi::polynomial(poly(&[2]))).expect("not over 0");
        let s = StepResponse::of(&g).expect("stable").figures();
        assert_eq!((s.overshoot, s.rise_time, s.settling_time), (Ok(0.0), Ok(0.5), Ok(0.5)));
    }
}
