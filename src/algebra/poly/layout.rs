//! Where the exponents of a polynomial stand: bit fields in one or more words of 64 bits.

use super::Var;

/// The place of one variable's exponent in a packed monomial.
///
/// The first variable takes the highest bits of the first word, so that comparing the words compares monomials
/// lexicographically. A field never crosses from one word into the next.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Field {
    /// The variable.
    pub(crate) var: Var,
    /// Its degree in the polynomial: the field is just wide enough for it.
    pub(crate) degree: u64,
    /// The word.
    pub(crate) word: u32,
    /// The lowest bit.
    pub(crate) shift: u8,
    /// How many bits.
    pub(crate) bits: u8,
}

impl Field {
    /// A mask of the field's width, at bit 0.
    pub(crate) fn mask(&self) -> u64 {
        u64::MAX >> (64 - self.bits)
    }
    /// The exponent in a packed monomial.
    pub(crate) fn get(&self, key: &[u64]) -> u64 {
        (key[self.word as usize] >> self.shift) & self.mask()
    }
    /// The exponent `e` at the field's place.
    pub(crate) fn set(&self, key: &mut [u64], e: u64) {
        key[self.word as usize] |= e << self.shift;
    }
    /// The field's bits within its word.
    pub(crate) fn in_word(&self) -> u64 {
        self.mask() << self.shift
    }
}

/// Lays out fields for these degrees, variables rising; those of degree 0 are left out.
pub(crate) fn layout(degrees: impl IntoIterator<Item = (Var, u64)>) -> Vec<Field> {
    let (mut word, mut used) = (0, 0);
    let mut fields = Vec::new();
    for (var, degree) in degrees {
        if degree == 0 {
            continue;
        }
        let bits = 64 - degree.leading_zeros() as u8;
        if used + bits > 64 {
            (word, used) = (word + 1, 0);
        }
        used += bits;
        fields.push(Field { var, degree, word, shift: 64 - used, bits });
    }
    fields
}

/// How many words a monomial takes.
pub(crate) fn words(fields: &[Field]) -> usize {
    fields.last().map_or(0, |f| f.word as usize + 1)
}

/// Whether monomials of the one look like monomials of the other.
pub(crate) fn same_places(a: &[Field], b: &[Field]) -> bool {
    a.len() == b.len()
        && a.iter().zip(b).all(|(a, b)| a.var == b.var && a.word == b.word && a.shift == b.shift && a.bits == b.bits)
}

/// The highest bit of every field, by words: where a borrow shows that one monomial does not divide another.
pub(crate) fn top_bits(fields: &[Field]) -> Vec<u64> {
    let mut tops = vec![0; words(fields)];
    for f in fields {
        tops[f.word as usize] |= 1 << (f.shift + f.bits - 1);
    }
    tops
}

/// Variables of both with a degree made of their degrees (0 where one lacks the variable).
pub(crate) fn combined(a: &[Field], b: &[Field], degree: impl Fn(u64, u64) -> u64) -> Vec<Field> {
    let (mut i, mut j) = (0, 0);
    let pairs = std::iter::from_fn(|| {
        let (x, y) = (a.get(i), b.get(j));
        let var = match (x, y) {
            (Some(x), Some(y)) => x.var.min(y.var),
            (Some(f), None) | (None, Some(f)) => f.var,
            (None, None) => return None,
        };
        let take = |f: Option<&Field>, at: &mut usize| match f {
            Some(f) if f.var == var => {
                *at += 1;
                f.degree
            }
            _ => 0,
        };
        Some((var, degree(take(x, &mut i), take(y, &mut j))))
    });
    layout(pairs)
}

/// One step of repacking: bits that keep their distance move together.
struct Move {
    from: usize,
    to: usize,
    mask: u64,
    left: i32,
}

fn moves(from: &[Field], to: &[Field]) -> Vec<Move> {
    let mut out: Vec<Move> = Vec::new();
    let mut at = 0;
    for t in to {
        while at < from.len() && from[at].var < t.var {
            at += 1;
        }
        let Some(f) = from.get(at).filter(|f| f.var == t.var) else { continue };
        let step = Move {
            from: f.word as usize,
            to: t.word as usize,
            mask: f.in_word(),
            left: i32::from(t.shift) - i32::from(f.shift),
        };
        match out.last_mut() {
            Some(last) if last.from == step.from && last.to == step.to && last.left == step.left => {
                last.mask |= step.mask;
            }
            _ => out.push(step),
        }
    }
    out
}

/// Packed monomials moved from one layout to another. Exponents of variables that `to` lacks are dropped; those that
/// it has must fit. `count` is the number of monomials (a constant's take no words).
pub(crate) fn repack(keys: &[u64], count: usize, from: &[Field], to: &[Field]) -> Vec<u64> {
    let (w, v) = (words(from), words(to));
    let mut out = vec![0; v * count];
    if w == 0 || v == 0 {
        return out;
    }
    let moves = moves(from, to);
    for (key, new) in keys.chunks_exact(w).zip(out.chunks_exact_mut(v)) {
        for m in &moves {
            let bits = key[m.from] & m.mask;
            new[m.to] |= if m.left >= 0 { bits << m.left } else { bits >> -m.left };
        }
    }
    out
}

/// The greatest exponent in every field, of monomials sorted descending. Fields of one bit are taken together.
pub(crate) fn degrees(keys: &[u64], fields: &[Field]) -> Vec<u64> {
    let w = words(fields);
    let mut any = vec![0; w];
    for key in keys.chunks_exact(w.max(1)) {
        for (a, k) in any.iter_mut().zip(key) {
            *a |= k;
        }
    }
    let greatest = |f: &Field| {
        let all = f.get(&any);
        match (f.word, f.shift + f.bits, f.bits) {
            (0, 64, _) => f.get(keys),
            (_, _, 1) => all,
            _ if all == 0 => 0,
            _ => keys.chunks_exact(w).map(|key| f.get(key)).max().unwrap_or(0),
        }
    };
    fields.iter().map(greatest).collect()
}
