//! Spectral abscissae of open models, against python-flint (reference/spectrum.py).

use keepout_checker::number::Rational;
use keepout_core::blocks::SparseMatrix;
use keepout_core::structure::{StructureOptions, spectral_structure_with};
use keepout_tests::reference::{bounds, group};
use std::path::Path;

/// The entries of a coordinate Matrix Market file, decimals read exactly.
fn market(name: &str) -> SparseMatrix {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("data").join(name);
    let matrix = keepout::matrix_market::read(&std::fs::read_to_string(path).unwrap()).unwrap();
    let entries = matrix.entries.iter().map(|((i, j), v)| (*i, *j, v.clone()));
    SparseMatrix::new(matrix.rows, entries.filter(|(_, _, v)| *v != Rational::from_integer(0.into()))).unwrap()
}

#[test]
fn spectral_abscissae_of_the_open_models_agree() {
    let mut compared = 0;
    for case in group("spectra") {
        let Some(model) = case["model"].as_str().filter(|m| m.ends_with(".mtx")) else { continue };
        let structure = spectral_structure_with(&market(model), &StructureOptions::default()).unwrap();
        let (low, high) = bounds(&case["abscissa"]);
        let rate = &structure.rates[0].rate;
        let (rate_lo, rate_hi) = (rate.lo().to_rational().unwrap(), rate.hi().to_rational().unwrap());
        assert!(rate_lo <= high && low <= rate_hi, "{model}: {rate_lo} {rate_hi}");
        assert!(&rate_hi - &rate_lo < Rational::new(1.into(), 1_000_000_000_000_i64.into()), "{model}: too wide");
        compared += 1;
    }
    assert!(compared >= 4);
}
