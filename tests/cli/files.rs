//! The files that `check` writes: which, and that they hold something.

use super::*;
use std::collections::HashMap;

#[test]
fn every_net_gets_pictures_and_a_waveform_of_its_own() {
    let folder = Folder::new();
    let plots = folder.path("plots");
    run(&[
        "check",
        BRACKWATER,
        "--net",
        "CAM_PCLK",
        "--net",
        "XTAL_OUT",
        "--plot",
        &plots,
        "--waveform",
        &folder.path("period.csv"),
    ])
    .ends(0);
    assert_eq!(
        folder.names(),
        ["period-CAM_PCLK.csv", "period-XTAL_OUT.csv", "plots"]
    );
    let pictures = paths_in(Path::new(&plots));
    assert_eq!(pictures.len(), 2 * 3 * 2, "{pictures:?}");
    for path in pictures {
        let what = path.display();
        match path.extension().and_then(|ending| ending.to_str()) {
            Some("png") => assert_drawn(&path),
            Some("svg") => {
                let text = fs::read_to_string(&path).expect("a picture");
                assert_well_formed(&text, &what.to_string());
                assert!(text.contains(NOTICE), "{what}");
                if what.to_string().contains("spectrum") {
                    assert!(text.contains("47 CFR 15.109 class B"), "{what}");
                    assert!(text.contains("CISPR 32 class B"), "{what}");
                }
            }
            other => panic!("{what}: {other:?}"),
        }
    }
}

/// A user's own title, with what XML reserves, and a net's name that is no file name.
#[test]
fn odd_names_make_sound_files() {
    let folder = Folder::new();
    let board = folder.file(
        "board.yaml",
        BOARD
            .replace("CLK", "\"CLK <1> & /2\"")
            .replace("test buoy", "\"<buoy> & \\\"Co\\\"\""),
    );
    let limit = folder.file(
        "limit.yaml",
        "title: \"house <A> & B\"\ndistance: 3 m\ndetector: peak\nbands:\n  - {from: 30 MHz, to: 1 GHz, limit: 60 dBuV/m}\n",
    );
    let plots = folder.path("plots");
    run(&[
        "check",
        &board,
        "--limit",
        &limit,
        "--plot",
        &plots,
        "--csv",
        &folder.path("all.csv"),
    ])
    .ends(0);
    for path in paths_in(Path::new(&plots)) {
        if path.extension().is_some_and(|ending| ending == "svg") {
            let text = fs::read_to_string(&path).expect("a picture");
            assert_well_formed(&text, &path.display().to_string());
            assert!(text.contains("CLK &lt;1&gt; &amp; /2"));
        }
    }
}

/// A picture holds more than its paper: some pixels in a hundred differ from it, in many shades.
pub fn assert_drawn(path: &Path) {
    let what = path.display();
    let file = fs::File::open(path).expect("a picture");
    let mut reader = png::Decoder::new(std::io::BufReader::new(file))
        .read_info()
        .unwrap_or_else(|error| panic!("{what}: {error}"));
    let mut bytes = vec![0; reader.output_buffer_size()];
    let info = reader
        .next_frame(&mut bytes)
        .unwrap_or_else(|error| panic!("{what}: {error}"));
    assert!(info.width >= 600 && info.height >= 400, "{what}: {info:?}");
    let mut shades: HashMap<&[u8], usize> = HashMap::new();
    for pixel in bytes[..info.buffer_size()].chunks(info.color_type.samples()) {
        *shades.entry(pixel).or_default() += 1;
    }
    let all: usize = shades.values().sum();
    let paper = shades.values().max().expect("a picture has pixels");
    assert!(
        shades.len() > 20 && all - paper > all / 100,
        "{what}: {} shades, {paper} of {all}",
        shades.len()
    );
}

/// Every tag is closed in its order, and nothing reserved stands in text or attributes.
pub fn assert_well_formed(svg: &str, what: &str) {
    assert!(svg.contains("<svg"), "{what}");
    let mut open: Vec<&str> = Vec::new();
    let mut rest = svg;
    while let Some(start) = rest.find('<') {
        assert_no_bare_ampersand(&rest[..start], what);
        let end = start
            + rest[start..]
                .find('>')
                .unwrap_or_else(|| panic!("{what}: a tag is left open"));
        let tag = &rest[start + 1..end];
        assert!(!tag.contains('<'), "{what}: {tag}");
        assert_no_bare_ampersand(tag, what);
        assert!(tag.matches('"').count().is_multiple_of(2), "{what}: {tag}");
        rest = &rest[end + 1..];
        if tag.starts_with(['?', '!']) || tag.ends_with('/') {
            continue;
        }
        match tag.strip_prefix('/') {
            Some(name) => assert_eq!(open.pop(), Some(name.trim()), "{what}"),
            None => open.push(tag.split_whitespace().next().unwrap_or_default()),
        }
    }
    assert!(
        open.is_empty() && rest.trim().is_empty(),
        "{what}: {open:?} {rest}"
    );
}

fn assert_no_bare_ampersand(text: &str, what: &str) {
    for (at, _) in text.match_indices('&') {
        let entity = text[at + 1..].split(';').next().unwrap_or_default();
        let known =
            ["amp", "lt", "gt", "quot", "apos"].contains(&entity) || entity.starts_with('#');
        assert!(known, "{what}: &{entity}");
    }
}
