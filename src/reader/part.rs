//! Files of parts of a sweep.

use std::fs::File;
use std::io::Read;
use std::path::Path;

use super::{Loaded, read};
use crate::findings::Asked;
use crate::scenario::Scenario;
use crate::sweep::{Part, Refusal};

/// Largest file of a part that is read, in bytes: 1 GiB.
pub const MAX_PART_BYTES: u64 = 1 << 30;

/// A part with the scenario that its text makes, with the draws that were asked for.
#[derive(Clone, Debug)]
pub struct LoadedPart {
    /// The part; [`Part::fits`] holds.
    pub part: Part,
    /// Its scenario.
    pub scenario: Scenario,
    /// What it asks.
    pub asked: Asked,
}

/// Reads the file of a part. Whether its figures can be is told by [`Part::fits`], against [`scenario_of`] it.
///
/// Errors: the file cannot be read, is larger than [`MAX_PART_BYTES`], or is not what was written, to the last byte.
pub fn read_part(path: &Path) -> Result<Part, Refusal> {
    let file = path.display().to_string();
    let refusal = |what: String, help: &str| Refusal::Damaged { file: file.clone(), what, help: help.to_string() };
    if path.is_dir() {
        return Err(refusal("this is a folder".into(), "name the files of parts in it"));
    }
    let mut bytes = Vec::new();
    let read = File::open(path).and_then(|file| file.take(MAX_PART_BYTES + 1).read_to_end(&mut bytes));
    if let Err(cause) = read {
        return Err(refusal(format!("this file cannot be read: {cause}"), "check the name and the folder"));
    }
    if bytes.len() as u64 > MAX_PART_BYTES {
        return Err(refusal("this file is larger than 1 GiB".into(), "sweep its samples in smaller parts"));
    }
    Part::from_bytes(&bytes).map_err(|damage| refusal(damage.to_string(), damage.help()))
}

/// The scenario of a part, made of its text.
///
/// Errors: the text is no scenario.
pub fn scenario_of(part: &Part, file: &str) -> Result<(Scenario, Asked), Refusal> {
    match read(&part.text, &part.name) {
        Ok(Loaded { mut scenario, .. }) => {
            part.overrides.apply(&mut scenario.plan);
            let asked = Asked::of(&scenario);
            Ok((scenario, asked))
        }
        Err(faults) => {
            let what = format!("the text in it is no scenario: {}", faults.items()[0].message);
            let help = "this program has not written it; make it again".to_string();
            Err(Refusal::Damaged { file: file.to_string(), what, help })
        }
    }
}

/// Reads the file of one part with its scenario.
///
/// Errors: those of [`read_part`] and [`scenario_of`], and figures that cannot be.
pub fn load_part(path: &Path) -> Result<LoadedPart, Refusal> {
    let part = read_part(path)?;
    let file = path.display().to_string();
    let (scenario, asked) = scenario_of(&part, &file)?;
    match part.fits(&scenario, &asked) {
        Ok(()) => Ok(LoadedPart { part, scenario, asked }),
        Err(what) => {
            let help = "this program has not written it; make it again".to_string();
            Err(Refusal::Damaged { file, what: format!("damaged: it holds {what}"), help })
        }
    }
}
