//! The named sections: constants, drives, states, outputs.

use super::dependency::order;
use super::scope::{Kind, NameScope, Names, Place};
use super::start::{refuse_second, start};
use super::table::{Item, Refusals};
use super::unknown::rate;
use crate::expression::{Node, Polynomial, parse, polynomial, signal};
use keepout_checker::statement::{Drive, Output, Phase, State};
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
    pub(super) fn get(&self, key: &str) -> Option<Item<'a>> {
        self.item.get_ref().as_table().and_then(|t| t.get(key))
    }

    /// A key that the section must have.
    pub(super) fn required(&self, key: &str, example: &str, refusals: &Refusals) -> Option<Item<'a>> {
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

    pub(super) fn unit(&self, refusals: &Refusals) -> Option<String> {
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

/// The states, the radii of their starts, and their rates.
pub(super) struct Dynamics {
    pub(super) states: Vec<State>,
    pub(super) radii: Vec<BigRational>,
    pub(super) phase: Phase,
}

/// Reads the states with their rates; with a section [start] they have no starts of their own.
pub(super) fn states(entries: &[Entry], has_set: bool, names: &Names, refusals: &Refusals) -> Dynamics {
    let scope = NameScope { names, place: Place::Rate };
    let mut dynamics =
        Dynamics { states: Vec::new(), radii: Vec::new(), phase: Phase { rates: Vec::new(), uncertain: Vec::new() } };
    for (i, entry) in entries.iter().enumerate() {
        let given = if has_set {
            entry.get("start").into_iter().for_each(|item| refuse_second(item, refusals));
            None
        } else {
            entry.required("start", "0", refusals).and_then(|item| start(item, names, refusals))
        };
        let (start, radius) = given.unwrap_or_else(|| (BigRational::zero(), BigRational::zero()));
        dynamics.states.push(State { name: entry.name.clone(), unit: entry.unit(refusals), start });
        dynamics.radii.push(radius);
        let parts = entry.required("rate", "\"...\", the time derivative", refusals).and_then(|item| {
            let node = refusals.expression(item, "a rate such as \"-2*x + u\"")?;
            refusals.keep(rate(&node, i, &scope).map_err(|d| refusals.inside(item, d)))
        });
        let (affine, uncertain) = parts.unwrap_or_default();
        dynamics.phase.rates.push(affine);
        dynamics.phase.uncertain.extend(uncertain);
    }
    dynamics
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
