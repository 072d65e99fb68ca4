//! A set of safe starts as text: JSON, SMT-LIB 2 (logic QF_NRA), and formulas for people. All three from one [`ExplicitSet`].

use keepout_checker::number::Rational;
use keepout_checker::statement::{Relation, Statement};
use keepout_synthesis::{ExplicitSet, SetFormula, SetPolynomial};
use num_traits::{One, Signed};
use serde_json::{Value, json};
use std::collections::BTreeMap;
use std::fmt::Write as _;

/// The `format` of the JSON text.
const FORMAT: &str = "keepout-set/1";

fn symbol(relation: Relation) -> &'static str {
    match relation {
        Relation::Negative => "<",
        Relation::NonPositive => "<=",
        Relation::Zero => "=",
        Relation::NonNegative => ">=",
        Relation::Positive => ">",
        Relation::NonZero => "!=",
    }
}

/// The set and the zone as a JSON text: polynomials as in a statement.
pub fn to_json(set: &ExplicitSet, statement: &Statement) -> String {
    let variable = |(i, v): (usize, &keepout_synthesis::SetVariable)| json!({ "name": v.name, "kind": if i < set.states { "state" } else { "auxiliary" }, "meaning": v.meaning });
    let conditions: Vec<Value> = set.conditions.iter().map(|(p, relation)| comparison(set, p, *relation)).collect();
    let value = json!({
        "format": FORMAT,
        "title": statement.title,
        "zone_name": statement.zone.name,
        "meaning": "the states for which there are values of the auxiliary variables such that all conditions hold",
        "variables": set.variables.iter().enumerate().map(variable).collect::<Vec<_>>(),
        "conditions": conditions,
        "zone": formula_json(set, &set.zone),
    });
    format!("{value:#}\n")
}

fn comparison(set: &ExplicitSet, polynomial: &SetPolynomial, relation: Relation) -> Value {
    let factor = |(variable, power): (&usize, &u32)| {
        let name = &set.variables[*variable].name;
        if *power == 1 { json!(name) } else { json!({ "name": name, "power": power.to_string() }) }
    };
    let term = |(powers, c): (&BTreeMap<usize, u32>, &Rational)| json!({ "times": c.to_string(), "of": powers.iter().map(factor).collect::<Vec<_>>() });
    let terms: Vec<Value> = polynomial.0.iter().map(term).collect();
    json!({ "polynomial": terms, "is": format!("{} 0", symbol(relation)) })
}

fn formula_json(set: &ExplicitSet, formula: &SetFormula) -> Value {
    let list = |parts: &[SetFormula]| parts.iter().map(|p| formula_json(set, p)).collect::<Vec<_>>();
    match formula {
        SetFormula::Atom(polynomial, relation) => comparison(set, polynomial, *relation),
        SetFormula::And(parts) => json!({ "all": list(parts) }),
        SetFormula::Or(parts) => json!({ "any": list(parts) }),
    }
}

/// The set and the zone as a script in SMT-LIB 2: that both hold is to be unsatisfiable.
pub fn to_smt(set: &ExplicitSet, statement: &Statement) -> String {
    let mut text = String::new();
    let _ = writeln!(text, "; A set of safe starts, and the zone {}.", one_line(&statement.zone.name));
    let _ = writeln!(
        text,
        "; The set: the states for which there are values of the other constants such that the first assertions hold."
    );
    let _ = writeln!(text, "; The last assertion: the state is in the zone. Together they cannot hold.");
    text.push_str("(set-logic QF_NRA)\n");
    for variable in &set.variables {
        let _ = writeln!(text, "(declare-const {} Real) ; {}", quoted(&variable.name), one_line(&variable.meaning));
    }
    for (polynomial, relation) in &set.conditions {
        let _ = writeln!(text, "(assert {})", comparison_smt(set, polynomial, *relation));
    }
    let _ = writeln!(text, "(assert {})", formula_smt(set, &set.zone));
    text.push_str("(check-sat)\n");
    text
}

/// Free text in a comment must not end the line.
fn one_line(text: &str) -> String {
    format!("{text:?}")
}

/// A symbol in bars may be any name, reserved words included.
fn quoted(name: &str) -> String {
    format!("|{name}|")
}

fn number_smt(x: &Rational) -> String {
    let whole = if x.denom().is_one() {
        format!("{}.0", x.numer().abs())
    } else {
        format!("(/ {}.0 {}.0)", x.numer().abs(), x.denom())
    };
    if x.is_negative() { format!("(- {whole})") } else { whole }
}

fn comparison_smt(set: &ExplicitSet, polynomial: &SetPolynomial, relation: Relation) -> String {
    let term = |(powers, c): (&BTreeMap<usize, u32>, &Rational)| {
        let mut factors = Vec::new();
        if !c.is_one() || powers.is_empty() {
            factors.push(number_smt(c));
        }
        for (variable, power) in powers {
            // Powers are products: the logic has no power.
            factors.extend((0..*power).map(|_| quoted(&set.variables[*variable].name)));
        }
        if factors.len() == 1 { factors.remove(0) } else { format!("(* {})", factors.join(" ")) }
    };
    let terms: Vec<String> = polynomial.0.iter().map(term).collect();
    let sum = match terms.as_slice() {
        [] => "0.0".to_string(),
        [only] => only.clone(),
        _ => format!("(+ {})", terms.join(" ")),
    };
    match relation {
        Relation::NonZero => format!("(not (= {sum} 0.0))"),
        _ => format!("({} {sum} 0.0)", symbol(relation)),
    }
}

fn formula_smt(set: &ExplicitSet, formula: &SetFormula) -> String {
    let join = |word: &str, unit: &str, parts: &[SetFormula]| match parts {
        [] => unit.to_string(),
        [only] => formula_smt(set, only),
        _ => format!("({word} {})", parts.iter().map(|p| formula_smt(set, p)).collect::<Vec<_>>().join(" ")),
    };
    match formula {
        SetFormula::Atom(polynomial, relation) => comparison_smt(set, polynomial, *relation),
        SetFormula::And(parts) => join("and", "true", parts),
        SetFormula::Or(parts) => join("or", "false", parts),
    }
}

/// What is claimed about the set, in words, then the set as formulas.
pub fn to_words(set: &ExplicitSet, statement: &Statement) -> String {
    let mut text = statement.words();
    text.push_str(CONE);
    text.push_str("\nThe same set S by polynomials: the states for which there are numbers\n");
    for variable in set.variables.iter().skip(set.states) {
        let _ = writeln!(text, "  {}  ({})", variable.name, variable.meaning);
    }
    text.push_str("such that\n");
    for (polynomial, relation) in &set.conditions {
        let _ = writeln!(text, "  {} {} 0", polynomial_words(set, polynomial), symbol(*relation));
    }
    text
}

const CONE: &str = "
The trajectory cone from the same instant on is the part of S that has y = exp(scale T), and u_j = exp(Re(r) T) for the root r that
u_j stands for: at each T >= from the trajectory with all phases free.
";

fn polynomial_words(set: &ExplicitSet, polynomial: &SetPolynomial) -> String {
    let mut text = String::new();
    for (powers, c) in &polynomial.0 {
        let sign = match (text.is_empty(), c.is_negative()) {
            (true, true) => "-",
            (true, false) => "",
            (false, true) => " - ",
            (false, false) => " + ",
        };
        text.push_str(sign);
        let mut factors: Vec<String> = Vec::new();
        if !c.abs().is_one() || powers.is_empty() {
            factors.push(c.abs().to_string());
        }
        for (variable, power) in powers {
            let name = &set.variables[*variable].name;
            factors.push(if *power == 1 { name.clone() } else { format!("{name}^{power}") });
        }
        text.push_str(&factors.join("*"));
    }
    if text.is_empty() { "0".into() } else { text }
}
