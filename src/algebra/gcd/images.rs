//! Images in one variable modulo a prime, all variables in one pass, and what they tell of degrees.

use crate::algebra::poly::coefficients::Coefficients;
use crate::algebra::poly::layout::{Field, words};
use crate::algebra::prime::Prime;
use crate::algebra::residues;
use crate::algebra::{Poly, Var};

/// Fields side by side in one word whose values index one table.
struct Chunk {
    word: usize,
    shift: u32,
    mask: u64,
    /// The fields in it, with their points.
    fields: Vec<(Field, u64)>,
    /// For each value the product of the points' powers.
    products: Vec<u64>,
    /// For each value the sum of the terms that have it.
    sums: Vec<u64>,
}

/// Tables of at most 2^9 values stay in the nearest cache.
const CHUNK_BITS: u8 = 9;

/// No list of all powers for a degree beyond this.
const LONGEST_IMAGE: u64 = 1 << 16;

fn chunks(p: &Poly, prime: &Prime, point: &impl Fn(Var) -> u64) -> Vec<Chunk> {
    let mut groups: Vec<Vec<Field>> = Vec::new();
    for &f in p.fields() {
        match groups.last_mut() {
            Some(g) if g[0].word == f.word && g[0].shift + g[0].bits - f.shift <= CHUNK_BITS => g.push(f),
            _ => groups.push(vec![f]),
        }
    }
    groups
        .into_iter()
        .map(|g| {
            let low = g.last().map_or(0, |f| f.shift);
            let bits = g[0].shift + g[0].bits - low;
            let fields: Vec<(Field, u64)> = g.iter().map(|f| (*f, point(f.var))).collect();
            let size = if bits <= CHUNK_BITS { 1usize << bits } else { g[0].degree.min(LONGEST_IMAGE) as usize + 1 };
            let mut products = vec![prime.one; size];
            for (f, x) in &fields {
                let (step, count) = (1usize << (f.shift - low), 1usize << f.bits.min(CHUNK_BITS));
                if fields.len() == 1 && bits > CHUNK_BITS {
                    (1..size).for_each(|e| products[e] = prime.mul(products[e - 1], *x));
                    continue;
                }
                let mut powers = vec![prime.one; count];
                (1..count).for_each(|e| powers[e] = prime.mul(powers[e - 1], *x));
                for (value, product) in products.iter_mut().enumerate() {
                    *product = prime.mul(*product, powers[value / step % count]);
                }
            }
            let mask = u64::MAX >> (64 - bits);
            Chunk { word: g[0].word as usize, shift: u32::from(low), mask, fields, products, sums: vec![0; size] }
        })
        .collect()
}

/// For each variable of `p`, its image with `point` for all other variables, from the power 0 up; `None` where the
/// degree is too large for a list.
///
/// Variables whose point is 0 get no image; terms that have them are passed over.
pub(crate) fn images(p: &Poly, prime: &Prime, point: impl Fn(Var) -> u64) -> Vec<(Var, Option<Vec<u64>>)> {
    let mut chunks = chunks(p, prime, &point);
    let power = |c: &Chunk, value: u64| match c.products.get(value as usize) {
        Some(x) => *x,
        None => prime.pow(c.fields[0].1, value),
    };
    let w = words(p.fields());
    let mut absent = vec![0; w];
    for f in p.fields().iter().filter(|f| point(f.var) == 0) {
        absent[f.word as usize] |= f.in_word();
    }
    let present = |key: &[u64]| key.iter().zip(&absent).all(|(k, a)| k & a == 0);
    let mut visit = |key: &[u64], c: u64| {
        let mut t = c;
        for chunk in &chunks {
            t = prime.mul(t, power(chunk, (key[chunk.word] >> chunk.shift) & chunk.mask));
        }
        for chunk in &mut chunks {
            if let Some(sum) = chunk.sums.get_mut(((key[chunk.word] >> chunk.shift) & chunk.mask) as usize) {
                *sum = prime.add(*sum, t);
            }
        }
    };
    // Most coefficients of symbolic polynomials are small.
    let known: Vec<u64> = (-64..64).map(|c| prime.of_signed(c)).collect();
    let residue = |c: i64| known.get(c.wrapping_add(64) as usize).copied().unwrap_or_else(|| prime.of_signed(c));
    match p.values() {
        Coefficients::Small(c) => {
            p.keys().chunks_exact(w).zip(c).filter(|t| present(t.0)).for_each(|(key, &c)| visit(key, residue(c)));
        }
        Coefficients::Big(c) => {
            p.keys().chunks_exact(w).zip(c).filter(|t| present(t.0)).for_each(|(key, c)| visit(key, prime.of_big(c)));
        }
    }
    let mut out = Vec::new();
    for chunk in &chunks {
        for (f, x) in &chunk.fields {
            if f.degree > LONGEST_IMAGE || *x == 0 {
                out.push((f.var, None));
                continue;
            }
            let mut image = vec![0; f.degree as usize + 1];
            for (value, sum) in chunk.sums.iter().enumerate() {
                if *sum > 0 {
                    let e = (value as u64) >> (u32::from(f.shift) - chunk.shift) & f.mask();
                    image[e as usize] = prime.add(image[e as usize], *sum);
                }
            }
            let back = prime.inverse(*x);
            let mut scale = prime.one;
            for c in &mut image {
                *c = prime.mul(*c, scale);
                scale = prime.mul(scale, back);
            }
            out.push((f.var, Some(image)));
        }
    }
    out
}

/// For each variable that both have an upper bound of the degree of gcd(a, b) in it.
///
/// An image at a point where the leading coefficient of `a` or of `b` doesn't vanish keeps the divisor's degree, so the
/// image's own divisor has at least that one.
pub(super) fn degree_bounds(a: &Poly, b: &Poly) -> Vec<(Var, u64)> {
    let least = |v: Var| a.degree_of(v).min(b.degree_of(v));
    let mut bounds: Vec<(Var, u64)> =
        a.variables().into_iter().filter(|&v| b.degree_of(v) > 0).map(|v| (v, least(v))).collect();
    if a.len().max(b.len()) > LONG {
        // With 0 for a few variables few terms are left, and mostly they prove enough. Variables that only the longer
        // one has leave the shorter one as it is.
        let (short, long) = if a.len() > b.len() { (b, a) } else { (a, b) };
        let own: Vec<Var> = long.variables().into_iter().filter(|&v| short.degree_of(v) == 0).collect();
        for candidates in [own, long.variables()] {
            let zeros: Vec<Var> = candidates.into_iter().filter(|v| *v != Var::S).skip(1).step_by(ZERO_STEP).collect();
            if !zeros.is_empty() && bounds.iter().any(|b| b.1 > 0) {
                improve(&mut bounds, a, b, &zeros);
            }
        }
    }
    if bounds.iter().any(|b| b.1 > 0) {
        improve(&mut bounds, a, b, &[]);
    }
    bounds
}

/// Polynomials of more terms are first looked at with 0 for some variables.
const LONG: usize = 4_000;

/// Every so many variables one is 0.
const ZERO_STEP: usize = 5;

/// Lowers bounds by images at one point.
fn improve(bounds: &mut [(Var, u64)], a: &Poly, b: &Poly, zeros: &[Var]) {
    let prime = Prime::first();
    let point = |v: Var| if zeros.contains(&v) { 0 } else { prime.scattered(u64::from(v.0)) };
    let (x, y) = (images(a, &prime, point), images(b, &prime, point));
    let find = |list: &[(Var, Option<Vec<u64>>)], v| list.iter().find(|i| i.0 == v).and_then(|i| i.1.clone());
    for (v, bound) in bounds.iter_mut().filter(|b| b.1 > 0) {
        if let (Some(p), Some(q)) = (find(&x, *v), find(&y, *v))
            && (p.last() != Some(&0) || q.last() != Some(&0))
        {
            *bound = (*bound).min(residues::gcd(&prime, &p, &q).len().saturating_sub(1) as u64);
        }
    }
}
