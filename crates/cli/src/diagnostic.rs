//! What is wrong with a model, where, and how to mend it.

use std::fmt;
use std::ops::Range;

/// One thing that is wrong.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    /// Bytes of the model's text; for another file, see `file`.
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
        for (i, diagnostic) in list.into_iter().enumerate() {
            if i > 0 {
                writeln!(f)?;
            }
            self.write(f, diagnostic)?;
        }
        Ok(())
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
            let gutter = number.to_string();
            let blank = " ".repeat(gutter.len());
            let length = self.text[start..end.min(line_end)].chars().count().max(1);
            writeln!(f, "{gutter} | {}", line.replace('\t', " "))?;
            writeln!(f, "{blank} | {}{}", " ".repeat(column - 1), "^".repeat(length))?;
        }
        if let Some(help) = &diagnostic.help {
            writeln!(f, "  to mend it: {help}")?;
        }
        Ok(())
    }
}

fn floor_boundary(text: &str, at: usize) -> usize {
    (0..=at.min(text.len())).rev().find(|i| text.is_char_boundary(*i)).unwrap_or(0)
}

/// The known name that is closest to a misspelt one, if any is close.
pub fn nearest<'a>(name: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let best =
        known.into_iter().map(|k| (distance(&name.to_lowercase(), &k.to_lowercase()), k)).min_by_key(|(d, _)| *d)?;
    (best.0 <= 1 + name.chars().count() / 4).then_some(best.1)
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
