# shellcheck shell=bash disable=SC2034
# Shared by the scripts in tools/: finds what is on the machine, installs what is missing where that is possible.
# Sourced, never run. Expects `set -euo pipefail` and the current folder to be the repository's root.

say() { printf '%s\n' "$*" >&2; }

fail() {
    say "error: $*"
    exit 1
}

has() { command -v "$1" >/dev/null 2>&1; }

# Whether packages can be installed here: apt-get, and root or a sudo that asks for no password.
can_install() { has apt-get && { [ "$(id -u)" -eq 0 ] || { has sudo && sudo -n true 2>/dev/null; }; }; }

# Installs Debian packages; prints apt's own words only when it fails.
apt_install() {
    can_install || return 1
    local as_root=() log
    [ "$(id -u)" -eq 0 ] || as_root=(sudo -n)
    log=$(mktemp)
    say "installing $*"
    if ! { "${as_root[@]}" apt-get update -qq \
        && "${as_root[@]}" env DEBIAN_FRONTEND=noninteractive \
            apt-get install -y -qq --no-install-recommends "$@"; } >"$log" 2>&1 </dev/null; then
        cat "$log" >&2
        rm -f "$log"
        return 1
    fi
    rm -f "$log"
}

# need_command COMMAND PACKAGE: makes sure the command is there, or stops and says how to get it.
need_command() {
    has "$1" && return
    apt_install "$2" && has "$1" && return
    fail "'$1' is missing and could not be installed; install Debian's package '$2', or its like, and run this again"
}

# Rust's cargo, also where rustup has just put it and the shell does not know yet.
need_cargo() {
    if ! has cargo && [ -r "$HOME/.cargo/env" ]; then
        # shellcheck source=/dev/null
        . "$HOME/.cargo/env"
    fi
    has cargo || fail "cargo is missing; install Rust with rustup (https://rustup.rs) and run this again"
    has cc || fail "no C compiler found as 'cc'; install Debian's package 'gcc' and run this again"
}

has_alsa() { has pkg-config && pkg-config --exists alsa; }

# Sets FEATURES to the cargo flags to build with: none, or --no-default-features where the ALSA headers that live
# audio needs on Linux are absent and cannot be installed.
choose_features() {
    FEATURES=()
    [ "$(uname -s)" = Linux ] || return 0
    has_alsa && return
    if apt_install libasound2-dev pkg-config && has_alsa; then
        return
    fi
    say "note: no ALSA headers (Debian: libasound2-dev and pkg-config), and they cannot be installed from here:"
    say "note: building with --no-default-features, which leaves out live audio alone"
    FEATURES=(--no-default-features)
}

# A Python environment in .venv with exactly what tools/requirements.txt pins.
need_python() {
    local wanted
    need_command python3 python3
    python3 -c 'import sys; sys.exit(sys.version_info < (3, 11))' \
        || fail "Python 3.11 or later is needed; found $(python3 --version 2>&1)"
    wanted=$(cksum <tools/requirements.txt)
    if [ -x .venv/bin/python ] && [ "$(cat .venv/requirements.cksum 2>/dev/null)" = "$wanted" ]; then
        return
    fi
    say "making a Python environment in .venv"
    rm -rf .venv
    if ! python3 -m venv .venv >/dev/null 2>&1; then
        apt_install python3-venv || fail "python3 cannot make an environment; install Debian's package 'python3-venv'"
        rm -rf .venv
        python3 -m venv .venv || fail "python3 -m venv failed"
    fi
    .venv/bin/python -m pip install --quiet --disable-pip-version-check -r tools/requirements.txt </dev/null \
        || fail "pip could not install what tools/requirements.txt lists"
    printf '%s\n' "$wanted" >.venv/requirements.cksum
}
