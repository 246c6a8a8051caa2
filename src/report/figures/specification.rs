//! Chart specifications in the Vega-Lite format, with the data inside.
//!
//! They hold the same data as the drawings and encode it the same way; whoever draws them may change
//! both. The tests of the browser compile each of them.

use serde_json::{Value, json};

use super::palette::LIGHT;
use super::table::Table;

/// The version of the format, as its schema is named.
const SCHEMA: &str = "https://vega.github.io/schema/vega-lite/v6.json";

/// A chart a population: `layers` over the rows of the table.
fn by_population(table: &Table, layers: Value) -> Value {
    facet(
        table,
        json!({"field": "population", "type": "nominal", "title": null}),
        layers,
    )
}

fn facet(table: &Table, by: Value, layers: Value) -> Value {
    json!({
        "$schema": SCHEMA,
        "description": table.caption,
        "data": {"values": table.records()},
        "facet": by,
        "columns": 3,
        "spec": {"width": 260, "layer": layers},
        "config": {"background": LIGHT.page, "font": "sans-serif", "axis": {"labelColor": LIGHT.ink, "titleColor": LIGHT.ink}}
    })
}

fn quantity(field: &str, title: &str) -> Value {
    json!({"field": field, "type": "quantitative", "title": title, "scale": {"zero": false}})
}

/// Values and intervals over the years as layers.
fn over_years(field: &str, title: &str, colour: &str, shape: &str) -> Vec<Value> {
    let x = json!({"field": "year", "type": "quantitative", "title": "Year of sampling", "scale": {"zero": false}, "axis": {"format": "d"}});
    let (low, high) = (format!("{field}_low"), format!("{field}_high"));
    vec![
        json!({"mark": {"type": "line", "color": colour}, "encoding": {"x": x, "y": quantity(field, title)}}),
        json!({"mark": {"type": "rule", "color": colour}, "encoding": {"x": x, "y": quantity(&low, title), "y2": {"field": high}}}),
        json!({"mark": {"type": "point", "color": colour, "shape": shape, "filled": true, "size": 60}, "encoding": {"x": x, "y": quantity(field, title)}}),
    ]
}

/// Diversity over the years: heterozygosity above richness.
pub fn diversity(table: &Table) -> Value {
    let heterozygosity = "Heterozygosity, 0 to 1";
    let mut upper = over_years("expected", heterozygosity, LIGHT.deep, "circle");
    upper.extend(over_years(
        "observed",
        heterozygosity,
        LIGHT.plum,
        "diamond",
    ));
    let x = upper[0]["encoding"]["x"].clone();
    upper.push(json!({
        "mark": {"type": "area", "color": LIGHT.deep, "opacity": 0.22},
        "encoding": {"x": x, "y": quantity("drift_low", heterozygosity), "y2": {"field": "drift_high"}}
    }));
    upper.push(json!({
        "mark": {"type": "line", "color": LIGHT.deep, "strokeDash": [4, 3]},
        "encoding": {"x": x, "y": quantity("drift_expectation", heterozygosity)}
    }));
    let lower = over_years(
        "richness",
        "Allelic richness, alleles",
        LIGHT.ochre,
        "triangle-up",
    );
    let mut whole = by_population(table, json!([]));
    whole["spec"] = json!({"vconcat": [
        {"width": 260, "height": 140, "layer": upper},
        {"width": 260, "height": 100, "layer": lower}
    ]});
    whole
}

/// Effective sizes with intervals on a logarithmic axis, and the published limits.
pub fn effective_size(table: &Table, limits: &[(f64, &str)]) -> Value {
    let size = json!({"field": "size", "type": "quantitative", "title": "Effective size, individuals", "scale": {"type": "log"}});
    let y = json!({"field": "label", "type": "nominal", "title": null, "sort": null, "axis": {"labelLimit": 320}});
    let low = json!({"field": "low", "type": "quantitative", "title": "Effective size, individuals", "scale": {"type": "log"}});
    let rules = limits.iter().map(|(n, source)| {
        json!({
            "mark": {"type": "rule", "color": LIGHT.ink, "tooltip": format!("{n}: {source}")},
            "encoding": {"x": {"datum": n, "type": "quantitative", "scale": {"type": "log"}}}
        })
    });
    let mut layers: Vec<Value> = rules.collect();
    layers.push(json!({
        "transform": [
            {"filter": "isValid(datum.low)"},
            {"calculate": "isValid(datum.high) ? datum.high : 100000", "as": "high_drawn"}
        ],
        "mark": {"type": "rule", "color": LIGHT.deep},
        "encoding": {"x": low, "x2": {"field": "high_drawn"}, "y": y}
    }));
    layers.push(json!({
        "transform": [{"filter": "isValid(datum.size)"}],
        "mark": {"type": "point", "color": LIGHT.deep, "filled": true, "size": 60},
        "encoding": {"x": size, "y": y, "shape": {"field": "method", "type": "nominal", "title": "Method"}}
    }));
    let mut whole = by_population(table, Value::Array(layers));
    whole["resolve"] = json!({"scale": {"y": "independent"}});
    whole
}

/// Fates of baseline alleles as bars.
pub fn fates(table: &Table) -> Value {
    by_population(
        table,
        json!([{
            "mark": {"type": "bar", "stroke": LIGHT.ink},
            "encoding": {
                "x": {"field": "alleles", "type": "quantitative", "title": "Alleles"},
                "y": {"field": "fate", "type": "nominal", "title": null, "sort": null},
                "color": {
                    "field": "fate", "type": "nominal", "legend": null,
                    "scale": {
                        "domain": ["kept", "missed", "uncertain", "missed or uncertain", "probably lost", "not seen again, fate unknown"],
                        "range": [LIGHT.deep, LIGHT.steps[3], LIGHT.ochre, LIGHT.ochre, LIGHT.plum, LIGHT.page]
                    }
                }
            }
        }]),
    )
}

/// FST between populations as a matrix a visit.
pub fn matrix(table: &Table) -> Value {
    json!({
        "$schema": SCHEMA,
        "description": table.caption,
        "data": {"values": table.records()},
        "layer": [
            {"mark": "rect", "encoding": {"color": {"field": "fst", "type": "quantitative", "title": "FST", "scale": {"range": LIGHT.steps}}}},
            {"mark": {"type": "text", "color": LIGHT.ink}, "encoding": {"text": {"field": "fst", "type": "quantitative", "format": ".3f"}}}
        ],
        "encoding": {
            "x": {"field": "from", "type": "nominal", "title": null, "sort": null},
            "y": {"field": "to", "type": "nominal", "title": null, "sort": null},
            "tooltip": [{"field": "from"}, {"field": "to"}, {"field": "fst"}, {"field": "fst_low"}, {"field": "fst_high"}]
        },
        "config": {"background": LIGHT.page}
    })
}

/// FST between visits as points with intervals.
pub fn in_time(table: &Table) -> Value {
    json!({
        "$schema": SCHEMA,
        "description": table.caption,
        "data": {"values": table.records()},
        "transform": [{"calculate": "datum.from + ' to ' + datum.to", "as": "pair"}],
        "encoding": {"y": {"field": "pair", "type": "nominal", "title": null, "sort": null, "axis": {"labelLimit": 320}}},
        "layer": [
            {"mark": {"type": "rule", "color": LIGHT.deep}, "encoding": {
                "x": {"field": "fst_low", "type": "quantitative", "title": "FST, no unit"}, "x2": {"field": "fst_high"}}},
            {"mark": {"type": "point", "color": LIGHT.deep, "filled": true, "size": 60}, "encoding": {
                "x": {"field": "fst", "type": "quantitative", "title": "FST, no unit"},
                "shape": {"field": "kind", "type": "nominal", "title": null}}}
        ],
        "config": {"background": LIGHT.page}
    })
}

/// Scarce alleles by carrier: bars, and points for what is expected to vanish.
pub fn carriers(table: &Table) -> Value {
    let y = json!({"field": "individual", "type": "nominal", "title": null, "sort": null});
    let x = |field: &str| json!({"field": field, "type": "quantitative", "title": "Alleles"});
    let mut whole = by_population(
        table,
        json!([
            {"mark": {"type": "bar", "color": LIGHT.plum}, "encoding": {"x": x("only_carrier"), "y": y}},
            {"mark": {"type": "point", "shape": "diamond", "color": LIGHT.ink}, "encoding": {"x": x("would_vanish"), "y": y}}
        ]),
    );
    whole["resolve"] = json!({"scale": {"y": "independent"}});
    whole
}

/// Outlying loci along their contigs.
pub fn outliers(table: &Table) -> Value {
    let mut whole = facet(
        table,
        json!({"field": "to", "type": "nominal", "title": null}),
        json!([{
            "transform": [{"calculate": "datum.frequency_to >= datum.frequency_from ? 'rose' : 'fell'", "as": "direction"}],
            "mark": {"type": "point", "filled": true, "size": 70},
            "encoding": {
                "x": {"field": "position", "type": "quantitative", "title": "Position"},
                "y": {"field": "contig", "type": "nominal", "title": null},
                "shape": {"field": "direction", "type": "nominal", "title": "First alternate allele",
                    "scale": {"domain": ["rose", "fell"], "range": ["triangle-up", "triangle-down"]}},
                "color": {"field": "direction", "type": "nominal", "title": "First alternate allele",
                    "scale": {"domain": ["rose", "fell"], "range": [LIGHT.plum, LIGHT.deep]}}
            }
        }]),
    );
    whole["resolve"] = json!({"scale": {"y": "independent"}});
    whole
}

/// Fans over the years by population and scenario: two bands, a median.
pub fn fans(table: &Table, field: &str, title: &str) -> Value {
    let x = json!({"field": "when", "type": "quantitative", "title": "Year, or generations ahead", "scale": {"zero": false}, "axis": {"format": "d"}});
    let band = |share: u8| {
        let (low, high) = (
            format!("{field}_low_{share}"),
            format!("{field}_high_{share}"),
        );
        json!({
            "mark": {"type": "area", "color": LIGHT.deep, "opacity": 0.22},
            "encoding": {"x": x, "y": quantity(&low, title), "y2": {"field": high}}
        })
    };
    let mut whole = facet(
        table,
        json!({"field": "panel", "type": "nominal", "title": null}),
        json!([
            band(95),
            band(50),
            {"mark": {"type": "line", "color": LIGHT.deep}, "encoding": {"x": x, "y": quantity(field, title)}}
        ]),
    );
    whole["transform"] = json!([
        {"calculate": "datum.population + ', ' + datum.scenario", "as": "panel"},
        {"calculate": "isValid(datum.year) ? datum.year : datum.generation", "as": "when"},
        {"filter": format!("isValid(datum.{field})")}
    ]);
    whole
}

/// Call rate beside the share of loci that depart from Hardy-Weinberg proportions.
pub fn genotyping(table: &Table) -> Value {
    let y = json!({"field": "stratum", "type": "nominal", "title": null, "sort": null, "axis": {"labelLimit": 320}});
    json!({
        "$schema": SCHEMA,
        "description": table.caption,
        "data": {"values": table.records()},
        "transform": [{"calculate": "datum.population + '@' + datum.visit", "as": "stratum"}],
        "hconcat": [
            {"mark": {"type": "point", "color": LIGHT.deep, "filled": true, "size": 60},
             "encoding": {"y": y, "x": {"field": "call_rate", "type": "quantitative", "title": "Call rate", "scale": {"domain": [0, 1]}}}},
            {"transform": [{"fold": ["deficit", "excess"], "as": ["heterozygotes", "loci"]}],
             "mark": {"type": "bar"},
             "encoding": {"y": y, "x": {"field": "loci", "type": "quantitative", "title": "Loci that depart"},
                "color": {"field": "heterozygotes", "type": "nominal", "title": "Heterozygotes",
                    "scale": {"domain": ["deficit", "excess"], "range": [LIGHT.plum, LIGHT.ochre]}}}}
        ],
        "config": {"background": LIGHT.page}
    })
}
