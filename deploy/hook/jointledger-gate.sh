#!/bin/sh
# Asks a jointledger server whether a part may be released, with curl alone:
# what `jointledger gate` does, for machines without that program.
#
#   jointledger-gate.sh --server URL --part P --revision R --joints FILE
#                       [--policy NAME] [--on-error hold|release] [--timeout SECONDS]
#
# FILE is a JSON list: [{"joint": "hinge-upper", "geometry_digest": "sha256:…"}, …].
# The API key is read from JOINTLEDGER_KEY, and never stands among the
# arguments of a process, where others could list it.
#
# Exit 0: release. Exit 1: hold, every reason in a plain line on standard
# output. Exit 2: the server could not be asked; with --on-error release that
# is exit 0 and a loud line on standard error. A request that the server
# refuses as such (400, 413, 422) is exit 2 in any case: whoever writes FILE
# must not be able to open the gate with it.
set -eu

die() {
	echo "jointledger-gate: the gate holds: $1" >&2
	exit 2
}

# The server, or the way to it, has failed.
could_not_ask() {
	if [ "$on_error" = release ]; then
		echo "jointledger-gate: WARNING: part $part, revision $revision, is released WITHOUT the gate, since --on-error release is set: $1" >&2
		exit 0
	fi
	echo "jointledger-gate: the gate could not be asked, and holds: $1" >&2
	exit 2
}

# Writes a text without control characters as a JSON string.
json() {
	printf '"%s"' "$(printf '%s' "$1" | sed 's/[\\"]/\\&/g')"
}

server='' part='' revision='' joints='' policy=default on_error=hold timeout=10
while [ $# -gt 0 ]; do
	[ $# -ge 2 ] || die "$1 needs a value, or is not known"
	case $1 in
	--server) server=$2 ;;
	--part) part=$2 ;;
	--revision) revision=$2 ;;
	--joints) joints=$2 ;;
	--policy) policy=$2 ;;
	--on-error) on_error=$2 ;;
	--timeout) timeout=${2%s} ;;
	*) die "there is no option $1" ;;
	esac
	shift 2
done
[ -n "$server" ] && [ -n "$part" ] && [ -n "$revision" ] && [ -n "$joints" ] ||
	die "--server, --part, --revision and --joints are needed"
case $server in
http://* | https://*) ;;
*) die "--server must be like https://host:port" ;;
esac
case $on_error in
hold | release) ;;
*) die "--on-error must be hold or release" ;;
esac
case $timeout in
'' | *[!0-9]* | 0*) die "--timeout must be a whole number of seconds, such as 10 or 10s" ;;
esac
case $part$revision$policy in
*[[:cntrl:]]*) die "a part, revision or policy has no control characters" ;;
esac
[ -f "$joints" ] && [ -r "$joints" ] || die "there is no file $joints"
command -v curl >/dev/null 2>&1 || could_not_ask "curl is not installed"

work=$(mktemp -d) || could_not_ask "no temporary folder can be made"
trap 'rm -rf "$work"' EXIT
trap 'exit 2' HUP INT TERM

{
	printf '{"part":%s,"revision":%s,"policy":%s,"joints":' "$(json "$part")" "$(json "$revision")" "$(json "$policy")" &&
		cat -- "$joints" &&
		printf '}'
} >"$work/request" || die "the request cannot be written"

# Only --config on standard input has the key. Nothing is followed to another
# address, and no ~/.curlrc has a say.
status=$(
	if [ -n "${JOINTLEDGER_KEY-}" ]; then
		printf 'header = "Authorization: Bearer %s"\n' "$JOINTLEDGER_KEY"
	fi | curl --disable --config - --silent --show-error --proto '=http,https' \
		--max-time "$timeout" --max-redirs 0 --max-filesize 16777216 \
		--header 'Content-Type: application/json' --header 'Accept: text/plain' \
		--data-binary "@$work/request" --output "$work/answer" --write-out '%{http_code}' \
		"${server%/}/v1/release-checks" 2>"$work/errors"
) || could_not_ask "$(cat "$work/errors")"

case $status in
200) ;;
400 | 413 | 422) die "the server refuses the request with $status: $(cat "$work/answer")" ;;
*) could_not_ask "the server answers with $status: $(head -c 1000 "$work/answer" 2>/dev/null)" ;;
esac

decision=
read -r decision <"$work/answer" || true
case $decision in
release) code=0 ;;
hold) code=1 ;;
*) could_not_ask "the answer is no decision" ;;
esac
cat "$work/answer"
exit "$code"
