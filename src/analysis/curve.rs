//! Quasi-polynomials on the imaginary axis in double precision, with bounds on values, slopes and curvatures over
//! intervals and on rounding: what the verified searches need where dead times keep a figure from being a root of a
//! polynomial.

use super::quasi::{Quasi, Ratio};
use super::search::{Jet, Smooth};
use crate::algebra::{IBig, RBig, dense};
use dashu_base::BitTest;
use num_complex::Complex64;

/// Values and their bounds are made of this many derivatives.
const ORDERS: usize = 3;

/// A quasi-polynomial f as a function of ω, f(jω)/2^scale.
#[derive(Clone, Debug)]
pub(crate) struct Curve {
    terms: Vec<Term>,
}

#[derive(Clone, Debug)]
struct Term {
    delay: f64,
    /// Coefficients of the powers of s.
    p: Vec<f64>,
}

/// f, df/dω and d²f/dω² at a point, and a bound on the rounding error of f.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Point {
    /// The derivatives 0, 1, 2.
    pub(crate) d: [Complex64; ORDERS],
    /// Rounding error of the value.
    pub(crate) noise: f64,
}

impl Curve {
    /// A numerator and a denominator with one scale in common: coefficients may be far beyond the range of doubles.
    pub(crate) fn pair(ratio: &Ratio) -> (Self, Self) {
        let all = || ratio.num.terms.iter().chain(&ratio.den.terms).flat_map(|t| &t.1);
        let bits = all().map(dense::bits).max().unwrap_or(0);
        (Self::scaled(&ratio.num, bits), Self::scaled(&ratio.den, bits))
    }

    /// One quasi-polynomial in a scale of its own.
    pub(crate) fn new(q: &Quasi) -> Self {
        let bits = q.terms.iter().flat_map(|t| &t.1).map(dense::bits).max().unwrap_or(0);
        Self::scaled(q, bits)
    }

    fn scaled(q: &Quasi, bits: usize) -> Self {
        let number = |c: &IBig| {
            let drop = c.bit_len().saturating_sub(128);
            let value = RBig::from(c >> drop).to_f64().value();
            libm::ldexp(value, (drop as i64 - bits as i64).max(-5000) as i32)
        };
        let term =
            |(delay, p): &(RBig, Vec<IBig>)| Term { delay: delay.to_f64().value(), p: p.iter().map(number).collect() };
        Self { terms: q.terms.iter().map(term).collect() }
    }

    /// Value, derivatives and rounding at ω.
    pub(crate) fn at(&self, w: f64) -> Point {
        let mut d = [Complex64::ZERO; ORDERS];
        let mut noise = 0.0;
        for term in &self.terms {
            let (mut p, mut size) = ([Complex64::ZERO; ORDERS], 0.0);
            let s = Complex64::new(0.0, w);
            for &c in term.p.iter().rev() {
                // Taylor coefficients in s, Horner's rule.
                p[2] = p[2] * s + p[1];
                p[1] = p[1] * s + p[0];
                p[0] = p[0] * s + c;
                size = size * w + c.abs();
            }
            let turn = Complex64::new(libm::cos(term.delay * w), -libm::sin(term.delay * w));
            let j = Complex64::I;
            let (p0, p1, p2) = (p[0], p[1] * j, -p[2] * 2.0);
            let t = -j * term.delay;
            d[0] += p0 * turn;
            d[1] += (p1 + t * p0) * turn;
            d[2] += (p2 + 2.0 * t * p1 + t * t * p0) * turn;
            noise += size * (2.0 * term.p.len() as f64 + 4.0 + term.delay * w);
        }
        Point { d, noise: noise * f64::EPSILON }
    }

    /// Bounds on the magnitudes of the derivatives 0, 1, 2 for all frequencies up to ω.
    pub(crate) fn bounds(&self, w: f64) -> [f64; ORDERS] {
        let mut out = [0.0; ORDERS];
        for term in &self.terms {
            let mut p = [0.0; ORDERS];
            for &c in term.p.iter().rev() {
                p[2] = p[2] * w + p[1];
                p[1] = p[1] * w + p[0];
                p[0] = p[0] * w + c.abs();
            }
            let t = term.delay;
            out[0] += p[0];
            out[1] += p[1] + t * p[0];
            out[2] += 2.0 * p[2] + 2.0 * t * p[1] + t * t * p[0];
        }
        out
    }

    /// The highest power.
    pub(crate) fn degree(&self) -> usize {
        self.terms.iter().map(|t| t.p.len().saturating_sub(1)).max().unwrap_or(0)
    }

    /// The coefficients of the highest power with their dead times.
    pub(crate) fn leads(&self) -> Vec<(f64, f64)> {
        let n = self.degree();
        self.terms.iter().filter_map(|t| t.p.get(n).map(|&c| (t.delay, c))).filter(|t| t.1 != 0.0).collect()
    }

    /// A frequency from which on the terms of the highest power outweigh all others `by` so many times, the terms of
    /// that power without dead time counted against those with.
    pub(crate) fn dominated_from(&self, by: f64) -> Option<f64> {
        let n = self.degree();
        let leads = self.leads();
        let first = leads.first().map_or(0.0, |l| l.1.abs());
        let margin = first - leads.iter().skip(1).map(|l| l.1.abs()).sum::<f64>();
        if margin <= 0.0 {
            return None;
        }
        // Each lower power gets an equal share of the margin, so that the bound is explicit.
        let mut w: f64 = 0.0;
        let count = self.terms.iter().flat_map(|t| t.p.iter().take(n)).filter(|c| **c != 0.0).count().max(1) as f64;
        for term in &self.terms {
            for (k, &c) in term.p.iter().enumerate().take(n).filter(|t| *t.1 != 0.0) {
                w = w.max(libm::pow(c.abs() * count * by / margin, 1.0 / (n - k) as f64));
            }
        }
        Some(w)
    }

    /// A frequency up to which the terms of the lowest power outweigh all others `by` so many times; the dead times'
    /// own variation included.
    pub(crate) fn dominated_to(&self, by: f64) -> f64 {
        let mut w = f64::INFINITY;
        for term in &self.terms {
            if term.delay > 0.0 {
                w = w.min(1.0 / (by * term.delay));
            }
            let Some(low) = term.p.iter().position(|&c| c != 0.0) else { continue };
            for (k, &c) in term.p.iter().enumerate().skip(low + 1).filter(|t| *t.1 != 0.0) {
                let ratio = term.p[low].abs() / (c.abs() * by * term.p.len() as f64);
                w = w.min(libm::pow(ratio, 1.0 / (k - low) as f64));
            }
        }
        w
    }
}

/// The part of f·conj(g) that is asked for, as a function of ω: its zeros are crossings of an axis.
pub(crate) struct Part<'c> {
    /// f
    pub(crate) f: &'c Curve,
    /// g
    pub(crate) g: &'c Curve,
}

/// Im(f·conj(g)).
impl Smooth for Part<'_> {
    fn jet(&self, x: f64) -> Jet {
        let (f, g) = (self.f.at(x), self.g.at(x));
        let value = (f.d[0] * g.d[0].conj()).im;
        let slope = (f.d[1] * g.d[0].conj() + f.d[0] * g.d[1].conj()).im;
        let noise = f.noise * g.d[0].norm() + g.noise * f.d[0].norm() + f.noise * g.noise;
        Jet { value, slope, noise: 2.0 * noise }
    }

    fn curvature(&self, _low: f64, high: f64) -> f64 {
        let (f, g) = (self.f.bounds(high), self.g.bounds(high));
        f[2] * g[0] + 2.0 * f[1] * g[1] + f[0] * g[2]
    }
}

/// factor·abs(f)² - abs(g)²: its zeros are where abs(f/g)² is 1/factor.
pub(crate) struct Level<'c> {
    /// f
    pub(crate) f: &'c Curve,
    /// g
    pub(crate) g: &'c Curve,
    /// factor
    pub(crate) factor: f64,
}

fn square(p: &Point) -> (f64, f64, f64) {
    let value = p.d[0].norm_sqr();
    (value, 2.0 * (p.d[1] * p.d[0].conj()).re, 2.0 * p.noise * p.d[0].norm() + p.noise * p.noise)
}

impl Smooth for Level<'_> {
    fn jet(&self, x: f64) -> Jet {
        let ((a, da, ea), (b, db, eb)) = (square(&self.f.at(x)), square(&self.g.at(x)));
        Jet { value: self.factor * a - b, slope: self.factor * da - db, noise: 2.0 * (self.factor * ea + eb) }
    }

    fn curvature(&self, _low: f64, high: f64) -> f64 {
        let (f, g) = (self.f.bounds(high), self.g.bounds(high));
        let second = |d: [f64; 3]| 2.0 * (d[0] * d[2] + d[1] * d[1]);
        self.factor * second(f) + second(g)
    }
}

/// abs(f/g)².
pub(crate) struct Magnitude<'c> {
    /// f
    pub(crate) f: &'c Curve,
    /// g
    pub(crate) g: &'c Curve,
}

impl Smooth for Magnitude<'_> {
    fn jet(&self, x: f64) -> Jet {
        let ((a, da, ea), (b, db, eb)) = (square(&self.f.at(x)), square(&self.g.at(x)));
        let value = a / b;
        Jet { value, slope: (da - value * db) / b, noise: 2.0 * (ea + value * eb) / b }
    }

    fn curvature(&self, low: f64, high: f64) -> f64 {
        // f = a/b: f'' = (a'' - 2 f' b' - f b'')/b, each taken at its worst over the interval.
        let (m, r) = (f64::midpoint(low, high), (high - low) / 2.0);
        let (bf, bg) = (self.f.bounds(high), self.g.bounds(high));
        let over = |c: &Curve, bound: &[f64; 3]| {
            let p = c.at(m);
            let (v, s) = (p.d[0].norm(), p.d[1].norm());
            let reach = s * r + bound[2] * r * r / 2.0 + p.noise;
            (v - reach, (v + reach).min(bound[0]), (s + bound[2] * r).min(bound[1]))
        };
        let ((_, f0, f1), (g_least, g0, g1)) = (over(self.f, &bf), over(self.g, &bg));
        if g_least <= 0.0 {
            return f64::INFINITY;
        }
        let b = g_least * g_least;
        let value = f0 * f0 / b;
        let slope = (2.0 * f0 * f1 + value * 2.0 * g0 * g1) / b;
        let second = |v: f64, s: f64, c: f64| 2.0 * (v * c + s * s);
        (second(f0, f1, bf[2]) + 2.0 * slope * 2.0 * g0 * g1 + value * second(g0, g1, bg[2])) / b
    }

    fn range(&self, low: f64, high: f64) -> Option<(f64, f64)> {
        let (m, r) = (f64::midpoint(low, high), (high - low) / 2.0);
        let over = |c: &Curve| {
            let (p, bound) = (c.at(m), c.bounds(high));
            let reach = p.d[1].norm() * r + bound[2] * r * r / 2.0 + p.noise;
            ((p.d[0].norm() - reach).max(0.0), p.d[0].norm() + reach)
        };
        let ((f_least, f_most), (g_least, g_most)) = (over(self.f), over(self.g));
        let most = if g_least > 0.0 { f_most / g_least } else { f64::INFINITY };
        Some(((f_least / g_most) * (f_least / g_most), most * most))
    }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{delayed_ratio, part, poly};
    use super::super::search::{From, maximum, zeros};
    use super::*;

    /// K·exp(-T·s)/s crosses the negative axis at ω = π/(2 T), and then after each turn.
    #[test]
    fn crossings_of_an_integrator_behind_a_dead_time() {
        let (n, d) = Curve::pair(&delayed_ratio(&[1], &[0, 2], part(1, 1)));
        let found = zeros(&Part { f: &n, g: &d }, 1e-6, 20.0, From::Low, 3).expect("few");
        let pi = std::f64::consts::PI;
        for (x, k) in found.iter().zip([0.5, 1.5, 2.5]) {
            assert!((x - k * pi).abs() < 1e-12, "{found:?}");
        }
        let unit = zeros(&Level { f: &n, g: &d, factor: 1.0 }, 1e-6, 20.0, From::Low, 9).expect("few");
        assert!(unit.len() == 1 && (unit[0] - 0.5).abs() < 1e-14);
    }

    /// The resonant peak of a second-order system, 1/(2 ζ sqrt(1 - ζ²)) at ω_n·sqrt(1 - 2 ζ²), with ζ = 1/10.
    #[test]
    fn a_resonant_peak() {
        let (n, d) = Curve::pair(&delayed_ratio(&[5], &[5, 1, 5], part(1, 1)));
        let (x, y) = maximum(&Magnitude { f: &n, g: &d }, 1e-3, 100.0, 0.0).expect("few").expect("some");
        assert!((x - libm::sqrt(0.98)).abs() < 1e-9 && (libm::sqrt(y) - 1.0 / (0.2 * libm::sqrt(0.99))).abs() < 1e-12);
    }

    #[test]
    fn derivatives_and_bounds_hold() {
        let q = Quasi::from_terms(vec![(part(0, 1), poly(&[1, -2, 3])), (part(1, 2), poly(&[4, 5]))]);
        let c = Curve::new(&q);
        let h = 1e-5;
        let (a, b, m) = (c.at(1.3 - h), c.at(1.3 + h), c.at(1.3));
        assert!(((b.d[0] - a.d[0]) / (2.0 * h) - m.d[1]).norm() < 1e-9);
        assert!(((b.d[1] - a.d[1]) / (2.0 * h) - m.d[2]).norm() < 1e-9);
        let bounds = c.bounds(1.3);
        assert!((0..3).all(|k| m.d[k].norm() <= bounds[k]));
        assert_eq!(c.leads().len(), 1);
    }
}
