//! Sets of safe starts as the program writes them.

use keepout_checker::certificate::Certificate;
use keepout_checker::statement::Statement;
use keepout_checker::{Limits, check};
use std::path::{Path, PathBuf};
use std::process::Command;

const ENDINGS: [&str; 5] = ["set.statement.json", "set.certificate.json", "set.json", "set.smt2", "set.txt"];

/// Runs `certify MODEL --invariant FOLDER`; returns the folder, the exit status and standard output.
fn certify(name: &str, model: &str) -> (PathBuf, i32, String) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("invariant_{name}"));
    std::fs::create_dir_all(&folder).expect("a folder");
    let path = folder.join("model.toml");
    std::fs::write(&path, model).expect("the model is written");
    let mut command = Command::new(env!("CARGO_BIN_EXE_keepout"));
    let output = command.arg("certify").arg(&path).arg("--invariant").arg(&folder).output().expect("the program runs");
    let text = String::from_utf8(output.stdout).expect("UTF-8");
    (folder, output.status.code().expect("an exit status"), text)
}

fn read(folder: &Path, ending: &str) -> String {
    std::fs::read_to_string(folder.join(format!("far.{ending}"))).expect("the file is there")
}

fn is_proved(folder: &Path) -> bool {
    let limits = Limits::default();
    let statement = Statement::from_json(&read(folder, "set.statement.json"), &limits).expect("a statement");
    let certificate = Certificate::from_json(&read(folder, "set.certificate.json"), &limits).expect("a certificate");
    check(&statement, &certificate, &limits).is_ok()
}

fn rotation(zone: &str) -> String {
    format!(
        "title = \"r\"\n[state.p]\nstart = 1\nrate = \"2*q\"\n[state.q]\nstart = 0\nrate = \"-2*p\"\n\
         [[zone]]\nname = \"far\"\ninside = \"{zone}\"\n"
    )
}

#[test]
fn a_circle_is_written_without_a_rounded_number() {
    let (folder, status, text) = certify("circle", &rotation("p >= 1.5"));
    assert_eq!(status, 0, "{text}");
    assert!(text.contains("set of safe starts: holds the trajectory from t ="), "{text}");
    assert!(is_proved(&folder));
    // The frequency is the positive root of z^2 + 4, as itself.
    let script = "\
(set-logic QF_NRA)
(declare-const |p| Real) ; \"a state\"
(declare-const |q| Real) ; \"a state\"
(declare-const |root_1_im| Real) ; \"the imaginary part of root 1\"
(declare-const |c_1| Real) ; \"the cosine of base angle 1\"
(declare-const |s_1| Real) ; \"the sine of base angle 1\"
(assert (>= (+ (- 2.0) |root_1_im|) 0.0))
(assert (<= (+ (- 2.0) |root_1_im|) 0.0))
(assert (= (+ 4.0 (* (- 1.0) |root_1_im| |root_1_im|)) 0.0))
(assert (= (+ (- 1.0) (* |c_1| |c_1|) (* |s_1| |s_1|)) 0.0))
(assert (= (+ (* (- 1.0) |p|) |c_1|) 0.0))
(assert (= (+ (* (- 1.0) |q|) (* (- (/ 1.0 2.0)) |root_1_im| |s_1|)) 0.0))
(assert (>= (+ (- (/ 3.0 2.0)) |p|) 0.0))
(check-sat)
";
    assert!(read(&folder, "set.smt2").ends_with(script), "{}", read(&folder, "set.smt2"));
    let value: serde_json::Value = serde_json::from_str(&read(&folder, "set.json")).expect("JSON");
    assert_eq!(value["format"], "keepout-set/1");
    assert_eq!(value["variables"].as_array().expect("a list").len(), 5);
    assert_eq!(value["zone"]["is"], ">= 0");
    let words = read(&folder, "set.txt");
    assert!(words.contains("Every start in the set S below is safe for ever"), "{words}");
    assert!(words.contains("  -p + c_1 = 0\n"), "{words}");
}

#[test]
fn known_inputs_become_states_of_the_set() {
    let model = "title = \"d\"\n[state.x]\nstart = 0\nrate = \"wind - x\"\n[drive.wind]\nsignal = \"1 + t*exp(-2*t) + 0.25*sin(3*t)\"\n\
        [[zone]]\nname = \"far\"\ninside = \"x + 0*t >= 1.5\"\n";
    let (folder, status, text) = certify("input", model);
    assert_eq!(status, 0, "{text}");
    assert!(is_proved(&folder));
    let words = read(&folder, "set.txt");
    assert!(words.contains("  wind' = "), "{words}");
}

#[test]
fn a_set_that_is_no_more_does_not_stay() {
    let (folder, _, _) = certify("stale", &rotation("p >= 1.5"));
    assert!(ENDINGS.iter().all(|ending| folder.join(format!("far.{ending}")).exists()));
    // Never entered, but touched at the border: no set of open conditions keeps away from it.
    let (folder, status, text) = certify("stale", &rotation("p > 1"));
    assert_eq!(status, 0, "{text}");
    assert!(text.contains("no set of safe starts: from each start that was tried"), "{text}");
    assert!(ENDINGS.iter().all(|ending| !folder.join(format!("far.{ending}")).exists()));
}

#[test]
fn zones_that_are_entered_or_end_get_no_set() {
    let (folder, status, text) = certify("entered", &rotation("p >= 0.5"));
    assert_eq!(status, 1, "{text}");
    assert!(!text.contains("safe starts") && !folder.join("far.set.json").exists());
    let (_, status, text) = certify("window", &format!("{}until = 5\n", rotation("p >= 1.5")));
    assert_eq!(status, 0, "{text}");
    assert!(!text.contains("safe starts"));
}
