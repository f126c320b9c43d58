//! `hillpull-demo FOLDER [TABLE]`: writes the demo's DEMs into a folder, and the station table if a name is given.

use std::path::Path;

use anyhow::{Context, Result, bail};
use hillpull_demo::{
    dems::{self, FAR, FINE, REGIONAL},
    relief::Relief,
    stations,
};

fn main() -> Result<()> {
    let arguments: Vec<_> = std::env::args_os().skip(1).collect();
    let (folder, table) = match arguments.as_slice() {
        [folder] => (Path::new(folder), None),
        [folder, table] => (Path::new(folder), Some(Path::new(table))),
        _ => bail!("usage: hillpull-demo FOLDER [TABLE.csv]"),
    };
    std::fs::create_dir_all(folder).with_context(|| format!("creating {}", folder.display()))?;
    let relief = Relief::new();
    dems::write(
        &folder.join("fine.tif"),
        &FINE,
        dems::fine_heights(&relief),
        3,
    )?;
    dems::write(
        &folder.join("regional.tif"),
        &REGIONAL,
        dems::regional_heights(&relief),
        2,
    )?;
    dems::write(&folder.join("far.tif"), &FAR, dems::far_heights(&relief), 2)?;
    if let Some(table) = table {
        std::fs::write(table, stations::table(&stations::stations(&relief)))
            .with_context(|| format!("writing {}", table.display()))?;
    }
    Ok(())
}
