//! Reads a Gerber job file (JSON): title, stackup, and what it says of the files.
//!
//! Fields by the Gerber job format specification (revision 2023.08); everything may be missing.

use super::log::Log;
use crate::diag::code::read as code;
use serde_json::Value;

/// A sheet of the stackup.
#[derive(Clone, Debug, PartialEq)]
pub struct Material {
    /// Whether it is copper; a dielectric otherwise.
    pub copper: bool,
    /// Thickness in metres.
    pub thickness_m: Option<f64>,
    /// Relative permittivity.
    pub permittivity: Option<f64>,
}

/// What a job file says.
#[derive(Clone, Debug, Default)]
pub struct Job {
    /// Name of the project.
    pub title: String,
    /// Revision of the project.
    pub revision: String,
    /// Thickness of the board in metres, solder mask usually included.
    pub thickness_m: Option<f64>,
    /// Copper and dielectrics from the top.
    pub stackup: Vec<Material>,
    /// File names and the functions it gives them.
    pub files: Vec<(String, String)>,
}

/// Reads a job file; none when it is not usable, which is logged.
pub fn read_job(text: &str, log: &mut Log) -> Option<Job> {
    let root: Value = match serde_json::from_str(text.trim_start_matches('\u{feff}')) {
        Ok(root) => root,
        Err(error) => {
            let line = u32::try_from(error.line()).unwrap_or(0);
            log.warning(
                line,
                code::JOB_UNREADABLE,
                format!("the job file must be JSON; got: {error}; it is left out"),
            );
            return None;
        }
    };
    let specs = &root["GeneralSpecs"];
    let text = |value: &Value| value.as_str().unwrap_or_default().trim().to_owned();
    let revision = text(&specs["ProjectId"]["Revision"]);
    let list = |value: &Value| value.as_array().cloned().unwrap_or_default();
    let mut job = Job {
        title: text(&specs["ProjectId"]["Name"]),
        // Exporters write `rev?` where the design has none.
        revision: if revision == "rev?" { String::new() } else { revision },
        thickness_m: number(&specs["BoardThickness"]).map(|mm| mm * 1e-3),
        ..Job::default()
    };
    for entry in list(&root["MaterialStackup"]) {
        let copper = match entry["Type"].as_str() {
            Some("Copper") => true,
            Some("Dielectric") => false,
            _ => continue,
        };
        let thickness_m = number(&entry["Thickness"]).map(|mm| mm * 1e-3).filter(|t| *t > 0.0 && *t < 0.02);
        let permittivity = number(&entry["DielectricConstant"]).filter(|value| (1.0..100.0).contains(value));
        job.stackup.push(Material { copper, thickness_m, permittivity });
    }
    for entry in list(&root["FilesAttributes"]) {
        job.files.push((text(&entry["Path"]), text(&entry["FileFunction"])));
    }
    Some(job)
}

/// A number, also when it was written as a string.
fn number(value: &Value) -> Option<f64> {
    let number = value.as_f64().or_else(|| value.as_str()?.trim().parse().ok())?;
    number.is_finite().then_some(number)
}
