//! How a sweep grows with its samples: `growth-samples.csv` and `growth-samples.svg`.

use std::error::Error;
use std::path::Path;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::sweep::run_samples;

use crate::chart::{Name, Panel, Point, RUST, Series, TEAL, page, power};
use crate::child::{ask, timed_again};
use crate::models::{divider, latch};

const SIZES: [u64; 4] = [1_000, 10_000, 100_000, 1_000_000];
const MODELS: [&str; 2] = ["latch", "divider"];

/// In the child: processor time and peak memory of a sweep on one thread, drawing and judging included.
pub fn measured(model: &str, samples: u64) -> Vec<f64> {
    let scenario = if model == "latch" { latch() } else { divider() };
    let control = Control::default();
    let program = Program::new(&scenario, &control).expect("it begins at rest");
    let asked = Asked::of(&scenario);
    let (seconds, tally) = timed_again(|| run_samples(&scenario, &program, &asked, 0..samples, 1, &control));
    assert_eq!(tally.samples, samples);
    vec![seconds, crate::measure::peak().unwrap_or(0.0)]
}

/// Measures the table, if need be, and draws it.
pub fn growth(folder: &Path, measured_anew: bool) -> Result<(), Box<dyn Error>> {
    let table = folder.join("growth-samples.csv");
    if measured_anew {
        let mut writer = csv::Writer::from_path(&table)?;
        writer.write_record(["network", "samples", "processor time [s]", "samples a second", "peak memory [MB]"])?;
        for (model, samples) in MODELS.iter().flat_map(|model| SIZES.map(|samples| (*model, samples))) {
            let n = ask("samples", model, samples);
            let rate = format!("{:.0}", samples as f64 / n[0]);
            let row = [model.to_string(), samples.to_string(), format!("{:.5}", n[0]), rate, format!("{:.1}", n[1])];
            writer.write_record(row)?;
            writer.flush()?;
        }
    }
    draw(&table, &folder.join("growth-samples.svg"))
}

fn draw(table: &Path, file: &Path) -> Result<(), Box<dyn Error>> {
    let rows: Vec<csv::StringRecord> = csv::Reader::from_path(table)?.records().collect::<Result<_, _>>()?;
    let series = |name: &'static str, column: usize, ink, open, place| {
        let point = |row: &csv::StringRecord| Some((row[1].parse().ok()?, row[column].parse().ok()?));
        let line: Vec<(f64, f64)> = rows.iter().filter(|row| row[0] == *name).filter_map(point).collect();
        let points = line.iter().map(|at| Point { at: *at, given_up: false }).collect();
        Series { name, ink, dashed: open, open, place, points, line }
    };
    let both = |column, places: [Name; 2]| {
        vec![series("latch", column, TEAL, false, places[0]), series("divider", column, RUST, true, places[1])]
    };
    let tens = |value: f64| format!("{value}");
    let across = || ("samples", 600.0..2e6, &power as &dyn Fn(f64) -> String);
    let panels = [
        Panel {
            across: across(),
            up: ("processor time [s]", 1e-4..100.0, &power),
            limit: None,
            series: both(2, [Name::Right, Name::Left]),
        },
        Panel {
            across: across(),
            up: ("peak memory [MB]", 1.0..1000.0, &tens),
            limit: None,
            series: both(4, [Name::Right, Name::Left]),
        },
    ];
    let note = "One thread, drawing and judging included. Latch of two NANDs: 8 transitions a sample; divider of six NANDs: \
                20 clock edges a sample.";
    let alternative = "Two log-log charts over the number of samples: processor time and peak memory of a sweep, for a \
                       latch and a divider. The numbers are in growth-samples.csv.";
    page(file, "A sweep over the number of samples", note, alternative, &panels)
}
