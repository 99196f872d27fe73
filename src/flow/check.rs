//! What only the graph can tell: one pass over everything, and a closer look where something shows.

use super::cases::Cases;
use super::direct::{self, Lead, Leads};
use super::graph::Wiring;
use super::improper::{self, Improper};
use super::rows::Laws;
use super::{hidden, loops, named, rates, tangles, unused};
use crate::diagnostics::Diagnostic;
use crate::netlist::expr::ExprId;
use crate::netlist::{Keep, Law, Netlist};
use std::rc::Rc;

/// Values for the nominal case that are worked out when the first one is needed.
struct Late<'n> {
    cases: Cases<'n>,
    diagnostics: Vec<Diagnostic>,
}

impl<'n> Late<'n> {
    fn laws(&mut self) -> Option<Rc<Laws<'n>>> {
        self.cases.laws(None, &Keep::Nothing, &mut self.diagnostics)
    }

    fn tell(&mut self, diagnostic: Diagnostic) {
        if !self.diagnostics.contains(&diagnostic) {
            self.diagnostics.push(diagnostic);
        }
    }
}

/// All diagnostics of this room, in the order of what they are about.
pub(super) fn check(netlist: &Netlist) -> Vec<Diagnostic> {
    let wiring = Wiring::new(netlist);
    let mut leads = Leads::new(netlist, None, &Keep::Nothing);
    let mut late = Late { cases: Cases::new(netlist), diagnostics: Vec::new() };
    let improper = laws(&wiring, &mut leads, &mut late);
    let sound = late.diagnostics.is_empty();
    if let Some(diagnostic) = rates::mixed(netlist) {
        late.tell(diagnostic);
    }
    if sound {
        for signals in direct::candidates(&wiring, &mut leads) {
            let Some(laws) = late.laws() else { break };
            match tangles::tangles(&wiring, &laws, &signals, &[]) {
                Ok(found) => found.iter().for_each(|t| late.tell(loops::tell(&wiring, &laws, t))),
                Err(diagnostic) => late.tell(*diagnostic),
            }
        }
    }
    let known = if sound && !improper.is_empty() { late.laws() } else { None };
    late.diagnostics.extend(improper::tell(&wiring, known.as_deref(), &improper));
    late.diagnostics.extend(unused::blocks(&wiring));
    let small = netlist.signals.len() <= 4 * named::MAX_ROWS;
    if sound && small && !late.diagnostics.iter().any(Diagnostic::is_error) {
        if let Some(laws) = late.laws() {
            late.diagnostics.extend(hidden::modes(&wiring, &laws));
        }
    }
    late.diagnostics
}

/// The laws that would answer before they are asked, in z: results are no use to anybody then.
pub(super) fn early(wiring: &Wiring<'_>) -> Vec<Diagnostic> {
    let mut leads = Leads::new(wiring.netlist, None, &Keep::Nothing);
    let mut late = Late { cases: Cases::new(wiring.netlist), diagnostics: Vec::new() };
    let found = laws(wiring, &mut leads, &mut late);
    improper::tell(wiring, None, &found)
}

/// Looks at every law, coefficient and factor: tells those that have no value, and gives the blocks whose law is
/// improper.
fn laws<'n>(wiring: &Wiring<'n>, leads: &mut Leads<'n>, late: &mut Late<'n>) -> Vec<Improper<'n>> {
    let netlist = wiring.netlist;
    let mut found = Vec::new();
    for term in &netlist.terms {
        if let Some(factor) = term.factor {
            look_at(factor, leads, late);
        }
    }
    for block in &netlist.blocks {
        let mut worst = None;
        let mut entry = |law: ExprId, leads: &mut Leads<'n>, late: &mut Late<'n>| {
            if let Some((above, below)) = look_at(law, leads, late) {
                if worst.is_none_or(|(a, b)| above - below > a - b) {
                    worst = Some((above, below));
                }
            }
        };
        match &block.law {
            Law::Scalar(law) => entry(*law, leads, late),
            Law::Matrix(rows) => rows.iter().flat_map(|r| r.iter()).for_each(|&law| entry(law, leads, late)),
            Law::States(equations) => {
                let terms = || equations.iter().flat_map(|e| e.terms.iter());
                terms().for_each(|t| entry(t.coefficient, leads, late));
                if terms().any(|t| t.derivative) && equations.len() <= named::MAX_ROWS {
                    worst = late.laws().and_then(|laws| improper::of_states(wiring, &laws, block, equations));
                }
            }
        }
        found.extend(worst.map(|(above, below)| Improper { block, above, below }));
    }
    found
}

/// The degrees of an expression that is improper; where its leading term does not settle it, or it has a dead time whose
/// form has to be looked at, its exact value is worked out.
fn look_at<'n>(expr: ExprId, leads: &mut Leads<'n>, late: &mut Late<'n>) -> Option<(u32, u32)> {
    match leads.of(expr) {
        Lead::Zero => return None,
        Lead::Term { power, delay: None, .. } if power <= 0 => return None,
        _ => {}
    }
    let laws = late.laws()?;
    match laws.evaluate(expr) {
        Ok(value) => improper::degrees(&value.fraction),
        Err(diagnostic) => {
            late.tell(*diagnostic);
            None
        }
    }
}
