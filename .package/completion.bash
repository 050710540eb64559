# SPDX-License-Identifier: GPL-2.0-or-later
# Completion of deviascope for bash.
_deviascope() {
    local word=${COMP_WORDS[COMP_CWORD]} previous=${COMP_WORDS[COMP_CWORD-1]} command=${COMP_WORDS[1]}
    COMPREPLY=()
    if [ "$COMP_CWORD" -eq 1 ]; then
        mapfile -t COMPREPLY < <(compgen -W "run check count weigh sample summarise figures export compare sweep mock --help --version" -- "$word")
        return
    fi
    case $previous in
        -o|--output) mapfile -t COMPREPLY < <(compgen -d -- "$word"); return ;;
        --threads|--reference|--clustering|--vary|--width|--thin|--parameters) return ;;
        --font) mapfile -t COMPREPLY < <(compgen -f -- "$word"); return ;;
        --format) mapfile -t COMPREPLY < <(compgen -W "fits csv csv.gz" -- "$word"); return ;;
        --only)
            mapfile -t COMPREPLY < <(compgen -W "directions residuals amplitudes joint hypotheses surveys profile weights traces" -- "$word")
            return ;;
    esac
    if [[ $word == -* ]]; then
        local options="--help --threads --quiet"
        case $command in
            check) options+=" --strict" ;;
            run) options+=" --output --replace --resume --strict --no-figures" ;;
            sample) options+=" --output --replace --resume --strict" ;;
            summarise) options+=" --output --replace --strict" ;;
            figures) options+=" --output --replace --strict --only --width --bare --parameters --font" ;;
            export) options+=" --output --replace --format --thin" ;;
            count) options+=" --output --replace --maps" ;;
            weigh) options+=" --output --replace --check" ;;
            compare) options+=" --output --replace --strict --reference --clustering" ;;
            sweep) options+=" --output --replace --strict --vary" ;;
            mock) options+=" --output --replace" ;;
        esac
        mapfile -t COMPREPLY < <(compgen -W "$options" -- "$word")
        return
    fi
    local ending=toml
    [[ $command == summarise || $command == figures || $command == export ]] && ending=h5
    mapfile -t COMPREPLY < <(compgen -d -- "$word"; compgen -f -X "!*.$ending" -- "$word")
}
complete -o filenames -F _deviascope deviascope
