//! Arithmetic modulo word-size primes, in Montgomery's form (Montgomery, "Modular multiplication without trial
//! division", 1985).

use dashu_base::{Sign, UnsignedAbs};
use dashu_int::IBig;

/// A prime below 2^62 with what multiplication needs. Residues are `u64` below the prime, in Montgomery's form: `x`
/// stands as `x · 2^64`.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Prime {
    /// The prime.
    pub(crate) p: u64,
    /// -1/p modulo 2^64.
    negated_inverse: u64,
    /// 2^128 modulo p.
    square: u64,
    /// The residue 1.
    pub(crate) one: u64,
}

impl Prime {
    pub(crate) fn new(p: u64) -> Self {
        // Newton's iteration doubles the bits that are right, from 5 to more than 64.
        let mut inverse = p.wrapping_mul(3) ^ 2;
        for _ in 0..5 {
            inverse = inverse.wrapping_mul(2u64.wrapping_sub(p.wrapping_mul(inverse)));
        }
        let one = ((1u128 << 64) % u128::from(p)) as u64;
        let square = (u128::from(one) * u128::from(one) % u128::from(p)) as u64;
        Self { p, negated_inverse: inverse.wrapping_neg(), square, one }
    }
    /// x·y
    #[inline]
    pub(crate) fn mul(&self, x: u64, y: u64) -> u64 {
        let t = u128::from(x) * u128::from(y);
        let m = (t as u64).wrapping_mul(self.negated_inverse);
        let u = ((t + u128::from(m) * u128::from(self.p)) >> 64) as u64;
        u.min(u.wrapping_sub(self.p))
    }
    /// x + y
    #[inline]
    pub(crate) fn add(&self, x: u64, y: u64) -> u64 {
        let s = x + y;
        s.min(s.wrapping_sub(self.p))
    }
    /// x - y
    #[inline]
    pub(crate) fn sub(&self, x: u64, y: u64) -> u64 {
        let d = x.wrapping_sub(y);
        d.min(d.wrapping_add(self.p))
    }
    /// x^e
    pub(crate) fn pow(&self, mut x: u64, mut e: u64) -> u64 {
        let mut out = self.one;
        while e > 0 {
            if e & 1 == 1 {
                out = self.mul(out, x);
            }
            x = self.mul(x, x);
            e >>= 1;
        }
        out
    }
    /// 1/x; 0 for 0.
    pub(crate) fn inverse(&self, x: u64) -> u64 {
        self.pow(x, self.p - 2)
    }
    /// The residue of a word.
    pub(crate) fn of(&self, x: u64) -> u64 {
        self.mul(x % self.p, self.square)
    }
    /// The residue of a word with its sign.
    pub(crate) fn of_signed(&self, x: i64) -> u64 {
        let r = self.of(x.unsigned_abs());
        if x < 0 { self.sub(0, r) } else { r }
    }
    /// The residue of an integer.
    pub(crate) fn of_big(&self, x: &IBig) -> u64 {
        if let Ok(x) = i64::try_from(x) {
            return self.of_signed(x);
        }
        let r = self.of(x.clone().unsigned_abs() % self.p);
        if dashu_base::Signed::sign(x) == Sign::Negative { self.sub(0, r) } else { r }
    }
    /// The number from 0 to p - 1 that a residue stands for.
    pub(crate) fn value(&self, x: u64) -> u64 {
        self.mul(x, 1)
    }
    /// Whether a number below 2^62 is prime: Miller and Rabin's test with the first twelve primes as bases decides up
    /// to 3·10^24 (Sorenson and Webster, "Strong pseudoprimes to twelve prime bases", 2017).
    pub(crate) fn is_prime(n: u64) -> bool {
        const BASES: [u64; 12] = [2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37];
        if BASES.iter().any(|b| n.is_multiple_of(*b)) {
            return false;
        }
        let field = Self::new(n);
        let twos = (n - 1).trailing_zeros();
        BASES.iter().all(|&b| {
            let mut x = field.pow(field.of(b), (n - 1) >> twos);
            let minus = field.sub(0, field.one);
            if x == field.one || x == minus {
                return true;
            }
            (1..twos).any(|_| {
                x = field.mul(x, x);
                x == minus
            })
        })
    }
    /// The primes below 2^62, descending.
    pub(crate) fn all() -> impl Iterator<Item = Self> {
        (0..1u64 << 40).map(|k| (1 << 62) - 1 - 2 * k).filter(|&n| Self::is_prime(n)).map(Self::new)
    }
    /// The primes from 101 to 65521, rising.
    pub(crate) fn small() -> impl Iterator<Item = Self> {
        let is_prime = |n: &u64| (2..256).take_while(|d| d * d <= *n).all(|d| !n.is_multiple_of(d));
        (101u64..1 << 16).step_by(2).filter(is_prime).map(Self::new)
    }
    /// The first of [`Self::all`].
    pub(crate) fn first() -> Self {
        Self::new((1 << 62) - 57)
    }
    /// A fixed residue other than 0 that looks random, one for each number.
    pub(crate) fn scattered(&self, number: u64) -> u64 {
        // The finalizer of splitmix64 (Steele, Lea, Flood, "Fast splittable pseudorandom number generators", 2014).
        let mut z = number.wrapping_add(1).wrapping_mul(0x9E37_79B9_7F4A_7C15);
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        1 + (z ^ (z >> 31)) % (self.p - 1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn residues_follow_the_integers() {
        let p = Prime::first();
        // 2^62 - 57 is the greatest prime below 2^62 (the table "primes just less than a power of two").
        assert_eq!(Prime::all().next().map(|q| q.p), Some(p.p));
        for (x, y) in [(3u64, 5u64), (p.p - 1, p.p - 2), (1 << 61, 12345)] {
            let (a, b) = (p.of(x), p.of(y));
            assert_eq!(u128::from(p.value(p.mul(a, b))), u128::from(x) * u128::from(y) % u128::from(p.p));
            assert_eq!(u128::from(p.value(p.add(a, b))), (u128::from(x) + u128::from(y)) % u128::from(p.p));
            assert_eq!(p.add(p.sub(a, b), b), a);
            assert_eq!(p.mul(a, p.inverse(a)), p.one);
        }
        let big = IBig::from(-7) * IBig::from(u64::MAX).pow(3);
        let expected = p.sub(0, p.mul(p.of(7), p.pow(p.of(u64::MAX), 3)));
        assert_eq!(p.of_big(&big), expected);
    }
}
