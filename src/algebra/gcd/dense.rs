//! Divisors in one variable: modulo primes, put together by Chinese remainders, certified by division.

use crate::algebra::poly::coefficients::Coefficient;
use crate::algebra::poly::dense::divide;
use crate::algebra::prime::Prime;
use crate::algebra::residues;
use dashu_base::{Gcd, Sign, UnsignedAbs};
use dashu_int::{IBig, UBig};

/// Divided by the content, the leading coefficient positive.
pub(crate) fn primitive(mut values: Vec<IBig>) -> Vec<IBig> {
    while values.last().is_some_and(Coefficient::is_zero) {
        values.pop();
    }
    let mut g = UBig::ZERO;
    for c in &values {
        g = if g == UBig::ZERO { c.clone().unsigned_abs() } else { g.gcd(c.clone().unsigned_abs()) };
        if g == UBig::ONE {
            break;
        }
    }
    let mut by = IBig::from(g);
    if values.last().is_some_and(|c| c.sign() == Sign::Negative) {
        by = -by;
    }
    if by != IBig::ONE && by != IBig::ZERO {
        for c in &mut values {
            *c = &*c / &by;
        }
    }
    values
}

/// The primitive divisor of two primitive polynomials that aren't 0, coefficients from the power 0 up.
pub(crate) fn gcd(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    let (Some(la), Some(lb)) = (a.last(), b.last()) else { return Vec::new() };
    let lead = IBig::from(la.clone().unsigned_abs().gcd(lb.clone().unsigned_abs()));
    let mut values: Vec<IBig> = Vec::new();
    let mut modulus = UBig::ONE;
    let mut tried: Vec<IBig> = Vec::new();
    for prime in Prime::all() {
        let modulo = |p: &[IBig]| p.iter().map(|c| prime.of_big(c)).collect::<Vec<_>>();
        let (x, y) = (modulo(a), modulo(b));
        if x.last() == Some(&0) || y.last() == Some(&0) {
            continue;
        }
        let mut g = residues::gcd(&prime, &x, &y);
        if g.len() == 1 {
            return vec![IBig::ONE];
        }
        // A prime that gives more than the least degree seen is unlucky; one that gives less shows the others were.
        if !values.is_empty() && g.len() > values.len() {
            continue;
        }
        if g.len() < values.len() {
            (values, modulus) = (Vec::new(), UBig::ONE);
        }
        let scale = prime.of_big(&lead);
        for c in &mut g {
            *c = prime.mul(*c, scale);
        }
        let changed = lift(&mut values, &mut modulus, &prime, &g);
        // Worth a division where the last prime changed nothing, or nothing needs more than one prime.
        if !changed || tried.is_empty() {
            let candidate = primitive(values.clone());
            if candidate != tried && divide(a, &candidate).is_some() && divide(b, &candidate).is_some() {
                return candidate;
            }
            tried = candidate;
        }
    }
    vec![IBig::ONE]
}

/// Chinese remainders, one prime at a time, residues symmetric around 0: whether any value changed.
pub(crate) fn lift(values: &mut Vec<IBig>, modulus: &mut UBig, prime: &Prime, residues: &[u64]) -> bool {
    let first = values.is_empty();
    values.resize(residues.len(), IBig::ZERO);
    let inverse = prime.inverse(prime.of(&*modulus % prime.p));
    let signed = IBig::from(modulus.clone());
    let mut changed = first;
    for (value, r) in values.iter_mut().zip(residues) {
        let step = prime.value(prime.mul(prime.sub(*r, prime.of_big(value)), inverse));
        if step != 0 {
            changed = true;
            // The step nearest to 0 keeps values symmetric.
            let step = if step > prime.p / 2 { IBig::from(step) - IBig::from(prime.p) } else { IBig::from(step) };
            *value += &signed * step;
        }
    }
    *modulus *= prime.p;
    changed
}
