//! Where a lag or a dead time would break all the loops of a tangle, with the fewest places first.

use super::graph::Wiring;
use super::tangles::Tangle;
use super::walk::{self, Element};

/// Up to so many elements every choice of places is tried; the number of choices of three among them is 2024.
const MAX_EXACT: usize = 24;

/// The most places that a choice has that is found by trying.
const MAX_PLACES: usize = 3;

/// How many choices of the least number of places are told.
pub(super) const MAX_TOLD: usize = 8;

/// Choices of elements, each of which breaks every loop. All choices of the least number of places come, in the order of
/// the file, at most [`MAX_TOLD`]; of a large tangle one choice of few places comes. Blocks are preferred, since a
/// block can be given a lag; sums come in where a loop has no block.
pub(super) fn choices(wiring: &Wiring<'_>, tangle: &Tangle) -> Vec<Vec<Element>> {
    let owners: Vec<Option<Element>> = tangle.signals.iter().map(|&v| walk::driver(wiring, v)).collect();
    let mut elements: Vec<Element> = owners.iter().flatten().copied().collect();
    elements.sort_unstable();
    elements.dedup();
    let blocks: Vec<Element> = elements.iter().copied().filter(|e| matches!(e, Element::Block(_))).collect();
    let candidates = if breaks(tangle, &owners, &blocks) { blocks } else { elements };
    if candidates.len() <= MAX_EXACT {
        for places in 1..=MAX_PLACES.min(candidates.len()) {
            let found = all_of(places, &candidates, &|choice| breaks(tangle, &owners, choice));
            if !found.is_empty() {
                return found;
            }
        }
    }
    vec![greedy(tangle, &owners, &candidates)]
}

/// All choices of so many places that break every loop, at most [`MAX_TOLD`].
fn all_of(places: usize, candidates: &[Element], breaks: &dyn Fn(&[Element]) -> bool) -> Vec<Vec<Element>> {
    let mut found = Vec::new();
    let mut chosen: Vec<usize> = (0..places).collect();
    loop {
        let choice: Vec<Element> = chosen.iter().map(|&i| candidates[i]).collect();
        if breaks(&choice) {
            found.push(choice);
            if found.len() == MAX_TOLD {
                return found;
            }
        }
        // The next choice in lexicographic order.
        let Some(k) = (0..places).rev().find(|&k| chosen[k] + places - k < candidates.len()) else { return found };
        chosen[k] += 1;
        for later in k + 1..places {
            chosen[later] = chosen[later - 1] + 1;
        }
    }
}

/// Takes the elements that most branches meet at until no loop is left, then gives back those that are not needed.
fn greedy(tangle: &Tangle, owners: &[Option<Element>], candidates: &[Element]) -> Vec<Element> {
    let degree = |e: &Element| {
        let into = tangle.branches.iter().filter(|b| owners[b.to] == Some(*e)).count();
        let out = tangle.branches.iter().filter(|b| owners[b.from] == Some(*e)).count();
        into * out
    };
    let mut ranked: Vec<(usize, usize)> = candidates.iter().enumerate().map(|(i, e)| (degree(e), i)).collect();
    ranked.sort_by_key(|&(d, i)| (std::cmp::Reverse(d), i));
    // The least number of the first ones that breaks all, found by halving: breaking is monotonous.
    let first = |n: usize| -> Vec<Element> { ranked[..n].iter().map(|&(_, i)| candidates[i]).collect() };
    let (mut low, mut high) = (0, ranked.len());
    while low < high {
        let middle = usize::midpoint(low, high);
        if breaks(tangle, owners, &first(middle)) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    let mut chosen = first(low);
    if chosen.len() <= MAX_EXACT {
        for i in (0..chosen.len()).rev() {
            let mut without = chosen.clone();
            without.remove(i);
            if breaks(tangle, owners, &without) {
                chosen = without;
            }
        }
    }
    chosen.sort_unstable();
    chosen
}

/// Whether no loop is left when these elements answer with a delay (Kahn's method).
fn breaks(tangle: &Tangle, owners: &[Option<Element>], choice: &[Element]) -> bool {
    let gone = |v: usize| owners[v].is_some_and(|e| choice.contains(&e));
    let mut into = vec![0usize; owners.len()];
    let live: Vec<_> = tangle.branches.iter().filter(|b| !gone(b.to)).collect();
    live.iter().for_each(|b| into[b.to] += 1);
    let mut leaving = vec![Vec::new(); owners.len()];
    live.iter().for_each(|b| leaving[b.from].push(b.to));
    let mut waiting: Vec<usize> = (0..owners.len()).filter(|&v| into[v] == 0).collect();
    let mut done = 0;
    while let Some(v) = waiting.pop() {
        done += 1;
        for &w in &leaving[v] {
            into[w] -= 1;
            if into[w] == 0 {
                waiting.push(w);
            }
        }
    }
    done == owners.len()
}
