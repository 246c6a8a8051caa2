#!/bin/sh
# Heterozygosity and effective size of each population, with intervals, by jq.
#
#   genewane measure calls.vcf.gz --samples samples.tsv --generation-years 2 -o report.json
#   sh report.sh report.json
#
# Prints a table (CSV): each heterozygosity of each population at each visit, then each effective size
# that the report puts forward. An empty estimate has its reason beside it; an empty `high` means
# that the data set no upper limit.
set -eu
jq -r '
  def row($population; $what; $from; $to):
    [$population, $what, $from, $to, .estimate, (.interval // [])[0], (.interval // [])[1],
     if .unbounded then "no more drift than sampling alone makes" else .absent_because end];

  ["population", "what", "from", "to", "estimate", "low", "high", "reason"],
  ([(.strata[] | . as $s
      | ("observed_heterozygosity", "expected_heterozygosity") as $what
      | $s[$what] | row($s.population; $what; null; $s.stratum)),
    # Those that are no headline are variants of the same methods, for comparison.
    (.effective_size[] | select(.headline)
      | row(.population; .method; .from; .to))]
    | sort_by(.[0])[])
  | @csv' "$1"
