//! The frequency response of one transfer function or return ratio: crossings, extremes and limits.
//!
//! Without dead time, or with one dead time in front, places are roots of exact polynomials in x = ω²; with dead times
//! inside they are found by the verified searches. A sampled response is taken to the imaginary axis by z = (1 + w)/(1 -
//! w): its frequencies ω are 2·atan(ν)/T of those here, ν = ∞ being ω = π/T.

use super::axis::{self, Dyadic, OnAxis};
use super::curve::{Curve, Level, Magnitude, Part};
use super::quasi::{Quasi, Ratio, bilinear, difference};
use super::search::{self, From, GivenUp};
use crate::algebra::{IBig, RBig, dense};
use num_complex::Complex64;
use std::f64::consts::PI;

/// The most crossings of one kind that are followed where dead times make them infinitely many.
const MAX_CROSSINGS: usize = 200;

/// What ω stands for.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Axis {
    /// s = jω
    Continuous,
    /// z = exp(jωT), with T in seconds.
    Sampled(f64),
}

impl Axis {
    /// The frequency in rad/s of a place on the imaginary axis.
    pub(crate) fn frequency(&self, place: f64) -> f64 {
        match self {
            Self::Continuous => place,
            Self::Sampled(period) => 2.0 * libm::atan(place) / period,
        }
    }

    /// The place of a frequency in rad/s; infinite for π/T and above.
    pub(crate) fn place(&self, frequency: f64) -> f64 {
        match self {
            Self::Continuous => frequency,
            Self::Sampled(period) if frequency * period >= PI => f64::INFINITY,
            Self::Sampled(period) => libm::tan(frequency * period / 2.0),
        }
    }

    /// The frequency of the place at infinity, where it is one.
    pub(crate) fn end(&self) -> Option<f64> {
        match self {
            Self::Continuous => None,
            Self::Sampled(period) => Some(PI / period),
        }
    }
}

/// A place with the value there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Place {
    /// In rad/s; `None` at infinity.
    pub(crate) frequency: Option<f64>,
    /// The response.
    pub(crate) value: Complex64,
}

/// A figure of a magnitude with its place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Extreme {
    /// The magnitude.
    pub(crate) value: f64,
    /// In rad/s; `None` where it is only approached as ω → ∞.
    pub(crate) frequency: Option<f64>,
}

/// The exact parts of a response without dead times inside.
#[derive(Clone, Debug)]
struct Exact {
    n: OnAxis,
    d: OnAxis,
    delay: f64,
}

/// A response with all that its figures need.
#[derive(Clone, Debug)]
pub(crate) struct Response {
    /// On the imaginary axis.
    pub(crate) ratio: Ratio,
    /// What its frequencies are.
    pub(crate) axis: Axis,
    exact: Option<Exact>,
    num: Curve,
    den: Curve,
}

impl Response {
    /// The response of a ratio in s.
    pub(crate) fn continuous(ratio: Ratio) -> Self {
        Self::new(ratio, Axis::Continuous)
    }

    /// The response of a ratio of polynomials in z with this sampling period; `None` where there are dead times.
    pub(crate) fn sampled(ratio: &Ratio, period: f64) -> Option<Self> {
        let n = ratio.num.as_polynomial().map(<[IBig]>::to_vec).or_else(|| ratio.num.is_zero().then(Vec::new))?;
        let d = ratio.den.as_polynomial()?;
        let degree = n.len().max(d.len()) - 1;
        let map = |p: &[IBig]| Quasi::polynomial(bilinear(p, degree));
        Some(Self::new(Ratio::new(map(&n), map(d))?, Axis::Sampled(period)))
    }

    fn new(ratio: Ratio, axis: Axis) -> Self {
        let exact = ratio.rational().map(|(n, d, delay)| Exact {
            n: OnAxis::new(n),
            d: OnAxis::new(d),
            delay: delay.to_f64().value(),
        });
        let (num, den) = Curve::pair(&ratio);
        Self { ratio, axis, exact, num, den }
    }

    /// Whether it is 0.
    pub(crate) fn is_zero(&self) -> bool {
        self.ratio.num.is_zero()
    }

    /// abs(N)² and abs(D)² as polynomials in x, where dead times leave them alone.
    pub(crate) fn squares(&self) -> Option<(Vec<IBig>, Vec<IBig>)> {
        self.exact.as_ref().map(|e| (e.n.square(), e.d.square()))
    }

    /// abs(N + D)² and abs(D)² as polynomials in x, where there is no dead time.
    pub(crate) fn squares_of_difference(&self) -> Option<(Vec<IBig>, Vec<IBig>)> {
        let e = self.exact.as_ref().filter(|e| e.delay == 0.0)?;
        let sum = OnAxis { even: super::quasi::sum(&e.n.even, &e.d.even), odd: super::quasi::sum(&e.n.odd, &e.d.odd) };
        Some((sum.square(), e.d.square()))
    }

    /// N·conj(D) as real(x) + jω·imaginary(x), where there is no dead time.
    pub(crate) fn cross(&self) -> Option<(Vec<IBig>, Vec<IBig>)> {
        self.exact.as_ref().filter(|e| e.delay == 0.0).map(|e| e.n.times_conjugate(&e.d))
    }

    /// The value at a place on the axis.
    pub(crate) fn at(&self, place: f64) -> Complex64 {
        if let Some(e) = &self.exact {
            let x = Dyadic::from_f64(place);
            let x = Dyadic { m: &x.m * &x.m, k: 2 * x.k };
            return e.at(&x, place);
        }
        self.num.at(place).d[0] / self.den.at(place).d[0]
    }

    /// The value at infinity: a number, or for what turns without end the largest magnitude that it comes back to.
    pub(crate) fn at_infinity(&self) -> AtInfinity {
        let (n, d) = (self.ratio.num.degree(), self.ratio.den.degree());
        if self.is_zero() || n < d {
            return AtInfinity::Value(0.0);
        }
        if n > d {
            return AtInfinity::Unbounded;
        }
        let lead = |q: &Quasi| -> Vec<(RBig, IBig)> {
            q.terms.iter().filter_map(|t| t.1.get(n).map(|c| (t.0.clone(), c.clone()))).collect()
        };
        let (above, below) = (lead(&self.ratio.num), lead(&self.ratio.den));
        match (&above[..], &below[..]) {
            ([(t, a)], [(u, b)]) if t == u => AtInfinity::Value(axis::quotient(a, b)),
            ([(_, a)], [(_, b)]) => AtInfinity::Turning(axis::quotient(a, b).abs()),
            _ => {
                // Cautiously: the sum of magnitudes over the least magnitude that is certain.
                let size = |c: &IBig| axis::quotient(c, &below[0].1).abs();
                let most: f64 = above.iter().map(|t| size(&t.1)).sum();
                let least = 1.0 - below.iter().skip(1).map(|t| size(&t.1)).sum::<f64>();
                if least > 0.0 { AtInfinity::Turning(most / least) } else { AtInfinity::Unbounded }
            }
        }
    }

    /// Places where the magnitude is 1, rising, none at 0.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn unit_places(&self) -> Result<Vec<Place>, GivenUp> {
        if let Some(e) = &self.exact {
            let roots = axis::positive_roots(&difference(&e.n.square(), &e.d.square()));
            let place = |x: &Dyadic| Place { frequency: Some(self.axis.frequency(x.root())), value: e.at(x, x.root()) };
            return Ok(roots.iter().map(|r| place(&r.x)).collect());
        }
        let (low, high) = self.range(1.0);
        let level = Level { f: &self.num, g: &self.den, factor: 1.0 };
        let found = search::zeros(&level, low, high, From::Low, MAX_CROSSINGS)?;
        Ok(found.into_iter().map(|w| Place { frequency: Some(self.axis.frequency(w)), value: self.at(w) }).collect())
    }

    /// Places where the response is real and negative, rising; those at 0 and at infinity (as a limit) included. Says
    /// besides whether there are more than were followed.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn negative_places(&self, most: usize) -> Result<(Vec<Place>, bool), GivenUp> {
        let mut out = Vec::new();
        let real = |value: f64| Complex64::new(value, 0.0);
        let at_zero = self.ratio.at_zero().map(|v| v.to_f64().value()).filter(|v| *v < 0.0);
        out.extend(at_zero.map(|v| Place { frequency: Some(0.0), value: real(v) }));
        let constant = self.ratio.num.degree() == 0 && self.ratio.den.degree() == 0;
        let mut more = false;
        if let Some(e) = self.exact.as_ref().filter(|e| e.delay == 0.0) {
            let (re, im) = e.n.times_conjugate(&e.d);
            let below = e.d.square();
            for root in axis::positive_roots(&im) {
                let value = root.x.quotient(&re, &below);
                if value < 0.0 && value.is_finite() {
                    out.push(Place { frequency: Some(self.axis.frequency(root.x.root())), value: real(value) });
                }
            }
        } else if !self.is_zero() {
            let (low, high) = self.range(1.0);
            let longest = self.ratio.num.terms.iter().chain(&self.ratio.den.terms).map(|t| t.0.to_f64().value());
            let shortest = longest.filter(|d| *d > 0.0).fold(f64::INFINITY, f64::min);
            let high = high + 2.0 * PI * most as f64 * 2.0 / shortest;
            let part = Part { f: &self.num, g: &self.den };
            // Every other place is negative where the response turns; no more are needed than are told.
            let found = search::zeros(&part, low, high, From::Low, MAX_CROSSINGS.min(2 * most + 8))?;
            let places = found.into_iter().map(|w| (w, self.at(w)));
            let negative: Vec<_> = places.filter(|(_, v)| v.re < 0.0 && v.is_finite()).collect();
            more = negative.len() > most || self.ratio.num.terms.last().is_some_and(|t| t.0 != RBig::ZERO);
            out.extend(
                negative
                    .into_iter()
                    .take(most)
                    .map(|(w, v)| Place { frequency: Some(self.axis.frequency(w)), value: real(v.re) }),
            );
        }
        match self.at_infinity() {
            AtInfinity::Value(v) if v < 0.0 && !constant => {
                out.push(Place { frequency: self.axis.end(), value: real(v) });
            }
            AtInfinity::Turning(v) if v > 0.0 => out.push(Place { frequency: None, value: real(-v) }),
            _ => {}
        }
        Ok((out, more))
    }

    /// The magnitude that a response of neutral type nears for ever, and a millionth more: where it stays below, the
    /// search ends, so that what is found is within a millionth of the limit.
    fn tail(&self) -> f64 {
        match self.at_infinity() {
            AtInfinity::Turning(v) => v * (1.0 + 1e-6),
            AtInfinity::Value(_) | AtInfinity::Unbounded => 0.0,
        }
    }

    /// The largest magnitude over all frequencies.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn largest(&self) -> Result<Extreme, GivenUp> {
        let mut ends = Vec::new();
        ends.extend(self.ratio.at_zero().map(|v| Extreme { value: v.to_f64().value().abs(), frequency: Some(0.0) }));
        match self.at_infinity() {
            AtInfinity::Value(v) => ends.push(Extreme { value: v.abs(), frequency: self.axis.end() }),
            AtInfinity::Turning(value) => ends.push(Extreme { value, frequency: None }),
            AtInfinity::Unbounded => return Ok(Extreme { value: f64::INFINITY, frequency: None }),
        }
        if let Some((n, d)) = self.squares() {
            ends.extend(self.stationary(&n, &d));
            return Ok(best(&ends, |a, b| a > b));
        }
        if self.is_zero() {
            return Ok(Extreme { value: 0.0, frequency: Some(0.0) });
        }
        let start = best(&ends, |a, b| a > b);
        let (low, _) = self.range(1.0);
        let sampled = self.coarse(|v| v.norm()).into_iter().fold(start.value, f64::max);
        let (_, high) = self.range(sampled.max(self.tail()).max(f64::MIN_POSITIVE));
        let f = Magnitude { f: &self.num, g: &self.den };
        let found = search::maximum(&f, low, high, start.value * start.value)?;
        Ok(found.map_or(start, |(x, y)| Extreme { value: libm::sqrt(y), frequency: Some(self.axis.frequency(x)) }))
    }

    /// The least of abs(1 + L) over all frequencies.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn least_difference(&self) -> Result<Extreme, GivenUp> {
        let mut ends = Vec::new();
        let at_zero = self.ratio.at_zero().map(|v| (v + RBig::ONE).to_f64().value().abs());
        ends.extend(at_zero.map(|value| Extreme { value, frequency: Some(0.0) }));
        match self.at_infinity() {
            AtInfinity::Value(v) => ends.push(Extreme { value: (1.0 + v).abs(), frequency: self.axis.end() }),
            AtInfinity::Turning(v) => ends.push(Extreme { value: (1.0 - v).max(0.0), frequency: None }),
            AtInfinity::Unbounded => {}
        }
        if let Some((a, b)) = self.squares_of_difference() {
            ends.extend(self.stationary(&a, &b));
            return Ok(best(&ends, |a, b| a < b));
        }
        let start = best(&ends, |a, b| a < b);
        let whole = self.ratio.num.add(&self.ratio.den);
        let pair = Ratio { num: self.ratio.den.clone(), den: whole };
        let (f, g) = Curve::pair(&pair);
        let (low, _) = self.range(1.0);
        let sampled = self.coarse(|v| (v + 1.0).norm()).into_iter().fold(start.value, f64::min);
        // Beyond, abs(L) stays below 1 - sampled.
        let (_, high) = self.range((1.0 - sampled).max(1e-6).max(self.tail()));
        let magnitude = Magnitude { f: &f, g: &g };
        let found = search::maximum(&magnitude, low, high, 1.0 / (start.value * start.value))?;
        Ok(found
            .map_or(start, |(x, y)| Extreme { value: 1.0 / libm::sqrt(y), frequency: Some(self.axis.frequency(x)) }))
    }

    /// The first frequency at which the magnitude is 1/√2 of that at 0; `None` where there is none.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn bandwidth(&self, at_zero: &RBig) -> Result<Option<f64>, GivenUp> {
        if let Some(polynomial) = self.bandwidth_polynomial(at_zero) {
            let first = axis::positive_roots(&polynomial).into_iter().next();
            return Ok(first.map(|r| self.axis.frequency(r.x.root())));
        }
        let gain = at_zero.to_f64().value();
        let (low, high) = self.range(gain.abs() / 2.0);
        let level = Level { f: &self.num, g: &self.den, factor: 2.0 / (gain * gain) };
        let found = search::zeros(&level, low, high, From::Low, 1)?;
        Ok(found.first().map(|w| self.axis.frequency(*w)))
    }

    /// 2·abs(N)² - gain²·abs(D)² in x.
    pub(crate) fn bandwidth_polynomial(&self, gain: &RBig) -> Option<Vec<IBig>> {
        let (n, d) = self.squares()?;
        let (p, q) = (gain.numerator(), IBig::from(gain.denominator().clone()));
        let scale = |a: &[IBig], by: IBig| super::quasi::times(a, &by);
        Some(difference(&scale(&n, &q * &q * IBig::from(2)), &scale(&d, p * p)))
    }

    /// The least or largest magnitude between two frequencies in rad/s.
    ///
    /// # Errors
    ///
    /// [`GivenUp`].
    pub(crate) fn over(&self, from: f64, to: f64, largest: bool) -> Result<Extreme, GivenUp> {
        let (a, b) = (self.axis.place(from), self.axis.place(to));
        let better = |x: f64, y: f64| if largest { x > y } else { x < y };
        let at = |place: f64, frequency: f64| {
            let value = if place == 0.0 {
                self.ratio.at_zero().map_or(f64::INFINITY, |v| v.to_f64().value().abs())
            } else if place.is_infinite() {
                match self.at_infinity() {
                    AtInfinity::Value(v) => v.abs(),
                    AtInfinity::Turning(v) => v,
                    AtInfinity::Unbounded => f64::INFINITY,
                }
            } else {
                self.at(place).norm()
            };
            Extreme { value, frequency: Some(frequency) }
        };
        let mut found = vec![at(a, from), at(b, to.min(self.axis.end().unwrap_or(to)))];
        if let Some((n, d)) = self.squares() {
            let inside = |e: &Extreme| e.frequency.is_some_and(|w| from < w && w < to);
            found.extend(self.stationary(&n, &d).into_iter().filter(inside));
            return Ok(best(&found, better));
        }
        let start = best(&found, better);
        let (f, g) = if largest { (&self.num, &self.den) } else { (&self.den, &self.num) };
        let least = if largest { start.value } else { 1.0 / start.value };
        let hit = search::maximum(&Magnitude { f, g }, a, b, least * least)?;
        Ok(hit.map_or(start, |(x, y)| {
            let value = if largest { libm::sqrt(y) } else { 1.0 / libm::sqrt(y) };
            Extreme { value, frequency: Some(self.axis.frequency(x)) }
        }))
    }

    /// √(a/b) where its slope with x vanishes.
    fn stationary(&self, a: &[IBig], b: &[IBig]) -> Vec<Extreme> {
        let slope = stationary_polynomial(a, b);
        let figure = |x: &Dyadic| {
            let value = libm::sqrt(x.quotient(a, b));
            value.is_finite().then(|| Extreme { value, frequency: Some(self.axis.frequency(x.root())) })
        };
        axis::positive_roots(&slope).iter().filter_map(|r| figure(&r.x)).collect()
    }

    /// Values at points spaced evenly in the logarithm: a start for searches that prove the rest.
    fn coarse(&self, of: impl Fn(Complex64) -> f64) -> Vec<f64> {
        let (low, high) = self.range(1e-3);
        let points = 300;
        let step = libm::log(high / low) / f64::from(points);
        let values = (0..=points).map(|i| of(self.at(low * libm::exp(step * f64::from(i)))));
        values.filter(|v| v.is_finite()).collect()
    }

    /// Frequencies below which nothing but the lowest powers counts, and above which the magnitude stays below `level`.
    fn range(&self, level: f64) -> (f64, f64) {
        let low = self.num.dominated_to(1e4).min(self.den.dominated_to(1e4));
        let from = self.den.dominated_from(2.0).unwrap_or(0.0);
        let mut high = from.max(self.num.dominated_from(2.0).unwrap_or(0.0)).max(low * 16.0);
        let lead: f64 = {
            let leads = self.den.leads();
            leads.first().map_or(0.0, |l| l.1.abs()) - leads.iter().skip(1).map(|l| l.1.abs()).sum::<f64>()
        };
        if lead > 0.0 {
            // From `from` on, abs(D) is at least half of its leading terms; the bound on abs(N) over it falls.
            for _ in 0..200 {
                let below = lead * libm::pow(high, self.den.degree() as f64) / 2.0;
                if self.num.bounds(high)[0] <= level * below || high > 1e30 {
                    break;
                }
                high *= 2.0;
                // With equal degrees the bound never falls below the direct gain.
                if self.num.degree() >= self.den.degree() && high > 1e4 * from.max(low) {
                    break;
                }
            }
        }
        (low, high)
    }
}

/// What a response does as ω → ∞.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum AtInfinity {
    /// It nears a real number.
    Value(f64),
    /// It turns, with a magnitude that comes back to this one or stays below it.
    Turning(f64),
    /// It grows.
    Unbounded,
}

impl Exact {
    /// The value at ω = √x.
    fn at(&self, x: &Dyadic, omega: f64) -> Complex64 {
        let (re, im) = self.n.times_conjugate(&self.d);
        let below = self.d.square();
        let value = Complex64::new(x.quotient(&re, &below), x.quotient(&im, &below) * omega);
        if self.delay == 0.0 { value } else { value * Complex64::from_polar(1.0, -self.delay * omega) }
    }
}

/// a'·b - a·b': its roots are the stationary points of a/b.
pub(crate) fn stationary_polynomial(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    difference(&dense::product(&dense::derivative(a), b), &dense::product(a, &dense::derivative(b)))
}

/// The best of a list that is not empty; of equals a place at a finite frequency, and the first.
fn best(all: &[Extreme], better: impl Fn(f64, f64) -> bool) -> Extreme {
    let mut out = Extreme { value: f64::NAN, frequency: None };
    for e in all {
        let earlier = e.value == out.value && out.frequency.is_none();
        if out.value.is_nan() || better(e.value, out.value) || earlier {
            out = *e;
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{delayed_ratio, part, ratio};
    use super::*;

    fn close(a: f64, b: f64, tolerance: f64) -> bool {
        (a - b).abs() <= tolerance * b.abs()
    }

    /// Formulas of the standard second-order system (K. Ogata, Modern Control Engineering, from memory).
    #[test]
    fn figures_of_a_second_order_system() {
        let zeta = 0.1f64;
        let r = Response::continuous(ratio(&[25], &[25, 1, 1]));
        let peak = r.largest().expect("exact");
        assert!(close(peak.value, 1.0 / (2.0 * zeta * (1.0 - zeta * zeta).sqrt()), 1e-15));
        assert!(close(peak.frequency.expect("finite"), 5.0 * (1.0 - 2.0 * zeta * zeta).sqrt(), 1e-15));
        let band = r.bandwidth(&RBig::ONE).expect("exact").expect("falls");
        let z = 1.0 - 2.0 * zeta * zeta;
        assert!(close(band, 5.0 * (z + (z * z + 1.0).sqrt()).sqrt(), 1e-15));
        // The same behind a dead time, magnitudes do not change.
        let late = Response::continuous(delayed_ratio(&[25], &[25, 1, 1], part(1, 3)));
        assert_eq!(late.largest().expect("exact"), peak);
        assert_eq!(r.over(10.0, 20.0, true).expect("exact").frequency, Some(10.0));
        assert_eq!(r.over(1.0, 10.0, true).expect("exact"), peak);
    }

    /// The peak of a resonance with a damping ratio of 1e-6, met where any grid would have to be finer than 1e-6.
    #[test]
    fn a_narrow_resonance_is_met() {
        // s² + 2e-6 s + 1, all times 500000
        let peak = Response::continuous(ratio(&[500_000], &[500_000, 1, 500_000])).largest().expect("exact");
        assert!(close(peak.value, 500_000.0, 1e-11), "{peak:?}");
    }

    /// The same figures by the exact polynomials and by the verified searches.
    #[test]
    fn both_ways_agree() {
        let exact = Response::continuous(ratio(&[4, 8, 4], &[0, 0, 0, 400, 40, 1]));
        let numeric = Response { exact: None, ..exact.clone() };
        let (a, b) = (exact.unit_places().expect("few"), numeric.unit_places().expect("few"));
        assert_eq!(a.len(), b.len());
        for (x, y) in a.iter().zip(&b) {
            assert!(close(x.frequency.expect("finite"), y.frequency.expect("finite"), 1e-12));
        }
        let (a, b) = (exact.least_difference().expect("exact"), numeric.least_difference().expect("few"));
        assert!(close(a.value, b.value, 1e-12), "{a:?} {b:?}");
        let (a, b) = (exact.negative_places(20).expect("exact").0, numeric.negative_places(20).expect("few").0);
        assert_eq!(a.len(), b.len());
        for (x, y) in a.iter().zip(&b) {
            assert!(close(x.value.re, y.value.re, 1e-10), "{a:?} {b:?}");
        }
    }

    /// An integrator behind a hold, L = 1/(2 (z - 1)): -1/4 at z = -1 (closed form).
    #[test]
    fn a_sampled_response_ends_at_half_the_rate() {
        let r = Response::sampled(&ratio(&[1], &[-2, 2]), 1.0).expect("no dead time");
        let (places, _) = r.negative_places(20).expect("exact");
        assert_eq!(places.len(), 1);
        assert_eq!((places[0].frequency, places[0].value.re), (Some(PI), -0.25));
        let least = r.least_difference().expect("exact");
        assert_eq!((least.value, least.frequency), (0.75, Some(PI)));
        let unit = r.unit_places().expect("exact");
        assert!(close(unit[0].frequency.expect("finite"), 2.0 * (0.25f64).asin(), 1e-15));
    }
}
