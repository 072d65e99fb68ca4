//! Expressions as an engineer writes them: tokens, syntax, and their exact meaning.

mod evaluate;
mod formula;
mod lexer;
mod parser;
mod polynomial;
mod signal;
mod syntax;

pub use evaluate::{Case, MAX_BITS, MAX_CASES, MAX_DEGREE, MAX_TERMS, Scope, Value, constant, evaluate, polynomial};
pub use formula::{MAX_COMPARISONS, MAX_NESTING, formula};
pub use parser::{MAX_DEPTH, MAX_EXPRESSION_LENGTH, parse};
pub use polynomial::{Polynomial, Powers};
pub use signal::{MAX_SIGNAL_POWER, MAX_SIGNAL_TERMS, signal};
pub use syntax::{Comparator, Function, Node, NodeKind, Sign, Step};

/// Words that are not names.
pub const RESERVED: [&str; 12] = ["t", "exp", "sin", "cos", "abs", "sqrt", "pi", "and", "or", "not", "true", "false"];
