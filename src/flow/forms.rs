//! Exact forms of one netlist for the figures that are made of them: characteristic polynomials, transfer functions and
//! return ratios, each with what could not be worked out told as a diagnostic.

use super::cases::{self, Cases};
use super::graph::Wiring;
use super::rows::Laws;
use super::system::{self, Failure, Part, Question};
use super::{characteristic, ill_posed, rates, transfer};
use crate::algebra::{Fraction, Poly, RBig, Var};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::ExprId;
use crate::netlist::values::{PARAMS, PI};
use crate::netlist::{AskedCases, CaseId, Keep, Law, Netlist, ParamId, SignalId};
use crate::source::Span;
use std::rc::Rc;

/// A netlist with what is worked out for several figures at once.
pub(crate) struct Forms<'n> {
    wiring: Wiring<'n>,
    cases: Cases<'n>,
    /// What could not be worked out.
    pub(crate) diagnostics: Vec<Diagnostic>,
}

/// The values of one case.
pub(crate) struct CaseLaws<'n>(Rc<Laws<'n>>);

/// A transfer function or a return ratio in lowest terms.
#[derive(Clone, Debug)]
pub(crate) struct Form {
    /// The function of s (or z) and dead times.
    pub(crate) fraction: Fraction,
    /// The characteristic polynomial of its part; of a return ratio with the loop closed.
    pub(crate) characteristic: Poly,
}

impl<'n> Forms<'n> {
    /// A netlist of one time base.
    ///
    /// # Errors
    ///
    /// Why nothing of it can be answered.
    pub(crate) fn new(netlist: &'n Netlist) -> Result<Self, Diagnostic> {
        if let Some(diagnostic) = rates::unanswered(netlist) {
            return Err(diagnostic);
        }
        Ok(Self { wiring: Wiring::new(netlist), cases: Cases::new(netlist), diagnostics: Vec::new() })
    }

    /// The netlist.
    pub(crate) fn netlist(&self) -> &'n Netlist {
        self.wiring.netlist
    }

    /// Whether laws are in z.
    pub(crate) fn is_sampled(&self) -> bool {
        transfer::is_sampled(self.wiring.netlist.time_base)
    }

    /// The cases that a clause asks for, nominal first.
    pub(crate) fn cases_of(&mut self, asked: &AskedCases, span: Span) -> Vec<Option<CaseId>> {
        cases::of(self.wiring.netlist, asked, span, &mut self.diagnostics)
    }

    /// What a case is called.
    pub(crate) fn name_of(&self, case: Option<CaseId>) -> String {
        cases::name(self.wiring.netlist, case)
    }

    /// The values of a case; `None`, and told, where they can't be worked out, or where a param on which the netlist
    /// depends has no value.
    pub(crate) fn laws(&mut self, case: Option<CaseId>) -> Option<CaseLaws<'n>> {
        let laws = self.cases.laws(case, &Keep::Nothing, &mut self.diagnostics)?;
        let missing = self.missing(&laws);
        for &param in &missing {
            let net = self.wiring.netlist;
            let name = net.param_name(param);
            let told = Diagnostic::new(Code::ParameterWithoutValue, format!("a figure needs a number for `{name}`"))
                .label(net.params[param.index()].origin.span, "has no value here")
                .help(format!("give it a value: `param {name} = 1`, in a `case`, or by `--set {name}=1`"));
            self.tell(told);
        }
        missing.is_empty().then_some(CaseLaws(laws))
    }

    /// The params without a value that some law or factor has in it.
    fn missing(&mut self, laws: &Laws<'n>) -> Vec<ParamId> {
        if laws.values.kept().is_empty() {
            return Vec::new();
        }
        let net = self.wiring.netlist;
        let mut exprs: Vec<ExprId> = net.terms.iter().filter_map(|t| t.factor).collect();
        for block in &net.blocks {
            exprs.extend(block.every);
            match &block.law {
                Law::Scalar(law) => exprs.push(*law),
                Law::Matrix(rows) => exprs.extend(rows.iter().flat_map(|r| r.iter().copied())),
                Law::States(equations) => {
                    exprs.extend(equations.iter().flat_map(|e| e.terms.iter().map(|t| t.coefficient)));
                }
            }
        }
        let mut found = Vec::new();
        for expr in exprs {
            match laws.evaluate(expr) {
                Ok(value) => found.extend(symbols(&laws.values, &value.fraction)),
                Err(told) => self.tell(*told),
            }
        }
        found.sort_unstable();
        found.dedup();
        found
    }

    /// The sampling period in seconds.
    pub(crate) fn period(&self, laws: &CaseLaws<'n>) -> Option<RBig> {
        let every = self.wiring.netlist.blocks.iter().find_map(|b| b.every)?;
        transfer::number(&laws.0.evaluate(every).ok()?.fraction)
    }

    /// The characteristic polynomial of the whole netlist.
    pub(crate) fn whole(&mut self, laws: &CaseLaws<'n>) -> Option<Poly> {
        let part = Part::whole(&self.wiring);
        let unsolvable = ill_posed::all(&self.wiring, &laws.0);
        if !self.well_posed(unsolvable) {
            return None;
        }
        match characteristic::whole(&self.wiring, &laws.0) {
            Ok((polynomial, _)) => Some(polynomial),
            Err(failure) => {
                self.failed(failure, laws, &part, &[], Span::NONE);
                None
            }
        }
    }

    /// The transfer function between two signals with some others cut.
    pub(crate) fn transfer(&mut self, laws: &CaseLaws<'n>, question: &Question<'_>, span: Span) -> Option<Form> {
        let part = Part::between(&self.wiring, question);
        let unsolvable = ill_posed::at_infinity(&self.wiring, &laws.0, question);
        if !self.well_posed(unsolvable.map(Vec::from_iter)) {
            return None;
        }
        let solved = system::solve(&self.wiring, &laws.0, &part, question).and_then(|solved| {
            let determinant = &solved.determinant;
            let whole = system::characteristic(&self.wiring, &laws.0, &part, Some(question), determinant)?;
            Ok((solved, whole))
        });
        match solved {
            Ok((solved, characteristic)) => {
                let fraction = Fraction::new(solved.numerator, solved.determinant)?;
                Some(Form { fraction, characteristic })
            }
            Err(failure) => {
                self.failed(failure, laws, &part, question.open, span);
                None
            }
        }
    }

    /// The return ratio at a signal with some others cut; its characteristic polynomial is that of the closed loop.
    pub(crate) fn return_ratio(
        &mut self,
        laws: &CaseLaws<'n>,
        at: SignalId,
        open: &[SignalId],
        span: Span,
    ) -> Option<Form> {
        let mut cut = open.to_vec();
        cut.push(at);
        cut.sort_unstable();
        cut.dedup();
        let question = Question { from: at, to: at, open: &cut };
        let form = self.transfer(laws, &question, span)?;
        let part = Part::between(&self.wiring, &question);
        let closed = Question { from: at, to: at, open };
        let unsolvable = ill_posed::at_infinity(&self.wiring, &laws.0, &closed);
        if !self.well_posed(unsolvable.map(Vec::from_iter)) {
            return None;
        }
        match self.closed(laws, &part, &closed) {
            Ok(characteristic) => Some(Form { fraction: form.fraction.neg(), characteristic }),
            Err(failure) => {
                self.failed(failure, laws, &part, open, span);
                None
            }
        }
    }

    fn closed(&self, laws: &CaseLaws<'n>, part: &Part, question: &Question<'_>) -> Result<Poly, Failure> {
        if part.rows.is_empty() {
            return Ok(Poly::one());
        }
        let equations = system::equations(&self.wiring, &laws.0, part, None, question.open)?;
        let solution = equations.system.solve(&[], &[]).map_err(|error| match error {
            crate::algebra::solve::SolveError::Singular => Failure::Singular,
            crate::algebra::solve::SolveError::Limit(text) => Failure::Limit(text),
        })?;
        system::characteristic(&self.wiring, &laws.0, part, Some(question), &solution.determinant)
    }

    /// Whether every algebraic loop that matters has a solution; those without one are told.
    fn well_posed(&mut self, found: Result<Vec<Diagnostic>, Box<Diagnostic>>) -> bool {
        let told = found.unwrap_or_else(|told| vec![*told]);
        let fine = told.is_empty();
        told.into_iter().for_each(|d| self.tell(d));
        fine
    }

    fn failed(&mut self, failure: Failure, laws: &CaseLaws<'n>, part: &Part, open: &[SignalId], span: Span) {
        let told = match failure {
            Failure::Told(told) => *told,
            Failure::Singular => ill_posed::singular(&self.wiring, &laws.0, part, open),
            Failure::Limit(text) => {
                Diagnostic::new(Code::LimitReached, format!("this netlist is too large to assess: {text}"))
                    .label(span, "asked for here")
                    .help("open a loop with `with … open`, or assess a part of it")
            }
        };
        self.tell(told);
    }

    /// Adds a diagnostic unless it is there already.
    pub(crate) fn tell(&mut self, diagnostic: Diagnostic) {
        if !self.diagnostics.contains(&diagnostic) {
            self.diagnostics.push(diagnostic);
        }
    }
}

impl CaseLaws<'_> {
    /// The exact value of an expression.
    ///
    /// # Errors
    ///
    /// As [`crate::netlist::values::Values::evaluate`].
    pub(crate) fn evaluate(&self, expr: ExprId) -> Result<Fraction, Box<Diagnostic>> {
        Ok(self.0.evaluate(expr)?.fraction.clone())
    }

    /// The number that a fraction is, its π to many digits; `None` where it has a symbol in it.
    pub(crate) fn number(fraction: &Fraction) -> Option<RBig> {
        transfer::number(fraction)
    }

    /// The dead time in seconds that a variable stands for.
    pub(crate) fn delay(&self, var: Var) -> Option<RBig> {
        transfer::delay_in_seconds(&self.0.values, var)
    }

    /// The params in an expression that have no value.
    pub(crate) fn symbols(&self, fraction: &Fraction) -> Vec<ParamId> {
        symbols(&self.0.values, fraction)
    }
}

/// The params in a fraction, those in its dead times included.
fn symbols(values: &crate::netlist::values::Values<'_>, fraction: &Fraction) -> Vec<ParamId> {
    let mut waiting = vec![fraction.clone()];
    let mut found = Vec::new();
    while let Some(f) = waiting.pop() {
        for var in f.numerator().variables().into_iter().chain(f.denominator().variables()) {
            if var != PI && var.0 >= PARAMS {
                found.push(ParamId(var.0 - PARAMS));
            } else if let Some(delay) = values.delay(var) {
                waiting.push(delay);
            }
        }
    }
    found
}
