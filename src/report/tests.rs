//! Whole texts at 80 columns, as they stand on the screen.

use super::*;
use crate::algebra::{IBig, Poly, Var};
use crate::results::mason::{Mason, MasonBranch, MasonGain, MasonGroup, MasonLoop, MasonPath, MasonResult};
use crate::results::{Decimal, Derive, Form, Root, Transfer, TransferKind};
use std::sync::Arc;

const S: Var = Var::S;
const DELAY: Var = Var(1);
const K: Var = Var(2);
const T: Var = Var(3);

fn poly(terms: &[(i64, &[(Var, u32)])]) -> Poly {
    Poly::from_terms(terms.iter().map(|(c, m)| (m.to_vec(), IBig::from(*c))))
}

/// A polynomial in s from its coefficients, the highest power first.
fn dense(coefficients: &[i64]) -> Poly {
    let n = coefficients.len() as u32;
    Poly::from_terms(coefficients.iter().zip(0..).map(|(&c, i)| (vec![(S, n - 1 - i)], IBig::from(c))))
}

fn transfer(numerator: Poly, denominator: Poly) -> Transfer {
    let names = [(DELAY, "exp(-(1/10)*s)"), (K, "Kp"), (T, "Ti")];
    Transfer {
        kind: TransferKind::Transfer,
        to: "y".into(),
        from: "r".into(),
        at: vec![],
        open: vec![],
        kept: vec![],
        case: "nominal".into(),
        variable: "s",
        sampling_period: None,
        exact: true,
        numerator: None,
        denominator: None,
        decimal: None,
        cancelled: vec![],
        poles: None,
        zeros: None,
        dc_gain: None,
        converges_right_of: Some(None),
        converges_outside: None,
        stable: None,
        verified: None,
        form: Some(Form {
            numerator: Arc::new(numerator),
            denominator: Arc::new(denominator),
            names: names.map(|(v, n)| (v, n.to_owned())).to_vec(),
        }),
    }
}

fn root(re: f64, im: f64, multiplicity: u32) -> Root {
    Root { re, im, multiplicity }
}

fn told(transfers: Vec<Transfer>, fraction: FractionStyle) -> String {
    let document = Derive {
        schema: "loopwright.derive.1",
        model: "heliostat".into(),
        ok: true,
        diagnostics: vec![],
        transfers,
        characteristic: vec![],
    };
    let mut out = Vec::new();
    derive(&document, TextOptions { width: 80, fraction }, &mut out).expect("a vector takes it");
    let text = String::from_utf8(out).expect("text is UTF-8");
    assert!(text.lines().all(|l| l.chars().count() <= 80 && l.trim_end() == l), "{text}");
    text
}

fn servo() -> Transfer {
    // 600 (s + 4)/(25 (s + 1)(s + 2 + 3j)(s + 2 - 3j))
    Transfer {
        poles: Some(vec![root(-1.0, 0.0, 1), root(-2.0, 3.0, 1), root(-2.0, -3.0, 1)]),
        zeros: Some(vec![root(-4.0, 0.0, 1)]),
        dc_gain: Some(2400.0 / 325.0),
        converges_right_of: Some(Some(-1.0)),
        stable: Some(true),
        cancelled: vec!["s + 2".into(), "s + 2".into(), "s + 1/3".into()],
        ..transfer(dense(&[600, 2400]), dense(&[25, 125, 425, 325]))
    }
}

#[test]
fn a_stable_transfer_function_has_all_its_facts() {
    assert_eq!(
        told(vec![servo()], FractionStyle::Automatic),
        "heliostat, nominal values

               24·(s + 4)
y / r = ─────────────────────────
         (s + 1)·(s² + 4·s + 13)

  poles           s = -1        time constant 1 s
                  s = -2 ± j3   ω_n = 3.606 rad/s, ζ = 0.5547
  zeros           s = -4
  gain at s = 0   96/13
  converges       right of Re s = -1; the jω axis lies inside
  cancelled       (s + 2)²·(s + 1/3), hidden modes

Roots and figures are rounded here (--format json has all digits); fractions are
exact unless they say otherwise.
"
    );
}

/// The fraction alone: what stands before the facts, without the title.
fn fraction(t: Transfer, style: FractionStyle) -> String {
    let text = told(vec![t], style);
    let fraction = text.split("\n\n").nth(1).map(|f| f.trim_end_matches('\n').to_owned()).unwrap_or_default();
    if fraction.contains('\n') { format!("\n{fraction}") } else { fraction }
}

#[test]
fn a_fraction_is_written_as_asked() {
    assert_eq!(
        fraction(servo(), FractionStyle::Expanded),
        "
               24·s + 96
y / r = ───────────────────────
         s³ + 5·s² + 17·s + 13"
    );
    let lags = || transfer(dense(&[6, 12]), dense(&[5, 52, 20]));
    assert_eq!(
        fraction(lags(), FractionStyle::TimeConstants),
        "
               0.6·(0.5 [s]·s + 1)
y / r = ─────────────────────────────────
         (2.5 [s]·s + 1)·(0.1 [s]·s + 1)"
    );
    assert_eq!(
        fraction(lags(), FractionStyle::Factored),
        "
            1.2·(s + 2)
y / r = ────────────────────
         (s + 0.4)·(s + 10)"
    );
    assert_eq!(
        fraction(transfer(dense(&[1, 5, 6]), dense(&[1, 1, 3, 7])), FractionStyle::Automatic),
        "
          (s + 2)·(s + 3)
y / r = ───────────────────
         s³ + s² + 3·s + 7"
    );
    assert_eq!(
        fraction(transfer(dense(&[7]), dense(&[3, 0, 75, 0, 0])), FractionStyle::TimeConstants),
        "
                    7
y / r = ──────────────────────────
         75·s²·(0.04 [s²]·s² + 1)"
    );
    assert_eq!(fraction(transfer(Poly::zero(), Poly::one()), FractionStyle::Automatic), "y / r = 0");
    assert_eq!(fraction(transfer(dense(&[5]), dense(&[2])), FractionStyle::Expanded), "y / r = 2.5");
    assert_eq!(fraction(transfer(dense(&[-1, 2]), dense(&[1])), FractionStyle::Automatic), "y / r = -(s - 2)");
}

#[test]
fn symbols_and_dead_times_keep_their_names() {
    let pi_control = transfer(
        poly(&[(1, &[(S, 1), (K, 1), (T, 1)]), (1, &[(K, 1)])]),
        poly(&[(1, &[(S, 2), (T, 1)]), (1, &[(S, 1), (K, 1), (T, 1)]), (2, &[(S, 1), (T, 1)]), (1, &[(K, 1)])]),
    );
    assert_eq!(
        told(vec![pi_control], FractionStyle::Automatic),
        "heliostat, nominal values

                 Kp·(Ti·s + 1)
y / r = ───────────────────────────────
         Ti·s² + (Kp·Ti + 2·Ti)·s + Kp

  symbols         Kp, Ti
  poles, zeros    depend on the symbols
  gain at s = 0   1
"
    );
    let delayed = transfer(poly(&[(1, &[(DELAY, 1)])]), poly(&[(2, &[(S, 1)]), (1, &[(DELAY, 1)])]));
    assert_eq!(
        told(vec![delayed], FractionStyle::Automatic),
        "heliostat, nominal values

            exp(-0.1·s)
y / r = ───────────────────
         2·s + exp(-0.1·s)

  poles           infinitely many: there is a dead time below the rule
  zeros           none
  gain at s = 0   1
"
    );
}

#[test]
fn a_symbol_of_a_dead_time_is_listed() {
    let mut late = transfer(poly(&[(1, &[(DELAY, 1)])]), poly(&[(1, &[(S, 1)]), (1, &[])]));
    late.kept = vec!["Td".into(), "T".into()];
    if let Some(form) = &mut late.form {
        form.names = vec![(DELAY, "exp(-(Td)*s)".into())];
    }
    let text = told(vec![late], FractionStyle::Automatic);
    assert!(text.contains("  symbols         Td\n  poles, zeros    depend on the symbols\n"), "{text}");
}

#[test]
fn a_transform_that_does_not_converge_on_the_axis_is_said_so_in_a_sentence() {
    let double_integrator = Transfer {
        kind: TransferKind::Loop,
        to: "u".into(),
        from: "loop at u".into(),
        at: vec!["u".into()],
        poles: Some(vec![root(0.0, 0.0, 2), root(0.0, 5.0, 1), root(0.0, -5.0, 1)]),
        zeros: Some(vec![]),
        converges_right_of: Some(Some(0.0)),
        stable: Some(false),
        ..transfer(dense(&[7]), dense(&[3, 0, 75, 0, 0]))
    };
    let unstable = Transfer {
        open: vec!["v".into()],
        case: "cold".into(),
        poles: Some(vec![root(2.0, 0.0, 1)]),
        zeros: Some(vec![]),
        converges_right_of: Some(Some(2.0)),
        stable: Some(false),
        ..transfer(dense(&[1]), dense(&[1, -2]))
    };
    assert_eq!(
        told(vec![double_integrator, unstable], FractionStyle::Automatic),
        "heliostat, cases nominal, cold

                              7
loop at u in nominal = ────────────────
                        3·s²·(s² + 25)

  poles           s = 0 (twice)
                  s = ±j5         ω_n = 5 rad/s, ζ = 0
  zeros           none
  gain at s = 0   none: there is a pole at s = 0
  converges       right of Re s = 0
  The jω axis is not in the region of convergence (no statement on the closed
  loop).


                               1
y / r with v open in cold = ───────
                             s - 2

  poles           s = 2
  zeros           none
  gain at s = 0   -0.5
  converges       right of Re s = 2
  The jω axis is not in the region of convergence: a sine at r has no
  steady-state response at y.
"
    );
}

#[test]
fn sampled_results_speak_of_the_circle() {
    let sampled = Transfer {
        variable: "z",
        sampling_period: Some("1/1000".into()),
        converges_right_of: None,
        converges_outside: Some(Some(0.8)),
        stable: Some(true),
        poles: Some(vec![root(0.8, 0.0, 1)]),
        zeros: Some(vec![root(-0.5, 0.0, 1)]),
        ..transfer(dense(&[2, 1]), dense(&[10, -8]))
    };
    assert_eq!(
        told(vec![sampled], FractionStyle::TimeConstants),
        "heliostat, nominal values

         0.2·(z + 0.5)
y / r = ───────────────
            z - 0.8

  sampled every   0.001 s
  poles           z = 0.8   time constant 0.004481 s
  zeros           z = -0.5
  gain at z = 1   1.5
  converges       outside |z| = 0.8; the unit circle lies inside

Roots and figures are rounded here (--format json has all digits); fractions are
exact unless they say otherwise.
"
    );
}

#[test]
fn rounded_results_say_so() {
    let rounded = Transfer {
        exact: false,
        form: None,
        decimal: Some(Decimal { numerator: vec![1.412_345_678, 0.0], denominator: vec![1.0, -0.25, 2e-7] }),
        ..servo()
    };
    let text = told(vec![rounded], FractionStyle::Automatic);
    assert!(text.contains("         s² - 0.25·s + 2e-7\n"), "{text}");
    assert!(text.contains("            1.41235·s\n"), "{text}");
    assert!(text.contains("\n  Rounded: a value in it is not rational."), "{text}");
    let long = Poly::from_terms((0..30u32).map(|k| (vec![(S, k)], IBig::from(7u8).pow(60 + k as usize))));
    let text = told(vec![transfer(dense(&[1]), long)], FractionStyle::Automatic);
    assert!(text.contains("    s²⁹ + 0.142857·s²⁸ + "), "{text}");
    assert!(text.contains("  Coefficients are rounded to 6 digits here; --format json has them exactly.\n"), "{text}");
    assert!(text.contains("gain at s = 0   1.96842e-51\n"), "{text}");
}

#[test]
fn long_sums_and_long_lists_are_broken_and_cut() {
    let terms = (0..40u32).map(|k| {
        let powers = vec![(S, k % 7), (Var(2 + k % 5), 1 + k % 3), (Var(2 + k % 4), 1)];
        (powers, IBig::from(i64::from(k) - 12))
    });
    let mut t = transfer(dense(&[1]), Poly::from_terms(terms));
    if let Some(form) = &mut t.form {
        form.names = (0..5).map(|k| (Var(2 + k), format!("K_{k}"))).collect();
    }
    t.to = "az.motor.shaft.position".into();
    t.from = "commanded_azimuth".into();
    let roots: Vec<Root> = (1..=40).map(|k| root(-f64::from(k), 0.0, 1)).collect();
    t.poles = Some(roots);
    let text = told(vec![t], FractionStyle::Automatic);
    assert!(text.contains("\naz.motor.shaft.position / commanded_azimuth =\n"), "{text}");
    assert!(text.contains(&format!("\n    {}\n    (8·K_0⁴", "─".repeat(76))), "{text}");
    assert!(text.contains("s = -16   time constant 0.0625 s\n"), "{text}");
    assert!(text.contains("… and 24 more; --format json lists all\n"), "{text}");
    assert!(!text.contains("s = -17"), "{text}");
}

#[test]
fn nothing_is_written_of_no_results() {
    let document = Derive {
        schema: "loopwright.derive.1",
        model: "m".into(),
        ok: false,
        diagnostics: vec![],
        transfers: vec![],
        characteristic: vec![],
    };
    let mut out = Vec::new();
    derive(&document, TextOptions::default(), &mut out).expect("a vector takes it");
    assert!(out.is_empty());
}

/// Two lags in a row, each with a loop of its own.
fn two_loops() -> Mason {
    let branch = |name: &str, from: &str, to: &str, expression: &str| MasonBranch {
        name: name.into(),
        from: from.into(),
        to: to.into(),
        expression: expression.into(),
    };
    let list = |text: &str| text.split(' ').map(str::to_owned).collect::<Vec<_>>();
    let gain = |name: &str, names: &str, expression: &str| MasonGain {
        name: name.into(),
        names: names.into(),
        expression: expression.into(),
    };
    let one = |k: u32, letter: &str, expression: &str| MasonLoop {
        name: format!("L{k}"),
        signals: list(&format!("e{k} y{k}")),
        branches: vec![branch(letter, &format!("e{k}"), &format!("y{k}"), expression.trim_start_matches('-'))],
        names: format!("-{letter}"),
        expression: expression.into(),
    };
    Mason {
        schema: "loopwright.mason.1",
        model: "two_tanks".into(),
        ok: true,
        diagnostics: vec![],
        to: "y2".into(),
        from: "r".into(),
        at: vec![],
        open: vec![],
        kept: vec![],
        case: "nominal".into(),
        variable: "s",
        sampling_period: None,
        exact: true,
        paths: vec![MasonPath {
            name: "P1".into(),
            signals: list("r e1 y1 e2 y2"),
            branches: vec![branch("A", "e1", "y1", "1/(2*s)"), branch("B", "e2", "y2", "23/20")],
            names: "A*B".into(),
            expression: "23/(40*s)".into(),
            touches: list("L1 L2"),
        }],
        loops: vec![one(1, "A", "-1/(2*s)"), one(2, "B", "-23/20")],
        groups: vec![MasonGroup { loops: list("L1 L2"), expression: "23/(40*s)".into() }],
        determinant: gain("D", "1 - L1 - L2 + L1*L2", "(86*s + 43)/(40*s)"),
        cofactors: vec![gain("D1", "1", "1")],
        gain: MasonResult {
            names: "P1*D1/D".into(),
            expression: "23/(86*s + 43)".into(),
            numerator: None,
            denominator: None,
            form: Some(Form {
                numerator: Arc::new(dense(&[23])),
                denominator: Arc::new(dense(&[86, 43])),
                names: vec![],
            }),
        },
    }
}

#[test]
fn masons_rule_can_be_followed_with_a_pencil() {
    let mut out = Vec::new();
    mason(&two_loops(), TextOptions::default(), &mut out).expect("a vector takes it");
    assert_eq!(
        String::from_utf8_lossy(&out),
        "two_tanks, nominal values: y2 / r by Mason's gain rule

Branches
  A   e1 → y1   1/(2·s)
  B   e2 → y2   1.15

Forward paths
  P1 = A·B = 23/(40·s)
       r → e1 → y1 → e2 → y2
       touches L1, L2

Loops
  L1 = -A = -1/(2·s)
       e1 → y1 → e1
  L2 = -B = -1.15
       e2 → y2 → e2

Groups of loops that do not touch one another
  L1·L2 = 23/(40·s)

Determinant
  D = 1 - L1 - L2 + L1·L2 = (86·s + 43)/(40·s)

Cofactors: the determinant without the loops that touch the path
  D1 = 1

Gain
  y2 / r = P1·D1/D

               23
y2 / r = ──────────────
          86·(s + 0.5)
"
    );
}
