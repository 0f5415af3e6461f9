//! How the shares of a sweep come to rest, look by look: as a picture and as the table beside it.

use plotters::prelude::*;

use crate::findings::{Asked, Subject};
use crate::output::charts::{HEAD, MOST_PANELS, PANEL, rgb, small};
use crate::output::ink;
use crate::output::measure::cut_end;
use crate::output::tables;
use crate::output::words::{self, six};
use crate::scenario::{Condition, Scenario};
use crate::sweep::{Point, Stopped, SweepReport};

type Area<'a> = DrawingArea<SVGBackend<'a>, plotters::coord::Shift>;
type Drawn = Result<(), DrawingAreaErrorKind<std::io::Error>>;

/// One finding with its points, fewest samples first.
struct Line<'a> {
    condition: &'a str,
    subject: Subject,
    points: Vec<&'a Point>,
}

/// The findings of the curve: by condition, worst first as in the report.
fn lines<'a>(report: &'a SweepReport, stopped: &'a Stopped) -> Vec<Line<'a>> {
    let nominal = std::iter::once((Condition::NOMINAL, report));
    let cases = nominal.chain(report.conditions.iter().map(|it| (it.condition.name.as_str(), &it.sweep)));
    let mut lines = Vec::new();
    for (case, (condition, report)) in cases.enumerate() {
        for finding in &report.findings {
            let here = |it: &&Point| it.case as usize == case && it.subject == finding.subject;
            let points: Vec<&Point> = stopped.curve.points.iter().filter(here).collect();
            if !points.is_empty() {
                lines.push(Line { condition, subject: finding.subject, points });
            }
        }
    }
    lines
}

/// Shares with their intervals at each look: one row a finding and look, from the first look that has the finding.
///
/// Columns: condition, kind, shape, rule_name, pattern, net, step, samples (done at that look), count, of, unit (draws or
/// boards), share, interval_low, interval_high. Intervals hold at all looks together with 95 %.
pub fn csv(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    tables::write(|to| {
        to.write_record([
            "condition",
            "kind",
            "shape",
            "rule_name",
            "pattern",
            "net",
            "step",
            "samples",
            "count",
            "of",
            "unit",
            "share",
            "interval_low",
            "interval_high",
        ])?;
        let Some(stopped) = &report.stopped else { return Ok(()) };
        for line in lines(report, stopped) {
            let named = words::subject(scenario, asked, &line.subject);
            for point in line.points {
                let (low, high) = stopped.interval(point).map_or((String::new(), String::new()), |(low, high)| {
                    (six(low).to_string(), six(high).to_string())
                });
                to.write_record([
                    line.condition,
                    named.kind,
                    named.shape.unwrap_or_default(),
                    named.rule_name.unwrap_or_default(),
                    named.pattern.as_deref().unwrap_or_default(),
                    named.net.unwrap_or_default(),
                    named.step.unwrap_or_default(),
                    &point.samples.to_string(),
                    &point.count.to_string(),
                    &point.of.to_string(),
                    unit(report),
                    &six(share(point)).to_string(),
                    &low,
                    &high,
                ])?;
            }
        }
        Ok(())
    })
}

/// What shares are shares of.
fn unit(report: &SweepReport) -> &'static str {
    if report.plan.tries > 1 { "boards" } else { "draws" }
}

fn share(point: &Point) -> f64 {
    point.count as f64 / point.of.max(1) as f64
}

/// Shares with their 95 % intervals over the draws, both on log axes: one panel a finding, worst first, at most
/// [`MOST_PANELS`]; the caption says how many are left out. [`csv`] has the numbers.
pub fn svg(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    let all = report.stopped.as_ref().map_or_else(Vec::new, |stopped| lines(report, stopped));
    let shown = &all[..all.len().min(MOST_PANELS)];
    let left_out = all.len() - shown.len();
    let rows = shown.len().div_ceil(2).max(1) as u32;
    let foot = if left_out > 0 { 24 } else { 4 };
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, (2 * PANEL.0, HEAD + rows * PANEL.1 + foot)).into_drawing_area();
        draw(&root, scenario, asked, report, shown, left_out).expect("drawing into memory");
    }
    let each = shown.iter().filter_map(|line| {
        let last = line.points.last()?;
        Some(format!("{}: {}", title(scenario, asked, line), words::percent(share(last))))
    });
    let text = format!("Shares over the draws. {}.", each.collect::<Vec<_>>().join("; "));
    let alternative = maud::html! { (words::clean(&text)) }.into_string();
    svg.replacen("<svg ", &format!("<svg role=\"img\" aria-label=\"{alternative}\" "), 1)
}

/// `static-0 glitch, green, both let go`, and the condition where it is not the scenario's own delays.
fn title(scenario: &Scenario, asked: &Asked, line: &Line<'_>) -> String {
    let named = words::subject(scenario, asked, &line.subject);
    let mut text = named.shape.map_or_else(String::new, |shape| format!("{shape} "));
    text += named.kind;
    let place = named.rule_name.or(named.net).or(named.pattern.as_deref());
    for part in place.into_iter().chain(named.step) {
        text += &format!(", {part}");
    }
    if line.condition != Condition::NOMINAL {
        text += &format!(" (condition {})", line.condition);
    }
    text
}

fn draw(
    root: &Area<'_>,
    scenario: &Scenario,
    asked: &Asked,
    report: &SweepReport,
    shown: &[Line<'_>],
    left_out: usize,
) -> Drawn {
    root.fill(&WHITE)?;
    let room = 2.0 * f64::from(PANEL.0) - 24.0;
    let head = format!(
        "{}: shares of {} with 95 % intervals (Monte Carlo, {} draws)",
        scenario.title,
        unit(report),
        words::count(report.samples)
    );
    let head = words::clean(&head);
    let head = cut_end(&head, 14.0, room / 1.15).unwrap_or(head);
    let bold = ("sans-serif", 14.0 * 1.24, FontStyle::Bold).into_font().color(&rgb(ink::INK));
    root.draw(&Text::new(head, (12, 8), bold))?;
    for (i, line) in shown.iter().enumerate() {
        let (column, row) = (i as u32 % 2, i as u32 / 2);
        let corner = ((column * PANEL.0) as i32, (HEAD + row * PANEL.1) as i32);
        panel(&root.clone().shrink(corner, PANEL), scenario, asked, report, line)?;
    }
    if shown.is_empty() {
        root.draw(&Text::new("Nothing was found in any draw.", (12, HEAD as i32), small()))?;
    }
    if left_out > 0 {
        let note = format!("Left out, but in convergence.csv: {}", words::many(left_out as u64, "finding"));
        let y = HEAD + shown.len().div_ceil(2) as u32 * PANEL.1 + 4;
        root.draw(&Text::new(note, (12, y as i32), small()))?;
    }
    root.present()
}

/// Whole decades around some numbers above 0.
fn decades(numbers: impl Iterator<Item = f64> + Clone) -> (f64, f64) {
    let low = numbers.clone().fold(f64::INFINITY, f64::min);
    let high = numbers.fold(0.0, f64::max);
    let (from, to) = (libm::floor(libm::log10(low)), libm::ceil(libm::log10(high)));
    (libm::exp10(from), libm::exp10(to.max(from + 1.0)))
}

/// One finding.
fn panel(area: &Area<'_>, scenario: &Scenario, asked: &Asked, report: &SweepReport, line: &Line<'_>) -> Drawn {
    let Some(stopped) = &report.stopped else { return Ok(()) };
    let marks: Vec<(f64, f64, f64, f64)> = line
        .points
        .iter()
        .map(|point| {
            let (low, high) = stopped.interval(point).unwrap_or((0.0, 1.0));
            (point.samples as f64, share(point), low, high)
        })
        .collect();
    let text = words::clean(&title(scenario, asked, line));
    let caption = cut_end(&text, ink::BODY, f64::from(PANEL.0) - 90.0).unwrap_or(text);
    area.draw(&Text::new(caption, (70, 0), ("sans-serif", ink::BODY * 1.24).into_font().color(&rgb(ink::INK))))?;
    let (left, right) = decades(marks.iter().map(|it| it.0));
    let (bottom, top) = decades(marks.iter().flat_map(|it| [it.2, it.3]));
    let mut chart = ChartBuilder::on(area)
        .margin_top(22)
        .margin_right(24)
        .margin_left(10)
        .set_label_area_size(LabelAreaPosition::Left, 60)
        .set_label_area_size(LabelAreaPosition::Bottom, 42)
        .build_cartesian_2d((left..right).log_scale(), (bottom..top).log_scale())?;
    chart
        .configure_mesh()
        .disable_x_mesh()
        .disable_y_mesh()
        .axis_style(rgb(ink::QUIET))
        .label_style(small())
        .axis_desc_style(small())
        .x_labels(6)
        .y_labels(5)
        .x_label_formatter(&|x| words::count(x.round() as u64))
        .y_label_formatter(&|y| words::three(*y))
        .x_desc("draws")
        .y_desc(format!("share of {}", unit(report)))
        .draw()?;
    let line = rgb(ink::INK).stroke_width(1);
    for (x, share, low, high) in marks {
        chart.draw_series(std::iter::once(PathElement::new(vec![(x, low.max(bottom)), (x, high)], line)))?;
        for end in [low.max(bottom), high] {
            let (x, y) = chart.backend_coord(&(x, end));
            let origin = area.get_base_pixel();
            let (x, y) = (x - origin.0, y - origin.1);
            area.draw(&PathElement::new(vec![(x - 4, y), (x + 4, y)], line))?;
        }
        chart.draw_series(std::iter::once(Circle::new((x, share), 3, rgb(ink::INK).filled())))?;
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn axes_are_whole_decades() {
        let near = |(a, b): (f64, f64), (c, d): (f64, f64)| (a / c - 1.0).abs() < 1e-12 && (b / d - 1.0).abs() < 1e-12;
        assert!(near(decades([0.2, 0.3].into_iter()), (0.1, 1.0)));
        assert!(near(decades([1000.0].into_iter()), (1000.0, 10_000.0)));
        assert!(near(decades([0.003, 0.2].into_iter()), (0.001, 1.0)));
    }
}
