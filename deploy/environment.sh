# Read by deploy/try and deploy/test: makes .venv beside this folder, from the lock, with the groups given.
# Needs git's checkout and a python3 of 3.11 or later with its venv module; nothing else, and no root.

make_environment() { # make_environment [uv sync arguments]
  local python="${PYTHON:-python3}"
  if ! command -v "$python" >/dev/null; then
    echo "ginnel: there is no $python here. On Debian or Ubuntu: sudo apt install python3 python3-venv" >&2
    return 1
  fi
  if ! "$python" -c 'import sys; sys.exit(sys.version_info < (3, 11))'; then
    echo "ginnel: $("$python" --version) is too old, 3.11 or later is needed. Install one and say PYTHON=python3.12 $0" >&2
    return 1
  fi
  if ! .venv/bin/python -c '' 2>/dev/null; then
    if ! "$python" -c 'import ensurepip, venv' 2>/dev/null; then
      echo "ginnel: $python has no venv module. On Debian or Ubuntu: sudo apt install python3-venv" >&2
      return 1
    fi
    echo "Making an environment in .venv (once) ..." >&2
    "$python" -m venv --clear .venv || return 1
  fi
  if [ ! -x .venv/bin/uv ]; then
    .venv/bin/python -m pip install --quiet --disable-pip-version-check 'uv>=0.8' || return 1
  fi
  # --inexact leaves uv itself and what the other command installed; a second run changes nothing
  UV_PROJECT_ENVIRONMENT="$PWD/.venv" UV_PYTHON_DOWNLOADS=never UV_SYSTEM_CERTS=1 \
    env -u VIRTUAL_ENV .venv/bin/uv sync --quiet --locked --inexact "$@"
}
