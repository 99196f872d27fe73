//! Exact values of expressions for one case, with some params kept as symbols.
//!
//! Variables of the polynomials: [`Var::S`] is s or z; [`DELAYS`] + i is the i-th basic dead time, as exp(-T·s);
//! [`PARAMS`] + i is the param with number i; [`PI`] is π. So the order of variables is: s, dead times, params in the
//! order of the file, π.

use super::expr::{Expr, ExprId, Function};
use super::{CaseId, Keep, Netlist, ParamId};
use crate::algebra::functions::{self, Rounded};
use crate::algebra::{Fraction, IBig, Poly, RBig, UBig, Var};
use crate::diagnostics::{Code, Diagnostic};
use crate::source::Span;
use dashu_base::{Abs, BitTest, Gcd, Signed};

/// Number of the first dead-time variable: `Var(DELAYS + i)` stands for exp(-T·s) with T the i-th basic dead time.
pub const DELAYS: u32 = 1;

/// Number of the first param's variable.
pub const PARAMS: u32 = 1 << 20;

/// π as a symbol.
pub const PI: Var = Var(u32::MAX);

/// The highest degree that one law may reach: beyond it the exact results would not fit any memory.
pub const MAX_LAW_DEGREE: u64 = 20_000;

/// The most binary digits that a number of one law may have.
pub const MAX_NUMBER_BITS: u64 = 1_000_000;

/// The most terms that the expansion of one law may have.
pub const MAX_LAW_TERMS: u64 = 1_000_000;

/// An exact value.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Value {
    /// The value, in lowest terms.
    pub fraction: Fraction,
    /// Whether a number in it was rounded on the way (the root of 2, a sine).
    pub rounded: bool,
}

impl Value {
    fn exact(fraction: Fraction) -> Self {
        Self { fraction, rounded: false }
    }
}

/// Why an expression has no value.
enum Failure {
    /// Told to the user as it is.
    Told(Box<Diagnostic>),
    /// A rounded function of something that has a symbol in it.
    Symbolic(Span),
}

impl From<Diagnostic> for Failure {
    fn from(diagnostic: Diagnostic) -> Self {
        Self::Told(Box::new(diagnostic))
    }
}

/// The values of all params of a netlist for one case, and of any expression over them.
#[derive(Debug)]
pub struct Values<'n> {
    netlist: &'n Netlist,
    params: Vec<Value>,
    symbols: Vec<ParamId>,
    delays: Vec<BasicDelay>,
}

/// exp(-T·s) for a T of which all dead times with the same symbols are whole multiples.
#[derive(Debug)]
struct BasicDelay {
    /// What the dead times of this family are rational multiples of: 1, or a product of params.
    family: Fraction,
    /// The rational factor: T = factor · family.
    factor: RBig,
}

impl<'n> Values<'n> {
    /// Works out all params for a case (`None`: the values as given, or those of the case in nominal's place), with
    /// some of them kept as symbols; a param without a value is a symbol always.
    ///
    /// # Errors
    ///
    /// What can't be worked out: a division by zero, a circle, a limit, each with its place.
    pub fn new(netlist: &'n Netlist, case: Option<CaseId>, keep: &Keep) -> Result<Self, Vec<Diagnostic>> {
        let mut values = Self { netlist, params: Vec::new(), symbols: Vec::new(), delays: Vec::new() };
        values.work_out_params(case.or(netlist.nominal), keep)?;
        values.find_delays()?;
        Ok(values)
    }

    /// The params that stay symbols, in the order of the file.
    pub fn kept(&self) -> &[ParamId] {
        &self.symbols
    }

    /// The value of a param.
    pub fn param(&self, id: ParamId) -> &Fraction {
        &self.params[id.index()].fraction
    }

    /// What a variable is called: `s`, `Kp`, `pi`, `exp(-0.1*s)`.
    pub fn name(&self, var: Var) -> String {
        if var == PI {
            return "pi".to_owned();
        }
        if var == Var::S {
            let sampled = self.netlist.time_base == super::TimeBase::Sampled;
            return if sampled { "z" } else { "s" }.to_owned();
        }
        if var.0 >= PARAMS {
            return self.netlist.param_name(ParamId(var.0 - PARAMS)).to_owned();
        }
        self.delay(var).map_or_else(String::new, |t| format!("exp(-{}*s)", self.delay_text(&t)))
    }

    /// The dead time T that a variable stands for as exp(-T·s), or `None` for any other variable.
    pub fn delay(&self, var: Var) -> Option<Fraction> {
        let basic = self.delays.get(var.0.checked_sub(DELAYS)? as usize)?;
        Some(basic.family.mul(&Fraction::number(&basic.factor)))
    }

    /// A dead time as text: exact, `2*T` or `1/10`, in parentheses where it is a sum or a ratio.
    fn delay_text(&self, delay: &Fraction) -> String {
        let side = |p: &Poly| {
            let term = |(powers, c): (Vec<(Var, u32)>, IBig)| {
                let mut parts: Vec<String> = powers
                    .iter()
                    .map(|&(v, e)| if e == 1 { self.name(v) } else { format!("{}^{e}", self.name(v)) })
                    .collect();
                if c != IBig::ONE || parts.is_empty() {
                    parts.insert(0, c.to_string());
                }
                parts.join("*")
            };
            p.terms().map(term).collect::<Vec<_>>().join(" + ")
        };
        let (n, d) = (side(delay.numerator()), side(delay.denominator()));
        if d == "1" { n } else { format!("({n}/{d})") }
    }

    /// The value of an expression.
    ///
    /// # Errors
    ///
    /// A division by zero, a dead time that is negative or no multiple of s, a function out of its domain or of a
    /// symbol, a named limit.
    pub fn evaluate(&self, expr: ExprId) -> Result<Value, Box<Diagnostic>> {
        self.value_of(expr).map_err(told)
    }

    /// The exact number that an expression is, with its π taken to [`functions::ROUNDED_BITS`] binary digits, or
    /// `None` where it has a symbol or s in it.
    ///
    /// # Errors
    ///
    /// As [`Self::evaluate`].
    pub fn number(&self, expr: ExprId) -> Result<Option<RBig>, Box<Diagnostic>> {
        Ok(number_of(&self.evaluate(expr)?.fraction).map(|n| n.value))
    }

    /// Params in the order of their dependence, without recursion.
    fn work_out_params(&mut self, case: Option<CaseId>, keep: &Keep) -> Result<(), Vec<Diagnostic>> {
        let net = self.netlist;
        let mut given: Vec<Option<ExprId>> = net.params.iter().map(|p| p.value).collect();
        if let Some(case) = case {
            for &(param, value) in &net.cases[case.index()].settings {
                given[param.index()] = Some(value);
            }
        }
        let symbol = |id: ParamId| Value::exact(Poly::var(Var(PARAMS + id.0)).into());
        let mut kept = vec![false; net.params.len()];
        if let Keep::Params(list) = keep {
            list.iter().for_each(|p| kept[p.index()] = true);
        }
        self.params = vec![Value::exact(Fraction::zero()); net.params.len()];
        let mut errors = Vec::new();
        let order = dependence_order(net, &given).map_err(|d| vec![d])?;
        for id in order {
            let value = match given[id.index()] {
                None => None,
                Some(_) if kept[id.index()] => None,
                Some(expr) if *keep == Keep::All && params_in(net, expr).is_empty() => None,
                Some(expr) => match self.value_of(expr) {
                    Ok(value) => Some(value),
                    Err(Failure::Symbolic(_)) => None,
                    Err(Failure::Told(d)) => {
                        errors.push(*d);
                        None
                    }
                },
            };
            if value.is_none() {
                self.symbols.push(id);
            }
            self.params[id.index()] = value.unwrap_or_else(|| symbol(id));
        }
        self.symbols.sort_unstable();
        if errors.is_empty() { Ok(()) } else { Err(errors) }
    }

    /// Finds the basic dead times: for each family of dead times the largest of which all are whole multiples.
    fn find_delays(&mut self) -> Result<(), Vec<Diagnostic>> {
        let net = self.netlist;
        let mut delays: Vec<BasicDelay> = Vec::new();
        for i in 0..net.exprs.len() {
            let Expr::Delay(argument) = net.exprs.get(ExprId(i as u32)) else { continue };
            // What has no value is told where the law itself is worked out.
            let Ok(value) = self.value_of(argument) else { continue };
            for (family, factor) in parts_of_delay(&value.fraction).unwrap_or_default() {
                match delays.iter_mut().find(|d| d.family == family) {
                    Some(known) => known.factor = gcd_of_ratios(&known.factor, &factor),
                    None => delays.push(BasicDelay { family, factor: factor.abs() }),
                }
            }
        }
        if delays.len() as u32 >= PARAMS - DELAYS {
            return Err(vec![Diagnostic::new(Code::LimitReached, "the dead times have too many different symbols")]);
        }
        self.delays = delays;
        Ok(())
    }

    /// Values of an expression's parts from the leaves up; each part once, without recursion.
    fn value_of(&self, root: ExprId) -> Result<Value, Failure> {
        let mut parts = vec![root];
        let mut seen = rustc_hash::FxHashSet::default();
        let mut next = 0;
        while next < parts.len() {
            let children = self.netlist.exprs.children(parts[next]);
            parts.extend(children.filter(|c| seen.insert(*c)));
            next += 1;
        }
        // Children have lower numbers than what is made of them.
        parts.sort_unstable();
        let mut values: Vec<Value> = Vec::with_capacity(parts.len());
        for (i, &part) in parts.iter().enumerate() {
            let of = |id: ExprId| {
                let place = parts[..i].binary_search(&id).unwrap_or_default();
                &values[place]
            };
            let value = self.one_value(part, &of)?;
            values.push(value);
        }
        Ok(values.pop().unwrap_or_else(|| Value::exact(Fraction::zero())))
    }

    fn one_value<'v>(&self, id: ExprId, of: &dyn Fn(ExprId) -> &'v Value) -> Result<Value, Failure> {
        let span = self.netlist.exprs.span(id);
        let both = |a: ExprId, b: ExprId| of(a).rounded || of(b).rounded;
        let node = self.netlist.exprs.get(id);
        Ok(match node {
            Expr::Ratio(n, d) => Value::exact(Fraction::number(&RBig::from_parts(n.into(), d.into()))),
            Expr::Number(place) => Value::exact(Fraction::number(self.netlist.exprs.number(place))),
            Expr::Pi => Value::exact(Poly::var(PI).into()),
            Expr::S | Expr::Z => Value::exact(Poly::var(Var::S).into()),
            Expr::Param(p) => self.params[p.index()].clone(),
            Expr::Neg(a) => Value { fraction: of(a).fraction.neg(), rounded: of(a).rounded },
            Expr::Add(a, b) => {
                bounded_product(&of(a).fraction, &of(b).fraction, span)?;
                Value { fraction: of(a).fraction.add(&of(b).fraction), rounded: both(a, b) }
            }
            Expr::Sub(a, b) => {
                bounded_product(&of(a).fraction, &of(b).fraction, span)?;
                Value { fraction: of(a).fraction.sub(&of(b).fraction), rounded: both(a, b) }
            }
            Expr::Mul(a, b) => {
                bounded_product(&of(a).fraction, &of(b).fraction, span)?;
                Value { fraction: of(a).fraction.mul(&of(b).fraction), rounded: both(a, b) }
            }
            Expr::Div(a, b) => {
                bounded_product(&of(a).fraction, &of(b).fraction, span)?;
                let quotient = of(a).fraction.div(&of(b).fraction);
                let fraction = quotient.ok_or_else(|| division_by_zero(self.netlist.exprs.span(b)))?;
                Value { fraction, rounded: both(a, b) }
            }
            Expr::Pow(a, n) => {
                bounded_power(&of(a).fraction, n, span)?;
                let fraction = of(a).fraction.pow(n).ok_or_else(|| division_by_zero(span))?;
                Value { fraction, rounded: of(a).rounded }
            }
            Expr::Delay(a) => self.dead_time(of(a), span)?,
            Expr::Call(function, a) => call(function, of(a), span)?,
            Expr::Min(a, b) | Expr::Max(a, b) => {
                let numbers = number_of(&of(a).fraction).zip(number_of(&of(b).fraction));
                let (x, y) = numbers.ok_or(Failure::Symbolic(span))?;
                let first = (x.value <= y.value) == matches!(node, Expr::Min(..));
                Value { fraction: of(if first { a } else { b }).fraction.clone(), rounded: both(a, b) }
            }
        })
    }

    /// exp(a) with a = -T·s, as a product of powers of the basic dead times.
    fn dead_time(&self, argument: &Value, span: Span) -> Result<Value, Failure> {
        let Some(parts) = parts_of_delay(&argument.fraction) else {
            let message = "`exp` in a transfer function (law) takes the form `exp(-T*s)`, a dead time";
            return Err(Diagnostic::new(Code::Syntax, message)
                .label(span, "the exponent is not a number or a param times s")
                .help("write the dead time T so that the exponent is -T*s, with T in seconds")
                .into());
        };
        if parts.len() == 1 && parts[0].0 == Fraction::one() && parts[0].1 < RBig::ZERO {
            return Err(would_answer_early(span).into());
        }
        let (mut above, mut below) = (Poly::one(), Poly::one());
        for (family, factor) in parts {
            let Some(place) = self.delays.iter().position(|d| d.family == family) else { continue };
            let multiple = &factor / &self.delays[place].factor;
            let power = u32::try_from(multiple.numerator().clone().abs()).map_err(|_| {
                Diagnostic::new(Code::LimitReached, "two dead times differ by more than a factor of 4 thousand million")
                    .label(span, "this one has no common unit of time with the others that could be counted in")
                    .help("round the dead times to a common step, such as a millisecond")
            })?;
            let var = Poly::var(Var(DELAYS + place as u32)).pow(power);
            if multiple.is_positive() {
                above = above.mul(&var);
            } else {
                below = below.mul(&var);
            }
        }
        let fraction = Fraction::new(above, below).unwrap_or_else(Fraction::one);
        Ok(Value { fraction, rounded: argument.rounded })
    }
}

/// What is told of a dead time below zero.
fn would_answer_early(span: Span) -> Diagnostic {
    Diagnostic::new(
        Code::ImproperLaw,
        "a dead time is negative: the transfer function (law) would answer before it is asked",
    )
    .severity(crate::diagnostics::Severity::Error)
    .label(span, "the exponent must be -T*s with T >= 0")
    .help("turn the sign, or leave the dead time out")
}

fn told(failure: Failure) -> Box<Diagnostic> {
    match failure {
        Failure::Told(d) => d,
        Failure::Symbolic(span) => Box::new(
            Diagnostic::new(Code::ParameterWithoutValue, "this function needs a number, and what it is of has a symbol in it")
                .label(span, "depends on a param that is kept or has no value")
                .help("give the function a param of its own (`param w = sqrt(k)`), which then stays the symbol, or give a value"),
        ),
    }
}

fn division_by_zero(span: Span) -> Diagnostic {
    Diagnostic::new(Code::DivisionByZero, "division by zero")
        .label(span, "this is zero")
        .help("check the values that it is made of; a case or `--set` may have changed one")
}

/// The params that an expression names, each once, in the order of their numbers.
pub fn params_in(net: &Netlist, root: ExprId) -> Vec<ParamId> {
    let (mut found, mut open) = (Vec::new(), vec![root]);
    let mut seen = rustc_hash::FxHashSet::default();
    while let Some(id) = open.pop() {
        if let Expr::Param(p) = net.exprs.get(id) {
            found.push(p);
        }
        open.extend(net.exprs.children(id).filter(|c| seen.insert(*c)));
    }
    found.sort_unstable();
    found.dedup();
    found
}

/// All params, each after those that its value is made of.
fn dependence_order(net: &Netlist, given: &[Option<ExprId>]) -> Result<Vec<ParamId>, Diagnostic> {
    const NEW: u8 = 0;
    const OPEN: u8 = 1;
    const DONE: u8 = 2;
    let mut state = vec![NEW; given.len()];
    let mut order = Vec::with_capacity(given.len());
    for first in 0..given.len() {
        let mut stack = vec![ParamId(first as u32)];
        while let Some(&id) = stack.last() {
            match state[id.index()] {
                NEW => {
                    state[id.index()] = OPEN;
                    for needed in given[id.index()].map_or_else(Vec::new, |e| params_in(net, e)) {
                        match state[needed.index()] {
                            NEW => stack.push(needed),
                            OPEN => return Err(circular(net, needed)),
                            _ => {}
                        }
                    }
                }
                OPEN => {
                    state[id.index()] = DONE;
                    order.push(id);
                    stack.pop();
                }
                _ => {
                    stack.pop();
                }
            }
        }
    }
    Ok(order)
}

fn circular(net: &Netlist, id: ParamId) -> Diagnostic {
    let name = net.param_name(id);
    Diagnostic::new(Code::CircularDefinition, format!("param `{name}` depends on itself in this case"))
        .label(net.params[id.index()].origin.span, "its value leads back to it")
        .help("give one param of the circle a value that does not use the others")
}

/// -T·s as a list of (family, factor) with T = Σ factor · family, or `None` where it is no multiple of s alone.
fn parts_of_delay(argument: &Fraction) -> Option<Vec<(Fraction, RBig)>> {
    let below = argument.denominator();
    let powers = argument.numerator().coefficients(Var::S);
    let is_delay = |v: &Var| (DELAYS..PARAMS).contains(&v.0);
    if below.degree(Var::S) > 0 || powers.len() > 2 || powers.first().is_some_and(|c| !c.is_zero()) {
        return None;
    }
    if argument.numerator().variables().iter().chain(&below.variables()).any(is_delay) {
        return None;
    }
    let Some(slope) = powers.into_iter().nth(1) else { return Some(Vec::new()) };
    let scale = below.content();
    let family_below = below.div_exact(&Poly::constant(scale.clone()))?;
    let part = |(powers, c): (Vec<(Var, u32)>, IBig)| {
        let family = Fraction::new(Poly::from_terms([(powers, IBig::ONE)]), family_below.clone())?;
        Some((family, RBig::from_parts_signed(-c, scale.clone())))
    };
    slope.terms().map(part).collect()
}

/// The largest ratio of which both are whole multiples.
fn gcd_of_ratios(a: &RBig, b: &RBig) -> RBig {
    let (na, nb) = (UBig::try_from(a.numerator().clone().abs()), UBig::try_from(b.numerator().clone().abs()));
    let (da, db) = (a.denominator(), b.denominator());
    match (na, nb) {
        (Ok(na), Ok(nb)) => RBig::from_parts(IBig::from((na * db).gcd(nb * da)), da * db),
        _ => a.clone(),
    }
}

/// The number that a fraction is, π taken to many digits; `None` where it has another variable in it.
pub fn number_of(fraction: &Fraction) -> Option<Rounded> {
    if let Some(value) = fraction.as_number() {
        return Some(Rounded { value, rounded: false });
    }
    let pi = functions::pi();
    let side = |p: &Poly| {
        let (number, scale) = p.substitute(PI, &pi);
        Some(RBig::from_parts_signed(number.as_constant()?, scale))
    };
    let (n, d) = (side(fraction.numerator())?, side(fraction.denominator())?);
    (d != RBig::ZERO).then(|| Rounded { value: n / d, rounded: true })
}

/// A function of a parameter expression: exact where the value is rational or a known multiple of π, else rounded.
fn call(function: Function, argument: &Value, span: Span) -> Result<Value, Failure> {
    if let Some(exact) = exact_call(function, &argument.fraction) {
        return Ok(Value { fraction: exact, rounded: argument.rounded });
    }
    let x = number_of(&argument.fraction).ok_or(Failure::Symbolic(span))?.value;
    if function == Function::Abs {
        let fraction = if x < RBig::ZERO { argument.fraction.neg() } else { argument.fraction.clone() };
        return Ok(Value { fraction, rounded: argument.rounded });
    }
    let result = match function {
        Function::Sqrt => functions::sqrt(&x),
        Function::Sin => functions::sin(&x),
        Function::Cos => functions::cos(&x),
        Function::Tan => functions::tan(&x),
        Function::Exp => functions::exp(&x),
        Function::Ln => functions::ln(&x),
        Function::Atan | Function::Abs => Some(functions::atan(&x)),
    };
    let result = result.ok_or_else(|| out_of_domain(function, span))?;
    // A function of a rounded π is not rational even where its formula would be exact for the rounded argument.
    let rounded = result.rounded || argument.rounded || argument.fraction.as_number().is_none();
    Ok(Value { fraction: Fraction::number(&result.value), rounded })
}

fn out_of_domain(function: Function, span: Span) -> Diagnostic {
    let (code, message) = match function {
        Function::Sqrt => (Code::Syntax, "the root of a negative number is not real".to_owned()),
        Function::Ln => (Code::Syntax, "the logarithm needs a number above zero".to_owned()),
        _ => (Code::LimitReached, format!("this function takes arguments up to {}", functions::MAX_ARGUMENT)),
    };
    Diagnostic::new(code, message)
        .label(span, "its argument is out of range")
        .help("check the values that the argument is made of")
}

/// Values that need no rounding: rational multiples of π as arguments (Niven 1956), arc tangents of -1, 0 and 1.
fn exact_call(function: Function, argument: &Fraction) -> Option<Fraction> {
    let ratio = |n: i32, d: u32| RBig::from_parts(n.into(), d.into());
    match function {
        Function::Sin | Function::Cos | Function::Tan => {
            let turns = argument.div(&Poly::var(PI).into())?.as_number()? / ratio(2, 1);
            let sine = functions::sin_of_turns(&turns);
            let cosine = functions::sin_of_turns(&(&turns + ratio(1, 4)));
            let eighths = &turns * ratio(8, 1);
            let value = match function {
                Function::Sin => sine?,
                Function::Cos => cosine?,
                // tan(π/4 + kπ/2) = ±1: odd eighths of a turn.
                _ if *eighths.denominator() == UBig::ONE && eighths.numerator().bit(0) => {
                    let k = ((eighths.numerator() % IBig::from(4)) + IBig::from(4)) % IBig::from(4);
                    if k == IBig::ONE { RBig::ONE } else { -RBig::ONE }
                }
                _ => {
                    let (sine, cosine) = (sine?, cosine?);
                    if cosine == RBig::ZERO {
                        return None;
                    }
                    sine / cosine
                }
            };
            Some(Fraction::number(&value))
        }
        Function::Atan => {
            let x = argument.as_number()?;
            let quarter = Fraction::from(Poly::var(PI)).mul(&Fraction::number(&ratio(1, 4)));
            if x == RBig::ONE {
                Some(quarter)
            } else if x == -RBig::ONE {
                Some(quarter.neg())
            } else {
                None
            }
        }
        _ => None,
    }
}

fn size(p: &Poly) -> u64 {
    p.len() as u64
}

/// Whether the products of numerators and denominators stay within the limits.
fn bounded_product(a: &Fraction, b: &Fraction, span: Span) -> Result<(), Diagnostic> {
    let degree = |f: &Fraction| u64::from(f.numerator().degree(Var::S).max(f.denominator().degree(Var::S)));
    let terms = |f: &Fraction| size(f.numerator()).max(size(f.denominator()));
    let dense = degree(a) + degree(b) + 1;
    if dense > MAX_LAW_DEGREE {
        return Err(too_large(span, &format!("its degree would be {}, above {MAX_LAW_DEGREE}", dense - 1)));
    }
    // Powers of s fall together in a product; other variables may not.
    let several = a.numerator().variables().len().max(b.numerator().variables().len()) > 1;
    if several && terms(a).saturating_mul(terms(b)) > 100 * MAX_LAW_TERMS {
        return Err(too_large(span, &format!("it would have more than {MAX_LAW_TERMS} terms")));
    }
    Ok(())
}

/// Whether a power stays within the limits.
fn bounded_power(base: &Fraction, exponent: i32, span: Span) -> Result<(), Diagnostic> {
    let k = u64::from(exponent.unsigned_abs());
    for p in [base.numerator(), base.denominator()] {
        let degree = p.variables().iter().map(|&v| u64::from(p.degree(v))).max().unwrap_or(0);
        if degree.saturating_mul(k) > MAX_LAW_DEGREE {
            return Err(too_large(span, &format!("its degree would pass {MAX_LAW_DEGREE}")));
        }
        let bits = p.terms().map(|(_, c)| c.bit_len() as u64).max().unwrap_or(0);
        if bits > 1 && bits.saturating_mul(k) > MAX_NUMBER_BITS {
            return Err(too_large(
                span,
                &format!("a number in it would have more than {MAX_NUMBER_BITS} binary digits"),
            ));
        }
        // Monomials of degree k in n variables: C(n + k - 1, k), here with n = number of terms.
        let mut count: u64 = 1;
        for i in 1..=(size(p).saturating_sub(1)).min(64) {
            count = count.saturating_mul(k + i) / i;
            if count > MAX_LAW_TERMS {
                break;
            }
        }
        if p.variables().len() > 1 && count > MAX_LAW_TERMS {
            return Err(too_large(span, &format!("it would have more than {MAX_LAW_TERMS} terms")));
        }
    }
    Ok(())
}

fn too_large(span: Span, why: &str) -> Diagnostic {
    Diagnostic::new(Code::LimitReached, format!("this expression grows too large: {why}"))
        .label(span, "here")
        .help("lower the exponent, or give values to some of the params in it")
}
