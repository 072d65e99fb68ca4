//! From a file to a model.

use super::scope::{Kind, Names};
use super::section::{self, Dynamics, Entry};
use super::table::Refusals;
use super::zone::zones;
use super::{Model, matrix, start, unknown};
use crate::diagnostic::{Diagnostic, Diagnostics};
use crate::expression::RESERVED;
use keepout_checker::statement::Starts;
use std::io::Read;
use std::ops::Range;
use std::path::Path;
use toml::de::{DeTable, DeValue};

/// The most bytes of a model or a matrix file.
pub const MAX_BYTES: u64 = 64 << 20;

/// The most constants, states, inputs, uncertain constants, outputs, zones, or vectors of a set of starts.
pub const MAX_ENTRIES: usize = 4_000;

/// The most faults in the TOML syntax that are told at once.
const MAX_SYNTAX_FAULTS: usize = 5;

const SECTIONS: [&str; 11] =
    ["title", "constants", "state", "drive", "disturbance", "uncertain", "output", "zone", "matrix", "start", "phase"];

/// Whether a model must have a zone.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Need {
    /// At least one.
    Zones,
    /// None.
    Nothing,
}

/// The text of a file of at most [`MAX_BYTES`].
pub(super) fn bounded_bytes(path: &Path) -> Result<Vec<u8>, String> {
    let file = std::fs::File::open(path).map_err(|e| format!("cannot be read: {e}"))?;
    let mut bytes = Vec::new();
    file.take(MAX_BYTES + 1).read_to_end(&mut bytes).map_err(|e| format!("cannot be read: {e}"))?;
    if bytes.len() as u64 > MAX_BYTES {
        return Err(format!("has more than {MAX_BYTES} bytes"));
    }
    Ok(bytes)
}

/// Loads a model file.
///
/// # Errors
/// All that is wrong with it, with places.
pub fn load(path: &Path, need: Need) -> Result<Model, Diagnostics> {
    let file = path.display().to_string();
    let refuse = |text: String, diagnostic| Diagnostics { file: file.clone(), text, list: vec![diagnostic] };
    let bytes =
        bounded_bytes(path).map_err(|e| refuse(String::new(), Diagnostic::new(0..0, format!("the model {e}"))))?;
    let text = String::from_utf8(bytes).map_err(|e| {
        let at = e.utf8_error().valid_up_to();
        let text = String::from_utf8_lossy(e.as_bytes()).into_owned();
        refuse(text, Diagnostic::new(at..at + 1, "expected UTF-8 text").help("save the model in the encoding UTF-8"))
    })?;
    let folder = path.parent().unwrap_or(Path::new("."));
    let title = path.file_stem().map_or_else(String::new, |s| s.to_string_lossy().into_owned());
    load_text(&text, &file, &title, folder, need)
}

/// Loads a model from its text; `folder` is where matrix files are, `title` stands where the model gives none.
///
/// # Errors
/// All that is wrong with it, with places.
pub fn load_text(text: &str, file: &str, title: &str, folder: &Path, need: Need) -> Result<Model, Diagnostics> {
    let shown = if text.is_empty() { " " } else { text };
    let refuse = |list| Diagnostics { file: file.to_string(), text: shown.to_string(), list };
    let (table, faults) = DeTable::parse_recoverable(text);
    if !faults.is_empty() {
        return Err(refuse(faults.iter().take(MAX_SYNTAX_FAULTS).map(|e| syntax_fault(e, text)).collect()));
    }
    let refusals = Refusals::new(text);
    let mut loader = Loader { refusals: &refusals, root: table.get_ref(), folder, names: Names::default() };
    let model = loader.model(title, need);
    if refusals.is_empty() { Ok(model) } else { Err(refuse(refusals.into_list())) }
}

fn syntax_fault(error: &toml::de::Error, text: &str) -> Diagnostic {
    let span = error.span().unwrap_or(0..0);
    let message = error.message().trim().replace('\n', "; ");
    if message == "duplicate key" {
        let name = text.get(span.clone()).unwrap_or("this");
        return Diagnostic::new(span, format!("`{name}` stands twice: duplicate key"))
            .help("each section and each key stands once: remove or rename one");
    }
    Diagnostic::new(span, format!("not TOML: {message}"))
        .help("a model has sections in [brackets] and lines key = value, texts in \"quotation marks\"")
}

struct Loader<'a> {
    refusals: &'a Refusals<'a>,
    root: &'a DeTable<'a>,
    folder: &'a Path,
    names: Names,
}

impl<'a> Loader<'a> {
    /// The model, of use only if nothing has been refused.
    fn model(&mut self, title: &str, need: Need) -> Model {
        let refusals = self.refusals;
        refusals.only(self.root, &SECTIONS, "a model");
        let title = self.root.get("title").map_or(Some(title.to_string()), |item| refusals.text_of(item, "a title"));
        let constants = section::entries(self.root, "constants", refusals);
        let states = self.named("state", &["start", "unit", "rate"]);
        let drives = self.named("drive", &["signal", "unit"]);
        let outputs = self.named("output", &["value", "unit"]);
        self.declare_all(&constants, |_| Kind::Constant(None));
        self.declare_all(&states, Kind::State);
        let set = self.root.get("start");
        let matrix = self.root.get("matrix").and_then(|item| matrix::Form::new(item, set, refusals));
        for (i, (name, span)) in matrix.iter().flat_map(|m| m.names(refusals)).enumerate() {
            self.declare(&name, span, Kind::State(i));
        }
        self.declare_all(&drives, Kind::Drive);
        self.declare_all(&outputs, |i| Kind::Output(i, None));
        let disturbances = self.named("disturbance", &["range", "unit"]);
        let uncertain = self.named("uncertain", &["range", "unit", "varying"]);
        self.declare_all(&disturbances, Kind::Disturbance);
        self.declare_all(&uncertain, |i| Kind::Uncertain(i, None));
        section::constants(&constants, &mut self.names, refusals);
        self.refuse_phases();
        let disturbances = unknown::disturbances(&disturbances, &self.names, refusals);
        let uncertain = unknown::uncertain(&uncertain, &mut self.names, refusals);
        let drives = section::drives(&drives, &self.names, refusals);
        let Dynamics { mut states, radii, phase } =
            self.dynamics(&states, matrix.as_ref(), (drives.len(), disturbances.len()));
        let starts = match set {
            // Without states the fault has been told.
            Some(_) if states.is_empty() => Starts::One,
            Some(item) => start::set(item, &mut states, &self.names, refusals).unwrap_or_default(),
            None => start::of_radii(radii),
        };
        let outputs = section::outputs(&outputs, &mut self.names, refusals);
        let zones = zones(self.root, need, &self.names, refusals);
        let (inputs, exponentials) = self.names.take_exponentials();
        let drives = drives.into_iter().chain(inputs).collect();
        let (title, source) = (title.unwrap_or_default(), refusals.text.to_string());
        let constants = self.names.constants();
        Model {
            title,
            constants,
            states,
            starts,
            drives,
            disturbances,
            uncertain,
            outputs,
            exponentials,
            phase,
            zones,
            source,
        }
    }

    fn refuse_phases(&self) {
        let Some((key, _)) = self.root.get_key_value("phase") else { return };
        let help = "describe one phase, with a zone's `until` for its end";
        self.refusals.refuse(key.span(), "phases are not supported yet", help);
    }

    fn named(&self, section: &str, keys: &[&str]) -> Vec<Entry<'a>> {
        let entries = section::entries(self.root, section, self.refusals);
        section::check_keys(&entries, section, keys, self.refusals);
        entries
    }

    /// `inputs`: the numbers of drives and of disturbances.
    fn dynamics(&self, states: &[Entry], matrix: Option<&matrix::Form>, inputs: (usize, usize)) -> Dynamics {
        let has_set = self.root.contains_key("start");
        match (matrix, self.root.get("state")) {
            (Some(matrix), None) => matrix.read(inputs, self.folder, &self.names, self.refusals),
            (Some(matrix), Some(_)) => {
                let message = "a model has [state] sections or a [matrix] section, not both";
                self.refusals.refuse(matrix.place(self.refusals), message, "remove one of them");
                section::states(states, has_set, &self.names, self.refusals)
            }
            (None, _) => {
                let is_empty = |item: &toml::Spanned<DeValue>| item.get_ref().as_table().is_some_and(|t| t.is_empty());
                if self.root.get("state").is_none_or(is_empty) && self.root.get("matrix").is_none() {
                    let help = "add a section such as [state.speed] with `start` and `rate`";
                    self.refusals.refuse(0..1, "the model has no state", help);
                }
                section::states(states, has_set, &self.names, self.refusals)
            }
        }
    }

    fn declare_all(&mut self, entries: &[Entry], kind: impl Fn(usize) -> Kind) {
        for (i, entry) in entries.iter().enumerate() {
            self.declare(&entry.name, entry.span.clone(), kind(i));
        }
    }

    fn declare(&mut self, name: &str, span: Range<usize>, kind: Kind) {
        let mut bytes = name.bytes();
        let is_name = bytes.next().is_some_and(|b| b.is_ascii_alphabetic() || b == b'_')
            && bytes.all(|b| b.is_ascii_alphanumeric() || b == b'_');
        if !is_name {
            let message = format!("`{name}` is not a name");
            self.refusals.refuse(span, message, "use letters, digits and _, not beginning with a digit");
        } else if RESERVED.contains(&name) {
            let help = format!("choose another name, such as {name}_0; reserved: {}", RESERVED.join(" "));
            self.refusals.refuse(span, format!("`{name}` is a reserved word"), help);
        } else if let Some((_, known, place)) = self.names.get(name) {
            let before = self.refusals.text.get(..place.start).unwrap_or_default();
            let line = before.matches('\n').count() + 1;
            let message = format!("`{name}` is declared twice: it is {} already, in line {line}", known.word());
            let help = "constants, states, drives, disturbances, uncertain constants and outputs share one namespace";
            self.refusals.refuse(span, message, help);
        } else {
            self.names.insert(name.to_string(), kind, span);
        }
    }
}
