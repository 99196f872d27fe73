//! The flat netlist: the one intermediate form. Every `define` and `repeat` is written out, every name is bound.
//!
//! What it means:
//!
//! - A [`Signal`] has exactly one driver: it is an input, or the output of a [`Sum`] or of a [`Block`].
//! - A sum says: output = Σ ± factor · signal.
//! - A block with a [`Law::Scalar`] or [`Law::Matrix`] says: outputs = law(s) · inputs (in z where `every` stands).
//! - A block with [`Law::States`] says each of its equations: \[s·\]left = Σ coefficient · \[s·\]variable. Its states and
//!   helper lines are signals too, driven by that block.
//! - A port of a composite is no signal of its own: it is another name of the outer signal ([`Netlist::aliases`]).
//! - Laws, factors and values are expressions in one arena ([`Netlist::exprs`]), children before parents, shared
//!   where a define's argument is used twice. [`values`] gives them their exact values for a case.
//!
//! All text-like things here are names; files, printing and numbers in floating point are not known.

pub mod expr;
pub mod probe;
pub mod values;

use crate::source::Span;
use expr::{ExprId, Exprs};

macro_rules! ids {
    ($($(#[$doc:meta])* $name:ident;)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(pub u32);

        impl $name {
            /// The number as an index.
            pub const fn index(self) -> usize {
                self.0 as usize
            }
        }
    )*};
}

ids! {
    /// A signal's place in [`Netlist::signals`].
    SignalId;
    /// A block's place in [`Netlist::blocks`].
    BlockId;
    /// A sum's place in [`Netlist::sums`].
    SumId;
    /// A param's place in [`Netlist::params`].
    ParamId;
    /// A case's place in [`Netlist::cases`].
    CaseId;
    /// A name's place in [`Netlist::names`].
    NameId;
    /// An instance's place in [`Netlist::instances`].
    InstanceId;
}

/// Full names (`az.e`), each once, in NFC.
#[derive(Clone, Debug, Default)]
pub struct Names {
    text: String,
    ends: Vec<u32>,
}

impl Names {
    /// The name with this number.
    pub fn get(&self, id: NameId) -> &str {
        let start = if id.0 == 0 { 0 } else { self.ends[id.index() - 1] as usize };
        &self.text[start..self.ends[id.index()] as usize]
    }

    /// Adds a name; the caller keeps names apart.
    pub fn push(&mut self, name: &str) -> NameId {
        self.text.push_str(name);
        self.ends.push(self.text.len() as u32);
        NameId(self.ends.len() as u32 - 1)
    }

    /// How many names there are.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.ends.is_empty()
    }
}

/// Where a thing came from: its own line, and the instance of a composite that it stands in, if any.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Origin {
    /// The line in the text, inside a `define` or a `repeat` too.
    pub span: Span,
    /// The innermost instance that wrote it out.
    pub instance: Option<InstanceId>,
}

/// One instance of a composite.
#[derive(Clone, Copy, Debug)]
pub struct Instance {
    /// Its full name.
    pub name: NameId,
    /// The block statement that made it, and the instance that this one stands in.
    pub origin: Origin,
}

/// What drives a signal.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Driver {
    /// The world outside.
    Input,
    /// A summing junction.
    Sum(SumId),
    /// A block: its output, state or helper line.
    Block(BlockId),
    /// Nothing, which is an error that `resolve` has told if anything reads it.
    Nothing,
}

/// A signal.
#[derive(Clone, Copy, Debug)]
pub struct Signal {
    /// Its full name.
    pub name: NameId,
    /// What drives it.
    pub driver: Driver,
    /// Whether it was declared an output of the model.
    pub output: bool,
    /// Where it was declared, or else where it is driven.
    pub origin: Origin,
    /// Its declared unit's place in [`Netlist::units`].
    pub unit: Option<u32>,
}

/// A term of a sum.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Term {
    /// Whether it is subtracted.
    pub negative: bool,
    /// The factor, where one is written.
    pub factor: Option<ExprId>,
    /// The signal.
    pub signal: SignalId,
}

/// A summing junction.
#[derive(Clone, Debug)]
pub struct Sum {
    /// What it drives; its name is the sum's name.
    pub output: SignalId,
    /// Where its terms begin in [`Netlist::terms`].
    pub first_term: u32,
    /// How many terms it has.
    pub term_count: u32,
    /// Where it came from.
    pub origin: Origin,
}

/// A block.
#[derive(Clone, Debug)]
pub struct Block {
    /// Its full name.
    pub name: NameId,
    /// What it reads.
    pub inputs: Box<[SignalId]>,
    /// What it drives, ports only.
    pub outputs: Box<[SignalId]>,
    /// What it does.
    pub law: Law,
    /// Its sampling period; none for a block in continuous time.
    pub every: Option<ExprId>,
    /// Where it came from.
    pub origin: Origin,
}

/// What a block does.
#[derive(Clone, Debug)]
pub enum Law {
    /// One input, one output.
    Scalar(ExprId),
    /// A row for each output, a column for each input.
    Matrix(Box<[Box<[ExprId]>]>),
    /// State equations.
    States(Box<[Equation]>),
}

/// One equation of a block with states: \[s·\]left = Σ coefficient · \[s·\]variable.
#[derive(Clone, Debug)]
pub struct Equation {
    /// The state, helper or output that the line is for.
    pub left: SignalId,
    /// Whether the line gives its derivative: then it is a state.
    pub derivative: bool,
    /// The linear combination on the right.
    pub terms: Box<[EquationTerm]>,
    /// The line.
    pub span: Span,
}

/// One term of an [`Equation`].
#[derive(Clone, Copy, Debug)]
pub struct EquationTerm {
    /// Its factor.
    pub coefficient: ExprId,
    /// Whether the variable's derivative stands here.
    pub derivative: bool,
    /// A state, a helper, an input or an output of the block.
    pub variable: SignalId,
}

/// A param: of the model, or of an instance (an argument, or a `param` inside the composite).
#[derive(Clone, Copy, Debug)]
pub struct Param {
    /// Its full name.
    pub name: NameId,
    /// Its value in coherent SI as given, where it has one.
    pub value: Option<ExprId>,
    /// Its tolerance.
    pub within: Option<Within>,
    /// The unit that it was given with; its place in [`Netlist::units`].
    pub unit: Option<u32>,
    /// Where it came from.
    pub origin: Origin,
}

/// A tolerance, in coherent SI.
#[derive(Clone, Copy, Debug)]
pub enum Within {
    /// Plus or minus so many hundredths of the value.
    Percent(ExprId),
    /// From the one to the other.
    Range(ExprId, ExprId),
}

/// A named set of other values.
#[derive(Clone, Debug)]
pub struct Case {
    /// Its name.
    pub name: String,
    /// Its description.
    pub description: Option<String>,
    /// What it sets.
    pub settings: Vec<(ParamId, ExprId)>,
    /// Where it stands.
    pub span: Span,
}

/// A signal in a request with the text under which it was asked for, blanks removed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Asked {
    /// The signal.
    pub signal: SignalId,
    /// As written.
    pub text: String,
}

/// One request.
#[derive(Clone, Debug)]
pub struct Request {
    /// What is asked for.
    pub kind: RequestKind,
    /// The clauses.
    pub clauses: Clauses,
    /// Where it stands; [`Span::NONE`] for one of the command line.
    pub span: Span,
}

/// What a request asks for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RequestKind {
    /// The transfer function `to / from`.
    Transfer {
        /// The signal that answers.
        to: Asked,
        /// Where the test signal is added.
        from: Asked,
    },
    /// Every output from every input.
    All,
    /// The return ratio, or the matrix of return ratios, with these signals cut.
    Loop {
        /// Where the loops are cut.
        at: Vec<Asked>,
    },
    /// The transmission zeros of a matrix of transfer functions.
    Zeros {
        /// The signals that answer.
        to: Vec<Asked>,
        /// Where test signals are added.
        from: Vec<Asked>,
    },
}

/// What holds for a request or a requirement.
#[derive(Clone, Debug, Default)]
pub struct Clauses {
    /// Signals that are cut too.
    pub open: Vec<Asked>,
    /// Params that stay symbols.
    pub keep: Keep,
    /// The cases it is asked for.
    pub cases: AskedCases,
}

/// Params that stay symbols though they have a value.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Keep {
    /// None.
    #[default]
    Nothing,
    /// Every one that is given as a number.
    All,
    /// These.
    Params(Vec<ParamId>),
}

/// The cases that something is asked for.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum AskedCases {
    /// The values as given.
    #[default]
    Nominal,
    /// Nominal and every case.
    All,
    /// These; `None` is nominal.
    These(Vec<Option<CaseId>>),
}

/// A requirement.
#[derive(Clone, Debug)]
pub struct Requirement {
    /// What must hold.
    pub kind: RequirementKind,
    /// The clauses.
    pub clauses: Clauses,
    /// The text after `require`, clauses included, blanks folded.
    pub text: String,
    /// Where it stands.
    pub span: Span,
}

/// What a requirement says.
#[derive(Clone, Debug)]
pub enum RequirementKind {
    /// `stable`
    Stable,
    /// A figure against a bound.
    Figure {
        /// The figure.
        metric: Metric,
        /// The comparison.
        comparison: Comparison,
        /// The bound, in coherent SI, or in dB where `unit` says so.
        bound: ExprId,
        /// The unit in which the bound was written (`deg`, `dB`, `ms`), where one was; where an angular frequency is
        /// asked for, the scale of `Hz` is 2π, and that of `dB` is 1.
        unit: Option<DisplayUnit>,
    },
}

pub use crate::syntax::ast::Comparison;

/// A figure that a requirement can bound.
#[derive(Clone, Debug)]
pub enum Metric {
    /// Smallest factor of the loop gain that loses stability.
    GainMargin(Asked),
    /// Smallest phase change that does.
    PhaseMargin(Asked),
    /// Smallest extra dead time that does.
    DelayMargin(Asked),
    /// Smallest abs(1 + L).
    ModulusMargin(Asked),
    /// The highest ω at which abs(L) = 1.
    Crossover(Asked),
    /// Largest magnitude of the frequency response.
    Peak(Pair),
    /// First ω at which it is 1/√2 of its value at ω = 0.
    Bandwidth(Pair),
    /// Magnitude over a band, in rad/s.
    Magnitude(Pair, ExprId, ExprId),
    /// Of the unit step response, in per cent.
    Overshoot(Pair),
    /// Of the unit step response, 10–90 %.
    RiseTime(Pair),
    /// Of the unit step response; the band as a ratio, 2 % where none is given.
    SettlingTime(Pair, Option<ExprId>),
    /// Of the unit step response, or of the ramp or parabola response.
    FinalValue(Pair, Stimulus),
    /// Smallest damping ratio of all modes.
    DampingRatio,
    /// Smallest -Re p of all modes.
    DecayRate,
}

/// What a final value is of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stimulus {
    /// 1 from t = 0 on.
    Step,
    /// t
    Ramp,
    /// t²/2
    Parabola,
}

/// A transfer function by its ends.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Pair {
    /// The signal that answers.
    pub to: Asked,
    /// Where the test signal is added.
    pub from: Asked,
}

/// A unit as it was written, for display.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DisplayUnit {
    /// Its text, such as `kg*m^2`.
    pub text: String,
    /// How much of coherent SI one of it is.
    pub scale: ExprId,
}

/// In what the laws of a netlist are written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum TimeBase {
    /// Continuous time, laws in s (or no law with dynamics at all).
    Continuous,
    /// All dynamics sampled at one rate, laws in z.
    Sampled,
    /// Sampled blocks beside laws in s.
    Mixed,
}

/// The whole.
#[derive(Clone, Debug)]
pub struct Netlist {
    /// The model's name.
    pub model: String,
    /// Its description.
    pub description: Option<String>,
    /// All names.
    pub names: Names,
    /// All expressions.
    pub exprs: Exprs,
    /// All params, in the order of the file (those of an instance where its block stands).
    pub params: Vec<Param>,
    /// All signals, in the order in which the file first declares or drives them.
    pub signals: Vec<Signal>,
    /// All summing junctions, in the order of the file.
    pub sums: Vec<Sum>,
    /// The terms of all sums.
    pub terms: Vec<Term>,
    /// All blocks, in the order of the file.
    pub blocks: Vec<Block>,
    /// All instances of composites.
    pub instances: Vec<Instance>,
    /// Other names of signals: ports of instances, in the order of the file.
    pub aliases: Vec<(NameId, SignalId)>,
    /// Units as they were written.
    pub units: Vec<DisplayUnit>,
    /// All cases, in the order of the file.
    pub cases: Vec<Case>,
    /// All requests, in the order of the file.
    pub requests: Vec<Request>,
    /// All requirements, in the order of the file.
    pub requirements: Vec<Requirement>,
    /// In what the laws are written.
    pub time_base: TimeBase,
    /// The case that was put in nominal's place.
    pub nominal: Option<CaseId>,
}

impl Netlist {
    /// The full name of a signal.
    pub fn signal_name(&self, id: SignalId) -> &str {
        self.names.get(self.signals[id.index()].name)
    }

    /// The full name of a block.
    pub fn block_name(&self, id: BlockId) -> &str {
        self.names.get(self.blocks[id.index()].name)
    }

    /// The full name of a param.
    pub fn param_name(&self, id: ParamId) -> &str {
        self.names.get(self.params[id.index()].name)
    }

    /// The terms of a sum.
    pub fn terms_of(&self, sum: &Sum) -> &[Term] {
        &self.terms[sum.first_term as usize..(sum.first_term + sum.term_count) as usize]
    }

    /// The inputs of the model, in their order.
    pub fn inputs(&self) -> impl Iterator<Item = SignalId> + '_ {
        self.ids_where(|s| s.driver == Driver::Input)
    }

    /// The outputs of the model, in their order.
    pub fn outputs(&self) -> impl Iterator<Item = SignalId> + '_ {
        self.ids_where(|s| s.output)
    }

    fn ids_where(&self, which: impl Fn(&Signal) -> bool) -> impl Iterator<Item = SignalId> {
        self.signals.iter().enumerate().filter(move |(_, s)| which(s)).map(|(i, _)| SignalId(i as u32))
    }
}
