#!/bin/sh
# zsh_test.sh COMPLETION SOURCE_DIR: the completion in a real zsh: a shell on a pseudo-terminal gets the
# keys of a user, and its line is looked at. Ends with 77 (skipped) where there is no zsh.
if ! command -v zsh >/dev/null; then
    echo "skipped: zsh (Debian: zsh) is not installed"
    exit 77
fi
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
mkdir "$work/functions" "$work/place"
cp "$1" "$work/functions/_ampstead"
cp "$2/netlists/mirror.cell" "$2/models/n350.process" "$work/place/"
touch "$work/place/curve.csv"
cat >"$work/zshrc" <<'END'
unsetopt zle_bracketed_paste beep
PS1= PS2= RPS1=
fpath=($FUNCTIONS $fpath)
autoload -Uz compinit
compinit -u -D
setopt no_list_beep no_auto_menu
zstyle ':completion:*' menu no
bindkey -e
# what stands on the line, where the test finds it
report() { print -r -- "$BUFFER" >"$ANSWER"; BUFFER=; zle reset-prompt }
zle -N report
bindkey '^X' report
END
cat >"$work/drive" <<'END'
zmodload zsh/zpty || exit 1
cd $PLACE
typeset -i failures=0
zpty -b shell "ZDOTDIR=$WORK zsh -d -i -o no_global_rcs -o no_rcs"
zpty -w shell "source $WORK/zshrc"
# becomes LINE WANTED: the line after the tab key
becomes() {
    local found= junk
    integer tries=0
    rm -f $ANSWER
    zpty -w -n shell "$1"$'\t'
    sleep 0.1
    zpty -w -n shell $'\x18'
    while [[ ! -s $ANSWER ]] && (( tries++ < 200 )); do
        zpty -r -t shell junk
        sleep 0.05
    done
    sleep 0.05
    [[ -s $ANSWER ]] && found=$(<$ANSWER)
    if [[ $found != $2 ]]; then
        print -r -- "FAILED: '$1' became '$found' instead of '$2'"
        (( failures++ ))
    fi
}
becomes "ampstead swe" "ampstead sweep "
becomes "ampstead mirr" "ampstead mirror.cell "
becomes "ampstead sweep --swe" "ampstead sweep --sweep="
becomes "ampstead point --swe" "ampstead point --swe"
becomes "ampstead mirror.cell --pag" "ampstead mirror.cell --page="
becomes "ampstead review --view=h" "ampstead review --view=hand "
becomes "ampstead size --round g" "ampstead size --round grid "
becomes "ampstead states --le" "ampstead states --leakage="
becomes "ampstead models n" "ampstead models n350.process "
becomes "ampstead calibrate c" "ampstead calibrate curve.csv "
becomes "ampstead help calib" "ampstead help calibrate "
becomes "ampstead review --set X=1 --sa" "ampstead review --set X=1 --samples="
becomes "ampstead point --sa" "ampstead point --sa"
zpty -d shell
(( failures == 0 )) && print "zsh completes verbs, options of a verb, words and files"
exit $(( failures > 0 ))
END
WORK=$work PLACE=$work/place FUNCTIONS=$work/functions ANSWER=$work/answer TERM=dumb LC_ALL=C.UTF-8 \
    zsh -f "$work/drive"
