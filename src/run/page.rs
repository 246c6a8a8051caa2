//! `genewane page`: read the report and what was made from it, set them, write.

use super::documents::report_of;
use crate::cli::PagePlan;
use crate::error::Result;
use crate::report::Output;
use crate::report::page::{Companions, Page, read_document};

/// Sets a report, with its forecasts and verdicts, as a page; nothing is written where one of them
/// does not fit.
pub fn page(plan: &PagePlan) -> Result<()> {
    let mut inputs = Vec::new();
    let report = report_of(&plan.report, &mut inputs)?;
    let mut companions = Companions::default();
    for path in &plan.documents {
        let bytes = read_document(path)?;
        companions.take(path, &bytes, &inputs[0].sha256)?;
    }
    let output = Output::create(plan.output.as_deref())?;
    let page = Page::of(report, &companions, plan.without_samples);
    let html = page.html()?;
    if let Some(folder) = &plan.figures {
        page.write_figures(folder)?;
    }
    output.bytes(html.as_bytes())
}
