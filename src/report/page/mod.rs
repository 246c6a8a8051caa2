//! A report as one page that people read: no network, no parts, the same bytes for the same report.
//!
//! [`parse_report`] reads the document back, [`Page::of`] turns it into sentences, figures and tables,
//! [`Page::html`] sets them in a template that escapes whatever it is given. The page is whole
//! without its script, which only sorts, filters and copies tables. Its policy header forbids every
//! request and every script or style but its own, by their digests.

mod ahead;
mod answer;
mod causes;
mod judged;
mod read;
mod redact;
#[cfg(test)]
pub(crate) mod sample;
mod tables;
#[cfg(test)]
mod tests;
mod view;

use std::path::Path;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use minijinja::value::{Serde, Value};
use minijinja::{AutoEscape, Environment};
use sha2::{Digest, Sha256};

use super::figures::{Figure, fans, figures, is_forbidden, palette, subject};
use super::wire::Report;
use crate::error::{Error, Result};
use crate::files::WholeFile;

pub use read::{Companions, parse_report, read_document};

const TEMPLATE: &str = include_str!("page.html");
const SCRIPT: &str = include_str!("page.js");
const STYLE: &str = include_str!("page.css");

/// Everything a page shows.
#[derive(Debug)]
pub struct Page {
    view: view::View,
    figures: Vec<Figure>,
}

impl Page {
    /// The page of a report and of the documents made from it; with `without_samples` no sample name
    /// is in it.
    pub fn of(report: Report, companions: &Companions, without_samples: bool) -> Page {
        let report = match without_samples {
            true => redact::without_samples(report),
            false => report,
        };
        let subjects = subject::subjects(&report);
        let futures = fans::futures(&companions.forecasts);
        let mut figures = figures(&report, &subjects);
        figures.extend(fans::figures(&futures));
        let ahead = ahead::section(companions, &futures, &figures);
        let judged = companions.verdicts.iter().enumerate();
        let judged = judged.map(|(i, verdict)| judged::section(verdict, i));
        let beside = judged.chain(ahead).collect();
        let view = view::View::of(&report, &subjects, &figures, beside, without_samples);
        Page { view, figures }
    }

    /// The document.
    ///
    /// # Errors
    /// [`Error::Document`] where the template refuses the report, which no report should bring about.
    pub fn html(&self) -> Result<String> {
        let style = format!(
            "{}{}{STYLE}",
            palette::theme_style(":root"),
            palette::FIGURE_STYLE
        );
        let refused = |e: minijinja::Error| Error::Document {
            path: "page".into(),
            problem: format!("the page could not be set: {e:#}"),
            cure: "tell the authors of the program, with the report".to_owned(),
        };
        let mut environment = Environment::new();
        environment.set_auto_escape_callback(|_| AutoEscape::Html);
        environment.add_filter("name", name);
        environment
            .add_template("page", TEMPLATE)
            .map_err(refused)?;
        let context = minijinja::context! {
            page => Value::from(Serde(&self.view)),
            policy => policy(&style),
            style => Value::from_safe_string(style),
            script => Value::from_safe_string(SCRIPT.to_owned()),
        };
        let template = environment.get_template("page").map_err(refused)?;
        let html = template.render(context).map_err(refused)?;
        Ok(html.replace(is_forbidden, "\u{fffd}"))
    }

    /// Writes each figure into a folder, as `NAME.svg` and `NAME.vl.json`; the folder is made if absent.
    pub fn write_figures(&self, folder: &Path) -> Result<()> {
        use std::io::Write;
        std::fs::create_dir_all(folder).map_err(|e| Error::io(folder, "create", e))?;
        for figure in &self.figures {
            let specification = serde_json::to_vec_pretty(&figure.specification)
                .map_err(|e| Error::io(folder, "write", std::io::Error::other(e)))?;
            let drawing = figure.file().into_bytes();
            for (ending, bytes) in [("svg", drawing), ("vl.json", specification)] {
                let path = folder.join(format!("{}.{ending}", figure.name));
                let mut file = WholeFile::create(&path)?;
                file.write_all(&bytes)
                    .map_err(|e| Error::io(&path, "write", e))?;
                file.finish()?;
            }
        }
        Ok(())
    }
}

/// What the page may do: nothing but its own style and script.
fn policy(style: &str) -> String {
    let digest = |text: &str| STANDARD.encode(Sha256::digest(text.as_bytes()));
    format!(
        "default-src 'none'; style-src 'sha256-{}'; script-src 'sha256-{}'; img-src data:; \
         base-uri 'none'; form-action 'none'",
        digest(style),
        digest(SCRIPT)
    )
}

/// A name in a cell: kept apart from the direction of its neighbours where it needs to be.
fn name(text: String) -> Value {
    let escaped = super::figures::escaped(&text);
    Value::from_safe_string(match text.is_ascii() {
        true => escaped,
        false => format!("<bdi>{escaped}</bdi>"),
    })
}
