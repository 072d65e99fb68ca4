//! Models that are read, and what they say: compared with statements written down by hand.

use keepout::model::{Model, Need, load, load_text};
use keepout_checker::statement::{
    Affine, Atom, Claim, Expression, Formula, Rational, Relation, SignalTerm, Term, Variable, Wave,
};
use std::path::Path;

fn q(p: i64, d: i64) -> Rational {
    Rational::new(p.into(), d.into())
}

fn read(text: &str) -> Model {
    load_text(text, "m", "m", Path::new("."), Need::Nothing).unwrap_or_else(|d| panic!("{d}"))
}

/// A model with the states x, y, a constant c = 3, a drive u, the output w = x + 2*y, and this zone.
fn inside(condition: &str) -> Formula {
    let text = format!(
        "[constants]\nc = 3\n[state.x]\nstart = 1\nrate = \"-x\"\n[state.y]\nstart = 0\nrate = \"x\"\n\
         [drive.u]\nsignal = \"t\"\n[output.w]\nvalue = \"x + 2*y\"\n[[zone]]\nname = \"z\"\ninside = \"{condition}\"\n"
    );
    read(&text).zones.remove(0).inside
}

fn signal(text: &str) -> Vec<SignalTerm> {
    let model = format!("[state.x]\nstart = 1\nrate = \"-x\"\n[drive.u]\nsignal = \"{text}\"\n");
    read(&model).drives.remove(0).signal
}

fn start(text: &str) -> Rational {
    read(&format!("[state.x]\nstart = {text}\nrate = \"-x\"\n")).states.remove(0).start
}

const X: Variable = Variable::State(0);
const Y: Variable = Variable::State(1);

/// The polynomial with these coefficients and powers.
fn polynomial(terms: &[(i64, &[(Variable, u32)])]) -> Expression {
    let term = |(c, powers): &(i64, &[(Variable, u32)])| Term { coefficient: q(*c, 1), powers: powers.to_vec() };
    Expression { terms: terms.iter().map(term).collect() }
}

fn atom(terms: &[(i64, &[(Variable, u32)])], relation: Relation) -> Formula {
    Formula::Atom(Atom { polynomial: polynomial(terms), relation })
}

#[test]
fn a_model_is_the_statement_that_an_engineer_would_write_by_hand() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/good/loop.toml");
    let model = load(&path, Need::Zones).unwrap_or_else(|d| panic!("{d}"));
    let statement = model.statement(0);
    assert_eq!(statement.title, "Blade angle loop");
    let states: Vec<_> =
        statement.states.iter().map(|s| (s.name.as_str(), s.unit.as_deref(), s.start.clone())).collect();
    assert_eq!(states, [("angle", Some("rad"), q(0, 1)), ("speed", Some("rad/s"), q(-1, 10))]);
    // (torque - k*angle - d*speed)/J with J = 1/25, k = 3/2, d = 2/25
    let speed = Affine { terms: vec![(q(-75, 2), X), (q(-2, 1), Y), (q(25, 1), Variable::Drive(0))], offset: q(0, 1) };
    let angle = Affine { terms: vec![(q(1, 1), Y)], offset: q(0, 1) };
    assert_eq!(statement.phases.len(), 1);
    assert_eq!(statement.phases[0].rates, [angle, speed]);
    let term = |coefficient, rate, wave| SignalTerm { coefficient, power: 0, rate, wave };
    let mut signal = statement.drives[0].signal.clone();
    signal.sort_by(|a, b| a.coefficient.cmp(&b.coefficient));
    let torque = [
        term(q(1, 50), q(0, 1), Wave::Sine(q(12, 1))),
        term(q(1, 10), q(-2, 1), Wave::One),
        term(q(1, 2), q(0, 1), Wave::One),
    ];
    assert_eq!(signal, torque);
    assert_eq!(statement.outputs[0].unit.as_deref(), Some("N m"));
    assert_eq!(statement.outputs[1].value.terms.len(), 3, "(2*load)^2 is expanded in states");
    assert_eq!(statement.zone.reference.as_deref(), Some("ACT-021"));
    assert_eq!((statement.zone.from, statement.zone.until), (q(1, 3), Some(q(60, 1))));
    assert_eq!(statement.claim, Claim::Never { margin: q(0, 1) });
    assert_eq!(model.source, std::fs::read_to_string(path).expect("the model"));
}

#[test]
fn the_matrix_form_says_the_same_as_its_files_and_as_named_states() {
    let good = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/good");
    let from = |name: &str| load(&good.join(name), Need::Zones).unwrap_or_else(|d| panic!("{name}: {d}"));
    let (rows, files, states) = (from("matrix_rows.toml"), from("matrix_files.toml"), from("matrix_states.toml"));
    assert_eq!(rows.statement(0), files.statement(0));
    assert_eq!(rows.statement(0), states.statement(0));
}

#[test]
fn states_of_the_matrix_form_are_called_x1_x2_and_so_on() {
    let model = read("[matrix]\nA = [[0, 1], [-4, -0.4]]\nstart = [1, [0.5, 0.5]]\n");
    let names: Vec<&str> = model.states.iter().map(|s| s.name.as_str()).collect();
    assert_eq!(names, ["x1", "x2"]);
    assert_eq!(model.states[1].start, q(1, 2));
    assert_eq!(model.phase.rates[1].terms, [(q(-4, 1), X), (q(-2, 5), Y)]);
}

#[test]
fn numbers_are_exact_whatever_their_form() {
    for (text, p, d) in [
        ("0.1", 1, 10),
        ("1.2e-3", 3, 2500),
        ("1E3", 1000, 1),
        ("-0.0", 0, 1),
        ("+5", 5, 1),
        ("1_000", 1000, 1),
        ("0x1F", 31, 1),
        ("0b101", 5, 1),
        ("0o17", 15, 1),
        ("\"22/7\"", 22, 7),
        ("\"2*(3 - 1)/8\"", 1, 2),
        ("\"-2^2\"", -4, 1),
        ("\"(-2)^2\"", 4, 1),
        ("\"1.5e1/3\"", 5, 1),
        ("[0.25, \"1/4\"]", 1, 4),
        ("'''1/3'''", 1, 3),
        ("\"\\u0031/4\"", 1, 4),
        ("\"12/2/3\"", 2, 1),
        ("\"2 - 3 - 4\"", -5, 1),
        ("\"abs(-3)\"", 3, 1),
    ] {
        assert_eq!(start(text), q(p, d), "{text}");
    }
}

#[test]
fn the_longest_and_the_largest_numbers_are_read_to_the_last_digit() {
    let digits = "7".repeat(10_000);
    assert_eq!(start(&digits).to_string(), digits);
    let power = format!("1{}", "0".repeat(10_000));
    assert_eq!(start("1e10000").to_string(), power);
    assert_eq!(start("1e-10000").to_string(), format!("1/{power}"));
}

#[test]
fn precedence_is_that_of_the_table() {
    let same = |a: &str, b: &str| assert_eq!(inside(a), inside(b), "{a} and {b}");
    same("-x^2 > 1", "-(x^2) > 1");
    same("2*-x > 1", "2*(-x) > 1");
    same("-x*y > 1", "(-x)*y > 1");
    same("1 - x - y > 1", "(1 - x) - y > 1");
    same("x + y*2 > 1", "x + (y*2) > 1");
    same("x/2/3 > 1", "(x/2)/3 > 1");
    same("x/2*3 > 1", "(x/2)*3 > 1");
    same("2^3*x > 1", "8*x > 1");
    same("x^(1 + 1) > 1", "x*x > 1");
    same("x^0 > 1", "1 > 1");
    same("not x > 1 and y > 2", "(not (x > 1)) and (y > 2)");
    same("not x > 1 or y > 2", "(not (x > 1)) or (y > 2)");
    same("x > 1 or y > 2 and x < 3", "x > 1 or (y > 2 and x < 3)");
    same("not (x > 1 or y > 2)", "x <= 1 and y <= 2");
    same("not not x > 1", "x > 1");
    same("x + 1 > y and y < 2", "((x + 1) > y) and (y < 2)");
}

#[test]
fn chains_in_one_direction_are_conjunctions() {
    let same = |a: &str, b: &str| assert_eq!(inside(a), inside(b), "{a} and {b}");
    same("0 <= x < 1", "0 <= x and x < 1");
    same("3 > x >= y > 0", "3 > x and x >= y and y > 0");
    same("x = y = 0", "x = y and y = 0");
    same("not 0 <= x < 1", "0 > x or x >= 1");
}

#[test]
fn each_comparison_is_left_minus_right_with_its_relation_and_negation() {
    for (symbol, relation, negation) in [
        ("<", Relation::Negative, Relation::NonNegative),
        ("<=", Relation::NonPositive, Relation::Positive),
        ("=", Relation::Zero, Relation::NonZero),
        (">=", Relation::NonNegative, Relation::Negative),
        (">", Relation::Positive, Relation::NonPositive),
    ] {
        let p: &[(i64, &[(Variable, u32)])] = &[(-3, &[]), (1, &[(X, 1)])];
        assert_eq!(inside(&format!("x {symbol} c")), atom(p, relation), "{symbol}");
        assert_eq!(inside(&format!("not x {symbol} c")), atom(p, negation), "not {symbol}");
        let turned: &[(i64, &[(Variable, u32)])] = &[(3, &[]), (-1, &[(X, 1)])];
        assert_eq!(inside(&format!("c {symbol} x")), atom(turned, relation), "turned {symbol}");
    }
}

#[test]
fn zones_keep_outputs_drives_and_time_by_name() {
    let w: &[(i64, &[(Variable, u32)])] = &[(1, &[(Variable::Output(0), 1)])];
    assert_eq!(inside("w > 0"), atom(w, Relation::Positive));
    let ut: &[(i64, &[(Variable, u32)])] = &[(1, &[(Variable::Drive(0), 1), (Variable::Time, 1)])];
    assert_eq!(inside("u*t > 0"), atom(ut, Relation::Positive));
    assert_eq!(inside("1 > 2"), atom(&[(-1, &[])], Relation::Positive));
    assert_eq!(inside("x = x"), atom(&[], Relation::Zero));
}

#[test]
fn abs_is_split_into_its_two_cases() {
    let x = |c: i64| -> Formula { atom(&[(c, &[(X, 1)])], Relation::NonNegative) };
    let beyond = |c: i64| -> Formula { atom(&[(-1, &[]), (c, &[(X, 1)])], Relation::Positive) };
    let wanted = Formula::Or(vec![Formula::And(vec![x(1), beyond(1)]), Formula::And(vec![x(-1), beyond(-1)])]);
    assert_eq!(inside("abs(x) > 1"), wanted);
    let Formula::Or(cases) = inside("abs(x) + abs(y) + abs(x - y) > 1") else { panic!("not a disjunction") };
    assert_eq!(cases.len(), 8);
    assert!(matches!(inside("not abs(x) > 1 and 1 > 2"), Formula::And(parts) if parts.len() == 2));
}

#[test]
fn products_of_waves_are_expanded_and_normalised() {
    let term = |coefficient, power, rate, wave| SignalTerm { coefficient, power, rate, wave };
    let zero = || q(0, 1);
    assert_eq!(signal("sin(-3*t)"), [term(q(-1, 1), 0, zero(), Wave::Sine(q(3, 1)))]);
    assert_eq!(signal("cos(-3*t)"), [term(q(1, 1), 0, zero(), Wave::Cosine(q(3, 1)))]);
    assert_eq!(signal("exp(0) + sin(0) + cos(0*t)"), [term(q(2, 1), 0, zero(), Wave::One)]);
    assert_eq!(signal("sin(t) - sin(t)"), []);
    assert_eq!(signal("0"), []);
    assert_eq!(signal("exp(-t/2)*exp(2*t)"), [term(q(1, 1), 0, q(3, 2), Wave::One)]);
    assert_eq!(signal("exp(t)^3"), [term(q(1, 1), 0, q(3, 1), Wave::One)]);
    assert_eq!(signal("t*t^2/4"), [term(q(1, 4), 3, zero(), Wave::One)]);
    let mut square = signal("sin(2*t)^2");
    square.sort_by(|a, b| a.coefficient.cmp(&b.coefficient));
    let wanted = [term(q(-1, 2), 0, zero(), Wave::Cosine(q(4, 1))), term(q(1, 2), 0, zero(), Wave::One)];
    assert_eq!(square, wanted);
    assert_eq!(signal("sin(t)^2 + cos(t)^2"), [term(q(1, 1), 0, zero(), Wave::One)]);
    assert_eq!(signal("2*sin(3*t)*cos(3*t)"), [term(q(1, 1), 0, zero(), Wave::Sine(q(6, 1)))]);
}

#[test]
fn signal_and_rate_may_be_plain_numbers_and_constants_may_come_in_any_order() {
    let text = "[state.x]\nstart = \"b\"\nrate = 2\n[drive.u]\nsignal = 0.5\n[constants]\nb = \"2*a\"\na = 0.25\n";
    let model = read(text);
    assert_eq!(model.states[0].start, q(1, 2));
    assert_eq!(model.phase.rates[0], Affine { terms: vec![], offset: q(2, 1) });
    assert_eq!(model.drives[0].signal.len(), 1);
}

#[test]
fn outputs_may_use_each_other_in_any_order() {
    let text = "[state.x]\nstart = 0\nrate = 1\n[output.b]\nvalue = \"a^2 - t\"\n[output.a]\nvalue = \"x + 1\"\n";
    let expanded = polynomial(&[(1, &[]), (2, &[(X, 1)]), (1, &[(X, 2)]), (-1, &[(Variable::Time, 1)])]);
    let mut found = read(text).outputs.remove(0).value;
    let mut wanted = expanded;
    found.terms.sort_by(|a, b| a.powers.cmp(&b.powers));
    wanted.terms.sort_by(|a, b| a.powers.cmp(&b.powers));
    assert_eq!(found, wanted);
}

#[test]
fn zone_names_at_the_edges_of_the_rule_are_accepted() {
    for name in ["a", " ", " a ", "end-stop_2 b", &"n".repeat(64)] {
        let text = format!("[state.x]\nstart = 0\nrate = 1\n[[zone]]\nname = \"{name}\"\ninside = \"x > 1\"\n");
        assert_eq!(read(&text).zones[0].name, name);
    }
}

#[test]
fn the_last_accepted_sizes_are_accepted() {
    let sum = vec!["x"; 20_000].join(" + ");
    let twenty_thousand: &[(i64, &[(Variable, u32)])] = &[(20_000, &[(X, 1)])];
    assert_eq!(inside(&format!("{sum} > 0")), atom(twenty_thousand, Relation::Positive));
    let Formula::Or(list) = inside(&vec!["x>9"; 10_000].join(" or ")) else { panic!("not a disjunction") };
    assert_eq!(list.len(), 10_000);
    inside(&format!("{}x > 1{}", "(".repeat(100), ")".repeat(100)));
    inside("x^24 > 1");
    inside("w^24 > 1");
    let six = ["abs(x)"; 6].join(" + ");
    assert!(matches!(inside(&format!("{six} > 1")), Formula::Or(cases) if cases.len() == 64));
    inside(&format!("{}x > 9{}", "x > 1 and (y > 1 or (".repeat(4), "))".repeat(4)));
}

#[test]
fn the_checker_reads_the_text_of_the_deepest_statement_also_inside_a_certificate() {
    let deepest = format!("{}x > 9{}", "x > 1 and (x^2 > 1 or (".repeat(4), "))".repeat(4));
    let text = format!("[state.x]\nstart = 1\nrate = \"-x\"\n[[zone]]\nname = \"z\"\ninside = \"{deepest}\"\n");
    let statement = read(&text).statement(0);
    let printed = statement.to_json().print();
    let limits = keepout_checker::Limits::default();
    let back = keepout_checker::statement::Statement::from_json(&printed, &limits);
    assert_eq!(back.ok(), Some(statement));
    // A certificate holds the statement one level deeper.
    let inside_a_certificate = format!("{{\"statement\": {printed}}}");
    assert!(keepout_checker::json::read(&inside_a_certificate, &limits).is_ok());
}

#[test]
fn the_examples_of_the_documentation_are_accepted() {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    let page = std::fs::read_to_string(here.join("../../docs/model-format.md")).expect("the page");
    let examples: Vec<&str> = page.split("```toml\n").skip(1).filter_map(|rest| rest.split("```").next()).collect();
    assert_eq!(examples.len(), 3);
    for example in examples {
        let model = load_text(example, "example", "m", &here.join("tests/models/good"), Need::Zones);
        model.unwrap_or_else(|d| panic!("{d}"));
    }
}
