//! Tokens of expressions.

use crate::diagnostic::Diagnostic;
use crate::number::decimal;
use num_rational::BigRational;
use std::ops::Range;

/// The kind of a token.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Token {
    Number(BigRational),
    Name(String),
    Symbol(&'static str),
    End,
}

/// The symbols, longer ones before their beginnings; those without a meaning are refused by name.
const SYMBOLS: [&str; 23] = [
    "<=", ">=", "==", "=>", "=<", "!=", "<>", "&&", "||", "**", "<", ">", "=", "+", "-", "*", "/", "^", "(", ")", "!",
    "|", ",",
];

/// Characters that look like an operator, and what to write for them.
const LOOKALIKES: [(char, &str); 10] = [
    ('≤', "<="),
    ('≥', ">="),
    ('≠', "not a = b"),
    ('−', "-"),
    ('–', "-"),
    ('·', "*"),
    ('×', "*"),
    ('÷', "/"),
    ('²', "^2"),
    ('π', "an exact number, say 3.14159265"),
];

/// Splits a text into tokens with their places in it; the last one is the end.
pub(super) fn tokens(text: &str) -> Result<Vec<(Token, Range<usize>)>, Diagnostic> {
    let mut list = Vec::new();
    let mut at = 0;
    while let Some(c) = text[at..].chars().next() {
        let rest = &text[at..];
        if c.is_whitespace() {
            at += c.len_utf8();
        } else if c.is_ascii_digit() || (c == '.' && rest[1..].starts_with(|d: char| d.is_ascii_digit())) {
            let length = number_length(rest);
            let span = at..at + length;
            let value =
                decimal(&rest[..length]).map_err(|e| Diagnostic::new(span.clone(), e.message()).help(e.help()))?;
            list.push((Token::Number(value), span));
            at += length;
        } else if c.is_ascii_alphabetic() || c == '_' {
            let length = rest.find(|d: char| !d.is_ascii_alphanumeric() && d != '_').unwrap_or(rest.len());
            list.push((Token::Name(rest[..length].to_string()), at..at + length));
            at += length;
        } else if let Some(symbol) = SYMBOLS.iter().find(|s| rest.starts_with(**s)) {
            list.push((Token::Symbol(symbol), at..at + symbol.len()));
            at += symbol.len();
        } else {
            return Err(unknown(c, at));
        }
    }
    list.push((Token::End, text.len()..text.len()));
    Ok(list)
}

fn unknown(c: char, at: usize) -> Diagnostic {
    let diagnostic =
        Diagnostic::new(at..at + c.len_utf8(), format!("the character {c:?} has no meaning in an expression"));
    match LOOKALIKES.iter().find(|(known, _)| *known == c) {
        Some((_, instead)) => diagnostic.help(format!("write {instead}")),
        None => diagnostic.help("use letters, digits, _ and + - * / ^ ( ) < <= = >= > and the words not, and, or"),
    }
}

/// The length of a number at the start of a text: digits, a point with digits, an exponent.
fn number_length(text: &str) -> usize {
    let digits =
        |from: usize| text[from..].find(|c: char| !c.is_ascii_digit() && c != '_').map_or(text.len(), |n| from + n);
    let mut end = digits(0);
    if text[end..].starts_with('.') {
        end = digits(end + 1);
    }
    if text[end..].starts_with(['e', 'E']) {
        let sign = usize::from(text[end + 1..].starts_with(['+', '-']));
        if text[end + 1 + sign..].starts_with(|c: char| c.is_ascii_digit()) {
            end = digits(end + 1 + sign);
        }
    }
    end
}
