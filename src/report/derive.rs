//! `derive` as text: what an engineer would put on a whiteboard.

use super::factors::{self, FractionStyle};
use super::number;
use super::page::{INDENT, Page, one_line};
use super::roots::{self, Plane};
use super::sum::{Joint, Naming, Scale, Words, dotted};
use crate::algebra::{Fraction, Poly, RBig, Var};
use crate::results::{Characteristic, Decimal, Derive, Form, Transfer, TransferKind};
use std::io::{self, Write};

/// The most entries of a list in text; JSON has all.
pub(super) const MAX_LISTED: usize = 16;

/// The most terms of a polynomial whose value at zero frequency is worked out for text.
const MAX_TERMS_AT_ZERO: usize = 2000;

/// The longest ratio, in characters, that says more than a rounded number.
const LONGEST_RATIO: usize = 16;

/// How text is set.
#[derive(Clone, Copy, Debug)]
pub struct TextOptions {
    /// Columns of the page.
    pub width: usize,
    /// How fractions are written.
    pub fraction: FractionStyle,
}

impl Default for TextOptions {
    fn default() -> Self {
        Self { width: 80, fraction: FractionStyle::default() }
    }
}

/// Writes all results of a `derive`, one below the other. Nothing for a document without results.
///
/// # Errors
///
/// What `out` says.
pub fn derive(document: &Derive, options: TextOptions, out: &mut dyn Write) -> io::Result<()> {
    let mut page = Page::new(out, options.width);
    let mut cases: Vec<&str> = Vec::new();
    for case in document.transfers.iter().map(|t| &t.case).chain(document.characteristic.iter().map(|c| &c.case)) {
        if !cases.contains(&case.as_str()) {
            cases.push(case);
        }
    }
    match cases.as_slice() {
        [] => return Ok(()),
        ["nominal"] => page.line(&format!("{}, nominal values", document.model))?,
        [one] => page.line(&format!("{}, case {one}", document.model))?,
        more => page.sentence(0, &format!("{}, cases {}", document.model, more.join(", ")))?,
    }
    let mut rounded = false;
    for (k, t) in document.transfers.iter().enumerate() {
        if k > 0 {
            page.gap()?;
        }
        page.gap()?;
        rounded |= transfer(&mut page, t, cases.len() > 1, options.fraction)?;
    }
    for c in &document.characteristic {
        page.gap()?;
        page.gap()?;
        rounded |= characteristic(&mut page, c, cases.len() > 1, options.fraction)?;
    }
    if rounded {
        page.gap()?;
        page.sentence(
            0,
            "Roots and figures are rounded here (--format json has all digits); fractions are exact unless they say otherwise.",
        )?;
    }
    Ok(())
}

/// The request as it stands in the language, with its clauses.
fn request(t: &Transfer, with_case: bool) -> String {
    let mut text = match t.kind {
        TransferKind::Transfer => format!("{} / {}", t.to, t.from),
        TransferKind::Loop if t.at.len() > 1 => format!("loop at {}: {} / {}", t.at.join(", "), t.to, t.from),
        TransferKind::Loop => t.from.clone(),
        TransferKind::Zeros => format!("zeros {} / {}", t.to.replace(',', ", "), t.from.replace(',', ", ")),
    };
    if !t.open.is_empty() {
        text = format!("{text} with {} open", t.open.join(", "));
    }
    if with_case {
        text = format!("{text} in {}", t.case);
    }
    text
}

/// One result; tells whether a figure in it was rounded.
fn transfer(page: &mut Page<'_>, t: &Transfer, with_case: bool, style: FractionStyle) -> io::Result<bool> {
    let label = request(t, with_case);
    let mut notes: Vec<String> = Vec::new();
    match (&t.form, &t.decimal) {
        (Some(form), _) if t.exact => {
            let naming = naming(form, t.variable);
            let written = factors::write(&form.numerator, &form.denominator, style, naming);
            let above = |out: &mut Words<'_>| written.numerator.words(out, naming);
            let below = |out: &mut Words<'_>| {
                if let Some(side) = &written.denominator {
                    side.words(out, naming);
                }
            };
            page.fraction(&label, &above, written.denominator.is_some().then_some(&below))?;
            if written.rounded {
                notes.push("Coefficients are rounded to 6 digits here; --format json has them exactly.".to_owned());
            }
        }
        (_, Some(decimal)) => {
            decimal_fraction(page, &label, decimal, t.variable)?;
            notes.push("Rounded: a value in it is not rational. --format json has all its digits.".to_owned());
        }
        _ => page.line(&format!("{label} has no closed form"))?,
    }
    let (facts, rounded) = facts(t);
    if !facts.is_empty() {
        page.gap()?;
        page.facts(&facts)?;
    }
    notes.extend(warning_of_convergence(t));
    for note in notes {
        page.sentence(INDENT, &note)?;
    }
    Ok(rounded)
}

pub(super) fn naming<'a>(form: &'a Form, variable: &'a str) -> Naming<'a> {
    Naming { variable, names: &form.names, seconds: false }
}

/// A fraction whose coefficients are floating-point numbers.
fn decimal_fraction(page: &mut Page<'_>, label: &str, decimal: &Decimal, variable: &str) -> io::Result<()> {
    let side = |coefficients: &[f64], out: &mut Words<'_>| {
        let mut first = true;
        for (i, &c) in coefficients.iter().enumerate().filter(|(_, c)| **c != 0.0) {
            if !first {
                out.end(Joint::Space);
            }
            out.push(match (c < 0.0, first) {
                (true, true) => "-",
                (true, false) => "- ",
                (false, true) => "",
                (false, false) => "+ ",
            });
            first = false;
            let power = coefficients.len() - 1 - i;
            let size = number::float(c.abs());
            if size != "1" || power == 0 {
                out.push(&size);
                out.push(if power == 0 { "" } else { "·" });
            }
            match power {
                0 => {}
                1 => out.push(variable),
                _ => out.push(&format!("{variable}{}", number::superscript(power as u32))),
            }
        }
        if first {
            out.push("0");
        }
    };
    let above = |out: &mut Words<'_>| side(&decimal.numerator, out);
    let below = |out: &mut Words<'_>| side(&decimal.denominator, out);
    let whole = decimal.denominator == [1.0];
    page.fraction(label, &above, (!whole).then_some(&below))
}

/// A name and what stands beside it, line by line.
type Fact = (String, Vec<String>);

/// What is known of a result besides the fraction; and whether any figure was rounded.
fn facts(t: &Transfer) -> (Vec<Fact>, bool) {
    let mut facts: Vec<Fact> = Vec::new();
    let mut rounded = false;
    let symbols = symbols(t);
    let others: Vec<&str> = symbols.iter().copied().filter(|s| *s != "pi").collect();
    if !symbols.is_empty() {
        facts.push(("symbols".to_owned(), vec![symbols.join(", ")]));
    }
    if !others.is_empty() && t.poles.is_none() && t.zeros.is_none() {
        facts.push(("poles, zeros".to_owned(), vec!["depend on the symbols".to_owned()]));
    }
    if let Some(period) = &t.sampling_period {
        facts.push(("sampled every".to_owned(), vec![format!("{} s", dotted(period))]));
    }
    let plane = Plane::of(t);
    for (name, list) in [("poles", &t.poles), ("zeros", &t.zeros)] {
        if t.kind == TransferKind::Zeros && name == "poles" {
            continue;
        }
        match list {
            Some(list) if list.is_empty() => facts.push((name.to_owned(), vec!["none".to_owned()])),
            Some(list) => {
                let told = roots::lines(list, &plane, name == "poles");
                rounded |= told.rounded;
                facts.push((name.to_owned(), told.lines));
            }
            None if others.is_empty() => facts.extend(why_no_roots(t, name).map(|why| (name.to_owned(), vec![why]))),
            None => {}
        }
    }
    if t.kind != TransferKind::Zeros
        && let Some((gain, inexact)) = gain_at_zero(t)
    {
        rounded |= inexact;
        let place = if t.variable == "z" { "gain at z = 1" } else { "gain at s = 0" };
        facts.push((place.to_owned(), vec![gain]));
    }
    facts.extend(convergence(t).map(|text| ("converges".to_owned(), vec![text])));
    if !t.cancelled.is_empty() {
        facts.push(("cancelled".to_owned(), vec![cancelled(&t.cancelled)]));
    }
    if let Some(v) = &t.verified {
        let text = if v.holds {
            format!(
                "the signal equations hold with it at {} points chosen at random, modulo a large prime each; a wrong \
                 result passes with a probability below 2^-{}",
                v.points, v.bits
            )
        } else {
            "it does NOT satisfy the signal equations: this is a defect of the program, please report it".to_owned()
        };
        facts.push(("verified".to_owned(), vec![text]));
    }
    (facts, rounded)
}

/// The symbols that stand in a result, those of its dead times last.
fn symbols(t: &Transfer) -> Vec<&str> {
    let Some(form) = &t.form else { return Vec::new() };
    let mut used = form.numerator.variables();
    used.extend(form.denominator.variables());
    let naming = naming(form, "");
    let (delays, params): (Vec<_>, Vec<_>) =
        form.names.iter().filter(|(v, _)| *v != Var::S && used.contains(v)).partition(|(v, _)| naming.is_delay(*v));
    let mut symbols: Vec<&str> = params.into_iter().map(|n| n.1.as_str()).collect();
    let is_part = |c: char| c.is_alphanumeric() || matches!(c, '_' | '.');
    for kept in t.kept.iter().map(String::as_str).filter(|k| !k.is_empty()) {
        let in_delay = |name: &str| name.split(|c: char| !is_part(c)).any(|word| word == kept);
        if !symbols.contains(&kept) && delays.iter().any(|n| in_delay(&n.1)) {
            symbols.push(kept);
        }
    }
    symbols
}

/// Why there is no list of poles or zeros, where that can be said.
fn why_no_roots(t: &Transfer, name: &str) -> Option<String> {
    let form = t.form.as_ref()?;
    let p = if name == "poles" { &form.denominator } else { &form.numerator };
    let place = if name == "poles" { "below" } else { "above" };
    match (delays(p, naming(form, t.variable)), p.len()) {
        (Delays::None, _) => {}
        (Delays::Alone, 1) if p.degree(Var::S) == 0 => return Some("none".to_owned()),
        (Delays::Alone, _) => return Some(format!("not listed: there is a dead time {place} the rule")),
        (Delays::InSum, _) => return Some(format!("infinitely many: there is a dead time {place} the rule")),
    }
    Some(format!("not worked out for degree {} unless --roots asks for them", p.degree(Var::S)))
}

/// How dead times stand in a polynomial.
enum Delays {
    /// There is none.
    None,
    /// The same one in every term: it is a factor.
    Alone,
    /// Different ones, or some terms without.
    InSum,
}

fn delays(p: &Poly, naming: Naming<'_>) -> Delays {
    if !p.variables().into_iter().any(|v| naming.is_delay(v)) {
        return Delays::None;
    }
    let mut each = p.terms().map(|(m, _)| m.into_iter().filter(|p| naming.is_delay(p.0)).collect::<Vec<_>>());
    let first = each.next();
    if each.all(|d| Some(&d) == first.as_ref()) { Delays::Alone } else { Delays::InSum }
}

/// The gain at s = 0 or z = 1, exact where it can be; and whether it is rounded.
fn gain_at_zero(t: &Transfer) -> Option<(String, bool)> {
    let pole = format!("none: there is a pole at {} = {}", t.variable, i32::from(t.variable == "z"));
    let rounded = t.dc_gain.map(|gain| (number::float(gain), true));
    let Some(form) = t.form.as_ref().filter(|_| t.exact) else {
        return Some(rounded.unwrap_or((pole, false)));
    };
    if form.numerator.len() + form.denominator.len() > MAX_TERMS_AT_ZERO {
        return rounded;
    }
    let (n, d) =
        (at_zero(&form.numerator, naming(form, t.variable)), at_zero(&form.denominator, naming(form, t.variable)));
    if d.is_zero() {
        return if n.is_zero() { rounded } else { Some((pole, false)) };
    }
    let value = Fraction::new(n, d)?;
    if let Some(number) = value.as_number() {
        let text = number::exact(&number);
        return Some(if text.len() > LONGEST_RATIO { (number::rounded(&number), true) } else { (text, false) });
    }
    let side = |p: &Poly| {
        let words = |out: &mut Words<'_>| naming(form, t.variable).sum(out, p, &Scale::Whole);
        let text = one_line(&words, 60)?;
        Some(if p.len() > 1 { format!("({text})") } else { text })
    };
    let (above, below) = (side(value.numerator())?, side(value.denominator())?);
    Some((if below == "1" { above } else { format!("{above} / {below}") }, false))
}

/// A polynomial at s = 0 (every dead time is 1 there) or at z = 1.
fn at_zero(p: &Poly, naming: Naming<'_>) -> Poly {
    let point = if naming.variable == "z" { RBig::ONE } else { RBig::ZERO };
    let delays = p.variables().into_iter().filter(|&v| naming.is_delay(v));
    let ones = delays.fold(p.clone(), |q, v| q.substitute(v, &RBig::ONE).0);
    ones.substitute(Var::S, &point).0
}

/// Where the transform converges.
fn convergence(t: &Transfer) -> Option<String> {
    if t.kind == TransferKind::Zeros {
        return None;
    }
    if let Some(Some(radius)) = t.converges_outside {
        let inside = if radius < 1.0 { "; the unit circle lies inside" } else { "" };
        return Some(format!("outside |z| = {}{inside}", number::float(radius)));
    }
    if let Some(Some(abscissa)) = t.converges_right_of {
        let inside = if abscissa < 0.0 { "; the jω axis lies inside" } else { "" };
        return Some(format!("right of Re s = {}{inside}", number::float(abscissa)));
    }
    match (&t.poles, t.stable) {
        (Some(poles), _) if poles.is_empty() => Some("everywhere".to_owned()),
        (_, Some(true)) => Some("on the jω axis: every pole lies left of it".to_owned()),
        (_, Some(false)) => Some("not on the jω axis: some pole lies on it or right of it".to_owned()),
        _ => None,
    }
}

/// The plain sentence for a transform that does not converge on the axis or the circle.
fn warning_of_convergence(t: &Transfer) -> Option<String> {
    if t.stable != Some(false) || t.kind == TransferKind::Zeros {
        return None;
    }
    let line = if t.variable == "z" { "unit circle" } else { "jω axis" };
    Some(if t.kind == TransferKind::Loop {
        format!("The {line} is not in the region of convergence (no statement on the closed loop).")
    } else {
        let (to, from) = (&t.to, &t.from);
        format!(
            "The {line} is not in the region of convergence: a sine at {from} has no steady-state response at {to}."
        )
    })
}

/// Cancelled factors as one product.
fn cancelled(factors: &[String]) -> String {
    let mut counted: Vec<(&str, u32)> = Vec::new();
    for f in factors {
        match counted.last_mut() {
            Some((last, n)) if *last == f => *n += 1,
            _ => counted.push((f, 1)),
        }
    }
    let more = counted.len().saturating_sub(MAX_LISTED);
    let told = counted.iter().take(MAX_LISTED).map(|(f, n)| {
        let power = if *n > 1 { number::superscript(*n) } else { String::new() };
        let decimal = dotted(f);
        if decimal.contains(' ') { format!("({decimal}){power}") } else { format!("{decimal}{power}") }
    });
    let list = told.collect::<Vec<_>>().join("·");
    let more = if more > 0 { format!(" and {more} more factors; --format json lists all") } else { String::new() };
    let hidden = if counted.len() > 1 || counted.iter().any(|c| c.1 > 1) { "hidden modes" } else { "a hidden mode" };
    format!("{list}{more}, {hidden}")
}

/// The characteristic polynomial of the whole netlist.
fn characteristic(page: &mut Page<'_>, c: &Characteristic, with_case: bool, style: FractionStyle) -> io::Result<bool> {
    let label = if with_case {
        format!("characteristic polynomial in {}", c.case)
    } else {
        "characteristic polynomial".to_owned()
    };
    match &c.form {
        Some(form) => {
            let naming = naming(form, c.variable);
            let written = factors::write(&form.denominator, &Poly::one(), style, naming);
            page.fraction(&label, &|out: &mut Words<'_>| written.numerator.words(out, naming), None)?;
        }
        None => page.line(&format!("{label}: not exact, a value in it is not rational"))?,
    }
    let mut facts: Vec<Fact> = Vec::new();
    for h in c.hidden.iter().take(MAX_LISTED) {
        let factor = dotted(&h.factor);
        let from = if h.from.len() > MAX_LISTED {
            format!("{} and {} more", h.from[..MAX_LISTED].join(", "), h.from.len() - MAX_LISTED)
        } else {
            h.from.join(", ")
        };
        facts.push(("hidden".to_owned(), vec![format!("{factor} from {from}")]));
    }
    if c.hidden.len() > MAX_LISTED {
        facts.push((
            String::new(),
            vec![format!("… and {} more; --format json lists all", c.hidden.len() - MAX_LISTED)],
        ));
    }
    if !facts.is_empty() {
        page.gap()?;
        page.facts(&facts)?;
    }
    Ok(false)
}
