//! The driver's return by way of its supply: the supply pin of the driver's part, and the capacitor that feeds it.
//!
//! While a driver pulls its line up, its current comes from the supply pin. From the planes it gets there through the
//! capacitor nearest to that pin: the return leaves the planes at the capacitor's ground pad, passes the capacitor and
//! runs along the copper of the supply net to the pin.

use super::course::{Line, ids, net_of};
use super::terrain::Terrain;
use crate::board::{NetId, PinId};
use crate::geom::Point;

/// The way of a driver's return from the planes to its supply pin.
#[derive(Clone, Debug)]
pub struct Feed {
    /// Supply pin of the driver's part.
    pub pin: PinId,
    /// The capacitor's name.
    pub capacitor: String,
    /// From the capacitor's ground pad through it to the pin, with the part of the current that takes this way.
    pub line: Line,
}

/// The feed of the part with pin `driver`: over all its pins of nets with a capacitor to a reference net, the net with
/// the most such capacitors, the pin nearest to the driver, and the capacitor nearest to that. None where no pin of the
/// part has one.
pub fn feed(terrain: &Terrain<'_>, driver: PinId, part_of_current: f64) -> Option<Feed> {
    let board = terrain.board;
    let at = |pin: PinId| board.pins[pin.0 as usize].at;
    let part = &board.pins[driver.0 as usize].part;
    let mut best: Option<(usize, f64, PinId, Vec<Capacitor>)> = None;
    for pin in ids(board).filter(|&pin| board.pins[pin.0 as usize].part == *part && pin != driver) {
        let Some(net) = net_of(board, pin).filter(|&net| Some(net) != net_of(board, driver)) else {
            continue;
        };
        if terrain.is_reference(Some(net)) {
            continue;
        }
        let found = capacitors(terrain, net);
        let distance = at(pin).distance(at(driver));
        let better = best
            .as_ref()
            .is_none_or(|known| found.len() > known.0 || found.len() == known.0 && distance < known.1);
        if !found.is_empty() && better {
            best = Some((found.len(), distance, pin, found));
        }
    }
    let (_, _, pin, found) = best?;
    let nearest = |place: Point| {
        let away = |capacitor: &&Capacitor| at(capacitor.supply).distance(place);
        found.iter().min_by(|a, b| away(a).total_cmp(&away(b)))
    };
    let capacitor = nearest(at(pin))?;
    let line = Line {
        driver: capacitor.ground,
        through: vec![(capacitor.ground, capacitor.supply)],
        receivers: vec![(pin, 1.0)],
        current: part_of_current,
    };
    Some(Feed { pin, capacitor: board.pins[capacitor.ground.0 as usize].part.clone(), line })
}

struct Capacitor {
    ground: PinId,
    supply: PinId,
}

/// Capacitors between a net and a reference net: parts with two pins whose reference starts with C and a digit
/// (common practice).
fn capacitors(terrain: &Terrain<'_>, net: NetId) -> Vec<Capacitor> {
    let board = terrain.board;
    let is_capacitor = |part: &str| {
        part.strip_prefix('C').is_some_and(|rest| rest.starts_with(|first: char| first.is_ascii_digit()))
    };
    let mut found = Vec::new();
    for supply in ids(board).filter(|&pin| net_of(board, pin) == Some(net)) {
        let part = &board.pins[supply.0 as usize].part;
        if !is_capacitor(part) {
            continue;
        }
        let others: Vec<PinId> =
            ids(board).filter(|&pin| pin != supply && board.pins[pin.0 as usize].part == *part).collect();
        if let [ground] = others[..]
            && terrain.is_reference(net_of(board, ground))
        {
            found.push(Capacitor { ground, supply });
        }
    }
    found
}
