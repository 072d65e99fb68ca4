//! What the benchmarks share: the matrices that are timed side by side with python-flint (`tests/reference/side_by_side.py`).

use keepout_checker::number::Rational;
use keepout_core::RationalMatrix;
use std::path::Path;

/// A matrix of `tests/reference/bench_matrices.json`.
///
/// # Panics
/// If the file or the matrix is not there.
pub fn matrix(name: &str) -> RationalMatrix {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/reference/bench_matrices.json");
    let text = std::fs::read_to_string(path).expect("the matrices");
    let all: serde_json::Value = serde_json::from_str(&text).expect("JSON");
    let entry = |v: &serde_json::Value| v.as_str().expect("a string").parse::<Rational>().expect("a rational");
    let rows = all[name].as_array().expect("rows").iter();
    let rows: Vec<Vec<Rational>> = rows.map(|r| r.as_array().expect("a row").iter().map(entry).collect()).collect();
    RationalMatrix::new(&rows).expect("a matrix")
}
