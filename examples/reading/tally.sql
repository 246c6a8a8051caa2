-- Counts and diversity from the Parquet files that genewane writes, in DuckDB.
--
--   genewane tally calls.vcf.gz --samples samples.tsv -o tally.parquet        (or one a contig: tally_1.parquet, ...)
--   genewane measure calls.vcf.gz --samples samples.tsv --loci loci.parquet -o report.json
--   duckdb < tally.sql                                                        (in the folder of these files)
--
-- Prints three tables:
--   1. from tallies: loci, and observed and expected heterozygosity of each stratum, mean over all its loci
--      (in the report: strata, per_site);
--   2. from tallies: alleles of each population's first visit, at loci that vary, and how many of them its
--      last visit did not show (in the report: comparisons, alleles);
--   3. from the table of loci: the five loci whose alleles differ most between each two strata.
--
-- A column is named `what:stratum`, a stratum `population@visit`. UNPIVOT makes rows of such columns.

CREATE TEMP VIEW tally AS
  SELECT * FROM read_parquet('tally*.parquet', filename = true, file_row_number = true);

-- One row a locus and stratum: gene copies of each allele, the first that of the reference.
CREATE TEMP VIEW copies AS
  SELECT filename, file_row_number, substr(name, length('copies:') + 1) AS stratum, copies
  FROM (UNPIVOT tally ON COLUMNS('^copies:') INTO NAME name VALUE copies);

CREATE TEMP VIEW typed AS
  SELECT filename, file_row_number, substr(name, length('typed:') + 1) AS stratum, typed
  FROM (UNPIVOT tally ON COLUMNS('^typed:') INTO NAME name VALUE typed);

CREATE TEMP VIEW heterozygotes AS
  SELECT filename, file_row_number, substr(name, length('heterozygotes:') + 1) AS stratum, heterozygotes
  FROM (UNPIVOT tally ON COLUMNS('^heterozygotes:') INTO NAME name VALUE heterozygotes);

-- The chance that two gene copies differ, unbiased (Nei 1978): n/(n - 1) (1 - sum of squared frequencies).
CREATE TEMP VIEW diversity AS
  SELECT stratum, copies, heterozygotes / typed AS observed,
    n / (n - 1) * (1 - list_sum([(c / n) ** 2 FOR c IN copies])) AS expected
  FROM (SELECT *, list_sum(copies)::DOUBLE AS n FROM copies)
  JOIN typed USING (filename, file_row_number, stratum)
  JOIN heterozygotes USING (filename, file_row_number, stratum)
  WHERE typed > 0 AND n > 1;

SELECT stratum, count(*) AS loci, avg(observed) AS observed_heterozygosity,
  avg(expected) AS expected_heterozygosity
FROM diversity GROUP BY stratum ORDER BY stratum;

-- Loci where more than one allele was seen, in whatever stratum.
CREATE TEMP VIEW varying AS
  SELECT filename, file_row_number
  FROM (SELECT *, unnest(copies) AS seen, generate_subscripts(copies, 1) AS allele FROM copies)
  WHERE seen > 0
  GROUP BY ALL HAVING count(DISTINCT allele) > 1;

-- A visit is what stands behind the last @. Visits sort as text, as years do.
CREATE TEMP VIEW visits AS
  SELECT *, regexp_extract(stratum, '^(.*)@([^@]*)$', 1) AS population,
    regexp_extract(stratum, '^(.*)@([^@]*)$', 2) AS visit
  FROM copies;

WITH ends AS (
  SELECT population, min(visit) AS first_visit, max(visit) AS last_visit FROM visits GROUP BY population
)
SELECT population, first_visit, last_visit,
  sum(len([1 FOR c IN a.copies IF c > 0]))::BIGINT AS baseline,
  sum(len([1 FOR c, i IN a.copies IF c > 0 AND b.copies[i] = 0]))::BIGINT AS not_seen_again
FROM ends
JOIN visits a USING (population)
JOIN visits b USING (population, filename, file_row_number)
JOIN varying USING (filename, file_row_number)
WHERE a.visit = first_visit AND b.visit = last_visit
  -- A locus that nobody is typed at in one of them tells nothing.
  AND list_sum(a.copies) > 0 AND list_sum(b.copies) > 0
GROUP BY ALL ORDER BY population;

SELECT substr(name, length('fst_hudson:') + 1) AS strata, contig, "position", fst
FROM (UNPIVOT (SELECT contig, "position", COLUMNS('^fst_hudson:') FROM 'loci.parquet')
      ON COLUMNS('^fst_hudson:') INTO NAME name VALUE fst)
QUALIFY row_number() OVER (PARTITION BY name ORDER BY fst DESC, contig, "position") <= 5
ORDER BY strata, fst DESC, contig, "position";
