//! The graphics state of a Gerber file and the commands that change it.

use super::aperture::{Aperture, ApertureKind, Transform, parse_definition};
use super::attribute::Attributes;
use super::macros::Macro;
use super::number::{Format, decimal, turn};
use super::words::{Item, excerpt, items};
use super::{Image, Object};
use crate::board::CopperKind;
use crate::diag::code::read as code;
use crate::geom::Point;
use crate::read::log::Log;
use std::collections::BTreeMap;
use std::sync::Arc;

/// Most objects that one file may make, blocks and repeats resolved.
pub(super) const MOST_OBJECTS: usize = 4_000_000;

/// How `D01` interpolates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Interpolation {
    Linear,
    Clockwise,
    CounterClockwise,
}

/// A region statement under construction.
#[derive(Debug)]
pub(super) struct OpenRegion {
    pub line: u32,
    pub contours: Vec<Vec<Point>>,
}

/// A block or repeat under construction.
#[derive(Debug)]
enum Frame {
    Block { code: u32, line: u32 },
    Repeat { columns: u32, rows: u32, step: Point, line: u32 },
}

/// Everything that commands may change.
pub(super) struct State<'a> {
    pub log: &'a mut Log,
    pub unit_nm: Option<f64>,
    pub format: Option<Format>,
    pub format_reported: bool,
    pub apertures: BTreeMap<u32, Aperture>,
    macros: BTreeMap<String, Macro>,
    pub current: Option<u32>,
    pub position: Point,
    pub interpolation: Interpolation,
    pub single_quadrant: Option<bool>,
    pub dark: bool,
    pub transform: Transform,
    pub region: Option<OpenRegion>,
    pub operation: u32,
    pub attributes: Attributes,
    targets: Vec<Vec<Object>>,
    frames: Vec<Frame>,
    pub n_objects: usize,
    pub pens_reported: Vec<u32>,
    done: bool,
}

/// Reads a Gerber file to its end. What is wrong is logged; the image holds what could be read.
pub fn read_image(text: &str, log: &mut Log) -> Image {
    let items = items(text, log);
    let mut state = State {
        unit_nm: first_unit(&items),
        log,
        format: None,
        format_reported: false,
        apertures: BTreeMap::new(),
        macros: BTreeMap::new(),
        current: None,
        position: Point::default(),
        interpolation: Interpolation::Linear,
        single_quadrant: None,
        dark: true,
        transform: Transform::NONE,
        region: None,
        operation: 2,
        attributes: Attributes::default(),
        targets: vec![Vec::new()],
        frames: Vec::new(),
        n_objects: 0,
        pens_reported: Vec::new(),
        done: false,
    };
    let mut last_line = 1;
    for item in &items {
        if state.done {
            let line = match item {
                Item::Word(_, line) | Item::Comment(_, line) => *line,
                Item::Extended(words) => words.first().map_or(0, |word| word.1),
            };
            state.log.warning(
                line,
                code::GERBER_SYNTAX,
                "what follows the end of the file (`M02`) is left out",
            );
            break;
        }
        match item {
            Item::Word(word, line) => {
                last_line = *line;
                state.word(word, *line);
            }
            Item::Extended(words) => {
                state.extended(words);
                last_line = words.last().map_or(last_line, |word| word.1);
            }
            Item::Comment(comment, line) => {
                last_line = *line;
                if let Some(command) = comment.strip_prefix("#@!") {
                    state.attribute(command.trim(), *line);
                }
            }
        }
    }
    state.finish(last_line)
}

/// The first unit that a file states: old files define apertures before `G70` or `G71`.
fn first_unit(items: &[Item<'_>]) -> Option<f64> {
    items.iter().find_map(|item| match item {
        Item::Word(word, _) if word.starts_with("G70") => Some(25.4e6),
        Item::Word(word, _) if word.starts_with("G71") => Some(1e6),
        Item::Extended(words) => words.iter().find_map(|(word, _)| match word.trim() {
            "MOIN" => Some(25.4e6),
            "MOMM" => Some(1e6),
            _ => None,
        }),
        _ => None,
    })
}

impl State<'_> {
    pub fn error(&mut self, line: u32, text: impl Into<String>) {
        self.log.error(line, code::GERBER_SYNTAX, text);
    }

    /// Adds an object to the image or block being made.
    pub fn push(&mut self, object: Object) {
        self.n_objects += 1;
        if self.n_objects > MOST_OBJECTS {
            if self.n_objects == MOST_OBJECTS + 1 {
                let text = format!("the file must make at most {MOST_OBJECTS} objects; the rest is left out");
                self.log.error(object.line, code::GERBER_SYNTAX, text);
            }
            return;
        }
        if let Some(target) = self.targets.last_mut() {
            target.push(object);
        }
    }

    fn attribute(&mut self, command: &str, line: u32) {
        if matches!(command.get(..2), Some("TF" | "TA" | "TO" | "TD"))
            && let Err(text) = self.attributes.take(command, line)
        {
            self.log.warning(line, code::GERBER_ATTRIBUTE, text);
        }
    }

    fn set_unit(&mut self, unit_nm: f64, line: u32) {
        if self.unit_nm.is_some_and(|unit| unit != unit_nm) {
            self.error(line, "the unit must stay the same in a file; got both millimetres and inches");
        }
    }

    /// Obeys one plain command: codes of one letter and a number each.
    fn word(&mut self, word: &str, line: u32) {
        let mut operands = super::plot::Operands::default();
        let mut rest = word;
        let mut seen_d = None;
        while let Some(letter) = rest.chars().next() {
            if !letter.is_ascii_uppercase() {
                self.error(line, format!("command `{}` must be made of letters and numbers", excerpt(word)));
                return;
            }
            let tail = &rest[1..];
            let length = tail.find(|c: char| c.is_alphabetic()).unwrap_or(tail.len());
            let (number, next) = tail.split_at(length);
            rest = next;
            let value =
                || number.parse::<u32>().ok().filter(|_| number.len() < 10 && !number.starts_with('+'));
            match letter {
                'X' | 'Y' | 'I' | 'J' => {
                    if !self.operand(letter, number, &mut operands, line) {
                        return;
                    }
                }
                'N' => {}
                'G' | 'D' | 'M' => {
                    let Some(value) = value() else {
                        self.error(
                            line,
                            format!("command `{}` must have a number after `{letter}`", excerpt(word)),
                        );
                        return;
                    };
                    match letter {
                        'G' => {
                            if !self.general(value, line) {
                                return;
                            }
                        }
                        'D' => seen_d = Some(value),
                        _ if value <= 2 => self.done = true,
                        _ => {
                            self.error(line, format!("command `M{value:02}` is not known"));
                            return;
                        }
                    }
                }
                _ => {
                    self.error(line, format!("command `{}` is not known", excerpt(word)));
                    return;
                }
            }
        }
        match seen_d {
            Some(tool) if tool >= 10 => {
                if !self.apertures.contains_key(&tool) {
                    self.error(line, format!("aperture `D{tool}` must be defined before it is selected"));
                }
                self.current = Some(tool);
                if operands.any() {
                    self.error(
                        line,
                        format!("command `{}` must not both select an aperture and move", excerpt(word)),
                    );
                }
            }
            Some(operation @ 1..=3) => {
                self.operation = operation;
                self.operate(operation, &operands, line);
            }
            Some(other) => self.error(line, format!("command `D{other:02}` is not known")),
            None if operands.any() => self.operate(self.operation, &operands, line),
            None => {}
        }
    }

    /// Obeys a `G` code; false when the rest of the command must be left out.
    fn general(&mut self, value: u32, line: u32) -> bool {
        match value {
            0 | 1 => self.interpolation = Interpolation::Linear,
            2 => self.interpolation = Interpolation::Clockwise,
            3 => self.interpolation = Interpolation::CounterClockwise,
            36 => {
                if self.region.is_some() {
                    self.error(line, "a region (`G36`) must end with `G37` before another begins");
                }
                self.region = Some(OpenRegion { line, contours: Vec::new() });
            }
            37 => self.end_region(line),
            54 | 55 | 90 => {}
            70 => self.set_unit(25.4e6, line),
            71 => self.set_unit(1e6, line),
            74 => self.single_quadrant = Some(true),
            75 => self.single_quadrant = Some(false),
            91 => self.error(line, "incremental coordinates (`G91`) are not supported"),
            _ => {
                self.error(line, format!("command `G{value:02}` is not known"));
                return false;
            }
        }
        true
    }

    fn extended(&mut self, words: &[(std::borrow::Cow<'_, str>, u32)]) {
        let mut index = 0;
        while let Some((word, line)) = words.get(index) {
            index += 1;
            let word = word.trim();
            if let Some(name) = word.strip_prefix("AM") {
                self.define_macro(name.trim(), &words[index..], *line);
                return;
            }
            if let Err(text) = self.command(word, *line) {
                self.error(*line, text);
            }
        }
    }

    fn define_macro(&mut self, name: &str, body: &[(std::borrow::Cow<'_, str>, u32)], line: u32) {
        let mut shape = Macro::default();
        for (statement, line) in body {
            if let Err(text) = shape.push(statement, *line) {
                self.error(*line, text);
            }
        }
        if name.is_empty() {
            self.error(line, "an aperture macro must have a name");
        }
        self.macros.insert(name.to_owned(), shape);
    }

    /// Obeys one extended command; an error is a sentence about it.
    fn command(&mut self, word: &str, line: u32) -> Result<(), String> {
        let Some((kind, rest)) = word.split_at_checked(2) else {
            return Err(format!("command `{}` is not known", excerpt(word)));
        };
        let no_effect = |ok: bool| {
            if ok { Ok(()) } else { Err(format!("command `{}` is not supported", excerpt(word))) }
        };
        match kind {
            "TF" | "TA" | "TO" | "TD" => self.attribute(word, line),
            "FS" => {
                let format = Format::parse(rest)?;
                if self.format.is_some_and(|earlier| earlier != format) {
                    return Err("the coordinate format must stay the same in a file".to_owned());
                }
                self.format = Some(format);
            }
            "MO" => match rest {
                "MM" => self.set_unit(1e6, line),
                "IN" => self.set_unit(25.4e6, line),
                _ => return Err(format!("unit `{}` must be `MM` or `IN`", excerpt(rest))),
            },
            "AD" => {
                let unit_nm =
                    self.unit_nm.ok_or("an aperture needs the unit (`MOMM` or `MOIN`), which is missing")?;
                let (code, kind) = parse_definition(rest, &self.macros, unit_nm * 1e-9)?;
                self.apertures.insert(code, Aperture { kind, function: self.attributes.function.clone() });
            }
            "LP" => match rest {
                "D" => self.dark = true,
                "C" => self.dark = false,
                _ => return Err(format!("polarity `{}` must be `D` or `C`", excerpt(rest))),
            },
            "LM" => {
                (self.transform.mirror_x, self.transform.mirror_y) = match rest {
                    "N" => (false, false),
                    "X" => (true, false),
                    "Y" => (false, true),
                    "XY" => (true, true),
                    _ => return Err(format!("mirroring `{}` must be `N`, `X`, `Y` or `XY`", excerpt(rest))),
                }
            }
            "LR" => {
                let angle =
                    decimal(rest).ok_or_else(|| format!("turn `{}` must be a number", excerpt(rest)))?;
                self.transform.turn = turn(angle);
            }
            "LS" => {
                let scale = decimal(rest).filter(|scale| *scale > 0.0 && *scale < 1e3);
                self.transform.scale =
                    scale.ok_or_else(|| format!("scale `{}` must be positive", excerpt(rest)))?;
            }
            "AB" => return self.block(rest, line),
            "SR" => return self.repeat(rest, line),
            "IN" | "LN" => {}
            "IP" if rest == "NEG" => {
                return Err(
                    "a negative image (`IPNEG`) is not supported: export the layer as a positive".to_owned()
                );
            }
            "IP" => return no_effect(rest == "POS"),
            "OF" => return no_effect(zero_values(rest, 0.0)),
            "SF" => return no_effect(zero_values(rest, 1.0)),
            "MI" | "IR" => return no_effect(zero_values(rest, 0.0) || decimal(rest) == Some(0.0)),
            "AS" => return no_effect(rest == "AXBY"),
            _ => return Err(format!("command `{}` is not known", excerpt(word))),
        }
        Ok(())
    }

    fn block(&mut self, rest: &str, line: u32) -> Result<(), String> {
        if rest.is_empty() {
            let Some(Frame::Block { code, .. }) = self.frames.last() else {
                return Err("`AB` must close a block that was opened".to_owned());
            };
            let code = *code;
            self.frames.pop();
            let objects = Arc::new(self.targets.pop().unwrap_or_default());
            self.apertures.insert(code, Aperture { kind: ApertureKind::Block(objects), function: None });
            return Ok(());
        }
        let code = rest.strip_prefix('D').and_then(|code| code.parse().ok()).filter(|code| *code >= 10);
        let code = code.ok_or_else(|| format!("block aperture `{}` must read like `D12`", excerpt(rest)))?;
        if self.frames.len() >= 8 {
            return Err("blocks must not be nested deeper than 8".to_owned());
        }
        self.frames.push(Frame::Block { code, line });
        self.targets.push(Vec::new());
        Ok(())
    }

    fn repeat(&mut self, rest: &str, line: u32) -> Result<(), String> {
        if let Some(Frame::Repeat { columns, rows, step, .. }) = self.frames.last() {
            let (columns, rows, step) = (*columns, *rows, *step);
            self.frames.pop();
            let objects = self.targets.pop().unwrap_or_default();
            'all: for column in 0..columns {
                for row in 0..rows {
                    let by = Point::new(step.x * f64::from(column), step.y * f64::from(row));
                    for object in &objects {
                        self.push(moved(object, &Transform::NONE, by, true, object.line));
                    }
                    if self.n_objects > MOST_OBJECTS {
                        break 'all;
                    }
                }
            }
        }
        if rest.is_empty() {
            return Ok(());
        }
        let wrong = || format!("repeat `{}` must read like `X2Y3I10J5`", excerpt(rest));
        let field = |letter: char| -> Option<&str> {
            let tail = &rest[rest.find(letter)? + 1..];
            Some(&tail[..tail.find(|c: char| c.is_alphabetic()).unwrap_or(tail.len())])
        };
        let count =
            |letter| field(letter).map_or(Some(1), |text| text.parse::<u32>().ok().filter(|n| *n > 0));
        let step = |letter| field(letter).map_or(Some(0.0), decimal).filter(|step| step.abs() < 1e4);
        let (columns, rows) = (count('X').ok_or_else(wrong)?, count('Y').ok_or_else(wrong)?);
        if u64::from(columns) * u64::from(rows) > 1_000_000 {
            return Err(wrong());
        }
        if (columns, rows) == (1, 1) {
            return Ok(());
        }
        let unit_m =
            self.unit_nm.ok_or("a repeat needs the unit (`MOMM` or `MOIN`), which is missing")? * 1e-9;
        let step = Point::new(step('I').ok_or_else(wrong)?, step('J').ok_or_else(wrong)?) * unit_m;
        if self.frames.len() >= 8 {
            return Err("repeats must not be nested deeper than 8".to_owned());
        }
        self.frames.push(Frame::Repeat { columns, rows, step, line });
        self.targets.push(Vec::new());
        Ok(())
    }

    fn finish(mut self, last_line: u32) -> Image {
        if !self.done {
            let text = "the file must end with `M02`; it may have been cut off";
            self.log.error(last_line, code::GERBER_CUT_OFF, text);
        }
        if let Some(region) = self.region.take() {
            self.error(region.line, "the region (`G36`) that begins here must end with `G37`");
        }
        while let Some(frame) = self.frames.last() {
            match frame {
                Frame::Block { line, .. } => {
                    let line = *line;
                    self.error(line, "the block (`AB`) that begins here must be closed");
                    self.frames.pop();
                    self.targets.pop();
                }
                // A repeat ends with the file at the latest.
                Frame::Repeat { line, .. } => {
                    let line = *line;
                    if let Err(text) = self.repeat("", line) {
                        self.error(line, text);
                    }
                }
            }
        }
        let objects = self.targets.pop().unwrap_or_default();
        Image { file: self.attributes.file, objects }
    }

    /// Reads a coordinate or an offset to an arc's centre.
    fn operand(&mut self, letter: char, text: &str, operands: &mut super::plot::Operands, line: u32) -> bool {
        let (Some(format), Some(unit_nm)) = (self.format, self.unit_nm) else {
            if !self.format_reported {
                self.format_reported = true;
                let text =
                    "coordinates need the format (`FS`) and the unit (`MO`) before them; one is missing";
                self.error(line, text);
            }
            return false;
        };
        let digits = if matches!(letter, 'X' | 'I') { format.x } else { format.y };
        match super::number::coordinate(text, digits, format.trailing_omitted, unit_nm) {
            Ok(nm) => {
                operands.set(letter, nm / 1e9);
                true
            }
            Err(text) => {
                self.error(line, format!("{letter} {text}"));
                false
            }
        }
    }
}

/// Whether all numbers of an old image command like `A0B0` are `value`, so that it changes nothing.
fn zero_values(text: &str, value: f64) -> bool {
    let mut numbers = text.split(|c: char| c.is_alphabetic()).filter(|field| !field.is_empty());
    text.starts_with(|c: char| c.is_alphabetic()) && numbers.all(|number| decimal(number) == Some(value))
}

/// An object of a block or repeat in its place. Inside a clear block polarities are exchanged (`dark` false).
pub(super) fn moved(object: &Object, transform: &Transform, by: Point, dark: bool, line: u32) -> Object {
    let kind = match &object.kind {
        CopperKind::Draw { path, width_m } => CopperKind::Draw {
            path: path.iter().map(|&p| transform.point(p) + by).collect(),
            width_m: width_m * transform.scale,
        },
        CopperKind::Flash { at, shape } => {
            CopperKind::Flash { at: transform.point(*at) + by, shape: transform.region(shape, by) }
        }
        CopperKind::Fill { shape } => CopperKind::Fill { shape: transform.region(shape, by) },
    };
    Object { kind, dark: object.dark == dark, line, ..object.clone() }
}
