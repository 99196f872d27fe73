//! Cases, requests, requirements, and what the command line adds to them.

use super::bind::{Bound, Context, Measure, Place};
use super::scope::{Entity, EnvId, ScopeId};
use super::suggest::did_you_mean;
use super::units::Dimension;
use super::write_out::{Item, Writer};
use super::{CommandLine, LimitReached};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::expr::Expr as Node;
use crate::netlist::{
    Asked, AskedCases, Case, CaseId, Clauses, DisplayUnit, Keep, Metric, Pair, ParamId, Request, RequestKind,
    Requirement, RequirementKind, Stimulus,
};
use crate::source::Span;
use crate::syntax::ast::{self, ExprKind, Name, StatementKind, Subject};

/// The metrics' words.
const METRICS: [&str; 15] = [
    "stable",
    "gain_margin",
    "phase_margin",
    "delay_margin",
    "modulus_margin",
    "crossover",
    "peak",
    "bandwidth",
    "magnitude",
    "overshoot",
    "rise_time",
    "settling_time",
    "final_value",
    "damping_ratio",
    "decay_rate",
];

impl<'a> Writer<'a> {
    /// Binds all cases.
    pub(super) fn cases(&mut self, items: &[Item<'a>]) -> Result<(), LimitReached> {
        for item in items {
            let StatementKind::Case(case) = &item.statement.kind else { continue };
            let name = super::scope::normal(self.loaded.files[0].text(case.name)).into_owned();
            if matches!(name.as_str(), "nominal" | "all") {
                let d = Diagnostic::new(Code::Syntax, format!("a case can't be called `{name}`"));
                self.told.push(
                    d.label(case.name, "this name is taken")
                        .help("`nominal` names the values as given, `all` all cases"),
                );
                continue;
            }
            if let Some(first) = self.net.cases.iter().find(|c| c.name == name) {
                let d = Diagnostic::new(Code::DuplicateName, format!("there are two cases `{name}`"));
                let d = d.label(case.name, "given again here").label(first.span, "first given here");
                self.told.push(d.help("rename one of them"));
                continue;
            }
            let settings = self.settings(0, &case.settings)?;
            let description = case.description.map(|d| self.loaded.files[0].text(d).to_owned());
            self.net.cases.push(Case { name, description, settings, span: case.name });
        }
        Ok(())
    }

    fn root(file: usize) -> Context {
        Context { file, scope: ScopeId(0), env: EnvId::EMPTY, frame: None, place: Place::Parameters }
    }

    /// Values of params, each param at most once.
    fn settings(
        &mut self,
        file: usize,
        settings: &[ast::Setting],
    ) -> Result<Vec<(ParamId, crate::netlist::expr::ExprId)>, LimitReached> {
        let mut bound: Vec<(ParamId, crate::netlist::expr::ExprId)> = Vec::new();
        let mut places: Vec<Span> = Vec::new();
        for setting in settings {
            let ctx = Self::root(file);
            let param = self.param_at(setting.name, ctx);
            let value = self.bind(setting.value, ctx)?;
            let Some(param) = param else { continue };
            if let Some(first) = bound.iter().position(|b| b.0 == param) {
                let name = self.net.param_name(param).to_owned();
                let d = Diagnostic::new(Code::DuplicateName, format!("`{name}` is set twice"));
                let d = d.label(setting.name.span, "set again here").label(places[first], "first set here");
                self.told.push(d.help("leave one of the two out"));
                continue;
            }
            let value = self.in_unit_of_param(param, value, ctx);
            bound.push((param, value.id));
            places.push(setting.name.span);
        }
        Ok(bound)
    }

    /// What a name or a path stands for.
    fn entity_at(&mut self, name: Name, ctx: Context) -> Option<(String, Option<Entity>)> {
        let text = self.name_text(ctx.file, name, ctx.env)?.into_owned();
        let mut scope = ScopeId(0);
        let mut parts = text.split('.').peekable();
        while let Some(part) = parts.next() {
            let sym = self.symbols.intern(part);
            let entity = self.scopes.get(scope, sym);
            if parts.peek().is_none() {
                return Some((text.clone(), entity));
            }
            scope = match entity {
                Some(Entity::Instance(_, inside)) => inside,
                Some(Entity::Block(block)) => match self.scopes.inside_of(block) {
                    Some(inside) => inside,
                    None => return Some((text, None)),
                },
                _ => return Some((text, None)),
            };
        }
        Some((text, None))
    }

    fn param_at(&mut self, name: Name, ctx: Context) -> Option<ParamId> {
        let (text, entity) = self.entity_at(name, ctx)?;
        match entity {
            Some(Entity::Param(id)) => return Some(id),
            _ if self.is_excused(&text) => return None,
            Some(Entity::Law(_)) => {
                let d = Diagnostic::new(
                    Code::Syntax,
                    format!("`{text}` is a transfer function (law), and can't be set or kept"),
                );
                self.told.push(d.label(name.span, "not a number").help("give its numbers params of their own"));
                return None;
            }
            _ => {}
        }
        let near = did_you_mean(&text, (0..self.net.params.len()).map(|i| self.net.param_name(ParamId(i as u32))));
        let d = Diagnostic::new(Code::UnknownName, format!("there is no param `{text}`"));
        let other = entity.is_some().then(|| format!("`{text}` is the name of a signal or a block"));
        let d = d.label(name.span, "not a param of this model");
        let help = near
            .or(other)
            .unwrap_or_else(|| "a param inside an instance is named by its path, such as `az.K`".to_owned());
        self.told.push(d.help(help));
        None
    }

    fn asked_signal(&mut self, name: Name, ctx: Context) -> Option<Asked> {
        let (text, entity) = self.entity_at(name, ctx)?;
        match entity {
            Some(Entity::Signal(signal)) => {
                self.read(signal, name.span, ctx);
                return Some(Asked { signal, text });
            }
            _ if self.is_excused(text.split('.').next_back().unwrap_or(&text)) => return None,
            _ => {}
        }
        let d = Diagnostic::new(Code::UnknownName, format!("there is no signal `{text}`"));
        let help = if let Some(Entity::Block(block)) = entity {
            let outputs = self.net.blocks[block.index()].outputs.clone();
            let names: Vec<String> = outputs.iter().map(|o| format!("`{}`", self.net.signal_name(*o))).collect();
            format!("`{text}` is a block; it drives {}", names.join(", "))
        } else if entity.is_some() {
            format!("`{text}` is no signal; requests name signals")
        } else {
            let names = (0..self.net.signals.len()).map(|i| self.net.signal_name(crate::netlist::SignalId(i as u32)));
            let aliases = self.net.aliases.iter().map(|(n, _)| self.net.names.get(*n));
            let near = did_you_mean(&text, names.chain(aliases).take(50_000));
            near.unwrap_or_else(|| "a signal inside an instance is named by its path, such as `az.e`".to_owned())
        };
        self.told.push(d.label(name.span, "not a signal of this model").help(help));
        None
    }

    /// All of them, or none where one was told to be in error.
    fn asked_signals(&mut self, names: &[Name], ctx: Context) -> Option<Vec<Asked>> {
        let found: Vec<Option<Asked>> = names.iter().map(|n| self.asked_signal(*n, ctx)).collect();
        found.into_iter().collect()
    }

    /// Binds all requests and requirements.
    pub(super) fn asked(&mut self, items: &[Item<'a>]) -> Result<(), LimitReached> {
        for item in items {
            let ctx = Context { env: item.env, ..Self::root(0) };
            match &item.statement.kind {
                StatementKind::Find(find) => {
                    let requests = self.find(find, ctx);
                    self.net.requests.extend(requests);
                }
                StatementKind::Require(require) => {
                    let span = item.statement.span;
                    if let Some(requirement) = self.requirement(require, span, ctx)? {
                        self.net.requirements.push(requirement);
                    }
                }
                _ => {}
            }
        }
        Ok(())
    }

    fn find(&mut self, find: &ast::Find, ctx: Context) -> Vec<Request> {
        let clauses = self.clauses(&find.clauses, ctx);
        let mut requests = Vec::with_capacity(find.requests.len());
        for request in &find.requests {
            let kind = match &request.kind {
                ast::RequestKind::All => Some(RequestKind::All),
                ast::RequestKind::Transfer { to, from } => {
                    let ends = [self.asked_signal(*to, ctx), self.asked_signal(*from, ctx)];
                    let [to, from] = ends;
                    to.zip(from).map(|(to, from)| RequestKind::Transfer { to, from })
                }
                ast::RequestKind::Loop { at } => self.asked_signals(at, ctx).map(|at| RequestKind::Loop { at }),
                ast::RequestKind::Zeros { to, from } => {
                    let ends = [self.asked_signals(to, ctx), self.asked_signals(from, ctx)];
                    let [to, from] = ends;
                    to.zip(from).map(|(to, from)| RequestKind::Zeros { to, from })
                }
            };
            if let (Some(kind), Some(clauses)) = (kind, &clauses) {
                requests.push(Request { kind, clauses: clauses.clone(), span: request.span });
            }
        }
        requests
    }

    fn clauses(&mut self, clauses: &ast::Clauses, ctx: Context) -> Option<Clauses> {
        let open = self.asked_signals(&clauses.open, ctx);
        let keep = match &clauses.keep {
            ast::Keep::Nothing => Some(Keep::Nothing),
            ast::Keep::All => Some(Keep::All),
            ast::Keep::Names(names) => {
                let found: Vec<Option<ParamId>> = names.iter().map(|n| self.param_at(*n, ctx)).collect();
                found.into_iter().collect::<Option<Vec<_>>>().map(Keep::Params)
            }
        };
        let cases = match &clauses.cases {
            ast::Cases::Nominal => Some(AskedCases::Nominal),
            ast::Cases::All => Some(AskedCases::All),
            ast::Cases::Names(names) => {
                let texts: Vec<(String, Span)> = names
                    .iter()
                    .map(|&n| (super::scope::normal(self.loaded.files[ctx.file].text(n)).into_owned(), n))
                    .collect();
                let found: Vec<Option<Option<CaseId>>> = texts.iter().map(|(t, s)| self.case_named(t, *s)).collect();
                found.into_iter().collect::<Option<Vec<_>>>().map(AskedCases::These)
            }
        };
        Some(Clauses { open: open?, keep: keep?, cases: cases? })
    }

    /// The case of a name; `Some(None)` is nominal.
    fn case_named(&mut self, name: &str, span: Span) -> Option<Option<CaseId>> {
        if name == "nominal" {
            return Some(None);
        }
        if let Some(place) = self.net.cases.iter().position(|c| c.name == name) {
            return Some(Some(CaseId(place as u32)));
        }
        if self.is_excused(name) {
            return None;
        }
        let d = Diagnostic::new(Code::UnknownName, format!("there is no case `{name}`"));
        let near = did_you_mean(name, self.net.cases.iter().map(|c| c.name.as_str()).chain(["nominal", "all"]));
        let d = if span == Span::NONE { d } else { d.label(span, "not a case of this file") };
        let help = near.unwrap_or_else(|| format!("declare it: `case {name} {{ … }}`"));
        self.told.push(d.help(help));
        None
    }

    /// What the command line adds: requests in place of the file's, values, the case in nominal's place, kept params.
    pub(super) fn command_line(&mut self, line: &CommandLine) -> Result<(), LimitReached> {
        let loaded = self.loaded;
        let (mut requests, mut kept) = (Vec::new(), Vec::new());
        let keep_file = (!line.keep.is_empty()).then(|| loaded.line.last().copied()).flatten();
        for &file in &loaded.line {
            for statement in &loaded.files[file].tree.statements {
                match &statement.kind {
                    StatementKind::Find(find) if Some(file) == keep_file => match &find.clauses.keep {
                        ast::Keep::Names(names) => {
                            kept.extend(names.iter().filter_map(|n| self.param_at(*n, Self::root(file))));
                        }
                        ast::Keep::All | ast::Keep::Nothing => self.keep_all(),
                    },
                    StatementKind::Find(find) => requests.extend(self.find(find, Self::root(file))),
                    StatementKind::Case(case) => {
                        for (param, value) in self.settings(file, &case.settings)? {
                            self.net.params[param.index()].value = Some(value);
                            self.net.cases.iter_mut().for_each(|c| c.settings.retain(|s| s.0 != param));
                        }
                    }
                    _ => {}
                }
            }
        }
        if !line.requests.is_empty() {
            self.net.requests = requests;
        }
        if !kept.is_empty() {
            for request in &mut self.net.requests {
                match &mut request.clauses.keep {
                    Keep::All => {}
                    Keep::Nothing => request.clauses.keep = Keep::Params(kept.clone()),
                    Keep::Params(own) => own.extend(&kept),
                }
            }
        }
        if let Some(name) = &line.case
            && let Some(case) = self.case_named(name, Span::NONE)
        {
            self.net.nominal = case;
        }
        Ok(())
    }

    fn keep_all(&mut self) {
        self.net.requests.iter_mut().for_each(|r| r.clauses.keep = Keep::All);
    }

    fn requirement(
        &mut self,
        require: &ast::Require,
        span: Span,
        ctx: Context,
    ) -> Result<Option<Requirement>, LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let word = file.text(require.metric);
        let text = file.text(span).trim_start_matches("require").split_whitespace().collect::<Vec<_>>().join(" ");
        let text = text.split(" #").next().unwrap_or(&text).trim().to_owned();
        if !METRICS.contains(&word) {
            let d = Diagnostic::new(Code::UnknownName, format!("there is no figure `{word}` to require"));
            let near = did_you_mean(word, METRICS);
            let d = d.label(require.metric, "not known");
            self.told.push(d.help(near.unwrap_or_else(|| format!("the figures are {}", METRICS.join(", ")))));
            return Ok(None);
        }
        let clauses = self.clauses(&require.clauses, ctx);
        let kind = if word == "stable" {
            self.fits(require, word, matches!(require.subject, Subject::Whole) && require.bound.is_none())
                .then_some(RequirementKind::Stable)
        } else {
            self.figure(word, require, ctx)?
        };
        Ok(kind.zip(clauses).map(|(kind, clauses)| Requirement { kind, clauses, text, span }))
    }

    /// Tells where a requirement's form does not fit its figure.
    fn fits(&mut self, require: &ast::Require, word: &str, fits: bool) -> bool {
        if fits {
            return true;
        }
        let form = match word {
            "stable" => "require stable".to_owned(),
            "damping_ratio" | "decay_rate" => format!("require {word} >= VALUE"),
            "magnitude" => "require magnitude y/r over a .. b [rad/s] <= VALUE".to_owned(),
            "gain_margin" | "phase_margin" | "delay_margin" | "modulus_margin" | "crossover" => {
                format!("require {word} at u >= VALUE")
            }
            _ => format!("require {word} y/r <= VALUE"),
        };
        let d = Diagnostic::new(Code::Syntax, format!("this is not how `{word}` is required"));
        self.told.push(d.label(require.metric, "its form is another").help(format!("write `{form}`")));
        false
    }

    fn figure(
        &mut self,
        word: &str,
        require: &ast::Require,
        ctx: Context,
    ) -> Result<Option<RequirementKind>, LimitReached> {
        let Some((comparison, bound)) = require.bound else {
            self.fits(require, word, false);
            return Ok(None);
        };
        let at = matches!(word, "gain_margin" | "phase_margin" | "delay_margin" | "modulus_margin" | "crossover");
        let whole = matches!(word, "damping_ratio" | "decay_rate");
        let subject_fits = match &require.subject {
            Subject::Whole => whole,
            Subject::At(_) => at,
            Subject::Transfer { .. } => !at && !whole,
        };
        let extras_fit = require.over.is_some() == (word == "magnitude")
            && (require.to.is_none() || word == "settling_time")
            && (require.stimulus.is_none() || word == "final_value");
        if !self.fits(require, word, subject_fits && extras_fit) {
            return Ok(None);
        }
        let (loop_at, pair) = match &require.subject {
            Subject::Whole => (None, None),
            Subject::At(name) => (self.asked_signal(*name, ctx), None),
            Subject::Transfer { to, from } => {
                let ends = [self.asked_signal(*to, ctx), self.asked_signal(*from, ctx)];
                let [to, from] = ends;
                (None, to.zip(from).map(|(to, from)| Pair { to, from }))
            }
        };
        let metric = match (word, loop_at, pair) {
            ("damping_ratio", ..) => Some(Metric::DampingRatio),
            ("decay_rate", ..) => Some(Metric::DecayRate),
            (_, Some(asked), _) => Some(match word {
                "gain_margin" => Metric::GainMargin(asked),
                "phase_margin" => Metric::PhaseMargin(asked),
                "delay_margin" => Metric::DelayMargin(asked),
                "modulus_margin" => Metric::ModulusMargin(asked),
                _ => Metric::Crossover(asked),
            }),
            (_, _, Some(pair)) => self.metric_of_pair(word, pair, require, ctx)?,
            _ => None,
        };
        let Some(metric) = metric else {
            // The bound's own mistakes are told all the same.
            self.bind(bound, ctx)?;
            return Ok(None);
        };
        let (bound, unit) = self.bound(bound, &metric, ctx)?;
        Ok(Some(RequirementKind::Figure { metric, comparison, bound: bound.id, unit }))
    }

    fn metric_of_pair(
        &mut self,
        word: &str,
        pair: Pair,
        require: &ast::Require,
        ctx: Context,
    ) -> Result<Option<Metric>, LimitReached> {
        Ok(Some(match word {
            "peak" => Metric::Peak(pair),
            "bandwidth" => Metric::Bandwidth(pair),
            "overshoot" => Metric::Overshoot(pair),
            "rise_time" => Metric::RiseTime(pair),
            "magnitude" => {
                let Some(band) = require.over else { return Ok(None) };
                let ends = [self.band_end(band.from, band.unit, ctx)?, self.band_end(band.to, band.unit, ctx)?];
                Metric::Magnitude(pair, ends[0].id, ends[1].id)
            }
            "settling_time" => {
                let band = match require.to {
                    Some(to) => {
                        let value = self.bind(to, ctx)?;
                        self.expect(value, Dimension::ONE, "a settling band", ctx);
                        // A bare number is in per cent, the metric's own unit.
                        Some(if value.measure.known.is_none() { self.hundredth(value).id } else { value.id })
                    }
                    None => None,
                };
                Metric::SettlingTime(pair, band)
            }
            _ => {
                let word = require.stimulus.map(|s| (s, self.loaded.files[ctx.file].text(s)));
                let stimulus = match word {
                    None | Some((_, "step")) => Stimulus::Step,
                    Some((_, "ramp")) => Stimulus::Ramp,
                    Some((_, "parabola")) => Stimulus::Parabola,
                    Some((span, other)) => {
                        let d = Diagnostic::new(Code::UnknownName, format!("there is no test input `{other}`"));
                        let near = did_you_mean(other, ["step", "ramp", "parabola"]);
                        let help = near
                            .unwrap_or_else(|| "a final value is `for step`, `for ramp` or `for parabola`".to_owned());
                        self.told.push(d.label(span, "not known").help(help));
                        return Ok(None);
                    }
                };
                Metric::FinalValue(pair, stimulus)
            }
        }))
    }

    /// One end of a band of angular frequencies, in rad/s.
    fn band_end(&mut self, end: ast::ExprId, unit: Option<u32>, ctx: Context) -> Result<Bound, LimitReached> {
        let mut value = self.bind(end, ctx)?;
        let span = self.net.exprs.span(value.id);
        if let Some(place) = unit
            && let Some(unit) = self.unit(ctx.file, place, ctx)
        {
            // Where an angular frequency is asked for, 1 Hz is 2π rad/s.
            value.id = self.scaled(value.id, &unit.angular_scale(), span);
            value.measure = Measure::of(unit.dimension);
        }
        self.expect(value, Dimension::SECOND.pow(-1), "a band of frequencies", ctx);
        Ok(value)
    }

    fn hundredth(&mut self, value: Bound) -> Bound {
        let span = self.net.exprs.span(value.id);
        let factor = self.net.exprs.push(Node::Ratio(1, 100), span);
        Bound { id: self.net.exprs.push(Node::Mul(value.id, factor), span), ..value }
    }

    /// A requirement's bound in coherent SI (or in dB), and the unit that it was written in.
    fn bound(
        &mut self,
        id: ast::ExprId,
        metric: &Metric,
        ctx: Context,
    ) -> Result<(Bound, Option<DisplayUnit>), LimitReached> {
        let file = &self.loaded.files[ctx.file];
        let expr = file.tree.expr(id);
        let needed = self.dimension_of(metric);
        if let ExprKind::WithUnit(inner, place) = expr.kind
            && let Some(unit) = self.unit(ctx.file, place, ctx)
        {
            let text: String = file.text(file.tree.units[place as usize]).split_whitespace().collect();
            if unit.decibel {
                let value = self.bind(inner, ctx)?;
                let ratio = matches!(
                    metric,
                    Metric::GainMargin(_) | Metric::ModulusMargin(_) | Metric::Peak(_) | Metric::Magnitude(..)
                );
                if !ratio {
                    let d = Diagnostic::new(Code::UnitMismatch, "decibels are for ratios, and this figure is none");
                    return Ok((self.broken(d.label(expr.span, "in dB"), ctx), None));
                }
                let scale = self.net.exprs.push(Node::Ratio(1, 1), expr.span);
                return Ok((value, Some(DisplayUnit { text, scale })));
            }
            let angular = matches!(metric, Metric::Crossover(_) | Metric::Bandwidth(_));
            let mut value = self.bind(if angular { inner } else { id }, ctx)?;
            if angular {
                value.id = self.scaled(value.id, &unit.angular_scale(), expr.span);
                value.measure = Measure::of(unit.dimension);
            }
            if let Some(needed) = needed {
                self.expect(value, needed, "this figure", ctx);
            }
            let scale = if angular { unit.angular_scale() } else { unit.scale };
            let scale = self.scale_value(&scale, expr.span);
            return Ok((value, Some(DisplayUnit { text, scale })));
        }
        let value = self.bind(id, ctx)?;
        if let Some(needed) = needed {
            self.expect(value, needed, "this figure", ctx);
        }
        if value.measure.known.is_some() {
            return Ok((value, None));
        }
        // A bare number is in the metric's own unit.
        let span = self.net.exprs.span(value.id);
        Ok(match metric {
            Metric::PhaseMargin(_) => {
                let pi = self.net.exprs.push(Node::Pi, span);
                let half_turn = self.net.exprs.push(Node::Ratio(1, 180), span);
                let degree = self.net.exprs.push(Node::Mul(pi, half_turn), span);
                (Bound { id: self.net.exprs.push(Node::Mul(value.id, degree), span), ..value }, None)
            }
            Metric::Overshoot(_) => (self.hundredth(value), None),
            _ => (value, None),
        })
    }

    /// The dimension of a figure, where it is known.
    fn dimension_of(&self, metric: &Metric) -> Option<Dimension> {
        let of = |pair: &Pair| {
            let (to, from) =
                (self.notes[pair.to.signal.index()].dimension?, self.notes[pair.from.signal.index()].dimension?);
            Some(to.div(from))
        };
        match metric {
            Metric::GainMargin(_)
            | Metric::PhaseMargin(_)
            | Metric::ModulusMargin(_)
            | Metric::Overshoot(_)
            | Metric::DampingRatio => Some(Dimension::ONE),
            Metric::DelayMargin(_) | Metric::RiseTime(_) | Metric::SettlingTime(..) => Some(Dimension::SECOND),
            Metric::Crossover(_) | Metric::Bandwidth(_) | Metric::DecayRate => Some(Dimension::SECOND.pow(-1)),
            Metric::Peak(pair) | Metric::Magnitude(pair, ..) => of(pair),
            Metric::FinalValue(pair, Stimulus::Step) => of(pair),
            Metric::FinalValue(..) => None,
        }
    }
}
