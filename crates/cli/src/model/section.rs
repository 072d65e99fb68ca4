//! The named sections: constants, drives, states, outputs.

use super::dependency::order;
use super::later::ONE_TRAJECTORY;
use super::scope::{Kind, NameScope, Names, Place};
use super::table::{Item, Refusals};
use crate::diagnostic::Diagnostic;
use crate::expression::{Node, NodeKind, Polynomial, Scope, parse, polynomial, signal};
use keepout_checker::statement::{Affine, Drive, Output, State};
use num_rational::BigRational;
use num_traits::Zero;
use std::collections::HashMap;
use std::ops::Range;
use toml::de::DeTable;

/// A named section, or a constant: its name, the place of the name, its value.
pub(super) struct Entry<'a> {
    pub(super) name: String,
    pub(super) span: Range<usize>,
    pub(super) item: Item<'a>,
}

impl<'a> Entry<'a> {
    fn get(&self, key: &str) -> Option<Item<'a>> {
        self.item.get_ref().as_table().and_then(|t| t.get(key))
    }

    /// A key that the section must have.
    fn required(&self, key: &str, example: &str, refusals: &Refusals) -> Option<Item<'a>> {
        let found = self.get(key);
        if found.is_none() && self.item.get_ref().as_table().is_some() {
            refusals.refuse(
                self.span.clone(),
                format!("`{}` has no `{key}`", self.name),
                format!("add {key} = {example}"),
            );
        }
        found
    }

    fn unit(&self, refusals: &Refusals) -> Option<String> {
        self.get("unit").and_then(|u| refusals.text_of(u, "a unit"))
    }
}

/// The entries of a section in the order of the file.
pub(super) fn entries<'a>(root: &'a DeTable<'a>, section: &str, refusals: &Refusals) -> Vec<Entry<'a>> {
    let Some(item) = root.get(section) else { return Vec::new() };
    let what = if section == "constants" {
        "a section [constants]".into()
    } else {
        format!("sections such as [{section}.name]")
    };
    let Some(table) = refusals.table(item, &what) else { return Vec::new() };
    if table.len() > super::MAX_ENTRIES {
        let message = format!("at most {} {section} entries, found {}", super::MAX_ENTRIES, table.len());
        refusals.refuse(refusals.header(item), message, "leave some out, or use the matrix form");
        return Vec::new();
    }
    let entry = |(key, item): (&'a toml::Spanned<_>, Item<'a>)| {
        let name: &toml::de::DeString<'a> = key.get_ref();
        Entry { name: name.to_string(), span: key.span(), item }
    };
    table.iter().map(entry).collect()
}

/// Refuses sections that are not sections, and unknown keys in them.
pub(super) fn check_keys(entries: &[Entry], section: &str, keys: &[&str], refusals: &Refusals) {
    for entry in entries {
        let what = format!("[{section}.{}]", entry.name);
        if let Some(table) = refusals.table(entry.item, &format!("a section {what}")) {
            refusals.only(table, keys, &what);
        }
    }
}

/// The definitions in an order in which each has what it uses, without those that are in a cycle; cycles are refused.
fn in_order<'e, 'a>(
    entries: &'e [Entry<'a>],
    expressions: &[Option<Node>],
    word: &str,
    refusals: &Refusals,
) -> Vec<usize> {
    let positions: HashMap<&str, usize> = entries.iter().enumerate().map(|(i, e)| (e.name.as_str(), i)).collect();
    let uses = |node: &Option<Node>| -> Vec<usize> {
        node.iter().flat_map(Node::names).filter_map(|n| positions.get(n).copied()).collect()
    };
    let order = order(&expressions.iter().map(uses).collect::<Vec<_>>());
    for cycle in &order.cycles {
        let first = &entries[cycle[0]];
        let path: Vec<&str> = cycle.iter().chain(&cycle[..1]).take(12).map(|i| entries[*i].name.as_str()).collect();
        let message = format!("the {word} `{}` is defined through itself", first.name);
        refusals.refuse(first.span.clone(), message, format!("break the cycle {}", path.join(" -> ")));
    }
    let cyclic = |i: &usize| order.cycles.iter().any(|c| c.contains(i));
    order.sequence.iter().copied().filter(|i| !cyclic(i)).collect()
}

/// Reads the constants into the names; each may use the others, in any order.
pub(super) fn constants(entries: &[Entry], names: &mut Names, refusals: &Refusals) {
    let text = |entry: &Entry| entry.item.get_ref().as_str().and_then(|text| parse(text).ok());
    let expressions: Vec<Option<Node>> = entries.iter().map(text).collect();
    for i in in_order(entries, &expressions, "constant", refusals) {
        let value = refusals.number(entries[i].item, names);
        if matches!(names.get(&entries[i].name), Some((_, Kind::Constant(_), _))) {
            names.set(&entries[i].name, Kind::Constant(value));
        }
    }
}

/// Reads the drives.
pub(super) fn drives(entries: &[Entry], names: &Names, refusals: &Refusals) -> Vec<Drive> {
    let scope = NameScope { names, place: Place::Signal };
    let read = |entry: &Entry| {
        let item = entry.required("signal", "\"0.5 + 0.1*exp(-2*t)\"", refusals);
        let terms = item.and_then(|i| {
            let node = refusals.expression(i, "a signal such as \"0.5*sin(2*t)\"")?;
            refusals.keep(signal(&node, &scope).map_err(|d| refusals.inside(i, d)))
        });
        Drive { name: entry.name.clone(), unit: entry.unit(refusals), signal: terms.unwrap_or_default() }
    };
    entries.iter().map(read).collect()
}

/// Reads the states with their rates.
pub(super) fn states(entries: &[Entry], names: &Names, refusals: &Refusals) -> (Vec<State>, Vec<Affine>) {
    let scope = NameScope { names, place: Place::Rate };
    let read = |entry: &Entry| {
        let value = entry.required("start", "0", refusals).and_then(|i| start(i, names, refusals));
        let affine = entry.required("rate", "\"...\", the time derivative", refusals).and_then(|i| {
            let node = refusals.expression(i, "a rate such as \"-2*x + u\"")?;
            refusals.keep(rate(&node, &scope).map_err(|d| refusals.inside(i, d)))
        });
        let start = value.unwrap_or_else(BigRational::zero);
        (State { name: entry.name.clone(), unit: entry.unit(refusals), start }, affine.unwrap_or_default())
    };
    entries.iter().map(read).unzip()
}

/// A start: a number, or a range of length 0.
pub(super) fn start(item: Item, names: &Names, refusals: &Refusals) -> Option<BigRational> {
    if item.get_ref().as_array().is_none() {
        return refusals.number(item, names);
    }
    let (lo, hi) = refusals.range(item, names)?;
    if lo != hi {
        refusals.refuse(
            item.span(),
            "ranges of starts are not supported yet",
            format!("give one number; {ONE_TRAJECTORY}"),
        );
        return None;
    }
    Some(lo)
}

/// Reads the outputs in terms of states, drives and time; each may use the others, in any order.
pub(super) fn outputs(entries: &[Entry], names: &mut Names, refusals: &Refusals) -> Vec<Output> {
    let read = |entry: &Entry| {
        let item = entry.required("value", "\"...\", an expression", refusals)?;
        refusals.expression(item, "an expression such as \"2*x + y\"")
    };
    let expressions: Vec<Option<Node>> = entries.iter().map(read).collect();
    let mut values: Vec<Polynomial> = vec![Polynomial::default(); entries.len()];
    for i in in_order(entries, &expressions, "output", refusals) {
        let (Some(node), Some(item)) = (&expressions[i], entries[i].get("value")) else { continue };
        let result = polynomial(node, &NameScope { names, place: Place::Output });
        let value = refusals.keep(result.map_err(|d| refusals.inside(item, d)));
        if let Some((_, Kind::Output(position, _), _)) = names.get(&entries[i].name) {
            let kind = Kind::Output(*position, value.clone());
            names.set(&entries[i].name, kind);
        }
        values[i] = value.unwrap_or_default();
    }
    let output = |(entry, value): (&Entry, Polynomial)| Output {
        name: entry.name.clone(),
        unit: entry.unit(refusals),
        value: value.expression(),
    };
    entries.iter().zip(values).map(output).collect()
}

/// A rate: affine in states and drives.
fn rate(node: &Node, scope: &NameScope) -> Result<Affine, Diagnostic> {
    let value = polynomial(node, scope)?;
    if value.degree() > 1 {
        let culprit = nonlinear(node, scope).unwrap_or(node);
        return Err(Diagnostic::new(
            culprit.span.clone(),
            "a rate is affine in states and drives: this product is not",
        )
        .help("linearise about the operating point, or make one of the factors a constant"));
    }
    let mut affine = Affine { terms: Vec::new(), offset: BigRational::zero() };
    for (powers, coefficient) in value.terms() {
        match powers {
            [(variable, _)] => affine.terms.push((coefficient.clone(), *variable)),
            _ => affine.offset = coefficient.clone(),
        }
    }
    Ok(affine)
}

/// The smallest part of an expression that has a degree above 1.
fn nonlinear<'n>(node: &'n Node, scope: &dyn Scope) -> Option<&'n Node> {
    if !polynomial(node, scope).is_ok_and(|p| p.degree() > 1) {
        return None;
    }
    let inner = match &node.kind {
        NodeKind::Power(..) => None,
        _ => node.children().into_iter().find_map(|child| nonlinear(child, scope)),
    };
    Some(inner.unwrap_or(node))
}
