//! Circles of params and of defines, and the order in which params are bound.

use super::LimitReached;
use super::bind::{Context, Measure, Place};
use super::files::DefineId;
use super::scope::{Entity, EnvId};
use super::units::Dimension;
use super::write_out::Writer;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::{ParamId, Within};
use crate::source::Span;
use crate::syntax::ast::{self, BlockBody, DefineBody, ExprId, ExprKind, Name, Statement, StatementKind, Tree};
use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};

/// A param with its statement and its indices.
type ParamItem<'a> = (ParamId, &'a ast::Param, EnvId);

impl<'a> Writer<'a> {
    /// Finds the defines that call each other in a circle, and tells each circle once.
    pub(super) fn circular_defines(&mut self) {
        let loaded = self.loaded;
        let mut ids: Vec<DefineId> = Vec::new();
        for (file, own) in loaded.files.iter().enumerate() {
            let defines = own.tree.statements.iter().enumerate();
            ids.extend(
                defines
                    .filter(|(_, s)| matches!(s.kind, StatementKind::Define(_)))
                    .map(|(statement, _)| DefineId { file, statement }),
            );
        }
        let mut graph: DiGraph<DefineId, ()> = DiGraph::new();
        let nodes: Vec<NodeIndex> = ids.iter().map(|id| graph.add_node(*id)).collect();
        for (id, &node) in ids.iter().zip(&nodes) {
            let own = &loaded.files[id.file];
            let Some(define) = loaded.define(*id) else { continue };
            for callee in called(define, &own.tree) {
                if let Some(other) = loaded.find_define(id.file, own.text(callee))
                    && let Ok(place) = ids.binary_search(&other)
                {
                    graph.update_edge(node, nodes[place], ());
                }
            }
        }
        for circle in circles(&graph) {
            let mut members: Vec<DefineId> = circle.iter().map(|n| graph[*n]).collect();
            members.sort_unstable();
            let place = |id: &DefineId| loaded.define(*id).map_or(Span::NONE, |d| d.name);
            let name = |id: &DefineId| format!("`{}`", loaded.files[id.file].text(place(id)));
            let names: Vec<String> = members.iter().map(name).collect();
            let message = match names.as_slice() {
                [one] => format!("define {one} calls itself"),
                several => format!("defines call each other in a circle: {}", several.join(", ")),
            };
            let mut d = Diagnostic::new(Code::CircularDefinition, message);
            for (member, name) in members.iter().zip(&names) {
                d = d.label(place(member), format!("{name} leads back to itself"));
            }
            self.told.push(
                d.help("a define may use only what does not need it; write a repetition with `repeat` or `sum( )`"),
            );
            self.circular_defines.extend(members);
        }
    }

    /// Binds the params of one scope, each after those that it needs; circles are told once each.
    pub(super) fn bind_params(&mut self, params: &[ParamItem<'a>], ctx: Context) -> Result<(), LimitReached> {
        for place in self.param_order(params, ctx) {
            let (id, param, env) = params[place];
            if !self.param_measures[id.index()].1 {
                self.bind_param(id, param, Context { env, place: Place::Parameters, ..ctx })?;
            }
        }
        Ok(())
    }

    /// Places in `params` in the order of dependence; members of circles are told and marked.
    fn param_order(&mut self, params: &[ParamItem<'a>], ctx: Context) -> Vec<usize> {
        let tree = &self.loaded.files[ctx.file].tree;
        let simple = |p: &ast::Param| p.value.is_none_or(|v| is_number(tree, v));
        if params.iter().all(|(_, p, _)| simple(p)) {
            return (0..params.len()).collect();
        }
        let mut graph: DiGraph<usize, ()> = DiGraph::with_capacity(params.len(), params.len());
        let nodes: Vec<NodeIndex> = (0..params.len()).map(|i| graph.add_node(i)).collect();
        let first = params.first().map_or(0, |p| p.0.0);
        for (place, &(_, param, env)) in params.iter().enumerate() {
            let Some(value) = param.value.filter(|_| !simple(param)) else { continue };
            let (mut names, _) = names_in(tree, value);
            names.sort_unstable_by_key(|n| n.span);
            for name in names {
                // Mistakes in names are told when the value is bound.
                let mark = self.told.len();
                let text = self.name_text(ctx.file, name, env);
                self.told.truncate(mark);
                let Some(text) = text else { continue };
                let sym = self.symbols.intern(&text);
                if let Some(Entity::Param(needed)) = self.scopes.get(ctx.scope, sym)
                    && let Some(other) = needed.0.checked_sub(first).map(|i| i as usize)
                    && params.get(other).is_some_and(|p| p.0 == needed)
                {
                    graph.update_edge(nodes[place], nodes[other], ());
                }
            }
        }
        for circle in circles(&graph) {
            let mut members: Vec<usize> = circle.iter().map(|n| graph[*n]).collect();
            members.sort_unstable_by_key(|&m| params[m].1.name.span);
            let name = |m: usize| format!("`{}`", self.net.param_name(params[m].0));
            let names: Vec<String> = members.iter().map(|&m| name(m)).collect();
            let message = match names.as_slice() {
                [one] => format!("param {one} depends on itself"),
                several => format!("params depend on each other in a circle: {}", several.join(", ")),
            };
            let mut d = Diagnostic::new(Code::CircularDefinition, message);
            for (&member, name) in members.iter().zip(&names) {
                d = d.label(params[member].1.name.span, format!("{name} leads back to itself"));
            }
            self.tell(d.help("give one param of the circle a value that does not use the others"), ctx);
            for &member in &members {
                self.param_measures[params[member].0.index()].1 = true;
            }
        }
        // Kosaraju's components come with those first that others need.
        kosaraju_scc(&graph).into_iter().flatten().map(|n| graph[n]).collect()
    }

    fn bind_param(&mut self, id: ParamId, param: &'a ast::Param, ctx: Context) -> Result<(), LimitReached> {
        let declared = param.unit.and_then(|u| self.unit(ctx.file, u, ctx).map(|unit| (u, unit)));
        let mut measure = Measure::FREE;
        if let Some((place, unit)) = &declared {
            measure = Measure::of(unit.dimension);
            let shown = self.display_unit(ctx.file, *place, unit);
            self.net.params[id.index()].unit = Some(shown);
        }
        let mut broken = false;
        if let Some(expr) = param.value {
            let mut value = self.bind(expr, ctx)?;
            let span = self.net.exprs.span(value.id);
            if (value.s || value.z) && !value.broken {
                let d = Diagnostic::new(Code::Syntax, "a param is a number: s and z can't stand in its value");
                value = self.broken(d.label(span, "s or z comes in here").help("write a law as a `define`"), ctx);
            }
            broken = value.broken;
            if let Some((_, unit)) = &declared {
                self.expect(value, unit.dimension, "this param", ctx);
                // A bare number beside the param's own unit is in that unit.
                if value.measure.known.is_none() && self.is_bare_number(value.id) {
                    value.id = self.scaled(value.id, &unit.scale, span);
                }
            } else {
                measure = Measure { bare: None, ..value.measure };
                self.net.params[id.index()].unit = value.unit;
            }
            self.net.params[id.index()].value = Some(value.id);
        }
        self.param_measures[id.index()] = (measure, broken);
        if let Some(within) = param.within {
            let bound = match within {
                ast::Within::Percent(p) => Within::Percent(self.bind(p, ctx)?.id),
                ast::Within::Range { from, to, unit } => {
                    let ends = [self.tolerance_end(id, from, unit, ctx)?, self.tolerance_end(id, to, unit, ctx)?];
                    Within::Range(ends[0], ends[1])
                }
            };
            self.net.params[id.index()].within = Some(bound);
        }
        Ok(())
    }

    /// One end of a tolerance: a bare number is in the unit that the range, or else the param, was given with.
    fn tolerance_end(
        &mut self,
        id: ParamId,
        end: ExprId,
        unit: Option<u32>,
        ctx: Context,
    ) -> Result<crate::netlist::expr::ExprId, LimitReached> {
        let mut value = self.bind(end, ctx)?;
        let span = self.net.exprs.span(value.id);
        if let Some(unit) = unit.and_then(|u| self.unit(ctx.file, u, ctx)) {
            value.id = self.scaled(value.id, &unit.scale, span);
            value.measure = Measure::of(unit.dimension);
        }
        Ok(self.in_unit_of_param(id, value, ctx).id)
    }

    /// A value for a param: a bare number is in the unit that the param was given with; another unit is told.
    pub(super) fn in_unit_of_param(
        &mut self,
        id: ParamId,
        mut value: super::bind::Bound,
        ctx: Context,
    ) -> super::bind::Bound {
        let needed: Option<Dimension> = self.param_measures[id.index()].0.known;
        if let Some(needed) = needed {
            let what = format!("param `{}`", self.net.param_name(id));
            self.expect(value, needed, &what, ctx);
        }
        if value.measure.known.is_none()
            && let Some(unit) = self.net.params[id.index()].unit
            && self.is_bare_number(value.id)
        {
            let span = self.net.exprs.span(value.id);
            let scale = self.net.units[unit as usize].scale;
            if self.net.exprs.get(scale) != crate::netlist::expr::Expr::Ratio(1, 1) {
                value.id = self.net.exprs.push(crate::netlist::expr::Expr::Mul(value.id, scale), span);
            }
        }
        value
    }
}

/// Components in which something depends on itself.
fn circles<T>(graph: &DiGraph<T, ()>) -> Vec<Vec<NodeIndex>> {
    let is_circle = |c: &Vec<NodeIndex>| c.len() > 1 || graph.contains_edge(c[0], c[0]);
    let mut found: Vec<Vec<NodeIndex>> = kosaraju_scc(graph).into_iter().filter(is_circle).collect();
    for circle in &mut found {
        circle.sort_unstable();
    }
    found.sort_unstable();
    found
}

fn is_number(tree: &Tree, id: ExprId) -> bool {
    match tree.expr(id).kind {
        ExprKind::Number => true,
        ExprKind::WithUnit(inner, _) | ExprKind::Neg(inner) => matches!(tree.expr(inner).kind, ExprKind::Number),
        _ => false,
    }
}

/// The names and the calls in an expression.
pub(super) fn names_in(tree: &Tree, root: ExprId) -> (Vec<Name>, Vec<Span>) {
    let (mut names, mut calls, mut open) = (Vec::new(), Vec::new(), vec![root]);
    while let Some(id) = open.pop() {
        let expr = tree.expr(id);
        match expr.kind {
            ExprKind::Number => {}
            ExprKind::Name(template) | ExprKind::Derivative(template) => names.push(Name { span: expr.span, template }),
            ExprKind::Neg(a) | ExprKind::WithUnit(a, _) => open.push(a),
            ExprKind::Binary(_, a, b) => open.extend([a, b]),
            ExprKind::Call(place) => {
                let call = &tree.calls[place as usize];
                calls.push(call.callee);
                open.extend(call.arguments.iter().map(|a| a.value));
            }
            ExprKind::Repeated(place) => {
                let r = tree.repeated[place as usize];
                open.extend([r.from, r.to, r.body]);
            }
        }
    }
    (names, calls)
}

/// What a define calls, in its body and in its defaults.
fn called(define: &ast::Define, tree: &Tree) -> Vec<Span> {
    let mut exprs: Vec<ExprId> = define.params.iter().filter_map(|p| p.default).collect();
    match &define.body {
        DefineBody::Law(body) => exprs.push(*body),
        DefineBody::Composite { body, .. } => {
            let mut open: Vec<&Statement> = body.iter().collect();
            while let Some(statement) = open.pop() {
                match &statement.kind {
                    StatementKind::Param(p) => exprs.extend(p.value),
                    StatementKind::Sum { value, .. } => exprs.push(*value),
                    StatementKind::Repeat(r) => open.extend(&r.body),
                    StatementKind::Block(b) => {
                        exprs.extend(b.every);
                        match &b.body {
                            BlockBody::Law(law) => exprs.push(*law),
                            BlockBody::Matrix(rows) => exprs.extend(rows.iter().flatten().copied()),
                            BlockBody::Equations(lines) => exprs.extend(lines.iter().map(|l| l.right)),
                        }
                    }
                    _ => {}
                }
            }
        }
    }
    exprs.into_iter().flat_map(|e| names_in(tree, e).1).collect()
}
