//! Syntax of expressions.
//!
//! Precedence, tightest first: `^`, unary `-`, `* /`, `+ -`, comparison, `not`, `and`, `or`.

use super::lexer::{Token, tokens};
use crate::diagnostic::Diagnostic;
use num_rational::BigRational;
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
    /// a + b
    Sum(Box<Node>, Box<Node>),
    /// a - b
    Difference(Box<Node>, Box<Node>),
    /// a * b
    Product(Box<Node>, Box<Node>),
    /// a / b
    Quotient(Box<Node>, Box<Node>),
    /// a ^ b
    Power(Box<Node>, Box<Node>),
    /// f(a)
    Call(Function, Box<Node>),
    /// a chain of comparisons: operands, and the operators between them
    Comparison(Vec<Node>, Vec<&'static str>),
    /// not a
    Not(Box<Node>),
    /// a and b
    And(Box<Node>, Box<Node>),
    /// a or b
    Or(Box<Node>, Box<Node>),
}

/// The most nested parentheses, signs and functions.
const MAX_DEPTH: usize = 100;

/// The most bytes of an expression.
const MAX_LENGTH: usize = 100_000;

/// Reads an expression or a formula.
///
/// # Errors
/// One diagnostic, with a place in `text`.
pub fn parse(text: &str) -> Result<Node, Diagnostic> {
    if text.len() > MAX_LENGTH {
        return Err(Diagnostic::new(0..1, format!("an expression has at most {MAX_LENGTH} characters")));
    }
    let mut parser = Parser { tokens: tokens(text)?, at: 0, depth: 0 };
    let node = parser.disjunction()?;
    match parser.peek() {
        Token::End => Ok(node),
        _ => Err(parser.trailing()),
    }
}

struct Parser {
    tokens: Vec<(Token, Range<usize>)>,
    at: usize,
    depth: usize,
}

type Parsed = Result<Node, Diagnostic>;

impl Parser {
    fn peek(&self) -> &Token {
        &self.tokens[self.at].0
    }

    fn span(&self) -> Range<usize> {
        self.tokens[self.at].1.clone()
    }

    fn next(&mut self) -> (Token, Range<usize>) {
        let token = self.tokens[self.at].clone();
        self.at = (self.at + 1).min(self.tokens.len() - 1);
        token
    }

    fn accept(&mut self, symbol: &str) -> bool {
        let found = matches!(self.peek(), Token::Symbol(s) if *s == symbol);
        if found {
            self.next();
        }
        found
    }

    fn accept_word(&mut self, word: &str) -> bool {
        let found = matches!(self.peek(), Token::Name(n) if n == word);
        if found {
            self.next();
        }
        found
    }

    /// What stands where an operator or the end was expected.
    fn trailing(&self) -> Diagnostic {
        let span = self.span();
        match self.peek() {
            Token::Name(_) | Token::Number(_) | Token::Symbol("(") => {
                Diagnostic::new(span, "expected an operator before this").help("write a product with *, as in 2*x")
            }
            Token::Symbol(")") => Diagnostic::new(span, "this closing parenthesis has no opening one"),
            Token::Symbol(s) => misused(s, span),
            Token::End => Diagnostic::new(span, "expected more"),
        }
    }

    fn disjunction(&mut self) -> Parsed {
        let mut left = self.conjunction()?;
        while self.accept_word("or") {
            let right = self.conjunction()?;
            left = join(left, right, NodeKind::Or);
        }
        Ok(left)
    }

    fn conjunction(&mut self) -> Parsed {
        let mut left = self.negation()?;
        while self.accept_word("and") {
            let right = self.negation()?;
            left = join(left, right, NodeKind::And);
        }
        Ok(left)
    }

    fn negation(&mut self) -> Parsed {
        let start = self.span().start;
        if self.accept_word("not") {
            self.deeper()?;
            let inner = self.negation()?;
            self.depth -= 1;
            return Ok(Node { span: start..inner.span.end, kind: NodeKind::Not(Box::new(inner)) });
        }
        self.comparison()
    }

    fn comparison(&mut self) -> Parsed {
        let first = self.sum()?;
        let mut operands = vec![first];
        let mut operators: Vec<&'static str> = Vec::new();
        while let Token::Symbol(symbol @ ("<" | "<=" | "=" | ">=" | ">")) = *self.peek() {
            let span = self.span();
            self.next();
            let direction = |s: &str| s.chars().next();
            if operators.iter().any(|o| direction(o) != direction(symbol)) || (symbol == "=" && !operators.is_empty()) {
                return Err(Diagnostic::new(span, "a chain of comparisons goes in one direction")
                    .help("write two comparisons joined by `and`, as in a < b and b > c"));
            }
            operators.push(symbol);
            operands.push(self.sum()?);
        }
        if operators.is_empty() {
            return Ok(operands.remove(0));
        }
        let span = operands[0].span.start..operands[operands.len() - 1].span.end;
        Ok(Node { span, kind: NodeKind::Comparison(operands, operators) })
    }

    fn sum(&mut self) -> Parsed {
        let mut left = self.product()?;
        loop {
            if self.accept("+") {
                let right = self.product()?;
                left = join(left, right, NodeKind::Sum);
            } else if self.accept("-") {
                let right = self.product()?;
                left = join(left, right, NodeKind::Difference);
            } else {
                return Ok(left);
            }
        }
    }

    fn product(&mut self) -> Parsed {
        let mut left = self.signed()?;
        loop {
            if self.accept("*") {
                let right = self.signed()?;
                left = join(left, right, NodeKind::Product);
            } else if self.accept("/") {
                let right = self.signed()?;
                left = join(left, right, NodeKind::Quotient);
            } else {
                return Ok(left);
            }
        }
    }

    fn signed(&mut self) -> Parsed {
        let start = self.span().start;
        if self.accept("-") {
            self.deeper()?;
            let inner = self.signed()?;
            self.depth -= 1;
            return Ok(Node { span: start..inner.span.end, kind: NodeKind::Negative(Box::new(inner)) });
        }
        self.power()
    }

    fn power(&mut self) -> Parsed {
        let base = self.primary()?;
        if !self.accept("^") {
            return Ok(base);
        }
        if matches!(self.peek(), Token::Symbol("-")) {
            return Err(Diagnostic::new(self.span(), "an exponent is a non-negative integer constant")
                .help("write a division, as in 1/x^2 for a constant x"));
        }
        let exponent = self.primary()?;
        if matches!(self.peek(), Token::Symbol("^")) {
            return Err(Diagnostic::new(self.span(), "a^b^c is ambiguous").help("write (a^b)^c or a^(b^c)"));
        }
        Ok(join(base, exponent, NodeKind::Power))
    }

    fn deeper(&mut self) -> Result<(), Diagnostic> {
        self.depth += 1;
        if self.depth <= MAX_DEPTH {
            return Ok(());
        }
        Err(Diagnostic::new(self.span(), format!("an expression is nested at most {MAX_DEPTH} deep")))
    }

    fn primary(&mut self) -> Parsed {
        let (token, span) = self.next();
        match token {
            Token::Number(value) => Ok(Node { span, kind: NodeKind::Number(value) }),
            Token::Symbol("(") => {
                self.deeper()?;
                let inner = self.disjunction()?;
                self.depth -= 1;
                let end = self.close(&span)?;
                Ok(Node { span: span.start..end, kind: inner.kind })
            }
            Token::Name(name) => self.named(name, span),
            Token::Symbol(s) => Err(misused(s, span)),
            Token::End => Err(Diagnostic::new(span, "the expression ends too early: expected a number, a name or `(`")),
        }
    }

    fn close(&mut self, open: &Range<usize>) -> Result<usize, Diagnostic> {
        let span = self.span();
        if self.accept(")") {
            return Ok(span.end);
        }
        match self.peek() {
            Token::End => Err(Diagnostic::new(open.clone(), "this parenthesis is never closed")),
            _ => Err(self.trailing()),
        }
    }

    fn named(&mut self, name: String, span: Range<usize>) -> Parsed {
        let function = match name.as_str() {
            "exp" => Function::Exp,
            "sin" => Function::Sin,
            "cos" => Function::Cos,
            "abs" => Function::Abs,
            "sqrt" => {
                return Err(Diagnostic::new(span, "sqrt is not exact")
                    .help("give the root as an exact number, say 1.4142136, or as a range under [uncertain]"));
            }
            "pi" => {
                return Err(Diagnostic::new(span, "pi is not a rational number")
                    .help("give an exact number, say 314.159265 for 100*pi, or a range around it under [uncertain]"));
            }
            "and" | "or" | "not" | "true" | "false" => {
                return Err(Diagnostic::new(span, format!("expected a number, a name or `(` before `{name}`")));
            }
            _ => return Ok(Node { span, kind: NodeKind::Name(name) }),
        };
        let open = self.span();
        if !self.accept("(") {
            return Err(Diagnostic::new(span, format!("{name} is a function: expected `(` after it")));
        }
        self.deeper()?;
        let argument = self.sum()?;
        self.depth -= 1;
        let end = self.close(&open)?;
        Ok(Node { span: span.start..end, kind: NodeKind::Call(function, Box::new(argument)) })
    }
}

fn join(left: Node, right: Node, kind: fn(Box<Node>, Box<Node>) -> NodeKind) -> Node {
    Node { span: left.span.start..right.span.end, kind: kind(Box::new(left), Box::new(right)) }
}

fn misused(symbol: &str, span: Range<usize>) -> Diagnostic {
    let (message, help) = match symbol {
        "==" => ("`==` is not a comparison here", Some("write = for equality")),
        "!=" | "<>" => ("there is no operator for inequality", Some("write not a = b, or a < b or a > b")),
        "&&" => ("`&&` is not an operator here", Some("write `and`")),
        "||" | "|" => ("`|` is not an operator here", Some("write `or`, or abs(x) for an absolute value")),
        "!" => ("`!` is not an operator here", Some("write `not`")),
        "**" => ("`**` is not an operator here", Some("write ^ for a power")),
        "," => ("a comma has no meaning in an expression", Some("write decimals with a point")),
        "+" => ("expected a number, a name or `(`", Some("there is no unary +: leave it out")),
        _ => ("expected a number, a name or `(`", None),
    };
    let diagnostic = Diagnostic::new(span, message);
    match help {
        Some(help) => diagnostic.help(help),
        None => diagnostic,
    }
}
