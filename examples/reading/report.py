"""Heterozygosity and effective size of each population, with intervals.

    genewane measure calls.vcf.gz --samples samples.tsv --generation-years 2 -o report.json
    python report.py report.json              # with pandas
    python report.py report.json polars       # with polars

Prints a table (CSV): each heterozygosity of each population at each visit, then each effective size that
the report puts forward. An empty `estimate` has its reason beside it; an empty `high` means that
the data set no upper limit.
"""

import json
import sys

HETEROZYGOSITY = ["observed_heterozygosity", "expected_heterozygosity"]
COLUMNS = ["population", "what", "from", "to", "estimate", "low", "high", "reason"]


def row(population, what, since, to, found):
    low, high = found.get("interval") or (None, None)
    reason = found.get("absent_because")
    if found.get("unbounded"):
        reason = "no more drift than sampling alone makes"
    return [population, what, since, to, found.get("estimate"), low, high, reason]


def rows(report):
    for stratum in report["strata"]:
        for what in HETEROZYGOSITY:
            yield row(stratum["population"], what, None, stratum["stratum"], stratum[what])
    for size in report["effective_size"]:
        if size["headline"]:  # the others are variants of the same methods, for comparison
            yield row(size["population"], size["method"], size.get("from"), size["to"], size)


def with_pandas(report):
    import pandas

    table = pandas.DataFrame(rows(report), columns=COLUMNS)
    table = table.sort_values("population", kind="stable")
    return table.to_csv(index=False)


def with_polars(report):
    import polars

    numbers = {"estimate", "low", "high"}
    schema = {name: polars.Float64 if name in numbers else polars.String for name in COLUMNS}
    table = polars.DataFrame(list(rows(report)), schema=schema, orient="row")
    return table.sort("population", maintain_order=True).write_csv()


if __name__ == "__main__":
    with open(sys.argv[1], encoding="utf-8") as file:
        read = json.load(file)
    make = with_polars if sys.argv[2:] == ["polars"] else with_pandas
    print(make(read), end="")
