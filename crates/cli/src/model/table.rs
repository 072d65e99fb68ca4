//! Typed reading of TOML values, with every refusal at its place.

use super::scope::{NameScope, Names, Place};
use crate::diagnostic::{Diagnostic, nearest};
use crate::expression::{Node, NodeKind, Scope, constant, parse};
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

    pub(super) fn refuse(&self, span: Range<usize>, message: impl Into<String>, help: impl Into<String>) {
        self.push(Diagnostic::new(span, message).help(help));
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

    /// The first line of an item: tables span many.
    pub(super) fn header(&self, item: Item) -> Range<usize> {
        let span = item.span();
        let length = self.text.get(span.start..).and_then(|rest| rest.find('\n')).unwrap_or(0);
        span.start..span.end.min(span.start + length.max(1))
    }

    /// Refuses keys other than these.
    pub(super) fn only(&self, table: &DeTable, keys: &[&str], what: &str) {
        for key in table.keys() {
            let name = key.get_ref().as_ref();
            if keys.contains(&name) {
                continue;
            }
            let help = match nearest(name, keys.iter().copied()) {
                Some(close) => format!("did you mean `{close}`?"),
                None => format!("keys here: {}", keys.join(", ")),
            };
            self.refuse(key.span(), format!("`{name}` is not a key of {what}"), help);
        }
    }

    /// The table at an item.
    pub(super) fn table<'b>(&self, item: Item<'b>, what: &str) -> Option<&'b DeTable<'b>> {
        let table = item.get_ref().as_table();
        if table.is_none() {
            let found = kind_of(item);
            self.refuse(
                self.header(item),
                format!("expected {what}, found {found}"),
                "write a section with one bracket on each side",
            );
        }
        table
    }

    /// The text at an item.
    pub(super) fn text_of(&self, item: Item, what: &str) -> Option<String> {
        let text = item.get_ref().as_str().map(str::to_string);
        if text.is_none() {
            let found = kind_of(item);
            self.refuse(item.span(), format!("expected {what} in quotation marks, found {found}"), "put it in \"...\"");
        }
        text
    }

    /// true or false at an item; false if it is neither.
    pub(super) fn flag(&self, item: Item) -> bool {
        item.get_ref().as_bool().unwrap_or_else(|| {
            let message = format!("expected true or false, found {}", kind_of(item));
            self.refuse(item.span(), message, "write true or false, without quotation marks");
            false
        })
    }

    /// The list at an item.
    pub(super) fn list_of<'b>(&self, item: Item<'b>, what: &str) -> Option<Vec<Item<'b>>> {
        let list = item.get_ref().as_array().map(|a| a.iter().collect());
        if list.is_none() {
            self.refuse(item.span(), format!("expected {what}, found {}", kind_of(item)), "write a list in [...]");
        }
        list
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
    pub(super) fn number(&self, item: Item, names: &Names) -> Option<BigRational> {
        self.keep(self.exact(item, &NameScope { names, place: Place::Number }))
    }

    fn exact(&self, item: Item, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
        match item.get_ref() {
            DeValue::Integer(_) | DeValue::Float(_) => literal(item),
            DeValue::String(text) => {
                parse(text).and_then(|node| constant(&node, scope)).map_err(|d| self.inside(item, d))
            }
            DeValue::Array(_) => Err(Diagnostic::new(item.span(), "expected a number, found an array")
                .help("a range of a constant is declared under [uncertain]")),
            DeValue::Boolean(_) | DeValue::Datetime(_) | DeValue::Table(_) => {
                let message = format!("expected a number, found {}", kind_of(item));
                Err(Diagnostic::new(item.span(), message)
                    .help("write a number such as 0.05, or a string such as \"22/7\""))
            }
        }
    }

    /// The expression at an item: a string, or a number.
    pub(super) fn expression(&self, item: Item, what: &str) -> Option<Node> {
        match item.get_ref() {
            DeValue::String(text) => self.keep(parse(text).map_err(|d| self.inside(item, d))),
            DeValue::Integer(_) | DeValue::Float(_) => {
                let value = self.keep(literal(item))?;
                Some(Node { span: 0..item.span().len(), kind: NodeKind::Number(value) })
            }
            DeValue::Boolean(_) | DeValue::Datetime(_) | DeValue::Table(_) | DeValue::Array(_) => {
                self.text_of(item, what);
                None
            }
        }
    }

    /// A closed range [lo, hi] with lo <= hi.
    pub(super) fn range(&self, item: Item, names: &Names) -> Option<(BigRational, BigRational)> {
        let list = self.list_of(item, "a range [lo, hi]")?;
        let ends: Vec<Option<BigRational>> = list.iter().map(|e| self.number(e, names)).collect();
        let ends: Vec<BigRational> = ends.into_iter().collect::<Option<_>>()?;
        match ends.as_slice() {
            [lo, hi] if lo > hi => {
                self.refuse(
                    item.span(),
                    format!("the range begins at {lo}, above its end {hi}"),
                    "write [lo, hi] with lo <= hi",
                );
                None
            }
            [lo, hi] => Some((lo.clone(), hi.clone())),
            _ => {
                let message = format!("expected a range [lo, hi], found a list of {}", ends.len());
                self.refuse(item.span(), message, "write two numbers, the lower one first");
                None
            }
        }
    }
}

/// What an item is, for people.
pub(super) fn kind_of(item: Item) -> &'static str {
    match item.get_ref() {
        DeValue::String(_) => "a text",
        DeValue::Integer(_) | DeValue::Float(_) => "a number",
        DeValue::Boolean(_) => "true or false",
        DeValue::Datetime(_) => "a date",
        DeValue::Array(_) => "a list",
        DeValue::Table(_) => "a section",
    }
}

fn literal(item: Item) -> Result<BigRational, Diagnostic> {
    let refuse = |e: NumberError| Diagnostic::new(item.span(), e.message()).help(e.help());
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
        DeValue::String(_) | DeValue::Boolean(_) | DeValue::Datetime(_) | DeValue::Array(_) | DeValue::Table(_) => {
            Err(refuse(NumberError::Form))
        }
    }
}
