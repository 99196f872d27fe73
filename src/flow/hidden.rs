//! Unstable modes that do not show in what is asked for.

use super::cancelled;
use super::characteristic;
use super::graph::Wiring;
use super::named::{self, Named};
use super::rows::Laws;
use super::system::{self, Part, Question};
use super::text::{self, Names};
use crate::algebra::factor::factor_with;
use crate::algebra::{Poly, Var, decimal, functions};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::values::PI;
use crate::netlist::{BlockId, Driver, Law, Metric, RequirementKind, SignalId, TimeBase};
use crate::source::Span;

/// The largest order of a netlist whose modes `check` looks at: it is run at each key of an editor.
const MAX_STATES: u32 = 60;

/// The most named transfer functions that are looked at: each is worked out.
const MAX_NAMED: usize = 60;

/// What is known of one named transfer function.
struct Shown<'a> {
    named: &'a Named,
    /// The polynomial whose roots it shows.
    shown: Poly,
    /// What its part has and it lacks.
    lost: Poly,
}

/// `hidden-unstable-mode` for each unstable factor of the characteristic polynomial that a named transfer function has
/// cancelled, or that none shows. Modes on the axis or the circle count only where they are cancelled: an integrator at
/// an output that is not asked for is no mistake.
pub(super) fn modes(wiring: &Wiring<'_>, laws: &Laws<'_>) -> Vec<Diagnostic> {
    let net = wiring.netlist;
    let all = named::all(net);
    if all.is_empty() || all.len() > MAX_NAMED || net.time_base == TimeBase::Mixed {
        return Vec::new();
    }
    if states(wiring, laws).is_none_or(|states| states > MAX_STATES) {
        return Vec::new();
    }
    let Ok((whole, _)) = characteristic::whole(wiring, laws) else { return Vec::new() };
    let whole = whole.substitute(PI, &functions::pi()).0;
    if whole.variables().iter().any(|&v| v != Var::S) || whole.degree(Var::S) > MAX_STATES {
        return Vec::new();
    }
    let sampled = net.time_base == TimeBase::Sampled;
    if decimal::is_stable(&whole, sampled) != Some(false) {
        return Vec::new();
    }
    let plain = |named: &&Named| !named.cut;
    let shown: Vec<Shown<'_>> = all.iter().filter(plain).filter_map(|n| look_at(wiring, laws, n)).collect();
    if shown.is_empty() {
        return Vec::new();
    }
    let known: Vec<Poly> = shown.iter().flat_map(|s| [s.shown.clone(), s.lost.clone()]).collect();
    let mut out = Vec::new();
    for (f, times) in factor_with(&whole, &known).factors {
        if decimal::is_stable(&f, sampled) != Some(false) {
            continue;
        }
        let lacking: Vec<&Shown<'_>> =
            shown.iter().filter(|s| characteristic::multiplicity(&f, &s.shown) < times).collect();
        let cancelled: Vec<&Shown<'_>> =
            lacking.iter().copied().filter(|s| s.lost.gcd(&f).degree(Var::S) > 0).collect();
        let nowhere = lacking.len() == shown.len() && !judged_as_a_whole(wiring) && decimal::has_outside(&f, sampled);
        let from = if !cancelled.is_empty() {
            cancelled
        } else if nowhere {
            lacking
        } else {
            continue;
        };
        out.push(tell(wiring, laws, &f, &from));
    }
    out
}

/// At most how many states a netlist has, or `None` where it is too large or a law has no value.
fn states(wiring: &Wiring<'_>, laws: &Laws<'_>) -> Option<u32> {
    let rows = Part::whole(wiring).rows;
    if rows.len() > named::MAX_ROWS {
        return None;
    }
    rows.iter().try_fold(0, |sum, &v| Some(sum + laws.row(wiring, v, |_| true).ok()?.left.degree(Var::S)))
}

/// Whether a requirement speaks of all modes, so that none is hidden from it.
fn judged_as_a_whole(wiring: &Wiring<'_>) -> bool {
    wiring.netlist.requirements.iter().any(|r| match &r.kind {
        RequirementKind::Stable => true,
        RequirementKind::Figure { metric, .. } => matches!(metric, Metric::DampingRatio | Metric::DecayRate),
    })
}

fn look_at<'a>(wiring: &Wiring<'_>, laws: &Laws<'_>, named: &'a Named) -> Option<Shown<'a>> {
    let (part, solved, fraction) = named::value(wiring, laws, named).ok()?;
    let question = Question { from: named.from, to: named.to, open: &named.open };
    let whole = system::characteristic(wiring, laws, &part, Some(&question), &solved.determinant).ok()?;
    let lost = cancelled::rest(&whole, &fraction)?;
    // A return ratio is solved for its negative.
    let shown = characteristic::shown(named.kind, &fraction.numerator().neg(), fraction.denominator())?;
    let number = |p: &Poly| p.substitute(PI, &functions::pi()).0;
    Some(Shown { named, shown: number(&shown), lost: number(&lost) })
}

fn tell(wiring: &Wiring<'_>, laws: &Laws<'_>, f: &Poly, from: &[&Shown<'_>]) -> Diagnostic {
    let names = Names::of(&laws.values, [f]);
    let factor = text::monic(&names, f);
    let mode = if f.degree(Var::S) == 1 {
        let root = crate::algebra::Fraction::new(f.coefficient(Var::S, 0).neg(), f.coefficient(Var::S, 1));
        let root = root.map_or_else(String::new, |r| text::fraction(&names, &r));
        let variable = if wiring.netlist.time_base == TimeBase::Sampled { "z" } else { "s" };
        format!("the unstable mode {variable} = {root}")
    } else {
        format!("the unstable modes where {factor} = 0")
    };
    let mut requests: Vec<String> = from.iter().map(|s| format!("`{}`", s.named.text)).collect();
    requests.dedup();
    let places: Vec<Span> = from.iter().map(|s| s.named.span).collect();
    let mut out = Diagnostic::new(
        Code::HiddenUnstableMode,
        format!(
            "{mode} of the netlist {} hidden from {}",
            if f.degree(Var::S) == 1 { "is" } else { "are" },
            requests.join(", ")
        ),
    )
    .help("a cancelled unstable mode still grows inside the loop: move the zero, or close a loop that moves the mode");
    for (i, span) in places.iter().enumerate() {
        if !places[..i].contains(span) {
            out = out.label(*span, format!("{} does not show it", requests.get(i).map_or("this", |r| r)));
        }
    }
    for block in homes(wiring, laws, f) {
        let block = &wiring.netlist.blocks[block.index()];
        let name = wiring.netlist.names.get(block.name);
        out = out.label(block.origin.span, format!("it lives in block `{name}`, where {factor} is a factor below"));
    }
    out
}

/// The blocks whose own denominator has the factor, or a part of it.
fn homes(wiring: &Wiring<'_>, laws: &Laws<'_>, f: &Poly) -> Vec<BlockId> {
    let net = wiring.netlist;
    let has = |p: &Poly| p.substitute(PI, &functions::pi()).0.gcd(f).degree(Var::S) > 0;
    let own = |(i, block): (usize, &crate::netlist::Block)| {
        let exprs: Vec<_> = match &block.law {
            Law::Scalar(law) => vec![*law],
            Law::Matrix(rows) => rows.iter().flat_map(|r| r.iter().copied()).collect(),
            Law::States(_) => return states_have(wiring, laws, BlockId(i as u32), &has).then_some(BlockId(i as u32)),
        };
        let any = exprs.into_iter().any(|e| laws.evaluate(e).is_ok_and(|v| has(v.fraction.denominator())));
        any.then_some(BlockId(i as u32))
    };
    net.blocks.iter().enumerate().filter_map(own).collect()
}

/// Whether the characteristic polynomial of a block's own state equations has a factor.
fn states_have(wiring: &Wiring<'_>, laws: &Laws<'_>, block: BlockId, has: &dyn Fn(&Poly) -> bool) -> bool {
    let signals = wiring.netlist.signals.iter().enumerate();
    let own = signals.filter(|(_, s)| s.driver == Driver::Block(block)).map(|(i, _)| SignalId(i as u32));
    let part = Part::of(own.collect());
    let Ok(equations) = system::equations(wiring, laws, &part, None, &[]) else { return false };
    equations.system.solve(&[], &[]).is_ok_and(|s| has(&s.determinant))
}
