//! A whole run: review -> plan -> maps -> files, with progress and threads.
