//! Typed reading of TOML values, with every refusal at its place.

use crate::diagnostic::{Diagnostic, nearest};
use crate::expression::{Scope, Value, constant, parse};
use crate::number::{MAX_LENGTH, NumberError, decimal};
use num_bigint::BigInt;
use num_rational::BigRational;
use std::cell::RefCell;
use std::ops::Range;
use toml::de::{DeTable, DeValue};

/// A TOML value with its place.
pub(super) type Item<'a> = &'a toml::Spanned<DeValue<'a>>;

/// Where refusals are collected.
pub(super) struct Refusals<'a> {
    pub(super) text: &'a str,
    list: RefCell<Vec<Diagnostic>>,
}

impl<'a> Refusals<'a> {
    pub(super) fn new(text: &'a str) -> Self {
        Self { text, list: RefCell::default() }
    }

    pub(super) fn push(&self, diagnostic: Diagnostic) {
        self.list.borrow_mut().push(diagnostic);
    }

    pub(super) fn into_list(self) -> Vec<Diagnostic> {
        self.list.into_inner()
    }

    pub(super) fn is_empty(&self) -> bool {
        self.list.borrow().is_empty()
    }

    /// The value, or its refusal on the list.
    pub(super) fn keep<T>(&self, result: Result<T, Diagnostic>) -> Option<T> {
        result.map_err(|d| self.push(d)).ok()
    }

    /// Refuses keys other than these.
    pub(super) fn only(&self, table: &DeTable, keys: &[&str], what: &str) {
        for key in table.keys() {
            let name = key.get_ref().as_ref();
            if keys.contains(&name) {
                continue;
            }
            let diagnostic = Diagnostic::new(key.span(), format!("`{name}` is not a key of {what}"));
            self.push(match nearest(name, keys.iter().copied()) {
                Some(close) => diagnostic.help(format!("did you mean `{close}`?")),
                None => diagnostic.help(format!("keys here: {}", keys.join(", "))),
            });
        }
    }

    /// The table at an item.
    pub(super) fn table<'b>(&self, item: Item<'b>, what: &str) -> Option<&'b DeTable<'b>> {
        let table = item.get_ref().as_table();
        if table.is_none() {
            self.push(Diagnostic::new(item.span(), format!("expected {what}, found {}", item.get_ref().type_str())));
        }
        table
    }

    /// The text at an item.
    pub(super) fn text_of(&self, item: Item, what: &str) -> Option<String> {
        let text = item.get_ref().as_str().map(str::to_string);
        if text.is_none() {
            let found = item.get_ref().type_str();
            self.push(Diagnostic::new(item.span(), format!("expected {what} in quotation marks, found {found}")));
        }
        text
    }

    /// Moves a diagnostic about the inside of a string to its place in the file.
    pub(super) fn inside(&self, item: Item, diagnostic: Diagnostic) -> Diagnostic {
        let span = item.span();
        let value = item.get_ref().as_str().unwrap_or_default();
        let raw = self.text.get(span.clone()).unwrap_or_default();
        // Without escapes the raw text holds the value letter by letter, after its opening quotation marks.
        match raw.find(value).filter(|_| !value.is_empty()) {
            Some(offset) => {
                let start = span.start + offset;
                Diagnostic { span: start + diagnostic.span.start..start + diagnostic.span.end, ..diagnostic }
            }
            None => Diagnostic { span, ..diagnostic },
        }
    }

    /// The exact number at an item: a literal, or a string with arithmetic on constants.
    pub(super) fn number(&self, item: Item, scope: &dyn Scope) -> Option<BigRational> {
        self.keep(self.exact(item, scope))
    }

    pub(super) fn exact(&self, item: Item, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
        let span = item.span();
        match item.get_ref() {
            DeValue::Integer(_) | DeValue::Float(_) => literal(item, &span),
            DeValue::String(text) => {
                parse(text).and_then(|node| constant(&node, scope)).map_err(|d| self.inside(item, d))
            }
            DeValue::Array(_) => Err(Diagnostic::new(span, "expected a number, found an array")),
            other => Err(Diagnostic::new(span, format!("expected a number, found {}", other.type_str()))),
        }
    }
}

fn literal(item: Item, span: &Range<usize>) -> Result<BigRational, Diagnostic> {
    let refuse = |e: NumberError| Diagnostic::new(span.clone(), e.message());
    match item.get_ref() {
        DeValue::Integer(value) if value.radix() != 10 => {
            if value.as_str().len() > MAX_LENGTH {
                return Err(refuse(NumberError::TooLong));
            }
            let digits = value.as_str().replace('_', "");
            let number = BigInt::parse_bytes(digits.as_bytes(), value.radix());
            number.map(BigRational::from_integer).ok_or_else(|| refuse(NumberError::Form))
        }
        DeValue::Integer(value) => decimal(value.as_str()).map_err(refuse),
        DeValue::Float(value) => decimal(value.as_str()).map_err(refuse),
        _ => Err(refuse(NumberError::Form)),
    }
}

/// The scope in which only constants are known.
pub(super) struct ConstantScope<'a> {
    /// The constants.
    pub(super) constants: &'a [(String, BigRational)],
}

impl Scope for ConstantScope<'_> {
    fn look_up(&self, name: &str) -> Option<Value> {
        if name == "t" {
            return Some(Value::Refused("t is not a constant".into(), None));
        }
        self.constants.iter().find(|(n, _)| n == name).map(|(_, v)| Value::Constant(v.clone()))
    }

    fn names(&self) -> Vec<String> {
        self.constants.iter().map(|(n, _)| n.clone()).collect()
    }

    fn function_hint(&self) -> (&'static str, &'static str) {
        (
            "this function is not exact in a constant",
            "give the value as an exact number, or as a range under [uncertain]",
        )
    }
}
