//! Reading fabrication data: our own small files with areas computed by hand, malformed files, and real boards where
//! they are at hand. The small files are in `tests/data/reading`.
//!
//! - `copper`: what each construct of a copper file covers, and what its attributes say.
//! - `sets`: which file is what; job file, duplicates, archives, profile, stackup.
//! - `holes`: drill and rout files, barrels, cuts, pins.
//! - `malformed`: every malformed case is an error with its line.
//! - `mutation`: no input makes the reader panic.
//! - `real`: areas, holes and counts of real boards against independent counts.

#![allow(clippy::unwrap_used)]

mod copper;
mod holes;
mod malformed;
mod mutation;
mod real;
mod sets;
mod support;
