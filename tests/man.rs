//! The man pages in `man/` say what the flags say. `GENEWANE_WRITE_MAN=1 cargo test --release --test
//! man` writes them anew.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use clap::Command;
use clap_mangen::Man;

/// Makes a plain apostrophe of `\*(Aq` in every dialect of roff.
const PREAMBLE: &str = ".ie \\n(.g .ds Aq \\(aq\n.el .ds Aq '\n";

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("man")
}

/// Topics of `genewane help` that are pages of their own, with their sections.
const TOPICS: [(&str, &str); 2] = [("formats", "5"), ("methods", "7")];

/// Every page by file name. No date: the same flags and words give the same bytes.
fn pages() -> BTreeMap<String, String> {
    let mut root = genewane::cli::command();
    root.build();
    let names: Vec<String> = root
        .get_subcommands()
        .map(|c| format!("genewane-{}", c.get_name()))
        .collect();
    let mut pages = BTreeMap::new();
    let others: Vec<&str> = names.iter().map(String::as_str).collect();
    pages.insert("genewane.1".to_string(), page(&root, "genewane", &others));
    for (command, name) in root.get_subcommands().zip(&names) {
        pages.insert(format!("{name}.1"), page(command, name, &["genewane"]));
    }
    for (topic, section) in TOPICS {
        let text = genewane::cli::help::TOPICS;
        let (_, text) = text.iter().find(|(name, _)| *name == topic).unwrap();
        let name = format!("genewane-{topic}.{section}");
        pages.insert(name, topic_page(topic, section, text));
    }
    pages
}

/// A topic as a page. Its text knows headings (`#`, `##`), paragraphs, and lines that are set as they
/// stand, which are indented by four.
fn topic_page(topic: &str, section: &str, text: &str) -> String {
    let mut lines = text.lines();
    let title = lines.next().unwrap_or_default().trim_start_matches("# ");
    let about = title.split_once(": ").map_or(title, |(_, about)| about);
    let mut out = format!(
        "{PREAMBLE}.TH {} {section} \"\" \"genewane {}\" \"genewane manual\"\n.SH NAME\ngenewane\\-{topic} \\- {}\n",
        escape(&format!("GENEWANE-{}", topic.to_uppercase())),
        env!("CARGO_PKG_VERSION"),
        escape(about)
    );
    let mut before_first = true;
    let mut stands = false;
    for line in lines {
        let as_it_stands = line.starts_with("    ");
        if as_it_stands != stands && !line.is_empty() {
            out.push_str(if as_it_stands { ".PP\n.nf\n" } else { ".fi\n" });
            stands = as_it_stands;
        }
        match line.strip_prefix("## ") {
            Some(heading) => {
                before_first = false;
                out.push_str(&format!(".SH \"{}\"\n", escape(&heading.to_uppercase())));
            }
            None if line.is_empty() => out.push_str(if stands { "\n" } else { ".PP\n" }),
            None => {
                if before_first {
                    before_first = false;
                    out.push_str(".SH DESCRIPTION\n");
                }
                out.push_str(&escape(line));
                out.push('\n');
            }
        }
    }
    out.push_str(if stands { ".fi\n" } else { "" });
    out.push_str(".SH \"SEE ALSO\"\n\\fBgenewane\\fR(1)\n");
    out
}

fn page(command: &Command, name: &str, see_also: &[&str]) -> String {
    let man = Man::new(command.clone());
    let mut bytes = Vec::new();
    let mut render = |section: fn(&Man, &mut dyn std::io::Write) -> std::io::Result<()>| {
        section(&man, &mut bytes).expect("memory takes any page");
    };
    render(Man::render_name_section);
    render(Man::render_synopsis_section);
    render(Man::render_description_section);
    render(Man::render_options_section);
    if command.has_subcommands() {
        render(Man::render_subcommands_section);
    }
    // Each section brings the preamble; a page needs it once.
    let sections = String::from_utf8(bytes)
        .expect("pages are UTF-8")
        .replace(PREAMBLE, "")
        .replace(".SH SUBCOMMANDS", ".SH COMMANDS");
    let last = command
        .get_after_long_help()
        .map(|text| own_section(&text.to_string()));
    let see_also: Vec<String> = see_also
        .iter()
        .map(|name| format!("\\fB{}\\fR(1)", escape(name)))
        .collect();
    // The title is written here because the date, which is blank, needs its quotes.
    format!(
        "{PREAMBLE}.TH {} 1 \"\" \"genewane {}\" \"genewane manual\"\n{sections}{}.SH \"SEE ALSO\"\n{}\n",
        escape(&name.to_uppercase()),
        env!("CARGO_PKG_VERSION"),
        last.unwrap_or_default(),
        see_also.join(", ")
    )
}

/// The closing text of a command's help: its first line, which ends in a colon, is the heading, and
/// the rest is set as it stands.
fn own_section(text: &str) -> String {
    let (heading, body) = text
        .split_once(":\n")
        .expect("a heading, a colon, then lines");
    let body: Vec<String> = body.lines().map(escape).collect();
    format!(
        ".SH \"{}\"\n.nf\n{}\n.fi\n",
        heading.to_uppercase(),
        body.join("\n")
    )
}

/// A line of text as roff: marks with a meaning of their own made plain.
fn escape(line: &str) -> String {
    let plain = line
        .replace('\\', "\\e")
        .replace('-', "\\-")
        .replace('\'', "\\(aq");
    if plain.starts_with('.') {
        format!("\\&{plain}")
    } else {
        plain
    }
}

#[test]
fn man_pages_say_what_the_flags_say() {
    let pages = pages();
    if std::env::var_os("GENEWANE_WRITE_MAN").is_some_and(|value| value == "1") {
        fs::create_dir_all(folder()).expect("man/ can be made");
        for (name, text) in &pages {
            fs::write(folder().join(name), text).expect("man/ can be written");
        }
    }
    for (name, text) in &pages {
        let kept = fs::read_to_string(folder().join(name)).unwrap_or_default();
        assert!(
            kept == *text,
            "man/{name} differs from the flags; write it anew with GENEWANE_WRITE_MAN=1\n\
             --- kept\n{kept}\n--- flags\n{text}"
        );
    }
    for entry in fs::read_dir(folder()).expect("man/ is there") {
        let name = entry
            .expect("man/ can be listed")
            .file_name()
            .into_string()
            .unwrap();
        let known = pages.contains_key(&name);
        assert!(known, "man/{name} is of no command: remove it");
    }
}

#[test]
fn pages_are_the_same_each_time_and_name_every_flag() {
    let pages = pages();
    assert_eq!(pages, self::pages());
    for command in genewane::cli::command().get_subcommands() {
        let text = &pages[&format!("genewane-{}.1", command.get_name())];
        for flag in command.get_arguments().filter_map(|flag| flag.get_long()) {
            assert!(
                text.contains(&escape(&format!("--{flag}"))),
                "--{flag} is missing"
            );
        }
    }
}

/// Numbers of the demonstration that topics quote stand in the tour of README.md, which a test makes
/// anew.
#[test]
fn numbers_of_the_topics_are_those_of_the_tour() {
    let readme =
        fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md")).unwrap();
    let mut quoted = 0;
    for (name, text) in genewane::cli::help::TOPICS {
        let text = text.replace('\n', " ");
        for (at, _) in text.match_indices(" (") {
            let Some(end) = text[at..].find(')') else {
                continue;
            };
            let inside = &text[at + 2..at + end];
            let Some((low, high)) = inside.split_once(" to ") else {
                continue;
            };
            let number = |word: &str| word.parse::<f64>().is_ok();
            let before = text[..at].rsplit(' ').next().unwrap_or_default();
            if number(low) && number(high) && number(before) {
                quoted += 1;
                let quote = format!("{before} ({inside})");
                assert!(
                    readme.contains(&quote),
                    "{name}: {quote} is not in README.md"
                );
            }
        }
    }
    assert!(quoted >= 3);
}

/// Files named in examples exist, so that a reader can type them.
#[test]
fn files_of_the_examples_exist() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    if !root.join("fixtures/demo").exists() {
        eprintln!("SKIPPED: there is no fixtures/demo");
        return;
    }
    for command in genewane::cli::command().get_subcommands() {
        let text = command
            .get_after_long_help()
            .map(ToString::to_string)
            .unwrap_or_default();
        for path in text
            .split_whitespace()
            .filter(|word| word.starts_with("fixtures/"))
        {
            assert!(
                root.join(path).exists(),
                "{}: {path} does not exist",
                command.get_name()
            );
        }
    }
}
