//! The matrix form of a model: x' = A x + c + B u + E d.

use super::load::bounded_bytes;
use super::scope::Names;
use super::section::Dynamics;
use super::start::{dimension, refuse_second, start};
use super::table::{Item, Refusals, kind_of};
use super::unknown::Entered;
use crate::matrix_market::{self, Matrix};
use keepout_checker::statement::{Affine, Phase, State, Variable};
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
    /// The section with its number of states: that of the starts, or of the set of starts.
    pub(super) fn new(item: Item<'a>, set: Option<Item>, refusals: &Refusals) -> Option<Self> {
        let table = refusals.table(item, "a section [matrix]")?;
        refusals.only(table, &KEYS, "[matrix]");
        let (starts, size) = match (table.get("start"), set) {
            (Some(starts), None) => (starts, refusals.list_of(starts, "a list with one number for each state")?.len()),
            (starts, Some(set)) => {
                starts.into_iter().for_each(|item| refuse_second(item, refusals));
                (set, dimension(set))
            }
            (None, None) => {
                let help = "add start = [...], a list with one number for each state";
                refusals.refuse(refusals.header(item), "[matrix] has no `start`", help);
                return None;
            }
        };
        if size == 0 || size > super::MAX_ENTRIES {
            let message = format!("expected 1 to {} states, found {size}", super::MAX_ENTRIES);
            refusals.refuse(refusals.header(starts), message, "give one number for each state");
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

    /// States and rates; `inputs`: the numbers of drives and of disturbances.
    pub(super) fn read(&self, inputs: (usize, usize), folder: &Path, names: &Names, refusals: &Refusals) -> Dynamics {
        let reader = Reader { folder, names, refusals };
        let n = self.size;
        let mut phase = Phase { rates: vec![Affine::default(); n], uncertain: Vec::new() };
        match self.table.get("A") {
            Some(item) => {
                let why = "one row and one column for each state";
                reader.shaped(item, (n, n), why).into_iter().for_each(|a| a.add(&mut phase, Variable::State));
            }
            None => refusals.refuse(
                self.place(refusals),
                "[matrix] has no `A`",
                "add A = [[...], ...], a list of rows, or A = \"file.mtx\"",
            ),
        }
        let (drives, disturbances) = inputs;
        self.input(("B", "drive", drives), Variable::Drive, &reader, &mut phase);
        self.input(("E", "disturbance", disturbances), Variable::Disturbance, &reader, &mut phase);
        for (i, entry) in self.table.get("c").and_then(|item| reader.column(item, n)).into_iter().flatten().enumerate()
        {
            entry.add(None, i, &mut phase.rates[i], &mut phase.uncertain);
        }
        // A statement's text has them state by state: a certificate speaks of this order.
        phase.uncertain.sort_by_key(|term| term.state);
        let (states, radii) = self.states(names, refusals);
        Dynamics { states, radii, phase }
    }

    /// Adds what a matrix with a column for each input of a kind says.
    fn input(
        &self,
        (key, word, count): (&str, &str, usize),
        variable: fn(usize) -> Variable,
        reader: &Reader,
        phase: &mut Phase,
    ) {
        match self.table.get(key) {
            Some(item) if count == 0 => {
                let help = format!("declare a [{word}] for each column of {key}");
                reader.refusals.refuse(item.span(), format!("there is {} `{key}`, but no {word}", article(key)), help);
            }
            Some(item) => {
                let why = format!("a row for each state, a column for each {word} in the order of the file");
                let matrix = reader.shaped(item, (self.size, count), &why);
                matrix.into_iter().for_each(|m| m.add(phase, variable));
            }
            None if count > 0 => reader.refusals.refuse(
                self.place(reader.refusals),
                format!("there are {word}s, but [matrix] has no `{key}`"),
                format!("add {key} with a row for each state and a column for each {word}"),
            ),
            None => {}
        }
    }

    /// The states, and the radii of their starts.
    fn states(&self, names: &Names, refusals: &Refusals) -> (Vec<State>, Vec<BigRational>) {
        let zero = || (BigRational::zero(), BigRational::zero());
        let starts = self.table.get("start").and_then(|i| i.get_ref().as_array());
        let starts = starts.iter().flat_map(|a| a.iter()).map(|i| start(i, names, refusals).unwrap_or_else(zero));
        let starts: Vec<_> = starts.chain(std::iter::repeat_with(zero)).take(self.size).collect();
        let units = self.labels("units", "a list of units", refusals);
        let units: Vec<Option<String>> = match units {
            Some(list) => list.iter().map(|i| refusals.text_of(i, "a unit")).collect(),
            None => vec![None; self.size],
        };
        // The faults of the names have been told when they were declared.
        let list = self.names(&Refusals::new(refusals.text));
        let state = |(((name, _), unit), (start, radius)): (((String, _), _), (BigRational, BigRational))| {
            (State { name, unit, start }, radius)
        };
        list.into_iter().zip(units).zip(starts).map(state).unzip()
    }
}

/// The article before the name of a matrix.
fn article(key: &str) -> &'static str {
    if key == "E" { "an" } else { "a" }
}

/// A matrix with its uncertain entries.
struct Entries {
    exact: Matrix,
    uncertain: Vec<((usize, usize), Entered)>,
}

impl Entries {
    /// Adds matrix * variables to the rates.
    fn add(self, phase: &mut Phase, variable: fn(usize) -> Variable) {
        for ((i, j), value) in self.exact.entries {
            phase.rates[i].terms.push((value, variable(j)));
        }
        for ((i, j), value) in self.uncertain {
            value.add(Some(variable(j)), i, &mut phase.rates[i], &mut phase.uncertain);
        }
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
    fn matrix(&self, item: Item) -> Option<Entries> {
        match item.get_ref() {
            DeValue::String(name) => self.file(name, item.span()).map(|exact| Entries { exact, uncertain: Vec::new() }),
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

    fn rows(&self, item: Item) -> Option<Entries> {
        let rows = self.refusals.list_of(item, "a list of rows")?;
        let (mut entries, mut uncertain) = (BTreeMap::new(), Vec::new());
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
                match Entered::read(entry, self.names, self.refusals) {
                    Some(Entered::Exact(value)) if value.is_zero() => {}
                    Some(Entered::Exact(value)) => drop(entries.insert((i, j), value)),
                    Some(value) => uncertain.push(((i, j), value)),
                    None => complete = false,
                }
            }
        }
        let exact = Matrix { rows: rows.len(), columns: columns.unwrap_or(0), entries };
        complete.then_some(Entries { exact, uncertain })
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
    fn shaped(&self, item: Item, wanted: (usize, usize), why: &str) -> Option<Entries> {
        let matrix = self.matrix(item)?;
        let found = (matrix.exact.rows, matrix.exact.columns);
        if found == wanted {
            return Some(matrix);
        }
        let message = format!("expected {} x {} entries, found {} x {}", wanted.0, wanted.1, found.0, found.1);
        self.refusals.refuse(self.refusals.header(item), message, format!("give {why}"));
        None
    }

    /// The offset c: a list of numbers, or a matrix with one column.
    fn column(&self, item: Item, length: usize) -> Option<Vec<Entered>> {
        let list = item.get_ref().as_array().filter(|a| a.iter().all(|e| e.get_ref().as_array().is_none()));
        let Some(list) = list else {
            let Entries { mut exact, uncertain } = self.shaped(item, (length, 1), "one number for each state")?;
            let entry = |i: usize| exact.entries.remove(&(i, 0)).unwrap_or_else(BigRational::zero);
            let mut column: Vec<Entered> = (0..length).map(entry).map(Entered::Exact).collect();
            uncertain.into_iter().for_each(|((i, _), value)| column[i] = value);
            return Some(column);
        };
        if list.len() != length {
            let message = format!("expected {length} entries in `c`, one for each state, found {}", list.len());
            self.refusals.refuse(item.span(), message, "give one number for each state");
            return None;
        }
        let entries: Vec<Option<Entered>> = list.iter().map(|e| Entered::read(e, self.names, self.refusals)).collect();
        entries.into_iter().collect()
    }
}
