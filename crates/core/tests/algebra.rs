//! Identities of the exact algebra: products factor back, companion matrices give back their polynomials.

use keepout_core::factor::factorize_within;
use keepout_core::linear_recurrence::{annihilates, minimal_annihilator};
use keepout_core::{
    IntegerMatrix, IntegerPolynomial, Irreducibility, RationalMatrix, characteristic_polynomial, factorize,
    minimal_polynomial_at,
};
use num_bigint::BigInt;
use num_rational::BigRational;
use proptest::prelude::*;

fn small(c: &[i64]) -> IntegerPolynomial {
    IntegerPolynomial::from_small(c)
}

fn polynomial(max_degree: usize, size: i64) -> impl Strategy<Value = IntegerPolynomial> {
    prop::collection::vec(-size..=size, 2..=max_degree + 1).prop_map(|c| small(&c))
}

fn rational() -> impl Strategy<Value = BigRational> {
    (-40i64..40, 1i64..12).prop_map(|(p, q)| BigRational::new(p.into(), q.into()))
}

fn matrix(n: usize) -> impl Strategy<Value = RationalMatrix> {
    prop::collection::vec(prop::collection::vec(rational(), n), n).prop_map(|rows| RationalMatrix::new(&rows).unwrap())
}

fn companion(p: &IntegerPolynomial) -> RationalMatrix {
    let n = p.degree();
    let monic = p.to_monic();
    RationalMatrix::from_function(n, n, |i, j| {
        if j == n - 1 {
            -monic.coefficients()[i].clone()
        } else {
            BigRational::from_integer(i64::from(i == j + 1).into())
        }
    })
}

/// det(z - A) at an integer point, by rational elimination: a naive oracle.
fn naive_determinant(a: &RationalMatrix, z: &BigRational) -> BigRational {
    let n = a.rows();
    let mut m: Vec<Vec<BigRational>> =
        (0..n).map(|i| (0..n).map(|j| if i == j { z - &a[(i, j)] } else { -a[(i, j)].clone() }).collect()).collect();
    let zero = BigRational::from_integer(0.into());
    let mut det = BigRational::from_integer(1.into());
    for k in 0..n {
        let Some(p) = (k..n).find(|i| m[*i][k] != zero) else { return zero };
        if p != k {
            m.swap(p, k);
            det = -det;
        }
        det *= m[k][k].clone();
        for i in k + 1..n {
            let f = &m[i][k] / &m[k][k];
            let (head, tail) = m.split_at_mut(i);
            for (slot, e) in tail[0][k..].iter_mut().zip(&head[k][k..]) {
                *slot -= &f * e;
            }
        }
    }
    det
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(128))]

    #[test]
    fn products_of_polynomials_factor_back(a in polynomial(5, 30), b in polynomial(5, 30), c in polynomial(3, 9)) {
        let product = &(&a * &b) * &c.power(2);
        let f = factorize(&product);
        prop_assert_eq!(f.product(), product.clone());
        if !product.is_zero() {
            prop_assert!(f.is_complete());
            // Every factor of a is among the factors found, and irreducible factors do not split again.
            for g in factorize(&a).factors {
                prop_assert!(f.factors.iter().any(|h| h.polynomial == g.polynomial), "{} lost in {}", g.polynomial, product);
            }
        }
    }

    #[test]
    fn gcd_divides_both_and_contains_the_common_factor(a in polynomial(6, 99), b in polynomial(6, 99), c in polynomial(4, 99)) {
        let (x, y) = (&a * &c, &b * &c);
        let g = x.gcd(&y);
        if !x.is_zero() && !y.is_zero() {
            prop_assert!(x.divide_exact(&g).is_some());
            prop_assert!(y.divide_exact(&g).is_some());
            prop_assert!(g.divide_exact(&c.primitive_part()).is_some());
        }
    }

    #[test]
    fn square_free_parts_multiply_to_the_input(a in polynomial(3, 9), b in polynomial(3, 9)) {
        let p = (&a.power(3) * &b).primitive_part();
        let parts = p.square_free_decomposition();
        if !p.is_zero() {
            let back = parts.iter().fold(IntegerPolynomial::one(), |m, (q, e)| &m * &q.power(*e));
            prop_assert_eq!(back, p);
            prop_assert!(parts.iter().all(|(q, _)| q.is_square_free()));
        }
    }

    #[test]
    fn coprime_base_members_are_coprime_and_generate(a in polynomial(3, 9), b in polynomial(3, 9), c in polynomial(3, 9)) {
        let inputs = [&a * &b, &b * &c.power(2), &a * &c];
        let base = IntegerPolynomial::coprime_base(&inputs);
        for (i, p) in base.iter().enumerate() {
            for q in &base[i + 1..] {
                prop_assert!(p.gcd(q).is_constant());
            }
        }
        for input in inputs.iter().filter(|p| !p.is_zero()) {
            let mut rest = input.primitive_part();
            for p in &base {
                while let Some(q) = rest.divide_exact(p) {
                    rest = q;
                }
            }
            prop_assert!(rest.is_constant());
        }
    }

    #[test]
    fn reflection_twice_is_the_identity(p in polynomial(6, 99), c in rational()) {
        let p = p.primitive_part();
        prop_assert_eq!(p.reflected(&c).reflected(&c), p);
    }

    #[test]
    fn reflected_polynomial_has_the_reflected_values(p in polynomial(5, 50), c in rational(), z in rational()) {
        let zero = BigRational::from_integer(0.into());
        prop_assert_eq!(p.reflected(&c).value_rational(&z) == zero, p.value_rational(&(&c - &z)) == zero);
        let (q, w) = (p.reflected(&c), &c - &z);
        // Proportional: cross products at z and at 0.
        prop_assert_eq!(q.value_rational(&z) * p.value_rational(&c), p.value_rational(&w) * q.value_rational(&zero));
    }

    #[test]
    fn companion_matrices_give_back_their_polynomial(p in polynomial(7, 50)) {
        let p = p.primitive_part();
        if p.degree() > 0 {
            prop_assert_eq!(characteristic_polynomial(&companion(&p)).unwrap(), p.clone());
            let n = p.degree();
            let e: Vec<_> = (0..n).map(|i| BigRational::from_integer(i64::from(i == 0).into())).collect();
            prop_assert_eq!(minimal_polynomial_at(&companion(&p), &e).unwrap(), p);
        }
    }

    #[test]
    fn characteristic_polynomial_agrees_with_elimination(a in matrix(5), z in rational()) {
        let chi = characteristic_polynomial(&a).unwrap();
        let lead = BigRational::from_integer(chi.leading());
        prop_assert_eq!(chi.value_rational(&z) / lead, naive_determinant(&a, &z));
        prop_assert_eq!(-chi.to_monic().coefficients()[4].clone(), a.trace());
    }

    #[test]
    fn minimal_polynomial_divides_the_characteristic_one(a in matrix(4), v in prop::collection::vec(rational(), 4)) {
        let m = minimal_polynomial_at(&a, &v).unwrap();
        prop_assert!(characteristic_polynomial(&a).unwrap().divide_exact(&m).is_some());
        let mut sum = vec![BigRational::from_integer(0.into()); 4];
        let mut power = v;
        for c in m.coefficients() {
            for (s, x) in sum.iter_mut().zip(&power) {
                *s += x * c;
            }
            power = a.apply(&power).unwrap();
        }
        prop_assert!(sum.iter().all(|s| *s == BigRational::from_integer(0.into())));
    }

    #[test]
    fn recurrences_are_found_with_minimal_order(c in prop::collection::vec(-9i64..9, 1..8), start in prop::collection::vec(-99i64..99, 8)) {
        let d = c.len();
        let mut y: Vec<BigInt> = start[..d].iter().map(|v| BigInt::from(*v)).collect();
        for k in d..16 {
            let next: BigInt = (0..d).map(|j| &y[k - d + j] * c[j]).sum();
            y.push(next);
        }
        let m = minimal_annihilator(&y).unwrap();
        prop_assert!(m.degree() <= d && m.is_monic() && annihilates(&m, &y));
        let mut given: Vec<i64> = c.iter().map(|v| -v).collect();
        given.push(1);
        prop_assert!(small(&given).divide_exact(&m).is_some());
    }
}

#[test]
fn swinnerton_dyer_polynomials_are_irreducible() {
    // Minimal polynomials of sqrt 2 + sqrt 3 + sqrt 5 and with sqrt 7: they split into quadratics modulo every prime.
    let sd8 = small(&[576, 0, -960, 0, 352, 0, -40, 0, 1]);
    let f = factorize(&sd8);
    assert_eq!(f.factors.len(), 1);
    assert!(f.is_complete());
    let sd16 = small(&[46225, 0, -5596840, 0, 13950764, 0, -7453176, 0, 1513334, 0, -141912, 0, 6476, 0, -136, 0, 1]);
    assert_eq!(factorize(&sd16).factors.len(), 1);
    let capped = factorize_within(&(&sd16 * &sd8), 10);
    assert_eq!(capped.product(), &sd16 * &sd8);
    assert!(capped.factors.iter().any(|g| g.irreducibility == Irreducibility::NotFactoredFurther));
    assert_eq!(factorize(&(&sd16 * &sd8)).factors.len(), 2);
}

#[test]
fn cyclotomic_products_have_the_number_of_divisors_as_factors() {
    for (n, divisors) in [(12, 6), (30, 8), (36, 9), (60, 12)] {
        let mut c = vec![0i64; n + 1];
        (c[0], c[n]) = (-1, 1);
        let f = factorize(&small(&c));
        assert_eq!(f.factors.len(), divisors, "z^{n} - 1");
        assert!(f.is_complete());
    }
}

#[test]
fn zero_sequence_has_annihilator_one() {
    assert_eq!(minimal_annihilator(&vec![BigInt::from(0); 6]), Some(IntegerPolynomial::one()));
}

#[test]
fn characteristic_polynomial_of_a_rectangle_is_refused() {
    let a = RationalMatrix::from_integers(&[vec![1, 2, 3]]).unwrap();
    assert_eq!(
        characteristic_polynomial(&a).unwrap_err().to_string(),
        "the matrix must be square, found 1 rows and 3 columns"
    );
    assert!(IntegerMatrix::new(&[vec![1.into()], vec![]]).is_err());
}

#[test]
fn independent_library_finds_the_same_factor_degrees() {
    for line in include_str!("oracle/factors.txt").lines() {
        let (coefficients, expected) = line.split_once(" | ").unwrap();
        let p = IntegerPolynomial::new(coefficients.split(' ').map(|c| c.parse().unwrap()).collect());
        let f = factorize(&p);
        assert!(f.is_complete() && f.product() == p, "{line}");
        let mut found: Vec<(usize, usize)> =
            f.factors.iter().map(|g| (g.polynomial.degree(), g.multiplicity)).collect();
        found.sort();
        let found: Vec<String> = found.iter().map(|(d, e)| format!("{d}^{e}")).collect();
        assert_eq!(found.join(" "), expected, "{line}");
    }
}
