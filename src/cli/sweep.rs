//! `stillgate sweep`: the whole sweep, a part of it, or the rest of one that was not finished.

use std::ops::Range;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use super::args::Long;
use super::common::{
    Failure, INTERRUPTED, called, code, control, finish, folder, load, options, overrides, page, program, say,
    say_aside, write,
};
use crate::findings::Asked;
use crate::output::{bundle, json, text};
use crate::reader::{LoadedPart, load_part};
use crate::review::{self, Stops, Sweeper};
use crate::scenario::Scenario;
use crate::sweep::{Cases, Curve, Part, SweepReport};

/// What a part's file is called, after its samples.
const SUFFIX: &str = "stillgate-part";

pub fn run(arguments: &Long) -> Result<ExitCode, Failure> {
    let common = &arguments.sweeping;
    let input = &common.input;
    let LoadedPart { mut part, scenario, asked } = begun(arguments)?;
    if part.piece && common.strict {
        return Err(Failure::Bad("`--strict`: a part has no verdict; give it to `stillgate merge`".into()));
    }
    let folder = match (&arguments.unfinished, &common.folder.out) {
        // the files go where the whole sweep would have left them
        (Some(file), None) => match file.parent() {
            Some(folder) if !folder.as_os_str().is_empty() => folder.to_path_buf(),
            _ => PathBuf::from("."),
        },
        _ => folder(input, &common.folder)?,
    };
    let (from, to) = part.wanted;
    let mut kept = Kept { path: folder.join(format!("unfinished-{from}-{}.{SUFFIX}", to - 1)), ours: false };
    kept.ours = arguments.unfinished.as_ref().is_some_and(|file| same(file, &kept.path));
    if !kept.ours && kept.path.exists() && !input.quiet {
        let path = kept.path.display();
        say_aside(&format!("note: {path} is there already; `stillgate sweep --continue {path}` goes on with it\n"));
    }

    let (control, bar) = control(input.quiet, "sweep");
    let program = program(&scenario, &control)?;
    let threads = common.threads.map_or(0, usize::from);
    let sweeper = Sweeper::new(&scenario, &program, &asked, threads)?;
    let mut cases = std::mem::replace(&mut part.cases, Cases::new(&scenario, &asked));
    let mut curve = part.curve.take();
    let stops = Stops { range: from..to, every: arguments.keep_every };
    let done: Result<(), Failure> =
        sweeper.go_on(&mut cases, curve.as_mut(), &stops, &control, &mut |cases, curve| kept.save(&part, cases, curve));
    finish(bar);
    done?;

    let sure = curve.as_ref().is_some_and(|curve| curve.sure);
    let complete = sure || cases.done().missing(from..to).is_empty();
    if !complete {
        if cases.is_empty() {
            return Err(Failure::Interrupted);
        }
        kept.save(&part, &cases, curve.as_ref())?;
    }
    if part.piece {
        if complete {
            part.cases = cases;
            let path = folder.join(format!("part-{from}-{}.{SUFFIX}", to - 1));
            bundle::replace(&path, &part.to_bytes())?;
            say_part(&part, &path, input.json, input.quiet)?;
        } else {
            kept.tell(&cases, from..to);
        }
    } else {
        let report = sweeper.conclude(&cases, curve.as_ref(), &control)?;
        let results = Results {
            scenario: &scenario,
            asked: &asked,
            report: &report,
            called: part.called.as_deref(),
            options: &options(&part.overrides),
            json: input.json,
            quiet: input.quiet,
            strict: common.strict,
        };
        let code = results.give(&folder)?;
        if complete {
            kept.drop();
            return Ok(code);
        }
        kept.tell(&cases, from..to);
    }
    if complete {
        kept.drop();
        return Ok(ExitCode::SUCCESS);
    }
    Ok(ExitCode::from(INTERRUPTED))
}

/// Are these the same file?
fn same(a: &Path, b: &Path) -> bool {
    matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b)
}

/// The sweep as far as it is: nothing done yet, or what a file has.
fn begun(arguments: &Long) -> Result<LoadedPart, Failure> {
    if let Some(file) = &arguments.unfinished {
        return Ok(load_part(file)?);
    }
    let input = &arguments.sweeping.input;
    let loaded = load(input)?;
    let name = Path::new(&loaded.name).file_name().map_or_else(String::new, |it| it.to_string_lossy().into_owned());
    let text = loaded.self_contained();
    let mut scenario = loaded.scenario;
    let overrides = overrides(&arguments.sweeping.draws);
    overrides.apply(&mut scenario.plan);
    let plan = scenario.plan;
    let wanted = wanted(arguments, &scenario)?;
    if arguments.until.is_some() && !plan.draw.allows_intervals() {
        let draw = plan.draw.name();
        let message = format!(
            "`--until`: draws of {draw} are not independent draws of parts, so that no share of them has an interval; \
             take --draw uniform, triangular or normal"
        );
        return Err(Failure::Bad(message));
    }
    let asked = Asked::of(&scenario);
    let part = Part {
        name,
        called: called(input),
        title: scenario.title.clone(),
        text,
        overrides,
        plan,
        wanted: wanted.clone().map_or((0, plan.samples), |it| (it.start, it.end)),
        piece: wanted.is_some(),
        curve: arguments.until.clone().map(Curve::new),
        cases: Cases::with_envelope(&scenario, &asked),
    };
    Ok(LoadedPart { part, scenario, asked })
}

/// The samples of a part; `None`: all of them, and no part.
fn wanted(arguments: &Long, scenario: &Scenario) -> Result<Option<Range<u64>>, Failure> {
    let plan = &scenario.plan;
    let tries = plan.tries.max(1);
    if let Some((k, n)) = arguments.part {
        // boards are shared out as evenly as they can be
        let boards = plan.samples.div_ceil(tries);
        let before = |k: u64| (u128::from(boards) * u128::from(k) / u128::from(n)) as u64;
        let range = before(k - 1) * tries..(before(k).saturating_mul(tries)).min(plan.samples);
        if range.is_empty() {
            let what = if tries > 1 { "boards" } else { "samples" };
            return Err(Failure::Bad(format!(
                "`--part {k}/{n}`: the sweep has only {boards} {what}; take fewer parts"
            )));
        }
        return Ok(Some(range));
    }
    let (Some(from), Some(count)) = (arguments.samples_from, arguments.count) else { return Ok(None) };
    let to = from.saturating_add(count);
    if to > plan.samples {
        let message = format!(
            "`--samples-from {from} --count {count}`: the sweep has samples 0 to {} only; --samples makes it longer, the \
             same for all parts",
            plan.samples - 1
        );
        return Err(Failure::Bad(message));
    }
    if !from.is_multiple_of(tries) || !(to.is_multiple_of(tries) || to == plan.samples) {
        let (lower, upper) = (from / tries * tries, to.div_ceil(tries).saturating_mul(tries).min(plan.samples));
        let message = format!(
            "`--samples-from {from} --count {count}`: a board has {tries} tries, and a part has whole boards; write \
             multiples of {tries}, as in --samples-from {lower} --count {}",
            upper - lower
        );
        return Err(Failure::Bad(message));
    }
    Ok(Some(from..to))
}

/// The file that keeps what is done of a sweep that is not finished.
struct Kept {
    path: PathBuf,
    /// This sweep wrote it, or goes on with it.
    ours: bool,
}

impl Kept {
    fn save(&mut self, part: &Part, cases: &Cases, curve: Option<&Curve>) -> Result<(), Failure> {
        let part = Part { cases: cases.clone(), curve: curve.cloned(), ..part.clone() };
        bundle::replace(&self.path, &part.to_bytes())?;
        self.ours = true;
        Ok(())
    }

    /// The sweep is finished: nothing of it need be kept.
    fn drop(&self) {
        if self.ours {
            bundle::remove(&self.path);
        }
    }

    /// Says what is kept, also where nothing else is to be said.
    fn tell(&self, cases: &Cases, wanted: Range<u64>) {
        let all = review::grouped(wanted.end - wanted.start);
        let done = cases.0.iter().map(|case| match cases.0.len() {
            1 => review::grouped(case.done.count()),
            _ => format!("{} ({})", review::grouped(case.done.count()), case.condition),
        });
        let done = done.collect::<Vec<_>>().join(", ");
        let path = self.path.display();
        say_aside(&format!(
            "interrupted: {done} of {all} samples are done and kept in {path}\n\
             `stillgate sweep --continue {path}` does the others\n"
        ));
    }
}

/// Says what a part has and where it is.
pub fn say_part(part: &Part, path: &Path, as_json: bool, quiet: bool) -> Result<(), Failure> {
    if as_json {
        say(&json::part(part, path))?;
    } else if !quiet {
        say(&text::part(part, path))?;
    }
    Ok(())
}

/// What a finished sweep says and leaves, by whichever way it came about.
pub struct Results<'a> {
    pub scenario: &'a Scenario,
    pub asked: &'a Asked,
    pub report: &'a SweepReport,
    /// The scenario as the user named it.
    pub called: Option<&'a str>,
    /// Options of the draws.
    pub options: &'a str,
    pub json: bool,
    pub quiet: bool,
    pub strict: bool,
}

impl Results<'_> {
    /// Prints text or JSON and writes the files.
    pub fn give(&self, folder: &Path) -> Result<ExitCode, Failure> {
        let Results { scenario, asked, report, .. } = *self;
        let verdict = review::verdict(scenario, report);
        let document = json::sweep(scenario, asked, report);
        if self.json {
            say(&document)?;
        } else if !self.quiet {
            say(&text::sweep(scenario, asked, report, &verdict, &page(self.called, self.options)))?;
        }
        let mut bundle = bundle::of_sweep(scenario, asked, report);
        bundle.add("sweep.json", document);
        write(&bundle, folder, self.quiet || self.json)?;
        Ok(code(verdict.call, self.strict))
    }
}
