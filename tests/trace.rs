//! Values of polynomials along random trajectories, against python-flint (reference/derive.py), through statement, search and checker.

use keepout_checker::number::Rational;
use keepout_checker::statement::{Atom, Expression, Formula, Relation, Statement, Term, Variable};
use keepout_synthesis::{Options, Outcome, certify};
use keepout_tests::reference::{bounds, group, list, rational as read};
use keepout_tests::system::{System, rational};
use serde_json::Value;

fn system(case: &Value) -> System {
    let a: Vec<Vec<Rational>> = case["a"].as_array().unwrap().iter().map(list).collect();
    System { c: vec![rational("0"); a.len()], a, start: list(&case["start"]) }
}

fn terms(case: &Value) -> Vec<Term> {
    let powers = |p: &Value| {
        let exponents = p.as_array().unwrap().iter().map(|k| u32::try_from(k.as_u64().unwrap()).unwrap()).enumerate();
        exponents.filter(|(_, k)| *k > 0).map(|(i, k)| (Variable::State(i), k)).collect()
    };
    case["terms"].as_array().unwrap().iter().map(|t| Term { coefficient: read(&t[0]), powers: powers(&t[1]) }).collect()
}

/// p >= level at exactly this time.
fn at(system: &System, p: &[Term], level: &Rational, time: &Rational) -> Statement {
    let mut terms = p.to_vec();
    match terms.iter_mut().find(|t| t.powers.is_empty()) {
        Some(constant) => constant.coefficient -= level,
        None => terms.push(Term { coefficient: -level, powers: vec![] }),
    }
    terms.retain(|t| t.coefficient != rational("0"));
    let inside = Formula::Atom(Atom { polynomial: Expression { terms }, relation: Relation::NonNegative });
    let mut statement = system.statement(inside);
    (statement.zone.from, statement.zone.until) = (time.clone(), Some(time.clone()));
    statement
}

#[test]
fn values_at_rational_times_are_bracketed() {
    let cases = group("traces");
    assert_eq!(cases.len(), 60);
    let options = Options { margin: false, ..Options::default() };
    let slack = rational("1/10000000000000000000000");
    for (number, case) in cases.iter().enumerate() {
        let (system, p) = (system(case), terms(case));
        for value in case["values"].as_array().unwrap() {
            let time = read(&value["t"]);
            let (low, high) = bounds(&value["value"]);
            let under = certify(&at(&system, &p, &(low - &slack), &time), &options).unwrap();
            assert!(matches!(under, Outcome::Enters { .. }), "case {number} at t = {time}: {under:?}");
            let over = certify(&at(&system, &p, &(high + &slack), &time), &options).unwrap();
            assert!(matches!(over, Outcome::Clear { .. }), "case {number} at t = {time}: {over:?}");
        }
    }
}
