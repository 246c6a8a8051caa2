"""Holds what the programs of examples/reading printed against the reports, read by the json module alone.

    python3 check.py FOLDER     the folder that tests/examples/run has filled
"""

import csv
import json
import math
import sys
from pathlib import Path

FOLDER = Path(sys.argv[1])
NUMBERS = ("estimate", "low", "high")


def read_report(name):
    return json.loads((FOLDER / f"{name}.json").read_text(encoding="utf-8"))


def read_rows(name):
    with open(FOLDER / name, encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def close(printed, wanted):
    """The report's sums are rounded to steps of 2^-40, so a mean made here differs in the last digits."""
    return math.isclose(float(printed), wanted, rel_tol=1e-9, abs_tol=1e-12)


def wanted_sizes(report):
    """Estimate, limits and whether a reason is due, by population, what, and strata."""
    wanted = {}
    for stratum in report["strata"]:
        for what in ("observed_heterozygosity", "expected_heterozygosity"):
            found = stratum[what]
            key = (stratum["population"], what, "", stratum["stratum"])
            wanted[key] = (found["estimate"], *found["interval"], False)
    for size in report["effective_size"]:
        if size["headline"]:
            key = (size["population"], size["method"], size["from"] or "", size["to"])
            assert key not in wanted, f"two headlines: {key}"
            low, high = size["interval"] or (None, None)
            wanted[key] = (size["estimate"], low, high, size["estimate"] is None)
    return wanted


def check_table(report, printed):
    wanted = wanted_sizes(read_report(report))
    rows = read_rows(printed)
    keys = [(row["population"], row["what"], row["from"], row["to"]) for row in rows]
    assert sorted(keys) == sorted(wanted), f"{printed}: the rows differ from the report"
    populations = [row["population"] for row in rows]
    assert populations == sorted(populations), f"{printed}: a population is torn apart"
    for key, row in zip(keys, rows):
        *numbers, reason_due = wanted[key]
        for name, number in zip(NUMBERS, numbers):
            # A double has one shortest text; whatever text was printed must read back as the same double.
            told = float(row[name]) if row[name] else None
            assert told == number, f"{printed}: {key}: {name} is {told}, the report has {number}"
        assert bool(row["reason"]) == reason_due, f"{printed}: {key}: {row['reason']!r}"
    return rows


def tables(name):
    """The tables of a text, each known by its header line, in order."""
    found = []
    headers = ("stratum,", "population,", "strata,", "from,")
    for line in (FOLDER / name).read_text(encoding="utf-8").splitlines():
        if line.startswith(headers):
            found.append([])
        if line:
            found[-1].append(line)
    return [list(csv.DictReader(lines)) for lines in found]


def check_diversity(table, name):
    strata = {s["stratum"]: s["per_site"] for s in read_report("whole")["strata"]}
    assert [row["stratum"] for row in table] == sorted(strata), name
    for row in table:
        wanted = strata[row["stratum"]]
        assert int(row["loci"]) == wanted["sites"], f"{name}: {row}"
        for what in ("observed_heterozygosity", "expected_heterozygosity"):
            assert close(row[what], wanted[what]["estimate"]), f"{name}: {row}: {what}"


def in_time():
    return [c for c in read_report("whole")["comparisons"] if c["kind"] != "between_populations"]


def check_lost(table, name):
    wanted = {(c["from"], c["to"]): c["alleles"]["not_seen_again"] for c in in_time()}
    assert {(r["from"], r["to"]): int(r["not_seen_again"]) for r in table} == wanted, name
    assert sum(wanted.values()) > 0


def check_first_and_last(table, name):
    wanted = {(c["from"], c["to"]): c["alleles"] for c in in_time()}
    assert [row["population"] for row in table] == ["Quillmere", "Tarn Osk"], name
    for row in table:
        pair = tuple(f"{row['population']}@{row[visit]}" for visit in ("first_visit", "last_visit"))
        assert pair[0].endswith("@2004") and pair[1].endswith("@2020"), f"{name}: {row}"
        for what in ("baseline", "not_seen_again"):
            assert int(row[what]) == wanted[pair][what], f"{name}: {row}: {what}"


def check_top_loci(table, name):
    """Against the table of loci as text, sorted here."""
    with open(FOLDER / "loci.tsv", encoding="utf-8", newline="") as file:
        loci = list(csv.DictReader(file, delimiter="\t"))
    pairs = sorted(c.removeprefix("fst_hudson:") for c in loci[0] if c.startswith("fst_hudson:"))
    wanted = []
    for pair in pairs:
        values = [
            (-float(l[f"fst_hudson:{pair}"]), l["contig"], int(l["position"]))
            for l in loci
            if l[f"fst_hudson:{pair}"] != "NA"
        ]
        wanted += [(pair, contig, place, -fst) for fst, contig, place in sorted(values)[:5]]
    printed = [(r["strata"], r["contig"], int(r["position"]), float(r["fst"])) for r in table]
    assert printed == wanted, f"{name}: other loci"


def main():
    checked = 0
    for report in ("whole", "few", "absent"):
        by_pandas, by_polars, by_jq = (
            check_table(report, f"{report}.{by}.csv") for by in ("pandas", "polars", "jq")
        )
        for rows in (by_polars, by_jq):
            kept = [[row[c] for c in ("population", "what", "from", "to", "reason")] for row in rows]
            same = [[row[c] for c in ("population", "what", "from", "to", "reason")] for row in by_pandas]
            assert kept == same, f"{report}: the three tables differ"
        checked += 3 * len(by_pandas)
        reasons = {row["reason"] for row in by_pandas}
        due = {"whole": 0, "few": 1, "absent": 1}[report]
        assert len(reasons - {""}) == due, f"{report}: the case it stands for is not in it: {reasons}"

    diversity, lost = tables("tally.pandas.txt")
    check_diversity(diversity, "tally.py")
    check_lost(lost, "tally.py")
    checked += len(diversity) + len(lost)
    for by in ("duckdb", "library"):
        diversity, ends, top = tables(f"tally.{by}.txt")
        check_diversity(diversity, by)
        check_first_and_last(ends, by)
        check_top_loci(top, by)
        checked += len(diversity) + len(ends) + len(top)
    print(f"examples/reading: {checked} rows hold the numbers of the report")


main()
