//! The structure of published and constructed matrices: Jordan indices, equal real parts, relations, growth.

use keepout_core::ToRational;
use keepout_core::structure::{Boundedness, Evidence, StructureOptions, pair_sum_polynomial, spectral_structure_with};
use keepout_core::{
    IntegerPolynomial, RationalMatrix, SparseMatrix, SpectralStructure, characteristic_polynomial, factorize,
    minimal_polynomial, spectral_structure,
};
use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::Zero;
use proptest::prelude::*;

fn integers(rows: &[Vec<i64>]) -> RationalMatrix {
    RationalMatrix::from_integers(rows).unwrap()
}

fn analyse(rows: &[Vec<i64>]) -> SpectralStructure {
    spectral_structure(&integers(rows)).unwrap()
}

fn rational(p: i64, q: i64) -> BigRational {
    BigRational::new(p.into(), q.into())
}

/// Block diagonal companion matrices of monic polynomials, mixed by the similarity I + strictly upper ones.
fn mixed(polynomials: &[&[i64]]) -> RationalMatrix {
    let n: usize = polynomials.iter().map(|p| p.len() - 1).sum();
    let mut a = vec![vec![0i64; n]; n];
    let mut start = 0;
    for p in polynomials {
        let d = p.len() - 1;
        for i in 0..d {
            if i > 0 {
                a[start + i][start + i - 1] = 1;
            }
            a[start + i][start + d - 1] = -p[i];
        }
        start += d;
    }
    let upper = RationalMatrix::from_function(n, n, |i, j| rational(i64::from(i <= j), 1));
    let inverse = RationalMatrix::from_function(n, n, |i, j| rational(i64::from(i == j) - i64::from(i + 1 == j), 1));
    upper.product(&integers(&a)).unwrap().product(&inverse).unwrap()
}

#[test]
fn ward_example_1_has_a_jordan_block_of_size_two() {
    let s = analyse(&[vec![4, 2, 0], vec![1, 4, 1], vec![1, 1, 4]]);
    let facts: Vec<_> =
        s.factors.iter().map(|f| (f.polynomial.to_string(), f.algebraic_multiplicity, f.index)).collect();
    assert_eq!(facts, [("z - 6".into(), 1, Some(1)), ("z - 3".into(), 2, Some(2))]);
    assert_eq!(s.growth.boundedness, Boundedness::GrowingExponentially);
    assert_eq!(s.rates[0].rational, Some(rational(6, 1)));
}

#[test]
fn textbook_jordan_matrix_has_index_two_at_sixteen() {
    let s = analyse(&[vec![21, 17, 6], vec![-5, -1, -6], vec![4, 4, 16]]);
    let facts: Vec<_> =
        s.factors.iter().map(|f| (f.polynomial.to_string(), f.algebraic_multiplicity, f.index)).collect();
    assert_eq!(facts, [("z - 16".into(), 2, Some(2)), ("z - 4".into(), 1, Some(1))]);
}

#[test]
fn real_jordan_block_has_a_defective_complex_pair() {
    let s = analyse(&[vec![-1, 2, 1, 0], vec![-2, -1, 0, 1], vec![0, 0, -1, 2], vec![0, 0, -2, -1]]);
    assert_eq!(s.blocks.len(), 2);
    assert_eq!((s.factors.len(), s.factors[0].algebraic_multiplicity, s.factors[0].index), (1, 2, Some(2)));
    assert_eq!(s.rates[0].rational, Some(rational(-1, 1)));
    assert_eq!(s.growth.boundedness, Boundedness::Decaying);
    assert_eq!(s.growth.power, Some(1));
}

#[test]
fn identity_has_index_one_and_a_double_integrator_index_two() {
    let eye = spectral_structure(&RationalMatrix::identity(4)).unwrap();
    assert_eq!((eye.factors[0].algebraic_multiplicity, eye.factors[0].index), (4, Some(1)));
    let drift = analyse(&[vec![0, 1], vec![0, 0]]);
    assert_eq!(drift.factors[0].index, Some(2));
    assert_eq!(drift.growth.boundedness, Boundedness::GrowingPolynomially);
}

#[test]
fn relative_orbital_motion_drifts() {
    // Hill's equations with n = 1/2, states x, y, z, x', y', z'.
    let n = rational(1, 2);
    let mut rows = vec![vec![rational(0, 1); 6]; 6];
    for i in 0..3 {
        rows[i][i + 3] = rational(1, 1);
    }
    rows[3][0] = rational(3, 1) * &n * &n;
    rows[3][4] = rational(2, 1) * &n;
    rows[4][3] = rational(-2, 1) * &n;
    rows[5][2] = -(&n * &n);
    let s = spectral_structure(&RationalMatrix::new(&rows).unwrap()).unwrap();
    assert_eq!(s.rates.len(), 1);
    assert_eq!(s.rates[0].rational, Some(rational(0, 1)));
    let facts: Vec<_> =
        s.factors.iter().map(|f| (f.polynomial.to_string(), f.algebraic_multiplicity, f.index)).collect();
    assert_eq!(facts, [("z".into(), 2, Some(2)), ("4z^2 + 1".into(), 2, Some(1))]);
    assert_eq!(s.growth.boundedness, Boundedness::GrowingPolynomially);
}

#[test]
fn rational_real_parts_are_proved_in_mixed_factors() {
    // (z+1)^2 + 2 and (z+1)^2 + 3, and z^4 + 1 shifted: real parts -1 and +-sqrt(1/2).
    let s = spectral_structure(&mixed(&[&[3, 2, 1], &[4, 2, 1], &[1, 0, 0, 0, 1]])).unwrap();
    let rates: Vec<_> = s.rates.iter().map(|r| (r.eigenvalues.len(), r.rational.clone(), r.equality)).collect();
    assert_eq!(
        rates,
        [(1, None, Evidence::Proved), (1, None, Evidence::Proved), (2, Some(rational(-1, 1)), Evidence::Proved)]
    );
}

#[test]
fn undamped_chain_of_any_size_is_proved_marginal() {
    // Masses and springs in a row: x'' = -K x with K tridiagonal; all 12 eigenvalues are imaginary.
    let n = 6;
    let mut rows = vec![vec![0i64; 2 * n]; 2 * n];
    for i in 0..n {
        rows[i][n + i] = 1;
        rows[n + i][i] = -2 - i as i64;
        if i > 0 {
            rows[n + i][i - 1] = 1;
            rows[n + i - 1][i] = 1;
        }
    }
    let s = analyse(&rows);
    assert_eq!(s.rates.len(), 1);
    assert_eq!((s.rates[0].eigenvalues.len(), s.rates[0].rational.clone()), (6, Some(rational(0, 1))));
    assert_eq!(s.growth.boundedness, Boundedness::Bounded);
    assert!(s.relations.is_empty());
}

#[test]
fn irrational_equal_real_parts_are_proved_by_pair_sums() {
    // Roots sqrt 2 +- i and sqrt 2 (with conjugates): f = ((z - r)^2 + 1)((z + r)^2 + 1), r^2 = 2; and z^2 - 2.
    let s = spectral_structure(&mixed(&[&[9, 0, -2, 0, 1], &[-2, 0, 1]])).unwrap();
    let rates: Vec<_> = s.rates.iter().map(|r| (r.eigenvalues.len(), r.rational.clone(), r.equality)).collect();
    assert_eq!(rates, [(2, None, Evidence::Proved), (2, None, Evidence::Proved)]);
}

#[test]
fn nearly_equal_real_parts_are_told_apart() {
    // Real parts -1 and -1 - 10^-30.
    let size = BigInt::from(10).pow(30);
    let near = BigRational::new(-&size - 1, size);
    let one = rational(1, 1);
    let rows = [
        [rational(-1, 1), one.clone(), BigRational::zero(), BigRational::zero()],
        [-one.clone(), rational(-1, 1), BigRational::zero(), BigRational::zero()],
        [BigRational::zero(), BigRational::zero(), near.clone(), rational(2, 1)],
        [BigRational::zero(), BigRational::zero(), rational(-2, 1), near.clone()],
    ];
    let s = spectral_structure(&RationalMatrix::new(&rows.map(|r| r.to_vec())).unwrap()).unwrap();
    assert_eq!(s.rates.len(), 2);
    assert_eq!(s.rates[1].rational, Some(near));
}

#[test]
fn frequency_relations_are_found_and_proved() {
    // omega = sqrt 2, sqrt 8, 3: one relation, by square classes.
    let s = spectral_structure(&mixed(&[&[2, 0, 1], &[8, 0, 1], &[9, 0, 1]])).unwrap();
    assert_eq!(s.relations.len(), 1);
    assert_eq!(s.relations[0].evidence, Evidence::Proved);
    let mut coefficients: Vec<String> = s.relations[0].terms.iter().map(|(_, c)| c.to_string()).collect();
    coefficients.sort();
    assert_eq!(coefficients, ["-1", "2"]);
    // z^4 + 4 z^2 + 2 and the same with doubled roots: two relations between roots of quartics.
    let s = spectral_structure(&mixed(&[&[2, 0, 4, 0, 1], &[32, 0, 16, 0, 1]])).unwrap();
    assert_eq!(s.relations.iter().map(|r| (r.terms.len(), r.evidence)).collect::<Vec<_>>(), [(2, Evidence::Proved); 2]);
}

#[test]
fn equal_frequencies_with_irrational_real_parts_are_proved() {
    // z^4 + 9 z^2 + 30 has the roots +-a +- ib, a irrational; scaled by 3 a second time.
    let s = spectral_structure(&mixed(&[&[30, 0, 9, 0, 1]])).unwrap();
    assert_eq!(s.relations.iter().map(|r| (r.terms.len(), r.evidence)).collect::<Vec<_>>(), [(2, Evidence::Proved)]);
    let s = spectral_structure(&mixed(&[&[30, 0, 9, 0, 1], &[2430, 0, 81, 0, 1]])).unwrap();
    assert_eq!(s.relations.len(), 3);
    assert!(s.relations.iter().all(|r| r.evidence == Evidence::Proved));
}

#[test]
fn heat_model_of_order_200_is_one_block_and_the_fom_of_order_1006_splits() {
    let one = rational(1, 1);
    let mut entries = Vec::new();
    for (block, freq) in [100i64, 200, 400].into_iter().enumerate() {
        let i = 2 * block;
        entries.extend([(i, i, -one.clone()), (i + 1, i + 1, -one.clone())]);
        entries.extend([(i, i + 1, rational(freq, 1)), (i + 1, i, rational(-freq, 1))]);
    }
    entries.extend((0..1000).map(|k| (6 + k, 6 + k, rational(-1 - k as i64, 1))));
    let fom = SparseMatrix::new(1006, entries).unwrap();
    let s = spectral_structure_with(&fom, &StructureOptions::default()).unwrap();
    assert_eq!((s.blocks.len(), s.rates.len()), (1003, 1000));
    assert_eq!(s.rates[0].eigenvalues.len(), 4);
    assert_eq!(s.rates[0].rational, Some(rational(-1, 1)));
    assert_eq!(s.relations.len(), 2);
    assert!(s.relations.iter().all(|r| r.evidence == Evidence::Proved));
    let heat = (0..200usize).flat_map(|i| [(i, i, -2i64), (i, i.saturating_sub(1), 1), (i, (i + 1).min(199), 1)]);
    let heat = heat.filter(|(i, j, v)| i != j || *v == -2).map(|(i, j, v)| (i, j, rational(v, 1)));
    assert_eq!(SparseMatrix::new(200, heat).unwrap().blocks().len(), 1);
}

#[test]
fn irrational_real_parts_of_the_pde_model_are_proved_equal() {
    // 84 states, 12 blocks of tridiag(-9, -734, 171) coupled by 196: eigenvalues -734 + 2i sqrt(1539) cos(j pi/8) +
    // 392 cos(k pi/13), j = 1..7, k = 1..12: twelve real parts, each shared by one real eigenvalue and three pairs.
    let entry = |i: usize, j: usize| match (i, j) {
        _ if i == j => -734,
        _ if i == j + 1 && !i.is_multiple_of(7) => -9,
        _ if j == i + 1 && !j.is_multiple_of(7) => 171,
        _ if i.abs_diff(j) == 7 => 196,
        _ => 0,
    };
    let s = spectral_structure(&RationalMatrix::from_function(84, 84, |i, j| rational(entry(i, j), 1))).unwrap();
    let facts: Vec<_> = s.rates.iter().map(|r| (r.eigenvalues.len(), r.rational.clone(), r.equality)).collect();
    assert_eq!(facts, vec![(4, None, Evidence::Proved); 12]);
    assert_eq!(s.growth.boundedness, Boundedness::Decaying);
    // Spectral abscissa -734 + 392 cos(pi/13) = -353.3908...
    let lead = (s.rates[0].rate.lo().to_rational().unwrap(), s.rates[0].rate.hi().to_rational().unwrap());
    assert!(lead.0 > rational(-3_533_909, 10_000) && lead.1 < rational(-3_533_907, 10_000));
}

/// Largest k such that (A - a)^k loses rank further: the Jordan index by naive elimination.
fn naive_index(a: &RationalMatrix, eigenvalue: i64) -> usize {
    let n = a.rows();
    let shifted = RationalMatrix::from_function(n, n, |i, j| {
        if i == j { &a[(i, j)] - rational(eigenvalue, 1) } else { a[(i, j)].clone() }
    });
    let rank = |m: &RationalMatrix| {
        let mut rows: Vec<Vec<BigRational>> = (0..n).map(|i| m.row(i).to_vec()).collect();
        let mut rank = 0;
        for c in 0..n {
            let Some(p) = (rank..n).find(|i| !rows[*i][c].is_zero()) else { continue };
            rows.swap(p, rank);
            for i in rank + 1..n {
                let f = &rows[i][c] / &rows[rank][c];
                let (head, tail) = rows.split_at_mut(i);
                for (slot, e) in tail[0].iter_mut().zip(&head[rank]) {
                    *slot -= &f * e;
                }
            }
            rank += 1;
        }
        rank
    };
    let mut power = shifted.clone();
    let mut ranks = vec![n, rank(&power)];
    while ranks[ranks.len() - 1] != ranks[ranks.len() - 2] {
        power = power.product(&shifted).unwrap();
        ranks.push(rank(&power));
    }
    ranks.len() - 2
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn jordan_indices_agree_with_ranks(sizes in prop::collection::vec((0i64..3, 1usize..4), 1..4), seed in 1i64..5) {
        let n: usize = sizes.iter().map(|(_, s)| s).sum();
        let mut a = vec![vec![0i64; n]; n];
        let mut start = 0;
        for (value, size) in &sizes {
            for i in 0..*size {
                a[start + i][start + i] = *value;
                if i > 0 {
                    a[start + i - 1][start + i] = 1;
                }
            }
            start += size;
        }
        // Similarity by a unit lower triangular matrix and its inverse.
        let lower = RationalMatrix::from_function(n, n, |i, j| rational(if i == j { 1 } else if i == j + 1 { seed } else { 0 }, 1));
        let inverse = RationalMatrix::from_function(n, n, |i, j| rational(if i >= j { (-seed).pow((i - j) as u32) } else { 0 }, 1));
        let a = lower.product(&integers(&a)).unwrap().product(&inverse).unwrap();
        let s = spectral_structure(&a).unwrap();
        for f in &s.factors {
            let value: i64 = (-f.polynomial.coefficient(0)).try_into().unwrap();
            prop_assert_eq!(f.index, Some(naive_index(&a, value)));
        }
        let m = minimal_polynomial(&a).unwrap();
        prop_assert!(characteristic_polynomial(&a).unwrap().divide_exact(&m).is_some());
    }

    #[test]
    fn pair_sums_of_rational_roots_are_right(roots in prop::collection::vec((-9i64..9, 1i64..4), 1..5)) {
        let f = roots.iter().fold(IntegerPolynomial::one(), |p, (a, b)| &p * &IntegerPolynomial::from_small(&[-a, *b])).primitive_part();
        let mut expected = IntegerPolynomial::one();
        for (i, (a, b)) in roots.iter().enumerate() {
            for (c, d) in &roots[i..] {
                expected = &expected * &IntegerPolynomial::from_small(&[-(a * d + c * b), b * d]);
            }
        }
        prop_assert_eq!(pair_sum_polynomial(&f), expected.primitive_part());
    }

    #[test]
    fn multiplicities_sum_to_the_order(rows in prop::collection::vec(prop::collection::vec(-2i64..3, 5), 5)) {
        let a = integers(&rows);
        let s = spectral_structure(&a).unwrap();
        let total: usize = s.factors.iter().map(|f| f.polynomial.degree() * f.algebraic_multiplicity).sum();
        prop_assert_eq!(total, 5);
        prop_assert!(s.rates.iter().all(|r| r.equality == Evidence::Proved && r.sign().is_some()));
        let product = s.factors.iter().fold(IntegerPolynomial::one(), |p, f| &p * &f.polynomial.power(f.algebraic_multiplicity));
        prop_assert_eq!(&product, &characteristic_polynomial(&a).unwrap());
        prop_assert_eq!(factorize(&product).factors.len(), s.factors.len());
    }
}
