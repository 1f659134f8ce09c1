//! From a plan to a solved map: coverage, masks, the closed form, figures and numbers.

mod mask;
