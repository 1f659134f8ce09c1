//! The state of a drill file and the lines that change it.

use super::number::{Notation, Zeros};
use super::{DrillFile, DrillHole, tool_function};
use crate::board::Plating;
use crate::diag::code::read as code;
use crate::geom::Point;
use crate::geom::stroke::arc;
use crate::read::gerber::{Attributes, decimal, excerpt};
use crate::read::log::Log;
use std::collections::BTreeMap;

/// Largest tool in metres: more is a misread unit or format.
const LARGEST_TOOL_M: f64 = 25e-3;
/// Most holes of one file.
const MOST_HOLES: usize = 1_000_000;

#[derive(Clone, Copy, Debug)]
struct Tool {
    diameter_m: f64,
    plating: Option<Plating>,
    via: Option<bool>,
}

#[derive(Debug, Default)]
struct State {
    notation: Notation,
    tools: BTreeMap<u32, Tool>,
    tool: Option<Tool>,
    position: Point,
    /// Rout mode: moves draw instead of drilling.
    routing: bool,
    /// The cut under way.
    cut: Option<Vec<Point>>,
    /// Plating of a `;TYPE=` comment, and whether it came after the header.
    stated: Option<Plating>,
    stated_in_body: bool,
    attributes: Attributes,
    in_header: bool,
    saw_header: bool,
    done: bool,
    holes: Vec<DrillHole>,
}

/// Reads a drill file to its end. What is wrong is logged.
pub fn read_drill(text: &str, log: &mut Log) -> DrillFile {
    let mut state = State::default();
    let mut last_line = 1;
    for (index, raw) in text.lines().enumerate() {
        let line = index as u32 + 1;
        let command = raw.trim().trim_start_matches('\u{feff}').trim_end_matches('*');
        if command.is_empty() {
            continue;
        }
        if state.done {
            break;
        }
        last_line = line;
        let outcome = match command.strip_prefix(';') {
            Some(comment) => {
                state.comment(comment.trim(), line, log);
                Ok(())
            }
            None => state.command(command, line),
        };
        if let Err(text) = outcome {
            log.error(line, code::DRILL_SYNTAX, text);
        }
        if state.holes.len() > MOST_HOLES {
            log.error(line, code::DRILL_SYNTAX, format!("the file must have at most {MOST_HOLES} holes"));
            break;
        }
    }
    state.end_cut(last_line);
    if !state.done && state.saw_header {
        let text = "the file must end with `M30`; it may have been cut off";
        log.error(last_line, code::DRILL_CUT_OFF, text);
    }
    DrillFile { file: state.attributes.file, holes: state.holes }
}

impl State {
    fn comment(&mut self, comment: &str, line: u32, log: &mut Log) {
        if let Some(command) = comment.strip_prefix("#@!") {
            let command = command.trim();
            if matches!(command.get(..2), Some("TF" | "TA" | "TO" | "TD"))
                && let Err(text) = self.attributes.take(command, line)
            {
                log.warning(line, code::GERBER_ATTRIBUTE, text);
            }
        } else if let Some(kind) = comment.strip_prefix("TYPE=") {
            self.stated = match kind.trim() {
                "PLATED" => Some(Plating::Plated),
                "NON_PLATED" | "NONPLATED" => Some(Plating::NonPlated),
                _ => None,
            };
            self.stated_in_body = !self.in_header;
        } else if let Some(format) = comment.strip_prefix("FILE_FORMAT=").or(comment.strip_prefix("FORMAT={"))
        {
            let mut digits = format.split(|c: char| !c.is_ascii_digit()).map(|n| n.parse().ok());
            if let (Some(Some(before)), Some(Some(after))) = (digits.next(), digits.next()) {
                let usable = before <= 6usize && after <= 7usize;
                self.notation.digits = usable.then_some((before, after));
            }
        }
    }

    fn set_unit(&mut self, unit_m: f64) -> Result<(), String> {
        if self.notation.unit_m.is_some_and(|unit| unit != unit_m) {
            return Err("the unit must stay the same in a file; got both millimetres and inches".to_owned());
        }
        self.notation.unit_m = Some(unit_m);
        Ok(())
    }

    fn command(&mut self, command: &str, line: u32) -> Result<(), String> {
        for (word, unit_m) in [("METRIC", 1e-3), ("INCH", 25.4e-3)] {
            if let Some(rest) = command.strip_prefix(word) {
                for field in rest.split(',').map(str::trim).filter(|field| !field.is_empty()) {
                    match field {
                        "LZ" => self.notation.zeros = Some(Zeros::LeadingKept),
                        "TZ" => self.notation.zeros = Some(Zeros::TrailingKept),
                        _ if field.bytes().all(|b| b == b'0' || b == b'.') && field.contains('.') => {
                            let at = field.find('.').unwrap_or(0);
                            self.notation.digits = Some((at.min(6), (field.len() - at - 1).min(7)));
                        }
                        _ => return Err(format!("`{}` is not known behind `{word}`", excerpt(field))),
                    }
                }
                return self.set_unit(unit_m);
            }
        }
        match command {
            "M48" => (self.in_header, self.saw_header) = (true, true),
            "%" | "M95" => self.in_header = false,
            "M71" => return self.set_unit(1e-3),
            "M72" => return self.set_unit(25.4e-3),
            "M30" | "M00" => {
                self.end_cut(line);
                self.done = true;
            }
            "FMAT,1" => return Err("drill format 1 (`FMAT,1`) is not supported".to_owned()),
            "ICI,ON" | "ICI" | "G91" => return Err("incremental coordinates are not supported".to_owned()),
            _ if ["FMAT", "VER", "ICI,OFF", "ATC", "DETECT", "M47", "TCST", "BLKD", "SBK", "M01"]
                .iter()
                .any(|word| command.starts_with(word)) => {}
            _ => return self.fields(command, line),
        }
        Ok(())
    }

    /// A line of codes, each a letter and a number.
    fn fields(&mut self, command: &str, line: u32) -> Result<(), String> {
        let wrong = || format!("line `{}` is not known", excerpt(command));
        let mut fields: Vec<(char, &str)> = Vec::new();
        let mut rest = command;
        while let Some(letter) = rest.chars().next() {
            if !letter.is_ascii_uppercase() {
                return Err(wrong());
            }
            let tail = &rest[1..];
            let length =
                tail.find(|c: char| !(c.is_ascii_digit() || "+-.".contains(c))).unwrap_or(tail.len());
            fields.push((letter, &tail[..length]));
            rest = &tail[length..];
        }
        match fields[..] {
            [('T', number), ref more @ ..] => return self.tool(number, more, line),
            [('R', count), ref more @ ..] => return self.repeat(count, more, line),
            _ => {}
        }
        if let Some(at) = fields.iter().position(|&(letter, number)| letter == 'G' && number == "85") {
            let from = self.target(&fields[..at])?.0;
            self.position = from;
            let to = self.target(&fields[at + 1..])?.0;
            self.position = to;
            return self.push(vec![from, to], line);
        }
        let mut interpolation = None;
        let mut operands = Vec::new();
        for &(letter, number) in &fields {
            match (letter, number.trim_start_matches('0')) {
                ('N' | 'F' | 'S', _) => {}
                ('G', "") => {
                    self.end_cut(line);
                    self.routing = true;
                    interpolation = Some(0);
                }
                ('G', "1" | "2" | "3") => interpolation = number.parse().ok(),
                ('G', "5" | "81") => {
                    self.end_cut(line);
                    self.routing = false;
                }
                ('G', "90" | "40") => {}
                ('M', "15") => self.cut = Some(vec![self.position]),
                ('M', "16" | "17") => self.end_cut(line),
                ('X' | 'Y' | 'I' | 'J' | 'A', _) => operands.push((letter, number)),
                _ => return Err(wrong()),
            }
        }
        if operands.is_empty() {
            return Ok(());
        }
        let (to, centre) = self.target(&operands)?;
        let from = std::mem::replace(&mut self.position, to);
        match interpolation {
            Some(0) => Ok(()),
            Some(mode) => {
                let path = self.path(from, to, mode, &operands, centre)?;
                self.cut.get_or_insert_with(|| vec![from]).extend(&path[1..]);
                Ok(())
            }
            None if self.cut.is_some() => {
                self.cut.get_or_insert_default().push(to);
                Ok(())
            }
            None if self.routing => Ok(()),
            None => self.push(vec![to], line),
        }
    }

    /// The point that coordinates lead to, and the centre that `I` and `J` give.
    fn target(&self, fields: &[(char, &str)]) -> Result<(Point, Point), String> {
        let (mut to, mut centre) = (self.position, self.position);
        for &(letter, number) in fields {
            match letter {
                'X' => to.x = self.notation.coordinate(number)?,
                'Y' => to.y = self.notation.coordinate(number)?,
                'I' => centre.x += self.notation.coordinate(number)?,
                'J' => centre.y += self.notation.coordinate(number)?,
                'A' | 'N' | 'F' | 'S' => {}
                'G' if number.trim_start_matches('0') == "5" => {}
                _ => return Err(format!("`{letter}{number}` must not stand beside coordinates")),
            }
        }
        Ok((to, centre))
    }

    /// Points of a rout from `from` to `to`.
    fn path(
        &self,
        from: Point,
        to: Point,
        mode: u32,
        operands: &[(char, &str)],
        centre: Point,
    ) -> Result<Vec<Point>, String> {
        if mode == 1 || from == to && !operands.iter().any(|field| matches!(field.0, 'I' | 'J')) {
            return Ok(vec![from, to]);
        }
        let clockwise = mode == 2;
        let centre = match operands.iter().find(|field| field.0 == 'A') {
            // A radius means the arc of at most half a turn.
            Some((_, radius)) => {
                let radius_m = self.notation.coordinate(radius)?;
                let half = (to - from) * 0.5;
                let square = radius_m * radius_m - half.dot(half);
                if square < -0.05 * radius_m * radius_m {
                    return Err(format!("an arc's radius `{radius}` must reach from its start to its end"));
                }
                let length = half.length();
                let left = Point::new(-half.y, half.x) * (square.max(0.0).sqrt() / length);
                let middle = from + half;
                if clockwise { middle - left } else { middle + left }
            }
            None => centre,
        };
        let (a, b) = (from.distance(centre), to.distance(centre));
        if a == 0.0 || (a - b).abs() > (0.05 * a.max(b)).max(20e-6) {
            return Err("an arc must have both ends at the same distance from its centre".to_owned());
        }
        Ok(arc(from, to, centre, clockwise))
    }

    /// `T` defines a tool, selects one, or both.
    fn tool(&mut self, number: &str, more: &[(char, &str)], line: u32) -> Result<(), String> {
        let code: u32 = number.parse().map_err(|_| format!("tool `T{number}` must have a number"))?;
        self.end_cut(line);
        if let Some((_, size)) = more.iter().find(|field| field.0 == 'C') {
            let unit_m =
                self.notation.unit_m.ok_or("a tool needs the unit (`METRIC` or `INCH`) before it")?;
            let wrong = || format!("diameter of tool `T{code}` must be from 0 to 25 mm; got `{size}`");
            let diameter_m = decimal(size).ok_or_else(wrong)? * unit_m;
            if !(diameter_m > 0.0 && diameter_m <= LARGEST_TOOL_M) {
                return Err(wrong());
            }
            let (plating, via) = self.attributes.function.as_deref().map_or((None, None), tool_function);
            let tool = Tool { diameter_m, plating: plating.or(self.stated), via };
            self.tools.insert(code, tool);
            if self.in_header {
                return Ok(());
            }
        } else if self.in_header && !more.is_empty() {
            return Err(format!("tool `T{code}` must have a diameter (`C`)"));
        }
        self.tool = self.tools.get(&code).copied();
        if self.tool.is_none() && code != 0 {
            return Err(format!("tool `T{code}` must be defined before it is selected"));
        }
        Ok(())
    }

    /// `R` repeats the last hole with a step.
    fn repeat(&mut self, count: &str, more: &[(char, &str)], line: u32) -> Result<(), String> {
        let wrong = || format!("repeat `R{count}` must have a number from 1 to 10000 and follow a hole");
        let count: u32 = count.parse().ok().filter(|n| (1..=10_000).contains(n)).ok_or_else(wrong)?;
        let Some(last) = self.holes.last().cloned() else { return Err(wrong()) };
        let mut step = Point::default();
        for &(letter, number) in more {
            match letter {
                'X' => step.x = self.notation.coordinate(number)?,
                'Y' => step.y = self.notation.coordinate(number)?,
                _ => return Err(format!("`{letter}{number}` must not stand in a repeat")),
            }
        }
        for index in 1..=count {
            let path: Vec<Point> = last.path.iter().map(|&p| p + step * f64::from(index)).collect();
            self.position = path[path.len() - 1];
            self.holes.push(DrillHole { path, line, ..last.clone() });
        }
        Ok(())
    }

    fn end_cut(&mut self, line: u32) {
        if let Some(mut path) = self.cut.take() {
            path.dedup();
            if let Some(tool) = self.tool {
                self.add(tool, path, line);
            }
        }
    }

    fn push(&mut self, mut path: Vec<Point>, line: u32) -> Result<(), String> {
        path.dedup();
        let tool = self.tool.ok_or("a hole needs a tool, and none is selected")?;
        self.add(tool, path, line);
        Ok(())
    }

    fn add(&mut self, tool: Tool, path: Vec<Point>, line: u32) {
        let stated = self.stated.filter(|_| self.stated_in_body);
        let plating = stated.or(tool.plating);
        self.holes.push(DrillHole { path, diameter_m: tool.diameter_m, plating, via: tool.via, line });
    }
}
