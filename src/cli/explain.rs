//! `ebbmap explain`: prints what a message code means and what to do.

use super::{Console, Exit};
use crate::diag::code;

/// Prints the paragraph of one code, or the list of all.
pub fn explain(name: Option<&str>, console: &mut Console) -> Exit {
    let Some(name) = name else {
        for code in code::all() {
            console.result(&format!("{}\n", code.name));
        }
        return Exit::Complete;
    };
    match code::all().find(|code| code.name == name) {
        Some(code) => {
            console.result(&format!("{}\n\n{}\n", code.name, code.meaning));
            Exit::Complete
        }
        None => {
            console.remark(&format!("error: message code `{name}` does not exist\n"));
            console.remark("  hint: `ebbmap explain` lists all codes\n");
            Exit::Unusable
        }
    }
}
