//! Charts of a sweep. No chart without its table beside it.

use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::output::far::Far;
use crate::output::fitted::Fitted;
use crate::output::ink;
use crate::output::measure::width;
use crate::output::words;
use crate::proof::Proof;
use crate::scenario::Scenario;
use crate::sweep::{Settling, SweepReport, WindowReport};
use crate::time::{Span, Unit};

/// Most panels of one chart.
pub const MOST_PANELS: usize = 12;
/// Size of a panel, pixels.
pub(super) const PANEL: (u32, u32) = (500, 230);
/// Height of title and notes, pixels.
pub(super) const HEAD: u32 = 34;
/// Most bars that get an outline.
const MOST_OUTLINED: usize = 24;
/// Font size that the backend turns into the small size of pictures: it divides by 1.24.
const SMALL: f64 = ink::SMALL * 1.24;

pub(super) type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
pub(super) type Drawn = Result<(), DrawingAreaErrorKind<std::io::Error>>;

/// The title of a picture.
pub(super) fn head(root: &Area<'_>, texts: &mut Fitted, title: &str) -> Drawn {
    let (wide, _) = root.dim_in_pixel();
    let title = texts.end(title, 14.0, (f64::from(wide) - 24.0) / 1.15);
    let bold = ("sans-serif", 14.0 * 1.24, FontStyle::Bold).into_font().color(&rgb(ink::INK));
    root.draw(&Text::new(title, (12, 8), bold))
}

/// A picture with what it says in words, for those who cannot see it.
pub(super) fn labelled(svg: &str, alternative: &str) -> String {
    let alternative = maud::html! { (words::clean(alternative)) }.into_string();
    svg.replacen("<svg ", &format!("<svg role=\"img\" aria-label=\"{alternative}\" "), 1)
}

type Axes = Cartesian2d<plotters::coord::types::RangedCoordf64, plotters::coord::types::RangedCoordf64>;

/// What is written at an axis: most labels, a number as a label, and what it shows.
pub(super) type Axis<'a> = (usize, &'a dyn Fn(&f64) -> String, String);

/// Quiet axes without a mesh.
pub(super) fn axes(chart: &mut ChartContext<'_, SVGBackend<'_>, Axes>, across: Axis<'_>, up: Axis<'_>) -> Drawn {
    chart
        .configure_mesh()
        .disable_x_mesh()
        .disable_y_mesh()
        .axis_style(rgb(ink::QUIET))
        .label_style(small())
        .axis_desc_style(small())
        .x_labels(across.0)
        .y_labels(up.0)
        .x_label_formatter(across.1)
        .y_label_formatter(up.1)
        .x_desc(across.2)
        .y_desc(up.2)
        .draw()
}

/// Settling-time histograms, one panel a step, at most [`MOST_PANELS`]; the caption names what is left out. Lines mark
/// median, 99th percentile and the limit from the rules. Where some windows settle, or lines lie, far beyond the others the
/// axis has a break, and what is behind it stands in its order, but not to scale.
/// [`tables::settling`](crate::output::tables::settling) and [`tables::settling_figures`](crate::output::tables::settling_figures)
/// have the numbers.
pub fn settling(scenario: &Scenario, report: &SweepReport) -> String {
    settling_with(scenario, report, None)
}

/// The same, with a line at the greatest settling time that a proof has for each step.
pub fn settling_with(scenario: &Scenario, report: &SweepReport, proof: Option<&Proof>) -> String {
    let panels: Vec<(&WindowReport, &Settling)> = report
        .windows
        .iter()
        .filter_map(|window| window.settling.as_ref().map(|settling| (window, settling)))
        .filter(|(_, settling)| !settling.bars.is_empty())
        .collect();
    let shown = &panels[..panels.len().min(MOST_PANELS)];
    let rows = shown.len().div_ceil(2) as u32;
    let size = (2 * PANEL.0, HEAD + rows.max(1) * PANEL.1 + if panels.len() > shown.len() { 24 } else { 4 });
    let (mut svg, mut texts) = (String::new(), Fitted::default());
    {
        let root = SVGBackend::with_string(&mut svg, size).into_drawing_area();
        draw(&root, &mut texts, scenario, report, proof, shown, &panels[shown.len()..]).expect("drawing into memory");
    }
    let alternative = alternative(scenario, shown, proof);
    labelled(&texts.titled(svg), &alternative)
}

fn draw(
    root: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    report: &SweepReport,
    proof: Option<&Proof>,
    shown: &[(&WindowReport, &Settling)],
    left_out: &[(&WindowReport, &Settling)],
) -> Drawn {
    root.fill(&WHITE)?;
    let draws = words::count(report.samples);
    let title = format!("{}: settling time (Monte Carlo, {draws} draws)", scenario.title);
    head(root, texts, &title)?;
    for (i, (window, settling)) in shown.iter().enumerate() {
        let (column, row) = (i as u32 % 2, i as u32 / 2);
        let corner = ((column * PANEL.0) as i32, (HEAD + row * PANEL.1) as i32);
        let area = root.clone().shrink(corner, PANEL);
        panel(&area, texts, scenario, proof, window, settling)?;
    }
    if shown.is_empty() {
        root.draw(&Text::new("No window settled.", (12, HEAD as i32), small()))?;
    }
    if !left_out.is_empty() {
        let steps: Vec<&str> = left_out.iter().filter_map(|it| words::step(scenario, Some(it.0.moment))).collect();
        let note = format!("Left out, but in settling.csv: {}", steps.join(", "));
        let note = texts.end(&note, ink::SMALL, 2.0 * f64::from(PANEL.0) - 24.0);
        let y = HEAD + (shown.len().div_ceil(2) as u32) * PANEL.1 + 4;
        root.draw(&Text::new(note, (12, y as i32), small()))?;
    }
    root.present()
}

/// One histogram.
fn panel(
    area: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    proof: Option<&Proof>,
    window: &WindowReport,
    settling: &Settling,
) -> Drawn {
    let mut marks = marks(scenario, window, settling);
    marks.extend(proved(proof, window.moment).map(|(at, label)| Mark { at, label, ink: ink::REST }));
    let far = Far::of(settling, &mut marks);
    let longest = marks.iter().map(|mark| mark.at).chain(settling.bars.iter().map(|bar| bar.1)).max();
    let unit = fitting(longest.unwrap_or_default(), scenario.unit);
    let value = |span: Span| span.fs() as f64 / unit.femtoseconds() as f64;
    let bars = far.common(settling);
    let (first, last) = (value(bars[0].0), value(bars[bars.len() - 1].1));
    let near = || marks.iter().filter(|mark| !far.has(mark.at)).map(|mark| value(mark.at));
    let (low, high) = (near().fold(first, f64::min), near().fold(last, f64::max));
    let margin = ((high - low) * 0.04).max(high * 1e-3 * f64::from(u8::from(bars.len() == 1))).max(1e-9);
    let range = (low - margin).max(0.0)..high + margin;
    let digits = digits(&range);
    let tallest = bars.iter().map(|bar| bar.2).max().unwrap_or(1);

    let label = words::step(scenario, Some(window.moment)).unwrap_or_default();
    let caption = texts.end(label, ink::BODY, f64::from(PANEL.0) - 80.0);
    area.draw(&Text::new(caption, (70, 0), ("sans-serif", ink::BODY * 1.24).into_font().color(&rgb(ink::INK))))?;
    let mut chart = ChartBuilder::on(area)
        .margin_top(18 + 14 * marks.len() as u32)
        .margin_right(16 + far.width())
        .margin_left(10)
        .margin_bottom(8)
        .set_label_area_size(LabelAreaPosition::Left, 60)
        .set_label_area_size(LabelAreaPosition::Bottom, 42)
        .build_cartesian_2d(range, 0.0..tallest as f64 * 1.05)?;
    let label = |x: &f64| match digits {
        Some(digits) => format!("{x:.digits$}"),
        None => words::three(*x),
    };
    axes(
        &mut chart,
        (7, &label, format!("settling time [{unit}]")),
        (4, &|y| words::count(*y as u64), "draws".to_string()),
    )?;
    let bar = |(from, below, count): &(Span, Span, u64)| [(value(*from), 0.0), (value(*below), *count as f64)];
    // outlines would fill narrow bars
    let narrow = bars.len() > MOST_OUTLINED;
    let fill = rgb(if narrow { ink::QUIET } else { ink::BAND });
    chart.draw_series(bars.iter().map(|it| Rectangle::new(bar(it), fill.filled())))?;
    if !narrow {
        let line = rgb(ink::INK).stroke_width(1);
        chart.draw_series(bars.iter().map(|it| Rectangle::new(bar(it), line)))?;
    }
    let origin = area.get_base_pixel();
    let at = |x: f64, y: f64| {
        let place = chart.backend_coord(&(x, y));
        (place.0 - origin.0, place.1 - origin.1)
    };
    let bottom = at(low, 0.0).1;
    let edge = at(high + margin, 0.0).0;
    let place = |span: Span| far.place(span, edge).unwrap_or_else(|| at(value(span), 0.0).0);
    let count = settling.bars.last().map_or(0.0, |bar| bar.2 as f64).min(tallest as f64);
    far.draw(area, edge, bottom, bottom - at(low, count).1)?;
    let boxes: Vec<(f64, f64)> =
        marks.iter().map(|mark| (f64::from(place(mark.at)), width(&mark.label, ink::SMALL))).collect();
    for (mark, spot) in marks.iter().zip(spots(&boxes, f64::from(PANEL.0))) {
        let x = place(mark.at);
        let y = 20 + 14 * spot.row as i32;
        area.draw(&PathElement::new(vec![(x, y + 2), (x, bottom)], rgb(mark.ink).stroke_width(2)))?;
        let (at, side) = if spot.leftwards { (x - 5, HPos::Right) } else { (x + 5, HPos::Left) };
        let text = ("sans-serif", SMALL).into_font().color(&rgb(mark.ink)).pos(Pos::new(side, VPos::Center));
        area.draw(&Text::new(mark.label.clone(), (at, y + 5), text))?;
    }
    Ok(())
}

/// Where a label stands: its row, 0 the highest, and on which side of its line.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
struct Spot {
    row: usize,
    leftwards: bool,
}

/// Rows and sides of the labels of a few lines (pixel, width of the label) such that as few lines as possible pass through
/// a label. A line begins in the row of its own label and goes down.
fn spots(lines: &[(f64, f64)], room: f64) -> Vec<Spot> {
    let many = lines.len();
    let mut best: (usize, Vec<Spot>) = (usize::MAX, vec![Spot::default(); many]);
    let ways = many.pow(many as u32) << many;
    for way in 0..ways {
        let mut rest = way >> many;
        let mut tried = Vec::with_capacity(many);
        for i in 0..many {
            tried.push(Spot { row: rest % many, leftwards: way >> i & 1 == 1 });
            rest /= many;
        }
        if tried.iter().enumerate().any(|(i, spot)| tried[..i].iter().any(|other| other.row == spot.row)) {
            continue;
        }
        let mut cost = 0;
        for (spot, (x, wide)) in tried.iter().zip(lines) {
            let (from, to) = if spot.leftwards { (x - 5.0 - wide, x - 4.0) } else { (x + 4.0, x + 5.0 + wide) };
            let outside = from < 4.0 || to > room - 4.0;
            let passing =
                tried.iter().zip(lines).filter(|(it, line)| it.row < spot.row && from < line.0 && line.0 < to);
            cost += 4 * passing.count() + if outside { 20 } else { usize::from(spot.leftwards) };
        }
        if cost < best.0 {
            best = (cost, tried);
        }
    }
    best.1
}

/// Decimals of the numbers on an axis that begins far from 0 for its length; `None`: three digits will do.
fn digits(range: &std::ops::Range<f64>) -> Option<usize> {
    let length = range.end - range.start;
    (length * 100.0 < range.end).then(|| libm::ceil(1.0 - libm::log10(length)).clamp(0.0, 9.0) as usize)
}

/// A labelled vertical line.
pub(super) struct Mark {
    pub at: Span,
    pub label: String,
    pub ink: &'static str,
}

fn marks(scenario: &Scenario, window: &WindowReport, settling: &Settling) -> Vec<Mark> {
    let at_least = |yes: bool| if yes { "≥ " } else { "" };
    let mut marks = Vec::new();
    if let Some(limit) = limit(scenario, window.moment) {
        marks.push(Mark { at: limit, label: format!("limit {}", limit.rounded()), ink: ink::FINDING });
    }
    let p99 = format!("99th percentile {}{}", at_least(settling.p99_at_least), settling.p99.rounded());
    marks.push(Mark { at: settling.p99, label: p99, ink: ink::INK });
    let median = format!("median {}{}", at_least(settling.median_at_least), settling.median.rounded());
    marks.push(Mark { at: settling.median, label: median, ink: ink::INK });
    marks
}

/// The greatest settling time that is proved for a moment, and its label.
fn proved(proof: Option<&Proof>, moment: u32) -> Option<(Span, String)> {
    let window = proof?.windows.iter().find(|window| window.moment == moment)?;
    let (_, most) = window.settling?;
    let below = if window.settling_below { "below " } else { "" };
    let ties = if window.settling_but_for_ties { ", but for ties" } else { "" };
    Some((most, format!("proved bound {below}{}{ties}", most.rounded())))
}

/// The settling limit of a moment, if the rules have one.
pub(super) fn limit(scenario: &Scenario, moment: u32) -> Option<Span> {
    let moment = scenario.stimulus.moments.get(moment as usize)?;
    let own = scenario.stimulus.step_of(moment).and_then(|step| step.settle_within);
    own.or(scenario.rules.settle_within)
}

/// The unit in which an axis up to `longest` has handy numbers.
pub(super) fn fitting(longest: Span, unit: Unit) -> Unit {
    let one = unit.femtoseconds();
    if (one..one.saturating_mul(100_000)).contains(&longest.fs()) {
        return unit;
    }
    Unit::ALL.into_iter().rev().find(|it| longest.fs() >= it.femtoseconds()).unwrap_or(Unit::Fs)
}

pub(super) fn small() -> TextStyle<'static> {
    ("sans-serif", SMALL).into_font().color(&rgb(ink::INK))
}

/// An ink as the backend takes it.
pub(super) fn rgb(ink: &str) -> RGBColor {
    let part = |at: usize| ink.get(at..at + 2).and_then(|hex| u8::from_str_radix(hex, 16).ok()).unwrap_or(0);
    RGBColor(part(1), part(3), part(5))
}

/// The chart in words, fit for an attribute.
fn alternative(scenario: &Scenario, shown: &[(&WindowReport, &Settling)], proof: Option<&Proof>) -> String {
    let each = shown.iter().map(|(window, settling)| {
        let step = words::step(scenario, Some(window.moment)).unwrap_or_default();
        let bound = proved(proof, window.moment).map_or_else(String::new, |(_, label)| format!(", {label}"));
        format!("{step}: median {}, 99th percentile {}{bound}", settling.median.rounded(), settling.p99.rounded())
    });
    format!("Settling time. {}.", each.collect::<Vec<_>>().join("; "))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_line_passes_a_label() {
        // two lines close together at the right edge, one far left
        let spots = spots(&[(440.0, 60.0), (470.0, 130.0), (200.0, 90.0)], 500.0);
        assert!(!spots[2].leftwards, "{spots:?}");
        assert!(spots[1].leftwards && spots[0].leftwards, "no room at the right: {spots:?}");
        assert!(spots[1].row < spots[0].row, "the label of the right line stands above the left line: {spots:?}");
    }

    #[test]
    fn the_unit_keeps_numbers_short() {
        assert_eq!(fitting(Span::from_fs(20_000_000), Unit::Ns), Unit::Ns);
        assert_eq!(fitting(Span::from_fs(20), Unit::Ns), Unit::Fs);
        assert_eq!(fitting(Span::from_fs(u64::MAX / 4), Unit::Ns), Unit::S);
    }
}
