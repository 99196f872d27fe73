//! Verified searches on an interval: all zeros of a smooth function, and its largest value.
//!
//! Of a function one knows, at a point, the value, the slope and a bound on the rounding error of the value, and over an
//! interval a bound on the second derivative. Taylor's theorem then bounds the function between the points: nothing is
//! decided by how densely somebody looked. Intervals are halved until the bounds decide (R. E. Moore, Interval Analysis,
//! 1966, chapters 6 and 7).

/// The most intervals that one search looks at: more than any response with a bounded number of oscillations needs.
const MAX_INTERVALS: usize = 4_000_000;

/// Relative width below which an interval is not halved any more: some units of the last place of a double.
const LEAST_WIDTH: f64 = 4e-15;

/// A function at a point.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Jet {
    /// Value.
    pub(crate) value: f64,
    /// First derivative.
    pub(crate) slope: f64,
    /// A bound on the rounding error of the value.
    pub(crate) noise: f64,
}

/// A smooth function of one variable.
pub(crate) trait Smooth {
    /// Value, slope and noise at a point.
    fn jet(&self, x: f64) -> Jet;
    /// A bound on the magnitude of the second derivative between two points.
    fn curvature(&self, low: f64, high: f64) -> f64;
    /// Bounds on the values between two points that do not come from the point in the middle, where there are any.
    fn range(&self, _low: f64, _high: f64) -> Option<(f64, f64)> {
        None
    }
}

/// In which order zeros are looked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum From {
    /// The least first.
    Low,
    /// The greatest first.
    High,
}

/// A search was given up: it would take more than [`MAX_INTERVALS`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct GivenUp;

/// The first zeros of a function between two points, up to `most` of them, in the order of the search.
///
/// Where the function touches 0 without crossing it, to within rounding, the place counts once.
///
/// # Errors
///
/// [`GivenUp`].
pub(crate) fn zeros(f: &dyn Smooth, low: f64, high: f64, order: From, most: usize) -> Result<Vec<f64>, GivenUp> {
    let mut out: Vec<f64> = Vec::new();
    let mut stack = vec![(low, high)];
    let mut touching: Option<(f64, f64)> = None;
    for _ in 0..MAX_INTERVALS {
        if out.len() >= most {
            break;
        }
        let Some((a, b)) = stack.pop() else {
            if let Some((a, b)) = touching {
                push_apart(f, &mut out, f64::midpoint(a, b));
            }
            return Ok(out);
        };
        let (m, r) = (f64::midpoint(a, b), (b - a) / 2.0);
        if f.range(a, b).is_some_and(|(least, most)| least > 0.0 || most < 0.0) {
            continue;
        }
        let (jet, c) = (f.jet(m), f.curvature(a, b));
        if jet.value.abs() > jet.slope.abs() * r + c * r * r / 2.0 + jet.noise {
            continue;
        }
        if jet.slope.abs() > c * r {
            let (fa, fb) = (f.jet(a).value, f.jet(b).value);
            if (fa >= 0.0) != (fb >= 0.0) {
                // A place that was taken for a touch is this zero where it lies beside it.
                let near = |t: &(f64, f64)| (t.0 - b).abs().min((a - t.1).abs()) <= 64.0 * LEAST_WIDTH * m.abs();
                if let Some(t) = touching.take().filter(|t| !near(t)) {
                    push_apart(f, &mut out, f64::midpoint(t.0, t.1));
                }
                push_apart(f, &mut out, solve(f, a, b, fa));
            }
            continue;
        }
        if b - a <= LEAST_WIDTH * a.abs().max(b.abs()) {
            match &mut touching {
                Some(t) if (t.0 - b).abs().min((a - t.1).abs()) <= 64.0 * LEAST_WIDTH * m.abs() => {
                    *t = (t.0.min(a), t.1.max(b));
                }
                _ => {
                    if let Some((a, b)) = touching.replace((a, b)) {
                        push_apart(f, &mut out, f64::midpoint(a, b));
                    }
                }
            }
            continue;
        }
        // Half of the ratio rather than half of the width where the ends are decades apart.
        let cut = if a > 0.0 && b > 8.0 * a { libm::sqrt(a) * libm::sqrt(b) } else { m };
        if order == From::Low {
            stack.extend([(cut, b), (a, cut)]);
        } else {
            stack.extend([(a, cut), (cut, b)]);
        }
    }
    if out.len() >= most { Ok(out) } else { Err(GivenUp) }
}

/// Adds a zero, unless the function is 0 to within rounding between it and the last one: then both are one touch, at
/// which rounding alone gave the signs.
fn push_apart(f: &dyn Smooth, out: &mut Vec<f64>, zero: f64) {
    if let Some(last) = out.last_mut() {
        let middle = f64::midpoint(*last, zero);
        let (jet, half) = (f.jet(middle), (zero - *last).abs() / 2.0);
        let bulge = f.curvature(last.min(zero), last.max(zero)) * half * half / 2.0;
        if jet.value.abs() + bulge <= 8.0 * jet.noise {
            *last = middle;
            return;
        }
    }
    out.push(zero);
}

/// The zero between two points at which the signs differ, the function monotone between them: Newton's method, kept
/// inside by halving.
fn solve(f: &dyn Smooth, mut a: f64, mut b: f64, fa: f64) -> f64 {
    let rising = fa < 0.0;
    let mut x = f64::midpoint(a, b);
    for _ in 0..200 {
        let jet = f.jet(x);
        if jet.value == 0.0 {
            return x;
        }
        if (jet.value < 0.0) == rising {
            a = x;
        } else {
            b = x;
        }
        let newton = x - jet.value / jet.slope;
        let next = if newton > a && newton < b { newton } else { f64::midpoint(a, b) };
        if (next - x).abs() <= f64::EPSILON * x.abs() || next == a || next == b {
            return next;
        }
        x = next;
    }
    x
}

/// The largest value of a function between two points, ends included, and where it is; `least` is a value that is known
/// to be reached elsewhere, and `None` says that the function stays below it.
///
/// # Errors
///
/// [`GivenUp`].
pub(crate) fn maximum(f: &dyn Smooth, low: f64, high: f64, least: f64) -> Result<Option<(f64, f64)>, GivenUp> {
    let mut best: Option<(f64, f64)> = None;
    let mut value = least;
    let mut stack = vec![(low, high)];
    let mut consider = |x: f64, y: f64, value: &mut f64| {
        if y > *value {
            (*value, best) = (y, Some((x, y)));
        }
    };
    for x in [low, high] {
        consider(x, f.jet(x).value, &mut value);
    }
    for _ in 0..MAX_INTERVALS {
        let Some((a, b)) = stack.pop() else {
            return Ok(best.map(|(x, y)| polished(f, low, high, x, y)));
        };
        let slack = f64::EPSILON * value.abs();
        if f.range(a, b).is_some_and(|(_, most)| most <= value) {
            continue;
        }
        let (m, r) = (f64::midpoint(a, b), (b - a) / 2.0);
        let (jet, c) = (f.jet(m), f.curvature(a, b));
        if jet.value + jet.slope.abs() * r + c * r * r / 2.0 <= value + slack + jet.noise {
            consider(m, jet.value, &mut value);
            continue;
        }
        if jet.slope.abs() > c * r {
            // Monotone: the ends have been looked at, or are looked at here.
            let end = if jet.slope > 0.0 { b } else { a };
            consider(end, f.jet(end).value, &mut value);
            continue;
        }
        consider(m, jet.value, &mut value);
        if b - a <= LEAST_WIDTH * a.abs().max(b.abs()) {
            continue;
        }
        let cut = if a > 0.0 && b > 8.0 * a { libm::sqrt(a) * libm::sqrt(b) } else { m };
        stack.extend([(cut, b), (a, cut)]);
    }
    Err(GivenUp)
}

/// A largest value inside is where the slope vanishes: the place, which the values alone give to half the digits only,
/// by the secant method on the slope.
fn polished(f: &dyn Smooth, low: f64, high: f64, x: f64, y: f64) -> (f64, f64) {
    if x <= low || x >= high {
        return (x, y);
    }
    let width = 1e-7 * x.abs().max(f64::MIN_POSITIVE);
    let (mut a, mut b) = ((x - width).max(low), (x + width).min(high));
    let (sa, sb) = (f.jet(a).slope, f.jet(b).slope);
    if sa <= 0.0 || sb >= 0.0 {
        return (x, y);
    }
    for _ in 0..60 {
        let m = f64::midpoint(a, b);
        if f.jet(m).slope > 0.0 {
            a = m;
        } else {
            b = m;
        }
    }
    let m = f64::midpoint(a, b);
    let at = f.jet(m).value;
    if at >= y - 4.0 * f64::EPSILON * y.abs() { (m, at.max(y)) } else { (x, y) }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// a·sin(w·x) + b, whose zeros and largest value are known.
    struct Wave {
        a: f64,
        w: f64,
        b: f64,
    }

    impl Smooth for Wave {
        fn jet(&self, x: f64) -> Jet {
            let (s, c) = (libm::sin(self.w * x), libm::cos(self.w * x));
            Jet { value: self.a * s + self.b, slope: self.a * self.w * c, noise: 1e-15 * (self.a.abs() + self.b.abs()) }
        }
        fn curvature(&self, _: f64, _: f64) -> f64 {
            self.a.abs() * self.w * self.w
        }
    }

    #[test]
    fn zeros_of_a_sine_from_both_sides() {
        let f = Wave { a: 2.0, w: 3.0, b: 1.0 };
        let pi = std::f64::consts::PI;
        let found = zeros(&f, 0.0, 4.1, From::Low, 9).expect("few");
        let expected = [7.0 / 18.0 * pi, 11.0 / 18.0 * pi, 19.0 / 18.0 * pi, 23.0 / 18.0 * pi];
        assert_eq!(found.len(), 4);
        assert!(found.iter().zip(expected).all(|(x, y)| (x - y).abs() < 1e-14), "{found:?}");
        let last = zeros(&f, 0.0, 4.1, From::High, 1).expect("few");
        assert!((last[0] - expected[3]).abs() < 1e-14);
    }

    #[test]
    fn a_touch_counts_once_and_a_narrow_miss_does_not() {
        let touch = zeros(&Wave { a: 1.0, w: 1.0, b: -1.0 }, 0.0, 6.0, From::Low, 9).expect("few");
        assert!(touch.len() == 1 && (touch[0] - std::f64::consts::FRAC_PI_2).abs() < 1e-6, "{touch:?}");
        assert_eq!(zeros(&Wave { a: 1.0, w: 1.0, b: -1.0 - 1e-9 }, 0.0, 6.0, From::Low, 9), Ok(Vec::new()));
    }

    #[test]
    fn the_largest_value_and_its_place() {
        let (x, y) =
            maximum(&Wave { a: 2.0, w: 3.0, b: 1.0 }, 0.1, 1.9, f64::NEG_INFINITY).expect("few").expect("some");
        assert!((x - std::f64::consts::FRAC_PI_6).abs() < 1e-9 && (y - 3.0).abs() < 1e-15, "{x} {y}");
        assert_eq!(maximum(&Wave { a: 2.0, w: 3.0, b: 1.0 }, 0.1, 1.9, 3.5), Ok(None));
        let (x, _) = maximum(&Wave { a: 2.0, w: 1.0, b: 0.0 }, 0.0, 1.0, 0.0).expect("few").expect("some");
        assert_eq!(x, 1.0);
    }
}
