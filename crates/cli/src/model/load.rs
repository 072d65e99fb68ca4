//! From a file to a model.

use super::Model;
use super::matrix;
use super::scope::{Kind, NameScope, Place};
use super::table::{ConstantScope, Item, Refusals};
use super::zone::zones;
use crate::diagnostic::{Diagnostic, Diagnostics};
use crate::expression::{Node, NodeKind, Polynomial, RESERVED, evaluate, parse, signal};
use keepout_checker::statement::{Affine, Drive, Output, Phase, State, Variable};
use num_rational::BigRational;
use num_traits::Zero;
use std::ops::Range;
use std::path::Path;
use toml::de::{DeTable, DeValue};

/// The largest file.
const MAX_BYTES: u64 = 64 << 20;

/// The most states, drives, outputs or zones.
const MAX_ENTRIES: usize = 4_000;

const SECTIONS: [&str; 11] =
    ["title", "constants", "state", "drive", "disturbance", "uncertain", "output", "zone", "matrix", "start", "phase"];

const ONE_TRAJECTORY: &str = "this version settles a single trajectory: exact start, exact constants, known inputs";

/// Whether a model must have a zone.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Need {
    /// At least one.
    Zones,
    /// None.
    Nothing,
}

/// Loads a model file.
///
/// # Errors
/// All that is wrong with it, with places.
pub fn load(path: &Path, need: Need) -> Result<Model, Diagnostics> {
    let file = path.display().to_string();
    let failed = |message: String| Diagnostics {
        file: file.clone(),
        text: String::new(),
        list: vec![Diagnostic::new(0..0, message)],
    };
    let size = std::fs::metadata(path).map_err(|e| failed(format!("cannot read the model: {e}")))?.len();
    if size > MAX_BYTES {
        return Err(failed(format!("a model has at most {MAX_BYTES} bytes, this file has {size}")));
    }
    let bytes = std::fs::read(path).map_err(|e| failed(format!("cannot read the model: {e}")))?;
    let text = String::from_utf8(bytes).map_err(|e| failed(format!("the model is not UTF-8 text: {e}")))?;
    let folder = path.parent().unwrap_or(Path::new("."));
    let title = path.file_stem().map_or_else(String::new, |s| s.to_string_lossy().into_owned());
    load_text(&text, &file, &title, folder, need)
}

/// Loads a model from its text; `folder` is where matrix files are, `title` stands where the model gives none.
///
/// # Errors
/// All that is wrong with it, with places.
pub fn load_text(text: &str, file: &str, title: &str, folder: &Path, need: Need) -> Result<Model, Diagnostics> {
    let refuse = |list| Diagnostics {
        file: file.to_string(),
        text: if text.is_empty() { " ".into() } else { text.to_string() },
        list,
    };
    let table = DeTable::parse(text).map_err(|e| {
        let span = e.span().unwrap_or(0..0);
        refuse(vec![Diagnostic::new(span, format!("not TOML: {}", e.message().trim().replace('\n', "; ")))])
    })?;
    let refusals = Refusals::new(text);
    let mut loader = Loader { refusals: &refusals, root: table.get_ref(), folder, names: Vec::new() };
    let model = loader.model(title, need);
    match model.filter(|_| refusals.is_empty()) {
        Some(model) => Ok(model),
        None => Err(refuse(refusals.into_list())),
    }
}

struct Loader<'a> {
    refusals: &'a Refusals<'a>,
    root: &'a DeTable<'a>,
    folder: &'a Path,
    names: Vec<(String, Kind)>,
}

impl<'a> Loader<'a> {
    fn refuse(&self, span: Range<usize>, message: impl Into<String>) {
        self.refusals.push(Diagnostic::new(span, message));
    }

    fn refuse_with(&self, span: Range<usize>, message: impl Into<String>, help: impl Into<String>) {
        self.refusals.push(Diagnostic::new(span, message).help(help));
    }

    fn model(&mut self, title: &str, need: Need) -> Option<Model> {
        self.refusals.only(self.root, &SECTIONS, "a model");
        self.refuse_later_sections();
        let title = match self.root.get("title") {
            Some(item) => self.refusals.text_of(item, "a title")?,
            None => title.to_string(),
        };
        let constants = self.constants();
        let constant_scope = ConstantScope { constants: &constants };
        let drives = self.section("drive", &["signal", "unit"]);
        let outputs = self.section("output", &["value", "unit"]);
        let states = self.section("state", &["start", "unit", "rate"]);
        for (i, (name, key, _)) in states.iter().enumerate() {
            self.declare(name, key.clone(), Kind::State(i));
        }
        let matrix =
            self.root.get("matrix").and_then(|item| Some((item, self.refusals.table(item, "the section [matrix]")?)));
        let matrix_states = matrix.and_then(|(item, table)| self.matrix_names(item, table));
        for (i, (name, key, _)) in drives.iter().enumerate() {
            self.declare(name, key.clone(), Kind::Drive(i));
        }
        for (i, (name, key, _)) in outputs.iter().enumerate() {
            self.declare(name, key.clone(), Kind::Output(i));
        }
        let drives = self.drives(&drives);
        let (states, phase) = match (matrix, states.is_empty()) {
            (Some((item, table)), true) => self.matrix(item, table, &matrix_states?, drives.len(), &constant_scope)?,
            (Some((item, _)), false) => {
                self.refuse(
                    header(item, self.refusals.text),
                    "a model has [state] sections or a [matrix] section, not both",
                );
                return None;
            }
            (None, true) => {
                self.refuse_with(
                    0..1,
                    "the model has no state",
                    "add a section such as [state.speed] with `start` and `rate`",
                );
                return None;
            }
            (None, false) => self.states(&states, &constant_scope)?,
        };
        let outputs = self.outputs(&outputs);
        let zones = self.zones(&constant_scope, need);
        Some(Model { title, states, drives, outputs, phase, zones })
    }

    /// Sections of the format that this version does not work on.
    fn refuse_later_sections(&self) {
        for (section, what) in [
            ("disturbance", "disturbances"),
            ("uncertain", "uncertain constants"),
            ("start", "sets of starts"),
            ("phase", "phases"),
        ] {
            if let Some((key, _)) = self.root.get_key_value(section) {
                self.refuse_with(key.span(), format!("{what} are not supported yet"), ONE_TRAJECTORY);
            }
        }
    }

    fn declare(&mut self, name: &str, span: Range<usize>, kind: Kind) {
        let mut bytes = name.bytes();
        let is_name = bytes.next().is_some_and(|b| b.is_ascii_alphabetic() || b == b'_')
            && bytes.all(|b| b.is_ascii_alphanumeric() || b == b'_');
        if !is_name {
            self.refuse(span, format!("`{name}` is not a name: letters, digits and _, not beginning with a digit"));
        } else if RESERVED.contains(&name) {
            self.refuse(span, format!("`{name}` is a reserved word"));
        } else if self.names.iter().any(|(known, _)| known == name) {
            self.refuse_with(
                span,
                format!("`{name}` is declared twice"),
                "constants, states, drives and outputs share one namespace",
            );
        } else {
            self.names.push((name.to_string(), kind));
        }
    }

    /// The named tables of a section, in the order of the file.
    fn section(&self, section: &str, keys: &[&str]) -> Vec<(String, Range<usize>, Item<'a>)> {
        let Some(item) = self.root.get(section) else { return Vec::new() };
        let Some(table) = self.refusals.table(item, &format!("sections such as [{section}.name]")) else {
            return Vec::new();
        };
        if table.len() > MAX_ENTRIES {
            self.refuse(item.span(), format!("at most {MAX_ENTRIES} {section} sections"));
            return Vec::new();
        }
        let mut list = Vec::new();
        for (key, value) in table {
            let Some(inner) = self.refusals.table(value, &format!("a section [{section}.{}]", key.get_ref())) else {
                continue;
            };
            self.refusals.only(inner, keys, &format!("[{section}.{}]", key.get_ref()));
            list.push((key.get_ref().to_string(), key.span(), value));
        }
        list
    }

    /// A key that a section must have.
    fn required(&self, name: &str, key_span: &Range<usize>, item: Item<'a>, key: &str) -> Option<Item<'a>> {
        let found = item.get_ref().as_table().and_then(|t| t.get(key));
        if found.is_none() {
            self.refuse(key_span.clone(), format!("`{name}` has no `{key}`"));
        }
        found
    }

    fn unit(&self, item: Item<'a>) -> Option<String> {
        item.get_ref().as_table()?.get("unit").and_then(|u| self.refusals.text_of(u, "a unit"))
    }

    /// The constants; each may use the others, in any order, without a cycle.
    fn constants(&mut self) -> Vec<(String, BigRational)> {
        let Some(item) = self.root.get("constants") else { return Vec::new() };
        let Some(table) = self.refusals.table(item, "the section [constants]") else { return Vec::new() };
        let mut open: Vec<(&toml::Spanned<_>, Item<'a>)> = table.iter().collect();
        let mut known: Vec<(String, BigRational)> = Vec::new();
        loop {
            let waiting = open.len();
            open.retain(|(key, item)| {
                let names: Vec<String> = uses(item);
                if names.iter().any(|n| !known.iter().any(|(k, _)| k == n) && table.contains_key(n.as_str())) {
                    return true;
                }
                let value = self.refusals.number(item, &ConstantScope { constants: &known });
                self.declare(key.get_ref(), key.span(), value.clone().map_or(Kind::Broken, Kind::Constant));
                known.extend(value.map(|v| (key.get_ref().to_string(), v)));
                false
            });
            if open.is_empty() || open.len() == waiting {
                break;
            }
        }
        // What is left waits for itself, or for a constant that could not be read.
        let broken = |n: &String| self.names.iter().any(|(k, kind)| k == n && *kind == Kind::Broken);
        let cyclic: Vec<_> = open.iter().filter(|(_, item)| !uses(item).iter().any(broken)).collect();
        for (key, item) in cyclic {
            let through = uses(item).join(", ");
            self.refuse(
                key.span(),
                format!("the constant `{}` is defined through itself (it uses {through})", key.get_ref()),
            );
        }
        for (key, _) in open {
            self.names.push((key.get_ref().to_string(), Kind::Broken));
        }
        known
    }

    fn drives(&self, sections: &[(String, Range<usize>, Item<'a>)]) -> Vec<Drive> {
        let scope = NameScope { names: &self.names, place: Place::Signal };
        let mut drives = Vec::new();
        for (name, span, item) in sections {
            let signal = self.required(name, span, item, "signal").and_then(|i| match i.get_ref() {
                DeValue::String(text) => {
                    let terms = parse(text).and_then(|node| signal(&node, &scope));
                    self.refusals.keep(terms.map_err(|d| self.refusals.inside(i, d)))
                }
                _ => {
                    let value = self.refusals.number(i, &scope)?;
                    signal(&Node { span: 0..0, kind: NodeKind::Number(value) }, &scope).ok()
                }
            });
            drives.push(Drive { name: name.clone(), unit: self.unit(item), signal: signal.unwrap_or_default() });
        }
        drives
    }

    fn states(
        &self,
        sections: &[(String, Range<usize>, Item<'a>)],
        constants: &ConstantScope,
    ) -> Option<(Vec<State>, Phase)> {
        let scope = NameScope { names: &self.names, place: Place::Rate };
        let mut states = Vec::new();
        let mut rates = Vec::new();
        for (name, span, item) in sections {
            let start = self.required(name, span, item, "start").and_then(|i| self.start(i, constants));
            let rate = self.required(name, span, item, "rate").and_then(|i| match i.get_ref() {
                DeValue::String(text) => {
                    let result = parse(text).and_then(|node| affine(&node, &scope));
                    self.refusals.keep(result.map_err(|d| self.refusals.inside(i, d)))
                }
                _ => self.refusals.number(i, &scope).map(|offset| Affine { terms: Vec::new(), offset }),
            });
            states.push(start.map(|start| State { name: name.clone(), unit: self.unit(item), start }));
            rates.push(rate);
        }
        let states: Option<Vec<State>> = states.into_iter().collect();
        let rates: Option<Vec<Affine>> = rates.into_iter().collect();
        Some((states?, Phase { rates: rates? }))
    }

    /// A start: a number, or a range of length 0.
    fn start(&self, item: Item<'a>, constants: &ConstantScope) -> Option<BigRational> {
        let Some(range) = item.get_ref().as_array() else { return self.refusals.number(item, constants) };
        let ends: Vec<Option<BigRational>> = range.iter().map(|e| self.refusals.number(e, constants)).collect();
        let ends: Vec<BigRational> = ends.into_iter().collect::<Option<_>>()?;
        match ends.as_slice() {
            [lo, hi] if lo == hi => return Some(lo.clone()),
            [lo, hi] if lo > hi => self.refuse(item.span(), format!("the range begins at {lo}, above its end {hi}")),
            [_, _] => self.refuse_with(item.span(), "ranges of starts are not supported yet", ONE_TRAJECTORY),
            _ => self.refuse(item.span(), "expected a number, or a range [lo, hi]"),
        }
        None
    }

    fn outputs(&self, sections: &[(String, Range<usize>, Item<'a>)]) -> Vec<Output> {
        let scope = NameScope { names: &self.names, place: Place::Output };
        let mut values: Vec<Option<(Polynomial, Item<'a>)>> = Vec::new();
        for (name, span, item) in sections {
            let value = self.required(name, span, item, "value").and_then(|i| {
                let DeValue::String(text) = i.get_ref() else {
                    return self.refusals.number(i, &scope).map(|v| (Polynomial::constant(v), i));
                };
                let result = parse(text).and_then(|node| polynomial(&node, &scope));
                self.refusals.keep(result.map_err(|d| self.refusals.inside(i, d))).map(|p| (p, i))
            });
            values.push(value);
        }
        // Outputs may use each other: replace until none is left, as often as there are outputs at most.
        for _ in 0..values.len() {
            let known: Vec<Option<Polynomial>> =
                values.iter().map(|v| v.as_ref().map(|(p, _)| p.clone()).filter(|p| !uses_outputs(p))).collect();
            for (value, _) in values.iter_mut().flatten() {
                if uses_outputs(value) {
                    *value = value.substitute(&|v| if let Variable::Output(i) = v { known[i].clone() } else { None });
                }
            }
        }
        let mut outputs = Vec::new();
        for ((name, _, item), value) in sections.iter().zip(values) {
            let Some((value, place)) = value else { continue };
            if uses_outputs(&value) {
                self.refuse(place.span(), format!("the output `{name}` is defined through itself"));
            } else if value.degree() > crate::expression::MAX_DEGREE {
                self.refuse(
                    place.span(),
                    format!("the output `{name}` has a degree above {}", crate::expression::MAX_DEGREE),
                );
            }
            outputs.push(Output { name: name.clone(), unit: self.unit(item), value: value.expression() });
        }
        outputs
    }

    fn zones(&self, constants: &ConstantScope, need: Need) -> Vec<keepout_checker::statement::Zone> {
        let item = self.root.get("zone");
        let list = item.and_then(|i| i.get_ref().as_array());
        match (item, list) {
            (None, _) if need == Need::Zones => {
                self.refuse_with(0..1, "the model has no zone", "add a section [[zone]] with `name` and `inside`");
                Vec::new()
            }
            (None, _) => Vec::new(),
            (Some(i), None) => {
                self.refuse_with(
                    header(i, self.refusals.text),
                    "zones are a list",
                    "write [[zone]] with two brackets on each side",
                );
                Vec::new()
            }
            (Some(i), Some(list)) => {
                if list.len() > MAX_ENTRIES {
                    self.refuse(i.span(), format!("at most {MAX_ENTRIES} zones"));
                }
                zones(list, &self.names, constants, self.refusals)
            }
        }
    }

    /// Declares the states of the matrix form.
    fn matrix_names(&mut self, item: Item<'a>, table: &'a DeTable<'a>) -> Option<Vec<String>> {
        self.refusals.only(table, &matrix::KEYS, "[matrix]");
        let size = match table.get("names").or_else(|| table.get("start")).and_then(|i| i.get_ref().as_array()) {
            Some(list) => list.len(),
            None => {
                self.refuse(
                    header(item, self.refusals.text),
                    "[matrix] has no `start`, a list with one number for each state",
                );
                return None;
            }
        };
        let mut names = Vec::new();
        for i in 0..size {
            let given = table.get("names").and_then(|n| n.get_ref().as_array()).and_then(|n| n.get(i));
            let (name, span) = match given {
                Some(entry) => (self.refusals.text_of(entry, "a name")?, entry.span()),
                None => (format!("x{}", i + 1), table.get("start").map_or(item.span(), toml::Spanned::span)),
            };
            self.declare(&name, span, Kind::State(i));
            names.push(name);
        }
        Some(names)
    }

    fn matrix(
        &self,
        item: Item<'a>,
        table: &'a DeTable<'a>,
        names: &[String],
        drives: usize,
        constants: &ConstantScope,
    ) -> Option<(Vec<State>, Phase)> {
        let place = || header(item, self.refusals.text);
        if let Some((key, _)) = table.get_key_value("E") {
            self.refuse_with(key.span(), "disturbances are not supported yet", ONE_TRAJECTORY);
        }
        let n = names.len();
        let Some(a_item) = table.get("A") else {
            self.refuse(place(), "[matrix] has no `A`");
            return None;
        };
        let a = matrix::rows(a_item, self.folder, constants, self.refusals)?;
        let a = matrix::shaped(a_item, a, (n, n), "one row and column for each state", self.refusals)?;
        let c = match table.get("c") {
            Some(i) => matrix::column(i, n, self.folder, constants, self.refusals)?,
            None => vec![BigRational::zero(); n],
        };
        let b = match table.get("B") {
            Some(i) => {
                let rows = matrix::rows(i, self.folder, constants, self.refusals)?;
                matrix::shaped(i, rows, (n, drives), "a row for each state, a column for each drive", self.refusals)?
            }
            None if drives > 0 => {
                self.refuse(place(), "there are drives, but [matrix] has no `B`");
                return None;
            }
            None => vec![Vec::new(); n],
        };
        let Some(start_item) = table.get("start") else {
            self.refuse(place(), "[matrix] has no `start`, a list with one number for each state");
            return None;
        };
        let starts = start_item.get_ref().as_array().filter(|list| list.len() == n);
        let Some(starts) = starts else {
            self.refuse(start_item.span(), format!("expected a list of {n} numbers, one for each state"));
            return None;
        };
        let starts: Vec<Option<BigRational>> = starts.iter().map(|i| self.start(i, constants)).collect();
        let starts: Vec<BigRational> = starts.into_iter().collect::<Option<_>>()?;
        let unit = |i: usize| table.get("units")?.get_ref().as_array()?.get(i)?.get_ref().as_str().map(str::to_string);
        let states = names.iter().zip(starts).enumerate().map(|(i, (name, start))| State {
            name: name.clone(),
            unit: unit(i),
            start,
        });
        let rates = a.into_iter().zip(b).zip(c).map(|((row, inputs), offset)| {
            let states = row.into_iter().enumerate().map(|(j, v)| (v, Variable::State(j)));
            let drives = inputs.into_iter().enumerate().map(|(j, v)| (v, Variable::Drive(j)));
            Affine { terms: states.chain(drives).filter(|(v, _)| !v.is_zero()).collect(), offset }
        });
        Some((states.collect(), Phase { rates: rates.collect() }))
    }
}

/// The first line of an item: tables span many.
fn header(item: Item, text: &str) -> Range<usize> {
    let span = item.span();
    let length = text.get(span.start..).and_then(|rest| rest.find('\n')).unwrap_or(0);
    span.start..span.end.min(span.start + length.max(1))
}

fn uses_outputs(p: &Polynomial) -> bool {
    p.terms().any(|(powers, _)| powers.iter().any(|(v, _)| matches!(v, Variable::Output(_))))
}

/// The names in the string at an item.
fn uses(item: Item) -> Vec<String> {
    let mut names = Vec::new();
    if let Some(Ok(node)) = item.get_ref().as_str().map(parse) {
        collect_names(&node, &mut names);
    }
    names
}

fn collect_names(node: &Node, names: &mut Vec<String>) {
    match &node.kind {
        NodeKind::Number(_) => {}
        NodeKind::Name(name) => names.push(name.clone()),
        NodeKind::Negative(a) | NodeKind::Not(a) | NodeKind::Call(_, a) => collect_names(a, names),
        NodeKind::Sum(a, b)
        | NodeKind::Difference(a, b)
        | NodeKind::Product(a, b)
        | NodeKind::Quotient(a, b)
        | NodeKind::Power(a, b)
        | NodeKind::And(a, b)
        | NodeKind::Or(a, b) => {
            collect_names(a, names);
            collect_names(b, names);
        }
        NodeKind::Comparison(list, _) => list.iter().for_each(|n| collect_names(n, names)),
    }
}

/// An expression without cases.
fn polynomial(node: &Node, scope: &NameScope) -> Result<Polynomial, Diagnostic> {
    let mut cases = evaluate(node, scope)?;
    cases.pop().map(|c| c.value).ok_or_else(|| Diagnostic::new(node.span.clone(), "expected an expression"))
}

/// A rate: affine in states and drives.
fn affine(node: &Node, scope: &NameScope) -> Result<Affine, Diagnostic> {
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
fn nonlinear<'n>(node: &'n Node, scope: &NameScope) -> Option<&'n Node> {
    let above = |n: &Node| polynomial(n, scope).is_ok_and(|p| p.degree() > 1);
    if !above(node) {
        return None;
    }
    let inner = match &node.kind {
        NodeKind::Negative(a) => nonlinear(a, scope),
        NodeKind::Sum(a, b) | NodeKind::Difference(a, b) | NodeKind::Product(a, b) | NodeKind::Quotient(a, b) => {
            nonlinear(a, scope).or_else(|| nonlinear(b, scope))
        }
        _ => None,
    };
    Some(inner.unwrap_or(node))
}
