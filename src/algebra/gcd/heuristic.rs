//! Divisors in a few variables by way of integers: with a large number for one variable the divisor's value is the
//! divisor of the values, and its digits to that base are the divisor (Char, Geddes and Gonnet, "GCDHEU: heuristic
//! polynomial GCD algorithm based on integer GCD computation", 1989). Certified by division.

use crate::algebra::{IBig, Poly, RBig, Var};
use dashu_base::UnsignedAbs;

/// Numbers tried before giving up: a wrong digit comes of a factor that the values have by chance.
const TRIES: usize = 4;

/// Values of more bits than this, over all variables, cost more than they save.
const MAX_BITS: u64 = 1 << 17;

/// The primitive divisor of two primitive polynomials in the same variables, or `None` where it didn't come out.
pub(super) fn gcd(a: &Poly, b: &Poly) -> Option<Poly> {
    // The last variable first: terms then stay in order.
    let v = a.variables().pop()?;
    let size = |p: &Poly| {
        let places = p.variables().iter().fold(1u64, |n, &v| n.saturating_mul(p.degree_of(v).saturating_add(1)));
        places.saturating_mul(p.bits() as u64 + 6)
    };
    if size(a).max(size(b)) > MAX_BITS {
        return None;
    }
    let most = a.values().iter().chain(b.values().iter()).map(UnsignedAbs::unsigned_abs).max()?;
    let mut base = IBig::from(most) * IBig::from(2) + IBig::from(29);
    for _ in 0..TRIES {
        let at = |p: &Poly| p.substitute(v, &RBig::from(base.clone())).0;
        let candidate = from_digits(at(a).gcd(&at(b)), v, &base).primitive();
        if a.div_exact(&candidate).is_some() && b.div_exact(&candidate).is_some() {
            return Some(candidate);
        }
        // Some number without a simple ratio to the last.
        base = base * IBig::from(73_794) / IBig::from(27_011) + IBig::ONE;
    }
    None
}

/// The polynomial in `v` whose value at `base` is given, all coefficients less than half the base.
fn from_digits(mut value: Poly, v: Var, base: &IBig) -> Poly {
    let mut digits = Vec::new();
    while !value.is_zero() {
        let digit = value.map_values(|c| {
            let r = c % base;
            let twice: IBig = &r * 2;
            if twice > *base {
                r - base
            } else if -twice > *base {
                r + base
            } else {
                r
            }
        });
        value = value.sub(&digit).div_number(base).unwrap_or_default();
        digits.push(digit);
    }
    Poly::from_coefficients(v, &digits)
}
