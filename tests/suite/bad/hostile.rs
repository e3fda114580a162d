//! Files that were cut off, damaged, or made to do harm: none of them may panic, hang or fill the memory.

use std::fmt::Write;
use std::time::{Duration, Instant};

use super::{folder, problems};

/// Reading is some ten times slower without optimisation, and tests share the machine.
fn allowed(released: Duration) -> Duration {
    if cfg!(debug_assertions) {
        released * 20
    } else {
        released
    }
}

/// Reads, shows what is wrong, and hands back what was shown.
fn read(bytes: &[u8]) -> String {
    let (problems, text) = problems(bytes);
    let plain = problems.render(&text, "system file", false);
    let coloured = problems.render(&text, "system file", true);
    assert_eq!(plain.is_empty(), coloured.is_empty());
    plain
}

fn read_within(what: &str, bytes: &[u8], released: Duration) -> String {
    let limit = allowed(released);
    let mut took = Duration::MAX;
    let mut shown = String::new();
    // Time on a busy machine is not the file's fault: the best of a few tries counts.
    for _ in 0..8 {
        let start = Instant::now();
        shown = read(bytes);
        took = took.min(start.elapsed());
        if took < limit {
            break;
        }
    }
    if std::env::var_os("SHOW_TIMES").is_some() {
        eprintln!("{:>9.3} ms  {what}", took.as_secs_f64() * 1e3);
    }
    assert!(took < limit, "{what} took {took:?}");
    shown
}

fn networks() -> Vec<String> {
    let folder = folder().join("../../networks");
    let entries = std::fs::read_dir(folder).unwrap();
    let mut paths: Vec<_> = entries.map(|entry| entry.unwrap().path()).collect();
    paths.retain(|path| path.extension().is_some_and(|end| end == "yaml"));
    paths.sort();
    assert!(paths.len() >= 5);
    let texts = paths.iter().map(std::fs::read_to_string);
    texts.map(Result::unwrap).collect()
}

/// Pseudo-random numbers: S. Vigna, splitmix64, public domain (from memory). Any mixing function would do here.
struct Random(u64);

impl Random {
    fn below(&mut self, limit: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) % limit.max(1) as u64) as usize
    }
}

#[test]
fn a_file_cut_off_anywhere_is_read_or_refused() {
    for text in networks() {
        for (i, _) in text.char_indices().step_by(7) {
            read_within("a prefix", &text.as_bytes()[..i], Duration::from_secs(1));
        }
    }
}

/// What a slip of the hand, a bad disk or an enemy would put into a file.
const STRANGE: [&str; 24] = [
    "{", "}", "[", "]", ":", "- ", "\n", "\t", "\"", "'", "&a ", "*a", "!x ", "%", "#", "|\n",
    ">\n", "? ", ".nan", "1e308", "-0", "\u{0}", "\u{feff}", "\u{202e}",
];

fn damaged(text: &str, random: &mut Random) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    for _ in 0..=random.below(3) {
        let at = random.below(bytes.len());
        match random.below(7) {
            0 => bytes[at] ^= 1 << random.below(8),
            1 => {
                let end = (at + 1 + random.below(40)).min(bytes.len());
                bytes.drain(at..end);
            }
            2 => {
                let strange = STRANGE[random.below(STRANGE.len())];
                bytes.splice(at..at, strange.bytes());
            }
            3 => bytes[at] = b"0123456789-.e:{}[],\" \n"[random.below(22)],
            kind => {
                // whole lines: one given twice, one left out, two exchanged
                let mut lines: Vec<&[u8]> = bytes.split(|b| *b == b'\n').collect();
                let (a, b) = (random.below(lines.len()), random.below(lines.len()));
                match kind {
                    4 => lines.insert(b, lines[a]),
                    5 => drop(lines.remove(a)),
                    _ => lines.swap(a, b),
                }
                bytes = lines.join(&b'\n');
            }
        }
        if bytes.is_empty() {
            break;
        }
    }
    bytes
}

#[test]
fn a_damaged_file_is_read_or_refused() {
    let mut random = Random(1);
    for text in networks() {
        for _ in 0..600 {
            let bytes = damaged(&text, &mut random);
            read_within("a damaged file", &bytes, Duration::from_secs(1));
        }
    }
}

#[test]
fn nesting_without_end_is_refused() {
    for (open, close) in [
        ("[", "]"),
        ("{a: ", "}"),
        ("- ", ""),
        ("? ", ""),
        ("&a [", "]"),
        ("a:\n ", ""),
    ] {
        for close in [close, ""] {
            let text = format!(
                "title: x\nnodes: {}1{}\n",
                open.repeat(20_000),
                close.repeat(20_000)
            );
            let shown = read_within(open, text.as_bytes(), Duration::from_secs(1));
            assert!(shown.contains("error"), "{open}{close} was read");
            let text = format!("{}1{}\n", open.repeat(20_000), close.repeat(20_000));
            read_within(open, text.as_bytes(), Duration::from_secs(1));
        }
    }
    let mut indented = String::new();
    for depth in 0..2_000 {
        writeln!(indented, "{}a:", " ".repeat(depth)).unwrap();
    }
    read_within(
        "deep indentation",
        indented.as_bytes(),
        Duration::from_secs(1),
    );
}

#[test]
fn aliases_that_multiply_are_refused_early() {
    let mut text = "a0: &a0 [x, x, x, x, x, x, x, x, x, x]\n".to_owned();
    for i in 1..40 {
        let inner = vec![format!("*a{}", i - 1); 10].join(", ");
        writeln!(text, "a{i}: &a{i} [{inner}]").unwrap();
    }
    let shown = read_within("aliases", text.as_bytes(), Duration::from_secs(3));
    assert!(shown.contains("too-many-values"), "{shown}");
}

#[test]
fn absurd_sizes_are_refused() {
    for (what, change) in [
        ("a count beyond all", "count: 1e12"),
        ("a count beyond u32", "count: 4294967297"),
        ("a count that is negative", "count: -1"),
        ("a count that is infinite", "count: .inf"),
    ] {
        let text = SMALL.replace("from: pond", &format!("{change}, from: pond"));
        let shown = read_within(what, text.as_bytes(), Duration::from_millis(100));
        assert!(shown.contains("`count` of line"), "{what}: {shown}");
    }
    // 20,000 banks of 1,000
    let mut text = "nodes: {pond: {reservoir: 3 m}, outfall: {outlet: 12 m}}\nlines:\n".to_owned();
    for i in 0..20_000 {
        writeln!(
            text,
            "  b{i}: {{from: pond, to: outfall, count: 1000, valve: {{kv: 9}}}}"
        )
        .unwrap();
    }
    let shown = read_within("banks", text.as_bytes(), Duration::from_secs(5));
    assert!(
        shown.contains("there are more than 1000000 lines"),
        "{shown}"
    );
}

const SMALL: &str = "nodes: {pond: {reservoir: 3 m}, outfall: {outlet: 12 m}}
lines:
  main: {from: pond, to: outfall, pipe: {length: 100 m, bore: 150 mm, roughness: 0.1 mm}}
";

/// Whatever figure stands anywhere, the file is refused, or its network holds finite figures that the solver can start from.
#[test]
fn extreme_figures_are_refused_or_harmless() {
    let extremes = [
        "1e308",
        "-1e308",
        "1e-308",
        "1e-320",
        "5e-324",
        "1e200",
        "1e-200",
        "1e-200 m",
        "1e300 km",
        "1e301",
        "-0",
        "-0.0",
        "0x10",
        "0o17",
        "1_000",
        "1e999",
        "-1e999",
        "18446744073709551616",
        ".inf",
        "-.inf",
        ".nan",
        "+1",
        "1.",
        ".5",
        "1e",
        "1e+",
        "١٢",
        "1,5",
        "1 000",
        "true",
        "null",
        "~",
        "[]",
        "{}",
        "\"\"",
        "''",
    ];
    let station = include_str!("../../../networks/starter.yaml");
    let mut read_well = 0;
    for text in [SMALL, station] {
        let starts: Vec<usize> = text
            .match_indices(|c: char| c.is_ascii_digit())
            .map(|(i, _)| i)
            .filter(|&i| text[..i].ends_with([' ', '[', '-']))
            .collect();
        for start in starts {
            let rest = &text[start..];
            let end = rest.find([',', '}', ']', '\n']).unwrap_or(rest.len());
            for extreme in extremes {
                let changed = format!("{}{extreme}{}", &text[..start], &rest[end..]);
                let shown = read_within(extreme, changed.as_bytes(), Duration::from_millis(200));
                read_well += usize::from(!shown.contains("error["));
            }
        }
    }
    assert!(read_well > 100, "only {read_well} were read");
}

#[test]
fn strange_texts_are_read_or_refused() {
    let long = "x".repeat(1 << 20);
    let list = "1,".repeat(200_000);
    let keys: String = (0..50_000).map(|i| format!("leng{i}: 3\n")).collect();
    let inner: String = (0..50_000).map(|i| format!("bor{i}: 3, ")).collect();
    let nodes: String = (0..50_000)
        .map(|i| format!("  p{i}: {{pont: 3}}\n"))
        .collect();
    let dangling: String = (0..20_000)
        .map(|i| format!("  l{i}: {{from: ponds{i}, to: outfal{i}, valve: {{kv: 9}}}}\n"))
        .collect();
    let cases: String = (0..2_000)
        .map(|i| format!("  c{i}: {{nothing{i}.speed: 3}}\n"))
        .collect();
    let files = [
        ("50,000 unknown sections", format!("{SMALL}{keys}")),
        (
            "50,000 unknown keys",
            SMALL.replace("pipe: {", &format!("pipe: {{{inner}")),
        ),
        (
            "50,000 unknown kinds",
            SMALL.replace("lines:", &format!("more:\n{nodes}lines:")),
        ),
        ("50,000 bad nodes", format!("nodes:\n{nodes}lines: {{}}\n")),
        ("20,000 dangling lines", format!("{SMALL}{dangling}")),
        ("2,000 bad cases", format!("{SMALL}cases:\n{cases}")),
        ("a long name", SMALL.replace("pond", &long)),
        (
            "a long unit",
            SMALL.replace("100 m", &format!("100 {long}")),
        ),
        (
            "a long number",
            SMALL.replace("100 m", &"9".repeat(1 << 20)),
        ),
        ("a long key", SMALL.replace("length", &long)),
        (
            "a long quoted text",
            SMALL.replace("100 m", &format!("\"{long}\"")),
        ),
        ("a long comment", format!("# {long}\n{SMALL}")),
        ("a long title", format!("title: {long}\n{SMALL}")),
        (
            "a long line that is wrong at its end",
            format!("title: [{list}{{a: 1, a: 2}}]\n"),
        ),
        (
            "a long curve",
            format!("{SMALL}pump_models: {{P: {{curve: {{flow: [{list}], head: [{list}]}}}}}}\n"),
        ),
        (
            "a long line of other letters",
            format!("title: [{}{{a: 1, a: 2}}]\n", "é,".repeat(200_000)),
        ),
        ("carriage returns", SMALL.replace('\n', "\r\n")),
        ("carriage returns alone", SMALL.replace('\n', "\r")),
        ("other line ends", SMALL.replace('\n', "\u{2028}")),
        ("next line marks", SMALL.replace('\n', "\u{85}")),
        ("a byte order mark", format!("\u{feff}{SMALL}")),
        ("two byte order marks", format!("\u{feff}\u{feff}{SMALL}")),
        ("nulls", SMALL.replace(' ', "\0")),
        ("tabs", SMALL.replace("  ", "\t")),
        (
            "names from right to left",
            SMALL.replace("pond", "بركة").replace("outfall", "מוצא"),
        ),
        (
            "names beyond the plane",
            SMALL.replace("pond", "𐌰𐌱").replace("outfall", "池"),
        ),
        (
            "combining letters",
            SMALL.replace("pond", "é\u{301}\u{301}\u{301}"),
        ),
        ("direction marks", SMALL.replace("pond", "\u{202e}pond")),
        ("emoji", SMALL.replace("100 m", "100 🐟")),
        (
            "names that are numbers",
            SMALL.replace("pond", "1").replace("outfall", "1e3"),
        ),
        (
            "names that are truths",
            SMALL.replace("pond", "true").replace("outfall", "null"),
        ),
        ("names that are nothing", SMALL.replace("pond", "~")),
        (
            "keys that are numbers",
            "1: 2\n2.0: 3\ntrue: 4\nnull: 5\n~: 6\n.nan: 7\n".to_owned(),
        ),
        (
            "keys that are one number",
            "1: 2\n0x1: 3\n1.0: 4\n01: 5\n+1: 6\n".to_owned(),
        ),
        ("merge keys", format!("a: &a {{b: 1}}\n<<: *a\n{SMALL}")),
        (
            "merge lists",
            format!("a: &a {{b: 1}}\n<<: [*a, *a]\n{SMALL}"),
        ),
        (
            "anchors",
            SMALL
                .replace("{length", "&p {length")
                .replace("100 m", "&l 100 m"),
        ),
        ("directives", format!("%YAML 1.1\n%TAG ! x\n---\n{SMALL}")),
        ("end marks", format!("---\n{SMALL}...\n...\n")),
        ("block texts", format!("title: |\n  a\n  b\n{SMALL}")),
        ("a comment alone", "# nothing".to_owned()),
        ("spaces alone", "   \n \n".to_owned()),
        ("nothing", String::new()),
    ];
    for (what, text) in files {
        read_within(what, text.as_bytes(), Duration::from_secs(2));
    }
}

#[test]
fn some_strange_texts_are_fine() {
    for text in [
        SMALL.replace('\n', "\r\n"),
        format!("\u{feff}{SMALL}"),
        format!("---\n{SMALL}...\n"),
        SMALL.replace("pond", "بركة").replace("outfall", "池"),
        SMALL.replace("pond", "1").replace("outfall", "1e3"),
        SMALL.replace("pond", "True").replace("outfall", "0x10"),
        SMALL.replace("{length", "&p {length") + "  twin: {from: outfall, to: pond, pipe: *p}\n",
    ] {
        assert_eq!(read(text.as_bytes()), "", "{text}");
    }
}

#[test]
fn problems_beyond_a_hundred_are_counted() {
    let keys: String = (0..150).map(|i| format!("leng{i}: 3\n")).collect();
    let shown = read(format!("{SMALL}{keys}").as_bytes());
    assert_eq!(shown.matches("error[unknown-key]").count(), 100);
    assert!(shown.ends_with("and 50 more errors\n"), "{shown}");
}

/// Cautions do not push errors out.
#[test]
fn an_error_after_many_cautions_is_shown() {
    let nodes: String = (0..300)
        .map(|i| format!("  p{i}: {{point: 3 m}}\n"))
        .collect();
    let lines = &SMALL[SMALL.find("lines").unwrap()..];
    let text =
        format!("nodes:\n  pond: {{reservoir: 3 m}}\n  outfall: {{outlet: 12 m}}\n{nodes}{lines}");
    let shown = read(text.as_bytes());
    assert_eq!(shown.matches("caution[unused-node]").count(), 100);
    let shown = read(format!("{text}cases: {{odd: {{main.bore: -1}}}}\n").as_bytes());
    assert!(
        shown.contains("`bore` of the pipe of line `main` must be above zero"),
        "{shown}"
    );
}

/// 10,000 network lines between 3,334 points, each line of the network on one line of the file.
pub fn large(lines: usize) -> String {
    let mut text = "nodes:\n  top: {reservoir: 50 m}\n".to_owned();
    let points = lines / 3 + 1;
    for i in 0..points {
        writeln!(
            text,
            "  p{i}: {{point: {{elevation: {} m, draw: 0.1 L/s}}}}",
            i % 17
        )
        .unwrap();
    }
    text.push_str("lines:\n  feed: {from: top, to: p0, pipe: {length: 10 m, bore: 500 mm, roughness: 0.1 mm}}\n");
    for i in 0..lines {
        let (from, to) = (i % points, (i * 7 + 1) % points);
        let to = if to == from { (to + 1) % points } else { to };
        writeln!(
            text,
            "  l{i}: {{from: p{from}, to: p{to}, pipe: {{length: {} m, bore: 200 mm, roughness: 0.1 mm, k: 1.5}}}}",
            10 + i % 90
        )
        .unwrap();
    }
    text
}

/// A guard against work that grows with the square of a file, run beside other tests, checking and showing included; how
/// long reading alone takes is measured by `benches/read.rs`.
#[test]
fn large_files_are_read_quickly() {
    let text = large(10_000);
    assert_eq!(
        read_within(
            "10,000 network lines",
            text.as_bytes(),
            Duration::from_millis(1500)
        ),
        ""
    );
    let text = large(7_500);
    assert!(text.lines().count() >= 10_000);
    assert_eq!(
        read_within("10,000 lines", text.as_bytes(), Duration::from_millis(1500)),
        ""
    );
    // short lines, as many as fit
    let count = if cfg!(debug_assertions) {
        100_000
    } else {
        1_000_000
    };
    let short: String = (0..count).map(|i| format!("a{i}: 1\n")).collect();
    read_within("short lines", short.as_bytes(), Duration::from_secs(5));
}
