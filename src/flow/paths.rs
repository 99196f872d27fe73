//! Simple paths and elementary circuits of a small graph, listed in a fixed order, without recursion.

/// Branches by where they begin: for each node the nodes where branches from it end, each once, rising.
pub(super) type Successors = Vec<Vec<usize>>;

/// The most steps of one search: beyond it a search that finds little would seem to hang.
const MAX_STEPS: usize = 5_000_000;

/// What a search found, and whether it was all.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Listed {
    /// Each as the nodes that it visits, in order.
    pub(super) found: Vec<Vec<usize>>,
    /// Whether there are no more.
    pub(super) complete: bool,
}

/// All paths from `from` to `to` that visit no node twice, in lexicographic order, at most `limit`.
pub(super) fn simple_paths(next: &Successors, from: usize, to: usize, limit: usize) -> Listed {
    let mut listed = Listed { found: Vec::new(), complete: true };
    if from == to {
        listed.found.push(vec![from]);
        return listed;
    }
    let alive = reaching(next, to);
    let mut path = vec![from];
    let mut on_path = vec![false; next.len()];
    on_path[from] = true;
    let mut places = vec![0];
    let mut steps = 0;
    while let (Some(&v), Some(place)) = (path.last(), places.last_mut()) {
        steps += 1;
        if steps > MAX_STEPS {
            listed.complete = false;
            break;
        }
        let Some(&w) = next[v].get(*place) else {
            on_path[v] = false;
            path.pop();
            places.pop();
            continue;
        };
        *place += 1;
        if w == to {
            if listed.found.len() == limit {
                listed.complete = false;
                break;
            }
            let mut whole = path.clone();
            whole.push(w);
            listed.found.push(whole);
        } else if alive[w] && !on_path[w] {
            on_path[w] = true;
            path.push(w);
            places.push(0);
        }
    }
    listed
}

/// Which nodes have a path to `to`.
fn reaching(next: &Successors, to: usize) -> Vec<bool> {
    let mut before = vec![Vec::new(); next.len()];
    for (v, list) in next.iter().enumerate() {
        list.iter().for_each(|&w| before[w].push(v));
    }
    let mut seen = vec![false; next.len()];
    let mut waiting = vec![to];
    while let Some(v) = waiting.pop() {
        if !std::mem::replace(&mut seen[v], true) {
            waiting.extend(before[v].iter().filter(|&&u| !seen[u]));
        }
    }
    seen
}

/// All elementary circuits, each from its lowest node, in lexicographic order of their nodes, at most `limit`.
///
/// D. B. Johnson, "Finding all the elementary circuits of a directed graph", SIAM J. Comput. 4 (1975): from each node s a
/// search over higher nodes of its strongly connected component, in which a node that led nowhere stays blocked until
/// a node after it is freed. Time is that of the circuits found times the size of the graph.
pub(super) fn circuits(next: &Successors, limit: usize) -> Listed {
    let mut listed = Listed { found: Vec::new(), complete: true };
    let mut steps = 0;
    for s in 0..next.len() {
        let inside = component(next, s);
        if !from_here(next, s, &inside, limit, &mut steps, &mut listed.found) {
            listed.complete = false;
            break;
        }
    }
    listed
}

/// The circuits through `s` whose other nodes are above it; false where a limit was met.
fn from_here(
    next: &Successors,
    s: usize,
    inside: &[bool],
    limit: usize,
    steps: &mut usize,
    found: &mut Vec<Vec<usize>>,
) -> bool {
    let mut blocked = vec![false; next.len()];
    let mut waits_for: Vec<Vec<usize>> = vec![Vec::new(); next.len()];
    let mut path = vec![s];
    // For each node of the path: the place of its next branch, and whether a circuit was closed after it.
    let mut state = vec![(0, false)];
    blocked[s] = true;
    while let (Some(&v), Some((place, closed))) = (path.last(), state.last_mut()) {
        *steps += 1;
        if *steps > MAX_STEPS {
            return false;
        }
        if let Some(&w) = next[v].get(*place) {
            *place += 1;
            if w == s {
                if found.len() == limit {
                    return false;
                }
                *closed = true;
                found.push(path.clone());
            } else if inside[w] && !blocked[w] {
                blocked[w] = true;
                path.push(w);
                state.push((0, false));
            }
            continue;
        }
        let closed = *closed;
        if closed {
            free(v, &mut blocked, &mut waits_for);
        } else {
            for &w in next[v].iter().filter(|&&w| inside[w]) {
                if !waits_for[w].contains(&v) {
                    waits_for[w].push(v);
                }
            }
        }
        path.pop();
        state.pop();
        if let Some((_, before)) = state.last_mut() {
            *before |= closed;
        }
    }
    true
}

/// Unblocks a node and all that wait for it.
fn free(v: usize, blocked: &mut [bool], waits_for: &mut [Vec<usize>]) {
    let mut waiting = vec![v];
    while let Some(v) = waiting.pop() {
        if std::mem::replace(&mut blocked[v], false) {
            waiting.append(&mut waits_for[v]);
        }
    }
}

/// The nodes above `s`, and `s`, that reach it and are reached from it over such nodes.
fn component(next: &Successors, s: usize) -> Vec<bool> {
    let upper: Successors = next
        .iter()
        .enumerate()
        .map(|(v, list)| if v < s { Vec::new() } else { list.iter().copied().filter(|&w| w >= s).collect() })
        .collect();
    let before = reaching(&upper, s);
    let mut after = vec![false; next.len()];
    let mut waiting = vec![s];
    while let Some(v) = waiting.pop() {
        if !std::mem::replace(&mut after[v], true) {
            waiting.extend(upper[v].iter().filter(|&&w| !after[w]));
        }
    }
    before.iter().zip(after).map(|(a, b)| *a && b).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn complete(n: usize) -> Successors {
        (0..n).map(|v| (0..n).filter(|&w| w != v).collect()).collect()
    }

    /// The complete directed graph on n nodes has Σ C(n, k)·(k - 1)! circuits, k from 2 to n: 84 for n = 5, 409 for 6
    /// (Johnson 1975, section 1).
    #[test]
    fn circuits_of_complete_graphs() {
        assert_eq!(circuits(&complete(5), 1000).found.len(), 84);
        let six = circuits(&complete(6), 1000);
        assert_eq!((six.found.len(), six.complete), (409, true));
        assert!(six.found.windows(2).all(|w| w[0] < w[1]), "each once, in order");
        assert!(!circuits(&complete(6), 408).complete);
        assert!(circuits(&complete(6), 409).complete);
    }

    /// Between two nodes of the complete graph on 5 nodes there are Σ 3!/(3 - k)! = 1 + 3 + 6 + 6 = 16 simple paths.
    #[test]
    fn paths_of_a_complete_graph() {
        let listed = simple_paths(&complete(5), 0, 4, 1000);
        assert_eq!((listed.found.len(), listed.complete), (16, true));
        assert!(listed.found.windows(2).all(|w| w[0] < w[1]));
        assert!(!simple_paths(&complete(5), 0, 4, 15).complete);
    }

    #[test]
    fn self_loops_count_once() {
        assert_eq!(circuits(&vec![vec![0, 1], vec![0]], 10).found, vec![vec![0], vec![0, 1]]);
    }
}
