//! Exact polynomials along the imaginary axis, in x = ω²: squares of magnitudes, real and imaginary parts, and their
//! positive roots to many more digits than a double holds. No frequency grid decides anything here.

use super::quasi::{difference, sum};
use crate::algebra::{IBig, RBig, UBig, dense, roots, stability};
use dashu_base::BitTest;

/// Binary digits of a root: enough that a resonance with a damping ratio of 1e-8 is still met to double precision.
const ROOT_BITS: usize = 96;

/// Binary digits to which roots are parted before they are refined.
const PARTED_BITS: usize = 12;

/// p(jω) = even(x) + jω·odd(x) with x = ω².
#[derive(Clone, Debug)]
pub(crate) struct OnAxis {
    /// Real part.
    pub(crate) even: Vec<IBig>,
    /// Imaginary part over ω.
    pub(crate) odd: Vec<IBig>,
}

impl OnAxis {
    /// The parts of a polynomial.
    pub(crate) fn new(p: &[IBig]) -> Self {
        let (even, odd) = dense::even_and_odd(p);
        let alternate =
            |v: Vec<IBig>| v.into_iter().enumerate().map(|(k, c)| if k % 2 == 1 { -c } else { c }).collect();
        Self { even: alternate(even), odd: alternate(odd) }
    }

    /// abs(p(jω))²
    pub(crate) fn square(&self) -> Vec<IBig> {
        let odd = dense::product(&self.odd, &self.odd);
        sum(&dense::product(&self.even, &self.even), &raised(odd))
    }

    /// p·conj(q) = real(x) + jω·imaginary(x), with this as p.
    pub(crate) fn times_conjugate(&self, q: &Self) -> (Vec<IBig>, Vec<IBig>) {
        let odd = dense::product(&self.odd, &q.odd);
        let real = sum(&dense::product(&self.even, &q.even), &raised(odd));
        let imaginary = difference(&dense::product(&self.odd, &q.even), &dense::product(&self.even, &q.odd));
        (real, imaginary)
    }
}

/// x·p(x)
fn raised(mut p: Vec<IBig>) -> Vec<IBig> {
    if !p.is_empty() {
        p.insert(0, IBig::ZERO);
    }
    p
}

/// m/2^k, a point at which polynomials are evaluated in whole numbers.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Dyadic {
    /// Numerator.
    pub(crate) m: IBig,
    /// Power of two below.
    pub(crate) k: usize,
}

impl Dyadic {
    /// The nearest double, 0 for what is below its range.
    pub(crate) fn to_f64(&self) -> f64 {
        quotient(&self.m, &(IBig::ONE << self.k))
    }

    /// Its root, as a double.
    pub(crate) fn root(&self) -> f64 {
        libm::sqrt(self.to_f64())
    }

    /// p at this point, times 2^(k·degree); `degree` is not below that of p.
    pub(crate) fn value(&self, p: &[IBig], degree: usize) -> IBig {
        let mut out = IBig::ZERO;
        for (i, c) in p.iter().enumerate().rev() {
            out = out * &self.m + (c << (self.k * (p.len() - 1 - i)));
        }
        if p.is_empty() { out } else { out << (self.k * (degree + 1 - p.len())) }
    }

    /// The sign of p at this point.
    fn sign(&self, p: &[IBig]) -> i32 {
        dense::sign(&self.value(p, p.len().saturating_sub(1)))
    }

    /// p/q at this point; infinite or not a number where q is 0.
    pub(crate) fn quotient(&self, p: &[IBig], q: &[IBig]) -> f64 {
        let degree = p.len().max(q.len()).saturating_sub(1);
        quotient(&self.value(p, degree), &self.value(q, degree))
    }

    /// The double with k binary places that is not negative.
    pub(crate) fn from_f64(x: f64) -> Self {
        let (m, e) = libm::frexp(x);
        let m = IBig::from((m * (1u64 << 53) as f64) as i64);
        let e = e - 53;
        if e >= 0 { Self { m: m << e as usize, k: 0 } } else { Self { m, k: (-e) as usize } }
    }
}

/// n/d as a double.
pub(crate) fn quotient(n: &IBig, d: &IBig) -> f64 {
    if d.is_zero() {
        return if n.is_zero() { f64::NAN } else { f64::from(dense::sign(n)) * f64::INFINITY };
    }
    // Leading digits are enough, and spare the reduction of long ratios.
    let keep = |x: &IBig| {
        let drop = x.bit_len().saturating_sub(160);
        (x >> drop, drop as i64)
    };
    let ((n, a), (d, b)) = (keep(n), keep(d));
    let value = RBig::from_parts_signed(n, d).to_f64().value();
    libm::ldexp(value, (a - b).clamp(-5000, 5000) as i32)
}

/// A positive root.
#[derive(Clone, Debug)]
pub(crate) struct AxisRoot {
    /// x = ω², to [`ROOT_BITS`] binary digits.
    pub(crate) x: Dyadic,
    /// How often it counts.
    pub(crate) multiplicity: u32,
}

/// The positive roots of a polynomial that is not 0, rising.
pub(crate) fn positive_roots(p: &[IBig]) -> Vec<AxisRoot> {
    let p = dense::trimmed(p);
    let Some(zeros) = p.iter().position(|c| !c.is_zero()) else { return Vec::new() };
    let p = dense::primitive(&p[zeros..]);
    let signs: Vec<i32> = p.iter().map(dense::sign).filter(|&s| s != 0).collect();
    // Descartes: without a change of sign there is no positive root.
    if signs.windows(2).all(|w| w[0] == w[1]) {
        return Vec::new();
    }
    from_certified(&p).unwrap_or_else(|| from_intervals(&p))
}

/// By the certified roots, of which one knows which are real: a change of sign about each of them starts its refinement.
/// `None` where roots lie too close together for that.
fn from_certified(p: &[IBig]) -> Option<Vec<AxisRoot>> {
    let found = roots::roots(p).ok()?;
    let simple = if found.iter().all(|r| r.multiplicity == 1) { p.to_vec() } else { square_free(p) };
    let mut out: Vec<AxisRoot> = Vec::new();
    for root in found.iter().filter(|r| r.im == 0.0 && r.re > 0.0) {
        let reach = root.radius.max(root.re * 4.0 * f64::EPSILON) * 2.0;
        if reach >= root.re {
            return None;
        }
        let (low, high) = (near(root.re - reach), near(root.re + reach));
        let sign = |x: &RBig| dyadic(x).sign(&simple);
        let apart = out.last().is_none_or(|last| last.x.to_f64() < root.re - 2.0 * reach);
        if !apart || sign(&low) * sign(&high) >= 0 {
            return None;
        }
        out.push(AxisRoot { x: refined(&simple, &low, &high), multiplicity: root.multiplicity });
    }
    Some(out)
}

/// By isolation of the real roots in exact arithmetic.
fn from_intervals(p: &[IBig]) -> Vec<AxisRoot> {
    let simple = square_free(p);
    let found = stability::real_roots(p, PARTED_BITS);
    let root = |r: stability::RealRoot| AxisRoot { x: refined(&simple, &r.low, &r.high), multiplicity: r.multiplicity };
    found.into_iter().filter(|r| r.high > RBig::ZERO).map(root).collect()
}

/// The polynomial with each of its roots once.
fn square_free(p: &[IBig]) -> Vec<IBig> {
    let common = dense::gcd(p, &dense::derivative(p));
    dense::divide_exactly(p, &common).unwrap_or_else(|| p.to_vec())
}

/// A dyadic number from a ratio whose denominator is a power of two.
fn dyadic(x: &RBig) -> Dyadic {
    Dyadic { m: x.numerator().clone(), k: x.denominator().trailing_zeros().unwrap_or(0) }
}

/// Narrows an interval with one simple root to [`ROOT_BITS`] digits: the secant points at a small part of the interval,
/// and where the signs at the ends of that part agree, it becomes the interval and the next part is smaller still.
///
/// Source: J. Abbott, "Quadratic interval refinement for real roots", ACM Communications in Computer Algebra 48 (2014).
fn refined(p: &[IBig], low: &RBig, high: &RBig) -> Dyadic {
    let (low, high) = (dyadic(low), dyadic(high));
    let k = low.k.max(high.k);
    let (mut a, mut b, mut k) = (low.m << (k - low.k), high.m << (k - high.k), k);
    if a == b {
        return Dyadic { m: a, k };
    }
    let degree = p.len() - 1;
    let (mut fa, mut fb) = (Dyadic { m: a.clone(), k }.value(p, degree), Dyadic { m: b.clone(), k }.value(p, degree));
    if dense::sign(&fb) == 0 {
        return Dyadic { m: b, k };
    }
    if dense::sign(&fa) == 0 {
        return Dyadic { m: a, k };
    }
    let mut parts = 2usize;
    // Each round either narrows the interval or halves the number of bits of the next part; the bound is generous.
    for _ in 0..4 * ROOT_BITS {
        let width = &b - &a;
        if width.bit_len() + ROOT_BITS <= a.bit_len() {
            break;
        }
        // Split into 2^parts pieces.
        (a, b, k) = (a << parts, b << parts, k + parts);
        let lift = parts * degree;
        (fa, fb) = (fa << lift, fb << lift);
        let piece = width;
        // Where the secant meets 0, in pieces.
        let count = IBig::ONE << parts;
        let place = (&fa * &count) / (&fa - &fb);
        let place = place.max(IBig::ZERO).min(&count - IBig::ONE);
        let left = &a + &place * &piece;
        let right = &left + &piece;
        let (fl, fr) =
            (Dyadic { m: left.clone(), k }.value(p, degree), Dyadic { m: right.clone(), k }.value(p, degree));
        let (sl, sr, sa) = (dense::sign(&fl), dense::sign(&fr), dense::sign(&fa));
        if sl == 0 && left != a {
            return Dyadic { m: left, k };
        }
        if sr == 0 && right != b {
            return Dyadic { m: right, k };
        }
        let inside_left = left == a || sl == sa;
        let inside_right = right == b || sr != sa;
        if inside_left && inside_right {
            if left != a {
                (a, fa) = (left, fl);
            }
            if right != b {
                (b, fb) = (right, fr);
            }
            parts = (parts * 2).min(ROOT_BITS);
        } else {
            // The root lies beside the piece: the piece's end is a new bound all the same.
            if inside_left {
                (a, fa) = (right, fr);
            } else {
                (b, fb) = (left, fl);
            }
            // And one halving, so that no round is lost.
            let middle = (&a + &b) >> 1;
            if middle != a && middle != b {
                let fm = Dyadic { m: middle.clone(), k }.value(p, degree);
                match dense::sign(&fm) {
                    0 => return Dyadic { m: middle, k },
                    s if s == dense::sign(&fa) => (a, fa) = (middle, fm),
                    _ => (b, fb) = (middle, fm),
                }
            }
            parts = (parts / 2).max(1);
        }
    }
    Dyadic { m: a + b, k: k + 1 }
}

/// Whether a polynomial has a positive root where x lies between the two numbers, ends included; exact.
pub(crate) fn has_root_between(p: &[IBig], low: &RBig, high: &RBig) -> bool {
    if p.len() < 2 {
        return p.is_empty();
    }
    let at_low = dense::sign_at(p, low.numerator(), &IBig::from(low.denominator().clone()));
    at_low == 0 || stability::real_count(p, Some(low), Some(high)) > 0
}

/// A ratio near a double.
pub(crate) fn near(x: f64) -> RBig {
    let d = Dyadic::from_f64(x.abs());
    let value = RBig::from_parts(d.m, UBig::ONE << d.k);
    if x < 0.0 { -value } else { value }
}

/// The sign of a polynomial at a dyadic number.
pub(crate) fn sign_at(p: &[IBig], x: &Dyadic) -> i32 {
    if p.is_empty() { 0 } else { x.sign(p) }
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::poly;
    use super::*;

    #[test]
    fn roots_are_refined_far_beyond_doubles() {
        // (x^2 - 2)(x - 3)^2(x + 5)
        let p =
            [poly(&[-2, 0, 1]), poly(&[9, -6, 1]), poly(&[5, 1])].iter().fold(poly(&[1]), |p, f| dense::product(&p, f));
        let found = positive_roots(&p);
        assert_eq!(found.iter().map(|r| r.multiplicity).collect::<Vec<_>>(), [1, 2]);
        assert_eq!(found[0].x.to_f64(), std::f64::consts::SQRT_2);
        assert_eq!(found[1].x.to_f64(), 3.0);
        let square = &found[0].x.m * &found[0].x.m - (IBig::from(2) << (2 * found[0].x.k));
        assert!(square.bit_len() + 80 < 2 * found[0].x.k, "{:?}", found[0].x);
        // Both ways to the roots agree.
        let other: Vec<f64> = from_intervals(&p).iter().map(|r| r.x.to_f64()).collect();
        assert_eq!(found.iter().map(|r| r.x.to_f64()).collect::<Vec<_>>(), other);
    }

    #[test]
    fn close_roots_over_wide_scales() {
        // (10^12 x - 1)(x - 10^12)(10^9 x - 10^9 - 1)(x - 1)
        let big = |e: usize| IBig::from(10).pow(e);
        let factors =
            [vec![-IBig::ONE, big(12)], vec![-big(12), IBig::ONE], vec![-big(9) - IBig::ONE, big(9)], poly(&[-1, 1])];
        let p = factors.iter().fold(poly(&[1]), |p, f| dense::product(&p, f));
        let found: Vec<f64> = positive_roots(&p).iter().map(|r| r.x.to_f64()).collect();
        assert_eq!(found, [1e-12, 1.0, 1.000_000_001, 1e12]);
    }

    #[test]
    fn parts_on_the_axis() {
        // p(jω) = (1 - ω²) + jω(2 - ω²) for 1 + 2 s + s² + s³
        let p = OnAxis::new(&poly(&[1, 2, 1, 1]));
        assert_eq!((p.even.clone(), p.odd.clone()), (poly(&[1, -1]), poly(&[2, -1])));
        assert_eq!(p.square(), poly(&[1, 2, -3, 1]));
        assert_eq!(Dyadic::from_f64(0.15625).to_f64(), 0.15625);
        assert_eq!(quotient(&IBig::from(1), &IBig::from(3)), 1.0 / 3.0);
    }
}
