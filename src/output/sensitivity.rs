//! Which delays decide a finding: a picture of the quantities that stand out, and the table beside it.

use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::output::causes::pull_remark;
use crate::output::charts::{self, Area, Drawn, HEAD, rgb, small};
use crate::output::deciding;
use crate::output::fitted::Fitted;
use crate::output::ink;
use crate::output::shares::title;
use crate::output::stands_in::{race_of, stands_in};
use crate::output::tables;
use crate::output::words::{self, six};
use crate::proof::Race;
use crate::review::{Pull, Pulls, Review, Why};
use crate::scenario::Scenario;

/// Most findings with a panel.
pub const MOST_PANELS: usize = 6;
/// Width of the picture, pixels.
const WIDE: u32 = 1000;
/// Height of a bar with its room, pixels.
const ROW: u32 = 20;
/// Height of the head of a panel, and of its foot, pixels.
const PANEL: (u32, u32) = (24, 46);
/// Ends of the axis from -1 to 1, pixels.
const AXIS: (f64, f64) = (280.0, 720.0);
/// Height of a line below the axis, pixels.
const LINE: u32 = 20;

/// A finding that was looked into.
struct Looked<'a> {
    /// Its number in the report, from 0.
    number: usize,
    why: &'a Why,
    pulls: &'a Pulls,
    /// What the proof says decides the same question.
    race: Option<&'a Race>,
}

impl Looked<'_> {
    /// Height of its panel, pixels.
    fn height(&self) -> u32 {
        match self.pulls.told.len() as u32 {
            0 => PANEL.0 + ROW + 10 + self.lines(),
            bars => PANEL.0 + bars * ROW + PANEL.1 + self.lines(),
        }
    }

    /// Height of what stands below the bars.
    fn lines(&self) -> u32 {
        if self.race.is_some() { LINE } else { 0 }
    }
}

/// The findings that were looked into, worst first.
fn looked_into(review: &Review) -> Vec<Looked<'_>> {
    let each = review.sweep.findings.iter().zip(&review.why).enumerate();
    each.filter_map(|(number, (finding, why))| {
        let why = why.as_ref()?;
        Some(Looked { number, why, pulls: why.pull.as_ref()?, race: race_of(review, finding) })
    })
    .collect()
}

/// One row a finding and quantity that stands out from chance, the most decisive first; a finding of which none is told has
/// one row with the reason. `None` if no finding was looked into.
///
/// Columns: finding (its number in `findings.csv`, from 1), kind, shape, rule_name, pattern, net, step, quantity, strength
/// (rank-biserial correlation, -1: fails where it is short, 1: where it is long), failing and passing (draws, or boards of
/// what a board draws, compared), in_inequality (is it a term of the inequality that the proof has for the same question;
/// empty where there is none), remarks.
pub fn csv(scenario: &Scenario, review: &Review) -> Option<String> {
    let all = looked_into(review);
    if all.is_empty() {
        return None;
    }
    Some(tables::write(|to| {
        let of = ["finding", "kind", "shape", "rule_name", "pattern", "net", "step"];
        to.write_record(of.into_iter().chain([
            "quantity",
            "strength",
            "failing",
            "passing",
            "in_inequality",
            "remarks",
        ]))?;
        for Looked { number, why, pulls, race } in all {
            let named = words::subject(scenario, &review.asked, &review.sweep.findings[number].subject);
            let finding = [
                (number + 1).to_string(),
                named.kind.to_string(),
                tables::name(named.shape),
                tables::name(named.rule_name),
                named.pattern.unwrap_or_default(),
                tables::name(named.net),
                tables::name(named.step),
            ];
            let remark = pull_remark(why).unwrap_or_default();
            let mut rows: Vec<[String; 5]> = pulls
                .told
                .iter()
                .map(|pull| {
                    let quantity = words::quantity(scenario, pull.quantity.target);
                    let (failing, passing) = (pull.failing.to_string(), pull.passing.to_string());
                    let inside = race.map(|race| tables::yes_no(stands_in(scenario, race, pull.quantity.target)));
                    [quantity, six(pull.strength).to_string(), failing, passing, inside.unwrap_or_default()]
                })
                .collect();
            if rows.is_empty() {
                rows.push(Default::default());
            }
            for row in rows {
                to.write_record(finding.iter().chain(&row).chain([&remark]))?;
            }
        }
        Ok(())
    }))
}

/// Bars from -1 to 1: how much each delay decides a finding; one panel a finding that was looked into, worst first, at most
/// [`MOST_PANELS`]. Bars to the left (hollow): it fails where the delay is short; to the right (filled): where it is long.
/// Where the proof has an inequality for the same question it stands below the bars, and bars of its terms say so.
/// [`csv()`] has the numbers. `None` if no finding was looked into.
pub fn svg(scenario: &Scenario, review: &Review) -> Option<String> {
    let all = looked_into(review);
    if all.is_empty() {
        return None;
    }
    let shown = &all[..all.len().min(MOST_PANELS)];
    let foot = if all.len() > shown.len() { 40 } else { 24 };
    let size = (WIDE, HEAD + shown.iter().map(Looked::height).sum::<u32>() + foot);
    let (mut svg, mut texts) = (String::new(), Fitted::default());
    {
        let root = SVGBackend::with_string(&mut svg, size).into_drawing_area();
        draw(&root, &mut texts, scenario, review, shown, all.len() - shown.len()).expect("drawing into memory");
    }
    let each = shown.iter().map(|Looked { number, why, pulls, race }| {
        let title = title(scenario, &review.asked, &review.sweep.findings[*number].subject);
        let bars = pulls.told.iter().map(|pull| {
            let quantity = words::quantity(scenario, pull.quantity.target);
            format!("{quantity} {} when {}", signed(pull.strength), way(pull))
        });
        let mut said: Vec<String> = bars.collect();
        said.extend(pull_remark(why));
        said.extend(race.map(|race| decides(scenario, race)));
        format!("{title}: {}", said.join(", "))
    });
    let text = format!("Which delays decide. {}.", each.collect::<Vec<_>>().join("; "));
    Some(charts::labelled(&texts.titled(svg), &text))
}

/// What the proof says of the same question.
fn decides(scenario: &Scenario, race: &Race) -> String {
    format!("The inequality of the proof: {}", deciding::race(scenario, race))
}

fn way(pull: &Pull) -> &'static str {
    if pull.strength < 0.0 { "short" } else { "long" }
}

/// `+0.93`, `−0.4`.
fn signed(strength: f64) -> String {
    let sign = if strength < 0.0 { "\u{2212}" } else { "+" };
    format!("{sign}{:.2}", strength.abs())
}

fn draw(
    root: &Area<'_>,
    texts: &mut Fitted,
    scenario: &Scenario,
    review: &Review,
    shown: &[Looked<'_>],
    left_out: usize,
) -> Drawn {
    root.fill(&WHITE)?;
    let room = f64::from(WIDE) - 24.0;
    charts::head(root, texts, &format!("{}: which delays decide", scenario.title))?;
    let mut top = HEAD as i32;
    for looked in shown {
        let Looked { number, pulls, .. } = looked;
        let title = title(scenario, &review.asked, &review.sweep.findings[*number].subject);
        let compared = match pulls.untold {
            None => {
                let (failing, passing) = pulls.samples;
                format!(": {} failing draws against {}", words::count(failing), words::count(passing))
            }
            Some(_) => String::new(),
        };
        let caption = format!("{}. {title}{compared}", number + 1);
        let caption = texts.end(&caption, ink::BODY, room);
        let body = ("sans-serif", ink::BODY * 1.24).into_font().color(&rgb(ink::INK));
        root.draw(&Text::new(caption, (12, top), body))?;
        panel(root, texts, scenario, looked, top + PANEL.0 as i32)?;
        top += looked.height() as i32;
        if let Some(race) = looked.race {
            let said = texts.end(&decides(scenario, race), ink::SMALL, room - 12.0);
            root.draw(&Text::new(said, (24, top - LINE as i32 - 6), small()))?;
        }
    }
    let note = "Bar to the right, filled: fails where the delay is long; to the left, hollow: where it is short. Only what \
                chance would hardly do is told.";
    root.draw(&Text::new(note, (12, top), small()))?;
    if left_out > 0 {
        let note = format!("Left out, but in sensitivity.csv: {}.", words::many(left_out as u64, "finding"));
        root.draw(&Text::new(note, (12, top + 16), small()))?;
    }
    root.present()
}

/// The bars of one finding, or why there are none.
fn panel(root: &Area<'_>, texts: &mut Fitted, scenario: &Scenario, looked: &Looked<'_>, top: i32) -> Drawn {
    let Looked { why, pulls, race, .. } = looked;
    let side = |h, v| small().pos(Pos::new(h, v));
    let remark = pull_remark(why);
    let (left, right) = AXIS;
    let place = |strength: f64| (left + (strength + 1.0) / 2.0 * (right - left)).round() as i32;
    if pulls.told.is_empty() {
        let said = words::sentence(&remark.unwrap_or_default());
        return root.draw(&Text::new(said, (24, top + ROW as i32 / 2), side(HPos::Left, VPos::Center)));
    }
    let bottom = top + pulls.told.len() as i32 * ROW as i32 + 2;
    let quiet = rgb(ink::QUIET).stroke_width(1);
    for (n, pull) in pulls.told.iter().enumerate() {
        let y = top + n as i32 * ROW as i32 + ROW as i32 / 2;
        let quantity = texts.middle(&words::quantity(scenario, pull.quantity.target), ink::SMALL, left - 40.0);
        root.draw(&Text::new(quantity, (place(-1.0) - 12, y), side(HPos::Right, VPos::Center)))?;
        let (from, to) = (place(pull.strength.min(0.0)), place(pull.strength.max(0.0)));
        let bar = [(from, y - 6), (to, y + 6)];
        let fill = if pull.strength < 0.0 { WHITE } else { rgb(ink::QUIET) };
        root.draw(&Rectangle::new(bar, fill.filled()))?;
        root.draw(&Rectangle::new(bar, rgb(ink::INK).stroke_width(1)))?;
        let inside = race.is_some_and(|race| stands_in(scenario, race, pull.quantity.target));
        let mark = if inside { "; in the inequality" } else { "" };
        let said = format!("{}, fails when {}{mark}", signed(pull.strength), way(pull));
        root.draw(&Text::new(said, (place(1.0) + 12, y), side(HPos::Left, VPos::Center)))?;
    }
    root.draw(&PathElement::new(vec![(place(0.0), top), (place(0.0), bottom)], rgb(ink::INK).stroke_width(1)))?;
    root.draw(&PathElement::new(vec![(place(-1.0), bottom), (place(1.0), bottom)], quiet))?;
    for (tick, label) in [(-1.0, "\u{2212}1"), (-0.5, "\u{2212}0.5"), (0.0, "0"), (0.5, "0.5"), (1.0, "1")] {
        let x = place(tick);
        root.draw(&PathElement::new(vec![(x, bottom), (x, bottom + 4)], quiet))?;
        root.draw(&Text::new(label, (x, bottom + 6), side(HPos::Center, VPos::Top)))?;
    }
    let axis = "strength [rank-biserial correlation, no unit]";
    root.draw(&Text::new(axis, (place(0.0), bottom + 20), side(HPos::Center, VPos::Top)))?;
    match remark {
        Some(remark) => root.draw(&Text::new(remark, (24, bottom + 12), side(HPos::Left, VPos::Center))),
        None => Ok(()),
    }
}
