// Adds the tallies of all shards up to the report. Programme and options are those of the tallies.
process MEASURE {
    tag "${name}"
    cpus 2
    memory { 2.GB * task.attempt }
    time { 2.h * task.attempt }

    input:
    tuple val(name), path(tallies), path(sheet)
    path programme
    val options

    output:
    tuple val(name), path("report.json"), emit: report
    path "versions.yml", emit: versions

    script:
    def settings = programme ? "--programme ${programme}" : ''
    """
    genewane measure ${tallies} --samples ${sheet} ${settings} ${options} --threads ${task.cpus} -o report.json
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    echo '{}' > report.json
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
