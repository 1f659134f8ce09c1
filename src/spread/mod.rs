//! Published closed forms of the return current, one file for each model.

pub mod stripline_constants;
