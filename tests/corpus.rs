//! Each case of the corpus gets the answer that its first line names.

use keepout_tests::case::{answer_to_text, corpus, files, read};

fn wrong_answers(folder: &str) -> Vec<String> {
    let mut wrong = Vec::new();
    for path in files(folder) {
        let (expected, text) = read(&path);
        let found = answer_to_text(&text);
        if found != expected {
            wrong.push(format!(
                "{}: expected {expected}, found {found}",
                path.strip_prefix(corpus()).unwrap().display()
            ));
        }
    }
    wrong
}

#[test]
fn accepted_certificates_are_verified() {
    assert!(files("accept").len() >= 20, "the corpus has shrunk");
    assert_eq!(wrong_answers("accept"), Vec::<String>::new());
}

#[test]
fn each_rejected_certificate_meets_the_refusal_that_it_names() {
    assert!(files("reject").len() >= 40, "the corpus has shrunk");
    assert_eq!(wrong_answers("reject"), Vec::<String>::new());
}
