//! Published closed forms of the return current, one file for each model.
