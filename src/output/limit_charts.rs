//! The share of failing draws over the values of a parameter. [`limit_tables::limit`](super::limit_tables::limit) has the
//! numbers.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use super::charts::{Area, Drawn, axes, fitting, head, labelled, rgb, small};
use super::fitted::Fitted;
use super::ink;
use super::limit_words::{best, draws, sentence, value};
use super::measure::{cut_end, width};
use super::words;
use crate::limit::{LimitReport, Outcome, Point, model};
use crate::scenario::Scenario;
use crate::time::Span;

/// Size of the picture, pixels.
const SIZE: (u32, u32) = (820, 426);
/// Height of the title, pixels.
const HEAD: u32 = 34;
/// Height of the notes below, pixels.
const FOOT: u32 = 46;
/// Points with an interval that is shown as a bar, at most: more would be a smear.
const MOST_BARS: usize = 200;
/// Room for the label of the limit above the curve, pixels.
const ROOM: u32 = 34;

/// The share of failing draws over the values that were tried, with 95 % intervals; values that do not pass lie on grey
/// ground, the limit is a labelled line.
pub fn limit(scenario: &Scenario, report: &LimitReport) -> String {
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, SIZE).into_drawing_area();
        draw(&root, scenario, report).expect("drawing into memory");
    }
    labelled(&svg, &words::sentence(&sentence(scenario, report)))
}

fn draw(root: &Area<'_>, scenario: &Scenario, report: &LimitReport) -> Drawn {
    root.fill(&WHITE)?;
    let parameter = report.range.parameter.words(scenario);
    let room = f64::from(SIZE.0) - 24.0;
    head(root, &mut Fitted::default(), &format!("{}: {parameter}", scenario.title))?;
    let area = root.clone().shrink((0, HEAD), (SIZE.0, SIZE.1 - HEAD - FOOT));
    curve(&area, scenario, report, &parameter)?;
    let notes =
        [format!("Model: {}. {}.", model(scenario), draws(scenario, report.samples, report.alike)), marks(report)];
    for (line, note) in notes.iter().enumerate() {
        let note = words::clean(note);
        let note = cut_end(&note, ink::SMALL, room).unwrap_or(note);
        root.draw(&Text::new(note, (12, (SIZE.1 - FOOT + 8) as i32 + 16 * line as i32), small()))?;
    }
    root.present()
}

/// What the marks of the curve mean, as far as they occur.
fn marks(report: &LimitReport) -> String {
    let has = |outcome: Outcome| report.points.iter().any(|point| point.outcome == outcome);
    let mut parts = vec!["Dot: a value that was tried"];
    if report.points.iter().any(|point| point.interval.is_some()) {
        parts.push("bar: 95 % interval");
    }
    if has(Outcome::NotJudged) || has(Outcome::Unsettled) {
        parts.push("square: a rule not judged, or not settled");
    }
    if report.stretches.iter().any(|stretch| !stretch.passes) {
        parts.push("grey ground: does not pass");
    }
    parts.join("; ") + "."
}

fn curve(area: &Area<'_>, scenario: &Scenario, report: &LimitReport, parameter: &str) -> Drawn {
    let points = &report.points;
    let (Some(first), Some(last)) = (points.first(), points.last()) else { return Ok(()) };
    let longest = first.value.unsigned_abs().max(last.value.unsigned_abs());
    let unit = fitting(Span::from_fs(longest), scenario.unit);
    let x = |fs: i64| fs as f64 / unit.femtoseconds() as f64;
    let length = (x(last.value) - x(first.value)).max(f64::MIN_POSITIVE);
    let margin = length * 0.03;
    let (low, high) = (x(first.value) - margin, x(last.value) + margin);
    let mut chart = ChartBuilder::on(area)
        .margin_top(ROOM)
        .margin_right(24)
        .margin_left(10)
        .set_label_area_size(LabelAreaPosition::Left, 60)
        .set_label_area_size(LabelAreaPosition::Bottom, 42)
        .build_cartesian_2d(low..high, -4.0..104.0)?;
    // ground first, so that everything lies on it
    let ground = rgb(ink::BAND).filled();
    let mut grounds = Vec::new();
    for (n, stretch) in report.stretches.iter().enumerate() {
        let from = if n == 0 { low } else { (x(report.stretches[n - 1].to) + x(stretch.from)) / 2.0 };
        let next = report.stretches.get(n + 1);
        let to = next.map_or(high, |next| (x(stretch.to) + x(next.from)) / 2.0);
        grounds.push((from, to, stretch.passes));
    }
    let fails = grounds.iter().filter(|it| !it.2);
    chart.draw_series(fails.map(|(from, to, _)| Rectangle::new([(*from, -4.0), (*to, 104.0)], ground)))?;
    let (axis, description) = (words::clean(parameter), room_of(area));
    let axis = cut_end(&axis, ink::SMALL, description).unwrap_or(axis);
    axes(
        &mut chart,
        (9, &|x| words::three(*x), format!("{axis} [{unit}]")),
        (6, &|y| words::three(*y), "draws that fail [%]".to_string()),
    )?;
    let percent = |share: f64| share * 100.0;
    let at = |point: &Point| (x(point.value), percent(point.share()));
    let tried = || points.iter().filter(|point| point.refused.is_none());
    chart.draw_series(LineSeries::new(tried().map(at), rgb(ink::QUIET).stroke_width(1)))?;
    let with_interval = tried().filter_map(|point| point.interval.map(|interval| (point, interval)));
    let bars: Vec<_> = with_interval.take(MOST_BARS).collect();
    chart.draw_series(bars.iter().map(|(point, (low, high))| {
        let x = x(point.value);
        PathElement::new(vec![(x, percent(*low)), (x, percent(*high))], rgb(ink::INK).stroke_width(1))
    }))?;
    let is_open = |point: &&Point| matches!(point.outcome, Outcome::NotJudged | Outcome::Unsettled);
    let closed = tried().filter(|point| !is_open(point));
    chart.draw_series(closed.map(|point| Circle::new(at(point), 3, rgb(ink::INK).filled())))?;
    let square = |point: &Point| {
        let (line, fill) = (rgb(ink::INK).stroke_width(1), WHITE.filled());
        EmptyElement::at(at(point))
            + Rectangle::new([(-4, -4), (4, 4)], fill)
            + Rectangle::new([(-4, -4), (4, 4)], line)
    };
    chart.draw_series(tried().filter(is_open).map(square))?;

    let origin = area.get_base_pixel();
    let place = |at: (f64, f64)| {
        let (x, y) = chart.backend_coord(&at);
        (x - origin.0, y - origin.1)
    };
    for (from, to, passes) in &grounds {
        let word = if *passes { "passes" } else { "does not pass" };
        let (left, right) = (place((*from, 0.0)).0, place((*to, 0.0)).0);
        if f64::from(right - left) > width(word, ink::SMALL) + 6.0 {
            let text = small().pos(Pos::new(HPos::Center, VPos::Bottom));
            area.draw(&Text::new(word, ((left + right) / 2, ROOM as i32 - 2), text))?;
        }
    }
    if let Some(limit) = report.limit {
        let top = place((x(limit.passes), 104.0));
        let bottom = place((x(limit.passes), -4.0));
        area.draw(&PathElement::new(vec![(top.0, 4), bottom], rgb(ink::FINDING).stroke_width(2)))?;
        let label = format!("{} that passes: {}", best(report.range.parameter), value(scenario, limit.passes));
        let leftwards = f64::from(top.0) + width(&label, ink::SMALL) + 12.0 > room_of(area) + 80.0;
        let (side, x) = if leftwards { (HPos::Right, top.0 - 5) } else { (HPos::Left, top.0 + 5) };
        let red = rgb(ink::FINDING);
        let text = small().color(&red).pos(Pos::new(side, VPos::Center));
        area.draw(&Text::new(label, (x, 8), text))?;
    }
    Ok(())
}

/// Width of the plot itself, pixels.
fn room_of(area: &Area<'_>) -> f64 {
    f64::from(area.dim_in_pixel().0) - 94.0
}
