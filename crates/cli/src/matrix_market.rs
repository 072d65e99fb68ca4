//! Matrix Market files (NIST exchange format): coordinate and array, real and integer, with every decimal read exactly.
//!
//! Source: Boisvert, Pozo, Remington, The Matrix Market Exchange Formats: Initial Design, NISTIR 5935 (1996).

use crate::number::decimal;
use num_rational::BigRational;
use num_traits::Zero;

/// A dense matrix, row by row.
pub type Rows = Vec<Vec<BigRational>>;

/// The most rows or columns.
pub const MAX_SIZE: usize = 4_000;

/// Reads a matrix.
///
/// # Errors
/// The line, counted from 1, and what is wrong there.
pub fn read(text: &str) -> Result<Rows, (usize, String)> {
    let mut lines = text.lines().enumerate().map(|(i, l)| (i + 1, l.trim()));
    let (_, header) = lines.next().ok_or((1, "the file is empty".to_string()))?;
    let words: Vec<String> = header.split_whitespace().map(str::to_lowercase).collect();
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let ["%%matrixmarket", "matrix", layout, field, symmetry] = words.as_slice() else {
        return Err((1, "expected a header such as `%%MatrixMarket matrix coordinate real general`".into()));
    };
    if !matches!(*field, "real" | "integer" | "double") {
        return Err((1, format!("expected real or integer entries, found `{field}`")));
    }
    let mirror = match *symmetry {
        "general" => 0,
        "symmetric" => 1,
        "skew-symmetric" => -1,
        other => return Err((1, format!("expected general, symmetric or skew-symmetric, found `{other}`"))),
    };
    let mut lines = lines.filter(|(_, l)| !l.is_empty() && !l.starts_with('%'));
    let (at, sizes) = lines.next().ok_or((1, "expected a line with the sizes".to_string()))?;
    let sizes: Option<Vec<usize>> = sizes.split_whitespace().map(|w| w.parse().ok()).collect();
    let wrong_sizes =
        || (at, "expected the sizes: rows, columns, and in coordinate layout the number of entries".to_string());
    let sizes = sizes.ok_or_else(wrong_sizes)?;
    let (rows, columns, entries) = match (*layout, sizes.as_slice()) {
        ("coordinate", [r, c, n]) => (*r, *c, Some(*n)),
        ("array", [r, c]) => (*r, *c, None),
        ("coordinate" | "array", _) => return Err(wrong_sizes()),
        (other, _) => return Err((1, format!("expected coordinate or array layout, found `{other}`"))),
    };
    if rows == 0 || columns == 0 || rows > MAX_SIZE || columns > MAX_SIZE {
        return Err((at, format!("expected 1 to {MAX_SIZE} rows and columns")));
    }
    if mirror != 0 && rows != columns {
        return Err((at, format!("a {symmetry} matrix is square")));
    }
    let mut matrix = vec![vec![BigRational::zero(); columns]; rows];
    let number = |line: usize, word: &str| decimal(word).map_err(|e| (line, format!("`{word}`: {}", e.message())));
    let mut put = |line: usize, i: usize, j: usize, value: BigRational| {
        if mirror == -1 && i == j && !value.is_zero() {
            return Err((line, "a skew-symmetric matrix has zeros on the diagonal".to_string()));
        }
        if mirror != 0 && i != j {
            matrix[j][i] = if mirror == 1 { value.clone() } else { -value.clone() };
        }
        matrix[i][j] = value;
        Ok(())
    };
    match entries {
        Some(expected) => {
            let mut seen = std::collections::HashSet::new();
            for (line, text) in lines {
                let words: Vec<&str> = text.split_whitespace().collect();
                let [i, j, value] = words.as_slice() else {
                    return Err((line, "expected row, column and value".into()));
                };
                let index = |word: &str, size: usize| {
                    word.parse::<usize>().ok().filter(|k| (1..=size).contains(k)).map(|k| k - 1)
                };
                let (Some(i), Some(j)) = (index(i, rows), index(j, columns)) else {
                    return Err((line, format!("expected a row in 1..{rows} and a column in 1..{columns}")));
                };
                if !seen.insert((i, j)) {
                    return Err((line, format!("entry ({}, {}) stands twice", i + 1, j + 1)));
                }
                put(line, i, j, number(line, value)?)?;
            }
            if seen.len() != expected {
                return Err((at, format!("the header announces {expected} entries, the file has {}", seen.len())));
            }
        }
        None => {
            let mut places = Vec::new();
            for j in 0..columns {
                let first = match mirror {
                    0 => 0,
                    1 => j,
                    _ => j + 1,
                };
                places.extend((first..rows).map(|i| (i, j)));
            }
            let mut places = places.into_iter();
            for (line, text) in lines {
                for word in text.split_whitespace() {
                    let (i, j) = places.next().ok_or((line, "more values than entries".to_string()))?;
                    put(line, i, j, number(line, word)?)?;
                }
            }
            if places.next().is_some() {
                return Err((at, "fewer values than entries".into()));
            }
        }
    }
    Ok(matrix)
}
