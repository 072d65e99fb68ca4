//! Settles the zones of `boom_release` from Rust: load the model, certify each zone, let the checker speak.

use keepout::model::{Need, load};
use keepout_synthesis::{Options, Outcome, certify};
use std::path::Path;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("boom_release/model.toml");
    let model = load(&path, Need::Zones).map_err(|diagnostics| diagnostics.to_string())?;
    for zone in 0..model.zones.len() {
        match certify(&model.statement(zone), &Options::default())? {
            Outcome::Clear { proof, .. } | Outcome::Enters { proof } => println!("{}", proof.statement().words()),
            Outcome::Unsettled { reason, .. } => println!("{}: not settled: {reason:?}", model.zones[zone].name),
        }
    }
    Ok(())
}
