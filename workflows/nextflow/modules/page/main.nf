// Sets the report, what lies ahead and the verdict as one page.
process PAGE {
    tag "${name}"
    cpus 1
    memory { 1.GB * task.attempt }
    time { 1.h * task.attempt }

    input:
    tuple val(name), path(report), path(forecast), path(verdict)
    val options

    output:
    tuple val(name), path("page.html"), emit: page
    path "versions.yml", emit: versions

    script:
    """
    genewane page ${report} ${forecast} ${verdict} ${options} -o page.html
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    echo '<!doctype html><title>stub</title>' > page.html
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
