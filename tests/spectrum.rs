//! Spectral abscissae of open models, against python-flint (reference/spectrum.py).

use keepout_checker::number::{Interval, Rational};
use keepout_core::ToRational;
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

fn integer(n: i64) -> Rational {
    Rational::from_integer(n.into())
}

/// The outside values of one model.
fn spectrum(name: &str) -> serde_json::Value {
    group("spectra").into_iter().find(|case| case["model"] == name).unwrap()
}

/// Whether an enclosure and the bounds of an outside value have a number in common.
fn agrees(found: &Interval, expected: &serde_json::Value) -> bool {
    let (low, high) = bounds(expected);
    found.lo().to_rational().unwrap() <= high && low <= found.hi().to_rational().unwrap()
}

#[test]
fn the_heat_equation_has_its_closed_form_spectrum() {
    let n = 200;
    let unit = Rational::new(((n + 1) * (n + 1)).into(), 100.into());
    let near =
        |i: i64, j: i64| if i == j { Some(&unit * integer(-2)) } else { ((i - j).abs() == 1).then(|| unit.clone()) };
    let place = |k: i64| usize::try_from(k).unwrap();
    let entries = (0..n).flat_map(|i| {
        (0..n).filter_map({
            let near = &near;
            move |j| near(i, j).map(|v| (place(i), place(j), v))
        })
    });
    let structure =
        spectral_structure_with(&SparseMatrix::new(place(n), entries).unwrap(), &StructureOptions::default()).unwrap();
    let case = spectrum("heat 200");
    let rates: Vec<&Interval> = structure.rates.iter().map(|class| &class.rate).collect();
    assert_eq!(rates.len(), 200, "all eigenvalues are distinct and real");
    assert!(structure.eigenvalues.iter().all(|e| e.disc.is_real()));
    for (k, expected) in case["first"].as_array().unwrap().iter().enumerate() {
        assert!(agrees(rates[k], expected), "eigenvalue {k} from the top");
    }
    for (k, expected) in case["last"].as_array().unwrap().iter().rev().enumerate() {
        assert!(agrees(rates[199 - k], expected), "eigenvalue {k} from the bottom");
    }
}

#[test]
fn the_fom_model_of_order_1006_has_its_closed_form_spectrum() {
    let mut entries = Vec::new();
    for (k, w) in [100, 200, 400].into_iter().enumerate() {
        let i = 2 * k;
        entries.extend([
            (i, i, integer(-1)),
            (i, i + 1, integer(w)),
            (i + 1, i, integer(-w)),
            (i + 1, i + 1, integer(-1)),
        ]);
    }
    entries.extend((1..=1000).map(|k| (5 + k, 5 + k, integer(-i64::try_from(k).unwrap()))));
    let structure =
        spectral_structure_with(&SparseMatrix::new(1006, entries).unwrap(), &StructureOptions::default()).unwrap();
    assert_eq!(structure.blocks.len(), 1003);
    // exp(-t) with the frequencies 0, 100, 200 and 400 first, then -2, -3, ..., -1000, each exactly.
    let rational: Vec<Option<Rational>> = structure.rates.iter().map(|class| class.rational.clone()).collect();
    assert_eq!(rational, (1..=1000).map(|k| Some(integer(-k))).collect::<Vec<_>>());
    assert_eq!(structure.rates[0].eigenvalues.len(), 4);
}
