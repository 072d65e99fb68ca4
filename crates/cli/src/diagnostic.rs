//! What is wrong with a model, where, and how to mend it.

use std::fmt;
use std::ops::Range;

/// The most characters of a source line that a message shows.
const MAX_LINE: usize = 120;

/// The most messages that are shown.
const MAX_SHOWN: usize = 40;

/// One thing that is wrong.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    /// Bytes of the model's text.
    pub span: Range<usize>,
    /// What is wrong, and what was expected.
    pub message: String,
    /// How to mend it.
    pub help: Option<String>,
}

impl Diagnostic {
    /// Something wrong at a place.
    pub fn new(span: Range<usize>, message: impl Into<String>) -> Self {
        Self { span, message: message.into(), help: None }
    }

    /// The same with a way to mend it.
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }
}

/// All that is wrong with one file, with the file's name and text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostics {
    /// The name of the file as the user gave it.
    pub file: String,
    /// Its text; empty if it could not be read.
    pub text: String,
    /// At least one.
    pub list: Vec<Diagnostic>,
}

impl fmt::Display for Diagnostics {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut list: Vec<&Diagnostic> = self.list.iter().collect();
        list.sort_by_key(|d| (d.span.start, d.span.end));
        list.dedup();
        let more = list.len().saturating_sub(MAX_SHOWN);
        for (i, diagnostic) in list.into_iter().take(MAX_SHOWN).enumerate() {
            if i > 0 {
                writeln!(f)?;
            }
            self.write(f, diagnostic)?;
        }
        if more > 0 { writeln!(f, "\nand {more} more") } else { Ok(()) }
    }
}

impl Diagnostics {
    fn write(&self, f: &mut fmt::Formatter<'_>, diagnostic: &Diagnostic) -> fmt::Result {
        if self.text.is_empty() {
            writeln!(f, "{}: {}", self.file, diagnostic.message)?;
        } else {
            let start = floor_boundary(&self.text, diagnostic.span.start);
            let end = floor_boundary(&self.text, diagnostic.span.end.max(start));
            let before = &self.text[..start];
            let line_start = before.rfind('\n').map_or(0, |i| i + 1);
            let line_end = self.text[start..].find('\n').map_or(self.text.len(), |i| start + i);
            let line = self.text[line_start..line_end].trim_end_matches('\r');
            let number = before.matches('\n').count() + 1;
            let column = self.text[line_start..start].chars().count() + 1;
            writeln!(f, "{}:{number}:{column}: {}", self.file, diagnostic.message)?;
            let length = self.text[start..end.min(line_end)].chars().count().max(1);
            let (shown, indent) = excerpt(line, column - 1, length);
            let gutter = number.to_string();
            let blank = " ".repeat(gutter.len());
            writeln!(f, "{gutter} | {shown}")?;
            let carets = length.min(shown.chars().count().saturating_sub(indent)).max(1);
            writeln!(f, "{blank} | {}{}", " ".repeat(indent), "^".repeat(carets))?;
        }
        if let Some(help) = &diagnostic.help {
            writeln!(f, "  to mend it: {help}")?;
        }
        Ok(())
    }
}

/// The part of a long line around a place, without control characters, and the place's position in it.
fn excerpt(line: &str, at: usize, length: usize) -> (String, usize) {
    let plain = |c: char| if c.is_control() { ' ' } else { c };
    let count = line.chars().count();
    if count <= MAX_LINE {
        return (line.chars().map(plain).collect(), at);
    }
    let first = (at + length.min(MAX_LINE / 2)).saturating_sub(3 * MAX_LINE / 4).min(at);
    let before = if first > 0 { "..." } else { "" };
    let after = if first + MAX_LINE < count { "..." } else { "" };
    let shown: String = line.chars().skip(first).take(MAX_LINE).map(plain).collect();
    (format!("{before}{shown}{after}"), at - first + before.len())
}

fn floor_boundary(text: &str, at: usize) -> usize {
    (0..=at.min(text.len())).rev().find(|i| text.is_char_boundary(*i)).unwrap_or(0)
}

/// The known name that is closest to a misspelt one, if any is close.
pub fn nearest<'a>(name: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let best =
        known.into_iter().map(|k| (distance(&name.to_lowercase(), &k.to_lowercase()), k)).min_by_key(|(d, _)| *d)?;
    let length = name.chars().count();
    (best.0 <= 1 + length / 4 && (best.0 == 0 || best.0 < length)).then_some(best.1)
}

/// The number of single-character edits between two texts (Levenshtein distance).
fn distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, x) in a.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, y) in b.iter().enumerate() {
            let cost = diagonal + usize::from(x != *y);
            diagonal = row[j + 1];
            row[j + 1] = cost.min(row[j] + 1).min(diagonal + 1);
        }
    }
    row[b.len()]
}
