//! `loopwright` compiles the text of a feedback loop (a `.loop` file) into exact closed-loop models.
//!
//! Data flows one way, through rooms that each have one door:
//!
//! 1. [`source`] holds texts and finds places in them;
//! 2. [`syntax`] reads a text into a syntax tree ([`syntax::parse`]);
//! 3. [`resolve`] binds names, checks units and writes out `define` and `repeat` ([`resolve::resolve`]);
//! 4. [`netlist`] is what comes of it: the one intermediate form, plain data;
//! 5. [`flow`] makes the signal-flow graph and reduces it ([`flow::derive`], [`flow::mason`]);
//! 6. [`algebra`] does the exact arithmetic for all of them and knows nothing of netlists;
//! 7. [`analysis`] judges the closed loop: stability, modes, margins, responses, requirements ([`analysis::assess`]);
//! 8. [`results`] are plain data, made once and rendered many times by [`report`];
//! 9. [`diagnostics`] is how every room tells a mistake; [`cli`] joins the rooms to a command line.

pub mod algebra;
pub mod analysis;
pub mod cli;
pub mod diagnostics;
pub mod flow;
pub mod netlist;
pub mod report;
pub mod resolve;
pub mod results;
pub mod source;
pub mod syntax;
