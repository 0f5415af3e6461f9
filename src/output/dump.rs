//! Waves as a value change dump (IEEE 1364-2001, clause 18, four-state), for programs that show or replay waves.
//!
//! Every net is a wire of one bit, in scopes made of its dotted name. The timescale is the coarsest that holds every time as a
//! whole number, so no time is rounded. There is no date in it: the same run gives the same bytes.

mod long;
mod names;
mod scale;

use std::io::{self, Write};

use crate::circuit::NetId;
use crate::engine::Trace;
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::time::Time;

pub use long::{LongDump, coarsen};
pub use scale::Tick;

/// The line of the header that says the tick.
fn timescale(tick: Tick) -> String {
    format!("$timescale {tick} $end\n")
}

/// Writes a dump: its declarations and the start, then one transition after the other.
struct Writer<W> {
    to: W,
    tick: Tick,
    ids: Vec<String>,
    /// The instant that was written last.
    at: Time,
}

impl<W: Write> Writer<W> {
    /// `case` names the run.
    fn new(scenario: &Scenario, case: &str, start: &State, tick: Tick, mut to: W) -> io::Result<Writer<W>> {
        let circuit = &scenario.circuit;
        let declared = names::declare(circuit.nets().map(|net| circuit.name(net)));
        let title = names::comment(&scenario.title);
        to.write_all(format!("$version Stillgate $end\n$comment {title}, {} $end\n", names::comment(case)).as_bytes())?;
        to.write_all(timescale(tick).as_bytes())?;
        to.write_all(declared.text.as_bytes())?;
        to.write_all(b"$enddefinitions $end\n#0\n$dumpvars\n")?;
        for (net, id) in circuit.nets().zip(&declared.ids) {
            writeln!(to, "{}{id}", letter(start.get(net.index())))?;
        }
        to.write_all(b"$end\n")?;
        Ok(Writer { to, tick, ids: declared.ids, at: Time::ZERO })
    }

    /// Writes one transition; transitions come in order of time.
    ///
    /// Errors: the device fails, or the time is no whole number of ticks.
    fn change(&mut self, at: Time, net: NetId, new: Value) -> io::Result<()> {
        if at != self.at {
            let ticks = self.tick.count(at).ok_or_else(|| {
                io::Error::new(
                    io::ErrorKind::InvalidInput,
                    format!("{} fs is no whole number of {}", at.fs(), self.tick),
                )
            })?;
            writeln!(self.to, "#{ticks}")?;
            self.at = at;
        }
        writeln!(self.to, "{}{}", letter(new), self.ids[net.index()])
    }
}

fn letter(value: Value) -> char {
    match value {
        Value::Zero => '0',
        Value::One => '1',
        Value::X => 'x',
    }
}

/// The dump of a trace that was kept whole. `case` names the run, as in `sample 12`.
pub fn vcd(scenario: &Scenario, case: &str, trace: &Trace) -> String {
    let tick = Tick::of(trace.changes.iter().map(|change| change.at), scenario.unit);
    let mut bytes = Vec::new();
    let written = Writer::new(scenario, case, &trace.start, tick, &mut bytes).and_then(|mut writer| {
        trace.changes.iter().try_for_each(|change| writer.change(change.at, change.net, change.new))
    });
    written.expect("memory takes every byte, and the tick divides every time");
    String::from_utf8(bytes).expect("names and numbers are text")
}
