//! Results as JSON: the result types, key by key, in their order, with two blanks a level.

use crate::results::assess::Assess;
use crate::results::mason::Mason;
use crate::results::{Check, Derive};
use serde::Serialize;
use std::io::{self, Write};

/// Writes a document and a line end. Floats are in the shortest form that reads back the same.
///
/// # Errors
///
/// What `out` says.
pub fn json(document: &impl Serialize, out: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *out, document).map_err(io::Error::from)?;
    writeln!(out)
}

/// The JSON schema of one kind of document (`assess`, `check`, `derive`, `mason`), made from the result types; `None` for
/// another word.
pub fn schema(document: &str) -> Option<String> {
    let schema = match document {
        "assess" => schemars::schema_for!(Assess),
        "check" => schemars::schema_for!(Check),
        "derive" => schemars::schema_for!(Derive),
        "mason" => schemars::schema_for!(Mason),
        _ => return None,
    };
    serde_json::to_string_pretty(&schema).ok().map(|text| text + "\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    /// `docs/schema/NAME.json` is this function's output: after a change of the result types, run the test with
    /// `LOOPWRIGHT_WRITE_SCHEMA=1` and commit what it wrote.
    #[test]
    fn the_schemas_in_docs_are_those_of_the_result_types() {
        for name in ["assess", "check", "derive", "mason"] {
            let path = format!("{}/docs/schema/{name}.json", env!("CARGO_MANIFEST_DIR"));
            let wanted = schema(name).expect("there is one");
            if std::env::var_os("LOOPWRIGHT_WRITE_SCHEMA").is_some() {
                std::fs::write(&path, &wanted).expect("docs/schema can be written");
            }
            let found = std::fs::read_to_string(&path).unwrap_or_default();
            assert!(found == wanted, "{path} is not up to date");
        }
        assert!(schema("response").is_none());
    }

    #[test]
    fn floats_read_back_the_same_and_the_line_ends() {
        let mut out = Vec::new();
        json(&[0.1, 1.0, 1e300, 2.5e-9], &mut out).expect("a vector takes it");
        assert_eq!(String::from_utf8_lossy(&out), "[\n  0.1,\n  1.0,\n  1e+300,\n  2.5e-9\n]\n");
    }
}
