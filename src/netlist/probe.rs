//! Cheap proofs that nothing is divided by zero: expressions at one point modulo a prime.
//!
//! A number that is not 0 modulo a prime is not 0. So one pass over an expression in word-size arithmetic, with
//! arbitrary values for s and the symbols, proves for nearly every law that its divisors are not zero; what it can't
//! prove is worked out exactly.

use super::expr::{Expr, ExprId};
use super::values::Values;
use super::{Netlist, ParamId};
use crate::algebra::{Fraction, IBig, Poly, RBig, UBig, Var};
use dashu_base::DivRem;

/// The prime 2^61 - 1.
const PRIME: u64 = (1 << 61) - 1;

/// A quotient modulo the prime; its denominator is not 0.
#[derive(Clone, Copy, Debug)]
struct Quotient {
    above: u64,
    below: u64,
}

fn mul(a: u64, b: u64) -> u64 {
    let product = u128::from(a) * u128::from(b);
    let folded = (product as u64 & PRIME) + (product >> 61) as u64;
    if folded >= PRIME { folded - PRIME } else { folded }
}

fn add(a: u64, b: u64) -> u64 {
    let sum = a + b;
    if sum >= PRIME { sum - PRIME } else { sum }
}

fn negative(a: u64) -> u64 {
    if a == 0 { 0 } else { PRIME - a }
}

fn power(mut base: u64, mut exponent: u32) -> u64 {
    let mut result = 1;
    while exponent > 0 {
        if exponent & 1 == 1 {
            result = mul(result, base);
        }
        base = mul(base, base);
        exponent >>= 1;
    }
    result
}

fn of_integer(value: &IBig) -> u64 {
    let prime = IBig::from(PRIME);
    let (_, rest) = value.div_rem(&prime);
    let rest = if rest < IBig::ZERO { rest + prime } else { rest };
    u64::try_from(rest).unwrap_or(0)
}

/// A value for each variable, the same in every run: Weyl's sequence, far from small numbers.
fn point(var: Var) -> u64 {
    let mixed = (u64::from(var.0) + 1).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    (mixed >> 4) % PRIME
}

/// Room to work in, kept from one expression to the next.
#[derive(Debug, Default)]
pub struct Room {
    open: Vec<(ExprId, bool)>,
    values: Vec<Quotient>,
}

/// Values of the params of a netlist at one point.
#[derive(Debug)]
pub struct Probe<'n> {
    netlist: &'n Netlist,
    params: Vec<Option<Quotient>>,
}

impl<'n> Probe<'n> {
    /// The values of all params as `values` has them, symbols at arbitrary points.
    pub fn new(netlist: &'n Netlist, values: &Values<'_>) -> Self {
        let params = (0..netlist.params.len()).map(|i| of_fraction(values.param(ParamId(i as u32)))).collect();
        Self { netlist, params }
    }

    /// Whether the expression surely has a value: no divisor in it is zero, and nothing stands in it that only the
    /// exact value can judge (a dead time, a function).
    pub fn surely_has_value(&self, root: ExprId, room: &mut Room) -> bool {
        // Each part is visited again when the values of its children lie on the stack.
        let Room { open, values } = room;
        open.clear();
        values.clear();
        open.push((root, false));
        while let Some((id, ready)) = open.pop() {
            if !ready {
                open.push((id, true));
                let mut children = self.netlist.exprs.children(id);
                let (first, second) = (children.next(), children.next());
                if let Some(second) = second {
                    open.push((second, false));
                }
                if let Some(first) = first {
                    open.push((first, false));
                }
                continue;
            }
            let Some(value) = self.one(id, values) else { return false };
            values.push(value);
            if values.len() + open.len() > MAX_PROBE_SIZE {
                return false;
            }
        }
        true
    }

    fn one(&self, id: ExprId, values: &mut Vec<Quotient>) -> Option<Quotient> {
        let ratio = |above: u64, below: u64| (below != 0).then_some(Quotient { above, below });
        match self.netlist.exprs.get(id) {
            Expr::Ratio(n, d) => {
                let above = u64::from(n.unsigned_abs());
                ratio(if n < 0 { negative(above) } else { above }, u64::from(d))
            }
            Expr::Number(place) => of_ratio(self.netlist.exprs.number(place)),
            Expr::Pi => ratio(point(super::values::PI), 1),
            Expr::S | Expr::Z => ratio(point(Var::S), 1),
            Expr::Param(p) => self.params[p.index()],
            Expr::Neg(_) => values.pop().map(|a| Quotient { above: negative(a.above), ..a }),
            Expr::Add(..) | Expr::Sub(..) => {
                let (b, a) = (values.pop()?, values.pop()?);
                let minus = matches!(self.netlist.exprs.get(id), Expr::Sub(..));
                let right = mul(b.above, a.below);
                let right = if minus { negative(right) } else { right };
                ratio(add(mul(a.above, b.below), right), mul(a.below, b.below))
            }
            Expr::Mul(..) => {
                let (b, a) = (values.pop()?, values.pop()?);
                ratio(mul(a.above, b.above), mul(a.below, b.below))
            }
            Expr::Div(..) => {
                let (b, a) = (values.pop()?, values.pop()?);
                ratio(mul(a.above, b.below), mul(a.below, b.above))
            }
            Expr::Pow(_, n) => {
                let a = values.pop()?;
                // Large exponents are judged by the limits of the exact value.
                let k = Some(n.unsigned_abs()).filter(|&k| k <= MAX_PROBE_EXPONENT)?;
                let (above, below) = (power(a.above, k), power(a.below, k));
                if n < 0 { ratio(below, above) } else { ratio(above, below) }
            }
            Expr::Delay(_) | Expr::Call(..) | Expr::Min(..) | Expr::Max(..) => None,
        }
    }
}

/// Exponents up to this are sure to stay within the limits of exact values.
const MAX_PROBE_EXPONENT: u32 = 16;

/// The most parts of one expression that are probed; a longer one is worked out exactly, each shared part once.
const MAX_PROBE_SIZE: usize = 100_000;

fn of_ratio(value: &RBig) -> Option<Quotient> {
    let below = of_integer(&IBig::from(UBig::clone(value.denominator())));
    (below != 0).then(|| Quotient { above: of_integer(value.numerator()), below })
}

fn of_fraction(fraction: &Fraction) -> Option<Quotient> {
    if let Some(number) = fraction.as_number() {
        return of_ratio(&number);
    }
    let side = |p: &Poly| {
        p.terms().fold(0, |sum, (powers, c)| {
            let term = powers.iter().fold(of_integer(&c), |t, &(v, e)| mul(t, power(point(v), e)));
            add(sum, term)
        })
    };
    let below = side(fraction.denominator());
    (below != 0).then(|| Quotient { above: side(fraction.numerator()), below })
}
