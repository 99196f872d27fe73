//! Closed walks through a tangle, and the elements (blocks and sums) that a signal meets on them.

use super::graph::Wiring;
use super::tangles::Tangle;
use crate::netlist::{BlockId, Driver, Law, SignalId, SumId};
use crate::source::Span;
use std::collections::VecDeque;

/// The most branches of a tangle for which a shortest closed walk through each is looked for; more cost their square.
const MAX_BRANCHES: usize = 1_000;

/// A block or a sum.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) enum Element {
    Block(BlockId),
    Sum(SumId),
}

/// What drives a signal that is on a loop.
pub(super) fn driver(wiring: &Wiring<'_>, v: SignalId) -> Option<Element> {
    match wiring.netlist.signals[v.index()].driver {
        Driver::Block(b) => Some(Element::Block(b)),
        Driver::Sum(s) => Some(Element::Sum(s)),
        Driver::Input | Driver::Nothing => None,
    }
}

/// The line that drives a signal, and what to call it: "block `G`", "sum `e`".
pub(super) fn element(wiring: &Wiring<'_>, v: SignalId) -> (Span, String) {
    let net = wiring.netlist;
    match net.signals[v.index()].driver {
        Driver::Input | Driver::Nothing => (net.signals[v.index()].origin.span, net.signal_name(v).to_owned()),
        Driver::Sum(sum) => {
            let sum = &net.sums[sum.index()];
            (sum.origin.span, format!("sum `{}`", net.signal_name(sum.output)))
        }
        Driver::Block(id) => {
            let block = &net.blocks[id.index()];
            let name = net.block_name(id);
            match &block.law {
                Law::States(equations) => equations.get(wiring.place(v)).filter(|e| e.left == v).map_or_else(
                    || (block.origin.span, format!("block `{name}`")),
                    |e| (e.span, format!("line `{}` of block `{name}`", net.signal_name(v))),
                ),
                _ => (block.origin.span, format!("block `{name}`")),
            }
        }
    }
}

/// The bare name of what drives a signal: a block's name, or a sum's.
pub(super) fn short_name<'n>(wiring: &Wiring<'n>, v: SignalId) -> &'n str {
    match wiring.netlist.signals[v.index()].driver {
        Driver::Block(b) => wiring.netlist.block_name(b),
        _ => wiring.netlist.signal_name(v),
    }
}

/// Closed walks that together use every branch of a tangle, each as a list of branches in the order in which the signal
/// travels: for each branch a shortest one through it, the shorter ones first, and of those only such as are no
/// combination of walks before them. At most one for each branch; their number is that of the tangle's independent
/// loops unless it is very large.
pub(super) fn basis(tangle: &Tangle) -> Vec<Vec<usize>> {
    let count = tangle.signals.len();
    let mut leaving = vec![Vec::new(); count];
    for (i, b) in tangle.branches.iter().enumerate() {
        leaving[b.from].push(i);
    }
    let mut found: Vec<Vec<usize>> = Vec::new();
    for (i, branch) in tangle.branches.iter().enumerate().take(MAX_BRANCHES) {
        let Some(mut path) = shortest(tangle, &leaving, branch.to, branch.from) else { continue };
        path.insert(0, i);
        // A walk is the same wherever it begins: it begins at the branch that leaves the first signal of the text.
        let first = (0..path.len()).min_by_key(|&k| tangle.branches[path[k]].from).unwrap_or(0);
        path.rotate_left(first);
        found.push(path);
    }
    found.sort_by(|a, b| a.len().cmp(&b.len()).then_with(|| a.cmp(b)));
    found.dedup();
    independent(found, tangle.branches.len())
}

/// The branches of a shortest path.
fn shortest(tangle: &Tangle, leaving: &[Vec<usize>], from: usize, to: usize) -> Option<Vec<usize>> {
    let mut by = vec![usize::MAX; leaving.len()];
    let mut waiting = VecDeque::from([from]);
    let mut seen = vec![false; leaving.len()];
    seen[from] = true;
    while let Some(v) = waiting.pop_front() {
        if v == to {
            let (mut path, mut at) = (Vec::new(), to);
            while at != from {
                path.push(by[at]);
                at = tangle.branches[by[at]].from;
            }
            path.reverse();
            return Some(path);
        }
        for &i in &leaving[v] {
            let next = tangle.branches[i].to;
            if !std::mem::replace(&mut seen[next], true) {
                by[next] = i;
                waiting.push_back(next);
            }
        }
    }
    None
}

/// Those walks that are no sum modulo 2 of walks before them.
fn independent(walks: Vec<Vec<usize>>, branches: usize) -> Vec<Vec<usize>> {
    let words = branches.div_ceil(64);
    let mut reduced: Vec<(usize, Vec<u64>)> = Vec::new();
    let mut kept = Vec::new();
    for walk in walks {
        let mut bits = vec![0u64; words];
        walk.iter().for_each(|&i| bits[i / 64] ^= 1 << (i % 64));
        for (pivot, row) in &reduced {
            if bits[pivot / 64] >> (pivot % 64) & 1 == 1 {
                bits.iter_mut().zip(row).for_each(|(x, y)| *x ^= y);
            }
        }
        if let Some(word) = bits.iter().position(|w| *w != 0) {
            let pivot = word * 64 + bits[word].trailing_zeros() as usize;
            reduced.push((pivot, bits));
            kept.push(walk);
        }
    }
    kept
}
