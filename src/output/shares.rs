//! How often each finding comes: a picture of shares with their intervals, and the table beside it.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::findings::{Asked, Subject};
use crate::output::charts::{self, Area, Drawn, HEAD, rgb, small};
use crate::output::fitted::Fitted;
use crate::output::ink;
use crate::output::log_axis::{stretch, ticks};
use crate::output::tables;
use crate::output::words::{self, six};
use crate::scenario::{Condition, Scenario};
use crate::sweep::{Finding, SweepReport};

/// Most rows of the picture.
pub const MOST_ROWS: usize = 30;
/// Width of the picture, pixels.
const WIDE: u32 = 1000;
/// Height of a row, pixels.
const ROW: u32 = 20;
/// Left and right end of the axis, pixels.
const AXIS: (f64, f64) = (360.0, 760.0);
/// Height of axis and notes, pixels; of a note on what is left out.
const FOOT: (u32, u32) = (72, 15);

/// What is known of how often something comes.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Figure {
    /// In so many of so many, with the interval of the share where there is one.
    Counted { count: u64, of: u64, interval: Option<(f64, f64)> },
    /// In none of so many, so its share is at most this (one-sided).
    AtMost { share: f64, of: u64 },
    /// Something of which it is not known what it is: its share as estimated, and at most.
    Unseen { once: u64, of: u64, upper: f64 },
    /// No share can be told.
    None,
}

/// One row.
struct Row<'a> {
    label: String,
    subject: Option<Subject>,
    condition: &'a str,
    breaks_rule: bool,
    figure: Figure,
    /// What the share is, in the words of the table.
    is: &'static str,
}

fn figure(report: &SweepReport, finding: &Finding) -> Figure {
    if finding.share.is_none() {
        return Figure::None;
    }
    match finding.boards {
        Some(boards) => Figure::Counted { count: boards.failing, of: boards.of, interval: boards.interval },
        None if report.plan.tries > 1 => Figure::None,
        None => Figure::Counted { count: finding.count, of: finding.of, interval: finding.interval },
    }
}

/// The findings of one sweep, worst first, then what was never seen.
fn rows<'a>(scenario: &Scenario, asked: &Asked, condition: &'a str, report: &SweepReport) -> Vec<Row<'a>> {
    let each = report.findings.iter().map(|finding| Row {
        label: title(scenario, asked, &finding.subject),
        subject: Some(finding.subject),
        condition,
        breaks_rule: finding.breaks_rule,
        figure: figure(report, finding),
        is: if finding.sample.is_some() { "seen in draws" } else { "seen in no draw" },
    });
    let mut rows: Vec<Row<'a>> = each.collect();
    let mut bound = |label: String, is, figure| {
        rows.push(Row { label, subject: None, condition, breaks_rule: false, figure, is });
    };
    if let Some(it) = report.at_most {
        let figure = Figure::AtMost { share: it.share, of: it.of };
        bound("a rule broken".to_string(), "no rule was broken", figure);
    }
    if let Some(it) = report.unseen {
        let step = words::step(scenario, Some(it.moment)).unwrap_or_default();
        let figure = Figure::Unseen { once: it.once, of: it.of, upper: it.upper };
        bound(format!("an order of events not seen yet, {step}"), "not seen yet", figure);
    }
    rows
}

/// Is there any row for the file's own delays?
pub(super) fn has_rows(report: &SweepReport) -> bool {
    !report.findings.is_empty() || report.at_most.is_some() || report.unseen.is_some()
}

/// `static-0 glitch, green, both let go`.
pub(super) fn title(scenario: &Scenario, asked: &Asked, subject: &Subject) -> String {
    let named = words::subject(scenario, asked, subject);
    let mut text = named.shape.map_or_else(String::new, |shape| format!("{shape} "));
    text += named.kind;
    let place = named.rule_name.or(named.net).or(named.pattern.as_deref());
    for part in place.into_iter().chain(named.step) {
        text += &format!(", {part}");
    }
    text
}

/// What shares are shares of.
pub(super) fn unit(report: &SweepReport) -> &'static str {
    if report.plan.tries > 1 { "boards" } else { "draws" }
}

fn share(count: u64, of: u64) -> f64 {
    count as f64 / of.max(1) as f64
}

/// Shares with their 95 % intervals: one row a finding, worst first, those of each condition after those of the file's own
/// delays; then, where no rule was broken, how often one may be at most.
///
/// Columns: condition, kind, shape, rule_name, pattern, net, step, breaks_rule, is (`seen in draws`, `seen in no draw`, `no
/// rule was broken`, `not seen yet`: an order of events that no draw had, its count that of orders in one draw only), count, of, unit (draws or boards), share, interval_low, interval_high (two-sided), at_most
/// (one-sided). What cannot be told is empty.
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
            "breaks_rule",
            "is",
            "count",
            "of",
            "unit",
            "share",
            "interval_low",
            "interval_high",
            "at_most",
        ])?;
        let nominal = std::iter::once((Condition::NOMINAL, report));
        let cases = nominal.chain(report.conditions.iter().map(|it| (it.condition.name.as_str(), &it.sweep)));
        for (condition, sweep) in cases {
            for row in rows(scenario, asked, condition, sweep) {
                let mut fields = vec![row.condition.to_string()];
                match row.subject.map(|subject| words::subject(scenario, asked, &subject)) {
                    Some(named) => fields.extend([
                        named.kind.to_string(),
                        tables::name(named.shape),
                        tables::name(named.rule_name),
                        named.pattern.unwrap_or_default(),
                        tables::name(named.net),
                        tables::name(named.step),
                        tables::yes_no(row.breaks_rule),
                    ]),
                    None => fields.extend(vec![String::new(); 7]),
                }
                fields.push(row.is.to_string());
                let number = |it: f64| six(it).to_string();
                let unit = unit(sweep).to_string();
                fields.extend(match row.figure {
                    Figure::None => vec![String::new(); 7],
                    Figure::Counted { count, of, interval } => {
                        let (low, high) = interval.map_or_else(Default::default, |it| (number(it.0), number(it.1)));
                        let told = number(share(count, of));
                        vec![count.to_string(), of.to_string(), unit, told, low, high, String::new()]
                    }
                    Figure::Unseen { once, of, upper } => {
                        let (told, none) = (number(share(once, of)), String::new);
                        vec![once.to_string(), of.to_string(), unit, told, none(), none(), number(upper)]
                    }
                    Figure::AtMost { share, of } => {
                        let none = String::new;
                        vec!["0".to_string(), of.to_string(), unit, "0".to_string(), none(), none(), number(share)]
                    }
                });
                to.write_record(&fields)?;
            }
        }
        Ok(())
    })
}

/// Shares of the sweep with the file's own delays, with their 95 % intervals on a log axis: one row a finding, worst first,
/// at most [`MOST_ROWS`]; a sentence says how many are left out. A name
/// without room is cut and has the whole as its title. What no draw shows has no dot: an open end at the left, and
/// a bar where its share may end. [`csv()`] has the numbers.
pub fn svg(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    let all = rows(scenario, asked, Condition::NOMINAL, report);
    let shown = &all[..all.len().min(MOST_ROWS)];
    let size =
        (WIDE, HEAD + shown.len().max(1) as u32 * ROW + FOOT.0 + if all.len() > shown.len() { FOOT.1 } else { 0 });
    let (mut svg, mut texts) = (String::new(), Fitted::default());
    {
        let root = SVGBackend::with_string(&mut svg, size).into_drawing_area();
        draw(&root, &mut texts, scenario, report, shown, all.len() - shown.len()).expect("drawing into memory");
    }
    let each: Vec<String> = shown.iter().map(|row| format!("{}: {}", row.label, told(row))).collect();
    let said = if each.is_empty() { "Nothing was found".to_string() } else { each.join("; ") };
    charts::labelled(&texts.titled(svg), &format!("Shares of {}. {said}.", unit(report)))
}

/// The figure in words, beside the row.
fn told(row: &Row<'_>) -> String {
    match row.figure {
        Figure::None if row.is == "seen in no draw" => "in no draw".to_string(),
        Figure::None => "no share".to_string(),
        Figure::Counted { count, of, .. } => {
            format!("{} ({} of {})", words::percent(share(count, of)), words::count(count), words::count(of))
        }
        Figure::Unseen { once, of, upper } => {
            format!("at most {}, estimate {}", words::percent(upper), words::percent(share(once, of)))
        }
        Figure::AtMost { share, of } => format!("at most {} (0 of {})", words::percent(share), words::count(of)),
    }
}

fn draw(
    root: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    report: &SweepReport,
    shown: &[Row<'_>],
    left_out: usize,
) -> Drawn {
    root.fill(&WHITE)?;
    let room = f64::from(WIDE) - 24.0;
    let head = format!(
        "{}: shares of {} with 95 % intervals (Monte Carlo, {} draws)",
        scenario.title,
        unit(report),
        words::count(report.samples)
    );
    charts::head(root, texts, &head)?;
    if shown.is_empty() {
        root.draw(&Text::new("Nothing was found in any draw.", (12, HEAD as i32), small()))?;
        return root.present();
    }
    let ends = shown.iter().flat_map(|row| match row.figure {
        Figure::Counted { count, of, interval } => {
            let (low, high) = interval.unwrap_or((0.0, 0.0));
            [share(count, of), low, high]
        }
        Figure::AtMost { share, .. } => [share, 0.0, 0.0],
        Figure::Unseen { once, of, upper } => [share(once, of), upper, 0.0],
        Figure::None => [0.0; 3],
    });
    let ends: Vec<f64> = ends.filter(|it| *it > 0.0).collect();
    let bottom = (HEAD + shown.len() as u32 * ROW + 6) as i32;
    let (left, right) = AXIS;
    let (x0, x1) = (left as i32, right as i32);
    let quiet = rgb(ink::QUIET).stroke_width(1);
    let side = |h, v| small().pos(Pos::new(h, v));
    let (from, to) = match ends.is_empty() {
        true => (-4.0, 0.0),
        // no share is above 1
        false => {
            let (from, to) = stretch(ends.iter().copied());
            (from, to.max(from + 0.2))
        }
    };
    let place = |share: f64| {
        let along = (libm::log10(share.max(f64::MIN_POSITIVE)).max(from) - from) / (to - from);
        (left + along * (right - left)).round() as i32
    };
    root.draw(&PathElement::new(vec![(x0, bottom), (x1, bottom)], quiet))?;
    for tick in ticks(from, to).into_iter().filter(|tick| *tick <= 1.0) {
        let x = place(tick);
        root.draw(&PathElement::new(vec![(x, bottom), (x, bottom + 4)], quiet))?;
        root.draw(&Text::new(words::three(tick * 100.0), (x, bottom + 8), side(HPos::Center, VPos::Top)))?;
    }
    let axis = format!("share of {} [%], log axis", unit(report));
    root.draw(&Text::new(axis, ((x0 + x1) / 2, bottom + 24), side(HPos::Center, VPos::Top)))?;
    for (n, row) in shown.iter().enumerate() {
        let y = (HEAD + n as u32 * ROW + ROW / 2) as i32;
        one(root, texts, row, y, (x0, x1), &place)?;
    }
    let mut notes = vec![
        "Dot: share of what was seen (ring: breaks no rule); bar: 95 % interval; arrow to the left: seen in none, and no more \
         often than the bar says.",
    ];
    let more = format!("Left out, but in shares.csv: {}.", words::many(left_out as u64, "row"));
    if left_out > 0 {
        notes.push(&more);
    }
    for (line, note) in notes.iter().enumerate() {
        let note = texts.end(note, ink::SMALL, room);
        root.draw(&Text::new(note, (12, bottom + 44 + 15 * line as i32), small()))?;
    }
    root.present()
}

/// Label, marks and words of one row.
fn one(
    root: &Area<'_>,
    texts: &mut Fitted,
    row: &Row<'_>,
    y: i32,
    (x0, x1): (i32, i32),
    place: &dyn Fn(f64) -> i32,
) -> Drawn {
    let side = |h| small().pos(Pos::new(h, VPos::Center));
    let label = texts.middle(&row.label, ink::SMALL, AXIS.0 - 30.0);
    root.draw(&Text::new(label, (x0 - 12, y), side(HPos::Right)))?;
    let told = texts.end(&told(row), ink::SMALL, f64::from(WIDE) - AXIS.1 - 20.0);
    root.draw(&Text::new(told, (x1 + 12, y), side(HPos::Left)))?;
    let ink = rgb(if row.breaks_rule { ink::FINDING } else { ink::INK });
    let line = |from: i32, to: i32| PathElement::new(vec![(from, y), (to, y)], ink.stroke_width(2));
    let end = |x: i32| PathElement::new(vec![(x, y - 4), (x, y + 4)], ink.stroke_width(1));
    let arrow = || PathElement::new(vec![(x0 + 6, y - 4), (x0, y), (x0 + 6, y + 4)], ink.stroke_width(1));
    match row.figure {
        Figure::None => {}
        Figure::AtMost { share: most, .. } | Figure::Unseen { upper: most, .. } => {
            root.draw(&line(x0, place(most)))?;
            root.draw(&arrow())?;
            root.draw(&end(place(most)))?;
        }
        Figure::Counted { count, of, interval } => {
            if let Some((low, high)) = interval {
                let from = if low > 0.0 { place(low) } else { x0 };
                root.draw(&line(from, place(high)))?;
                root.draw(&end(place(high)))?;
                match low > 0.0 {
                    true => root.draw(&end(from))?,
                    false => root.draw(&arrow())?,
                }
            }
            if count > 0 {
                let at = (place(share(count, of)), y);
                let fill = if row.breaks_rule { ink } else { WHITE };
                root.draw(&Circle::new(at, 4, fill.filled()))?;
                root.draw(&Circle::new(at, 4, ink.stroke_width(1)))?;
            }
        }
    }
    Ok(())
}
