//! Effective size by method and interval on a logarithmic axis, with published limits.

use super::drawing::{Anchor, Drawing, Shape};
use super::scale::Scale;
use super::subject::Subject;
use super::table::{Cell, Table, cells};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{EffectiveSize, Plan};

const LEFT: f64 = 8.0;
const RIGHT: f64 = PANEL_WIDTH - 22.0;
const TOP: f64 = 62.0;
const ROW: f64 = 36.0;
/// Rows drawn of one population; the table has all.
const MOST_ROWS: usize = 14;
/// Beyond this a size is as good as without bound, and is drawn as an arrow.
const LARGEST_DRAWN: f64 = 10_000.0;

/// Sizes that the literature sets as limits, each with its source. Rules of thumb, not law.
pub const LIMITS: [(f64, &str); 4] = [
    (50.0, "Franklin 1980"),
    (100.0, "Frankham et al. 2014"),
    (500.0, "Franklin 1980"),
    (1000.0, "Frankham et al. 2014"),
];

/// Effective sizes, a panel a population.
pub fn figure(subjects: &[Subject]) -> Option<Figure> {
    let level = subjects.iter().flat_map(|s| &s.sizes).next()?.level;
    let x = axis(subjects);
    let with_sizes = subjects.iter().filter(|s| !s.sizes.is_empty());
    let table = table(subjects);
    Some(Figure {
        name: "effective-size",
        title: "Effective population size".to_owned(),
        caption: format!(
            "Effective size Ne in diploid individuals, logarithmic axis; bars are {} % intervals, an \
             arrow means that the data set no upper limit, or one above 10\u{202f}000. Filled marks are \
             the values to quote of each method; the name of the one quoted above is bold. The table \
             has all variants. \
             Upright lines are published rules of thumb, not law: 50 against inbreeding in the short \
             term and 500 to keep the power to adapt (Franklin 1980; full lines), 100 and 1000 for the \
             same (Frankham et al. 2014; dashed lines).",
            numbers::level(level)
        ),
        panels: with_sizes.map(|s| panel(s, &x)).collect(),
        specification: specification::effective_size(&table, &LIMITS),
        table,
    })
}

fn axis(subjects: &[Subject]) -> Scale {
    let mut limits = [10.0, 2000.0];
    let sizes = subjects.iter().flat_map(|s| &s.sizes).flat_map(|e| {
        let (low, high) = e.interval.unwrap_or_default();
        [e.estimate, low, high]
    });
    for n in sizes.flatten().filter(|&n| n > 0.0) {
        let n = n.clamp(1.0, LARGEST_DRAWN);
        limits = [f64::min(limits[0], n), f64::max(limits[1], n)];
    }
    Scale::logarithmic([limits[0] / 1.15, limits[1] * 1.15], [LEFT, RIGHT])
}

fn panel(subject: &Subject, x: &Scale) -> Panel {
    let shown = rows(subject);
    let hidden = subject.sizes.len() - shown.len();
    let bottom = TOP + ROW * shown.len() as f64 + 4.0;
    let mut d = Drawing::new();
    d.name(
        "name",
        (8.0, 17.0),
        Anchor::Start,
        (subject.population, 304.0),
    );
    limits(&mut d, x, bottom);
    for (i, size) in shown.iter().enumerate() {
        let quoted = subject.size.is_some_and(|s| std::ptr::eq(s, *size));
        row(
            &mut d,
            size,
            (short_label(subject, size), quoted),
            x,
            TOP + ROW * i as f64,
        );
    }
    d.line("axis", (LEFT, bottom), (RIGHT, bottom));
    for tick in x.ticks(9) {
        d.line("axis", (x.at(tick), bottom), (x.at(tick), bottom + 4.0));
        let label = numbers::size(tick);
        d.text("tick", (x.at(tick), bottom + 16.0), Anchor::Middle, &label);
    }
    let below = bottom + 33.0;
    d.text(
        "small",
        (160.0, below),
        Anchor::Middle,
        "Effective size, individuals",
    );
    d.line("limit", (12.0, below + 7.0), (12.0, below + 19.0));
    d.text(
        "small",
        (20.0, below + 17.0),
        Anchor::Start,
        "50, 500: Franklin (1980)",
    );
    d.line("limit dashed", (12.0, below + 24.0), (12.0, below + 36.0));
    let words = "100, 1000: Frankham et al. (2014)";
    d.text("small", (20.0, below + 34.0), Anchor::Start, words);
    let mut height = below + 42.0;
    if hidden > 0 {
        let words = format!("{} more in the table", numbers::count(hidden as u64));
        d.text("small soft", (20.0, below + 51.0), Anchor::Start, &words);
        height += 17.0;
    }
    let values = shown.iter().map(|e| {
        format!(
            "{}: {}",
            short_label(subject, e),
            numbers::effective_size(e)
        )
    });
    Panel {
        title: subject.population.to_owned(),
        description: values.collect::<Vec<_>>().join("; "),
        width: PANEL_WIDTH,
        height,
        body: d.into_body(),
    }
}

/// The value quoted above first, then those to quote of their method, then those since the baseline,
/// as far as there is room. Variants of a method that has a value to quote are for the table.
fn rows<'a>(subject: &Subject<'a>) -> Vec<&'a EffectiveSize> {
    let is_variant = |e: &EffectiveSize| {
        let same = |o: &&EffectiveSize| {
            o.headline && (&o.method, &o.from, &o.to) == (&e.method, &e.from, &e.to)
        };
        !e.headline && e.variant.is_some() && subject.sizes.iter().any(same)
    };
    let mut rows = subject.sizes.clone();
    rows.retain(|e| !is_variant(e));
    let quoted = |e: &EffectiveSize| subject.size.is_some_and(|s| std::ptr::eq(s, e));
    let since_baseline = |e: &EffectiveSize| {
        let c = subject.since_baseline;
        c.is_some_and(|c| e.from.as_deref() == Some(c.from.as_str()) && e.to == c.to)
    };
    rows.sort_by_key(|e| {
        let absent = e.estimate.is_none() && !e.unbounded;
        (!quoted(e), absent, !e.headline, !since_baseline(e))
    });
    rows.truncate(MOST_ROWS);
    rows
}

/// Lines of the published limits, their sizes above them in two rows, since 50 and 100 are near.
fn limits(d: &mut Drawing, x: &Scale, bottom: f64) {
    for (i, &(size, _)) in LIMITS.iter().enumerate() {
        let at = x.at(size);
        let dashed = i % 2 == 1;
        let y = if dashed { 46.0 } else { 33.0 };
        let class = if dashed { "limit dashed" } else { "limit" };
        d.line(class, (at, y + 3.0), (at, bottom));
        d.text(
            "tick",
            (at, y),
            Anchor::Middle,
            &numbers::count(size as u64),
        );
    }
}

fn row(d: &mut Drawing, e: &EffectiveSize, (words, quoted): (String, bool), x: &Scale, top: f64) {
    let value = numbers::effective_size(e);
    d.begin(&format!("{words}: {value}"));
    let class = if quoted { "small strong" } else { "small" };
    let has_mark = e.estimate.is_some() || e.unbounded;
    // The label stands on the ground colour, so that the upright lines do not cross it.
    let wide = super::drawing::width_of(&words, 11.0).min(RIGHT - LEFT);
    d.rectangle("step-0", (LEFT - 2.0, top), (wide + 4.0, 14.0));
    d.name(class, (LEFT, top + 11.0), Anchor::Start, (&words, 304.0));
    let y = top + 24.0;
    if has_mark {
        interval(d, e, x, y);
    } else {
        let wide = super::drawing::width_of(&value, 11.0).min(RIGHT - LEFT);
        d.rectangle("step-0", (LEFT - 2.0, y - 9.0), (wide + 4.0, 14.0));
        d.name(
            "small soft",
            (LEFT, y + 2.0),
            Anchor::Start,
            (&value, 304.0),
        );
    }
    d.end();
}

fn interval(d: &mut Drawing, e: &EffectiveSize, x: &Scale, y: f64) {
    let (colour, shape) = look(&e.method);
    let whisker = format!("{colour} whisker");
    if let Some((low, high)) = e.interval {
        let high_drawn = high.filter(|&n| n <= LARGEST_DRAWN);
        let start = low.map_or(LEFT, |n| x.at(n));
        let end = high_drawn.map_or(RIGHT, |n| x.at(n));
        d.line(&whisker, (start, y), (end, y));
        for (limit, at) in [(low, start), (high_drawn, end)] {
            if limit.is_some() {
                d.line(&whisker, (at, y - 4.0), (at, y + 4.0));
            }
        }
        if high_drawn.is_none() {
            let tip = [(end - 7.0, y - 4.5), (end, y), (end - 7.0, y + 4.5)];
            d.polyline(&whisker, tip, false);
        }
        if low.is_none() {
            let tip = [(start + 7.0, y - 4.5), (start, y), (start + 7.0, y + 4.5)];
            d.polyline(&whisker, tip, false);
        }
    }
    if let Some(n) = e.estimate.filter(|&n| n <= LARGEST_DRAWN) {
        let filling = if e.headline { "solid" } else { "hollow" };
        d.mark(&format!("{colour} {filling}"), shape, (x.at(n), y));
    }
}

/// Colour and shape of a family of methods.
fn look(method: &str) -> (&'static str, Shape) {
    match method {
        "temporal_fs" | "temporal_fc" | "temporal_fk" => ("deep", Shape::Circle),
        "temporal_likelihood" | "temporal_likelihood_by_interval" => ("plum", Shape::Diamond),
        "linkage" => ("ochre", Shape::Square),
        _ => ("ink", Shape::Triangle),
    }
}

/// Visits and method in a line, with the plan where a population has estimates under both.
fn short_label(subject: &Subject, e: &EffectiveSize) -> String {
    let other_plan = |o: &&EffectiveSize| o.plan.is_some() && o.plan != e.plan;
    let plan = e.plan.filter(|_| subject.sizes.iter().any(other_plan));
    let plan = plan.map_or_else(String::new, |plan| format!(", plan {}", plan_name(plan)));
    format!("{}: {}{plan}", when(e), method_name(&e.method))
}

/// Visits, method, variant and plan in a line.
fn label(e: &EffectiveSize) -> String {
    let variant = e.variant.iter().map(|v| format!(", {v}"));
    let plan = e.plan.map(|plan| format!(", plan {}", plan_name(plan)));
    let tail: String = variant.chain(plan).collect();
    format!("{}: {}{tail}", when(e), method_name(&e.method))
}

fn when(e: &EffectiveSize) -> String {
    let visit = |stratum: &str| {
        let own = stratum.strip_prefix(e.population.as_str());
        let visit = own.and_then(|rest| rest.strip_prefix('@'));
        visit.unwrap_or(stratum).to_owned()
    };
    match &e.from {
        Some(from) => format!("{} to {}", visit(from), visit(&e.to)),
        None => visit(&e.to),
    }
}

/// The method in words, with authors and year where a name alone would not tell it.
fn method_name(method: &str) -> &str {
    match method {
        "temporal_fs" => "frequencies, Jorde & Ryman 2007",
        "temporal_fc" => "frequencies, Nei & Tajima 1981",
        "temporal_fk" => "frequencies, Pollak 1983",
        "temporal_likelihood" => "likelihood of all visits",
        "temporal_likelihood_by_interval" => "likelihood of this interval",
        "linkage" => "linkage",
        "heterozygote_excess" => "heterozygote excess",
        "demographic" => "counts of breeders",
        other => other,
    }
}

fn plan_name(plan: Plan) -> &'static str {
    match plan {
        Plan::I => "I",
        Plan::II => "II",
    }
}

fn table(subjects: &[Subject]) -> Table {
    let mut table = Table::new(
        "Effective size by population, method and visits. An empty upper limit means that there is none.",
        &[
            ("population", "Population"),
            ("method", "Method"),
            ("label", "Method in words"),
            ("from", "From"),
            ("to", "To"),
            ("refers_to", "Refers to"),
            ("generations", "Generations"),
            ("plan", "Sampling plan"),
            ("size", "Effective size, individuals"),
            ("low", "lower limit"),
            ("high", "upper limit"),
            (
                "drift_rate",
                "1/(2Ne), share of heterozygosity lost per generation",
            ),
            ("drift_rate_low", "lower limit"),
            ("drift_rate_high", "upper limit"),
            ("unbounded", "Without upper limit"),
            ("loci", "Loci"),
            ("individuals", "Individuals (harmonic mean)"),
            ("share_of_census", "Effective over census size"),
            ("headline", "To quote"),
            ("notes", "Notes"),
        ],
    );
    for e in subjects.iter().flat_map(|s| &s.sizes) {
        let (low, high) = e.interval.unwrap_or_default();
        let yes = |b: bool| Cell::from(if b { "yes" } else { "no" });
        let notes = e.notes.iter().chain(&e.absent_because);
        let mut row = vec![
            Cell::from(e.population.as_str()),
            Cell::from(e.method.as_str()),
            Cell::from(label(e)),
            e.from.as_deref().map_or(Cell::Missing, Cell::from),
            Cell::from(e.to.as_str()),
            Cell::from(e.refers_to.as_str()),
            Cell::maybe(e.generations),
            e.plan
                .map_or(Cell::Missing, |plan| Cell::from(plan_name(plan))),
            Cell::maybe(e.estimate),
            Cell::maybe(low),
            Cell::maybe(high),
        ];
        row.extend(cells(&e.drift_rate));
        row.extend([
            yes(e.unbounded),
            Cell::from(e.loci),
            Cell::maybe(e.individuals),
            Cell::maybe(e.share_of_census),
            yes(e.headline),
            Cell::from(notes.cloned().collect::<Vec<_>>().join("; ")),
        ]);
        table.rows.push(row);
    }
    table
}
