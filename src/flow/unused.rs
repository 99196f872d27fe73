//! Blocks on which nothing depends.

use super::graph::Wiring;
use super::named;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::Driver;

/// `unused-block` for each block on which no output, request or requirement depends.
pub(super) fn blocks(wiring: &Wiring<'_>) -> Vec<Diagnostic> {
    let net = wiring.netlist;
    let targets = net.outputs().chain(named::all(net).into_iter().map(|n| n.to));
    let needed = wiring.needed_for(targets, &[]);
    let mut used = vec![false; net.blocks.len()];
    for (signal, needed) in net.signals.iter().zip(needed) {
        if let Driver::Block(block) = signal.driver {
            used[block.index()] |= needed;
        }
    }
    let unused = net.blocks.iter().zip(used).filter(|(_, used)| !used);
    unused
        .map(|(block, _)| {
            let name = net.names.get(block.name);
            let outputs: Vec<String> = block.outputs.iter().map(|&y| format!("`{}`", net.signal_name(y))).collect();
            Diagnostic::new(
                Code::UnusedBlock,
                format!("block `{name}` is unused: no output and no request depends on it"),
            )
            .label(block.origin.span, "nothing that is asked for comes from here")
            .help(format!("take it out, or ask for {} with `find`, or declare it an `output`", outputs.join(", ")))
        })
        .collect()
}
