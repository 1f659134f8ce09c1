//! What the review asks to chart, in one form: nets, paths and pairs become courses from pin to pin.
//!
//! A course is one line, or the two lines of a pair. A line starts at its driver, passes parts from pin to pin and ends
//! at receivers that share its current; between two parts it runs in the copper of one net. A charted net is a line
//! without parts and with one receiver.

use super::request;
use super::terrain::Terrain;
use crate::board::{Board, NetId, PinId};
use crate::diag::code::plan as code;
use crate::diag::{Code, Diagnostic, nearest};
use crate::review::drive::SignalRequest;
use crate::review::path::{PairRequest, PathRequest, Step};
use crate::review::{LandingRequest, Marks, NetRequest, Review};

/// A signal to chart.
#[derive(Clone, Debug)]
pub struct Course<'r> {
    /// Name of the net, path or pair.
    pub name: String,
    /// Its kind and name for texts, for example `` net `TIDE_SCK` ``.
    pub who: String,
    /// One line, or the two of a pair.
    pub lines: Vec<Line>,
    /// Plane to chart, as `L2-GND`.
    pub plane: Option<&'r str>,
    /// Where the return reaches the plane at the driver, if the review says so.
    pub driver_landing: Option<&'r LandingRequest>,
    /// The same at the receiver.
    pub receiver_landing: Option<&'r LandingRequest>,
    /// Drive, load, landing of the driver, budget.
    pub signal: &'r SignalRequest,
    place: Place<'r>,
}

/// Where the entry of a course stands in the review.
#[derive(Clone, Copy, Debug)]
struct Place<'r> {
    file: &'r str,
    line: u32,
    marks: &'r Marks,
}

/// A way of current from one pin to others.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// Pin that drives.
    pub driver: PinId,
    /// Parts that the current passes: pin of entry and pin of exit.
    pub through: Vec<(PinId, PinId)>,
    /// Where it ends, with shares that sum to 1.
    pub receivers: Vec<(PinId, f64)>,
    /// Current of the line in A per A of the driver's current.
    pub current: f64,
}

impl Line {
    /// The receiver with the largest share, of equal ones the first.
    pub fn receiver(&self) -> PinId {
        let mut best = (self.driver, 0.0);
        for &(pin, share) in &self.receivers {
            if share > best.1 {
                best = (pin, share);
            }
        }
        best.0
    }
}

impl Course<'_> {
    /// Names of the nets in whose tracks the current runs: reference nets are not among them.
    pub fn own_nets<'b>(&self, terrain: &Terrain<'b>) -> Vec<&'b str> {
        let board = terrain.board;
        let mut names = Vec::new();
        for line in &self.lines {
            let starts = line.through.iter().map(|passed| passed.1);
            let pins = std::iter::once(line.driver).chain(starts);
            let own =
                pins.filter_map(|pin| net_of(board, pin)).filter(|&net| !terrain.is_reference(Some(net)));
            names.extend(own.map(|net| board.net_name(net)));
        }
        names
    }

    /// Puts a message at a key of the entry, or at its name.
    pub fn at_key(&self, key: &str, message: Diagnostic) -> Diagnostic {
        self.place.mark(key, message)
    }

    /// The same, unless the message has its place on the board already.
    pub fn in_review(&self, key: &str, message: Diagnostic) -> Diagnostic {
        if message.place.at.is_some() { message } else { self.at_key(key, message) }
    }
}

impl Place<'_> {
    fn mark(&self, key: &str, mut message: Diagnostic) -> Diagnostic {
        message.place.file = Some(self.file.to_owned());
        let mark = self.marks.get(key).or_else(|| self.marks.get("name"));
        message.place.line = Some(mark.as_ref().map_or(self.line, |mark| mark.0));
        message.place.span = mark.map(|mark| mark.1);
        message
    }
}

/// All courses of a review: nets, then paths, then pairs, in the order of the file. What cannot be resolved is a message.
pub fn courses<'r>(board: &Board, review: &'r Review, messages: &mut Vec<Diagnostic>) -> Vec<Course<'r>> {
    let mut found = Vec::new();
    let mut keep = |course: Result<Course<'r>, Diagnostic>, messages: &mut Vec<Diagnostic>| match course {
        Ok(course) => found.push(course),
        Err(message) => messages.push(message),
    };
    for (net, request) in request::expand(board, review, messages) {
        let course =
            request::ends(board, review, net, request).map(|line| of_net(board, review, request, line));
        keep(course, messages);
    }
    for request in &review.paths {
        keep(of_path(board, review, request), messages);
    }
    for request in &review.pairs {
        keep(of_pair(board, review, request), messages);
    }
    found
}

fn of_net<'r>(board: &Board, review: &'r Review, request: &'r NetRequest, line: Line) -> Course<'r> {
    let name = net_of(board, line.driver).map_or_else(String::new, |net| board.net_name(net).to_owned());
    Course {
        who: format!("net `{name}`"),
        name,
        lines: vec![line],
        plane: request.plane.as_deref(),
        driver_landing: request.driver_landing.as_ref(),
        receiver_landing: request.receiver_landing.as_ref(),
        signal: &request.signal,
        place: Place { file: &review.file, line: request.line, marks: &request.marks },
    }
}

fn of_path<'r>(
    board: &Board,
    review: &'r Review,
    request: &'r PathRequest,
) -> Result<Course<'r>, Diagnostic> {
    let place = Place { file: &review.file, line: request.line, marks: &request.marks };
    let line = path_line(board, request).map_err(|(key, message)| place.mark(key, message))?;
    Ok(Course {
        name: request.name.clone(),
        who: format!("path `{}`", request.name),
        lines: vec![line],
        plane: request.plane.as_deref(),
        driver_landing: request.driver_landing.as_ref(),
        receiver_landing: request.receiver_landing.as_ref(),
        signal: &request.signal,
        place,
    })
}

/// A fault with the key of the entry that it is about.
type Fault = (&'static str, Diagnostic);

fn path_line(board: &Board, request: &PathRequest) -> Result<Line, Fault> {
    let name = &request.name;
    let find = |key: &'static str, label: &str| {
        find_pin(board, label).ok_or_else(|| unknown_pin(board, key, name, label)).and_then(|pin| {
            if net_of(board, pin).is_some() {
                return Ok(pin);
            }
            let text = format!("pin `{label}` of path `{name}` must be on a net; the files give it none");
            Err((key, Diagnostic::error(code::PIN_UNKNOWN, text)))
        })
    };
    let driver = find("driver", &request.driver)?;
    let mut at = driver;
    let mut through = Vec::new();
    for step in &request.through {
        let (enter, leave) = match step {
            Step::Part(part) => part_pins(board, name, part, at)?,
            Step::Pins { enter, leave } => (find("through", enter)?, find("through", leave)?),
        };
        same_net(board, "through", name, at, enter)?;
        through.push((enter, leave));
        at = leave;
    }
    let mut receivers = Vec::new();
    for receiver in &request.receivers {
        let key = if request.receivers.len() > 1 { "receivers" } else { "receiver" };
        let pin = find(key, &receiver.pin)?;
        same_net(board, key, name, at, pin)?;
        receivers.push((pin, receiver.share));
    }
    Ok(Line { driver, through, receivers, current: 1.0 })
}

/// Where a part with two pins is entered and left by a current that comes in the net of pin `at`.
fn part_pins(board: &Board, name: &str, part: &str, at: PinId) -> Result<(PinId, PinId), Fault> {
    let pins: Vec<PinId> = ids(board).filter(|pin| board.pins[pin.0 as usize].part == part).collect();
    let [a, b] = pins[..] else {
        let text = if pins.is_empty() {
            format!("path `{name}` must pass parts of the board; it has no part `{part}`")
        } else {
            format!(
                "part `{part}` of path `{name}` must have two pins to be passed by its name; it has {}",
                pins.len()
            )
        };
        let message = Diagnostic::error(code::PATH_BROKEN, text);
        let parts = board.pins.iter().map(|pin| pin.part.as_str());
        return Err((
            "through",
            match nearest(part, parts).filter(|_| pins.is_empty()) {
                Some(near) => message.hint(format!("did you mean `{near}`?")),
                None => message
                    .hint(format!("name the pins of entry and exit, such as `[\"{part}.1\", \"{part}.2\"]`")),
            },
        ));
    };
    let (net, of_a, of_b) = (net_of(board, at), net_of(board, a), net_of(board, b));
    if of_a == of_b {
        let text =
            format!("part `{part}` of path `{name}` must lie between two nets; both its pins are on one");
        return Err(("through", Diagnostic::error(code::PATH_BROKEN, text)));
    }
    if net == of_b { Ok((b, a)) } else { Ok((a, b)) }
}

fn same_net(board: &Board, key: &'static str, name: &str, at: PinId, next: PinId) -> Result<(), Fault> {
    let (here, there) = (net_of(board, at), net_of(board, next));
    if here == there {
        return Ok(());
    }
    let label = |pin: PinId| board.pins[pin.0 as usize].label();
    let net = |net: Option<NetId>| net.map_or("no net", |net| board.net_name(net));
    let text = format!(
        "path `{name}` must go on in one net from `{}` to `{}`; the first is on `{}`, the second on `{}`",
        label(at),
        label(next),
        net(here),
        net(there)
    );
    let hint = "list every part that the current passes between them in `through`, in its order";
    Err((key, Diagnostic::error(code::PATH_BROKEN, text).hint(hint)))
}

fn of_pair<'r>(
    board: &Board,
    review: &'r Review,
    request: &'r PairRequest,
) -> Result<Course<'r>, Diagnostic> {
    let place = Place { file: &review.file, line: request.line, marks: &request.marks };
    let mut landings = (None, None, None);
    let mut side = |key: &'static str, name: &str, current: f64| -> Result<Line, Diagnostic> {
        let line = if let Some(path) = review.paths.iter().find(|path| path.name == name) {
            landings.0 = landings.0.or(path.plane.as_deref());
            landings.1 = landings.1.or(path.driver_landing.as_ref());
            landings.2 = landings.2.or(path.receiver_landing.as_ref());
            path_line(board, path).map_err(|(_, message)| message)
        } else {
            let Some(net) = board.net(name) else {
                let text = format!(
                    "{key} side `{name}` of pair `{}` must be a net of the board or a path of the review",
                    request.name
                );
                let names = board.nets.iter().map(|net| net.name.as_str());
                let message = place.mark(key, Diagnostic::error(code::NET_UNKNOWN, text));
                return Err(match nearest(name, names) {
                    Some(near) => message.hint(format!("did you mean `{near}`?")),
                    None => message,
                });
            };
            let own = review.nets.iter().find(|net| net.name == name);
            if let Some(own) = own {
                landings.0 = landings.0.or(own.plane.as_deref());
                landings.1 = landings.1.or(own.driver_landing.as_ref());
                landings.2 = landings.2.or(own.receiver_landing.as_ref());
            }
            let plain = NetRequest { name: name.to_owned(), ..NetRequest::default() };
            request::ends(board, review, net, own.unwrap_or(&plain))
        };
        let line = line.map_err(|message| place.mark(key, message))?;
        Ok(Line { current, ..line })
    };
    let positive = side("positive", &request.positive, 1.0 + 0.5 * request.imbalance)?;
    let negative = side("negative", &request.negative, -(1.0 - 0.5 * request.imbalance))?;
    Ok(Course {
        name: request.name.clone(),
        who: format!("pair `{}`", request.name),
        lines: vec![positive, negative],
        plane: landings.0,
        driver_landing: landings.1,
        receiver_landing: landings.2,
        signal: &request.signal,
        place,
    })
}

/// All pins of a board.
pub fn ids(board: &Board) -> impl Iterator<Item = PinId> + '_ {
    (0..board.pins.len()).map(|index| PinId(index as u32))
}

/// The net of a pin.
pub fn net_of(board: &Board, pin: PinId) -> Option<NetId> {
    board.pins[pin.0 as usize].net
}

fn find_pin(board: &Board, label: &str) -> Option<PinId> {
    ids(board).find(|pin| board.pins[pin.0 as usize].label() == label)
}

fn unknown_pin(board: &Board, key: &'static str, name: &str, label: &str) -> Fault {
    const CODE: Code = code::PIN_UNKNOWN;
    let text = format!("pin `{label}` of path `{name}` must be a pin of the board; it is not");
    let labels: Vec<String> = board.pins.iter().map(crate::board::Pin::label).collect();
    let message = Diagnostic::error(CODE, text);
    let near = nearest(label, labels.iter().map(String::as_str)).map(str::to_owned);
    (
        key,
        match near {
            Some(near) => message.hint(format!("did you mean `{near}`?")),
            None => message,
        },
    )
}
