//! A tree written out with all its parentheses, for tests.

use super::super::ast::{
    BinaryOp, BlockBody, Cases, Clauses, Comparison, DefineBody, Equation, ExprId, ExprKind, Keep, Name, Piece, Port,
    Repeated, RequestKind, Setting, SignalKind, Statement, StatementKind, Subject, TemplateId, Tree, Within,
};
use crate::source::Span;

pub(super) fn statements(tree: &Tree, text: &str, statements: &[Statement]) -> Vec<String> {
    let show = Show { tree, text };
    statements.iter().map(|s| show.statement(s)).collect()
}

struct Show<'a> {
    tree: &'a Tree,
    text: &'a str,
}

impl Show<'_> {
    fn span(&self, span: Span) -> &str {
        &self.text[span.start as usize..span.end as usize]
    }

    fn name(&self, name: &Name) -> String {
        self.template(name.template).unwrap_or_else(|| self.span(name.span).to_owned())
    }

    fn template(&self, template: TemplateId) -> Option<String> {
        if template == TemplateId::NONE {
            return None;
        }
        let piece = |piece: &Piece| match piece {
            Piece::Text(span) => self.span(*span).to_owned(),
            Piece::Index(id) => format!("{{{}}}", self.expr(*id)),
        };
        Some(self.tree.templates[template.0 as usize].iter().map(piece).collect())
    }

    fn names(&self, names: &[Name]) -> String {
        names.iter().map(|n| self.name(n)).collect::<Vec<_>>().join(", ")
    }

    fn unit(&self, unit: Option<u32>) -> String {
        unit.map_or(String::new(), |unit| format!(" [{}]", self.span(self.tree.units[unit as usize])))
    }

    fn expr(&self, id: ExprId) -> String {
        let expr = self.tree.expr(id);
        match expr.kind {
            ExprKind::Number => self.span(expr.span).to_owned(),
            ExprKind::Name(template) => self.template(template).unwrap_or_else(|| self.span(expr.span).to_owned()),
            ExprKind::Derivative(template) => match self.template(template) {
                Some(name) => format!("{name}'"),
                None => self.span(expr.span).to_owned(),
            },
            ExprKind::Neg(a) => format!("(-{})", self.expr(a)),
            ExprKind::Binary(op, a, b) => {
                let sign = match op {
                    BinaryOp::Add => "+",
                    BinaryOp::Sub => "-",
                    BinaryOp::Mul => "*",
                    BinaryOp::Div => "/",
                    BinaryOp::Pow => "^",
                };
                format!("({} {sign} {})", self.expr(a), self.expr(b))
            }
            ExprKind::Call(call) => {
                let call = &self.tree.calls[call as usize];
                let arguments: Vec<String> = call
                    .arguments
                    .iter()
                    .map(|a| match a.name {
                        Some(name) => format!("{}={}", self.span(name), self.expr(a.value)),
                        None => self.expr(a.value),
                    })
                    .collect();
                format!("{}({})", self.span(call.callee), arguments.join(", "))
            }
            ExprKind::Repeated(repeated) => {
                let r = self.tree.repeated[repeated as usize];
                let word = if r.kind == Repeated::Sum { "SUM" } else { "PRODUCT" };
                let (index, from, to) = (self.span(r.index), self.expr(r.from), self.expr(r.to));
                format!("{word}({index} in {from}..{to}, {})", self.expr(r.body))
            }
            ExprKind::WithUnit(a, unit) => format!("{}{}", self.expr(a), self.unit(Some(unit))),
        }
    }

    fn description(&self, span: Option<Span>) -> String {
        span.map_or(String::new(), |span| format!(" \"{}\"", self.span(span)))
    }

    fn statement(&self, statement: &Statement) -> String {
        match &statement.kind {
            StatementKind::Model { name, description } => {
                format!("model {}{}", self.span(*name), self.description(*description))
            }
            StatementKind::Use { path } => format!("use {}", self.span(*path)),
            StatementKind::Unit { name, value } => format!("unit {} = {}", self.span(*name), self.expr(*value)),
            StatementKind::Param(param) => {
                let within = match param.within {
                    None => String::new(),
                    Some(Within::Percent(id)) => format!(" within {}%", self.expr(id)),
                    Some(Within::Range { from, to, unit }) => {
                        format!(" within {}..{}{}", self.expr(from), self.expr(to), self.unit(unit))
                    }
                };
                let (name, unit) = (self.name(&param.name), self.unit(param.unit));
                let value = param.value.map_or(String::new(), |id| format!(" = {}", self.expr(id)));
                format!("param {name}{unit}{value}{within}{}", self.description(param.description))
            }
            StatementKind::Signal { kind, name, unit, description } => {
                let word = match kind {
                    SignalKind::Input => "input",
                    SignalKind::Output => "output",
                    SignalKind::Inner => "signal",
                };
                format!("{word} {}{}{}", self.name(name), self.unit(*unit), self.description(*description))
            }
            StatementKind::Sum { output, value, description } => {
                format!("sum {} = {}{}", self.name(output), self.expr(*value), self.description(*description))
            }
            StatementKind::Block(block) => {
                let body = match &block.body {
                    BlockBody::Law(id) => format!(" = {}", self.expr(*id)),
                    BlockBody::Matrix(rows) => {
                        let row = |row: &[ExprId]| row.iter().map(|&id| self.expr(id)).collect::<Vec<_>>().join(", ");
                        format!(" = [{}]", rows.iter().map(|r| format!("[{}]", row(r))).collect::<Vec<_>>().join(", "))
                    }
                    BlockBody::Equations(equations) => {
                        format!(" {{ {} }}", equations.iter().map(|e| self.equation(e)).collect::<Vec<_>>().join("; "))
                    }
                };
                let every = block.every.map_or(String::new(), |id| format!(" every {}", self.expr(id)));
                let (inputs, outputs) = (self.names(&block.inputs), self.names(&block.outputs));
                let text = self.description(block.description);
                format!("block {} : {inputs} -> {outputs}{body}{every}{text}", self.name(&block.name))
            }
            StatementKind::Define(define) => {
                let param = |p: &super::super::ast::DefineParam| {
                    let default = p.default.map_or(String::new(), |id| format!(" = {}", self.expr(id)));
                    format!("{}{}{default}", self.span(p.name), self.unit(p.unit))
                };
                let params = define.params.iter().map(param).collect::<Vec<_>>().join(", ");
                let ports = |ports: &[Port]| {
                    let port = |p: &Port| format!("{}{}", self.span(p.name), self.unit(p.unit));
                    ports.iter().map(port).collect::<Vec<_>>().join(", ")
                };
                let body = match &define.body {
                    DefineBody::Law(id) => format!(" = {}", self.expr(*id)),
                    DefineBody::Composite { inputs, outputs, body } => {
                        let inside = statements(self.tree, self.text, body).join("; ");
                        format!(" : {} -> {} {{ {inside} }}", ports(inputs), ports(outputs))
                    }
                };
                let text = self.description(define.description);
                format!("define {}({params}){body}{text}", self.span(define.name))
            }
            StatementKind::Repeat(repeat) => {
                let inside = statements(self.tree, self.text, &repeat.body).join("; ");
                let (index, from, to) = (self.span(repeat.index), self.expr(repeat.from), self.expr(repeat.to));
                format!("repeat {index} in {from}..{to} {{ {inside} }}")
            }
            StatementKind::Case(case) => {
                let setting = |s: &Setting| format!("{} = {}", self.name(&s.name), self.expr(s.value));
                let inside = case.settings.iter().map(setting).collect::<Vec<_>>().join("; ");
                format!("case {}{} {{ {inside} }}", self.span(case.name), self.description(case.description))
            }
            StatementKind::Find(find) => {
                let request = |kind: &RequestKind| match kind {
                    RequestKind::Transfer { to, from } => format!("{} / {}", self.name(to), self.name(from)),
                    RequestKind::All => "ALL".to_owned(),
                    RequestKind::Loop { at } => format!("LOOP {}", self.names(at)),
                    RequestKind::Zeros { to, from } => format!("ZEROS {} / {}", self.names(to), self.names(from)),
                };
                let requests = find.requests.iter().map(|r| request(&r.kind)).collect::<Vec<_>>().join(", ");
                format!("find {requests}{}", self.clauses(&find.clauses))
            }
            StatementKind::Require(require) => self.require(require),
        }
    }

    fn equation(&self, equation: &Equation) -> String {
        let prime = if equation.derivative { "'" } else { "" };
        format!("{}{prime} = {}", self.name(&equation.left), self.expr(equation.right))
    }

    fn require(&self, require: &super::super::ast::Require) -> String {
        let subject = match &require.subject {
            Subject::Whole => String::new(),
            Subject::At(name) => format!(" at {}", self.name(name)),
            Subject::Transfer { to, from } => format!(" {}/{}", self.name(to), self.name(from)),
        };
        let over = require.over.map_or(String::new(), |band| {
            format!(" over {}..{}{}", self.expr(band.from), self.expr(band.to), self.unit(band.unit))
        });
        let to = require.to.map_or(String::new(), |id| format!(" to {}", self.expr(id)));
        let stimulus = require.stimulus.map_or(String::new(), |span| format!(" for {}", self.span(span)));
        let bound = require.bound.map_or(String::new(), |(comparison, value)| {
            let sign = match comparison {
                Comparison::AtLeast => ">=",
                Comparison::AtMost => "<=",
                Comparison::Above => ">",
                Comparison::Below => "<",
            };
            format!(" {sign} {}", self.expr(value))
        });
        let metric = self.span(require.metric);
        format!("require {metric}{subject}{over}{to}{stimulus}{bound}{}", self.clauses(&require.clauses))
    }

    fn clauses(&self, clauses: &Clauses) -> String {
        let open =
            if clauses.open.is_empty() { String::new() } else { format!(" with {} open", self.names(&clauses.open)) };
        let keep = match &clauses.keep {
            Keep::Nothing => String::new(),
            Keep::All => " keep ALL".to_owned(),
            Keep::Names(names) => format!(" keep {}", self.names(names)),
        };
        let cases = match &clauses.cases {
            Cases::Nominal => String::new(),
            Cases::All => " in ALL".to_owned(),
            Cases::Names(names) => {
                format!(" in {}", names.iter().map(|&span| self.span(span)).collect::<Vec<_>>().join(", "))
            }
        };
        format!("{open}{keep}{cases}")
    }
}
