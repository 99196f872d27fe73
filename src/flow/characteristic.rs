//! The characteristic polynomial of a whole netlist, and which of its factors the requests do not show.

use super::cancelled;
use super::cases::{self, Cases};
use super::derive::Run;
use super::graph::Wiring;
use super::ill_posed;
use super::rows::Laws;
use super::system::{self, Failure, Part};
use super::text::{self, Names};
use super::transfer;
use crate::algebra::solve::SolveError;
use crate::algebra::{Poly, Var};
use crate::netlist::values::PARAMS;
use crate::netlist::{CaseId, Clauses, Keep, Request, RequestKind};
use crate::results::{Characteristic, Form, HiddenFactor, Transfer, TransferKind};
use crate::source::Span;
use std::sync::Arc;

/// The characteristic polynomial of every row of a netlist, primitive in s, and whether a value was rounded.
///
/// # Errors
///
/// [`Failure`].
pub(super) fn whole(wiring: &Wiring<'_>, laws: &Laws<'_>) -> Result<(Poly, bool), Failure> {
    let part = Part::whole(wiring);
    if part.rows.is_empty() {
        return Ok((Poly::one(), false));
    }
    let equations = system::equations(wiring, laws, &part, None, &[])?;
    let solution = equations.system.solve(&[], &[]).map_err(|error| match error {
        SolveError::Singular => Failure::Singular,
        SolveError::Limit(text) => Failure::Limit(text),
    })?;
    let polynomial = system::characteristic(wiring, laws, &part, None, &solution.determinant)?;
    Ok((cancelled::primitive(&polynomial), equations.rounded))
}

/// The polynomial whose roots a result shows: the denominator, of a return ratio L that of 1/(1 + L).
pub(super) fn shown(kind: TransferKind, numerator: &Poly, denominator: &Poly) -> Option<Poly> {
    match kind {
        TransferKind::Transfer => Some(denominator.clone()),
        TransferKind::Loop => Some(denominator.add(numerator)),
        TransferKind::Zeros => None,
    }
}

/// How often a factor divides a polynomial.
pub(super) fn multiplicity(factor: &Poly, p: &Poly) -> u32 {
    let (mut rest, mut count) = (p.clone(), 0);
    if factor.is_constant() || p.is_zero() {
        return 0;
    }
    while let Some(quotient) = rest.div_exact(factor) {
        rest = quotient;
        count += 1;
    }
    count
}

/// One polynomial for each case and choice of kept params that the requests name; for the nominal values if there is no
/// request.
pub(super) fn of_whole(run: &mut Run<'_>, cases: &mut Cases<'_>, transfers: &[Transfer]) -> Vec<Characteristic> {
    let net = run.wiring.netlist;
    let mut asked: Vec<(Option<CaseId>, Keep)> = Vec::new();
    for request in &net.requests {
        for case in cases::of(net, &request.clauses.cases, request.span, &mut Vec::new()) {
            let entry = (case, request.clauses.keep.clone());
            if !asked.contains(&entry) {
                asked.push(entry);
            }
        }
    }
    if asked.is_empty() {
        asked.push((None, Keep::Nothing));
    }
    let whole_request = Request { kind: RequestKind::All, clauses: Clauses::default(), span: Span::NONE };
    let mut out = Vec::new();
    for (case, keep) in asked {
        let Some(laws) = cases.laws(case, &keep, &mut run.diagnostics) else { continue };
        let found = whole(&run.wiring, &laws);
        if matches!(found, Err(Failure::Singular)) {
            let told = ill_posed::singular(&run.wiring, &laws, &Part::whole(&run.wiring), &[]);
            run.tell(told);
            continue;
        }
        let Some((polynomial, rounded)) = run.told(found, &whole_request) else { continue };
        let kept: Vec<String> = laws.values.kept().iter().map(|&p| laws.values.name(Var(PARAMS + p.0))).collect();
        let name = cases::name(net, case);
        let own = |t: &&Transfer| t.case == name && t.kept == kept && t.open.is_empty() && t.at.len() <= 1;
        out.push(one(
            run,
            &laws,
            polynomial,
            rounded,
            transfers.iter().filter(own).collect(),
            (name.clone(), kept.clone()),
        ));
    }
    out
}

fn one(
    run: &Run<'_>,
    laws: &Laws<'_>,
    polynomial: Poly,
    rounded: bool,
    transfers: Vec<&Transfer>,
    (case, kept): (String, Vec<String>),
) -> Characteristic {
    let shown_by = |t: &Transfer| {
        let form = t.form.as_ref()?;
        shown(t.kind, &form.numerator, &form.denominator)
    };
    let part = Part::whole(&run.wiring);
    let factors = cancelled::split(&run.wiring, laws, &part, &polynomial);
    let words = cancelled::told(laws, &factors, rounded);
    let names = Names::of(&laws.values, [&polynomial]);
    let polynomial = Arc::new(polynomial);
    let mut hidden = Vec::new();
    for (f, times) in &factors {
        let lacks = |t: &&&Transfer| shown_by(t).is_some_and(|p| multiplicity(f, &p) < *times);
        let from: Vec<String> = transfers.iter().filter(lacks).map(|t| request_text(t)).collect();
        if !from.is_empty() {
            let factor = if rounded { text::monic_decimal(&names, f) } else { text::monic(&names, f) };
            hidden.push(HiddenFactor { factor, from });
        }
    }
    Characteristic {
        case,
        kept,
        variable: if run.sampled { "z" } else { "s" },
        exact: !rounded,
        polynomial: (!rounded).then(|| transfer::exact_terms(&laws.values, &polynomial)),
        factors: words,
        hidden,
        form: Some(Form { numerator: Arc::new(Poly::one()), denominator: polynomial, names: names.table() }),
    }
}

/// How a result is asked for: `y/r`, `loop at u`.
fn request_text(t: &Transfer) -> String {
    if t.kind == TransferKind::Loop { t.from.clone() } else { format!("{}/{}", t.to, t.from) }
}
