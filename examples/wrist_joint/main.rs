//! Settles the zones of the wrist joint from Rust and prints the certified margins.

use keepout::model::{Need, load};
use keepout_synthesis::{Options, Outcome, certify};
use std::path::Path;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("wrist_joint/model.toml");
    let model = load(&path, Need::Zones).map_err(|diagnostics| diagnostics.to_string())?;
    for (zone, name) in model.zones.iter().map(|z| &z.name).enumerate() {
        match certify(&model.statement(zone), &Options::default())? {
            Outcome::Clear { margin: Some(margin), .. } => println!("{name}: clear by {}", margin.certified),
            Outcome::Clear { margin: None, .. } => println!("{name}: clear"),
            Outcome::Enters { proof } | Outcome::Inseparable { proof } | Outcome::Eventually { proof } => {
                println!("{name}: not clear\n{}", proof.statement().words());
            }
            Outcome::Unsettled { reason, .. } => println!("{name}: not settled: {reason:?}"),
        }
    }
    Ok(())
}
