//! Networks by name, and what their state set costs: each measured in a process of its own, so that the peak memory is
//! its own, too.

use std::process::Command;

use stillgate::circuit::Circuit;
use stillgate::control::Control;
use stillgate::statics::StateSet;

use super::networks::{Wiring, array, dividers, random};

/// Tells a process which network to measure.
const ASKED: &str = "STILLGATE_NETWORK";
/// Short work is repeated until it has taken this long, seconds.
const AT_LEAST: f64 = 0.2;
/// Inputs of the random networks.
pub const INPUTS: usize = 24;

/// A network by name.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Network {
    /// This many dividers in a chain.
    Dividers(usize),
    /// An array of latches of this side.
    Array(usize),
    /// This many gates, each reading gates within 20 places: 300 of them have about 30 feedback nets.
    Near { gates: usize, seed: u64 },
    /// This many gates, reading each other anywhere: 300 of them have about 25 feedback nets.
    Scattered { gates: usize, seed: u64 },
}

impl Network {
    /// The network itself.
    pub fn circuit(self) -> Circuit {
        match self {
            Network::Dividers(stages) => dividers(stages),
            Network::Array(side) => array(side),
            Network::Near { gates, seed } => random(Wiring::Within(20), INPUTS, gates, 200, seed),
            Network::Scattered { gates, seed } => random(Wiring::Scattered, INPUTS, gates, 500, seed),
        }
    }

    fn text(self) -> String {
        match self {
            Network::Dividers(stages) => format!("dividers {stages} 0"),
            Network::Array(side) => format!("array {side} 0"),
            Network::Near { gates, seed } => format!("near {gates} {seed}"),
            Network::Scattered { gates, seed } => format!("scattered {gates} {seed}"),
        }
    }

    fn of(text: &str) -> Option<Network> {
        let [family, size, seed] = text.split(' ').collect::<Vec<_>>()[..] else { return None };
        let (gates, seed) = (size.parse().ok()?, seed.parse().ok()?);
        Some(match family {
            "dividers" => Network::Dividers(gates),
            "array" => Network::Array(gates),
            "near" => Network::Near { gates, seed },
            "scattered" => Network::Scattered { gates, seed },
            _ => return None,
        })
    }
}

/// What building the state set and counting it took.
#[derive(Clone, Copy, Debug)]
pub struct Cost {
    /// Processor time of one thread; wall time where the system does not tell.
    pub seconds: f64,
    /// Nodes of the diagram; `None`: it gave up.
    pub nodes: Option<usize>,
    /// Peak of the resident memory, where the system tells.
    pub megabytes: Option<f64>,
    /// Binary digits of the number of stable states.
    pub digits: u64,
}

/// The first call of `main`: measures the network that the parent asked for, if one did, and ends the process.
pub fn answer_if_asked() {
    let Ok(text) = std::env::var(ASKED) else { return };
    let circuit = Network::of(&text).expect("the parent knows the networks").circuit();
    let (clock, began) = (std::time::Instant::now(), processor());
    let mut runs = 0.0;
    let (seconds, nodes, digits) = loop {
        let set = StateSet::of(&circuit, &Control::default());
        let digits = set.as_ref().map_or(0, |set| set.count().bits());
        runs += 1.0;
        let spent = match (began, processor()) {
            (Some(began), Some(now)) => now - began,
            _ => clock.elapsed().as_secs_f64(),
        };
        if spent >= AT_LEAST {
            break (spent / runs, set.map_or(0, |set| set.nodes()), digits);
        }
    };
    println!("{seconds} {nodes} {} {digits}", peak().unwrap_or(0.0));
    std::process::exit(0);
}

/// Measures a network in a process of its own.
pub fn cost(network: Network) -> Cost {
    let program = std::env::current_exe().expect("a program that runs has a file");
    let output = Command::new(program).env(ASKED, network.text()).output().expect("it can be started again");
    let text = String::from_utf8_lossy(&output.stdout);
    let [seconds, nodes, megabytes, digits] = text.split_whitespace().collect::<Vec<_>>()[..] else {
        panic!("{network:?}: {text} {}", String::from_utf8_lossy(&output.stderr));
    };
    let number = |text: &str| text.parse::<f64>().expect("a number");
    Cost {
        seconds: number(seconds),
        nodes: Some(number(nodes) as usize).filter(|nodes| *nodes > 0),
        megabytes: Some(number(megabytes)).filter(|megabytes| *megabytes > 0.0),
        digits: number(digits) as u64,
    }
}

/// Seconds that this process has been on a processor.
pub fn processor() -> Option<f64> {
    let text = std::fs::read_to_string("/proc/self/schedstat").ok()?;
    Some(text.split_whitespace().next()?.parse::<f64>().ok()? * 1e-9)
}

/// Most memory that this process has had, megabytes.
pub fn peak() -> Option<f64> {
    let text = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = text.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    Some(line.trim().strip_suffix("kB")?.trim().parse::<f64>().ok()? * 1.024e-3)
}
