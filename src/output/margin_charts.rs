//! How the margins of rules spread over the draws. [`margins::csv`](super::margins::csv) has the numbers.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use super::charts::{Area, Drawn, HEAD, MOST_PANELS, axes, fitting, head, labelled, rgb, small};
use super::fitted::Fitted;
use super::ink;
use super::margins::{BARS, OfRule, of_rules};
use super::words;
use crate::scenario::Scenario;
use crate::sweep::SweepReport;
use crate::time::{Span, rounded};

/// Size of a panel, pixels.
const PANEL: (u32, u32) = (500, 264);
/// Height of a line of text, pixels.
const LINE: u32 = 16;
/// Most rules without a margin that are named.
const MOST_NAMED: usize = 8;
/// Narrower bars get no outline, pixels.
const OUTLINED: f64 = 12.0;
/// The least height of a bar, as a share of the highest: one draw of very many can be seen.
const LEAST_HEIGHT: f64 = 0.012;
/// Space at the left of the axis, pixels: margin and labels.
const LEFT: (u32, u32) = (10, 60);
/// Top of the axis within a panel, pixels.
const TOP: u32 = 80;
/// Room at the left and right of the axis for the words beside its marks, pixels.
const SIDE: u32 = 40;

/// One histogram a rule that measures times, at most [`MOST_PANELS`], the least margins first; the margins of the steps of
/// a rule are drawn together. Left of the line at 0 the rule is broken; a dashed line is at the least margin. Rules
/// without any margin, and those that are left out, are named below.
pub fn svg(scenario: &Scenario, report: &SweepReport) -> String {
    let rules = of_rules(report);
    let some = rules.iter().take_while(|it| !it.margins.is_empty()).count();
    let (drawn, none) = rules.split_at(some);
    let (shown, left_out) = drawn.split_at(some.min(MOST_PANELS));
    let mut notes = notes(scenario, left_out, none);
    if rules.is_empty() {
        notes.push("No rule measures times.".to_string());
    }
    let rows = shown.len().div_ceil(2) as u32;
    let size = (2 * PANEL.0, HEAD + rows * PANEL.1 + LINE * notes.len() as u32 + 10);
    let (mut svg, mut texts) = (String::new(), Fitted::default());
    {
        let root = SVGBackend::with_string(&mut svg, size).into_drawing_area();
        draw(&root, &mut texts, scenario, report, shown, &notes).expect("drawing into memory");
    }
    labelled(&texts.titled(svg), &alternative(scenario, shown, &notes))
}

/// What has no panel, in lines.
fn notes(scenario: &Scenario, left_out: &[OfRule<'_>], none: &[OfRule<'_>]) -> Vec<String> {
    let mut notes = Vec::new();
    if !left_out.is_empty() {
        let titles: Vec<String> = left_out.iter().map(|it| it.title(scenario)).collect();
        notes.push(format!("Left out, but in margins.csv: {}", titles.join(", ")));
    }
    for rule in none.iter().take(MOST_NAMED) {
        let why = rule.without();
        let why = if why.is_empty() { String::new() } else { format!(": {why}") };
        notes.push(format!("No margin of {}{why}", rule.title(scenario)));
    }
    if none.len() > MOST_NAMED {
        let more = words::many((none.len() - MOST_NAMED) as u64, "more rule");
        notes.push(format!("No margin of {more}; margins.csv has all"));
    }
    notes
}

fn draw(
    root: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    report: &SweepReport,
    shown: &[OfRule<'_>],
    notes: &[String],
) -> Drawn {
    root.fill(&WHITE)?;
    let draws = words::many(report.samples, "draw");
    head(root, texts, &format!("{}: margins of rules (Monte Carlo, {draws})", scenario.title))?;
    for (i, rule) in shown.iter().enumerate() {
        let (column, row) = (i as u32 % 2, i as u32 / 2);
        let corner = ((column * PANEL.0) as i32, (HEAD + row * PANEL.1) as i32);
        panel(&root.clone().shrink(corner, PANEL), texts, scenario, rule)?;
    }
    let from = HEAD + shown.len().div_ceil(2) as u32 * PANEL.1;
    for (i, note) in notes.iter().enumerate() {
        let note = texts.end(note, ink::SMALL, 2.0 * f64::from(PANEL.0) - 24.0);
        root.draw(&Text::new(note, (12, (from + LINE * i as u32) as i32), small()))?;
    }
    root.present()
}

/// One histogram.
fn panel(area: &Area<'_>, texts: &mut Fitted, scenario: &Scenario, rule: &OfRule<'_>) -> Drawn {
    let (wide, bars) = rule.margins.bars(BARS);
    let (Some(first), Some(last), Some((least, _))) = (bars.first(), bars.last(), rule.least) else { return Ok(()) };
    let longest = first.0.unsigned_abs().max(last.1.unsigned_abs());
    let unit = fitting(Span::from_fs(u64::try_from(longest).unwrap_or(u64::MAX)), scenario.unit);
    let value = |fs: i128| fs as f64 / unit.femtoseconds() as f64;
    let (low, high) = (value(first.0.min(0)), value(last.1.max(0)));
    // as many pixels of room on both sides as the words beside the marks need
    let pixels = f64::from(PANEL.0 - LEFT.0 - LEFT.1 - 16);
    let room = (high - low) * f64::from(SIDE) / (pixels - 2.0 * f64::from(SIDE));
    let tallest = bars.iter().map(|bar| bar.2).max().unwrap_or(1);

    let lines = [(rule.title(scenario), ink::BODY), (rule.figures(scenario), ink::SMALL), (rule.without(), ink::SMALL)];
    for (i, (text, size)) in lines.into_iter().enumerate() {
        let text = texts.end(&text, size, f64::from(PANEL.0) - 78.0);
        let font = ("sans-serif", size * 1.24).into_font().color(&rgb(ink::INK));
        area.draw(&Text::new(text, ((LEFT.0 + LEFT.1) as i32, 15 * i as i32), font))?;
    }
    let mut chart = ChartBuilder::on(area)
        .margin_top(TOP)
        .margin_bottom(14)
        .margin_right(16)
        .margin_left(LEFT.0)
        .set_label_area_size(LabelAreaPosition::Left, LEFT.1)
        .set_label_area_size(LabelAreaPosition::Bottom, 42)
        .build_cartesian_2d(low - room..high + room, 0.0..tallest as f64 * 1.05)?;
    axes(
        &mut chart,
        (7, &|x| words::three(*x), format!("margin [{unit}], in bars of {}", rounded(wide))),
        (4, &|y| words::count(*y as u64), "draws".to_string()),
    )?;
    let height = |count: u64| (count as f64).max(tallest as f64 * LEAST_HEIGHT);
    let bar = |(from, below, count): &(i128, i128, u64)| [(value(*from), 0.0), (value(*below), height(*count))];
    // outlines would fill narrow bars
    let narrow = value(wide) / (high - low + 2.0 * room) * pixels < OUTLINED;
    let kept = rgb(if narrow { ink::QUIET } else { ink::BAND });
    let fill = |it: &(i128, i128, u64)| if it.0 < 0 { rgb(ink::FINDING) } else { kept }.filled();
    chart.draw_series(bars.iter().map(|it| Rectangle::new(bar(it), fill(it))))?;
    if !narrow {
        let line = rgb(ink::INK).stroke_width(1);
        chart.draw_series(bars.iter().map(|it| Rectangle::new(bar(it), line)))?;
    }
    let origin = area.get_base_pixel();
    let place = |fs: i128| {
        let (x, y) = chart.backend_coord(&(value(fs), 0.0));
        (x - origin.0, y - origin.1)
    };
    let (zero, bottom) = place(0);
    let top = TOP as i32;
    area.draw(&PathElement::new(vec![(zero, top - 32), (zero, bottom)], rgb(ink::INK).stroke_width(2)))?;
    label(area, "broken", (zero - 5, top - 26), HPos::Right, ink::FINDING)?;
    label(area, "kept", (zero + 5, top - 26), HPos::Left, ink::INK)?;
    let (x, _) = place(least);
    let ink = if least < 0 { ink::FINDING } else { ink::INK };
    for y in ((top - 16)..bottom).step_by(7) {
        area.draw(&PathElement::new(vec![(x, y), (x, (y + 4).min(bottom))], rgb(ink).stroke_width(1)))?;
    }
    // away from the line at 0
    let (at, side) = if least < 0 { (x - 4, HPos::Right) } else { (x + 4, HPos::Left) };
    label(area, "least", (at, top - 10), side, ink)
}

fn label(area: &Area<'_>, text: &'static str, at: (i32, i32), side: HPos, ink: &str) -> Drawn {
    let style = ("sans-serif", ink::SMALL * 1.24).into_font().color(&rgb(ink)).pos(Pos::new(side, VPos::Center));
    area.draw(&Text::new(text, at, style))
}

/// The chart in words.
fn alternative(scenario: &Scenario, shown: &[OfRule<'_>], notes: &[String]) -> String {
    let each = shown.iter().map(|it| {
        let more = it.without();
        let more = if more.is_empty() { more } else { format!("; {more}") };
        format!("{}: {}{more}", it.title(scenario), it.figures(scenario))
    });
    let all: Vec<String> = each.chain(notes.iter().cloned()).map(|it| words::sentence(&it)).collect();
    format!("Margins of rules. {}", all.join(" "))
}
