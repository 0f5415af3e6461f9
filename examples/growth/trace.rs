//! How a single run grows with its length: `growth-trace.csv` and `growth-trace.svg`.

use std::error::Error;
use std::fs::File;
use std::io::BufWriter;
use std::path::Path;

use stillgate::control::Control;
use stillgate::engine::{Deaf, Program};
use stillgate::findings::Asked;
use stillgate::instance::{Instance, Which};
use stillgate::output::waves::Overflow;
use stillgate::review::{MOST_KEPT, run_heard};

use crate::chart::{Name, Panel, Point, RUST, Series, TEAL, page, power};
use crate::child::{ask, timed_again};
use crate::models::rings;

const SIZES: [u64; 7] = [10_000, 100_000, 300_000, 1_000_000, 3_000_000, 10_000_000, 30_000_000];
/// Gates of the rings.
const GATES: u64 = 64;
const MODELS: [&str; 2] = ["kernel alone", "judged, kept and written"];

/// In the child: processor time, peak memory and bytes of the table of a run with so many transitions.
pub fn measured(model: &str, transitions: u64) -> Vec<f64> {
    let scenario = rings(GATES, transitions);
    let control = Control::default();
    let program = Program::new(&scenario, &control).expect("it begins at rest");
    let mut bytes = 0;
    let seconds = if model == "kernel" {
        let case = Instance::of(&scenario, &Which::Sample(7));
        let mut machine = program.machine::<()>();
        timed_again(|| assert!(machine.run(&case, &control, &mut Deaf))).0
    } else {
        let asked = Asked::of(&scenario);
        let file = std::env::temp_dir().join(format!("stillgate-growth-{}.csv", std::process::id()));
        let (seconds, ()) = timed_again(|| {
            let open = || Ok(BufWriter::new(File::create(&file)?));
            let table = Overflow::new(&scenario, MOST_KEPT as usize, open, &|| panic!("the table cannot be written"));
            let (report, table) = run_heard(&scenario, &program, &asked, Which::Sample(7), &control, table);
            let (_, rows) = table.finish(true).expect("it can be written").expect("it is there");
            assert!(rows >= transitions && report.is_some(), "{rows}");
        });
        bytes = std::fs::metadata(&file).map_or(0, |it| it.len());
        std::fs::remove_file(&file).expect("it was just written");
        seconds
    };
    vec![seconds, crate::measure::peak().unwrap_or(0.0), bytes as f64]
}

/// Measures the table, if need be, and draws it.
pub fn growth(folder: &Path, measured_anew: bool) -> Result<(), Box<dyn Error>> {
    let table = folder.join("growth-trace.csv");
    if measured_anew {
        let mut writer = csv::Writer::from_path(&table)?;
        writer.write_record(["run", "transitions", "processor time [s]", "peak memory [MB]", "table [MB]"])?;
        for (model, size) in MODELS.iter().flat_map(|model| SIZES.map(|size| (*model, size))) {
            let first = model.split([' ', ',']).next().expect("a word");
            let n = ask("trace", first, size);
            let megabytes = format!("{:.1}", n[2] / 1e6);
            let row = [model.to_string(), size.to_string(), format!("{:.5}", n[0]), format!("{:.1}", n[1]), megabytes];
            writer.write_record(row)?;
            writer.flush()?;
        }
    }
    draw(&table, &folder.join("growth-trace.svg"))
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
        vec![series(MODELS[0], column, TEAL, false, places[0]), series(MODELS[1], column, RUST, true, places[1])]
    };
    let tens = |value: f64| format!("{value}");
    let across = || ("transitions of the run", 6_000.0..6e7, &power as &dyn Fn(f64) -> String);
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
            series: both(3, [Name::Right, Name::Left]),
        },
    ];
    let note = "64 gates in rings, all at work. Kept: the first million transitions, for pictures; written: a table of all of \
                them, on disk, while the run goes on.";
    let alternative = "Two log-log charts over the number of transitions of one run: processor time and peak memory, of the \
                       kernel alone and with judges, trace and a table on disk. The numbers are in growth-trace.csv.";
    page(file, "A single run over its length", note, alternative, &panels)
}
