//! Models with sets of starts, disturbances and uncertain constants, compared with statements written down by hand.

use keepout::model::{Model, Need, load_text};
use keepout_checker::statement::{
    Affine, Disturbance, Range, Rational, Starts, Statement, Uncertain, UncertainTerm, Variable,
};
use std::path::Path;

fn q(p: i64, d: i64) -> Rational {
    Rational::new(p.into(), d.into())
}

fn read(text: &str) -> Model {
    load_text(text, "m", "m", Path::new("."), Need::Nothing).unwrap_or_else(|d| panic!("{d}"))
}

fn range(from: i64, to: i64) -> Range {
    Range { from: q(from, 1), to: q(to, 1) }
}

const X: Variable = Variable::State(0);
const Y: Variable = Variable::State(1);

/// The rate of a state x in a model with a state y, a drive u, a disturbance w, and uncertain constants k in [1, 2], m in
/// [3, 5] and z in [-1, 1], as (known terms, uncertain terms).
fn rate(text: &str) -> (Affine, Vec<UncertainTerm>) {
    let model = read(&format!(
        "[constants]\nc = 4\n[state.x]\nstart = 0\nrate = \"{text}\"\n[state.y]\nstart = 0\nrate = \"-y\"\n\
         [drive.u]\nsignal = \"t\"\n[disturbance.w]\nrange = [-1, 1]\n[uncertain.k]\nrange = [1, 2]\n\
         [uncertain.m]\nrange = [3, 5]\n[uncertain.z]\nrange = [-1, 1]\n"
    ));
    let mut terms = model.phase.uncertain;
    terms.sort_by(|a, b| (&a.powers, a.of).cmp(&(&b.powers, b.of)));
    (model.phase.rates[0].clone(), terms)
}

fn known(terms: &[(Rational, Variable)], offset: Rational) -> Affine {
    Affine { terms: terms.to_vec(), offset }
}

fn term(factor: Rational, powers: &[(usize, i32)], of: Option<Variable>) -> UncertainTerm {
    UncertainTerm { state: 0, factor, powers: powers.to_vec(), of }
}

#[test]
fn rates_are_known_terms_and_products_with_powers_of_uncertain_constants() {
    let nothing = || known(&[], q(0, 1));
    assert_eq!(rate("-k*x"), (nothing(), vec![term(q(-1, 1), &[(0, 1)], Some(X))]));
    assert_eq!(
        rate("(u - k*x - c*y + w + 3)/m"),
        (
            nothing(),
            vec![
                term(q(-1, 1), &[(0, 1), (1, -1)], Some(X)),
                term(q(3, 1), &[(1, -1)], None),
                term(q(-4, 1), &[(1, -1)], Some(Y)),
                term(q(1, 1), &[(1, -1)], Some(Variable::Drive(0))),
                term(q(1, 1), &[(1, -1)], Some(Variable::Disturbance(0))),
            ]
        )
    );
    let mixed = (known(&[(q(2, 1), X)], q(1, 1)), vec![term(q(1, 1), &[(2, 2)], Some(X))]);
    assert_eq!(rate("(2 + z^2)*x + 1"), mixed);
    assert_eq!(rate("x/(2*k^2*m)"), (nothing(), vec![term(q(1, 2), &[(0, -2), (1, -1)], Some(X))]));
    assert_eq!(rate("x/(1/k)"), rate("k*x"));
    assert_eq!(rate("x/(k/m)/m"), rate("x/k"));
    assert_eq!(rate("2*w - x"), (known(&[(q(-1, 1), X), (q(2, 1), Variable::Disturbance(0))], q(0, 1)), vec![]));
}

#[test]
fn an_uncertain_constant_and_its_reciprocal_cancel() {
    assert_eq!(rate("k*x/k"), rate("x"));
    assert_eq!(rate("k*x/k - x + y"), rate("y"));
    assert_eq!(rate("(k*x + k*y)/k"), rate("x + y"));
    assert_eq!(rate("k^3*x/k"), rate("k^2*x"));
    assert_eq!(rate("k*x - k*x + 1"), rate("1"));
    assert_eq!(rate("m*x/(m*k)"), rate("x/k"));
}

#[test]
fn ranges_of_starts_are_a_box_about_the_centres() {
    let text = "[state.x]\nstart = [-0.1, 0.3]\nrate = \"-x\"\n[state.y]\nstart = 2\nrate = \"-y\"\n";
    let model = read(text);
    assert_eq!((&model.states[0].start, &model.states[1].start), (&q(1, 10), &q(2, 1)));
    assert_eq!(model.starts, Starts::Box(vec![q(1, 5), q(0, 1)]));
    let one = read("[state.x]\nstart = [2, 2]\nrate = \"-x\"\n");
    assert_eq!((one.starts, one.states[0].start.clone()), (Starts::One, q(2, 1)));
}

/// The starts of a model with the states x, y and this line in [start], and the states' own.
fn set(line: &str) -> (Starts, Vec<Rational>) {
    let model = read(&format!("[start]\n{line}\n[state.x]\nrate = \"y\"\n[state.y]\nrate = \"-x\"\n"));
    (model.starts, model.states.into_iter().map(|s| s.start).collect())
}

#[test]
fn sets_of_starts_are_read_with_their_centres() {
    let numbers = |list: &[i64]| -> Vec<Rational> { list.iter().map(|n| q(*n, 1)).collect() };
    let rows = |list: &[[i64; 2]]| -> Vec<Vec<Rational>> { list.iter().map(|row| numbers(row)).collect() };
    assert_eq!(set("points = [[1, 2], [3, 4], [5, 6]]"), (Starts::Hull(rows(&[[3, 4], [5, 6]])), numbers(&[1, 2])));
    assert_eq!(set("points = [[1, 2]]"), (Starts::One, numbers(&[1, 2])));
    assert_eq!(
        set("zonotope = {centre = [1, 2], generators = [[1, 0], [0, 1], [1, 1]]}"),
        (Starts::Zonotope(rows(&[[1, 0], [0, 1], [1, 1]])), numbers(&[1, 2]))
    );
    assert_eq!(
        set("ellipsoid = {centre = [1, 2], shape = [[4, 2], [2, 1]]}"),
        (Starts::Ellipsoid(rows(&[[4, 2], [2, 1]])), numbers(&[1, 2]))
    );
    set("ellipsoid = {centre = [1, 2], shape = [[0, 0], [0, 0]]}");
    set("ellipsoid = {centre = [1, 2], shape = [[0, 0], [0, \"1/3\"]]}");
}

#[test]
fn the_matrix_form_says_the_same_as_named_states() {
    let common = "[drive.u]\nsignal = \"t\"\n[disturbance.w]\nrange = [-1, 1]\n[disturbance.v]\nrange = [0, 2]\n\
                  [uncertain.k]\nrange = [1, 2]\n[uncertain.m]\nrange = [3, 5]\nvarying = true\n";
    let states = format!(
        "[state.x1]\nstart = [0, 1]\nrate = \"x2 + k\"\n\
         [state.x2]\nstart = 1\nrate = \"-k*x1/m - 2*x2 + u/m + w + m*v - 3\"\n{common}"
    );
    let matrix = format!(
        "[matrix]\nA = [[0, 1], [\"-k/m\", -2]]\nB = [[0], [\"1/m\"]]\nE = [[0, 0], [1, \"m\"]]\nc = [\"k\", \"-3\"]\n\
         start = [[0, 1], 1]\n{common}"
    );
    let sorted = |text: &str| {
        let mut model = read(text);
        model.phase.uncertain.sort_by(|a, b| (a.state, &a.powers, a.of).cmp(&(b.state, &b.powers, b.of)));
        (model.states, model.starts, model.disturbances, model.uncertain, model.phase)
    };
    assert_eq!(sorted(&matrix), sorted(&states));
    let column = matrix.replace("c = [\"k\", \"-3\"]", "c = [[\"k\"], [-3]]");
    assert_eq!(sorted(&column), sorted(&states));
}

#[test]
fn the_matrix_form_has_as_many_states_as_its_set_of_starts() {
    for set in [
        "points = [[1, 2], [3, 4]]",
        "zonotope = {centre = [1, 2], generators = [[1, 0]]}",
        "ellipsoid = {centre = [1, 2], shape = [[1, 0], [0, 1]]}",
    ] {
        let model = read(&format!("[matrix]\nA = [[0, 1], [-1, 0]]\n[start]\n{set}\n"));
        let starts: Vec<Rational> = model.states.iter().map(|s| s.start.clone()).collect();
        assert_eq!(starts, [q(1, 1), q(2, 1)], "{set}");
    }
}

#[test]
fn all_of_it_stands_in_the_statement_and_its_text_is_read_back() {
    let text = "[state.x]\nstart = [0, 1]\nrate = \"-k*x + w/m\"\n[disturbance.w]\nrange = [-1, 1]\nunit = \"N\"\n\
                [uncertain.k]\nrange = [1, 2]\nunit = \"1/s\"\nvarying = true\n[uncertain.m]\nrange = [-5, -3]\n\
                [[zone]]\nname = \"z\"\ninside = \"x > 2\"\n";
    let statement = read(text).statement(0);
    let disturbance = Disturbance { name: "w".into(), unit: Some("N".into()), range: range(-1, 1) };
    assert_eq!(statement.disturbances, [disturbance]);
    let uncertain = |name: &str, unit: Option<&str>, range, varying| Uncertain {
        name: name.into(),
        unit: unit.map(String::from),
        range,
        varying,
    };
    assert_eq!(
        statement.uncertain,
        [uncertain("k", Some("1/s"), range(1, 2), true), uncertain("m", None, range(-5, -3), false)]
    );
    assert!(!statement.is_single());
    let limits = keepout_checker::Limits::default();
    assert_eq!(Statement::from_json(&statement.to_json().print(), &limits).ok(), Some(statement));
}
