//! Margins of a loop from its return ratio L: the characteristic equation is 1 + L = 0.
//!
//! - gain margins: all factors k > 0 for which 1 + k·L has a root on the axis, that is -1/L where L is real and negative;
//! - phase margins: the angles φ, from -180° to 180°, for which 1 + exp(-jφ)·L has a root on the axis: arg L + 180° where
//!   abs(L) = 1;
//! - delay margin: the least extra dead time τ ≥ 0 for which 1 + exp(-τs)·L has one;
//! - modulus margin: the least of abs(1 + L).

use super::response::{AtInfinity, Extreme, Response};
use super::search::GivenUp;
use std::f64::consts::{PI, TAU};

/// With dead time in it a loop may have infinitely many gain margins; so many are listed.
pub(crate) const MAX_LISTED: usize = 20;

/// A factor of the loop gain.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct GainMargin {
    /// The factor.
    pub(crate) factor: f64,
    /// In rad/s; `None` for ω → ∞.
    pub(crate) frequency: Option<f64>,
}

/// A change of phase.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct PhaseMargin {
    /// In degrees, above -180, up to 180.
    pub(crate) degrees: f64,
    /// In rad/s.
    pub(crate) frequency: f64,
}

/// All margins of one loop.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Margins {
    /// Rising in frequency.
    pub(crate) gain: Vec<GainMargin>,
    /// Whether there are more than are listed.
    pub(crate) more: bool,
    /// Rising in frequency.
    pub(crate) phase: Vec<PhaseMargin>,
    /// Seconds with the frequency of the crossing; `None` where no dead time loses stability.
    pub(crate) delay: Option<(f64, Option<f64>)>,
    /// The least of abs(1 + L).
    pub(crate) modulus: Extreme,
}

impl Margins {
    /// The margins of a loop that is stable.
    ///
    /// # Errors
    ///
    /// [`GivenUp`] where dead times make a search too long.
    pub(crate) fn of(response: &Response) -> Result<Self, GivenUp> {
        let (places, more) = response.negative_places(MAX_LISTED)?;
        let gain = places.iter().map(|p| GainMargin { factor: -1.0 / p.value.re, frequency: p.frequency }).collect();
        let unit = response.unit_places()?;
        let phase: Vec<PhaseMargin> = unit
            .iter()
            .filter_map(|p| {
                let frequency = p.frequency?;
                Some(PhaseMargin { degrees: two_sided(p.value.im.atan2(p.value.re) + PI).to_degrees(), frequency })
            })
            .collect();
        let turning = |p: &PhaseMargin| {
            let radians = p.degrees.to_radians();
            let ahead = if radians < 0.0 { radians + TAU } else { radians };
            (ahead / p.frequency, Some(p.frequency))
        };
        let mut delay = phase.iter().map(turning).min_by(|a, b| a.0.total_cmp(&b.0));
        let at_infinity = match response.at_infinity() {
            AtInfinity::Value(v) | AtInfinity::Turning(v) => v.abs(),
            AtInfinity::Unbounded => f64::INFINITY,
        };
        // A direct gain of 1 or more loses stability with the least dead time: a chain of roots far up the axis.
        if at_infinity >= 1.0 && response.axis.end().is_none() {
            delay = Some((0.0, None));
        }
        Ok(Self { gain, more, phase, delay, modulus: response.least_difference()? })
    }

    /// The smallest factor, up or down, as a ratio of at least 1, with its frequency; `None` where no factor loses
    /// stability.
    pub(crate) fn smallest_gain(&self) -> Option<GainMargin> {
        let ratio = |m: &GainMargin| m.factor.max(1.0 / m.factor);
        let least = self.gain.iter().min_by(|a, b| ratio(a).total_cmp(&ratio(b)))?;
        Some(GainMargin { factor: ratio(least), frequency: least.frequency })
    }

    /// The smallest change of phase, in degrees, without its sign.
    pub(crate) fn smallest_phase(&self) -> Option<PhaseMargin> {
        let least = self.phase.iter().min_by(|a, b| a.degrees.abs().total_cmp(&b.degrees.abs()))?;
        Some(PhaseMargin { degrees: least.degrees.abs(), frequency: least.frequency })
    }
}

/// An angle in radians above -π, up to π.
fn two_sided(angle: f64) -> f64 {
    let turn = libm::remainder(angle, TAU);
    if turn <= -PI { turn + TAU } else { turn }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{delayed_ratio, part, poly, ratio};
    use super::super::quasi::{Quasi, Ratio};
    use super::*;

    fn close(a: f64, b: f64) -> bool {
        (a - b).abs() <= 1e-12 * b.abs().max(1e-3)
    }

    /// K·exp(-Ts)/s: gain margin π/(2KT), phase margin π/2 - KT, delay margin π/(2K) - T (closed form).
    #[test]
    fn an_integrator_behind_a_dead_time() {
        let m = Margins::of(&Response::continuous(delayed_ratio(&[1], &[0, 2], part(1, 1)))).expect("few");
        assert!(close(m.gain[0].factor, PI) && close(m.gain[0].frequency.expect("finite"), PI / 2.0));
        assert_eq!((m.gain.len(), m.more), (20, true));
        assert!(close(m.gain[19].frequency.expect("finite"), 38.5 * PI));
        assert!(close(m.phase[0].degrees, 90.0 - 0.5f64.to_degrees()) && close(m.phase[0].frequency, 0.5));
        assert!(close(m.delay.expect("some").0, PI - 1.0));
        // The same case in the published checks, computed with mpmath 1.3.0 at 40 digits.
        assert!((m.modulus.value - 0.628_736_963_693_6).abs() < 1e-12);
        assert!((m.modulus.frequency.expect("finite") - 1.144_233_739_9).abs() < 1e-9);
    }

    /// (1 - s)/(s + 1)²: gain margin 2 at √3 (closed form).
    #[test]
    fn a_right_half_plane_zero() {
        let m = Margins::of(&Response::continuous(ratio(&[1, -1], &[1, 2, 1]))).expect("exact");
        assert_eq!(m.gain.len(), 1);
        assert!(close(m.gain[0].factor, 2.0) && close(m.gain[0].frequency.expect("finite"), 3f64.sqrt()));
        assert!(m.phase.is_empty() && m.delay.is_none());
    }

    /// 4 (s + 1)²/(s³ (s/20 + 1)²) limits the gain from both sides; figures computed with mpmath at 40 digits.
    #[test]
    fn a_conditionally_stable_loop() {
        let m = Margins::of(&Response::continuous(ratio(&[1600, 3200, 1600], &[0, 0, 0, 400, 40, 1]))).expect("exact");
        assert!(
            close(m.gain[0].factor, 0.155_883_597_504_004_3) || (m.gain[0].factor - 0.155_883_597_504).abs() < 1e-11
        );
        assert!((m.gain[1].factor - 8.018_803_902_496).abs() < 1e-11);
        let least = m.smallest_gain().expect("two");
        assert!((least.factor - 1.0 / 0.155_883_597_504).abs() < 1e-9);
    }

    /// A gain crossing within a resonance 1e-5 wide, between decades of smooth decay: no grid would meet it. L = 1e-3/(s +
    /// 1) + resonance at 10 with the peak 5: crossings on both sides of 10.
    #[test]
    fn a_resonance_narrower_than_any_grid() {
        // 0.0005·s/(s² + 1e-4 s + 100): peak 5 at ω = 10, half-width 5e-5; abs = 1 where (100 - ω²)² = (25 - 1)·1e-8·ω².
        let m = Response::continuous(ratio(&[0, 5], &[1_000_000, 1, 10_000]));
        let found = m.unit_places().expect("exact");
        assert_eq!(found.len(), 2);
        let half = 24f64.sqrt() * 1e-4 / 2.0;
        let expected = (100.0 + half * half).sqrt() - half;
        assert!(close(found[0].frequency.expect("finite"), expected));
        assert!((found[1].frequency.expect("finite") - found[0].frequency.expect("finite") - 2.0 * half).abs() < 1e-13);
    }

    /// Poles at 0 and a crossing at ω = 0 for a loop with negative gain at rest.
    #[test]
    fn a_crossing_at_zero_and_one_at_infinity() {
        // L = -1/2: 1 - k/2 is 0 for k = 2, and at no frequency in particular.
        let m = Margins::of(&Response::continuous(ratio(&[-1], &[2]))).expect("exact");
        assert_eq!(m.gain, [GainMargin { factor: 2.0, frequency: Some(0.0) }]);
        // L = (1 - s)/(2 (s + 1)): 1/2 at 0, -1/2 at infinity.
        let m = Margins::of(&Response::continuous(ratio(&[1, -1], &[2, 2]))).expect("exact");
        assert_eq!(m.gain, [GainMargin { factor: 2.0, frequency: None }]);
        assert_eq!(m.modulus, Extreme { value: 0.5, frequency: None });
    }

    /// A loop of neutral type: L = exp(-s)·(s + 2)/(2 (s + 1)) nears the magnitude 1/2.
    #[test]
    fn a_neutral_loop() {
        let m = Margins::of(&Response::continuous(delayed_ratio(&[2, 1], &[4, 2], part(1, 1)))).expect("few");
        let limit = m.gain.last().expect("one");
        assert_eq!((limit.factor, limit.frequency), (2.0, None));
        assert!(m.phase.is_empty() && m.delay.is_none());
        // A direct gain above 1 behind no dead time: any dead time loses stability.
        let m = Margins::of(&Response::continuous(ratio(&[4, 3], &[1, 2]))).expect("exact");
        assert_eq!(m.delay, Some((0.0, None)));
    }

    /// The Smith predictor of a plant exp(-s)/(s + 1) under the gain 2: L has a dead time inside. C = 2/(1 + 2 (1 -
    /// exp(-s))/(s + 1)), L = C·exp(-s)/(s + 1) = 2 exp(-s)/(s + 3 - 2 exp(-s)).
    #[test]
    fn dead_time_inside_the_loop() {
        let num = Quasi::polynomial(poly(&[2])).delayed(&part(1, 1));
        let den = Quasi::from_terms(vec![(part(0, 1), poly(&[3, 1])), (part(1, 1), poly(&[-2]))]);
        let l = Response::continuous(Ratio::new(num, den).expect("not over 0"));
        let m = Margins::of(&l).expect("few");
        // 1 + L = (s + 3)/(s + 3 - 2 exp(-s)), so abs(1 + L) can be evaluated at will: compare with a fine grid.
        let grid = (1..200_000).map(|i| (l.at(f64::from(i) * 1e-4) + 1.0).norm()).fold(f64::INFINITY, f64::min);
        assert!(m.modulus.value <= grid + 1e-12 && m.modulus.value > grid - 1e-7, "{:?} {grid}", m.modulus);
        for p in &m.phase {
            assert!((l.at(p.frequency).norm() - 1.0).abs() < 1e-12);
        }
        for g in m.gain.iter().filter(|g| g.frequency.is_some_and(|w| w > 0.0)) {
            let v = l.at(g.frequency.unwrap_or(0.0)) * g.factor + 1.0;
            assert!(v.norm() < 1e-9, "{g:?} {v}");
        }
    }
}
