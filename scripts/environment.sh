# Sourced by scripts/run and scripts/test: gives the project its own environment in .venv.
# Sets `project` and keeps every cache inside the project folder.
set -o pipefail  # a failed download must not pass for a good one

project="$(cd -- "$(dirname -- "${BASH_SOURCE[0]}")/.." && pwd -P)"
venv="$project/.venv"
export XDG_CACHE_HOME="$project/.cache" MPLCONFIGDIR="$project/.cache/matplotlib"

# Prints a Python of version 3.11 or later that can make virtual environments.
find_python() {
    local name
    for name in ${PYTHON:+"$PYTHON"} python3.11 python3.12 python3.13 python3 python3.14 python; do
        if "$name" -c 'import sys, venv, ensurepip; sys.exit(sys.version_info < (3, 11))' >/dev/null 2>&1; then
            printf '%s\n' "$name"
            return
        fi
    done
    cat >&2 <<'MESSAGE'
scission needs Python 3.11 or later with the modules venv and ensurepip, and found none in PATH.
Install it (Debian, Ubuntu: apt-get install python3 python3-venv) or name one: PYTHON=/path/to/python3.12
MESSAGE
    return 1
}

# What decides which packages are there; the folder too, since an environment cannot be moved.
wanted_packages() {
    printf '%s\n' "$project"
    cat -- "$project/requirements.lock"
}

packages_are_ready() {
    [ -f "$venv/complete" ] && wanted_packages | cmp -s - "$venv/complete" && "$venv/bin/python" -c '' 2>/dev/null
}

environment_is_ready() {
    packages_are_ready && cmp -s -- "$project/pyproject.toml" "$venv/installed"
}

# Shows how far pip is: one line a tenth of the packages, and what went wrong if it did.
install_packages() {
    local log="$project/.cache/set-up.log" total
    total="$(grep -c '^[a-z0-9].*==' "$project/requirements.lock")"
    if ! "$venv/bin/python" -m pip install --no-cache-dir --no-input --disable-pip-version-check \
        --progress-bar off --require-hashes -r "$project/requirements.lock" 2>&1 |
        tee "$log" |
        awk -v total="$total" '/^Collecting /{n++; if (n % 10 == 0) {printf "  %d of about %d packages fetched\n", n, total; fflush()}}
                 /^Installing collected/{print "  unpacking"; fflush()}'; then
        tail -n 20 -- "$log" >&2
        printf 'set-up failed: the packages could not be installed (whole log: %s)\n' "$log" >&2
        return 1
    fi
}

install_scission() {
    local log="$project/.cache/set-up.log"
    if ! "$venv/bin/python" -m pip install --quiet --no-cache-dir --no-deps --no-build-isolation \
        --disable-pip-version-check -e "$project" >>"$log" 2>&1; then
        tail -n 20 -- "$log" >&2
        printf 'set-up failed: scission itself could not be installed (whole log: %s)\n' "$log" >&2
        return 1
    fi
}

# The marks are written last and renamed into place: an interrupted set-up is never taken for a finished one.
make_environment() {
    # pip keeps its hands off the rest of the machine; it asks any rustc for its version, whose proxy writes settings
    export TMPDIR="$project/.cache/tmp" RUSTUP_HOME="$project/.cache/rustup"
    if ! packages_are_ready; then
        local python
        python="$(find_python)" || return 1
        printf 'setting up scission in %s (once, a few minutes) with %s\n' "$venv" "$("$python" --version)" >&2
        rm -rf -- "$venv"
        "$python" -m venv "$venv" || return 1
        install_packages >&2 || return 1
        wanted_packages >"$venv/complete.part" && mv -- "$venv/complete.part" "$venv/complete"
    fi
    install_scission || return 1
    cp -- "$project/pyproject.toml" "$venv/installed.part" && mv -- "$venv/installed.part" "$venv/installed"
    printf 'set-up done\n' >&2
}

# Holds a lock on file descriptor 9; Python takes it because flock(1) is not everywhere.
set_up() {
    environment_is_ready && return
    local python
    python="$(find_python)" || exit 1
    mkdir -p -- "$project/.cache/tmp"
    exec 9>"$project/.cache/set-up.lock"
    "$python" - <<'LOCK' || exit 1
import fcntl, sys
try:
    fcntl.flock(9, fcntl.LOCK_EX | fcntl.LOCK_NB)
except BlockingIOError:
    print("another set-up of this project is at work, waiting for it", file=sys.stderr, flush=True)
    fcntl.flock(9, fcntl.LOCK_EX)
LOCK
    environment_is_ready || (make_environment) || exit 1  # in a subshell: its TMPDIR is for pip only
    exec 9>&-
}
