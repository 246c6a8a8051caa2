// Projects the latest visit of each population. Scenarios and watched alleles may be absent: empty lists.
process FORECAST {
    tag "${name}"
    cpus 2
    memory { 2.GB * task.attempt }
    time { 1.h * task.attempt }

    input:
    tuple val(name), path(report)
    path scenarios
    path watched
    val options

    output:
    tuple val(name), path("forecast.json"), emit: forecast
    path "versions.yml", emit: versions

    script:
    def management = scenarios ? "--scenarios ${scenarios}" : ''
    def alleles = watched ? "--watch ${watched}" : ''
    """
    genewane forecast ${report} ${management} ${alleles} ${options} --threads ${task.cpus} -o forecast.json
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    echo '{}' > forecast.json
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
