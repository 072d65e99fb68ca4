//! The matrix form of a model: x' = A x + c + B u.

use super::table::{ConstantScope, Item, Refusals};
use crate::diagnostic::Diagnostic;
use crate::matrix_market;
use num_rational::BigRational;
use num_traits::Zero;
use std::path::Path;
use toml::de::DeValue;

pub(super) const KEYS: [&str; 7] = ["A", "c", "B", "E", "names", "start", "units"];

/// The entries of a matrix, given as rows or as the name of a Matrix Market file beside the model.
pub(super) fn rows(
    item: Item,
    folder: &Path,
    constants: &ConstantScope,
    refusals: &Refusals,
) -> Option<Vec<Vec<BigRational>>> {
    if let DeValue::String(name) = item.get_ref() {
        return refusals.keep(file(name, folder).map_err(|message| Diagnostic::new(item.span(), message)));
    }
    let Some(array) = item.get_ref().as_array() else {
        refusals.push(Diagnostic::new(
            item.span(),
            "expected rows such as [[0, 1], [-4, -0.4]] or the name of a Matrix Market file",
        ));
        return None;
    };
    let mut rows: Vec<Vec<BigRational>> = Vec::new();
    for row in array.iter() {
        let Some(entries) = row.get_ref().as_array() else {
            refusals.push(Diagnostic::new(row.span(), "expected a row, an array of numbers"));
            return None;
        };
        let entries: Vec<Option<BigRational>> = entries.iter().map(|e| refusals.number(e, constants)).collect();
        let entries: Vec<BigRational> = entries.into_iter().collect::<Option<_>>()?;
        if rows.first().is_some_and(|first| first.len() != entries.len()) {
            refusals.push(Diagnostic::new(
                row.span(),
                format!("this row has {} entries, the first one {}", entries.len(), rows[0].len()),
            ));
            return None;
        }
        rows.push(entries);
    }
    Some(rows)
}

fn file(name: &str, folder: &Path) -> Result<Vec<Vec<BigRational>>, String> {
    let path = Path::new(name);
    if path.components().any(|c| !matches!(c, std::path::Component::Normal(_))) {
        return Err(format!("`{name}` is not the name of a file beside the model"));
    }
    let text = std::fs::read_to_string(folder.join(path))
        .map_err(|e| format!("cannot read `{name}` beside the model: {e}"))?;
    matrix_market::read(&text).map_err(|(line, message)| format!("{name}:{line}: {message}"))
}

/// Requires a shape.
pub(super) fn shaped(
    item: Item,
    rows: Vec<Vec<BigRational>>,
    wanted: (usize, usize),
    why: &str,
    refusals: &Refusals,
) -> Option<Vec<Vec<BigRational>>> {
    let found = (rows.len(), rows.first().map_or(0, Vec::len));
    if found == wanted {
        return Some(rows);
    }
    let message = format!("expected {} x {} entries ({why}), found {} x {}", wanted.0, wanted.1, found.0, found.1);
    refusals.push(Diagnostic::new(item.span(), message));
    None
}

/// The offset c: a list, or a matrix with one column.
pub(super) fn column(
    item: Item,
    length: usize,
    folder: &Path,
    constants: &ConstantScope,
    refusals: &Refusals,
) -> Option<Vec<BigRational>> {
    let is_list = item.get_ref().as_array().is_some_and(|a| a.iter().all(|e| e.get_ref().as_array().is_none()));
    if !is_list {
        let rows = rows(item, folder, constants, refusals)?;
        let rows = shaped(item, rows, (length, 1), "one for each state", refusals)?;
        return Some(rows.into_iter().map(|mut r| r.pop().unwrap_or_else(BigRational::zero)).collect());
    }
    let array = item.get_ref().as_array()?;
    if array.len() != length {
        refusals.push(Diagnostic::new(
            item.span(),
            format!("expected {length} entries, one for each state, found {}", array.len()),
        ));
        return None;
    }
    let entries: Vec<Option<BigRational>> = array.iter().map(|e| refusals.number(e, constants)).collect();
    entries.into_iter().collect()
}
