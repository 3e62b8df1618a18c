# Sourced by the scripts here: finds a Python and keeps the environment in .venv complete and up to date.
# Sets `root` (the repository), `python` (the environment's interpreter) and defines `ensure_environment`.

root=$(CDPATH='' cd -P -- "$(dirname -- "${BASH_SOURCE[0]}")/.." && pwd -P)
environment=$root/.venv
python=$environment/bin/python
# Holds the number of the process that alters the environment; left behind by one that was interrupted.
unfinished=$environment/.unfinished
unset PYTHONHOME PYTHONPATH

refuse() {
    echo "$1" >&2
    exit 2
}

is_suitable() {
    "$1" -c 'import sys, venv, ensurepip; sys.exit(sys.version_info < (3, 11))' >/dev/null 2>&1
}

# The versions that constraints.txt was tested with come first, whatever else `python3` may be last.
find_python() {
    local candidate
    for candidate in ${PYTHON:+"$PYTHON"} python3.13 python3.12 python3.11 python3 python3.14; do
        if is_suitable "$candidate"; then
            command -v -- "$candidate"
            return
        fi
    done
    refuse "no Python 3.11 or newer with venv was found: install one (on Debian: python3 and python3-venv), or name it as PYTHON=/path/to/python3"
}

# Nothing is kept of an environment whose making was interrupted, that lost its interpreter or that was moved.
is_sound() {
    [ ! -e "$unfinished" ] && is_suitable "$python" && grep -qF -- "$environment/bin/" "$environment/bin/pip" 2>/dev/null
}

clear_environment() {
    local maker
    maker=$(cat "$unfinished" 2>/dev/null || true)
    if [ -n "$maker" ] && kill -0 "$maker" 2>/dev/null; then
        refuse "another script (process $maker) is making $environment: wait for it to end, or delete that folder"
    fi
    mkdir -p "$environment"
    echo $$ >"$unfinished"
    find "$environment" -mindepth 1 -maxdepth 1 ! -name .unfinished -exec rm -rf {} +
}

# ensure_environment EXTRA...: the package is installed editable with these extras at the tested versions.
ensure_environment() {
    local recipe extra base sound='' current=yes
    recipe=$(cat "$root/pyproject.toml" "$root/scripts/constraints.txt" | cksum)
    is_sound && sound=yes
    for extra in "$@"; do
        [ "$(cat "$environment/.installed-$extra" 2>/dev/null)" = "$recipe" ] || current=''
    done
    if [ -n "$sound" ] && [ -n "$current" ]; then
        return
    fi

    if [ -n "$sound" ]; then
        echo "bringing the environment in $environment up to date" >&2
        echo $$ >"$unfinished"
    else
        base=$(find_python)
        clear_environment
        echo "making the environment in $environment (a minute or two)" >&2
        "$base" -m venv "$environment"
    fi
    if ! install_package "$@"; then
        refuse "the environment in $environment could not be made: the lines above tell why; run this again when that is mended"
    fi
    for extra in "$@"; do
        echo "$recipe" >"$environment/.installed-$extra"
    done
    rm "$unfinished"
}

# The build tool is installed first, at its tested version, rather than fetched anew into a folder of its own.
install_package() {
    local extras
    local install=("$python" -m pip install --quiet --no-input --disable-pip-version-check -c scripts/constraints.txt)
    extras=$(IFS=, && echo "$*")
    (cd "$root" && "${install[@]}" setuptools && "${install[@]}" --no-build-isolation -e ".[$extras]") </dev/null
}
