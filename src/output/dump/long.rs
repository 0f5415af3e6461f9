//! Dumps of runs that are too long to be kept: written while the run goes on, then once more in the coarsest tick.

use std::io::{self, BufRead, Write};

use super::scale::Tick;
use super::{Writer, timescale};
use crate::circuit::NetId;
use crate::engine::Observer;
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::time::Time;

/// Keeps the transitions of a run up to a number, and opens a dump for all of them when there are more.
///
/// The dump counts in femtoseconds, as nobody knows yet what times will come; [`coarsen`] writes it in the tick that
/// [`LongDump::finish`] gives.
pub struct LongDump<'a, W, F> {
    scenario: &'a Scenario,
    case: &'a str,
    most: usize,
    start: State,
    kept: Vec<(Time, NetId, Value)>,
    tick: Tick,
    open: F,
    dump: Option<Writer<W>>,
    /// The first error: after it nothing is written.
    error: Option<io::Error>,
    /// Called once when nothing more can be written.
    give_up: &'a dyn Fn(),
}

impl<'a, W: Write, F: FnMut() -> io::Result<W>> LongDump<'a, W, F> {
    /// Keeps up to `most` transitions; `open` is called once, if there are more. `give_up` is called once if the dump
    /// cannot be opened or written. `case` names the run.
    pub fn new(
        scenario: &'a Scenario,
        case: &'a str,
        most: usize,
        open: F,
        give_up: &'a dyn Fn(),
    ) -> LongDump<'a, W, F> {
        let (start, kept, tick) = (State::default(), Vec::new(), Tick::unset());
        LongDump { scenario, case, most, start, kept, tick, open, dump: None, error: None, give_up }
    }

    fn row(&mut self, at: Time, net: NetId, new: Value) {
        if self.error.is_some() {
            return;
        }
        self.tick = self.tick.and(at);
        if self.dump.is_none() && self.kept.len() < self.most {
            self.kept.push((at, net, new));
            return;
        }
        let written = self.spill().and_then(|dump| dump.change(at, net, new));
        self.note(written);
    }

    /// The dump, opened if it is not, with what was kept.
    fn spill(&mut self) -> io::Result<&mut Writer<W>> {
        let dump = match self.dump.take() {
            Some(dump) => dump,
            None => {
                let to = (self.open)()?;
                let mut dump = Writer::new(self.scenario, self.case, &self.start, Tick::FINEST, to)?;
                let mut kept = std::mem::take(&mut self.kept).into_iter();
                kept.try_for_each(|(at, net, new)| dump.change(at, net, new))?;
                dump
            }
        };
        Ok(self.dump.insert(dump))
    }

    fn note(&mut self, written: io::Result<()>) {
        if let Err(error) = written {
            self.error = Some(error);
            (self.give_up)();
        }
    }

    /// Ends the run: the dump's device and the coarsest tick of its times; `None` if there were not more than `most`
    /// transitions. With `anyway` it is written however few there are.
    ///
    /// Errors: the dump could not be opened or written.
    pub fn finish(mut self, anyway: bool) -> io::Result<Option<(W, Tick)>> {
        if let Some(error) = self.error {
            return Err(error);
        }
        if anyway {
            self.spill()?;
        }
        let Some(mut dump) = self.dump else { return Ok(None) };
        dump.to.flush()?;
        let tick = if dump.at == Time::ZERO { Tick::of([], self.scenario.unit) } else { self.tick };
        Ok(Some((dump.to, tick)))
    }
}

impl<W: Write, F: FnMut() -> io::Result<W>> Observer for LongDump<'_, W, F> {
    type Tag = ();

    fn start(&mut self, state: &State) {
        self.start = state.clone();
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        self.row(at, net, new);
    }
}

/// Writes a dump that counts in femtoseconds once more, in a coarser tick, line by line.
///
/// Errors: a device fails, or a time is no whole number of ticks: nothing is rounded.
pub fn coarsen(from: impl BufRead, tick: Tick, mut to: impl Write) -> io::Result<()> {
    let finest = timescale(Tick::FINEST);
    let zeros = "0".repeat(tick.zeros());
    let mut header = true;
    for line in from.split(b'\n') {
        let line = line?;
        if header && line == finest.trim_end().as_bytes() {
            to.write_all(timescale(tick).as_bytes())?;
            header = false;
            continue;
        }
        match line.strip_prefix(b"#") {
            Some(b"0") | None => to.write_all(&line)?,
            Some(digits) => {
                let ticks = digits.strip_suffix(zeros.as_bytes()).filter(|ticks| !ticks.is_empty());
                let ticks = ticks.ok_or_else(|| {
                    let time = String::from_utf8_lossy(digits).into_owned();
                    io::Error::new(io::ErrorKind::InvalidInput, format!("{time} fs is no whole number of {tick}"))
                })?;
                to.write_all(b"#")?;
                to.write_all(ticks)?;
            }
        }
        to.write_all(b"\n")?;
    }
    to.flush()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Function;
    use crate::control::Control;
    use crate::engine::{Program, Trace};
    use crate::instance::{Instance, Which};
    use crate::output::dump::vcd;
    use crate::scenario::{Builder, NewStep};

    fn latch(delay: &str) -> Scenario {
        let mut b = Builder::new("latch, $end of story");
        b.input("s", true);
        b.input("r", true);
        b.gate("q", Function::Nand, ["s", "qn"]).delay(delay);
        b.gate("qn", Function::Nand, ["r", "q"]).delay(delay);
        b.initial("q", false);
        for (at, net, value) in [("10", "s", false), ("20", "s", true), ("30", "r", false), ("40", "r", true)] {
            b.step(NewStep::at(at).set(net, value));
        }
        b.finish().unwrap()
    }

    #[test]
    fn a_streamed_dump_is_that_of_the_whole_trace() {
        for (delay, tick) in [("2.5", "100 ps"), ("5", "1 ns"), ("2.500001", "1 fs")] {
            let scenario = latch(delay);
            let program = Program::new(&scenario, &Control::default()).unwrap();
            let instance = Instance::of(&scenario, &Which::Typ);
            let mut trace = Trace::default();
            program.machine().run(&instance, &Control::default(), &mut trace);
            let whole = vcd(&scenario, "typical", &trace);
            assert!(whole.contains(&format!("$timescale {tick} $end\n")), "{whole}");
            assert!(whole.starts_with("$version Stillgate $end\n$comment latch, _end of story, typical $end\n"));
            for most in [0, 1, 5, 7] {
                let mut dump = LongDump::new(&scenario, "typical", most, || Ok(Vec::new()), &|| panic!("memory"));
                program.machine().run(&instance, &Control::default(), &mut dump);
                let (bytes, tick) = dump.finish(false).unwrap().unwrap();
                let mut again = Vec::new();
                coarsen(&bytes[..], tick, &mut again).unwrap();
                assert_eq!(String::from_utf8(again).unwrap(), whole, "more than {most}");
            }
            let mut dump = LongDump::new(&scenario, "typical", 8, || Ok(Vec::new()), &|| panic!("memory"));
            program.machine().run(&instance, &Control::default(), &mut dump);
            assert!(dump.finish(false).unwrap().is_none());
        }
    }

    #[test]
    fn what_a_tick_does_not_hold_is_refused() {
        let text = "$timescale 1 fs $end\n#0\n0!\n#1500\n1!\n";
        let tick = Tick::of([Time::from_fs(1000)], crate::time::Unit::Ns);
        assert!(coarsen(text.as_bytes(), tick, Vec::new()).is_err());
        let mut to = Vec::new();
        coarsen(text.replace("1500", "15000").as_bytes(), tick, &mut to).unwrap();
        assert_eq!(String::from_utf8(to).unwrap(), "$timescale 1 ps $end\n#0\n0!\n#15\n1!\n");
    }

    #[test]
    fn a_full_device_is_told_once() {
        let scenario = latch("2.5");
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let instance = Instance::of(&scenario, &Which::Typ);
        let told = std::cell::Cell::new(0);
        let give_up = || told.set(told.get() + 1);
        let open = || Err::<Vec<u8>, _>(io::Error::other("no place"));
        let mut dump = LongDump::new(&scenario, "typical", 2, open, &give_up);
        program.machine().run(&instance, &Control::default(), &mut dump);
        assert_eq!((dump.finish(true).err().map(|it| it.to_string()), told.get()), (Some("no place".into()), 1));
    }
}
