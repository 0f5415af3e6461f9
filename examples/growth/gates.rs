//! How building and running grow with the gates: `growth-gates.csv` and `growth-gates.svg`.

use std::error::Error;
use std::path::Path;

use stillgate::control::Control;
use stillgate::engine::{Deaf, Program};
use stillgate::instance::{Instance, Which};

use crate::chart::{Name, Panel, Point, RUST, Series, TEAL, medians, page, power};
use crate::child::{allocated, ask, fastest, timed, timed_again};
use crate::models::{Count, grid, rings};

const SIZES: [u64; 4] = [1_000, 10_000, 100_000, 1_000_000];
/// Transitions of a run of the rings.
const TRANSITIONS: u64 = 4_000_000;
/// Small networks are built so often that all together have as many gates as this.
const TOGETHER: u64 = 100_000;

const HEADER: [&str; 12] = [
    "network",
    "gates",
    "scenario [s]",
    "start state and plan [s]",
    "drawing a case [s]",
    "first run of a machine [s]",
    "events of a run",
    "run [ns an event]",
    "scenario [bytes a gate]",
    "plan and case [bytes a gate]",
    "machine [bytes a gate]",
    "peak memory [MB]",
];

/// In the child: all columns behind the gates.
pub fn measured(model: &str, gates: u64) -> Vec<f64> {
    let copies = TOGETHER.div_ceil(gates) as usize;
    let build = || match model {
        "rings" => rings(gates, TRANSITIONS),
        _ => grid(gates),
    };
    let control = Control::default();
    let each = |seconds: f64| seconds / copies as f64;
    let empty = allocated();
    let (scenario_time, scenarios) = timed(|| (0..copies).map(|_| build()).collect::<Vec<_>>());
    let built = allocated();
    let (program_time, programs) = timed(|| {
        let program = |scenario| Program::new(scenario, &control).expect("it begins at rest");
        scenarios.iter().map(program).collect::<Vec<_>>()
    });
    let (draw_time, cases) =
        timed(|| scenarios.iter().map(|it| Instance::of(it, &Which::Sample(7))).collect::<Vec<_>>());
    let planned = allocated();
    // the runs of the rings are as long for few gates as for many: one machine tells enough
    let first = || {
        let mut machine = programs[0].machine::<()>();
        assert!(machine.run(&cases[0], &control, &mut Deaf));
        machine
    };
    let (first_time, mut machine) = timed_again(first);
    let running = allocated();
    let mut count = Count::default();
    assert!(machine.run(&cases[0], &control, &mut count));
    assert!(count.0 as f64 > gates as f64 / 10.0, "it moves: {}", count.0);
    let runs = (TRANSITIONS / count.0).max(1);
    let run_time = fastest(3, || {
        let (seconds, ()) = timed(|| (0..runs).for_each(|_| assert!(machine.run(&cases[0], &control, &mut Deaf))));
        seconds / runs as f64
    });
    let per_gate = |bytes: f64, copies: usize| (bytes / (gates * copies as u64) as f64).max(0.0);
    vec![
        each(scenario_time),
        each(program_time),
        each(draw_time),
        first_time,
        count.0 as f64,
        run_time / count.0 as f64 * 1e9,
        per_gate(built - empty, copies),
        per_gate(planned - built, copies),
        per_gate(running - planned, 1),
        crate::measure::peak().unwrap_or(0.0),
    ]
}

/// Measures the table, if need be, and draws it.
pub fn growth(folder: &Path, measured_anew: bool) -> Result<(), Box<dyn Error>> {
    let table = folder.join("growth-gates.csv");
    if measured_anew {
        let mut writer = csv::Writer::from_path(&table)?;
        writer.write_record(HEADER)?;
        for (model, gates) in ["rings", "grid"].iter().flat_map(|model| SIZES.map(|gates| (*model, gates))) {
            let n = ask("gates", model, gates);
            let mut row = vec![model.to_string(), gates.to_string()];
            row.extend(n[..4].iter().map(|seconds| format!("{seconds:.6}")));
            row.extend([format!("{:.0}", n[4]), format!("{:.1}", n[5])]);
            row.extend(n[6..8].iter().map(|bytes| format!("{bytes:.0}")));
            row.extend([format!("{:.0}", n[8]), format!("{:.1}", n[9])]);
            writer.write_record(row)?;
            writer.flush()?;
        }
    }
    draw(&table, &folder.join("growth-gates.svg"))
}

fn draw(table: &Path, file: &Path) -> Result<(), Box<dyn Error>> {
    let rows: Vec<csv::StringRecord> = csv::Reader::from_path(table)?.records().collect::<Result<_, _>>()?;
    let series = |of: &str, column: &dyn Fn(&csv::StringRecord) -> Option<f64>, name, ink, open, place| {
        let value = |row: &csv::StringRecord| Some(((row[1].parse().ok()?, column(row)?), ()));
        let points: Vec<Point> = rows
            .iter()
            .filter(|row| row[0] == *of)
            .filter_map(value)
            .map(|(at, ())| Point { at, given_up: false })
            .collect();
        let line = medians(&points);
        Series { name, ink, dashed: of == "grid", open, place, points, line }
    };
    let number = |at: usize| move |row: &csv::StringRecord| row[at].parse::<f64>().ok();
    let building = |row: &csv::StringRecord| Some(number(2)(row)? + number(3)(row)? + number(4)(row)?);
    let bytes = |row: &csv::StringRecord| Some(number(8)(row)? + number(9)(row)? + number(10)(row)?);
    let gates = |value: f64| power(value);
    let tens = |value: f64| format!("{value}");
    let both = |column: &dyn Fn(&csv::StringRecord) -> Option<f64>, places: [Name; 2]| {
        vec![
            series("rings", column, "rings", TEAL, false, places[0]),
            series("grid", column, "grid", RUST, true, places[1]),
        ]
    };
    let across = || ("gates", 600.0..2e6);
    let panel = |up, range, text, series| Panel {
        across: (across().0, across().1, &gates),
        up: (up, range, text),
        limit: None,
        series,
    };
    let panels = [
        panel(
            "building a scenario, its plan and a case [s]",
            1e-4..100.0,
            &power as _,
            both(&building, [Name::Right, Name::Left]),
        ),
        panel("run [ns an event]", 1.0..10_000.0, &tens as _, both(&number(7), [Name::Right, Name::Left])),
        panel("memory [bytes a gate]", 10.0..10_000.0, &tens as _, both(&bytes, [Name::Right, Name::Left])),
    ];
    let note = "Rings of three inverting gates, tied together by XORs, all at work; a grid of 20 rows of XORs, four steps. \
                Straight lines of slope 1 are linear growth.";
    let alternative = "Three log-log charts over the number of gates: time to build, time an event, bytes a gate, for \
                       rings and a grid of XORs. The numbers are in growth-gates.csv.";
    page(file, "A single run over the number of gates", note, alternative, &panels)
}
