//! The requested transfer functions, one after the other.

use super::cases::{self, Cases};
use super::graph::Wiring;
use super::rows::Laws;
use super::system::{Failure, Part, Question, Solved};
use super::transfer::{self, Head};
use super::{
    DeriveOptions, Derived, Method, cancelled, characteristic, check, ill_posed, mason, modes, rates, system, verify,
};
use crate::algebra::{Fraction, Poly};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::{Asked, CaseId, Netlist, Request, RequestKind};
use crate::results::{Transfer, TransferKind};
use std::rc::Rc;

/// What all requests of one run have in common.
pub(super) struct Run<'n> {
    pub(super) wiring: Wiring<'n>,
    pub(super) options: DeriveOptions,
    pub(super) sampled: bool,
    pub(super) diagnostics: Vec<Diagnostic>,
    /// The values for which loops of the whole netlist were looked at.
    looked_at: Vec<Rc<Laws<'n>>>,
}

/// One entry of the list of results: a transfer function by its ends, or a return ratio, or zeros.
struct Item {
    kind: TransferKind,
    to: Vec<Asked>,
    from: Vec<Asked>,
    at: Vec<Asked>,
}

/// Works out every request of the netlist.
pub(super) fn derive(netlist: &Netlist, options: &DeriveOptions) -> Derived {
    let mut out = Derived::default();
    if let Some(diagnostic) = rates::unanswered(netlist) {
        out.diagnostics.push(diagnostic);
        return out;
    }
    let sampled = transfer::is_sampled(netlist.time_base);
    let mut run = Run {
        wiring: Wiring::new(netlist),
        options: *options,
        sampled,
        diagnostics: Vec::new(),
        looked_at: Vec::new(),
    };
    if sampled {
        check::early(&run.wiring).into_iter().for_each(|d| run.tell(d));
    }
    let mut cases = Cases::new(netlist);
    for request in &netlist.requests {
        let asked = cases::of(netlist, &request.clauses.cases, request.span, &mut run.diagnostics);
        for item in items(netlist, &request.kind) {
            for &case in &asked {
                let Some(laws) = cases.laws(case, &request.clauses.keep, &mut run.diagnostics) else { continue };
                run.whole_netlist(&laws);
                out.transfers.extend(run.item(&laws, request, &item, case));
            }
        }
    }
    if options.characteristic {
        out.characteristic = characteristic::of_whole(&mut run, &mut cases, &out.transfers);
    }
    out.diagnostics = run.diagnostics;
    out
}

/// What one request lists, in the order of the contract.
fn items(netlist: &Netlist, kind: &RequestKind) -> Vec<Item> {
    let plain =
        |to: Asked, from: Asked| Item { kind: TransferKind::Transfer, to: vec![to], from: vec![from], at: Vec::new() };
    let named = |signal| Asked { signal, text: netlist.signal_name(signal).to_owned() };
    match kind {
        RequestKind::Transfer { to, from } => vec![plain(to.clone(), from.clone())],
        RequestKind::All => {
            let inputs: Vec<_> = netlist.inputs().collect();
            netlist.outputs().flat_map(|y| inputs.iter().map(move |&r| plain(named(y), named(r)))).collect()
        }
        RequestKind::Loop { at } => {
            let entry = |to: &Asked, from: &Asked| Item {
                kind: TransferKind::Loop,
                to: vec![to.clone()],
                from: vec![from.clone()],
                at: at.clone(),
            };
            at.iter().flat_map(|to| at.iter().map(move |from| entry(to, from))).collect()
        }
        RequestKind::Zeros { to, from } => {
            vec![Item { kind: TransferKind::Zeros, to: to.clone(), from: from.clone(), at: Vec::new() }]
        }
    }
}

fn texts(asked: &[Asked]) -> Vec<String> {
    asked.iter().map(|a| a.text.clone()).collect()
}

/// A transfer function with its part, in lowest terms.
pub(super) struct Reduced {
    pub(super) part: Part,
    pub(super) solved: Solved,
    pub(super) fraction: Fraction,
}

impl<'n> Run<'n> {
    /// Tells every loop of the netlist that has no solution with these values, whether or not a request touches it.
    fn whole_netlist(&mut self, laws: &Rc<Laws<'n>>) {
        if self.looked_at.iter().any(|l| Rc::ptr_eq(l, laws)) {
            return;
        }
        self.looked_at.push(Rc::clone(laws));
        match ill_posed::all(&self.wiring, laws) {
            Ok(found) => found.into_iter().for_each(|d| self.tell(d)),
            Err(diagnostic) => self.tell(*diagnostic),
        }
    }

    /// Answers one item for one case; what can't be answered is told instead.
    fn item(&mut self, laws: &Laws<'n>, request: &Request, item: &Item, case: Option<CaseId>) -> Option<Transfer> {
        let head = self.head(laws, request, item, case);
        let mut open: Vec<_> = request.clauses.open.iter().chain(&item.at).map(|a| a.signal).collect();
        open.sort_unstable();
        open.dedup();
        if item.kind == TransferKind::Zeros {
            return self.zeros(laws, request, item, &open, head);
        }
        let question = Question { from: item.from[0].signal, to: item.to[0].signal, open: &open };
        let reduced = self.reduce(laws, &question, request)?;
        let fraction = if item.kind == TransferKind::Loop { reduced.fraction.neg() } else { reduced.fraction.clone() };
        let lost = self
            .told(
                system::characteristic(&self.wiring, laws, &reduced.part, Some(&question), &reduced.solved.determinant),
                request,
            )
            .map(|whole| cancelled::factors(&self.wiring, laws, &reduced.part, &whole, &reduced.fraction))?;
        let rounded = reduced.solved.rounded;
        let words = cancelled::told(laws, &lost, rounded);
        let mut result =
            transfer::result(&laws.values, self.sampled, head, &fraction, rounded, words, self.options.roots);
        if self.options.verify {
            let verified = verify::verify(&self.wiring, laws, &reduced.part, &question, &reduced.fraction);
            result.verified = self.told(verified.map_err(Failure::Told), request);
        }
        Some(result)
    }

    fn head(&self, laws: &Laws<'n>, request: &Request, item: &Item, case: Option<CaseId>) -> Head {
        let (to, from) = (texts(&item.to).join(","), texts(&item.from).join(","));
        Head {
            kind: item.kind,
            from: if item.kind == TransferKind::Loop && item.at.len() == 1 { format!("loop at {from}") } else { from },
            to,
            at: texts(&item.at),
            open: texts(&request.clauses.open),
            case: cases::name(self.wiring.netlist, case),
            sampling_period: rates::period(self.wiring.netlist, laws),
        }
    }

    /// Solves one question by the method that was asked for.
    fn reduce(&mut self, laws: &Laws<'n>, question: &Question<'_>, request: &Request) -> Option<Reduced> {
        let part = Part::between(&self.wiring, question);
        let unsolvable = ill_posed::at_infinity(&self.wiring, laws, question);
        if let Some(diagnostic) = self.told(unsolvable.map_err(Failure::Told), request)? {
            self.tell(diagnostic);
            return None;
        }
        let solved = match self.options.method {
            Method::Elimination => system::solve(&self.wiring, laws, &part, question),
            Method::Mason => mason::solve(&self.wiring, laws, &part, question),
        };
        if matches!(solved, Err(Failure::Singular)) {
            let told = ill_posed::singular(&self.wiring, laws, &part, question.open);
            self.tell(told);
            return None;
        }
        let solved = self.told(solved, request)?;
        let fraction = Fraction::new(solved.numerator.clone(), solved.determinant.clone())?;
        Some(Reduced { part, solved, fraction })
    }

    /// The transmission zeros of a matrix: the zero polynomial over 1.
    fn zeros(
        &mut self,
        laws: &Laws<'n>,
        request: &Request,
        item: &Item,
        open: &[crate::netlist::SignalId],
        head: Head,
    ) -> Option<Transfer> {
        let mut matrix = Vec::new();
        let mut rounded = false;
        for to in &item.to {
            let mut line = Vec::new();
            for from in &item.from {
                let question = Question { from: from.signal, to: to.signal, open };
                let reduced = self.reduce(laws, &question, request)?;
                rounded |= reduced.solved.rounded;
                line.push(reduced.fraction);
            }
            matrix.push(line);
        }
        let zeros = self.told(modes::zeros(&matrix).map_err(Failure::Limit), request)?;
        let zeros = cancelled::primitive(&zeros);
        let fraction = Fraction::new(zeros, Poly::one())?;
        let mut result =
            transfer::result(&laws.values, self.sampled, head, &fraction, rounded, Vec::new(), self.options.roots);
        // What holds of a transfer function means nothing of a polynomial of zeros.
        (result.poles, result.dc_gain, result.stable) = (None, None, None);
        Some(result)
    }

    /// The result, or its failure told once.
    pub(super) fn told<T>(&mut self, result: Result<T, Failure>, request: &Request) -> Option<T> {
        match result {
            Ok(value) => Some(value),
            Err(Failure::Told(diagnostic)) => {
                self.tell(*diagnostic);
                None
            }
            Err(Failure::Limit(text)) => {
                self.tell(
                    Diagnostic::new(Code::LimitReached, format!("this request is too large to answer: {text}"))
                        .label(request.span, "asked for here")
                        .help("keep fewer symbols, open a loop with `with … open`, or ask for a part of it"),
                );
                None
            }
            // Callers that can meet it tell it with the loop's own lines.
            Err(Failure::Singular) => None,
        }
    }

    /// Adds a diagnostic unless it is there already.
    pub(super) fn tell(&mut self, diagnostic: Diagnostic) {
        if !self.diagnostics.contains(&diagnostic) {
            self.diagnostics.push(diagnostic);
        }
    }
}
