#!/bin/sh
# Finds, or on Debian as root installs, what the tests need beside Go.
set -eu

missing=""
command -v gcc >/dev/null 2>&1 || missing="$missing gcc libc6-dev"
command -v strace >/dev/null 2>&1 || missing="$missing strace"
if ! command -v postgres >/dev/null 2>&1 && ! ls /usr/lib/postgresql/*/bin/postgres >/dev/null 2>&1; then
	missing="$missing postgresql"
fi
[ -z "$missing" ] && exit 0

if [ "$(id -u)" != 0 ] || ! command -v apt-get >/dev/null 2>&1; then
	echo "The tests need:$missing. Install them (on Debian, as root: apt-get install$missing) and run make test again." >&2
	exit 1
fi
echo "installing:$missing"
export DEBIAN_FRONTEND=noninteractive
# The tests start a throwaway cluster of their own; none is to run beside it.
mkdir -p /etc/postgresql-common
grep -qs '^create_main_cluster' /etc/postgresql-common/createcluster.conf ||
	echo 'create_main_cluster = false' >>/etc/postgresql-common/createcluster.conf
apt-get update -qq
# shellcheck disable=SC2086 # a list of packages
apt-get install -y -qq --no-install-recommends $missing >/dev/null
