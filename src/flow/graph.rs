//! Who reads whom: the signals of a netlist as nodes, a branch from each signal to each one whose driver reads it.
//!
//! A signal's own equation is called its row: that of the sum, of the output of the block, or the line of the state
//! equations that drives it. Reading a row costs what stands in it, so whatever follows branches is linear.

use crate::netlist::expr::Expr;
use crate::netlist::{Driver, Law, Netlist, SignalId};

/// The branches of a netlist in both directions.
#[derive(Debug)]
pub(crate) struct Wiring<'n> {
    /// The netlist.
    pub(crate) netlist: &'n Netlist,
    /// For each signal that a block drives, the place of its row among the block's outputs or equations.
    places: Vec<u32>,
    /// For each signal, where its readers begin in `readers`; one more at the end.
    starts: Vec<u32>,
    readers: Vec<SignalId>,
}

impl<'n> Wiring<'n> {
    /// Follows every row once.
    pub(crate) fn new(netlist: &'n Netlist) -> Self {
        let count = netlist.signals.len();
        let mut places = vec![0; count];
        for block in &netlist.blocks {
            match &block.law {
                Law::States(equations) => {
                    for (i, equation) in equations.iter().enumerate() {
                        places[equation.left.index()] = i as u32;
                    }
                }
                Law::Scalar(_) | Law::Matrix(_) => {
                    for (i, output) in block.outputs.iter().enumerate() {
                        places[output.index()] = i as u32;
                    }
                }
            }
        }
        let mut wiring = Self { netlist, places, starts: vec![0; count + 1], readers: Vec::new() };
        wiring.find_readers();
        wiring
    }

    /// Counting sort of all branches by where they begin; readers come in the order of signals, each once a row.
    fn find_readers(&mut self) {
        let count = self.netlist.signals.len();
        let mut starts = vec![0u32; count + 1];
        for v in 0..count {
            self.reads(SignalId(v as u32), |u| starts[u.index() + 1] += 1);
        }
        for i in 0..count {
            starts[i + 1] += starts[i];
        }
        let mut next = starts.clone();
        let mut readers = vec![SignalId(0); starts[count] as usize];
        for v in 0..count {
            let v = SignalId(v as u32);
            self.reads(v, |u| {
                readers[next[u.index()] as usize] = v;
                next[u.index()] += 1;
            });
        }
        (self.starts, self.readers) = (starts, readers);
    }

    /// Calls `each` with every signal that the row of `v` reads, in the order of the text; one that is written twice
    /// comes twice. An entry of a matrix that is written as 0 reads nothing.
    pub(crate) fn reads(&self, v: SignalId, mut each: impl FnMut(SignalId)) {
        let net = self.netlist;
        match net.signals[v.index()].driver {
            Driver::Input | Driver::Nothing => {}
            Driver::Sum(sum) => net.terms_of(&net.sums[sum.index()]).iter().for_each(|t| each(t.signal)),
            Driver::Block(block) => {
                let block = &net.blocks[block.index()];
                let place = self.place(v);
                match &block.law {
                    Law::Scalar(_) => block.inputs.iter().copied().for_each(each),
                    Law::Matrix(rows) => {
                        let Some(row) = rows.get(place) else { return };
                        for (&law, &input) in row.iter().zip(&block.inputs) {
                            if net.exprs.get(law) != Expr::Ratio(0, 1) {
                                each(input);
                            }
                        }
                    }
                    Law::States(equations) => {
                        if let Some(equation) = equations.get(place).filter(|e| e.left == v) {
                            equation.terms.iter().for_each(|t| each(t.variable));
                        }
                    }
                }
            }
        }
    }

    /// The place of a signal's row among its block's outputs, or among its equations.
    pub(crate) fn place(&self, v: SignalId) -> usize {
        self.places[v.index()] as usize
    }

    /// The signals whose rows read `u`, in the order of their numbers.
    pub(crate) fn readers(&self, u: SignalId) -> &[SignalId] {
        &self.readers[self.starts[u.index()] as usize..self.starts[u.index() + 1] as usize]
    }

    /// Marks what depends on `from`: every row that a change of what the readers of `from` see can reach, where the
    /// readers of the signals in `open` see nothing.
    pub(crate) fn reached_from(&self, from: SignalId, open: &[SignalId]) -> Vec<bool> {
        let mut reached = vec![false; self.netlist.signals.len()];
        let mut waiting: Vec<SignalId> = self.readers(from).to_vec();
        while let Some(v) = waiting.pop() {
            if std::mem::replace(&mut reached[v.index()], true) || open.contains(&v) {
                continue;
            }
            waiting.extend(self.readers(v).iter().filter(|w| !reached[w.index()]));
        }
        reached
    }

    /// Marks what any of `targets` depends on, the targets' own rows included.
    pub(crate) fn needed_for(&self, targets: impl IntoIterator<Item = SignalId>, open: &[SignalId]) -> Vec<bool> {
        let mut needed = vec![false; self.netlist.signals.len()];
        let mut waiting: Vec<SignalId> = targets.into_iter().collect();
        while let Some(v) = waiting.pop() {
            if std::mem::replace(&mut needed[v.index()], true) {
                continue;
            }
            self.reads(v, |u| {
                if !needed[u.index()] && !open.contains(&u) {
                    waiting.push(u);
                }
            });
        }
        needed
    }
}
