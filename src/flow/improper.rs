//! Laws whose numerator's degree passes their denominator's.

use super::graph::Wiring;
use super::named;
use super::rows::Laws;
use super::system::{self, Part};
use crate::algebra::{Fraction, Var};
use crate::diagnostics::{Code, Diagnostic, Severity};
use crate::netlist::{Block, Equation, Netlist, SignalId, TimeBase};

/// A block with such a law, and the degrees of the worst of its entries.
#[derive(Clone, Copy, Debug)]
pub(super) struct Improper<'n> {
    pub(super) block: &'n Block,
    pub(super) above: u32,
    pub(super) below: u32,
}

/// The degrees of a fraction where it is improper.
pub(super) fn degrees(f: &Fraction) -> Option<(u32, u32)> {
    let (above, below) = (f.numerator().degree(Var::S), f.denominator().degree(Var::S));
    (above > below).then_some((above, below))
}

/// The degrees of the worst entry of a block with state equations that is improper. Only a derivative on the right of a
/// line can make one so.
pub(super) fn of_states(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    block: &Block,
    equations: &[Equation],
) -> Option<(u32, u32)> {
    let mut rows: Vec<SignalId> = equations.iter().map(|e| e.left).collect();
    rows.sort_unstable();
    rows.dedup();
    let part = Part::of(rows);
    let mut worst: Option<(u32, u32)> = None;
    for &input in &block.inputs {
        let equations = system::equations(wiring, laws, &part, Some(input), &[]).ok()?;
        let wanted: Vec<usize> = block.outputs.iter().filter_map(|&y| part.place(y)).collect();
        let solution = equations.system.solve(&equations.right, &wanted).ok()?;
        for numerator in solution.numerators {
            let entry = Fraction::new(numerator, solution.determinant.clone())?;
            if let Some((above, below)) = degrees(&entry) {
                worst = worst.filter(|(a, b)| a - b >= above - below).or(Some((above, below)));
            }
        }
    }
    worst
}

/// Tells them: an error in z; in s a note while every transfer function and return ratio that is named is proper, and a
/// warning otherwise.
pub(super) fn tell(wiring: &Wiring<'_>, laws: Option<&Laws<'_>>, found: &[Improper<'_>]) -> Vec<Diagnostic> {
    let net = wiring.netlist;
    if found.is_empty() {
        return Vec::new();
    }
    let severity = if net.time_base == TimeBase::Continuous {
        if laws.is_some_and(|laws| whole_is_proper(wiring, laws)) { Severity::Note } else { Severity::Warning }
    } else {
        Severity::Error
    };
    found.iter().map(|i| one(net, i, severity)).collect()
}

fn one(net: &Netlist, improper: &Improper<'_>, severity: Severity) -> Diagnostic {
    let Improper { block, above, below } = *improper;
    let name = net.names.get(block.name);
    let variable = if block.every.is_some() { "z" } else { "s" };
    let message =
        format!("`{name}` has an improper transfer function (law): degree {above} in {variable} over degree {below}");
    let power = above - below;
    let excess = if power == 1 { String::new() } else { format!("^{power}") };
    let (label, help) = if block.every.is_some() {
        (
            format!("answers {power} sample{} before it is asked", if power == 1 { "" } else { "s" }),
            format!("give it {power} more pole{} in z: divide by z{excess}", if power == 1 { "" } else { "s" }),
        )
    } else if severity == Severity::Note {
        (
            "grows with frequency".to_owned(),
            "what is asked for stays proper, so the results stand; the block alone can't be built like this".to_owned(),
        )
    } else {
        (
            "grows with frequency, and so does what is asked for".to_owned(),
            format!("give it as many poles as zeros, such as a filter: divide by (Tf*s + 1){excess}"),
        )
    };
    Diagnostic::new(Code::ImproperLaw, message)
        .severity(if block.every.is_some() { Severity::Error } else { severity })
        .label(block.origin.span, label)
        .help(help)
}

/// Whether every transfer function and return ratio that is named is proper; what can't be worked out here counts as
/// not.
fn whole_is_proper(wiring: &Wiring<'_>, laws: &Laws<'_>) -> bool {
    named::all(wiring.netlist)
        .iter()
        .all(|n| named::value(wiring, laws, n).is_ok_and(|(_, _, fraction)| degrees(&fraction).is_none()))
}
