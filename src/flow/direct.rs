//! How laws behave at infinite frequency, found without working them out: each expression's leading term c·s^k, with c
//! modulo a prime. A c that is not 0 modulo the prime is not 0 at all, so the power k is certain; where leading terms
//! cancel, or a function that has no residue occurs, nothing is claimed and the exact value has to decide.
//!
//! This is what lets a netlist of a million statements be searched for algebraic loops in linear time.

use super::graph::Wiring;
use crate::algebra::Poly;
use crate::algebra::prime::Prime;
use crate::netlist::expr::{Expr, ExprId};
use crate::netlist::values::params_in;
use crate::netlist::{CaseId, Driver, Keep, Law, Netlist, ParamId, SignalId};
use petgraph::algo::kosaraju_scc;
use petgraph::graph::DiGraph;

/// What an expression is like as s → ∞.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Lead {
    /// Not looked at yet.
    Unset,
    /// Exactly 0.
    Zero,
    /// (above/below)·s^power with both residues other than 0.
    Term {
        above: u64,
        below: u64,
        power: i32,
        /// The only dead time in it, as a symbol, and whether it is a factor of the whole.
        delay: Option<(ExprId, bool)>,
    },
    /// Only its exact value can tell.
    Unknown,
}

/// Leading terms of the expressions of a netlist, for one case with some params kept; each worked out once.
#[derive(Debug)]
pub(crate) struct Leads<'n> {
    netlist: &'n Netlist,
    prime: Prime,
    known: Vec<Lead>,
    given: Vec<Option<ExprId>>,
}

impl<'n> Leads<'n> {
    /// Nothing is worked out yet.
    pub(crate) fn new(netlist: &'n Netlist, case: Option<CaseId>, keep: &Keep) -> Self {
        let mut given: Vec<Option<ExprId>> = netlist.params.iter().map(|p| p.value).collect();
        if let Some(case) = case.or(netlist.nominal) {
            for &(param, value) in &netlist.cases[case.index()].settings {
                given[param.index()] = Some(value);
            }
        }
        match keep {
            Keep::Nothing => {}
            Keep::All => {
                let derived = |e: &ExprId| !params_in(netlist, *e).is_empty();
                given.iter_mut().for_each(|g| *g = g.filter(derived));
            }
            Keep::Params(list) => list.iter().for_each(|p| given[p.index()] = None),
        }
        Self { netlist, prime: Prime::first(), known: vec![Lead::Unset; netlist.exprs.len()], given }
    }

    /// The leading term of an expression, dead times taken as symbols.
    pub(crate) fn of(&mut self, root: ExprId) -> Lead {
        let mut stack = vec![root];
        while let Some(&id) = stack.last() {
            if self.known[id.0 as usize] != Lead::Unset {
                stack.pop();
                continue;
            }
            let before = stack.len();
            let node = self.netlist.exprs.get(id);
            if let Expr::Param(param) = node {
                let value = self.given[param.index()];
                stack.extend(value.filter(|v| self.known[v.0 as usize] == Lead::Unset));
            } else {
                stack.extend(self.netlist.exprs.children(id).filter(|c| self.known[c.0 as usize] == Lead::Unset));
            }
            // A circle of params, which is told elsewhere, would pile up without end.
            if stack.len() > self.known.len() + 2 {
                return Lead::Unknown;
            }
            if stack.len() == before {
                self.known[id.0 as usize] = self.combine(id, node);
                stack.pop();
            }
        }
        self.known[root.0 as usize]
    }

    /// As [`Self::of`], but with dead times as they act at infinite frequency on the right half-plane: 0.
    fn without_delays(&mut self, root: ExprId) -> Lead {
        match self.of(root) {
            Lead::Term { delay: Some((_, true)), .. } => Lead::Zero,
            Lead::Term { delay: Some((_, false)), .. } => Lead::Unknown,
            lead => lead,
        }
    }

    fn combine(&self, id: ExprId, node: Expr) -> Lead {
        let at = |e: ExprId| self.known[e.0 as usize];
        let p = &self.prime;
        let constant = |above: u64, below: u64| match (above, below) {
            (_, 0) => Lead::Unknown,
            (0, _) => Lead::Unknown,
            _ => Lead::Term { above, below, power: 0, delay: None },
        };
        match node {
            Expr::Ratio(0, _) => Lead::Zero,
            Expr::Ratio(n, d) => constant(p.of_signed(i64::from(n)), p.of(u64::from(d))),
            Expr::Number(place) => {
                let value = self.netlist.exprs.number(place);
                constant(p.of_big(value.numerator()), p.of_big(&value.denominator().clone().into()))
            }
            Expr::Pi => constant(p.scattered(u64::MAX), p.one),
            Expr::S | Expr::Z => Lead::Term { above: p.one, below: p.one, power: 1, delay: None },
            Expr::Param(param) => self.given[param.index()].map_or_else(|| self.symbol(param), at),
            Expr::Neg(a) => match at(a) {
                Lead::Term { above, below, power, delay } => Lead::Term { above: p.sub(0, above), below, power, delay },
                other => other,
            },
            Expr::Add(a, b) => self.sum(at(a), at(b), false),
            Expr::Sub(a, b) => self.sum(at(a), at(b), true),
            Expr::Mul(a, b) => self.product(at(a), at(b), false),
            Expr::Div(a, b) => self.product(at(a), at(b), true),
            Expr::Pow(a, n) => self.power(at(a), n),
            Expr::Delay(a) => match at(a) {
                Lead::Zero => Lead::Term { above: p.one, below: p.one, power: 0, delay: None },
                Lead::Term { .. } => {
                    Lead::Term { above: p.scattered(u64::MAX - 1), below: p.one, power: 0, delay: Some((id, true)) }
                }
                Lead::Unknown | Lead::Unset => Lead::Unknown,
            },
            Expr::Call(..) | Expr::Min(..) | Expr::Max(..) => Lead::Unknown,
        }
    }

    fn symbol(&self, param: ParamId) -> Lead {
        let above = self.prime.scattered(u64::from(param.0));
        Lead::Term { above, below: self.prime.one, power: 0, delay: None }
    }

    fn sum(&self, a: Lead, b: Lead, minus: bool) -> Lead {
        let p = &self.prime;
        match (a, b) {
            (_, Lead::Zero) => a,
            (Lead::Zero, Lead::Term { above, below, power, delay }) => {
                let above = if minus { p.sub(0, above) } else { above };
                Lead::Term { above, below, power, delay }
            }
            (
                Lead::Term { above: n, below: d, power: j, delay: x },
                Lead::Term { above: m, below: e, power: k, delay: y },
            ) => {
                let Some(delay) = one_delay(x, y) else { return Lead::Unknown };
                let whole = matches!((x, y), (Some((_, true)), Some((_, true))));
                let delay = delay.map(|d| (d, whole));
                let (left, right) = (p.mul(n, e), p.mul(m, d));
                let above = match (j.cmp(&k), minus) {
                    (std::cmp::Ordering::Greater, _) => return Lead::Term { above: n, below: d, power: j, delay },
                    (std::cmp::Ordering::Less, false) => return Lead::Term { above: m, below: e, power: k, delay },
                    (std::cmp::Ordering::Less, true) => {
                        return Lead::Term { above: p.sub(0, m), below: e, power: k, delay };
                    }
                    (std::cmp::Ordering::Equal, false) => p.add(left, right),
                    (std::cmp::Ordering::Equal, true) => p.sub(left, right),
                };
                if above == 0 { Lead::Unknown } else { Lead::Term { above, below: p.mul(d, e), power: j, delay } }
            }
            _ => Lead::Unknown,
        }
    }

    fn product(&self, a: Lead, b: Lead, divide: bool) -> Lead {
        let p = &self.prime;
        match (a, b) {
            (Lead::Zero, Lead::Term { .. }) => Lead::Zero,
            (_, Lead::Zero) if !divide && a != Lead::Unknown => Lead::Zero,
            (
                Lead::Term { above: n, below: d, power: j, delay: x },
                Lead::Term { above: m, below: e, power: k, delay: y },
            ) => {
                let Some(delay) = one_delay(x, y) else { return Lead::Unknown };
                let whole = x.is_none_or(|x| x.1) && y.is_none_or(|y| y.1 && !divide);
                let delay = delay.map(|d| (d, whole));
                let (m, e, k) = if divide { (e, m, k.saturating_neg()) } else { (m, e, k) };
                Lead::Term { above: p.mul(n, m), below: p.mul(d, e), power: j.saturating_add(k), delay }
            }
            _ => Lead::Unknown,
        }
    }

    fn power(&self, a: Lead, n: i32) -> Lead {
        let p = &self.prime;
        match a {
            Lead::Zero if n > 0 => Lead::Zero,
            Lead::Term { above, below, power, delay } => {
                let (above, below) = if n < 0 { (below, above) } else { (above, below) };
                let k = u64::from(n.unsigned_abs());
                Lead::Term {
                    above: p.pow(above, k),
                    below: p.pow(below, k),
                    power: power.saturating_mul(n),
                    delay: delay.filter(|_| n != 0).map(|(d, whole)| (d, whole && n > 0)),
                }
            }
            _ => Lead::Unknown,
        }
    }
}

/// The one dead time of two expressions; `None` where they have different ones, which need not be independent.
fn one_delay(a: Option<(ExprId, bool)>, b: Option<(ExprId, bool)>) -> Option<Option<ExprId>> {
    match (a, b) {
        (Some(x), Some(y)) if x.0 != y.0 => None,
        _ => Some(a.or(b).map(|d| d.0)),
    }
}

/// Sets of signals among which all algebraic loops of a netlist lie: small where nothing but lags and dead times
/// closes loops. Signals of each in the order of their numbers.
pub(crate) fn candidates(wiring: &Wiring<'_>, leads: &mut Leads<'_>) -> Vec<Vec<SignalId>> {
    let count = wiring.netlist.signals.len();
    let (mut direct, mut doubtful) = (Vec::new(), Vec::new());
    for v in 0..count {
        branches(wiring, leads, SignalId(v as u32), |u, power| match power {
            Some(k) if k < 0 => {}
            Some(0) => direct.push((u.0, v as u32)),
            _ => doubtful.push((u.0, v as u32)),
        });
    }
    if doubtful.is_empty() {
        return components(count, direct);
    }
    // A law that grows may meet one that falls off: then the whole of the tangle that holds it has to be looked at.
    let mut all = Vec::new();
    for v in 0..count {
        wiring.reads(SignalId(v as u32), |u| all.push((u.0, v as u32)));
    }
    let mut place = vec![u32::MAX; count];
    let whole = components(count, all);
    for (i, component) in whole.iter().enumerate() {
        component.iter().for_each(|v| place[v.index()] = i as u32);
    }
    let inside = |&(u, v): &(u32, u32)| place[u as usize] != u32::MAX && place[u as usize] == place[v as usize];
    let mut marked = vec![false; whole.len()];
    doubtful.iter().filter(|e| inside(e)).for_each(|(u, _)| marked[place[*u as usize] as usize] = true);
    direct.retain(|e| inside(e) && !marked[place[e.0 as usize] as usize]);
    let mut found = components(count, direct);
    found.extend(whole.into_iter().zip(marked).filter(|(_, m)| *m).map(|(c, _)| c));
    found.sort();
    found
}

/// Calls `each` with every signal that the row of `v` reads through something that may be other than 0, and the power
/// of s with which it acts at infinite frequency, where that is certain.
fn branches(wiring: &Wiring<'_>, leads: &mut Leads<'_>, v: SignalId, mut each: impl FnMut(SignalId, Option<i32>)) {
    let net = wiring.netlist;
    let power = |lead: Lead| match lead {
        Lead::Zero => None,
        Lead::Term { power, .. } => Some(Some(power)),
        Lead::Unknown | Lead::Unset => Some(None),
    };
    match net.signals[v.index()].driver {
        Driver::Input | Driver::Nothing => {}
        Driver::Sum(sum) => {
            for term in net.terms_of(&net.sums[sum.index()]) {
                let lead = term.factor.map(|f| power(leads.of(f)));
                if let Some(k) = lead.unwrap_or(Some(Some(0))) {
                    each(term.signal, k);
                }
            }
        }
        Driver::Block(block) => {
            let block = &net.blocks[block.index()];
            match &block.law {
                Law::Scalar(law) => {
                    if let (Some(k), Some(&u)) = (power(leads.without_delays(*law)), block.inputs.first()) {
                        each(u, k);
                    }
                }
                Law::Matrix(rows) => {
                    let row = rows.get(wiring.place(v)).map_or(&[][..], |r| &r[..]);
                    for (&law, &u) in row.iter().zip(&block.inputs) {
                        if let Some(k) = power(leads.without_delays(law)) {
                            each(u, k);
                        }
                    }
                }
                Law::States(equations) => {
                    let Some(equation) = equations.get(wiring.place(v)).filter(|e| e.left == v) else { return };
                    for term in &equation.terms {
                        if let Some(k) = power(leads.of(term.coefficient)) {
                            let shift = i32::from(term.derivative) - i32::from(equation.derivative);
                            each(term.variable, k.map(|k| k + shift));
                        }
                    }
                }
            }
        }
    }
}

/// Strongly connected components with a branch inside, each in the order of signals. What no circle leads to is peeled
/// off before the graph is made.
fn components(count: usize, mut edges: Vec<(u32, u32)>) -> Vec<Vec<SignalId>> {
    let mut into = vec![0u32; count];
    edges.iter().for_each(|e| into[e.1 as usize] += 1);
    edges.sort_unstable();
    let first = |u: u32| edges.partition_point(|e| e.0 < u);
    let mut waiting: Vec<u32> = (0..count as u32).filter(|&v| into[v as usize] == 0).collect();
    let mut peeled = vec![false; count];
    while let Some(u) = waiting.pop() {
        peeled[u as usize] = true;
        for e in edges[first(u)..].iter().take_while(|e| e.0 == u) {
            into[e.1 as usize] -= 1;
            if into[e.1 as usize] == 0 {
                waiting.push(e.1);
            }
        }
    }
    edges.retain(|e| !peeled[e.0 as usize]);
    if edges.is_empty() {
        return Vec::new();
    }
    let mut nodes: Vec<u32> = edges.iter().flat_map(|e| [e.0, e.1]).collect();
    nodes.sort_unstable();
    nodes.dedup();
    let at = |v: u32| nodes.partition_point(|&n| n < v) as u32;
    let graph = DiGraph::<(), ()>::from_edges(edges.iter().map(|e| (at(e.0), at(e.1))));
    let mut found = Vec::new();
    // Kosaraju's method, since petgraph's Tarjan is recursive.
    for component in kosaraju_scc(&graph) {
        let own = component.len() > 1 || graph.contains_edge(component[0], component[0]);
        if own {
            let mut signals: Vec<SignalId> = component.iter().map(|n| SignalId(nodes[n.index()])).collect();
            signals.sort_unstable();
            found.push(signals);
        }
    }
    found.sort();
    found
}

/// The leading behaviour of a fraction as s → ∞ with dead times as 0: the power of s, and coefficient above and below.
/// `None` for what is 0 there, or where the denominator has nothing but dead times.
pub(crate) fn exact_lead(above: &Poly, below: &Poly) -> Option<(i64, Poly, Poly)> {
    let at_rest = |p: &Poly| {
        let terms = p.terms().filter(|(powers, _)| powers.iter().all(|(v, _)| !super::transfer::is_delay(*v)));
        Poly::from_terms(terms)
    };
    let (above, below) = (at_rest(above), at_rest(below));
    let lead = |p: &Poly| p.coefficients(crate::algebra::Var::S).pop();
    let (n, d) = (lead(&above)?, lead(&below)?);
    let degree = |p: &Poly| i64::from(p.degree(crate::algebra::Var::S));
    Some((degree(&above) - degree(&below), n, d))
}
