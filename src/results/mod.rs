//! Results as plain data: made once, rendered many times. The JSON documents are these types, key by key.

pub mod assess;
pub mod mason;
mod terms;

pub(crate) use terms::Monomials;
pub use terms::Terms;

use crate::algebra::Poly;
use crate::diagnostics::{Code, Severity};
use schemars::JsonSchema;
use serde::Serialize;
use std::sync::Arc;

/// A diagnostic as JSON tells it.
#[derive(Clone, Debug, PartialEq, Serialize, JsonSchema)]
pub struct ToldDiagnostic {
    /// The code's word.
    pub code: Code,
    /// How much it weighs.
    pub severity: Severity,
    /// What is wrong.
    pub message: String,
    /// How to mend it.
    pub help: Option<String>,
    /// The places, the primary one first.
    pub labels: Vec<ToldLabel>,
}

/// A labelled place as JSON tells it; lines and columns count from 1, columns and lengths in Unicode scalar values.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct ToldLabel {
    /// The file as the user named it.
    pub file: String,
    /// Line, from 1.
    pub line: usize,
    /// Column, from 1.
    pub column: usize,
    /// Length.
    pub length: usize,
    /// What to say there.
    pub text: String,
}

/// What `check` gives.
#[derive(Clone, Debug, PartialEq, Serialize, JsonSchema)]
pub struct Check {
    /// `loopwright.check.1`
    pub schema: &'static str,
    /// Whether no diagnostic is an error.
    pub ok: bool,
    /// All diagnostics.
    pub diagnostics: Vec<ToldDiagnostic>,
}

/// What `derive` gives.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct Derive {
    /// `loopwright.derive.1`
    pub schema: &'static str,
    /// The model's name.
    pub model: String,
    /// Whether no diagnostic is an error.
    pub ok: bool,
    /// All diagnostics.
    pub diagnostics: Vec<ToldDiagnostic>,
    /// The results, in the order of the requests.
    pub transfers: Vec<Transfer>,
    /// With `--characteristic`: the characteristic polynomial of the whole netlist, for each case that was asked for.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub characteristic: Vec<Characteristic>,
}

/// The characteristic polynomial of a whole netlist, no signal cut.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct Characteristic {
    /// The case.
    pub case: String,
    /// The params that stay symbols.
    pub kept: Vec<String>,
    /// `s` or `z`.
    pub variable: &'static str,
    /// Whether it is exact.
    pub exact: bool,
    /// Its terms, ordered as those of a denominator; null where a value was rounded.
    pub polynomial: Option<Terms>,
    /// Its monic factors, each as often as its multiplicity.
    pub factors: Vec<String>,
    /// Each factor that some transfer function of this document does not show, with the requests that it is hidden from.
    pub hidden: Vec<HiddenFactor>,
    /// The same in polynomials, for rendering: the denominator is the characteristic polynomial.
    #[serde(skip)]
    #[schemars(skip)]
    pub form: Option<Form>,
}

/// A factor of the characteristic polynomial that some requests do not show.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct HiddenFactor {
    /// The factor, monic: `s + 2`.
    pub factor: String,
    /// The requests whose denominators lack it: `y/r`.
    pub from: Vec<String>,
}

/// What `--verify` found of one result.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct Verified {
    /// Whether the signal equations hold with this result at every point tried.
    pub holds: bool,
    /// How many points were tried, each modulo a prime of its own.
    pub points: u32,
    /// A wrong result would pass with a probability of at most 2^-this.
    pub bits: u32,
}

/// Which kind of request a [`Transfer`] answers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum TransferKind {
    /// `y / x`
    Transfer,
    /// `loop at u`
    Loop,
    /// `zeros …`
    Zeros,
}

/// One term coefficient · s^power · exp(-delay·s).
#[derive(Clone, Debug, PartialEq, Eq, Serialize, JsonSchema)]
pub struct ExactTerm {
    /// Power of s or z.
    pub power: u32,
    /// Dead time in seconds, exact.
    pub delay: String,
    /// Its coefficient, exact.
    pub coefficient: String,
}

/// A pole or a zero.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct Root {
    /// Real part.
    pub re: f64,
    /// Imaginary part.
    pub im: f64,
    /// How often it counts.
    pub multiplicity: u32,
}

/// Coefficients in decimals, from the highest power down.
#[derive(Clone, Debug, PartialEq, Serialize, JsonSchema)]
pub struct Decimal {
    /// Of the numerator.
    pub numerator: Vec<f64>,
    /// Of the denominator.
    pub denominator: Vec<f64>,
}

/// One exact result.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct Transfer {
    /// Which kind of request it answers.
    pub kind: TransferKind,
    /// The signal that answers, as written.
    pub to: String,
    /// Where the test signal is added, as written; `loop at u` for a return ratio.
    pub from: String,
    /// The signals at which the loop is cut for a return ratio.
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
    /// Whether numerator and denominator are exact.
    pub exact: bool,
    /// Terms of the numerator, by delay up, then power down.
    pub numerator: Option<Terms>,
    /// Terms of the denominator.
    pub denominator: Option<Terms>,
    /// Coefficients in decimals where there is no delay and no kept symbol.
    pub decimal: Option<Decimal>,
    /// Factors that were cancelled, monic, each as often as its multiplicity.
    pub cancelled: Vec<String>,
    /// Roots of the denominator.
    pub poles: Option<Vec<Root>>,
    /// Roots of the numerator.
    pub zeros: Option<Vec<Root>>,
    /// Value at s = 0 or z = 1.
    pub dc_gain: Option<f64>,
    /// The largest real part of a pole, or null; absent for sampled results.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub converges_right_of: Option<Option<f64>>,
    /// The largest modulus of a pole, or null; absent in continuous time.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub converges_outside: Option<Option<f64>>,
    /// Whether every pole lies strictly left of the axis or inside the circle.
    pub stable: Option<bool>,
    /// With `--verify`: whether the result put back into the signal equations satisfies them.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub verified: Option<Verified>,
    /// The same in polynomials, for rendering.
    #[serde(skip)]
    #[schemars(skip)]
    pub form: Option<Form>,
}

/// The exact polynomials behind a [`Transfer`], with what their variables are called.
#[derive(Clone, Debug)]
pub struct Form {
    /// Numerator.
    pub numerator: Arc<Poly>,
    /// Denominator.
    pub denominator: Arc<Poly>,
    /// Variables with their names: params, π, dead times (`exp(-0.1*s)`).
    pub names: Vec<(crate::algebra::Var, String)>,
}
