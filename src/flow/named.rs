//! What the requests and requirements of a netlist name, each with its place, and its value for the nominal case.

use super::graph::Wiring;
use super::rows::Laws;
use super::system::{self, Failure, Part, Question, Solved};
use crate::algebra::Fraction;
use crate::netlist::{Asked, Metric, Netlist, RequestKind, RequirementKind, SignalId};
use crate::results::TransferKind;
use crate::source::Span;

/// The largest part that `check` works out a transfer function for: it is run at each key of an editor.
pub(super) const MAX_ROWS: usize = 150;

/// One transfer function or return ratio that the text names.
#[derive(Clone, Debug)]
pub(super) struct Named {
    /// Which of the two.
    pub(super) kind: TransferKind,
    /// The signal that answers.
    pub(super) to: SignalId,
    /// Where the test signal is added.
    pub(super) from: SignalId,
    /// What is cut, the loop's own cut included.
    pub(super) open: Vec<SignalId>,
    /// Whether more than the loop's own cut is cut.
    pub(super) cut: bool,
    /// `y/r`, `loop at u`.
    pub(super) text: String,
    /// Where it is named.
    pub(super) span: Span,
}

/// Everything that is named, in the order of the text, requests first.
pub(super) fn all(netlist: &Netlist) -> Vec<Named> {
    let mut out = Vec::new();
    for request in &netlist.requests {
        let open = &request.clauses.open;
        match &request.kind {
            RequestKind::Transfer { to, from } => out.push(transfer(to, from, open, request.span)),
            RequestKind::All => {
                let named = |s| Asked { signal: s, text: netlist.signal_name(s).to_owned() };
                let inputs: Vec<Asked> = netlist.inputs().map(named).collect();
                for to in netlist.outputs().map(named) {
                    out.extend(inputs.iter().map(|from| transfer(&to, from, open, request.span)));
                }
            }
            RequestKind::Loop { at } => out.extend(at.iter().map(|u| cut_at(u, at, open, request.span))),
            RequestKind::Zeros { to, from } => {
                for to in to {
                    out.extend(from.iter().map(|from| transfer(to, from, open, request.span)));
                }
            }
        }
    }
    for requirement in &netlist.requirements {
        let RequirementKind::Figure { metric, .. } = &requirement.kind else { continue };
        let (open, span) = (&requirement.clauses.open, requirement.span);
        match metric {
            Metric::GainMargin(u)
            | Metric::PhaseMargin(u)
            | Metric::DelayMargin(u)
            | Metric::ModulusMargin(u)
            | Metric::Crossover(u) => out.push(cut_at(u, std::slice::from_ref(u), open, span)),
            Metric::Peak(pair)
            | Metric::Bandwidth(pair)
            | Metric::Magnitude(pair, ..)
            | Metric::Overshoot(pair)
            | Metric::RiseTime(pair)
            | Metric::SettlingTime(pair, _)
            | Metric::FinalValue(pair, _) => out.push(transfer(&pair.to, &pair.from, open, span)),
            Metric::DampingRatio | Metric::DecayRate => {}
        }
    }
    out
}

fn transfer(to: &Asked, from: &Asked, open: &[Asked], span: Span) -> Named {
    Named {
        kind: TransferKind::Transfer,
        to: to.signal,
        from: from.signal,
        open: open.iter().map(|a| a.signal).collect(),
        cut: !open.is_empty(),
        text: format!("{}/{}", to.text, from.text),
        span,
    }
}

fn cut_at(u: &Asked, at: &[Asked], open: &[Asked], span: Span) -> Named {
    Named {
        kind: TransferKind::Loop,
        to: u.signal,
        from: u.signal,
        open: open.iter().chain(at).map(|a| a.signal).collect(),
        cut: !open.is_empty() || at.len() > 1,
        text: format!("loop at {}", u.text),
        span,
    }
}

/// Works out what is named, without its sign where it is a return ratio: part, solution, fraction in lowest terms.
///
/// # Errors
///
/// [`Failure`]; [`Failure::Limit`] for more than [`MAX_ROWS`] rows.
pub(super) fn value(wiring: &Wiring<'_>, laws: &Laws<'_>, named: &Named) -> Result<(Part, Solved, Fraction), Failure> {
    let question = Question { from: named.from, to: named.to, open: &named.open };
    let part = Part::between(wiring, &question);
    if part.rows.len() > MAX_ROWS {
        return Err(Failure::Limit(format!("{} signals, and {MAX_ROWS} are the limit here", part.rows.len())));
    }
    let solved = system::solve(wiring, laws, &part, &question)?;
    let fraction = Fraction::new(solved.numerator.clone(), solved.determinant.clone()).ok_or(Failure::Singular)?;
    Ok((part, solved, fraction))
}
