//! Chinese remainders for many numbers at once, and the sign that enough primes have been taken.

use super::super::prime::Prime;
use dashu_int::{IBig, UBig};
use rayon::prelude::*;

/// Numbers from their residues modulo distinct primes.
///
/// x = Σ t_i·M/p_i - q·M with t_i = x·(M/p_i)⁻¹ mod p_i; as |x| is well below M/2, the nearest whole number to
/// Σ t_i/p_i is q.
pub(super) struct Basis {
    primes: Vec<Prime>,
    product: UBig,
    /// M/p_i as words.
    cofactors: Vec<Vec<u64>>,
    /// (M/p_i)⁻¹ mod p_i.
    inverses: Vec<u64>,
}

impl Basis {
    /// The basis of some distinct primes.
    pub(super) fn new(primes: &[u64]) -> Self {
        let fields: Vec<Prime> = primes.iter().map(|&p| Prime::new(p)).collect();
        let product = product(primes);
        let words = |c: &UBig| c.as_words().to_vec();
        let cofactors = primes.iter().map(|&p| words(&(&product / UBig::from(p)))).collect();
        let inverses = fields
            .iter()
            .enumerate()
            .map(|(i, f)| {
                let rest = primes.iter().enumerate().filter(|t| t.0 != i).fold(f.one, |x, (_, &q)| f.mul(x, f.of(q)));
                f.inverse(rest)
            })
            .collect();
        Self { primes: fields, product, cofactors, inverses }
    }

    /// The numbers whose residues modulo the i-th prime are `residues[i]`, each list as long as the others.
    pub(super) fn numbers(&self, residues: &[&[u64]]) -> Vec<IBig> {
        let count = residues.first().map_or(0, |r| r.len());
        (0..count).into_par_iter().map(|k| self.number(residues.iter().map(|r| r[k]))).collect()
    }

    fn number(&self, residues: impl Iterator<Item = u64>) -> IBig {
        let words = self.cofactors.iter().map(Vec::len).max().unwrap_or(0) + 2;
        let mut sum = vec![0u64; words];
        let mut quotient = 0.0;
        for (((f, cofactor), &inverse), r) in self.primes.iter().zip(&self.cofactors).zip(&self.inverses).zip(residues)
        {
            let t = f.value(f.mul(f.of(r), inverse));
            quotient += t as f64 / f.p as f64;
            let mut carry = 0u64;
            for (s, &w) in sum.iter_mut().zip(cofactor) {
                let x = u128::from(t) * u128::from(w) + u128::from(*s) + u128::from(carry);
                *s = x as u64;
                carry = (x >> 64) as u64;
            }
            for s in &mut sum[cofactor.len()..] {
                let (x, over) = s.overflowing_add(carry);
                *s = x;
                carry = u64::from(over);
                if carry == 0 {
                    break;
                }
            }
        }
        let q = libm::rint(quotient) as u64;
        IBig::from(from_words(&sum)) - IBig::from(&self.product * UBig::from(q))
    }
}

fn from_words(words: &[u64]) -> UBig {
    let bytes: Vec<u8> = words.iter().flat_map(|w| w.to_le_bytes()).collect();
    UBig::from_le_bytes(&bytes)
}

/// Product of many numbers, by halves.
fn product(primes: &[u64]) -> UBig {
    match primes {
        [] => UBig::ONE,
        [p] => UBig::from(*p),
        _ => {
            let (a, b) = primes.split_at(primes.len() / 2);
            product(a) * product(b)
        }
    }
}

/// One whole number by its mixed radix digits of least magnitude, prime after prime: once it is known, the digits are 0.
///
/// It is a sum of all coefficients with weights that look random; while it changes, so do they (E. Kaltofen, W. Lee,
/// A. A. Lobo, "Early termination in Ben-Or/Tiwari sparse interpolation and a hybrid of Zippel's algorithm", ISSAC 2000).
#[derive(Default)]
pub(super) struct Probe {
    primes: Vec<u64>,
    digits: Vec<i64>,
}

impl Probe {
    /// Takes in all coefficients modulo one more prime.
    pub(super) fn take<'a>(&mut self, p: u64, residues: impl Iterator<Item = &'a u64>) {
        let f = Prime::new(p);
        let weight = |k: usize| 1 + (Prime::first().scattered(k as u64) & 0x3fff);
        let sum = residues.enumerate().fold(0, |s, (k, &r)| f.add(s, f.mul(f.of(r), f.of(weight(k)))));
        let (mut known, mut modulus) = (0, f.one);
        for (&digit, &q) in self.digits.iter().zip(&self.primes) {
            known = f.add(known, f.mul(modulus, f.of_signed(digit)));
            modulus = f.mul(modulus, f.of(q));
        }
        let digit = f.value(f.mul(f.sub(sum, known), f.inverse(modulus)));
        self.digits.push(if digit > p / 2 { digit as i64 - p as i64 } else { digit as i64 });
        self.primes.push(p);
    }
    /// How many primes it took, where at least `spare` more changed nothing.
    pub(super) fn enough(&self, spare: usize) -> Option<usize> {
        let used = self.digits.iter().rposition(|&d| d != 0).map_or(0, |k| k + 1);
        (self.digits.len() >= used + spare).then_some(used)
    }
}
