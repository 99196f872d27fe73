//! The numbers of a fraction of polynomials: decimal coefficients, poles, zeros, the value at rest, and stability. All is
//! found from the exact polynomials; decimals are made at the very end, each correctly rounded.

use super::roots::{self, RootOf};
use super::{IBig, Poly, RBig, UBig, Var, stability};
use dashu_base::Abs;

/// The range in which coefficients are told as they are; doubles end at 1.8e308.
const LARGEST: f64 = 1e290;

/// The nearest double.
pub fn to_f64(value: &RBig) -> f64 {
    value.to_f64().value()
}

/// The shortest decimal that reads back as the nearest double.
pub fn text(value: &RBig) -> String {
    to_f64(value).to_string()
}

/// Coefficients in decimals from the highest power down: of the numerator, and of the denominator.
///
/// Where one would not fit the range of doubles, or where the numbers themselves mean nothing (`scaled`), all are divided
/// by the denominator's first.
pub fn coefficients(above: &[RBig], below: &[RBig], scaled: bool) -> (Vec<f64>, Vec<f64>) {
    let large = |c: &RBig| *c != RBig::ZERO && !(LARGEST.recip()..LARGEST).contains(&to_f64(&c.clone().abs()));
    let lead = below.first().filter(|_| scaled || above.iter().chain(below).any(large));
    let told = |list: &[RBig]| {
        list.iter().map(|c| lead.map_or_else(|| to_f64(c), |lead| to_f64(&(c / lead)))).collect::<Vec<_>>()
    };
    (if above.is_empty() { vec![0.0] } else { told(above) }, told(below))
}

/// The roots of a polynomial in the main variable alone: none for the polynomial 0, `None` where another variable occurs
/// or the roots can't be told in doubles.
pub fn roots_of(p: &Poly) -> Option<Vec<RootOf>> {
    if p.is_zero() {
        return Some(Vec::new());
    }
    roots::roots(&p.to_dense(Var::S)?).ok()
}

/// The largest real part of some roots, or with `modulus` their largest modulus; `None` where there is none.
pub fn edge(roots: &[RootOf], modulus: bool) -> Option<f64> {
    roots.iter().map(|r| if modulus { libm::hypot(r.re, r.im) } else { r.re }).reduce(f64::max)
}

/// Whether every root lies strictly left of the imaginary axis, or with `circle` strictly inside the unit circle; exact.
pub fn is_stable(p: &Poly, circle: bool) -> Option<bool> {
    let coefficients = p.to_dense(Var::S)?;
    Some(if circle {
        let counts = stability::unit_circle(&coefficients);
        counts.outside == 0 && counts.on == 0
    } else {
        let counts = stability::half_plane(&coefficients);
        counts.right == 0 && counts.axis == 0
    })
}

/// Whether some root lies strictly right of the imaginary axis, or with `circle` strictly outside the unit circle; exact.
pub fn has_outside(p: &Poly, circle: bool) -> bool {
    p.to_dense(Var::S).is_some_and(|coefficients| {
        if circle {
            stability::unit_circle(&coefficients).outside > 0
        } else {
            stability::half_plane(&coefficients).right > 0
        }
    })
}

/// The value of a fraction at z = 1, `None` for a pole there.
pub fn at_one(above: &Poly, below: &Poly) -> Option<RBig> {
    let at_one = |p: &Poly| RBig::from(p.substitute(Var::S, &RBig::ONE).0.as_constant().unwrap_or(IBig::ZERO));
    let d = at_one(below);
    (d != RBig::ZERO).then(|| at_one(above) / d)
}

/// The limit of a fraction as s → 0, `None` for a pole there. Variables other than s stand for exp(-T·s), with the T that
/// `delay` gives.
///
/// Both polynomials may vanish at s = 0, as those of (1 - exp(-s))/s do: then the first powers that remain of their
/// power series decide.
pub fn at_zero(above: &Poly, below: &Poly, delay: &dyn Fn(Var) -> RBig) -> Option<RBig> {
    // A sum of m terms c·s^k·exp(-T·s) that is not 0 has one of the first m + max k powers in its series.
    let first = |p: &Poly| {
        let most = p.len() as u32 + p.degree(Var::S);
        (0..=most).map(|k| (k, taylor(p, k, delay))).find(|(_, c)| *c != RBig::ZERO)
    };
    let (low_below, d) = first(below)?;
    match first(above) {
        None => Some(RBig::ZERO),
        Some((low_above, _)) if low_above > low_below => Some(RBig::ZERO),
        Some((low_above, _)) if low_above < low_below => None,
        Some((_, n)) => Some(n / d),
    }
}

/// The coefficient of s^k in the power series of a sum of terms c·s^j·exp(-T·s) at s = 0.
fn taylor(p: &Poly, k: u32, delay: &dyn Fn(Var) -> RBig) -> RBig {
    let mut sum = RBig::ZERO;
    for (powers, c) in p.terms() {
        let (mut power, mut dead_time) = (0, RBig::ZERO);
        for (var, e) in powers {
            if var == Var::S {
                power = e;
            } else {
                dead_time += delay(var) * RBig::from(e);
            }
        }
        let Some(order) = k.checked_sub(power) else { continue };
        if order > 0 && dead_time == RBig::ZERO {
            continue;
        }
        let factorial = (1..=order).fold(UBig::ONE, |f, i| f * UBig::from(i));
        let part = RBig::from(c) * dead_time.pow(order as isize) / RBig::from(factorial);
        sum += if order % 2 == 1 { -part } else { part };
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    fn poly(coefficients: &[i64]) -> Poly {
        Poly::from_dense(Var::S, &coefficients.iter().map(|&c| IBig::from(c)).collect::<Vec<_>>())
    }

    /// (1 - exp(-3 s))/s has the limit 3, and (1 - exp(-3 s))/s² none.
    #[test]
    fn limits_at_zero_see_through_dead_time() {
        let gate = Poly::one().sub(&Poly::var(Var(1)));
        let three = |_| RBig::from(3);
        assert_eq!(at_zero(&gate, &poly(&[0, 1]), &three), Some(RBig::from(3)));
        assert_eq!(at_zero(&gate, &poly(&[0, 0, 1]), &three), None);
        assert_eq!(at_zero(&poly(&[0, 1]), &poly(&[2, 1]), &three), Some(RBig::ZERO));
    }

    #[test]
    fn coefficients_beyond_doubles_are_scaled() {
        let huge = RBig::from(IBig::from(10).pow(400));
        let (n, d) = coefficients(&[huge.clone()], &[huge.clone() * RBig::from(2), huge], false);
        assert_eq!((n, d), (vec![0.5], vec![1.0, 0.5]));
        let third = RBig::from_parts(1.into(), 3u8.into());
        assert_eq!(coefficients(&[third], &[RBig::ONE], false).0, vec![1.0 / 3.0]);
    }

    /// s² - 0.25 is unstable in s and stable in z.
    #[test]
    fn stability_by_region() {
        let p = poly(&[-1, 0, 4]);
        assert_eq!((is_stable(&p, false), is_stable(&p, true)), (Some(false), Some(true)));
        assert_eq!((has_outside(&p, false), has_outside(&p, true)), (true, false));
        assert_eq!(edge(&roots_of(&p).unwrap_or_default(), false), Some(0.5));
    }
}
