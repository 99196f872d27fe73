//! Whether a figure that agrees with a bound to nine digits is equal to it, by exact arithmetic: the bound is put into the
//! condition that defines the figure, and a root that the condition then has in common with what it should have decides.

use super::axis::{has_root_between, near};
use super::quasi::{difference, sum, times};
use super::requirements::Subject;
use super::response::{Axis, Response};
use crate::algebra::{IBig, RBig, dense, stability};
use crate::netlist::Metric;
use dashu_base::Abs;

/// Roots are looked for this near to the frequency of the figure, relative.
const NEAR: f64 = 1e-6;

/// Whether the figure, near the bound and at this frequency, is the bound. No where it can't be decided: then the double
/// counts as it stands.
pub(crate) fn is(metric: &Metric, subject: &Subject<'_>, bound: &RBig, frequency: Option<f64>) -> bool {
    match subject {
        Subject::Modes(_, p, _) => match metric {
            Metric::DampingRatio => has_damping(p, bound),
            _ => has_decay(p, bound),
        },
        Subject::Loop(l) => of_loop(metric, &l.response, bound, frequency),
        Subject::Transfer(t) => of_transfer(metric, &t.response, bound, frequency),
    }
}

fn of_loop(metric: &Metric, r: &Response, bound: &RBig, frequency: Option<f64>) -> bool {
    match metric {
        Metric::GainMargin(_) => {
            let Some((n, d, delay)) = r.ratio.rational() else { return false };
            *delay == RBig::ZERO && *bound > RBig::ZERO && (loses(n, d, bound) || loses(n, d, &(RBig::ONE / bound)))
        }
        Metric::PhaseMargin(_) => has_phase(r, bound, frequency),
        Metric::ModulusMargin(_) => {
            let Some((a, b)) = r.squares_of_difference() else { return false };
            extreme(r, &a, &b, bound, frequency)
        }
        Metric::Crossover(_) => {
            let Some((n, d)) = r.squares() else { return false };
            r.axis == Axis::Continuous && vanishes(&difference(&n, &d), &(bound * bound))
        }
        _ => false,
    }
}

fn of_transfer(metric: &Metric, r: &Response, bound: &RBig, frequency: Option<f64>) -> bool {
    let Some((n, d)) = r.squares() else { return false };
    match metric {
        Metric::Peak(_) | Metric::Magnitude(..) => extreme(r, &n, &d, bound, frequency),
        Metric::Bandwidth(_) => {
            let polynomial = r.ratio.at_zero().and_then(|gain| r.bandwidth_polynomial(&gain));
            r.axis == Axis::Continuous && polynomial.is_some_and(|p| vanishes(&p, &(bound * bound)))
        }
        _ => false,
    }
}

/// p(x) = 0
fn vanishes(p: &[IBig], x: &RBig) -> bool {
    dense::sign_at(p, x.numerator(), &IBig::from(x.denominator().clone())) == 0
}

/// D + k·N has a root on the axis, or loses one to infinity.
fn loses(n: &[IBig], d: &[IBig], k: &RBig) -> bool {
    let whole = sum(&times(n, k.numerator()), &times(d, &IBig::from(k.denominator().clone())));
    whole.len() < n.len().max(d.len()) || stability::half_plane(&whole).axis > 0
}

/// The square of the place on the axis of a frequency, with some room on both sides.
fn about(r: &Response, frequency: Option<f64>) -> Option<(RBig, RBig)> {
    let place = r.axis.place(frequency?);
    let x = place * place;
    x.is_finite().then(|| (near(x * (1.0 - NEAR)), near(x * (1.0 + NEAR))))
}

/// √(a/b) is the bound where it is stationary: a - bound²·b has a double root; at the ends of the axis by the values.
fn extreme(r: &Response, a: &[IBig], b: &[IBig], bound: &RBig, frequency: Option<f64>) -> bool {
    let square = bound * bound;
    let f = difference(&times(a, &IBig::from(square.denominator().clone())), &times(b, square.numerator()));
    if f.is_empty() {
        return true;
    }
    match about(r, frequency) {
        None => f.len() < a.len().max(b.len()),
        Some((low, high)) if low == RBig::ZERO && high == RBig::ZERO => f[0].is_zero(),
        Some((low, high)) => {
            let common = dense::gcd(&f, &dense::derivative(&f));
            let inside = common.len() > 1 && has_root_between(&common, &low, &high);
            // The end of a band, where it is a number with few digits.
            let end = frequency.filter(|_| r.axis == Axis::Continuous).map(near);
            inside || end.is_some_and(|w| vanishes(&f, &(&w * &w)))
        }
    }
}

/// arg L + 180° is ± the bound at a crossing, for the angles whose tangents have rational squares.
fn has_phase(r: &Response, bound: &RBig, frequency: Option<f64>) -> bool {
    let Some(((re, im), (n, d))) = r.cross().zip(r.squares()) else { return false };
    // sin² : cos² of multiples of 15 degrees; the side of the axis is known from the figure itself.
    let twelfth = bound / RBig::from(15);
    if *twelfth.denominator() != 1u8.into() {
        return false;
    }
    let (sine, cosine) = match i64::try_from(twelfth.numerator().clone().abs()) {
        Ok(0 | 12) => (0, 1),
        Ok(2 | 10) => (1, 3),
        Ok(3 | 9) => (1, 1),
        Ok(4 | 8) => (3, 1),
        Ok(6) => (1, 0),
        _ => return false,
    };
    let mut imaginary = dense::product(&im, &im);
    if !imaginary.is_empty() {
        imaginary.insert(0, IBig::ZERO);
    }
    let real = dense::product(&re, &re);
    let condition = difference(&times(&imaginary, &IBig::from(cosine)), &times(&real, &IBig::from(sine)));
    let common = dense::gcd(&condition, &difference(&n, &d));
    let Some((low, high)) = about(r, frequency) else { return false };
    common.len() > 1 && has_root_between(&common, &low, &high)
}

/// Some root has the real part -rate.
fn has_decay(p: &[IBig], rate: &RBig) -> bool {
    let (Ok(shift), q) = (i64::try_from(rate.numerator().clone()), IBig::from(rate.denominator().clone())) else {
        return false;
    };
    if p.is_empty() {
        return false;
    }
    // q^n·p(u/q), then u - shift for u.
    let mut power = IBig::ONE;
    let mut scaled = p.to_vec();
    for c in scaled.iter_mut().rev() {
        *c *= &power;
        power *= &q;
    }
    stability::half_plane(&dense::shifted(&scaled, -shift)).axis > 0
}

/// Some pair of roots is that of s² + 2·c·ω·s + ω² with ω > 0: the remainder of p by it, two polynomials in ω, has a
/// positive root.
fn has_damping(p: &[IBig], c: &RBig) -> bool {
    if c.clone().abs() >= RBig::ONE {
        // A real root: all of them have a damping ratio of 1 or -1.
        let side = if *c > RBig::ZERO { (None, Some(&RBig::ZERO)) } else { (Some(&RBig::ZERO), None) };
        return c.clone().abs() == RBig::ONE && stability::real_count(p, side.0, side.1) > 0;
    }
    // s^k = ω^(k-1)·u_k·s + ω^k·v_k with u_(k+1) = v_k - 2 c u_k and v_(k+1) = -u_k, times the denominator of c each step.
    let (num, den) = (c.numerator(), IBig::from(c.denominator().clone()));
    let (mut u, mut v) = (IBig::ZERO, IBig::ONE);
    let mut scale = IBig::ONE;
    let n = p.len();
    let (mut first, mut second) = (vec![IBig::ZERO; n], vec![IBig::ZERO; n]);
    let whole = den.pow(n.saturating_sub(1));
    for (k, a) in p.iter().enumerate() {
        let lift = &whole / &scale;
        if k > 0 {
            first[k - 1] = a * &u * &lift;
        }
        second[k] = a * &v * &lift;
        let next = &v * &den - IBig::from(2) * num * &u;
        v = -(&u * &den);
        u = next;
        scale *= &den;
    }
    let (first, second) = (dense::trim(first), dense::trim(second));
    let common = dense::gcd(&first, &second);
    common.len() > 1 && stability::real_count(&common, Some(&RBig::ZERO), None) > 0
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{part, poly, ratio};
    use super::*;

    #[test]
    fn exact_damping_and_decay() {
        // (s² + s + 1)(s + 3): damping ratio 1/2, decay rates 1/2 and 3.
        let p = dense::product(&poly(&[1, 1, 1]), &poly(&[3, 1]));
        assert!(has_damping(&p, &part(1, 2)) && !has_damping(&p, &part(500_000_001, 1_000_000_000)));
        assert!(has_damping(&p, &part(1, 1)) && !has_damping(&p, &part(-1, 1)));
        assert!(has_decay(&p, &part(1, 2)) && has_decay(&p, &part(3, 1)) && !has_decay(&p, &part(2, 1)));
        // ω = 7, ζ = 3/7: s² + 6 s + 49
        assert!(has_damping(&poly(&[49, 6, 1]), &part(3, 7)));
    }

    #[test]
    fn exact_margins() {
        assert!(loses(&poly(&[1, -1]), &poly(&[1, 2, 1]), &part(2, 1)));
        assert!(!loses(&poly(&[1, -1]), &poly(&[1, 2, 1]), &part(2_000_000_001, 1_000_000_000)));
        // 1/s has a phase margin of 90 degrees, at 1 rad/s.
        let integrator = Response::continuous(ratio(&[1], &[0, 1]));
        assert!(has_phase(&integrator, &part(90, 1), Some(1.0)) && !has_phase(&integrator, &part(60, 1), Some(1.0)));
        // (1 - s)/(1 + s)·1/s turns by 90 degrees more there.
        let allpass = Response::continuous(ratio(&[1, -1], &[0, 1, 1]));
        assert!(has_phase(&allpass, &part(0, 1), Some(1.0)));
        // abs(1 + L) tends to 1 for L = 1/(s + 1).
        let lag = Response::continuous(ratio(&[1], &[1, 1]));
        let (a, b) = lag.squares_of_difference().expect("rational");
        assert!(extreme(&lag, &a, &b, &part(1, 1), None));
    }
}
