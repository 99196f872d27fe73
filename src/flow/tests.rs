//! Whole derivations on netlists built by hand: closed forms, and three ways against each other on random netlists.

use super::*;
use crate::algebra::RBig;
use crate::netlist::expr::{Expr, ExprId, Exprs};
use crate::netlist::*;
use crate::results::TransferKind;
use crate::source::Span;
use std::collections::BTreeMap;

/// A netlist under construction; signals come into being when they are named.
pub(super) struct Net {
    pub(super) net: Netlist,
    known: BTreeMap<String, SignalId>,
    line: u32,
}

impl Net {
    pub(super) fn new() -> Self {
        let net = Netlist {
            model: "test".to_owned(),
            description: None,
            names: Names::default(),
            exprs: Exprs::default(),
            params: Vec::new(),
            signals: Vec::new(),
            sums: Vec::new(),
            terms: Vec::new(),
            blocks: Vec::new(),
            instances: Vec::new(),
            aliases: Vec::new(),
            units: Vec::new(),
            cases: Vec::new(),
            requests: Vec::new(),
            requirements: Vec::new(),
            time_base: TimeBase::Continuous,
            nominal: None,
        };
        Self { net, known: BTreeMap::new(), line: 0 }
    }

    fn span(&mut self) -> Span {
        self.line += 10;
        Span::new(self.line, self.line + 5)
    }

    pub(super) fn signal(&mut self, name: &str) -> SignalId {
        if let Some(&id) = self.known.get(name) {
            return id;
        }
        let id = SignalId(self.net.signals.len() as u32);
        let origin = Origin { span: self.span(), instance: None };
        let name_id = self.net.names.push(name);
        self.net.signals.push(Signal { name: name_id, driver: Driver::Nothing, output: false, origin, unit: None });
        self.known.insert(name.to_owned(), id);
        id
    }

    pub(super) fn input(&mut self, name: &str) {
        let id = self.signal(name);
        self.net.signals[id.index()].driver = Driver::Input;
    }

    pub(super) fn output(&mut self, name: &str) {
        let id = self.signal(name);
        self.net.signals[id.index()].output = true;
    }

    /// `sum("e", "r -y")`
    pub(super) fn sum(&mut self, output: &str, terms: &str) {
        let output = self.signal(output);
        let first_term = self.net.terms.len() as u32;
        for word in terms.split_whitespace() {
            let (negative, name) = word.strip_prefix('-').map_or((false, word), |rest| (true, rest));
            let signal = self.signal(name);
            self.net.terms.push(Term { negative, factor: None, signal });
        }
        let origin = Origin { span: self.span(), instance: None };
        let term_count = self.net.terms.len() as u32 - first_term;
        self.net.signals[output.index()].driver = Driver::Sum(SumId(self.net.sums.len() as u32));
        self.net.sums.push(Sum { output, first_term, term_count, origin });
    }

    fn push(&mut self, node: Expr) -> ExprId {
        self.net.exprs.push(node, Span::NONE)
    }

    pub(super) fn number(&mut self, n: i64, d: u64) -> ExprId {
        self.net.exprs.push_number(RBig::from_parts(n.into(), d.into()), Span::NONE)
    }

    pub(super) fn param(&mut self, name: &str) -> ExprId {
        let id = ParamId(self.net.params.len() as u32);
        let origin = Origin { span: self.span(), instance: None };
        let name = self.net.names.push(name);
        self.net.params.push(Param { name, value: None, within: None, unit: None, origin });
        self.push(Expr::Param(id))
    }

    /// A polynomial in s, its coefficients from the highest power down.
    fn poly(&mut self, coefficients: &[i64]) -> ExprId {
        let mut out = self.number(coefficients[0], 1);
        for &c in &coefficients[1..] {
            let s = self.push(Expr::S);
            let product = self.push(Expr::Mul(out, s));
            let c = self.number(c, 1);
            out = self.push(Expr::Add(product, c));
        }
        out
    }

    pub(super) fn ratio(&mut self, above: &[i64], below: &[i64]) -> ExprId {
        let (a, b) = (self.poly(above), self.poly(below));
        self.push(Expr::Div(a, b))
    }

    /// exp(-T·s) with T a whole number of seconds.
    pub(super) fn delay(&mut self, t: i64) -> ExprId {
        let argument = self.poly(&[-t, 0]);
        self.push(Expr::Delay(argument))
    }

    pub(super) fn block(&mut self, name: &str, input: &str, output: &str, law: ExprId) {
        self.add_block(name, &[input], &[output], Law::Scalar(law));
    }

    pub(super) fn add_block(&mut self, name: &str, inputs: &[&str], outputs: &[&str], law: Law) {
        let inputs: Box<[SignalId]> = inputs.iter().map(|n| self.signal(n)).collect();
        let outputs: Box<[SignalId]> = outputs.iter().map(|n| self.signal(n)).collect();
        let id = BlockId(self.net.blocks.len() as u32);
        for y in &outputs {
            self.net.signals[y.index()].driver = Driver::Block(id);
        }
        let origin = Origin { span: self.span(), instance: None };
        let name = self.net.names.push(name);
        self.net.blocks.push(Block { name, inputs, outputs, law, every: None, origin });
    }

    pub(super) fn asked(&mut self, name: &str) -> Asked {
        Asked { signal: self.signal(name), text: name.to_owned() }
    }

    pub(super) fn find(&mut self, to: &str, from: &str) {
        let kind = RequestKind::Transfer { to: self.asked(to), from: self.asked(from) };
        self.request(kind, &[]);
    }

    pub(super) fn find_loop(&mut self, at: &[&str]) {
        let kind = RequestKind::Loop { at: at.iter().map(|n| self.asked(n)).collect() };
        self.request(kind, &[]);
    }

    pub(super) fn request(&mut self, kind: RequestKind, open: &[&str]) {
        let open = open.iter().map(|n| self.asked(n)).collect();
        let span = self.span();
        self.net.requests.push(Request { kind, clauses: Clauses { open, ..Clauses::default() }, span });
    }

    pub(super) fn derive(&self) -> Derived {
        derive(&self.net, &DeriveOptions { verify: true, ..DeriveOptions::default() })
    }
}

/// `600 s^1 + 2400` as text, one term after the other, with dead times after `@`.
fn terms(terms: Option<&crate::results::Terms>) -> String {
    let told = |t: crate::results::ExactTerm| {
        let delay = if t.delay == "0" { String::new() } else { format!("@{}", t.delay) };
        format!("({})s^{}{delay}", t.coefficient, t.power)
    };
    terms.map_or_else(|| "null".to_owned(), |list| list.iter().map(told).collect::<Vec<_>>().join(" "))
}

fn ratio_of(t: &Transfer) -> String {
    assert!(t.verified.as_ref().is_none_or(|v| v.holds), "{} / {} verified", t.to, t.from);
    format!("{} / {}", terms(t.numerator.as_ref()), terms(t.denominator.as_ref()))
}

fn results(derived: &Derived) -> Vec<String> {
    assert!(derived.diagnostics.is_empty(), "{:?}", derived.diagnostics);
    derived.transfers.iter().map(ratio_of).collect()
}

/// A loop of two blocks: y = G·C·(r - y).
fn single_loop(c: (&[i64], &[i64]), g: (&[i64], &[i64])) -> Net {
    let mut net = Net::new();
    net.input("r");
    net.output("y");
    net.sum("e", "r -y");
    let law = net.ratio(c.0, c.1);
    net.block("C", "e", "u", law);
    let law = net.ratio(g.0, g.1);
    net.block("G", "u", "y", law);
    net
}

/// Closed form: C = 4(s + 2)/s, G = 1/((s + 2)(s + 5)); y/r = 4/(s² + 5 s + 4), and s + 2 is cancelled.
#[test]
fn a_cancelled_factor_is_listed() {
    let mut net = single_loop((&[4, 8], &[1, 0]), (&[1], &[1, 7, 10]));
    net.find("y", "r");
    net.find_loop(&["u"]);
    net.find("u", "u");
    let derived = net.derive();
    assert_eq!(
        results(&derived),
        ["(4)s^0 / (1)s^2 (5)s^1 (4)s^0", "(4)s^0 / (1)s^2 (5)s^1", "(1)s^2 (5)s^1 / (1)s^2 (5)s^1 (4)s^0"]
    );
    let y = &derived.transfers[0];
    assert_eq!(y.cancelled, ["s + 2"]);
    assert_eq!(y.poles.as_ref().map(|p| p.iter().map(|r| r.re).collect::<Vec<_>>()), Some(vec![-4.0, -1.0]));
    assert_eq!((y.dc_gain, y.converges_right_of, y.stable), (Some(1.0), Some(Some(-1.0)), Some(true)));
    let ratio = &derived.transfers[1];
    assert_eq!((ratio.kind, ratio.from.as_str(), ratio.dc_gain), (TransferKind::Loop, "loop at u", None));
    assert_eq!((ratio.stable, ratio.converges_right_of), (Some(false), Some(Some(0.0))));
}

/// Closed form: y/r = exp(-s)/(2 s + exp(-s)).
#[test]
fn dead_time_stays_exact() {
    let mut net = Net::new();
    net.input("r");
    net.output("y");
    net.sum("e", "r -y");
    let law = net.number(1, 2);
    net.block("C", "e", "u", law);
    let (delay, below) = (net.delay(1), net.poly(&[1, 0]));
    let law = net.push(Expr::Div(delay, below));
    net.block("G", "u", "y", law);
    net.find("y", "r");
    net.find_loop(&["u"]);
    let derived = net.derive();
    assert_eq!(results(&derived), ["(1)s^0@1 / (2)s^1 (1)s^0@1", "(1)s^0@1 / (2)s^1"]);
    let y = &derived.transfers[0];
    assert_eq!((y.dc_gain, y.poles.as_ref(), y.zeros.as_ref()), (Some(1.0), None, None));
    assert!(derived.transfers[1].poles.is_some());
}

/// Opening a signal: readers see 0; asked for, it is what its driver gives; a test signal at it reaches its readers.
#[test]
fn open_signals_follow_the_language() {
    let mut net = single_loop((&[3], &[1]), (&[1], &[1, 1]));
    let ask = |net: &mut Net, to: &str, from: &str| {
        let kind = RequestKind::Transfer { to: net.asked(to), from: net.asked(from) };
        net.request(kind, &["u"]);
    };
    ask(&mut net, "y", "r");
    ask(&mut net, "u", "r");
    ask(&mut net, "y", "u");
    ask(&mut net, "u", "u");
    assert_eq!(
        results(&net.derive()),
        [" / (1)s^0", "(3)s^0 / (1)s^0", "(1)s^0 / (1)s^1 (1)s^0", "(-3)s^0 / (1)s^1 (1)s^0"]
    );
}

/// Symbols: y/r = K/(s + K) around an integrator.
#[test]
fn symbols_stay() {
    let mut net = Net::new();
    net.input("r");
    net.output("y");
    net.sum("e", "r -y");
    let law = net.param("K");
    net.block("C", "e", "u", law);
    let law = net.ratio(&[1], &[1, 0]);
    net.block("G", "u", "y", law);
    net.find("y", "r");
    let derived = net.derive();
    assert_eq!(results(&derived), ["(K)s^0 / (1)s^1 (K)s^0"]);
    assert_eq!((derived.transfers[0].dc_gain, derived.transfers[0].stable), (None, None));
    assert_eq!(derived.transfers[0].kept, ["K"]);
}

/// State equations: J v' = tau - b v, w = v, with J = 2 and b = 3.
#[test]
fn state_equations_keep_their_modes() {
    let mut net = Net::new();
    net.input("tau");
    net.output("w");
    let (tau, v, w) = (net.signal("tau"), net.signal("rotor.v"), net.signal("w"));
    let (minus, half, one) = (net.number(-3, 2), net.number(1, 2), net.number(1, 1));
    let term = |coefficient, variable| EquationTerm { coefficient, derivative: false, variable };
    let equations = vec![
        Equation { left: v, derivative: true, terms: [term(half, tau), term(minus, v)].into(), span: Span::NONE },
        Equation { left: w, derivative: false, terms: [term(one, v)].into(), span: Span::NONE },
    ];
    net.add_block("rotor", &["tau"], &["w"], Law::States(equations.into()));
    net.net.signals[v.index()].driver = Driver::Block(BlockId(0));
    net.find("w", "tau");
    net.find("rotor.v", "rotor.v");
    net.find("w", "rotor.v");
    // A test signal at the state is read by its own line too: v = -3/2/s·v + t, in all s/(s + 3/2).
    let expected = ["(1)s^0 / (2)s^1 (3)s^0", "(2)s^1 / (2)s^1 (3)s^0", "(2)s^1 / (2)s^1 (3)s^0"];
    assert_eq!(results(&net.derive()), expected);
}

/// A 2×2 law whose entries share their pole has it twice by rows, but once in the least realization where its residue
/// has the rank one.
#[test]
fn a_matrix_law_has_the_modes_of_its_least_realization() {
    let mut net = Net::new();
    net.input("a");
    net.input("b");
    net.output("y");
    let entry = |net: &mut Net| net.ratio(&[1], &[1, 1]);
    let rows: Vec<Box<[ExprId]>> = (0..2).map(|_| (0..2).map(|_| entry(&mut net)).collect()).collect();
    net.add_block("G", &["a", "b"], &["p", "q"], Law::Matrix(rows.into()));
    net.sum("y", "p q");
    net.find("y", "a");
    let derived = net.derive();
    assert_eq!(results(&derived), ["(2)s^0 / (1)s^1 (1)s^0"]);
    assert_eq!(derived.transfers[0].cancelled, Vec::<String>::new());
}

/// Transmission zeros of the quadruple tank's kind: det has the zero, the entries have none.
#[test]
fn zeros_of_a_matrix() {
    let mut net = Net::new();
    net.input("a");
    net.input("b");
    for (input, output, gain) in [("a", "p", 1), ("b", "q", 2), ("a", "v", 3), ("b", "w", 1)] {
        let law = net.ratio(&[gain], &[1, gain]);
        net.block(&format!("G{input}{output}"), input, output, law);
    }
    net.sum("y", "p q");
    net.sum("x", "v w");
    let kind =
        RequestKind::Zeros { to: vec![net.asked("y"), net.asked("x")], from: vec![net.asked("a"), net.asked("b")] };
    net.request(kind, &[]);
    let derived = net.derive();
    // 1/(s+1)² - 6/((s+2)(s+3)): the numerator is (s+2)(s+3) - 6 (s+1)² = -5 s² - 7 s.
    assert_eq!(results(&derived), ["(5)s^2 (7)s^1 / (1)s^0"]);
    assert_eq!(derived.transfers[0].to, "y,x");
}

/// A solvable algebraic loop: loop gain -2, so the factor is 1/3; and one whose gain is exactly 1.
#[test]
fn algebraic_loops_are_told() {
    let net = single_loop((&[4], &[1]), (&[1, 1], &[2, 3]));
    let told = check(&net.net);
    let told: Vec<_> = told.iter().filter(|d| d.code == crate::diagnostics::Code::AlgebraicLoop).collect();
    assert_eq!(told.len(), 1);
    assert!(told[0].message.contains("`e -> C -> G -> e`"), "{}", told[0].message);
    assert!(told[0].message.contains("is -2; it has a solution, 1/(1 - gain) = 1/3"), "{}", told[0].message);
    let labels: Vec<&str> = told[0].labels.iter().map(|l| l.text.as_str()).collect();
    let expected = ["sum `e`: direct gain -1 from `y`", "block `C`: direct gain 4", "block `G`: direct gain 1/2"];
    assert_eq!(labels, expected);
    assert!(told[0].help.as_ref().is_some_and(|h| h.contains("any one of `C` or `G`")), "{:?}", told[0].help);

    let mut net = single_loop((&[-2], &[1]), (&[1, 3], &[2, 1]));
    net.find("y", "r");
    net.find_loop(&["u"]);
    let told = check(&net.net);
    assert_eq!(told.len(), 1);
    assert_eq!(told[0].code, crate::diagnostics::Code::IllPosedLoop);
    let derived = net.derive();
    assert_eq!(derived.transfers.len(), 1, "the return ratio is there all the same");
    assert_eq!(derived.diagnostics.len(), 1);
}

/// Codes of what `check` tells.
fn codes(net: &Net) -> Vec<crate::diagnostics::Code> {
    check(&net.net).iter().map(|d| d.code).collect()
}

/// A lag or a dead time anywhere on a loop breaks it; a law with a part that is not delayed does not.
#[test]
fn lags_and_dead_times_break_loops() {
    use crate::diagnostics::Code::AlgebraicLoop;
    assert_eq!(codes(&single_loop((&[4], &[1]), (&[1], &[2, 3]))), []);
    assert_eq!(codes(&single_loop((&[1, 4], &[1, 0]), (&[1, 1], &[2, 3]))), [AlgebraicLoop]);
    let with_delay = |part_of_it: bool| {
        let mut net = Net::new();
        net.input("r");
        net.output("y");
        net.sum("e", "r -y");
        let mut law = net.delay(2);
        if part_of_it {
            let one = net.number(1, 1);
            law = net.push(Expr::Sub(one, law));
        }
        net.block("C", "e", "y", law);
        codes(&net)
    };
    assert_eq!(with_delay(false), []);
    assert_eq!(with_delay(true), [AlgebraicLoop]);
}

/// Two loops through one block: both are told, with det(I - D) = 1 + 2 + 3, and the block they share breaks both.
#[test]
fn tangled_loops_are_told_together() {
    let mut net = Net::new();
    net.input("r");
    net.output("y");
    net.sum("e", "r -f -g");
    for (name, from, to, gain) in [("C", "e", "y", 1), ("F", "y", "f", 2), ("G", "y", "g", 3)] {
        let law = net.number(gain, 1);
        net.block(name, from, to, law);
    }
    let told = check(&net.net);
    assert_eq!(told.len(), 1, "{told:?}");
    let message = &told[0].message;
    for part in ["2 algebraic loops share 4 blocks and sums", "`F -> e -> C -> F` with gain -2", "D is 6"] {
        assert!(message.contains(part), "{part}: {message}");
    }
    assert_eq!(told[0].help.as_deref(), Some("a lag or a dead time at `C` breaks all of them"));
    assert_eq!(told[0].labels.len(), 5, "the sum twice, once for each signal that it reads");
}

/// A loop whose gain grows without bound has a solution, s²/(s² + s + 1), and is told as what it is.
#[test]
fn a_growing_loop_is_told() {
    let net = single_loop((&[1, 0, 0], &[1]), (&[1], &[1, 1]));
    let told = check(&net.net);
    assert!(told[0].message.contains("grows without bound, as -s at high frequency"), "{}", told[0].message);
}

/// Past the limit of loops the rule says so, and elimination answers all the same.
#[test]
fn masons_rule_has_a_limit() {
    let mut net = Net::new();
    net.input("r");
    net.output("x0");
    let count = 8;
    for i in 0..count {
        let terms: Vec<String> = (0..count).filter(|j| *j != i).map(|j| format!("x{j}")).collect();
        net.sum(&format!("e{i}"), &format!("r {}", terms.join(" ")));
        let law = net.ratio(&[1], &[1, i + 2]);
        net.block(&format!("B{i}"), &format!("e{i}"), &format!("x{i}"), law);
    }
    net.find("x0", "r");
    let told = mason(&net.net, &net.net.requests[0]).expect_err("16,064 loops");
    assert_eq!(told[0].code, crate::diagnostics::Code::LimitReached);
    assert!(told[0].message.contains("more than 2000"), "{}", told[0].message);
    assert_eq!(results(&net.derive()).len(), 1);
}

/// (Kd s + Kp)/(s² + Kd s + Kp): an improper controller is no algebraic loop around a double integrator.
#[test]
fn an_improper_controller_in_a_proper_loop() {
    let mut net = single_loop((&[2, 9], &[1]), (&[1], &[1, 0, 0]));
    net.find("y", "r");
    assert_eq!(results(&net.derive()), ["(2)s^1 (9)s^0 / (1)s^2 (2)s^1 (9)s^0"]);
    let told = check(&net.net);
    assert_eq!(told.len(), 1, "{told:?}");
    assert_eq!(told[0].code, crate::diagnostics::Code::ImproperLaw);
    assert_eq!(told[0].severity, crate::diagnostics::Severity::Note);
}

/// The mode at +1 does not show in y/r.
#[test]
fn a_hidden_unstable_mode_is_told() {
    let mut net = single_loop((&[2, -2], &[1, 3]), (&[1], &[1, -1]));
    net.find("y", "r");
    let told = check(&net.net);
    assert_eq!(told.len(), 1, "{told:?}");
    assert_eq!(told[0].code, crate::diagnostics::Code::HiddenUnstableMode);
    assert!(told[0].message.contains("s = 1") && told[0].message.contains("`y/r`"), "{}", told[0].message);
    let options = DeriveOptions { characteristic: true, ..DeriveOptions::default() };
    let derived = derive(&net.net, &options);
    assert_eq!(derived.characteristic[0].factors, ["s - 1", "s + 5"]);
    assert_eq!(derived.characteristic[0].hidden[0].from, ["y/r"]);
}

/// S. J. Mason's rule on a chain of three integrators with three loops, of which two do not touch.
#[test]
fn masons_rule_is_worked_out() {
    let mut net = Net::new();
    net.input("r");
    net.output("y");
    net.sum("a", "r -f");
    let k = net.param("G1");
    net.block("G1", "a", "b", k);
    let k = net.param("H1");
    net.block("H1", "b", "f", k);
    net.sum("c", "b -g");
    let k = net.param("G2");
    net.block("G2", "c", "y", k);
    let k = net.param("H2");
    net.block("H2", "y", "g", k);
    net.find("y", "r");
    let told = mason(&net.net, &net.net.requests[0]).expect("small");
    assert_eq!(told.paths.len(), 1);
    assert_eq!(told.paths[0].names, "G1*G2");
    assert_eq!(told.paths[0].signals, ["r", "a", "b", "c", "y"]);
    let loops: Vec<&str> = told.loops.iter().map(|l| l.names.as_str()).collect();
    assert_eq!(loops, ["-G1*H1", "-G2*H2"]);
    assert_eq!(told.groups.len(), 1);
    assert_eq!(told.determinant.names, "1 - L1 - L2 + L1*L2");
    assert_eq!(told.cofactors[0].names, "1");
    assert_eq!(told.gain.expression, "G1*G2/((G1*H1 + 1)*(G2*H2 + 1))");
}

/// A small pseudo-random generator (Knuth, The Art of Computer Programming, vol. 2, section 3.3.4: MMIX).
struct Dice(u64);

impl Dice {
    fn below(&mut self, n: u64) -> u64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) % n
    }
}

/// The laws of a random netlist in numbers: above and below, from the highest power down.
type Numbers = Vec<(&'static [i64], &'static [i64])>;

/// Sums e_k over random signals, blocks B_k : e_k -> x_k with small laws; y = x_0. The laws are mostly gains, so that many
/// loops are algebraic, and some of them singular.
fn random(seed: u64) -> (Net, Numbers, Vec<Vec<(usize, f64)>>) {
    const LAWS: [(&[i64], &[i64]); 8] = [
        (&[1], &[1]),
        (&[-1], &[1]),
        (&[2], &[1]),
        (&[1], &[2]),
        (&[1], &[1, 1]),
        (&[1, 3], &[1, 2]),
        (&[2, -1], &[1, 0]),
        (&[1], &[1, -1]),
    ];
    let mut dice = Dice(seed);
    let count = 1 + dice.below(5) as usize;
    let (mut net, mut laws, mut sums) = (Net::new(), Vec::new(), Vec::new());
    net.input("r");
    net.output("x0");
    for k in 0..count {
        let mut terms = if k == count - 1 || dice.below(3) == 0 { "r".to_owned() } else { String::new() };
        let mut row: Vec<(usize, f64)> = if terms.is_empty() { Vec::new() } else { vec![(count, 1.0)] };
        for _ in 0..=dice.below(2) {
            let (from, minus) = (dice.below(count as u64) as usize, dice.below(2) == 0);
            terms.push_str(&format!(" {}x{from}", if minus { "-" } else { "" }));
            row.push((from, if minus { -1.0 } else { 1.0 }));
        }
        net.sum(&format!("e{k}"), &terms);
        let law = LAWS[dice.below(LAWS.len() as u64) as usize];
        let expr = net.ratio(law.0, law.1);
        net.block(&format!("B{k}"), &format!("e{k}"), &format!("x{k}"), expr);
        laws.push(law);
        sums.push(row);
    }
    net.find("x0", "r");
    net.find_loop(&["e0"]);
    (net, laws, sums)
}

type Complex = nalgebra::Complex<f64>;

fn horner(coefficients: impl Iterator<Item = f64>, s: Complex) -> Complex {
    coefficients.fold(Complex::new(0.0, 0.0), |sum, c| sum * s + Complex::new(c, 0.0))
}

/// I - A(s) over the signals x, and the column of r.
fn numeric(
    laws: &Numbers,
    sums: &[Vec<(usize, f64)>],
    s: Complex,
) -> (nalgebra::DMatrix<Complex>, nalgebra::DVector<Complex>) {
    let n = laws.len();
    let mut a = nalgebra::DMatrix::<Complex>::identity(n, n);
    let mut b = nalgebra::DVector::<Complex>::zeros(n);
    let value = |p: &[i64]| horner(p.iter().map(|&c| c as f64), s);
    for (k, row) in sums.iter().enumerate() {
        let law = value(laws[k].0) / value(laws[k].1);
        for &(from, sign) in row {
            if from == n {
                b[k] += law * sign;
            } else {
                a[(k, from)] -= law * sign;
            }
        }
    }
    (a, b)
}

/// Elimination, Mason's rule and a direct numeric solution of the signal equations agree on random small netlists, with
/// the singular ones ill-posed in all three.
#[test]
fn three_ways_agree_on_random_netlists() {
    let (mut ill_posed, mut answered) = (0, 0);
    for seed in 0..1000 {
        let (net, laws, sums) = random(seed);
        let eliminated = net.derive();
        let by_mason = derive(&net.net, &DeriveOptions { method: Method::Mason, ..DeriveOptions::default() });
        let list = |d: &Derived| d.transfers.iter().map(ratio_of).collect::<Vec<_>>();
        assert_eq!(list(&eliminated), list(&by_mason), "seed {seed}");
        let lost = |d: &Derived| d.transfers.iter().map(|t| t.cancelled.clone()).collect::<Vec<_>>();
        assert_eq!(lost(&eliminated), lost(&by_mason), "seed {seed}");
        assert_eq!(eliminated.diagnostics, by_mason.diagnostics, "seed {seed}");
        let Some(first) = eliminated.transfers.iter().find(|t| t.to == "x0") else {
            // Some loop on the way has no solution: then the whole has none either, far out.
            let (a, _) = numeric(&laws, &sums, Complex::new(1e9, 0.0));
            assert!(a.lu().determinant().norm() < 1e-6, "seed {seed}");
            ill_posed += 1;
            continue;
        };
        let s = Complex::new(0.37, 1.9);
        let (a, b) = numeric(&laws, &sums, s);
        let Some(direct) = a.lu().solve(&b).map(|x| x[0]) else { continue };
        let side = |terms: Option<&crate::results::Terms>| {
            terms.into_iter().flat_map(|t| t.iter()).fold(Complex::new(0.0, 0.0), |sum, t| {
                sum + s.powu(t.power) * Complex::new(t.coefficient.parse::<f64>().expect("a number"), 0.0)
            })
        };
        let exact = side(first.numerator.as_ref()) / side(first.denominator.as_ref());
        assert!((exact - direct).norm() <= 1e-9 * (1.0 + direct.norm()), "seed {seed}: {exact} {direct}");
        answered += 1;
    }
    assert!(ill_posed > 30 && answered > 500, "{ill_posed} {answered}");
}
