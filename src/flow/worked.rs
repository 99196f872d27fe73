//! The gain rule worked out as a result: names first, expressions beside them.

use super::cases::{self, Cases};
use super::graph::Wiring;
use super::ill_posed;
use super::mason::{self, FlowGraph, Rule};
use super::rates;
use super::rows::Laws;
use super::system::{Failure, Part, Question};
use super::text::{self, Names};
use super::transfer;
use crate::algebra::{Fraction, Var};
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::values::PARAMS;
use crate::netlist::{Asked, Driver, Law, Netlist, Request, RequestKind, SignalId};
use crate::results::Form;
use crate::results::mason::{Mason, MasonBranch, MasonGain, MasonGroup, MasonLoop, MasonPath, MasonResult};
use std::sync::Arc;

/// Works the rule out for one request: a transfer function, or the return ratio at one signal.
///
/// # Errors
///
/// What can't be answered, with the limit of loops where that is the reason.
pub(super) fn mason(netlist: &Netlist, request: &Request) -> Result<Mason, Vec<Diagnostic>> {
    if let Some(diagnostic) = rates::unanswered(netlist) {
        return Err(vec![diagnostic]);
    }
    let (to, from, at) = ends(request)?;
    let mut told = Vec::new();
    let case = cases::of(netlist, &request.clauses.cases, request.span, &mut told).first().copied().flatten();
    let laws = Cases::new(netlist).laws(case, &request.clauses.keep, &mut told).ok_or(told)?;
    let wiring = Wiring::new(netlist);
    let open: Vec<SignalId> = request.clauses.open.iter().chain(&at).map(|a| a.signal).collect();
    let question = Question { from: from.signal, to: to.signal, open: &open };
    let part = Part::between(&wiring, &question);
    let unsolvable = ill_posed::at_infinity(&wiring, &laws, &question).map_err(|d| vec![*d])?;
    if let Some(diagnostic) = unsolvable {
        return Err(vec![diagnostic]);
    }
    let work = || {
        let graph = FlowGraph::new(&wiring, &laws, &part, &question)?;
        let rule = graph.rule()?;
        let solved = mason::solve(&wiring, &laws, &part, &question)?;
        let gain = Fraction::new(solved.numerator, solved.determinant).ok_or(Failure::Singular)?;
        Ok((graph, rule, gain))
    };
    let (graph, rule, gain) = work().map_err(|failure| {
        vec![match failure {
            Failure::Told(diagnostic) => *diagnostic,
            Failure::Singular => ill_posed::singular(&wiring, &laws, &part, &open),
            Failure::Limit(text) => too_many(&text, request),
        }]
    })?;
    let teller = Teller { wiring: &wiring, laws: &laws, graph: &graph };
    let sampled = transfer::is_sampled(netlist.time_base);
    Ok(Mason {
        schema: "loopwright.mason.1",
        model: netlist.model.clone(),
        ok: true,
        diagnostics: Vec::new(),
        from: if at.is_empty() { from.text.clone() } else { format!("loop at {}", from.text) },
        to: to.text,
        at: at.iter().map(|a| a.text.clone()).collect(),
        open: request.clauses.open.iter().map(|a| a.text.clone()).collect(),
        kept: laws.values.kept().iter().map(|&p| laws.values.name(Var(PARAMS + p.0))).collect(),
        case: cases::name(netlist, case),
        variable: if sampled { "z" } else { "s" },
        sampling_period: rates::period(netlist, &laws),
        exact: !graph.rounded,
        paths: teller.paths(&rule),
        loops: teller.loops(&rule),
        groups: teller.groups(&rule),
        determinant: teller.determinant(&rule),
        cofactors: teller.cofactors(&rule),
        gain: teller.gain(&rule, &gain, !at.is_empty()),
    })
}

/// Where a request begins and ends, and what it cuts.
fn ends(request: &Request) -> Result<(Asked, Asked, Vec<Asked>), Vec<Diagnostic>> {
    match &request.kind {
        RequestKind::Transfer { to, from } => Ok((to.clone(), from.clone(), Vec::new())),
        RequestKind::Loop { at } if at.len() == 1 => Ok((at[0].clone(), at[0].clone(), at.clone())),
        RequestKind::Loop { .. } | RequestKind::All | RequestKind::Zeros { .. } => Err(vec![
            Diagnostic::new(Code::Syntax, "the gain rule is worked out for one transfer function at a time")
                .label(request.span, "this asks for several")
                .help("ask for one, such as `y/r` or `loop at u`"),
        ]),
    }
}

fn too_many(text: &str, request: &Request) -> Diagnostic {
    Diagnostic::new(Code::LimitReached, format!("the gain rule is too long to be worked out: {text}"))
        .label(request.span, "asked for here")
        .help("ask `derive` for it, which enumerates nothing, or open a loop with `with … open`")
}

struct Teller<'t, 'n> {
    wiring: &'t Wiring<'n>,
    laws: &'t Laws<'n>,
    graph: &'t FlowGraph,
}

impl Teller<'_, '_> {
    fn expression(&self, f: &Fraction) -> String {
        let names = Names::of(&self.laws.values, [f.numerator(), f.denominator()]);
        if self.graph.rounded { text::fraction_decimal(&names, f) } else { text::factored(&names, f) }
    }

    fn signal(&self, node: usize) -> SignalId {
        self.graph.signals[node]
    }

    fn signal_name(&self, node: usize) -> String {
        self.wiring.netlist.signal_name(self.signal(node)).to_owned()
    }

    /// A branch, and what it contributes to a product of names: its sign and its factor.
    fn branch(&self, from: usize, to: usize) -> (MasonBranch, bool, String) {
        let net = self.wiring.netlist;
        let gain = self.graph.gain(from, to);
        let (u, v) = (self.signal(from), self.signal(to));
        let expression = self.expression(&gain);
        let (negative, name) = match net.signals[v.index()].driver {
            Driver::Block(block) => {
                let name = net.block_name(block);
                match net.blocks[block.index()].law {
                    Law::Scalar(_) => (false, name.to_owned()),
                    _ => (false, format!("{name}[{},{}]", net.signal_name(v), net.signal_name(u))),
                }
            }
            // A plain term is told by its sign, another one by its factor.
            _ if gain == Fraction::one() => (false, String::new()),
            _ if gain == Fraction::one().neg() => (true, String::new()),
            _ => {
                let negative = expression.starts_with('-') && gain.numerator().len() == 1;
                let plain = expression.trim_start_matches('-');
                let text = if negative { plain } else { &expression };
                (negative, if text.contains(' ') { format!("({text})") } else { text.to_owned() })
            }
        };
        let told =
            MasonBranch { name: name.clone(), from: self.signal_name(from), to: self.signal_name(to), expression };
        (told, negative, name)
    }

    /// The branches of a walk and its gain by names.
    fn walk(&self, nodes: &[usize], closed: bool) -> (Vec<MasonBranch>, String) {
        let mut pairs: Vec<(usize, usize)> = nodes.windows(2).map(|w| (w[0], w[1])).collect();
        if let (true, Some(&first), Some(&last)) = (closed, nodes.first(), nodes.last()) {
            pairs.push((last, first));
        }
        let (mut branches, mut factors, mut minus) = (Vec::new(), Vec::new(), false);
        for (from, to) in pairs {
            if from == 0 && self.graph.added {
                continue;
            }
            let (branch, negative, factor) = self.branch(from, to);
            minus ^= negative;
            if !factor.is_empty() {
                factors.push(factor);
            }
            branches.push(branch);
        }
        let product = if factors.is_empty() { "1".to_owned() } else { factors.join("*") };
        (branches, if minus { format!("-{product}") } else { product })
    }

    fn paths(&self, rule: &Rule) -> Vec<MasonPath> {
        let tell = |(i, (nodes, gain)): (usize, &(Vec<usize>, Fraction))| {
            let (branches, names) = self.walk(nodes, false);
            let shown = if self.graph.added { &nodes[1..] } else { &nodes[..] };
            let touches = rule.loops.iter().enumerate().filter(|(_, (l, _))| mason::touch(l, nodes));
            MasonPath {
                name: format!("P{}", i + 1),
                signals: shown.iter().map(|&n| self.signal_name(n)).collect(),
                branches,
                names,
                expression: self.expression(gain),
                touches: touches.map(|(j, _)| loop_name(j)).collect(),
            }
        };
        rule.paths.iter().enumerate().map(tell).collect()
    }

    fn loops(&self, rule: &Rule) -> Vec<MasonLoop> {
        let tell = |(i, (nodes, gain)): (usize, &(Vec<usize>, Fraction))| {
            let (branches, names) = self.walk(nodes, true);
            MasonLoop {
                name: loop_name(i),
                signals: nodes.iter().map(|&n| self.signal_name(n)).collect(),
                branches,
                names,
                expression: self.expression(gain),
            }
        };
        rule.loops.iter().enumerate().map(tell).collect()
    }

    fn groups(&self, rule: &Rule) -> Vec<MasonGroup> {
        let tell = |(group, gain): &(Vec<usize>, Fraction)| MasonGroup {
            loops: group.iter().map(|&i| loop_name(i)).collect(),
            expression: self.expression(gain),
        };
        rule.groups.iter().map(tell).collect()
    }

    fn determinant(&self, rule: &Rule) -> MasonGain {
        let gain = rule.determinant(|_| true);
        MasonGain { name: "D".to_owned(), names: sum_of_loops(rule, |_| true), expression: self.expression(&gain) }
    }

    fn cofactors(&self, rule: &Rule) -> Vec<MasonGain> {
        let tell = |(k, (nodes, _)): (usize, &(Vec<usize>, Fraction))| MasonGain {
            name: format!("D{}", k + 1),
            names: sum_of_loops(rule, |i| !mason::touch(&rule.loops[i].0, nodes)),
            expression: self.expression(&rule.cofactor(nodes)),
        };
        rule.paths.iter().enumerate().map(tell).collect()
    }

    /// The whole, with the sign of a return ratio where it is one.
    fn gain(&self, rule: &Rule, gain: &Fraction, ratio: bool) -> MasonResult {
        let terms: Vec<String> = (1..=rule.paths.len()).map(|k| format!("P{k}*D{k}")).collect();
        let above = match terms.as_slice() {
            [] => "0".to_owned(),
            [one] => one.clone(),
            several => format!("({})", several.join(" + ")),
        };
        let gain = if ratio { gain.neg() } else { gain.clone() };
        let (n, d) = transfer::with_sign(&self.laws.values, &gain);
        let (n, d) = (Arc::new(n), Arc::new(d));
        let names = Names::of(&self.laws.values, [&*n, &*d]);
        let exact = !self.graph.rounded;
        MasonResult {
            names: format!("{}{above}/D", if ratio { "-" } else { "" }),
            expression: self.expression(&gain),
            numerator: exact.then(|| transfer::exact_terms(&self.laws.values, &n)),
            denominator: exact.then(|| transfer::exact_terms(&self.laws.values, &d)),
            form: Some(Form { numerator: n, denominator: d, names: names.table() }),
        }
    }
}

fn loop_name(i: usize) -> String {
    format!("L{}", i + 1)
}

/// `1 - L1 - L2 + L1*L2` over the loops for which `counts` holds.
fn sum_of_loops(rule: &Rule, counts: impl Fn(usize) -> bool) -> String {
    let mut out = "1".to_owned();
    for i in (0..rule.loops.len()).filter(|&i| counts(i)) {
        out.push_str(" - ");
        out.push_str(&loop_name(i));
    }
    for (group, _) in rule.groups.iter().filter(|(g, _)| g.iter().all(|&i| counts(i))) {
        out.push_str(if group.len() % 2 == 0 { " + " } else { " - " });
        out.push_str(&group.iter().map(|&i| loop_name(i)).collect::<Vec<_>>().join("*"));
    }
    out
}
