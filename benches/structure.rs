//! Exact structure and matrix exponentials, on the matrices that `tests/reference/side_by_side.py` times with python-flint.

use criterion::{Criterion, criterion_group, criterion_main};
use keepout_benches::matrix;
use keepout_checker::number::Rational;
use keepout_core::{characteristic_polynomial, enclose_exponential, enclose_roots};
use std::hint::black_box;

fn structure(c: &mut Criterion) {
    for name in ["dense_8", "dense_30"] {
        let a = matrix(name);
        c.bench_function(&format!("characteristic polynomial, square-free part, roots at 64 bits: {name}"), |b| {
            b.iter(|| {
                let p = characteristic_polynomial(black_box(&a)).expect("a square matrix").square_free_part();
                enclose_roots(&p, 64).expect("roots")
            });
        });
    }
    let a = matrix("rational_20");
    let one = Rational::from_integer(1.into());
    c.bench_function("exp(A) at 53 bits, n = 20", |b| {
        b.iter(|| enclose_exponential(black_box(&a), &one, 53).expect("an enclosure"));
    });
}

criterion_group!(benches, structure);
criterion_main!(benches);
