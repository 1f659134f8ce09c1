//! `ebbmap` shows where the return current of a net flows on the reference planes of a circuit board.
//!
//! Data flows one way: files -> board -> plan -> field -> figures -> files. Each hand-over is a plain type:
//! [`board::Board`] (what the fabrication data say), [`review::Review`] (what the user asks),
//! [`plan::Plan`] (what will be solved, before minutes of work), [`field::ReturnMap`] (the current density),
//! [`figure::Figures`] (the numbers a reviewer reads), and the pictures and texts that [`report`] returns.

pub mod board;
pub mod cli;
pub mod diag;
pub mod draw;
pub mod field;
pub mod figure;
pub mod finding;
pub mod geom;
pub mod math;
pub mod plan;
pub mod read;
pub mod report;
pub mod review;
pub mod run;
pub mod sheet;
pub mod signal;
pub mod spread;
pub mod style;
pub mod unit;
