//! Mason's gain rule worked out for one request, as plain data.
//!
//! Everything is told twice: by names, so that a reviewer can follow on the diagram (`C*G`, `1 - L1 - L2 + L1*L2`), and
//! as an exact expression beside it (`10/(s + 2)`). Numbers in names count from 1, in the order of the lists.

use super::{Form, Terms, ToldDiagnostic};
use schemars::JsonSchema;
use serde::Serialize;

/// What `mason` gives.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct Mason {
    /// `loopwright.mason.1`
    pub schema: &'static str,
    /// The model's name.
    pub model: String,
    /// Whether no diagnostic is an error.
    pub ok: bool,
    /// All diagnostics.
    pub diagnostics: Vec<ToldDiagnostic>,
    /// The signal that answers, as written.
    pub to: String,
    /// Where the test signal is added, as written; `loop at u` for a return ratio, which is the gain times -1.
    pub from: String,
    /// The signal at which the loop is cut for a return ratio.
    pub at: Vec<String>,
    /// The signals that are cut besides.
    pub open: Vec<String>,
    /// The params that stay symbols.
    pub kept: Vec<String>,
    /// The case.
    pub case: String,
    /// `s` or `z`.
    pub variable: &'static str,
    /// In seconds, exact; null for continuous time.
    pub sampling_period: Option<String>,
    /// Whether all gains are exact; with a rounded value somewhere they are decimals.
    pub exact: bool,
    /// The forward paths: `P1`, `P2`, …
    pub paths: Vec<MasonPath>,
    /// The loops: `L1`, `L2`, …
    pub loops: Vec<MasonLoop>,
    /// The groups of two and more loops of which no two share a signal, the smaller groups first.
    pub groups: Vec<MasonGroup>,
    /// `D = 1 - Σ loops + Σ pairs - …`
    pub determinant: MasonGain,
    /// Of each path, the determinant without the loops that touch it: `D1`, `D2`, …
    pub cofactors: Vec<MasonGain>,
    /// `(P1*D1 + P2*D2)/D`, in lowest terms.
    pub gain: MasonResult,
}

/// A gain by names and as an exact expression.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct MasonGain {
    /// What it is called: `D`, `D1`.
    pub name: String,
    /// By names: `1 - L1 - L2 + L1*L2`.
    pub names: String,
    /// What that is.
    pub expression: String,
}

/// One branch of a path or a loop: from one signal to the next.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct MasonBranch {
    /// The block (`C`), its entry (`G[y1,u2]`), a sum's factor, or empty for a plain term of a sum.
    pub name: String,
    /// The signal where it begins.
    pub from: String,
    /// The signal where it ends.
    pub to: String,
    /// Its gain.
    pub expression: String,
}

/// A forward path.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct MasonPath {
    /// `P1`, `P2`, …
    pub name: String,
    /// The signals in the order in which the test signal travels.
    pub signals: Vec<String>,
    /// The branches between them.
    pub branches: Vec<MasonBranch>,
    /// Its gain by names of blocks: `C*G`.
    pub names: String,
    /// Its gain.
    pub expression: String,
    /// The loops that share a signal with it.
    pub touches: Vec<String>,
}

/// A loop.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct MasonLoop {
    /// `L1`, `L2`, …
    pub name: String,
    /// The signals in the order in which a signal travels, the first one once.
    pub signals: Vec<String>,
    /// The branches; the last one leads back to the first signal.
    pub branches: Vec<MasonBranch>,
    /// Its gain by names of blocks: `-C*G*H`.
    pub names: String,
    /// Its gain.
    pub expression: String,
}

/// A group of loops of which no two share a signal.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct MasonGroup {
    /// The loops.
    pub loops: Vec<String>,
    /// The product of their gains.
    pub expression: String,
}

/// The whole gain.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct MasonResult {
    /// By names: `(P1*D1 + P2*D2)/D`.
    pub names: String,
    /// As one expression.
    pub expression: String,
    /// Terms of the numerator as in `derive`; null where a value was rounded.
    pub numerator: Option<Terms>,
    /// Terms of the denominator.
    pub denominator: Option<Terms>,
    /// The same in polynomials, for rendering.
    #[serde(skip)]
    #[schemars(skip)]
    pub form: Option<Form>,
}
