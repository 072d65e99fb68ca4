//! `keepout certify --invariant DIR`: sets of safe starts, written beside their evidence.

use crate::set::{to_json, to_smt, to_words};
use keepout_checker::statement::{Claim, Statement};
use keepout_synthesis::{Options, Proof, RegionFailure, certify_region, explicit};
use std::panic::AssertUnwindSafe;
use std::path::Path;

/// The set for a zone, or why there is none.
pub(super) fn find(statement: &Statement, options: &Options) -> Result<Proof, String> {
    match std::panic::catch_unwind(AssertUnwindSafe(|| certify_region(statement, options))) {
        Ok(Ok(found)) => found.map_err(|failure| failure_words(failure).into()),
        Ok(Err(e)) => Err(e.to_string()),
        Err(_) => Err("a defect of this program stopped the search; please report the model".into()),
    }
}

fn failure_words(failure: RegionFailure) -> &'static str {
    match failure {
        RegionFailure::NotOfStates => {
            "the zone names an exponential, or an input that is no solution of linear equations"
        }
        RegionFailure::WindowEnds => "a set that is safe for ever has no window with `until`",
        RegionFailure::Exponents => "the exponents of the motion could not be separated or compared",
        RegionFailure::Meets => {
            "from each start that was tried, the set of all phases, with time and growth rates loosened to polynomial bounds, \
             may meet the zone: what keeps the trajectory out holds for itself alone, or by too small a margin"
        }
        RegionFailure::Effort => "the work allowed was used up",
    }
}

/// The line of the report.
pub(super) fn in_words(found: &Result<Proof, String>) -> String {
    match found {
        Ok(proof) => match &proof.statement().claim {
            Claim::Region(region) => format!("set of safe starts: holds the trajectory from t = {} on", region.from),
            Claim::Never { .. } | Claim::Enters { .. } | Claim::Eventually { .. } | Claim::Inseparable => String::new(),
        },
        Err(reason) => format!("no set of safe starts: {reason}"),
    }
}

/// Writes the set, its statement and its certificate; those of an earlier run do not stay where there is none.
pub(super) fn write(found: &Result<Proof, String>, zone: &str, folder: &Path) -> Result<(), String> {
    let failed = |path: &Path, e: std::io::Error| format!("cannot write {}: {e}", path.display());
    std::fs::create_dir_all(folder).map_err(|e| failed(folder, e))?;
    let proof = found.as_ref().ok();
    let set = proof.and_then(explicit);
    let texts = [
        ("set.statement.json", proof.map(|p| p.statement().to_json().print())),
        ("set.certificate.json", proof.map(|p| p.certificate().to_json().print())),
        ("set.json", proof.zip(set.as_ref()).map(|(p, set)| to_json(set, p.statement()))),
        ("set.smt2", proof.zip(set.as_ref()).map(|(p, set)| to_smt(set, p.statement()))),
        ("set.txt", proof.zip(set.as_ref()).map(|(p, set)| to_words(set, p.statement()))),
    ];
    for (what, text) in texts {
        let path = folder.join(format!("{zone}.{what}"));
        match text {
            Some(text) => std::fs::write(&path, text).map_err(|e| failed(&path, e))?,
            None if path.exists() => std::fs::remove_file(&path).map_err(|e| failed(&path, e))?,
            None => {}
        }
    }
    Ok(())
}
