//! The signal equations of the part of a netlist that one transfer function goes through, as a system with polynomial
//! coefficients (Rosenbrock, State-space and multivariable theory, 1970): its determinant has the part's modes as roots.
//!
//! What a cut and a test signal mean: let d be what a signal's driver gives, and r what its readers see. With a test
//! signal t at x, r = d + t, and r is what a request for x gets; where x is cut, r = t, and a request gets d. Elsewhere
//! r = d, or 0 where the signal is cut. The unknowns are the d.

use super::graph::Wiring;
use super::modes;
use super::rows::Laws;
use crate::algebra::Poly;
use crate::algebra::solve::{SolveError, System};
use crate::diagnostics::Diagnostic;
use crate::netlist::{BlockId, Driver, Law, SignalId};
use rustc_hash::FxHashMap;

/// One transfer function by its ends.
#[derive(Clone, Debug)]
pub(crate) struct Question<'q> {
    /// Where the test signal is added.
    pub(crate) from: SignalId,
    /// What answers.
    pub(crate) to: SignalId,
    /// What is cut.
    pub(crate) open: &'q [SignalId],
}

/// The rows that a transfer function goes through: all that the test signal reaches and that reach what answers.
#[derive(Clone, Debug)]
pub(crate) struct Part {
    /// The signals of those rows, in the order of their numbers.
    pub(crate) rows: Vec<SignalId>,
    places: FxHashMap<SignalId, usize>,
    /// Whether what comes from outside counts: then a block that reads an input only has its modes all the same.
    whole: bool,
}

/// The system of a part, with what is known beside its coefficients.
#[derive(Debug)]
pub(crate) struct Equations {
    /// A row and a column for each signal of the part.
    pub(crate) system: System,
    /// What the test signal gives: (row, coefficient).
    pub(crate) right: Vec<(usize, Poly)>,
    /// Whether some value was rounded.
    pub(crate) rounded: bool,
}

/// A transfer function that is not in lowest terms yet: `numerator / determinant`.
#[derive(Debug)]
pub(crate) struct Solved {
    /// What stands above.
    pub(crate) numerator: Poly,
    /// The determinant of the system, 1 for a part without rows.
    pub(crate) determinant: Poly,
    /// Whether some value was rounded.
    pub(crate) rounded: bool,
}

/// Why there is no transfer function.
#[derive(Debug)]
pub(crate) enum Failure {
    /// The signal equations of the part have no solution, or more than one.
    Singular,
    /// Told as it is.
    Told(Box<Diagnostic>),
    /// A limit of the arithmetic.
    Limit(String),
}

impl From<Box<Diagnostic>> for Failure {
    fn from(diagnostic: Box<Diagnostic>) -> Self {
        Self::Told(diagnostic)
    }
}

impl Part {
    /// The part between the two ends of a question.
    pub(crate) fn between(wiring: &Wiring<'_>, question: &Question<'_>) -> Self {
        let reached = wiring.reached_from(question.from, question.open);
        let mut rows = Vec::new();
        if reached[question.to.index()] {
            let needed = wiring.needed_for([question.to], question.open);
            rows = ids_where(&reached, &needed);
        }
        Self::of(rows)
    }

    /// The part with these rows, which must come in the order of their numbers.
    pub(crate) fn of(rows: Vec<SignalId>) -> Self {
        let places = rows.iter().enumerate().map(|(i, &v)| (v, i)).collect();
        Self { rows, places, whole: false }
    }

    /// Every row of a netlist.
    pub(crate) fn whole(wiring: &Wiring<'_>) -> Self {
        let signals = wiring.netlist.signals.iter().enumerate();
        let driven = signals.filter(|(_, s)| !matches!(s.driver, Driver::Input | Driver::Nothing));
        Self { whole: true, ..Self::of(driven.map(|(i, _)| SignalId(i as u32)).collect()) }
    }

    /// The place of a signal's row.
    pub(crate) fn place(&self, v: SignalId) -> Option<usize> {
        self.places.get(&v).copied()
    }
}

fn ids_where(a: &[bool], b: &[bool]) -> Vec<SignalId> {
    a.iter().zip(b).enumerate().filter(|(_, (a, b))| **a && **b).map(|(i, _)| SignalId(i as u32)).collect()
}

/// The signal equations of a part, with a test signal at `from`.
///
/// # Errors
///
/// What the laws say when they are worked out.
pub(crate) fn equations(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    from: Option<SignalId>,
    open: &[SignalId],
) -> Result<Equations, Box<Diagnostic>> {
    let mut out = Equations { system: System::default(), right: Vec::new(), rounded: false };
    for (i, &v) in part.rows.iter().enumerate() {
        let counts = |u| part.whole || Some(u) == from || (part.place(u).is_some() && !open.contains(&u));
        let row = laws.row(wiring, v, counts)?;
        out.rounded |= row.rounded;
        let mut line = vec![(i, row.left)];
        for (u, coefficient) in row.terms {
            if Some(u) == from {
                out.right.push((i, coefficient.clone()));
            }
            let Some(j) = part.place(u).filter(|_| !open.contains(&u)) else { continue };
            if i == j {
                line[0].1 = line[0].1.sub(&coefficient);
            } else {
                line.push((j, coefficient.neg()));
            }
        }
        line.retain(|(_, p)| !p.is_zero());
        line.sort_by_key(|(j, _)| *j);
        out.system.rows.push(line);
    }
    Ok(out)
}

/// Solves a question over its part by elimination.
///
/// # Errors
///
/// [`Failure`].
pub(crate) fn solve(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    question: &Question<'_>,
) -> Result<Solved, Failure> {
    let mut solved = Solved { numerator: Poly::zero(), determinant: Poly::one(), rounded: false };
    if let Some(wanted) = part.place(question.to) {
        let equations = equations(wiring, laws, part, Some(question.from), question.open)?;
        let mut solution = equations.system.solve(&equations.right, &[wanted]).map_err(|error| match error {
            SolveError::Singular => Failure::Singular,
            SolveError::Limit(text) => Failure::Limit(text),
        })?;
        solved.numerator = solution.numerators.pop().unwrap_or_default();
        solved.determinant = solution.determinant;
        solved.rounded = equations.rounded;
    }
    if question.from == question.to && !question.open.contains(&question.to) {
        solved.numerator = solved.numerator.add(&solved.determinant);
    }
    Ok(solved)
}

/// The characteristic polynomial of a part whose system has this determinant: with the modes of the least realization
/// of each matrix law in place of those of its rows. Up to a factor without s.
///
/// # Errors
///
/// [`Failure`].
pub(crate) fn characteristic(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    question: Option<&Question<'_>>,
    determinant: &Poly,
) -> Result<Poly, Failure> {
    let open = question.map_or(&[][..], |q| q.open);
    let from = question.map(|q| q.from);
    let mut result = determinant.clone();
    let mut outputs: FxHashMap<BlockId, Vec<SignalId>> = FxHashMap::default();
    let mut order = Vec::new();
    for &v in &part.rows {
        let Driver::Block(block) = wiring.netlist.signals[v.index()].driver else { continue };
        if matches!(wiring.netlist.blocks[block.index()].law, Law::Matrix(_)) {
            let known = outputs.entry(block).or_insert_with(|| {
                order.push(block);
                Vec::new()
            });
            known.push(v);
        }
    }
    for block in order {
        let sees =
            |u: &SignalId| Some(*u) == from || question.is_none() || (part.place(*u).is_some() && !open.contains(u));
        let mut inputs: Vec<SignalId> =
            wiring.netlist.blocks[block.index()].inputs.iter().copied().filter(sees).collect();
        inputs.sort_unstable();
        inputs.dedup();
        let entries = laws.entries(wiring, block, &inputs, &outputs[&block])?;
        let (rows, least) = modes::of_rows_and_least(&entries).map_err(Failure::Limit)?;
        // The rows' denominators have all modes of the least realization, and perhaps more.
        if let Some(more) = rows.div_exact(&rows.gcd(&least)) {
            result = result.div_exact(&more).unwrap_or(result);
        }
    }
    Ok(result)
}
