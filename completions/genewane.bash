_genewane() {
    local i cur prev opts cmd
    COMPREPLY=()
    if [[ "${BASH_VERSINFO[0]}" -ge 4 ]]; then
        cur="$2"
    else
        cur="${COMP_WORDS[COMP_CWORD]}"
    fi
    prev="$3"
    cmd=""
    opts=""

    for i in "${COMP_WORDS[@]:0:COMP_CWORD}"
    do
        case "${cmd},${i}" in
            ",$1")
                cmd="genewane"
                ;;
            genewane,design)
                cmd="genewane__subcmd__design"
                ;;
            genewane,forecast)
                cmd="genewane__subcmd__forecast"
                ;;
            genewane,help)
                cmd="genewane__subcmd__help"
                ;;
            genewane,measure)
                cmd="genewane__subcmd__measure"
                ;;
            genewane,page)
                cmd="genewane__subcmd__page"
                ;;
            genewane,rehearse)
                cmd="genewane__subcmd__rehearse"
                ;;
            genewane,schema)
                cmd="genewane__subcmd__schema"
                ;;
            genewane,screen)
                cmd="genewane__subcmd__screen"
                ;;
            genewane,tally)
                cmd="genewane__subcmd__tally"
                ;;
            genewane,verdict)
                cmd="genewane__subcmd__verdict"
                ;;
            *)
                ;;
        esac
    done

    case "${cmd}" in
        genewane)
            opts="-h -V --help --version measure tally page rehearse verdict forecast design screen schema help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 1 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__design)
            opts="-o -h --individuals --loci --generations --effective-size --alleles --chromosomes --cv --allele-frequency --seen --power --simulate --size-limit --richness-drop --stable-size --seed --cost-per-sample --cost-per-locus --output --threads --quiet --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --individuals)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --loci)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --generations)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --effective-size)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --alleles)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --chromosomes)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --cv)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --allele-frequency)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --seen)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --power)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --simulate)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --size-limit)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --richness-drop)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --stable-size)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --seed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --cost-per-sample)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --cost-per-locus)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__forecast)
            opts="-o -h --scenarios --watch --tally --years --generations --generation-years --keep --draws --seed --output --threads --quiet --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --scenarios)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --watch)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --tally)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --years)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --generations)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --generation-years)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --keep)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --draws)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --seed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__help)
            opts="-h --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__measure)
            opts="-o -h --samples --locus-map --allow-absent --programme --baseline --generation-years --census --sampling-plan --chromosomes --map-length-cm --min-call-rate --gene-copies --list-losses --mask-below-gq --mask-below-dp --mask-above-dp --mask-below-balance --filters --snv-only --biallelic-only --contigs --without-contigs --region --regions-bed --threads --quiet --output --loci --stamp --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --samples)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --locus-map)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --programme)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --baseline)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --generation-years)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --census)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --sampling-plan)
                    COMPREPLY=($(compgen -W "1 2" -- "${cur}"))
                    return 0
                    ;;
                --chromosomes)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --map-length-cm)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --min-call-rate)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --gene-copies)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --list-losses)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-gq)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-above-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-balance)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --filters)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --without-contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --region)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --regions-bed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --loci)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__page)
            opts="-o -h --output --figures --without-samples --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --figures)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__rehearse)
            opts="-o -h --output --seed --threads --quiet --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --seed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__schema)
            opts="-h --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__screen)
            opts="-o -h --samples --locus-map --allow-absent --min-sample-call-rate --fewest-shared --most-mismatching --most-loci --run-loci --run-length --run-heterozygous --run-missing --run-gap --false-discovery-rate --output --write-sheet --list-pairs --list-loci --mask-below-gq --mask-below-dp --mask-above-dp --mask-below-balance --filters --snv-only --biallelic-only --contigs --without-contigs --region --regions-bed --threads --quiet --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --samples)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --locus-map)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --min-sample-call-rate)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --fewest-shared)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --most-mismatching)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --most-loci)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --run-loci)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --run-length)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --run-heterozygous)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --run-missing)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --run-gap)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --false-discovery-rate)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --write-sheet)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --list-pairs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --list-loci)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-gq)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-above-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-balance)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --filters)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --without-contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --region)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --regions-bed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__tally)
            opts="-o -h --samples --locus-map --allow-absent --programme --baseline --generation-years --census --sampling-plan --chromosomes --map-length-cm --min-call-rate --gene-copies --list-losses --mask-below-gq --mask-below-dp --mask-above-dp --mask-below-balance --filters --snv-only --biallelic-only --contigs --without-contigs --region --regions-bed --threads --quiet --output --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --samples)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --locus-map)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --programme)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --baseline)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --generation-years)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --census)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --sampling-plan)
                    COMPREPLY=($(compgen -W "1 2" -- "${cur}"))
                    return 0
                    ;;
                --chromosomes)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --map-length-cm)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --min-call-rate)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --gene-copies)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --list-losses)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-gq)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-above-dp)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --mask-below-balance)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --filters)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --without-contigs)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --region)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --regions-bed)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --threads)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
        genewane__subcmd__verdict)
            opts="-o -h --policy --indicator --on-uncertain --write-policy --output --quiet --help"
            if [[ ${cur} == -* || ${COMP_CWORD} -eq 2 ]] ; then
                COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
                return 0
            fi
            case "${prev}" in
                --policy)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                --on-uncertain)
                    COMPREPLY=($(compgen -W "met breached tell" -- "${cur}"))
                    return 0
                    ;;
                --output)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                -o)
                    COMPREPLY=($(compgen -f "${cur}"))
                    return 0
                    ;;
                *)
                    COMPREPLY=()
                    ;;
            esac
            COMPREPLY=( $(compgen -W "${opts}" -- "${cur}") )
            return 0
            ;;
    esac
}

if [[ "${BASH_VERSINFO[0]}" -eq 4 && "${BASH_VERSINFO[1]}" -ge 4 || "${BASH_VERSINFO[0]}" -gt 4 ]]; then
    complete -F _genewane -o nosort -o bashdefault -o default genewane
else
    complete -F _genewane -o bashdefault -o default genewane
fi
