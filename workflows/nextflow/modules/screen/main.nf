// Looks at the samples and loci themselves. The sheet that it writes says whom it would leave out and why: a
// person reads it before anybody is left out, so the steps after it take the sheet as given.
process SCREEN {
    tag "${name}"
    cpus 2
    memory { 2.GB * task.attempt }
    time { 2.h * task.attempt }

    input:
    tuple val(name), path(calls), path(sheet)
    val options

    output:
    tuple val(name), path("screen.json"), emit: report
    tuple val(name), path("samples.clean.tsv"), emit: sheet
    path "versions.yml", emit: versions

    script:
    """
    genewane screen ${calls} --samples ${sheet} ${options} --threads ${task.cpus} \\
        --write-sheet samples.clean.tsv -o screen.json
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    echo '{}' > screen.json
    printf 'sample\\tpopulation\\tyear\\tuse\\twhy\\n' > samples.clean.tsv
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
