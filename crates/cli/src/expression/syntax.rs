//! The syntax tree of expressions and conditions.
//!
//! Sums, products, `and` and `or` hold all their operands in one list, so that the depth of a tree is bounded by the
//! nesting of its parentheses, however long a sum is.

use num_rational::BigRational;
use std::fmt;
use std::ops::Range;

/// The functions that expressions know.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Function {
    /// exp
    Exp,
    /// sin
    Sin,
    /// cos
    Cos,
    /// abs
    Abs,
}

impl Function {
    /// The word for it.
    pub fn name(self) -> &'static str {
        match self {
            Self::Exp => "exp",
            Self::Sin => "sin",
            Self::Cos => "cos",
            Self::Abs => "abs",
        }
    }
}

/// What stands before a summand.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sign {
    /// +
    Plus,
    /// -
    Minus,
}

/// What stands before a factor.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Step {
    /// *
    Times,
    /// /
    Over,
}

/// What stands between the two sides of a comparison.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Comparator {
    /// <
    Less,
    /// <=
    AtMost,
    /// =
    Equal,
    /// >=
    AtLeast,
    /// >
    Greater,
}

impl Comparator {
    /// The symbol for it.
    pub fn symbol(self) -> &'static str {
        match self {
            Self::Less => "<",
            Self::AtMost => "<=",
            Self::Equal => "=",
            Self::AtLeast => ">=",
            Self::Greater => ">",
        }
    }

    /// The comparator with this symbol.
    pub fn from_symbol(symbol: &str) -> Option<Self> {
        [Self::Less, Self::AtMost, Self::Equal, Self::AtLeast, Self::Greater].into_iter().find(|c| c.symbol() == symbol)
    }

    /// Whether two comparators may stand in one chain.
    pub fn runs_with(self, other: Self) -> bool {
        let direction = |c: Self| match c {
            Self::Less | Self::AtMost => 1,
            Self::Equal => 0,
            Self::AtLeast | Self::Greater => -1,
        };
        direction(self) == direction(other)
    }
}

/// A node of the syntax tree, with its place in the text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Node {
    /// The bytes of the text.
    pub span: Range<usize>,
    /// What it is.
    pub kind: NodeKind,
}

/// What a node is.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum NodeKind {
    /// A number.
    Number(BigRational),
    /// A name.
    Name(String),
    /// -a
    Negative(Box<Node>),
    /// a + b - c
    Sum(Vec<(Sign, Node)>),
    /// a * b / c, from left to right
    Product(Vec<(Step, Node)>),
    /// a ^ b
    Power(Box<Node>, Box<Node>),
    /// f(a)
    Call(Function, Box<Node>),
    /// a chain of comparisons: operands, and the comparators between them
    Comparison(Vec<Node>, Vec<Comparator>),
    /// not a
    Not(Box<Node>),
    /// a and b
    And(Vec<Node>),
    /// a or b
    Or(Vec<Node>),
}

impl Node {
    /// The nodes directly below.
    pub fn children(&self) -> Vec<&Node> {
        match &self.kind {
            NodeKind::Number(_) | NodeKind::Name(_) => Vec::new(),
            NodeKind::Negative(a) | NodeKind::Call(_, a) | NodeKind::Not(a) => vec![a],
            NodeKind::Power(a, b) => vec![a, b],
            NodeKind::Sum(list) => list.iter().map(|(_, n)| n).collect(),
            NodeKind::Product(list) => list.iter().map(|(_, n)| n).collect(),
            NodeKind::Comparison(list, _) | NodeKind::And(list) | NodeKind::Or(list) => list.iter().collect(),
        }
    }

    /// All names in the tree, in the order of the text, with repetitions.
    pub fn names(&self) -> Vec<&str> {
        if let NodeKind::Name(name) = &self.kind {
            return vec![name];
        }
        self.children().into_iter().flat_map(Node::names).collect()
    }
}

/// How tightly a node binds: or 0, and 1, not 2, comparison 3, sum 4, product 5, sign 6, power 7, else 8.
fn level(kind: &NodeKind) -> u8 {
    match kind {
        NodeKind::Or(_) => 0,
        NodeKind::And(_) => 1,
        NodeKind::Not(_) => 2,
        NodeKind::Comparison(..) => 3,
        NodeKind::Sum(_) => 4,
        NodeKind::Product(_) => 5,
        NodeKind::Negative(_) => 6,
        NodeKind::Power(..) => 7,
        NodeKind::Number(_) | NodeKind::Name(_) | NodeKind::Call(..) => 8,
    }
}

fn write_at(f: &mut fmt::Formatter<'_>, node: &Node, tightest: u8) -> fmt::Result {
    if level(&node.kind) < tightest { write!(f, "({node})") } else { write!(f, "{node}") }
}

fn write_list(f: &mut fmt::Formatter<'_>, list: &[Node], word: &str, tightest: u8) -> fmt::Result {
    for (i, node) in list.iter().enumerate() {
        if i > 0 {
            write!(f, " {word} ")?;
        }
        write_at(f, node, tightest)?;
    }
    Ok(())
}

/// The text of a tree, with parentheses where the reading would differ without them.
impl fmt::Display for Node {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.kind {
            NodeKind::Number(value) if value.is_integer() => write!(f, "{value}"),
            NodeKind::Number(value) => write!(f, "({value})"),
            NodeKind::Name(name) => write!(f, "{name}"),
            NodeKind::Negative(a) => {
                write!(f, "-")?;
                write_at(f, a, 6)
            }
            NodeKind::Sum(list) => list.iter().enumerate().try_for_each(|(i, (sign, node))| {
                match (i, sign) {
                    (0, Sign::Plus) => {}
                    (0, Sign::Minus) => write!(f, "0 - ")?,
                    (_, Sign::Plus) => write!(f, " + ")?,
                    (_, Sign::Minus) => write!(f, " - ")?,
                }
                write_at(f, node, 5)
            }),
            NodeKind::Product(list) => list.iter().enumerate().try_for_each(|(i, (step, node))| {
                match (i, step) {
                    (0, Step::Times) => {}
                    (0, Step::Over) => write!(f, "1/")?,
                    (_, Step::Times) => write!(f, "*")?,
                    (_, Step::Over) => write!(f, "/")?,
                }
                write_at(f, node, 6)
            }),
            NodeKind::Power(a, b) => {
                write_at(f, a, 8)?;
                write!(f, "^")?;
                write_at(f, b, 8)
            }
            NodeKind::Call(function, a) => write!(f, "{}({a})", function.name()),
            NodeKind::Comparison(operands, comparators) => operands.iter().enumerate().try_for_each(|(i, operand)| {
                if let Some(comparator) = i.checked_sub(1).and_then(|j| comparators.get(j)) {
                    write!(f, " {} ", comparator.symbol())?;
                }
                write_at(f, operand, 4)
            }),
            NodeKind::Not(a) => {
                write!(f, "not ")?;
                write_at(f, a, 2)
            }
            NodeKind::And(list) => write_list(f, list, "and", 2),
            NodeKind::Or(list) => write_list(f, list, "or", 1),
        }
    }
}
