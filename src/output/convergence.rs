//! How the shares of a sweep come to rest, look by look: as a picture and as the table beside it.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::findings::{Asked, Subject};
use crate::output::charts::{self, Area, Drawn, HEAD, MOST_PANELS, PANEL, rgb, small};
use crate::output::fitted::Fitted;
use crate::output::ink;
use crate::output::log_axis::{stretch, ticks};
use crate::output::shares::{self, unit};
use crate::output::tables;
use crate::output::words::{self, six};
use crate::scenario::{Condition, Scenario};
use crate::sweep::{Point, Stopped, SweepReport};

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

fn share(point: &Point) -> f64 {
    point.count as f64 / point.of.max(1) as f64
}

/// Shares with their 95 % intervals over the draws, both on log axes: one panel a finding, worst first, at most
/// [`MOST_PANELS`]; the caption says how many are left out. [`csv()`] has the numbers.
pub fn svg(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    let all = report.stopped.as_ref().map_or_else(Vec::new, |stopped| lines(report, stopped));
    let shown = &all[..all.len().min(MOST_PANELS)];
    let left_out = all.len() - shown.len();
    let rows = shown.len().div_ceil(2).max(1) as u32;
    let foot = if left_out > 0 { 24 } else { 4 };
    let (mut svg, mut texts) = (String::new(), Fitted::default());
    {
        let root = SVGBackend::with_string(&mut svg, (2 * PANEL.0, HEAD + rows * PANEL.1 + foot)).into_drawing_area();
        draw(&root, &mut texts, scenario, asked, report, shown, left_out).expect("drawing into memory");
    }
    let each = shown.iter().filter_map(|line| {
        let last = line.points.last()?;
        Some(format!("{}: {}", title(scenario, asked, line), words::percent(share(last))))
    });
    let text = format!("Shares over the draws. {}.", each.collect::<Vec<_>>().join("; "));
    charts::labelled(&texts.titled(svg), &text)
}

/// `static-0 glitch, green, both let go`, and the condition where it is not the scenario's own delays.
fn title(scenario: &Scenario, asked: &Asked, line: &Line<'_>) -> String {
    let mut text = shares::title(scenario, asked, &line.subject);
    if line.condition != Condition::NOMINAL {
        text += &format!(" (condition {})", line.condition);
    }
    text
}

fn draw(
    root: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    asked: &Asked,
    report: &SweepReport,
    shown: &[Line<'_>],
    left_out: usize,
) -> Drawn {
    root.fill(&WHITE)?;
    let head = format!(
        "{}: shares of {} with 95 % intervals (Monte Carlo, {} draws)",
        scenario.title,
        unit(report),
        words::count(report.samples)
    );
    charts::head(root, texts, &head)?;
    for (i, line) in shown.iter().enumerate() {
        let (column, row) = (i as u32 % 2, i as u32 / 2);
        let corner = ((column * PANEL.0) as i32, (HEAD + row * PANEL.1) as i32);
        panel(&root.clone().shrink(corner, PANEL), texts, scenario, asked, report, line)?;
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

/// One finding.
fn panel(
    area: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    asked: &Asked,
    report: &SweepReport,
    line: &Line<'_>,
) -> Drawn {
    let Some(stopped) = &report.stopped else { return Ok(()) };
    let marks: Vec<(f64, f64, f64, f64)> = line
        .points
        .iter()
        .map(|point| {
            let (low, high) = stopped.interval(point).unwrap_or((0.0, 1.0));
            (point.samples as f64, share(point), low, high)
        })
        .collect();
    let caption = texts.end(&title(scenario, asked, line), ink::BODY, f64::from(PANEL.0) - 90.0);
    area.draw(&Text::new(caption, (70, 0), ("sans-serif", ink::BODY * 1.24).into_font().color(&rgb(ink::INK))))?;

    let (from_x, to_x) = stretch(marks.iter().map(|it| it.0));
    // a share that every draw shows has its lower end above 0, too
    let (from_y, to_y) = stretch(marks.iter().flat_map(|it| [it.2, it.3]).filter(|it| *it > 0.0));
    let (left, right, top, bottom) = (80.0, f64::from(PANEL.0) - 24.0, 26.0, f64::from(PANEL.1) - 48.0);
    let place = |x: f64, y: f64| -> (i32, i32) {
        let along = (libm::log10(x) - from_x) / (to_x - from_x);
        let up = (libm::log10(y.max(f64::MIN_POSITIVE)).max(from_y) - from_y) / (to_y - from_y);
        ((left + along * (right - left)).round() as i32, (bottom - up * (bottom - top)).round() as i32)
    };
    let (x0, x1, y0, y1) = (left as i32, right as i32, bottom as i32, top as i32);
    let quiet = rgb(ink::QUIET).stroke_width(1);
    area.draw(&PathElement::new(vec![(x0, y1), (x0, y0), (x1, y0)], quiet))?;
    let label = |side, upright| small().pos(Pos::new(side, upright));
    for tick in ticks(from_x, to_x) {
        let x = place(tick, 1.0).0;
        area.draw(&PathElement::new(vec![(x, y0), (x, y0 + 4)], quiet))?;
        area.draw(&Text::new(words::count(tick.round() as u64), (x, y0 + 8), label(HPos::Center, VPos::Top)))?;
    }
    for tick in ticks(from_y, to_y) {
        let y = place(1.0, tick).1;
        area.draw(&PathElement::new(vec![(x0 - 4, y), (x0, y)], quiet))?;
        area.draw(&Text::new(words::three(tick), (x0 - 8, y), label(HPos::Right, VPos::Center)))?;
    }
    let middle = ((left + right) / 2.0).round() as i32;
    area.draw(&Text::new("draws", (middle, y0 + 24), label(HPos::Center, VPos::Top)))?;
    let turned = small().transform(FontTransform::Rotate270).pos(Pos::new(HPos::Center, VPos::Center));
    area.draw(&Text::new(format!("share of {}", unit(report)), (14, (y0 + y1) / 2), turned))?;

    let thin = rgb(ink::INK).stroke_width(1);
    for (x, share, low, high) in marks {
        let ((x, middle), lower, upper) = (place(x, share), place(x, low).1, place(x, high).1);
        area.draw(&PathElement::new(vec![(x, lower), (x, upper)], thin))?;
        for end in [lower, upper] {
            area.draw(&PathElement::new(vec![(x - 4, end), (x + 4, end)], thin))?;
        }
        area.draw(&Circle::new((x, middle), 3, rgb(ink::INK).filled()))?;
    }
    Ok(())
}
