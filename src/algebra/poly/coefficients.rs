//! Lists of coefficients: machine words where all of them fit, big integers otherwise.

use dashu_base::{BitTest, Gcd, UnsignedAbs};
use dashu_int::{IBig, UBig};

/// Coefficients of a polynomial. Canonical: `Small` exactly where all of them fit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) enum Coefficients {
    /// All fit in 64 bits with their sign.
    Small(Vec<i64>),
    /// At least one does not.
    Big(Vec<IBig>),
}

impl Default for Coefficients {
    fn default() -> Self {
        Self::Small(Vec::new())
    }
}

impl Coefficients {
    /// From big integers, in canonical form.
    pub(crate) fn from_big(values: Vec<IBig>) -> Self {
        let small: Option<Vec<i64>> = values.iter().map(|c| i64::try_from(c).ok()).collect();
        small.map_or(Self::Big(values), Self::Small)
    }
    pub(crate) fn len(&self) -> usize {
        match self {
            Self::Small(c) => c.len(),
            Self::Big(c) => c.len(),
        }
    }
    pub(crate) fn get(&self, i: usize) -> IBig {
        match self {
            Self::Small(c) => IBig::from(c[i]),
            Self::Big(c) => c[i].clone(),
        }
    }
    pub(crate) fn is_negative(&self, i: usize) -> bool {
        match self {
            Self::Small(c) => c[i] < 0,
            Self::Big(c) => c[i] < IBig::ZERO,
        }
    }
    pub(crate) fn to_big(&self) -> Vec<IBig> {
        match self {
            Self::Small(c) => c.iter().map(|&c| IBig::from(c)).collect(),
            Self::Big(c) => c.clone(),
        }
    }
    pub(crate) fn iter(&self) -> impl Iterator<Item = IBig> + '_ {
        (0..self.len()).map(|i| self.get(i))
    }
    /// Bits of the greatest magnitude.
    pub(crate) fn bits(&self) -> usize {
        match self {
            Self::Small(c) => {
                let all = c.iter().fold(0, |m, c| m | c.unsigned_abs());
                64 - all.leading_zeros() as usize
            }
            Self::Big(c) => c.iter().map(BitTest::bit_len).max().unwrap_or(0),
        }
    }
    /// Greatest common divisor, not negative.
    pub(crate) fn content(&self) -> IBig {
        match self {
            Self::Small(c) => {
                let mut g = 0;
                for c in c {
                    g = gcd_word(g, c.unsigned_abs());
                    if g == 1 {
                        break;
                    }
                }
                IBig::from(g)
            }
            Self::Big(c) => {
                let mut g = UBig::ZERO;
                for c in c {
                    g = if g == UBig::ZERO { c.unsigned_abs() } else { g.gcd(c.unsigned_abs()) };
                    if g == UBig::ONE {
                        break;
                    }
                }
                IBig::from(g)
            }
        }
    }
    /// All negated.
    pub(crate) fn negated(&self) -> Self {
        match self {
            Self::Small(c) => match c.iter().map(|c| c.checked_neg()).collect() {
                Some(c) => Self::Small(c),
                None => Self::from_big(c.iter().map(|&c| -IBig::from(c)).collect()),
            },
            // One value, 2^63, fits only after its sign is changed.
            Self::Big(c) => Self::from_big(c.iter().map(|c| -c).collect()),
        }
    }
    /// All multiplied by one number that is not 0.
    pub(crate) fn scaled(&self, by: &IBig) -> Self {
        if let (Self::Small(c), Ok(k)) = (self, i64::try_from(by))
            && let Some(c) = c.iter().map(|c| c.checked_mul(k)).collect()
        {
            return Self::Small(c);
        }
        Self::from_big(self.iter().map(|c| c * by).collect())
    }
    /// All divided by one number that is not 0, or `None` where one of them is no multiple of it.
    pub(crate) fn divided(&self, by: &IBig) -> Option<Self> {
        if let (Self::Small(c), Ok(k)) = (self, i64::try_from(by)) {
            if k == 1 {
                return Some(self.clone());
            }
            let exact = |c: &i64| if c.checked_rem(k)? == 0 { c.checked_div(k) } else { None };
            if let Some(c) = c.iter().map(exact).collect() {
                return Some(Self::Small(c));
            }
        }
        let exact = |c: IBig| {
            let q = &c / by;
            (&q * by == c).then_some(q)
        };
        Some(Self::from_big(self.iter().map(exact).collect::<Option<_>>()?))
    }
}

/// Greatest common divisor of two words.
pub(crate) fn gcd_word(mut a: u64, mut b: u64) -> u64 {
    if a <= 1 || b == 0 {
        return if a == 0 { b } else { a };
    }
    if a == 0 {
        return b;
    }
    let twos = (a | b).trailing_zeros();
    a >>= a.trailing_zeros();
    while b != 0 {
        b >>= b.trailing_zeros();
        if a > b {
            (a, b) = (b, a);
        }
        b -= a;
    }
    a << twos
}

/// A coefficient in the inner loops: a machine integer that is known not to overflow, or a big one.
pub(crate) trait Coefficient: Clone + Send + Sync {
    const ZERO: Self;
    /// Whether [`Self::kept`] costs nothing, so that merging needs no branches.
    const MACHINE: bool;
    /// Itself or 0.
    fn kept(&self, keep: bool) -> Self;
    fn is_zero(&self) -> bool;
    fn add(&mut self, other: &Self);
    fn negate(&mut self);
    fn product(&self, other: &Self) -> Self;
    fn add_product(&mut self, a: &Self, b: &Self);
    fn sub_product(&mut self, a: &Self, b: &Self);
    /// Bits of its magnitude.
    fn bits(&self) -> usize;
    /// The quotient where it is exact.
    fn divide(&self, by: &Self) -> Option<Self>;
    /// Into the canonical list.
    fn collect(values: Vec<Self>) -> Coefficients;
}

macro_rules! machine {
    ($type:ty, $collect:expr) => {
        impl Coefficient for $type {
            const ZERO: Self = 0;
            const MACHINE: bool = true;
            fn kept(&self, keep: bool) -> Self {
                self & -Self::from(keep)
            }
            fn is_zero(&self) -> bool {
                *self == 0
            }
            fn add(&mut self, other: &Self) {
                *self += other;
            }
            fn negate(&mut self) {
                *self = -*self;
            }
            fn product(&self, other: &Self) -> Self {
                self * other
            }
            fn add_product(&mut self, a: &Self, b: &Self) {
                *self += a * b;
            }
            fn sub_product(&mut self, a: &Self, b: &Self) {
                *self -= a * b;
            }
            fn bits(&self) -> usize {
                (Self::BITS - self.unsigned_abs().leading_zeros()) as usize
            }
            fn divide(&self, by: &Self) -> Option<Self> {
                if *by == 1 {
                    return Some(*self);
                }
                if let (Ok(a), Ok(b)) = (i64::try_from(*self), i64::try_from(*by))
                    && a != i64::MIN
                {
                    return (a.checked_rem(b)? == 0).then(|| Self::from(a / b));
                }
                (self.checked_rem(*by)? == 0).then(|| self / by)
            }
            fn collect(values: Vec<Self>) -> Coefficients {
                $collect(values)
            }
        }
    };
}

machine!(i64, Coefficients::Small);
machine!(i128, |values: Vec<i128>| {
    let small: Option<Vec<i64>> = values.iter().map(|&c| i64::try_from(c).ok()).collect();
    small.map_or_else(|| Coefficients::Big(values.into_iter().map(IBig::from).collect()), Coefficients::Small)
});

impl Coefficient for IBig {
    const ZERO: Self = Self::ZERO;
    const MACHINE: bool = false;
    fn kept(&self, keep: bool) -> Self {
        if keep { self.clone() } else { Self::ZERO }
    }
    fn is_zero(&self) -> bool {
        *self == Self::ZERO
    }
    fn add(&mut self, other: &Self) {
        *self += other;
    }
    fn negate(&mut self) {
        *self = -std::mem::take(self);
    }
    fn product(&self, other: &Self) -> Self {
        self * other
    }
    fn add_product(&mut self, a: &Self, b: &Self) {
        *self += a * b;
    }
    fn sub_product(&mut self, a: &Self, b: &Self) {
        *self -= a * b;
    }
    fn bits(&self) -> usize {
        self.bit_len()
    }
    fn divide(&self, by: &Self) -> Option<Self> {
        let q = self / by;
        (&q * by == *self).then_some(q)
    }
    fn collect(values: Vec<Self>) -> Coefficients {
        Coefficients::from_big(values)
    }
}
