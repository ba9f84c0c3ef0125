# shellcheck shell=bash
# Sourced by demo/run and tests/run: installing what is missing and building into build/.
# The caller sets `top`, the project's folder.

say() {
    printf '%s\n' "$*" >&2
}

# The packages listed in files, without comments.
listed_packages() {
    sed -e 's/#.*//' -e '/^[[:space:]]*$/d' "$@"
}

# Install those packages of the listed files that are missing; touches no network when none is.
install_missing() {
    local package command missing=() as_root=()
    if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
        say "This is no Debian system: going on in the hope that what $* list is installed."
        return
    fi
    for package in $(listed_packages "$@"); do
        if ! dpkg-query --show --showformat='${Status}\n' "$package" 2>/dev/null |
            grep -qx 'install ok installed'; then
            missing+=("$package")
        fi
    done
    if [ "${#missing[@]}" -eq 0 ]; then
        return
    fi
    if [ "$(id -u)" -ne 0 ]; then
        if ! command -v sudo >/dev/null; then
            say "Packages are missing: ask an administrator for 'apt-get install ${missing[*]}'."
            return 1
        fi
        as_root=(sudo)
    fi
    as_root+=(env DEBIAN_FRONTEND=noninteractive)
    say "Installing ${missing[*]} ..."
    for command in update "install --yes --no-install-recommends ${missing[*]}"; do
        # shellcheck disable=SC2086  # the words of $command are separate arguments
        quietly "${as_root[@]}" apt-get $command
    done
}

# Run a command and show what it printed only when it fails.
quietly() {
    local output
    if ! output=$("$@" 2>&1); then
        say "$output"
        say "This failed: $*"
        return 1
    fi
}

# build_in FOLDER COMPILER TARGET [CMAKE OPTION...]: build one target into build/FOLDER.
build_in() {
    local folder=$top/build/$1 compiler=$2 target=$3
    shift 3
    say "Building build/${folder##*/} with $compiler ..."
    # A build folder remembers where its sources were; after the project has moved it is of no use.
    if [ -e "$folder/CMakeCache.txt" ] &&
        ! grep -qxF "CMAKE_HOME_DIRECTORY:INTERNAL=$top" "$folder/CMakeCache.txt"; then
        rm -r "$folder"
    fi
    quietly env CC="$compiler" cmake -S "$top" -B "$folder" -G Ninja "$@"
    quietly cmake --build "$folder" --target "$target" -- --quiet
}
