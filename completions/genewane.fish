# Print an optspec for argparse to handle cmd's options that are independent of any subcommand.
function __fish_genewane_global_optspecs
    string join \n h/help V/version
end

function __fish_genewane_needs_command
    # Figure out if the current invocation already has a command.
    set -l cmd (commandline -opc)
    set -e cmd[1]
    argparse -s (__fish_genewane_global_optspecs) -- $cmd 2>/dev/null
    or return
    if set -q argv[1]
        # Also print the command, so this can be used to figure out what it is.
        echo $argv[1]
        return 1
    end
    return 0
end

function __fish_genewane_using_subcommand
    set -l cmd (__fish_genewane_needs_command)
    test -z "$cmd"
    and return 1
    contains -- $cmd[1] $argv
end

complete -c genewane -n "__fish_genewane_needs_command" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_needs_command" -s V -l version -d 'Print version'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "measure" -d 'Measures diversity, its change and effective size from genotype calls'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "tally" -d 'Counts one shard of the calls into a file that \'measure\' adds up with others'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "page" -d 'Sets a report as one page to read, print or send'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "rehearse" -d 'Simulates a monitored population with known truth'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "verdict" -d 'Judges a report against the limits of a policy; exit code 3 says breach'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "forecast" -d 'Projects diversity and watched alleles under management scenarios'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "design" -d 'Tells what a sampling design can see, before the field season'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "screen" -d 'Looks at the samples and loci themselves, before anything is measured'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "schema" -d 'Prints the JSON Schema of a document that the program writes'
complete -c genewane -n "__fish_genewane_needs_command" -f -a "help" -d 'Explains a command or a topic'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l samples -d 'Sample sheet: who was sampled where and when' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l locus-map -d 'Where the loci of a tidy genotype table are: columns locus, contig, position' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l programme -d 'Programme file: the settings below by population; flags hold for all and win over it' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l baseline -d 'Visit that later ones are held against: a label or a year [default: the earliest]' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l generation-years -d 'Generation length in years: the mean age of parents' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l census -d 'Census size at the baseline, in individuals; needed by sampling plan 1' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l sampling-plan -d 'How individuals were taken [default: 2]' -r -f -a "1\t'Plan I: sampled individuals may be parents of later ones (sampled after breeding, or put back)'
2\t'Plan II: they cannot (removed before breeding, or young that were never put back)'"
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l chromosomes -d 'Haploid number of chromosomes, to correct linkage estimates for linked loci' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l map-length-cm -d 'Length of the genetic map in centimorgans, for the same where chromosomes are not counted' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l min-call-rate -d 'Least share of individuals typed for a locus to count [default: 0, every typed locus]' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l gene-copies -d 'Gene copies to which allelic richness is rarefied [default: by the smallest stratum]' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l list-losses -d 'Most lost alleles listed by name in the report [default: 1000]' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l mask-below-gq -d 'Take genotypes of lower quality (GQ) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l mask-below-dp -d 'Take genotypes of lower depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l mask-above-dp -d 'Take genotypes of higher depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l mask-below-balance -d 'Take heterozygotes as missing whose rarer allele has a smaller share of the reads (AD)' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l filters -d 'Keep records of which every filter is listed, as in PASS,. (a dot is "not filtered")' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l contigs -d 'Keep these contigs alone' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l without-contigs -d 'Leave out these contigs, such as sex chromosomes' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l region -d 'Read the records at these places alone: CONTIG, CONTIG:FROM-TO, CONTIG:FROM-; several with commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l regions-bed -d 'The same, from a BED file (positions from 0, ends not included)' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand measure" -s o -l output -d 'Write the report here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l loci -d 'Write a table with one row a locus here; the name ends in .tsv, .tsv.gz or .parquet' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l allow-absent -d 'Let samples of the sheet lack calls: they are left out with a note'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l snv-only -d 'Leave out records with an allele other than a single base'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l biallelic-only -d 'Leave out records of more than two alleles'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -l stamp -d 'Put the time of the run into the report, which then differs from run to run'
complete -c genewane -n "__fish_genewane_using_subcommand measure" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l samples -d 'Sample sheet: who was sampled where and when' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l locus-map -d 'Where the loci of a tidy genotype table are: columns locus, contig, position' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l programme -d 'Programme file: the settings below by population; flags hold for all and win over it' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l baseline -d 'Visit that later ones are held against: a label or a year [default: the earliest]' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l generation-years -d 'Generation length in years: the mean age of parents' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l census -d 'Census size at the baseline, in individuals; needed by sampling plan 1' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l sampling-plan -d 'How individuals were taken [default: 2]' -r -f -a "1\t'Plan I: sampled individuals may be parents of later ones (sampled after breeding, or put back)'
2\t'Plan II: they cannot (removed before breeding, or young that were never put back)'"
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l chromosomes -d 'Haploid number of chromosomes, to correct linkage estimates for linked loci' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l map-length-cm -d 'Length of the genetic map in centimorgans, for the same where chromosomes are not counted' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l min-call-rate -d 'Least share of individuals typed for a locus to count [default: 0, every typed locus]' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l gene-copies -d 'Gene copies to which allelic richness is rarefied [default: by the smallest stratum]' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l list-losses -d 'Most lost alleles listed by name in the report [default: 1000]' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l mask-below-gq -d 'Take genotypes of lower quality (GQ) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l mask-below-dp -d 'Take genotypes of lower depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l mask-above-dp -d 'Take genotypes of higher depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l mask-below-balance -d 'Take heterozygotes as missing whose rarer allele has a smaller share of the reads (AD)' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l filters -d 'Keep records of which every filter is listed, as in PASS,. (a dot is "not filtered")' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l contigs -d 'Keep these contigs alone' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l without-contigs -d 'Leave out these contigs, such as sex chromosomes' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l region -d 'Read the records at these places alone: CONTIG, CONTIG:FROM-TO, CONTIG:FROM-; several with commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l regions-bed -d 'The same, from a BED file (positions from 0, ends not included)' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand tally" -s o -l output -d 'Write the tally here: a Parquet file' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l allow-absent -d 'Let samples of the sheet lack calls: they are left out with a note'
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l snv-only -d 'Leave out records with an allele other than a single base'
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l biallelic-only -d 'Leave out records of more than two alleles'
complete -c genewane -n "__fish_genewane_using_subcommand tally" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand tally" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand page" -s o -l output -d 'Write the page here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand page" -l figures -d 'Write each figure into this folder as well, made if absent' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand page" -l without-samples -d 'Leave sample names out, for a page that leaves the house'
complete -c genewane -n "__fish_genewane_using_subcommand page" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand rehearse" -s o -l output -d 'Folder to write into; made if absent' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand rehearse" -l seed -d 'Seed of all chance [default: the scenario\'s]' -r
complete -c genewane -n "__fish_genewane_using_subcommand rehearse" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand rehearse" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand rehearse" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -l policy -d 'Policy file: the rules, and what is known of populations beside the report' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -l on-uncertain -d 'What \'cannot tell\' counts as for the exit code' -r -f -a "met\t'As met'
breached\t'As breached: the cautious reading'
tell\t'As neither: it is told, and the exit code is that of the other rules'"
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -s o -l output -d 'Write the verdict here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -l indicator -d 'Add the share of populations with an effective size above 500, by species'
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -l write-policy -d 'Print the built-in policy as a start for one\'s own, and stop'
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -l quiet -d 'Keep the table and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand verdict" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l scenarios -d 'Scenario file: other ways to manage, beside the status quo' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l watch -d 'Alleles to watch: the chance that each is lost, still there or fixed' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l tally -d 'Tally of the report\'s calls: has the copies of any watched allele; may be given several times' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l years -d 'Years to look ahead [default: 100 where a generation length is known]' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l generations -d 'Generations to look ahead [default: 20 where no generation length is known]' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l generation-years -d 'Generation length in years [default: the report\'s]' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l keep -d 'Share of the baseline\'s expected heterozygosity that is to be kept' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l draws -d 'Draws behind each band' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l seed -d 'Seed of all chance; the same seed gives the same bytes' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -s o -l output -d 'Write the forecast here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand forecast" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand design" -l individuals -d 'Individuals at each visit, separated by commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l loci -d 'Loci, separated by commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l generations -d 'Generations between two visits, separated by commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l effective-size -d 'True effective sizes, separated by commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l alleles -d 'Alleles a locus: 2 for most SNPs, 8 or more for many microsatellites' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l chromosomes -d 'Chromosomes: loci on one chromosome do not count as pairs for linkage, and are simulated linked' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l cv -d 'Coefficient of variation of 1/Ne that is to be reached' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l allele-frequency -d 'Frequencies of alleles that are to be seen, separated by commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l seen -d 'Probability with which they are to be seen' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l power -d 'Power that is to be reached' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l simulate -d 'Simulations a design, for the power; 0 leaves it out' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l size-limit -d 'Effective size below which a decline is to be declared' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l richness-drop -d 'Share of allelic richness that must be gone before its loss is declared' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l stable-size -d 'Effective size of the stable population in which declared losses are false alarms' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l seed -d 'Seed of all chance; the same seed gives the same bytes' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l cost-per-sample -d 'Cost of one sampled and genotyped individual' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l cost-per-locus -d 'Cost of one locus, paid once' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -s o -l output -d 'Write the document here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand design" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand design" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand design" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l samples -d 'Sample sheet: who was sampled where and when' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l locus-map -d 'Where the loci of a tidy genotype table are: columns locus, contig, position' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l min-sample-call-rate -d 'Least share of records typed for a sample to be used [default: 0.5]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l fewest-shared -d 'Loci that both samples of a match must be typed at [default: as many as tell sibs apart]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l most-mismatching -d 'Share of the shared loci that may differ within one individual [default: from the panel]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l most-loci -d 'Most loci of two alleles on which pairs are compared [default: 50000]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l run-loci -d 'Fewest typed loci of a run [default: 30]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l run-length -d 'Least length of a run in base pairs [default: 1000000]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l run-heterozygous -d 'Most heterozygous loci inside a run [default: 1]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l run-missing -d 'Most missing loci inside a run [default: 5]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l run-gap -d 'Widest gap between neighbouring loci of a run in base pairs [default: 500000]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l false-discovery-rate -d 'Share of false findings accepted among odd loci [default: 0.05]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -s o -l output -d 'Write the report here [default: standard output]' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l write-sheet -d 'Write the sheet here, every row and column kept, with columns \'use\' and \'why\'' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l list-pairs -d 'Most related pairs listed by name [default: 1000]; all are counted' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l list-loci -d 'Most odd loci listed of each kind [default: 200]; all are counted' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l mask-below-gq -d 'Take genotypes of lower quality (GQ) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l mask-below-dp -d 'Take genotypes of lower depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l mask-above-dp -d 'Take genotypes of higher depth (DP) as missing' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l mask-below-balance -d 'Take heterozygotes as missing whose rarer allele has a smaller share of the reads (AD)' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l filters -d 'Keep records of which every filter is listed, as in PASS,. (a dot is "not filtered")' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l contigs -d 'Keep these contigs alone' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l without-contigs -d 'Leave out these contigs, such as sex chromosomes' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l region -d 'Read the records at these places alone: CONTIG, CONTIG:FROM-TO, CONTIG:FROM-; several with commas' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l regions-bed -d 'The same, from a BED file (positions from 0, ends not included)' -r -F
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l threads -d 'Threads to use [default: all cores]' -r
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l allow-absent -d 'Let samples of the sheet lack calls: they are left out with a note'
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l snv-only -d 'Leave out records with an allele other than a single base'
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l biallelic-only -d 'Leave out records of more than two alleles'
complete -c genewane -n "__fish_genewane_using_subcommand screen" -l quiet -d 'Keep progress and notes off standard error; errors still appear'
complete -c genewane -n "__fish_genewane_using_subcommand screen" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand schema" -s h -l help -d 'Print help (see more with \'--help\')'
complete -c genewane -n "__fish_genewane_using_subcommand help" -s h -l help -d 'Print help (see more with \'--help\')'
