# Rules of one monitoring programme: screen the samples, count by contig, add up, forecast, judge, set the page.
# A module for other workflows: they give `config` with the keys of config/config.yaml.

OUT = config["out"]
CONTIGS = config["contigs"]
CALLS = config["calls"]
SHEET = config["samples"]
MEASURE = config.get("measure_options", "")


# What a whole run makes.
RESULTS = expand(
    "{out}/{file}",
    out=OUT,
    file=["page.html", "forecast.json", "verdict.txt", "screen.json"],
)


rule screen:
    input:
        calls=CALLS,
        samples=SHEET,
    output:
        report=expand("{out}/screen.json", out=OUT),
        sheet=expand("{out}/samples.clean.tsv", out=OUT),
    log:
        expand("{out}/logs/screen.log", out=OUT),
    conda:
        "../envs/genewane.yaml"
    threads: 2
    resources:
        mem_mb=lambda wildcards, attempt: 2000 * attempt,
        runtime=lambda wildcards, attempt: 120 * attempt,
    shell:
        "genewane screen {input.calls} --samples {input.samples} --threads {threads}"
        " --write-sheet {output.sheet} -o {output.report} 2> {log}"


rule tally:
    input:
        calls=CALLS,
        samples=SHEET,
    output:
        expand("{out}/tallies/{{contig}}.parquet", out=OUT),
    log:
        expand("{out}/logs/tally.{{contig}}.log", out=OUT),
    benchmark:
        expand("{out}/benchmarks/tally.{{contig}}.tsv", out=OUT)[0]
    conda:
        "../envs/genewane.yaml"
    threads: 1
    resources:
        mem_mb=lambda wildcards, attempt: 1000 * attempt,
        runtime=lambda wildcards, attempt: 240 * attempt,
    params:
        options=MEASURE,
    shell:
        "genewane tally {input.calls} --samples {input.samples} {params.options}"
        " --region {wildcards.contig} --threads {threads} -o {output} 2> {log}"


rule measure:
    input:
        tallies=expand("{out}/tallies/{contig}.parquet", out=OUT, contig=CONTIGS),
        samples=SHEET,
    output:
        expand("{out}/report.json", out=OUT),
    log:
        expand("{out}/logs/measure.log", out=OUT),
    conda:
        "../envs/genewane.yaml"
    threads: 2
    resources:
        mem_mb=lambda wildcards, attempt: 2000 * attempt,
        runtime=lambda wildcards, attempt: 120 * attempt,
    params:
        options=MEASURE,
    shell:
        "genewane measure {input.tallies} --samples {input.samples} {params.options}"
        " --threads {threads} -o {output} 2> {log}"


rule forecast:
    input:
        expand("{out}/report.json", out=OUT),
    output:
        expand("{out}/forecast.json", out=OUT),
    log:
        expand("{out}/logs/forecast.log", out=OUT),
    conda:
        "../envs/genewane.yaml"
    threads: 2
    resources:
        mem_mb=lambda wildcards, attempt: 2000 * attempt,
        runtime=lambda wildcards, attempt: 60 * attempt,
    params:
        options=config.get("forecast_options", ""),
    shell:
        "genewane forecast {input} {params.options} --threads {threads} -o {output} 2> {log}"


# A breach is an answer, not a failure of the step: exit code 3 is kept in the text.
rule verdict:
    input:
        expand("{out}/report.json", out=OUT),
    output:
        json=expand("{out}/verdict.json", out=OUT),
        text=expand("{out}/verdict.txt", out=OUT),
    log:
        expand("{out}/logs/verdict.log", out=OUT),
    conda:
        "../envs/genewane.yaml"
    resources:
        mem_mb=lambda wildcards, attempt: 1000 * attempt,
        runtime=lambda wildcards, attempt: 60 * attempt,
    params:
        options=config.get("verdict_options", ""),
    shell:
        "code=0; genewane verdict {input} {params.options} -o {output.json} 2> {output.text} || code=$?;"
        " cp {output.text} {log}; echo exit code $code >> {output.text};"
        " test $code -eq 0 -o $code -eq 3"


rule page:
    input:
        report=expand("{out}/report.json", out=OUT),
        forecast=expand("{out}/forecast.json", out=OUT),
        verdict=expand("{out}/verdict.json", out=OUT),
    output:
        expand("{out}/page.html", out=OUT),
    log:
        expand("{out}/logs/page.log", out=OUT),
    conda:
        "../envs/genewane.yaml"
    resources:
        mem_mb=lambda wildcards, attempt: 1000 * attempt,
        runtime=lambda wildcards, attempt: 60 * attempt,
    shell:
        "genewane page {input.report} {input.forecast} {input.verdict} -o {output} 2> {log}"
