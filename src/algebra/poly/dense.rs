//! Products over a dense box of exponents, and products as one product of big integers.

use super::coefficients::{Coefficient, Coefficients};
use super::layout::{Field, words};
use super::{Poly, Var};
use dashu_base::Sign;
use dashu_int::{IBig, UBig, Word};

/// Dense boxes of more places than this aren't made: 2^22 places of 16 bytes stay near the size of a cache.
pub(super) const LARGEST_BOX: usize = 1 << 22;

/// How many exponent vectors lie in the box of the degrees; `None` where that overflows.
pub(super) fn box_size(fields: &[Field]) -> Option<usize> {
    fields.iter().try_fold(1usize, |n, f| n.checked_mul(usize::try_from(f.degree).ok()?.checked_add(1)?))
}

/// The step of each field in a dense box, the last field's being 1.
pub(super) fn strides(fields: &[Field]) -> Vec<usize> {
    let mut out = vec![1; fields.len()];
    for i in (1..fields.len()).rev() {
        out[i - 1] = out[i] * (fields[i].degree as usize + 1);
    }
    out
}

/// Places of a polynomial's terms in the box of `fields`, which has all its variables.
pub(super) fn places(p: &Poly, fields: &[Field]) -> Vec<usize> {
    let steps = strides(fields);
    let used: Vec<(&Field, usize)> =
        p.fields.iter().filter_map(|f| fields.iter().position(|g| g.var == f.var).map(|i| (f, steps[i]))).collect();
    if used.is_empty() {
        return vec![0; p.len()];
    }
    p.keys
        .chunks_exact(words(&p.fields))
        .map(|key| used.iter().map(|(f, step)| f.get(key) as usize * step).sum())
        .collect()
}

/// The packed monomial of a place in the box, appended.
pub(super) fn push_key(fields: &[Field], steps: &[usize], mut place: usize, keys: &mut Vec<u64>) {
    let start = keys.len();
    keys.resize(start + words(fields), 0);
    for (f, step) in fields.iter().zip(steps) {
        f.set(&mut keys[start..], (place / step) as u64);
        place %= step;
    }
}

/// The terms of a dense box, descending.
pub(super) fn gather<C: Coefficient>(fields: &[Field], values: Vec<C>) -> (Vec<u64>, Vec<C>) {
    let steps = strides(fields);
    let (mut keys, mut out) = (Vec::new(), Vec::new());
    for (place, c) in values.into_iter().enumerate().rev() {
        if !c.is_zero() {
            push_key(fields, &steps, place, &mut keys);
            out.push(c);
        }
    }
    (keys, out)
}

/// Product over a dense box.
pub(super) fn convolution<C: Coefficient>(
    fields: &[Field],
    size: usize,
    a: (&Poly, &[C]),
    b: (&Poly, &[C]),
) -> (Vec<u64>, Coefficients) {
    let (pa, pb) = (places(a.0, fields), places(b.0, fields));
    let mut out = vec![C::ZERO; size];
    for (i, x) in pa.iter().zip(a.1) {
        for (j, y) in pb.iter().zip(b.1) {
            out[i + j].add_product(x, y);
        }
    }
    let (keys, values) = gather(fields, out);
    (keys, C::collect(values))
}

/// Kronecker's substitution down to one big integer each, where both operands nearly fill their box.
pub(super) fn packed_product(fields: &[Field], a: &Poly, b: &Poly, x: &[IBig], y: &[IBig]) -> Option<Poly> {
    let size = box_size(fields)?;
    if a.len() < 12 || size > 3 * (a.len() + b.len()) {
        return None;
    }
    let spread = |p: &Poly, values: &[IBig]| {
        let places = places(p, fields);
        let mut out = vec![IBig::ZERO; places.first().map_or(0, |m| m + 1)];
        for (at, c) in places.into_iter().zip(values) {
            out[at].clone_from(c);
        }
        out
    };
    let product = multiply(&spread(a, x), &spread(b, y));
    let (keys, values) = gather(fields, product);
    Some(Poly { fields: fields.to_vec(), keys, coefficients: Coefficients::from_big(values) })
}

fn slot_words(bits: usize) -> usize {
    bits.div_ceil(Word::BITS as usize).max(1)
}

/// Coefficients at 2^(64·slot): the value of the polynomial there.
pub(crate) fn pack(values: &[IBig], slot: usize) -> IBig {
    let mut positive = vec![0 as Word; values.len() * slot];
    let mut negative = positive.clone();
    let mut any = false;
    for (i, c) in values.iter().enumerate() {
        let (sign, words) = c.as_sign_words();
        let to = if sign == Sign::Negative { &mut negative } else { &mut positive };
        any |= sign == Sign::Negative;
        to[i * slot..i * slot + words.len()].copy_from_slice(words);
    }
    let p = IBig::from(UBig::from_words(&positive));
    if any { p - IBig::from(UBig::from_words(&negative)) } else { p }
}

/// Digits in ±2^(64·slot - 1) of a packed value, from the lowest.
pub(crate) fn unpack(value: &IBig, slot: usize, count: usize) -> Vec<IBig> {
    let (sign, words) = value.as_sign_words();
    let mut out = Vec::with_capacity(count);
    let mut carry = false;
    for i in 0..count {
        let from = (i * slot).min(words.len());
        let chunk = &words[from..((i + 1) * slot).min(words.len())];
        let mut digit = UBig::from_words(chunk);
        if carry {
            digit += 1u8;
        }
        // A digit in the upper half stands for a negative one, with a carry.
        let top = chunk.len() == slot && chunk[slot - 1] >> (Word::BITS - 1) == 1 || digit.as_words().len() > slot;
        carry = top || digit.as_words().len() == slot && digit.as_words()[slot - 1] >> (Word::BITS - 1) == 1;
        let mut c = IBig::from(digit);
        if carry {
            c -= IBig::from(UBig::ONE << (slot * Word::BITS as usize));
        }
        out.push(if sign == Sign::Negative { -c } else { c });
    }
    out
}

/// Product of two dense polynomials in one variable, coefficients from the power 0 up.
pub(crate) fn multiply(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    if a.is_empty() || b.is_empty() {
        return Vec::new();
    }
    let bits = |v: &[IBig]| v.iter().map(Coefficient::bits).max().unwrap_or(0);
    let short = a.len().min(b.len());
    if short < 8 {
        let mut out = vec![IBig::ZERO; a.len() + b.len() - 1];
        for (i, x) in a.iter().enumerate() {
            for (j, y) in b.iter().enumerate() {
                out[i + j].add_product(x, y);
            }
        }
        return out;
    }
    let slot = slot_words(bits(a) + bits(b) + short.ilog2() as usize + 3);
    unpack(&(pack(a, slot) * pack(b, slot)), slot, a.len() + b.len() - 1)
}

/// The exact quotient of two dense polynomials, or `None`.
///
/// Short ones by long division. Long ones by one division of packed integers: a quotient's coefficients are less than
/// 2^deg ‖a‖₂ (Mignotte, "Some useful bounds", 1982), which fixes the size of the slots; the product is compared.
pub(crate) fn divide(a: &[IBig], b: &[IBig]) -> Option<Vec<IBig>> {
    let lead = b.last()?;
    if a.is_empty() {
        return Some(Vec::new());
    }
    let count = (a.len() + 1).checked_sub(b.len()).filter(|&n| n > 0)?;
    let bits = a.iter().map(Coefficient::bits).max().unwrap_or(0);
    if count.min(b.len()) < 24 || bits < 128 {
        let mut rest = a.to_vec();
        let mut out = vec![IBig::ZERO; count];
        for k in (0..count).rev() {
            let top = std::mem::take(&mut rest[k + b.len() - 1]);
            if top.is_zero() {
                continue;
            }
            let q = top.divide(lead)?;
            for (r, c) in rest[k..].iter_mut().zip(&b[..b.len() - 1]) {
                r.sub_product(&q, c);
            }
            out[k] = q;
        }
        return rest.iter().all(Coefficient::is_zero).then_some(out);
    }
    let own = b.iter().map(Coefficient::bits).max().unwrap_or(0);
    let slot = slot_words((bits + count + a.len().ilog2() as usize + 4).max(own + 2));
    let (x, y) = (pack(a, slot), pack(b, slot));
    let q = &x / &y;
    if &q * &y != x {
        return None;
    }
    let out = unpack(&q, slot, count);
    (multiply(&out, b) == a).then_some(out)
}

impl Poly {
    /// Coefficients in one variable, from the power 0 up, where no other variable occurs; empty for 0. `None` also
    /// where the degree passes 2^24, far beyond what a dense list is good for.
    pub fn to_dense(&self, var: Var) -> Option<Vec<IBig>> {
        match self.fields.as_slice() {
            [] => Some(self.coefficients.to_big()),
            [f] if f.var == var && f.degree < 1 << 24 => {
                let mut out = vec![IBig::ZERO; f.degree as usize + 1];
                for (key, c) in self.keys.iter().zip(self.coefficients.iter()) {
                    out[f.get(&[*key]) as usize] = c;
                }
                Some(out)
            }
            _ => None,
        }
    }

    /// The polynomial with these coefficients in one variable, from the power 0 up.
    pub fn from_dense(var: Var, values: &[IBig]) -> Self {
        let Some(top) = values.iter().rposition(|c| !c.is_zero()) else { return Self::zero() };
        let fields = super::layout::layout([(var, top as u64)]);
        let (keys, coefficients) = if let [f] = fields[..] {
            let some = || (0..=top).rev().filter(|&k| !values[k].is_zero());
            (some().map(|k| (k as u64) << f.shift).collect(), some().map(|k| values[k].clone()).collect())
        } else {
            (Vec::new(), vec![values[0].clone()])
        };
        Self { fields, keys, coefficients: Coefficients::from_big(coefficients) }
    }
}
