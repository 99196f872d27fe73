//! Arithmetic modulo four primes of 50 bits at once, in double precision with fused multiply-add.
//!
//! A residue is a whole number of magnitude below p, held as a double; products are exact as a sum of two doubles
//! (T. J. Dekker, "A Floating-Point Technique for Extending the Available Precision", Numerische Mathematik 18, 1971,
//! with a fused multiply-add). Every result is an exact residue, so vector registers and the scalar fallback give the
//! same bytes.

// Only what is inlined into a function that enables AVX2 gets its instructions.
#![allow(clippy::inline_always)]

/// Primes are below this.
pub(super) const LIMIT: u64 = 1 << 50;
/// 2^25: residues are split there, so that products with small numbers can be summed without rounding.
pub(super) const SPLIT: f64 = 33_554_432.0;
/// Σ|c| up to which Σ c·x of split residues stays below 2^52 (2^25 · 2^27).
pub(super) const SMALL: f64 = 134_217_728.0;

/// One number for each of four primes.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[repr(C, align(32))]
pub(super) struct Four(pub(super) [f64; 4]);

/// Four doubles in whatever registers there are.
pub(super) trait Lanes: Copy {
    /// Reads.
    fn load(m: &Four) -> Self;
    /// Writes.
    fn store(self) -> Four;
    /// The same number four times.
    fn splat(x: f64) -> Self;
    /// Sum.
    fn add(self, other: Self) -> Self;
    /// Difference.
    fn sub(self, other: Self) -> Self;
    /// Product, rounded.
    fn mul(self, other: Self) -> Self;
    /// self·b + c, rounded once.
    fn mul_add(self, b: Self, c: Self) -> Self;
    /// c - self·b, rounded once.
    fn neg_mul_add(self, b: Self, c: Self) -> Self;
    /// The nearest whole number, ties to even.
    fn round(self) -> Self;
}

/// Lanes in plain Rust.
#[derive(Clone, Copy)]
pub(super) struct Plain([f64; 4]);

fn each(f: impl Fn(usize) -> f64) -> Plain {
    Plain([f(0), f(1), f(2), f(3)])
}

impl Lanes for Plain {
    fn load(m: &Four) -> Self {
        Self(m.0)
    }
    fn store(self) -> Four {
        Four(self.0)
    }
    fn splat(x: f64) -> Self {
        Self([x; 4])
    }
    fn add(self, other: Self) -> Self {
        each(|k| self.0[k] + other.0[k])
    }
    fn sub(self, other: Self) -> Self {
        each(|k| self.0[k] - other.0[k])
    }
    fn mul(self, other: Self) -> Self {
        each(|k| self.0[k] * other.0[k])
    }
    fn mul_add(self, b: Self, c: Self) -> Self {
        each(|k| self.0[k].mul_add(b.0[k], c.0[k]))
    }
    fn neg_mul_add(self, b: Self, c: Self) -> Self {
        each(|k| (-self.0[k]).mul_add(b.0[k], c.0[k]))
    }
    fn round(self) -> Self {
        each(|k| self.0[k].round_ties_even())
    }
}

/// Lanes in one register of AVX2.
#[cfg(target_arch = "x86_64")]
pub(super) mod avx {
    use super::{Four, Lanes};
    use std::arch::x86_64::{
        __m256d, _MM_FROUND_NO_EXC, _MM_FROUND_TO_NEAREST_INT, _mm256_add_pd, _mm256_fmadd_pd, _mm256_fnmadd_pd,
        _mm256_load_pd, _mm256_mul_pd, _mm256_round_pd, _mm256_set1_pd, _mm256_store_pd, _mm256_sub_pd,
    };

    /// Four doubles in a register. Values are made only in code that [`available`] allowed to run.
    #[derive(Clone, Copy)]
    pub(in super::super) struct Register(__m256d);

    /// Whether this machine has what [`Register`] needs.
    pub(in super::super) fn available() -> bool {
        is_x86_feature_detected!("avx2") && is_x86_feature_detected!("fma")
    }

    // SAFETY (all below): the instructions exist wherever a `Register` does, see above; `Four` is aligned to 32 bytes.
    impl Lanes for Register {
        #[inline(always)]
        fn load(m: &Four) -> Self {
            Self(unsafe { _mm256_load_pd(m.0.as_ptr()) })
        }
        #[inline(always)]
        fn store(self) -> Four {
            let mut out = Four::default();
            unsafe { _mm256_store_pd(out.0.as_mut_ptr(), self.0) };
            out
        }
        #[inline(always)]
        fn splat(x: f64) -> Self {
            Self(unsafe { _mm256_set1_pd(x) })
        }
        #[inline(always)]
        fn add(self, other: Self) -> Self {
            Self(unsafe { _mm256_add_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn sub(self, other: Self) -> Self {
            Self(unsafe { _mm256_sub_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn mul(self, other: Self) -> Self {
            Self(unsafe { _mm256_mul_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn mul_add(self, b: Self, c: Self) -> Self {
            Self(unsafe { _mm256_fmadd_pd(self.0, b.0, c.0) })
        }
        #[inline(always)]
        fn neg_mul_add(self, b: Self, c: Self) -> Self {
            Self(unsafe { _mm256_fnmadd_pd(self.0, b.0, c.0) })
        }
        #[inline(always)]
        fn round(self) -> Self {
            Self(unsafe { _mm256_round_pd::<{ _MM_FROUND_TO_NEAREST_INT | _MM_FROUND_NO_EXC }>(self.0) })
        }
    }
}

/// Four primes with their reciprocals.
#[derive(Clone, Copy)]
pub(super) struct Primes<L> {
    /// The primes.
    pub(super) p: L,
    /// Their reciprocals, rounded.
    pub(super) reciprocal: L,
}

impl<L: Lanes> Primes<L> {
    /// Four primes below [`LIMIT`].
    #[inline(always)]
    pub(super) fn new(p: &[u64; 4]) -> Self {
        let mut m = Four::default();
        let mut r = Four::default();
        for k in 0..4 {
            m.0[k] = p[k] as f64;
            r.0[k] = 1.0 / p[k] as f64;
        }
        Self { p: L::load(&m), reciprocal: L::load(&r) }
    }
    /// A whole number below 2^53 in magnitude, reduced to a magnitude of at most p/2 (and a rounding of 2^-2 of it).
    #[inline(always)]
    pub(super) fn reduce(self, x: L) -> L {
        let q = x.mul(self.reciprocal).round();
        q.neg_mul_add(self.p, x)
    }
    /// a·b for magnitudes below p; the result's is below p as well.
    ///
    /// a·b = h + l exactly, |l| ≤ 2^47; q is within 3/4 of h/p, and h - q·p is a whole number below 2^50, thus exact.
    #[inline(always)]
    pub(super) fn mul(self, a: L, b: L) -> L {
        let h = a.mul(b);
        // l = a·b - h
        let l = a.mul_add(b, L::splat(0.0).sub(h));
        let q = h.mul(self.reciprocal).round();
        q.neg_mul_add(self.p, h).add(l)
    }
    /// low + 2^25·high for sums below 2^52, reduced in part: the result's magnitude is below 2^52 + p.
    #[inline(always)]
    pub(super) fn joined(self, low: L, high: L) -> L {
        let h = high.mul(L::splat(SPLIT));
        let q = h.mul(self.reciprocal).round();
        q.neg_mul_add(self.p, h).add(low)
    }
    /// A residue in two halves: x = low + 2^25·high, |low| ≤ 2^24, |high| ≤ 2^25.
    #[inline(always)]
    pub(super) fn split(x: L) -> (L, L) {
        let high = x.mul(L::splat(1.0 / SPLIT)).round();
        (high.neg_mul_add(L::splat(SPLIT), x), high)
    }
    /// 1/a modulo each prime by Fermat's theorem; 0 for 0.
    #[inline(always)]
    pub(super) fn inverse(self, a: L, primes: &[u64; 4]) -> L {
        let mut result = L::splat(1.0);
        for bit in (0..50).rev() {
            result = self.mul(result, result);
            let with = self.mul(result, a).store();
            let mut chosen = result.store();
            for k in 0..4 {
                if (primes[k] - 2) >> bit & 1 == 1 {
                    chosen.0[k] = with.0[k];
                }
            }
            result = L::load(&chosen);
        }
        result
    }
}

/// The residue from 0 to p - 1 of one lane.
pub(super) fn to_number(x: f64, p: u64) -> u64 {
    (x as i64).rem_euclid(p as i64) as u64
}

/// A lane's form, of magnitude at most p/2, of a residue.
pub(super) fn from_number(x: u64, p: u64) -> f64 {
    let x = x % p;
    if x > p / 2 { x as f64 - p as f64 } else { x as f64 }
}

#[cfg(test)]
mod tests {
    use super::super::super::prime::Prime;
    use super::*;

    fn check<L: Lanes>() {
        let primes: Vec<u64> = (0..).map(|k| LIMIT - 1 - 2 * k).filter(|&n| Prime::is_prime(n)).take(4).collect();
        let primes = [primes[0], primes[1], primes[2], primes[3]];
        let field = Primes::<L>::new(&primes);
        let mut x = 1u64;
        for _ in 0..2000 {
            let (mut a, mut b) = (Four::default(), Four::default());
            for k in 0..4 {
                x = x.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                a.0[k] = from_number(x >> 8, primes[k]);
                b.0[k] = from_number(x.rotate_left(23) >> 8, primes[k]);
            }
            let product = field.mul(L::load(&a), L::load(&b)).store();
            let (low, high) = Primes::split(L::load(&a));
            let joined = field.reduce(field.joined(low, high)).store();
            let inverse = field.inverse(L::load(&a), &primes);
            let one = field.reduce(field.mul(inverse, L::load(&a))).store();
            for k in 0..4 {
                let p = i128::from(primes[k]);
                let exact = (a.0[k] as i128 * b.0[k] as i128).rem_euclid(p);
                assert_eq!(i128::from(to_number(product.0[k], primes[k])), exact);
                assert!(product.0[k].abs() < primes[k] as f64);
                assert_eq!(to_number(joined.0[k], primes[k]), to_number(a.0[k], primes[k]));
                assert_eq!(to_number(one.0[k], primes[k]), u64::from(a.0[k] != 0.0));
            }
        }
    }

    #[test]
    fn plain_lanes_agree_with_wide_integers() {
        check::<Plain>();
    }

    #[cfg(target_arch = "x86_64")]
    #[test]
    fn register_lanes_agree_with_wide_integers() {
        if avx::available() {
            check::<avx::Register>();
        }
    }
}
