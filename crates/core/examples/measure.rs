//! Prints the running times of the main algorithms on fixed pseudo-random inputs.

use keepout_core::{
    IntegerPolynomial, RationalMatrix, characteristic_polynomial, enclose_exponential, enclose_roots, factorize,
    spectral_structure,
};
use num_bigint::BigInt;
use num_rational::BigRational;
use std::time::Instant;

struct Source(u64);

impl Source {
    fn next(&mut self, size: i64) -> i64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 8) as i64 % (2 * size + 1) - size
    }
}

fn matrix(n: usize, size: i64, source: &mut Source) -> RationalMatrix {
    let rows: Vec<Vec<i64>> = (0..n).map(|_| (0..n).map(|_| source.next(size)).collect()).collect();
    RationalMatrix::from_integers(&rows).unwrap_or_else(|_| RationalMatrix::identity(n))
}

/// The least of several times, in milliseconds.
fn time<T>(what: &str, mut work: impl FnMut() -> T) {
    let mut best = f64::INFINITY;
    for _ in 0..7 {
        let start = Instant::now();
        let result = work();
        best = best.min(start.elapsed().as_secs_f64() * 1e3);
        drop(result);
    }
    println!("{what:<55} {best:9.3} ms");
}

fn main() {
    let mut source = Source(0x1234_5678_9abc_def1);
    for n in [8, 20, 30, 60] {
        let a = matrix(n, 1 << 15, &mut source);
        time(&format!("characteristic polynomial, n = {n}, 16 bits"), || characteristic_polynomial(&a));
        let Ok(chi) = characteristic_polynomial(&a) else { continue };
        time(&format!("square-free test, n = {n}"), || chi.is_square_free());
        for bits in [53, 64, 300] {
            time(&format!("roots, n = {n}, {bits} bits"), || enclose_roots(&chi, bits));
        }
        if n <= 30 {
            time(&format!("factorisation, n = {n}"), || factorize(&chi));
        }
    }
    let wilkinson = (1..=20).fold(IntegerPolynomial::one(), |p, k| &p * &IntegerPolynomial::from_small(&[-k, 1]));
    time("roots of (z-1)...(z-20), 64 bits", || enclose_roots(&wilkinson, 64));
    let shifted = IntegerPolynomial::new(wilkinson.coefficients().iter().map(|c| c + BigInt::from(1)).collect());
    time("roots of (z-1)...(z-20) + sum z^k, 64 bits", || enclose_roots(&shifted, 64));
    let one = BigRational::from_integer(1.into());
    for n in [5, 20, 60, 100] {
        let rows: Vec<Vec<BigRational>> = (0..n)
            .map(|_| (0..n).map(|_| BigRational::new(source.next(99).into(), (50 + source.next(49)).into())).collect())
            .collect();
        let Ok(a) = RationalMatrix::new(&rows) else { continue };
        for bits in [53, 300] {
            time(&format!("exponential, n = {n}, {bits} bits"), || enclose_exponential(&a, &one, bits));
        }
        if n <= 60 {
            time(&format!("structure, rational entries, n = {n}"), || spectral_structure(&a));
        }
    }
}
