//! The reference page of scenario keys, made from their doc comments.

use serde_json::Value;

use super::scenario::Scenario;

/// The page as Markdown: a table of keys, by name, for every table of a scenario file, and the
/// words and forms that some keys take.
pub fn scenario_reference() -> String {
    let schema = schemars::schema_for!(Scenario).to_value();
    let mut page = String::from("# Scenario keys\n\n");
    page.push_str("A scenario is a TOML file for `genewane rehearse`.\n\n");
    let mut waiting = vec![("Top level".to_string(), schema.clone())];
    let mut told: Vec<String> = Vec::new();
    while !waiting.is_empty() {
        let (title, table) = waiting.remove(0);
        page.push_str(&format!("## {title}\n\n{}\n\n", text(&table)));
        page.push_str("| key | value | default | meaning |\n| --- | --- | --- | --- |\n");
        let mut inner = Vec::new();
        for (key, property) in entries(&table["properties"]) {
            let default = default(&table, key, property);
            let kind = kind(property);
            let meaning = text(property);
            page.push_str(&format!("| `{key}` | {kind} | {default} | {meaning} |\n"));
            let Some(name) = reference(property) else {
                continue;
            };
            let definition = &schema["$defs"][name];
            if told.iter().any(|t| t == name) {
                continue;
            }
            told.push(name.to_string());
            match definition.get("properties") {
                Some(_) => inner.push((heading(&title, key, property), definition.clone())),
                None => page.push_str(&forms(definition)),
            }
        }
        page.push('\n');
        waiting.splice(0..0, inner);
    }
    page
}

fn entries(object: &Value) -> impl Iterator<Item = (&String, &Value)> {
    object.as_object().into_iter().flatten()
}

/// A description on one line, with the bars of a table kept out.
fn text(value: &Value) -> String {
    let description = value["description"].as_str().unwrap_or_default();
    let words: Vec<&str> = description.split_whitespace().collect();
    words.join(" ").replace('|', "\\|")
}

/// Name of the definition that a key's value, or each of its values, follows.
fn reference(property: &Value) -> Option<&str> {
    let options = property["anyOf"].as_array().into_iter().flatten();
    let mut places = vec![property, &property["items"]];
    places.extend(options);
    let path = places.into_iter().find_map(|p| p["$ref"].as_str())?;
    path.rsplit('/').next()
}

fn heading(parent: &str, key: &str, property: &Value) -> String {
    let path = match parent.trim_matches(['[', ']', '`']) {
        "Top level" => key.to_string(),
        table => format!("{table}.{key}"),
    };
    if property["type"] == "array" {
        format!("`[[{path}]]`")
    } else {
        format!("`[{path}]`")
    }
}

fn kind(property: &Value) -> String {
    let word = |name: &str| match name {
        "integer" => "whole number".to_string(),
        "string" => "text".to_string(),
        "boolean" => "`true` or `false`".to_string(),
        other => other.to_string(),
    };
    match &property["type"] {
        Value::String(name) if name == "array" => {
            let items = &property["items"];
            match reference(property) {
                Some(_) if items["$ref"].is_string() => "list".to_string(),
                _ => format!(
                    "list of {}",
                    word(items["type"].as_str().unwrap_or("values"))
                ),
            }
        }
        Value::String(name) => word(name),
        Value::Array(names) => {
            let names = names.iter().filter_map(Value::as_str);
            names
                .filter(|n| *n != "null")
                .map(word)
                .collect::<Vec<_>>()
                .join(" or ")
        }
        _ => "see below".to_string(),
    }
}

fn default(table: &Value, key: &str, property: &Value) -> String {
    let required = table["required"]
        .as_array()
        .is_some_and(|r| r.iter().any(|k| k == key));
    match property.get("default") {
        _ if required => "required".to_string(),
        Some(Value::Null) | None => "absent".to_string(),
        Some(Value::Array(list)) if list.is_empty() => "none".to_string(),
        Some(Value::String(word)) if word.is_empty() => "empty".to_string(),
        Some(Value::Object(fields)) if fields.len() > 1 => "as below".to_string(),
        Some(value) => format!(
            "`{}`",
            value.to_string().replace(':', " = ").replace('"', "")
        ),
    }
}

/// The words of an enumeration, or the forms of a table with one key.
fn forms(definition: &Value) -> String {
    let mut lines = String::new();
    for form in definition["oneOf"].as_array().into_iter().flatten() {
        let words = form["const"].as_str().into_iter();
        let listed = form["enum"]
            .as_array()
            .into_iter()
            .flatten()
            .filter_map(Value::as_str);
        let keys = entries(&form["properties"]).map(|(key, _)| key.as_str());
        for word in words.chain(listed).chain(keys) {
            lines.push_str(&format!("| &nbsp; `{word}` | | | {} |\n", text(form)));
        }
    }
    lines
}
