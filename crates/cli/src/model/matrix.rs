//! The matrix form of a model: x' = A x + c + B u.

use super::later::ONE_TRAJECTORY;
use super::load::bounded_bytes;
use super::scope::Names;
use super::section::start;
use super::table::{Item, Refusals, kind_of};
use crate::matrix_market::{self, Matrix};
use keepout_checker::statement::{Affine, State, Variable};
use num_rational::BigRational;
use num_traits::Zero;
use std::collections::BTreeMap;
use std::ops::Range;
use std::path::{Component, Path};
use toml::de::{DeTable, DeValue};

const KEYS: [&str; 7] = ["A", "c", "B", "E", "names", "start", "units"];

/// The section [matrix].
pub(super) struct Form<'a> {
    item: Item<'a>,
    table: &'a DeTable<'a>,
    size: usize,
}

impl<'a> Form<'a> {
    /// The section with its number of states: that of the starts.
    pub(super) fn new(item: Item<'a>, refusals: &Refusals) -> Option<Self> {
        let table = refusals.table(item, "a section [matrix]")?;
        refusals.only(table, &KEYS, "[matrix]");
        let Some(starts) = table.get("start") else {
            let help = "add start = [...], a list with one number for each state";
            refusals.refuse(refusals.header(item), "[matrix] has no `start`", help);
            return None;
        };
        let size = refusals.list_of(starts, "a list with one number for each state")?.len();
        if size == 0 || size > super::MAX_ENTRIES {
            let message = format!("expected 1 to {} states, found {size}", super::MAX_ENTRIES);
            refusals.refuse(starts.span(), message, "give one number for each state");
            return None;
        }
        Some(Self { item, table, size })
    }

    pub(super) fn place(&self, refusals: &Refusals) -> Range<usize> {
        refusals.header(self.item)
    }

    /// The names of the states, given or x1, x2, ..., with their places.
    pub(super) fn names(&self, refusals: &Refusals) -> Vec<(String, Range<usize>)> {
        let place = self.table.get("start").map_or(self.item.span(), toml::Spanned::span);
        let numbered = |i: usize| (format!("x{}", i + 1), place.clone());
        let Some(list) = self.labels("names", "a list of names", refusals) else {
            return (0..self.size).map(numbered).collect();
        };
        let name = |(i, item): (usize, &Item)| {
            refusals.text_of(item, "a name").map_or_else(|| numbered(i), |name| (name, item.span()))
        };
        list.iter().enumerate().map(name).collect()
    }

    /// A list with one entry for each state.
    fn labels(&self, key: &str, what: &str, refusals: &Refusals) -> Option<Vec<Item<'a>>> {
        let item = self.table.get(key)?;
        let list = refusals.list_of(item, what)?;
        if list.len() != self.size {
            let message =
                format!("expected {} entries in `{key}`, one for each start, found {}", self.size, list.len());
            refusals.refuse(item.span(), message, "give one entry for each state, in the same order everywhere");
            return None;
        }
        Some(list)
    }

    /// States and rates.
    pub(super) fn read(
        &self,
        drives: usize,
        folder: &Path,
        names: &Names,
        refusals: &Refusals,
    ) -> (Vec<State>, Vec<Affine>) {
        if let Some((key, _)) = self.table.get_key_value("E") {
            refusals.refuse(
                key.span(),
                "disturbances are not supported yet",
                format!("leave `E` out; {ONE_TRAJECTORY}"),
            );
        }
        let reader = Reader { folder, names, refusals };
        let n = self.size;
        let mut rates = vec![Affine::default(); n];
        match self.table.get("A") {
            Some(item) => {
                let why = "one row and one column for each state";
                reader.matrix(item).and_then(|a| reader.shaped(item, a, (n, n), why)).into_iter().for_each(|a| {
                    add(&mut rates, a, Variable::State);
                });
            }
            None => refusals.refuse(
                self.place(refusals),
                "[matrix] has no `A`",
                "add A = [[...], ...], a list of rows, or A = \"file.mtx\"",
            ),
        }
        match self.table.get("B") {
            Some(item) if drives == 0 => {
                refusals.refuse(item.span(), "there is a `B`, but no drive", "declare a [drive] for each column of B");
            }
            Some(item) => {
                let why = "a row for each state, a column for each drive in the order of the file";
                reader.matrix(item).and_then(|b| reader.shaped(item, b, (n, drives), why)).into_iter().for_each(|b| {
                    add(&mut rates, b, Variable::Drive);
                });
            }
            None if drives > 0 => refusals.refuse(
                self.place(refusals),
                "there are drives, but [matrix] has no `B`",
                "add B with a row for each state and a column for each drive",
            ),
            None => {}
        }
        if let Some(offsets) = self.table.get("c").and_then(|item| reader.column(item, n)) {
            rates.iter_mut().zip(offsets).for_each(|(rate, offset)| rate.offset = offset);
        }
        (self.states(names, refusals), rates)
    }

    fn states(&self, names: &Names, refusals: &Refusals) -> Vec<State> {
        let starts = self.table.get("start").and_then(|i| i.get_ref().as_array());
        let starts = starts.iter().flat_map(|a| a.iter()).map(|i| start(i, names, refusals));
        let units = self.labels("units", "a list of units", refusals);
        let units: Vec<Option<String>> = match units {
            Some(list) => list.iter().map(|i| refusals.text_of(i, "a unit")).collect(),
            None => vec![None; self.size],
        };
        // The faults of the names have been told when they were declared.
        let list = self.names(&Refusals::new(refusals.text));
        let state = |(((name, _), unit), start): (((String, _), _), Option<BigRational>)| State {
            name,
            unit,
            start: start.unwrap_or_else(BigRational::zero),
        };
        list.into_iter().zip(units).zip(starts).map(state).collect()
    }
}

fn add(rates: &mut [Affine], matrix: Matrix, variable: fn(usize) -> Variable) {
    for ((i, j), value) in matrix.entries {
        rates[i].terms.push((value, variable(j)));
    }
}

/// What the entries are read with.
struct Reader<'r> {
    folder: &'r Path,
    names: &'r Names,
    refusals: &'r Refusals<'r>,
}

impl Reader<'_> {
    /// A matrix, given as rows or as the name of a Matrix Market file beside the model.
    fn matrix(&self, item: Item) -> Option<Matrix> {
        match item.get_ref() {
            DeValue::String(name) => self.file(name, item.span()),
            DeValue::Array(_) => self.rows(item),
            DeValue::Integer(_)
            | DeValue::Float(_)
            | DeValue::Boolean(_)
            | DeValue::Datetime(_)
            | DeValue::Table(_) => {
                let message = format!("expected rows or the name of a Matrix Market file, found {}", kind_of(item));
                self.refusals.refuse(item.span(), message, "write [[0, 1], [-4, -0.4]] or \"plant.mtx\"");
                None
            }
        }
    }

    fn rows(&self, item: Item) -> Option<Matrix> {
        let rows = self.refusals.list_of(item, "a list of rows")?;
        let mut entries = BTreeMap::new();
        let mut columns = None;
        let mut complete = true;
        for (i, row) in rows.iter().enumerate() {
            let Some(list) = self.refusals.list_of(row, "a row, a list of numbers") else {
                complete = false;
                continue;
            };
            let width = *columns.get_or_insert(list.len());
            if list.len() != width {
                let message = format!("row {} has {} entries, the first row {width}", i + 1, list.len());
                self.refusals.refuse(row.span(), message, "give all rows the same length");
                complete = false;
            }
            for (j, entry) in list.iter().enumerate() {
                match self.refusals.number(entry, self.names) {
                    Some(value) if value.is_zero() => {}
                    Some(value) => drop(entries.insert((i, j), value)),
                    None => complete = false,
                }
            }
        }
        complete.then_some(Matrix { rows: rows.len(), columns: columns.unwrap_or(0), entries })
    }

    fn file(&self, name: &str, span: Range<usize>) -> Option<Matrix> {
        let path = Path::new(name);
        let plain = |c: Component| matches!(c, Component::Normal(_) | Component::CurDir);
        if name.is_empty() || !path.components().all(plain) {
            let help = "put the file into the folder of the model, and give its name as \"plant.mtx\"";
            self.refusals.refuse(span, format!("`{name}` is not the name of a file beside the model"), help);
            return None;
        }
        let text = bounded_bytes(&self.folder.join(path))
            .and_then(|bytes| String::from_utf8(bytes).map_err(|_| "is not UTF-8 text".to_string()));
        let matrix = match text {
            Ok(text) => matrix_market::read(&text).map_err(|e| {
                let line = text.lines().nth(e.line - 1).unwrap_or_default();
                let shown: String = line.trim().chars().take(80).collect();
                (format!("{name}:{}: {}", e.line, e.fault), format!("correct line {} of {name}: `{shown}`", e.line))
            }),
            Err(message) => {
                Err((format!("the matrix file `{name}` {message}"), "it is looked for beside the model".into()))
            }
        };
        matrix.map_err(|(message, help)| self.refusals.refuse(span, message, help)).ok()
    }

    /// The matrix, if it has the wanted shape.
    fn shaped(&self, item: Item, matrix: Matrix, wanted: (usize, usize), why: &str) -> Option<Matrix> {
        if (matrix.rows, matrix.columns) == wanted {
            return Some(matrix);
        }
        let (rows, columns) = wanted;
        let message = format!("expected {rows} x {columns} entries, found {} x {}", matrix.rows, matrix.columns);
        self.refusals.refuse(self.refusals.header(item), message, format!("give {why}"));
        None
    }

    /// The offset c: a list of numbers, or a matrix with one column.
    fn column(&self, item: Item, length: usize) -> Option<Vec<BigRational>> {
        let list = item.get_ref().as_array().filter(|a| a.iter().all(|e| e.get_ref().as_array().is_none()));
        let Some(list) = list else {
            let mut matrix = self.shaped(item, self.matrix(item)?, (length, 1), "one number for each state")?;
            let entry = |i: usize| matrix.entries.remove(&(i, 0)).unwrap_or_else(BigRational::zero);
            return Some((0..length).map(entry).collect());
        };
        if list.len() != length {
            let message = format!("expected {length} entries in `c`, one for each state, found {}", list.len());
            self.refusals.refuse(item.span(), message, "give one number for each state");
            return None;
        }
        let entries: Vec<Option<BigRational>> = list.iter().map(|e| self.refusals.number(e, self.names)).collect();
        entries.into_iter().collect()
    }
}
