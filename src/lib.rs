//! Stillgate answers one question about a small block of feedback logic (latches, mutual-exclusion elements, handshake
//! controllers, dividers, interlocks, ring oscillators): *with every delay its parts may have, does each input change
//! lead the block to rest in a state it is allowed to rest in, in time and without a glitch?*
//!
//! # The words
//!
//! A *net* is a signal; a *gate* drives one net and has a rise and a fall delay; an *input* is driven from outside. In a
//! *stable state* every gate's output equals its function. A *step* changes inputs; the time from one step to the next is
//! a *window*; a window is *settled* when no event is pending. A *glitch* is an unwanted pulse that was seen. An
//! *instance* is one concrete case: a delay for every gate and edge, a place for every step.
//!
//! # One circuit, seen by two views
//!
//! ```
//! use stillgate::control::Control;
//! use stillgate::engine::Program;
//! use stillgate::review;
//!
//! let text = r#"
//! title = "latch of two NANDs"
//! outputs = ["q"]
//! [inputs]
//! set_not = 1
//! reset_not = 1
//! [initial]
//! q = 0
//! [gates]
//! q  = { nand = ["set_not", "qn"] }
//! qn = { nand = ["reset_not", "q"] }
//! [delays]
//! delay = [6, 9, 14]
//! [[steps]]
//! label = "set"
//! at = 100
//! set = { set_not = 0 }
//! expect = { q = 1 }
//! [sweep]
//! samples = 200
//! "#;
//! let scenario = stillgate::reader::read(text, "latch.toml").unwrap().scenario;
//!
//! // without delays: three input vectors have one stable state, one has two
//! let states = review::states(&scenario, &Control::default()).unwrap();
//! assert_eq!(states.count.as_deref(), Some("5"));
//!
//! // with delays: 200 draws of them
//! let program = Program::new(&scenario, &Control::default()).unwrap();
//! let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
//! assert_eq!(review.verdict.call.words(), "proved");
//! assert_eq!(review.sweep.windows[0].outcomes.len(), 1);
//! ```
//!
//! The views check one another: every settled state must be one of the stable states, and every failing case of the
//! sweep is run again by itself. A contradiction is reported as a defect of the program, never hidden.
//!
//! # The floors, lowest first
//!
//! [`time`], [`logic`], [`control`] · [`circuit`] · [`delay`] · [`scenario`] · [`instance`] · [`statics`] · [`flow`] · [`engine`] ·
//! [`findings`] · [`sweep`] · [`search`] · [`review`] · [`limit`] · [`reader`], [`output`] · [`cli`]. A module uses only floors below its own.
//!
//! # What is not modelled
//!
//! Metastable dwell, voltage levels, noise, tri-state and wired nets, supply ramps, contact bridges, part failures. A
//! logic simulation is no safety case. A sweep can find failures; it proves nothing.
//!
//! Read next: [`review::review`] for the main job, [`scenario::Builder`] for circuits built in code, and in `docs/` the
//! scenario format, the semantics, and the methods with their sources.

pub mod circuit;
pub mod cli;
pub mod control;
pub mod delay;
pub mod engine;
pub mod findings;
pub mod flow;
pub mod instance;
pub mod limit;
pub mod logic;
pub mod output;
pub mod proof;
pub mod reader;
pub mod review;
pub mod scenario;
pub mod search;
pub mod statics;
pub mod sweep;
pub mod time;
