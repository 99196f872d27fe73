//! Counts of roots right of, and on, the imaginary axis (outside and on the unit circle): exact without dead times, by
//! the method of Walton and Marshall with one dead time, by the argument principle with verified steps otherwise.
//!
//! Sources: K. Walton, J. E. Marshall, "Direct method for TDS stability analysis", IEE Proceedings D 134 (1987) 101-107;
//! R. Bellman, K. L. Cooke, *Differential-Difference Equations* (1963), chapter 12, for retarded, neutral and advanced
//! type; J. K. Hale, S. M. Verduyn Lunel, *Introduction to Functional Differential Equations* (1993), chapter 9, for the
//! difference part of neutral equations; A. Baker, *Transcendental Number Theory* (1975), chapter 1, for the theorem of
//! Lindemann and Weierstrass.

use super::axis::{self, OnAxis};
use super::curve::Curve;
use super::quasi::{Quasi, common_step, difference, sum};
use super::search::GivenUp;
use crate::algebra::{IBig, RBig, dense, stability};
use dashu_base::Sign;
use std::f64::consts::{PI, TAU};

/// Above this degree, roots are not counted by exact arithmetic: the arrays would take minutes.
pub(crate) const MAX_EXACT_DEGREE: usize = 1_000;

/// The largest multiple of the common step that the difference part of a neutral equation may have.
const MAX_STEPS: usize = 2_000;

/// A crossing this near to the given dead time (relative) is told as lying on the axis: with rational data and a dead
/// time other than 0 no root but 0 can lie there (Lindemann and Weierstrass), with π in the data one can.
const ON_AXIS: f64 = 1e-12;

/// The most pieces into which the imaginary axis is cut by the argument principle.
const MAX_PIECES: usize = 2_000_000;

/// The most windows of the dead time that are listed.
const MAX_WINDOWS: usize = 50;

/// Roots of a characteristic function, with multiplicity.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Stability {
    /// Whether all are strictly left of the axis, and stay so at infinity.
    pub(crate) stable: bool,
    /// Right of the axis, or outside the circle; `None` where there are infinitely many, or no count was reached.
    pub(crate) outside: Option<usize>,
    /// On the axis, or on the circle.
    pub(crate) on: Option<usize>,
    /// How they were counted, and whether exactly.
    pub(crate) method: String,
    /// Where there is one dead time: the intervals of it in which all roots are left of the axis; no end is infinity.
    pub(crate) windows: Option<Vec<(f64, Option<f64>)>>,
    /// Why there is no count, or what is special.
    pub(crate) why: Option<String>,
}

impl Stability {
    fn counted(outside: usize, on: usize, method: &str) -> Self {
        Self {
            stable: outside == 0 && on == 0,
            outside: Some(outside),
            on: Some(on),
            method: method.to_owned(),
            windows: None,
            why: None,
        }
    }

    fn unstable(method: &str, why: String) -> Self {
        Self { stable: false, outside: None, on: None, method: method.to_owned(), windows: None, why: Some(why) }
    }
}

/// Counts the roots of a polynomial in z by the unit circle.
pub(crate) fn of_circle(p: &[IBig]) -> Stability {
    let counts = stability::unit_circle(p);
    Stability::counted(counts.outside, counts.on, "routh after the bilinear map, exact")
}

/// Counts the roots of a characteristic function by the imaginary axis.
pub(crate) fn of_axis(q: &Quasi) -> Stability {
    let least = q.least_delay();
    let q = q.delayed(&-least);
    if let Some(p) = q.as_polynomial() {
        if p.len() > MAX_EXACT_DEGREE {
            return from_roots(p);
        }
        let counts = stability::half_plane(p);
        return Stability::counted(counts.right, counts.axis, "routh, exact");
    }
    let (common, rest) = q.split();
    let known = stability::half_plane(&common);
    let mut result = with_delay(&rest);
    result.outside = result.outside.map(|n| n + known.right);
    result.on = result.on.map(|n| n + known.axis);
    if known.right + known.axis > 0 {
        result.stable = false;
        result.windows = result.windows.map(|_| Vec::new());
    }
    result
}

/// By the roots themselves with their inclusion discs.
fn from_roots(p: &[IBig]) -> Stability {
    let method = format!("roots with error bounds, numeric above {MAX_EXACT_DEGREE} states");
    let Ok(found) = crate::algebra::roots::roots(p) else {
        return Stability::unstable(&method, "the roots could not be parted".to_owned());
    };
    let count = |which: &dyn Fn(&crate::algebra::roots::RootOf) -> bool| -> usize {
        found.iter().filter(|r| which(r)).map(|r| r.multiplicity as usize).sum()
    };
    Stability::counted(count(&|r| !r.on_axis && r.re > 0.0), count(&|r| r.on_axis), &method)
}

/// A function with dead times whose polynomials have no factor in common.
fn with_delay(q: &Quasi) -> Stability {
    let degree = q.degree();
    let first = &q.terms[0].1;
    if first.len() - 1 < degree {
        let why = "the highest power of s stands behind a dead time only (advanced type): infinitely many roots lie \
                   right of the axis";
        return Stability::unstable("type of the equation, exact", why.to_owned());
    }
    let neutral = q.terms.iter().skip(1).any(|t| t.1.len() - 1 == degree);
    if neutral && let Some(answer) = neutral_chain(q, degree) {
        return answer;
    }
    if q.terms.len() == 2 {
        let mut answer = walton_marshall(q);
        if answer.is_none() {
            answer = argument_principle(q).ok();
        }
        if let Some(answer) = answer {
            return answer;
        }
    } else if let Ok(answer) = argument_principle(q) {
        return answer;
    }
    let why = "a root lies so near to the axis that double precision can't tell its side";
    Stability::unstable("argument principle, numeric", why.to_owned())
}

/// For a neutral equation: an answer where its difference part has a root on or outside the unit circle, so that a chain
/// of roots nears the axis or lies right of it.
fn neutral_chain(q: &Quasi, degree: usize) -> Option<Stability> {
    let method = "difference part of the neutral equation, exact";
    let steps = common_step(q).and_then(|(step, most)| usize::try_from(&most).ok().map(|m| (step, m)));
    let Some((step, most)) = steps.filter(|s| s.1 <= MAX_STEPS) else {
        // With dead times that have no common step of useful size: the sum of magnitudes decides (strong stability).
        let lead = |p: &Vec<IBig>| p.get(degree).map_or(0.0, |c| axis::quotient(c, &q.terms[0].1[degree]).abs());
        let total: f64 = q.terms.iter().skip(1).map(|t| lead(&t.1)).sum();
        let why = "the direct gains behind dead times add up to 1 or more: the slightest change of a dead time can \
                   bring roots right of the axis";
        return (total >= 1.0).then(|| Stability::unstable(method, why.to_owned()));
    };
    // Σ c_k·x^k with x = exp(step·s): its roots must lie inside the circle.
    let mut p = vec![IBig::ZERO; most + 1];
    for (delay, poly) in &q.terms {
        let k = usize::try_from((delay / &step).numerator()).unwrap_or(0);
        if let Some(c) = poly.get(degree) {
            p[most - k] += c;
        }
    }
    let counts = stability::unit_circle(&p);
    if counts.outside > 0 {
        let why = "direct gain behind a dead time closes a loop with a gain above 1 (neutral type): infinitely many \
                   roots lie right of the axis";
        return Some(Stability::unstable(method, why.to_owned()));
    }
    if counts.on > 0 {
        let why = "direct gain behind a dead time closes a loop with a gain of 1 (neutral type): a chain of roots nears \
                   the axis without end";
        return Some(Stability::unstable(method, why.to_owned()));
    }
    None
}

/// A root jω that exists for some dead times: they are first + k·turn, and the root moves right (+1) or left (-1)
/// there as the dead time grows.
struct Crossing {
    first: f64,
    turn: f64,
    direction: i32,
}

/// A(s) + B(s)·exp(-hs): the exponential eliminated, all crossing frequencies are roots of abs(A)² - abs(B)²; `None`
/// where roots at 0 come or go with the dead time, which this method does not follow.
fn walton_marshall(q: &Quasi) -> Option<Stability> {
    let (a, b) = (&q.terms[0].1, &q.terms[1].1);
    let h = q.terms[1].0.to_f64().value();
    let (on_a, on_b) = (OnAxis::new(a), OnAxis::new(b));
    let w = difference(&on_a.square(), &on_b.square());
    let undelayed = sum(a, b);
    if w.is_empty() || undelayed.is_empty() || undelayed.len() != a.len() {
        return None;
    }
    // Roots at 0 stay for all dead times; their number must not depend on it.
    let at_zero = undelayed.iter().position(|c| !c.is_zero())?;
    if q.lowest()?.0 != at_zero || at_zero > 1 {
        return None;
    }
    let counts = stability::half_plane(&undelayed);
    let (real, imaginary) = on_a.times_conjugate(&on_b);
    let mut crossings = Vec::new();
    let mut moved_at_once = 0;
    let mut last_sign = sign_before_first(&w);
    for root in axis::positive_roots(&w) {
        let omega = root.x.root();
        let after = if root.multiplicity % 2 == 1 { -last_sign } else { last_sign };
        let direction = (after - last_sign) / 2;
        last_sign = after;
        // exp(-jωh) = -A/B = -(A·conj B)/abs(B)²
        let degree = real.len().max(imaginary.len());
        let to = |p: &[IBig]| axis::quotient(&root.x.value(p, degree), &(IBig::ONE << (root.x.k * degree)));
        let (re, im) = (-to(&real), -to(&imaginary) * omega);
        let angle = -libm::atan2(im, re);
        let exactly_now = axis::sign_at(&imaginary, &root.x) == 0 || im.abs() <= 1e-14 * re.abs();
        let angle = if angle < 0.0 { angle + TAU } else { angle };
        let at_start = exactly_now && re > 0.0;
        if at_start {
            // On the axis without dead time: it leaves at once.
            moved_at_once += if direction > 0 { 2 } else { 0 };
        }
        let first = if at_start { TAU / omega } else { angle / omega };
        crossings.push(Crossing { first, turn: TAU / omega, direction });
    }
    let start = i64::try_from(counts.right).ok()? + moved_at_once;
    let (mut right, mut on) = (start, at_zero);
    for c in &crossings {
        let mut at = c.first;
        // The number of turns is bounded by the dead time over the shortest period.
        let whole = ((h * (1.0 - ON_AXIS) - at) / c.turn).floor();
        if whole >= 0.0 {
            right += 2 * i64::from(c.direction) * (whole as i64 + 1);
            at += (whole + 1.0) * c.turn;
        }
        if (at - h).abs() <= ON_AXIS * h {
            on += 2;
            if c.direction < 0 {
                right -= 2;
            }
        }
    }
    let method = "walton-marshall, exact crossing frequencies";
    let mut answer = Stability::counted(usize::try_from(right).ok()?, on, method);
    answer.windows = Some(if at_zero > 0 { Vec::new() } else { windows(&counts, start, &crossings) });
    Some(answer)
}

/// The sign of a polynomial just right of 0.
fn sign_before_first(p: &[IBig]) -> i32 {
    p.iter().map(dense::sign).find(|&s| s != 0).unwrap_or(0)
}

/// The intervals of the dead time without roots on or right of the axis.
fn windows(undelayed: &stability::HalfPlane, start: i64, crossings: &[Crossing]) -> Vec<(f64, Option<f64>)> {
    let mut out = Vec::new();
    let mut right = start;
    let mut from = (undelayed.right == 0 && undelayed.axis == 0 && start == 0).then_some(0.0);
    let leaves_axis = from.is_none() && start == 0;
    if leaves_axis {
        from = Some(0.0);
    }
    let mut next: Vec<f64> = crossings.iter().map(|c| c.first).collect();
    // Roots that go right outnumber those that come back from some dead time on: then no window can follow.
    for _ in 0..100 * MAX_WINDOWS {
        let least = next.iter().enumerate().min_by(|a, b| a.1.total_cmp(b.1));
        let Some((i, &at)) = least else {
            out.extend(from.map(|f| (f, None)));
            return out;
        };
        if let Some(f) = from.take()
            && at > f
        {
            out.push((f, Some(at)));
        }
        right += 2 * i64::from(crossings[i].direction);
        next[i] += crossings[i].turn;
        if right == 0 {
            from = Some(at);
        }
        if out.len() >= MAX_WINDOWS || right > 2 * 100 {
            break;
        }
    }
    out
}

/// R = -(1/π)·Δ arg g, with g = f/((s + σ)^d·c(exp(-hs))) along the upper half of the axis: g tends to 1 at infinity, and
/// c, the difference part, has no roots right of the axis. The axis is cut into pieces on each of which bounds on the
/// slope and the curvature prove that f turns by less than a half turn.
///
/// # Errors
///
/// [`GivenUp`] where a root lies too near to the axis for double precision.
pub(crate) fn argument_principle(q: &Quasi) -> Result<Stability, GivenUp> {
    let (at_zero, lowest) = q.lowest().ok_or(GivenUp)?;
    let f = Curve::new(q);
    let degree = q.degree();
    let leads: Vec<(RBig, Vec<IBig>)> =
        q.terms.iter().filter_map(|t| t.1.get(degree).map(|c| (t.0.clone(), vec![c.clone()]))).collect();
    let c = Curve::new(&Quasi::from_terms(leads));
    let top = match f.dominated_from(4.0) {
        Some(w) => w,
        // The difference part is stable, but its terms outweigh each other in turn: go far enough for the rest.
        None => (4.0 * f.bounds(1.0)[0] / least_of_difference(&c)).max(1.0),
    };
    let bottom = f.dominated_to(64.0).min(top / 8.0);
    if !(top.is_finite() && bottom > 0.0) {
        return Err(GivenUp);
    }
    // Near 0, f ~ a·(jω)^m: real and of the sign of a once (jω)^m is divided out.
    let mut turned = turns(&f, bottom, top)?;
    let first = f.at(bottom).d[0];
    let start = expected_near_zero(at_zero, lowest.sign() == Sign::Negative);
    turned += wrapped(libm::atan2(first.im, first.re) - start);
    // From `top` on, f is its leading terms to within a quarter turn.
    let scale = (bottom * top).sqrt();
    let c_turned = turns(&c, 0.0, top)?;
    let (last, last_c) = (f.at(top).d[0], c.at(top).d[0]);
    let smooth = degree as f64 * libm::atan2(top, scale);
    let power = degree as f64 * (libm::atan2(top, scale) - PI / 2.0);
    let turn_of_power = num_complex::Complex64::from_polar(1.0, degree as f64 * PI / 2.0);
    let rest = last / (turn_of_power * last_c);
    let tail = wrapped(-libm::atan2(rest.im, rest.re)) + power;
    let total = turned - smooth - c_turned + tail;
    // Roots at 0 lie on the contour: with (jω)^m divided out, the m powers of (s + σ) are m too many.
    let right = -(total / PI) - at_zero as f64 / 2.0;
    let count = libm::round(right);
    if (right - count).abs() > 0.05 || count < -0.5 {
        return Err(GivenUp);
    }
    let method = "argument principle with verified steps, numeric";
    Ok(Stability::counted(count as usize, at_zero, method))
}

/// The argument of a·(jω)^m with a positive or negative.
fn expected_near_zero(m: usize, negative: bool) -> f64 {
    (m % 4) as f64 * PI / 2.0 + if negative { PI } else { 0.0 }
}

fn wrapped(angle: f64) -> f64 {
    let turn = libm::remainder(angle, TAU);
    if turn <= -PI { turn + TAU } else { turn }
}

/// The least magnitude of the difference part on the axis, from its values over one period, cautiously.
fn least_of_difference(c: &Curve) -> f64 {
    let longest = c.leads().iter().map(|l| l.0).fold(0.0, f64::max);
    let total: f64 = c.leads().iter().map(|l| l.1.abs()).sum();
    let shortest = c.leads().iter().map(|l| l.0).filter(|d| *d > 0.0).fold(f64::INFINITY, f64::min);
    let steps = 4096;
    let period = TAU / shortest * (longest / shortest).ceil();
    let least = (0..=steps).map(|i| c.at(period * f64::from(i) / f64::from(steps)).d[0].norm());
    (least.fold(f64::INFINITY, f64::min) / 2.0).max(total * 1e-6)
}

/// By how much the argument of f grows between two frequencies.
fn turns(f: &Curve, low: f64, high: f64) -> Result<f64, GivenUp> {
    let mut total = 0.0;
    let mut stack = vec![(low, high)];
    for _ in 0..MAX_PIECES {
        let Some((a, b)) = stack.pop() else { return Ok(total) };
        let (m, r) = (f64::midpoint(a, b), (b - a) / 2.0);
        let (p, bound) = (f.at(m), f.bounds(b));
        let reach = p.d[1].norm() * r + bound[2] * r * r / 2.0 + 2.0 * p.noise;
        if reach < p.d[0].norm() {
            // A disc about f(jm) that does not hold 0: both ends are within a quarter turn of the middle.
            let (x, y) = (f.at(a).d[0], f.at(b).d[0]);
            let turn = y * x.conj();
            total += libm::atan2(turn.im, turn.re);
            continue;
        }
        if b - a <= 1e-14 * b {
            return Err(GivenUp);
        }
        let cut = if a > 0.0 && b > 8.0 * a { libm::sqrt(a) * libm::sqrt(b) } else { m };
        stack.extend([(cut, b), (a, cut)]);
    }
    Err(GivenUp)
}

#[cfg(test)]
mod tests {
    use super::super::quasi::tests::{part, poly};
    use super::*;

    fn quasi(terms: &[(i64, u64, &[i64])]) -> Quasi {
        Quasi::from_terms(terms.iter().map(|(n, d, p)| (part(*n, *d), poly(p))).collect())
    }

    fn both(q: &Quasi) -> (Option<usize>, Option<usize>) {
        let exact = of_axis(q);
        let counted = argument_principle(&q.delayed(&-q.least_delay())).expect("not on the axis");
        assert_eq!((exact.outside, exact.on), (counted.outside, counted.on), "{q:?}");
        (exact.outside, exact.on)
    }

    /// s + K·exp(-s) has 2k roots right of the axis for K between (2k - 3/2)π and (2k + 1/2)π (closed form).
    #[test]
    fn an_integrator_behind_a_dead_time() {
        for (k, right) in [(1, 0), (2, 2), (7, 2), (8, 4), (14, 4), (15, 6)] {
            assert_eq!(both(&quasi(&[(0, 1, &[0, 1]), (1, 1, &[k])])), (Some(right), Some(0)), "{k}");
        }
        let answer = of_axis(&quasi(&[(0, 1, &[0, 2]), (1, 1, &[1])]));
        let windows = answer.windows.expect("one dead time");
        assert!(windows.len() == 1 && windows[0].0 == 0.0);
        assert!((windows[0].1.expect("an end") - PI).abs() < 1e-12, "{windows:?}");
    }

    /// s² + s·exp(-hs) + 4: Walton and Marshall's kind of plant with several windows; the ends from the closed form:
    /// crossings where abs(4 - ω²) = ω, at ω = (√17 ± 1)/2, going right at the larger, left at the smaller.
    #[test]
    fn windows_of_an_oscillator_with_delayed_damping() {
        let answer = of_axis(&quasi(&[(0, 1, &[4, 0, 1]), (1, 1, &[0, 1])]));
        let (low, high) = ((17f64.sqrt() - 1.0) / 2.0, (17f64.sqrt() + 1.0) / 2.0);
        // jω·exp(-jωh) = ω² - 4: at the larger ω, exp(-jωh) = -j, at the smaller one +j.
        let (right, left) = (0.5 * PI / high, 1.5 * PI / low);
        let windows = answer.windows.expect("one dead time");
        assert!((windows[0].1.expect("an end") - right).abs() < 1e-12, "{windows:?}");
        // To the right at (0.5 + 2k)π/high, to the left at (1.5 + 2k)π/low: 3.02 lies before 3.07.
        assert!((windows[1].0 - left).abs() < 1e-12 && (windows[1].1.expect("an end") - 2.5 * PI / high).abs() < 1e-12);
        for (n, d) in [(1, 2), (3, 2), (3, 1), (61, 20), (4, 1), (9, 1)] {
            both(&quasi(&[(0, 1, &[4, 0, 1]), (n, d, &[0, 1])]));
        }
    }

    /// Roots at 0 and common factors are counted exactly: s(s + 1)(s + 2 exp(-s)) has 0 once and 2 to the right.
    #[test]
    fn roots_at_zero_and_common_factors() {
        let q = quasi(&[(0, 1, &[0, 0, 1, 1]), (1, 1, &[0, 2, 2])]);
        assert_eq!((of_axis(&q).outside, of_axis(&q).on), (Some(2), Some(1)));
        // s + 1 - exp(-s) has the simple root 0 only on the axis, all others left of it.
        assert_eq!(both(&quasi(&[(0, 1, &[1, 1]), (1, 1, &[-1])])), (Some(0), Some(1)));
        // (s² + 1)(s + 1/2 exp(-s)): two on the axis.
        let q = quasi(&[(0, 1, &[0, 2, 0, 2]), (1, 1, &[1, 0, 1])]);
        assert_eq!((of_axis(&q).outside, of_axis(&q).on), (Some(0), Some(2)));
    }

    /// Two and more dead times: exp factors of products of closed forms.
    #[test]
    fn several_dead_times() {
        // (s + 2 exp(-s))(s + 1/2 exp(-s/2)): two from the first factor.
        let q = quasi(&[(0, 1, &[0, 0, 2]), (1, 1, &[0, 4]), (1, 2, &[0, 1]), (3, 2, &[2])]);
        assert_eq!((of_axis(&q).outside, of_axis(&q).on), (Some(2), Some(0)));
        // (s + 1)(s + 2) + exp(-s) + exp(-7 s): stable, since 2 is the least magnitude of the first term... at ω = 0.
        let q = quasi(&[(0, 1, &[4, 6, 2]), (1, 1, &[1]), (7, 1, &[2])]);
        assert_eq!((of_axis(&q).outside, of_axis(&q).on), (Some(0), Some(0)));
    }

    /// s·(1 + a·exp(-s)) + b: stable only for abs(a) < 1 (Bellman and Cooke 1963, chapter 12: the chain of roots nears
    /// Re s = ln a).
    #[test]
    fn neutral_equations() {
        let stable = of_axis(&quasi(&[(0, 1, &[2, 2]), (1, 1, &[0, 1])]));
        assert_eq!((stable.stable, stable.outside), (true, Some(0)));
        both(&quasi(&[(0, 1, &[2, 2]), (1, 1, &[0, 1])]));
        let unstable = of_axis(&quasi(&[(0, 1, &[2, 2]), (1, 1, &[0, 3])]));
        assert_eq!((unstable.stable, unstable.outside), (false, None));
        let border = of_axis(&quasi(&[(0, 1, &[2, 2]), (1, 1, &[0, 2])]));
        assert!(!border.stable && border.why.is_some_and(|w| w.contains("chain")));
        let advanced = of_axis(&quasi(&[(0, 1, &[2, 2]), (1, 1, &[0, 0, 1])]));
        assert!(!advanced.stable && advanced.why.is_some_and(|w| w.contains("advanced")));
    }

    #[test]
    fn the_unit_circle() {
        let counted = of_circle(&poly(&[-1, 2]));
        assert!(counted.stable);
        assert_eq!((of_circle(&poly(&[-1, 1])).on, of_circle(&poly(&[3, 1])).outside), (Some(1), Some(1)));
    }
}
