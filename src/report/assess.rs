//! The document of `assess`, and its text for people: the verdict first, then the requirement that fails by most, then
//! tables.

use super::CAUTION;
use super::derive::TextOptions;
use super::number::{float, rounded_float};
use super::page::Page;
use crate::results::ToldDiagnostic;
use crate::results::assess::{
    Absent, Assess, CaseFigures, LoopFigures, Mode, RequirementFigure, StabilityFigures, TransferFigures,
};
use crate::source::SourceMap;
use std::io::{self, Write};
use unicode_width::UnicodeWidthStr as _;

/// Modes listed for one case unless all are asked for: the slowest matter most, and they stand last in the results.
const MAX_MODES: usize = 24;

/// Gain and phase margins listed for one loop unless all are asked for.
const MAX_MARGINS: usize = 6;

/// Significant digits of figures in tables.
const DIGITS: usize = 5;

/// The document, with the files and lines of requirements filled in.
pub fn assess_document(
    model: String,
    mut cases: Vec<CaseFigures>,
    diagnostics: Vec<ToldDiagnostic>,
    sources: &SourceMap,
) -> Assess {
    for requirement in cases.iter_mut().flat_map(|c| &mut c.requirements) {
        if let Some(place) = sources.place(requirement.span) {
            (requirement.file, requirement.line) = (place.file.to_owned(), place.line);
        }
    }
    let ok = diagnostics.iter().all(|d| d.severity != crate::diagnostics::Severity::Error);
    Assess { schema: "loopwright.assess.1", model, ok, diagnostics, cases }
}

/// Writes the text; `all` lists what is left out otherwise: every mode, every margin, reasons of figures that are absent.
///
/// # Errors
///
/// What `out` says.
pub fn assess(document: &Assess, all: bool, options: TextOptions, out: &mut dyn Write) -> io::Result<()> {
    let mut page = Page::new(out, options.width);
    verdict(&mut page, document)?;
    for case in &document.cases {
        page.gap()?;
        if document.cases.len() > 1 {
            page.line(&format!("case {}", case.name))?;
            page.line(&"─".repeat(case.name.width() + 5))?;
        }
        one_case(&mut page, case, all)?;
    }
    page.gap()?;
    page.sentence(0, CAUTION)
}

/// What an engineer wants to know first.
fn verdict(page: &mut Page<'_>, document: &Assess) -> io::Result<()> {
    let every = || document.cases.iter().flat_map(|c| c.requirements.iter().map(move |r| (c, r)));
    let (total, failed) = (every().count(), every().filter(|(_, r)| !r.holds).count());
    let unstable: Vec<&CaseFigures> = document.cases.iter().filter(|c| !c.stability.stable).collect();
    let named = |list: &[&CaseFigures]| list.iter().map(|c| c.name.as_str()).collect::<Vec<_>>().join(", ");
    let state = if unstable.is_empty() {
        "stable".to_owned()
    } else if document.cases.len() == 1 {
        format!("NOT STABLE: {}", counts(&unstable[0].stability))
    } else {
        format!("NOT STABLE in {}", named(&unstable))
    };
    let asked = match (total, failed) {
        (0, _) => "nothing is required".to_owned(),
        (n, 0) => format!("all {n} requirements hold"),
        (n, k) => format!("{k} of {n} requirements {}", if k == 1 { "fails" } else { "fail" }),
    };
    let asked = asked.replace("all 1 requirements hold", "the requirement holds");
    let asked = asked.replace("1 of 1 requirements fails", "the requirement fails");
    page.sentence(0, &format!("{}: {state}; {asked}", document.model))?;
    if let Some((case, r)) = every().filter(|(_, r)| !r.holds).max_by(|a, b| shortfall(a.1).total_cmp(&shortfall(b.1)))
    {
        let place = if document.cases.len() > 1 { format!(" in case {}", case.name) } else { String::new() };
        page.sentence(0, &format!("worst: {}:{} {}{place}: {}", r.file, r.line, r.text, found(r)))?;
    }
    Ok(())
}

/// By how much a requirement fails, as a part of what is required; a figure that is not there fails by most.
fn shortfall(r: &RequirementFigure) -> f64 {
    match (r.slack, r.required) {
        (Some(slack), Some(required)) if required != 0.0 => -slack / required.abs(),
        (Some(slack), _) => -slack,
        _ => f64::INFINITY,
    }
}

fn counts(s: &StabilityFigures) -> String {
    let count = |n: Option<usize>, place: &str| match n {
        Some(0) => None,
        Some(n) => Some(format!("{n} {} {place}", if n == 1 { "mode" } else { "modes" })),
        None => Some(format!("modes {place} can't be counted")),
    };
    let parts = [
        s.right_half_plane.and_then(|n| count(n, "in the right half-plane")),
        s.on_axis.and_then(|n| count(n, "on the axis")),
        s.outside_circle.and_then(|n| count(n, "outside the unit circle")),
        s.on_circle.and_then(|n| count(n, "on the unit circle")),
    ];
    let told: Vec<String> = parts.into_iter().flatten().collect();
    if let Some(why) = s.absent.values().next() { why.clone() } else { told.join(", ") }
}

fn with_unit(value: f64, unit: Option<&str>) -> String {
    match unit {
        None | Some("1") => float(value),
        Some(unit) => format!("{} {unit}", float(value)),
    }
}

/// `found 40.5283 deg, 4.47175 deg short`, or why there is nothing.
fn found(r: &RequirementFigure) -> String {
    let unit = r.unit.as_deref();
    match (r.value, r.slack) {
        (Some(value), Some(slack)) => {
            let side = if slack < 0.0 { "short" } else { "to spare" };
            let at = r.frequency.map_or_else(String::new, |w| format!(" at {} rad/s", rounded_float(w, DIGITS)));
            format!("found {}{at}, {} {side}", with_unit(value, unit), with_unit(slack.abs(), unit))
        }
        _ => r.why.clone().unwrap_or_else(|| if r.holds { "holds".to_owned() } else { "fails".to_owned() }),
    }
}

fn one_case(page: &mut Page<'_>, case: &CaseFigures, all: bool) -> io::Result<()> {
    let s = &case.stability;
    let state = if s.stable { "stable".to_owned() } else { format!("not stable: {}", counts(s)) };
    let mut facts = vec![("stability".to_owned(), vec![format!("{state} ({})", s.method)])];
    if let Some(windows) = &s.dead_time_windows {
        let told: Vec<String> = windows
            .iter()
            .map(|w| {
                let to = w.to.map_or_else(|| "∞".to_owned(), |t| rounded_float(t, DIGITS));
                format!("{} .. {to} s", rounded_float(w.from, DIGITS))
            })
            .collect();
        let told = if told.is_empty() { "for no dead time".to_owned() } else { told.join(", ") };
        facts.push(("stable for dead times".to_owned(), vec![told]));
    }
    page.facts(&facts)?;
    requirements(page, &case.requirements)?;
    modes(page, case, all)?;
    for l in &case.loops {
        one_loop(page, l, all)?;
    }
    for t in &case.transfers {
        transfer(page, t, all)?;
    }
    Ok(())
}

fn heading(page: &mut Page<'_>, text: &str) -> io::Result<()> {
    page.gap()?;
    page.line(text)
}

/// Those that fail first, by how much; then the others in the order of the file.
fn requirements(page: &mut Page<'_>, list: &[RequirementFigure]) -> io::Result<()> {
    if list.is_empty() {
        return Ok(());
    }
    heading(page, "requirements")?;
    let mut order: Vec<&RequirementFigure> = list.iter().collect();
    order.sort_by(|a, b| {
        a.holds
            .cmp(&b.holds)
            .then_with(|| if a.holds { std::cmp::Ordering::Equal } else { shortfall(b).total_cmp(&shortfall(a)) })
    });
    for r in order {
        let word = if r.holds { "holds" } else { "FAILS" };
        page.sentence(2, &format!("{word}  line {}: {}", r.line, r.text))?;
        let told = found(r);
        if told != "holds" {
            page.sentence(9, &told)?;
        }
    }
    Ok(())
}

fn modes(page: &mut Page<'_>, case: &CaseFigures, all: bool) -> io::Result<()> {
    if case.modes.is_empty() && case.absent.is_empty() {
        return Ok(());
    }
    heading(page, "modes")?;
    if let Some(why) = case.absent.get("modes") {
        page.sentence(2, why)?;
    }
    let upper: Vec<&Mode> = case.modes.iter().filter(|m| m.im >= 0.0).collect();
    let most = if all { usize::MAX } else { MAX_MODES };
    let left_out = upper.len().saturating_sub(most);
    if left_out > 0 {
        page.line(&format!("  {left_out} faster ones are left out; --verbose lists them"))?;
    }
    for m in &upper[left_out..] {
        let place = if m.im == 0.0 {
            rounded_float(m.re, DIGITS)
        } else {
            format!("{} ± j{}", rounded_float(m.re, DIGITS), rounded_float(m.im, DIGITS))
        };
        let mut text = format!("{} = {place}", case.variable);
        if m.multiplicity > 1 {
            text += &format!(" ({} times)", m.multiplicity);
        }
        let text = format!("{text:<32}");
        let mut rest = Vec::new();
        if let Some(w) = m.frequency {
            rest.push(format!("ω_n = {} rad/s", rounded_float(w, DIGITS)));
        }
        if let Some(z) = m.damping_ratio {
            rest.push(format!("ζ = {}", rounded_float(z, DIGITS)));
        }
        page.line(&format!("  {text}  {}", rest.join(", ")))?;
        if !m.hidden_from.is_empty() {
            page.sentence(6, &format!("hidden from {}", m.hidden_from.join(", ")))?;
        }
    }
    Ok(())
}

fn at(frequency: Option<f64>) -> String {
    frequency.map_or_else(|| "as ω → ∞".to_owned(), |w| format!("at {} rad/s", rounded_float(w, DIGITS)))
}

fn opened(open: &[String]) -> String {
    if open.is_empty() { String::new() } else { format!(" with {} open", open.join(", ")) }
}

/// Reasons of absent figures, told with `all`.
fn reasons(facts: &mut Vec<(String, Vec<String>)>, absent: &Absent, all: bool) {
    if all {
        facts.extend(absent.iter().map(|(key, why)| (key.replace('_', " "), vec![format!("none: {why}")])));
    }
}

fn one_loop(page: &mut Page<'_>, l: &LoopFigures, all: bool) -> io::Result<()> {
    heading(page, &format!("loop at {}{}", l.at, opened(&l.open)))?;
    let most = if all { usize::MAX } else { MAX_MARGINS };
    let mut facts = Vec::new();
    if let Some(why) = l.absent.get("gain_margins") {
        facts.push(("margins".to_owned(), vec![format!("none: {why}")]));
    }
    if let Some(list) = &l.gain_margins {
        let decibel = |f: f64| rounded_float(20.0 * libm::log10(f), DIGITS);
        let line = |m: &crate::results::assess::GainFigure| {
            format!("{} ({} dB) {}", rounded_float(m.factor, DIGITS), decibel(m.factor), at(m.frequency))
        };
        let mut told: Vec<String> = list.iter().take(most).map(line).collect();
        if list.len() > most {
            told.push(format!("and {} more", list.len() - most));
        }
        if told.is_empty() {
            told.push("∞: no factor of the loop gain loses stability".to_owned());
        }
        facts.push(("gain margin".to_owned(), told));
    }
    if let Some(list) = &l.phase_margins {
        let line = |m: &crate::results::assess::PhaseFigure| {
            format!("{} deg at {} rad/s", rounded_float(m.degrees, DIGITS), rounded_float(m.frequency, DIGITS))
        };
        let mut told: Vec<String> = list.iter().take(most).map(line).collect();
        if list.len() > most {
            told.push(format!("and {} more", list.len() - most));
        }
        if told.is_empty() {
            told.push("∞: abs(L) is 1 at no frequency".to_owned());
        }
        facts.push(("phase margin".to_owned(), told));
    }
    if let Some(d) = &l.delay_margin {
        facts.push((
            "delay margin".to_owned(),
            vec![format!("{} s {}", rounded_float(d.seconds, DIGITS), at(d.frequency))],
        ));
    }
    if let Some(m) = &l.modulus_margin {
        facts.push((
            "modulus margin".to_owned(),
            vec![format!("{} {}", rounded_float(m.value, DIGITS), at(m.frequency))],
        ));
    }
    if let Some(w) = l.crossover {
        facts.push(("crossover".to_owned(), vec![format!("{} rad/s", rounded_float(w, DIGITS))]));
    }
    facts.extend(l.notes.iter().map(|n| ("note".to_owned(), vec![n.clone()])));
    reasons(&mut facts, &l.absent, all && !l.absent.contains_key("gain_margins"));
    page.facts(&facts)
}

fn transfer(page: &mut Page<'_>, t: &TransferFigures, all: bool) -> io::Result<()> {
    heading(page, &format!("{} / {}{}", t.to, t.from, opened(&t.open)))?;
    let short = |v: f64| rounded_float(v, DIGITS);
    let mut facts = Vec::new();
    if !t.stable {
        facts.push(("poles".to_owned(), vec!["not all of them decay".to_owned()]));
    }
    if let Some(v) = t.dc_gain {
        facts.push(("gain at ω = 0".to_owned(), vec![short(v)]));
    }
    if let Some(p) = &t.peak {
        facts.push(("peak".to_owned(), vec![format!("{} {}", short(p.value), at(p.frequency))]));
    }
    if let Some(w) = t.bandwidth {
        facts.push(("bandwidth".to_owned(), vec![format!("{} rad/s", short(w))]));
    }
    if let Some(v) = t.two_norm {
        facts.push(("2-norm".to_owned(), vec![short(v)]));
    }
    if let Some(s) = &t.step {
        let mut told = Vec::new();
        told.extend(s.final_value.map(|v| format!("final value {}", short(v))));
        told.extend(s.overshoot.map(|v| {
            let when = s.peak_time.map_or_else(String::new, |t| format!(" at {} s", short(t)));
            format!("overshoot {} %{when}", short(v))
        }));
        told.extend(s.rise_time.map(|v| format!("rise 10–90 % in {} s", short(v))));
        told.extend(s.settling_time.map(|v| format!("settled to ±2 % after {} s", short(v))));
        facts.push(("step response".to_owned(), vec![told.join(", ")]));
        reasons(&mut facts, &s.absent, all);
    }
    reasons(&mut facts, &t.absent, all);
    page.facts(&facts)
}

#[cfg(test)]
mod tests {
    use super::super::{junit, sarif};
    use super::*;
    use crate::results::assess::{GainFigure, PhaseFigure};
    use crate::source::Span;

    fn requirement(text: &str, line: usize, holds: bool, value: Option<f64>, slack: Option<f64>) -> RequirementFigure {
        RequirementFigure {
            text: text.into(),
            file: "a b.loop".into(),
            line,
            holds,
            value,
            unit: Some("deg".into()),
            required: slack.map(|_| 45.0),
            slack,
            frequency: None,
            why: value.is_none().then(|| "the loop is not stable".into()),
            span: Span::NONE,
        }
    }

    /// A document with one case, a loop, and requirements of all three ends.
    fn document() -> Assess {
        let case = CaseFigures {
            name: "nominal".into(),
            variable: "s",
            stability: StabilityFigures {
                stable: true,
                right_half_plane: Some(Some(0)),
                on_axis: Some(Some(0)),
                outside_circle: None,
                on_circle: None,
                method: "routh, exact".into(),
                dead_time_windows: None,
                absent: Absent::new(),
            },
            modes: vec![Mode {
                re: -1.0,
                im: 0.0,
                multiplicity: 2,
                frequency: Some(1.0),
                damping_ratio: Some(1.0),
                hidden_from: vec!["y/r".into()],
            }],
            absent: Absent::new(),
            loops: vec![LoopFigures {
                at: "u".into(),
                open: vec![],
                stable: true,
                gain_margins: Some(vec![GainFigure { factor: 10.0, frequency: None }]),
                phase_margins: Some(vec![PhaseFigure { degrees: 40.5, frequency: 2.0 }]),
                delay_margin: None,
                modulus_margin: None,
                crossover: Some(2.0),
                absent: Absent::new(),
                notes: vec![],
            }],
            transfers: vec![],
            requirements: vec![
                requirement("phase_margin at v >= 40 & <x>", 7, true, Some(52.0), Some(7.0)),
                requirement("phase_margin at u >= 45 [deg]", 8, false, Some(40.5), Some(-4.5)),
            ],
        };
        let cases = vec![case];
        Assess { schema: "loopwright.assess.1", model: "m".into(), ok: true, diagnostics: vec![], cases }
    }

    fn text(document: &Assess) -> String {
        let mut out = Vec::new();
        assess(document, false, TextOptions::default(), &mut out).expect("a vector takes it");
        String::from_utf8(out).expect("UTF-8")
    }

    #[test]
    fn the_verdict_stands_first_and_the_caution_last() {
        let told = text(&document());
        let lines: Vec<&str> = told.lines().collect();
        assert_eq!(lines[0], "m: stable; 1 of 2 requirements fails");
        assert!(lines[1].starts_with("worst: a b.loop:8 phase_margin at u >= 45 [deg]: found 40.5 deg"), "{told}");
        assert!(
            told.trim_end().ends_with("prevail.") && told.matches(CAUTION.split(':').next().unwrap_or("")).count() == 1
        );
        assert!(lines.iter().all(|l| l.width() <= 80), "{told}");
        let (fails, holds) = (told.find("FAILS line 8"), told.find("holds line 7"));
        assert!(fails < holds && fails.is_some() && told.contains("10 (20 dB) as ω → ∞"), "{told}");
    }

    /// The members that the standard requires (OASIS SARIF 2.1.0, sections 3.13, 3.14, 3.18, 3.27) and the place.
    #[test]
    fn sarif_has_what_the_standard_requires() {
        let log = sarif(&document());
        assert_eq!(log["version"], "2.1.0");
        let run = &log["runs"][0];
        assert_eq!(run["tool"]["driver"]["name"], "loopwright");
        let results = run["results"].as_array().expect("a list");
        assert_eq!(results.len(), 1);
        let rules = run["tool"]["driver"]["rules"].as_array().expect("a list");
        assert!(rules.iter().any(|r| r["id"] == results[0]["ruleId"]));
        assert!(results[0]["message"]["text"].as_str().is_some_and(|t| t.contains("found 40.5 deg")));
        let place = &results[0]["locations"][0]["physicalLocation"];
        assert_eq!(place["artifactLocation"]["uri"], "a%20b.loop");
        assert_eq!(place["region"]["startLine"], 8);
    }

    #[test]
    fn junit_counts_and_escapes() {
        let mut out = Vec::new();
        junit(&document(), &mut out).expect("a vector takes it");
        let told = String::from_utf8(out).expect("UTF-8");
        assert!(told.contains(r#"<testsuites name="m" tests="2" failures="1" errors="0">"#), "{told}");
        assert!(
            told.contains("&gt;= 40 &amp; &lt;x&gt;") && told.contains(r#"<failure message="found 40.5 deg"/>"#),
            "{told}"
        );
    }
}
