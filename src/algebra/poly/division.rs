//! Exact division.

use super::arithmetic::{Key, as_big, as_double, by_words};
use super::coefficients::{Coefficient, Coefficients};
use super::layout::{Field, combined, layout, repack, top_bits, words};
use super::{Poly, dense};
use std::collections::BinaryHeap;

/// The exact quotient, or `None`; neither is 0.
pub(super) fn quotient(a: &Poly, b: &Poly) -> Option<Poly> {
    if b.fields.is_empty() {
        let coefficients = a.coefficients.divided(&b.coefficients.get(0))?;
        return Some(Poly { fields: a.fields.clone(), keys: a.keys.clone(), coefficients });
    }
    // Degrees are additive, so they tell the quotient's.
    let all = combined(&a.fields, &b.fields, u64::max);
    if all.len() != a.fields.len() || a.fields.iter().any(|f| b.degree_of(f.var) > f.degree) {
        return None;
    }
    if let ([f], Some(x), Some(y)) = (&a.fields[..], dense_list(a), dense_list(b)) {
        return dense::divide(&x, &y).map(|q| Poly::from_dense(f.var, &q));
    }
    let target = layout(a.fields.iter().map(|f| (f.var, f.degree - b.degree_of(f.var))));
    let w = words(&a.fields);
    let kb = repack(&b.keys, b.len(), &b.fields, &a.fields);
    let tops = top_bits(&a.fields);
    let most = target_key(&a.fields, &target);
    let bounds = Bounds { tops: &tops, most: &most };
    // Products of a quotient's coefficient and one of b must not overflow, nor may sums of up to 2^32 of them.
    let limit = 93usize.saturating_sub(b.coefficients.bits());
    let small = matches!((&a.coefficients, &b.coefficients), (Coefficients::Small(_), Coefficients::Small(_)));
    let mut found = None;
    if small && limit > 0 {
        let (x, y) = (as_double(&a.coefficients), as_double(&b.coefficients));
        found = by_words!(w, K => match divide::<K, i128>((&K::load(&a.keys, w), &x), (&K::load(&kb, w), &y), &bounds, limit) {
            Ok((keys, values)) => Some((K::flatten(keys), Coefficient::collect(values))),
            Err(Failure::NotExact) => return None,
            Err(Failure::TooLarge) => None,
        });
    }
    if found.is_none() {
        let (x, y) = (as_big(&a.coefficients), as_big(&b.coefficients));
        found = by_words!(w, K => {
            divide::<K, dashu_int::IBig>((&K::load(&a.keys, w), &x), (&K::load(&kb, w), &y), &bounds, usize::MAX)
                .ok()
                .map(|(keys, values)| (K::flatten(keys), Coefficient::collect(values)))
        });
    }
    let (keys, coefficients) = found?;
    let keys = repack(&keys, coefficients.len(), &a.fields, &target);
    Some(Poly { fields: target, keys, coefficients })
}

/// A dense list where that isn't much longer than the polynomial.
fn dense_list(p: &Poly) -> Option<Vec<dashu_int::IBig>> {
    let Field { var, degree, .. } = *p.fields.first()?;
    (degree < 16 + 4 * p.len() as u64).then(|| p.to_dense(var))?
}

/// What a monomial of the quotient must obey.
struct Bounds<'a> {
    /// The highest bit of each field.
    tops: &'a [u64],
    /// The greatest exponents that the quotient can have; beyond them products would leave their fields.
    most: &'a [u64],
}

/// The degrees of the quotient, packed as the dividend's monomials are.
fn target_key(fields: &[Field], target: &[Field]) -> Vec<u64> {
    let mut key = vec![0; words(fields)];
    for t in target {
        if let Some(f) = fields.iter().find(|f| f.var == t.var) {
            f.set(&mut key, t.degree);
        }
    }
    key
}

enum Failure {
    /// It leaves something over.
    NotExact,
    /// A coefficient of the quotient passed the limit of bits.
    TooLarge,
}

/// Division with a heap of the divisor's terms (Johnson, "Sparse polynomial arithmetic", 1974; each term of the divisor
/// holds a place in the quotient, after Monagan and Pearce, "Sparse polynomial division using a heap", 2011).
fn divide<K: Key, C: Coefficient>(
    a: (&[K], &[C]),
    b: (&[K], &[C]),
    bounds: &Bounds<'_>,
    limit: usize,
) -> Result<(Vec<K>, Vec<C>), Failure> {
    let (mut keys, mut values): (Vec<K>, Vec<C>) = (Vec::new(), Vec::new());
    // Entries (monomial, term of b, term of the quotient). Terms of b that wait for a further quotient term.
    let mut heap: BinaryHeap<(K, usize, usize)> = BinaryHeap::new();
    let mut waiting: Vec<usize> = vec![1];
    let mut begun = 1;
    let mut next = 0;
    let mut due: Vec<(usize, usize)> = Vec::new();
    loop {
        let key = match (a.0.get(next), heap.peek()) {
            (Some(x), Some((y, ..))) => x.max(y).clone(),
            (Some(x), None) => x.clone(),
            (None, Some((y, ..))) => y.clone(),
            (None, None) => break,
        };
        let mut c = C::ZERO;
        if a.0.get(next) == Some(&key) {
            c = a.1[next].clone();
            next += 1;
        }
        while let Some((top, j, i)) = heap.peek() {
            if *top != key {
                break;
            }
            c.sub_product(&b.1[*j], &values[*i]);
            due.push((*j, *i));
            heap.pop();
        }
        for (j, i) in due.drain(..) {
            // The following term of b begins once this one has been used for the first time.
            if i == 0 && j == begun && j + 1 < b.0.len() {
                begun = j + 1;
                heap.push((b.0[j + 1].times(&keys[0]), j + 1, 0));
            }
            if i + 1 < keys.len() {
                heap.push((b.0[j].times(&keys[i + 1]), j, i + 1));
            } else {
                waiting.push(j);
            }
        }
        if c.is_zero() {
            continue;
        }
        let k = key.over(&b.0[0], bounds.tops).ok_or(Failure::NotExact)?;
        if !k.divides(bounds.most, bounds.tops) {
            return Err(Failure::NotExact);
        }
        let q = c.divide(&b.1[0]).ok_or(Failure::NotExact)?;
        if q.bits() > limit {
            return Err(Failure::TooLarge);
        }
        for j in waiting.drain(..) {
            if j < b.0.len() {
                heap.push((b.0[j].times(&k), j, keys.len()));
            }
        }
        keys.push(k);
        values.push(q);
    }
    Ok((keys, values))
}
