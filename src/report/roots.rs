//! Poles and zeros, one to a line: a conjugate pair with its frequency and damping, a real one with its time constant.

use super::derive::MAX_LISTED;
use super::number::{float, rounded_float};
use crate::results::{Root, Transfer};
use unicode_width::UnicodeWidthStr as _;

/// Significant digits of a frequency, a damping ratio or a time constant beside a root: enough to work with, and
/// few enough for one line of 80 columns.
const DIGITS_BESIDE: usize = 4;

/// Which plane the roots lie in.
pub(super) enum Plane {
    /// s
    Laplace,
    /// z, with the sampling period in seconds where it is known.
    Sampled(Option<f64>),
}

impl Plane {
    /// The plane of a result.
    pub(super) fn of(t: &Transfer) -> Self {
        if t.variable == "s" {
            return Self::Laplace;
        }
        let period = t.sampling_period.as_deref().and_then(|p| {
            let (n, d) = p.split_once('/').unwrap_or((p, "1"));
            Some(n.parse::<f64>().ok()? / d.parse::<f64>().ok()?)
        });
        Self::Sampled(period)
    }

    /// A root as a natural frequency in rad/s and a damping ratio: of itself, or of ln(z)/T.
    fn frequency_and_damping(&self, root: Root) -> Option<(f64, f64)> {
        let (re, im) = match self {
            Self::Laplace => (root.re, root.im),
            Self::Sampled(period) => {
                let size = libm::hypot(root.re, root.im);
                let period = (*period)?;
                (libm::log(size) / period, libm::atan2(root.im, root.re) / period)
            }
        };
        let frequency = libm::hypot(re, im);
        (frequency.is_finite() && frequency > 0.0).then(|| (frequency, -re / frequency))
    }
}

/// Lines that tell roots.
pub(super) struct Told {
    /// One for each real root or pair, and one for what is left out.
    pub(super) lines: Vec<String>,
    /// Whether a figure was rounded.
    pub(super) rounded: bool,
}

/// Tells roots in the order in which they stand, both of a pair on one line.
pub(super) fn lines(list: &[Root], plane: &Plane, poles: bool) -> Told {
    let mut rounded = false;
    let mut told = |text: String, x: f64| {
        rounded |= text.parse() != Ok(x);
        text
    };
    // The lower half of each pair is told by the upper one.
    let shown: Vec<Root> = list.iter().copied().filter(|r| r.im >= 0.0).collect();
    let variable = if matches!(plane, Plane::Laplace) { "s" } else { "z" };
    let mut rows: Vec<(String, String)> = Vec::new();
    for r in shown.iter().take(MAX_LISTED) {
        let place = match (r.re == 0.0, r.im == 0.0) {
            (_, true) => told(float(r.re), r.re),
            (true, false) => format!("±j{}", told(float(r.im), r.im)),
            (false, false) => format!("{} ± j{}", told(float(r.re), r.re), told(float(r.im), r.im)),
        };
        let times = match r.multiplicity {
            1 => String::new(),
            2 => " (twice)".to_owned(),
            n => format!(" ({n} times)"),
        };
        let besides = match plane.frequency_and_damping(*r) {
            Some((frequency, damping)) if r.im > 0.0 => {
                let frequency = told(rounded_float(frequency, DIGITS_BESIDE), frequency);
                let damping = told(rounded_float(damping, DIGITS_BESIDE), damping);
                format!("ω_n = {frequency} rad/s, ζ = {damping}")
            }
            Some((frequency, damping)) if poles && damping >= 1.0 => {
                let time = 1.0 / frequency;
                format!("time constant {} s", told(rounded_float(time, DIGITS_BESIDE), time))
            }
            _ => String::new(),
        };
        rows.push((format!("{variable} = {place}{times}"), besides));
    }
    let column = rows.iter().map(|r| r.0.width()).max().unwrap_or(0) + 3;
    let mut lines: Vec<String> = rows
        .into_iter()
        .map(|(place, besides)| {
            format!("{place}{:pad$}{besides}", "", pad = column - place.width()).trim_end().to_owned()
        })
        .collect();
    if shown.len() > MAX_LISTED {
        lines.push(format!("… and {} more; --format json lists all", shown.len() - MAX_LISTED));
    }
    Told { lines, rounded }
}
