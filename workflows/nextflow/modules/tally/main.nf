// Counts one shard: the contigs named, out of calls that may hold more. With an index beside the calls their other
// blocks are not read.
process TALLY {
    tag "${name} ${contigs}"
    cpus 1
    memory { 1.GB * task.attempt }
    time { 4.h * task.attempt }

    input:
    tuple val(name), val(shard), val(contigs), path(calls), path(index), path(sheet)
    path programme
    val options

    output:
    tuple val(name), path("${shard}.parquet"), emit: tally
    path "versions.yml", emit: versions

    script:
    // No programme file is an empty list.
    def settings = programme ? "--programme ${programme}" : ''
    """
    genewane tally ${calls} --samples ${sheet} ${settings} ${options} --region '${contigs}' \\
        --threads ${task.cpus} -o ${shard}.parquet
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    printf 'PAR1' > ${shard}.parquet
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
