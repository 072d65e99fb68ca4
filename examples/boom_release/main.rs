//! Evidence as another program would use it: written, read back, re-checked, and refused once it is tampered with.

use keepout::model::{Need, load};
use keepout_checker::certificate::Certificate;
use keepout_checker::{Limits, check};
use keepout_synthesis::{Options, Outcome, certify};
use std::path::Path;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("boom_release/model.toml");
    let model = load(&path, Need::Zones).map_err(|diagnostics| diagnostics.to_string())?;
    let Outcome::Clear { proof, .. } = certify(&model.statement(0), &Options::default())? else {
        return Err("the panel is expected to be clear".into());
    };
    let text = proof.certificate().to_json().print();

    let limits = Limits::default();
    let read = Certificate::from_json(&text, &limits)?;
    let verified = check(proof.statement(), &read, &limits)?;
    println!("{}", verified.statement().words());

    // One sign the other way round: the checker says which obligation is false.
    let tampered = Certificate::from_json(&text.replace("0:+", "0:-"), &limits)?;
    match check(proof.statement(), &tampered, &limits) {
        Ok(_) => Err("a tampered certificate was accepted".into()),
        Err(rejection) => {
            println!("tampered: {rejection}");
            Ok(())
        }
    }
}
