//! What `assess` gives, as plain data: stability, modes, margins, figures of responses, requirements.
//!
//! Where a figure is null, `absent` beside it has the reason under the same key. Frequencies are in rad/s, times in s.

use super::ToldDiagnostic;
use crate::source::Span;
use schemars::JsonSchema;
use serde::Serialize;
use std::collections::BTreeMap;

/// Reasons of figures that are null, by their keys.
pub type Absent = BTreeMap<&'static str, String>;

/// What `assess` gives.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct Assess {
    /// `loopwright.assess.1`
    pub schema: &'static str,
    /// The model's name.
    pub model: String,
    /// Whether no diagnostic is an error.
    pub ok: bool,
    /// All diagnostics.
    pub diagnostics: Vec<ToldDiagnostic>,
    /// Nominal, and each case that an `in` names.
    pub cases: Vec<CaseFigures>,
}

/// All figures of one case.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct CaseFigures {
    /// The case.
    pub name: String,
    /// `s` or `z`.
    pub variable: &'static str,
    /// Counts of roots of the characteristic polynomial of the whole netlist.
    pub stability: StabilityFigures,
    /// Every mode of the whole netlist, both of a conjugate pair, the rightmost (in z: the outermost) last.
    pub modes: Vec<Mode>,
    /// Why there are no modes, or not all.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub absent: Absent,
    /// The loops that a `find` or a `require` names.
    pub loops: Vec<LoopFigures>,
    /// The transfer functions that a `find` or a `require` names.
    pub transfers: Vec<TransferFigures>,
    /// The requirements of this case, in the order of the file.
    pub requirements: Vec<RequirementFigure>,
}

/// Stability of the whole netlist, hidden modes included.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct StabilityFigures {
    /// Whether every mode decays.
    pub stable: bool,
    /// Roots right of the axis, with multiplicity; absent for sampled netlists.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub right_half_plane: Option<Option<usize>>,
    /// Roots on the axis.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub on_axis: Option<Option<usize>>,
    /// Roots outside the unit circle, with multiplicity; absent in continuous time.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub outside_circle: Option<Option<usize>>,
    /// Roots on the circle.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub on_circle: Option<Option<usize>>,
    /// How they were counted, and whether exactly.
    pub method: String,
    /// Where one dead time occurs: the intervals of it, in seconds, in which the whole is stable.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub dead_time_windows: Option<Vec<Window>>,
    /// Reasons for counts that are null.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub absent: Absent,
}

/// An interval.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct Window {
    /// Lower end.
    pub from: f64,
    /// Upper end; null for infinity.
    pub to: Option<f64>,
}

/// A mode.
#[derive(Clone, Debug, PartialEq, Serialize, JsonSchema)]
pub struct Mode {
    /// Real part.
    pub re: f64,
    /// Imaginary part.
    pub im: f64,
    /// How often it counts; exact.
    pub multiplicity: u32,
    /// Its magnitude, in rad/s; in z that of ln(z)/T; null for z = 0, which is over at once.
    pub frequency: Option<f64>,
    /// Minus its real part over its magnitude, in z that of ln(z)/T; null for a mode at 0.
    pub damping_ratio: Option<f64>,
    /// The requests that do not show it.
    pub hidden_from: Vec<String>,
}

/// Margins at one signal.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct LoopFigures {
    /// The signal, or the signals, at which the loop is cut.
    pub at: String,
    /// Signals that are cut besides.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub open: Vec<String>,
    /// Whether the loop is stable when it is closed, its hidden modes included.
    pub stable: bool,
    /// All factors of the loop gain that lose stability.
    pub gain_margins: Option<Vec<GainFigure>>,
    /// All changes of phase that lose stability.
    pub phase_margins: Option<Vec<PhaseFigure>>,
    /// The least extra dead time that loses stability.
    pub delay_margin: Option<DelayFigure>,
    /// The least of abs(1 + L).
    pub modulus_margin: Option<ValueFigure>,
    /// The highest frequency at which abs(L) = 1.
    pub crossover: Option<f64>,
    /// Reasons for figures that are null.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub absent: Absent,
    /// What else is to be known, such as that there are more margins than are listed.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub notes: Vec<String>,
}

/// A gain margin.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct GainFigure {
    /// The factor.
    pub factor: f64,
    /// Null where the limit is only approached as ω → ∞.
    pub frequency: Option<f64>,
}

/// A phase margin.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct PhaseFigure {
    /// From -180 to 180.
    pub degrees: f64,
    /// Where abs(L) = 1.
    pub frequency: f64,
}

/// A delay margin.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct DelayFigure {
    /// Extra dead time.
    pub seconds: f64,
    /// Where stability is lost; null for ω → ∞.
    pub frequency: Option<f64>,
}

/// A magnitude with its frequency.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, JsonSchema)]
pub struct ValueFigure {
    /// The magnitude.
    pub value: f64,
    /// Null where it is only approached as ω → ∞.
    pub frequency: Option<f64>,
}

/// Figures of one transfer function.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct TransferFigures {
    /// The signal that answers.
    pub to: String,
    /// Where the test signal is added.
    pub from: String,
    /// Signals that are cut.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub open: Vec<String>,
    /// Whether all poles of this transfer function decay.
    pub stable: bool,
    /// Value at ω = 0.
    pub dc_gain: Option<f64>,
    /// The largest magnitude over all frequencies.
    pub peak: Option<ValueFigure>,
    /// The first frequency at which the magnitude is 1/√2 of that at 0.
    pub bandwidth: Option<f64>,
    /// The root of the integral of the squared impulse response.
    pub two_norm: Option<f64>,
    /// Of the unit step response.
    pub step: Option<StepFigures>,
    /// Reasons for figures that are null.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub absent: Absent,
}

/// Figures of a unit step response.
#[derive(Clone, Debug, PartialEq, Serialize, JsonSchema)]
pub struct StepFigures {
    /// Final value.
    pub final_value: Option<f64>,
    /// In per cent of the final value.
    pub overshoot: Option<f64>,
    /// When the largest value is reached; null where the final value is not passed.
    pub peak_time: Option<f64>,
    /// From 10 to 90 per cent of the final value.
    pub rise_time: Option<f64>,
    /// Last entry into ±2 per cent of the final value.
    pub settling_time: Option<f64>,
    /// Reasons for figures that are null.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    pub absent: Absent,
}

/// One requirement.
#[derive(Clone, Debug, Serialize, JsonSchema)]
pub struct RequirementFigure {
    /// The text after `require`.
    pub text: String,
    /// The file.
    pub file: String,
    /// The line, from 1.
    pub line: usize,
    /// Whether it holds.
    pub holds: bool,
    /// The figure, in `unit`; null where it does not exist, or is a yes or no.
    pub value: Option<f64>,
    /// The unit of `value` and `required`.
    pub unit: Option<String>,
    /// What was required; null for a yes or no.
    pub required: Option<f64>,
    /// By how much the figure is on the good side of what was required, in `unit`; negative where it fails.
    pub slack: Option<f64>,
    /// Where the figure is taken, in rad/s.
    pub frequency: Option<f64>,
    /// Why it fails, where it is not by a number; or what is special.
    pub why: Option<String>,
    /// Where it stands; file and line are made of it when the document is.
    #[serde(skip)]
    #[schemars(skip)]
    pub span: Span,
}
