//! What is known of one loop and of one transfer function: their exact forms, their stability and, worked out when first
//! asked for, their figures.

use super::margins::Margins;
use super::quasi::{Quasi, Ratio};
use super::response::{Extreme, Response};
use super::stability::{self, Stability};
use super::step::{StepResponse, StepResult};
use super::{norm, sampled};
use crate::algebra::{IBig, RBig, Var, functions};
use crate::flow::forms::{CaseLaws, Form};
use crate::netlist::SignalId;
use crate::netlist::values::PI;
use std::cell::OnceCell;

/// What a search says that would take too long.
const GIVEN_UP: &str = "the search for it was given up: dead times make the response turn too often";

/// What is told of a figure that needs a stable transfer function.
const NOT_STABLE: &str = "the transfer function is not stable";

/// How a netlist runs.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Time {
    /// In s.
    Continuous,
    /// In z, with the period in seconds.
    Sampled(RBig),
}

/// A characteristic polynomial as a sum over dead times.
pub(crate) fn quasi(p: &crate::algebra::Poly, laws: &CaseLaws<'_>) -> Option<Quasi> {
    Quasi::from_poly(&p.substitute(PI, &functions::pi()).0, &|v: Var| laws.delay(v))
}

fn ratio(form: &Form, laws: &CaseLaws<'_>) -> Option<Ratio> {
    let (n, a) = form.fraction.numerator().substitute(PI, &functions::pi());
    let (d, b) = form.fraction.denominator().substitute(PI, &functions::pi());
    Ratio::from_polys((&n, &a), (&d, &b), &|v: Var| laws.delay(v))
}

/// The roots of a characteristic function by the side that matters.
pub(crate) fn count(q: &Quasi, time: &Time) -> Stability {
    match time {
        Time::Continuous => stability::of_axis(q),
        Time::Sampled(_) => q.as_polynomial().map_or_else(|| stability::of_circle(&[]), stability::of_circle),
    }
}

fn response(ratio: &Ratio, time: &Time) -> Option<Response> {
    match time {
        Time::Continuous => Some(Response::continuous(ratio.clone())),
        Time::Sampled(period) => Response::sampled(ratio, period.to_f64().value()),
    }
}

/// One loop, cut at a signal.
pub(crate) struct Loop {
    /// The signal.
    pub(crate) at: SignalId,
    /// What is cut besides.
    pub(crate) open: Vec<SignalId>,
    /// As it was first asked for.
    pub(crate) text: String,
    /// Texts of what is cut besides.
    pub(crate) open_texts: Vec<String>,
    /// L on the imaginary axis.
    pub(crate) response: Response,
    /// Of the closed loop.
    pub(crate) stability: Stability,
    /// N + D of L = N/D, in s or z: what 1/(1 + L) shows.
    pub(crate) shown: Quasi,
    margins: OnceCell<Result<Margins, String>>,
}

impl Loop {
    /// From the exact form; `None` where it has symbols in it.
    pub(crate) fn new(
        (at, text): (SignalId, String),
        (open, open_texts): (Vec<SignalId>, Vec<String>),
        form: &Form,
        laws: &CaseLaws<'_>,
        time: &Time,
    ) -> Option<Self> {
        let ratio = ratio(form, laws)?;
        let stability = count(&quasi(&form.characteristic, laws)?, time);
        let shown = ratio.num.add(&ratio.den);
        let response = response(&ratio, time)?;
        Some(Self { at, open, text, open_texts, response, stability, shown, margins: OnceCell::new() })
    }

    /// Its margins.
    ///
    /// # Errors
    ///
    /// Why there are none.
    pub(crate) fn margins(&self) -> Result<&Margins, String> {
        let made = self.margins.get_or_init(|| {
            if !self.stability.stable {
                return Err("the loop is not stable".to_owned());
            }
            Margins::of(&self.response).map_err(|_| GIVEN_UP.to_owned())
        });
        made.as_ref().map_err(Clone::clone)
    }
}

/// One transfer function.
pub(crate) struct Transfer {
    /// What answers.
    pub(crate) to: (SignalId, String),
    /// Where the test signal is added.
    pub(crate) from: (SignalId, String),
    /// What is cut.
    pub(crate) open: Vec<SignalId>,
    /// Texts of what is cut.
    pub(crate) open_texts: Vec<String>,
    /// N/D in s or z.
    pub(crate) ratio: Ratio,
    /// On the imaginary axis.
    pub(crate) response: Response,
    /// Of its own poles.
    pub(crate) stability: Stability,
    time: Time,
    largest: OnceCell<Result<Extreme, String>>,
    step: OnceCell<Result<StepResponse, String>>,
    figures: OnceCell<Result<StepResult, String>>,
}

impl Transfer {
    /// From the exact form; `None` where it has symbols in it.
    pub(crate) fn new(
        to: (SignalId, String),
        from: (SignalId, String),
        (open, open_texts): (Vec<SignalId>, Vec<String>),
        form: &Form,
        laws: &CaseLaws<'_>,
        time: &Time,
    ) -> Option<Self> {
        let ratio = ratio(form, laws)?;
        let stability = count(&ratio.den, time);
        Some(Self {
            to,
            from,
            open,
            open_texts,
            response: response(&ratio, time)?,
            stability,
            ratio,
            time: time.clone(),
            largest: OnceCell::new(),
            step: OnceCell::new(),
            figures: OnceCell::new(),
        })
    }

    fn is_stable(&self) -> Result<(), String> {
        if self.stability.stable { Ok(()) } else { Err(NOT_STABLE.to_owned()) }
    }

    /// The value at ω = 0; exact.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn at_zero(&self) -> Result<RBig, String> {
        self.response.ratio.at_zero().ok_or_else(|| "it has a pole at frequency zero".to_owned())
    }

    /// The largest magnitude.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn largest(&self) -> Result<Extreme, String> {
        let made = self.largest.get_or_init(|| {
            self.is_stable()?;
            let found = self.response.largest().map_err(|_| GIVEN_UP.to_owned())?;
            if found.value.is_finite() { Ok(found) } else { Err("it grows without bound as ω → ∞".to_owned()) }
        });
        made.clone()
    }

    /// The bandwidth; `None` where the magnitude never falls so far.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn bandwidth(&self) -> Result<Option<f64>, String> {
        self.is_stable()?;
        let gain = self.at_zero()?;
        if gain == RBig::ZERO {
            return Err("no gain at zero frequency".to_owned());
        }
        self.response.bandwidth(&gain).map_err(|_| GIVEN_UP.to_owned())
    }

    /// The least or the largest magnitude over a band in rad/s.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn over(&self, from: f64, to: f64, largest: bool) -> Result<Extreme, String> {
        self.is_stable()?;
        self.response.over(from, to, largest).map_err(|_| GIVEN_UP.to_owned())
    }

    /// The final value of the response to t^n/n!, exact.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn last(&self, n: usize) -> Result<RBig, String> {
        self.is_stable()?;
        let ratio = &self.response.ratio;
        let Some((low, above)) = ratio.num.lowest() else { return Ok(RBig::ZERO) };
        let (zeros, below) = ratio.den.lowest().ok_or("its denominator is 0")?;
        // Stable: no pole at 0, so that the order at 0 is that of the numerator.
        let order = low.saturating_sub(zeros);
        if order > n {
            return Ok(RBig::ZERO);
        }
        if order < n {
            return Err("its final value is infinite".to_owned());
        }
        let mut value = above / below;
        if let Time::Sampled(period) = &self.time {
            // z - 1 = 2 w/(1 - w), and the ramp is T·z/(z - 1)²: T/2 for each power of w.
            value *= (period / RBig::from(2)).pow(n as isize);
        }
        Ok(value)
    }

    /// The root of the integral (of the sum) of the squared impulse response.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn two_norm(&self) -> Result<f64, String> {
        self.is_stable()?;
        norm::two_norm(&self.ratio, &self.time)
    }

    /// The last entry of the step response into a band about its final value.
    ///
    /// # Errors
    ///
    /// Why there is none.
    pub(crate) fn settling(&self, band: f64) -> Result<f64, String> {
        if !(band > 0.0 && band < 1.0) {
            return Err("the band must lie between 0 and 100 per cent".to_owned());
        }
        match &self.time {
            Time::Continuous => self.step()?.settling(band),
            Time::Sampled(_) => sampled::figures(&self.ratio, &self.time, band)?.settling_time,
        }
    }

    fn step(&self) -> Result<&StepResponse, String> {
        let made = self.step.get_or_init(|| {
            self.is_stable()?;
            StepResponse::of(&self.ratio)
        });
        made.as_ref().map_err(Clone::clone)
    }

    /// Figures of the step response.
    ///
    /// # Errors
    ///
    /// Why there are none.
    pub(crate) fn figures(&self) -> Result<&StepResult, String> {
        let made = self.figures.get_or_init(|| match &self.time {
            Time::Continuous => Ok(self.step()?.figures()),
            Time::Sampled(_) => {
                self.is_stable()?;
                sampled::figures(&self.ratio, &self.time, 0.02)
            }
        });
        made.as_ref().map_err(Clone::clone)
    }

    /// The polynomial part of the denominator: the modes that it shows.
    pub(crate) fn shown(&self) -> Vec<IBig> {
        shown(&self.ratio.den)
    }
}

/// The part of a characteristic function that is a polynomial.
pub(crate) fn shown(q: &Quasi) -> Vec<IBig> {
    q.as_polynomial().map_or_else(|| q.split().0, <[IBig]>::to_vec)
}
