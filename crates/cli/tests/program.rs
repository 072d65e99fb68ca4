//! The program from outside: exit statuses, verdicts, messages.

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

fn example(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../examples").join(name)
}

fn keepout(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_keepout")).args(arguments).output().unwrap()
}

/// Runs `certify` on a model's text; returns exit status, standard output and standard error.
fn certify(name: &str, model: &str) -> (i32, String, String) {
    let path = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("{name}.toml"));
    std::fs::write(&path, model).unwrap();
    let output = keepout(&["certify", path.to_str().unwrap()]);
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (output.status.code().unwrap(), text(output.stdout), text(output.stderr))
}

#[test]
fn examples_print_what_is_recorded_beside_them() {
    for (name, status) in [("wrist_joint", 0), ("dead_thrusters", 1), ("boom_release", 0)] {
        let output = keepout(&["certify", example(name).join("model.toml").to_str().unwrap()]);
        let recorded = std::fs::read_to_string(example(name).join("output.txt")).unwrap();
        assert_eq!(
            (output.status.code(), String::from_utf8(output.stdout).unwrap()),
            (Some(status), recorded),
            "{name}"
        );
    }
}

#[test]
fn wrong_models_exit_with_3_and_say_where_and_how_to_mend_it() {
    let state = "[state.x]\nstart = 1\nrate = \"-x\"\n";
    let zone = "[[zone]]\nname = \"far\"\ninside = \"x > 2\"\n";
    let cases = [
        ("no_zone", state.to_string(), "the model has no zone"),
        ("no_state", zone.to_string(), "the model has no state"),
        ("unknown_key", format!("{state}unti = 3\n{zone}"), "`unti` is not a key of [state.x]"),
        ("misspelt", format!("{state}[[zone]]\nname = \"far\"\ninside = \"xx > 2\"\n"), "did you mean `x`?"),
        ("nonlinear", format!("[state.x]\nstart = 1\nrate = \"x*x\"\n{zone}"), "this product is not"),
        ("equals", format!("{state}[[zone]]\nname = \"far\"\ninside = \"x == 2\"\n"), "write = for equality"),
        ("implicit", format!("{state}[[zone]]\nname = \"far\"\ninside = \"2x > 2\"\n"), "write a product with *"),
        ("chain", format!("{state}[[zone]]\nname = \"far\"\ninside = \"1 < x > 2\"\n"), "goes in one direction"),
        ("tower", format!("{state}[[zone]]\nname = \"far\"\ninside = \"x^2^2 > 2\"\n"), "a^b^c is ambiguous"),
        ("infinite", format!("[state.x]\nstart = inf\nrate = \"-x\"\n{zone}"), "expected a finite number"),
        ("cycle", format!("[constants]\na = \"b\"\nb = \"a\"\n{state}{zone}"), "is defined through itself"),
        ("window", format!("{state}{zone}from = 3\nuntil = 2\n"), "before it begins"),
        ("range", format!("[state.x]\nstart = [1, 0]\nrate = \"-x\"\n{zone}"), "the range begins at 1"),
        ("twice", format!("{state}{zone}{}", zone.replace("far", "FAR")), "another zone named"),
        ("reserved", format!("[constants]\npi = 3\n{state}{zone}"), "reserved word"),
    ];
    for (name, model, message) in cases {
        let (status, out, err) = certify(name, &model);
        assert_eq!((status, out.as_str()), (3, ""), "{name}: {err}");
        assert!(err.contains(message), "{name}: {err}");
        assert!(err.contains(&format!("{name}.toml:")), "{name}: {err}");
    }
}

#[test]
fn precedence_is_that_of_the_format() {
    // -x^2 is -(x^2): at x = 1 it is -1. `not x > 1 and x > 2` is (not (x > 1)) and (x > 2): nowhere.
    let model = "[state.x]\nstart = 1\nrate = \"-x\"\n[[zone]]\nname = \"z\"\ninside = \"INSIDE\"\n";
    for (inside, status) in [
        ("-x^2 > 0", 0),
        ("-x^2 = -1", 1),
        ("not x > 1 and x > 2", 0),
        ("x >= 1 and x < 0 or x = 1", 1),
        ("0 < x <= 1", 1),
    ] {
        let (found, out, err) = certify("precedence", &model.replace("INSIDE", inside));
        assert_eq!(found, status, "{inside}: {out}{err}");
    }
}

#[test]
fn literals_are_exact() {
    // 0.1 + 0.2 is 0.3: the zone x = 0.3 is entered at the start.
    let model = "[state.x]\nstart = \"0.1 + 0.2\"\nrate = \"-x\"\n[[zone]]\nname = \"z\"\ninside = \"x = 0.3\"\n";
    assert_eq!(certify("literals", model).0, 1);
}

#[test]
fn json_gives_verdict_margin_and_time() {
    let model = example("dead_thrusters").join("model.toml");
    let output = keepout(&["certify", model.to_str().unwrap(), "--json"]);
    let report: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["zones"][0]["verdict"], "clear");
    assert!(report["zones"][0]["margin"].is_string());
    assert_eq!(report["zones"][1]["verdict"], "enters");
    assert_eq!(report["zones"][1]["time"]["first"], true);
}

#[test]
fn misuse_exits_with_3_and_help_with_0() {
    assert_eq!(keepout(&[]).status.code(), Some(3));
    assert_eq!(keepout(&["certify"]).status.code(), Some(3));
    assert_eq!(keepout(&["certify", "nowhere.toml"]).status.code(), Some(3));
    assert_eq!(keepout(&["--help"]).status.code(), Some(0));
    let model = example("boom_release").join("model.toml");
    assert_eq!(keepout(&["certify", model.to_str().unwrap(), "--zone", "solar"]).status.code(), Some(3));
}
