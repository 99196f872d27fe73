//! Factors modulo a small prime (Cantor and Zassenhaus, "A new algorithm for factoring polynomials over finite
//! fields", 1981), with fixed instead of random choices.

use crate::algebra::prime::Prime;
use crate::algebra::residues::{div_rem, gcd, mul, pow_modulo, sub, trim};

/// The map h ↦ h^p modulo f, which is linear: the images of 1, x, x², … .
struct Frobenius<'a> {
    prime: &'a Prime,
    f: &'a [u64],
    images: Vec<Vec<u64>>,
}

impl<'a> Frobenius<'a> {
    fn new(prime: &'a Prime, f: &'a [u64]) -> Self {
        let step = pow_modulo(prime, &[0, prime.one], prime.p, f);
        let mut images = vec![vec![prime.one]];
        for k in 1..f.len() - 1 {
            images.push(div_rem(prime, &mul(prime, &images[k - 1], &step), f).1);
        }
        Self { prime, f, images }
    }
    fn apply(&self, h: &[u64]) -> Vec<u64> {
        let mut out = vec![0; self.f.len() - 1];
        for (c, image) in h.iter().zip(&self.images) {
            for (o, x) in out.iter_mut().zip(image) {
                *o = self.prime.add(*o, self.prime.mul(*c, *x));
            }
        }
        trim(out)
    }
}

/// Products of the irreducible factors of one degree each, with that degree; `f` is monic and square-free.
pub(super) fn distinct_degrees(prime: &Prime, f: &[u64]) -> Vec<(Vec<u64>, usize)> {
    let x = [0, prime.one];
    let (mut rest, mut out) = (f.to_vec(), Vec::new());
    if f.len() <= 2 {
        return vec![(rest, 1)];
    }
    let frobenius = Frobenius::new(prime, f);
    let mut power = x.to_vec();
    let mut degree = 0;
    while rest.len() > 2 * (degree + 1) {
        degree += 1;
        power = frobenius.apply(&power);
        let g = gcd(prime, &rest, &sub(prime, &power, &x));
        if g.len() > 1 {
            rest = div_rem(prime, &rest, &g).0;
            out.push((g, degree));
        }
    }
    if rest.len() > 1 {
        let degree = rest.len() - 1;
        out.push((rest, degree));
    }
    out
}

/// The irreducible factors of a monic square-free product of factors of one degree; the prime is odd.
pub(super) fn equal_degree(prime: &Prime, f: Vec<u64>, degree: usize) -> Vec<Vec<u64>> {
    let (mut open, mut out) = (vec![f], Vec::new());
    let mut tries = 0;
    while let Some(f) = open.pop() {
        if f.len() - 1 <= degree {
            out.push(f);
            continue;
        }
        // A polynomial that looks random; its power (p^degree - 1)/2 is 1 or -1 modulo each factor.
        let h: Vec<u64> = (0..f.len() - 1).map(|k| prime.of(prime.scattered(1000 * tries + k as u64))).collect();
        tries += 1;
        let mut norm = div_rem(prime, &h, &f).1;
        let mut conjugate = norm.clone();
        for _ in 1..degree {
            conjugate = pow_modulo(prime, &conjugate, prime.p, &f);
            norm = div_rem(prime, &mul(prime, &norm, &conjugate), &f).1;
        }
        let sign = sub(prime, &pow_modulo(prime, &norm, (prime.p - 1) / 2, &f), &[prime.one]);
        let g = gcd(prime, &f, &sign);
        if g.len() > 1 && g.len() < f.len() {
            open.push(div_rem(prime, &f, &g).0);
            open.push(g);
        } else {
            open.push(f);
        }
    }
    out.sort_unstable_by(|a, b| (a.len(), a).cmp(&(b.len(), b)));
    out
}

/// The roots of a monic square-free polynomial, as residues.
pub(super) fn roots(prime: &Prime, f: &[u64]) -> Vec<u64> {
    let x = [0, prime.one];
    let linear = gcd(prime, f, &sub(prime, &pow_modulo(prime, &x, prime.p, f), &x));
    if linear.len() < 2 {
        return Vec::new();
    }
    equal_degree(prime, linear, 1).iter().map(|l| prime.sub(0, l[0])).collect()
}

/// The value at a point.
pub(super) fn value(prime: &Prime, f: &[u64], x: u64) -> u64 {
    f.iter().rev().fold(0, |v, c| prime.add(prime.mul(v, x), *c))
}
