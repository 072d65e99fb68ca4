//! The program: exit statuses, output, evidence.

use keepout_checker::Limits;
use keepout_checker::certificate::Certificate;
use keepout_checker::statement::Statement;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

fn keepout(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_keepout")).args(arguments).output().expect("the program runs")
}

fn status(output: &Output) -> i32 {
    output.status.code().expect("an exit status, not a signal")
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("UTF-8")
}

/// A folder of its own for a test.
fn folder(name: &str) -> PathBuf {
    let path = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&path);
    std::fs::create_dir_all(&path).expect("a folder");
    path
}

/// A decaying and an oscillating state, with zones given as name and condition.
fn model(folder: &Path, zones: &[(&str, &str)]) -> String {
    let mut model = String::from(
        "title = \"m\"\n[state.x]\nstart = 1\nrate = \"-x\"\n[state.p]\nstart = 1\nrate = \"q\"\n[state.q]\nstart = 0\nrate = \"-p\"\n",
    );
    for (name, inside) in zones {
        model.push_str(&format!("[[zone]]\nname = \"{name}\"\ninside = \"{inside}\"\n"));
    }
    let path = folder.join("m.toml");
    std::fs::write(&path, model).expect("the model is written");
    path.to_string_lossy().into_owned()
}

#[test]
fn the_exit_status_says_what_became_of_the_zones() {
    let folder = folder("statuses");
    let clear = model(&folder, &[("a", "x > 2"), ("b", "p > 1.5")]);
    assert_eq!(status(&keepout(&["certify", &clear])), 0);
    let entered = model(&folder, &[("a", "x > 2"), ("b", "x < 0.5")]);
    assert_eq!(status(&keepout(&["certify", &entered])), 1);
    let chosen = model(&folder, &[("a", "x < 0.5"), ("b", "p > 1.5")]);
    assert_eq!(status(&keepout(&["certify", &chosen, "--zone", "b"])), 0);
    // p returns to 1 - x for ever more closely, and with too little work nothing is decided
    let unsettled = model(&folder, &[("a", "x > 2"), ("b", "p >= 1.5 - x and t > 1")]);
    assert_eq!(status(&keepout(&["certify", &unsettled, "--effort", "0"])), 2);
    let wrong = model(&folder, &[("a", "x == 2")]);
    assert_eq!(status(&keepout(&["certify", &wrong])), 3);
    let none = model(&folder, &[]);
    assert_eq!(status(&keepout(&["certify", &none])), 3);
    assert_eq!(status(&keepout(&["spectrum", &none])), 0);
}

#[test]
fn margins_are_left_out_on_request() {
    let clear = model(&folder("no_margins"), &[("a", "x > 2")]);
    let zone = |options: &[&str]| -> serde_json::Value {
        let output = keepout(&[&["certify", &clear, "--json"], options].concat());
        serde_json::from_str::<serde_json::Value>(&text(&output.stdout)).expect("JSON")["zones"][0].clone()
    };
    assert!(zone(&[])["margin"].is_string());
    let without = zone(&["--no-margins"]);
    assert_eq!((&without["verdict"], &without["margin"]), (&"clear".into(), &serde_json::Value::Null));
}

#[test]
fn every_misuse_of_the_command_line_exits_with_3() {
    for arguments in [
        &[][..],
        &["certify"],
        &["bogus"],
        &["--bogus"],
        &["certify", "a", "b"],
        &["certify", "absent.toml"],
        &["certify", "."],
        &["certify", "a.toml", "--effort", "many"],
        &["certify", "a.toml", "--zone"],
        &["spectrum"],
        &["spectrum", "absent.toml"],
        &["peak"],
        &["peak", "absent.toml", "--of", "x"],
        &["peak", "a.toml", "--of"],
    ] {
        let output = keepout(arguments);
        assert_eq!(status(&output), 3, "{arguments:?}");
        assert!(output.stdout.is_empty(), "{arguments:?}: messages go to standard error");
        assert!(!output.stderr.is_empty(), "{arguments:?}");
    }
}

#[test]
fn help_and_version_exit_with_0() {
    for arguments in [
        &["--help"][..],
        &["--version"],
        &["certify", "--help"],
        &["help"],
        &["spectrum", "--help"],
        &["peak", "--help"],
    ] {
        let output = keepout(arguments);
        assert_eq!(status(&output), 0, "{arguments:?}");
        assert!(!output.stdout.is_empty(), "{arguments:?}");
    }
}

#[test]
fn the_spectrum_of_a_model_with_uncertain_constants_is_that_at_the_centres_and_says_so() {
    let path = folder("spectrum").join("m.toml");
    let text_of = "[state.x]\nstart = [0, 1]\nrate = \"-k*x/m + w\"\n[disturbance.w]\nrange = [-1, 1]\n\
                   [uncertain.k]\nrange = [5, 7]\n[uncertain.m]\nrange = [1, 3]\n";
    std::fs::write(&path, text_of).expect("the model is written");
    let output = keepout(&["spectrum", &path.to_string_lossy()]);
    assert_eq!(status(&output), 0);
    let found = text(&output.stdout);
    assert!(found.contains("uncertain constants at the centres of their ranges: k = 6, m = 2\n"), "{found}");
    assert!(found.contains("largest Jordan block 1, irreducible: s + 3\n"), "{found}");
}

#[test]
fn a_peak_is_asked_in_the_names_of_the_model_and_answered_with_both_extremes() {
    let path = folder("peak").join("m.toml");
    let model = "title = \"P\"\n[constants]\nc = 3\n[state.x]\nstart = 1\nunit = \"rad\"\nrate = \"-x + w\"\n\
                 [disturbance.w]\nrange = [-1, 1]\n[output.y]\nvalue = \"2*x\"\n[output.z]\nvalue = \"x^2\"\n";
    std::fs::write(&path, model).expect("the model is written");
    let path = path.to_string_lossy().into_owned();
    let found = keepout(&["peak", &path, "--of", "y - c*t", "--from", "1/c", "--until", "2*c", "--json"]);
    assert!([0, 2].contains(&status(&found)), "{}", text(&found.stderr));
    let object: serde_json::Value = serde_json::from_str(&text(&found.stdout)).expect("JSON");
    assert_eq!((&object["of"], &object["title"]), (&"y - c*t".into(), &"P".into()));
    assert_eq!((&object["from"], &object["until"]), (&"1/3".into(), &"6".into()));
    for extreme in ["max", "min"] {
        let bounds = ["upper", "lower"].map(|side| object[extreme][side].is_string());
        let is_told = object[extreme]["reason"].is_string();
        assert_eq!(bounds != [true, true], is_told, "{extreme}: {object}");
        assert!(status(&found) == 2 || bounds == [true, true], "{extreme}: {object}");
    }
    for (of, window, message) in [
        ("x^2", &[][..], "--of:1:1: the expression is affine"),
        ("1 + z", &[], "--of:1:1: the expression is affine"),
        ("x + w", &[], "--of:1:5: `w` is a disturbance: the expression does not use it"),
        ("x > 1", &[], "--of:1:1: expected a number-valued expression"),
        ("x + sin(t)", &[], "--of:1:5: sin is not allowed here"),
        ("abs(x)", &[], "--of:1:1: abs is for zones"),
        ("xx", &[], "did you mean `x`?"),
        ("", &[], "--of:1:1: the expression ends too early"),
        ("x", &["--from", "-1"], "--from is a time >= 0, found -1"),
        ("x", &["--until", "t"], "--until:1:1: t is not a constant"),
        ("x", &["--from", "2", "--until", "1"], "the window ends at 1, before it begins at 2"),
    ] {
        let refused = keepout(&[&["peak", path.as_str(), "--of", of], window].concat());
        let told = text(&refused.stderr);
        assert_eq!((status(&refused), text(&refused.stdout).as_str()), (3, ""), "{of}: {told}");
        assert!(told.contains(message), "{of}: {told}");
    }
}

#[test]
fn an_entered_zone_of_many_trajectories_has_a_witness_for_people() {
    let folder = folder("witness");
    let path = folder.join("m.toml");
    let model = "[state.x]\nstart = [0, 1]\nrate = \"-x + w\"\n[disturbance.w]\nrange = [-1, 1]\n\
                 [[zone]]\nname = \"low\"\ninside = \"x <= -0.5\"\n[[zone]]\nname = \"far\"\ninside = \"x > 2\"\n";
    std::fs::write(&path, model).expect("the model is written");
    let (path, out) = (path.to_string_lossy().into_owned(), folder.join("out"));
    let found = keepout(&["certify", &path, "--out", &out.to_string_lossy(), "--json"]);
    assert_eq!(status(&found), 1, "{}{}", text(&found.stdout), text(&found.stderr));
    let object: serde_json::Value = serde_json::from_str(&text(&found.stdout)).expect("JSON");
    let (low, far) = (&object["zones"][0], &object["zones"][1]);
    assert_eq!((&low["verdict"], &far["verdict"]), (&"enters".into(), &"clear".into()), "{object}");
    let file = std::fs::read_to_string(out.join("low.witness.json")).expect("a witness");
    let witness: serde_json::Value = serde_json::from_str(&file).expect("JSON");
    assert_eq!(low["witness"]["start"], witness["start"]);
    assert!(!out.join("far.witness.json").exists() && far["witness"].is_null());
    // x(at) by exact steps in doubles: x' = -x + w with constant w up to each `until`.
    let number = |v: &serde_json::Value| v.as_f64().expect("a number");
    let (mut x, mut t) = (number(&witness["start"]["x"]["decimal"]), 0.0);
    assert!((0.0..=1.0).contains(&x));
    for step in witness["signals"]["w"].as_array().expect("a list") {
        let (until, w) = (number(&step["until_decimal"]), number(&step["value_decimal"]));
        assert!((-1.0..=1.0).contains(&w) && until >= t);
        x = w + (x - w) * f64::exp(t - until);
        t = until;
    }
    assert!((t - number(&witness["at_decimal"])).abs() < 1e-12 && x <= -0.5 + 1e-9, "x = {x} at {t}");
    let told = text(&keepout(&["certify", &path, "--out", &out.to_string_lossy()]).stdout);
    assert!(told.contains("worst case: start x = ") && told.contains("(see low.witness.json)"), "{told}");
}

#[test]
fn an_unknown_zone_is_answered_with_the_nearest_and_all_names() {
    let path = model(&folder("names"), &[("end stop", "x > 2"), ("over speed", "p > 3")]);
    let output = keepout(&["certify", &path, "--zone", "end-stop"]);
    assert_eq!(status(&output), 3);
    let message = text(&output.stderr);
    assert!(message.contains("no zone `end-stop`") && message.contains("did you mean `end stop`?"), "{message}");
    assert!(message.contains("over speed"), "{message}");
}

#[test]
fn messages_have_place_line_and_caret_and_no_colour() {
    let path = model(&folder("messages"), &[("a", "x > 2y")]);
    let output = keepout(&["certify", &path]);
    let message = text(&output.stderr);
    assert!(message.starts_with(&format!("{path}:13:16: expected an operator before this\n")), "{message}");
    assert!(message.contains("13 | inside = \"x > 2y\"\n   |                ^\n"), "{message}");
    assert!(!message.contains('\u{1b}'), "{message}");
}

#[test]
fn json_is_one_object_with_a_verdict_for_each_chosen_zone() {
    let path = model(&folder("json"), &[("a", "x > 2"), ("b", "x < 0.5"), ("c", "p > 7")]);
    let output = keepout(&["certify", &path, "--json", "--zone", "b", "--zone", "a", "--zone", "b"]);
    assert_eq!(status(&output), 1);
    let report: serde_json::Value = serde_json::from_slice(&output.stdout).expect("one JSON object");
    let zones = report["zones"].as_array().expect("zones");
    assert_eq!(zones.len(), 2);
    assert_eq!((&zones[0]["name"], &zones[0]["verdict"]), (&"b".into(), &"enters".into()));
    assert_eq!((&zones[1]["name"], &zones[1]["verdict"]), (&"a".into(), &"clear".into()));
    for key in ["from", "to"] {
        let exact = zones[0]["time"][key].as_str().expect("a string");
        let (p, q) = exact.split_once('/').unwrap_or((exact, "1"));
        let value = p.parse::<f64>().expect("a number") / q.parse::<f64>().expect("a number");
        assert!((value - std::f64::consts::LN_2).abs() < 1e-3, "exp(-t) = 1/2 at ln 2, {key} is {exact}");
    }
    assert_eq!(zones[0]["time"]["first"], true);
    assert!(zones[1]["margin"].is_string());
}

#[test]
fn evidence_can_be_read_and_is_checked_again() {
    let folder = folder("evidence");
    let nested = "x > 3 and (p > 3 or (x > 9 and (p > 9 or q > 9)))";
    let path = model(&folder, &[("end stop", "abs(x) >= 2"), ("nested", nested), ("b", "x < 0.5")]);
    let out = folder.join("out");
    let output = keepout(&["certify", &path, "--out", &out.to_string_lossy()]);
    assert_eq!(status(&output), 1, "{}", text(&output.stderr));
    for zone in ["end stop", "nested", "b"] {
        let read = |what: &str| std::fs::read_to_string(out.join(format!("{zone}.{what}.json"))).expect("evidence");
        let limits = Limits::default();
        let statement = Statement::from_json(&read("statement"), &limits).unwrap_or_else(|e| panic!("{zone}: {e}"));
        let certificate =
            Certificate::from_json(&read("certificate"), &limits).unwrap_or_else(|e| panic!("{zone}: {e}"));
        assert_eq!(statement.zone.name, zone);
        assert!(keepout_checker::check(&statement, &certificate, &limits).is_ok(), "{zone}");
    }
}

#[test]
fn a_reader_that_goes_away_is_no_panic() {
    let path = model(&folder("pipe"), &[("a", "x > 2")]);
    for arguments in [&["certify", path.as_str()][..], &["spectrum", path.as_str()], &["--help"]] {
        let mut child = Command::new(env!("CARGO_BIN_EXE_keepout"))
            .args(arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program runs");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("the program ends");
        assert_eq!(status(&output), 0, "{arguments:?}");
        assert!(output.stderr.is_empty(), "{arguments:?}: {}", text(&output.stderr));
    }
}

#[test]
fn bytes_that_are_not_text_are_refused_with_their_place() {
    let path = folder("bytes").join("m.toml");
    std::fs::write(&path, b"title = \"a\"\n# caf\xe9\n").expect("the model is written");
    let output = keepout(&["certify", &path.to_string_lossy()]);
    assert_eq!(status(&output), 3);
    assert!(text(&output.stderr).contains(":2:6: expected UTF-8 text"), "{}", text(&output.stderr));
}
