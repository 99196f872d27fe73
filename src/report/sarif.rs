//! Requirements that fail, and diagnostics, as SARIF 2.1.0 (OASIS standard, 27 March 2020), which code hosts read to
//! annotate lines.

use crate::diagnostics::Severity;
use crate::results::assess::Assess;
use serde_json::{Value, json};

/// The rule under which a failing requirement is told.
const RULE: &str = "requirement-not-met";

/// The document.
pub fn sarif(document: &Assess) -> Value {
    let mut results = Vec::new();
    let mut rules = vec![json!({
        "id": RULE,
        "shortDescription": { "text": "a requirement does not hold" },
        "defaultConfiguration": { "level": "error" },
    })];
    for case in &document.cases {
        for r in case.requirements.iter().filter(|r| !r.holds) {
            let found = match (r.value, &r.why) {
                (Some(value), _) => format!(
                    "found {value}{}",
                    r.unit.as_ref().filter(|u| *u != "1").map_or_else(String::new, |u| format!(" {u}"))
                ),
                (None, Some(why)) => why.clone(),
                (None, None) => "it does not hold".to_owned(),
            };
            let text = format!("requirement not met in case {}: {}: {found}", case.name, r.text);
            results.push(json!({
                "ruleId": RULE,
                "level": "error",
                "message": { "text": text },
                "locations": [location(&r.file, json!({ "startLine": r.line }))],
            }));
        }
    }
    for d in &document.diagnostics {
        let id = d.code.word();
        if !rules.iter().any(|r| r["id"] == id) {
            rules.push(json!({ "id": id }));
        }
        let level = match d.severity {
            Severity::Error => "error",
            Severity::Warning => "warning",
            Severity::Note => "note",
        };
        let place = d.labels.first().map(|l| {
            let region =
                json!({ "startLine": l.line, "startColumn": l.column, "endColumn": l.column + l.length.max(1) });
            location(&l.file, region)
        });
        let mut result = json!({ "ruleId": id, "level": level, "message": { "text": d.message } });
        if let Some(place) = place {
            result["locations"] = json!([place]);
        }
        results.push(result);
    }
    json!({
        "$schema": "https://json.schemastore.org/sarif-2.1.0.json",
        "version": "2.1.0",
        "runs": [{
            "tool": { "driver": { "name": "loopwright", "version": env!("CARGO_PKG_VERSION"), "rules": rules } },
            "columnKind": "unicodeCodePoints",
            "results": results,
        }],
    })
}

fn location(file: &str, region: Value) -> Value {
    let uri: String = file.bytes().map(percent).collect();
    json!({ "physicalLocation": { "artifactLocation": { "uri": uri }, "region": region } })
}

/// A byte of a path as it stands in a URI reference (RFC 3986, section 2).
fn percent(byte: u8) -> String {
    let plain = byte.is_ascii_alphanumeric() || b"-._~/".contains(&byte);
    if plain { char::from(byte).to_string() } else { format!("%{byte:02X}") }
}
