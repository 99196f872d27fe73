//! `mason` as text: the rule worked out so that a reviewer follows it with a pencil on the diagram.

use super::derive::{TextOptions, naming};
use super::factors;
use super::page::{INDENT, Page, one_line};
use super::sum::{Joint, Words, dotted};
use crate::results::mason::{Mason, MasonBranch};
use std::io::{self, Write};

/// The most entries of one section; JSON has all.
const MAX_ENTRIES: usize = 60;

/// Writes Mason's rule for one request, section by section.
///
/// # Errors
///
/// What `out` says.
pub fn mason(document: &Mason, options: TextOptions, out: &mut dyn Write) -> io::Result<()> {
    let mut page = Page::new(out, options.width);
    let request = request(document);
    let values =
        if document.case == "nominal" { "nominal values".to_owned() } else { format!("case {}", document.case) };
    page.sentence(0, &format!("{}, {values}: {request} by Mason's gain rule", document.model))?;

    branches(&mut page, document)?;

    heading(&mut page, "Forward paths", document.paths.len())?;
    for p in document.paths.iter().take(MAX_ENTRIES) {
        equation(&mut page, &p.name, &p.names, &p.expression)?;
        walk(&mut page, &p.name, &p.signals.join(" → "))?;
        let touched = if p.touches.is_empty() {
            "touches no loop".to_owned()
        } else {
            format!("touches {}", p.touches.join(", "))
        };
        walk(&mut page, &p.name, &touched)?;
    }
    cut(&mut page, document.paths.len())?;

    heading(&mut page, "Loops", document.loops.len())?;
    for l in document.loops.iter().take(MAX_ENTRIES) {
        equation(&mut page, &l.name, &l.names, &l.expression)?;
        let first = l.signals.first().map_or("", String::as_str);
        walk(&mut page, &l.name, &format!("{} → {first}", l.signals.join(" → ")))?;
    }
    cut(&mut page, document.loops.len())?;

    if document.loops.len() > 1 {
        heading(&mut page, "Groups of loops that do not touch one another", document.groups.len())?;
        for g in document.groups.iter().take(MAX_ENTRIES) {
            equation(&mut page, &g.loops.join("·"), "", &g.expression)?;
        }
        cut(&mut page, document.groups.len())?;
    }

    page.gap()?;
    page.line("Determinant")?;
    let d = &document.determinant;
    equation(&mut page, &d.name, &d.names, &d.expression)?;

    page.gap()?;
    page.line("Cofactors: the determinant without the loops that touch the path")?;
    if document.cofactors.is_empty() {
        page.line("  none")?;
    }
    for c in document.cofactors.iter().take(MAX_ENTRIES) {
        equation(&mut page, &c.name, &c.names, &c.expression)?;
    }
    cut(&mut page, document.cofactors.len())?;

    page.gap()?;
    page.line("Gain")?;
    equation(&mut page, &request, &document.gain.names, "")?;
    page.gap()?;
    match &document.gain.form {
        Some(form) => {
            let naming = naming(form, document.variable);
            let written = factors::write(&form.numerator, &form.denominator, options.fraction, naming);
            let above = |out: &mut Words<'_>| written.numerator.words(out, naming);
            let below = |out: &mut Words<'_>| {
                if let Some(side) = &written.denominator {
                    side.words(out, naming);
                }
            };
            page.fraction(&request, &above, written.denominator.is_some().then_some(&below))?;
        }
        None => equation(&mut page, &request, "", &document.gain.expression)?,
    }
    if !document.exact {
        page.sentence(INDENT, "Rounded: a value in it is not rational.")?;
    }
    Ok(())
}

/// The request as it stands in the language.
fn request(document: &Mason) -> String {
    let mut text =
        if document.at.is_empty() { format!("{} / {}", document.to, document.from) } else { document.from.clone() };
    if !document.open.is_empty() {
        text = format!("{text} with {} open", document.open.join(", "));
    }
    text
}

/// A legend of the branches that occur: name, from where to where, gain.
fn branches(page: &mut Page<'_>, document: &Mason) -> io::Result<()> {
    let all = document.paths.iter().flat_map(|p| &p.branches).chain(document.loops.iter().flat_map(|l| &l.branches));
    let mut known: Vec<&MasonBranch> = Vec::new();
    for b in all.filter(|b| !b.name.is_empty()) {
        if known.len() < MAX_ENTRIES && !known.contains(&b) {
            known.push(b);
        }
    }
    if known.is_empty() {
        return Ok(());
    }
    page.gap()?;
    page.line("Branches")?;
    let width = |text: &dyn Fn(&MasonBranch) -> usize| known.iter().map(|b| text(b)).max().unwrap_or(0).min(24);
    let (names, ways) = (width(&|b| dotted(&b.name).chars().count()), width(&|b| way(b).chars().count()));
    for b in known {
        let lead = format!("{:INDENT$}{:names$}   {:ways$}   ", "", dotted(&b.name), way(b));
        page.hanging(&lead, INDENT + 4, &|out| text(out, &b.expression))?;
    }
    Ok(())
}

fn way(b: &MasonBranch) -> String {
    format!("{} → {}", b.from, b.to)
}

fn heading(page: &mut Page<'_>, title: &str, count: usize) -> io::Result<()> {
    page.gap()?;
    page.line(title)?;
    if count == 0 { page.line("  none") } else { Ok(()) }
}

fn cut(page: &mut Page<'_>, count: usize) -> io::Result<()> {
    if count > MAX_ENTRIES {
        return page.line(&format!("  … and {} more; --format json lists all", count - MAX_ENTRIES));
    }
    Ok(())
}

/// `P1 = C·G = 10/(s + 2)`, on one line where it fits, else the expression below the names.
fn equation(page: &mut Page<'_>, name: &str, names: &str, expression: &str) -> io::Result<()> {
    let lead = format!("{:INDENT$}{name} = ", "");
    let set_in = lead.chars().count();
    // Where a path has no block in it, its names are its gain already.
    let expression = if expression == names { "" } else { expression };
    if names.is_empty() || expression.is_empty() {
        let one = if names.is_empty() { expression } else { names };
        return page.hanging(&lead, set_in, &|out| text(out, one));
    }
    let both = format!("{names} = {expression}");
    if one_line(&|out| text(out, &both), page.width().saturating_sub(set_in)).is_some() {
        return page.hanging(&lead, set_in, &|out| text(out, &both));
    }
    page.hanging(&lead, set_in, &|out| text(out, names))?;
    let below = format!("{:pad$}= ", "", pad = set_in - 2);
    page.hanging(&below, set_in, &|out| text(out, expression))
}

/// What belongs to an equation, below it.
fn walk(page: &mut Page<'_>, name: &str, what: &str) -> io::Result<()> {
    let set_in = INDENT + name.chars().count() + 3;
    page.hanging(&" ".repeat(set_in), set_in, &|out| text(out, what))
}

/// An expression of the results' notation as words.
fn text(out: &mut Words<'_>, expression: &str) {
    for word in dotted(expression).split(' ') {
        out.push(word);
        out.end(Joint::Space);
    }
}
