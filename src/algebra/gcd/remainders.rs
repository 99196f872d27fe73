//! Divisors in several variables by primitive remainder sequences: sure, slow where degrees are high.

use crate::algebra::{Poly, Var};

/// The primitive divisor of two primitive polynomials in the same variables, `bounds` being upper bounds of its
/// degrees.
pub(super) fn gcd(a: &Poly, b: &Poly, bounds: &[(Var, u64)]) -> Poly {
    let Some(v) = bounds.iter().map(|b| b.0).min_by_key(|&v| (a.degree(v).min(b.degree(v)), v)) else {
        return Poly::one();
    };
    let (ca, cb) = (content(a, v), content(b, v));
    let common = ca.gcd(&cb);
    let (mut a, mut b) = (a.div_exact(&ca).unwrap_or_default(), b.div_exact(&cb).unwrap_or_default());
    if a.degree(v) < b.degree(v) {
        std::mem::swap(&mut a, &mut b);
    }
    while !b.is_zero() {
        if b.degree(v) == 0 {
            return common.primitive();
        }
        let rest = remainder(&a, &b, v);
        a = b;
        b = if rest.is_zero() { rest } else { rest.div_exact(&content(&rest, v)).unwrap_or_default() };
    }
    a.mul(&common).primitive()
}

/// Greatest common divisor of the coefficients in one variable.
pub(crate) fn content(p: &Poly, v: Var) -> Poly {
    super::of_coefficients(p.powers(v).into_iter().map(|(_, c)| c).collect())
}

/// A multiple of the remainder of a by b in one variable that needs no fractions.
fn remainder(a: &Poly, b: &Poly, v: Var) -> Poly {
    let (lead, degree) = (b.leading(v), b.degree(v));
    let mut rest = a.clone();
    while !rest.is_zero() && rest.degree(v) >= degree {
        let top = rest.leading(v);
        let g = top.gcd(&lead);
        let (x, y) = (lead.div_exact(&g).unwrap_or_default(), top.div_exact(&g).unwrap_or_default());
        let shift = Poly::var(v).pow(rest.degree(v) - degree);
        rest = rest.mul(&x).sub(&b.mul(&y).mul(&shift));
    }
    rest
}
