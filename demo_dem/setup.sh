# Sourced by demo_dem/run.sh and tests/run.sh, from the top folder of the project: finds or installs what a build needs.
#
# Needed: a C compiler and linker, pkg-config, the development files of GDAL (3.4 or newer) and PROJ (8.1 or newer), libclang
# (the bindings to PROJ are made from its header while building) and cargo.
# Missing packages are installed by apt-get where that is possible without a question; otherwise the command for the
# system at hand is printed and the script ends with exit code 69. Ends with 69 too if there is no cargo.

say() { printf '%s\n' "$*" >&2; }

# libclang with its own headers; on macOS it comes with the compiler.
libclang_ready() {
    [ -z "${LIBCLANG_PATH:-}" ] || return 0
    [ "$(uname -s)" != Darwin ] || return 0
    for header in /usr/lib/llvm*/lib*/clang/*/include/stddef.h /usr/lib*/clang/*/include/stddef.h \
        /usr/local/lib*/clang/*/include/stddef.h; do
        [ ! -e "$header" ] || return 0
    done
    return 1
}

system_ready() {
    command -v cc >/dev/null 2>&1 || return 1
    command -v pkg-config >/dev/null 2>&1 || return 1
    pkg-config --exists 'gdal >= 3.4' 'proj >= 8.1' 2>/dev/null || return 1
    libclang_ready
}

print_install_commands() {
    say "hillpull needs a C compiler, pkg-config, libclang and the development files of GDAL (3.4 or newer) and PROJ (8.1 or newer)."
    say "Install them with the command for this system and run this script again:"
    say ""
    say "  Debian, Ubuntu:    sudo apt-get update && sudo apt-get install -y build-essential pkg-config libclang-dev libgdal-dev libproj-dev"
    say "  Fedora:            sudo dnf install -y gcc gcc-c++ make pkgconf-pkg-config clang-devel gdal-devel proj-devel"
    say "  macOS (Homebrew):  xcode-select --install; brew install pkg-config gdal proj"
    say "  conda:             conda install -c conda-forge compilers pkg-config clangdev libgdal proj"
    say "                     export PKG_CONFIG_PATH=\"\$CONDA_PREFIX/lib/pkgconfig\" LIBCLANG_PATH=\"\$CONDA_PREFIX/lib\" LD_LIBRARY_PATH=\"\$CONDA_PREFIX/lib\""
}

if ! system_ready && command -v apt-get >/dev/null 2>&1; then
    as_root=none
    if [ "$(id -u)" -eq 0 ]; then
        as_root=""
    elif command -v sudo >/dev/null 2>&1 && sudo -n true >/dev/null 2>&1; then
        as_root="sudo -n"
    fi
    if [ "$as_root" != none ]; then
        say "Installing a C compiler, pkg-config, libclang, GDAL and PROJ with apt-get (a few minutes) ..."
        apt_log=$(mktemp)
        # shellcheck disable=SC2086 # as_root is a command with its option, or nothing
        if ! { $as_root env DEBIAN_FRONTEND=noninteractive apt-get -q update;
            $as_root env DEBIAN_FRONTEND=noninteractive apt-get -q install -y --no-install-recommends \
                build-essential pkg-config libclang-dev libgdal-dev libproj-dev; } >"$apt_log" 2>&1 </dev/null; then
            tail -n 20 "$apt_log" >&2
            say "apt-get failed; its last lines are above."
        fi
        rm -f "$apt_log"
    fi
fi
if ! system_ready; then
    print_install_commands
    exit 69
fi

if ! command -v cargo >/dev/null 2>&1 && [ -x "${CARGO_HOME:-$HOME/.cargo}/bin/cargo" ]; then
    PATH="${CARGO_HOME:-$HOME/.cargo}/bin:$PATH"
    export PATH
fi
if ! command -v cargo >/dev/null 2>&1; then
    say "hillpull is built by cargo, which was found neither on the PATH nor in ${CARGO_HOME:-$HOME/.cargo}/bin."
    say "Install the Rust tools with rustup, as https://rustup.rs shows, open a new shell and run this script again."
    exit 69
fi
