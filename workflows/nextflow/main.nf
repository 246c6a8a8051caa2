// One monitoring programme: screen the samples, count each shard, add up, project, judge, set the page.
//
//     nextflow run workflows/nextflow -profile local --calls calls.vcf.gz --samples samples.tsv --contigs 'reed_1 reed_2,reed_3'

include { SCREEN   } from './modules/screen'
include { TALLY    } from './modules/tally'
include { MEASURE  } from './modules/measure'
include { FORECAST } from './modules/forecast'
include { VERDICT  } from './modules/verdict'
include { PAGE     } from './modules/page'

// The contigs of each shard. In a file of parameters a list, a shard each; on a command line shards are parted by
// blanks. Contigs of one shard are parted by commas.
def shards(contigs) {
    return contigs instanceof List ? contigs : contigs.toString().tokenize(' ')
}

// Shards are numbered, for names of contigs may hold what a file name must not.
def numbered(contigs) {
    return shards(contigs).withIndex().collect { named, i -> ["shard-" + "${i + 1}".padLeft(4, '0'), named.toString()] }
}

// A file that may be absent is an empty list to a step.
def optional(path) {
    return path ? file(path, checkIfExists: true) : []
}

// The indexes that stand beside calls, if any.
def indexes(calls) {
    return ['csi', 'tbi'].collect { ending -> file("${calls.toUriString()}.${ending}") }.findAll { index -> index.exists() }
}

// For other workflows: `programmes` carries (name, calls, sheet), and `counted` holds the contigs as above.
workflow MONITOR {
    take:
    programmes
    counted
    settings
    options

    main:
    SCREEN(programmes, options.screen)

    pieces = numbered(counted)
    scattered = programmes
        .combine(channel.fromList(pieces))
        .map { name, calls, sheet, shard, contigs -> tuple(name, shard, contigs, calls, indexes(calls), sheet) }
    TALLY(scattered, settings.programme, options.measure)

    // As soon as a programme has all its tallies; in the order of the shards, so that a rerun finds its cache.
    gathered = TALLY.out.tally
        .groupTuple(size: pieces.size())
        .map { name, tallies -> tuple(name, tallies.toSorted { tally -> tally.name }) }
        .join(programmes.map { name, _calls, sheet -> tuple(name, sheet) })
    MEASURE(gathered, settings.programme, options.measure)

    FORECAST(MEASURE.out.report, settings.scenarios, settings.watched, options.forecast)
    VERDICT(MEASURE.out.report, settings.policy, options.verdict)
    documents = MEASURE.out.report.join(FORECAST.out.forecast).join(VERDICT.out.verdict)
    PAGE(documents, options.page)

    versions = SCREEN.out.versions
        .mix(TALLY.out.versions, MEASURE.out.versions, FORECAST.out.versions, VERDICT.out.versions, PAGE.out.versions)

    emit:
    report = MEASURE.out.report
    forecast = FORECAST.out.forecast
    verdict = VERDICT.out.verdict
    page = PAGE.out.page
    versions = versions
}

workflow {
    if (!params.calls || !params.samples || !params.contigs) {
        error("Give --calls, --samples and --contigs; nextflow.config beside main.nf explains each.")
    }
    programmes = channel.of(
        tuple(params.name, file(params.calls, checkIfExists: true), file(params.samples, checkIfExists: true))
    )
    settings = [
        programme: optional(params.programme),
        scenarios: optional(params.scenarios),
        watched: optional(params.watch),
        policy: optional(params.policy),
    ]
    options = [
        screen: params.screen_options,
        measure: params.measure_options,
        forecast: params.forecast_options,
        verdict: params.verdict_options,
        page: params.page_options,
    ]
    MONITOR(programmes, params.contigs, settings, options)

    // Every step of a kind says the same.
    MONITOR.out.versions
        .map { said -> said.text }
        .unique()
        .collectFile(name: 'versions.yml', storeDir: params.out, sort: true)
}
