//! Requirements as the test cases of a JUnit report, a suite for each case of the model: the form that build servers read.

use crate::results::assess::Assess;
use std::fmt::Write as _;
use std::io::{self, Write};

/// Writes the report.
///
/// # Errors
///
/// What `out` says.
pub fn junit(document: &Assess, out: &mut dyn Write) -> io::Result<()> {
    let every = || document.cases.iter().flat_map(|c| &c.requirements);
    let (total, failed) = (every().count(), every().filter(|r| !r.holds).count());
    let errors: Vec<_> =
        document.diagnostics.iter().filter(|d| d.severity == crate::diagnostics::Severity::Error).collect();
    writeln!(out, r#"<?xml version="1.0" encoding="UTF-8"?>"#)?;
    let count = total + errors.len();
    writeln!(
        out,
        r#"<testsuites name="{}" tests="{count}" failures="{failed}" errors="{}">"#,
        escaped(&document.model),
        errors.len()
    )?;
    for case in &document.cases {
        let failed = case.requirements.iter().filter(|r| !r.holds).count();
        let (name, tests) = (escaped(&case.name), case.requirements.len());
        writeln!(out, r#"  <testsuite name="{name}" tests="{tests}" failures="{failed}" errors="0">"#)?;
        for r in &case.requirements {
            let (text, file) = (escaped(&r.text), escaped(&r.file));
            let head = format!(r#"<testcase classname="{file}" name="{text}" file="{file}" line="{}""#, r.line);
            if r.holds {
                writeln!(out, "    {head}/>")?;
                continue;
            }
            let mut why = r.why.clone().unwrap_or_default();
            if let Some(value) = r.value {
                let unit = r.unit.as_deref().filter(|u| *u != "1").map_or_else(String::new, |u| format!(" {u}"));
                let _ = write!(why, "found {value}{unit}");
            }
            writeln!(out, r#"    {head}><failure message="{}"/></testcase>"#, escaped(&why))?;
        }
        writeln!(out, "  </testsuite>")?;
    }
    if !errors.is_empty() {
        writeln!(out, r#"  <testsuite name="input" tests="{0}" failures="0" errors="{0}">"#, errors.len())?;
        for d in errors {
            let place = d.labels.first().map_or_else(String::new, |l| format!("{}:{}", l.file, l.line));
            let (code, place, text) = (d.code.word(), escaped(&place), escaped(&d.message));
            writeln!(out, r#"    <testcase classname="{place}" name="{code}"><error message="{text}"/></testcase>"#)?;
        }
        writeln!(out, "  </testsuite>")?;
    }
    writeln!(out, "</testsuites>")
}

/// Text inside an attribute (XML 1.0, section 2.4); characters that XML does not have are left out.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\t' | '\n' | '\r' => out.push(' '),
            c if (c as u32) < 0x20 || matches!(c as u32, 0xFFFE | 0xFFFF) => {}
            c => out.push(c),
        }
    }
    out
}
