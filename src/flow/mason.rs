//! Mason's gain rule (S. J. Mason, "Feedback theory: further properties of signal flow graphs", Proc. IRE 44, 1956): the
//! gain is Σ P·Δ_P / Δ over the forward paths P, with Δ = 1 - Σ loops + Σ pairs of loops that do not touch - …, and Δ_P
//! the same over the loops that do not touch P.
//!
//! Independent of the elimination in `algebra::solve`: nothing is shared but the rows.

use super::graph::Wiring;
use super::paths::{self, Successors};
use super::rows::Laws;
use super::system::{Failure, Part, Question, Solved};
use crate::algebra::{Fraction, Poly};
use crate::netlist::SignalId;
use rustc_hash::FxHashMap;

/// The most loops, and the most forward paths, that are listed: a reviewer follows a few, and their number may double
/// with each block.
pub(super) const MAX_LOOPS: usize = 2_000;

/// The most groups of loops that do not touch.
pub(super) const MAX_GROUPS: usize = 5_000;

/// A branch with its gain.
#[derive(Clone, Debug)]
pub(super) struct Branch {
    pub(super) to: usize,
    pub(super) gain: Fraction,
}

/// The signal-flow graph of one question. Node 0 is the test signal; the others are the signals of the rows, with what the
/// test adds to them, in the order in which the test signal first reaches them.
#[derive(Debug)]
pub(super) struct FlowGraph {
    /// The signal of each node.
    pub(super) signals: Vec<SignalId>,
    /// Branches by where they begin, in the order of where they end.
    pub(super) branches: Vec<Vec<Branch>>,
    /// The node that answers.
    pub(super) target: usize,
    /// Whether the test signal is added to a signal that has a row here: then node 0 leads to it and nowhere else.
    pub(super) added: bool,
    /// Π of what the rows were multiplied with: Δ times this is the determinant of the signal equations.
    left: Poly,
    /// Whether some value was rounded.
    pub(super) rounded: bool,
}

/// Paths, loops and groups, all of them complete.
#[derive(Debug)]
pub(super) struct Rule {
    /// Forward paths as nodes, with their gains.
    pub(super) paths: Vec<(Vec<usize>, Fraction)>,
    /// Loops as nodes, with their gains.
    pub(super) loops: Vec<(Vec<usize>, Fraction)>,
    /// Groups of two and more loops that do not touch, with the products of their gains.
    pub(super) groups: Vec<(Vec<usize>, Fraction)>,
}

impl FlowGraph {
    /// The graph of a question over its part.
    ///
    /// # Errors
    ///
    /// What the laws say when they are worked out.
    pub(super) fn new(
        wiring: &Wiring<'_>,
        laws: &Laws<'_>,
        part: &Part,
        question: &Question<'_>,
    ) -> Result<Self, Failure> {
        let is_open = |u: SignalId| question.open.contains(&u);
        let signals = in_order(wiring, part, question);
        let nodes: FxHashMap<SignalId, usize> = signals.iter().enumerate().skip(1).map(|(i, &v)| (v, i)).collect();
        let source = nodes.get(&question.from).filter(|_| !is_open(question.from));
        let mut graph = Self {
            branches: vec![Vec::new(); signals.len()],
            target: nodes.get(&question.to).copied().unwrap_or(0),
            added: source.is_some(),
            left: Poly::one(),
            rounded: false,
            signals: Vec::new(),
        };
        if let Some(&to) = source {
            graph.branches[0].push(Branch { to, gain: Fraction::one() });
        }
        for (to, &v) in signals.iter().enumerate().skip(1) {
            let counts = |u| u == question.from || (part.place(u).is_some() && !is_open(u));
            let row = laws.row(wiring, v, counts)?;
            graph.rounded |= row.rounded;
            graph.left = graph.left.mul(&row.left);
            for (u, coefficient) in row.terms {
                let Some(gain) = Fraction::new(coefficient, row.left.clone()) else { continue };
                let from = nodes.get(&u).filter(|_| !is_open(u)).copied().unwrap_or(0);
                graph.branches[from].push(Branch { to, gain });
            }
        }
        graph.signals = signals;
        graph.branches.iter_mut().for_each(|list| list.sort_by_key(|b| b.to));
        Ok(graph)
    }

    /// The gain of a branch, 0 where there is none.
    pub(super) fn gain(&self, from: usize, to: usize) -> Fraction {
        let list = &self.branches[from];
        list.iter().find(|b| b.to == to).map_or_else(Fraction::zero, |b| b.gain.clone())
    }

    fn product(&self, nodes: &[usize], closed: bool) -> Fraction {
        let mut gain = nodes.windows(2).fold(Fraction::one(), |g, w| g.mul(&self.gain(w[0], w[1])));
        if let (true, Some(&first), Some(&last)) = (closed, nodes.first(), nodes.last()) {
            gain = gain.mul(&self.gain(last, first));
        }
        gain
    }

    /// Lists paths, loops and groups.
    ///
    /// # Errors
    ///
    /// [`Failure::Limit`] with how many there are at least.
    pub(super) fn rule(&self) -> Result<Rule, Failure> {
        let next: Successors = self.branches.iter().map(|list| list.iter().map(|b| b.to).collect()).collect();
        let cut = |listed: paths::Listed, what: &str| {
            if listed.complete {
                return Ok(listed.found);
            }
            Err(Failure::Limit(format!("there are more than {} {what}", listed.found.len())))
        };
        // Without a row that answers, only the test signal itself does, where it is asked for.
        let found = if self.target == 0 {
            paths::Listed { found: Vec::new(), complete: true }
        } else {
            paths::simple_paths(&next, 0, self.target, MAX_LOOPS)
        };
        let forward = cut(found, "forward paths")?;
        let loops = cut(paths::circuits(&next, MAX_LOOPS), "loops")?;
        let with_gain = |list: Vec<Vec<usize>>, closed: bool| {
            list.into_iter()
                .map(|nodes| {
                    let gain = self.product(&nodes, closed);
                    (nodes, gain)
                })
                .collect::<Vec<_>>()
        };
        let loops = with_gain(loops, true);
        let groups = groups(&loops)?;
        Ok(Rule { paths: with_gain(forward, false), loops, groups })
    }
}

/// The signal where the test signal is added, then those of the rows, by how many branches the test signal needs to
/// reach them.
fn in_order(wiring: &Wiring<'_>, part: &Part, question: &Question<'_>) -> Vec<SignalId> {
    let mut order = vec![question.from];
    let mut seen = vec![false; part.rows.len()];
    if let Some(place) = part.place(question.from).filter(|_| !question.open.contains(&question.from)) {
        seen[place] = true;
        order.push(question.from);
    }
    let mut next = 0;
    while next < order.len() {
        let u = order[next];
        next += 1;
        if next > 1 && question.open.contains(&u) {
            continue;
        }
        for &v in wiring.readers(u) {
            if let Some(place) = part.place(v) {
                if !std::mem::replace(&mut seen[place], true) {
                    order.push(v);
                }
            }
        }
    }
    order
}

/// Whether two sorted or unsorted lists of nodes share one.
pub(super) fn touch(a: &[usize], b: &[usize]) -> bool {
    a.iter().any(|x| b.contains(x))
}

/// Groups of loops of which no two share a node: the pairs first, each level in lexicographic order.
fn groups(loops: &[(Vec<usize>, Fraction)]) -> Result<Vec<(Vec<usize>, Fraction)>, Failure> {
    let mut out: Vec<(Vec<usize>, Fraction)> = Vec::new();
    let apart: Vec<Vec<usize>> = (0..loops.len())
        .map(|i| (i + 1..loops.len()).filter(|&j| !touch(&loops[i].0, &loops[j].0)).collect())
        .collect();
    let mut level: Vec<(Vec<usize>, Fraction)> =
        loops.iter().enumerate().map(|(i, (_, gain))| (vec![i], gain.clone())).collect();
    while !level.is_empty() {
        let mut next = Vec::new();
        for (group, gain) in &level {
            let Some(&last) = group.last() else { continue };
            for &j in &apart[last] {
                if group.iter().any(|i| apart[*i].binary_search(&j).is_err()) {
                    continue;
                }
                if out.len() + next.len() == MAX_GROUPS {
                    return Err(Failure::Limit(format!(
                        "there are more than {MAX_GROUPS} groups of loops that do not touch"
                    )));
                }
                let mut larger = group.clone();
                larger.push(j);
                next.push((larger, gain.mul(&loops[j].1)));
            }
        }
        out.extend(next.iter().cloned());
        level = next;
    }
    Ok(out)
}

impl Rule {
    /// 1 - Σ loops + Σ pairs - … over the loops for which `counts` holds.
    pub(super) fn determinant(&self, counts: impl Fn(usize) -> bool) -> Fraction {
        let mut sum = Fraction::one();
        for (_, (_, gain)) in self.loops.iter().enumerate().filter(|(i, _)| counts(*i)) {
            sum = sum.sub(gain);
        }
        for (group, gain) in self.groups.iter().filter(|(g, _)| g.iter().all(|&i| counts(i))) {
            sum = if group.len() % 2 == 0 { sum.add(gain) } else { sum.sub(gain) };
        }
        sum
    }

    /// The determinant over the loops that do not touch a path.
    pub(super) fn cofactor(&self, path: &[usize]) -> Fraction {
        self.determinant(|i| !touch(&self.loops[i].0, path))
    }

    /// Σ P·Δ_P.
    pub(super) fn above(&self) -> Fraction {
        self.paths.iter().fold(Fraction::zero(), |sum, (nodes, gain)| sum.add(&gain.mul(&self.cofactor(nodes))))
    }
}

/// Solves a question by the rule: the same as `system::solve`, by another way.
///
/// # Errors
///
/// [`Failure`].
pub(super) fn solve(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    question: &Question<'_>,
) -> Result<Solved, Failure> {
    let graph = FlowGraph::new(wiring, laws, part, question)?;
    let rule = graph.rule()?;
    let determinant = rule.determinant(|_| true);
    if determinant.is_zero() {
        return Err(Failure::Singular);
    }
    let left = Fraction::from(graph.left.clone());
    let (above, below) = (rule.above().mul(&left), determinant.mul(&left));
    // Both are polynomials: each row's denominators were multiplied away.
    let mut solved = Solved {
        numerator: above.numerator().mul(below.denominator()),
        determinant: below.numerator().mul(above.denominator()),
        rounded: graph.rounded,
    };
    let itself = question.from == question.to && !question.open.contains(&question.to);
    if itself && !graph.added {
        solved.numerator = solved.numerator.add(&solved.determinant);
    }
    Ok(solved)
}
