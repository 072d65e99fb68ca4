//! Expressions as an engineer writes them: tokens, syntax, and their exact meaning.

mod formula;
mod lexer;
mod parser;
mod polynomial;
mod signal;

pub use formula::formula;
pub use parser::{Function, Node, NodeKind, parse};
pub use polynomial::{MAX_DEGREE, Polynomial, Scope, Value, constant, evaluate};
pub use signal::signal;

/// Words that are not names.
pub const RESERVED: [&str; 12] = ["t", "exp", "sin", "cos", "abs", "sqrt", "pi", "and", "or", "not", "true", "false"];
