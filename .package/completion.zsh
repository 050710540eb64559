#compdef deviascope
# SPDX-License-Identifier: GPL-2.0-or-later
# Completion of deviascope for zsh.
local -a commands everywhere writes
commands=(
    'run:the whole job: counts, samples and summarises'
    'check:checks a job and its inputs; writes nothing'
    'count:counts the sources of every survey'
    'weigh:measures the kinematic weights of bins'
    'sample:samples the posterior'
    'summarise:summarises a chain'
    'figures:draws figures, and makes report, tables and sky files'
    'export:writes the draws as a FITS or CSV table'
    'compare:holds the posterior against a reference velocity, rival hypotheses, surveys and counts'
    'sweep:runs the job again with other cuts, masks, priors or resolutions'
    'mock:makes mock catalogues with known truth'
)
everywhere=('--help[help]' '--threads[threads to use]:number:' '--quiet[no progress and no report]')
writes=('(-o --output)'{-o,--output}'[folder for the results]:folder:_files -/'
    '--replace[overwrite results that exist]')
local resume='--resume[go on with a run that was cut off]'
local strict='--strict[exit with 6 where the result is doubtful]'

if (( CURRENT == 2 )); then
    _describe command commands
    _arguments '--help[help]' '--version[version]'
    return
fi
local command=$words[2]
shift words
(( CURRENT-- ))
case $command in
    check) _arguments $everywhere $strict '1:job:_files -g "*.toml"' ;;
    run) _arguments $everywhere $writes $strict $resume '--no-figures[chain and summary alone]' '1:job:_files -g "*.toml"' ;;
    sample) _arguments $everywhere $writes $strict $resume '1:job:_files -g "*.toml"' ;;
    count) _arguments $everywhere $writes '--maps[write maps too]' '1:job:_files -g "*.toml"' ;;
    weigh) _arguments $everywhere $writes '--check[full-sky experiment]' '1:job:_files -g "*.toml"' ;;
    summarise) _arguments $everywhere $writes $strict '1:chain:_files -g "*.h5"' ;;
    figures) _arguments $everywhere $writes $strict '--only[only these figures]:names:' \
        '--width[of the figures]:width:(90mm 180mm)' '--bare[no titles]' \
        '--parameters[of the joint figure]:names:' '--font[font file]:file:_files' '1:chain:_files -g "*.h5"' ;;
    export) _arguments $everywhere $writes '--format[format]:format:(fits csv csv.gz)' \
        '--thin[every N-th stored row only]:number:' '1:chain:_files -g "*.h5"' ;;
    compare) _arguments $everywhere $writes $strict '--reference[prior with the velocity to compare with]:name:' '--clustering[prior of dipoles by clustering]:name:' '1:job:_files -g "*.toml"' ;;
    sweep) _arguments $everywhere $writes $strict '*--vary[key and values]:path=values:' '1:job:_files -g "*.toml"' ;;
    mock) _arguments $everywhere $writes '1:scenario:_files -g "*.toml"' ;;
esac
