# The Debian 12 packages of the project, listed once. Sourced by sample-data/run.sh and tests/run.sh (POSIX sh).
# docs/dependencies.md says what each is for.

# What the program is built with. The compiler cache is not needed, but once the tests brought it, all would be compiled again.
packages_to_build='
  ccache cmake g++ ninja-build pkg-config
  libboost-dev libceres-dev libcli11-dev libeigen3-dev libexpected-dev libfftw3-dev libfmt-dev libre2-dev libserialport-dev libsndfile1-dev
  libsoci-dev libsqlite3-dev libssl-dev libtomlplusplus-dev libutfcpp-dev libzstd-dev nlohmann-json3-dev zlib1g-dev'

# What the program starts as a child: figures. PDF reports also need chromium, which is large and therefore left to who wants them.
packages_to_run='gnuplot-nox'

# What the tests need besides: their framework, the schema check, and other programs to compare with.
packages_to_test='dpkg-dev file libgmock-dev libgtest-dev libvalijson-dev ngspice python3-numpy python3-scipy socat sqlite3'

# What tests/proof.sh compares speed with, besides.
packages_to_compare='python3-pandas'

# What looking for broken inputs needs besides (tests/fuzz.sh).
packages_to_fuzz='clang-19 libclang-rt-19-dev'

# need_packages <package...>: installs those that are missing; without any missing it changes nothing and asks for nothing.
need_packages() {
  if ! command -v dpkg-query >/dev/null 2>&1 || ! command -v apt-get >/dev/null 2>&1; then
    echo "This is no Debian system, so nothing is installed. Needed are (names of Debian 12):" >&2
    echo "  $(echo "$*" | tr -s ' \n' ' ')" >&2
    echo "Going on with what is there." >&2
    return 0
  fi
  missing=
  for package in "$@"; do
    state=$(dpkg-query -W -f='${Status}' "$package" 2>/dev/null) || state=
    case $state in
      *' ok installed') ;;
      *) missing="$missing $package" ;;
    esac
  done
  [ -n "$missing" ] || return 0

  as_root=
  if [ "$(id -u)" -ne 0 ]; then
    if ! command -v sudo >/dev/null 2>&1; then
      echo "Missing packages:$missing" >&2
      echo "  try: as root, apt-get install --no-install-recommends$missing" >&2
      return 1
    fi
    as_root=sudo
  fi
  echo "Installing what is missing:$missing"
  # A machine's package index may be absent or out of date: it is fetched only when the installation does not work without.
  # shellcheck disable=SC2086
  if apt-get -qq -s --no-install-recommends --no-remove install $missing >/dev/null 2>&1; then
    install_packages $missing && return 0
  fi
  $as_root env DEBIAN_FRONTEND=noninteractive apt-get -qq update || return 1
  # shellcheck disable=SC2086
  install_packages $missing && return 0
  echo "apt-get could not install:$missing" >&2
  echo "  try: apt-get update, and look at its messages; the project is made for Debian 12 (bookworm)" >&2
  return 1
}

# Each step of dpkg is a line on standard output, hundreds of them; what goes wrong is on standard error.
install_packages() {
  $as_root env DEBIAN_FRONTEND=noninteractive apt-get -qq -y -o Dpkg::Use-Pty=0 \
    --no-install-recommends --no-remove install "$@" >/dev/null
}
