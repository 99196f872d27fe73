//! From factors modulo a prime to factors over the integers: Hensel's lemma, then sets of factors that divide.

use super::finite;
use crate::algebra::gcd::dense::primitive;
use crate::algebra::poly::coefficients::Coefficient;
use crate::algebra::poly::dense::{divide, multiply};
use crate::algebra::prime::Prime;
use crate::algebra::residues;
use dashu_base::{Sign, UnsignedAbs};
use dashu_int::{IBig, UBig};

/// The residue nearest to 0.
fn centred(x: &IBig, modulus: &IBig) -> IBig {
    let r = x % modulus;
    let twice: IBig = &r * 2;
    if twice.clone().unsigned_abs() <= modulus.clone().unsigned_abs() {
        r
    } else if r.sign() == Sign::Negative {
        r + modulus
    } else {
        r - modulus
    }
}

fn reduce(values: &[IBig], modulus: &IBig) -> Vec<IBig> {
    let mut out: Vec<IBig> = values.iter().map(|c| centred(c, modulus)).collect();
    while out.last().is_some_and(Coefficient::is_zero) {
        out.pop();
    }
    out
}

fn added(a: &[IBig], b: &[IBig], minus: bool) -> Vec<IBig> {
    let mut out = a.to_vec();
    out.resize(a.len().max(b.len()), IBig::ZERO);
    for (o, c) in out.iter_mut().zip(b) {
        if minus { *o -= c } else { *o += c }
    }
    out
}

/// Quotient and remainder by a monic polynomial modulo a number.
fn div_rem(a: &[IBig], b: &[IBig], modulus: &IBig) -> (Vec<IBig>, Vec<IBig>) {
    let mut rest = a.to_vec();
    if rest.len() < b.len() {
        return (Vec::new(), rest);
    }
    let mut quotient = vec![IBig::ZERO; rest.len() - b.len() + 1];
    for k in (0..quotient.len()).rev() {
        let q = centred(&rest[k + b.len() - 1], modulus);
        if !q.is_zero() {
            for (r, c) in rest[k..].iter_mut().zip(b) {
                r.sub_product(&q, c);
            }
        }
        quotient[k] = q;
    }
    rest.truncate(b.len() - 1);
    (reduce(&quotient, modulus), reduce(&rest, modulus))
}

/// Residues as integers nearest to 0.
fn integers(prime: &Prime, values: &[u64]) -> Vec<IBig> {
    let modulus = IBig::from(prime.p);
    values.iter().map(|c| centred(&IBig::from(prime.value(*c)), &modulus)).collect()
}

/// How far to lift: a number that products of a leading coefficient and a factor's coefficients stay below by half.
/// Factors obey Mignotte's bound 2^n ‖f‖₂ ("An inequality about factors of polynomials", 1974).
fn bound(f: &[IBig]) -> UBig {
    let most = f.iter().map(|c| c.clone().unsigned_abs()).max().unwrap_or_default();
    let lead = f.last().map(|c| c.clone().unsigned_abs()).unwrap_or_default();
    (most * lead * UBig::from(f.len())) << (f.len() + 2)
}

/// f = g·h modulo p^k, from factors modulo p; `h` monic (von zur Gathen and Gerhard, Modern Computer Algebra, alg. 15.10).
fn lift_pair(prime: &Prime, f: &[IBig], g: &[u64], h: &[u64], target: &IBig) -> (Vec<IBig>, Vec<IBig>) {
    let (s, t) = residues::bezout(prime, g, h);
    let [mut g, mut h, mut s, mut t] = [g, h, &s, &t].map(|v| integers(prime, v));
    let mut modulus = IBig::from(prime.p);
    while modulus < *target {
        modulus = &modulus * &modulus;
        let m = &modulus;
        let error = reduce(&added(f, &multiply(&g, &h), true), m);
        let (q, r) = div_rem(&reduce(&multiply(&s, &error), m), &h, m);
        let more = added(&multiply(&t, &error), &multiply(&q, &g), false);
        g = reduce(&added(&g, &more, false), m);
        h = reduce(&added(&h, &r, false), m);
        let mut error = added(&multiply(&s, &g), &multiply(&t, &h), false);
        error[0] -= IBig::ONE;
        let error = reduce(&error, m);
        let (q, r) = div_rem(&reduce(&multiply(&s, &error), m), &h, m);
        s = reduce(&added(&s, &r, true), m);
        let more = added(&multiply(&t, &error), &multiply(&q, &g), false);
        t = reduce(&added(&t, &more, true), m);
    }
    (g, h)
}

/// All factors lifted, monic modulo p^(2^k), the first such power from `target` on, which is given back.
fn lift_all(prime: &Prime, f: &[IBig], factors: Vec<Vec<u64>>, target: &IBig) -> (Vec<Vec<IBig>>, IBig) {
    let mut modulus = IBig::from(prime.p);
    while modulus < *target {
        modulus = &modulus * &modulus;
    }
    let lead = f.last().map_or(0, |c| prime.of_big(c));
    let mut open = vec![(f.to_vec(), factors, lead)];
    let mut out = Vec::new();
    while let Some((f, mut left, lead)) = open.pop() {
        if left.len() == 1 {
            let inverse = f.last().map_or(IBig::ONE, |c| invert(prime, c, &modulus));
            out.push(reduce(&f.iter().map(|c| c * &inverse).collect::<Vec<_>>(), &modulus));
            continue;
        }
        let right = left.split_off(left.len() / 2);
        let product = |list: &[Vec<u64>], c: u64| list.iter().fold(vec![c], |p, f| residues::mul(prime, &p, f));
        let (g, h) = lift_pair(prime, &f, &product(&left, lead), &product(&right, prime.one), target);
        open.push((g, left, lead));
        open.push((h, right, prime.one));
    }
    (out, modulus)
}

/// 1/c modulo a power of the prime, by Newton's iteration.
fn invert(prime: &Prime, c: &IBig, modulus: &IBig) -> IBig {
    let mut x = IBig::from(prime.value(prime.inverse(prime.of_big(c))));
    let mut good = IBig::from(prime.p);
    while good < *modulus {
        good = &good * &good;
        x = centred(&(&x * (IBig::from(2) - c * &x)), &good);
    }
    centred(&x, modulus)
}

/// The primitive linear factor whose root a simple root modulo the prime may stand for.
pub(super) fn rational_root(prime: &Prime, f: &[IBig], root: u64) -> Option<Vec<IBig>> {
    let image: Vec<u64> = f.iter().map(|c| prime.of_big(c)).collect();
    let slope = residues::derivative(prime, &image);
    if finite::value(prime, &image, root) != 0 || finite::value(prime, &slope, root) == 0 {
        return None;
    }
    // A root a/b has b dividing the leading coefficient and a the lowest that is not 0: lead·root is that small.
    let lead = f.last()?;
    let lowest = f.iter().find(|c| !c.is_zero())?;
    let target = IBig::from((lead.clone().unsigned_abs() * lowest.clone().unsigned_abs()) << 2) + IBig::from(4);
    let mut modulus = IBig::from(prime.p);
    let mut x = IBig::from(prime.value(root));
    let derivative: Vec<IBig> = f.iter().enumerate().skip(1).map(|(k, c)| c * IBig::from(k)).collect();
    let value = |f: &[IBig], x: &IBig, m: &IBig| f.iter().rev().fold(IBig::ZERO, |v, c| centred(&(v * x + c), m));
    while modulus < target {
        modulus = &modulus * &modulus;
        let slope = value(&derivative, &x, &modulus);
        x = centred(&(&x - value(f, &x, &modulus) * invert(prime, &slope, &modulus)), &modulus);
    }
    Some(primitive(vec![-centred(&(lead * x), &modulus), lead.clone()]))
}

/// Factors over the integers of a primitive square-free polynomial, from its monic factors modulo the prime. After
/// `most` sets of them the rest is left whole.
pub(super) fn recombine(prime: &Prime, f: Vec<IBig>, local: Vec<Vec<u64>>, most: usize) -> Vec<Vec<IBig>> {
    let target = IBig::from(bound(&f));
    let (mut lifted, modulus) = lift_all(prime, &f, local, &target);
    let (mut rest, mut out, mut tried) = (f, Vec::new(), 0);
    let mut size = 1;
    while 2 * size <= lifted.len() {
        let mut set: Vec<usize> = (0..size).collect();
        let found = loop {
            tried += 1;
            if tried > most {
                out.push(rest);
                return out;
            }
            if let Some(found) = divisor(&rest, &lifted, &set, &modulus) {
                break Some(found);
            }
            if !following(&mut set, lifted.len()) {
                break None;
            }
        };
        match found {
            Some((factor, quotient)) => {
                out.push(factor);
                rest = quotient;
                let mut at = 0;
                lifted.retain(|_| {
                    at += 1;
                    !set.contains(&(at - 1))
                });
            }
            None => size += 1,
        }
    }
    if rest.len() > 1 {
        out.push(rest);
    }
    out
}

/// The factor that a set of lifted ones makes, with what it leaves of `f`.
fn divisor(f: &[IBig], lifted: &[Vec<IBig>], set: &[usize], modulus: &IBig) -> Option<(Vec<IBig>, Vec<IBig>)> {
    let lead = f.last()?;
    // The constant terms tell most wrong sets at little cost.
    let low = set.iter().fold(lead.clone(), |p, &i| centred(&(p * &lifted[i][0]), modulus));
    let goal = lead * f.first()?;
    if low.is_zero() != goal.is_zero() || (!low.is_zero() && !(&goal % &low).is_zero()) {
        return None;
    }
    let product = set.iter().fold(vec![lead.clone()], |p, &i| reduce(&multiply(&p, &lifted[i]), modulus));
    let factor = primitive(product);
    let quotient = divide(f, &factor)?;
    Some((factor, quotient))
}

/// The next set of the same size, in lexicographic order; false after the last.
fn following(set: &mut [usize], count: usize) -> bool {
    let size = set.len();
    for i in (0..size).rev() {
        if set[i] < count - size + i {
            set[i] += 1;
            for j in i + 1..size {
                set[j] = set[j - 1] + 1;
            }
            return true;
        }
    }
    false
}
