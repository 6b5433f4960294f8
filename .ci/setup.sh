#!/usr/bin/env bash
# Set up everything on Debian 12: LibreOffice Calc and uno from apt (where we may), then a virtual environment.
# Quiet and repeatable. `setup.sh test` also installs what the tests need: LibreOffice in a second language, a
# virtual display with a window manager and a hand on its keyboard, and a reader of PDF pages.
set -euo pipefail
cd "$(dirname "$0")/.."
want_tests="${1:-}"
venv="${SHEETCAL_VENV:-.venv}"

as_root() {
  if [ "$(id -u)" = 0 ]; then "$@"; elif command -v sudo >/dev/null && sudo -n true 2>/dev/null; then sudo "$@"; else return 1; fi
}

packages=()
command -v soffice >/dev/null || packages+=(libreoffice-calc)
/usr/bin/python3 -I -c "import uno" 2>/dev/null || packages+=(python3-uno)
/usr/bin/python3 -I -c "import ensurepip" 2>/dev/null || packages+=(python3-venv)
fc-list 2>/dev/null | grep -qi liberation || packages+=(fonts-liberation)
if [ "$want_tests" = test ]; then
  needs() { command -v "$1" >/dev/null || packages+=("$2"); }
  needs Xvfb xvfb
  needs xdotool xdotool
  needs openbox openbox
  needs pdftotext poppler-utils
  [ -e /usr/lib/libreoffice/program/resource/de ] || packages+=(libreoffice-l10n-de)
fi
if [ ${#packages[@]} -gt 0 ]; then
  if as_root true && command -v apt-get >/dev/null; then
    echo "installing ${packages[*]}" >&2
    as_root apt-get update -qq >/dev/null 2>&1 || true
    as_root env DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends "${packages[@]}" >/dev/null 2>&1 ||
      echo "setup: apt-get could not install ${packages[*]}; going on without" >&2
  else
    echo "setup: without root, ${packages[*]} stay out; sheetcal runs without LibreOffice" >&2
  fi
fi

python=""
for candidate in python3.13 python3.12 python3.11 python3 /usr/bin/python3; do
  if command -v "$candidate" >/dev/null && "$candidate" -c 'import sys; raise SystemExit(sys.version_info < (3, 11))' 2>/dev/null; then
    python="$candidate"
    break
  fi
done
[ -n "$python" ] || { echo "setup: no Python 3.11 or newer found; install python3" >&2; exit 2; }
[ -x "$venv/bin/python" ] || "$python" -m venv "$venv"
extra=""
[ "$want_tests" = test ] && extra="[test]"
"$venv/bin/python" -m pip install --quiet --disable-pip-version-check -e ".$extra"
