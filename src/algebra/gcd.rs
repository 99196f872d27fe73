//! Greatest common divisors, certified by exact division.
//!
//! Steps: numbers and monomials common to all terms are taken out; variables that only one of the two has, and
//! variables whose one-variable images modulo a prime show that the divisor lacks them, are got rid of by going over
//! to coefficients; where the images allow it, each is tried as a divisor of the other; what then remains is a divisor
//! that has all the variables. Primes and points are fixed, so the same input takes the same way.

pub(crate) mod dense;
mod heuristic;
pub(crate) mod images;
pub(crate) mod remainders;
#[cfg(test)]
mod tests;

use super::Poly;
use super::Var;
use super::poly::coefficients::gcd_word;
use super::poly::layout::{combined, words};
use dashu_base::Gcd;
use dashu_int::IBig;
use std::borrow::Cow;

/// Greatest common divisor with its number, the leading coefficient positive; gcd(0, p) = ±p.
pub(crate) fn gcd(a: &Poly, b: &Poly) -> Poly {
    let positive = |p: &Poly| if p.is_negative() { p.neg() } else { p.clone() };
    if a.is_zero() || a == b {
        return positive(b);
    }
    if b.is_zero() {
        return positive(a);
    }
    let (ca, cb) = (a.content(), b.content());
    let number = if ca == IBig::ONE || cb == IBig::ONE { IBig::ONE } else { IBig::from((&ca).gcd(&cb)) };
    if a.is_constant() || b.is_constant() {
        return Poly::constant(number);
    }
    let (ma, mb) = (common_monomial(a), common_monomial(b));
    let common = Poly::monomial(&least(&ma, &mb), number);
    if a.len() == 1 || b.len() == 1 {
        return common;
    }
    common.mul(&primitive(&stripped(a, &ma, &ca), &stripped(b, &mb, &cb)))
}

/// Without its common monomial and its content, the leading coefficient positive; borrowed where it is so already.
fn stripped<'p>(p: &'p Poly, monomial: &Poly, content: &IBig) -> Cow<'p, Poly> {
    let mut out = Cow::Borrowed(p);
    if !monomial.is_one() {
        out = Cow::Owned(out.div_exact(monomial).unwrap_or_default());
    }
    if *content != IBig::ONE {
        out = Cow::Owned(out.div_number(content).unwrap_or_default());
    }
    if out.is_negative() { Cow::Owned(out.neg()) } else { out }
}

/// The least exponents in all terms, as a monomial.
pub(crate) fn common_monomial(p: &Poly) -> Poly {
    let w = words(p.fields());
    let mut powers = Vec::new();
    for f in p.fields() {
        // The constant term, where there is one, stands last: mostly one look is enough.
        let last = f.get(p.key(p.len() - 1));
        let low = if last == 0 { 0 } else { p.keys().chunks_exact(w).map(|k| f.get(k)).min().unwrap_or(0) };
        powers.push((f.var, low));
    }
    Poly::monomial(&powers, IBig::ONE)
}

fn least(a: &Poly, b: &Poly) -> Vec<(Var, u64)> {
    combined(a.fields(), b.fields(), u64::min).iter().map(|f| (f.var, f.degree)).collect()
}

/// The divisor of two that have no common number or monomial of their own, with positive leading coefficients.
fn primitive(a: &Poly, b: &Poly) -> Poly {
    if a == b {
        return a.clone();
    }
    let shared = combined(a.fields(), b.fields(), u64::min);
    if shared.is_empty() {
        return Poly::one();
    }
    if let ([f], [_], [_]) = (&shared[..], a.fields(), b.fields()) {
        let (mut x, mut y) = (a.clone(), b.clone());
        let k = deflate(&mut x, &mut y, f.var);
        return of_one_variable(&x, &y, f.var).with_exponents(f.var, |e| e * k);
    }
    let bounds = images::degree_bounds(a, b);
    let keep: Vec<Var> = bounds.iter().filter(|b| b.1 > 0).map(|b| b.0).collect();
    if keep.is_empty() {
        return Poly::one();
    }
    if keep.len() < a.fields().len() || keep.len() < b.fields().len() {
        return of_pieces(a, b, &keep, &bounds);
    }
    for (p, q) in [(a, b), (b, a)] {
        if bounds.iter().all(|&(v, d)| d == q.degree_of(v)) && p.div_exact(q).is_some() {
            return q.clone();
        }
    }
    let (mut x, mut y) = (a.clone(), b.clone());
    let powers: Vec<(Var, u64)> = keep.iter().map(|&v| (v, deflate(&mut x, &mut y, v))).collect();
    let bounds: Vec<(Var, u64)> = bounds.iter().zip(&powers).map(|(b, p)| (b.0, b.1 / p.1)).collect();
    let g = heuristic::gcd(&x, &y).unwrap_or_else(|| remainders::gcd(&x, &y, &bounds));
    powers.into_iter().fold(g, |g, (var, k)| if k == 1 { g } else { g.with_exponents(var, |e| e * k) })
}

/// The divisor of two that has only the variables in `keep`: it divides all coefficients of both, as polynomials in the
/// other variables. As soon as a few of these have a divisor of the degrees expected, divisions decide.
fn of_pieces(a: &Poly, b: &Poly, keep: &[Var], bounds: &[(Var, u64)]) -> Poly {
    let mut parts = pieces(a, keep);
    parts.extend(pieces(b, keep));
    parts.sort_by_key(|p| (p.variables().len(), p.len()));
    let mut out = Poly::zero();
    let mut refused = false;
    for p in parts {
        out = gcd(&out, &p).primitive();
        if out.is_constant() {
            return Poly::one();
        }
        let expected = keep.iter().all(|&v| bounds.iter().any(|b| b.0 == v && b.1 == out.degree_of(v)));
        if expected && !refused {
            if a.div_exact(&out).is_some() && b.div_exact(&out).is_some() {
                return out;
            }
            refused = true;
        }
    }
    out
}

/// Coefficients as a polynomial in all variables but these.
fn pieces(p: &Poly, keep: &[Var]) -> Vec<Poly> {
    let w = words(p.fields());
    let mut mask = vec![0; w];
    for f in p.fields().iter().filter(|f| !keep.contains(&f.var)) {
        mask[f.word as usize] |= f.in_word();
    }
    if mask.iter().all(|m| *m == 0) {
        return vec![p.clone()];
    }
    let other = |i: usize| p.key(i).iter().zip(&mask).map(|(k, m)| k & m);
    let mut order: Vec<usize> = (0..p.len()).collect();
    order.sort_by(|&i, &j| other(i).cmp(other(j)));
    order.chunk_by(|&i, &j| other(i).eq(other(j))).map(|group| p.selected(group, |v| keep.contains(&v))).collect()
}

/// The divisor of many with its number.
fn of_coefficients(mut parts: Vec<Poly>) -> Poly {
    parts.sort_by_key(|p| (p.variables().len(), p.len()));
    let mut out = Poly::zero();
    for p in parts {
        out = gcd(&out, &p);
        if out.is_one() {
            break;
        }
    }
    out
}

/// Degrees beyond this, after common factors of the exponents are taken out, aren't searched for common factors: only
/// dead times of no simple ratio give such, and a list of all powers would take their place in memory.
const LARGEST_DEGREE: u64 = 1 << 20;

fn of_one_variable(a: &Poly, b: &Poly, var: Var) -> Poly {
    match (dense_list(a, var), dense_list(b, var)) {
        (Some(x), Some(y)) => Poly::from_dense(var, &dense::gcd(&x, &y)),
        _ => Poly::one(),
    }
}

fn dense_list(p: &Poly, var: Var) -> Option<Vec<IBig>> {
    if p.degree_of(var) > LARGEST_DEGREE { None } else { p.to_dense(var) }
}

/// Puts x for x^k where all exponents of x in both are multiples of k, and gives k.
fn deflate(a: &mut Poly, b: &mut Poly, var: Var) -> u64 {
    let k = exponents_gcd(b, var, exponents_gcd(a, var, 0));
    if k > 1 {
        *a = a.with_exponents(var, |e| e / k);
        *b = b.with_exponents(var, |e| e / k);
    }
    k
}

fn exponents_gcd(p: &Poly, var: Var, start: u64) -> u64 {
    let Some(f) = p.field(var).filter(|f| f.degree > 1) else { return if p.degree_of(var) == 1 { 1 } else { start } };
    let mut g = start;
    for key in p.keys().chunks_exact(words(p.fields())) {
        g = gcd_word(g, f.get(key));
        if g == 1 {
            break;
        }
    }
    g
}
