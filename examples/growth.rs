//! How the state set grows with the network: writes `growth-states.csv` and `growth-states.svg` into a folder.
//!
//! `cargo run --release --example growth -- docs` measures and draws; with `drawn` behind it, it only draws the table that
//! is there.

#![allow(clippy::print_stdout)] // a measured process answers its parent

#[path = "../benches/measure.rs"]
mod measure;
#[path = "../benches/networks.rs"]
mod networks;

use std::error::Error;
use std::path::Path;

use measure::Network;
use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

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

fn main() -> Result<(), Box<dyn Error>> {
    measure::answer_if_asked();
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let folder = Path::new(arguments.first().map_or(".", String::as_str));
    let table = folder.join("growth-states.csv");
    if arguments.get(1).is_none_or(|word| word != "drawn") {
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

/// A family of networks: its name, its ink, whether its line is dashed and its points are open, where its name stands.
type Family = (&'static str, RGBColor, bool, bool, (HPos, VPos));

/// The families of the picture.
const FAMILIES: [Family; 4] = [
    ("dividers", INK, false, false, (HPos::Left, VPos::Bottom)),
    ("array of latches", RGBColor(0x0b, 0x6b, 0x7d), false, true, (HPos::Left, VPos::Top)),
    ("random, near", RGBColor(0x7a, 0x3f, 0xa0), true, false, (HPos::Left, VPos::Center)),
    ("random, scattered", RGBColor(0xb3, 0x42, 0x0f), true, true, (HPos::Left, VPos::Center)),
];
const INK: RGBColor = RGBColor(0x1d, 0x24, 0x30);
const QUIET: RGBColor = RGBColor(0x8a, 0x93, 0xa0);
const SIZE: (u32, u32) = (1000, 470);
const HEAD: u32 = 44;

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Axes<'a, 'b> = ChartContext<
    'a,
    SVGBackend<'b>,
    Cartesian2d<plotters::coord::combinators::LogCoord<f64>, plotters::coord::combinators::LogCoord<f64>>,
>;

fn text(size: f64, ink: RGBColor) -> TextStyle<'static> {
    // the backend divides sizes by 1.24
    ("sans-serif", size * 1.24).into_font().color(&ink)
}

fn draw(rows: &[Row], file: &Path) -> Result<(), Box<dyn Error>> {
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, SIZE).into_drawing_area();
        root.fill(&WHITE)?;
        let bold = ("sans-serif", 14.0 * 1.24, FontStyle::Bold).into_font().color(&INK);
        root.draw(&Text::new("The state set over the size of the network", (12, 8), bold))?;
        let note = "Random networks: 24 inputs, seven of each size, the line through their medians; a cross gave up at the budget.";
        root.draw(&Text::new(note, (12, 27), text(11.0, INK)))?;
        let (_, below) = root.split_vertically(HEAD);
        let (left, right) = below.split_horizontally(SIZE.0 / 2);
        panel(&left, rows, "processor time [s]", (1e-5, 100.0), (TARGET, "target: 1 s"), |row| row.seconds)?;
        let budget = (BUDGET, "budget: 2²⁴ nodes");
        panel(&right, rows, "nodes of the diagram", (10.0, 1e8), budget, |row| row.nodes.unwrap_or(BUDGET))?;
        root.present()?;
    }
    let alternative = "Two log-log charts over the number of gates: processor time and nodes of the state set for chained \
                       dividers, arrays of latches, random networks with near and with scattered wiring. The numbers \
                       are in growth-states.csv.";
    let svg = svg.replacen("<svg ", &format!("<svg role=\"img\" aria-label=\"{alternative}\" "), 1);
    Ok(std::fs::write(file, svg)?)
}

fn panel(
    area: &Area<'_>,
    rows: &[Row],
    title: &str,
    range: (f64, f64),
    (limit, limit_name): (f64, &'static str),
    value: impl Fn(&Row) -> f64,
) -> Result<(), Box<dyn Error>> {
    let mut chart = ChartBuilder::on(area)
        .margin(12)
        .margin_right(20)
        .x_label_area_size(40)
        .y_label_area_size(64)
        .build_cartesian_2d((5.0..10_000.0).log_scale(), (range.0..range.1).log_scale())?;
    chart
        .configure_mesh()
        .light_line_style(TRANSPARENT)
        .bold_line_style(QUIET.mix(0.35))
        .axis_style(QUIET)
        .x_desc("gates")
        .y_desc(title)
        .label_style(text(11.0, INK))
        .axis_desc_style(text(12.0, INK))
        .x_label_formatter(&|value| format!("{value}"))
        .y_label_formatter(&|value| power(*value))
        .draw()?;
    chart.draw_series(DashedLineSeries::new([(5.0, limit), (10_000.0, limit)], 6, 4, INK.into()))?;
    let above = Pos::new(HPos::Left, VPos::Bottom);
    chart.draw_series([Text::new(limit_name, (6.0, limit * 1.15), text(11.0, INK).pos(above))])?;
    for (family, ink, dashed, open, side) in FAMILIES {
        let members: Vec<&Row> = rows.iter().filter(|row| row.network == family).collect();
        for row in &members {
            let point = (row.gates, value(row));
            let style = if open { ink.stroke_width(1) } else { ink.filled() };
            match row.nodes {
                Some(_) => chart.draw_series([Circle::new(point, 2, style)])?,
                None => chart.draw_series([Cross::new(point, 4, ink.stroke_width(1))])?,
            };
        }
        let middle = medians(&members, &value);
        line(&mut chart, &middle, ink, dashed)?;
        // solid lines are named where they begin, the others where they end: there they are apart
        let place = match (middle.first(), middle.last(), side.1) {
            (Some(&(gates, value)), _, VPos::Bottom) => (gates, value * 5.0),
            (Some(&(gates, value)), _, VPos::Top) => (gates * 1.7, value),
            (_, Some(&(gates, value)), _) => (gates * 1.12, value),
            _ => continue,
        };
        chart.draw_series([Text::new(family, place, text(11.0, ink).pos(Pos::new(side.0, side.1)))])?;
    }
    Ok(())
}

/// For each number of gates the median of the values, by gates.
fn medians(members: &[&Row], value: &impl Fn(&Row) -> f64) -> Vec<(f64, f64)> {
    let mut points: Vec<(f64, f64)> = members.iter().map(|row| (row.gates, value(row))).collect();
    points.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    points.chunk_by(|a, b| a.0 == b.0).map(|same| same[same.len() / 2]).collect()
}

/// A power of ten.
fn power(value: f64) -> String {
    let digits = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    match value.log10().round() as i32 {
        0 => "1".to_string(),
        1 => "10".to_string(),
        power => {
            let sign = if power < 0 { "⁻" } else { "" };
            format!("10{sign}{}", digits[power.unsigned_abs() as usize % 10])
        }
    }
}

fn line(chart: &mut Axes<'_, '_>, points: &[(f64, f64)], ink: RGBColor, dashed: bool) -> Result<(), Box<dyn Error>> {
    let style = ink.stroke_width(2);
    if dashed {
        chart.draw_series(DashedLineSeries::new(points.iter().copied(), 7, 4, style))?;
    } else {
        chart.draw_series(LineSeries::new(points.iter().copied(), style))?;
    }
    Ok(())
}
