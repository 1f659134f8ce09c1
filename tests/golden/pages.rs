//! Whole pages: nothing overlaps, nothing leaves the page, sizes stay small.

use crate::gauge::{Gauge, Shape, gauge};
use ebbmap::report::{TicketInput, ticket};
use ebbmap::style::Style;
use std::path::PathBuf;

fn style(name: &str) -> Style {
    ebbmap::read::style::built_in(name).expect("a style of the program")
}

fn input<'a>(gauge: &'a Gauge, style: &'a Style) -> TicketInput<'a> {
    TicketInput {
        board: &gauge.board,
        review: &gauge.review,
        net: &gauge.net,
        chart: &gauge.net.charts[0],
        band: &gauge.band,
        map: &gauge.map,
        figures: &gauge.figures,
        scale_height_m: gauge.net.charts[0].height_m,
        style,
        input_hash: "0",
        sheet: (1, 1),
        index: None,
    }
}

fn out(name: &str) -> PathBuf {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("target/golden/pages");
    std::fs::create_dir_all(&folder).expect("a folder");
    folder.join(name)
}

#[test]
fn ticket_pages() {
    let gauge = gauge(&Shape::default());
    for name in ["paper", "screen"] {
        let style = style(name);
        let start = std::time::Instant::now();
        let picture = ticket(&input(&gauge, &style)).expect("a picture");
        let scene = ebbmap::report::ticket_scene(&input(&gauge, &style));
        let t0 = start.elapsed();
        let svg = ebbmap::draw::svg::write(&scene);
        let t1 = start.elapsed();
        let pixels = ebbmap::draw::png::render(&scene, &svg).expect("pixels");
        let t2 = start.elapsed();
        ebbmap::draw::png::encode(&scene, &pixels).expect("a file");
        println!(
            "until scene {t0:?} svg {:?} render {:?} encode {:?}",
            t1 - t0,
            t2 - t1,
            start.elapsed() - t2
        );
        println!("{name}: {:?}, svg {} png {}", start.elapsed(), picture.svg.len(), picture.png.len());
        std::fs::write(out(&format!("ticket-{name}.svg")), &picture.svg).expect("written");
        std::fs::write(out(&format!("ticket-{name}.png")), &picture.png).expect("written");
    }
}
