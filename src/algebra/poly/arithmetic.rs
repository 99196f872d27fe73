//! Sums and products of packed polynomials.
//!
//! Inner loops work on one kind of key (one word, two words, or more) and one kind of coefficient (`i64`, `i128` where
//! a bound on the result shows that nothing overflows, big integers otherwise). Sums are merges of sorted lists.
//! Products are dense convolutions where the box of exponents is about as large as the number of term products, and
//! balanced trees of merges otherwise: no hashing, so the order is right by construction.

use super::coefficients::{Coefficient, Coefficients};
use super::layout::{Field, combined, repack, same_places, words};
use super::{Poly, dense};
use dashu_int::IBig;
use std::borrow::Cow;

/// A packed monomial; its order is the order of terms.
pub(crate) trait Key: Ord + Clone {
    fn load(keys: &[u64], words: usize) -> Cow<'_, [Self]>;
    fn flatten(keys: Vec<Self>) -> Vec<u64>;
    fn words(&self) -> &[u64];
    /// The product of two monomials; the layout has room for it.
    fn times(&self, other: &Self) -> Self;
    /// The quotient, or `None` where a field would borrow. `tops` are the highest bits of all fields.
    fn over(&self, other: &Self, tops: &[u64]) -> Option<Self>;
    /// Whether no field is greater than in `other`.
    fn divides(&self, other: &[u64], tops: &[u64]) -> bool {
        self.words().iter().zip(other).zip(tops).all(|((&y, &x), &t)| word_over(x, y, t).is_some())
    }
}

/// The quotient's word, or `None` where a field borrows (a borrow out of a field shows at its highest bit).
fn word_over(x: u64, y: u64, tops: u64) -> Option<u64> {
    let d = x.wrapping_sub(y);
    (((!x & y) | (!(x ^ y) & d)) & tops == 0).then_some(d)
}

impl<const N: usize> Key for [u64; N] {
    fn load(keys: &[u64], _: usize) -> Cow<'_, [Self]> {
        Cow::Borrowed(keys.as_chunks().0)
    }
    fn flatten(keys: Vec<Self>) -> Vec<u64> {
        keys.into_flattened()
    }
    fn words(&self) -> &[u64] {
        self
    }
    fn times(&self, other: &Self) -> Self {
        std::array::from_fn(|i| self[i] + other[i])
    }
    fn over(&self, other: &Self, tops: &[u64]) -> Option<Self> {
        let mut out = [0; N];
        for i in 0..N {
            out[i] = word_over(self[i], other[i], tops[i])?;
        }
        Some(out)
    }
}

impl Key for Vec<u64> {
    fn load(keys: &[u64], words: usize) -> Cow<'_, [Self]> {
        Cow::Owned(keys.chunks_exact(words).map(<[u64]>::to_vec).collect())
    }
    fn flatten(keys: Vec<Self>) -> Vec<u64> {
        keys.concat()
    }
    fn words(&self) -> &[u64] {
        self
    }
    fn times(&self, other: &Self) -> Self {
        self.iter().zip(other).map(|(x, y)| x + y).collect()
    }
    fn over(&self, other: &Self, tops: &[u64]) -> Option<Self> {
        self.iter().zip(other).zip(tops).map(|((&x, &y), &t)| word_over(x, y, t)).collect()
    }
}

/// Runs an expression with the type `$key` fitting a number of words.
macro_rules! by_words {
    ($words:expr, $key:ident => $run:expr) => {
        match $words {
            1 => {
                type $key = [u64; 1];
                $run
            }
            2 => {
                type $key = [u64; 2];
                $run
            }
            _ => {
                type $key = Vec<u64>;
                $run
            }
        }
    };
}
pub(crate) use by_words;

/// The coefficients as one machine type or as big integers.
pub(crate) fn as_words(c: &Coefficients) -> Cow<'_, [i64]> {
    match c {
        Coefficients::Small(c) => Cow::Borrowed(c),
        Coefficients::Big(_) => Cow::Borrowed(&[]),
    }
}
pub(crate) fn as_double(c: &Coefficients) -> Vec<i128> {
    match c {
        Coefficients::Small(c) => c.iter().map(|&c| i128::from(c)).collect(),
        Coefficients::Big(c) => c.iter().map(|c| i128::try_from(c).unwrap_or(0)).collect(),
    }
}
pub(crate) fn as_big(c: &Coefficients) -> Cow<'_, [IBig]> {
    match c {
        Coefficients::Small(_) => Cow::Owned(c.to_big()),
        Coefficients::Big(c) => Cow::Borrowed(c),
    }
}

/// Keys in another layout, borrowed where nothing moves.
fn in_layout<'a>(p: &'a Poly, to: &[Field]) -> Cow<'a, [u64]> {
    if same_places(&p.fields, to) {
        Cow::Borrowed(&p.keys)
    } else {
        Cow::Owned(repack(&p.keys, p.len(), &p.fields, to))
    }
}

type Terms<K, C> = (Vec<K>, Vec<C>);

/// Merges two sorted lists, leaving out what cancels.
fn merge<K: Key, C: Coefficient>(a: (&[K], &[C]), b: (&[K], &[C]), negative: bool) -> Terms<K, C> {
    let mut keys = Vec::with_capacity(a.0.len() + b.0.len());
    let mut values = Vec::with_capacity(a.0.len() + b.0.len());
    let signed = |c: &C| {
        let mut c = c.clone();
        if negative {
            c.negate();
        }
        c
    };
    let (mut i, mut j) = (0, 0);
    while i < a.0.len() && j < b.0.len() {
        match a.0[i].cmp(&b.0[j]) {
            std::cmp::Ordering::Greater => {
                keys.push(a.0[i].clone());
                values.push(a.1[i].clone());
                i += 1;
            }
            std::cmp::Ordering::Less => {
                keys.push(b.0[j].clone());
                values.push(signed(&b.1[j]));
                j += 1;
            }
            std::cmp::Ordering::Equal => {
                let mut c = signed(&b.1[j]);
                c.add(&a.1[i]);
                if !c.is_zero() {
                    keys.push(a.0[i].clone());
                    values.push(c);
                }
                (i, j) = (i + 1, j + 1);
            }
        }
    }
    keys.extend_from_slice(&a.0[i..]);
    values.extend_from_slice(&a.1[i..]);
    keys.extend_from_slice(&b.0[j..]);
    values.extend(b.1[j..].iter().map(signed));
    (keys, values)
}

/// Sum or difference.
pub(super) fn sum(a: &Poly, b: &Poly, negative: bool) -> Poly {
    if b.is_zero() {
        return a.clone();
    }
    if a.is_zero() {
        return if negative { b.neg() } else { b.clone() };
    }
    let fields = combined(&a.fields, &b.fields, u64::max);
    let w = words(&fields);
    let (ka, kb) = (in_layout(a, &fields), in_layout(b, &fields));
    let bits = a.coefficients.bits().max(b.coefficients.bits());
    let (keys, coefficients) = if w == 0 {
        let (x, y) = (a.coefficients.get(0), b.coefficients.get(0));
        let c = if negative { x - y } else { x + y };
        return Poly::constant(c);
    } else if bits <= 62 {
        let (x, y) = (as_words(&a.coefficients), as_words(&b.coefficients));
        summed(w, (&ka, &x), (&kb, &y), negative)
    } else {
        let (x, y) = (as_big(&a.coefficients), as_big(&b.coefficients));
        summed(w, (&ka, &x), (&kb, &y), negative)
    };
    Poly::normalized(fields, keys, coefficients)
}

fn summed<C: Coefficient>(w: usize, a: (&[u64], &[C]), b: (&[u64], &[C]), negative: bool) -> (Vec<u64>, Coefficients) {
    by_words!(w, K => {
        let (keys, values) = merge::<K, C>((&K::load(a.0, w), a.1), (&K::load(b.0, w), b.1), negative);
        (K::flatten(keys), C::collect(values))
    })
}

/// Product of two polynomials that are not 0.
pub(super) fn product(a: &Poly, b: &Poly) -> Poly {
    let (a, b) = if a.len() <= b.len() { (a, b) } else { (b, a) };
    if a.fields.is_empty() {
        return b.scale(&a.coefficients.get(0));
    }
    let fields = combined(&a.fields, &b.fields, |x, y| x + y);
    let bits = a.coefficients.bits() + b.coefficients.bits() + a.len().ilog2() as usize + 1;
    let (keys, coefficients) = if bits <= 62 {
        multiplied(&fields, a, b, &as_words(&a.coefficients), &as_words(&b.coefficients))
    } else if bits <= 126 {
        multiplied(&fields, a, b, &as_double(&a.coefficients), &as_double(&b.coefficients))
    } else {
        let (x, y) = (as_big(&a.coefficients), as_big(&b.coefficients));
        if let Some(p) = dense::packed_product(&fields, a, b, &x, &y) {
            return p;
        }
        multiplied(&fields, a, b, &x, &y)
    };
    // The ring has no zero divisors, so the degrees are exact.
    Poly { fields, keys, coefficients }
}

fn multiplied<C: Coefficient>(fields: &[Field], a: &Poly, b: &Poly, x: &[C], y: &[C]) -> (Vec<u64>, Coefficients) {
    if let Some(size) = dense::box_size(fields)
        && a.len() > 2
        && size <= 4 * a.len() * b.len() + 64
        && size <= dense::LARGEST_BOX
    {
        return dense::convolution(fields, size, (a, x), (b, y));
    }
    let w = words(fields);
    let (ka, kb) = (in_layout(a, fields), in_layout(b, fields));
    by_words!(w, K => {
        let (keys, values) = product_tree::<K, C>((&K::load(&ka, w), x), (&K::load(&kb, w), y));
        (K::flatten(keys), C::collect(values))
    })
}

/// Halves `a` until one term is left; the depth is the binary logarithm of its length.
fn product_tree<K: Key, C: Coefficient>(a: (&[K], &[C]), b: (&[K], &[C])) -> Terms<K, C> {
    if a.0.len() == 1 {
        let (k, c) = (&a.0[0], &a.1[0]);
        return (b.0.iter().map(|x| x.times(k)).collect(), b.1.iter().map(|x| x.product(c)).collect());
    }
    let half = a.0.len() / 2;
    let left = product_tree((&a.0[..half], &a.1[..half]), b);
    let right = product_tree((&a.0[half..], &a.1[half..]), b);
    merge((&left.0, &left.1), (&right.0, &right.1), false)
}
