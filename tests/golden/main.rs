//! Pictures: golden cases, and rules that every picture keeps.

mod gauge;
mod pages;
