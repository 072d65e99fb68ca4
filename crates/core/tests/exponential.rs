//! Matrix exponentials against published closed forms, printed reference results, an independent ball library, and
//! themselves.

use keepout_checker::number::{Complex, Interval};
use keepout_core::ToRational;
use keepout_core::{CoreError, IntervalMatrix, RationalMatrix, enclose_exponential};
use num_bigint::BigInt;
use num_rational::BigRational;
use proptest::prelude::*;

fn ratio(p: i64, q: i64) -> BigRational {
    BigRational::new(p.into(), q.into())
}

fn integers(rows: &[Vec<i64>]) -> RationalMatrix {
    RationalMatrix::from_integers(rows).unwrap()
}

/// The number written in decimal notation, exactly.
fn decimal(text: &str) -> BigRational {
    if let Some((p, q)) = text.split_once('/') {
        return BigRational::new(p.parse().unwrap(), q.parse().unwrap());
    }
    let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let digits: BigInt = format!("{whole}{fraction}").parse().unwrap();
    let exponent = exponent.parse::<i32>().unwrap() - fraction.len() as i32;
    BigRational::from_integer(digits) * BigRational::from_integer(10.into()).pow(exponent)
}

fn ends(interval: &Interval) -> (BigRational, BigRational) {
    (interval.lo().to_rational().unwrap(), interval.hi().to_rational().unwrap())
}

/// Whether the interval meets [value - slack, value + slack].
fn meets(interval: &Interval, value: &BigRational, slack: &BigRational) -> bool {
    let (lo, hi) = ends(interval);
    lo <= value + slack && value - slack <= hi
}

fn exponential(a: &[Vec<i64>], t: (i64, i64), bits: u32) -> IntervalMatrix {
    enclose_exponential(&integers(a), &ratio(t.0, t.1), bits).unwrap()
}

/// sum of coefficient * t^power * exp(rate t), enclosed by scalar arithmetic.
fn closed_form(terms: &[(i64, i64, u32, i64)], t: (i64, i64), denominator: i64) -> Interval {
    let bits = 300;
    let time = ratio(t.0, t.1);
    terms.iter().fold(Interval::integer(0), |sum, (num, den, power, rate)| {
        let factor = ratio(*num, *den * denominator) * time.pow(*power as i32);
        let exponent = Interval::rational(&(&time * ratio(*rate, 1)), bits);
        let exp = Complex::real(exponent).exp(bits).unwrap().re;
        sum.add(&exp.mul(&Interval::rational(&factor, bits), bits), bits)
    })
}

fn assert_entry(exp: &IntervalMatrix, place: (usize, usize), expected: &Interval, what: &str) {
    assert!(!exp[place].is_disjoint(expected), "{what} {place:?}: {:?} against {:?}", exp[place], expected);
}

#[test]
fn moler_van_loan_stiff_example_has_its_closed_form() {
    // doi:10.1137/S00361445024180: rates -1 and -17.
    for t in [(1, 1), (1, 7), (10, 1)] {
        let exp = exponential(&[vec![-49, 24], vec![-64, 31]], t, 80);
        let form = |a: (i64, i64), b: (i64, i64)| closed_form(&[(a.0, a.1, 0, -1), (b.0, b.1, 0, -17)], t, 1);
        assert_entry(&exp, (0, 0), &form((-2, 1), (3, 1)), "stiff");
        assert_entry(&exp, (0, 1), &form((3, 2), (-3, 2)), "stiff");
        assert_entry(&exp, (1, 0), &form((-4, 1), (4, 1)), "stiff");
        assert_entry(&exp, (1, 1), &form((3, 1), (-2, 1)), "stiff");
    }
}

#[test]
fn laub_example_has_its_closed_form() {
    // SIAM Rev. 52(4): 779-781: rates -1 and -39.
    let t = (1, 3);
    let exp = exponential(&[vec![0, 1], vec![-39, -40]], t, 100);
    let form = |a, b| closed_form(&[(a, 1, 0, -1), (b, 1, 0, -39)], t, 38);
    assert_entry(&exp, (0, 0), &form(39, -1), "companion");
    assert_entry(&exp, (0, 1), &form(1, -1), "companion");
    assert_entry(&exp, (1, 0), &form(-39, 39), "companion");
    assert_entry(&exp, (1, 1), &form(-1, 39), "companion");
}

#[test]
fn ward_examples_have_their_closed_forms() {
    // SINUM 14: 600-610, examples 1 and 3.
    let t = (1, 1);
    let exp = exponential(&[vec![4, 2, 0], vec![1, 4, 1], vec![1, 1, 4]], t, 60);
    assert_entry(&exp, (0, 0), &closed_form(&[(1, 3, 0, 6), (2, 3, 0, 3)], t, 1), "example 1");
    assert_entry(&exp, (0, 1), &closed_form(&[(2, 3, 1, 3), (4, 9, 0, 6), (-4, 9, 0, 3)], t, 1), "example 1");
    let exp = exponential(&[vec![-131, 19, 18], vec![-390, 56, 54], vec![-387, 57, 52]], t, 60);
    assert_entry(&exp, (0, 0), &closed_form(&[(-3, 1, 0, -1), (-3, 1, 0, -2), (7, 1, 0, -20)], t, 1), "example 3");
    assert_entry(&exp, (0, 1), &closed_form(&[(1, 1, 0, -1), (-1, 1, 0, -20)], t, 1), "example 3");
    assert_entry(&exp, (0, 2), &closed_form(&[(1, 1, 0, -2), (-1, 1, 0, -20)], t, 1), "example 3");
}

#[test]
fn textbook_jordan_block_has_its_closed_form() {
    let t = (1, 2);
    let exp = exponential(&[vec![21, 17, 6], vec![-5, -1, -6], vec![4, 4, 16]], t, 70);
    for (j, terms) in [[(4, 1, 1, 16)], [(4, 1, 1, 16)], [(1, 1, 0, 16)]].iter().enumerate() {
        assert_entry(&exp, (2, j), &closed_form(terms, t, 1), "Jordan block");
    }
}

#[test]
fn real_jordan_block_has_its_closed_form() {
    // exp(-t) [R tR; 0 R], R a rotation by 2t; cos and sin from the complex exponential.
    let exp = exponential(&[vec![-1, 2, 1, 0], vec![-2, -1, 0, 1], vec![0, 0, -1, 2], vec![0, 0, -2, -1]], (3, 1), 90);
    let z = Complex { re: Interval::integer(-3), im: Interval::integer(6) }.exp(300).unwrap();
    let three = Interval::integer(3);
    assert_entry(&exp, (0, 0), &z.re, "rotation");
    assert_entry(&exp, (0, 1), &z.im, "rotation");
    assert_entry(&exp, (1, 0), &z.im.neg(), "rotation");
    assert_entry(&exp, (0, 2), &z.re.mul(&three, 300), "rotation");
    assert_entry(&exp, (0, 3), &z.im.mul(&three, 300), "rotation");
    assert_entry(&exp, (2, 0), &Interval::integer(0), "rotation");
}

#[test]
fn nilpotent_matrix_gives_a_polynomial() {
    let rows: Vec<Vec<i64>> = (0..4).map(|i| (0..4).map(|j| if j == i + 1 { 6 } else { 0 }).collect()).collect();
    let exp = exponential(&rows, (5, 1), 64);
    for (j, value) in [1, 30, 450, 4500].into_iter().enumerate() {
        assert_entry(&exp, (0, j), &Interval::integer(value), "nilpotent");
    }
}

/// Reference results printed to four decimals in the SLICOT Reference (BSD-3): MB05MD, MB05ND (exponential and
/// integral), MB05OD.
fn assert_printed(exp: &IntervalMatrix, offset: usize, printed: &[&str]) {
    let slack = ratio(51, 1_000_000);
    for (i, row) in printed.iter().enumerate() {
        for (j, value) in row.split_whitespace().enumerate() {
            assert!(meets(&exp[(i, offset + j)], &decimal(value), &slack), "({i}, {j}): {value}");
        }
    }
}

#[test]
fn slicot_mb05md_prints_the_same_exponential() {
    let text = ["0.5 0.0 2.3 -2.6", "0.0 0.5 -1.4 -0.7", "2.3 -1.4 0.5 0.0", "-2.6 -0.7 0.0 0.5"];
    let rows: Vec<Vec<BigRational>> = text.iter().map(|r| r.split(' ').map(decimal).collect()).collect();
    let exp = enclose_exponential(&RationalMatrix::new(&rows).unwrap(), &ratio(1, 1), 53).unwrap();
    let printed = [
        "26.8551 -3.2824 18.7409 -19.4430",
        "-3.2824 4.3474 -5.1848 0.2700",
        "18.7409 -5.1848 15.6012 -11.7228",
        "-19.4430 0.2700 -11.7228 15.6012",
    ];
    assert_printed(&exp, 0, &printed);
}

#[test]
fn slicot_mb05nd_prints_the_same_exponential_and_integral() {
    let a = [[5, 4, 3, 2, 1], [1, 6, 0, 4, 3], [2, 0, 7, 6, 5], [1, 3, 1, 8, 7], [2, 5, 7, 1, 9]];
    // exp([A I; 0 0] t) = [exp(At) integral; 0 I].
    let rows: Vec<Vec<i64>> = (0..10)
        .map(|i| {
            (0..10)
                .map(|j| {
                    if i >= 5 {
                        0
                    } else if j < 5 {
                        a[i][j]
                    } else {
                        i64::from(j == i + 5)
                    }
                })
                .collect()
        })
        .collect();
    let exp = exponential(&rows, (1, 10), 53);
    let printed = [
        "1.8391 0.9476 0.7920 0.8216 0.7811",
        "0.3359 2.2262 0.4013 1.0078 1.0957",
        "0.6335 0.6776 2.6933 1.6155 1.8502",
        "0.4804 1.1561 0.9110 2.7461 2.0854",
        "0.7105 1.4244 1.8835 1.0966 3.4134",
    ];
    let integral = [
        "0.1347 0.0352 0.0284 0.0272 0.0231",
        "0.0114 0.1477 0.0104 0.0369 0.0368",
        "0.0218 0.0178 0.1624 0.0580 0.0619",
        "0.0152 0.0385 0.0267 0.1660 0.0732",
        "0.0240 0.0503 0.0679 0.0317 0.1863",
    ];
    assert_printed(&exp, 0, &printed);
    assert_printed(&exp, 5, &integral);
}

#[test]
fn slicot_mb05od_prints_the_same_exponential() {
    let exp = exponential(&[vec![2, 1, 1], vec![0, 3, 2], vec![1, 0, 4]], (1, 1), 53);
    assert_printed(&exp, 0, &["22.5984 17.2073 53.8144", "24.4047 27.6033 83.2241", "29.4097 12.2024 81.4177"]);
}

#[test]
fn independent_ball_library_agrees() {
    for line in include_str!("oracle/exponential.txt").lines() {
        let (input, output) = line.split_once(" | ").unwrap();
        let mut words = input.split(' ');
        let n: usize = words.next().unwrap().parse().unwrap();
        let t = decimal(words.next().unwrap());
        let entries: Vec<BigRational> = words.map(decimal).collect();
        let a = RationalMatrix::from_function(n, n, |i, j| entries[i * n + j].clone());
        for bits in [20, 53, 200] {
            let exp = enclose_exponential(&a, &t, bits).unwrap();
            let values: Vec<BigRational> = output.split(' ').map(decimal).collect();
            let largest = values.iter().map(|v| if *v < ratio(0, 1) { -v } else { v.clone() }).max().unwrap();
            let width = largest * ratio(2, 1) / BigRational::from_integer(BigInt::from(1) << bits);
            for (k, value) in values.iter().enumerate() {
                let interval = &exp[(k / n, k % n)];
                let slack = value * decimal("1e-38");
                let slack = if slack < ratio(0, 1) { -slack } else { slack };
                assert!(meets(interval, value, &(slack + decimal("1e-60"))), "entry {k} of {line}");
                let (lo, hi) = ends(interval);
                assert!(hi - lo <= width, "width of entry {k} at {bits} bits");
            }
        }
    }
}

#[test]
fn huge_arguments_are_refused_and_rectangles_too() {
    let a = RationalMatrix::from_integers(&[vec![-1]]).unwrap();
    let far = BigRational::from_integer(BigInt::from(1) << 40);
    assert!(matches!(enclose_exponential(&a, &far, 53), Err(CoreError::LimitExceeded { .. })));
    let wide = RationalMatrix::from_integers(&[vec![1, 2]]).unwrap();
    assert!(matches!(enclose_exponential(&wide, &ratio(1, 1), 53), Err(CoreError::NotSquare { .. })));
}

fn matrix(n: usize) -> impl Strategy<Value = RationalMatrix> {
    let entry = (-60i64..60, 1i64..9).prop_map(|(p, q)| ratio(p, q));
    prop::collection::vec(prop::collection::vec(entry, n), n).prop_map(|rows| RationalMatrix::new(&rows).unwrap())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn exponential_times_its_inverse_meets_the_identity(a in (1usize..5).prop_flat_map(matrix), t in 1i64..6, bits in 10u32..160) {
        let forward = enclose_exponential(&a, &ratio(t, 3), bits).unwrap();
        let backward = enclose_exponential(&a, &ratio(-t, 3), bits).unwrap();
        let product = forward.product(&backward, 400).unwrap();
        for i in 0..a.rows() {
            for j in 0..a.rows() {
                prop_assert!(!product[(i, j)].is_disjoint(&Interval::integer(i64::from(i == j))));
            }
        }
    }

    #[test]
    fn two_times_add_up_and_two_precisions_overlap(a in (1usize..5).prop_flat_map(matrix), s in 0i64..5, t in -5i64..5) {
        let exp = |t: i64, bits| enclose_exponential(&a, &ratio(t, 4), bits).unwrap();
        let (sum, product) = (exp(s + t, 30), exp(s, 90).product(&exp(t, 90), 400).unwrap());
        let fine = exp(s + t, 150);
        for i in 0..a.rows() {
            for j in 0..a.rows() {
                prop_assert!(!sum[(i, j)].is_disjoint(&product[(i, j)]));
                prop_assert!(!sum[(i, j)].is_disjoint(&fine[(i, j)]));
            }
        }
    }

    #[test]
    fn determinant_is_the_exponential_of_the_trace(a in matrix(2), t in 1i64..4) {
        let exp = enclose_exponential(&a, &ratio(t, 5), 120).unwrap();
        let det = exp[(0, 0)].mul(&exp[(1, 1)], 300).sub(&exp[(0, 1)].mul(&exp[(1, 0)], 300), 300);
        let trace = Interval::rational(&(a.trace() * ratio(t, 5)), 300);
        prop_assert!(!det.is_disjoint(&Complex::real(trace).exp(300).unwrap().re));
    }
}
