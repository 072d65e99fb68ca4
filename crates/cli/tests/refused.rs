//! Models that must be refused. The first line of each says where and why; the whole text of the messages stands beside it.
//!
//! `KEEPOUT_BLESS=1 cargo test -p keepout --test refused` writes the texts anew; look at every change.

use keepout::model::{Need, load};
use std::path::{Path, PathBuf};

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/bad")
}

fn models() -> Vec<PathBuf> {
    let entries = std::fs::read_dir(folder()).expect("the folder of refused models");
    let mut list: Vec<PathBuf> = entries.map(|e| e.expect("an entry").path()).collect();
    list.retain(|p| p.extension().is_some_and(|e| e == "toml"));
    list.sort();
    assert!(list.len() > 100, "only {} refused models found", list.len());
    list
}

/// The messages about a model, with the bare name of the file.
fn messages(path: &Path) -> Option<String> {
    let mut diagnostics = load(path, Need::Zones).err()?;
    diagnostics.file = path.file_name()?.to_string_lossy().into_owned();
    Some(diagnostics.to_string())
}

#[test]
fn each_refused_model_is_refused_at_its_place_for_its_reason() {
    let mut wrong = Vec::new();
    for path in models() {
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        let text = std::fs::read_to_string(&path).expect("a model");
        let wanted = text.lines().next().and_then(|l| l.strip_prefix("# refused at ")).expect("the first line");
        match messages(&path) {
            None => wrong.push(format!("{name}: accepted, wanted {wanted}")),
            Some(found) if !found.contains(&format!("{name}:{wanted}")) => {
                wrong.push(format!("wanted {wanted}, found\n{found}"));
            }
            Some(_) => {}
        }
    }
    assert!(wrong.is_empty(), "{} of the models:\n{}", wrong.len(), wrong.join("\n"));
}

#[test]
fn the_messages_are_those_that_have_been_read_and_approved() {
    let mut wrong = Vec::new();
    for path in models() {
        let found = messages(&path).unwrap_or_else(|| "accepted".into());
        let approved = path.with_extension("txt");
        if std::env::var_os("KEEPOUT_BLESS").is_some() {
            std::fs::write(&approved, &found).expect("the text is written");
        }
        let wanted = std::fs::read_to_string(&approved).unwrap_or_default();
        if wanted != found {
            wrong.push(format!("{}\n--- approved\n{wanted}--- found\n{found}", path.display()));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn each_message_says_how_to_mend_it_and_starts_in_lower_case() {
    for path in models() {
        let Err(diagnostics) = load(&path, Need::Zones) else { continue };
        for diagnostic in &diagnostics.list {
            let message = &diagnostic.message;
            assert!(diagnostic.help.is_some(), "{}: no help with: {message}", path.display());
            let first = message.chars().next();
            assert!(first.is_some_and(|c| !c.is_uppercase()), "{}: {message}", path.display());
            assert!(!message.contains("invalid input") && !message.ends_with('.'), "{}: {message}", path.display());
        }
    }
}

#[test]
fn a_spectrum_needs_no_zone_but_a_certificate_does() {
    let path = folder().join("zone_none.toml");
    assert!(load(&path, Need::Nothing).is_ok());
    assert!(load(&path, Need::Zones).is_err());
}

#[test]
fn faults_in_different_sections_are_told_in_one_go() {
    let text = "[constants]\na = \"b\"\n[state.x]\nstart = inf\nrate = \"x*x\"\n[drive.u]\nsignal = \"sin(t + 1)\"\n\
                [output.w]\nvalue = \"q\"\n[[zone]]\nname = \"a/b\"\ninside = \"x == 1\"\nuntil = -1\n";
    let refused = keepout::model::load_text(text, "m", "m", Path::new("."), Need::Zones);
    let lines: Vec<String> = refused.expect_err("a refusal").to_string().lines().map(String::from).collect();
    let places: Vec<&str> =
        lines.iter().filter(|l| l.starts_with("m:")).map(|l| l.split(':').nth(1).unwrap_or("")).collect();
    assert_eq!(places, ["2", "4", "5", "7", "9", "11", "12", "13"], "{lines:#?}");
}
