#!/bin/sh
# Finds, or on Debian as root installs, what the tests need beside Go.
set -eu

missing=""
command -v gcc >/dev/null 2>&1 || missing="$missing gcc libc6-dev"
command -v strace >/dev/null 2>&1 || missing="$missing strace"
if ! command -v postgres >/dev/null 2>&1 && ! ls /usr/lib/postgresql/*/bin/postgres >/dev/null 2>&1; then
	missing="$missing postgresql"
fi
for tool in haproxy sqlite3 curl python3 git; do
	command -v "$tool" >/dev/null 2>&1 || [ -x "/usr/sbin/$tool" ] || missing="$missing $tool"
done
command -v chromium >/dev/null 2>&1 || missing="$missing chromium fonts-liberation"
command -v pdftotext >/dev/null 2>&1 || missing="$missing poppler-utils"
command -v promtool >/dev/null 2>&1 || missing="$missing prometheus"
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
case "$missing" in
*prometheus*)
	# Of Prometheus only promtool, not a server that starts by itself.
	missing=$(echo "$missing" | sed 's/ prometheus//')
	(
		work=$(mktemp -d)
		trap 'rm -rf "$work"' EXIT
		chown _apt "$work" # apt downloads as a user of its own
		cd "$work"
		apt-get download -qq prometheus >/dev/null
		dpkg-deb --extract prometheus_*.deb .
		install usr/bin/promtool /usr/local/bin/promtool
	)
	;;
esac
[ -z "$missing" ] && exit 0
# shellcheck disable=SC2086 # a list of packages
apt-get install -y -qq --no-install-recommends $missing >/dev/null
