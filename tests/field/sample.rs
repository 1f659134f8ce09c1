//! The sample board's paths over all their copper: times and choices, printed for the notes.

use ebbmap::field::Workshop;
use ebbmap::figure::chart;
use ebbmap::run::{Unwatched, prepare};
use std::path::Path;
use std::time::Instant;

#[test]
#[ignore = "times, printed for the notes"]
fn time_of_the_sample() {
    let only = std::env::var("PATHS").unwrap_or_default();
    let cell = std::env::var("CELL").ok().map(|mm| mm.parse::<f64>().unwrap() * 1e-3);
    let prepared = prepare(Path::new("samples/tide-gauge/review.toml"), cell, &Unwatched).unwrap();
    let plan = &prepared.plan;
    for conductor in &plan.conductors.layers {
        eprintln!("L{}: {} areas", conductor.layer + 1, conductor.areas.len());
    }
    eprintln!("{} joints, {} nodes", plan.conductors.joints.len(), plan.conductors.nodes.len());
    let workshop = Workshop::new(&prepared.board, plan, prepared.review.solver.model);
    let workshop = if std::env::var("WHOLE").is_ok() { workshop.with_whole_boards() } else { workshop };
    let all = Instant::now();
    for path in plan.paths.iter().filter(|path| only.is_empty() || only.split(',').any(|o| o == path.name)) {
        let started = Instant::now();
        let bench = workshop.bench(path);
        let planes: Vec<String> = bench.charts().iter().map(|c| c.plane.to_string()).collect();
        eprintln!(
            "{}: {} entries, bench {:.2} s, charts {planes:?}",
            path.name,
            path.entries.len(),
            started.elapsed().as_secs_f64()
        );
        for (band, hertz) in plan.bands.iter().flat_map(|b| b.at_hz.iter().map(move |&f| (b, f))) {
            let started = Instant::now();
            for setup in bench.at(hertz) {
                match setup {
                    Ok(setup) => eprintln!(
                        "  {hertz:e}: {} x {} cells of {:.3} mm, layers {:?}, left out {:.4}",
                        setup.stage.grid.nx,
                        setup.stage.grid.ny,
                        setup.stage.grid.cell_m * 1e3,
                        setup.stage.sheets.iter().map(|s| s.layer + 1).collect::<Vec<_>>(),
                        setup.left_out
                    ),
                    Err(reason) => eprintln!("  {hertz:e}: {}", reason.text),
                }
            }
            let set_up = started.elapsed().as_secs_f64();
            let started = Instant::now();
            let charted = chart(&bench, path, band, hertz);
            let joints: Vec<String> = charted
                .joints
                .iter()
                .filter(|j| j.current.norm() > 0.02)
                .map(|j| format!("{} {:.3}", j.what, j.current))
                .collect();
            eprintln!(
                "    set up {set_up:.2} s, solved {:.2} s, joints {joints:?}",
                started.elapsed().as_secs_f64()
            );
            for plane in &charted.planes {
                match plane {
                    Ok(c) => eprintln!(
                        "    {}: share {:?} +- {:.3}, L {:?}",
                        c.map.plane,
                        c.figures.share_3h.value,
                        c.figures.share_3h.error,
                        c.figures.loop_inductance_h.and_then(|l| l.value)
                    ),
                    Err(reason) => eprintln!("    {}", reason.text),
                }
            }
        }
        for note in bench.notes() {
            eprintln!("  note: {}", note.text);
        }
    }
    eprintln!("all: {:.1} s", all.elapsed().as_secs_f64());
}
