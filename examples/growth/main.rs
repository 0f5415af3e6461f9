//! How time and memory grow: with the network (`growth-states`, `growth-gates`), with the samples of a sweep
//! (`growth-samples`) and with the length of a trace (`growth-trace`), each a table and a picture in a folder.
//!
//! `cargo run --release --example growth -- docs` measures and draws all; names behind the folder (`states`, `gates`,
//! `samples`, `trace`) choose some, and with `drawn` behind it only the tables that are there are drawn.

#![allow(clippy::print_stdout)] // a measured process answers its parent

mod chart;
mod child;
mod gates;
#[path = "../../benches/measure.rs"]
mod measure;
mod models;
#[path = "../../benches/networks.rs"]
mod networks;
mod samples;
mod states;
mod trace;

use std::error::Error;
use std::path::Path;

type Measured = Result<(), Box<dyn Error>>;

/// Measures what a picture shows, or reads it where only drawing is asked, and draws it.
type Draws = fn(&Path, bool) -> Measured;

const PICTURES: [(&str, Draws); 4] =
    [("states", states::growth), ("gates", gates::growth), ("samples", samples::growth), ("trace", trace::growth)];

fn main() -> Measured {
    measure::answer_if_asked();
    child::answer_if_asked();
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let folder = Path::new(arguments.first().map_or(".", String::as_str));
    let words = arguments.get(1..).unwrap_or_default();
    if let Some(unknown) = words.iter().find(|word| *word != "drawn" && PICTURES.iter().all(|it| it.0 != **word)) {
        return Err(format!("there is no picture `{unknown}`; name states, gates, samples, trace, or drawn").into());
    }
    let anew = words.iter().all(|word| word != "drawn");
    let all = words.iter().all(|word| word == "drawn");
    for (name, growth) in PICTURES {
        if all || words.iter().any(|word| word == name) {
            growth(folder, anew)?;
        }
    }
    Ok(())
}
