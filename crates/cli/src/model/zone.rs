//! Keep-out zones.

use super::scope::{Kind, NameScope, Place};
use super::table::{ConstantScope, Item, Refusals};
use crate::diagnostic::Diagnostic;
use crate::expression::{formula, parse};
use keepout_checker::statement::Zone;
use num_rational::BigRational;
use num_traits::{Signed, Zero};

const KEYS: [&str; 5] = ["name", "ref", "inside", "from", "until"];

/// Reads the zones; two of one name, ignoring case, are refused because they become file names.
pub(super) fn zones(
    items: &[toml::Spanned<toml::de::DeValue<'_>>],
    names: &[(String, Kind)],
    constants: &ConstantScope,
    refusals: &Refusals,
) -> Vec<Zone> {
    let mut zones: Vec<Zone> = Vec::new();
    for item in items {
        let Some(table) = refusals.table(item, "a zone") else { continue };
        refusals.only(table, &KEYS, "a zone");
        let zone = zone(item, names, constants, refusals);
        let Some(zone) = zone else { continue };
        if zones.iter().any(|known| known.name.eq_ignore_ascii_case(&zone.name)) {
            let span = table.get("name").map_or(item.span(), toml::Spanned::span);
            refusals.push(
                Diagnostic::new(span, format!("there is another zone named `{}`", zone.name))
                    .help("zone names differ in more than case: they become file names"),
            );
        }
        zones.push(zone);
    }
    zones
}

fn zone(item: Item, names: &[(String, Kind)], constants: &ConstantScope, refusals: &Refusals) -> Option<Zone> {
    let table = item.get_ref().as_table()?;
    let required = |key: &str| {
        let value = table.get(key);
        if value.is_none() {
            refusals.push(Diagnostic::new(header(item, refusals), format!("this zone has no `{key}`")));
        }
        value
    };
    let name_item = required("name");
    let inside_item = required("inside");
    let name = name_item.and_then(|i| zone_name(i, refusals));
    let inside = inside_item.and_then(|i| {
        let text = refusals.text_of(i, "a condition such as \"x > 2\"")?;
        let scope = NameScope { names, place: Place::Zone };
        let result = parse(&text).and_then(|node| formula(&node, &scope));
        refusals.keep(result.map_err(|d| refusals.inside(i, d)))
    });
    let time = |key: &str| -> Option<Option<BigRational>> {
        let Some(i) = table.get(key) else { return Some(None) };
        let value = refusals.number(i, constants)?;
        if value.is_negative() {
            refusals.push(Diagnostic::new(i.span(), format!("`{key}` is a time >= 0")));
            return None;
        }
        Some(Some(value))
    };
    let (from, until) = (time("from"), time("until"));
    let reference = table.get("ref").and_then(|i| refusals.text_of(i, "a text"));
    let (from, until) = (from?.unwrap_or_else(BigRational::zero), until?);
    if let Some(until) = until.as_ref().filter(|u| **u < from) {
        let span = table.get("until").map_or(item.span(), toml::Spanned::span);
        refusals.push(Diagnostic::new(span, format!("the window ends at {until}, before it begins at {from}")));
        return None;
    }
    Some(Zone { name: name?, reference, inside: inside?, from, until })
}

/// The first line of an item: tables span many.
fn header(item: Item, refusals: &Refusals) -> std::ops::Range<usize> {
    let span = item.span();
    let length = refusals.text.get(span.start..).and_then(|rest| rest.find('\n')).unwrap_or(0);
    span.start..span.end.min(span.start + length.max(1))
}

fn zone_name(item: Item, refusals: &Refusals) -> Option<String> {
    let name = refusals.text_of(item, "a name")?;
    let allowed = |c: char| c.is_ascii_alphanumeric() || matches!(c, ' ' | '_' | '-');
    if name.is_empty() || name.len() > 64 || !name.chars().all(allowed) || name.trim() != name {
        refusals.push(
            Diagnostic::new(item.span(), "a zone's name is 1 to 64 letters, digits, blanks, _ or -")
                .help("it becomes a file name; free text belongs into `ref`"),
        );
        return None;
    }
    Some(name)
}
