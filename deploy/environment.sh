# Makes the private environments of deploy/serve and deploy/test; sourced by both, never run.
# An environment is made once, and again only when its list of pinned packages changes or its Python is gone.

root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)

fail() { printf '%s: %s\n' "$(basename "$0")" "$*" >&2; exit 1; }

find_python() {
    local name found=""
    for name in ${PYTHON:-} python3.13 python3.12 python3.11 python3 python; do
        command -v "$name" >/dev/null 2>&1 || continue
        found=yes
        if "$name" -c 'import sys; sys.exit(not (3, 11) <= sys.version_info[:2] <= (3, 13))' >/dev/null 2>&1; then
            command -v "$name"
            return
        fi
    done
    [ -n "$found" ] && fail "Python 3.11, 3.12 or 3.13 is needed, only another version was found; name one with PYTHON=/path/to/python3.11"
    fail "Python 3.11, 3.12 or 3.13 is needed and no python3 was found on the PATH"
}

install_into() {  # environment, pinned packages
    "$1/bin/python" -m pip install --quiet --disable-pip-version-check --no-input --no-deps --require-hashes -r "$2" >>"$1.log" 2>&1 || {
        tail -n 20 "$1.log" >&2
        fail "the packages of $2 could not be installed: the first start needs a Python package index (pip's own words are above)"
    }
    "$1/bin/python" - "$root" <<'PY'
import pathlib, sys, sysconfig
root, bin_ = sys.argv[1], pathlib.Path(sys.prefix, "bin")
pathlib.Path(sysconfig.get_path("purelib"), "sublevel.pth").write_text(root + "\n")
command = bin_ / "sublevel"
guard = 'if __name__ == "__main__":'  # processes of a pool import this file too
command.write_text(f"#!{bin_ / 'python'}\nfrom service.cli import main\n\n{guard}\n    raise SystemExit(main())\n")
command.chmod(0o755)
PY
}

environment() {  # name, pinned packages: leaves the interpreter's path in $python
    local python3 place made_from
    place="$root/.venv/$1"
    python="$place/bin/python"
    made_from=$(cksum <"$2") || fail "cannot read $2"
    [ "$(cat "$place/made-from" 2>/dev/null)" = "$made_from" ] && "$python" -c '' 2>/dev/null && return
    python3=$(find_python) || exit 1
    printf '%s: making the environment %s (once)\n' "$(basename "$0")" "$place" >&2
    mkdir -p "$root/.venv" 2>/dev/null && rm -rf "$place" || fail "cannot write to $root/.venv"
    "$python3" -m venv "$place" >"$place.log" 2>&1 || {
        tail -n 20 "$place.log" >&2
        rm -rf "$place"
        fail "$python3 could not make a virtual environment: its venv and ensurepip modules are needed (on Debian and Ubuntu the package python3-venv)"
    }
    install_into "$place" "$2"
    printf '%s\n' "$made_from" >"$place/made-from"
}
