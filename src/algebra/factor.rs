//! Factors over the rationals.
//!
//! Numbers and single variables first, then the factors that the caller knows, then the contents with respect to each
//! variable (which splits every product whose factors don't share all their variables), then square-free parts (Yun,
//! "On square-free decomposition algorithms", 1976), and the irreducible factors of what is left in one variable
//! (Zassenhaus, "On Hensel factorization", 1969). A part in several variables that all these leave whole stays whole;
//! so do parts beyond the named limits.

mod finite;
mod lift;
#[cfg(test)]
mod tests;
mod univariate;

use super::gcd::{common_monomial, images::images, remainders::content};
use super::prime::Prime;
use super::{IBig, Poly, Var, residues};

/// Polynomials in several variables with more terms than this are only tried with numbers, single variables and known
/// factors: the rest takes time with the square of the number of terms.
pub const MAX_TERMS: usize = 10_000;

/// A product: `unit · Π factor^multiplicity`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Factored {
    /// The content with its sign; 0 for the polynomial 0.
    pub unit: IBig,
    /// Factors without content, their leading coefficients positive, each once with its multiplicity; ordered by
    /// the sum of their degrees in all variables, then by variables and terms.
    pub factors: Vec<(Poly, u32)>,
}

/// The factors of a polynomial over the rationals.
pub fn factor(p: &Poly) -> Factored {
    factor_with(p, &[])
}

/// The factors of a polynomial over the rationals. `known` are polynomials that are likely to divide it, such as the
/// denominators of single blocks; they need not be irreducible, and change nothing but the time it takes, except for
/// what the limits leave whole.
pub fn factor_with(p: &Poly, known: &[Poly]) -> Factored {
    if p.is_zero() {
        return Factored { unit: IBig::ZERO, factors: Vec::new() };
    }
    let mut unit = p.content();
    if p.is_negative() {
        unit = -unit;
    }
    let mut found: Vec<(Poly, u32)> = Vec::new();
    let mut rest = p.primitive();
    let monomial = common_monomial(&rest);
    if !monomial.is_one() {
        rest = rest.div_exact(&monomial).unwrap_or(rest);
        found.extend(monomial.fields().iter().map(|f| (Poly::var(f.var), f.degree as u32)));
    }
    let mut parts = Vec::new();
    for k in known {
        let k = k.primitive();
        let mut times = 0;
        while !k.is_constant() && may_divide(&k, &rest) {
            let Some(q) = rest.div_exact(&k) else { break };
            rest = q;
            times += 1;
        }
        if times > 0 {
            parts.push((k, times));
        }
    }
    parts.push((rest, 1));
    while let Some((part, times)) = parts.pop() {
        split(part, times, &mut parts, &mut found);
    }
    Factored { unit, factors: ordered(found) }
}

/// Whether one-variable images modulo a prime allow that `k` divides `p`.
fn may_divide(k: &Poly, p: &Poly) -> bool {
    let shape = k.fields().iter().all(|f| f.degree <= p.degree_of(f.var));
    if !shape || p.len() < 32 {
        return shape;
    }
    let prime = Prime::first();
    let point = |v: Var| prime.scattered(u64::from(v.0));
    let large = images(p, &prime, point);
    images(k, &prime, point).into_iter().all(|(v, small)| {
        let Some((_, Some(large))) = large.iter().find(|i| i.0 == v) else { return true };
        let Some(small) = small.map(residues::trim).filter(|s| !s.is_empty()) else { return true };
        residues::div_rem(&prime, large, &small).1.is_empty()
    })
}

/// Splits one part without content into further parts, or adds it to what is found.
fn split(part: Poly, times: u32, parts: &mut Vec<(Poly, u32)>, found: &mut Vec<(Poly, u32)>) {
    if part.is_constant() {
        return;
    }
    let variables = part.variables();
    if let [v] = variables[..] {
        for (p, k) in univariate::factors(&part, v) {
            found.push((p, k * times));
        }
        return;
    }
    if part.len() > MAX_TERMS {
        found.push((part, times));
        return;
    }
    for &v in &variables {
        let c = content(&part, v).primitive();
        if !c.is_one() {
            let rest = part.div_exact(&c).unwrap_or_default();
            parts.extend([(c, times), (rest, times)]);
            return;
        }
    }
    // Without content with respect to a variable that it has the degree 1 in, it cannot be a product.
    if variables.iter().any(|&v| part.degree(v) == 1) {
        found.push((part, times));
        return;
    }
    let v = variables.iter().copied().min_by_key(|&v| part.degree(v)).unwrap_or(Var::S);
    let free = square_free(&part, v);
    if let [(_, 1)] = free[..] {
        found.extend(disguised(&part).into_iter().map(|(p, k)| (p, k * times)));
        return;
    }
    parts.extend(free.into_iter().map(|(p, k)| (p, k * times)));
}

/// Square-free parts with their multiplicities, of a polynomial without content with respect to `v`.
fn square_free(p: &Poly, v: Var) -> Vec<(Poly, u32)> {
    let slope = p.derivative(v);
    let repeated = p.gcd(&slope);
    if repeated.is_constant() {
        return vec![(p.clone(), 1)];
    }
    let exact = |a: &Poly, b: &Poly| a.div_exact(b).unwrap_or_default();
    let mut out = Vec::new();
    // `simple` has every factor once whose multiplicity is k or more; `rest` shares with it those of exactly k.
    let mut simple = exact(p, &repeated);
    let mut rest = exact(&slope, &repeated).sub(&simple.derivative(v));
    let mut k = 1;
    while !rest.is_zero() {
        let these = simple.gcd(&rest).primitive();
        simple = exact(&simple, &these);
        rest = exact(&rest, &these).sub(&simple.derivative(v));
        if !these.is_constant() {
            out.push((these, k));
        }
        k += 1;
    }
    out.push((simple.primitive(), k));
    out
}

/// Factors of a square-free part in two variables that is one variable in disguise: of terms of one total degree, such
/// as (s + K)(s + 2K), or of powers of one product, such as (Ts + 1)(Ts + 2).
fn disguised(part: &Poly) -> Vec<(Poly, u32)> {
    let [a, b] = part.fields() else { return vec![(part.clone(), 1)] };
    let (x, y) = (a.var, b.var);
    let pairs = || (0..part.len()).map(|i| (a.get(part.key(i)), b.get(part.key(i))));
    let total = a.degree;
    let one_degree = pairs().all(|(e, f)| e + f == total);
    if !one_degree && !pairs().all(|(e, f)| e == f) {
        return vec![(part.clone(), 1)];
    }
    let line = part.substitute(y, &super::RBig::ONE).0;
    let back = |p: &Poly| {
        let degree = p.degree(x);
        Poly::from_terms(p.terms().map(|(m, c)| {
            let e = m.first().map_or(0, |m| m.1);
            (vec![(x, e), (y, if one_degree { degree - e } else { e })], c)
        }))
    };
    univariate::factors(&line, x).into_iter().map(|(p, k)| (back(&p).primitive(), k)).collect()
}

/// Equal factors together, in the order of [`Factored::factors`].
fn ordered(mut found: Vec<(Poly, u32)>) -> Vec<(Poly, u32)> {
    type Order = (u64, Vec<Var>, Vec<u64>, Vec<IBig>);
    let order = |p: &Poly| -> Order {
        let total = p.fields().iter().map(|f| f.degree).sum();
        (total, p.variables(), p.keys().to_vec(), p.values().to_big())
    };
    if found.len() > 1 {
        found.sort_by_cached_key(|(p, _)| order(p));
    }
    let mut out: Vec<(Poly, u32)> = Vec::new();
    for (p, k) in found {
        match out.last_mut() {
            Some((last, times)) if *last == p => *times += k,
            _ => out.push((p, k)),
        }
    }
    out
}
