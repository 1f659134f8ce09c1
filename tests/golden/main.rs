//! Pictures: golden cases, and rules that every picture keeps.
//!
//! A golden case is a folder `tests/golden/<group>/<name>/` with `case.toml` (title, what it guards, pixels that may
//! differ), `expect.svg` (embedded rasters and fonts replaced by their size and hash) and `expect.png`. Run with
//! `EBBMAP_BLESS=1` to rewrite the references; the run then fails so that nobody blesses by accident.

mod cases;
mod compare;
mod gauge;
mod layers;
mod pages;
