//! Conditions: names, factors, and whether every delay stays a delay.

use super::context::Context;
use super::said::Said;
use crate::delay::{Billionths, DelayModel, Filter};
use crate::scenario::{Condition, Fault};

/// A condition as it was said.
#[derive(Clone, Debug)]
pub struct NewCondition {
    /// Its name.
    pub name: Said<String>,
    /// What every delay is multiplied by, as a plain decimal; `None` if it could not be read, which was reported.
    pub scale: Option<Said<String>>,
}

/// Checks conditions. What has a fault is left out.
pub(super) fn check(context: &mut Context<'_>, told: &[NewCondition], delays: &DelayModel) -> Vec<Condition> {
    let mut checked: Vec<(Condition, &Said<String>)> = Vec::new();
    for condition in told {
        let name = &condition.name;
        let odd = name.what.trim().is_empty() || name.what.chars().any(char::is_control);
        if name.what == Condition::NOMINAL {
            let message = "`nominal` is what the delays of the file are called";
            context.faults.add(name.mark, message, "give the condition another name, as in `[conditions.cold]`");
        } else if odd {
            context.faults.add(name.mark, "this condition has no name", "name it, as in `[conditions.cold]`");
        } else if let Some((_, first)) = checked.iter().find(|it| it.0.name == name.what) {
            let fault =
                Fault::new(name.mark, format!("condition `{}` is there twice", name.what), "remove one of them");
            context.faults.push(fault.related(first.mark, "first here"));
        }
        let Some(scale) = &condition.scale else { continue };
        match factor(&scale.what, delays) {
            Ok(factor) => checked.push((Condition { name: name.what.clone(), scale: factor }, name)),
            Err((message, help)) => context.faults.add(scale.mark, message, help),
        }
    }
    checked.into_iter().map(|it| it.0).collect()
}

/// The factor of a condition, if every delay stays a delay under it; else message and help.
fn factor(text: &str, delays: &DelayModel) -> Result<Billionths, (String, &'static str)> {
    const WRITE: &str = "write a plain decimal such as 0.8 or 1.25, with at most 9 digits behind the point";
    let factor = Billionths::parse(text).filter(|factor| factor.0 > 0);
    let Some(factor) = factor else {
        return Err((format!("`scale` is {text}; it is a decimal above 0 and below 10^9"), WRITE));
    };
    let Some(scaled) = delays.scaled(factor) else {
        return Err((
            format!("with `scale` {text} a delay leaves the span from 1 fs to below 2^62 fs"),
            "take a factor nearer to 1",
        ));
    };
    // rounding may bring a filter's figure out of the bounds that hold for the file's own delays
    for (edges, filter) in scaled.gate.iter().zip(&scaled.filter) {
        let [fall, rise] = edges.map(|range| range.min);
        let sound = match filter {
            Filter::Reject(limit) => *limit < fall.min(rise),
            Filter::Involution(tau) => {
                let ratio = |delay: crate::time::Span| libm::exp(-(delay.fs() as f64) / tau.fs() as f64);
                ratio(fall) + ratio(rise) < 1.0
            }
            Filter::Inertial | Filter::Transport => true,
        };
        if !sound {
            let message = format!("with `scale` {text}, rounded to whole fs, a filter no longer fits its delays");
            return Err((message, "take a factor nearer to 1"));
        }
    }
    Ok(factor)
}
