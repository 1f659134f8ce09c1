//! Writes a scene as SVG: millimeters, real text, the used letters embedded, roles and labels for assistive technology.
//!
//! Deterministic: items in the order of the scene, ids counted, numbers with at most three decimals.

use super::font::subset_of;
use super::number::coordinate;
use super::scene::{Group, Image, Item, Scene, Shape, anchor_name};
use super::text::{Text, span_size};
use crate::style::Face;
use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use quick_xml::escape::escape;
use std::collections::{BTreeMap, BTreeSet};

/// A scene as SVG, and the font subsets that it embeds.
#[derive(Clone, Debug)]
pub struct SvgText {
    /// The file.
    pub text: String,
    /// The embedded fonts.
    pub fonts: Vec<(Face, Vec<u8>)>,
}

/// Writes `scene`.
pub fn write(scene: &Scene) -> SvgText {
    let fonts = fonts(scene);
    let mut out = Writer::default();
    out.head(scene, &fonts);
    out.items(&scene.items);
    out.text.push_str("</svg>\n");
    SvgText { text: out.text, fonts }
}

/// The subset of each face that the scene uses.
fn fonts(scene: &Scene) -> Vec<(Face, Vec<u8>)> {
    let mut used: BTreeMap<Face, BTreeSet<char>> = BTreeMap::new();
    for span in scene.texts().into_iter().flat_map(|text| &text.spans) {
        used.entry(span.face).or_default().extend(span.text.chars());
    }
    used.into_iter().map(|(face, characters)| (face, subset_of(face, &characters))).collect()
}

/// Text without the characters that XML 1.0 forbids (control characters, surrogates are no `char`, U+FFFE, U+FFFF).
fn legal(text: &str) -> String {
    let allowed = |c: &char| !c.is_control() && !matches!(c, '\u{FFFE}' | '\u{FFFF}') || *c == '\n';
    escape(text.chars().filter(allowed).collect::<String>()).into_owned()
}

#[derive(Default)]
struct Writer {
    text: String,
    clips: usize,
    /// Before the numbers of clips.
    prefix: String,
    /// What was written of shared groups: content to id.
    shared: BTreeMap<String, String>,
}

/// Stands for the id of a shared group until its content is known to be new.
const UNNAMED: &str = "\u{E011}";

impl Writer {
    fn attribute(&mut self, name: &str, value: &str) {
        self.text.push(' ');
        self.text.push_str(name);
        self.text.push_str("=\"");
        self.text.push_str(&legal(value));
        self.text.push('"');
    }

    fn number(&mut self, name: &str, value: f64) {
        self.attribute(name, &coordinate(value));
    }

    fn head(&mut self, scene: &Scene, fonts: &[(Face, Vec<u8>)]) {
        let (width, height) = (coordinate(scene.width), coordinate(scene.height));
        self.text.push_str("<svg xmlns=\"http://www.w3.org/2000/svg\"");
        self.attribute("width", &format!("{width}mm"));
        self.attribute("height", &format!("{height}mm"));
        self.attribute("viewBox", &format!("0 0 {width} {height}"));
        for (name, value) in [
            ("role", "graphics-document document"),
            ("aria-labelledby", "title"),
            ("aria-describedby", "description"),
            ("lang", "en"),
            ("font-kerning", "none"),
        ] {
            self.attribute(name, value);
        }
        self.text.push_str(">\n");
        self.text.push_str(&format!("<title id=\"title\">{}</title>\n", legal(&scene.title)));
        self.text.push_str(&format!("<desc id=\"description\">{}</desc>\n", legal(&scene.description)));
        self.text.push_str(&format!("<metadata>{}</metadata>\n", legal(&facts_json(scene))));
        self.text.push_str("<style>\n");
        for (face, bytes) in fonts {
            let style = if face.italic() { "italic" } else { "normal" };
            self.text.push_str(&format!(
                "@font-face{{font-family:\"{}\";font-weight:{};font-style:{style};src:url(data:font/ttf;base64,{})}}\n",
                face.family(),
                face.weight(),
                STANDARD.encode(bytes)
            ));
        }
        let stack = |family: &str| format!("font-family:\"{family}\",{}", legal(&scene.fallback));
        self.text.push_str("text{font-kerning:none;font-variant-ligatures:none;stroke-linejoin:round}\n");
        self.text.push_str(&format!(
            ".s,.n{{font-weight:400;font-style:normal}}.s{{{}}}.n{{{}}}",
            stack("Ebbmap Sans"),
            stack("Ebbmap Narrow")
        ));
        self.text.push_str(".b{font-weight:600}.i{font-style:italic}\n</style>\n");
        self.text.push_str("<rect");
        self.attribute("width", &width);
        self.attribute("height", &height);
        self.attribute("fill", &scene.page.hex());
        self.text.push_str("/>\n");
    }

    fn items(&mut self, items: &[Item]) {
        for item in items {
            match item {
                Item::Shape(shape) => self.shape(shape),
                Item::Text(text) => self.line(text),
                Item::Image(image) => self.image(image),
                Item::Group(group) => self.group(group),
            }
        }
    }

    fn shape(&mut self, shape: &Shape) {
        self.text.push_str("<path");
        self.attribute("d", shape.path.as_str());
        self.attribute("fill", &shape.fill.map_or("none".to_owned(), |fill| fill.hex()));
        if let Some(opacity) = shape.opacity {
            self.number("fill-opacity", opacity);
        }
        if shape.even_odd {
            self.attribute("fill-rule", "evenodd");
        }
        if let Some((color, width)) = shape.stroke {
            self.attribute("stroke", &color.hex());
            self.number("stroke-width", width);
            if shape.round {
                self.attribute("stroke-linecap", "round");
                self.attribute("stroke-linejoin", "round");
            }
            if !shape.dash.is_empty() {
                let dashes: Vec<String> = shape.dash.iter().map(|&dash| coordinate(dash)).collect();
                self.attribute("stroke-dasharray", &dashes.join(" "));
            }
        }
        self.text.push_str("/>\n");
    }

    fn line(&mut self, text: &Text) {
        let Some(first) = text.spans.first() else { return };
        self.text.push_str("<text");
        self.number("x", text.x);
        self.number("y", text.y);
        self.number("font-size", text.size);
        self.attribute("class", class(first.face));
        if let Some(anchor) = anchor_name(text.anchor) {
            self.attribute("text-anchor", anchor);
        }
        self.attribute("fill", &text.fill.hex());
        if let Some(halo) = text.halo {
            self.attribute("stroke", &halo.hex());
            self.attribute("stroke-width", "1.1");
            self.attribute("paint-order", "stroke");
        }
        if text
            .spans
            .iter()
            .any(|span| span.text.contains("  ") || span.text.starts_with(' ') || span.text.ends_with(' '))
        {
            self.attribute("xml:space", "preserve");
        }
        self.text.push('>');
        let mut lifted = 0.0;
        for span in &text.spans {
            let (size, lift) = span_size(span, text.size);
            let same = span.face == first.face && size == text.size && lift == lifted;
            if same {
                self.text.push_str(&legal(&span.text));
                continue;
            }
            self.text.push_str("<tspan");
            if span.face != first.face {
                self.attribute("class", class(span.face));
            }
            if size != text.size {
                self.number("font-size", size);
            }
            if lift != lifted {
                self.number("dy", lifted - lift);
                lifted = lift;
            }
            self.text.push('>');
            self.text.push_str(&legal(&span.text));
            self.text.push_str("</tspan>");
        }
        self.text.push_str("</text>\n");
    }

    fn image(&mut self, image: &Image) {
        self.text.push_str("<image");
        for (name, value) in
            [("x", image.x), ("y", image.y), ("width", image.width), ("height", image.height)]
        {
            self.number(name, value);
        }
        self.attribute("preserveAspectRatio", "none");
        self.attribute("role", "img");
        self.attribute("aria-label", &image.label);
        self.attribute("href", &format!("data:image/png;base64,{}", STANDARD.encode(&image.png)));
        self.text.push_str("/>\n");
    }

    /// A shared group: in full where its content is new, else a reference to where it stands.
    fn shared(&mut self, group: &Group) {
        let mut part = Self { prefix: UNNAMED.to_owned(), ..Self::default() };
        part.plain_group(group);
        let content = part.text;
        if let Some(id) = self.shared.get(&content) {
            self.text.push_str(&format!("<use href=\"#{id}\"/>\n"));
            return;
        }
        let id = format!("u{}", self.shared.len() + 1);
        self.text.push_str(&format!("<g id=\"{id}\">\n"));
        self.text.push_str(&content.replace(UNNAMED, &format!("{id}-")));
        self.text.push_str("</g>\n");
        self.shared.insert(content, id);
    }

    fn group(&mut self, group: &Group) {
        if group.shared { self.shared(group) } else { self.plain_group(group) }
    }

    fn plain_group(&mut self, group: &Group) {
        if let Some(link) = &group.link {
            self.text.push_str("<a");
            self.attribute("href", link);
            self.text.push('>');
        }
        let clip = group.clip.map(|[x, y, width, height]| {
            self.clips += 1;
            let id = format!("{}m{}", self.prefix, self.clips);
            self.text.push_str(&format!("<clipPath id=\"{id}\"><rect"));
            for (name, value) in [("x", x), ("y", y), ("width", width), ("height", height)] {
                self.number(name, value);
            }
            self.text.push_str("/></clipPath>");
            id
        });
        self.text.push_str("<g");
        if !group.id.is_empty() {
            self.attribute("id", &group.id);
        }
        if !group.name.is_empty() {
            self.attribute("data-name", &group.name);
        }
        if !group.role.is_empty() {
            self.attribute("role", group.role);
        }
        if !group.label.is_empty() {
            self.attribute("aria-label", &group.label);
        }
        if let Some((x, y)) = group.shift {
            self.attribute("transform", &format!("translate({} {})", coordinate(x), coordinate(y)));
        }
        if let Some(id) = clip {
            self.attribute("clip-path", &format!("url(#{id})"));
        }
        self.text.push_str(">\n");
        self.items(&group.items);
        self.text.push_str("</g>");
        self.text.push_str(if group.link.is_some() { "</a>\n" } else { "\n" });
    }
}

fn class(face: Face) -> &'static str {
    match face {
        Face::Regular => "s",
        Face::Bold => "s b",
        Face::Narrow => "n",
        Face::NarrowBold => "n b",
        Face::NarrowItalic => "n i",
    }
}

/// The facts as one JSON object.
fn facts_json(scene: &Scene) -> String {
    let mut facts: BTreeMap<&str, serde_json::Value> = BTreeMap::new();
    for (key, value) in &scene.facts {
        let value = value
            .parse::<f64>()
            .ok()
            .filter(|number| number.is_finite())
            .and_then(serde_json::Number::from_f64);
        let text = scene.facts.iter().find(|(k, _)| k == key).map_or("", |(_, v)| v.as_str());
        facts.insert(key, value.map_or_else(|| text.into(), serde_json::Value::Number));
    }
    if !scene.number.is_empty() {
        facts.insert("picture", scene.number.as_str().into());
    }
    serde_json::to_string(&facts).unwrap_or_default()
}
