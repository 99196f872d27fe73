//! Sampling periods: one for the whole netlist.

use super::cases::Cases;
use super::rows::Laws;
use super::text::{self, Names};
use crate::algebra::Fraction;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::{Keep, Netlist, TimeBase};

/// `mixed-rates` where two blocks are sampled with different periods.
pub(super) fn mixed(netlist: &Netlist) -> Option<Diagnostic> {
    let sampled = || netlist.blocks.iter().filter_map(|b| b.every.map(|e| (b, e)));
    sampled().next()?;
    let laws = Cases::new(netlist).laws(None, &Keep::Nothing, &mut Vec::new())?;
    let period = |e| laws.evaluate(e).ok();
    let (first, every) = sampled().next()?;
    let one = period(every)?;
    let (other, every) = sampled().find(|&(_, e)| period(e).is_some_and(|p| p.fraction != one.fraction))?;
    let two = period(every)?;
    let (a, b) = (netlist.names.get(first.name), netlist.names.get(other.name));
    let (t, u) = (seconds(&laws, &one.fraction), seconds(&laws, &two.fraction));
    Some(
        Diagnostic::new(Code::MixedRates, format!("`{a}` and `{b}` are sampled at different rates"))
            .label(other.origin.span, format!("block `{b}` runs every {u}"))
            .label(first.origin.span, format!("block `{a}` runs every {t}"))
            .help("give all blocks with `every` one period, best by one param: `param Ts = 1 [ms]`, then `every Ts`"),
    )
}

/// Why no request of a netlist can be answered: sampled blocks beside laws in s, or of two rates.
pub(super) fn unanswered(netlist: &Netlist) -> Option<Diagnostic> {
    if let Some(diagnostic) = mixed(netlist) {
        return Some(diagnostic);
    }
    if netlist.time_base != TimeBase::Mixed {
        return None;
    }
    let sampled = netlist.blocks.iter().find(|b| b.every.is_some());
    let continuous = netlist.blocks.iter().find(|b| b.every.is_none());
    let mut diagnostic = Diagnostic::new(
        Code::LimitReached,
        "this netlist has sampled blocks beside transfer functions (laws) in s, and such a mixture is not answered exactly yet",
    )
    .help("write the plant as a law in z (its step-invariant equivalent) with the same `every`, or all blocks in s");
    if let Some(block) = sampled {
        diagnostic =
            diagnostic.label(block.origin.span, format!("block `{}` is sampled", netlist.names.get(block.name)));
    }
    if let Some(block) = continuous {
        diagnostic =
            diagnostic.label(block.origin.span, format!("block `{}` is not sampled", netlist.names.get(block.name)));
    }
    Some(diagnostic)
}

/// The sampling period in seconds, exact; `None` in continuous time.
pub(super) fn period(netlist: &Netlist, laws: &Laws<'_>) -> Option<String> {
    let every = netlist.blocks.iter().find_map(|b| b.every)?;
    let value = laws.evaluate(every).ok()?;
    Some(text::fraction(&names(laws, &value.fraction), &value.fraction))
}

fn seconds(laws: &Laws<'_>, value: &Fraction) -> String {
    format!("{} s", text::fraction(&names(laws, value), value))
}

fn names(laws: &Laws<'_>, value: &Fraction) -> Names {
    Names::of(&laws.values, [value.numerator(), value.denominator()])
}
