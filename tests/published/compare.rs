//! What a result must have in common with what is expected; the keys stand in `README.md` beside the cases.

use super::exact::{self, Env};
use dashu_ratio::RBig;
use serde_json::Value;

/// Added to every relative tolerance.
const ABSOLUTE: f64 = 1e-9;

fn no_blanks(text: &Value) -> String {
    text.as_str().unwrap_or("").split_whitespace().collect()
}

fn list(value: &Value) -> &[Value] {
    value.as_array().map_or(&[], Vec::as_slice)
}

const KEYS: [&str; 7] = ["exit", "transfers", "ok", "diagnostics", "errors_only", "absent", "note"];

const TRANSFER_KEYS: [&str; 17] = [
    "to",
    "from",
    "index",
    "case",
    "variable",
    "exact",
    "stable",
    "numerator",
    "denominator",
    "reduced",
    "canonical",
    "poles",
    "zeros",
    "dc_gain",
    "converges_right_of",
    "cancelled",
    "note",
];

/// Refuses a case that asks for something which nothing here would look at.
pub(crate) fn only_known_keys(expect: &Value) -> Result<(), String> {
    let keys = |value: &Value| value.as_object().map(|o| o.keys().cloned().collect::<Vec<_>>()).unwrap_or_default();
    let unknown = |value: &Value, known: &[&str]| keys(value).into_iter().find(|k| !known.contains(&k.as_str()));
    let mut all = list(&expect["transfers"]).iter().map(|t| unknown(t, &TRANSFER_KEYS));
    let found = unknown(expect, &KEYS).or_else(|| all.find_map(|key| key));
    found.map_or(Ok(()), |key| Err(format!("`{key}` is no key that this test compares")))
}

/// Each expected transfer must be among the results, matched by `to` and `from`, or by `index` among those.
pub(crate) fn transfers(got: &Value, wanted: &Value) -> Result<(), String> {
    for want in list(wanted) {
        let what = format!("{} / {}", no_blanks(&want["to"]), no_blanks(&want["from"]));
        let same = |t: &&Value| ["to", "from"].iter().all(|&key| no_blanks(&t[key]) == no_blanks(&want[key]));
        let mut hits: Vec<&Value> = list(got).iter().filter(same).collect();
        if let Some(index) = want.get("index").and_then(Value::as_u64) {
            hits = hits.into_iter().skip(index as usize).take(1).collect();
        }
        let mut why = format!("{what}: not in the results");
        let found = hits.iter().rev().any(|t| transfer(t, want).map_err(|w| why = format!("{what}: {w}")).is_ok());
        if !found {
            return Err(why);
        }
    }
    Ok(())
}

fn transfer(got: &Value, want: &Value) -> Result<(), String> {
    for key in ["case", "variable", "exact", "stable"] {
        if want.get(key).is_some_and(|w| *w != got[key]) {
            return Err(format!("{key} is {}, expected {}", got[key], want[key]));
        }
    }
    if let Some(numerator) = want.get("numerator") {
        let reduced = want.get("reduced").and_then(Value::as_bool).unwrap_or(true);
        let ends = [&got["numerator"], &got["denominator"]];
        exact::same_fraction(ends, [numerator, &want["denominator"]], reduced)?;
        if want.get("canonical") == Some(&Value::Bool(true)) {
            exact::canonical(ends[0], ends[1])?;
        }
    }
    for key in ["poles", "zeros"] {
        if let Some(want) = want.get(key) {
            roots(&got[key], want).map_err(|why| format!("{key}: {why}"))?;
        }
    }
    for key in ["dc_gain", "converges_right_of"] {
        if let Some(want) = want.get(key) {
            near(&got[key], want).map_err(|why| format!("{key}: {why}"))?;
        }
    }
    match want.get("cancelled") {
        Some(factors) => same_product(&got["cancelled"], factors),
        None => Ok(()),
    }
}

/// A number within 1e-6, or the tolerance that stands beside it; null must be null.
fn near(got: &Value, want: &Value) -> Result<(), String> {
    if want.is_null() {
        return if got.is_null() { Ok(()) } else { Err(format!("expected null, got {got}")) };
    }
    let value = want.as_f64().or_else(|| want["value"].as_f64()).ok_or("the expected value is no number")?;
    let relative = want.get("rel").and_then(Value::as_f64).unwrap_or(1e-6) * value.abs();
    let tolerance = want.get("tol").and_then(Value::as_f64).unwrap_or(relative) + ABSOLUTE;
    match got.as_f64() {
        Some(got) if (got - value).abs() <= tolerance => Ok(()),
        _ => Err(format!("expected {value}, got {got} (tolerance {tolerance:.3e})")),
    }
}

/// The whole set with multiplicity; each within 1e-6 of its modulus, or within `tol`.
fn roots(got: &Value, want: &Value) -> Result<(), String> {
    let part = |root: &Value, key: &str| root[key].as_f64().unwrap_or(f64::NAN);
    let count = |root: &Value| root.get("multiplicity").and_then(Value::as_u64).unwrap_or(1);
    let mut left: Vec<u64> = list(got).iter().map(count).collect();
    for root in list(want) {
        let (re, im) = (part(root, "re"), part(root, "im"));
        let tolerance = root.get("tol").and_then(Value::as_f64);
        let tolerance = tolerance.unwrap_or(1e-6 * re.hypot(im).max(1e-9) + 1e-12);
        let mut need = count(root);
        for (g, left) in list(got).iter().zip(&mut left) {
            if (part(g, "re") - re).hypot(part(g, "im") - im) <= tolerance {
                let taken = need.min(*left);
                need -= taken;
                *left -= taken;
            }
        }
        if need > 0 {
            return Err(format!("{re} + {im}j (multiplicity {}) not found in {got}", count(root)));
        }
    }
    let extra: u64 = left.iter().sum();
    if extra == 0 { Ok(()) } else { Err(format!("{extra} more than expected: {got}")) }
}

/// The products of two lists of factors must be equal up to a constant: compared at three points.
fn same_product(got: &Value, want: &Value) -> Result<(), String> {
    let product = |factors: &Value, point: &RBig| {
        let env: Env = ["s", "z"].map(|name| (name.to_owned(), point.clone())).into();
        list(factors).iter().try_fold(RBig::ONE, |product, factor| {
            Ok::<_, String>(product * exact::value(factor.as_str().unwrap_or(""), &env)?)
        })
    };
    let mut ratios = Vec::new();
    for point in [23, 45, 101] {
        let point = RBig::from(point) / RBig::from(7);
        ratios.push(product(got, &point)? / product(want, &point)?);
    }
    if ratios.iter().all(|r| *r == ratios[0]) { Ok(()) } else { Err(format!("cancelled {got}, expected {want}")) }
}

/// Each expected diagnostic must be reported; `errors_only` and `absent` say what must not be.
pub(crate) fn diagnostics(document: &Value, expect: &Value) -> Result<(), String> {
    let got = list(&document["diagnostics"]);
    let codes: Vec<&str> = got.iter().filter_map(|d| d["code"].as_str()).collect();
    if expect.get("ok").is_some_and(|ok| *ok != document["ok"]) {
        return Err(format!("ok is {}; codes {codes:?}", document["ok"]));
    }
    for want in list(&expect["diagnostics"]) {
        let mut why = format!("no diagnostic {}; got {codes:?}", want["code"]);
        if !got.iter().any(|d| diagnostic(d, want).map_err(|w| why = w.unwrap_or_else(|| why.clone())).is_ok()) {
            return Err(why);
        }
    }
    if let Some(allowed) = expect.get("errors_only") {
        let unexpected = |d: &&Value| d["severity"] == "error" && !list(allowed).contains(&d["code"]);
        if let Some(d) = got.iter().find(unexpected) {
            return Err(format!("unexpected error {d}"));
        }
    }
    let absent = list(&expect["absent"]).iter().find(|code| got.iter().any(|d| d["code"] == **code));
    absent.map_or(Ok(()), |code| Err(format!("unexpected diagnostic {code}")))
}

/// Whether a diagnostic is the expected one: nothing to say of one with another code, otherwise what differs.
fn diagnostic(got: &Value, want: &Value) -> Result<(), Option<String>> {
    let code = &got["code"];
    if *code != want["code"] && !list(&want["code"]).contains(code) {
        return Err(None);
    }
    let severity = &got["severity"];
    if want.get("severity").is_some_and(|s| s != severity) {
        return Err(Some(format!("{code}: severity {severity}, expected {}", want["severity"])));
    }
    let labels = list(&got["labels"]);
    let lines: Vec<i64> = labels.iter().filter_map(|l| l["line"].as_i64()).collect();
    let line = |key: &str| want.get(key).and_then(Value::as_i64);
    if line("line").is_some_and(|line| !lines.contains(&line)) {
        return Err(Some(format!("{code}: labels on lines {lines:?}, expected {}", want["line"])));
    }
    if let (Some(from), Some(to)) = (line("line_from"), line("line_to"))
        && !lines.iter().any(|line| (from..=to).contains(line))
    {
        return Err(Some(format!("{code}: labels on lines {lines:?}, expected {from} to {to}")));
    }
    let told = [&got["message"], &got["help"]].into_iter().chain(labels.iter().map(|l| &l["text"]));
    let text = told.filter_map(Value::as_str).collect::<Vec<_>>().join(" ");
    let missing = list(&want["mentions"]).iter().filter_map(Value::as_str).find(|m| !text.contains(m));
    missing.map_or(Ok(()), |m| Err(Some(format!("{code}: does not mention {m}: {text}"))))
}
