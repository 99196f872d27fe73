//! Polynomials in one variable modulo a prime: lists of residues from the power 0 up, without zeros on top.

use super::prime::Prime;

/// Takes zeros off the top.
pub(crate) fn trim(mut v: Vec<u64>) -> Vec<u64> {
    while v.last() == Some(&0) {
        v.pop();
    }
    v
}

/// With 1 as leading coefficient; 0 stays 0.
pub(crate) fn monic(prime: &Prime, mut v: Vec<u64>) -> Vec<u64> {
    if let Some(&top) = v.last().filter(|&&top| top != prime.one) {
        let inverse = prime.inverse(top);
        for c in &mut v {
            *c = prime.mul(*c, inverse);
        }
    }
    v
}

/// a - b
pub(crate) fn sub(prime: &Prime, a: &[u64], b: &[u64]) -> Vec<u64> {
    let at = |v: &[u64], i: usize| v.get(i).copied().unwrap_or(0);
    trim((0..a.len().max(b.len())).map(|i| prime.sub(at(a, i), at(b, i))).collect())
}

/// a·b
pub(crate) fn mul(prime: &Prime, a: &[u64], b: &[u64]) -> Vec<u64> {
    if a.is_empty() || b.is_empty() {
        return Vec::new();
    }
    let mut out = vec![0; a.len() + b.len() - 1];
    for (i, x) in a.iter().enumerate() {
        for (o, y) in out[i..].iter_mut().zip(b) {
            *o = prime.add(*o, prime.mul(*x, *y));
        }
    }
    out
}

/// Quotient and remainder; the divisor is not 0.
pub(crate) fn div_rem(prime: &Prime, a: &[u64], b: &[u64]) -> (Vec<u64>, Vec<u64>) {
    let mut rest = trim(a.to_vec());
    let Some(&lead) = b.last() else { return (Vec::new(), rest) };
    if rest.len() < b.len() {
        return (Vec::new(), rest);
    }
    let inverse = prime.inverse(lead);
    let mut quotient = vec![0; rest.len() - b.len() + 1];
    for k in (0..quotient.len()).rev() {
        let q = prime.mul(rest[k + b.len() - 1], inverse);
        if q != 0 {
            for (x, y) in rest[k..].iter_mut().zip(b) {
                *x = prime.sub(*x, prime.mul(q, *y));
            }
        }
        quotient[k] = q;
    }
    rest.truncate(b.len() - 1);
    (quotient, trim(rest))
}

/// The monic greatest common divisor; empty where both are 0.
pub(crate) fn gcd(prime: &Prime, a: &[u64], b: &[u64]) -> Vec<u64> {
    let (mut a, mut b) = (trim(a.to_vec()), trim(b.to_vec()));
    while !b.is_empty() {
        if b.len() == 1 {
            return vec![prime.one];
        }
        let rest = div_rem(prime, &a, &b).1;
        a = std::mem::replace(&mut b, rest);
    }
    monic(prime, a)
}

/// (s, t) with s·a + t·b = 1 for coprime a and b, deg s < deg b, deg t < deg a.
pub(crate) fn bezout(prime: &Prime, a: &[u64], b: &[u64]) -> (Vec<u64>, Vec<u64>) {
    let (mut r, mut next) = (a.to_vec(), b.to_vec());
    let (mut s, mut s_next) = (vec![prime.one], Vec::new());
    let (mut t, mut t_next) = (Vec::new(), vec![prime.one]);
    while !next.is_empty() {
        let (q, rest) = div_rem(prime, &r, &next);
        r = std::mem::replace(&mut next, rest);
        let step = sub(prime, &s, &mul(prime, &q, &s_next));
        s = std::mem::replace(&mut s_next, step);
        let step = sub(prime, &t, &mul(prime, &q, &t_next));
        t = std::mem::replace(&mut t_next, step);
    }
    let scale = r.first().map_or(0, |&c| prime.inverse(c));
    let scaled = |v: Vec<u64>| v.into_iter().map(|c| prime.mul(c, scale)).collect();
    (scaled(s), scaled(t))
}

/// The derivative.
pub(crate) fn derivative(prime: &Prime, a: &[u64]) -> Vec<u64> {
    trim(a.iter().enumerate().skip(1).map(|(k, c)| prime.mul(*c, prime.of(k as u64))).collect())
}

/// a^e modulo f.
pub(crate) fn pow_modulo(prime: &Prime, a: &[u64], e: u64, f: &[u64]) -> Vec<u64> {
    let mut out = vec![prime.one];
    for bit in (0..64 - e.leading_zeros()).rev() {
        out = div_rem(prime, &mul(prime, &out, &out), f).1;
        if e >> bit & 1 == 1 {
            out = div_rem(prime, &mul(prime, &out, a), f).1;
        }
    }
    out
}
