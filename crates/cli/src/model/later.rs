//! Sections of the format that this version does not settle: recognised, looked at, and refused with the reason.

use super::scope::Names;
use super::table::{Item, Refusals};
use toml::de::DeTable;

/// What this version does, said wherever it does not do more.
pub(super) const ONE_TRAJECTORY: &str =
    "this version settles a single trajectory: exact start, exact constants, known inputs, no disturbance";

/// Each section with what is refused and what to do instead.
const SECTIONS: [(&str, &str, &str); 4] = [
    ("disturbance", "disturbances are not supported yet", "leave it out, or declare a known input as a [drive]"),
    ("uncertain", "uncertain constants are not supported yet", "give an exact value under [constants]"),
    ("start", "sets of starts are not supported yet", "give each state one exact start"),
    ("phase", "phases are not supported yet", "describe one phase, with a zone's `until` for its end"),
];

/// Refuses these sections; faults inside them are told as well.
pub(super) fn refuse_later(root: &DeTable, names: &Names, refusals: &Refusals) {
    for (section, message, instead) in SECTIONS {
        let Some((key, item)) = root.get_key_value(section) else { continue };
        refusals.refuse(key.span(), message, format!("{instead}; {ONE_TRAJECTORY}"));
        match section {
            "disturbance" => ranges(item, "disturbance", &["range", "unit"], names, refusals),
            "uncertain" => ranges(item, "uncertain", &["range", "unit", "varying"], names, refusals),
            "start" => {
                if let Some(table) = refusals.table(item, "a section [start]") {
                    refusals.only(table, &["ellipsoid", "points"], "[start]");
                }
            }
            _ => {}
        }
    }
}

fn ranges(item: Item, section: &str, keys: &[&str], names: &Names, refusals: &Refusals) {
    let Some(table) = refusals.table(item, &format!("sections such as [{section}.name]")) else { return };
    for (key, inner) in table.iter() {
        let name = key.get_ref();
        let Some(fields) = refusals.table(inner, &format!("a section [{section}.{name}]")) else { continue };
        refusals.only(fields, keys, &format!("[{section}.{name}]"));
        match fields.get("range") {
            Some(range) => drop(refusals.range(range, names)),
            None => refusals.refuse(key.span(), format!("`{name}` has no `range`"), "add range = [lo, hi]"),
        }
    }
}
