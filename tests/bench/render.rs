//! How long pictures take on one core: a ticket map of a board with 1,000 voids, and a contact sheet of 40 rows in 5
//! bands. Prints times and sizes; asserts none.

#[allow(dead_code)] // The cases of the pictures use more of it.
#[path = "../golden/gauge.rs"]
mod gauge;

use ebbmap::draw::{DensityScale, ScaleChoice};
use ebbmap::report::{
    ContactCell, ContactInput, ContactRow, Picture, TicketInput, contact, thumbnail, ticket_scene,
};
use ebbmap::review::Band;
use gauge::{Shape, gauge};

/// Seconds of processor time of this process (one thread) where the system tells them, else of the clock.
fn seconds() -> f64 {
    let spent = std::fs::read_to_string("/proc/self/schedstat").ok();
    let nanoseconds = spent.and_then(|text| text.split(' ').next().and_then(|n| n.parse::<f64>().ok()));
    let clock = || {
        std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH).map_or(0.0, |t| t.as_secs_f64())
    };
    nanoseconds.map_or_else(clock, |n| 1e-9 * n)
}

fn main() {
    let style = ebbmap::read::style::built_in("paper").expect("a style of the program");
    let shape = Shape { perforation: (40, 25), pins: 0, slot: None, ..Shape::default() };
    let gauge = gauge(&shape);
    let scale = DensityScale::chosen(0.2e-3, style.density.range_db, ScaleChoice::OfStyle);
    let input = TicketInput {
        board: &gauge.board,
        review: &gauge.review,
        net: &gauge.net,
        chart: &gauge.net.charts[0],
        band: &gauge.band,
        map: &gauge.map,
        figures: &gauge.figures,
        scale,
        findings: Some(&gauge.findings),
        joints: &gauge.joints,
        style: &style,
        input_hash: "0",
        sheet: (1, 1),
        index: None,
    };
    let mut times = Vec::new();
    for _ in 0..5 {
        let start = seconds();
        let scene = ticket_scene(&input);
        let placed = seconds() - start;
        let picture = Picture::of(&scene).expect("a picture");
        times.push((seconds() - start, placed, picture.svg.len(), picture.png.len()));
    }
    times.sort_by(|a, b| a.0.total_cmp(&b.0));
    let (all, placed, svg, png) = times[times.len() / 2];
    println!(
        "ticket map, 1,000 voids, 600 x 400 cells: {} ms (of it placing {} ms); SVG {} kB, PNG {} kB",
        (all * 1e3).round(),
        (placed * 1e3).round(),
        svg / 1000,
        png / 1000
    );
    let band = |name: &str, at: f64| Band {
        name: name.to_owned(),
        from_hz: 0.3 * at,
        to_hz: 3.0 * at,
        at_hz: vec![at],
        explicit: false,
    };
    let bands = [band("VLF", 1e4), band("LF", 1e5), band("MF", 1e6), band("HF", 1e7), band("VHF", 1e8)];
    let start = seconds();
    let rows = (0..40).map(|_| {
        let cells = bands.iter().map(|_| {
            let (board, review, net) = (&gauge.board, &gauge.review, &gauge.net);
            let map =
                thumbnail(board, review, net, &net.charts[0], &gauge.map, &gauge.figures, scale, &style);
            ContactCell::Map(Box::new(map), Some("maps/one.svg".to_owned()))
        });
        let cells = cells.collect();
        ContactRow { net: &gauge.net, chart: &gauge.net.charts[0], cells, findings: &gauge.findings }
    });
    let input = ContactInput {
        board: &gauge.board,
        review: &gauge.review,
        columns: bands.iter().map(|band| (band, band.at_hz[0])).collect(),
        rows: rows.collect(),
        scale,
        style: &style,
        input_hash: "0",
    };
    let reduced = seconds() - start;
    let pages = contact(&input).expect("pages");
    let largest = pages.iter().map(|page| page.svg.len()).max().unwrap_or(0);
    println!(
        "contact sheet, 40 x 5: {} ms (of it reducing maps {} ms); {} pages, largest SVG {} kB",
        ((seconds() - start) * 1e3).round(),
        (reduced * 1e3).round(),
        pages.len(),
        largest / 1000
    );
}
