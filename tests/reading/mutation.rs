//! No input makes the reader panic or hang: our own files with bytes changed, cut, doubled and spliced.

use crate::support::{data, data_folder};
use ebbmap::read::drill::read_drill;
use ebbmap::read::gerber::read_image;
use ebbmap::read::job::read_job;
use ebbmap::read::log::Log;
use ebbmap::read::read_board;
use proptest::prelude::*;

const DRILL: &str = "M48\n; #@! TF.FileFunction,Plated,1,2,PTH\n;FILE_FORMAT=3:3\nMETRIC,TZ\n; #@! TA.AperFunction,ViaDrill\n\
    T1C0.3\nT2C0.5F200S50\n%\nG90\nG05\nT1\nX1.0Y1.0\nR3X2.0Y0.5\nX1000Y2000G85X3000\nT2\nG00X1.0Y1.0\nM15\n\
    G01X2.0\nG03X4.0Y3.0A2.0\nG02X6.0Y1.0I2.0J0.0\nM16\nG05\nT0\nM30\n";
const JOB: &str = r#"{"GeneralSpecs": {"BoardThickness": 1.6}, "MaterialStackup": [{"Type": "Copper", "Thickness": "0.035"}],
    "FilesAttributes": [{"Path": "a.gbr", "FileFunction": "Copper,L1,Top"}]}"#;

/// One change: where (as a part of the length), what kind, and a byte.
type Change = (f64, u8, u8);

fn changed(text: &str, changes: &[Change]) -> String {
    // Characters that mean something in these formats are chosen more often than others.
    let alphabet = b"%*,.-+$XYIJDGMTARC0123456789()=x/\n\r\\u\"{}[]; \xb5\x00";
    let mut bytes = text.as_bytes().to_vec();
    for &(place, kind, byte) in changes {
        if bytes.is_empty() {
            break;
        }
        let at = ((place * bytes.len() as f64) as usize).min(bytes.len() - 1);
        let new = if byte < 128 { alphabet[byte as usize % alphabet.len()] } else { byte };
        let end = (at + 1 + byte as usize).min(bytes.len());
        match kind % 6 {
            0 => bytes[at] = new,
            1 => bytes.insert(at, new),
            2 => drop(bytes.drain(at..end)),
            3 => {
                let part = bytes[at..end].to_vec();
                bytes.splice(at..at, part);
            }
            4 => bytes.truncate(at + 1),
            _ => {
                let part = bytes[at..end].to_vec();
                bytes.extend(part);
            }
        }
    }
    match String::from_utf8(bytes) {
        Ok(text) => text,
        Err(error) => error.into_bytes().into_iter().map(char::from).collect(),
    }
}

fn changes() -> impl Strategy<Value = Vec<Change>> {
    prop::collection::vec((0.0..1.0f64, any::<u8>(), any::<u8>()), 1..12)
}

fn files() -> Vec<String> {
    let mut names: Vec<_> = std::fs::read_dir(data_folder())
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    assert!(names.len() >= 10, "{names:?}");
    names.iter().map(|name| data(name)).collect()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 800, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn gerber_files(which in any::<prop::sample::Index>(), changes in changes()) {
        let files = files();
        let mut log = Log::new("a.gbr");
        let image = read_image(&changed(which.get::<String>(&files), &changes), &mut log);
        prop_assert!(image.objects.len() < 4_000_001);
        prop_assert!(log.finish().iter().all(|message| message.place.file.is_some()));
    }

    #[test]
    fn drill_and_job_files(changes in changes()) {
        let mut log = Log::new("a.drl");
        read_drill(&changed(DRILL, &changes), &mut log);
        read_job(&changed(JOB, &changes), &mut log);
    }

    #[test]
    fn any_text(text in "\\PC{0,200}") {
        let mut log = Log::new("a");
        read_image(&text, &mut log);
        read_drill(&text, &mut log);
        read_job(&text, &mut log);
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 100, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn whole_sets(which in any::<prop::sample::Index>(), changes in changes(), drill in changes()) {
        let folder = tempfile::TempDir::new().unwrap();
        let files = files();
        std::fs::write(folder.path().join("copper-1.gbr"), changed(which.get::<String>(&files), &changes)).unwrap();
        std::fs::write(folder.path().join("plated.drl"), changed(&DRILL.replace("1,2,PTH", "1,1,PTH"), &drill)).unwrap();
        std::fs::write(folder.path().join("board.gbrjob"), changed(JOB, &changes)).unwrap();
        // Either answer is right; a panic is not.
        let _ = read_board(folder.path());
    }
}
