//! Polynomials as text: `Kp*b + 3`, terms in their order.
//!
//! Long symbolic results have millions of terms, so the text of each group of neighbouring variables is looked up by the
//! bits of their exponents, and text leaves in large pieces.

use super::coefficients::Coefficients;
use super::layout::{Field, words};
use super::{Poly, Var, narrow};
use dashu_int::IBig;
use rayon::prelude::*;
use std::ops::Range;

/// Neighbouring fields of one word whose bits index a table of texts.
struct Group {
    word: usize,
    shift: u32,
    mask: u64,
    /// Bytes from one text to the next, at least as many as the longest has.
    stride: usize,
    lengths: Vec<u8>,
    texts: Vec<u8>,
}

/// A variable whose exponents are too many, or whose name is too long, for a table.
struct Single {
    field: Field,
    name: String,
}

enum Part {
    Group(Group),
    Single(Single),
}

/// A table has at most 2^10 texts, so that all tables of a term stay in the second cache.
const TABLE_BITS: u8 = 10;

/// The longest text in a table.
const LONGEST: usize = 96;

/// Texts of this length or less are copied as a whole slot, which takes three instructions.
const SLOT: usize = 48;

/// Text leaves in pieces of about this size.
const PIECE: usize = 1 << 16;

/// What is needed to write the terms of one polynomial without one of its variables.
struct Writer {
    parts: Vec<Part>,
    /// Upper bound of a term's bytes but for its coefficient and its singles.
    most: usize,
}

fn power_text(out: &mut Vec<u8>, name: &str, e: u64) {
    if e > 0 {
        out.push(b'*');
        out.extend_from_slice(name.as_bytes());
    }
    if e > 1 {
        out.push(b'^');
        out.extend_from_slice(e.to_string().as_bytes());
    }
}

impl Writer {
    fn new<'n>(fields: &[Field], without: Option<Var>, name: &impl Fn(Var) -> &'n str) -> Self {
        let mut parts: Vec<Part> = Vec::new();
        let mut open: Vec<(Field, &str)> = Vec::new();
        for &f in fields.iter().filter(|f| Some(f.var) != without) {
            let longest =
                |f: &Field, name: &str| 1 + name.len() + if f.degree > 1 { f.degree.to_string().len() + 1 } else { 0 };
            let text = name(f.var);
            let length = open.iter().map(|(f, n)| longest(f, n)).sum::<usize>() + longest(&f, text);
            let fits = open.last().is_none_or(|(last, _)| {
                last.word == f.word
                    && last.shift == f.shift + f.bits
                    && open[0].0.shift + open[0].0.bits - f.shift <= TABLE_BITS
            });
            if !fits || length > LONGEST {
                parts.extend(Self::table(&open));
                open.clear();
            }
            if f.bits > TABLE_BITS || longest(&f, text) > LONGEST {
                parts.extend(Self::table(&open));
                open.clear();
                parts.push(Part::Single(Single { field: f, name: text.to_owned() }));
            } else {
                open.push((f, text));
            }
        }
        parts.extend(Self::table(&open));
        let most = parts.iter().map(|p| if let Part::Group(g) = p { g.stride } else { 0 }).sum();
        Self { parts, most }
    }

    /// All texts of some neighbouring fields; nothing for none.
    fn table(open: &[(Field, &str)]) -> Option<Part> {
        let ((first, _), (last, _)) = (open.first()?, open.last()?);
        let bits = first.shift + first.bits - last.shift;
        let all: Vec<Vec<u8>> = (0..1u64 << bits)
            .map(|value| {
                let mut text = Vec::new();
                for (f, name) in open {
                    power_text(&mut text, name, value >> (f.shift - last.shift) & f.mask());
                }
                // Exponents beyond the degree don't occur; their texts could be longer than the bound.
                text.truncate(LONGEST);
                text
            })
            .collect();
        let longest = all.iter().map(Vec::len).max().unwrap_or(0);
        let stride = longest.max(SLOT);
        let mut texts = vec![0; stride * all.len()];
        for (slot, text) in texts.chunks_exact_mut(stride).zip(&all) {
            slot[..text.len()].copy_from_slice(text);
        }
        let lengths = all.iter().map(|t| t.len() as u8).collect();
        let mask = (1 << bits) - 1;
        Some(Part::Group(Group {
            word: first.word as usize,
            shift: u32::from(last.shift),
            mask,
            stride,
            lengths,
            texts,
        }))
    }

    /// Writes a range of terms as a sum.
    fn write(&self, p: &Poly, range: Range<usize>, emit: &mut impl FnMut(&str)) {
        let w = words(&p.fields);
        let mut buffer: Vec<u8> = vec![0; PIECE + self.most + 2 * SLOT];
        let mut at = 0;
        for i in range.clone() {
            let key = &p.keys[i * w..(i + 1) * w];
            let (negative, one) = match &p.coefficients {
                Coefficients::Small(c) => (c[i] < 0, c[i].unsigned_abs() == 1),
                Coefficients::Big(c) => (p.coefficients.is_negative(i), c[i] == IBig::ONE || c[i] == IBig::NEG_ONE),
            };
            let sign: &[u8] = match (i == range.start, negative) {
                (true, false) => b"",
                (true, true) => b"-",
                (false, false) => b" + ",
                (false, true) => b" - ",
            };
            let begin = at;
            at += sign.len();
            if !one {
                at = self.number(p, i, &mut buffer, at);
                buffer[begin..begin + sign.len()].copy_from_slice(sign);
                at = self.powers(key, &mut buffer, at);
            } else if at == 0 {
                // Nothing stands before that the first star could be written over.
                let end = self.powers(key, &mut buffer, 0);
                buffer.copy_within(1..end.max(1), 0);
                at = end.saturating_sub(1);
            } else {
                // The first star lies under the sign's last character.
                let end = self.powers(key, &mut buffer, at - 1);
                buffer[begin..begin + sign.len()].copy_from_slice(sign);
                at = if end == at - 1 { at } else { end };
            }
            if one && at == begin + sign.len() {
                buffer[at] = b'1';
                at += 1;
            }
            if at >= PIECE {
                emit(std::str::from_utf8(&buffer[..at]).unwrap_or(""));
                at = 0;
            }
        }
        emit(std::str::from_utf8(&buffer[..at]).unwrap_or(""));
    }

    /// The coefficient's magnitude at a place in the buffer; gives the place behind it.
    fn number(&self, p: &Poly, i: usize, buffer: &mut Vec<u8>, at: usize) -> usize {
        let (mut digits, mut long) = ([0u8; 20], String::new());
        let text = match &p.coefficients {
            Coefficients::Small(c) => {
                let (mut value, mut k) = (c[i].unsigned_abs(), digits.len());
                while value > 0 || k == digits.len() {
                    k -= 1;
                    digits[k] = b'0' + (value % 10) as u8;
                    value /= 10;
                }
                &digits[k..]
            }
            Coefficients::Big(c) => {
                long.push_str(&c[i].to_string());
                long.trim_start_matches('-').as_bytes()
            }
        };
        let end = at + text.len();
        if buffer.len() < end + self.most + 2 * SLOT {
            buffer.resize(end + self.most + PIECE, 0);
        }
        buffer[at..end].copy_from_slice(text);
        end
    }

    /// All powers of one term, each with a star before it; gives the place behind.
    #[inline]
    fn powers(&self, key: &[u64], buffer: &mut Vec<u8>, mut at: usize) -> usize {
        for part in &self.parts {
            match part {
                Part::Group(g) => {
                    let value = ((key[g.word] >> g.shift) & g.mask) as usize;
                    let (from, length) = (value * g.stride, usize::from(g.lengths[value]));
                    if length <= SLOT {
                        buffer[at..at + SLOT].copy_from_slice(&g.texts[from..from + SLOT]);
                    } else {
                        buffer[at..at + length].copy_from_slice(&g.texts[from..from + length]);
                    }
                    at += length;
                }
                Part::Single(s) => {
                    let mut text = Vec::new();
                    power_text(&mut text, &s.name, s.field.get(key));
                    if buffer.len() < at + text.len() + self.most + 2 * SLOT {
                        buffer.resize(at + text.len() + self.most + PIECE, 0);
                    }
                    buffer[at..at + text.len()].copy_from_slice(&text);
                    at += text.len();
                }
            }
        }
        at
    }
}

impl Poly {
    /// Writes the polynomial as a sum of terms in their order, `K*b^2 - 3*T + 1`, piece by piece; 0 is `0`. `name` gives
    /// the names of the variables.
    pub fn write_text<'n>(&self, name: impl Fn(Var) -> &'n str, mut emit: impl FnMut(&str)) {
        if self.is_zero() {
            emit("0");
            return;
        }
        Writer::new(&self.fields, None, &name).write(self, 0..self.len(), &mut emit);
    }

    /// The texts of the coefficients in one variable, by its powers, descending; those that are 0 are left out.
    pub fn coefficient_texts<'n>(&self, main: Var, name: impl Fn(Var) -> &'n str) -> Vec<(u32, String)> {
        let text = |p: &Self| {
            let mut out = String::new();
            p.write_text(&name, |piece| out.push_str(piece));
            out
        };
        let Some(first) = self.fields.first().filter(|f| f.var == main) else {
            return self.powers(main).iter().map(|(power, c)| (*power, text(c))).collect();
        };
        // Terms of one power of the first variable stand together.
        let writer = Writer::new(&self.fields, Some(main), &name);
        let mut ranges = Vec::new();
        let mut start = 0;
        while start < self.len() {
            let power = first.get(self.key(start));
            let mut end = start;
            let mut step = 1;
            // Doubling steps, then halving ones.
            while end + step < self.len() && first.get(self.key(end + step)) == power {
                end += step;
                step *= 2;
            }
            while step > 0 {
                if end + step < self.len() && first.get(self.key(end + step)) == power {
                    end += step;
                }
                step /= 2;
            }
            ranges.push((narrow(power), start..end + 1));
            start = end + 1;
        }
        let write = |(power, range): (u32, Range<usize>)| {
            let mut text = String::new();
            writer.write(self, range, &mut |piece| text.push_str(piece));
            (power, text)
        };
        if self.len() < 10_000 {
            return ranges.into_iter().map(write).collect();
        }
        ranges.into_par_iter().map(write).collect()
    }
}
