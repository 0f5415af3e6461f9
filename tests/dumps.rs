//! Value change dumps: what is written is what happened, what is read drives the circuit, and no dump makes the reader panic.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

use stillgate::control::Control;
use stillgate::engine::{Program, Trace};
use stillgate::instance::{Instance, Which};
use stillgate::logic::Value;
use stillgate::output::dump;
use stillgate::reader::{self, Diagnostics, Loaded, ReadError};
use stillgate::scenario::{Place, Scenario};

fn project(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// A circuit whose inputs the dumps of these tests drive.
fn driven(stimulus: &str) -> String {
    format!(
        "title = \"driven\"\nstimulus = {stimulus}\n[inputs]\na = 0\nb = 0\n\"d[2]\" = 0\n[gates]\nq = {{ and = [\"a\", \"b\"], \
         delay = 2 }}\nr = {{ not = [\"d[2]\"], delay = 2 }}\n"
    )
}

/// A scenario read beside a dump.
fn beside(dump: &[u8], scenario: &str) -> Result<Loaded, Box<Diagnostics>> {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("trace.vcd"), dump).unwrap();
    fs::write(folder.path().join("block.toml"), scenario).unwrap();
    match reader::load(&folder.path().join("block.toml")) {
        Ok(loaded) => Ok(loaded),
        Err(ReadError::Faults(faults)) => Err(Box::new(faults)),
        Err(ReadError::File(error)) => panic!("{error}"),
    }
}

fn good(dump: &str, stimulus: &str) -> Scenario {
    beside(dump.as_bytes(), &driven(stimulus)).unwrap_or_else(|faults| panic!("{faults}\n{dump}")).scenario
}

/// The steps of a scenario in words: `at 5 ns: a=1 b=0`, behind the values before the first.
fn steps(scenario: &Scenario) -> Vec<String> {
    let initial: String = scenario.stimulus.initial.iter().map(|bit| if *bit { '1' } else { '0' }).collect();
    let one = |step: &stillgate::scenario::Step| {
        let Place::At(at) = &step.place else { panic!("{step:?}") };
        assert_eq!((at.min, at.max), (at.typ, at.typ));
        assert_eq!(step.label, format!("at {} {}", at.typ.decimal(scenario.unit), scenario.unit));
        let set = step.set.iter().map(|(net, bit)| format!(" {}={}", scenario.circuit.name(*net), u8::from(*bit)));
        format!("{}:{}", step.label, set.collect::<String>())
    };
    [initial].into_iter().chain(scenario.stimulus.steps.iter().map(one)).collect()
}

const FILE: &str = "{ dump = \"trace.vcd\" }";
const HEAD: &str = "$timescale 1 ns $end $var wire 1 ! a $end $var wire 1 \" b $end $var wire 4 % d [3:0] $end \
                    $enddefinitions $end\n";

#[test]
fn each_malformed_dump_gets_its_one_fault_and_nothing_is_written() {
    let mut wrong = String::new();
    let mut seen = 0;
    let mut paths: Vec<PathBuf> = fs::read_dir(project("tests/dumps")).unwrap().map(|it| it.unwrap().path()).collect();
    paths.sort();
    for path in paths {
        seen += 1;
        let text = fs::read(&path).unwrap();
        let first = String::from_utf8_lossy(&text).lines().next().unwrap().to_string();
        let (place, fragment) = first.strip_prefix("$comment expect ").and_then(|it| it.split_once(' ')).unwrap();
        let fragment = fragment.strip_suffix(" $end").unwrap();
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("trace.vcd"), &text).unwrap();
        fs::write(folder.path().join("block.toml"), driven(FILE)).unwrap();
        let faults = match reader::load(&folder.path().join("block.toml")) {
            Err(ReadError::Faults(faults)) => faults,
            other => panic!("{path:?}: {other:?}"),
        };
        let [item] = faults.items() else { panic!("{path:?}: {faults}") };
        let right = format!("{}:{}", item.line, item.column) == place && item.message.contains(fragment);
        let shown = faults.render(false);
        let pictured =
            shown.contains(&format!("trace.vcd:{place}\n")) && shown.contains(&format!("help: {}", item.help));
        if !right || !pictured || item.help.is_empty() {
            wrong += &format!("{path:?}\n{shown}\n");
        }
        let output = Command::new(env!("CARGO_BIN_EXE_stillgate"))
            .current_dir(folder.path())
            .args(["review", "block.toml"])
            .output()
            .unwrap();
        let said = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(2), "{path:?}: {said}");
        assert!(output.stdout.is_empty() && said.contains("trace.vcd") && !said.contains("panicked"), "{said}");
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2, "{path:?} left a file");
    }
    assert!(wrong.is_empty(), "{wrong}");
    assert!(seen >= 50, "{seen}");
    let empty = beside(b"", &driven(FILE)).unwrap_err();
    assert!(empty.items()[0].message.contains("within its declarations"), "{empty}");
}

#[test]
fn what_is_wrong_in_the_scenario_is_told_there() {
    let dump = format!("{HEAD}#0 0! 0\" b0 % #5 1!\n");
    let several = "$timescale 1 ns $end $scope module x $end $var wire 1 ! a $end $upscope $end $scope module y $end \
                   $var wire 1 % a $end $var real 1 & b $end $upscope $end $enddefinitions $end #0 0! 1% r1 &\n";
    let cases = [
        (dump.as_str(), "{ dump = \"other.vcd\" }", "cannot be read: there is no such file", "beside the scenario"),
        (&dump, "{ dump = \".\" }", "cannot be read", "beside"),
        (&dump, "{ dump = 1 }", "expected text", "quotes"),
        (&dump, "{ }", "lacks `dump`", "dump = "),
        (&dump, "{ dump = \"trace.vcd\", dump_text = \"\" }", "has a dump already", "keep one"),
        (&dump, "{ dmp = \"trace.vcd\" }", "unknown key `dmp`", "`dump`"),
        (&dump, "{ dump = \"trace.vcd\", from = 5, to = 4 }", "ends before it begins", "or later"),
        (&dump, "{ dump = \"trace.vcd\", from = -1 }", "negative", "zero or more"),
        (&dump, "{ dump = \"trace.vcd\", unknown = \"keep\" }", "no meaning", "hold"),
        (&dump, "{ dump = \"trace.vcd\", map = { q = \"a\" } }", "no input `q`", "what the dump calls it"),
        (&dump, "{ dump = \"trace.vcd\", map = { a = \"aa\" } }", "no variable `aa`", "`a`"),
        (&dump, "{ dump = \"trace.vcd\", map = { a = \"d\" } }", "`d[3:0]` has 4 bits", "\"d[0]\""),
        (&dump, "{ dump = \"trace.vcd\", map = { a = \"d[4]\" } }", "no variable `d[4]`", "with its scopes"),
        (several, FILE, "`a` is several signals of the dump: x.a, y.a", "x.a"),
        (several, "{ dump = \"trace.vcd\", map = { a = \"x.a\", b = \"y.b\" } }", "`y.b` holds no bits", "one bit"),
        (
            "$timescale 1 ns $end $var wire 1 ! other $end $enddefinitions $end #0\n",
            FILE,
            "names none of the inputs",
            "map = { a = \"other\" }",
        ),
    ];
    for (dump, stimulus, message, help) in cases {
        let faults = beside(dump.as_bytes(), &driven(stimulus)).unwrap_err();
        let item = &faults.items()[0];
        assert!(item.message.contains(message) && item.help.contains(help), "{stimulus}: {faults}");
        assert!(faults.name().ends_with("block.toml") && item.line == 2, "{faults}");
    }
    let with_steps = driven(FILE) + "[[steps]]\nat = 1\nset = { a = 1 }\n";
    let faults = beside(dump.as_bytes(), &with_steps).unwrap_err();
    assert!(faults.items()[0].message.contains("takes the place of steps"), "{faults}");
    let clocked = driven("{ dump = \"trace.vcd\", map = { a = \"b\" } }")
        + "[[clocks]]\nnet = \"a\"\nfirst = 1\nperiod = 4\nhigh = 2\ncount = 2\n";
    let faults = beside(dump.as_bytes(), &clocked).unwrap_err();
    assert!(faults.items()[0].message.contains("driven by a clock"), "{faults}");
    let faults = reader::read(&driven(FILE), "nowhere.toml").unwrap_err();
    assert!(faults.items()[0].message.contains("not read from a file"), "{faults}");
}

/// Legal, whatever it looks like. Each is worked out by hand.
#[test]
fn unusual_dumps_read_well() {
    let cases: [(&str, &str, &[&str]); 19] = [
        ("plain", "$dumpvars 0! 1\" b0100 % $end #5 1! #7 0\" b0 %", &["011", "at 5 ns: a=1", "at 7 ns: b=0 d[2]=0"]),
        ("all of it at one instant is one step", "0! 0\" b0 % #5 1! 1\" b1111 %", &["000", "at 5 ns: a=1 b=1 d[2]=1"]),
        ("no section of start", "0! 1\" b0 % #5 1!", &["010", "at 5 ns: a=1"]),
        ("capital letters", "X! 1\" B0 % #5 1! Bx10Z %", &["010", "at 5 ns: a=1 d[2]=1"]),
        (
            "short vectors are filled up",
            "0! 0\" b1 % #5 b100 % #6 b1 %",
            &["000", "at 5 ns: d[2]=1", "at 6 ns: d[2]=0"],
        ),
        ("values that do not change", "0! 0\" b0 % #5 0! #6 1! #7 1! #8 0!", &["000", "at 6 ns: a=1", "at 8 ns: a=0"]),
        ("a time twice", "0! 0\" b0 % #5 1! #5 1\" #6", &["000", "at 5 ns: a=1 b=1"]),
        ("the last change of an instant counts", "0! 0\" b0 % #5 1! 0! #6 1! 0! 1!", &["000", "at 6 ns: a=1"]),
        (
            "a change at the first instant is a step",
            "$dumpvars 0! 0\" b0 % $end 1! #5 0!",
            &["000", "at 0 ns: a=1", "at 5 ns: a=0"],
        ),
        ("all values once more", "0! 0\" b0 % #5 $dumpall 1! 0\" b0 % $end", &["000", "at 5 ns: a=1"]),
        (
            "the recording is off and on again",
            "1! 0\" b0 % #5 $dumpoff x! x\" bx % $end #9 $dumpon 1! 1\" b0 % $end",
            &["100", "at 9 ns: b=1"],
        ),
        (
            "comments anywhere",
            "$comment #9 1! $end 0! $comment $end 0\" b0 % #5 1! $comment x! $end",
            &["000", "at 5 ns: a=1"],
        ),
        ("no value at the start", "1\" #5 1! #6 0!", &["010", "at 5 ns: a=1", "at 6 ns: a=0"]),
        ("unknown at the start", "x! z\" bx % #5 1! x\" #6 1\" b0 %", &["000", "at 5 ns: a=1", "at 6 ns: b=1"]),
        ("leading zeros", "0! 0\" b0 % #0005 1!", &["000", "at 5 ns: a=1"]),
        ("nothing happens", "0! 1\" b0100 %", &["011"]),
        ("unknown digits of no input", "0! 0\" b0 % #5 bx0xx % #6 b01x1 %", &["000", "at 6 ns: d[2]=1"]),
        ("vectors filled up with x", "0! 0\" b0 % #5 1! #6", &["000", "at 5 ns: a=1"]),
        ("one word a line", "0!\r\n0\"\r\nb0\r\n\t%\r\n#5\x0b1!\x0c", &["000", "at 5 ns: a=1"]),
    ];
    for (what, changes, expected) in cases {
        assert_eq!(steps(&good(&format!("{HEAD}#0 {changes}"), FILE)), expected, "{what}");
    }
    // values before the first time are what the inputs begin with
    assert_eq!(steps(&good(&format!("{HEAD}1! b0100 % #3 0! #4 1\""), FILE)), ["101", "at 3 ns: a=0", "at 4 ns: b=1"]);
    // nothing begins before the dump does
    assert_eq!(steps(&good(&format!("{HEAD}#700 1! 0\" b0 % #800 0!"), FILE)), ["100", "at 800 ns: a=0"]);
}

#[test]
fn declarations_may_be_written_in_many_ways() {
    let steps_of = |head: &str, changes: &str, stimulus: &str| steps(&good(&format!("{head} {changes}"), stimulus));
    let expected = ["000", "at 5 ns: a=1"];
    // over several lines, sections in another order, types that are not known, an escaped name
    let odd = "$date\n today\n$end $version x $end\n$comment a\n\n$end\n$timescale\n\n1ns\n$end $scope\nbegin\nmain $end \
               $var\nlogic\n1\n!\n\\a\n$end $var tri0 1 \" b $end $var reg 4 % d[3:0] $end $var event 1 e go $end \
               $upscope $end $enddefinitions\n$end";
    assert_eq!(steps_of(odd, "#0 0! 0\" b0 % #5 1! 1e", FILE), expected);
    // two names of one signal; the range behind the name, as one word or as two; bits of their own
    let alias = "$timescale 1 ns $end $scope module x $end $var wire 1 ! a $end $var wire 1 \" b $end $upscope $end \
                 $scope module y $end $var wire 1 ! a $end $var wire 1 % d [2] $end $upscope $end $enddefinitions $end";
    assert_eq!(steps_of(alias, "#0 0! 0\" 0% #5 1!", FILE), expected);
    // the whole name wins over one that ends like it
    let inner = "$timescale 1 ns $end $var wire 1 ! a $end $scope module x $end $var wire 1 + a $end $var wire 1 \" b $end \
                 $var wire 4 % d [0:3] $end $upscope $end $enddefinitions $end";
    assert_eq!(steps_of(inner, "#0 0! 1+ 0\" b0001 % #5 1!", FILE), expected);
    assert_eq!(
        steps_of(inner, "#0 0! 1+ 0\" b0010 % #5 0+", "{ dump = \"trace.vcd\", map = { a = \"x.a\" } }"),
        ["101", "at 5 ns: a=0"]
    );
    // ticks
    for (tick, time, label) in
        [("100 ps", "55", "5.5"), ("10us", "3", "30000"), ("1 fs", "1", "0.000001"), ("100 S", "2", "200000000000")]
    {
        let head = HEAD.replace("1 ns", tick);
        assert_eq!(steps_of(&head, &format!("#0 0! 0\" b0 % #{time} 1!"), FILE)[1], format!("at {label} ns: a=1"));
    }
}

#[test]
fn a_stretch_can_be_cut_out_and_unknown_values_held() {
    let dump = format!("{HEAD}#0 0! 0\" b0 % #5 1! #10 1\" #15 0! #20 x! #25 0\" #30 1!");
    let with = |keys: &str| format!("{{ dump = \"trace.vcd\"{keys} }}");
    let cut = |keys: &str| steps(&good(&dump, &with(keys)));
    assert_eq!(cut(", to = 15"), ["000", "at 5 ns: a=1", "at 10 ns: b=1", "at 15 ns: a=0"]);
    assert_eq!(cut(", from = 8, to = 14"), ["100", "at 2 ns: b=1"]);
    assert_eq!(cut(", from = 10, to = 10"), ["100", "at 0 ns: b=1"], "what comes at `from` is a step");
    assert_eq!(cut(", from = \"0.022 us\""), ["010", "at 3 ns: b=0", "at 8 ns: a=1"], "before `from` an x is no fault");
    assert_eq!(cut(", from = 90"), ["100"]);
    assert_eq!(cut(", unknown = \"hold\", from = 15"), ["110", "at 0 ns: a=0", "at 10 ns: b=0", "at 15 ns: a=1"]);
    let faults = beside(dump.as_bytes(), &driven(&with(", unknown = \"refused\""))).unwrap_err();
    assert!(faults.items()[0].message.contains("`a` becomes x"), "{faults}");
    let late = format!("{HEAD}#0 0! 0\" b0 % #5 1! #99999999999999 0! #999999999999999999 1!");
    assert_eq!(
        steps(&good(&late, &with(", to = 5"))),
        ["000", "at 5 ns: a=1"],
        "times beyond the stretch do not matter"
    );
}

#[test]
fn what_was_passed_over_is_noted() {
    let head =
        HEAD.replace("$enddefinitions", "$var real 1 & level $end $enddefinitions").replace("1 \" b", "1 \" other");
    let dump =
        format!("{head}#0 x! b0 % r0.5 & #5 1! #6 $dumpoff x! bx % $end #8 $dumpon 1! b0 % $end #9 z! #10 0! 1!");
    let notes = good(&dump, "{ dump = \"trace.vcd\", unknown = \"hold\" }").notes.join("\n");
    for part in [
        "the stimulus is a dump: 1 step of 2 inputs",
        "not in the dump, so kept at the values under `inputs`: b",
        "without a value where the dump begins, so taken from `inputs`: a",
        "1 real variable of the dump passed over",
        "the recording was off once",
        "an input became x or z once and holds its value",
        "1 change at the same instant as another",
    ] {
        assert!(notes.contains(part), "{part} in\n{notes}");
    }
}

/// One run, as a user makes it.
fn trace(scenario: &Scenario, which: &Which) -> Trace {
    let program = Program::new(scenario, &Control::default()).unwrap();
    let mut trace = Trace::default();
    let instance = Instance::of(scenario, which);
    assert!(program.machine().run(&instance, &Control::default(), &mut trace));
    trace
}

/// Values of every net at the end of each instant, by femtosecond; only where something is new.
type Waves = BTreeMap<String, Vec<(u64, char)>>;

fn waves_of(scenario: &Scenario, trace: &Trace) -> Waves {
    let circuit = &scenario.circuit;
    let mut waves: BTreeMap<String, Vec<(u64, char)>> = BTreeMap::new();
    for net in circuit.nets() {
        let start = trace.start.get(net.index()).letter().to_ascii_lowercase();
        let changes = trace.changes.iter().filter(|change| change.net == net);
        let all = changes.map(|change| (change.at.fs(), change.new.letter().to_ascii_lowercase()));
        waves.insert(circuit.name(net).to_string(), [(0, start)].into_iter().chain(all).collect());
    }
    waves
}

/// What an independent reader finds in a dump.
fn read_elsewhere(text: &str) -> Waves {
    let mut parser = vcd::Parser::new(text.as_bytes());
    let header = parser.parse_header().unwrap();
    let (number, unit) = header.timescale.unwrap();
    let tick = u64::from(number) * 10u64.pow(15) / unit.divisor();
    let mut names = BTreeMap::new();
    fn walk(items: &[vcd::ScopeItem], path: &str, names: &mut BTreeMap<vcd::IdCode, String>) {
        for item in items {
            match item {
                vcd::ScopeItem::Scope(scope) => walk(&scope.items, &format!("{path}{}.", scope.identifier), names),
                vcd::ScopeItem::Var(var) => {
                    assert_eq!((var.size, var.var_type), (1, vcd::VarType::Wire));
                    let range = var.index.map_or_else(String::new, |range| range.to_string());
                    assert!(
                        names.insert(var.code, format!("{path}{}{range}", var.reference)).is_none(),
                        "ids are unique"
                    );
                }
                _ => {}
            }
        }
    }
    walk(&header.items, "", &mut names);
    let (mut waves, mut now) = (Waves::new(), 0);
    for command in parser {
        match command.unwrap() {
            vcd::Command::Timestamp(ticks) => now = ticks * tick,
            vcd::Command::ChangeScalar(id, value) => {
                let name = names[&id].strip_prefix("circuit.").unwrap().to_string();
                waves.entry(name).or_default().push((now, value.to_string().chars().next().unwrap()));
            }
            _ => {}
        }
    }
    waves
}

fn demonstrations() -> Vec<(String, String)> {
    let mut all: Vec<(String, String)> = fs::read_dir(project("scenarios"))
        .unwrap()
        .map(|entry| {
            let path = entry.unwrap().path();
            let name = path.file_stem().unwrap().to_string_lossy().into_owned();
            (name, fs::read_to_string(path).unwrap())
        })
        .collect();
    all.sort();
    all
}

#[test]
fn an_independent_reader_finds_the_same_waves() {
    for (name, text) in demonstrations() {
        let scenario = reader::read(&text, &name).unwrap().scenario;
        for which in [Which::Typ, Which::Sample(3)] {
            let trace = trace(&scenario, &which);
            let text = dump::vcd(&scenario, &which.words(), &trace);
            assert_eq!(read_elsewhere(&text), waves_of(&scenario, &trace), "{name} {}", which.words());
        }
    }
    // an unknown start
    let text = "begin = \"unknown\"\n[inputs]\n\"port.a\" = 0\n[gates]\n\"d[1]\" = { not = [\"port.a\"], delay = 2.5 }\n\
                q = { buf = [\"q\"], delay = 1 }\n";
    let scenario = reader::read(text, "unknown").unwrap().scenario;
    let trace = trace(&scenario, &Which::Typ);
    let text = dump::vcd(&scenario, "typical", &trace);
    let expected = "$version Stillgate $end\n$comment unknown, typical $end\n$timescale 100 ps $end\n\
                    $scope module circuit $end\n$var wire 1 \" d [1] $end\n$var wire 1 % q $end\n$scope module port $end\n\
                    $var wire 1 ! a $end\n$upscope $end\n$upscope $end\n$enddefinitions $end\n#0\n$dumpvars\n0!\nx\"\nx%\n\
                    $end\n#25\n1\"\n";
    assert_eq!(text, expected, "worked out by hand");
    assert_eq!(read_elsewhere(&text), waves_of(&scenario, &trace));
    assert_eq!(trace.start.get(1), Value::X);
}

/// A scenario without its stimulus, with a dump in its place.
fn replayed(text: &str) -> String {
    let mut kept = "stimulus = { dump = \"trace.vcd\" }\n".to_string();
    let mut dropped = false;
    for line in text.lines() {
        if line.starts_with('[') {
            dropped = line.starts_with("[[steps]]") || line.starts_with("[[clocks]]");
        }
        if !dropped && !line.starts_with("stimulus") {
            kept += line;
            kept.push('\n');
        }
    }
    kept
}

/// Waves at the end of every instant: what a dump can hold of a run.
fn ends(waves: &Waves) -> Waves {
    let one = |(net, all): (&String, &Vec<(u64, char)>)| {
        let mut kept: Vec<(u64, char)> = Vec::new();
        for (i, (at, value)) in all.iter().enumerate() {
            let is_last = all.get(i + 1).is_none_or(|next| next.0 != *at);
            if is_last && kept.last().is_none_or(|last| last.1 != *value) {
                kept.push((*at, *value));
            }
        }
        (net.clone(), kept)
    };
    waves.iter().map(one).collect()
}

#[test]
fn the_dump_of_a_demonstration_drives_it_the_same_way_again() {
    let mut moved = 0;
    for (name, text) in demonstrations() {
        let scenario = reader::read(&text, &name).unwrap().scenario;
        let first = trace(&scenario, &Which::Typ);
        let dump = dump::vcd(&scenario, "typical", &first);
        let again =
            beside(dump.as_bytes(), &replayed(&text)).unwrap_or_else(|faults| panic!("{name}: {faults}")).scenario;
        assert!(again.stimulus.clocks.is_empty());
        let second = trace(&again, &Which::Typ);
        let (before, after) = (waves_of(&scenario, &first), waves_of(&again, &second));
        // a run that ended by a limit or in an oscillation may be looked at for longer
        let until = first.changes.last().map_or(0, |change| change.at.fs());
        let part = |waves: &Waves| -> Waves {
            let cut = |all: &Vec<(u64, char)>| all.iter().copied().filter(|(at, _)| *at <= until).collect();
            ends(&waves.iter().map(|(net, all)| (net.clone(), cut(all))).collect())
        };
        assert_eq!(part(&after), part(&before), "{name}");
        for net in scenario.circuit.inputs() {
            let net = scenario.circuit.name(net);
            assert_eq!(ends(&after)[net], ends(&before)[net], "{name}: {net}");
            moved += usize::from(before[net].len() > 1);
        }
    }
    assert!(moved >= 30, "only {moved} inputs moved");
}

#[test]
fn parts_of_a_sweep_carry_the_dump_with_them() {
    let folder = tempfile::tempdir().unwrap();
    let stillgate = |arguments: &[&str]| {
        let output = Command::new(env!("CARGO_BIN_EXE_stillgate")).current_dir(folder.path()).args(arguments).output();
        let output = output.unwrap();
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        output.stdout
    };
    let head = HEAD.replace("$enddefinitions", "$var wire 1 ' c\"\\x $end $enddefinitions");
    let dump = format!("{head}#0 1' 0! 0\" b0 % #15 1! #30 1\" 0' #45 b1100 % #60 0!");
    fs::write(folder.path().join("trace.vcd"), dump).unwrap();
    let scenario = driven("{ dump = \"trace.vcd\", from = 5 }") + "[sweep]\nsamples = 400\n";
    fs::write(folder.path().join("block.toml"), scenario.replace("delay = 2 ", "delay = [1, 9] ")).unwrap();
    let whole = stillgate(&["sweep", "block.toml", "--json", "--out", "whole"]);
    stillgate(&["sweep", "block.toml", "--part", "1/2", "--out", "parts", "--quiet"]);
    stillgate(&["sweep", "block.toml", "--part", "2/2", "--out", "parts", "--quiet"]);
    fs::remove_file(folder.path().join("trace.vcd")).unwrap();
    let parts: Vec<String> = fs::read_dir(folder.path().join("parts"))
        .unwrap()
        .map(|it| format!("parts/{}", it.unwrap().file_name().to_string_lossy()))
        .collect();
    assert_eq!(parts.len(), 2);
    let merged = stillgate(&["merge", &parts[0], &parts[1], "--json", "--out", "merged"]);
    assert_eq!(String::from_utf8_lossy(&merged), String::from_utf8_lossy(&whole));
    assert!(String::from_utf8_lossy(&whole).contains("at 10 ns"));
}

#[test]
fn no_bytes_make_the_reader_panic() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("block.toml");
    fs::write(&path, driven("{ dump = \"trace.vcd\", unknown = \"hold\" }")).unwrap();
    let demonstration = {
        let text = fs::read_to_string(project("scenarios/interlock.toml")).unwrap();
        let scenario = reader::read(&text, "interlock").unwrap().scenario;
        dump::vcd(&scenario, "typical", &trace(&scenario, &Which::Typ)).replace("call_upper", "a")
    };
    let oddities = format!(
        "$comment x $end {HEAD}#0 $dumpvars 0! 1\" b01x0 % $end #5 1! bz % #7 $dumpoff x! x\" bx % $end #9 $dumpon 1! 1\" b0 % \
         $end #12 b1111 % 0! #1200 $dumpall 0! 0\" b1 % $end"
    );
    // a multiplicative congruential generator: its high bits are random enough to break texts
    let mut state = 7u64;
    let mut next = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) as u32
    };
    let (mut well, mut faults) = (0, 0);
    for case in 0..4000 {
        let base = if case % 4 == 0 { demonstration.as_bytes() } else { oddities.as_bytes() };
        let mut bytes = base.to_vec();
        for _ in 0..1 + next() % 4 {
            if bytes.is_empty() {
                break;
            }
            let at = next() as usize % bytes.len();
            let interesting = b"$#b01xzrs!\"% \n[]:\xff\x00-9";
            let byte = interesting[next() as usize % interesting.len()];
            match next() % 6 {
                0 => bytes[at] = byte,
                1 => bytes[at] = next() as u8,
                2 => bytes.insert(at, byte),
                3 => drop(bytes.remove(at)),
                4 => bytes.truncate(at.max(1)),
                _ => {
                    let end = (at + next() as usize % 30).min(bytes.len());
                    let piece = bytes[at..end].to_vec();
                    let to = next() as usize % (bytes.len() + 1);
                    bytes.splice(to..to, piece);
                }
            }
        }
        fs::write(folder.path().join("trace.vcd"), &bytes).unwrap();
        match reader::load(&path) {
            Ok(loaded) => {
                well += 1;
                // what goes into parts reads to the same
                let own = reader::read(&loaded.self_contained(), "block.toml");
                let own =
                    own.unwrap_or_else(|faults| panic!("case {case}: {faults}\n{}", String::from_utf8_lossy(&bytes)));
                assert_eq!(
                    steps(&own.scenario),
                    steps(&loaded.scenario),
                    "case {case}: {}",
                    String::from_utf8_lossy(&bytes)
                );
                assert_eq!(own.scenario.notes, loaded.scenario.notes, "case {case}");
            }
            Err(ReadError::Faults(found)) => {
                faults += 1;
                let item = &found.items()[0];
                assert!(item.line > 0 && item.column > 0 && !item.help.is_empty(), "case {case}: {found}");
                assert!(!found.render(false).is_empty());
            }
            Err(ReadError::File(error)) => panic!("{error}"),
        }
    }
    assert!(well > 150 && faults > 400, "{well} read, {faults} did not");
}
