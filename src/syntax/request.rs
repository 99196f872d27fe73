//! `find` and `require`: from the events of their rules to their nodes.

use super::ast::{
    Band, Cases, Clauses, Comparison, Find, Keep, Name, Request, RequestKind, Require, StatementKind, Subject,
    TemplateId,
};
use super::grammar::Rule;
use super::reader::{Outcome, Reader};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;

impl Reader<'_> {
    /// The events of `find`.
    pub(super) fn find(&mut self) -> Outcome<StatementKind> {
        self.paths = true;
        let mut requests = Vec::new();
        loop {
            let start = self.event().at;
            let kind = if self.accept(Rule::find_all).is_some() {
                RequestKind::All
            } else if self.enter(Rule::find_loop) {
                let at = self.listed()?;
                self.take();
                RequestKind::Loop { at }
            } else if self.enter(Rule::find_zeros) {
                let to = self.listed()?;
                self.accept(Rule::slash);
                let from = self.listed()?;
                self.take();
                RequestKind::Zeros { to, from }
            } else {
                let (to, from) = self.transfer()?;
                RequestKind::Transfer { to, from }
            };
            let span = self.trimmed(start);
            requests.push(Request { kind, span });
            if self.accept(Rule::comma).is_none() {
                break;
            }
        }
        let alone = requests.iter().find(|r| matches!(r.kind, RequestKind::Loop { .. } | RequestKind::Zeros { .. }));
        if let (Some(request), true) = (alone, requests.len() > 1) {
            let span = request.span;
            return self.fail(
                Diagnostic::new(Code::Syntax, "`find loop` and `find zeros` stand alone on their line")
                    .label(span, "not in a list")
                    .help("write a `find` of its own for it"),
            );
        }
        let clauses = self.clauses()?;
        Ok(StatementKind::Find(Box::new(Find { requests: requests.into(), clauses })))
    }

    /// The span from `start` to the event taken last, without the blanks at its end.
    fn trimmed(&self, start: u32) -> Span {
        let start = self.span(start, start).start;
        let text = self.slice(Span::new(start, self.last_end()));
        Span::new(start, start + text.trim_end().len() as u32)
    }

    /// The list of names that begins next.
    fn listed(&mut self) -> Outcome<Box<[Name]>> {
        self.enter(Rule::names);
        let names = self.names()?;
        self.take();
        Ok(names)
    }

    /// `y / x`
    fn transfer(&mut self) -> Outcome<(Name, Name)> {
        self.enter(Rule::transfer);
        let to = self.name()?;
        self.accept(Rule::slash);
        let from = self.name()?;
        self.take();
        Ok((to, from))
    }

    /// The clauses at the end, in any order, each at most once.
    fn clauses(&mut self) -> Outcome<Clauses> {
        let mut clauses = Clauses::default();
        loop {
            let place = self.event().at;
            let twice = if self.enter(Rule::with_open) {
                let twice = !clauses.open.is_empty();
                clauses.open = self.listed()?;
                self.accept(Rule::open_word);
                twice
            } else if self.enter(Rule::keep) {
                let twice = clauses.keep != Keep::Nothing;
                let names = self.listed()?;
                clauses.keep = if self.is_all(&names) { Keep::All } else { Keep::Names(names) };
                twice
            } else if self.enter(Rule::in_cases) {
                let twice = clauses.cases != Cases::Nominal;
                self.accept(Rule::in_word);
                let names = self.listed()?;
                clauses.cases = if self.is_all(&names) { Cases::All } else { Cases::Names(self.case_names(&names)?) };
                twice
            } else {
                return Ok(clauses);
            };
            self.take();
            if twice {
                let span = self.trimmed(place);
                return self.fail(
                    Diagnostic::new(Code::Syntax, "a clause stands twice")
                        .label(span, "the second of its kind")
                        .help("put all names into one clause, separated by commas"),
                );
            }
        }
    }

    /// Whether a list is the word `all`.
    fn is_all(&self, names: &[Name]) -> bool {
        matches!(names, [name] if self.slice(name.span) == "all")
    }

    fn case_names(&mut self, names: &[Name]) -> Outcome<Box<[Span]>> {
        let odd = names.iter().find(|n| n.template != TemplateId::NONE || self.slice(n.span).contains('.'));
        if let Some(odd) = odd {
            let span = odd.span;
            return self.fail(Diagnostic::new(Code::Syntax, "a case has a plain name").label(span, "no case's name"));
        }
        Ok(names.iter().map(|name| name.span).collect())
    }

    /// The events of `require`.
    pub(super) fn require(&mut self) -> Outcome<StatementKind> {
        let metric = self.leaf();
        self.paths = true;
        let subject = if self.enter(Rule::at) {
            let name = self.name()?;
            self.take();
            Subject::At(name)
        } else if self.begins(Rule::transfer) {
            let (to, from) = self.transfer()?;
            Subject::Transfer { to, from }
        } else {
            Subject::Whole
        };
        let over = self.band()?;
        let to = if self.enter(Rule::to) {
            let value = self.expression()?.id;
            self.take();
            Some(value)
        } else {
            None
        };
        let stimulus = if self.enter(Rule::stimulus) {
            let word = self.leaf();
            self.take();
            Some(word)
        } else {
            None
        };
        let bound = match self.accept(Rule::comparison) {
            Some(sign) => {
                let comparison = match self.slice(sign) {
                    ">=" => Comparison::AtLeast,
                    "<=" => Comparison::AtMost,
                    ">" => Comparison::Above,
                    _ => Comparison::Below,
                };
                Some((comparison, self.expression()?.id))
            }
            None => None,
        };
        let clauses = self.clauses()?;
        Ok(StatementKind::Require(Box::new(Require { metric, subject, over, to, stimulus, bound, clauses })))
    }

    /// `over a .. b [unit]`
    fn band(&mut self) -> Outcome<Option<Band>> {
        if !self.enter(Rule::over) {
            return Ok(None);
        }
        let (from, to) = self.range()?;
        self.take();
        let span = Span::new(from.span.start, to.end);
        Ok(Some(Band { from: from.id, to: to.value, unit: to.unit, span }))
    }
}
