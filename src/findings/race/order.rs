//! A non-critical race: the two loop nets whose order differs.

use crate::circuit::NetId;
use crate::engine::Link;
use crate::findings::causes::Causes;
use crate::findings::paths::RacePair;

/// The first place at which the order of loop nets differs from that of another run: the net that came first here, and the
/// one that came first there.
pub(super) fn order(run: &Causes<'_>, other: &Causes<'_>, moment: u32) -> Option<RacePair> {
    let sequence = |run: &Causes<'_>| -> Option<Vec<(NetId, u32, u32)>> {
        let (_, batches) = run.window(moment)?;
        let nets = run.circuit.nets().filter(|net| run.circuit.in_loop(*net));
        let all = nets.flat_map(|net| {
            let changes = run.changes(net, &batches).iter().enumerate();
            changes.map(move |(nth, change)| (net, nth as u32, *change))
        });
        let mut all: Vec<(NetId, u32, u32)> = all.collect();
        all.sort_by_key(|it| (run.batch(Link::Change(it.2)), it.0));
        Some(all)
    };
    if run.trace.windows[run.window(moment)?.0].before != other.trace.windows[other.window(moment)?.0].before {
        return None;
    }
    let (here, there) = (sequence(run)?, sequence(other)?);
    let same = |a: &(NetId, u32, u32), b: &(NetId, u32, u32)| (a.0, a.1) == (b.0, b.1);
    let at = here.iter().zip(&there).position(|(a, b)| !same(a, b))?;
    let first = here[at];
    let second = here[at..].iter().find(|it| same(it, &there[at]))?;
    // what came at one instant here has no order here, but there it had
    let meet = run.circuit.gates().map(|gate| (gate, run.circuit.net_of(gate)));
    let reads = |gate, net| run.circuit.sources(gate).iter().any(|it| it.0 == net);
    let meet = meet.filter(|(gate, _)| reads(*gate, first.0) && reads(*gate, second.0)).map(|it| it.1).next();
    let path = |change: u32| run.path(Link::Change(change));
    Some(RacePair { first: path(first.2), second: Some(path(second.2)), meet })
}
