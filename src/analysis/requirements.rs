//! Requirements: each metric's figure, and its comparison with the bound.
//!
//! Comparisons have no tolerance. Figures that are rational are exact; the others are roots of exact polynomials known to
//! double precision, and where such a root and the bound agree to nine digits, exact arithmetic decides whether they
//! are equal (module `equal`).

use super::equal;
use super::looked_at::{Loop, Transfer};
use super::modes::ModeFigure;
use super::response::Extreme;
use crate::algebra::{Fraction, IBig, Poly, RBig};
use crate::flow::forms::CaseLaws;
use crate::netlist::values::PI;
use crate::netlist::{Comparison, DisplayUnit, Metric, Stimulus};

/// Figures that agree with a bound to this part of it are compared by exact arithmetic.
const CLOSE: f64 = 1e-9;

/// A figure in the metric's own unit.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Value {
    /// Exact.
    Exact(RBig),
    /// To double precision.
    Near(f64),
    /// Larger than any number, for the reason told.
    Infinite(&'static str),
}

/// A figure with its place.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Found {
    /// The figure.
    pub(crate) value: Value,
    /// In rad/s.
    pub(crate) frequency: Option<f64>,
}

/// What a requirement asks of, with the figures that it needs.
pub(crate) enum Subject<'f> {
    /// All modes.
    Modes(&'f [ModeFigure], &'f [IBig], &'f Result<(), String>),
    /// A loop.
    Loop(&'f Loop),
    /// A transfer function.
    Transfer(&'f Transfer),
}

/// What comes of a requirement.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Verdict {
    /// Whether it holds.
    pub(crate) holds: bool,
    /// In `unit`.
    pub(crate) value: Option<f64>,
    /// The unit written, else the metric's own.
    pub(crate) unit: Option<String>,
    /// The bound in `unit`.
    pub(crate) required: Option<f64>,
    /// By how much it is on the good side.
    pub(crate) slack: Option<f64>,
    /// In rad/s.
    pub(crate) frequency: Option<f64>,
    /// Why, where no number says it.
    pub(crate) why: Option<String>,
}

/// A bound with what it was written in.
pub(crate) struct Bound<'n> {
    /// The comparison.
    pub(crate) comparison: Comparison,
    /// In coherent SI, or in dB.
    pub(crate) value: Fraction,
    /// The unit written.
    pub(crate) unit: Option<&'n DisplayUnit>,
    /// What the unit is in coherent SI.
    pub(crate) scale: Fraction,
}

/// The metric's own unit, and what it is in coherent SI; no unit for figures in the units of their signals.
fn own_unit(metric: &Metric) -> (Option<&'static str>, Fraction) {
    let one = Fraction::one();
    match metric {
        Metric::GainMargin(_) | Metric::ModulusMargin(_) | Metric::DampingRatio => (Some("1"), one),
        Metric::PhaseMargin(_) => {
            let degree = Fraction::new(Poly::var(PI), Poly::constant(IBig::from(180)));
            (Some("deg"), degree.unwrap_or(one))
        }
        Metric::DelayMargin(_) | Metric::RiseTime(_) | Metric::SettlingTime(..) => (Some("s"), one),
        Metric::Crossover(_) | Metric::Bandwidth(_) => (Some("rad/s"), one),
        Metric::DecayRate => (Some("1/s"), one),
        Metric::Overshoot(_) => (Some("%"), Fraction::number(&RBig::from_parts(IBig::ONE, 100u8.into()))),
        Metric::Peak(_) | Metric::Magnitude(..) | Metric::FinalValue(..) => (None, one),
    }
}

/// Judges one requirement.
pub(crate) fn judge(metric: &Metric, subject: &Subject<'_>, laws: &CaseLaws<'_>, bound: &Bound<'_>) -> Verdict {
    let (own, own_scale) = own_unit(metric);
    let decibel = bound.unit.is_some_and(|u| u.text == "dB");
    let unit = bound.unit.map(|u| u.text.clone()).or_else(|| own.map(str::to_owned));
    let scale = if bound.unit.is_some() { bound.scale.clone() } else { own_scale.clone() };
    let over = |a: &Fraction, b: &Fraction| a.div(b).and_then(|f| CaseLaws::number(&f));
    // The bound in the metric's own unit, in which figures are compared, and in the unit that is told.
    let in_own = if decibel { over(&bound.value, &Fraction::one()) } else { over(&bound.value, &own_scale) };
    let in_told = if decibel { in_own.clone() } else { over(&bound.value, &scale) };
    let required = in_told.as_ref().map(|b| b.to_f64().value());
    let mut verdict = Verdict { holds: false, value: None, unit, required, slack: None, frequency: None, why: None };
    let Some(required_own) = in_own else {
        verdict.why = Some("its bound is no number".to_owned());
        return verdict;
    };
    let found = match figure(metric, subject, laws, bound.comparison) {
        Ok(found) => found,
        Err(why) => {
            verdict.why = Some(why);
            return verdict;
        }
    };
    verdict.frequency = found.frequency;
    let upward = matches!(bound.comparison, Comparison::AtLeast | Comparison::Above);
    let value = match &found.value {
        Value::Infinite(why) => {
            verdict.why = Some((*why).to_owned());
            verdict.holds = upward;
            return verdict;
        }
        Value::Exact(v) => v.to_f64().value(),
        Value::Near(v) => *v,
    };
    let factor = over(&own_scale, &scale).map_or(1.0, |f| f.to_f64().value());
    let mut told = if decibel { 20.0 * libm::log10(value) } else { value * factor };
    let order = if decibel {
        told.partial_cmp(&required.unwrap_or(f64::NAN))
    } else {
        match &found.value {
            Value::Exact(v) => Some(v.cmp(&required_own)),
            _ => near(value, &required_own, || equal::is(metric, subject, &required_own, found.frequency)),
        }
    };
    if order == Some(std::cmp::Ordering::Equal) {
        told = required.unwrap_or(told);
    }
    verdict.holds = order.is_some_and(|o| match bound.comparison {
        Comparison::AtLeast => o.is_ge(),
        Comparison::AtMost => o.is_le(),
        Comparison::Above => o.is_gt(),
        Comparison::Below => o.is_lt(),
    });
    verdict.value = Some(told).filter(|v| v.is_finite());
    verdict.slack = required.map(|r| if upward { told - r } else { r - told }).filter(|v| v.is_finite());
    verdict
}

/// A double against an exact bound; what agrees to nine digits is told equal where exact arithmetic says so.
fn near(value: f64, bound: &RBig, equal: impl FnOnce() -> bool) -> Option<std::cmp::Ordering> {
    let b = bound.to_f64().value();
    if (value - b).abs() <= CLOSE * value.abs().max(b.abs()) && equal() {
        return Some(std::cmp::Ordering::Equal);
    }
    let exact = RBig::try_from(value).ok()?;
    Some(exact.cmp(bound))
}

/// The figure of a metric.
fn figure(
    metric: &Metric,
    subject: &Subject<'_>,
    laws: &CaseLaws<'_>,
    comparison: Comparison,
) -> Result<Found, String> {
    match subject {
        Subject::Modes(modes, _, complete) => {
            (*complete).clone()?;
            of_modes(metric, modes)
        }
        Subject::Loop(l) => of_loop(metric, l),
        Subject::Transfer(t) => of_transfer(metric, t, laws, comparison),
    }
}

fn of_modes(metric: &Metric, modes: &[ModeFigure]) -> Result<Found, String> {
    let figure = |m: &ModeFigure| if matches!(metric, Metric::DampingRatio) { m.damping_ratio } else { m.decay_rate };
    let least = modes.iter().filter_map(|m| figure(m).map(|v| (v, m.frequency))).min_by(|a, b| a.0.total_cmp(&b.0));
    let on_origin = modes.iter().any(|m| m.damping_ratio.is_none() && m.frequency == Some(0.0));
    if matches!(metric, Metric::DampingRatio) && on_origin {
        return Err("a mode at 0 has no damping ratio".to_owned());
    }
    match least {
        Some((value, frequency)) => Ok(Found { value: Value::Near(value), frequency }),
        None => Err("there are no modes".to_owned()),
    }
}

fn of_extreme(e: Extreme) -> Found {
    Found { value: Value::Near(e.value), frequency: e.frequency }
}

fn of_loop(metric: &Metric, l: &Loop) -> Result<Found, String> {
    if let Metric::Crossover(_) = metric {
        let unit = l.response.unit_places().map_err(|_| "the search for it was given up".to_owned())?;
        let highest = unit.iter().filter_map(|p| p.frequency).reduce(f64::max);
        let w = highest.ok_or("abs(L) is 1 at no frequency")?;
        return Ok(Found { value: Value::Near(w), frequency: Some(w) });
    }
    let margins = l.margins()?;
    let infinite = |why| Ok(Found { value: Value::Infinite(why), frequency: None });
    match metric {
        Metric::GainMargin(_) => match margins.smallest_gain() {
            Some(m) => Ok(Found { value: Value::Near(m.factor), frequency: m.frequency }),
            None => infinite("no factor of the loop gain loses stability"),
        },
        Metric::PhaseMargin(_) => match margins.smallest_phase() {
            Some(m) => Ok(Found { value: Value::Near(m.degrees), frequency: Some(m.frequency) }),
            None => infinite("abs(L) is 1 at no frequency: no change of phase loses stability"),
        },
        Metric::DelayMargin(_) => match margins.delay {
            Some((seconds, frequency)) => Ok(Found { value: Value::Near(seconds), frequency }),
            None => infinite("abs(L) is 1 at no frequency: no dead time loses stability"),
        },
        _ => Ok(of_extreme(margins.modulus)),
    }
}

fn of_transfer(metric: &Metric, t: &Transfer, laws: &CaseLaws<'_>, comparison: Comparison) -> Result<Found, String> {
    let timed = |value: Result<f64, String>| Ok(Found { value: Value::Near(value?), frequency: None });
    match metric {
        Metric::Peak(_) => {
            let peak = t.largest()?;
            if peak.frequency == Some(0.0) {
                let value = t.at_zero()?;
                let value = if value < RBig::ZERO { -value } else { value };
                return Ok(Found { value: Value::Exact(value), frequency: peak.frequency });
            }
            Ok(of_extreme(peak))
        }
        Metric::Bandwidth(_) => Ok(match t.bandwidth()? {
            Some(w) => Found { value: Value::Near(w), frequency: Some(w) },
            None => Found {
                value: Value::Infinite("the magnitude never falls to 1/√2 of that at zero frequency"),
                frequency: None,
            },
        }),
        Metric::Magnitude(_, from, to) => {
            let end = |e| laws.evaluate(e).ok().and_then(|f| CaseLaws::number(&f)).map(|n: RBig| n.to_f64().value());
            let (from, to) = end(*from).zip(end(*to)).ok_or("its band has no numbers")?;
            if !(0.0 <= from && from <= to) {
                return Err("its band is empty, or begins below 0".to_owned());
            }
            let largest = matches!(comparison, Comparison::AtMost | Comparison::Below);
            Ok(of_extreme(t.over(from, to, largest)?))
        }
        Metric::Overshoot(_) => timed(t.figures()?.overshoot.clone()),
        Metric::RiseTime(_) => timed(t.figures()?.rise_time.clone()),
        Metric::SettlingTime(_, band) => {
            let band = match band {
                Some(e) => laws.evaluate(*e).ok().and_then(|f| CaseLaws::number(&f)).ok_or("its band has no number")?,
                None => RBig::from_parts(IBig::ONE, 50u8.into()),
            };
            timed(t.settling(band.to_f64().value()))
        }
        Metric::FinalValue(_, stimulus) => {
            let order = match stimulus {
                Stimulus::Step => 0,
                Stimulus::Ramp => 1,
                Stimulus::Parabola => 2,
            };
            Ok(Found { value: Value::Exact(t.last(order)?), frequency: None })
        }
        _ => Err("this figure is not one of a transfer function".to_owned()),
    }
}
