//! What holds of every text, expression and number, tried on many.

use keepout::expression::{
    Comparator, Function, Node, NodeKind, Polynomial, Scope, Sign, Step, Value, evaluate, formula, parse, polynomial,
    signal,
};
use keepout::model::{Need, load_text};
use keepout::number::decimal;
use keepout_checker::Limits;
use keepout_checker::statement::{Expression, Formula, Rational, Relation, SignalTerm, Statement, Variable, Wave};
use num_bigint::BigInt;
use num_traits::{Signed, ToPrimitive, Zero};
use proptest::prelude::*;
use std::path::Path;

/// The states x, y, z, the constant c = 3/7, and t.
struct Names;

impl Scope for Names {
    fn look_up(&self, name: &str) -> Option<Value> {
        Some(match name {
            "x" => Value::Variable(Variable::State(0)),
            "y" => Value::Variable(Variable::State(1)),
            "z" => Value::Variable(Variable::State(2)),
            "t" => Value::Variable(Variable::Time),
            "c" => Value::Constant(constant_c()),
            _ => return None,
        })
    }

    fn names(&self) -> Vec<String> {
        ["x", "y", "z", "c", "t"].map(String::from).to_vec()
    }

    fn function_hint(&self, function: Function) -> (String, String) {
        (format!("{} is not tested here", function.name()), "leave it out".into())
    }

    fn splits(&self) -> bool {
        true
    }
}

fn constant_c() -> Rational {
    Rational::new(3.into(), 7.into())
}

/// The scope of signals: only t is a variable.
struct TimeOnly;

impl Scope for TimeOnly {
    fn look_up(&self, name: &str) -> Option<Value> {
        (name == "t").then_some(Value::Variable(Variable::Time))
    }

    fn names(&self) -> Vec<String> {
        vec!["t".into()]
    }

    fn function_hint(&self, function: Function) -> (String, String) {
        (format!("{} is not allowed here", function.name()), "leave it out".into())
    }
}

fn node(kind: NodeKind) -> Node {
    Node { span: 0..0, kind }
}

fn number() -> impl Strategy<Value = Node> {
    (0_i64..40, 1_i64..9).prop_map(|(p, q)| node(NodeKind::Number(Rational::new(p.into(), q.into()))))
}

fn name() -> impl Strategy<Value = Node> {
    prop::sample::select(vec!["x", "y", "z", "c", "t"]).prop_map(|n| node(NodeKind::Name(n.into())))
}

fn sign() -> impl Strategy<Value = Sign> {
    prop::sample::select(vec![Sign::Plus, Sign::Minus])
}

/// Expressions without abs: any shape that the syntax tree allows.
fn arithmetic() -> impl Strategy<Value = Node> {
    let leaf = prop_oneof![number(), name(), name()];
    leaf.prop_recursive(4, 24, 3, |inner| {
        let summands = prop::collection::vec((sign(), inner.clone()), 2..4);
        let factors = (inner.clone(), prop::collection::vec((any::<bool>(), inner.clone(), 1_i64..9), 1..3));
        prop_oneof![
            summands.prop_map(|mut list| {
                list[0].0 = Sign::Plus;
                node(NodeKind::Sum(list))
            }),
            factors.prop_map(|(first, rest)| {
                let mut list = vec![(Step::Times, first)];
                list.extend(rest.into_iter().map(|(times, factor, divisor)| match times {
                    true => (Step::Times, factor),
                    false => (Step::Over, node(NodeKind::Number(Rational::from_integer(divisor.into())))),
                }));
                node(NodeKind::Product(list))
            }),
            inner.clone().prop_map(|a| node(NodeKind::Negative(Box::new(a)))),
            (inner, 0_i64..4).prop_map(|(a, k)| {
                let exponent = node(NodeKind::Number(Rational::from_integer(k.into())));
                node(NodeKind::Power(Box::new(a), Box::new(exponent)))
            }),
        ]
    })
}

fn affine() -> impl Strategy<Value = Node> {
    prop::collection::vec((sign(), prop_oneof![number(), name()]), 2..4).prop_map(|mut list| {
        list[0].0 = Sign::Plus;
        node(NodeKind::Sum(list))
    })
}

/// A side of a comparison: an expression, with a few absolute values in it, also inside each other.
fn side() -> impl Strategy<Value = Node> {
    let absolute = |a: Node| node(NodeKind::Call(Function::Abs, Box::new(a)));
    let nested = affine().prop_map(move |a| {
        let inside =
            node(NodeKind::Sum(vec![(Sign::Plus, absolute(a)), (Sign::Minus, node(NodeKind::Name("y".into())))]));
        absolute(inside)
    });
    prop_oneof![
        arithmetic(),
        affine().prop_map(absolute),
        nested,
        (affine(), arithmetic())
            .prop_map(move |(a, b)| { node(NodeKind::Sum(vec![(Sign::Plus, b), (Sign::Minus, absolute(a))])) }),
    ]
}

fn condition() -> impl Strategy<Value = Node> {
    let comparator = prop::sample::select(vec![
        vec![Comparator::Less],
        vec![Comparator::AtMost],
        vec![Comparator::Equal],
        vec![Comparator::AtLeast],
        vec![Comparator::Greater],
        vec![Comparator::Less, Comparator::AtMost],
        vec![Comparator::Greater, Comparator::AtLeast],
    ]);
    let leaf = (prop::collection::vec(side(), 3), comparator).prop_map(|(mut sides, comparators)| {
        sides.truncate(comparators.len() + 1);
        node(NodeKind::Comparison(sides, comparators))
    });
    leaf.prop_recursive(3, 8, 3, |inner| {
        prop_oneof![
            inner.clone().prop_map(|a| node(NodeKind::Not(Box::new(a)))),
            prop::collection::vec(inner.clone(), 2..4).prop_map(|list| node(NodeKind::And(list))),
            prop::collection::vec(inner, 2..4).prop_map(|list| node(NodeKind::Or(list))),
        ]
    })
}

/// The value of a variable at a point.
fn at(variable: Variable, point: &[Rational; 4]) -> Rational {
    match variable {
        Variable::State(i) => point[i].clone(),
        Variable::Time => point[3].clone(),
        Variable::Drive(_) | Variable::Output(_) | Variable::Exponential(_) | Variable::Disturbance(_) => {
            panic!("no such variable here")
        }
    }
}

/// An evaluator that knows nothing of polynomials: it follows the tree.
fn value(node: &Node, point: &[Rational; 4]) -> Rational {
    match &node.kind {
        NodeKind::Number(v) => v.clone(),
        NodeKind::Name(n) => match Names.look_up(n) {
            Some(Value::Constant(c)) => c,
            Some(Value::Variable(v)) => at(v, point),
            _ => panic!("no such name"),
        },
        NodeKind::Negative(a) => -value(a, point),
        NodeKind::Sum(list) => list.iter().fold(Rational::zero(), |sum, (sign, n)| match sign {
            Sign::Plus => sum + value(n, point),
            Sign::Minus => sum - value(n, point),
        }),
        NodeKind::Product(list) => {
            list.iter().fold(Rational::from_integer(1.into()), |product, (step, n)| match step {
                Step::Times => product * value(n, point),
                Step::Over => product / value(n, point),
            })
        }
        NodeKind::Power(a, b) => {
            let exponent = value(b, point).to_integer().to_usize().expect("a small exponent");
            (0..exponent).fold(Rational::from_integer(1.into()), |product, _| product * value(a, point))
        }
        NodeKind::Call(Function::Abs, a) => value(a, point).abs(),
        _ => panic!("not arithmetic"),
    }
}

fn truth(node: &Node, point: &[Rational; 4]) -> bool {
    match &node.kind {
        NodeKind::Not(a) => !truth(a, point),
        NodeKind::And(list) => list.iter().all(|n| truth(n, point)),
        NodeKind::Or(list) => list.iter().any(|n| truth(n, point)),
        NodeKind::Comparison(sides, comparators) => comparators.iter().enumerate().all(|(i, comparator)| {
            let (a, b) = (value(&sides[i], point), value(&sides[i + 1], point));
            match comparator {
                Comparator::Less => a < b,
                Comparator::AtMost => a <= b,
                Comparator::Equal => a == b,
                Comparator::AtLeast => a >= b,
                Comparator::Greater => a > b,
            }
        }),
        _ => panic!("not a condition"),
    }
}

fn expression_value(expression: &Expression, point: &[Rational; 4]) -> Rational {
    let power = |v: &Variable, k: &u32| (0..*k).fold(Rational::from_integer(1.into()), |p, _| p * at(*v, point));
    let term = |t: &keepout_checker::statement::Term| {
        t.powers.iter().fold(t.coefficient.clone(), |product, (v, k)| product * power(v, k))
    };
    expression.terms.iter().map(term).fold(Rational::zero(), |sum, t| sum + t)
}

fn formula_truth(formula: &Formula, point: &[Rational; 4]) -> bool {
    match formula {
        Formula::And(list) => list.iter().all(|f| formula_truth(f, point)),
        Formula::Or(list) => list.iter().any(|f| formula_truth(f, point)),
        Formula::Atom(atom) => {
            let p = expression_value(&atom.polynomial, point);
            match atom.relation {
                Relation::Negative => p.is_negative(),
                Relation::NonPositive => !p.is_positive(),
                Relation::Zero => p.is_zero(),
                Relation::NonNegative => !p.is_negative(),
                Relation::Positive => p.is_positive(),
                Relation::NonZero => !p.is_zero(),
            }
        }
    }
}

fn point() -> impl Strategy<Value = [Rational; 4]> {
    prop::array::uniform4((-6_i64..7, 1_i64..4).prop_map(|(p, q)| Rational::new(p.into(), q.into())))
}

/// Texts of tokens that an expression may have, in any order.
fn token_soup() -> impl Strategy<Value = String> {
    let tokens = vec![
        "x", "y", "t", "c", "1", "0.5", "2e3", "1e99999", "+", "-", "*", "/", "^", "(", ")", "<", "<=", "=", ">=", ">",
        "==", "!=", "and", "or", "not", "abs", "exp", "sin", "cos", "sqrt", "pi", "true", ",", "|", "²", "≤", "_", ".",
        "1__0", " ",
    ];
    prop::collection::vec(prop::sample::select(tokens), 0..30).prop_map(|list| list.concat())
}

/// The contract's model with one stretch of it replaced.
fn mutated_model() -> impl Strategy<Value = String> {
    let text = std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/good/loop.toml"));
    let text = text.expect("the model");
    let pieces = vec![
        "",
        "\"",
        "[",
        "]",
        "[[",
        "=",
        "\n",
        "inf",
        "-1",
        "1e99999",
        "\"x\"",
        "[1, 2, 3]",
        "t",
        "angle",
        "'''",
        "\\u0000",
        "é",
        "{",
        "}",
        "#",
        "[matrix]\n",
        "zone",
        "and",
        "abs(",
        "^",
        "true",
    ];
    (0..text.len(), 0_usize..20, prop::sample::select(pieces)).prop_map(move |(at, cut, piece)| {
        let start = (0..=at).rev().find(|i| text.is_char_boundary(*i)).unwrap_or(0);
        let end = (start + cut).min(text.len());
        let end = (start..=end).rev().find(|i| text.is_char_boundary(*i)).unwrap_or(start);
        format!("{}{piece}{}", &text[..start], &text[end..])
    })
}

fn read_all(text: &str) {
    if let Ok(node) = parse(text) {
        let _ = (evaluate(&node, &Names), formula(&node, &Names), signal(&node, &TimeOnly));
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(1_000))]

    #[test]
    fn the_parser_does_not_panic_on_any_text(text in ".{0,200}") {
        read_all(&text);
    }

    #[test]
    fn the_parser_does_not_panic_on_any_tokens(text in token_soup()) {
        read_all(&text);
    }

    #[test]
    fn a_fault_points_into_the_text(text in token_soup()) {
        if let Err(fault) = parse(&text) {
            prop_assert!(fault.span.start <= fault.span.end && fault.span.end <= text.len().max(1));
            prop_assert!(text.is_char_boundary(fault.span.start));
            prop_assert!(fault.help.is_some(), "{}", fault.message);
        }
    }

    #[test]
    fn the_loader_neither_panics_on_a_mutated_model_nor_refuses_without_a_message(text in mutated_model()) {
        match load_text(&text, "m", "m", Path::new("."), Need::Zones) {
            Ok(model) => {
                let statement = model.statement(0);
                let back = Statement::from_json(&statement.to_json().print(), &Limits::default());
                prop_assert_eq!(back.ok(), Some(statement));
            }
            Err(diagnostics) => prop_assert!(diagnostics.to_string().starts_with("m:"), "{}", diagnostics),
        }
    }

    #[test]
    fn a_printed_expression_is_read_back_as_the_same_polynomial(tree in arithmetic()) {
        let first = polynomial(&tree, &Names);
        let again = parse(&tree.to_string()).unwrap_or_else(|d| panic!("{tree}: {}", d.message));
        let second = polynomial(&again, &Names);
        match (first, second) {
            (Ok(a), Ok(b)) => prop_assert_eq!(a, b, "{}", tree),
            (a, b) => prop_assert_eq!(a.is_err(), b.is_err(), "{}", tree),
        }
    }

    #[test]
    fn a_polynomial_has_the_value_of_its_expression(tree in arithmetic(), point in point()) {
        if let Ok(p) = polynomial(&tree, &Names) {
            prop_assert_eq!(expression_value(&p.expression(), &point), value(&tree, &point), "{}", tree);
        }
    }

    #[test]
    fn a_formula_is_true_exactly_where_its_condition_is(tree in condition(), points in prop::collection::vec(point(), 8)) {
        if let Ok(f) = formula(&tree, &Names) {
            for point in points {
                prop_assert_eq!(formula_truth(&f, &point), truth(&tree, &point), "{} at {:?}", tree, point);
            }
        }
    }

    #[test]
    fn a_printed_condition_is_read_back_as_the_same_formula(tree in condition()) {
        let again = parse(&tree.to_string()).unwrap_or_else(|d| panic!("{tree}: {}", d.message));
        prop_assert_eq!(formula(&tree, &Names).ok(), formula(&again, &Names).ok(), "{}", tree);
    }

    #[test]
    fn a_decimal_is_the_rational_of_its_digits(whole in "[0-9]{1,40}", fraction in "[0-9]{0,40}", exponent in -60_i32..60, negative: bool) {
        let sign = if negative { "-" } else { "" };
        let point = if fraction.is_empty() { "" } else { "." };
        let text = format!("{sign}{whole}{point}{fraction}e{exponent}");
        // digit by digit: each place has its own power of ten
        let ten = Rational::from_integer(10.into());
        let mut wanted = Rational::zero();
        for (i, digit) in format!("{whole}{fraction}").bytes().enumerate() {
            let place = whole.len() as i32 - 1 - i as i32 + exponent;
            wanted += Rational::from_integer(BigInt::from(digit - b'0')) * ten.pow(place);
        }
        prop_assert_eq!(decimal(&text), Ok(if negative { -wanted } else { wanted }));
    }

    #[test]
    fn the_terms_of_a_signal_add_up_to_its_value(factors in prop::collection::vec(prop::collection::vec((0_usize..5, -3_i32..4), 1..4), 1..4), t in 0.0_f64..2.0) {
        let texts = |(kind, n): &(usize, i32)| match kind {
            0 => format!("sin({n}*t)"),
            1 => format!("cos({n}*t/2)"),
            2 => format!("exp({n}*t/3)"),
            3 => format!("t^{}", n.abs()),
            _ => format!("({n} + t)"),
        };
        let values = |(kind, n): &(usize, i32)| match (kind, f64::from(*n)) {
            (0, n) => (n * t).sin(),
            (1, n) => (n * t / 2.0).cos(),
            (2, n) => (n * t / 3.0).exp(),
            (3, n) => t.powf(n.abs()),
            (_, n) => n + t,
        };
        let products: Vec<String> = factors.iter().map(|f| f.iter().map(texts).collect::<Vec<_>>().join("*")).collect();
        let text = products.join(" - ");
        let node = parse(&text).unwrap_or_else(|d| panic!("{text}: {}", d.message));
        let terms = signal(&node, &TimeOnly).unwrap_or_else(|d| panic!("{text}: {}", d.message));
        for term in &terms {
            prop_assert!(!term.coefficient.is_zero());
            if let Wave::Sine(w) | Wave::Cosine(w) = &term.wave {
                prop_assert!(w.is_positive());
            }
        }
        let product = |f: &Vec<(usize, i32)>| f.iter().map(values).product::<f64>();
        let wanted = 2.0 * product(&factors[0]) - factors.iter().map(product).sum::<f64>();
        let found: f64 = terms.iter().map(|term| term_value(term, t)).sum();
        let size: f64 = 1.0 + terms.iter().map(|term| term_value(term, t).abs()).sum::<f64>();
        prop_assert!((found - wanted).abs() <= 1e-9 * size, "{text}: {found} is not {wanted}");
    }
}

fn term_value(term: &SignalTerm, t: f64) -> f64 {
    let float = |r: &Rational| r.to_f64().expect("a float");
    let wave = match &term.wave {
        Wave::One => 1.0,
        Wave::Sine(w) => (float(w) * t).sin(),
        Wave::Cosine(w) => (float(w) * t).cos(),
    };
    float(&term.coefficient) * t.powi(term.power as i32) * (float(&term.rate) * t).exp() * wave
}

#[test]
fn the_polynomials_of_different_expressions_differ() {
    let of = |text: &str| -> Polynomial { polynomial(&parse(text).expect("syntax"), &Names).expect("a polynomial") };
    assert_ne!(of("x^2"), of("2*x"));
    assert_ne!(of("-x^2"), of("(-x)^2"));
    assert_ne!(of("x - (y - z)"), of("x - y - z"));
}
