//! A strict reader and a plain writer for the JSON texts of this project (RFC 8259).
//!
//! The formats hold objects, arrays, strings and the words `true` and `false`: all numbers of meaning are strings, so a
//! bare number or `null` is refused, as are duplicate keys, deep nesting and anything after the value.

use crate::error::Rejection;
use crate::limits::{Limits, within};
use std::iter::Peekable;
use std::str::CharIndices;

/// A JSON value.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Value {
    /// `true` or `false`.
    Bool(bool),
    /// A string.
    Text(String),
    /// An array.
    List(Vec<Value>),
    /// An object: keys in the order of the text, none twice.
    Object(Vec<(String, Value)>),
}

impl Value {
    /// A string value.
    pub fn text(text: impl ToString) -> Self {
        Self::Text(text.to_string())
    }

    /// The value as JSON: short lists and objects on one line, others one entry a line.
    pub fn print(&self) -> String {
        let mut out = String::new();
        self.write(&mut out, 0, usize::MAX);
        out + "\n"
    }

    /// Nothing is written once the text is longer than `limit`: an attempt to stay on one line ends early.
    fn write(&self, out: &mut String, indent: usize, limit: usize) {
        match self {
            _ if out.len() > limit => {}
            Self::Bool(value) => out.push_str(if *value { "true" } else { "false" }),
            Self::Text(text) => write_text(out, text),
            Self::List(items) => write_block(out, indent, limit, ('[', ']'), items, |out, item, inner, limit| {
                item.write(out, inner, limit);
            }),
            Self::Object(fields) => {
                write_block(out, indent, limit, ('{', '}'), fields, |out, (key, value), inner, limit| {
                    write_text(out, key);
                    out.push_str(": ");
                    value.write(out, inner, limit);
                })
            }
        }
    }
}

/// A string value.
pub(crate) fn text(text: impl ToString) -> Value {
    Value::text(text)
}

/// An object with these keys, which are distinct.
pub(crate) fn object(fields: Vec<(&str, Value)>) -> Value {
    Value::Object(fields.into_iter().map(|(key, value)| (key.to_string(), value)).collect())
}

fn write_block<T>(
    out: &mut String,
    indent: usize,
    limit: usize,
    brackets: (char, char),
    items: &[T],
    write: impl Fn(&mut String, &T, usize, usize),
) {
    let start = out.len();
    let line_end = limit.min((start + 110).saturating_sub(indent));
    out.push(brackets.0);
    for (i, item) in items.iter().enumerate() {
        out.push_str(if i == 0 { "" } else { ", " });
        write(out, item, indent, line_end);
    }
    out.push(brackets.1);
    if out.len() <= line_end || limit < usize::MAX {
        return;
    }
    out.truncate(start);
    out.push(brackets.0);
    for (i, item) in items.iter().enumerate() {
        out.push_str(if i == 0 { "\n" } else { ",\n" });
        out.extend(std::iter::repeat_n(' ', indent + 2));
        write(out, item, indent + 2, limit);
    }
    out.push('\n');
    out.extend(std::iter::repeat_n(' ', indent));
    out.push(brackets.1);
}

fn write_text(out: &mut String, text: &str) {
    out.push('"');
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            c if c < ' ' => out.push_str(&format!("\\u{:04x}", u32::from(c))),
            c => out.push(c),
        }
    }
    out.push('"');
}

/// Reads one JSON value that is the whole text.
///
/// # Errors
/// [`Rejection::Malformed`] with the line, or [`Rejection::LimitExceeded`].
pub fn read(text: &str, limits: &Limits) -> Result<Value, Rejection> {
    within("text_bytes", text.len(), limits.text_bytes)?;
    let mut reader = Reader { text, rest: text.char_indices().peekable(), limits };
    let value = reader.value(0)?;
    reader.space();
    if reader.rest.peek().is_some() {
        return Err(reader.unexpected("the end of the text"));
    }
    Ok(value)
}

struct Reader<'a> {
    text: &'a str,
    rest: Peekable<CharIndices<'a>>,
    limits: &'a Limits,
}

impl Reader<'_> {
    fn unexpected(&mut self, expected: &'static str) -> Rejection {
        let at = self.rest.peek().map_or(self.text.len(), |(i, _)| *i);
        let line = self.text.get(..at).map_or(0, |before| before.matches('\n').count()) + 1;
        let found = self.rest.peek().map_or("the end of the text".to_string(), |(_, c)| format!("{c:?}"));
        Rejection::Malformed { place: format!("line {line}"), expected, found }
    }

    fn space(&mut self) {
        while self.rest.next_if(|(_, c)| matches!(c, ' ' | '\t' | '\r' | '\n')).is_some() {}
    }

    fn accept(&mut self, wanted: char) -> bool {
        self.space();
        self.rest.next_if(|(_, c)| *c == wanted).is_some()
    }

    fn expect(&mut self, wanted: char, expected: &'static str) -> Result<(), Rejection> {
        if self.accept(wanted) { Ok(()) } else { Err(self.unexpected(expected)) }
    }

    fn value(&mut self, depth: usize) -> Result<Value, Rejection> {
        within("nesting", depth, self.limits.nesting)?;
        self.space();
        match self.rest.peek().map(|(_, c)| *c) {
            Some('{') => self.object(depth),
            Some('[') => self.list(depth),
            Some('"') => self.string().map(Value::Text),
            Some('t') => self.word("true").map(|()| Value::Bool(true)),
            Some('f') => self.word("false").map(|()| Value::Bool(false)),
            Some(_) | None => {
                Err(self.unexpected("an object, an array, a string, true or false (numbers are strings)"))
            }
        }
    }

    fn word(&mut self, word: &'static str) -> Result<(), Rejection> {
        let is_there = word.chars().all(|wanted| self.rest.next_if(|(_, c)| *c == wanted).is_some());
        if is_there { Ok(()) } else { Err(self.unexpected(word)) }
    }

    fn object(&mut self, depth: usize) -> Result<Value, Rejection> {
        self.expect('{', "'{'")?;
        let mut fields: Vec<(String, Value)> = Vec::new();
        if self.accept('}') {
            return Ok(Value::Object(fields));
        }
        loop {
            self.space();
            let key = self.string()?;
            // Objects of the formats have a dozen keys at most; the limit keeps this comparison short.
            within("statement_entries", fields.len() + 1, self.limits.statement_entries)?;
            if fields.iter().any(|(k, _)| *k == key) {
                return Err(Rejection::Malformed {
                    place: format!("key {key:?}"),
                    expected: "each key once",
                    found: "it twice".into(),
                });
            }
            self.expect(':', "':'")?;
            let value = self.value(depth + 1)?;
            fields.push((key, value));
            if self.accept('}') {
                return Ok(Value::Object(fields));
            }
            self.expect(',', "',' or '}'")?;
        }
    }

    fn list(&mut self, depth: usize) -> Result<Value, Rejection> {
        self.expect('[', "'['")?;
        let mut items = Vec::new();
        if self.accept(']') {
            return Ok(Value::List(items));
        }
        loop {
            items.push(self.value(depth + 1)?);
            if self.accept(']') {
                return Ok(Value::List(items));
            }
            self.expect(',', "',' or ']'")?;
        }
    }

    fn string(&mut self) -> Result<String, Rejection> {
        self.expect('"', "a string")?;
        let mut out = String::new();
        loop {
            match self.rest.next().map(|(_, c)| c) {
                Some('"') => return Ok(out),
                Some('\\') => out.push(self.escape()?),
                Some(c) if c >= ' ' => out.push(c),
                Some(_) | None => return Err(self.unexpected("the rest of a string")),
            }
        }
    }

    fn escape(&mut self) -> Result<char, Rejection> {
        match self.rest.next().map(|(_, c)| c) {
            Some(c @ ('"' | '\\' | '/')) => Ok(c),
            Some('n') => Ok('\n'),
            Some('t') => Ok('\t'),
            Some('r') => Ok('\r'),
            Some('b') => Ok('\u{8}'),
            Some('f') => Ok('\u{c}'),
            Some('u') => {
                let mut code = 0;
                for _ in 0..4 {
                    let digit = self.rest.next().and_then(|(_, c)| c.to_digit(16));
                    code = code * 16 + digit.ok_or_else(|| self.unexpected("four hexadecimal digits"))?;
                }
                // Surrogate pairs are not characters; the formats write such characters as themselves.
                char::from_u32(code).ok_or_else(|| self.unexpected("a character, not a surrogate"))
            }
            Some(_) | None => Err(self.unexpected("an escape sequence")),
        }
    }
}
