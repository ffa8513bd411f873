# shellcheck shell=bash
# To be sourced by deploy/try, deploy/test and deploy/check, under their `set -euo pipefail`.
# Makes .venv beside pyproject.toml, if it is not there, and installs the project into it.
#
#   set_up            what the program needs
#   set_up test       and what the tests need; likewise: set_up check
#
# PYTHON=/path/to/python chooses the interpreter that the environment is made with.

root=$(CDPATH='' cd -- "$(dirname -- "${BASH_SOURCE[0]}")/.." && pwd -P)
venv=$root/.venv

# Another project's modules on these paths would be found before ours: `config` is a common name.
unset PYTHONPATH PYTHONHOME

set_up() {
    local extra=${1:-}
    have_environment || make_environment
    install_project "$extra"
}

say() { printf '%s\n' "$*"; }

give_up() {
    printf '%s\n' "$*" >&2
    exit 1
}

# An interpreter that runs is not enough: on a bare Debian, venv fails for want of ensurepip and yet leaves
# bin/python behind. An environment made by uv has no pip, but then uv is there to install with.
have_environment() {
    [ -x "$venv/bin/python" ] && "$venv/bin/python" -c '' 2>/dev/null && { have_pip || have_uv; }
}

have_pip() { "$venv/bin/python" -m pip --version >/dev/null 2>&1; }
have_uv() { command -v uv >/dev/null; }

make_environment() {
    local python
    python=$(find_python) || give_up "knickpoint needs Python 3.11 or newer, and none was found:" \
        "install it, or name it: PYTHON=/path/to/python $0"
    say "Making $venv with $python ..."
    try_venv "$python" && return
    if [ "$(id -u)" = 0 ] && command -v apt-get >/dev/null; then
        say "This Python cannot make environments; installing python3-venv ..."
        # The list of packages may be missing or old on a fresh machine. Whether it helped is seen next.
        { apt-get update -qq && DEBIAN_FRONTEND=noninteractive apt-get install -y -qq python3-venv; } >/dev/null || true
        try_venv "$python" && return
    fi
    if have_uv && uv venv --quiet --python "$python" "$venv"; then
        return
    fi
    give_up "$python cannot make an environment (it lacks ensurepip); on Debian and Ubuntu, type" \
        "sudo apt-get install python3-venv, then start $0 again."
}

try_venv() {
    # --clear, since a half-made environment of an earlier try may be there.
    "$1" -m venv --clear "$venv" >/dev/null 2>&1 && have_pip && return
    rm -rf -- "$venv"
    return 1
}

find_python() {
    local name
    for name in ${PYTHON:+"$PYTHON"} python3 python3.14 python3.13 python3.12 python3.11; do
        # Asked rather than trusted: a name on the PATH may be a stub that starts nothing.
        if "$name" -c 'import sys; sys.exit(sys.version_info < (3, 11))' 2>/dev/null; then
            command -v "$name"
            return
        fi
        # Whoever named an interpreter does not want another.
        [ -z "${PYTHON:-}" ] || return 1
    done
    return 1
}

# Editable, so that a change in the source needs no second installation.
install_project() {
    local extra=$1 what=$root stamp=$venv/.installed-${1:-plain} wanted
    wanted=$(cat -- "$root/pyproject.toml" "$root/deploy/constraints.txt" | cksum; say "$root")
    if [ -f "$stamp" ] && [ "$(cat -- "$stamp")" = "$wanted" ]; then
        return
    fi
    [ -z "$extra" ] || what="$root[$extra]"
    say "Installing knickpoint${extra:+ with what deploy/$extra needs} into $venv ..."
    if have_pip; then
        "$venv/bin/python" -m pip install --quiet --disable-pip-version-check --no-input \
            --constraint "$root/deploy/constraints.txt" --editable "$what"
    else
        uv pip install --quiet --python "$venv/bin/python" \
            --constraints "$root/deploy/constraints.txt" --editable "$what"
    fi
    # Written last, so that an installation that broke off is taken up again. The environment's own place is in
    # it, since an environment that was moved does not work.
    printf '%s\n' "$wanted" >"$stamp"
}
