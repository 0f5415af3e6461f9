//! `[plot]`: names to nets, and a span of time.

use super::context::Context;
use super::said::{Amount, Said};
use crate::scenario::{Fault, Plot};
use crate::time::{Span, Time};

/// What pictures of waves are to show, as it was said.
#[derive(Clone, Debug, Default)]
pub struct NewPlot {
    /// Nets, in the order of their lanes; `None`: all.
    pub nets: Option<Said<Vec<Said<String>>>>,
    /// From when.
    pub from: Option<Said<Amount>>,
    /// To when.
    pub to: Option<Said<Amount>>,
}

/// Checks names and span.
pub(super) fn check(context: &mut Context<'_>, told: &NewPlot) -> Plot {
    let nets = told.nets.as_ref().map(|names| {
        if names.what.is_empty() {
            context.faults.add(names.mark, "a picture of no nets", "name at least one net, or leave `nets` out");
        }
        context.list(&names.what).into_iter().map(|(net, _)| net).collect()
    });
    let from = told.from.as_ref().and_then(|from| context.span(from));
    let to = told.to.as_ref().and_then(|to| context.span(to));
    let least = told.from.as_ref().map_or(Some(Span::ZERO), |_| from);
    if let (Some(least), Some(most), Some(said)) = (least, to, &told.to)
        && least >= most
    {
        let message = format!("pictures from {} to {} show nothing", context.show(least), context.show(most));
        let fault = Fault::new(said.mark, message, "let `to` be later than `from`, which is 0 if it is left out");
        context.faults.push(match &told.from {
            Some(from) => fault.related(from.mark, "`from` is here"),
            None => fault,
        });
    }
    let time = |span: Span| Time::ZERO + span;
    Plot { nets, from: from.map(time), to: to.map(time) }
}
