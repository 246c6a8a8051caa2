"""Counts and diversity from the Parquet files that genewane writes, in pandas.

    genewane tally calls.vcf.gz --samples samples.tsv -o tally.parquet     # or one a contig: tally_1.parquet, ...
    genewane measure calls.vcf.gz --samples samples.tsv --loci loci.parquet -o report.json
    python tally.py loci.parquet tally*.parquet

Prints two tables (CSV):
  1. from tallies: loci, and observed and expected heterozygosity of each stratum, mean over all its loci
     (in the report: strata, per_site);
  2. from the table of loci: alleles that each later visit no longer showed
     (in the report: comparisons, alleles, not_seen_again).

A column is named `what:stratum` or `what:from>to`, a stratum `population@visit`.
"""

import sys

import pandas


def columns(table, what):
    """The columns `what:...`, named by what stands behind the colon."""
    prefix = what + ":"
    chosen = table[[name for name in table.columns if name.startswith(prefix)]]
    return chosen.rename(columns=lambda name: name.removeprefix(prefix))


def expected(copies):
    """The chance that two gene copies differ, unbiased (Nei 1978), from the copies of each allele."""
    n = sum(copies)
    if n < 2:
        return None
    return n / (n - 1) * (1 - sum((c / n) ** 2 for c in copies))


def diversity(tally):
    typed = columns(tally, "typed")
    observed = columns(tally, "heterozygotes") / typed.where(typed > 0)
    chances = columns(tally, "copies").map(expected).astype(float)
    table = {
        "loci": chances.count(),
        "observed_heterozygosity": observed.mean(),
        "expected_heterozygosity": chances.mean(),
    }
    return pandas.DataFrame(table).rename_axis("stratum").sort_index()


def not_seen_again(loci):
    """Each cell lists alleles by their number ("1,3"), or is "-" for none."""
    lists = columns(loci, "alleles_not_seen_again")
    counts = lists.map(lambda cell: 0 if cell == "-" else len(cell.split(",")), na_action="ignore")
    counts = counts.sum().astype(int).rename("not_seen_again")
    pairs = counts.index.str.split(">", n=1, expand=True)
    return counts.set_axis(pairs.set_names(["from", "to"]))


if __name__ == "__main__":
    loci, *tallies = sys.argv[1:]
    tally = pandas.concat([pandas.read_parquet(shard) for shard in tallies], ignore_index=True)
    print(diversity(tally).to_csv(), end="")
    print()
    print(not_seen_again(pandas.read_parquet(loci)).to_csv(), end="")
