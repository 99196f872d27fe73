//! How an algebraic loop is told: as closed walks in the order in which the signal travels, every block and sum labelled
//! at its own line with its direct gain, the loop gain, whether there is a solution and which, and where a lag or a dead
//! time would break it.

use super::breaks;
use super::graph::Wiring;
use super::rows::Laws;
use super::tangles::{Branch, Solvable, Tangle};
use super::text::{self, Names};
use super::walk::{self, Element};
use crate::algebra::Fraction;
use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::{Driver, InstanceId, Law};

/// The most closed walks that one message writes out; a person follows a handful.
const MAX_WALKS: usize = 5;

/// The most labels of one diagnostic: more than a screen of them helps nobody.
const MAX_LABELS: usize = 200;

/// The most names that one closed walk writes out.
const MAX_NAMES: usize = 40;

/// Tells one tangle: `algebraic-loop` where it has a solution, `ill-posed-loop` where it has none.
pub(super) fn tell(wiring: &Wiring<'_>, laws: &Laws<'_>, tangle: &Tangle) -> Diagnostic {
    let walks = walk::basis(tangle);
    let names =
        Names::of(&laws.values, tangle.branches.iter().flat_map(|b| [b.gain.numerator(), b.gain.denominator()]));
    let teller = Teller { wiring, tangle, names };
    let code = if tangle.solvable == Solvable::No { Code::IllPosedLoop } else { Code::AlgebraicLoop };
    let mut diagnostic = Diagnostic::new(code, teller.message(&walks)).help(teller.help(&walks));
    let mut instances: Vec<InstanceId> = Vec::new();
    for &i in walks.iter().flatten() {
        let (span, text) = teller.label(&tangle.branches[i]);
        let told = diagnostic.labels.iter().any(|l| l.span == span && l.text == text);
        if told || diagnostic.labels.len() >= MAX_LABELS {
            continue;
        }
        diagnostic = diagnostic.label(span, text);
        if let Some(instance) = teller.instance(tangle.branches[i].to).filter(|i| !instances.contains(i)) {
            instances.push(instance);
        }
    }
    for instance in instances {
        let instance = &wiring.netlist.instances[instance.index()];
        let name = wiring.netlist.names.get(instance.name);
        diagnostic = diagnostic.label(instance.origin.span, format!("`{name}` is made here"));
    }
    diagnostic
}

struct Teller<'t, 'n> {
    wiring: &'t Wiring<'n>,
    tangle: &'t Tangle,
    names: Names,
}

impl Teller<'_, '_> {
    fn text(&self, f: &Fraction) -> String {
        text::fraction(&self.names, f)
    }

    fn power_text(&self, gain: &str, power: i64) -> String {
        let sampled = super::transfer::is_sampled(self.wiring.netlist.time_base);
        power_text(gain, power, if sampled { "z" } else { "s" })
    }

    /// The product of the gains of a walk, with its power of s.
    fn gain(&self, walk: &[usize]) -> (Fraction, i64) {
        walk.iter()
            .map(|&i| &self.tangle.branches[i])
            .fold((Fraction::one(), 0), |(g, k), b| (g.mul(&b.gain), k + b.power))
    }

    /// `e -> K -> G -> e`
    fn walk(&self, walk: &[usize]) -> String {
        let mut parts: Vec<&str> = Vec::new();
        for &i in walk {
            let name = walk::short_name(self.wiring, self.tangle.signals[self.tangle.branches[i].to]);
            if parts.last() != Some(&name) {
                parts.push(name);
            }
        }
        let first = parts.first().copied().unwrap_or_default();
        if parts.len() > MAX_NAMES {
            let left_out = parts.len() - MAX_NAMES;
            parts.truncate(MAX_NAMES);
            return format!("{} -> ({left_out} more) -> {first}", parts.join(" -> "));
        }
        parts.push(first);
        parts.join(" -> ")
    }

    fn message(&self, walks: &[Vec<usize>]) -> String {
        if let [only] = walks {
            let (gain, power) = self.gain(only);
            let (walk, gain_text) = (self.walk(only), self.text(&gain));
            return match &self.tangle.solvable {
                Solvable::No => format!(
                    "ill-posed loop `{walk}`: its gain at infinite frequency is exactly 1, so that it has no solution"
                ),
                Solvable::Grows => format!(
                    "algebraic loop `{walk}`: its gain grows without bound, as {} at high frequency",
                    self.power_text(&gain_text, power)
                ),
                Solvable::Determinant(_) | Solvable::Undecided(_) => {
                    format!(
                        "algebraic loop `{walk}`: its gain at infinite frequency is {gain_text}; {}",
                        self.solution(&gain)
                    )
                }
            };
        }
        let told: Vec<String> = walks
            .iter()
            .take(MAX_WALKS)
            .map(|w| {
                let (gain, power) = self.gain(w);
                format!("`{}` with gain {}", self.walk(w), self.power_text(&self.text(&gain), power))
            })
            .collect();
        let more = walks.len().saturating_sub(MAX_WALKS);
        let more = if more > 0 { format!("; and {more} more") } else { String::new() };
        let elements = self.elements();
        let verdict = match &self.tangle.solvable {
            Solvable::No => "det(I - D) over their direct gains D is 0, so that they have no solution".to_owned(),
            Solvable::Grows => "a loop's gain grows without bound at high frequency".to_owned(),
            Solvable::Determinant(d) => {
                let d = self.with_sign(d);
                let unless = if d.as_number().is_some() { "" } else { " wherever that is not 0" };
                format!("they have a solution{unless}: det(I - D) over their direct gains D is {}", self.text(&d))
            }
            Solvable::Undecided(why) => format!("whether they have a solution was not decided: {why}"),
        };
        let kind = if self.tangle.solvable == Solvable::No { "ill-posed" } else { "algebraic" };
        let loops = format!("{} {kind} loops share {elements} blocks and sums", walks.len());
        format!("{loops}: {}{more}; {verdict}", told.join("; "))
    }

    /// How many blocks and sums take part.
    fn elements(&self) -> usize {
        let mut all: Vec<Option<Element>> = self.tangle.signals.iter().map(|&v| walk::driver(self.wiring, v)).collect();
        all.sort_unstable();
        all.dedup();
        all.len()
    }

    /// The determinant with its own sign: elimination may have turned it.
    fn with_sign(&self, determinant: &Fraction) -> Fraction {
        let point = super::residue::Point::new(crate::algebra::prime::Prime::first(), 0);
        let prime = &point.prime;
        let value = |f: &Fraction| prime.mul(point.of(f.numerator()), prime.inverse(point.of(f.denominator())));
        let rows = vec![std::collections::BTreeMap::new(); self.tangle.signals.len()];
        let mut system = super::residue::Residues { rows, ..Default::default() };
        for (i, row) in system.rows.iter_mut().enumerate() {
            row.insert(i, prime.one);
        }
        for b in &self.tangle.branches {
            let entry = system.rows[b.to].entry(b.from).or_insert(0);
            *entry = prime.sub(*entry, value(&b.gain));
        }
        system.rows.iter_mut().for_each(|row| row.retain(|_, x| *x != 0));
        if system.determinant(prime) == value(determinant) { determinant.clone() } else { determinant.neg() }
    }

    /// What becomes of a signal that enters a single loop with this gain.
    fn solution(&self, gain: &Fraction) -> String {
        let rest = Fraction::one().sub(gain);
        let factor = Fraction::one().div(&rest).unwrap_or_else(Fraction::zero);
        if rest.as_number().is_some() {
            return format!("it has a solution, 1/(1 - gain) = {} times what enters it", self.text(&factor));
        }
        format!(
            "it has a solution, {} times what enters it, unless {} = 0",
            self.text(&factor),
            text::sum(&self.names, rest.numerator())
        )
    }

    fn help(&self, walks: &[Vec<usize>]) -> String {
        let choices = breaks::choices(self.wiring, self.tangle);
        let name = |e: &Element| match e {
            Element::Block(b) => format!("`{}`", self.wiring.netlist.block_name(*b)),
            Element::Sum(s) => {
                format!("`{}`", self.wiring.netlist.signal_name(self.wiring.netlist.sums[s.index()].output))
            }
        };
        let joined = |list: &[String], word: &str| match list {
            [] => String::new(),
            [one] => one.clone(),
            [most @ .., last] => format!("{} {word} {last}", most.join(", ")),
        };
        let texts: Vec<String> =
            choices.iter().map(|c| joined(&c.iter().map(name).collect::<Vec<_>>(), "and")).collect();
        let it = if walks.len() == 1 { "it" } else { "all of them" };
        let places = choices.first().map_or(0, Vec::len);
        match (choices.len(), places) {
            (1, 1) => format!("a lag or a dead time at {} breaks {it}", texts[0]),
            (1, _) => format!("a lag or a dead time at each of {} breaks {it}", texts[0]),
            (_, 1) => format!("a lag or a dead time at any one of {} breaks {it}", joined(&texts, "or")),
            _ => format!("a lag or a dead time at {} breaks {it}", joined(&texts, "or at")),
        }
    }

    /// The innermost instance that the row of a signal was written out by.
    fn instance(&self, place: usize) -> Option<InstanceId> {
        let net = self.wiring.netlist;
        match net.signals[self.tangle.signals[place].index()].driver {
            Driver::Block(b) => net.blocks[b.index()].origin.instance,
            Driver::Sum(s) => net.sums[s.index()].origin.instance,
            Driver::Input | Driver::Nothing => None,
        }
    }

    /// The place of what a branch goes through, and its direct gain.
    fn label(&self, branch: &Branch) -> (crate::source::Span, String) {
        let net = self.wiring.netlist;
        let (from, to) = (self.tangle.signals[branch.from], self.tangle.signals[branch.to]);
        let (span, name) = walk::element(self.wiring, to);
        let gain = self.power_text(&self.text(&branch.gain), branch.power);
        let ends = match net.signals[to.index()].driver {
            Driver::Block(b) if matches!(net.blocks[b.index()].law, Law::Scalar(_)) => String::new(),
            Driver::Block(_) => format!(" from `{}` to `{}`", net.signal_name(from), net.signal_name(to)),
            _ => format!(" from `{}`", net.signal_name(from)),
        };
        let inside = self
            .instance(branch.to)
            .map_or_else(String::new, |i| format!(", in instance `{}`", net.names.get(net.instances[i.index()].name)));
        (span, format!("{name}: direct gain {gain}{ends}{inside}"))
    }
}

/// A gain with its power of s (or z): `4`, `2*s`, `-s^2`, `3/s`.
fn power_text(gain: &str, power: i64, variable: &str) -> String {
    let exponent = power.unsigned_abs();
    let powers = if exponent == 1 { variable.to_owned() } else { format!("{variable}^{exponent}") };
    let gain = if power != 0 && gain.contains(' ') || power < 0 && gain.contains('/') {
        format!("({gain})")
    } else {
        gain.to_owned()
    };
    match (power, gain.as_str()) {
        (0, _) => gain,
        (1.., "1") => powers,
        (1.., "-1") => format!("-{powers}"),
        (1.., _) => format!("{gain}*{powers}"),
        _ => format!("{gain}/{powers}"),
    }
}

#[cfg(test)]
mod tests {
    use super::power_text;

    #[test]
    fn gains_with_powers_read_well() {
        let told = [("4", 0), ("1", 2), ("-1", 1), ("K + 1", 1), ("1/2", -1)].map(|(g, k)| power_text(g, k, "s"));
        assert_eq!(told, ["4", "s^2", "-s", "(K + 1)*s", "(1/2)/s"]);
    }
}
