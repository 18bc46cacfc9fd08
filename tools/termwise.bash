# Completion for termwise in bash.
_termwise()
{
    local word=${COMP_WORDS[COMP_CWORD]} before=${COMP_WORDS[COMP_CWORD - 1]}
    case $before in
    --results) mapfile -t COMPREPLY < <(compgen -W "json text" -- "$word"); return ;;
    -e | --digits | --time-limit | --memory-limit) return ;;
    esac
    if [[ $word == -* ]]; then
        mapfile -t COMPREPLY < <(compgen -W "-e --parse-only --results --digits --quiet --keep-going --time-limit \
            --memory-limit --version --help" -- "$word")
    else
        mapfile -t COMPREPLY < <(compgen -f -X '!*.tw' -- "$word"; compgen -d -- "$word")
    fi
}
complete -o filenames -F _termwise termwise
