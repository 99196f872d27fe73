//! Polynomials in one variable with whole coefficients, as slices: the lowest power first, no zero at the end.
//!
//! The empty slice is the polynomial 0. These are the working form of [`super::roots`] and [`super::stability`];
//! everywhere else polynomials are [`super::Poly`].

pub(crate) use super::poly::dense::{divide as divide_exactly, multiply as product};
use dashu_base::{Abs, Gcd, Sign, UnsignedAbs};
use dashu_int::{IBig, UBig};

/// Without zeros at the end.
pub fn trimmed(a: &[IBig]) -> &[IBig] {
    &a[..a.iter().rposition(|c| !c.is_zero()).map_or(0, |k| k + 1)]
}

/// Drops zeros at the end.
pub fn trim(mut a: Vec<IBig>) -> Vec<IBig> {
    a.truncate(trimmed(&a).len());
    a
}

/// Greatest common divisor of the coefficients, not negative; 0 for 0.
pub fn content(a: &[IBig]) -> UBig {
    let mut g = UBig::ZERO;
    // The shortest first: the running divisor is then short from the start.
    let mut order: Vec<&IBig> = a.iter().filter(|c| !c.is_zero()).collect();
    order.sort_by_key(|c| bits(c));
    for c in order {
        g = if g.is_zero() { c.unsigned_abs() } else { g.gcd(&c.unsigned_abs()) };
        if g.is_one() {
            break;
        }
    }
    g
}

/// How many bits the magnitude of a number has.
pub fn bits(c: &IBig) -> usize {
    use dashu_base::BitTest;
    c.bit_len()
}

/// Divided by its content, the leading coefficient positive.
pub fn primitive(a: &[IBig]) -> Vec<IBig> {
    let g = IBig::from(content(a));
    let negative = a.last().is_some_and(|c| c.sign() == Sign::Negative);
    let g = if negative { -g } else { g };
    if g == IBig::ONE { a.to_vec() } else { a.iter().map(|c| c / &g).collect() }
}

/// Derivative.
pub fn derivative(a: &[IBig]) -> Vec<IBig> {
    a.iter().enumerate().skip(1).map(|(k, c)| c * IBig::from(k)).collect()
}

/// The coefficients in reverse, zeros at the new end dropped: z^n·a(1/z).
pub fn reversed(a: &[IBig]) -> Vec<IBig> {
    trim(a.iter().rev().cloned().collect())
}

/// a(x + shift), by repeated synthetic division; `shift` is a small number, so that only sums grow.
pub fn shifted(a: &[IBig], shift: i64) -> Vec<IBig> {
    let (mut out, n) = (a.to_vec(), a.len());
    for first in 0..n.saturating_sub(1) {
        for k in (first..n - 1).rev() {
            let carried = &out[k + 1] * shift;
            out[k] += carried;
        }
    }
    out
}

/// Greatest common divisor, contents included, its leading coefficient positive.
pub fn gcd(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    if a.is_empty() || b.is_empty() {
        let c = if a.is_empty() { b } else { a };
        let negative = c.last().is_some_and(|c| c.sign() == Sign::Negative);
        return c.iter().map(|c| if negative { -c } else { c.clone() }).collect();
    }
    let common = IBig::from(content(a).gcd(&content(b)));
    let primitive_part = super::gcd::dense::gcd(&primitive(a), &primitive(b));
    primitive_part.into_iter().map(|c| c * &common).collect()
}

/// Square-free factors with their multiplicities, by multiplicity: a = content · ∏ factor^multiplicity; all primitive,
/// pairwise coprime, of degree 1 at least.
///
/// Source: D. Y. Y. Yun, "On Square-free Decomposition Algorithms", SYMSAC 1976.
pub fn square_free(a: &[IBig]) -> Vec<(Vec<IBig>, u32)> {
    let mut out = Vec::new();
    if a.len() < 2 {
        return out;
    }
    let a = primitive(a);
    let d = derivative(&a);
    let g = gcd(&a, &d);
    let quotient = |a: &[IBig], b: &[IBig]| divide_exactly(a, b).unwrap_or_default();
    let (mut b, mut c) = (quotient(&a, &g), quotient(&d, &g));
    let mut multiplicity = 1;
    while b.len() > 1 {
        let db = derivative(&b);
        let len = c.len().max(db.len());
        let at = |v: &[IBig], k: usize| v.get(k).cloned().unwrap_or_default();
        let rest = trim((0..len).map(|k| at(&c, k) - at(&db, k)).collect());
        let factor = primitive(&gcd(&b, &rest));
        b = quotient(&b, &factor);
        c = quotient(&rest, &factor);
        if factor.len() > 1 {
            out.push((factor, multiplicity));
        }
        multiplicity += 1;
    }
    out
}

/// a = ±content · even part in x² and odd part: a(x) = even(x²) + x·odd(x²).
pub fn even_and_odd(a: &[IBig]) -> (Vec<IBig>, Vec<IBig>) {
    let every = |first| trim(a.iter().skip(first).step_by(2).cloned().collect());
    (every(0), every(1))
}

/// a(x²).
pub fn of_square(a: &[IBig]) -> Vec<IBig> {
    let mut out = vec![IBig::ZERO; (2 * a.len()).saturating_sub(1)];
    for (k, c) in a.iter().enumerate() {
        out[2 * k] = c.clone();
    }
    out
}

/// The sign of a(numerator/denominator) for a positive denominator.
pub fn sign_at(a: &[IBig], numerator: &IBig, denominator: &IBig) -> i32 {
    let (mut value, mut power) = (IBig::ZERO, IBig::ONE);
    for c in a.iter().rev() {
        value = value * numerator + c * &power;
        power *= denominator;
    }
    sign(&value)
}

/// The sign of a number: -1, 0 or 1.
pub fn sign(c: &IBig) -> i32 {
    if c.is_zero() {
        0
    } else if c.sign() == Sign::Negative {
        -1
    } else {
        1
    }
}

/// The largest number of bits among the coefficients.
pub fn height_bits(a: &[IBig]) -> usize {
    a.iter().map(|c| bits(&c.clone().abs())).max().unwrap_or(0)
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;

    /// Coefficients from small numbers, lowest power first.
    pub(in crate::algebra) fn poly(a: &[i64]) -> Vec<IBig> {
        a.iter().map(|&c| IBig::from(c)).collect()
    }

    fn power(a: &[IBig], k: usize) -> Vec<IBig> {
        (0..k).fold(poly(&[1]), |p, _| product(&p, a))
    }

    #[test]
    fn gcd_of_products() {
        let (f, g, h) = (poly(&[-7, 0, 3, 10]), poly(&[1, 2, 3, 4, 5]), poly(&[123_456_789, -5, 1]));
        let common = power(&h, 9);
        assert_eq!(gcd(&product(&f, &common), &product(&g, &common)), common);
        assert_eq!(gcd(&poly(&[6, 12]), &poly(&[-4, -8])), poly(&[2, 4]));
        assert_eq!(gcd(&poly(&[6, 12]), &poly(&[4, 0, 8])), poly(&[2]));
        assert_eq!(gcd(&[], &poly(&[1, -3])), poly(&[-1, 3]));
    }

    #[test]
    fn square_free_factors_rebuild_the_polynomial() {
        let (f, g) = (poly(&[2, 1]), poly(&[1, 0, 1]));
        let p = product(&product(&power(&f, 10), &power(&g, 3)), &poly(&[5, 1]));
        assert_eq!(square_free(&p), vec![(poly(&[5, 1]), 1), (g, 3), (f, 10)]);
        assert_eq!(square_free(&poly(&[0, 0, 7])), vec![(poly(&[0, 1]), 2)]);
        assert!(square_free(&poly(&[4])).is_empty());
    }

    #[test]
    fn division_and_shift() {
        let (f, g) = (poly(&[1, 2, 3]), poly(&[-1, 4]));
        assert_eq!(divide_exactly(&product(&f, &g), &g), Some(f.clone()));
        assert_eq!(divide_exactly(&f, &g), None);
        // (x + 2)^3 = x^3 + 6 x^2 + 12 x + 8
        assert_eq!(shifted(&poly(&[0, 0, 0, 1]), 2), poly(&[8, 12, 6, 1]));
        assert_eq!(sign_at(&g, &IBig::from(1), &IBig::from(4)), 0);
    }
}
