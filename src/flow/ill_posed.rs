//! Requests that have no answer: the signal equations of their part are singular, or an algebraic loop in it has no
//! solution at infinite frequency.

use super::graph::Wiring;
use super::residue::{Point, Residues};
use super::rows::Laws;
use super::system::{self, Part, Question};
use super::tangles::{self, Solvable};
use super::walk;
use crate::algebra::prime::Prime;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::SignalId;
use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};

/// Every algebraic loop of a netlist without a solution, no signal cut.
///
/// # Errors
///
/// What the laws say when they are worked out.
pub(super) fn all<'n>(wiring: &Wiring<'n>, laws: &Laws<'n>) -> Result<Vec<Diagnostic>, Box<Diagnostic>> {
    let mut out = Vec::new();
    for set in laws.candidates(wiring) {
        let found = tangles::tangles(wiring, laws, set, &[])?;
        let none = found.iter().filter(|t| t.solvable == Solvable::No);
        out.extend(none.map(|tangle| super::loops::tell(wiring, laws, tangle)));
    }
    Ok(out)
}

/// The first algebraic loop without a solution among those that a signal depends on, whether or not the test signal
/// reaches it: the signal has no value then.
///
/// # Errors
///
/// What the laws say when they are worked out.
pub(super) fn at_infinity<'n>(
    wiring: &Wiring<'n>,
    laws: &Laws<'n>,
    question: &Question<'_>,
) -> Result<Option<Diagnostic>, Box<Diagnostic>> {
    let candidates = laws.candidates(wiring);
    if candidates.is_empty() {
        return Ok(None);
    }
    let needed = wiring.needed_for([question.to], question.open);
    for set in candidates {
        let rows: Vec<SignalId> = set.iter().copied().filter(|v| needed[v.index()]).collect();
        let found = tangles::tangles(wiring, laws, &rows, question.open)?;
        if let Some(tangle) = found.iter().find(|t| t.solvable == Solvable::No) {
            return Ok(Some(super::loops::tell(wiring, laws, tangle)));
        }
    }
    Ok(None)
}

/// What makes the equations of a part singular, whatever the frequency: the strongly connected parts of it whose own
/// equations are.
pub(super) fn singular(wiring: &Wiring<'_>, laws: &Laws<'_>, part: &Part, open: &[SignalId]) -> Diagnostic {
    let mut diagnostic = Diagnostic::new(
        Code::IllPosedLoop,
        "the signal equations of this loop have no solution, or more than one, at every frequency",
    )
    .help("the loop gain is exactly 1 here: change a gain or a sign, or take one of the paths out");
    let Ok(equations) = system::equations(wiring, laws, part, None, open) else { return diagnostic };
    let mut graph = DiGraph::<(), ()>::new();
    part.rows.iter().for_each(|_| {
        graph.add_node(());
    });
    for (i, row) in equations.system.rows.iter().enumerate() {
        row.iter().for_each(|(j, _)| {
            graph.add_edge(NodeIndex::new(*j), NodeIndex::new(i), ());
        });
    }
    let point = Point::new(Prime::first(), 0);
    for component in kosaraju_scc(&graph) {
        let mut members: Vec<usize> = component.iter().map(|n| n.index()).collect();
        members.sort_unstable();
        let inside = |j: &usize| members.binary_search(j).ok();
        let rows = members.iter().map(|&i| {
            let row = equations.system.rows[i].iter().filter_map(|(j, p)| inside(j).map(|j| (j, point.of(p))));
            row.filter(|e| e.1 != 0).collect()
        });
        let system = Residues { rows: rows.collect(), right: Vec::new() };
        if system.determinant(&point.prime) == 0 {
            for &i in &members {
                let (span, name) = walk::element(wiring, part.rows[i]);
                diagnostic = diagnostic.label(span, format!("{name} is on the loop"));
            }
        }
    }
    diagnostic
}
