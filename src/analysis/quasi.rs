//! Quasi-polynomials Σ P(s)·exp(-T·s) with whole coefficients and exact dead times, and what the bilinear map makes of
//! polynomials in z.

use crate::algebra::{IBig, Poly, RBig, UBig, Var, dense};
use dashu_base::Gcd;

/// A sum of terms P(s)·exp(-T·s): dead times in seconds, rising, each once; no polynomial is 0, lowest power first.
///
/// The empty sum is 0.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(crate) struct Quasi {
    /// Dead times with their polynomials.
    pub(crate) terms: Vec<(RBig, Vec<IBig>)>,
}

/// A quotient of two quasi-polynomials, the denominator's least dead time 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Ratio {
    /// What stands above.
    pub(crate) num: Quasi,
    /// What stands below; not 0.
    pub(crate) den: Quasi,
}

impl Quasi {
    /// A polynomial without dead time.
    pub(crate) fn polynomial(p: Vec<IBig>) -> Self {
        Self::from_terms(vec![(RBig::ZERO, p)])
    }

    /// From terms in any order.
    pub(crate) fn from_terms(mut terms: Vec<(RBig, Vec<IBig>)>) -> Self {
        terms.sort_by(|a, b| a.0.cmp(&b.0));
        let mut out: Vec<(RBig, Vec<IBig>)> = Vec::with_capacity(terms.len());
        for (delay, p) in terms {
            match out.last_mut() {
                Some(last) if last.0 == delay => last.1 = sum(&last.1, &p),
                _ => out.push((delay, dense::trim(p))),
            }
        }
        out.retain(|t| !t.1.is_empty());
        Self { terms: out }
    }

    /// From a polynomial in s and variables that stand for dead times; `None` where another variable occurs.
    pub(crate) fn from_poly(p: &Poly, delay: &dyn Fn(Var) -> Option<RBig>) -> Option<Self> {
        let mut terms = Vec::new();
        let mut rest: std::collections::BTreeMap<RBig, Vec<IBig>> = std::collections::BTreeMap::new();
        if p.variables().iter().all(|v| *v == Var::S) {
            let whole: Option<Vec<IBig>> = p.coefficients(Var::S).iter().map(Poly::as_constant).collect();
            terms.push((RBig::ZERO, whole?));
            return Some(Self::from_terms(terms));
        }
        for (powers, c) in p.terms() {
            let (mut power, mut total) = (0usize, RBig::ZERO);
            for (var, e) in powers {
                if var == Var::S {
                    power = e as usize;
                } else {
                    total += delay(var)? * RBig::from(e);
                }
            }
            let group = rest.entry(total).or_default();
            if group.len() <= power {
                group.resize(power + 1, IBig::ZERO);
            }
            group[power] += c;
        }
        terms.extend(rest);
        Some(Self::from_terms(terms))
    }

    /// Whether it is 0.
    pub(crate) fn is_zero(&self) -> bool {
        self.terms.is_empty()
    }

    /// Its polynomial where it has no dead time; `None` otherwise, and for 0.
    pub(crate) fn as_polynomial(&self) -> Option<&[IBig]> {
        match &self.terms[..] {
            [(delay, p)] if *delay == RBig::ZERO => Some(p),
            _ => None,
        }
    }

    /// The highest power of s.
    pub(crate) fn degree(&self) -> usize {
        self.terms.iter().map(|t| t.1.len() - 1).max().unwrap_or(0)
    }

    /// Sum.
    pub(crate) fn add(&self, other: &Self) -> Self {
        Self::from_terms(self.terms.iter().chain(&other.terms).cloned().collect())
    }

    /// Product with a number.
    pub(crate) fn scaled(&self, by: &IBig) -> Self {
        let scale = |p: &Vec<IBig>| p.iter().map(|c| c * by).collect();
        Self::from_terms(self.terms.iter().map(|(d, p)| (d.clone(), scale(p))).collect())
    }

    /// All dead times changed by the same amount.
    pub(crate) fn delayed(&self, by: &RBig) -> Self {
        Self { terms: self.terms.iter().map(|(d, p)| (d + by, p.clone())).collect() }
    }

    /// The least dead time.
    pub(crate) fn least_delay(&self) -> RBig {
        self.terms.first().map_or(RBig::ZERO, |t| t.0.clone())
    }

    /// The greatest common divisor of the polynomials, primitive, and the quotient by it.
    pub(crate) fn split(&self) -> (Vec<IBig>, Self) {
        let mut common = Vec::new();
        for (_, p) in &self.terms {
            common = dense::gcd(&common, p);
        }
        let common = dense::primitive(&common);
        if common.len() < 2 {
            return (common, self.clone());
        }
        let quotient = |p: &[IBig]| dense::divide_exactly(p, &common).unwrap_or_default();
        let rest = self.terms.iter().map(|(d, p)| (d.clone(), quotient(p))).collect();
        (common, Self { terms: rest })
    }

    /// The coefficient of s^k in the power series at s = 0.
    pub(crate) fn taylor(&self, k: usize) -> RBig {
        let mut total = RBig::ZERO;
        for (delay, p) in &self.terms {
            for (power, c) in p.iter().enumerate().take(k + 1).filter(|t| !t.1.is_zero()) {
                let order = k - power;
                if *delay == RBig::ZERO && order > 0 {
                    continue;
                }
                let factorial = (1..=order).fold(UBig::ONE, |f, i| f * UBig::from(i));
                let part = RBig::from(c.clone()) * delay.pow(order as isize) / RBig::from(factorial);
                total += if order % 2 == 1 { -part } else { part };
            }
        }
        total
    }

    /// The lowest power of its power series at s = 0 with its coefficient; `None` for 0.
    ///
    /// A sum of m terms c·s^k·exp(-T·s) that is not 0 has one among the first m.
    pub(crate) fn lowest(&self) -> Option<(usize, RBig)> {
        let most: usize = self.terms.iter().map(|t| t.1.len()).sum();
        (0..=most).map(|k| (k, self.taylor(k))).find(|(_, c)| *c != RBig::ZERO)
    }
}

impl Ratio {
    /// The quotient; `None` for a denominator 0.
    pub(crate) fn new(num: Quasi, den: Quasi) -> Option<Self> {
        if den.is_zero() {
            return None;
        }
        let least = den.least_delay();
        if least == RBig::ZERO {
            return Some(Self { num, den });
        }
        let back = -least;
        Some(Self { num: num.delayed(&back), den: den.delayed(&back) })
    }

    /// From polynomials n/a over d/b with whole a and b.
    pub(crate) fn from_polys(
        (n, a): (&Poly, &IBig),
        (d, b): (&Poly, &IBig),
        delay: &dyn Fn(Var) -> Option<RBig>,
    ) -> Option<Self> {
        let (num, den) = (Quasi::from_poly(n, delay)?.scaled(b), Quasi::from_poly(d, delay)?.scaled(a));
        Self::new(num, den)
    }

    /// Numerator, denominator, and the dead time in front where nothing but one dead time in front occurs.
    pub(crate) fn rational(&self) -> Option<(&[IBig], &[IBig], &RBig)> {
        let below = self.den.as_polynomial()?;
        match &self.num.terms[..] {
            [(delay, p)] => Some((p, below, delay)),
            _ => None,
        }
    }

    /// The value at s = 0, from the first powers that remain above and below; `None` where there is a pole.
    pub(crate) fn at_zero(&self) -> Option<RBig> {
        let (low, d) = self.den.lowest()?;
        match self.num.lowest() {
            None => Some(RBig::ZERO),
            Some((k, _)) if k > low => Some(RBig::ZERO),
            Some((k, n)) if k == low => Some(n / d),
            Some(_) => None,
        }
    }
}

/// Sum of two polynomials.
pub(crate) fn sum(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    let at = |v: &[IBig], k: usize| v.get(k).cloned().unwrap_or_default();
    dense::trim((0..a.len().max(b.len())).map(|k| at(a, k) + at(b, k)).collect())
}

/// Difference of two polynomials.
pub(crate) fn difference(a: &[IBig], b: &[IBig]) -> Vec<IBig> {
    sum(a, &b.iter().map(|c| -c).collect::<Vec<_>>())
}

/// Product with a number.
pub(crate) fn times(a: &[IBig], by: &IBig) -> Vec<IBig> {
    dense::trim(a.iter().map(|c| c * by).collect())
}

/// p((1 + w)/(1 - w))·(1 - w)^n, n not below the degree: the inside of the unit circle becomes the left half-plane, and
/// z = exp(jωT) becomes w = j·tan(ωT/2).
pub(crate) fn bilinear(p: &[IBig], n: usize) -> Vec<IBig> {
    let (plus, minus) = ([IBig::ONE, IBig::ONE], [IBig::ONE, -IBig::ONE]);
    let mut down = vec![IBig::ONE];
    for _ in p.len()..=n {
        down = dense::product(&down, &minus);
    }
    // Horner's rule; `down` is (1 - w)^(n - k) at the power k.
    let mut out = Vec::new();
    for c in p.iter().rev() {
        out = sum(&dense::product(&out, &plus), &times(&down, c));
        down = dense::product(&down, &minus);
    }
    out
}

/// The largest time of which all dead times are whole multiples, with the largest multiple; `None` without dead times.
pub(crate) fn common_step(q: &Quasi) -> Option<(RBig, UBig)> {
    let mut step: Option<RBig> = None;
    for (delay, _) in q.terms.iter().filter(|t| t.0 != RBig::ZERO) {
        step = Some(match step {
            None => delay.clone(),
            Some(s) => {
                let (a, b) =
                    (UBig::try_from(s.numerator().clone()).ok()?, UBig::try_from(delay.numerator().clone()).ok()?);
                let (c, d) = (s.denominator(), delay.denominator());
                RBig::from_parts(IBig::from((a * d).gcd(b * c)), c * d)
            }
        });
    }
    let step = step?;
    let most = q.terms.last()?.0.clone() / &step;
    Some((step, UBig::try_from(most.numerator().clone()).ok()?))
}

#[cfg(test)]
pub(crate) mod tests {
    use super::*;

    /// Coefficients from small numbers, lowest power first.
    pub(crate) fn poly(a: &[i64]) -> Vec<IBig> {
        dense::trim(a.iter().map(|&c| IBig::from(c)).collect())
    }

    /// A ratio of two polynomials.
    pub(crate) fn ratio(n: &[i64], d: &[i64]) -> Ratio {
        delayed_ratio(n, d, RBig::ZERO)
    }

    /// The same behind a dead time.
    pub(crate) fn delayed_ratio(n: &[i64], d: &[i64], delay: RBig) -> Ratio {
        let num = Quasi::polynomial(poly(n)).delayed(&delay);
        Ratio::new(num, Quasi::polynomial(poly(d))).expect("not over 0")
    }

    /// Numbers as ratios.
    pub(crate) fn part(n: i64, d: u64) -> RBig {
        RBig::from_parts(IBig::from(n), UBig::from(d))
    }

    #[test]
    fn values_at_zero_come_from_the_power_series() {
        // (1 - exp(-2 s))/s is 2 at 0; 1/s has a pole; s/(s + 1) is 0.
        let gap = Quasi::from_terms(vec![(RBig::ZERO, poly(&[1])), (part(2, 1), poly(&[-1]))]);
        let hold = Ratio::new(gap, Quasi::polynomial(poly(&[0, 1]))).expect("not over 0");
        assert_eq!(hold.at_zero(), Some(part(2, 1)));
        assert_eq!(ratio(&[1], &[0, 1]).at_zero(), None);
        assert_eq!(ratio(&[0, 1], &[1, 1]).at_zero(), Some(RBig::ZERO));
        assert_eq!(ratio(&[3], &[4, 1]).at_zero(), Some(part(3, 4)));
    }

    #[test]
    fn the_bilinear_map_of_a_pole_at_one_half() {
        // 2 z - 1 = (2 (1 + w) - (1 - w))/(1 - w) = (1 + 3 w)/(1 - w)
        assert_eq!(bilinear(&poly(&[-1, 2]), 1), poly(&[1, 3]));
        // With n = 2 once more (1 - w).
        assert_eq!(bilinear(&poly(&[-1, 2]), 2), poly(&[1, 2, -3]));
    }

    #[test]
    fn dead_times_have_a_common_step() {
        let q = Quasi::from_terms(vec![(RBig::ZERO, poly(&[1])), (part(3, 10), poly(&[2])), (part(1, 2), poly(&[5]))]);
        assert_eq!(common_step(&q), Some((part(1, 10), UBig::from(5u8))));
        let (common, rest) =
            Quasi::from_terms(vec![(RBig::ZERO, poly(&[1, 2, 1])), (part(1, 1), poly(&[1, 1]))]).split();
        assert_eq!((common, rest.terms[0].1.clone()), (poly(&[1, 1]), poly(&[1, 1])));
    }
}
