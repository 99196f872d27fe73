//! Factors in one variable.

use super::{finite, lift, square_free};
use crate::algebra::poly::dense::divide;
use crate::algebra::prime::Prime;
use crate::algebra::{IBig, Poly, Var, residues};

/// Square-free parts of a higher degree are only searched for rational roots: modulo a prime, splitting takes time with
/// the cube of the degree.
const MAX_DEGREE: u32 = 150;

/// At most so many sets of factors modulo a prime are tried for one part: a polynomial can have many factors modulo
/// every prime and none over the rationals.
const MAX_SETS: usize = 20_000;

/// Products of the factors of one degree modulo a prime, with that degree.
type ByDegree = Vec<(Vec<u64>, usize)>;

/// How many primes are looked at for one with few factors.
const PRIMES: usize = 4;

/// Irreducible factors of a primitive polynomial in one variable, with multiplicities.
pub(super) fn factors(p: &Poly, v: Var) -> Vec<(Poly, u32)> {
    let mut out = Vec::new();
    for (part, times) in square_free(p, v) {
        if part.degree(v) <= 1 {
            out.push((part, times));
            continue;
        }
        let Some(dense) = part.to_dense(v) else {
            out.push((part, times));
            continue;
        };
        out.extend(irreducible(dense).into_iter().map(|f| (Poly::from_dense(v, &f).primitive(), times)));
    }
    out
}

/// Irreducible factors of a square-free primitive polynomial.
fn irreducible(p: Vec<IBig>) -> Vec<Vec<IBig>> {
    let Some((prime, image)) = Prime::small().find_map(|prime| Some((prime, square_free_image(&p, &prime)?))) else {
        return vec![p];
    };
    let (mut out, mut rest) = (Vec::new(), p);
    // Rational roots first: they need only the linear factors modulo the prime.
    for root in finite::roots(&prime, &image) {
        let line = lift::rational_root(&prime, &rest, root);
        if let Some((line, quotient)) = line.and_then(|line| Some((line.clone(), divide(&rest, &line)?))) {
            out.push(line);
            rest = quotient;
        }
    }
    if rest.len() == 2 {
        out.push(rest);
        return out;
    }
    if rest.len() <= 1 {
        return out;
    }
    // Without a linear factor, degrees 2 and 3 are irreducible.
    if rest.len() <= 4 || rest.len() > MAX_DEGREE as usize + 1 {
        out.push(rest);
        return out;
    }
    let mut best: Option<(Prime, ByDegree, usize)> = None;
    let candidates = Prime::small().filter_map(|q| Some((q, square_free_image(&rest, &q)?)));
    for (q, f) in candidates.take(PRIMES) {
        let by_degree = finite::distinct_degrees(&q, &f);
        let count = by_degree.iter().map(|(f, d)| (f.len() - 1) / d).sum();
        if count == 1 {
            out.push(rest);
            return out;
        }
        if best.as_ref().is_none_or(|b| count < b.2) {
            best = Some((q, by_degree, count));
        }
    }
    let Some((prime, by_degree, _)) = best else {
        out.push(rest);
        return out;
    };
    let local: Vec<Vec<u64>> = by_degree.into_iter().flat_map(|(f, d)| finite::equal_degree(&prime, f, d)).collect();
    out.extend(lift::recombine(&prime, rest, local, MAX_SETS));
    out
}

/// The monic image modulo a prime where it keeps its degree and stays square-free.
fn square_free_image(p: &[IBig], prime: &Prime) -> Option<Vec<u64>> {
    let image: Vec<u64> = p.iter().map(|c| prime.of_big(c)).collect();
    if image.last() == Some(&0) {
        return None;
    }
    let slope = residues::derivative(prime, &image);
    (residues::gcd(prime, &image, &slope).len() == 1).then(|| residues::monic(prime, image))
}
