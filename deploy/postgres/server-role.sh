#!/bin/sh
# Makes the role that servers connect as: it owns nothing and may do nothing until
# `jointledger migrate --server-role jointledger_server` grants it what a server
# needs. Run by the first start of the Postgres of deploy/compose.yaml, or by
# hand: PGHOST=… PGUSER=… PGDATABASE=… deploy/postgres/server-role.sh PASSWORDFILE
set -eu
file=${1:-/run/secrets/server_password}
psql --no-psqlrc --quiet --set ON_ERROR_STOP=1 --set password="$(cat "$file")" \
	--username "${POSTGRES_USER:-${PGUSER:-postgres}}" --dbname "${POSTGRES_DB:-${PGDATABASE:-postgres}}" <<'SQL'
CREATE ROLE jointledger_server LOGIN NOSUPERUSER NOCREATEDB NOCREATEROLE PASSWORD :'password';
SQL
