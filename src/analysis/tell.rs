//! Figures as results: every null with its reason.

use super::looked_at::{Loop, Time, Transfer};
use super::margins::MAX_LISTED;
use super::modes::ModeFigure;
use super::stability::Stability;
use crate::results::assess::{
    Absent, DelayFigure, GainFigure, LoopFigures, Mode, PhaseFigure, StabilityFigures, StepFigures, TransferFigures,
    ValueFigure, Window,
};

pub(super) fn stability(s: &Stability, time: &Time) -> StabilityFigures {
    let sampled = matches!(time, Time::Sampled(_));
    let (continuous, circle) = (|n: Option<usize>| (!sampled).then_some(n), |n: Option<usize>| sampled.then_some(n));
    let mut absent = Absent::new();
    if let Some(why) = &s.why {
        let keys = if sampled { ["outside_circle", "on_circle"] } else { ["right_half_plane", "on_axis"] };
        for (key, count) in keys.into_iter().zip([s.outside, s.on]) {
            if count.is_none() {
                absent.insert(key, why.clone());
            }
        }
    }
    let window = |&(from, to): &(f64, Option<f64>)| Window { from, to };
    StabilityFigures {
        stable: s.stable,
        right_half_plane: continuous(s.outside),
        on_axis: continuous(s.on),
        outside_circle: circle(s.outside),
        on_circle: circle(s.on),
        method: s.method.clone(),
        dead_time_windows: s.windows.as_ref().map(|w| w.iter().map(window).collect()),
        absent,
    }
}

pub(super) fn mode(m: &ModeFigure) -> Mode {
    Mode {
        re: m.re,
        im: m.im,
        multiplicity: m.multiplicity,
        frequency: m.frequency,
        damping_ratio: m.damping_ratio,
        hidden_from: m.hidden_from.clone(),
    }
}

pub(super) fn one_loop(l: &Loop) -> LoopFigures {
    let mut out = LoopFigures {
        at: l.text.clone(),
        open: l.open_texts.clone(),
        stable: l.stability.stable,
        gain_margins: None,
        phase_margins: None,
        delay_margin: None,
        modulus_margin: None,
        crossover: None,
        absent: Absent::new(),
        notes: Vec::new(),
    };
    match l.margins() {
        Err(why) => {
            for key in ["gain_margins", "phase_margins", "delay_margin", "modulus_margin"] {
                out.absent.insert(key, why.clone());
            }
        }
        Ok(m) => {
            out.gain_margins =
                Some(m.gain.iter().map(|g| GainFigure { factor: g.factor, frequency: g.frequency }).collect());
            out.phase_margins =
                Some(m.phase.iter().map(|p| PhaseFigure { degrees: p.degrees, frequency: p.frequency }).collect());
            out.delay_margin = m.delay.map(|(seconds, frequency)| DelayFigure { seconds, frequency });
            if out.delay_margin.is_none() {
                out.absent
                    .insert("delay_margin", "abs(L) is 1 at no frequency: no dead time loses stability".to_owned());
            }
            out.modulus_margin = Some(ValueFigure { value: m.modulus.value, frequency: m.modulus.frequency });
            if m.more {
                out.notes.push(format!("with dead time there are more gain margins than these first {MAX_LISTED}"));
            }
        }
    }
    let unit = l.response.unit_places().unwrap_or_default();
    out.crossover = unit.iter().filter_map(|p| p.frequency).reduce(f64::max);
    if out.crossover.is_none() {
        out.absent.insert("crossover", "abs(L) is 1 at no frequency".to_owned());
    }
    out
}

/// A figure, or its reason under a key.
fn take<T>(result: Result<T, String>, key: &'static str, absent: &mut Absent) -> Option<T> {
    result.map_err(|why| absent.insert(key, why)).ok()
}

pub(super) fn transfer(t: &Transfer) -> TransferFigures {
    let mut absent = Absent::new();
    let dc_gain = take(t.at_zero(), "dc_gain", &mut absent).map(|v| v.to_f64().value());
    let peak = take(t.largest(), "peak", &mut absent);
    let never = || "its magnitude never falls to 1/√2 of that at zero frequency".to_owned();
    let bandwidth = take(t.bandwidth().and_then(|w| w.ok_or_else(never)), "bandwidth", &mut absent);
    let two_norm = take(t.two_norm(), "two_norm", &mut absent);
    let step = take(step(t), "step", &mut absent);
    TransferFigures {
        to: t.to.1.clone(),
        from: t.from.1.clone(),
        open: t.open_texts.clone(),
        stable: t.stability.stable,
        dc_gain,
        peak: peak.map(|p| ValueFigure { value: p.value, frequency: p.frequency }),
        bandwidth,
        two_norm,
        step,
        absent,
    }
}

/// Figures of the step response where it has a final value; of a response to 0 nothing but that.
fn step(t: &Transfer) -> Result<StepFigures, String> {
    let last = t.last(0)?.to_f64().value();
    let mut absent = Absent::new();
    let mut out = StepFigures {
        final_value: Some(last),
        overshoot: None,
        peak_time: None,
        rise_time: None,
        settling_time: None,
        absent: Absent::new(),
    };
    match t.figures() {
        Ok(f) => {
            out.overshoot = take(f.overshoot.clone(), "overshoot", &mut absent);
            out.rise_time = take(f.rise_time.clone(), "rise_time", &mut absent);
            out.settling_time = take(f.settling_time.clone(), "settling_time", &mut absent);
            out.peak_time = f.peak_time;
            if f.peak_time.is_none() && f.overshoot.is_ok() {
                absent.insert("peak_time", "the final value is not passed".to_owned());
            }
        }
        Err(why) => {
            for key in ["overshoot", "peak_time", "rise_time", "settling_time"] {
                absent.insert(key, why.clone());
            }
        }
    }
    out.absent = absent;
    Ok(out)
}
