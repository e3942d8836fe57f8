#!/bin/sh
# Makes the secrets of deploy/compose.yaml, each in a file of its own, in the
# folder that is given. It replaces nothing.
#
#   deploy/secrets.sh deploy/secrets
set -eu
: "${1:?which folder?}"
umask 077
mkdir -p "$1"
cd "$1"

# The containers run as users of their own and must read the files: the folder
# is closed to others, the files are not.
write() {
	[ -e "$1" ] || (umask 022 && cat >"$1")
}
random() {
	od -An -N24 -tx1 /dev/urandom | tr -d ' \n'
}
random | write owner_password
random | write server_password
random | write grafana_password
printf 'postgres://jointledger_owner:%s@postgres/jointledger?sslmode=disable' "$(cat owner_password)" | write owner_url
printf 'postgres://jointledger_server:%s@postgres/jointledger?sslmode=disable' "$(cat server_password)" | write server_url
