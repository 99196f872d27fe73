//! Bound expressions: one arena, children before parents.

use super::ParamId;
use crate::source::Span;
use dashu_ratio::RBig;

/// An expression's place in [`Exprs`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct ExprId(pub u32);

/// A function of parameter expressions.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Function {
    /// Square root.
    Sqrt,
    /// Sine.
    Sin,
    /// Cosine.
    Cos,
    /// Tangent.
    Tan,
    /// Arc tangent.
    Atan,
    /// Exponential of a number.
    Exp,
    /// Natural logarithm.
    Ln,
    /// Absolute value.
    Abs,
}

/// What an expression is. Values are in coherent SI.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Expr {
    /// A ratio of two small whole numbers, in lowest terms, the denominator positive.
    Ratio(i32, u32),
    /// Any other rational number; its place in the table of numbers.
    Number(u32),
    /// π
    Pi,
    /// The Laplace variable.
    S,
    /// The variable of the z transform.
    Z,
    /// A param's value.
    Param(ParamId),
    /// `-a`
    Neg(ExprId),
    /// `a + b`
    Add(ExprId, ExprId),
    /// `a - b`
    Sub(ExprId, ExprId),
    /// `a * b`
    Mul(ExprId, ExprId),
    /// `a / b`
    Div(ExprId, ExprId),
    /// `a ^ n`
    Pow(ExprId, i32),
    /// `exp(a)` in a law: a = -T·s, a dead time.
    Delay(ExprId),
    /// `f(a)` of a parameter expression.
    Call(Function, ExprId),
    /// `min(a, b)`
    Min(ExprId, ExprId),
    /// `max(a, b)`
    Max(ExprId, ExprId),
}

/// All expressions of a netlist with their places in the text.
#[derive(Clone, Debug, Default)]
pub struct Exprs {
    nodes: Vec<Expr>,
    spans: Vec<Span>,
    numbers: Vec<RBig>,
}

impl Exprs {
    /// Adds an expression; its children must be there already.
    pub fn push(&mut self, node: Expr, span: Span) -> ExprId {
        self.nodes.push(node);
        self.spans.push(span);
        ExprId(self.nodes.len() as u32 - 1)
    }

    /// Adds a rational number.
    pub fn push_number(&mut self, value: RBig, span: Span) -> ExprId {
        let small = i32::try_from(value.numerator()).ok().zip(u32::try_from(value.denominator()).ok());
        let node = small.map_or_else(
            || {
                self.numbers.push(value);
                Expr::Number(self.numbers.len() as u32 - 1)
            },
            |(n, d)| Expr::Ratio(n, d),
        );
        self.push(node, span)
    }

    /// The expression with this number.
    pub fn get(&self, id: ExprId) -> Expr {
        self.nodes[id.0 as usize]
    }

    /// Where it stands in the text.
    pub fn span(&self, id: ExprId) -> Span {
        self.spans[id.0 as usize]
    }

    /// The value of an [`Expr::Number`].
    pub fn number(&self, place: u32) -> &RBig {
        &self.numbers[place as usize]
    }

    /// How many expressions there are.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }

    /// The expressions that a node is made of.
    pub fn children(&self, id: ExprId) -> impl Iterator<Item = ExprId> + use<> {
        let (a, b) = match self.get(id) {
            Expr::Ratio(..) | Expr::Number(_) | Expr::Pi | Expr::S | Expr::Z | Expr::Param(_) => (None, None),
            Expr::Neg(a) | Expr::Pow(a, _) | Expr::Delay(a) | Expr::Call(_, a) => (Some(a), None),
            Expr::Add(a, b)
            | Expr::Sub(a, b)
            | Expr::Mul(a, b)
            | Expr::Div(a, b)
            | Expr::Min(a, b)
            | Expr::Max(a, b) => (Some(a), Some(b)),
        };
        a.into_iter().chain(b)
    }
}
