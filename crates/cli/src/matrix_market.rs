//! Matrix Market files (NIST exchange format): coordinate and array, real and integer, with every decimal read exactly.
//!
//! Source: Boisvert, Pozo, Remington, The Matrix Market Exchange Formats: Initial Design, NISTIR 5935 (1996).

use crate::number::{NumberError, decimal};
use num_rational::BigRational;
use num_traits::Zero;
use std::collections::{BTreeMap, BTreeSet};
use thiserror::Error;

/// The most rows or columns.
pub const MAX_SIZE: usize = 4_000;

/// The most entries that are not 0.
pub const MAX_MATRIX_ENTRIES: usize = 1_000_000;

/// A matrix by its entries that are not 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Matrix {
    /// The number of rows.
    pub rows: usize,
    /// The number of columns.
    pub columns: usize,
    /// Value by row and column, counted from 0; no value is 0.
    pub entries: BTreeMap<(usize, usize), BigRational>,
}

/// What is wrong with a file, and the line, counted from 1.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[error("line {line}: {fault}")]
pub struct MatrixError {
    /// The line.
    pub line: usize,
    /// What is wrong there.
    pub fault: Fault,
}

/// What can be wrong with a Matrix Market file.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Fault {
    /// No such first line.
    #[error("expected a header such as `%%MatrixMarket matrix coordinate real general`")]
    Header,
    /// A layout other than coordinate and array.
    #[error("expected coordinate or array layout, found `{0}`")]
    Layout(String),
    /// A field other than real and integer.
    #[error("expected real or integer entries, found `{0}`")]
    Field(String),
    /// A symmetry other than general, symmetric, skew-symmetric.
    #[error("expected general, symmetric or skew-symmetric, found `{0}`")]
    Symmetry(String),
    /// No line with the sizes, or a wrong one.
    #[error("expected the sizes: rows, columns, and in coordinate layout the number of entries")]
    Sizes,
    /// Too many or no rows, columns, entries.
    #[error("expected 1 to {MAX_SIZE} rows and columns, and at most {MAX_MATRIX_ENTRIES} entries")]
    Size,
    /// A symmetric matrix that is not square.
    #[error("a symmetric or skew-symmetric matrix is square")]
    Square,
    /// An entry line without three parts.
    #[error("expected row, column and value")]
    Entry,
    /// A row or column outside the matrix.
    #[error("expected a row in 1..{rows} and a column in 1..{columns}")]
    Position {
        /// The rows of the matrix.
        rows: usize,
        /// The columns of the matrix.
        columns: usize,
    },
    /// An entry above the diagonal of a symmetric matrix.
    #[error("a symmetric or skew-symmetric matrix is given by its lower triangle: expected row >= column")]
    UpperTriangle,
    /// An entry on the diagonal of a skew-symmetric matrix.
    #[error("a skew-symmetric matrix has no entries on the diagonal")]
    Diagonal,
    /// An entry twice.
    #[error("entry ({0}, {1}) stands twice")]
    Twice(usize, usize),
    /// Another number of entries than announced.
    #[error("expected {expected} entries, found {found}")]
    Count {
        /// As the sizes announce.
        expected: usize,
        /// As the file has.
        found: usize,
    },
    /// A value that is not a number.
    #[error("`{word}`: {}", .reason.message())]
    Number {
        /// The text.
        word: String,
        /// Why it is none.
        reason: NumberError,
    },
    /// A fraction in an integer matrix.
    #[error("expected an integer, as the header says, found `{0}`")]
    Integer(String),
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Layout {
    Coordinate,
    Array,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Symmetry {
    General,
    Symmetric,
    Skew,
}

/// What the header and the sizes say.
struct Shape {
    layout: Layout,
    integers: bool,
    symmetry: Symmetry,
    rows: usize,
    columns: usize,
    entries: usize,
}

/// Reads a matrix.
///
/// # Errors
/// The line and what is wrong there.
pub fn read(text: &str) -> Result<Matrix, MatrixError> {
    let mut lines = text.lines().enumerate().map(|(i, l)| (i + 1, l.trim()));
    let (line, header) = lines.next().unwrap_or((1, ""));
    let (layout, integers, symmetry) = read_header(header).map_err(|fault| MatrixError { line, fault })?;
    let mut lines = lines.filter(|(_, l)| !l.is_empty() && !l.starts_with('%'));
    let (at, sizes) = lines.next().ok_or(MatrixError { line: line + 1, fault: Fault::Sizes })?;
    let shape = read_sizes(sizes, layout, integers, symmetry).map_err(|fault| MatrixError { line: at, fault })?;
    let mut matrix = Matrix { rows: shape.rows, columns: shape.columns, entries: BTreeMap::new() };
    let found = match layout {
        Layout::Coordinate => read_coordinates(lines, &shape, &mut matrix)?,
        Layout::Array => read_array(lines, &shape, &mut matrix)?,
    };
    if found != shape.entries {
        return Err(MatrixError { line: at, fault: Fault::Count { expected: shape.entries, found } });
    }
    Ok(matrix)
}

fn read_header(header: &str) -> Result<(Layout, bool, Symmetry), Fault> {
    let words: Vec<String> = header.split_whitespace().map(str::to_lowercase).collect();
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let ["%%matrixmarket", "matrix", layout, field, symmetry] = words.as_slice() else {
        return Err(Fault::Header);
    };
    let layout = match *layout {
        "coordinate" => Layout::Coordinate,
        "array" => Layout::Array,
        other => return Err(Fault::Layout(other.into())),
    };
    let integers = match *field {
        "real" => false,
        "integer" => true,
        other => return Err(Fault::Field(other.into())),
    };
    let symmetry = match *symmetry {
        "general" => Symmetry::General,
        "symmetric" => Symmetry::Symmetric,
        "skew-symmetric" => Symmetry::Skew,
        other => return Err(Fault::Symmetry(other.into())),
    };
    Ok((layout, integers, symmetry))
}

fn read_sizes(sizes: &str, layout: Layout, integers: bool, symmetry: Symmetry) -> Result<Shape, Fault> {
    let sizes: Option<Vec<usize>> = sizes.split_whitespace().map(|w| w.parse().ok()).collect();
    let sizes = sizes.ok_or(Fault::Sizes)?;
    let (rows, columns, announced) = match (layout, sizes.as_slice()) {
        (Layout::Coordinate, [r, c, n]) => (*r, *c, Some(*n)),
        (Layout::Array, [r, c]) => (*r, *c, None),
        (Layout::Coordinate | Layout::Array, _) => return Err(Fault::Sizes),
    };
    if rows == 0 || columns == 0 || rows > MAX_SIZE || columns > MAX_SIZE {
        return Err(Fault::Size);
    }
    if symmetry != Symmetry::General && rows != columns {
        return Err(Fault::Square);
    }
    let entries = announced.unwrap_or(match symmetry {
        Symmetry::General => rows * columns,
        Symmetry::Symmetric => rows * (rows + 1) / 2,
        Symmetry::Skew => rows * (rows - 1) / 2,
    });
    if entries > MAX_MATRIX_ENTRIES {
        return Err(Fault::Size);
    }
    Ok(Shape { layout, integers, symmetry, rows, columns, entries })
}

fn read_coordinates<'t>(
    lines: impl Iterator<Item = (usize, &'t str)>,
    shape: &Shape,
    matrix: &mut Matrix,
) -> Result<usize, MatrixError> {
    let mut seen = BTreeSet::new();
    for (line, text) in lines {
        let refused = |fault| MatrixError { line, fault };
        let words: Vec<&str> = text.split_whitespace().collect();
        let [i, j, value] = words.as_slice() else {
            return Err(refused(Fault::Entry));
        };
        let index = |word: &str, size: usize| word.parse::<usize>().ok().filter(|k| (1..=size).contains(k));
        let (Some(i), Some(j)) = (index(i, shape.rows), index(j, shape.columns)) else {
            return Err(refused(Fault::Position { rows: shape.rows, columns: shape.columns }));
        };
        if !seen.insert((i, j)) {
            return Err(refused(Fault::Twice(i, j)));
        }
        put(matrix, shape, (i - 1, j - 1), value).map_err(refused)?;
    }
    Ok(seen.len())
}

fn read_array<'t>(
    lines: impl Iterator<Item = (usize, &'t str)>,
    shape: &Shape,
    matrix: &mut Matrix,
) -> Result<usize, MatrixError> {
    debug_assert!(shape.layout == Layout::Array);
    let first = |j: usize| match shape.symmetry {
        Symmetry::General => 0,
        Symmetry::Symmetric => j,
        Symmetry::Skew => j + 1,
    };
    let mut places = (0..shape.columns).flat_map(|j| (first(j)..shape.rows).map(move |i| (i, j)));
    let mut found = 0;
    for (line, text) in lines {
        for word in text.split_whitespace() {
            found += 1;
            if let Some(place) = places.next() {
                put(matrix, shape, place, word).map_err(|fault| MatrixError { line, fault })?;
            }
        }
    }
    Ok(found)
}

/// Enters a value, and its mirror image.
fn put(matrix: &mut Matrix, shape: &Shape, (i, j): (usize, usize), word: &str) -> Result<(), Fault> {
    if word.contains('_') {
        return Err(Fault::Number { word: word.into(), reason: NumberError::Form });
    }
    let value = decimal(word).map_err(|reason| Fault::Number { word: word.chars().take(40).collect(), reason })?;
    if shape.integers && !value.is_integer() {
        return Err(Fault::Integer(word.into()));
    }
    if shape.symmetry != Symmetry::General && i < j {
        return Err(Fault::UpperTriangle);
    }
    if shape.symmetry == Symmetry::Skew && i == j {
        return Err(Fault::Diagonal);
    }
    if value.is_zero() {
        return Ok(());
    }
    match shape.symmetry {
        Symmetry::Symmetric if i != j => drop(matrix.entries.insert((j, i), value.clone())),
        Symmetry::Skew => drop(matrix.entries.insert((j, i), -value.clone())),
        Symmetry::General | Symmetry::Symmetric => {}
    }
    matrix.entries.insert((i, j), value);
    Ok(())
}
