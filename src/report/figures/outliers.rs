//! Loci that changed more than drift explains, along their contigs, a panel a comparison.

use super::drawing::{Anchor, Drawing, Shape};
use super::scale::{Scale, extent};
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{Comparison, OutlierLocus, Outliers, Report};

const ROW: f64 = 24.0;
const NAME_WIDTH: f64 = 84.0;
/// Contigs drawn of one comparison; the table has all loci.
const MOST_ROWS: usize = 40;

/// Outlying loci by contig and position.
pub fn figure(report: &Report) -> Option<Figure> {
    let tested: Vec<(&Comparison, &Outliers)> = report
        .comparisons
        .iter()
        .filter_map(|c| Some((c, c.outlier_loci.as_ref()?)))
        .filter(|(_, o)| !o.list.is_empty())
        .collect();
    let (_, first) = tested.first()?;
    let mut table = Table::new(
        "Loci whose change drift does not explain, at most 100 a comparison, the least likely first.",
        &[
            ("from", "From"),
            ("to", "To"),
            ("contig", "Contig"),
            ("position", "Position"),
            (
                "frequency_from",
                "Frequency of the first alternate allele before",
            ),
            ("frequency_to", "Frequency after"),
            ("p", "p"),
            ("q", "q (false discovery rate)"),
        ],
    );
    for (c, outliers) in &tested {
        for locus in &outliers.list {
            table.rows.push(vec![
                Cell::from(c.from.as_str()),
                Cell::from(c.to.as_str()),
                Cell::from(locus.contig.as_str()),
                Cell::from(locus.position),
                Cell::from(locus.frequency_from),
                Cell::from(locus.frequency_to),
                Cell::from(locus.p),
                Cell::from(locus.q),
            ]);
        }
    }
    Some(Figure {
        name: "outliers",
        title: "Loci that changed more than drift explains".to_owned(),
        caption: format!(
            "Loci whose change of allele frequency is too large for drift and sampling at the estimated \
             effective size, by contig and position in millions of bases (Mb); false discovery rate \
             {} % (Benjamini & Hochberg 1995). Triangles point up where the first alternate allele rose \
             and down where it fell. A contig is drawn as far as its last such locus. Selection, \
             migration, and genotyping errors all make such loci.",
            numbers::level(first.false_discovery_rate)
        ),
        panels: tested.iter().map(|(c, o)| panel(c, o)).collect(),
        specification: specification::outliers(&table),
        table,
    })
}

fn panel(c: &Comparison, outliers: &Outliers) -> Panel {
    let mut contigs: Vec<&str> = outliers.list.iter().map(|l| l.contig.as_str()).collect();
    contigs.sort_by(|a, b| natural(a).cmp(&natural(b)).then(a.cmp(b)));
    contigs.dedup();
    let shown = &contigs[..contigs.len().min(MOST_ROWS)];
    let title = format!("{} to {}", c.from, c.to);
    let mut d = Drawing::new();
    d.name("name", (8.0, 17.0), Anchor::Start, (&title, 304.0));
    let found = format!(
        "{} of {} tested",
        numbers::count(outliers.found),
        numbers::counted(outliers.tested, "locus", "loci")
    );
    d.text("small", (8.0, 34.0), Anchor::Start, &found);
    let last = extent(outliers.list.iter().map(millions), 0.0, [0.0, 1.0])[1];
    let x = Scale::linear(
        [0.0, last.max(1e-6)],
        [NAME_WIDTH + 14.0, PANEL_WIDTH - 14.0],
    );
    for (i, contig) in shown.iter().enumerate() {
        let y = 54.0 + ROW * i as f64;
        d.name("small", (8.0, y + 4.0), Anchor::Start, (contig, NAME_WIDTH));
        let on_contig = || outliers.list.iter().filter(|l| l.contig == *contig);
        let end = on_contig()
            .map(|l| x.at(millions(l)))
            .fold(x.at(0.0), f64::max);
        d.line("grid", (x.at(0.0), y), (end, y));
        for locus in on_contig() {
            mark(&mut d, locus, x.at(millions(locus)), y);
        }
    }
    let bottom = 54.0 + ROW * shown.len() as f64;
    d.line("axis", (x.at(0.0), bottom), (PANEL_WIDTH - 14.0, bottom));
    let places = x.places(4);
    for tick in x.ticks(4) {
        d.line("axis", (x.at(tick), bottom), (x.at(tick), bottom + 4.0));
        let label = numbers::decimals(tick, places);
        d.text("tick", (x.at(tick), bottom + 16.0), Anchor::Middle, &label);
    }
    d.text(
        "small",
        (200.0, bottom + 33.0),
        Anchor::Middle,
        "Position, Mb",
    );
    let mut height = bottom + 42.0;
    if contigs.len() > shown.len() {
        let more = (contigs.len() - shown.len()) as u64;
        let words = format!(
            "{} more in the table",
            numbers::counted(more, "contig", "contigs")
        );
        d.text("small soft", (8.0, bottom + 51.0), Anchor::Start, &words);
        height += 17.0;
    }
    let places = outliers.list.iter().take(20);
    let places: Vec<_> = places
        .map(|l| format!("{}:{}", l.contig, l.position))
        .collect();
    Panel {
        title,
        description: format!("{found}. The least likely: {}", places.join(", ")),
        width: PANEL_WIDTH,
        height,
        body: d.into_body(),
    }
}

fn mark(d: &mut Drawing, locus: &OutlierLocus, x: f64, y: f64) {
    d.begin(&format!(
        "{}:{}, frequency {} to {}, q {}",
        locus.contig,
        locus.position,
        numbers::decimals(locus.frequency_from, 2),
        numbers::decimals(locus.frequency_to, 2),
        numbers::chance(locus.q)
    ));
    match locus.frequency_to >= locus.frequency_from {
        true => d.mark("plum solid", Shape::Triangle, (x, y)),
        false => d.mark("deep solid", Shape::Drop, (x, y)),
    }
    d.end();
}

fn millions(locus: &OutlierLocus) -> f64 {
    locus.position as f64 / 1e6
}

/// Sorts `chr2` before `chr10`: runs of digits by length, then as written.
fn natural(name: &str) -> Vec<(usize, String)> {
    let mut parts: Vec<(usize, String)> = Vec::new();
    let mut in_digits = false;
    for c in name.chars() {
        let digit = c.is_ascii_digit();
        match parts.last_mut() {
            Some((length, part)) if digit == in_digits => {
                part.push(c);
                *length += usize::from(digit);
            }
            _ => parts.push((usize::from(digit), c.to_string())),
        }
        in_digits = digit;
    }
    parts
}

#[cfg(test)]
mod tests {
    use super::natural;

    #[test]
    fn contigs_stand_in_the_order_of_their_numbers() {
        let mut names = vec!["chr10", "chrX", "chr2", "chr1", "2", "11"];
        names.sort_by_key(|n| natural(n));
        assert_eq!(names, ["chr1", "chr2", "chr10", "chrX", "2", "11"]);
    }
}
