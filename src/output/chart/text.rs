//! How wide a text is, without a font at hand; texts that fit; characters that mean something in XML.

/// Advance widths of the characters from space to tilde, in thousandths of the size.
///
/// # Source
/// Adobe Font Metrics of the core fonts, Helvetica, 1997 (from memory); sans faces of common systems are within some per cent.
const WIDTHS: [u16; 95] = [
    278, 278, 355, 556, 556, 889, 667, 191, 333, 333, 389, 584, 278, 333, 278, 278, 556, 556, 556,
    556, 556, 556, 556, 556, 556, 556, 278, 278, 584, 584, 584, 556, 1015, 667, 667, 722, 722, 667,
    611, 778, 722, 278, 500, 667, 556, 833, 722, 778, 667, 778, 722, 667, 611, 722, 667, 944, 667,
    667, 611, 278, 278, 278, 469, 556, 333, 556, 556, 500, 556, 556, 278, 556, 556, 222, 222, 500,
    222, 833, 556, 556, 556, 556, 333, 500, 278, 556, 500, 722, 500, 500, 500, 334, 260, 334, 584,
];

/// Room for faces that are wider than the table: the widest in use (DejaVu Sans) needs this.
const ROOM: f64 = 1.15;

/// Width of a text of that size, in the unit of the size; never less than what common sans faces need.
pub fn width(text: &str, size: f64) -> f64 {
    let sum: f64 = text.chars().map(advance).sum();
    ROOM * size * sum / 1000.0
}

fn advance(c: char) -> f64 {
    let code = c as u32;
    match code {
        0x20..=0x7e => f64::from(WIDTHS[(code - 0x20) as usize]),
        // combining marks stand on the letter before them
        0x300..=0x36f | 0x200b..=0x200f | 0xfe00..=0xfe0f => 0.0,
        // Latin, Greek, Cyrillic: as wide as a wide small letter, capitals as an M
        0xa0..=0x52f => {
            if c.is_uppercase() {
                833.0
            } else {
                610.0
            }
        }
        // the wide scripts and signs
        0x1100..=0x11ff | 0x2e80..=0xa4cf | 0xac00..=0xd7ff | 0xf900..=0xfaff | 0xff00..=0xffef => {
            1000.0
        }
        0x10000.. => 1250.0,
        _ => 900.0,
    }
}

/// The text, cut with an ellipsis where it is wider than `room`.
pub(super) fn shortened(text: &str, size: f64, room: f64) -> String {
    if width(text, size) <= room {
        return text.to_owned();
    }
    let mut kept = String::new();
    let mut used = width("…", size);
    for c in text.chars() {
        used += ROOM * size * advance(c) / 1000.0;
        if used > room {
            break;
        }
        kept.push(c);
    }
    kept.truncate(kept.trim_end().len());
    kept.push('…');
    kept
}

/// The text in lines no wider than `room`, broken between words, or within one that is wider.
pub(super) fn wrapped(text: &str, size: f64, room: f64) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    let mut line = String::new();
    for word in text.split_whitespace() {
        let longer = if line.is_empty() {
            word.to_owned()
        } else {
            format!("{line} {word}")
        };
        if width(&longer, size) <= room {
            line = longer;
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        line = shortened(word, size, room);
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

/// The text as XML has it, in content and in attributes alike; characters that XML cannot hold are replaced.
pub(super) fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            '\n' | '\t' | '\r' => out.push(' '),
            // XML 1.0, production 2: no other control characters, no halves of pairs, not these two
            '\u{0}'..='\u{1f}' | '\u{fffe}' | '\u{ffff}' => out.push('\u{fffd}'),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// "Flow" is 611 + 222 + 556 + 722 in the table.
    #[test]
    fn widths_add_up() {
        assert!((width("Flow", 10.0) - ROOM * 21.11).abs() < 1e-9);
        assert!(width("流量", 10.0) >= 20.0);
        assert_eq!(width("", 3.0), 0.0);
    }

    #[test]
    fn texts_are_cut_and_wrapped_to_fit() {
        let long = "second pump badly worn, low level, old pipe";
        let cut = shortened(long, 3.0, 30.0);
        assert!(cut.ends_with('…') && width(&cut, 3.0) <= 30.0);
        assert_eq!(shortened("short", 3.0, 30.0), "short");
        let lines = wrapped(long, 3.0, 30.0);
        assert!(lines.len() > 1 && lines.iter().all(|line| width(line, 3.0) <= 30.0));
        assert_eq!(lines.join(" "), long);
    }

    #[test]
    fn what_xml_reserves_is_escaped() {
        assert_eq!(
            escaped("a<b & \"c\" 'd'>"),
            "a&lt;b &amp; &quot;c&quot; &#39;d&#39;&gt;"
        );
        assert_eq!(escaped("x\u{1}\ny"), "x\u{fffd} y");
    }
}
