//! Whole cases: search with and without the margin, the re-check, and single cells at early and late times.

use criterion::{Criterion, criterion_group, criterion_main};
use keepout_checker::number::Rational;
use keepout_checker::statement::{Relation, Statement};
use keepout_checker::{Limits, check};
use keepout_synthesis::{Options, Outcome, certify};
use keepout_tests::system::{System, atom, rational};
use std::hint::black_box;

fn cases() -> Vec<(&'static str, Statement)> {
    let list = |text: &str| text.split_whitespace().map(rational).collect::<Vec<Rational>>();
    // Bessel polynomial of degree 6: suprema are in tests/reference.
    let bessel = System::step_response(&list("10395 10395 4725 1260 210 21"));
    let torus = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "1 0 1 0");
    vec![
        ("bessel 6", bessel.statement(atom(&[("1", &[1]), ("-101/100", &[])], Relation::NonNegative))),
        (
            "torus of dimension 2",
            torus.statement(atom(&[("1", &[1]), ("1", &[0, 0, 1]), ("-201/100", &[])], Relation::NonNegative)),
        ),
    ]
}

fn whole(c: &mut Criterion) {
    for (name, statement) in cases() {
        let without = Options { margin: false, ..Options::default() };
        c.bench_function(&format!("search without margin: {name}"), |b| {
            b.iter(|| certify(black_box(&statement), &without))
        });
        c.bench_function(&format!("search with margin: {name}"), |b| {
            b.iter(|| certify(black_box(&statement), &Options::default()));
        });
        let Ok(Outcome::Clear { proof, .. }) = certify(&statement, &Options::default()) else {
            panic!("{name} is not clear")
        };
        c.bench_function(&format!("re-check: {name}"), |b| {
            b.iter(|| check(black_box(proof.statement()), proof.certificate(), &Limits::default()));
        });
    }
}

/// The verdicts on one quasi-periodic sum with both amplitudes 1 (phases with rational data), and a quadratic zone on a torus of
/// dimension 3 at one hundredth of its supremum.
fn verdicts(c: &mut Criterion) {
    let tones = System::new("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "3/5 4/5 1/3 4/3");
    let sum = |limit, relation| tones.statement(atom(&[("1", &[1]), ("1", &[0, 0, 1]), (limit, &[])], relation));
    let three = System::new(
        "0 1 0 0 0 0; -1 0 0 0 0 0; 0 0 0 1 0 0; 0 0 -2 0 0 0; 0 0 0 0 0 1; 0 0 0 0 -3 0",
        "0 0 0 0 0 0",
        "1 0 1 0 1 0",
    );
    let quadratic: [(&str, &[u32]); 5] =
        [("1", &[2]), ("1", &[0, 0, 2]), ("1", &[0, 0, 0, 0, 2]), ("1", &[1, 0, 1]), ("-101/25", &[])];
    let mut group = c.benchmark_group("verdicts");
    group.sample_size(10);
    for (name, statement) in [
        ("sum >= 2: inseparable", sum("-2", Relation::NonNegative)),
        ("sum > 2: clear", sum("-2", Relation::Positive)),
        ("sum >= 2.0001: clear", sum("-20001/10000", Relation::NonNegative)),
        ("sum >= 1.99: enters", sum("-199/100", Relation::NonNegative)),
        ("sum >= 1.99999: enters late", sum("-199999/100000", Relation::NonNegative)),
        ("torus of dimension 3, degree 2, margin 1 %", three.statement(atom(&quadratic, Relation::NonNegative))),
    ] {
        group.bench_function(name, |b| b.iter(|| certify(black_box(&statement), &Options::default())));
    }
    group.finish();
}

/// A window of one cell at time t: the cost of a cell must not depend on t. The zone is entered at other times, so that no cone helps.
fn cells(c: &mut Criterion) {
    let rotation = System::new("0 1; -1 0", "0 0", "1 0");
    for t in ["1", "1000003"] {
        let mut statement = rotation.statement(atom(&[("1", &[1]), ("-9/10", &[])], Relation::NonNegative));
        statement.zone.from = rational(t);
        statement.zone.until = Some(rational(t) + rational("1/1000"));
        let Ok(Outcome::Clear { proof, .. }) = certify(&statement, &Options { margin: false, ..Options::default() })
        else {
            panic!("not clear")
        };
        c.bench_function(&format!("re-check of a short window at t = {t}"), |b| {
            b.iter(|| check(black_box(proof.statement()), proof.certificate(), &Limits::default()));
        });
    }
}

criterion_group!(benches, whole, verdicts, cells);
criterion_main!(benches);
