//! The syntax tree: what the text says, in its order, with spans; no meaning yet.
//!
//! Expressions of a whole file lie in one arena, children before parents, so that a tree of a million statements is
//! a few large allocations. Names and numbers are spans: their text is read from the file where it is needed.

use crate::source::Span;

/// An expression's place in [`Tree::exprs`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct ExprId(pub u32);

/// A template's place in [`Tree::templates`]; [`TemplateId::NONE`] for a name without `{…}`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct TemplateId(pub u32);

impl TemplateId {
    /// A name without `{…}`.
    pub const NONE: Self = Self(u32::MAX);
}

/// A name as written: an identifier, or a path `az.e`, each part perhaps with indices `T{i}_{j}`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Name {
    /// The whole name, dots and indices included.
    pub span: Span,
    /// Its pieces where there is a `{…}` in it.
    pub template: TemplateId,
}

/// A piece of a name with indices.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Piece {
    /// Text to take as it stands.
    Text(Span),
    /// `{…}`: to be replaced by the whole number that the expression gives.
    Index(ExprId),
}

/// A sign between two expressions.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum BinaryOp {
    /// `+`
    Add,
    /// `-`
    Sub,
    /// `*`
    Mul,
    /// `/`
    Div,
    /// `^`
    Pow,
}

/// `sum(…)` or `product(…)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Repeated {
    /// `sum(k in a..b, …)`
    Sum,
    /// `product(k in a..b, …)`
    Product,
}

/// What an expression is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ExprKind {
    /// A number; its text is the node's span.
    Number,
    /// A name, `s`, `z` and `pi` among them; the whole name is the node's span.
    Name(TemplateId),
    /// `x'`: the derivative of a state; the node's span covers the prime, the name is what stands before it.
    Derivative(TemplateId),
    /// `-a`
    Neg(ExprId),
    /// `a + b` and so on; `operator` is found between the operands.
    Binary(BinaryOp, ExprId, ExprId),
    /// `f(…)`: a function or a defined law; the number is its place in [`Tree::calls`].
    Call(u32),
    /// `sum(k in a..b, …)`; the number is its place in [`Tree::repeated`].
    Repeated(u32),
    /// `a [unit]`; the number is the unit's place in [`Tree::units`].
    WithUnit(ExprId, u32),
}

/// An expression with its place in the text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Expr {
    /// What it is.
    pub kind: ExprKind,
    /// Its whole text. For [`ExprKind::Binary`] the text of both operands and all between them.
    pub span: Span,
}

/// One argument of a call.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Argument {
    /// The name before `=`, where it is a named argument.
    pub name: Option<Span>,
    /// Its value.
    pub value: ExprId,
}

/// A call `f(…)`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Call {
    /// What is called.
    pub callee: Span,
    /// The arguments in their order.
    pub arguments: Box<[Argument]>,
}

/// `sum(k in a..b, body)` or `product(…)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct RepeatedExpr {
    /// Which of the two.
    pub kind: Repeated,
    /// The index.
    pub index: Span,
    /// First whole number.
    pub from: ExprId,
    /// Last whole number.
    pub to: ExprId,
    /// What is written out.
    pub body: ExprId,
}

/// A statement with its place in the text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Statement {
    /// From its first word to its last.
    pub span: Span,
    /// What it says.
    pub kind: StatementKind,
}

/// Which kind of declaration of a signal.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum SignalKind {
    /// `input`
    Input,
    /// `output`
    Output,
    /// `signal`
    Inner,
}

/// What a statement says.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum StatementKind {
    /// `model NAME "…"`
    Model {
        /// The model's name.
        name: Span,
        /// Its description, quotation marks excluded.
        description: Option<Span>,
    },
    /// `use "PATH"`
    Use {
        /// The path, quotation marks excluded.
        path: Span,
    },
    /// `unit NAME = VALUE [UNIT]`
    Unit {
        /// The new unit's name.
        name: Span,
        /// What one of it is.
        value: ExprId,
    },
    /// `param …`
    Param(Box<Param>),
    /// `input …`, `output …`, `signal …`
    Signal {
        /// Which of the three.
        kind: SignalKind,
        /// The signal.
        name: Name,
        /// Its unit's place in [`Tree::units`].
        unit: Option<u32>,
        /// Its description, quotation marks excluded.
        description: Option<Span>,
    },
    /// `sum NAME = …`
    Sum {
        /// The signal that it drives.
        output: Name,
        /// The signed sum.
        value: ExprId,
        /// Its description, quotation marks excluded.
        description: Option<Span>,
    },
    /// `block …`
    Block(Box<Block>),
    /// `define NAME(…) = …` or `define NAME(…) : … -> … { … }`
    Define(Box<Define>),
    /// `repeat k in a..b { … }`
    Repeat(Box<Repeat>),
    /// `case NAME { … }`
    Case(Box<Case>),
    /// `find …`
    Find(Box<Find>),
    /// `require …`
    Require(Box<Require>),
}

/// `param NAME [UNIT] = VALUE within …`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Param {
    /// Its name.
    pub name: Name,
    /// A unit after the name (`param Ti [s]`); a unit after the value is part of the value.
    pub unit: Option<u32>,
    /// Its value.
    pub value: Option<ExprId>,
    /// Its tolerance.
    pub within: Option<Within>,
    /// Its description, quotation marks excluded.
    pub description: Option<Span>,
}

/// A tolerance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Within {
    /// `within 5%`: the number before the sign.
    Percent(ExprId),
    /// `within a .. b [unit]`: a unit after the range covers both ends.
    Range {
        /// Lower end.
        from: ExprId,
        /// Upper end.
        to: ExprId,
        /// The unit's place in [`Tree::units`].
        unit: Option<u32>,
    },
}

/// `block NAME : INPUTS -> OUTPUTS = LAW every T`, or with `{ equations }`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Block {
    /// Its name.
    pub name: Name,
    /// The signals that it reads.
    pub inputs: Box<[Name]>,
    /// The signals that it drives.
    pub outputs: Box<[Name]>,
    /// What it does.
    pub body: BlockBody,
    /// Its sampling period.
    pub every: Option<ExprId>,
    /// Its description, quotation marks excluded.
    pub description: Option<Span>,
}

/// What a block does.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum BlockBody {
    /// A law, or a call that may be an instance of a composite.
    Law(ExprId),
    /// `[[…], […]]`: a row for each output.
    Matrix(Box<[Box<[ExprId]>]>),
    /// `{ … }`: state equations.
    Equations(Box<[Equation]>),
}

/// One line of state equations: `x' = …` or `w = …`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Equation {
    /// What stands on the left, its prime excluded.
    pub left: Name,
    /// Whether a prime stands after it.
    pub derivative: bool,
    /// What stands on the right.
    pub right: ExprId,
    /// The whole line.
    pub span: Span,
}

/// A parameter of a define: `NAME [UNIT] = DEFAULT`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct DefineParam {
    /// Its name.
    pub name: Span,
    /// Its unit's place in [`Tree::units`].
    pub unit: Option<u32>,
    /// Its default.
    pub default: Option<ExprId>,
}

/// A port of a composite: `NAME [UNIT]`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Port {
    /// Its name.
    pub name: Span,
    /// Its unit's place in [`Tree::units`].
    pub unit: Option<u32>,
}

/// `define …`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Define {
    /// Its name.
    pub name: Span,
    /// Its parameters.
    pub params: Box<[DefineParam]>,
    /// What it stands for.
    pub body: DefineBody,
    /// Its description, quotation marks excluded.
    pub description: Option<Span>,
}

/// What a define stands for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum DefineBody {
    /// A law.
    Law(ExprId),
    /// A composite of statements.
    Composite {
        /// Ports that it reads.
        inputs: Box<[Port]>,
        /// Ports that it drives.
        outputs: Box<[Port]>,
        /// What is inside.
        body: Vec<Statement>,
    },
}

/// `repeat k in a..b { … }`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Repeat {
    /// The index.
    pub index: Span,
    /// First whole number.
    pub from: ExprId,
    /// Last whole number.
    pub to: ExprId,
    /// What is written out.
    pub body: Vec<Statement>,
}

/// `case NAME "…" { … }`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Case {
    /// Its name.
    pub name: Span,
    /// Its description, quotation marks excluded.
    pub description: Option<Span>,
    /// The values that it sets.
    pub settings: Box<[Setting]>,
}

/// One line of a case: `NAME = VALUE`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Setting {
    /// The param, perhaps inside an instance.
    pub name: Name,
    /// Its value in that case.
    pub value: ExprId,
}

/// `find REQUEST, … CLAUSES`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Find {
    /// What is asked for.
    pub requests: Box<[Request]>,
    /// The clauses, which hold for all of them.
    pub clauses: Clauses,
}

/// One request with its place in the text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Request {
    /// What is asked for.
    pub kind: RequestKind,
    /// Its text, clauses excluded.
    pub span: Span,
}

/// What a request asks for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RequestKind {
    /// `y / x`
    Transfer {
        /// The signal that answers.
        to: Name,
        /// The signal at which the test signal is added.
        from: Name,
    },
    /// `all`
    All,
    /// `loop at u1, u2`
    Loop {
        /// Where the loop is cut.
        at: Box<[Name]>,
    },
    /// `zeros y1, y2 / u1, u2`
    Zeros {
        /// The signals that answer.
        to: Box<[Name]>,
        /// The signals at which test signals are added.
        from: Box<[Name]>,
    },
}

/// What may stand after requests and requirements; each at most once.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Clauses {
    /// `with v, w open`
    pub open: Box<[Name]>,
    /// `keep …`
    pub keep: Keep,
    /// `in …`
    pub cases: Cases,
}

/// `keep …`
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Keep {
    /// No such clause.
    #[default]
    Nothing,
    /// `keep all`
    All,
    /// `keep Kp, Ti`
    Names(Box<[Name]>),
}

/// `in …`
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Cases {
    /// No such clause: the values as given.
    #[default]
    Nominal,
    /// `in all`: nominal and every case.
    All,
    /// `in cold, hot`
    Names(Box<[Span]>),
}

/// How a figure is compared with a value.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Comparison {
    /// `>=`
    AtLeast,
    /// `<=`
    AtMost,
    /// `>`
    Above,
    /// `<`
    Below,
}

/// `require METRIC SUBJECT OP VALUE CLAUSES`
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Require {
    /// The metric's word.
    pub metric: Span,
    /// What it is asked of.
    pub subject: Subject,
    /// `over a .. b [unit]`
    pub over: Option<Band>,
    /// `to 5 [%]`
    pub to: Option<ExprId>,
    /// The word after `for`.
    pub stimulus: Option<Span>,
    /// The comparison and the value; none for `stable`.
    pub bound: Option<(Comparison, ExprId)>,
    /// The clauses.
    pub clauses: Clauses,
}

/// What a requirement is asked of.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Subject {
    /// The whole.
    Whole,
    /// `at u`
    At(Name),
    /// `y/r`
    Transfer {
        /// The signal that answers.
        to: Name,
        /// The signal at which the test signal is added.
        from: Name,
    },
}

/// `a .. b [unit]`
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Band {
    /// Lower end.
    pub from: ExprId,
    /// Upper end.
    pub to: ExprId,
    /// The unit's place in [`Tree::units`]; it covers both ends.
    pub unit: Option<u32>,
    /// The whole range with its unit.
    pub span: Span,
}

/// The tree of one file.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Tree {
    /// The statements in their order.
    pub statements: Vec<Statement>,
    /// All expressions, children before parents.
    pub exprs: Vec<Expr>,
    /// The pieces of names with indices.
    pub templates: Vec<Box<[Piece]>>,
    /// All calls.
    pub calls: Vec<Call>,
    /// All `sum(…)` and `product(…)`.
    pub repeated: Vec<RepeatedExpr>,
    /// All units, brackets excluded.
    pub units: Vec<Span>,
    /// All comments, from `#` to the end of the line.
    pub comments: Vec<Span>,
}

impl Tree {
    /// The expression with this number.
    pub fn expr(&self, id: ExprId) -> Expr {
        self.exprs[id.0 as usize]
    }
}

/// A unit as written, such as `kg*m^2/s`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum UnitExpr {
    /// A symbol, with its prefix if any; its span counts from the start of the unit's text.
    Symbol(Span),
    /// `1`
    One,
    /// `a * b`
    Mul(Box<Self>, Box<Self>),
    /// `a / b`
    Div(Box<Self>, Box<Self>),
    /// `a ^ n`
    Pow(Box<Self>, i32),
}
