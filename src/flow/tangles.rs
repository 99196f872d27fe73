//! Algebraic loops, exactly: sets of signals that depend on each other at once, without lag or dead time between them.
//!
//! The rows are looked at as s → ∞, dead times taken as 0 there. With proper laws the branches that matter are those
//! whose gain does not vanish. Where a law grows, as a derivative does, signals are scaled by powers of s until no branch
//! grows (a potential for each signal, by longest paths); the branches that do not vanish after that matter, so that
//! proportional-derivative control of a double integrator is no algebraic loop. Where even that fails, a loop's own
//! gain grows without bound.

use super::direct::exact_lead;
use super::graph::Wiring;
use super::rows::Laws;
use crate::algebra::solve::{SolveError, System};
use crate::algebra::{Fraction, Poly};
use crate::diagnostics::Diagnostic;
use crate::netlist::{Driver, SignalId};
use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};
use rustc_hash::FxHashMap;

/// A branch at infinite frequency: gain·s^power.
#[derive(Clone, Debug)]
pub(crate) struct Branch {
    /// Where it begins; a place in [`Tangle::signals`].
    pub(crate) from: usize,
    /// Where it ends.
    pub(crate) to: usize,
    /// Its gain, never 0.
    pub(crate) gain: Fraction,
    /// The power of s; 0 unless a law grows or falls off.
    pub(crate) power: i64,
}

/// Whether the equations of a tangle can be solved at infinite frequency.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) enum Solvable {
    /// det(I - D), not 0.
    Determinant(Fraction),
    /// The determinant is 0.
    No,
    /// Some loop's gain grows without bound.
    Grows,
    /// The determinant is too large to be written out.
    Undecided(String),
}

/// Signals that depend on each other at once.
#[derive(Clone, Debug)]
pub(crate) struct Tangle {
    /// The signals, in the order of their numbers.
    pub(crate) signals: Vec<SignalId>,
    /// The branches between them, in the order of their ends.
    pub(crate) branches: Vec<Branch>,
    /// Whether there is a solution.
    pub(crate) solvable: Solvable,
}

/// The tangles among some rows, where the readers of `open` see nothing. Tangles that lie within the state equations of
/// one block are left out unless they have no solution.
///
/// # Errors
///
/// What the laws say when they are worked out.
pub(crate) fn tangles(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    rows: &[SignalId],
    open: &[SignalId],
) -> Result<Vec<Tangle>, Box<Diagnostic>> {
    let places: FxHashMap<SignalId, usize> = rows.iter().enumerate().map(|(i, &v)| (v, i)).collect();
    let mut branches = Vec::new();
    for (to, &v) in rows.iter().enumerate() {
        let row = laws.row(wiring, v, |u| places.contains_key(&u) && !open.contains(&u))?;
        for (u, coefficient) in row.terms {
            let Some((power, above, below)) = exact_lead(&coefficient, &row.left) else { continue };
            let Some(gain) = Fraction::new(above, below) else { continue };
            branches.push(Branch { from: places[&u], to, gain, power });
        }
    }
    let mut found = Vec::new();
    for signals in components(rows.len(), &branches) {
        found.extend(within(&signals, &branches));
    }
    let mut out = Vec::new();
    for (members, inner, grows) in found {
        let signals: Vec<SignalId> = members.iter().map(|&m| rows[m]).collect();
        let solvable = if grows { Solvable::Grows } else { determinant(members.len(), &inner) };
        let tangle = Tangle { signals, branches: inner, solvable };
        if tangle.solvable == Solvable::No || !in_one_block(wiring, &tangle.signals) {
            out.push(tangle);
        }
    }
    out.sort_by(|a, b| a.signals.cmp(&b.signals));
    Ok(out)
}

/// Whether one block drives all of these signals by its own equations.
fn in_one_block(wiring: &Wiring<'_>, signals: &[SignalId]) -> bool {
    let net = wiring.netlist;
    let block = |v: &SignalId| match net.signals[v.index()].driver {
        Driver::Block(b) if matches!(net.blocks[b.index()].law, crate::netlist::Law::States(_)) => Some(b),
        _ => None,
    };
    let first = signals.first().and_then(block);
    first.is_some() && signals.iter().all(|v| block(v) == first)
}

/// Strongly connected components with a branch inside, each in rising order, in the order of their first members.
fn components(count: usize, branches: &[Branch]) -> Vec<Vec<usize>> {
    let mut graph = DiGraph::<(), ()>::new();
    for _ in 0..count {
        graph.add_node(());
    }
    for b in branches {
        graph.add_edge(NodeIndex::new(b.from), NodeIndex::new(b.to), ());
    }
    let mut out = Vec::new();
    for component in kosaraju_scc(&graph) {
        if component.len() > 1 || graph.contains_edge(component[0], component[0]) {
            let mut members: Vec<usize> = component.iter().map(|n| n.index()).collect();
            members.sort_unstable();
            out.push(members);
        }
    }
    out.sort();
    out
}

type Found = (Vec<usize>, Vec<Branch>, bool);

/// The tangles in one strongly connected component: members, branches between them by their places, and whether a
/// loop's gain grows without bound.
fn within(members: &[usize], branches: &[Branch]) -> Vec<Found> {
    let places: FxHashMap<usize, usize> = members.iter().enumerate().map(|(i, &m)| (m, i)).collect();
    let local = |b: &Branch| {
        let (from, to) = (*places.get(&b.from)?, *places.get(&b.to)?);
        Some(Branch { from, to, gain: b.gain.clone(), power: b.power })
    };
    let mut inner: Vec<Branch> = branches.iter().filter_map(local).collect();
    if inner.iter().all(|b| b.power < 0) {
        return Vec::new();
    }
    let Some(potential) = potentials(members.len(), &inner) else {
        inner.sort_by_key(|b| (b.to, b.from));
        return vec![(members.to_vec(), inner, true)];
    };
    inner.retain(|b| b.power + potential[b.from] == potential[b.to]);
    let mut out = Vec::new();
    for tight in components(members.len(), &inner) {
        let places: FxHashMap<usize, usize> = tight.iter().enumerate().map(|(i, &m)| (m, i)).collect();
        let mut own: Vec<Branch> = inner
            .iter()
            .filter_map(|b| {
                let (from, to) = (*places.get(&b.from)?, *places.get(&b.to)?);
                Some(Branch { from, to, gain: b.gain.clone(), power: b.power })
            })
            .collect();
        own.sort_by_key(|b| (b.to, b.from));
        out.push((tight.iter().map(|&m| members[m]).collect(), own, false));
    }
    out
}

/// For each signal the largest power of s that a path to it gains (Bellman and Ford), or `None` where a circle gains
/// without end.
fn potentials(count: usize, branches: &[Branch]) -> Option<Vec<i64>> {
    let mut potential = vec![0i64; count];
    for _ in 0..=count {
        let mut changed = false;
        for b in branches {
            let reached = potential[b.from] + b.power;
            if reached > potential[b.to] {
                potential[b.to] = reached;
                changed = true;
            }
        }
        if !changed {
            return Some(potential);
        }
    }
    None
}

/// det(I - D) over a tangle.
fn determinant(count: usize, branches: &[Branch]) -> Solvable {
    let mut system = System::default();
    let mut scale = Poly::one();
    for i in 0..count {
        let own: Vec<&Branch> = branches.iter().filter(|b| b.to == i).collect();
        let common = own.iter().fold(Poly::one(), |m, b| super::rows::least_common_multiple(&m, b.gain.denominator()));
        let mut row = vec![(i, common.clone())];
        for b in own {
            let factor = common.div_exact(b.gain.denominator()).unwrap_or_else(Poly::one);
            let coefficient = b.gain.numerator().mul(&factor);
            if b.from == i {
                row[0].1 = row[0].1.sub(&coefficient);
            } else {
                row.push((b.from, coefficient.neg()));
            }
        }
        row.retain(|(_, p)| !p.is_zero());
        row.sort_by_key(|e| e.0);
        system.rows.push(row);
        scale = scale.mul(&common);
    }
    match system.solve(&[], &[]) {
        Ok(solution) if solution.determinant.is_zero() => Solvable::No,
        Ok(solution) => Fraction::new(solution.determinant, scale).map_or(Solvable::No, Solvable::Determinant),
        Err(SolveError::Singular) => Solvable::No,
        Err(SolveError::Limit(text)) => Solvable::Undecided(text),
    }
}
