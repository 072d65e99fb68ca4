//! Keep-out zones.

use super::load::Need;
use super::scope::{NameScope, Names, Place};
use super::table::{Item, Refusals};
use crate::expression::{formula, parse};
use keepout_checker::statement::{Formula, Zone};
use num_rational::BigRational;
use num_traits::{Signed, Zero};
use std::collections::HashSet;
use toml::de::{DeTable, DeValue};

const KEYS: [&str; 5] = ["name", "ref", "inside", "from", "until"];

const NO_ZONE: &str = "add a section [[zone]] with `name` and `inside`";

/// Reads the zones; two of one name, ignoring case, are refused because they become file names.
pub(super) fn zones(root: &DeTable, need: Need, names: &Names, refusals: &Refusals) -> Vec<Zone> {
    let Some(item) = root.get("zone") else {
        if need == Need::Zones {
            refusals.refuse(0..1, "the model has no zone", NO_ZONE);
        }
        return Vec::new();
    };
    let Some(list) = item.get_ref().as_array() else {
        refusals.refuse(refusals.header(item), "zones are a list", "write [[zone]] with two brackets on each side");
        return Vec::new();
    };
    if list.is_empty() && need == Need::Zones {
        refusals.refuse(item.span(), "the list of zones is empty", NO_ZONE);
    }
    if list.len() > super::MAX_ENTRIES {
        let message = format!("at most {} zones, found {}", super::MAX_ENTRIES, list.len());
        refusals.refuse(refusals.header(item), message, "split the model into several files");
        return Vec::new();
    }
    let mut taken = HashSet::new();
    let mut zones = Vec::new();
    for item in list.iter() {
        let Some(table) = item.get_ref().as_table() else {
            refusals.refuse(item.span(), "a zone is a section", "write [[zone]] with two brackets on each side");
            continue;
        };
        refusals.only(table, &KEYS, "a zone");
        if let Some(given) = table.get("name").filter(|n| n.get_ref().as_str().is_some()) {
            let name = given.get_ref().as_str().unwrap_or_default();
            if !taken.insert(name.to_lowercase()) {
                let help =
                    "give each zone a name of its own; a difference in case is not enough: names become file names";
                refusals.refuse(given.span(), format!("there is another zone named `{name}`"), help);
            }
        }
        zones.extend(zone(item, table, names, refusals));
    }
    zones
}

fn zone(item: Item, table: &DeTable, names: &Names, refusals: &Refusals) -> Option<Zone> {
    let name = required(item, table, "name", "\"...\"", refusals).and_then(|i| zone_name(i, refusals));
    let inside = required(item, table, "inside", "\"x > 2\"", refusals).and_then(|i| condition(i, names, refusals));
    let from = time(table, "from", names, refusals);
    let until = time(table, "until", names, refusals);
    let reference = table.get("ref").and_then(|i| refusals.text_of(i, "a text"));
    let (from, until) = (from?.unwrap_or_else(BigRational::zero), until?);
    if let Some(end) = until.as_ref().filter(|end| **end < from) {
        let span = table.get("until").map_or(item.span(), toml::Spanned::span);
        let message = format!("the window ends at {end}, before it begins at {from}");
        refusals.refuse(span, message, "choose `until` >= `from`, or leave `until` out for all time");
        return None;
    }
    Some(Zone { name: name?, reference, inside: inside?, from, until })
}

fn required<'b>(item: Item, table: &'b DeTable<'b>, key: &str, example: &str, refusals: &Refusals) -> Option<Item<'b>> {
    let value = table.get(key);
    if value.is_none() {
        refusals.refuse(refusals.header(item), format!("this zone has no `{key}`"), format!("add {key} = {example}"));
    }
    value
}

fn condition(item: Item, names: &Names, refusals: &Refusals) -> Option<Formula> {
    let DeValue::String(text) = item.get_ref() else {
        refusals.text_of(item, "a condition such as \"x > 2\"");
        return None;
    };
    let scope = NameScope { names, place: Place::Zone };
    let result = parse(text).and_then(|node| formula(&node, &scope));
    refusals.keep(result.map_err(|d| refusals.inside(item, d)))
}

/// A time >= 0, if the key is there; outer `None`: refused.
fn time(table: &DeTable, key: &str, names: &Names, refusals: &Refusals) -> Option<Option<BigRational>> {
    let Some(item) = table.get(key) else { return Some(None) };
    let value = refusals.number(item, names)?;
    if value.is_negative() {
        refusals.refuse(
            item.span(),
            format!("`{key}` is a time >= 0, found {value}"),
            "t counts from 0, when the model starts",
        );
        return None;
    }
    Some(Some(value))
}

fn zone_name(item: Item, refusals: &Refusals) -> Option<String> {
    let name = refusals.text_of(item, "a name")?;
    let allowed = |c: char| c.is_ascii_alphanumeric() || matches!(c, ' ' | '_' | '-');
    if name.is_empty() || name.len() > 64 || !name.chars().all(allowed) {
        let help = "it becomes a file name; free text belongs into `ref`";
        refusals.refuse(item.span(), "a zone's name is 1 to 64 letters, digits, blanks, _ or -", help);
        return None;
    }
    Some(name)
}
