//! The rows of a netlist with exact polynomials: left · signal = Σ coefficient · (what the row reads).
//!
//! - a sum and a scalar law are multiplied by their denominators;
//! - a row of a matrix law is multiplied by the least common multiple of the denominators of its entries;
//! - a line of state equations keeps its s: s · state = Σ …, so that its modes stay, whatever cancels.

use super::direct::{self, Leads};
use super::graph::Wiring;
use crate::algebra::{Fraction, Poly, Var};
use crate::diagnostics::Diagnostic;
use crate::netlist::expr::ExprId;
use crate::netlist::values::{Value, Values};
use crate::netlist::{BlockId, CaseId, Driver, Keep, Law, SignalId};
use rustc_hash::FxHashMap;
use std::cell::{OnceCell, RefCell};
use std::rc::Rc;

/// Values with a memory, so that each law is worked out once.
#[derive(Debug)]
pub(crate) struct Laws<'n> {
    /// The values.
    pub(crate) values: Values<'n>,
    known: RefCell<FxHashMap<ExprId, Rc<Value>>>,
    case: Option<CaseId>,
    keep: Keep,
    candidates: OnceCell<Vec<Vec<SignalId>>>,
}

/// One row: `left · v = Σ coefficient · u`, with every signal u once, in the order of their numbers.
#[derive(Clone, Debug)]
pub(crate) struct Row {
    /// What the signal itself is multiplied with; never 0.
    pub(crate) left: Poly,
    /// What the signals that it reads are multiplied with; none is 0.
    pub(crate) terms: Vec<(SignalId, Poly)>,
    /// Whether some value was rounded.
    pub(crate) rounded: bool,
}

impl<'n> Laws<'n> {
    /// A memory that is still empty, of the values for a case with some params kept.
    pub(crate) fn new(values: Values<'n>, case: Option<CaseId>, keep: &Keep) -> Self {
        Self { values, known: RefCell::default(), case, keep: keep.clone(), candidates: OnceCell::new() }
    }

    /// Sets of signals among which all algebraic loops lie, no signal cut.
    pub(crate) fn candidates(&self, wiring: &Wiring<'n>) -> &[Vec<SignalId>] {
        self.candidates
            .get_or_init(|| direct::candidates(wiring, &mut Leads::new(wiring.netlist, self.case, &self.keep)))
    }

    /// The value of an expression.
    ///
    /// # Errors
    ///
    /// As [`Values::evaluate`].
    pub(crate) fn evaluate(&self, expr: ExprId) -> Result<Rc<Value>, Box<Diagnostic>> {
        if let Some(value) = self.known.borrow().get(&expr) {
            return Ok(Rc::clone(value));
        }
        let value = Rc::new(self.values.evaluate(expr)?);
        self.known.borrow_mut().insert(expr, Rc::clone(&value));
        Ok(value)
    }

    /// The row of `v`, of which only the signals for which `counts` holds are read.
    ///
    /// # Errors
    ///
    /// As [`Values::evaluate`].
    pub(crate) fn row(
        &self,
        wiring: &Wiring<'n>,
        v: SignalId,
        counts: impl Fn(SignalId) -> bool,
    ) -> Result<Row, Box<Diagnostic>> {
        let net = wiring.netlist;
        let mut gather = Gather::default();
        let mut by_s = false;
        match net.signals[v.index()].driver {
            Driver::Input | Driver::Nothing => {}
            Driver::Sum(sum) => {
                for term in net.terms_of(&net.sums[sum.index()]).iter().filter(|t| counts(t.signal)) {
                    let one = || Rc::new(Value { fraction: Fraction::one(), rounded: false });
                    let factor = term.factor.map_or_else(|| Ok(one()), |f| self.evaluate(f))?;
                    let gain = if term.negative { factor.fraction.neg() } else { factor.fraction.clone() };
                    gather.add(term.signal, gain, factor.rounded);
                }
            }
            Driver::Block(block) => {
                let block = &net.blocks[block.index()];
                match &block.law {
                    Law::Scalar(law) => {
                        for &u in block.inputs.iter().filter(|&&u| counts(u)) {
                            let value = self.evaluate(*law)?;
                            gather.add(u, value.fraction.clone(), value.rounded);
                        }
                    }
                    Law::Matrix(rows) => {
                        let row = rows.get(wiring.place(v)).map_or(&[][..], |r| &r[..]);
                        for (&law, &u) in row.iter().zip(&block.inputs).filter(|(_, u)| counts(**u)) {
                            let value = self.evaluate(law)?;
                            gather.add(u, value.fraction.clone(), value.rounded);
                        }
                    }
                    Law::States(equations) => {
                        let Some(equation) = equations.get(wiring.place(v)) else { return Ok(gather.into_row(false)) };
                        by_s = equation.derivative;
                        for term in equation.terms.iter().filter(|t| counts(t.variable)) {
                            let value = self.evaluate(term.coefficient)?;
                            let mut gain = value.fraction.clone();
                            if term.derivative {
                                gain = gain.mul(&Poly::var(Var::S).into());
                            }
                            gather.add(term.variable, gain, value.rounded);
                        }
                    }
                }
            }
        }
        Ok(gather.into_row(by_s))
    }

    /// The entries of a matrix law between some of its inputs and outputs, as (row, column) with equal inputs added.
    ///
    /// # Errors
    ///
    /// As [`Values::evaluate`].
    pub(crate) fn entries(
        &self,
        wiring: &Wiring<'n>,
        block: BlockId,
        inputs: &[SignalId],
        outputs: &[SignalId],
    ) -> Result<Vec<Vec<Fraction>>, Box<Diagnostic>> {
        let block = &wiring.netlist.blocks[block.index()];
        let Law::Matrix(rows) = &block.law else { return Ok(Vec::new()) };
        let mut entries = vec![vec![Fraction::zero(); inputs.len()]; outputs.len()];
        for (output, line) in outputs.iter().zip(&mut entries) {
            let Some(row) = rows.get(wiring.place(*output)) else { continue };
            for (&law, input) in row.iter().zip(&block.inputs) {
                if let Some(column) = inputs.iter().position(|i| i == input) {
                    line[column] = line[column].add(&self.evaluate(law)?.fraction);
                }
            }
        }
        Ok(entries)
    }
}

/// Gains of one row while they are gathered.
#[derive(Default)]
struct Gather {
    gains: Vec<(SignalId, Fraction)>,
    rounded: bool,
}

impl Gather {
    fn add(&mut self, u: SignalId, gain: Fraction, rounded: bool) {
        self.rounded |= rounded;
        self.gains.push((u, gain));
    }

    /// Adds up what is read twice and multiplies with all denominators, and the left side with s where `by_s` holds.
    fn into_row(mut self, by_s: bool) -> Row {
        self.gains.sort_by_key(|(u, _)| *u);
        self.gains.dedup_by(|next, kept| {
            let same = next.0 == kept.0;
            if same {
                kept.1 = kept.1.add(&next.1);
            }
            same
        });
        self.gains.retain(|(_, g)| !g.is_zero());
        let common = self.gains.iter().fold(Poly::one(), |m, (_, g)| least_common_multiple(&m, g.denominator()));
        let over = |g: &Fraction| {
            let factor = common.div_exact(g.denominator()).unwrap_or_else(Poly::one);
            g.numerator().mul(&factor)
        };
        let terms = self.gains.iter().map(|(u, g)| (*u, over(g))).collect();
        let left = if by_s { common.mul(&Poly::var(Var::S)) } else { common };
        Row { left, terms, rounded: self.rounded }
    }
}

/// The least common multiple of two polynomials that are not 0.
pub(crate) fn least_common_multiple(a: &Poly, b: &Poly) -> Poly {
    if a == b || b.is_one() {
        return a.clone();
    }
    if a.is_one() {
        return b.clone();
    }
    b.div_exact(&a.gcd(b)).map_or_else(|| a.mul(b), |rest| a.mul(&rest))
}
