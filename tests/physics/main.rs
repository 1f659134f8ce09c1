//! Checks of the solver against closed forms, other methods and itself.
mod straight;
mod support;
