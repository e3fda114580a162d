//! Reads an SVG back as far as the tests need it: a strict little parser that fails on anything not well-formed.

use std::collections::BTreeMap;

/// An element with its attributes, its own text and the elements round it.
#[derive(Clone, Debug)]
pub struct Element {
    pub name: String,
    pub attributes: BTreeMap<String, String>,
    pub text: String,
    /// Positions of the elements it stands in, outermost first.
    pub inside: Vec<usize>,
}

impl Element {
    pub fn get(&self, key: &str) -> &str {
        self.attributes.get(key).map_or("", String::as_str)
    }

    pub fn number(&self, key: &str) -> f64 {
        self.get(key)
            .parse()
            .unwrap_or_else(|_| panic!("{} of {self:?} is no number", key))
    }

    /// The points of a path of straight lines.
    pub fn path(&self) -> Vec<[f64; 2]> {
        let numbers: Vec<f64> = self
            .get("d")
            .split([' ', 'M', 'L'])
            .filter(|word| !word.is_empty())
            .map(|word| word.parse().unwrap())
            .collect();
        numbers.chunks(2).map(|pair| [pair[0], pair[1]]).collect()
    }
}

/// All elements in order.
pub fn parse(text: &str) -> Vec<Element> {
    let mut elements: Vec<Element> = Vec::new();
    let mut open: Vec<usize> = Vec::new();
    let mut rest = text;
    if let Some(after) = rest.strip_prefix("<?xml") {
        rest = after.split_once("?>").expect("an open declaration").1;
    }
    while let Some(start) = rest.find('<') {
        let before = &rest[..start];
        match open.last() {
            Some(last) => elements[*last].text.push_str(&unescaped(before)),
            None => assert!(before.trim().is_empty(), "text outside: {before}"),
        }
        let end = rest.find('>').expect("an open tag");
        let tag = &rest[start + 1..end];
        rest = &rest[end + 1..];
        if let Some(name) = tag.strip_prefix('/') {
            let last = open.pop().expect("a close too many");
            assert_eq!(elements[last].name, name);
            continue;
        }
        let (tag, closed) = tag
            .strip_suffix('/')
            .map_or((tag, false), |tag| (tag, true));
        let mut words = tag.splitn(2, [' ', '\n']);
        let name = words.next().unwrap().to_owned();
        assert!(
            name.chars().all(char::is_alphanumeric),
            "a tag named {name}"
        );
        let attributes = attributes(words.next().unwrap_or(""));
        elements.push(Element {
            name,
            attributes,
            text: String::new(),
            inside: open.clone(),
        });
        if !closed {
            open.push(elements.len() - 1);
        }
    }
    assert!(
        rest.trim().is_empty() && open.is_empty(),
        "unclosed: {open:?}"
    );
    elements
}

fn attributes(mut text: &str) -> BTreeMap<String, String> {
    let mut found = BTreeMap::new();
    loop {
        text = text.trim_start();
        if text.is_empty() {
            return found;
        }
        let (key, after) = text
            .split_once("=\"")
            .unwrap_or_else(|| panic!("no attribute: {text}"));
        let (value, after) = after.split_once('"').expect("an open value");
        assert!(!value.contains('<'), "{value}");
        let before = found.insert(key.to_owned(), unescaped(value));
        assert!(before.is_none(), "{key} twice");
        text = after;
    }
}

fn unescaped(text: &str) -> String {
    let mut out = String::new();
    let mut rest = text;
    while let Some(at) = rest.find('&') {
        out.push_str(&rest[..at]);
        let end = rest[at..].find(';').expect("a bare ampersand") + at;
        out.push_str(match &rest[at..=end] {
            "&amp;" => "&",
            "&lt;" => "<",
            "&gt;" => ">",
            "&quot;" => "\"",
            "&#39;" => "'",
            other => panic!("entity {other}"),
        });
        rest = &rest[end + 1..];
    }
    out + rest
}

/// Everything that is drawn lies inside the view box, and no two labels overlap; returns how many labels there are.
pub fn is_tidy(elements: &[Element], what: &str) -> usize {
    let view: Vec<f64> = elements[0]
        .get("viewBox")
        .split(' ')
        .map(|word| word.parse().unwrap())
        .collect();
    let (w, h) = (view[2], view[3]);
    let inside = |x: f64, y: f64| {
        assert!(
            (-0.01..=w + 0.01).contains(&x) && (-0.01..=h + 0.01).contains(&y),
            "{what}: {x}, {y} is outside {w} x {h}"
        );
    };
    let mut boxes: Vec<([f64; 4], String)> = Vec::new();
    for element in elements {
        match element.name.as_str() {
            "line" => {
                inside(element.number("x1"), element.number("y1"));
                inside(element.number("x2"), element.number("y2"));
            }
            "path" => element.path().iter().for_each(|[x, y]| inside(*x, *y)),
            "circle" => inside(element.number("cx"), element.number("cy")),
            "rect" => {
                let (x, y) = (element.number("x"), element.number("y"));
                inside(x, y);
                inside(x + element.number("width"), y + element.number("height"));
            }
            "text" if element.get("class") != "halo" => {
                let size = element.number("font-size");
                let wide = dutybank::output::chart::width(&element.text, size);
                let (x, y) = (element.number("x"), element.number("y"));
                let left = match element.get("text-anchor") {
                    "" => x,
                    "middle" => x - 0.5 * wide,
                    "end" => x - wide,
                    other => panic!("{other}"),
                };
                let area = if element.get("transform").is_empty() {
                    [left, y - 0.8 * size, left + wide, y + 0.22 * size]
                } else {
                    [
                        x - 0.8 * size,
                        y - 0.5 * wide,
                        x + 0.22 * size,
                        y + 0.5 * wide,
                    ]
                };
                inside(area[0], area[1]);
                inside(area[2], area[3]);
                boxes.push((area, element.text.clone()));
            }
            _ => {}
        }
    }
    for (i, (a, first)) in boxes.iter().enumerate() {
        for (b, second) in &boxes[i + 1..] {
            let overlaps = a[0] < b[2] && b[0] < a[2] && a[1] < b[3] && b[1] < a[3];
            assert!(
                !overlaps,
                "{what}: `{first}` {a:?} overlaps `{second}` {b:?}"
            );
        }
    }
    boxes.len()
}

/// Distance from a point to a line through points.
pub fn distance(point: [f64; 2], line: &[[f64; 2]]) -> f64 {
    let to_piece = |pair: &[[f64; 2]]| {
        let [a, b] = [pair[0], pair[1]];
        let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
        let length = dx * dx + dy * dy;
        let along = ((point[0] - a[0]) * dx + (point[1] - a[1]) * dy) / length.max(1e-12);
        let along = along.clamp(0.0, 1.0);
        (point[0] - a[0] - along * dx).hypot(point[1] - a[1] - along * dy)
    };
    line.windows(2).map(to_piece).fold(f64::INFINITY, f64::min)
}
