//! The look of the pictures: panels side by side, both axes logarithmic, lines named where they begin or end.

use std::error::Error;
use std::ops::Range;
use std::path::Path;

use plotters::coord::Shift;
use plotters::coord::combinators::LogCoord;
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

pub const INK: RGBColor = RGBColor(0x1d, 0x24, 0x30);
pub const TEAL: RGBColor = RGBColor(0x0b, 0x6b, 0x7d);
pub const VIOLET: RGBColor = RGBColor(0x7a, 0x3f, 0xa0);
pub const RUST: RGBColor = RGBColor(0xb3, 0x42, 0x0f);
const QUIET: RGBColor = RGBColor(0x8a, 0x93, 0xa0);
const SIZE: (u32, u32) = (1000, 470);
const HEAD: u32 = 44;

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Axes<'a, 'b> = ChartContext<'a, SVGBackend<'b>, Cartesian2d<LogCoord<f64>, LogCoord<f64>>>;

/// An axis: what it shows, from where to where, and how its numbers are written.
type Axis<'a> = (&'a str, Range<f64>, &'a dyn Fn(f64) -> String);

/// A panel.
pub struct Panel<'a> {
    pub across: Axis<'a>,
    pub up: Axis<'a>,
    pub limit: Option<Limit>,
    pub series: Vec<Series>,
}

/// A dashed line across.
pub struct Limit {
    pub value: f64,
    pub name: &'static str,
}

/// A measured point; `given_up`: drawn as a cross.
#[derive(Clone, Copy)]
pub struct Point {
    pub at: (f64, f64),
    pub given_up: bool,
}

/// Where the name of a line stands.
#[derive(Clone, Copy, PartialEq, Eq)]
pub enum Name {
    /// Over its begin.
    Above,
    /// Behind its first point, below.
    Below,
    /// Behind its end.
    Behind,
    /// Over its middle, to the left: free of a line that rises.
    Left,
    /// Under its middle, to the right.
    Right,
}

/// Points and a line.
pub struct Series {
    pub name: &'static str,
    pub ink: RGBColor,
    pub dashed: bool,
    pub open: bool,
    pub place: Name,
    pub points: Vec<Point>,
    pub line: Vec<(f64, f64)>,
}

fn text(size: f64, ink: RGBColor) -> TextStyle<'static> {
    // the backend divides sizes by 1.24
    ("sans-serif", size * 1.24).into_font().color(&ink)
}

/// Draws panels side by side.
pub fn page(
    file: &Path,
    title: &str,
    note: &str,
    alternative: &str,
    panels: &[Panel<'_>],
) -> Result<(), Box<dyn Error>> {
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, SIZE).into_drawing_area();
        root.fill(&WHITE)?;
        let bold = ("sans-serif", 14.0 * 1.24, FontStyle::Bold).into_font().color(&INK);
        root.draw(&Text::new(title, (12, 8), bold))?;
        root.draw(&Text::new(note, (12, 27), text(11.0, INK)))?;
        let (_, below) = root.split_vertically(HEAD);
        for (area, panel) in below.split_evenly((1, panels.len())).iter().zip(panels) {
            draw(area, panel)?;
        }
        root.present()?;
    }
    let svg = svg.replacen("<svg ", &format!("<svg role=\"img\" aria-label=\"{alternative}\" "), 1);
    Ok(std::fs::write(file, svg)?)
}

fn draw(area: &Area<'_>, panel: &Panel<'_>) -> Result<(), Box<dyn Error>> {
    let ((across, width, width_text), (up, height, height_text)) = (&panel.across, &panel.up);
    let mut chart = ChartBuilder::on(area)
        .margin(12)
        .margin_right(20)
        .x_label_area_size(40)
        .y_label_area_size(64)
        .build_cartesian_2d(width.clone().log_scale(), height.clone().log_scale())?;
    chart
        .configure_mesh()
        .light_line_style(TRANSPARENT)
        .bold_line_style(QUIET.mix(0.35))
        .axis_style(QUIET)
        .x_desc(*across)
        .y_desc(*up)
        .label_style(text(11.0, INK))
        .axis_desc_style(text(12.0, INK))
        .x_label_formatter(&|value| width_text(*value))
        .y_label_formatter(&|value| height_text(*value))
        .draw()?;
    if let Some(Limit { value, name }) = panel.limit {
        chart.draw_series(DashedLineSeries::new([(width.start, value), (width.end, value)], 6, 4, INK.into()))?;
        let above = Pos::new(HPos::Left, VPos::Bottom);
        chart.draw_series([Text::new(name, (width.start * 1.2, value * 1.15), text(11.0, INK).pos(above))])?;
    }
    for series in &panel.series {
        for Point { at, given_up } in &series.points {
            let style = if series.open { series.ink.stroke_width(1) } else { series.ink.filled() };
            match given_up {
                false => chart.draw_series([Circle::new(*at, 2, style)])?,
                true => chart.draw_series([Cross::new(*at, 4, series.ink.stroke_width(1))])?,
            };
        }
        line(&mut chart, series)?;
        name(&mut chart, series)?;
    }
    Ok(())
}

fn line(chart: &mut Axes<'_, '_>, series: &Series) -> Result<(), Box<dyn Error>> {
    let (points, style) = (series.line.iter().copied(), series.ink.stroke_width(2));
    if series.dashed {
        chart.draw_series(DashedLineSeries::new(points, 7, 4, style))?;
    } else {
        chart.draw_series(LineSeries::new(points, style))?;
    }
    Ok(())
}

fn name(chart: &mut Axes<'_, '_>, series: &Series) -> Result<(), Box<dyn Error>> {
    let (Some(&first), Some(&last)) = (series.line.first(), series.line.last()) else { return Ok(()) };
    let middle = series.line[series.line.len() / 2];
    let (place, side) = match series.place {
        Name::Above => ((first.0, first.1 * 5.0), (HPos::Left, VPos::Bottom)),
        Name::Below => ((first.0 * 1.7, first.1), (HPos::Left, VPos::Top)),
        Name::Behind => ((last.0 * 1.12, last.1), (HPos::Left, VPos::Center)),
        Name::Left => ((middle.0 * 0.9, middle.1 * 1.25), (HPos::Right, VPos::Bottom)),
        Name::Right => ((middle.0 * 1.1, middle.1 * 0.8), (HPos::Left, VPos::Top)),
    };
    let style = text(11.0, series.ink).pos(Pos::new(side.0, side.1));
    chart.draw_series([Text::new(series.name, place, style)])?;
    Ok(())
}

/// For each place across the median of the values, in order.
pub fn medians(points: &[Point]) -> Vec<(f64, f64)> {
    let mut points: Vec<(f64, f64)> = points.iter().map(|point| point.at).collect();
    points.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    points.chunk_by(|a, b| a.0 == b.0).map(|same| same[same.len() / 2]).collect()
}

/// A power of ten.
pub fn power(value: f64) -> String {
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
