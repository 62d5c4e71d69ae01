#!/usr/bin/env bash
# Prove that `make site` and `make test` do all set-up: run them from a fresh clone of this repository in a
# Debian root that holds python3 and make, and nothing else that debootstrap's minbase does not bring.
#
# usage: tests/references/bare_root.sh DIR [TARGET...]       as root; targets are `site test` unless named
#
# DIR is made, with debootstrap, when it does not exist, and is left in place to look at. Release, mirrors,
# pip's machine-wide settings and local certificate authorities are this machine's own; its folders of packages
# are not seen inside. First comes a user without rights, who must get one apt line and a failure; then root,
# target by target, twice each: from nothing, then with all in place. Only what is committed is in the clone.
# The locale is POSIX throughout.
set -euo pipefail

root=$(realpath -m "${1:?usage: bare_root.sh DIR [TARGET...]}")
shift
targets=("$@")
[ $# -gt 0 ] || targets=(site test)
repository=$(git -C "$(dirname "$0")" rev-parse --show-toplevel)

copy_in() { # the named files and folders that exist here, to the same place in the root
    local path
    for path in "$@"; do
        if [ -e "$path" ]; then
            mkdir -p "$root${path%/*}"
            cp -aT "$path" "$root$path"
        fi
    done
}

make_root() {
    local mirror suite
    # shellcheck disable=SC1091
    suite=$(. /etc/os-release && echo "$VERSION_CODENAME")
    # shellcheck disable=SC2016  # the variables are apt's
    mirror=$(apt-get indextargets --format '$(RELEASE) $(REPO_URI)' 'Created-By: Packages' |
        awk -v suite="$suite" '$1 == suite { print $2; exit }')
    debootstrap --variant=minbase --include=python3,make "$suite" "$root" "$mirror" >"$root.log" 2>&1 ||
        { tail -20 "$root.log" >&2; return 1; }
    rm -f "$root/etc/apt/sources.list" # debootstrap's, which may repeat what is copied next
    copy_in /etc/apt/sources.list /etc/apt/sources.list.d /etc/apt/auth.conf.d /etc/apt/keyrings
    copy_in /etc/apt/trusted.gpg /etc/apt/trusted.gpg.d /usr/local/share/ca-certificates /etc/resolv.conf
    apt-config dump | grep -E '^Acquire::(http|https|Check-)' >"$root/etc/apt/apt.conf.d/99-as-outside" || true
    copy_in /etc/pip.conf /etc/xdg/pip
}

inside() { # USER COMMAND...: run it in the clone, with mounts and processes that end with it
    local user=$1 pip_settings
    shift
    mapfile -t pip_settings < <(env | grep '^PIP_' | grep -v '^PIP_FIND_LINKS=' || true)
    # shellcheck disable=SC2016  # the inner shell expands
    unshare --mount --pid --fork --kill-child sh -euc '
        root=$1 user=$2
        shift 2
        mount --make-rprivate /
        mount -t proc proc "$root/proc"
        mount --rbind /dev "$root/dev"
        exec chroot --userspec="$user" "$root" /usr/bin/env -i "$@"
    ' sh "$root" "$user" HOME="$([ "$user" = root ] && echo /root || echo /tmp)" CI=true "${pip_settings[@]}" \
        PATH=/usr/local/sbin:/usr/local/bin:/usr/sbin:/usr/bin:/sbin:/bin \
        sh -c 'cd /handbook && exec "$@"' sh "$@" </dev/null
}

timed() { # LABEL USER COMMAND...
    local label=$1 start=$SECONDS
    shift
    echo "=== $label"
    inside "$@"
    echo "=== $label: $((SECONDS - start)) s"
}

[ -d "$root" ] || make_root
rm -rf "$root/handbook"
git clone --quiet --no-hardlinks "$repository" "$root/handbook"

if ! inside root sh -c 'dpkg -s python3-venv' >/dev/null 2>&1; then
    echo "=== a user without rights"
    chown -R nobody: "$root/handbook"
    said=$(inside nobody: make "${targets[0]}" 2>&1) && { echo "must fail, did not: $said" >&2; exit 1; }
    echo "$said"
    [ "$(grep -c 'apt-get install' <<<"$said")" -eq 1 ] || { echo "must name one apt line" >&2; exit 1; }
    chown -R root: "$root/handbook"
fi
for target in "${targets[@]}"; do
    timed "make $target, first" root make "$target"
    timed "make $target, again" root make "$target"
done
