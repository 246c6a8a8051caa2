// Judges the report. A breach (exit code 3) is an answer and not a failure of the step: the code is the last line of
// verdict.txt, below the table. Any other code fails the step as it is, with the words of the program.
process VERDICT {
    tag "${name}"
    cpus 1
    memory { 1.GB * task.attempt }
    time { 1.h * task.attempt }

    input:
    tuple val(name), path(report)
    path policy
    val options

    output:
    tuple val(name), path("verdict.json"), emit: verdict
    tuple val(name), path("verdict.txt"), emit: words
    path "versions.yml", emit: versions

    script:
    // No policy file is an empty list: the built-in policy judges.
    def rules = policy ? "--policy ${policy}" : ''
    """
    code=0
    genewane verdict ${report} ${rules} ${options} -o verdict.json 2> verdict.txt || code=\$?
    case \$code in
        0 | 3) echo "exit code \$code" >> verdict.txt ;;
        *) cat verdict.txt >&2; rm verdict.txt; exit \$code ;;
    esac
    version=\$(genewane --version)
    printf '"%s":\\n  genewane: "%s"\\n' '${task.process}' "\${version#* }" > versions.yml
    """

    stub:
    """
    echo '{}' > verdict.json
    echo 'exit code 0' > verdict.txt
    printf '"%s":\\n  genewane: "stub"\\n' '${task.process}' > versions.yml
    """
}
