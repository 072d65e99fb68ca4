//! Syntax of expressions.
//!
//! Precedence, tightest first: `^`, unary `-`, `* /`, `+ -`, comparison, `not`, `and`, `or`.

use super::lexer::{Token, tokens};
use super::syntax::{Comparator, Function, Node, NodeKind, Sign, Step};
use crate::diagnostic::Diagnostic;
use std::ops::Range;

/// The most nested parentheses, signs and functions.
pub const MAX_DEPTH: usize = 100;

/// The most bytes of an expression.
pub const MAX_EXPRESSION_LENGTH: usize = 100_000;

/// Reads an expression or a formula.
///
/// # Errors
/// One diagnostic, with a place in `text`.
pub fn parse(text: &str) -> Result<Node, Diagnostic> {
    if text.len() > MAX_EXPRESSION_LENGTH {
        return Err(Diagnostic::new(0..1, format!("an expression has at most {MAX_EXPRESSION_LENGTH} characters"))
            .help("name its parts with [output] sections"));
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
        let before = self.at.checked_sub(1).map(|i| &self.tokens[i].0);
        match self.peek() {
            Token::Symbol("(") if matches!(before, Some(Token::Name(_))) => {
                Diagnostic::new(span, "expected an operator between a name and `(`")
                    .help("write a product with *; the only functions are exp, sin, cos in signals and abs in zones")
            }
            Token::Name(name) if matches!(name.to_lowercase().as_str(), "and" | "or" | "not") => {
                Diagnostic::new(span, format!("expected an operator before `{name}`"))
                    .help("the words are and, or, not, in lower case, between comparisons: not a = b, a > 1 and b > 2")
            }
            Token::Name(_) | Token::Number(_) | Token::Symbol("(") => {
                Diagnostic::new(span, "expected an operator before this").help("write a product with *, as in 2*x")
            }
            Token::Symbol(")") => Diagnostic::new(span, "this closing parenthesis has no opening one")
                .help("remove it, or open it before"),
            Token::Symbol(s) => misused(s, span),
            Token::End => Diagnostic::new(span, "expected more").help("finish the expression"),
        }
    }

    fn disjunction(&mut self) -> Parsed {
        let mut parts = vec![self.conjunction()?];
        while self.accept_word("or") {
            parts.push(self.conjunction()?);
        }
        Ok(gathered(parts, |node| node, NodeKind::Or))
    }

    fn conjunction(&mut self) -> Parsed {
        let mut parts = vec![self.negation()?];
        while self.accept_word("and") {
            parts.push(self.negation()?);
        }
        Ok(gathered(parts, |node| node, NodeKind::And))
    }

    fn negation(&mut self) -> Parsed {
        let place = self.span();
        let start = place.start;
        if self.accept_word("not") {
            self.deeper(&place)?;
            let inner = self.negation()?;
            self.depth -= 1;
            return Ok(Node { span: start..inner.span.end, kind: NodeKind::Not(Box::new(inner)) });
        }
        self.comparison()
    }

    fn comparison(&mut self) -> Parsed {
        let mut operands = vec![self.sum()?];
        let mut comparators: Vec<Comparator> = Vec::new();
        while let Token::Symbol(symbol) = *self.peek() {
            let Some(comparator) = Comparator::from_symbol(symbol) else { break };
            let span = self.span();
            self.next();
            if comparators.first().is_some_and(|first| !first.runs_with(comparator)) {
                return Err(Diagnostic::new(span, "a chain of comparisons goes in one direction")
                    .help("write two comparisons joined by `and`, as in a < b and b > c"));
            }
            comparators.push(comparator);
            operands.push(self.sum()?);
        }
        if comparators.is_empty() {
            return Ok(operands.remove(0));
        }
        let span = operands[0].span.start..operands[operands.len() - 1].span.end;
        Ok(Node { span, kind: NodeKind::Comparison(operands, comparators) })
    }

    fn sum(&mut self) -> Parsed {
        let mut parts = vec![(Sign::Plus, self.product()?)];
        loop {
            let sign = match self.peek() {
                Token::Symbol("+") => Sign::Plus,
                Token::Symbol("-") => Sign::Minus,
                _ => return Ok(gathered(parts, |(_, node)| node, NodeKind::Sum)),
            };
            self.next();
            parts.push((sign, self.product()?));
        }
    }

    fn product(&mut self) -> Parsed {
        let mut parts = vec![(Step::Times, self.signed()?)];
        loop {
            let step = match self.peek() {
                Token::Symbol("*") => Step::Times,
                Token::Symbol("/") => Step::Over,
                _ => return Ok(gathered(parts, |(_, node)| node, NodeKind::Product)),
            };
            self.next();
            parts.push((step, self.signed()?));
        }
    }

    fn signed(&mut self) -> Parsed {
        let place = self.span();
        let start = place.start;
        if self.accept("-") {
            self.deeper(&place)?;
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
        let span = base.span.start..exponent.span.end;
        Ok(Node { span, kind: NodeKind::Power(Box::new(base), Box::new(exponent)) })
    }

    /// Counts a level that begins at a place.
    fn deeper(&mut self, place: &Range<usize>) -> Result<(), Diagnostic> {
        self.depth += 1;
        if self.depth <= MAX_DEPTH {
            return Ok(());
        }
        Err(Diagnostic::new(place.clone(), format!("an expression is nested at most {MAX_DEPTH} deep"))
            .help("name its parts with [output] sections"))
    }

    fn primary(&mut self) -> Parsed {
        let (token, span) = self.next();
        match token {
            Token::Number(value) => Ok(Node { span, kind: NodeKind::Number(value) }),
            Token::Symbol("(") => {
                self.deeper(&span)?;
                let inner = self.disjunction()?;
                self.depth -= 1;
                let end = self.close(&span)?;
                Ok(Node { span: span.start..end, kind: inner.kind })
            }
            Token::Name(name) => self.named(name, span),
            Token::Symbol(s) => Err(misused(s, span)),
            Token::End => Err(Diagnostic::new(span, "the expression ends too early: expected a number, a name or `(`")
                .help("finish the expression")),
        }
    }

    fn close(&mut self, open: &Range<usize>) -> Result<usize, Diagnostic> {
        let span = self.span();
        if self.accept(")") {
            return Ok(span.end);
        }
        match self.peek() {
            Token::End => {
                Err(Diagnostic::new(open.clone(), "this parenthesis is never closed").help("add the closing one"))
            }
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
            "true" | "false" => {
                return Err(Diagnostic::new(span, format!("`{name}` is a reserved word without a meaning"))
                    .help("write a comparison, as in x > 2"));
            }
            "not" => {
                return Err(Diagnostic::new(span, "`not` stands before a comparison, not inside one")
                    .help("put the negated comparison in parentheses, as in not (a > b)"));
            }
            "and" | "or" => {
                return Err(Diagnostic::new(span, format!("expected a number, a name or `(` before `{name}`"))
                    .help(format!("write a comparison on each side of `{name}`, as in x > 1 {name} y > 2")));
            }
            _ => return Ok(Node { span, kind: NodeKind::Name(name) }),
        };
        let open = self.span();
        if !self.accept("(") {
            return Err(Diagnostic::new(span, format!("{name} is a function: expected `(` after it"))
                .help(format!("write {name}(...); it cannot be the name of a quantity")));
        }
        self.deeper(&open)?;
        let argument = self.sum()?;
        self.depth -= 1;
        let end = self.close(&open)?;
        Ok(Node { span: span.start..end, kind: NodeKind::Call(function, Box::new(argument)) })
    }
}

/// The only part, or the node of all parts.
fn gathered<T: Part>(mut parts: Vec<T>, alone: fn(T) -> Node, kind: fn(Vec<T>) -> NodeKind) -> Node {
    if parts.len() == 1 {
        return alone(parts.remove(0));
    }
    let end = |part: Option<&T>, edge: fn(&Range<usize>) -> usize| part.map_or(0, |p| edge(&p.node().span));
    let span = end(parts.first(), |s| s.start)..end(parts.last(), |s| s.end);
    Node { span, kind: kind(parts) }
}

/// An operand, with or without what stands before it.
trait Part {
    fn node(&self) -> &Node;
}

impl Part for Node {
    fn node(&self) -> &Node {
        self
    }
}

impl<T> Part for (T, Node) {
    fn node(&self) -> &Node {
        &self.1
    }
}

fn misused(symbol: &str, span: Range<usize>) -> Diagnostic {
    let (message, help) = match symbol {
        "==" => ("`==` is not a comparison here", Some("write = for equality")),
        "!=" | "<>" => ("there is no operator for inequality", Some("write not a = b, or a < b or a > b")),
        "=>" => ("`=>` is not a comparison", Some("write >=")),
        "=<" => ("`=<` is not a comparison", Some("write <=")),
        "&&" => ("`&&` is not an operator here", Some("write `and`")),
        "||" | "|" => ("`|` is not an operator here", Some("write `or`, or abs(x) for an absolute value")),
        "!" => ("`!` is not an operator here", Some("write `not`")),
        "**" => ("`**` is not an operator here", Some("write ^ for a power")),
        "," => ("a comma has no meaning in an expression", Some("write decimals with a point")),
        "+" => ("expected a number, a name or `(`", Some("there is no unary +: leave it out")),
        _ => ("expected a number, a name or `(`", Some("an operator stands between two operands, as in x - 2*y")),
    };
    let diagnostic = Diagnostic::new(span, message);
    match help {
        Some(help) => diagnostic.help(help),
        None => diagnostic,
    }
}
