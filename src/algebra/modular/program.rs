//! A condensed system as a linear state machine, laid out flat for the inner loop.
//!
//! Row i of degree d, R_d s^d x + … + R_0 x = b, becomes d states by Horner's rule (the observer form, row by row):
//!
//! ```text
//! s w_(k+1) = w_k - R_k x + b_k   (k = 0 … d-1, w_0 = 0)        R_d x = w_d + b_d
//! ```
//!
//! With L the matrix of the rows R_d, x = L⁻¹(w_top + b_top), so that s w = M w + B and
//! det A(s) = det L · det(sI - M). L must be a triangular matrix but for the order of its rows and columns, which it is
//! unless strong direct couplings form a loop; such systems are left to [`super::points`].
//! Source for the form: T. Kailath, *Linear Systems* (1980), §6.4.

use super::sparse::{Condensed, Functional, is_odd};
use dashu_int::IBig;
use rustc_hash::FxHashMap;
use std::ops::Range;

/// Numbers up to this may be multiplied with split residues.
const SMALL: i64 = super::lanes::SMALL as i64;

/// Σ c·y over some y: chunks of small c, then c as residues.
#[derive(Clone, Debug, Default)]
pub(super) struct Sum {
    /// Which chunks; Σ|c| of each is at most [`super::lanes::SMALL`].
    pub(super) chunks: Range<u32>,
    /// Which of the long terms.
    pub(super) long: Range<u32>,
}

/// x_`y` = (w_`state` + input - Σ L x)/pivot.
#[derive(Clone, Debug)]
pub(super) struct Solve {
    /// The state at the top of the row; `None` for a row without s.
    pub(super) state: Option<u32>,
    /// Which row, for inputs.
    pub(super) row: u32,
    /// Which x.
    pub(super) y: u32,
    /// The other entries of the row of L.
    pub(super) sum: Sum,
    /// Which constant is the pivot.
    pub(super) pivot: u32,
}

/// w_`to` = w_`from` - Σ R_k x.
#[derive(Clone, Debug)]
pub(super) struct Update {
    /// The state below; `None` at the bottom of a row.
    pub(super) from: Option<u32>,
    /// The state.
    pub(super) to: u32,
    /// The entries of R_k.
    pub(super) sum: Sum,
}

/// The whole step from one vector of the Krylov sequence to the next.
#[derive(Clone, Debug, Default)]
pub(super) struct Program {
    /// Unknowns.
    pub(super) ys: usize,
    /// States: the degree of the determinant.
    pub(super) states: usize,
    /// In an order in which each needs only earlier ones.
    pub(super) solves: Vec<Solve>,
    /// In an order in which no state is overwritten that is still needed.
    pub(super) updates: Vec<Update>,
    /// Output functionals of x: the wanted ones.
    pub(super) outputs: Vec<Sum>,
    /// Small terms: which y, coefficient.
    pub(super) terms: Vec<(u32, f64)>,
    /// Chunks of `terms`.
    pub(super) chunks: Vec<Range<u32>>,
    /// Long terms: which y, which constant.
    pub(super) long: Vec<(u32, u32)>,
    /// Numbers that are needed as residues.
    pub(super) constants: Vec<IBig>,
    /// Whether det L is minus the product of the pivots.
    pub(super) odd: bool,
    /// For each right side: (row, power, value); `state_of(row, power + 1)` takes it in, or the top.
    pub(super) inputs: Vec<Vec<Input>>,
}

/// Where a coefficient of a right side enters.
#[derive(Clone, Debug)]
pub(super) enum Input {
    /// Added to a state's derivative.
    State(u32, IBig),
    /// Added to the right of a row of L.
    Top(u32, IBig),
}

impl Program {
    /// The program of a system; `None` where L has no triangular form or a right side has a higher degree than its row.
    pub(super) fn compile(system: &Condensed, outputs: &[Functional], rights: usize) -> Option<Self> {
        let rows = &system.rows;
        let place: FxHashMap<usize, u32> = system.columns.iter().enumerate().map(|(k, &c)| (c, k as u32)).collect();
        let degrees: Vec<usize> =
            rows.iter().map(|r| r.entries.iter().map(|t| t.1.len() - 1).max().unwrap_or(0)).collect();
        let order = triangular(system, &place, &degrees)?;
        let mut out = Self { ys: rows.len(), inputs: vec![Vec::new(); rights], ..Self::default() };
        let mut first = Vec::with_capacity(rows.len());
        for d in &degrees {
            first.push(out.states as u32);
            out.states += d;
        }
        for &(i, y) in &order {
            let d = degrees[i];
            let mut rest = Vec::new();
            let mut pivot = IBig::ZERO;
            for (j, p) in rows[i].entries.iter().filter(|t| t.1.len() == d + 1) {
                let (column, c) = (place[j], p[d].clone());
                if column == y { pivot = c } else { rest.push((column, c)) }
            }
            let sum = out.sum(&rest);
            let state = (d > 0).then(|| first[i] + d as u32 - 1);
            let pivot = out.constant(pivot);
            out.solves.push(Solve { state, row: i as u32, y, sum, pivot });
        }
        for (i, row) in rows.iter().enumerate() {
            for k in (0..degrees[i]).rev() {
                let terms: Vec<(u32, IBig)> = row
                    .entries
                    .iter()
                    .filter_map(|(j, p)| Some((place[j], p.get(k).filter(|c| !c.is_zero())?.clone())))
                    .collect();
                let to = first[i] + k as u32;
                let sum = out.sum(&terms);
                out.updates.push(Update { from: (k > 0).then(|| to - 1), to, sum });
            }
            for (r, p) in &row.right {
                if p.len() > degrees[i] + 1 {
                    return None;
                }
                for (k, c) in p.iter().enumerate().filter(|t| !t.1.is_zero()) {
                    let at = if k < degrees[i] {
                        Input::State(first[i] + k as u32, c.clone())
                    } else {
                        Input::Top(i as u32, c.clone())
                    };
                    out.inputs[*r].push(at);
                }
            }
        }
        for f in outputs {
            let terms: Vec<(u32, IBig)> = f.terms.iter().map(|(j, c)| (place[j], c.clone())).collect();
            let sum = out.sum(&terms);
            out.outputs.push(sum);
        }
        let rows: Vec<usize> = order.iter().map(|t| t.0).collect();
        let columns: Vec<usize> = order.iter().map(|t| t.1 as usize).collect();
        out.odd = is_odd(&rows) != is_odd(&columns);
        Some(out)
    }

    fn constant(&mut self, c: IBig) -> u32 {
        self.constants.push(c);
        self.constants.len() as u32 - 1
    }

    /// Lays out Σ c·y.
    fn sum(&mut self, terms: &[(u32, IBig)]) -> Sum {
        let (chunk_start, long_start) = (self.chunks.len() as u32, self.long.len() as u32);
        let (mut start, mut weight) = (self.terms.len() as u32, 0);
        for (y, c) in terms {
            let Some(small) = i64::try_from(c).ok().filter(|c| c.abs() <= SMALL) else {
                let constant = self.constant(c.clone());
                self.long.push((*y, constant));
                continue;
            };
            weight += small.abs();
            if weight > SMALL {
                let end = self.terms.len() as u32;
                self.chunks.push(start..end);
                (start, weight) = (end, small.abs());
            }
            self.terms.push((*y, small as f64));
        }
        let end = self.terms.len() as u32;
        if end > start {
            self.chunks.push(start..end);
        }
        Sum { chunks: chunk_start..self.chunks.len() as u32, long: long_start..self.long.len() as u32 }
    }
}

/// Rows with their columns in an order in which each row of L holds its own column and earlier ones only.
fn triangular(system: &Condensed, place: &FxHashMap<usize, u32>, degrees: &[usize]) -> Option<Vec<(usize, u32)>> {
    let rows = &system.rows;
    let lead: Vec<Vec<u32>> = rows
        .iter()
        .zip(degrees)
        .map(|(r, d)| r.entries.iter().filter(|t| t.1.len() == d + 1).map(|t| place[&t.0]).collect())
        .collect();
    let n = rows.len();
    let mut left: Vec<usize> = lead.iter().map(Vec::len).collect();
    let mut users: Vec<Vec<usize>> = vec![Vec::new(); n];
    for (i, columns) in lead.iter().enumerate() {
        for &c in columns {
            users[c as usize].push(i);
        }
    }
    let mut known = vec![false; n];
    let mut ready: std::collections::VecDeque<usize> = (0..n).filter(|&i| left[i] == 1).collect();
    let mut order = Vec::with_capacity(n);
    while let Some(i) = ready.pop_front() {
        // Where two rows were ready with one column, L is singular.
        let y = *lead[i].iter().find(|&&c| !known[c as usize])?;
        known[y as usize] = true;
        order.push((i, y));
        for &k in &users[y as usize] {
            left[k] -= 1;
            if left[k] == 1 {
                ready.push_back(k);
            }
        }
    }
    (order.len() == n).then_some(order)
}
