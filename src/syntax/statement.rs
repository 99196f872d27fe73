//! Statements: from the events of a statement's rule to its node.

use super::ast::{
    Block, BlockBody, Case, Define, DefineBody, DefineParam, Equation, ExprId, Param, Port, Repeat, Setting,
    SignalKind, Statement, StatementKind, Within,
};
use super::grammar::Rule;
use super::reader::{Outcome, Reader};
use super::words::Word;
use crate::source::Span;

/// Puts what stands in its body into a statement.
pub(super) fn fill(head: &mut Statement, statements: Vec<Statement>, equations: Vec<Equation>, settings: Vec<Setting>) {
    match &mut head.kind {
        StatementKind::Define(define) => {
            if let DefineBody::Composite { body, .. } = &mut define.body {
                *body = statements;
            }
        }
        StatementKind::Repeat(repeat) => repeat.body = statements,
        StatementKind::Block(block) => block.body = BlockBody::Equations(equations.into()),
        StatementKind::Case(case) => case.settings = settings.into(),
        _ => {}
    }
}

impl Reader<'_> {
    /// Walks along the events of a statement that begins with `word`.
    pub(super) fn statement_kind(&mut self, word: Word) -> Outcome<StatementKind> {
        match word {
            Word::Model => {
                let name = self.identifier()?;
                Ok(StatementKind::Model { name, description: self.description() })
            }
            Word::Use => Ok(StatementKind::Use { path: self.description().unwrap_or(Span::NONE) }),
            Word::Unit => {
                // Units have a name space of their own, in which `s` is the second.
                let name = self.leaf();
                self.accept(Rule::equals);
                Ok(StatementKind::Unit { name, value: self.expression()?.id })
            }
            Word::Param => self.param(),
            Word::Input => self.signal(SignalKind::Input),
            Word::Output => self.signal(SignalKind::Output),
            Word::Signal => self.signal(SignalKind::Inner),
            Word::Sum => {
                let output = self.declared()?;
                self.accept(Rule::equals);
                let value = self.expression()?.id;
                Ok(StatementKind::Sum { output, value, description: self.description() })
            }
            Word::Block => self.block(),
            Word::Define => self.define(),
            Word::Repeat => {
                let index = self.identifier()?;
                self.accept(Rule::in_word);
                let (from, to) = self.whole_range()?;
                Ok(StatementKind::Repeat(Box::new(Repeat { index, from: from.id, to: to.id, body: Vec::new() })))
            }
            Word::Case => {
                let name = self.identifier()?;
                let description = self.description();
                Ok(StatementKind::Case(Box::new(Case { name, description, settings: Box::default() })))
            }
            Word::Find => self.find(),
            Word::Require => self.require(),
        }
    }

    fn param(&mut self) -> Outcome<StatementKind> {
        let name = self.declared()?;
        let unit = self.unit()?;
        let value = self.value_after_equals()?;
        let within = if self.enter(Rule::within) { Some(self.within()?) } else { None };
        let description = self.description();
        Ok(StatementKind::Param(Box::new(Param { name, unit, value, within, description })))
    }

    fn value_after_equals(&mut self) -> Outcome<Option<ExprId>> {
        match self.accept(Rule::equals) {
            Some(_) => Ok(Some(self.expression()?.id)),
            None => Ok(None),
        }
    }

    fn within(&mut self) -> Outcome<Within> {
        let first = self.row(true)?;
        let within = if self.accept(Rule::percent).is_some() {
            Within::Percent(first.0.id)
        } else {
            let (from, to) = self.rest_of_range(first)?;
            Within::Range { from: from.id, to: to.value, unit: to.unit }
        };
        self.take();
        Ok(within)
    }

    fn signal(&mut self, kind: SignalKind) -> Outcome<StatementKind> {
        let name = self.declared()?;
        let unit = self.unit()?;
        Ok(StatementKind::Signal { kind, name, unit, description: self.description() })
    }

    fn block(&mut self) -> Outcome<StatementKind> {
        let name = self.declared()?;
        self.accept(Rule::colon);
        let inputs = self.names()?;
        self.accept(Rule::arrow);
        let outputs = self.names()?;
        let mut every = None;
        let body = if self.accept(Rule::equals).is_some() {
            let body = if self.enter(Rule::matrix) {
                BlockBody::Matrix(self.matrix()?)
            } else {
                BlockBody::Law(self.expression()?.id)
            };
            if self.enter(Rule::every) {
                every = Some(self.expression()?.id);
                self.take();
            }
            body
        } else {
            BlockBody::Equations(Box::default())
        };
        let description = self.description();
        Ok(StatementKind::Block(Box::new(Block { name, inputs, outputs, body, every, description })))
    }

    fn matrix(&mut self) -> Outcome<Box<[Box<[ExprId]>]>> {
        let mut rows = Vec::new();
        while self.enter(Rule::row) {
            let mut row = Vec::new();
            while self.begins(Rule::expression) {
                row.push(self.expression()?.id);
                self.accept(Rule::comma);
            }
            self.take();
            rows.push(row.into());
            self.accept(Rule::comma);
        }
        self.take();
        Ok(rows.into())
    }

    fn define(&mut self) -> Outcome<StatementKind> {
        let name = self.identifier()?;
        self.accept(Rule::open);
        let mut params = Vec::new();
        while self.enter(Rule::parameter) {
            let name = self.identifier()?;
            let unit = self.unit()?;
            let default = self.value_after_equals()?;
            params.push(DefineParam { name, unit, default });
            self.take();
            self.accept(Rule::comma);
        }
        self.accept(Rule::close);
        let body = if self.accept(Rule::equals).is_some() {
            DefineBody::Law(self.expression()?.id)
        } else {
            self.accept(Rule::colon);
            let inputs = self.ports()?;
            self.accept(Rule::arrow);
            let outputs = self.ports()?;
            DefineBody::Composite { inputs, outputs, body: Vec::new() }
        };
        let description = self.description();
        Ok(StatementKind::Define(Box::new(Define { name, params: params.into(), body, description })))
    }

    fn ports(&mut self) -> Outcome<Box<[Port]>> {
        let mut ports = Vec::new();
        while self.enter(Rule::port) {
            let name = self.identifier()?;
            let unit = self.unit()?;
            ports.push(Port { name, unit });
            self.take();
            self.accept(Rule::comma);
        }
        Ok(ports.into())
    }
}
