//! Trees of parts of a text, joined to one: every number that names a place in an arena moves by what stands before.

use super::ast::{
    Band, BlockBody, Clauses, DefineBody, Expr, ExprId, ExprKind, Keep, Name, Piece, RequestKind, Require, Statement,
    StatementKind, Subject, TemplateId, Tree, Within,
};

/// How far each kind of number moves.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Offsets {
    exprs: u32,
    templates: u32,
    calls: u32,
    repeated: u32,
    units: u32,
}

impl Offsets {
    /// The offsets after a tree that was moved by these.
    pub(super) fn after(self, tree: &Tree) -> Self {
        Self {
            exprs: self.exprs + tree.exprs.len() as u32,
            templates: self.templates + tree.templates.len() as u32,
            calls: self.calls + tree.calls.len() as u32,
            repeated: self.repeated + tree.repeated.len() as u32,
            units: self.units + tree.units.len() as u32,
        }
    }
}

/// Moves every number in `tree`.
pub(super) fn relocate(tree: &mut Tree, by: Offsets) {
    for Expr { kind, .. } in &mut tree.exprs {
        match kind {
            ExprKind::Number => {}
            ExprKind::Name(template) | ExprKind::Derivative(template) => by.template(template),
            ExprKind::Neg(id) => by.expr(id),
            ExprKind::Binary(_, left, right) => {
                by.expr(left);
                by.expr(right);
            }
            ExprKind::Call(call) => *call += by.calls,
            ExprKind::Repeated(repeated) => *repeated += by.repeated,
            ExprKind::WithUnit(id, unit) => {
                by.expr(id);
                *unit += by.units;
            }
        }
    }
    for piece in tree.templates.iter_mut().flatten() {
        if let Piece::Index(id) = piece {
            by.expr(id);
        }
    }
    for argument in tree.calls.iter_mut().flat_map(|call| call.arguments.iter_mut()) {
        by.expr(&mut argument.value);
    }
    for repeated in &mut tree.repeated {
        by.expr(&mut repeated.from);
        by.expr(&mut repeated.to);
        by.expr(&mut repeated.body);
    }
    by.statements(&mut tree.statements);
}

impl Offsets {
    fn expr(self, id: &mut ExprId) {
        id.0 += self.exprs;
    }

    fn template(self, template: &mut TemplateId) {
        if *template != TemplateId::NONE {
            template.0 += self.templates;
        }
    }

    fn unit(self, unit: &mut Option<u32>) {
        if let Some(unit) = unit {
            *unit += self.units;
        }
    }

    fn names(self, names: &mut [Name]) {
        for name in names {
            self.template(&mut name.template);
        }
    }

    /// Bodies are entered by recursion; the splitter bounds how deep they are.
    fn statements(self, statements: &mut [Statement]) {
        for statement in statements {
            self.statement(&mut statement.kind);
        }
    }

    fn statement(self, kind: &mut StatementKind) {
        match kind {
            StatementKind::Model { .. } | StatementKind::Use { .. } => {}
            StatementKind::Unit { value, .. } => self.expr(value),
            StatementKind::Param(param) => {
                self.template(&mut param.name.template);
                self.unit(&mut param.unit);
                param.value.iter_mut().for_each(|id| self.expr(id));
                match &mut param.within {
                    None => {}
                    Some(Within::Percent(id)) => self.expr(id),
                    Some(Within::Range { from, to, unit }) => {
                        self.expr(from);
                        self.expr(to);
                        self.unit(unit);
                    }
                }
            }
            StatementKind::Signal { name, unit, .. } => {
                self.template(&mut name.template);
                self.unit(unit);
            }
            StatementKind::Sum { output, value, .. } => {
                self.template(&mut output.template);
                self.expr(value);
            }
            StatementKind::Block(block) => {
                self.template(&mut block.name.template);
                self.names(&mut block.inputs);
                self.names(&mut block.outputs);
                self.body(&mut block.body);
                block.every.iter_mut().for_each(|id| self.expr(id));
            }
            StatementKind::Define(define) => {
                for param in &mut define.params {
                    self.unit(&mut param.unit);
                    param.default.iter_mut().for_each(|id| self.expr(id));
                }
                match &mut define.body {
                    DefineBody::Law(id) => self.expr(id),
                    DefineBody::Composite { inputs, outputs, body } => {
                        inputs.iter_mut().chain(outputs.iter_mut()).for_each(|port| self.unit(&mut port.unit));
                        self.statements(body);
                    }
                }
            }
            StatementKind::Repeat(repeat) => {
                self.expr(&mut repeat.from);
                self.expr(&mut repeat.to);
                self.statements(&mut repeat.body);
            }
            StatementKind::Case(case) => {
                for setting in &mut case.settings {
                    self.template(&mut setting.name.template);
                    self.expr(&mut setting.value);
                }
            }
            StatementKind::Find(find) => {
                for request in &mut find.requests {
                    match &mut request.kind {
                        RequestKind::All => {}
                        RequestKind::Transfer { to, from } => {
                            self.template(&mut to.template);
                            self.template(&mut from.template);
                        }
                        RequestKind::Loop { at } => self.names(at),
                        RequestKind::Zeros { to, from } => {
                            self.names(to);
                            self.names(from);
                        }
                    }
                }
                self.clauses(&mut find.clauses);
            }
            StatementKind::Require(require) => self.require(require),
        }
    }

    fn body(self, body: &mut BlockBody) {
        match body {
            BlockBody::Law(id) => self.expr(id),
            BlockBody::Matrix(rows) => rows.iter_mut().flat_map(|row| row.iter_mut()).for_each(|id| self.expr(id)),
            BlockBody::Equations(equations) => {
                for equation in equations {
                    self.template(&mut equation.left.template);
                    self.expr(&mut equation.right);
                }
            }
        }
    }

    fn require(self, require: &mut Require) {
        match &mut require.subject {
            Subject::Whole => {}
            Subject::At(name) => self.template(&mut name.template),
            Subject::Transfer { to, from } => {
                self.template(&mut to.template);
                self.template(&mut from.template);
            }
        }
        if let Some(Band { from, to, unit, .. }) = &mut require.over {
            self.expr(from);
            self.expr(to);
            self.unit(unit);
        }
        require.to.iter_mut().for_each(|id| self.expr(id));
        if let Some((_, value)) = &mut require.bound {
            self.expr(value);
        }
        self.clauses(&mut require.clauses);
    }

    fn clauses(self, clauses: &mut Clauses) {
        self.names(&mut clauses.open);
        if let Keep::Names(names) = &mut clauses.keep {
            self.names(names);
        }
    }
}
