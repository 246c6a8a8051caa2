//! Figures of a report: panels of SVG, each figure with its caption, its data and a chart
//! specification in the open Vega-Lite format.
//!
//! Drawn by a small module of our own. What a page needs of a figure is real text, colours from the
//! style sheet (so that dark screens, paper and the reader's own settings apply), a title at each
//! mark, and coordinates finer than a pixel. Of the libraries there are, `plotters` writes whole
//! pixels, literal colours and neither groups, titles nor classes; `charming` needs a script engine
//! to draw at all. What is left to do by hand is small: scales, ticks and some shapes.
//!
//! A figure is a list of panels of one phone's width, one a population or visit: the page lays them
//! out in as many columns as there is room for, and the standalone file in a grid.

mod carriers;
mod differentiation;
mod diversity;
mod drawing;
mod effective_size;
pub mod fans;
mod fates;
mod genotyping;
pub mod numbers;
mod outliers;
pub mod palette;
mod scale;
mod specification;
pub mod subject;
pub mod table;

use std::fmt::Write as _;

use serde_json::Value;

use drawing::length;
use subject::Subject;
use table::Table;

use super::wire::Report;

pub use drawing::{escaped, is_forbidden, isolated};

/// Width of a panel in pixels: a phone of 360 with margins.
pub const PANEL_WIDTH: f64 = 320.0;

/// One figure.
#[derive(Debug, Clone)]
pub struct Figure {
    /// Name for anchors and files: lower-case letters and hyphens.
    pub name: &'static str,
    /// What it shows, in a few words.
    pub title: String,
    /// How to read it: units, intervals, sources.
    pub caption: String,
    /// The panels.
    pub panels: Vec<Panel>,
    /// The data behind it.
    pub table: Table,
    /// The same as a Vega-Lite specification with its data.
    pub specification: Value,
}

/// One drawing of a figure.
#[derive(Debug, Clone)]
pub struct Panel {
    /// What it is of, such as a population.
    pub title: String,
    /// What it says, for those who do not see it.
    pub description: String,
    /// Width in pixels at natural size.
    pub width: f64,
    /// Height in pixels at natural size.
    pub height: f64,
    /// The elements inside.
    pub body: String,
}

/// Every figure for which the report has data, in the order of the page.
pub fn figures(report: &Report, subjects: &[Subject]) -> Vec<Figure> {
    [
        diversity::figure(report, subjects),
        effective_size::figure(subjects),
        fates::figure(report, subjects),
        carriers::figure(report, subjects),
        differentiation::between_populations(report),
        differentiation::in_time(subjects),
        outliers::figure(report),
        genotyping::figure(subjects),
    ]
    .into_iter()
    .flatten()
    .collect()
}

impl Panel {
    /// The drawing as an element of a page. `fluid` panels take the width they are given.
    pub fn element(&self, fluid: bool) -> String {
        let [w, h] = [self.width, self.height].map(length);
        let size = match fluid {
            true => String::new(),
            false => format!(r#" width="{w}" height="{h}""#),
        };
        format!(
            r#"<svg class="figure" viewBox="0 0 {w} {h}"{size} role="img" aria-label="{}">{}</svg>"#,
            escaped(&format!("{}: {}", isolated(&self.title), self.description)),
            self.body
        )
    }
}

impl Figure {
    /// The whole figure as a file: its panels in a grid, its style inside.
    pub fn file(&self) -> String {
        const GAP: f64 = 24.0;
        let widest = self.panels.iter().map(|p| p.width).fold(0.0, f64::max);
        let columns = match widest > PANEL_WIDTH {
            true => 1,
            false => (self.panels.len() as f64).sqrt().ceil().clamp(1.0, 6.0) as usize,
        };
        let mut placed = String::new();
        let mut y = GAP;
        for row in self.panels.chunks(columns) {
            for (i, panel) in row.iter().enumerate() {
                let [x, top, w, h] = [
                    GAP + i as f64 * (widest + GAP),
                    y,
                    panel.width,
                    panel.height,
                ]
                .map(length);
                let _ = write!(
                    placed,
                    r#"<svg x="{x}" y="{top}" width="{w}" height="{h}" viewBox="0 0 {w} {h}"><title>{}</title>{}</svg>"#,
                    escaped(&panel.title),
                    panel.body
                );
                placed.push('\n');
            }
            y += row.iter().map(|p| p.height).fold(0.0, f64::max) + GAP;
        }
        let wide = GAP + columns.min(self.panels.len().max(1)) as f64 * (widest + GAP);
        let [w, h] = [wide, y].map(length);
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" class=\"figure\" viewBox=\"0 0 {w} {h}\" width=\"{w}\" height=\"{h}\" role=\"img\" aria-labelledby=\"title caption\">\n\
             <title id=\"title\">{}</title>\n<desc id=\"caption\">{}</desc>\n\
             <style>\n{}{}.ground{{fill:var(--page)}}\n</style>\n<rect class=\"ground\" width=\"{w}\" height=\"{h}\"/>\n{placed}</svg>\n",
            escaped(&self.title),
            escaped(&self.caption),
            palette::theme_style(".figure"),
            palette::FIGURE_STYLE,
        )
    }
}
