//! What holds of every model with sets of starts, disturbances and uncertain constants, tried on many: compared with evaluators
//! that know nothing of polynomials.

use keepout::expression::{Node, NodeKind, Sign, Step};
use keepout::model::{Model, Need, load_text};
use keepout_checker::Limits;
use keepout_checker::statement::{Rational, Statement, UncertainTerm, Variable};
use num_traits::{One, Signed, ToPrimitive, Zero};
use proptest::prelude::*;
use std::path::Path;

/// Uncertain constants with their ranges; z may be 0, the others not.
const UNCERTAIN: [(&str, i64, i64); 4] = [("k", 1, 2), ("m", 3, 5), ("n", -5, -2), ("z", -1, 1)];

const VARIABLES: [(&str, Variable); 4] =
    [("x", Variable::State(0)), ("y", Variable::State(1)), ("u", Variable::Drive(0)), ("w", Variable::Disturbance(0))];

fn whole(n: i64) -> Rational {
    Rational::from_integer(n.into())
}

/// What the inputs of all models here are.
fn inputs() -> String {
    let uncertain = UNCERTAIN.map(|(name, from, to)| format!("[uncertain.{name}]\nrange = [{from}, {to}]\n"));
    format!(
        "[constants]\nc = \"3/7\"\n[drive.u]\nsignal = \"t\"\n[disturbance.w]\nrange = [-1, 1]\n{}",
        uncertain.concat()
    )
}

const ZONE: &str = "[[zone]]\nname = \"z\"\ninside = \"1 > 2\"\n";

/// A value for each name.
#[derive(Clone, Debug)]
struct Point {
    variables: [Rational; 4],
    uncertain: [Rational; 4],
}

impl Point {
    fn named(&self, name: &str) -> Rational {
        if let Some(i) = VARIABLES.iter().position(|(n, _)| *n == name) {
            return self.variables[i].clone();
        }
        UNCERTAIN
            .iter()
            .position(|(n, ..)| *n == name)
            .map_or_else(|| Rational::new(3.into(), 7.into()), |i| self.uncertain[i].clone())
    }

    fn variable(&self, variable: Variable) -> Rational {
        let i = VARIABLES.iter().position(|(_, v)| *v == variable).expect("a variable of the rate");
        self.variables[i].clone()
    }

    fn term(&self, term: &UncertainTerm) -> Rational {
        let of = term.of.map_or_else(Rational::one, |v| self.variable(v));
        term.powers.iter().fold(&term.factor * of, |product, (i, k)| product * self.uncertain[*i].pow(*k))
    }
}

fn point() -> impl Strategy<Value = Point> {
    let variables = prop::array::uniform4((-6_i64..7, 1_i64..4).prop_map(|(p, q)| Rational::new(p.into(), q.into())));
    let parts = prop::array::uniform4(0_i64..=8);
    (variables, parts).prop_map(|(variables, parts)| {
        let inside = |i: usize| {
            let (_, from, to) = UNCERTAIN[i];
            whole(from) + whole(to - from) * Rational::new(parts[i].into(), 8.into())
        };
        Point { variables, uncertain: [0, 1, 2, 3].map(inside) }
    })
}

fn node(kind: NodeKind) -> Node {
    Node { span: 0..0, kind }
}

fn number() -> impl Strategy<Value = Node> + Clone {
    (1_i64..9, 1_i64..5).prop_map(|(p, q)| node(NodeKind::Number(Rational::new(p.into(), q.into()))))
}

fn name(list: &[&'static str]) -> impl Strategy<Value = Node> + Clone + use<> {
    prop::sample::select(list.to_vec()).prop_map(|n| node(NodeKind::Name(n.into())))
}

fn power(base: Node, exponent: i64) -> Node {
    let exponent = node(NodeKind::Number(whole(exponent)));
    node(NodeKind::Power(Box::new(base), Box::new(exponent)))
}

/// Products of powers that may be divided by.
fn divisor() -> impl Strategy<Value = Node> + Clone {
    let factor = (name(&["k", "m", "n", "c"]), 0_i64..3).prop_map(|(base, k)| power(base, k));
    let plain = prop_oneof![factor, number(), name(&["k", "m", "n"])];
    let step = prop::sample::select(vec![Step::Times, Step::Over]);
    prop::collection::vec((step, plain), 1..4).prop_map(|mut list| {
        list[0].0 = Step::Times;
        node(NodeKind::Product(list))
    })
}

/// Sums, products and quotients of numbers and uncertain constants.
fn coefficient() -> impl Strategy<Value = Node> + Clone {
    let leaf = prop_oneof![number(), name(&["k", "m", "n", "z", "c"])];
    leaf.prop_recursive(2, 6, 2, |inner| {
        prop_oneof![
            (inner.clone(), sign(), inner.clone())
                .prop_map(|(a, sign, b)| node(NodeKind::Sum(vec![(Sign::Plus, a), (sign, b)]))),
            (inner.clone(), inner.clone())
                .prop_map(|(a, b)| node(NodeKind::Product(vec![(Step::Times, a), (Step::Times, b)]))),
            (inner.clone(), divisor()).prop_map(|(a, b)| quotient(a, b)),
            (inner, 0_i64..3).prop_map(|(a, k)| power(a, k)),
        ]
    })
}

fn sign() -> impl Strategy<Value = Sign> + Clone {
    prop::sample::select(vec![Sign::Plus, Sign::Minus])
}

fn quotient(a: Node, b: Node) -> Node {
    node(NodeKind::Product(vec![(Step::Times, a), (Step::Over, b)]))
}

/// Rates that are affine in the variables, as an engineer might type them.
fn rate() -> impl Strategy<Value = Node> {
    let product = (coefficient(), name(&["x", "y", "u", "w"]))
        .prop_map(|(a, b)| node(NodeKind::Product(vec![(Step::Times, a), (Step::Times, b)])));
    let term = prop_oneof![
        product.clone(),
        product,
        coefficient(),
        name(&["x", "y", "u", "w"]).prop_map(|a| node(NodeKind::Negative(Box::new(a)))),
    ];
    let sum = prop::collection::vec((sign(), term), 2..4).prop_map(|mut list| {
        list[0].0 = Sign::Plus;
        node(NodeKind::Sum(list))
    });
    prop_oneof![sum.clone(), (sum, divisor()).prop_map(|(a, b)| quotient(a, b))]
}

/// Follows the tree.
fn value(node: &Node, point: &Point) -> Rational {
    match &node.kind {
        NodeKind::Number(v) => v.clone(),
        NodeKind::Name(n) => point.named(n),
        NodeKind::Negative(a) => -value(a, point),
        NodeKind::Sum(list) => list.iter().fold(Rational::zero(), |sum, (sign, n)| match sign {
            Sign::Plus => sum + value(n, point),
            Sign::Minus => sum - value(n, point),
        }),
        NodeKind::Product(list) => list.iter().fold(Rational::one(), |product, (step, n)| match step {
            Step::Times => product * value(n, point),
            Step::Over => product / value(n, point),
        }),
        NodeKind::Power(a, b) => value(a, point).pow(value(b, point).to_integer().to_i32().expect("a small exponent")),
        _ => panic!("not arithmetic"),
    }
}

fn read(text: &str) -> Result<Model, String> {
    load_text(text, "m", "m", Path::new("."), Need::Zones).map_err(|d| d.to_string())
}

/// The value of a state's rate as the model has it.
fn rate_value(model: &Model, state: usize, point: &Point) -> Rational {
    let rate = &model.phase.rates[state];
    let known = rate.terms.iter().fold(rate.offset.clone(), |sum, (c, v)| sum + c * point.variable(*v));
    let uncertain = model.phase.uncertain.iter().filter(|t| t.state == state);
    uncertain.fold(known, |sum, term| sum + point.term(term))
}

/// Checks what every statement promises of its terms, and that its text says the same.
fn check_form(model: &Model) -> Result<(), TestCaseError> {
    for rate in &model.phase.rates {
        for (i, (factor, variable)) in rate.terms.iter().enumerate() {
            prop_assert!(!factor.is_zero() && rate.terms[..i].iter().all(|(_, v)| v != variable));
        }
    }
    let terms = &model.phase.uncertain;
    for (i, term) in terms.iter().enumerate() {
        prop_assert!(!term.factor.is_zero() && !term.powers.is_empty());
        prop_assert!(term.powers.windows(2).all(|pair| pair[0].0 < pair[1].0));
        for (position, power) in &term.powers {
            let range = &model.uncertain[*position].range;
            prop_assert!(*power != 0 && (*power > 0 || range.from.is_positive() || range.to.is_negative()));
        }
        let same = |t: &UncertainTerm| t.state == term.state && t.powers == term.powers && t.of == term.of;
        prop_assert!(!terms[..i].iter().any(same));
    }
    let statement = model.statement(0);
    let back = Statement::from_json(&statement.to_json().print(), &Limits::default());
    prop_assert_eq!(back.map_err(|e| e.to_string()), Ok(statement));
    Ok(())
}

fn determinant(rows: &[Vec<i64>]) -> i64 {
    match rows {
        [] => 1,
        [first, rest @ ..] => (0..first.len())
            .map(|j| {
                let minor: Vec<Vec<i64>> = rest
                    .iter()
                    .map(|row| row.iter().enumerate().filter(|(k, _)| *k != j).map(|(_, x)| *x).collect())
                    .collect();
                first[j] * if j % 2 == 0 { 1 } else { -1 } * determinant(&minor)
            })
            .sum(),
    }
}

/// Whether all principal minors are >= 0.
fn is_semidefinite(rows: &[Vec<i64>]) -> bool {
    (1_u32..1 << rows.len()).all(|set| {
        let chosen: Vec<usize> = (0..rows.len()).filter(|i| set >> i & 1 == 1).collect();
        let minor: Vec<Vec<i64>> = chosen.iter().map(|i| chosen.iter().map(|j| rows[*i][*j]).collect()).collect();
        determinant(&minor) >= 0
    })
}

/// A symmetric matrix: any, or a sum of few squares of vectors, which is semidefinite and often singular.
fn symmetric() -> impl Strategy<Value = Vec<Vec<i64>>> {
    let any = prop::collection::vec(-2_i64..4, 9).prop_map(|x| {
        (0..3).map(|i: usize| (0..3).map(|j: usize| x[3 * i.min(j) + i.max(j)]).collect()).collect::<Vec<Vec<i64>>>()
    });
    let squares = prop::collection::vec(prop::array::uniform3(-2_i64..3), 1..3).prop_map(|list| {
        (0..3).map(|i| (0..3).map(|j| list.iter().map(|v| v[i] * v[j]).sum()).collect()).collect::<Vec<Vec<i64>>>()
    });
    let nearly = (squares.clone(), 0_usize..3, -1_i64..1).prop_map(|(mut rows, i, d)| {
        rows[i][i] += d;
        rows
    });
    prop_oneof![any, squares, nearly]
}

/// A model with all sections of this kind, with one stretch of it replaced.
fn mutated_model() -> impl Strategy<Value = String> {
    let named = format!(
        "[state.x]\nrate = \"-k*x/m + w\"\n[state.y]\nrate = \"u*z - y\"\n\
         [start]\nellipsoid = {{centre = [0, 1], shape = [[4, 1], [1, 2]]}}\n{}{ZONE}",
        inputs().replace("range = [1, 2]", "range = [1, 2]\nvarying = true")
    );
    let matrix = format!(
        "[matrix]\nA = [[0, 1], [\"-k/m\", -2]]\nB = [[0], [\"1/m\"]]\nE = [[0], [1]]\nc = [\"k\", 0]\n\
         start = [[0, 1], 1]\n{}{ZONE}",
        inputs()
    );
    let pieces = vec![
        "",
        "\"",
        "[",
        "]",
        "=",
        "\n",
        "{",
        "}",
        "-1",
        "0",
        "inf",
        "\"k\"",
        "[1, 2]",
        "[[1, 0], [0, 1]]",
        "k",
        "w",
        "x",
        "/",
        "^",
        "true",
        "points",
        "zonotope",
        "centre",
        "range",
        "varying",
        "generators",
    ];
    let texts = prop::sample::select(vec![named, matrix]);
    (texts, 0_usize..600, 0_usize..20, prop::sample::select(pieces)).prop_map(|(text, at, cut, piece)| {
        let start = at.min(text.len());
        format!("{}{piece}{}", &text[..start], &text[(start + cut).min(text.len())..])
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(1_000))]

    #[test]
    fn a_rate_has_the_value_of_its_expression(tree in rate(), points in prop::collection::vec(point(), 4)) {
        let text = format!(
            "[state.x]\nstart = 0\nrate = \"{tree}\"\n[state.y]\nstart = [0, 1]\nrate = \"-y\"\n{}{ZONE}", inputs()
        );
        let model = read(&text).map_err(TestCaseError::fail)?;
        check_form(&model)?;
        for point in points {
            prop_assert_eq!(rate_value(&model, 0, &point), value(&tree, &point), "{} at {:?}", tree, point);
        }
    }

    #[test]
    fn the_matrix_form_has_the_values_of_its_entries(
        entries in prop::collection::vec(coefficient(), 10), points in prop::collection::vec(point(), 2)
    ) {
        let e: Vec<String> = entries.iter().map(|node| format!("\"{node}\"")).collect();
        let text = format!(
            "[matrix]\nA = [[{}, {}], [{}, {}]]\nB = [[{}], [{}]]\nE = [[{}], [{}]]\nc = [{}, {}]\n\
             names = [\"x\", \"y\"]\nstart = [0, [0, 1]]\n{}{ZONE}",
            e[0], e[1], e[2], e[3], e[4], e[5], e[6], e[7], e[8], e[9], inputs()
        );
        let model = read(&text).map_err(TestCaseError::fail)?;
        check_form(&model)?;
        for point in points {
            let v = |i: usize| value(&entries[i], &point);
            let [x, y, u, w] = &point.variables;
            for (state, [a, b, c, d, f]) in [[0, 1, 4, 6, 8], [2, 3, 5, 7, 9]].into_iter().enumerate() {
                let wanted = v(a) * x + v(b) * y + v(c) * u + v(d) * w + v(f);
                prop_assert_eq!(rate_value(&model, state, &point), wanted, "{} at {:?}", text, point);
            }
        }
    }

    #[test]
    fn an_ellipsoid_is_accepted_exactly_if_no_principal_minor_is_negative(rows in symmetric()) {
        let text = format!(
            "[state.x]\nrate = \"y\"\n[state.y]\nrate = \"z\"\n[state.z]\nrate = \"-x\"\n\
             [start]\nellipsoid = {{centre = [0, 0, 0], shape = {rows:?}}}\n{ZONE}"
        );
        prop_assert_eq!(read(&text).is_ok(), is_semidefinite(&rows), "{:?}", rows);
    }

    #[test]
    fn the_loader_neither_panics_on_a_mutated_model_nor_refuses_without_a_message(text in mutated_model()) {
        match read(&text) {
            Ok(model) => check_form(&model)?,
            Err(message) => prop_assert!(message.starts_with("m:"), "{}", message),
        }
    }
}
