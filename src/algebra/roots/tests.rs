//! Roots against published values, closed forms and constructed products.

use super::*;
use crate::algebra::dense::{product, tests::poly};

fn power(a: &[IBig], k: usize) -> Vec<IBig> {
    (0..k).fold(poly(&[1]), |p, _| product(&p, a))
}

fn told(p: &[IBig]) -> Vec<(f64, f64, u32)> {
    roots(p).expect("roots").iter().map(|r| (r.re, r.im, r.multiplicity)).collect()
}

/// J. H. Wilkinson, "The evaluation of the zeros of ill-conditioned polynomials", Numerische Mathematik 1 (1959).
#[test]
fn wilkinsons_polynomial() {
    let p = (1..=20).fold(poly(&[1]), |p, k| product(&p, &poly(&[-k, 1])));
    let expected: Vec<_> = (1..=20).map(|k| (f64::from(k), 0.0, 1)).collect();
    assert_eq!(told(&p), expected);
}

/// The same with -210 - 2^-23 for the coefficient -210: the roots that Wilkinson published, to the nine decimals he
/// gave (1959; quoted in his "Rounding Errors in Algebraic Processes", 1963; from memory).
#[test]
fn wilkinsons_perturbed_polynomial() {
    let mut p = (1..=20).fold(poly(&[1 << 23]), |p, k| product(&p, &poly(&[-k, 1])));
    p[19] -= IBig::ONE;
    let complex = [
        (10.095_266_145, 0.643_500_904),
        (11.793_633_881, 1.652_329_728),
        (13.992_358_137, 2.518_830_070),
        (16.730_737_466, 2.812_624_894),
        (19.502_439_400, 1.940_330_347),
    ];
    let real =
        [1.0, 2.0, 3.0, 4.0, 4.999_999_928, 6.000_006_944, 6.999_697_234, 8.007_267_603, 8.917_250_249, 20.846_908_101];
    let found = told(&p);
    for (re, im) in complex.iter().copied().chain(real.iter().map(|&r| (r, 0.0))) {
        let hit = found.iter().filter(|r| (r.0 - re).abs() < 6e-10 && (r.1.abs() - im).abs() < 6e-10).count();
        assert_eq!(hit, if im == 0.0 { 1 } else { 2 }, "{re} {im} in {found:?}");
    }
    assert!(found.iter().filter(|r| r.1 == 0.0).count() == 10);
}

#[test]
fn tenfold_roots_and_zeros() {
    let p = product(&power(&poly(&[1, 1]), 10), &power(&poly(&[0, 1]), 3));
    assert_eq!(told(&p), [(-1.0, 0.0, 10), (0.0, 0.0, 3)]);
    // (3 s + 1)^10 (s^2 + 2)^4
    let q = product(&power(&poly(&[1, 3]), 10), &power(&poly(&[2, 0, 1]), 4));
    let w = std::f64::consts::SQRT_2;
    assert_eq!(told(&q), [(-1.0 / 3.0, 0.0, 10), (0.0, -w, 4), (0.0, w, 4)]);
}

#[test]
fn axis_and_circle_are_recognised_exactly() {
    // (s^2 + 1)(s^2 - 3)(s^2 + s + 1)(s + 1)(2 s + 1)(s + 2)
    let p = [[1, 0, 1], [-3, 0, 1], [1, 1, 1], [1, 1, 0], [1, 2, 0], [2, 1, 0]]
        .iter()
        .fold(poly(&[1]), |p, f| product(&p, dense::trimmed(&poly(f))));
    let found = roots(&p).expect("roots");
    let axis: Vec<_> = found.iter().filter(|r| r.on_axis).map(|r| (r.re, r.im)).collect();
    assert_eq!(axis, [(0.0, -1.0), (0.0, 1.0)]);
    let circle: Vec<_> = found.iter().filter(|r| r.on_circle).map(|r| (r.re, r.im)).collect();
    let h = 3f64.sqrt() / 2.0;
    assert_eq!(circle, [(-1.0, 0.0), (-0.5, -h), (-0.5, h), (0.0, -1.0), (0.0, 1.0)]);
    // All but one 1e-30 beside the axis, and beside the circle.
    let big = IBig::from(10).pow(60);
    let near = product(&[&big + IBig::ONE, IBig::from(10).pow(30) * 2, big.clone()], &poly(&[1, 0, 1]));
    let found = roots(&near).expect("roots");
    assert_eq!(found.iter().map(|r| r.re).collect::<Vec<_>>(), [-1e-30, -1e-30, 0.0, 0.0]);
    assert_eq!(found.iter().map(|r| r.on_circle).collect::<Vec<_>>(), [false, false, true, true]);
}

#[test]
fn clusters_and_wide_scales() {
    // Five roots 1e-12 apart, exactly representable scale: (10^12 s + 10^12 + k), k = 0..4
    let big = IBig::from(10).pow(12);
    let p = (0..5).fold(poly(&[1]), |p, k| product(&p, &[&big + IBig::from(k), big.clone()]));
    let expected: Vec<f64> = (0..5).rev().map(|k| -((1e12 + f64::from(k)) / 1e12)).collect();
    assert_eq!(told(&p).iter().map(|r| r.0).collect::<Vec<_>>(), expected);
    // Roots -10^k for k = -9..9: coefficients over 90 decades.
    let q = (-9i32..=9).fold(poly(&[1]), |p, k| {
        let ten = IBig::from(10).pow(k.unsigned_abs() as usize);
        product(&p, &if k < 0 { [IBig::ONE, ten] } else { [ten, IBig::ONE] })
    });
    let expected: Vec<f64> = (-9i32..=9).rev().map(|k| format!("-1e{k}").parse().expect("number")).collect();
    assert_eq!(told(&q).iter().map(|r| r.0).collect::<Vec<_>>(), expected);
}

#[test]
fn degenerate_input() {
    assert_eq!(roots(&[]), Err(RootsError::Zero));
    assert_eq!(roots(&poly(&[0, 0])), Err(RootsError::Zero));
    assert_eq!(roots(&poly(&[5])), Ok(Vec::new()));
    assert_eq!(roots(&[IBig::ONE << 3000, IBig::ONE]), Err(RootsError::OutOfRange));
    assert_eq!(told(&[IBig::ONE, IBig::ONE << 3000]), [(0.0, 0.0, 1)]);
}
