//! How the state set grows with the network: `growth-states.csv` and `growth-states.svg`.

use std::error::Error;
use std::path::Path;

use crate::chart::{INK, Limit, Name, Panel, Point, RUST, Series, TEAL, VIOLET, medians, page, power};
use crate::measure::{self, Network};

/// Nodes at which the state set gives up by default.
const BUDGET: f64 = (1 << 24) as f64;
/// What a state set should take at most, seconds.
const TARGET: f64 = 1.0;
/// Random networks of one size.
const SEEDS: u64 = 7;

/// A line of the table.
struct Row {
    network: String,
    gates: f64,
    /// seconds and nodes; nodes `None`: it gave up
    seconds: f64,
    nodes: Option<f64>,
}

/// Measures the table, if need be, and draws it.
pub fn growth(folder: &Path, measured_anew: bool) -> Result<(), Box<dyn Error>> {
    let table = folder.join("growth-states.csv");
    if measured_anew {
        measured(&table)?;
    }
    draw(&read(&table)?, &folder.join("growth-states.svg"))
}

fn networks() -> Vec<Network> {
    let mut all: Vec<Network> = (0..=9).map(|power| Network::Dividers(1 << power)).collect();
    all.extend([2, 3, 4, 6, 8, 12, 16, 20, 24].map(Network::Array));
    for gates in (50..=400).step_by(50) {
        all.extend((0..SEEDS).map(|seed| Network::Near { gates, seed }));
        all.extend((0..SEEDS).map(|seed| Network::Scattered { gates, seed }));
    }
    all
}

fn measured(table: &Path) -> Result<(), Box<dyn Error>> {
    let mut writer = csv::Writer::from_path(table)?;
    writer.write_record([
        "network",
        "size",
        "gates",
        "inputs",
        "feedback nets",
        "digits of the count [bit]",
        "time [s]",
        "nodes",
        "peak memory [MB]",
    ])?;
    for network in networks() {
        let (name, size) = match network {
            Network::Dividers(stages) => ("dividers", stages.to_string()),
            Network::Array(side) => ("array of latches", format!("{side}x{side}")),
            Network::Near { seed, .. } => ("random, near", format!("seed {seed}")),
            Network::Scattered { seed, .. } => ("random, scattered", format!("seed {seed}")),
        };
        let circuit = network.circuit();
        let cost = measure::cost(network);
        let gave_up = || "gave up".to_string();
        writer.write_record([
            name.to_string(),
            size,
            circuit.gate_count().to_string(),
            circuit.input_count().to_string(),
            circuit.feedback().len().to_string(),
            cost.nodes.map_or_else(gave_up, |_| cost.digits.to_string()),
            format!("{:.6}", cost.seconds),
            cost.nodes.map_or_else(gave_up, |nodes| nodes.to_string()),
            cost.megabytes.map_or(String::new(), |megabytes| format!("{megabytes:.1}")),
        ])?;
        writer.flush()?;
    }
    Ok(())
}

fn read(table: &Path) -> Result<Vec<Row>, Box<dyn Error>> {
    let mut rows = Vec::new();
    for record in csv::Reader::from_path(table)?.records() {
        let record = record?;
        rows.push(Row {
            network: record[0].to_string(),
            gates: record[2].parse()?,
            seconds: record[6].parse()?,
            nodes: record[7].parse().ok(),
        });
    }
    Ok(rows)
}

/// The families of the picture: name, ink, whether the line is dashed and the points open, where the name stands.
const FAMILIES: [(&str, plotters::style::RGBColor, bool, bool, Name); 4] = [
    ("dividers", INK, false, false, Name::Above),
    ("array of latches", TEAL, false, true, Name::Below),
    ("random, near", VIOLET, true, false, Name::Behind),
    ("random, scattered", RUST, true, true, Name::Behind),
];

fn draw(rows: &[Row], file: &Path) -> Result<(), Box<dyn Error>> {
    let series = |value: &dyn Fn(&Row) -> f64| -> Vec<Series> {
        FAMILIES
            .into_iter()
            .map(|(name, ink, dashed, open, place)| {
                let members = rows.iter().filter(|row| row.network == name);
                let points: Vec<Point> =
                    members.map(|row| Point { at: (row.gates, value(row)), given_up: row.nodes.is_none() }).collect();
                let line = medians(&points);
                Series { name, ink, dashed, open, place, points, line }
            })
            .collect()
    };
    let gates = |value: f64| format!("{value}");
    let panels = [
        Panel {
            across: ("gates", 5.0..10_000.0, &gates),
            up: ("processor time [s]", 1e-5..100.0, &power),
            limit: Some(Limit { value: TARGET, name: "target: 1 s" }),
            series: series(&|row| row.seconds),
        },
        Panel {
            across: ("gates", 5.0..10_000.0, &gates),
            up: ("nodes of the diagram", 10.0..1e8, &power),
            limit: Some(Limit { value: BUDGET, name: "budget: 2²⁴ nodes" }),
            series: series(&|row| row.nodes.unwrap_or(BUDGET)),
        },
    ];
    let note = "Random networks: 24 inputs, seven of each size, the line through their medians; a cross gave up at the budget.";
    let alternative = "Two log-log charts over the number of gates: processor time and nodes of the state set for chained \
                       dividers, arrays of latches, random networks with near and with scattered wiring. The numbers \
                       are in growth-states.csv.";
    page(file, "The state set over the size of the network", note, alternative, &panels)
}
