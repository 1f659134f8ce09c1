//! From a plan to a solved map: coverage, masks, the closed form, figures and numbers.

mod closed_form;
mod mask;
mod numbers;
mod scene;
